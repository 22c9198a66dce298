"""Two clocks compared: by how much one gains on the other between two dates, term by term."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, field
from typing import Final, Literal, TypeAlias

import numpy as np

from .. import exact
from ..counts import tcb_from_tdb, tcg_from_tt
from ..earth.gravity.field import GravityField
from ..earth.observer import Observer
from ..ephemeris.body_time import BodyTimeEphemeris
from ..errors import InvalidInput, ScaleMismatch
from ..exact import FloatArray, Pair
from ..instants import Instants
from ..surface import SurfaceSite
from ..tables.reference import ReferenceData
from ..transforms.barycentric import tdb_from_tt, tt_from_tdb
from ..transforms.body_events import body_time_from_tdb, tdb_from_body_time
from ..transforms.proper_integral import SET_RATE, ProperIntegral
from ..transforms.proper_scales import checked_against
from ..transforms.proper_tides import Tides
from .arguments import Ticking, as_ticking, checked_dates, checked_tables
from .dates import tt_at
from .proper_clock import ProperClock

__all__ = ["ClockComparison", "compare_clocks"]

_DAY_S: Final = 86400.0
DATES: Final = "difference of dates"
"""Name of the term of two clocks whose dates are alike on another time than TT, and therefore not on TT."""

_MOON: Final = 301
_Alike: TypeAlias = Literal["TT", "TDB", "TT of the geocentre"] | int
"""On what the dates of two clocks are alike: TT (TCG ...) of their own events or, of both, of the geocentre at the same
TDB; TDB (TCB); TDB, counted as TT of the geocentre, where TT reaches one of the two alone; the time of a body."""


@dataclass(frozen=True, eq=False)
class ClockComparison:
    """Clock a minus clock b between two dates.

    Attributes
    ----------
    a, b : str
        Names of the clocks.
    against : str
        The coordinate time by which the dates of the two are alike, and by which rates are counted.
    duration_s : float
        Seconds of it from start to stop.
    accumulated_s : float
        Proper time elapsed at a less that at b, s.
    rate : float
        accumulated_s / duration_s: the mean fractional frequency of a less that of b, each against the coordinate time.
    ledger : mapping of str to float
        accumulated_s by terms, s: kinematic, gravitational, tidal, second order, and those of clocks elsewhere; set
        rate offset; difference of dates.
    """

    a: str
    b: str
    against: str
    duration_s: float
    accumulated_s: float
    ledger: Mapping[str, float]
    _pair: _Pair = field(repr=False)

    @property
    def rate(self) -> float:
        """Mean fractional frequency of a less that of b."""
        return self.accumulated_s / self.duration_s

    @property
    def rates(self) -> dict[str, float]:
        """`rate` by terms."""
        return {name: value / self.duration_s for name, value in self.ledger.items()}

    def series_s(self, t: Instants) -> FloatArray:
        """What a has gained on b from the start to dates on any coordinate time, s, in their shape.

        They may lie before start and after stop.
        """
        return self._pair.gained_s(checked_dates(t, "t"))

    def table(self) -> str:
        """A readable table: each term as time accumulated and as fractional frequency."""
        rows = [*self.ledger.items(), (f"{self.a} - {self.b}", self.accumulated_s)]
        width = max(len(name) for name, _ in rows)
        lines = [
            f"{self.duration_s / _DAY_S:.6f} days of {self.against}",
            f"{'term':<{width}}  {'ns':>20}  {'frequency':>14}  {'ns a day':>16}",
        ]
        rule = "  ".join("-" * n for n in (width, 20, 14, 16))
        lines.append(rule)
        for name, value in rows:
            if name == rows[-1][0]:
                lines.append(rule)
            rate = value / self.duration_s
            lines.append(f"{name:<{width}}  {value * 1e9:>+20.9f}  {rate:>+14.6e}  {rate * _DAY_S * 1e9:>+16.9f}")
        return "\n".join(lines)


@dataclass(frozen=True, eq=False)
class _Pair:
    """Both clocks from the start on, and how dates at the one go to dates at the other."""

    a: Ticking
    b: Ticking
    reference: ReferenceData
    against: str
    alike: _Alike
    integrals: tuple[ProperIntegral, ProperIntegral]

    @classmethod
    def of(cls, a: Ticking, b: Ticking, reference: ReferenceData, against: str, start: Instants) -> _Pair:
        alike = _alike(a, b, against)
        counts = _both(a, b, reference, alike, start)
        integrals = [
            ProperIntegral(
                clock.observer,
                tt,
                reference,
                gravity=clock.gravity,
                tides=clock.tides,
                rate_offset=clock.rate_offset,
            )
            for clock, tt in zip((a, b), counts, strict=True)
        ]
        return cls(a, b, reference, against, alike, (integrals[0], integrals[1]))

    def counts(self, t: Instants) -> tuple[Pair, Pair]:
        """TT counts at the two clocks."""
        return _both(self.a, self.b, self.reference, self.alike, t)

    def gained_s(self, t: Instants) -> FloatArray:
        one, two = self.counts(t)
        first, second = self.integrals
        gained = first.free_s(one) - second.free_s(two)
        if self.alike != "TT":
            apart = exact.subtract(exact.subtract(one, first.anchor), exact.subtract(two, second.anchor))
            gained = gained + exact.seconds(apart)
        return np.asarray(gained + self.set_s((one, two)))

    def set_s(self, counts: tuple[Pair, Pair]) -> FloatArray:
        """What set rates add to `gained_s`; equal ones of long spans would cancel badly as floats."""
        if self.a.rate_offset == self.b.rate_offset == 0.0:
            return np.zeros(np.shape(counts[0][0]))
        return exact.seconds(exact.subtract(*(i.set_part(tt) for i, tt in zip(self.integrals, counts, strict=True))))

    def duration_s(self, end: Pair) -> float:
        """Seconds of the coordinate time at a from the start to a TT count."""
        return float(exact.seconds(exact.subtract(self._on(end), self._on(self.integrals[0].anchor))))

    def _on(self, tt: Pair) -> Pair:
        if self.alike != "TT":
            tdb = tdb_from_tt(tt, self.reference, self.a.own_event)
            if isinstance(self.alike, int):
                return body_time_from_tdb(tdb, self.alike, self.reference, self.a.observer)
            if self.alike == "TDB":
                return tcb_from_tdb(tdb) if self.against == "TCB" else tdb
            tt = tt_from_tdb(tdb, self.reference)
        return tcg_from_tt(tt) if self.against == "TCG" else tt


def _alike(a: Ticking, b: Ticking, against: str) -> _Alike:
    """See `_Alike`."""
    if against in ("TDB", "TCB"):
        return "TDB"
    if against == "TCL":
        return _MOON
    if against == "own":
        bodies = _body_of(a.observer), _body_of(b.observer)
        if bodies[0] is None or bodies[0] != bodies[1]:
            raise ScaleMismatch(
                f"against='own' is the time of the one other body that both clocks are on or about, which {a.name} and "
                f"{b.name} are not: compare them against TCG near the Earth, TCL near the Moon, or TDB anywhere"
            )
        return bodies[0]
    # One TT count must not stand for the event of one clock here and for the geocentre's at the same TDB there.
    return "TT" if (a.own_event is None) == (b.own_event is None) else "TT of the geocentre"


def _body_of(observer: Observer) -> int | None:
    """Number of the body other than the Earth that a clock is on or about."""
    if isinstance(observer, SurfaceSite):
        return BodyTimeEphemeris.number(observer.body)
    centers = {piece.center for piece in getattr(observer, "pieces", ())} or {0}
    if getattr(observer, "geocentric", True) or len(centers) > 1 or centers & {0, 399}:
        return None
    return BodyTimeEphemeris.number(centers.pop())


def _both(a: Ticking, b: Ticking, reference: ReferenceData, alike: _Alike, t: Instants) -> tuple[Pair, Pair]:
    """TT counts at the two clocks, each of the TT that goes with its events."""
    here, there = a.own_event, b.own_event
    if alike == "TT":
        one = tt_at(t, here, reference)
        return one, one
    dated = None if alike == "TT of the geocentre" and t.scale != "TCL" else here
    one = tt_at(t, dated, reference)
    tdb = first = tdb_from_tt(one, reference, dated)
    if isinstance(alike, int):
        own = body_time_from_tdb(tdb, alike, reference, a.observer)
        tdb = tdb_from_body_time(own, alike, reference, b.observer)
    return (one if dated is here else tt_from_tdb(first, reference, here)), tt_from_tdb(tdb, reference, there)


def compare_clocks(
    a: Observer | ProperClock,
    b: Observer | ProperClock,
    start: Instants,
    stop: Instants,
    *,
    against: str = "TT",
    gravity: GravityField | None = None,
    tides: Tides = True,
    reference: ReferenceData | None = None,
) -> ClockComparison:
    """What clock a gains on clock b between two dates.

    The proper time that elapses at each is taken between the same two dates of a coordinate time, TT if not said
    otherwise: clocks that are apart have no other "same time". With TDB or TCB the dates of the two differ by up to
    some us of TT, which changes with their places; for two clocks on the ground that is up to 4 us, and averages out
    over days. Two clocks on one other body go by that body's own time: against it a difference of rates is that of
    their potentials, without what dates on TT add as the body turns.

    Where TT reaches one of two clocks alone (one of them is over 1e10 m from the Earth), TT and the scales tied to it
    mean that of the geocentre at the same TDB, for both.

    Parameters
    ----------
    a, b : Site, Trajectory, SurfaceSite or ProperClock
        The clocks. A `ProperClock` brings its own gravity, tides and set rate.
    start, stop : Instants, one each
        On any coordinate time; stop after start. On a scale that depends on the place (TDB, TCB) they are events at a.
    against : str
        TT (or TAI, UTC and the satellite-navigation times, which run alike), TCG, TCB, TDB; TCL near the Moon; `own`:
        the time of the one other body that both clocks are on or about.
    gravity, tides
        For both clocks; see `transforms.proper_time.rate_terms`.
    reference : ReferenceData, optional
        `ReferenceData.default()` if not given.

    Raises
    ------
    InvalidInput
        For dates that are not one instant each or not in order.
    MissingPiece, OutOfSpan, ScaleMismatch, NotConverged
        As `rate_terms` and `ProperIntegral`.
    """
    against, tables = checked_against(against, own=True), checked_tables(reference)
    clocks = as_ticking(a, gravity, tides, "a"), as_ticking(b, gravity, tides, "b")
    start, stop = _one(start, "start"), _one(stop, "stop")
    pair = _Pair.of(*clocks, tables, against, start)
    ends = pair.counts(stop)
    duration_s = pair.duration_s(ends[0])
    if not duration_s > 0.0:
        raise InvalidInput(f"stop comes {-duration_s:.6g} s before start (or with it); give them in order")
    accumulated_s = float(pair.gained_s(stop))
    parts = [integral.terms_s(end) for integral, end in zip(pair.integrals, ends, strict=True)]
    ledger = {name: float(parts[0].get(name, 0.0) - parts[1].get(name, 0.0)) for name in parts[0] | parts[1]}
    if SET_RATE in ledger:
        ledger[SET_RATE] = float(pair.set_s(ends))
    if pair.alike != "TT":
        elapsed = [
            exact.subtract(tcg_from_tt(end), tcg_from_tt(i.anchor)) for i, end in zip(pair.integrals, ends, strict=True)
        ]
        ledger[DATES] = float(exact.seconds(exact.subtract(*elapsed)))
    return ClockComparison(clocks[0].name, clocks[1].name, against, duration_s, accumulated_s, ledger, pair)


def _one(t: Instants, what: str) -> Instants:
    t = checked_dates(t, what)
    if t.size != 1:
        raise InvalidInput(f"{what} is one instant, got {t.size}; ask the result for a series with .series_s(t)")
    return Instants._of((t.whole.reshape(()), t.fraction.reshape(())), t.scale, t.place)
