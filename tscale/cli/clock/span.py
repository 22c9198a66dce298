"""The dates of `tscale clock`: from where to where, and the grid between."""

from __future__ import annotations

from collections.abc import Sequence
from decimal import Decimal, InvalidOperation
from fractions import Fraction
from typing import TYPE_CHECKING, Any, Final, NamedTuple

from ..link_dates import date_of
from .ends import ClockEnd

if TYPE_CHECKING:
    import argparse

    from ...instants import Instants
    from ...tables.reference import ReferenceData

__all__ = ["Span", "span_of"]

_USUAL: Final = 400
_MOST: Final = 100_000


class Span(NamedTuple):
    """Start and stop, one instant each, and dates from the one to the other in equal steps; the last may stop short."""

    start: Instants
    stop: Instants
    dates: Instants


def span_of(args: argparse.Namespace, ends: Sequence[ClockEnd], reference: ReferenceData) -> Span:
    """The span by `--start` and `--stop`, else all that the flights and orbits among the clocks cover.

    Raises
    ------
    InvalidInput
        Dates that are none or not in order, one without the other, none for clocks that have no dates of their own.
    """
    import numpy as np

    from ... import exact
    from ...errors import InvalidInput

    if (args.start is None) != (args.stop is None):
        raise InvalidInput("--start and --stop belong together: give both")
    if args.start is not None:
        start, stop = (date_of(args, option, reference) for option in ("start", "stop"))
    else:
        start, stop = _covered(args, ends)
    whole, fraction = stop.minus_exact(start)
    span = Fraction(int(whole)) + Fraction(float(fraction))
    if span <= 0:
        raise InvalidInput(
            f"--stop comes after --start; got --start {args.start} --stop {args.stop}"
            if args.start is not None
            else "the two clocks share no dates: one ends before the other begins"
        )
    step = span / (_USUAL - 1) if args.step is None else _step(args.step)
    # A step such as 0.1 s may miss the last date by the rounding of its text.
    count = int((span + Fraction(1, 10**15)) / step) + 1
    if not 2 <= count <= _MOST:
        raise InvalidInput(
            f"rates are taken at 2 to {_MOST} dates, and --step {args.step} makes {count}; take "
            f"{'a longer' if count > 2 else 'a shorter'} --step, or none for {_USUAL} dates"
        )
    rows = np.arange(count, dtype=np.int64)
    return Span(start, stop, start.shifted(exact.multiply((rows, np.zeros(count)), exact.Factor.of(step))))


def _covered(args: argparse.Namespace, ends: Sequence[ClockEnd]) -> tuple[Instants, Instants]:
    """First and last date that all trajectories cover, on the scale asked for if that runs with theirs."""
    import numpy as np

    from ...counts import fixed_count
    from ...errors import InvalidInput
    from ...instants import Instants
    from ...scales import Scale

    found: dict[str, list[tuple[Any, Any]]] = {}
    for end in ends:
        observer: Any = end.observer
        if end.kind in ("site", "surface") or not all(np.isfinite(observer.span)):
            continue
        pieces = sorted(observer.pieces, key=lambda piece: int(piece.first[0]))
        found.setdefault(observer.scale, []).append((pieces[0].first, pieces[-1].last))
    if len(found) != 1:
        raise InvalidInput(
            "no dates: give --start DATE and --stop DATE (a site, a place on a body and an orbit of elements have none "
            "of their own)"
            if not found
            else "the clocks are dated in TT and in TDB: give --start DATE and --stop DATE"
        )
    ((scale, spans),) = found.items()
    first = max((span[0] for span in spans), key=_order)
    last = min((span[1] for span in spans), key=_order)
    wanted = Scale.parse(args.scale)
    pairs = [(np.asarray(int(end[0]), dtype=np.int64), np.asarray(float(end[1]))) for end in (first, last)]
    if scale == "TT" and wanted.count_minus_tai is not None:
        pairs = [fixed_count(pair, Scale.parse("TT"), wanted) for pair in pairs]
        scale = args.scale
    start, stop = (Instants._of(pair, scale) for pair in pairs)
    return start, stop


def _order(pair: Any) -> tuple[int, float]:
    return int(pair[0]), float(pair[1])


def _step(text: str) -> Fraction:
    """The step; its size is looked at before it becomes a ratio, which for 1e999999999 would never be done."""
    from ...errors import InvalidInput

    try:
        step = Decimal(text)
    except InvalidOperation as error:
        raise InvalidInput(f"--step is a decimal number of seconds, got {text!r:.60}") from error
    if not (step.is_finite() and Decimal("1e-6") <= step <= Decimal("1e12")):
        raise InvalidInput(f"--step lies between 1e-6 and 1e12 s, got {text!r:.60}")
    return Fraction(step)
