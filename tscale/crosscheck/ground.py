"""Signatures of mistakes in where a site is: Earth rotation, coordinates."""

from __future__ import annotations

import math
from collections.abc import Iterator
from dataclasses import replace
from functools import partial
from typing import Any, Final

import numpy as np

from .. import exact
from ..constants import C_M_S, EARTH_ANGULAR_VELOCITY_RAD_S
from ..counts import tai_from_tt, tdb_from_tcb, tt_from_tcg
from ..earth.frames import bcrs_offset, dot
from ..earth.moving import EarthAndSun
from ..earth.rotation import orientation
from ..earth.site import Site
from ..exact import FloatArray, Pair
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from .front import Front, Pieces, total_of
from .path import Path
from .signature import Signature, bound

__all__ = ["ground_signatures"]

_WEST: Final = "longitude of the site with the wrong sign"
_SOUTH: Final = "latitude of the site with the wrong sign"
_GEODETIC: Final = "geodetic latitude taken for geocentric"
_ALONG: Final = "place of the site along {} (ITRF)"


def ground_signatures(path: Path, number: int, front: Front | None) -> Iterator[Signature]:
    """All that can go wrong with the place of a site; none for other observers.

    Parameters
    ----------
    path : Path
    number : int
        The step in which the place counts: the wavefront, else the one to TCB or TDB.
    front : Front or None
        The wavefront, if there is one, of whose pieces the coordinates of the site are one.
    """
    site = path.chain._supplies.site
    if not isinstance(site, Site):
        return
    moves = {} if front is None else _moves(site)
    for signature in _signatures(path, number, front, site):
        moved_m = moves.get(signature.name)
        if moved_m is None or front is None:
            yield signature
        else:
            yield replace(signature, change=partial(_moved, moved_m), joined=front.joined_s)


def _moves(site: Site) -> dict[str, FloatArray]:
    """How far each mistake in its coordinates moves a site, ITRF, m."""
    position = np.array(site.position_m)
    return {
        _WEST: position * np.array([0.0, -2.0, 0.0]),
        _SOUTH: position * np.array([0.0, 0.0, -2.0]),
        _GEODETIC: _ball(site) - position,
        _ALONG.format("X"): np.array([1.0, 0.0, 0.0]),
        _ALONG.format("Y"): np.array([0.0, 1.0, 0.0]),
    }


def _ball(site: Site) -> FloatArray:
    """A site with its geodetic latitude taken for the geocentric one, ITRF, m."""
    position = np.array(site.position_m)
    latitude, east = math.radians(site.lat_deg), math.atan2(position[1], position[0])
    flat = math.cos(latitude)
    return float(np.linalg.norm(position)) * np.array(
        [flat * math.cos(east), flat * math.sin(east), math.sin(latitude)]
    )


def _moved(moved_m: FloatArray, pieces: Pieces, amplitude: float) -> Pieces:
    if pieces.site is None:
        return pieces
    place = tuple((np.array(pieces.site.position_m) + amplitude * moved_m).tolist())
    return pieces._replace(site=replace(pieces.site, position_m=place))


