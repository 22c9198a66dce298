"""What `tscale clock` finds: the rate of one clock or of two, by terms, over a span."""

from __future__ import annotations

import re
from typing import TYPE_CHECKING, Any, NamedTuple

from .ends import ClockEnd
from .span import Span

if TYPE_CHECKING:
    from ...clocks import ClockComparison, ProperClock, RateLedger
    from ...earth.gravity.field import GravityField
    from ...earth.observer import Observer
    from ...exact import FloatArray, Pair
    from ...tables.reference import ReferenceData
    from ...transforms.proper_tides import Tides

__all__ = ["Found", "Model", "of_one", "of_two"]


class Model(NamedTuple):
    """What rates are taken by."""

    against: str
    gravity: GravityField | None
    tides: Tides
    set_offset: float
    """Fractional frequency by which the first clock is set fast."""
    reference: ReferenceData


class Found(NamedTuple):
    """A clock less a coordinate time, or less another clock."""

    title: str
    names: tuple[str, ...]
    against: str
    span: Span
    duration_s: float
    """Seconds of `against` from start to stop."""
    accumulated_s: float
    ledger: dict[str, float]
    """`accumulated_s` by terms, s."""
    rates: dict[str, FloatArray]
    """Rate at the dates of the span by terms."""
    total: FloatArray
    """Rate at the dates of the span."""
    gained_s: FloatArray
    """Gained from the start to the dates of the span, s."""
    drawn: RateLedger | ClockComparison
    """What a picture is made from."""

    @property
    def rate(self) -> float:
        """Mean over the span."""
        return self.accumulated_s / self.duration_s


def of_one(end: ClockEnd, span: Span, model: Model) -> Found:
    """The rate of a clock against a coordinate time, and what it gains on that."""
    import numpy as np

    from ... import exact
    from ...clocks import proper_ledger
    from ...clocks.arguments import as_ticking
    from ...clocks.dates import tt_at
    from ...transforms.proper_integral import ProperIntegral

    reference, against = model.reference, model.against
    clock = _set(end, span, model)
    ledger = proper_ledger(clock, span.dates, against, gravity=model.gravity, tides=model.tides, reference=reference)
    ticking = as_ticking(clock, model.gravity, model.tides, "a clock")
    own = ticking.own_event
    first, last, dates = (tt_at(t, own, reference) for t in span)
    integral = ProperIntegral(
        ticking.observer,
        first,
        reference,
        gravity=ticking.gravity,
        tides=ticking.tides,
        rate_offset=ticking.rate_offset,
    )
    zero = _on(against, first, own, ticking.observer, reference)

    def gained_s(tt: Pair) -> FloatArray:
        there = exact.subtract(_on(against, tt, own, ticking.observer, reference), zero)
        return np.asarray(integral.gained_s(tt) + exact.seconds(exact.subtract(exact.subtract(tt, first), there)))

    accumulated = float(gained_s(last))
    terms = {name: float(value) for name, value in integral.terms_s(last).items()}
    if against != "TCG":
        terms[f"TCG against {against}"] = accumulated - sum(sorted(terms.values(), key=abs))
    duration = exact.subtract(_on(against, last, own, ticking.observer, reference), zero)
    return Found(
        f"{end.name} against {against}",
        (end.name,),
        against,
        span,
        float(exact.seconds(duration)),
        accumulated,
        terms,
        dict(ledger),
        ledger.total,
        gained_s(dates),
        ledger,
    )


def of_two(a: ClockEnd, b: ClockEnd, span: Span, model: Model) -> Found:
    """The rate of clock a less that of clock b, and what a gains on b."""
    import numpy as np

    from ...clocks import compare_clocks, proper_ledger
    from ...clocks.arguments import as_ticking
    from ...transforms.proper_models import total_of

    words: dict[str, Any] = {"gravity": model.gravity, "tides": model.tides, "reference": model.reference}
    clock = _set(a, span, model)
    compared = compare_clocks(clock, b.observer, span.start, span.stop, against=model.against, **words)
    against = model.against
    if against not in ("TDB", "TCB", "TCL"):
        own = [as_ticking(which, model.gravity, model.tides, "a clock").own_event for which in (clock, b.observer)]
        # Where TT reaches one of them alone, rates by their own TT would differ by the turning of the place (1e-10).
        against = "TDB" if (own[0] is None) != (own[1] is None) else against
    one, two = (dict(proper_ledger(which, span.dates, against, **words)) for which in (clock, b.observer))
    nothing = np.zeros(span.dates.shape)
    rates = {name: np.asarray(one.get(name, nothing) - two.get(name, nothing)) for name in dict.fromkeys([*one, *two])}
    return Found(
        f"{a.name} minus {b.name}",
        (a.name, b.name),
        model.against,
        span,
        compared.duration_s,
        compared.accumulated_s,
        dict(compared.ledger),
        {name: value for name, value in rates.items() if np.any(value)},
        total_of(rates),
        compared.series_s(span.dates),
        compared,
    )


def _set(end: ClockEnd, span: Span, model: Model) -> Observer | ProperClock:
    """The clock, set fast if that is asked for."""
    from ...clocks import ProperClock
    from ...transforms.proper_models import is_near_earth

    if not model.set_offset:
        return end.observer
    return ProperClock(
        re.sub(r"[\s()\[\]{}@]+", "-", end.name),
        end.observer,
        span.start,
        rate_offset=model.set_offset,
        gravity=model.gravity if is_near_earth(end.observer) else None,
        tides=model.tides,
    )


def _on(against: str, tt: Pair, own: Observer | None, observer: Any, reference: ReferenceData) -> Pair:
    """Counts of a coordinate time at the clock's events."""
    from ...counts import tcb_from_tdb, tcg_from_tt
    from ...transforms.barycentric import tdb_from_tt
    from ...transforms.lunar import tcl_from_tdb

    if against == "TCG":
        return tcg_from_tt(tt)
    if against not in ("TDB", "TCB", "TCL"):
        return tt
    tdb = tdb_from_tt(tt, reference, own)
    if against == "TCL":
        return tcl_from_tdb(tdb, reference, observer)
    return tcb_from_tdb(tdb) if against == "TCB" else tdb
