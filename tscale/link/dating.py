"""Dates of events at an end of a link: from any scale to TDB, and back."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Final

import numpy as np

from ..earth.frames import dot
from ..earth.moving import gcrs_state
from ..earth.observer import Observer
from ..errors import MissingPiece, ScaleMismatch
from ..exact import FloatArray, Pair
from ..instants import Instants
from ..scales import Scale
from ..transforms.barycentric import tcb_from_tdb, tdb_from_tcb, tdb_from_tt, tt_from_tdb
from ..transforms.geocentric import tcg_from_tt, tt_from_tcg
from ..transforms.terrestrial import (
    clock_to_reference,
    reference_to_clock,
    tai_to_tt_bipm,
    tai_to_ut1,
    to_fixed_scale,
    tt_bipm_to_tai,
    ut1_to_tai,
)
from .ends import BodyEnd, End, ObserverEnd, absolute

if TYPE_CHECKING:
    from ..tables.clock_log import ClockLog
    from ..tables.reference import ReferenceData

__all__ = ["GEOCENTRIC_REGION_M", "dates_on", "tdb_of"]

GEOCENTRIC_REGION_M: Final = 5e8
"""Farthest distance from the geocentre at which an event is dated on TT and the scales that hang on it: the Moon is
within it. What the relation leaves out (terms of IAU 2000 B1.3 of second order in distance) is 0.01 ps there."""

_EARTH: Final = 399


@dataclass(frozen=True)
class _Seen:
    """An end as an observer: its geocentric vector from its barycentric state, within the geocentric region."""

    end: End

    @property
    def name(self) -> str:
        return self.end.name

    def gcrs(self, tt: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray]:
        def state(tdb: Pair) -> tuple[FloatArray, FloatArray]:
            place, speed, offset, rate = absolute(self.end, tdb, reference)
            return place + offset, speed + rate

        r, v = gcrs_state(state, tt, reference)
        far = dot(r, r) > GEOCENTRIC_REGION_M**2
        if np.any(far):
            raise ScaleMismatch(
                f"events at {self.end.name} are up to {np.sqrt(np.max(dot(r, r))):.3g} m from the geocentre; UTC, TT "
                f"and their kin date events within {GEOCENTRIC_REGION_M:g} m of it: use TDB or TCB there",
                mask=np.asarray(far),
            )
        return r, v


def _observer(end: End) -> Observer | None:
    if isinstance(end, ObserverEnd):
        return end.observer
    if isinstance(end, BodyEnd) and end.anchor == _EARTH:
        return None
    return _Seen(end)


def tdb_of(t: Instants, end: End, reference: ReferenceData, clocks: Sequence[ClockLog]) -> Pair:
    """TDB count of events at an end, dated on TDB, TCB, or (near the Earth) a terrestrial scale or a clock."""
    if t.place is not None and t.place != end.place:
        raise ScaleMismatch(
            f"instants at {t.place} do not date events at {end.name} ({end.place or 'no place name'}): leave the place "
            "unstated with .at(None) if they do"
        )
    if t.scale == "TDB":
        return t.pair
    if t.scale == "TCB":
        return tdb_from_tcb(t.pair)
    seen: set[str] = set()
    while (log := _log_of(t.scale, clocks)) is not None and t.scale not in seen:
        seen.add(t.scale)
        t = clock_to_reference(t, log)
    if t.scale == "TCG":
        tt = tt_from_tcg(t.pair)
    else:
        table = next((table for table in reference.tt_bipm if table.scale == t.scale), None)
        if table is not None:
            t = tt_bipm_to_tai(t, table)
        elif t.scale == "UT1":
            t = ut1_to_tai(t, reference.earth_orientation)
        _require_fixed(t.scale)
        tt = to_fixed_scale(t, "TT").pair
    return tdb_from_tt(tt, reference, _observer(end))


def dates_on(tdb: Pair, scale: str, end: End, reference: ReferenceData, clocks: Sequence[ClockLog]) -> Instants:
    """Date events at an end, known by their TDB counts, on another scale; inverse of `tdb_of`."""
    if scale == "TDB":
        return Instants._of(tdb, "TDB", end.place)
    if scale == "TCB":
        return Instants._of(tcb_from_tdb(tdb), "TCB", end.place)
    # From the scale asked for back to one that hangs on TAI, by the logs; they are walked in reverse below.
    path: list[ClockLog] = []
    base = scale
    while (log := _log_of(base, clocks)) is not None and log not in path:
        path.append(log)
        base = log.reference
    tables = {table.scale: table for table in reference.tt_bipm}
    if base not in ("TCG", "UT1") and base not in tables:
        _require_fixed(base)
    tt = Instants._of(tt_from_tdb(tdb, reference, _observer(end)), "TT", end.place)
    if base == "TCG":
        t = Instants._of(tcg_from_tt(tt.pair), "TCG", end.place)
    elif base == "UT1":
        t = tai_to_ut1(to_fixed_scale(tt, "TAI"), reference.earth_orientation)
    elif base in tables:
        t = tai_to_tt_bipm(to_fixed_scale(tt, "TAI"), tables[base])
    else:
        t = to_fixed_scale(tt, base)
    for log in reversed(path):
        t = reference_to_clock(t, log)
    return t


def _log_of(scale: str, clocks: Sequence[ClockLog]) -> ClockLog | None:
    return next((log for log in clocks if log.scale == scale), None)


def _require_fixed(scale: str) -> None:
    kind = Scale.parse(scale)
    if kind.count_minus_tai is not None:
        return
    if kind.family == "TT":
        raise MissingPiece(f"no table for {scale}: give it with ReferenceData.load(tt_bipm=path)")
    if kind.family in ("UTC", "CLOCK"):
        raise MissingPiece(f"no comparison log for {scale}: give one with clocks=[ClockLog.load(path)]")
    raise ScaleMismatch(
        f"the events of a link are not dated on {scale}; UTC, TAI, TT, GPS, GST, BDT, GLONASS, UT1, TCG, TCB, TDB and, "
        "with their tables or logs, TT(...), UTC(...) and CLOCK(...) are understood"
    )
