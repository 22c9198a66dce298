"""The edges that a chain may be made of: one function per kind of step.

Each returns a `Step` bound to its places, tables and observer; none does any work yet.
"""

from __future__ import annotations

from typing import Final

import numpy as np

from . import exact
from .constants import C_M_S, L_B, L_G, TT_MINUS_TAI
from .earth.moving import observer_event
from .earth.observer import Observer
from .exact import FloatArray, Pair
from .instants import Instants
from .scales import Node, Scale
from .source import Source
from .step import Step, Terms
from .tables.clock_log import ClockLog
from .tables.reference import ReferenceData
from .tables.tt_bipm import TTBIPM
from .transforms import barycentric, geocentric, terrestrial, wavefront

__all__ = [
    "clock_step",
    "fixed_step",
    "tcb_tdb_step",
    "tcg_tcb_step",
    "tt_bipm_step",
    "tt_tcg_step",
    "tt_tdb_step",
    "ut1_step",
    "wavefront_step",
]

_TT_MINUS_TAI: Final = exact.normalise(*TT_MINUS_TAI)

TIME_EPHEMERIS_SIGMA_S: Final = 2e-10
"""Standard uncertainty of TT - TDB at the geocentre, s: rms difference from an independently integrated
planetary ephemeris (type B)."""


def _zero_rate(before: Instants, after: Instants) -> FloatArray:
    return np.zeros(before.shape)


def _count_difference(before: Instants, after: Instants) -> Pair:
    return exact.subtract(after.pair, before.pair)


def _label_minus_tai(scale: Scale, count: Pair, reference: ReferenceData) -> Pair:
    """Label of a fixed-distance scale minus the TAI label, in seconds."""
    if not scale.utc_labels:
        offset = scale.count_minus_tai
        assert offset is not None
        return exact.normalise(*offset)
    utc = exact.add(count, exact.normalise(-scale.label_offset_s, 0.0))
    tai_minus_utc = exact.from_seconds(reference.leap_seconds.tai_minus_utc(utc))
    return exact.subtract(exact.normalise(scale.label_offset_s, 0.0), tai_minus_utc)


_FIXED_SOURCES: Final = {
    "UTC": "ITU-R TF.460-6; IERS leap-second table",
    "TT": "IAU 1991 Resolution A4",
    "GPS": "IS-GPS-200",
    "GST": "Galileo OS-SIS-ICD",
    "BDT": "BDS-SIS-ICD",
    "GLONASS": "GLONASS ICD",
}


def fixed_step(start: str, end: str, place: str | None, reference: ReferenceData) -> Step:
    """Between TAI and UTC, TT or a satellite-navigation time: constant in counts, a table in labels."""
    a, b = Scale.parse(start), Scale.parse(end)
    named = end if start == "TAI" else start

    def terms(before: Instants, after: Instants) -> Terms:
        shift = exact.subtract(_label_minus_tai(b, after.pair, reference), _label_minus_tai(a, before.pair, reference))
        return {f"{end} - {start}": shift}

    def notes(before: Instants) -> tuple[str, ...]:
        if not (a.utc_labels or b.utc_labels):
            return ()
        table = reference.leap_seconds
        utc = terrestrial.to_fixed_scale(before, "UTC")
        expired = int(np.count_nonzero(table.is_expired(utc.pair)))
        if not expired:
            return ()
        return (f"{expired} of {before.size} instants are past the expiry of the leap-second table {table.name}",)

    return Step(
        start=Node(a, place),
        end=Node(b, place),
        title="leap seconds" if "UTC" in (start, end) else "fixed offset",
        source=_FIXED_SOURCES[named],
        forward=lambda t: terrestrial.to_fixed_scale(t, end),
        backward=lambda t: terrestrial.to_fixed_scale(t, start),
        terms=terms,
        rate=_zero_rate,
        notes=notes,
    )


def tt_tcg_step(place: str | None) -> Step:
    """TT to TCG."""
    rate = float(L_G / (1 - L_G))
    return Step(
        start=Node(Scale.parse("TT"), place),
        end=Node(Scale.parse("TCG"), place),
        title="rate L_G",
        source="IAU 2000 Resolution B1.9",
        forward=geocentric.tt_to_tcg,
        backward=geocentric.tcg_to_tt,
        terms=lambda before, after: {"TCG - TT": _count_difference(before, after)},
        rate=lambda before, after: np.full(before.shape, rate),
    )


