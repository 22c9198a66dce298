"""Between the geocentric and the barycentric state of one observer at one event.

An event has one TT and one TDB, which differ by the topocentric term V.r/c^2 from the pair at the geocentre (2 us on
the ground, in which a low satellite moves 2 cm). Both functions find the other date first and then change
the vectors with the terms of order c^-2 of `frames`; each is the other's inverse to the rounding of a barycentric
position, 1.5e-5 m.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, Final, NamedTuple

import numpy as np

from .. import exact
from ..constants import C_M_S, L_G
from ..ephemeris import PLANETARY_BODIES, Ephemeris
from ..exact import FloatArray, Pair
from .frames import bcrs_offset, bcrs_offset_velocity, dot, gcrs_offset, gcrs_offset_velocity
from .observer import Observer, nearest_inside, require_inside

if TYPE_CHECKING:
    from ..tables.reference import ReferenceData

__all__ = [
    "TT_PER_TCG",
    "EarthAndSun",
    "Event",
    "TopocentricTerms",
    "bcrs_state",
    "gcrs_state",
    "observer_event",
    "tdb_from_tt_at_geocentre",
    "topocentric_rate",
    "topocentric_terms",
    "tt_from_tdb_at_geocentre",
]

TT_PER_TCG: Final = float(1 - L_G)
_TCG_METRE: Final = float(1 / (1 - L_G))
_C2: Final = C_M_S**2


class TopocentricTerms(NamedTuple):
    """TCB - TCG of an observer minus that of the geocentre, seconds."""

    first_s: FloatArray
    """v_E.X / c^2 of the geocentric vector X, up to 2.1e-6 s on the ground."""
    second_s: FloatArray
    """2 w_ext v_E.X / c^4, up to 4e-14 s on the ground."""

    @property
    def total_s(self) -> FloatArray:
        """Both terms."""
        return self.first_s + self.second_s


class EarthAndSun(NamedTuple):
    """What the topocentric terms need of the ephemeris at some TDB dates."""

    earth_m: FloatArray
    earth_v_m_s: FloatArray
    sun_m: FloatArray
    sun_v_m_s: FloatArray
    potential_m2_s2: FloatArray
    """The Sun's potential at the geocentre."""

    @classmethod
    def at(cls, ephemeris: Ephemeris, tdb: Pair) -> EarthAndSun:
        """Look both bodies up."""
        (earth, sun), (earth_v, sun_v) = ephemeris.states(("earth", "sun"), tdb)
        away = sun - earth
        return cls(earth, earth_v, sun, sun_v, np.asarray(ephemeris.gm_m3_s2("sun") / np.sqrt(dot(away, away))))

    @property
    def acceleration_m_s2(self) -> FloatArray:
        """Acceleration of the geocentre by the Sun, m/s2; the Moon's 1 % is left out, for it enters divided by c^2."""
        away = self.sun_m - self.earth_m
        return np.asarray(away * (self.potential_m2_s2 / dot(away, away))[..., np.newaxis])

    def topocentric_rate(self, r_gcrs_m: FloatArray, v_gcrs_m_s: FloatArray) -> FloatArray:
        """Derivative of the topocentric terms, (A_E.r + v_E.v)/c^2, to 2e-15 on the ground."""
        return np.asarray((dot(self.acceleration_m_s2, r_gcrs_m) + dot(self.earth_v_m_s, v_gcrs_m_s)) / C_M_S**2)

    def moved(self, seconds: FloatArray) -> EarthAndSun:
        """Both bodies some microseconds later, in a straight line; potential and velocities stay."""
        step = np.asarray(seconds)[..., np.newaxis]
        earth_m, sun_m = self.earth_m + self.earth_v_m_s * step, self.sun_m + self.sun_v_m_s * step
        return self._replace(earth_m=earth_m, sun_m=sun_m)

    def terms(self, r_gcrs_m: FloatArray) -> TopocentricTerms:
        """Topocentric terms of TCB - TCG for a geocentric vector; see `topocentric_terms`."""
        first = dot(self.earth_v_m_s, r_gcrs_m) * (_TCG_METRE / C_M_S**2)
        return TopocentricTerms(first, first * (2.0 * self.potential_m2_s2 / C_M_S**2))


