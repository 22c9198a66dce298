"""TCG, TCB and TDB: the time ephemeris at the geocentre and the topocentric terms of an observer.

All by IAU 2000 Resolution B1.5 and IAU 2006 Resolution B3:

    TCB - TCG = D(TCB) + q,    q = v_E.r_E / c^2 + (3 w_ext + v_E^2/2) v_E.r_E / c^4

where D is the integral at the geocentre, kept by `TimeEphemeris` as TT - TDB (a quantity of
milliseconds, which float64 holds to 1e-19 s), and r_E the GCRS vector of the observer.
"""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np

from .. import exact
from ..constants import C_M_S, L_B, L_G, T0_COUNT, TDB0_S
from ..earth.frames import dot
from ..earth.observer import Observer
from ..ephemeris import Ephemeris
from ..exact import Factor, FloatArray, Pair
from ..instants import Instants
from ..tables.reference import ReferenceData
from .geocentric import tcg_from_tt, tt_from_tcg
from .terrestrial import require_scale

__all__ = [
    "EarthAndSun",
    "Event",
    "TopocentricTerms",
    "observer_event",
    "tcb_from_tdb",
    "tcb_to_tcg",
    "tcb_to_tdb",
    "tcg_to_tcb",
    "tdb_from_tcb",
    "tdb_from_tt",
    "tdb_to_tcb",
    "tdb_to_tt",
    "topocentric_rate",
    "topocentric_terms",
    "tt_from_tdb",
    "tt_to_tdb",
]

_LOSS: Final = Factor.of(-L_B)
_GAIN: Final = Factor.of(L_B / (1 - L_B))
_T0: Final[Pair] = exact.normalise(*T0_COUNT)
_TDB_AT_T0: Final[Pair] = exact.add(_T0, exact.from_seconds(TDB0_S))
_TT_PER_TCG: Final = float(1 - L_G)
_TCG_METRE: Final = float(1 / (1 - L_G))


class TopocentricTerms(NamedTuple):
    """TCB - TCG of an observer minus that of the geocentre, seconds."""

    first_s: FloatArray
    """v_E.r_E / c^2, up to 2.1e-6 s on the ground."""
    second_s: FloatArray
    """(3 w_ext + v_E^2/2) v_E.r_E / c^4, up to 7e-14 s on the ground."""

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

    def terms(self, r_gcrs_m: FloatArray) -> TopocentricTerms:
        """Topocentric terms of TCB - TCG for a geocentric vector; see `topocentric_terms`."""
        first = dot(self.earth_v_m_s, r_gcrs_m) * (_TCG_METRE / C_M_S**2)
        speed2 = dot(self.earth_v_m_s, self.earth_v_m_s)
        return TopocentricTerms(first, first * ((3.0 * self.potential_m2_s2 + 0.5 * speed2) / C_M_S**2))


class Event(NamedTuple):
    """An event at an observer, dated in TDB, with all that its place is made of."""

    tt: Pair
    r_gcrs_m: FloatArray
    v_gcrs_m_s: FloatArray
    bodies: EarthAndSun


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
    Of the external potential the Sun's alone is taken: the planets' would change the second term
    by 2e-17 s.
    """
    return EarthAndSun.at(ephemeris, tdb).terms(r_gcrs_m)


def observer_event(tdb: Pair, reference: ReferenceData, observer: Observer) -> Event:
    """Date an event at an observer in TT and find the observer's geocentric vector, from its TDB."""
    tt = exact.add_seconds(tdb, reference.time_ephemeris.tt_minus_tdb_s(tdb))
    r_m, v_m_s = observer.gcrs(tt, reference)
    bodies = EarthAndSun.at(reference.ephemeris, tdb)
    # The vector was taken at TT + q, later than the event by q = 2 us: 1 mm, 0.3 fs. It is carried back.
    r_m = r_m - v_m_s * bodies.terms(r_m).total_s[..., np.newaxis]
    return Event(exact.add_seconds(tt, -_TT_PER_TCG * bodies.terms(r_m).total_s), r_m, v_m_s, bodies)


def topocentric_rate(ephemeris: Ephemeris, tdb: Pair, r_gcrs_m: FloatArray, v_gcrs_m_s: FloatArray) -> FloatArray:
    """Derivative by TCB of the topocentric terms, (A_E.r + v_E.v)/c^2, for dr/dTT = `v_gcrs_m_s`.

    The Earth's acceleration A_E is the Sun's and the Moon's attraction; what is left out (planets, order
    c^-4) is below 1e-17.
    """
    position, velocity = ephemeris.state("earth", tdb)
    acceleration = np.zeros_like(position)
    for body in ("sun", "moon"):
        toward = ephemeris.position(body, tdb) - position
        distance = np.sqrt(dot(toward, toward))
        acceleration += toward * (ephemeris.gm_m3_s2(body) / distance**3)[..., np.newaxis]
    return np.asarray((dot(acceleration, r_gcrs_m) + dot(velocity, v_gcrs_m_s)) / C_M_S**2)