def tcb_tdb_step(place: str | None) -> Step:
    """TCB to TDB."""
    return Step(
        start=Node(Scale.parse("TCB"), place),
        end=Node(Scale.parse("TDB"), place),
        title="rate L_B and TDB0",
        source="IAU 2006 Resolution B3",
        forward=barycentric.tcb_to_tdb,
        backward=barycentric.tdb_to_tcb,
        terms=lambda before, after: {"TDB - TCB": _count_difference(before, after)},
        rate=lambda before, after: np.full(before.shape, -float(L_B)),
    )


def tcg_tcb_step(place: str, observer: Observer | None, reference: ReferenceData) -> Step:
    """TCG to TCB of one event: the integral at the geocentre, and at an observer the topocentric terms."""

    def terms(before: Instants, after: Instants) -> Terms:
        total = _count_difference(before, after)
        if observer is None:
            return {"Einstein integral at the geocentre": total}
        tdb = barycentric.tdb_from_tcb(after.pair)
        r_m, _ = observer.gcrs(geocentric.tt_from_tcg(before.pair), reference)
        parts = barycentric.topocentric_terms(reference.ephemeris, tdb, r_m)
        return {
            "Einstein integral at the geocentre": exact.add_seconds(total, -parts.total_s),
            "topocentric v.r/c^2": exact.from_seconds(parts.first_s),
            "topocentric, order c^-4": exact.from_seconds(parts.second_s),
        }

    def rate(before: Instants, after: Instants) -> FloatArray:
        tdb = barycentric.tdb_from_tcb(after.pair)
        # TCG - TCB at the geocentre from TT - TDB: (1 - L_G)(1 - f) = (1 - L_B)(1 + P').
        gain = reference.time_ephemeris.rate(tdb)
        tcg_per_tcb = (gain * float(1 - L_B) - float(L_B - L_G)) / float(1 - L_G)
        if observer is not None:
            tcg_per_tcb = tcg_per_tcb - barycentric.topocentric_rate(
                reference.ephemeris, tdb, *observer.gcrs(geocentric.tt_from_tcg(before.pair), reference)
            )
        return np.asarray(-tcg_per_tcb / (1.0 + tcg_per_tcb))

    def uncertainty_s(before: Instants) -> dict[str, FloatArray]:
        return {"time ephemeris": np.full(before.shape, TIME_EPHEMERIS_SIGMA_S)}

    def notes(before: Instants) -> tuple[str, ...]:
        if observer is None:
            return ()
        return orientation_notes(geocentric.tt_from_tcg(before.pair), reference)

    return Step(
        start=Node(Scale.parse("TCG"), place),
        end=Node(Scale.parse("TCB"), place),
        title="time ephemeris" if observer is None else f"time ephemeris and place of {observer.name}",
        source="IAU 2000 Resolution B1.5",
        forward=lambda t: barycentric.tcg_to_tcb(t, reference, observer),
        backward=lambda t: barycentric.tcb_to_tcg(t, reference, observer),
        terms=terms,
        rate=rate,
        uncertainty_s=uncertainty_s,
        notes=notes,
    )


def tt_tdb_step(place: str, observer: Observer | None, reference: ReferenceData) -> Step:
    """TT to TDB of one event in one go, for speed and two roundings less than through TCG and TCB."""

    def rate(before: Instants, after: Instants) -> FloatArray:
        gain = reference.time_ephemeris.rate(after.pair)
        if observer is not None:
            terms = barycentric.topocentric_rate(
                reference.ephemeris, after.pair, *observer.gcrs(before.pair, reference)
            )
            gain = gain - terms
        return np.asarray(-gain / (1.0 + gain))

    return Step(
        start=Node(Scale.parse("TT"), place),
        end=Node(Scale.parse("TDB"), place),
        title="time ephemeris",
        source="IAU 2000 Resolution B1.5, IAU 2006 Resolution B3",
        forward=lambda t: barycentric.tt_to_tdb(t, reference, observer),
        backward=lambda t: barycentric.tdb_to_tt(t, reference, observer),
        terms=lambda before, after: {"TDB - TT": _count_difference(before, after)},
        rate=rate,
    )


def orientation_notes(tt: Pair, reference: ReferenceData) -> tuple[str, ...]:
    """What a reader should know of the Earth orientation used: how much is predicted or held."""
    tai = exact.subtract(tt, _TT_MINUS_TAI)
    status = reference.earth_orientation.status(tai)
    names = {1: "use predicted Earth orientation", 2: "are past the end of the Earth orientation, which is held"}
    counts = {code: int(np.count_nonzero(status == code)) for code in names}
    return tuple(f"{n} of {status.size} instants {names[code]}" for code, n in counts.items() if n)