class Event(NamedTuple):
    """An event at an observer, dated in TDB, with all that its place is made of."""

    tt: Pair
    r_gcrs_m: FloatArray
    v_gcrs_m_s: FloatArray
    bodies: EarthAndSun

    def moved(self, seconds: FloatArray, *, of_bodies: bool = False) -> Event:
        """The event some microseconds later, in a straight line; with `of_bodies` only the bodies are moved."""
        bodies = self.bodies.moved(seconds)
        if of_bodies:
            return self._replace(bodies=bodies)
        step = np.asarray(seconds)
        tt, r = exact.add_seconds(self.tt, step), self.r_gcrs_m + self.v_gcrs_m_s * step[..., np.newaxis]
        return self._replace(tt=tt, r_gcrs_m=r, bodies=bodies)

    def offset(self) -> FloatArray:
        """Barycentric vector from the geocentre, m, TDB-compatible."""
        bodies = self.bodies
        return bcrs_offset(self.r_gcrs_m, bodies.earth_v_m_s, bodies.acceleration_m_s2, bodies.potential_m2_s2)

    def offset_rate(self, tt_rate: FloatArray) -> FloatArray:
        """Derivative of `offset` by TDB, m/s; `tt_rate` is dTT/dTDB at the geocentre."""
        bodies, r, v = self.bodies, self.r_gcrs_m, self.v_gcrs_m_s
        own_rate = tt_rate - bodies.topocentric_rate(r, v)
        return bcrs_offset_velocity(
            r, v, bodies.earth_v_m_s, bodies.acceleration_m_s2, bodies.potential_m2_s2, own_rate
        )

    def bcrs_position(self) -> FloatArray:
        """Barycentric position, m, TDB-compatible."""
        return self.bodies.earth_m + self.offset()

    def bcrs_state(self, tt_rate: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Barycentric position (m) and velocity (m/s) by TDB; `tt_rate` as for `offset_rate`."""
        return self.bcrs_position(), self.bodies.earth_v_m_s + self.offset_rate(tt_rate)


def topocentric_terms(ephemeris: Ephemeris, tdb: Pair, r_gcrs_m: FloatArray) -> TopocentricTerms:
    """Terms of IAU 2000 B1.5 that depend on the observer's place.

    Parameters
    ----------
    ephemeris : Ephemeris
        For the Earth's velocity and the Sun's potential.
    tdb : Pair
        TDB count of the event; an error of 1 ms changes the terms by 1e-15 s.
    r_gcrs_m : (..., 3) array
        Geocentric GCRS vector of the observer, m (TT-compatible, as IERS products are).

    Notes
    -----
    IAU 2000 B1.5 gives (1 + (3 w_ext + v_E^2/2)/c^2) v_E.r/c^2 of the barycentric r = x - x_E. By B1.3 (Soffel et al.
    2003, AJ 126, 2687, eq. 58) v_E.r is (1 - (w_ext + v_E^2/2)/c^2) v_E.X of the geocentric X, which leaves 2 w_ext.

    Of the external potential the Sun's alone is taken, and no vector potential; the Earth's acceleration in B1.3 is
    left out: together 6e-17 s on the ground, and below 4e-14 s at 1e9 m.
    """
    return EarthAndSun.at(ephemeris, tdb).terms(r_gcrs_m)


def topocentric_rate(ephemeris: Ephemeris, tdb: Pair, r_gcrs_m: FloatArray, v_gcrs_m_s: FloatArray) -> FloatArray:
    """Derivative of the topocentric terms by TDB for dr/dTT = `v_gcrs_m_s`, to 1e-17 as far as 1e9 m.

    Sun, Moon and planets pull on the Earth; the second term goes with the first, its factor changing slowly.
    """
    positions, velocities = ephemeris.states(PLANETARY_BODIES, tdb)
    here = PLANETARY_BODIES.index(399)
    acceleration = np.zeros_like(positions[here])
    potential = np.zeros(acceleration.shape[:-1])
    for number, position in zip(PLANETARY_BODIES, positions, strict=True):
        if number != 399:
            toward = position - positions[here]
            distance = np.sqrt(dot(toward, toward))
            pull = ephemeris.gm_m3_s2(number) / distance
            potential += pull
            acceleration += toward * (pull / distance**2)[..., np.newaxis]
    velocity = velocities[here]
    second = 2.0 * potential / _C2
    return np.asarray((dot(acceleration, r_gcrs_m) + dot(velocity, v_gcrs_m_s)) * ((1.0 + second) / _C2))


def tt_from_tdb_at_geocentre(tdb: Pair, reference: ReferenceData) -> Pair:
    """TT count at the geocentre of a TDB count."""
    return exact.add_seconds(tdb, reference.time_ephemeris.tt_minus_tdb_s(tdb))


def tdb_from_tt_at_geocentre(tt: Pair, reference: ReferenceData) -> Pair:
    """TDB count at the geocentre of a TT count: one Newton step from TDB = TT leaves 1e-21 s."""
    value, rate = reference.time_ephemeris.tt_minus_tdb_and_rate(tt)
    return exact.add_seconds(tt, -value / (1.0 + rate))


def observer_event(tdb: Pair, reference: ReferenceData, observer: Observer, *, loose: bool = False) -> Event:
    """Date an event at an observer in TT and find the observer's geocentric state, from its TDB.

    Parameters
    ----------
    tdb : Pair
        TDB count of the event, any shape.
    reference : ReferenceData
        Ephemeris, time ephemeris, and what the observer needs.
    observer : Observer
        A site or a trajectory.
    loose : bool
        Past the span of a trajectory go on in a straight line from its end, as an iteration on its way to a date
        inside may need. Without it the date must lie inside.

    Raises
    ------
    OutOfSpan
        Where the ephemeris or the observer does not reach.
    """
    geocentric = tt_from_tdb_at_geocentre(tdb, reference)
    bodies = EarthAndSun.at(reference.ephemeris, tdb)
    r_m, v_m_s = observer.gcrs(nearest_inside(observer, geocentric), reference)
    tt = exact.add_seconds(geocentric, -TT_PER_TCG * bodies.terms(r_m).total_s)
    asked = nearest_inside(observer, tt)
    if asked is tt:
        # On the ground the vector taken 2 us late is carried back in a straight line: 1 mm, 0.3 fs of the term.
        r_m = r_m - v_m_s * bodies.terms(r_m).total_s[..., np.newaxis]
        tt = exact.add_seconds(geocentric, -TT_PER_TCG * bodies.terms(r_m).total_s)
    else:
        # In orbit the vector is asked for again: after two rounds the terms move by less than 1e-18 s.
        for _ in range(2):
            r_m, v_m_s = observer.gcrs(asked, reference)
            r_m = r_m + v_m_s * exact.seconds(exact.subtract(tt, asked))[..., np.newaxis]
            tt = exact.add_seconds(geocentric, -TT_PER_TCG * bodies.terms(r_m).total_s)
            asked = nearest_inside(observer, tt)
        if not loose:
            require_inside(observer, tt, reference)
    return Event(tt, r_m, v_m_s, bodies)


def bcrs_state(observer: Observer, tdb: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray]:
    """Barycentric position (m) and velocity (m/s) of an observer at TDB counts, TDB-compatible.

    Parameters
    ----------
    observer : Observer
        A site or a trajectory near the Earth.
    tdb : Pair
        TDB count of the observer's event, any shape.
    reference : ReferenceData
        Ephemeris, time ephemeris, and what the observer needs.

    Returns
    -------
    x_m, v_m_s : float array, shape of `tdb` + (3,)

    Raises
    ------
    OutOfSpan
        Where the ephemeris or the observer does not reach.
    """
    event = observer_event(tdb, reference, observer)
    return event.bcrs_state(1.0 + reference.time_ephemeris.rate(tdb))


def gcrs_state(
    state: Callable[[Pair], tuple[FloatArray, FloatArray]], tt: Pair, reference: ReferenceData
) -> tuple[FloatArray, FloatArray]:
    """Geocentric state (m, m/s; GCRS, TT-compatible) at TT counts of something whose barycentric state is known.

    Parameters
    ----------
    state : callable
        Gives barycentric, TDB-compatible position and velocity at TDB counts.
    tt : Pair
        TT count of the event, any shape.
    reference : ReferenceData
        Ephemeris and time ephemeris.

    Notes
    -----
    The inverse of `bcrs_state`, from the barycentric offset from the geocentre at the event's own TDB.
    """
    near = tdb_from_tt_at_geocentre(tt, reference)
    x_m, _ = state(near)
    position, velocity = reference.ephemeris.state("earth", near)
    tdb = exact.add_seconds(near, dot(velocity, x_m - position) / _C2)
    bodies = EarthAndSun.at(reference.ephemeris, tdb)
    earth_v, acceleration = bodies.earth_v_m_s, bodies.acceleration_m_s2
    x_m, v_m_s = state(tdb)
    d, d_rate = x_m - bodies.earth_m, v_m_s - earth_v
    potential = bodies.potential_m2_s2
    r = gcrs_offset(d, earth_v, acceleration, potential)
    r_rate = gcrs_offset_velocity(d, d_rate, earth_v, acceleration, potential)
    rate = bodies.topocentric_rate(d, d_rate)
    tt_rate = 1.0 + reference.time_ephemeris.rate(tdb) - rate
    return np.asarray(r), np.asarray(r_rate / tt_rate[..., np.newaxis])
