"""From a measured frequency difference to a difference of potential and of height: levelling with clocks."""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt

from ..constants import C_M_S
from ..earth.gravity.normal import GRS80, NormalField, geopotential_number_m2_s2
from ..errors import InvalidInput
from ..exact import FloatArray
from .numbers import numbers

__all__ = ["HeightDifference", "height_from_frequency"]

_C2: Final = C_M_S**2
_LARGEST: Final = 1e-11


class HeightDifference(NamedTuple):
    """What a frequency difference says of two places, a minus b; arrays that broadcast from the input."""

    geopotential_number_m2_s2: FloatArray
    """Geopotential number of a less that of b, m2/s2: positive where a is higher."""
    geopotential_sigma_m2_s2: FloatArray
    """Its standard uncertainty, m2/s2."""
    height_m: FloatArray
    """Height of a above b along the plumb line, m."""
    height_sigma_m: FloatArray
    """Its standard uncertainty, from that of the frequency alone, m."""
    gravity_m_s2: FloatArray
    """Mean gravity between the two that was used, m/s2."""


def height_from_frequency(
    y: npt.ArrayLike,
    sigma_y: npt.ArrayLike = 0.0,
    *,
    lat_deg: npt.ArrayLike | None = None,
    height_above_geoid_m: npt.ArrayLike = 0.0,
    gravity_m_s2: npt.ArrayLike | None = None,
    normal: NormalField = GRS80,
) -> HeightDifference:
    """Geopotential and height difference of two clocks at rest on the ground from their fractional frequency
    difference.

    Parameters
    ----------
    y : float array
        Fractional frequency of clock a less that of clock b, both realising the same unperturbed frequency, within
        1e-11.
    sigma_y : float array
        Its standard uncertainty.
    lat_deg : float array, optional
        Geodetic latitude of the two, degrees: then gravity is normal gravity, to second order in the height.
    height_above_geoid_m : float array
        Height of clock b, m; used with `lat_deg`.
    gravity_m_s2 : float array, optional
        Mean gravity between the two clocks, 9.7 to 9.9 m/s2, in place of a latitude.
    normal : NormalField
        Whose gravity is used with `lat_deg`.

    Returns
    -------
    HeightDifference
        dC = y c^2 (C is W0 - W: a clock in the higher place runs fast); height from dC by the gravity. Real gravity
        differs from normal by 50 mGal as a rule, 5e-5 of the height difference, and by 300 mGal in high mountains.

    Raises
    ------
    InvalidInput
        Values that are not finite or out of range (with the mask), neither or both of `lat_deg` and `gravity_m_s2`.
    """
    if (lat_deg is None) == (gravity_m_s2 is None):
        raise InvalidInput(
            "a height follows from a potential by gravity: give lat_deg= (for normal gravity) or gravity_m_s2=, one of "
            "them"
        )
    y_array, sigma, base = numbers(y=y, sigma_y=sigma_y, height_above_geoid_m=height_above_geoid_m)
    bad = np.asarray((np.abs(y_array) > _LARGEST) | (sigma < 0.0))
    if np.any(bad):
        raise InvalidInput(
            f"{int(np.count_nonzero(bad))} of {bad.size} frequency differences are over {_LARGEST:g} (100 km of "
            "height) or have a negative sigma_y: give fractions, such as 4.1e-17",
            mask=bad,
        )
    number = y_array * _C2
    if gravity_m_s2 is not None:
        number, gravity = np.broadcast_arrays(number, *numbers(gravity_m_s2=gravity_m_s2))
        out = np.asarray(~((gravity >= 9.7) & (gravity <= 9.9)))
        if np.any(out):
            raise InvalidInput("gravity_m_s2 on the ground lies within 9.7 to 9.9 m/s2 (see .mask)", mask=out)
        height = number / gravity
        local = gravity
    else:
        number, base, lat = np.broadcast_arrays(number, base, *numbers(lat_deg=lat_deg))
        below = geopotential_number_m2_s2(base, lat, normal=normal)
        # Newton from the local value: exact in the difference, which the inverse of a sum would round.
        height = number / normal.gravity_m_s2(lat, base)
        for _ in range(4):
            excess = geopotential_number_m2_s2(base + height, lat, normal=normal) - below - number
            height = height - excess / normal.gravity_m_s2(lat, base + height)
        moved = height != 0.0
        local = np.where(moved, number / np.where(moved, height, 1.0), normal.gravity_m_s2(lat, base))
    spread = np.broadcast_to(sigma * _C2, number.shape)
    return HeightDifference(
        np.array(number), np.array(spread), np.array(height), np.asarray(spread / local), np.array(local)
    )