def ut1_step(place: str | None, reference: ReferenceData) -> Step:
    """TAI to UT1."""

    def rate(before: Instants, after: Instants) -> FloatArray:
        return reference.earth_orientation.ut1_rate(before.pair)

    return Step(
        start=Node(Scale.parse("TAI"), place),
        end=Node(Scale.parse("UT1"), place),
        title="Earth rotation",
        source="IERS Conventions (2010) chapter 5",
        forward=lambda t: terrestrial.tai_to_ut1(t, reference.earth_orientation),
        backward=lambda t: terrestrial.ut1_to_tai(t, reference.earth_orientation),
        terms=lambda before, after: {"UT1 - TAI": _count_difference(before, after)},
        rate=rate,
        uncertainty_s=lambda before: {"UT1": reference.earth_orientation.at(before.pair).ut1_sigma_s},
    )


def tt_bipm_step(place: str | None, table: TTBIPM) -> Step:
    """TAI to a realisation TT(BIPMxx)."""

    def terms(before: Instants, after: Instants) -> Terms:
        return {f"{table.scale} - TAI": _count_difference(before, after)}

    return Step(
        start=Node(Scale.parse("TAI"), place),
        end=Node(Scale.parse(table.scale), place),
        title="realisation of TT",
        source=f"BIPM, {table.name}",
        forward=lambda t: terrestrial.tai_to_tt_bipm(t, table),
        backward=lambda t: terrestrial.tt_bipm_to_tai(t, table),
        terms=terms,
        rate=lambda before, after: table.rate(before.pair),
        uncertainty_s=lambda before: {table.scale: np.broadcast_to(table.uncertainty_s(before.pair), before.shape)},
    )


def clock_step(place: str | None, log: ClockLog) -> Step:
    """A clock's reading to the scale it was compared with."""

    def terms(before: Instants, after: Instants) -> Terms:
        return {f"{log.reference} - {log.scale}": _count_difference(before, after)}

    return Step(
        start=Node(Scale.parse(log.scale), place),
        end=Node(Scale.parse(log.reference), place),
        title="clock comparisons",
        source=f"log {log.name}",
        forward=lambda t: terrestrial.clock_to_reference(t, log),
        backward=lambda t: terrestrial.reference_to_clock(t, log),
        terms=terms,
        rate=lambda before, after: log.rate(after.pair),
        uncertainty_s=lambda before: {log.scale: log.uncertainty_s(log.to_reference(before.pair))},
    )


def wavefront_step(
    place: str, observer: Observer | None, source: Source, reference: ReferenceData, second_order: bool
) -> Step:
    """TDB where a wavefront meets the observer (or the geocentre) to TDB at the barycentre."""

    def parts(before: Instants) -> wavefront.WavefrontTerms:
        return wavefront.wavefront_terms(before.pair, reference, source, observer, second_order=second_order)

    def uncertainty_s(before: Instants) -> dict[str, FloatArray]:
        if observer is None:
            return {}
        event = observer_event(before.pair, reference, observer)
        values = reference.earth_orientation.at(exact.subtract(event.tt, _TT_MINUS_TAI))
        speed, radius = np.linalg.norm(event.v_gcrs_m_s, axis=-1), np.linalg.norm(event.r_gcrs_m, axis=-1)
        pole = np.hypot(values.x_sigma_rad, values.y_sigma_rad)
        return {
            "Earth orientation, UT1": np.asarray(values.ut1_sigma_s * speed / C_M_S),
            "Earth orientation, pole": np.asarray(pole * radius / C_M_S),
        }

    def notes(before: Instants) -> tuple[str, ...]:
        found: tuple[str, ...] = ()
        if observer is not None:
            found = orientation_notes(barycentric.tt_from_tdb(before.pair, reference, observer), reference)
        hidden = int(np.count_nonzero(wavefront.behind_the_sun(before.pair, reference, source, observer)))
        if hidden:
            found += (f"{hidden} of {before.size} lines of sight pass through the Sun",)
        return found

    tdb = Scale.parse("TDB")
    return Step(
        start=Node(tdb, place),
        end=Node(tdb, "BARYCENTER"),
        title=f"wavefront from {source.name or 'the source'}",
        source="Roemer, curvature; IERS Conventions (2010) eq. 11.17, 11.19",
        forward=lambda t: wavefront.observer_to_barycenter(t, reference, source, observer, second_order=second_order),
        backward=lambda t: wavefront.barycenter_to_observer(t, reference, source, observer, second_order=second_order),
        terms=lambda before, after: {k: exact.from_seconds(v) for k, v in parts(before).terms_s.items()},
        rate=lambda before, after: parts(before).rate,
        uncertainty_s=uncertainty_s,
        notes=notes,
    )
