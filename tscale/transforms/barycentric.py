"""TCG, TCB and TDB: the time ephemeris at the geocentre and the topocentric terms of an observer.

All by IAU 2000 Resolution B1.5 and IAU 2006 Resolution B3:

    TCB - TCG = D(TCB) + q,    q = v_E.X / c^2 + 2 w_ext v_E.X / c^4

where D is the integral at the geocentre, kept by `TimeEphemeris` as TT - TDB (a quantity of
milliseconds, which float64 holds to 1e-19 s), and X the GCRS vector of the observer (see `topocentric_terms`).
"""

from __future__ import annotations

from typing import Final

import numpy as np

from .. import exact
from ..counts import tcb_from_tdb, tcg_from_tt, tdb_from_tcb, tt_from_tcg
from ..earth.frames import dot
from ..earth.moving import (
    TT_PER_TCG,
    EarthAndSun,
    Event,
    TopocentricTerms,
    observer_event,
    tdb_from_tt_at_geocentre,
    topocentric_rate,
    topocentric_terms,
)
from ..earth.observer import Observer
from ..errors import ScaleMismatch
from ..exact import FloatArray, Pair
from ..instants import Instants
from ..tables.reference import ReferenceData
from .terrestrial import require_scale

__all__ = [
    "GEOCENTRIC_LIMIT_M",
    "TopocentricTerms",
    "event_from_tt",
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

GEOCENTRIC_LIMIT_M: Final = 1e10
"""Distance from the Earth up to which events are dated in TT and TCG, m: what the terms of order c^-4 leave out
grows as its square and reaches 2e-12 s there."""


def tdb_from_tt(tt: Pair, reference: ReferenceData, observer: Observer | None = None) -> Pair:
    """TDB count of an event dated in TT at the geocentre, or at an observer.

    TT is shifted by the observer's terms to the geocentric argument, then TDB + P(TDB) = TT is
    solved for TDB with P = TT - TDB of the time ephemeris; one Newton step from TDB = TT leaves
    P'' P^2 / 2 < 1e-21 s.

    Parameters
    ----------
    tt : Pair
        TT count of the event, any shape.
    reference : ReferenceData
        Ephemeris, time ephemeris, and what the observer needs (Earth orientation for a site).
    observer : Observer or None
        Site or trajectory; None is the geocentre.

    Raises
    ------
    OutOfSpan
        Where the ephemeris, the Earth orientation or the trajectory does not reach, with the mask.
    ScaleMismatch
        For an observer more than `GEOCENTRIC_LIMIT_M` from the Earth.
    """
    if observer is None:
        return tdb_from_tt_at_geocentre(tt, reference)
    return event_from_tt(tt, reference, observer)[0]


def event_from_tt(tt: Pair, reference: ReferenceData, observer: Observer) -> tuple[Pair, Event]:
    """TDB count of an event dated in TT at an observer, as `tdb_from_tt`, and the event: its place and bodies."""
    r_m, v_m_s = observer.gcrs(tt, reference)
    _require_near_earth(r_m, observer)
    # v_E moves by 1e-5 m/s in the 2 ms between TT and TDB: 1e-15 s in the terms, so P comes first.
    near = exact.add_seconds(tt, -reference.time_ephemeris.tt_minus_tdb_s(tt))
    bodies = EarthAndSun.at(reference.ephemeris, near)
    terms = bodies.terms(r_m)
    if np.any(np.abs(terms.total_s) > 1e-5):  # far from the ground the terms themselves move the date they are for
        near = exact.add_seconds(near, terms.total_s)
        bodies = EarthAndSun.at(reference.ephemeris, near)
        terms = bodies.terms(r_m)
    tdb = tdb_from_tt_at_geocentre(exact.add_seconds(tt, TT_PER_TCG * terms.total_s), reference)
    return tdb, Event(tt, r_m, v_m_s, bodies).moved(exact.seconds(exact.subtract(tdb, near)), of_bodies=True)


def tt_from_tdb(tdb: Pair, reference: ReferenceData, observer: Observer | None = None) -> Pair:
    """TT count of an event dated in TDB at the geocentre, or at an observer; inverse of `tdb_from_tt` to 0.2 fs.

    Parameters
    ----------
    tdb : Pair
        TDB count of the event, any shape.
    reference : ReferenceData
        Ephemeris, time ephemeris, and what the observer needs (Earth orientation for a site).
    observer : Observer or None
        Site or trajectory; None is the geocentre.

    Raises
    ------
    OutOfSpan
        Where the ephemeris, the Earth orientation or the trajectory does not reach, with the mask.
    ScaleMismatch
        For an observer more than `GEOCENTRIC_LIMIT_M` from the Earth.
    """
    if observer is None:
        return exact.add_seconds(tdb, reference.time_ephemeris.tt_minus_tdb_s(tdb))
    event = observer_event(tdb, reference, observer)
    _require_near_earth(event.r_gcrs_m, observer)
    return event.tt


def _require_near_earth(r_gcrs_m: FloatArray, observer: Observer) -> None:
    """Refuse TT and TCG of events so far from the Earth that the geocentric frame no longer gives them."""
    far = dot(r_gcrs_m, r_gcrs_m) > GEOCENTRIC_LIMIT_M**2
    if np.any(far):
        raise ScaleMismatch(
            f"{int(np.count_nonzero(far))} of {far.size} events at {observer.name} are over {GEOCENTRIC_LIMIT_M:.0e} m "
            "from the Earth, where TT, TCG and the scales tied to them do not reach: date them in TDB or TCB",
            mask=np.asarray(far),
        )


def tcb_to_tdb(t: Instants) -> Instants:
    """TCB to TDB (IAU 2006 B3), anywhere; exact to 0.5 fs."""
    require_scale(t, "TCB")
    return Instants._of(tdb_from_tcb(t.pair), "TDB", t.place)


def tdb_to_tcb(t: Instants) -> Instants:
    """TDB to TCB (IAU 2006 B3), anywhere; exact to 0.5 fs."""
    require_scale(t, "TDB")
    return Instants._of(tcb_from_tdb(t.pair), "TCB", t.place)


def tt_to_tdb(t: Instants, reference: ReferenceData, observer: Observer | None = None) -> Instants:
    """TT to TDB of the same event, at the geocentre (`observer=None`) or at an observer.

    Parameters
    ----------
    t : Instants
        TT, any shape.
    reference : ReferenceData
        Ephemeris, time ephemeris, and what the observer needs (Earth orientation for a site).
    observer : Observer or None
        Site or trajectory; None is the geocentre.

    Raises
    ------
    OutOfSpan
        Where the ephemeris, the Earth orientation or the trajectory does not reach, with the mask.
    ScaleMismatch
        For another scale than TT, and for an observer more than `GEOCENTRIC_LIMIT_M` from the Earth.
    """
    require_scale(t, "TT")
    return Instants._of(tdb_from_tt(t.pair, reference, observer), "TDB", t.place)


def tdb_to_tt(t: Instants, reference: ReferenceData, observer: Observer | None = None) -> Instants:
    """TDB to TT of the same event; inverse of `tt_to_tdb` to 0.2 fs.

    Parameters
    ----------
    t : Instants
        TDB, any shape.
    reference : ReferenceData
        Ephemeris, time ephemeris, and what the observer needs (Earth orientation for a site).
    observer : Observer or None
        Site or trajectory; None is the geocentre.

    Raises
    ------
    OutOfSpan
        Where the ephemeris, the Earth orientation or the trajectory does not reach, with the mask.
    ScaleMismatch
        For another scale than TDB, and for an observer more than `GEOCENTRIC_LIMIT_M` from the Earth.
    """
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