def tcb_from_tdb(tdb: Pair) -> Pair:
    """TCB count of a TDB count, inverse of `tdb_from_tcb`."""
    since = exact.subtract(tdb, _TDB_AT_T0)
    return exact.add(exact.add(_T0, since), exact.multiply(since, _GAIN))


def tdb_from_tcb(tcb: Pair) -> Pair:
    """TDB count of a TCB count: TDB = TCB - L_B (TCB - T0) + TDB0, IAU 2006 Resolution B3."""
    since = exact.subtract(tcb, _T0)
    return exact.add(exact.add(_TDB_AT_T0, since), exact.multiply(since, _LOSS))


def tdb_from_tt(tt: Pair, reference: ReferenceData, observer: Observer | None = None) -> Pair:
    """TDB count of an event dated in TT at the geocentre, or at an observer.

    TT is shifted by the observer's terms to the geocentric argument, then TDB + P(TDB) = TT is
    solved for TDB with P = TT - TDB of the time ephemeris; one Newton step from TDB = TT leaves
    P'' P^2 / 2 < 1e-21 s.
    """
    table = reference.time_ephemeris
    if observer is not None:
        r_m, _ = observer.gcrs(tt, reference)
        # v_E moves by 1e-5 m/s in the 2 ms between TT and TDB: 1e-15 s in the terms, so P comes first.
        near = exact.add_seconds(tt, -table.tt_minus_tdb_s(tt))
        terms = topocentric_terms(reference.ephemeris, near, r_m)
        tt = exact.add_seconds(tt, _TT_PER_TCG * terms.total_s)
    value, rate = table.tt_minus_tdb_and_rate(tt)
    return exact.add_seconds(tt, -value / (1.0 + rate))


def tt_from_tdb(tdb: Pair, reference: ReferenceData, observer: Observer | None = None) -> Pair:
    """TT count of an event dated in TDB at the geocentre, or at an observer."""
    if observer is None:
        return exact.add_seconds(tdb, reference.time_ephemeris.tt_minus_tdb_s(tdb))
    return observer_event(tdb, reference, observer).tt


def tcb_to_tdb(t: Instants) -> Instants:
    """TCB to TDB (IAU 2006 B3), anywhere; exact to 0.5 fs."""
    require_scale(t, "TCB")
    return Instants._of(tdb_from_tcb(t.pair), "TDB", t.place)


def tdb_to_tcb(t: Instants) -> Instants:
    """TDB to TCB (IAU 2006 B3), anywhere; exact to 0.5 fs."""
    require_scale(t, "TDB")
    return Instants._of(tcb_from_tdb(t.pair), "TCB", t.place)


def tt_to_tdb(t: Instants, reference: ReferenceData, observer: Observer | None = None) -> Instants:
    """TT to TDB of the same event, at the geocentre (`observer=None`) or at an observer."""
    require_scale(t, "TT")
    return Instants._of(tdb_from_tt(t.pair, reference, observer), "TDB", t.place)


def tdb_to_tt(t: Instants, reference: ReferenceData, observer: Observer | None = None) -> Instants:
    """TDB to TT of the same event; inverse of `tt_to_tdb` to 0.5 fs."""
    require_scale(t, "TDB")
    return Instants._of(tt_from_tdb(t.pair, reference, observer), "TT", t.place)


def tcg_to_tcb(t: Instants, reference: ReferenceData, observer: Observer | None = None) -> Instants:
    """TCG to TCB of the same event (IAU 2000 B1.5), at the geocentre or at an observer.

    Goes through TT and TDB, the pair whose difference is small; the linear relations between are
    exact, so nothing is lost.
    """
    require_scale(t, "TCG")
    return Instants._of(tcb_from_tdb(tdb_from_tt(tt_from_tcg(t.pair), reference, observer)), "TCB", t.place)


def tcb_to_tcg(t: Instants, reference: ReferenceData, observer: Observer | None = None) -> Instants:
    """TCB to TCG of the same event; inverse of `tcg_to_tcb` to 1 fs."""
    require_scale(t, "TCB")
    return Instants._of(tcg_from_tt(tt_from_tdb(tdb_from_tcb(t.pair), reference, observer)), "TCG", t.place)
