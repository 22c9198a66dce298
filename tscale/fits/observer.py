"""Where the observer of a header is, and where it looked: Site from OBSGEO, Source from RA and DEC."""

from __future__ import annotations

import math
from collections.abc import Mapping
from decimal import Decimal
from typing import Any, Final

from ..earth.geodesy import geocentric_from_geodetic
from ..earth.site import Site
from ..errors import MissingPiece
from ..source import Source
from .cards import Cards, Value

__all__ = ["observer_itrf_m", "site_of", "source_of"]

_XYZ: Final = ("OBSGEO-X", "OBSGEO-Y", "OBSGEO-Z")
_BLH: Final = ("OBSGEO-B", "OBSGEO-L", "OBSGEO-H")
_DEGREE_M: Final = 111.4e3
_DIRECTIONS: Final = (("RA_NOM", "DEC_NOM"), ("RA_OBJ", "DEC_OBJ"))


def observer_itrf_m(cards: Cards) -> tuple[float, float, float] | None:
    """The ITRS position of OBSGEO-X, -Y, -Z, or of OBSGEO-B, -L, -H (WGS84), m; None without them.

    Raises
    ------
    DataFileError
        For an incomplete set, and for two that differ by more than their digits.
    """
    xyz, blh = _three(cards, _XYZ), _three(cards, _BLH)
    if blh is None:
        return None if xyz is None else (float(xyz[0]), float(xyz[1]), float(xyz[2]))
    lat, lon, height = map(float, blh)
    if abs(lat) > 90 or abs(lon) > 360:
        raise cards.fault(f"OBSGEO-B is a latitude and OBSGEO-L a longitude in degrees, and they are {lat} and {lon}")
    x, y, z = geocentric_from_geodetic(lon, lat, height, "WGS84").tolist()
    if xyz is None:
        return float(x), float(y), float(z)
    first = (float(xyz[0]), float(xyz[1]), float(xyz[2]))
    apart_m = math.dist(first, (x, y, z))
    digits_m = [_digit(value) for value in xyz] + [_digit(value) * _DEGREE_M for value in blh[:2]] + [_digit(blh[2])]
    if apart_m > sum(digits_m):
        raise cards.fault(
            f"OBSGEO-X, -Y, -Z and OBSGEO-B, -L, -H are {apart_m:.6g} m apart. Give those that are wrong their right "
            "values, by cards={'OBSGEO-X': ...} and so on"
        )
    return first


def _three(cards: Cards, names: tuple[str, ...]) -> list[Decimal] | None:
    values = [cards.number(name) for name in names]
    there = [value for value in values if value is not None]
    if there and len(there) < len(names):
        missing = [name for name, value in zip(names, values, strict=True) if value is None]
        raise cards.fault(f"{', '.join(missing)} is missing beside the rest of {', '.join(names)}")
    return there or None


def _digit(value: Decimal) -> float:
    exponent = int(value.as_tuple().exponent)
    return float(10.0 ** min(exponent, 0))


def site_of(header: Any, name: str | None = None, *, cards: Mapping[str, Value] | None = None) -> Site:
    """The site that OBSGEO keywords state; an epoch they do not have.

    Raises
    ------
    MissingPiece
        Where the header has none.
    DataFileError
        Where it contradicts itself.
    InvalidInput
        For a place that is not on the ground.
    """
    found = Cards.of(header, cards)
    position = observer_itrf_m(found)
    if position is None:
        raise MissingPiece(f"{found.where} has no OBSGEO keywords: give a Site, or the Trajectory of a spacecraft")
    return Site.from_itrf(name or found.text("TELESCOP") or "OBSGEO", *position)


def source_of(
    header: Any, keywords: tuple[str, str] | None = None, *, cards: Mapping[str, Value] | None = None
) -> Source:
    """The direction that two keywords of a header state, as a source at infinite distance.

    Parameters
    ----------
    header : header
    keywords : (str, str), optional
        Right ascension and declination, degrees; RA_NOM and DEC_NOM if not given, else RA_OBJ and DEC_OBJ.

    Raises
    ------
    MissingPiece
        Where they are not there.
    DataFileError
        For another frame than the ICRS (by RADESYS and EQUINOX): FK5 differs by up to 0.1", 0.2 ms in an arrival time.
    """
    found = Cards.of(header, cards)
    pairs = _DIRECTIONS if keywords is None else (keywords,)
    for pair in pairs:
        ra, dec = found.number(pair[0]), found.number(pair[1])
        if ra is not None and dec is not None:
            break
    else:
        wanted = " or ".join(" and ".join(pair) for pair in pairs)
        raise MissingPiece(f"{found.where} does not state {wanted}: give a Source")
    if not is_icrs(found):
        raise found.fault(
            f"{pair[0]} and {pair[1]} are not ICRS by RADESYS = {found.text('RADESYS') or 'not given'}, EQUINOX = "
            f"{found.token('EQUINOX') or 'not given'}: carry the direction to the ICRS and give it as a Source"
        )
    return Source(float(ra), float(dec), name=found.text("OBJECT") or "")


def is_icrs(cards: Cards) -> bool:
    """Whether directions of a header are ICRS: by RADESYS, which is ICRS by default where no EQUINOX is given."""
    system = cards.text("RADESYS") or cards.text("RADECSYS")
    return system == "ICRS" if system is not None else "EQUINOX" not in cards
