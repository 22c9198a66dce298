"""Edges between scales kept on Earth and by clocks: constant offsets, rates and tables."""

from __future__ import annotations

from typing import Final

import numpy as np

from .. import exact
from ..budget.assumptions import Assumptions
from ..budget.comparisons import clock_contributions, clock_omissions
from ..budget.contribution import Contribution, Omission
from ..budget.places import left_out
from ..budget.rows import orientation_rows, tt_bipm_contributions, tt_bipm_omissions
from ..constants import L_G
from ..exact import FloatArray, Pair
from ..instants import Instants
from ..scales import Node, Scale
from ..step import Step, Terms
from ..tables.clock_log import ClockLog
from ..tables.clock_nominal import label_difference
from ..tables.notes import leap_second_notes, orientation_notes
from ..tables.reference import ReferenceData
from ..tables.tt_bipm import TTBIPM
from ..transforms import geocentric, terrestrial
from .common import count_difference

__all__ = ["clock_step", "fixed_step", "tt_bipm_step", "tt_tcg_step", "ut1_step"]


def _zero_rate(before: Instants, after: Instants) -> FloatArray:
    return np.zeros(before.shape)


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


_DEFINED: Final = {
    "TT": Omission(
        "TT as TAI realises it",
        "TAI + 32.184 s by definition; TT(BIPM), which is nearer to TT, differs from that by 27.7 us: go to TT(BIPMyy) "
        "where that counts",
    )
} | {
    name: Omission(
        f"{name} as its system keeps it",
        f"only the defined offset is applied; the time broadcast differs from it by some ns to {most} (BIPM Circular "
        "T, section on GNSS times): give a log of comparisons where that counts",
    )
    for name, most in (("GPS", "tens of ns"), ("GST", "tens of ns"), ("BDT", "tens of ns"), ("GLONASS", "some 100 ns"))
}
"""What steps by definition leave out."""


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
        return leap_second_notes(terrestrial.to_fixed_scale(before, "UTC").pair, reference)

    return Step(
        start=Node(a, place),
        end=Node(b, place),
        title="leap seconds" if "UTC" in (start, end) else "fixed offset",
        source=_FIXED_SOURCES[named],
        forward=lambda t: terrestrial.to_fixed_scale(t, end),
        backward=lambda t: terrestrial.to_fixed_scale(t, start),
        terms=terms,
        rate=_zero_rate,
        omissions=lambda assumptions: [_DEFINED[name] for name in (start, end) if name in _DEFINED],
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
        terms=lambda before, after: {"TCG - TT": count_difference(before, after)},
        rate=lambda before, after: np.full(before.shape, rate),
    )


_UT1_TIDES_S: Final = 9e-5
"""Largest variation of UT1 within a day by tides, s (IERS Conventions 2010, section 8.2)."""


def ut1_step(place: str | None, reference: ReferenceData) -> Step:
    """TAI to UT1."""
    table = reference.earth_orientation

    def contributions(before: Instants, assumptions: Assumptions) -> list[Contribution]:
        rows, one = orientation_rows(table, before.pair, assumptions), np.ones(before.shape)
        found = rows.contributions(0, "Earth orientation, UT1", "s", one)
        if assumptions.truncation and not table.sub_daily:
            name = "tides in UT1 within a day, left out"
            found.append(left_out(name, name, "s", one, _UT1_TIDES_S))
        return found

    def rate(before: Instants, after: Instants) -> FloatArray:
        return reference.earth_orientation.ut1_rate(before.pair)

    return Step(
        start=Node(Scale.parse("TAI"), place),
        end=Node(Scale.parse("UT1"), place),
        title="Earth rotation",
        source="IERS Conventions (2010) chapter 5",
        forward=lambda t: terrestrial.tai_to_ut1(t, reference.earth_orientation),
        backward=lambda t: terrestrial.ut1_to_tai(t, reference.earth_orientation),
        terms=lambda before, after: {"UT1 - TAI": count_difference(before, after)},
        rate=rate,
        contributions=contributions,
        notes=lambda before: orientation_notes(before.pair, reference),
    )


def tt_bipm_step(place: str | None, table: TTBIPM) -> Step:
    """TAI to a realisation TT(BIPMxx)."""

    def terms(before: Instants, after: Instants) -> Terms:
        return {f"{table.scale} - TAI": count_difference(before, after)}

    return Step(
        start=Node(Scale.parse("TAI"), place),
        end=Node(Scale.parse(table.scale), place),
        title="realisation of TT",
        source=f"BIPM, {table.name}",
        forward=lambda t: terrestrial.tai_to_tt_bipm(t, table),
        backward=lambda t: terrestrial.tt_bipm_to_tai(t, table),
        terms=terms,
        rate=lambda before, after: table.rate(before.pair),
        contributions=lambda before, assumptions: tt_bipm_contributions(table, before.pair),
        omissions=lambda assumptions: tt_bipm_omissions(table),
    )


def clock_step(place: str | None, log: ClockLog, reference: ReferenceData) -> Step:
    """A clock's reading to the scale it was compared with."""

    def terms(before: Instants, after: Instants) -> Terms:
        shift = label_difference(before, after, reference.leap_seconds)
        return {f"{log.reference} - {log.scale}": shift}

    return Step(
        start=Node(Scale.parse(log.scale), place),
        end=Node(Scale.parse(log.reference), place),
        title="clock comparisons",
        source=f"log {log.name}",
        forward=lambda t: terrestrial.clock_to_reference(t, log),
        backward=lambda t: terrestrial.reference_to_clock(t, log),
        terms=terms,
        rate=lambda before, after: log.rate(after.pair),
        contributions=lambda before, assumptions: clock_contributions(log, log.to_reference(before.pair), assumptions),
        omissions=lambda assumptions: clock_omissions(log),
        notes=lambda before: log.notes(log.to_reference(before.pair)),
    )
