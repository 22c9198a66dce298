"""Geodetic and geocentric coordinates on the WGS84 and GRS80 ellipsoids.

The conversions are those of ERFA (`gd2gce`; `gc2gde` after Fukushima 2006, J. Geodesy 79, 689), wrapped
so that units, shapes and errors are ours. Ellipsoids: NIMA TR8350.2 (WGS84), Moritz 2000 (GRS80).
"""

from __future__ import annotations

from typing import Final, Literal, TypeAlias

import numpy as np
import numpy.typing as npt

from ..constants import WGS84_A_M, WGS84_INVERSE_FLATTENING
from ..errors import InvalidInput
from ..exact import FloatArray

__all__ = ["Ellipsoid", "geocentric_from_geodetic", "geodetic_from_geocentric"]

Ellipsoid: TypeAlias = Literal["WGS84", "GRS80"]

_ELLIPSOIDS: Final[dict[str, tuple[float, float]]] = {
    "WGS84": (WGS84_A_M, 1.0 / WGS84_INVERSE_FLATTENING),
    "GRS80": (6378137.0, 1.0 / 298.257222101),
}


def _figure(ellipsoid: str) -> tuple[float, float]:
    try:
        return _ELLIPSOIDS[ellipsoid]
    except KeyError:
        raise InvalidInput(f"unknown ellipsoid {ellipsoid!r}; known are {', '.join(_ELLIPSOIDS)}") from None


def geocentric_from_geodetic(
    lon_deg: npt.ArrayLike, lat_deg: npt.ArrayLike, height_m: npt.ArrayLike, ellipsoid: Ellipsoid = "WGS84"
) -> FloatArray:
    """Geocentric position of a geodetic one.

    Parameters
    ----------
    lon_deg, lat_deg : float array
        East longitude within +-360 and geodetic latitude within +-90, degrees; they broadcast with the height.
    height_m : float array
        Height above the ellipsoid, m.
    ellipsoid : {"WGS84", "GRS80"}
        Figure of the Earth.

    Returns
    -------
    float array, broadcast shape + (3,)
        x, y, z in m.

    Raises
    ------
    InvalidInput
        Not finite, or a latitude or longitude beyond its range (with the mask).
    """
    import erfa

    radius_m, flattening = _figure(ellipsoid)
    lon, lat, height = (np.asarray(value, dtype=np.float64) for value in (lon_deg, lat_deg, height_m))
    bad = ~((np.abs(lat) <= 90.0) & (np.abs(lon) <= 360.0) & np.isfinite(height))
    if np.any(bad):
        raise InvalidInput(
            f"{int(np.count_nonzero(bad))} geodetic positions are out of range: lon_deg must lie within +-360 "
            f"(got {lon!s}), lat_deg within +-90 (got {lat!s}), height_m be finite (got {height!s}); "
            "check their order and units",
            mask=np.asarray(bad),
        )
    return np.asarray(erfa.gd2gce(radius_m, flattening, np.radians(lon), np.radians(lat), height), dtype=np.float64)


def geodetic_from_geocentric(
    position_m: npt.ArrayLike, ellipsoid: Ellipsoid = "WGS84"
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Geodetic position of a geocentric one.

    Parameters
    ----------
    position_m : float array (..., 3)
        x, y, z in m.
    ellipsoid : {"WGS84", "GRS80"}
        Figure of the Earth.

    Returns
    -------
    lon_deg, lat_deg, height_m : float array (...)
        Longitude in (-180, 180] (0 on the axis), geodetic latitude, height above the ellipsoid.

    Raises
    ------
    InvalidInput
        A last axis other than 3, or values that are not finite (with the mask).
    """
    import erfa

    radius_m, flattening = _figure(ellipsoid)
    position = np.asarray(position_m, dtype=np.float64)
    if position.ndim == 0 or position.shape[-1] != 3:
        raise InvalidInput(f"a position has x, y, z on its last axis, got shape {position.shape}")
    bad = ~np.isfinite(position).all(axis=-1)
    if np.any(bad):
        raise InvalidInput(
            f"{int(np.count_nonzero(bad))} positions are not finite; drop them first", mask=np.asarray(bad)
        )
    lon, lat, height = erfa.gc2gde(radius_m, flattening, position)
    return np.degrees(lon), np.degrees(lat), np.asarray(height, dtype=np.float64)
