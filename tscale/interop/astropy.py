"""Instants, sites and sources from and to astropy's `Time`, `EarthLocation` and `SkyCoord`."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from ..earth.site import Site
from ..errors import InvalidInput
from ..instants import Instants
from ..source import Source
from . import astropy_places, astropy_time
from .optional import needed

if TYPE_CHECKING:
    from ..formats.leap_seconds import LeapSeconds

__all__ = ["from_astropy", "to_astropy"]


def from_astropy(
    value: Any,
    place: str | None = None,
    *,
    leap_seconds: LeapSeconds | None = None,
    name: str | None = None,
    epoch: str | None = None,
    drop_radial_velocity: bool = False,
) -> Any:
    """Read an astropy `Time` as Instants, an `EarthLocation` as a Site, or a `SkyCoord` as a Source.

    Parameters
    ----------
    value : Time, EarthLocation or SkyCoord
        A `Time` of any shape and of scale utc, tai, tt, tcg, tcb, tdb or ut1; one location; one direction in any frame
        that astropy turns into ICRS.
    place : str or None
        Place to state with a `Time`: `TOPOCENTER`, `GEOCENTER`, `BARYCENTER` ...
    leap_seconds : LeapSeconds, optional
        For a `Time` of UTC.
    name : str, optional
        Of the site or the source; by default what astropy calls it (`info.name`).
    epoch : str, optional
        Of a `SkyCoord` without `obstime`: ISO 8601, TDB.
    drop_radial_velocity : bool
        Leave a radial velocity out, which a Source has not.

    Returns
    -------
    Instants, Site or Source
        A `Time` is read exactly: its two parts say a date to 5 ps, Instants hold it to 0.1 fs. A site has astropy's
        metres to the bit, a source its degrees (within one rounding where astropy has to turn or convert).

    Raises
    ------
    MissingPiece
        Without astropy.
    InvalidInput
        For anything else; the scale `local`; masked or non-finite dates (with the mask); several locations or
        directions; a source with proper motion and no date, or with a radial velocity.
    OutOfSpan
        For UTC before the leap-second table.

    Notes
    -----
    `Time.location` is where astropy puts the observer when it converts, no part of the date, and is let be.

    On the few days of 1961 to 1971 that end with a step of some 0.1 s, ERFA (and astropy with it) takes the length of
    the day to 3 ns only: there the same two parts mean labels up to 3 ns apart.
    """
    coordinates = needed("astropy.coordinates") if type(value).__module__.startswith("astropy.coord") else None
    if coordinates is not None and isinstance(value, coordinates.EarthLocation):
        return astropy_places.site_of(value, name)
    if coordinates is not None and isinstance(value, coordinates.SkyCoord):
        return astropy_places.source_of(value, name, epoch, drop_radial_velocity)
    if not isinstance(value, needed("astropy.time").Time):
        raise InvalidInput(f"from_astropy reads an astropy Time, EarthLocation or SkyCoord, got {type(value).__name__}")
    return astropy_time.instants_of(value, place, leap_seconds)


def to_astropy(value: Instants | Site | Source, *, leap_seconds: LeapSeconds | None = None) -> Any:
    """Write Instants as an astropy `Time` of the same shape, a Site as an `EarthLocation`, a Source as a `SkyCoord`.

    A `Time` is two float64 of days, each rounded to nearest: half a unit of the last place is 2.4 ps at midnight, and
    nothing within a second of noon. What was read from a `Time` goes back to the same two numbers. The place is no
    part of a `Time`: keep it beside a barycentric date.

    An `EarthLocation` has no velocity: it is where the site is at its own epoch. A `SkyCoord` is ICRS, with proper
    motion, with `obstime` at the source's epoch, and with a distance where there is a parallax.

    Parameters
    ----------
    value : Instants, Site or Source
        Instants of scale UTC, TAI, TT, TCG, TCB, TDB or UT1.
    leap_seconds : LeapSeconds, optional
        For UTC; the default table is the one that astropy knows.

    Raises
    ------
    MissingPiece
        Without astropy.
    ScaleMismatch
        For a scale that astropy does not have; convert with `tscale.chain` first.
    """
    if isinstance(value, Site):
        return astropy_places.location_of(value)
    if isinstance(value, Source):
        return astropy_places.sky_coord_of(value)
    if not isinstance(value, Instants):
        raise InvalidInput(f"to_astropy writes Instants, a Site or a Source, got {type(value).__name__}")
    return astropy_time.time_of(value, leap_seconds)