def _signatures(path: Path, number: int, front: Front | None, site: Site) -> Iterator[Signature]:
    reference = path.chain.reference
    position = np.array(site.position_m)

    def seconds(a: Instants, b: Instants, offset_m: Any) -> FloatArray:
        """Effect of ITRS offsets made from the orientation of the Earth, as (..., 3) or (3,) m."""
        tt, tdb = _dates(a, b, path)
        earth = orientation(tt, reference)
        moved = earth.celestial(np.asarray(offset_m(earth, tt), dtype=np.float64))
        if front is None:
            return EarthAndSun.at(reference.ephemeris, tdb).terms(moved).total_s
        bodies = EarthAndSun.at(reference.ephemeris, tdb)
        there = bcrs_offset(moved, bodies.earth_v_m_s, bodies.acceleration_m_s2, bodies.potential_m2_s2)
        # The date at the site moves by the topocentric terms, and the Earth with it.
        onward = 1.0 + dot(bodies.earth_v_m_s, front.toward(a)) / C_M_S
        return np.asarray(bodies.terms(moved).total_s * onward + dot(there, front.toward(a)) / C_M_S)

    def along(a: Instants, b: Instants, axis: int) -> FloatArray:
        return seconds(a, b, lambda o, tt: np.eye(3)[axis])

    def elsewhere(a: Instants, b: Instants, place_m: FloatArray) -> FloatArray:
        """Effect of a site at other ITRF coordinates, exact also for thousands of kilometres."""
        tt, tdb = _dates(a, b, path)
        there = replace(site, position_m=tuple(place_m.tolist()))
        moved = there.gcrs(tt, reference)[0] - site.gcrs(tt, reference)[0]
        late = EarthAndSun.at(reference.ephemeris, tdb).terms(moved).total_s
        if front is None:
            return late
        shifted = Instants._of(exact.add_seconds(a.pair, late), a.scale, a.place)
        return np.asarray(late + total_of(front.other(shifted, site=there)) - front.total_s(a))

    mirrored = position * np.array([1.0, -1.0, 1.0])
    yield Signature(
        _WEST,
        "west taken for east",
        bound(elsewhere, mirrored),
        number,
    )
    flipped = position * np.array([1.0, 1.0, -1.0])
    yield Signature(
        _SOUTH,
        "south taken for north",
        bound(elsewhere, flipped),
        number,
    )
    yield Signature(
        "UTC in place of UT1 in the Earth's rotation",
        "up to 0.9 s, 400 m: 1.4 us in a wavefront",
        lambda a, b: seconds(a, b, lambda o, tt: _turned(position, -_ut1_utc_s(tt, reference))),
        number,
    )
    if front is None:
        return
    yield Signature(
        "polar motion left out",
        "up to 0.5 arcsec, 15 m: 50 ns",
        lambda a, b: seconds(a, b, lambda o, tt: _unpolar(position, o)),
        number,
    )
    ball = _ball(site)
    if float(np.max(np.abs(ball - position))) > 1.0:
        yield Signature(
            _GEODETIC,
            "up to 21 km: 70 us",
            bound(elsewhere, ball),
            number,
        )
    # Along Z the site is off by the same for all dates of one source, which tells nothing.
    for axis in range(2):
        yield Signature(
            _ALONG.format("XY"[axis]),
            "3.3 ns for 1 m",
            bound(along, axis),
            number,
            None,
            unit="m",
            limit=2e7,
        )


def _dates(a: Instants, b: Instants, path: Path) -> tuple[Pair, Pair]:
    """TT (to 2 us where that suffices) and TDB of the event at the site."""
    if a.scale == "TDB":
        table = path.chain.reference.time_ephemeris
        return exact.add_seconds(a.pair, table.tt_minus_tdb_s(a.pair)), a.pair
    tt = a.pair if a.scale == "TT" else tt_from_tcg(a.pair)
    return tt, b.pair if b.scale == "TDB" else tdb_from_tcb(b.pair)


def _ut1_utc_s(tt: Pair, reference: Any) -> FloatArray:
    tai = tai_from_tt(tt)
    leaps: LeapSeconds = reference.leap_seconds
    utc = exact.normalise(tai[0] - 32, tai[1])
    return np.asarray(reference.earth_orientation.at(tai).ut1_minus_tai_s + leaps.tai_minus_utc(utc))


def _turned(position: FloatArray, seconds: FloatArray) -> FloatArray:
    """Displacement by a rotation about the pole that is so many seconds too far."""
    angle = EARTH_ANGULAR_VELOCITY_RAD_S * seconds
    sine, less = np.sin(angle), -2.0 * np.sin(angle / 2.0) ** 2
    x, y, _ = position
    return np.stack([less * x - sine * y, sine * x + less * y, np.zeros(np.shape(angle))], axis=-1)


def _unpolar(position: FloatArray, earth: Any) -> FloatArray:
    """ITRS offset that undoes R2(xp) R1(yp), to first order."""
    x, y, z = position
    xp, yp = earth.pole_x_rad, earth.pole_y_rad
    # R2 R1 r - r is (-xp z, yp z, xp x - yp y).
    return np.stack([xp * z, -yp * z, yp * y - xp * x], axis=-1)
