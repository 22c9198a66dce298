"""The dates of `tscale link`: one, or those of a table."""

from __future__ import annotations

import re
from decimal import Decimal, InvalidOperation
from fractions import Fraction
from typing import TYPE_CHECKING, Final

if TYPE_CHECKING:
    import argparse
    from collections.abc import Iterator

    from ..instants import Instants
    from ..tables.reference import ReferenceData

__all__ = ["blocks_of", "date_of"]

_BLOCK_ROWS: Final = 8192
_MOST_ROWS: Final = 10_000_000
_SHORTEST_STEP_S: Final = Decimal("1e-15")
_LONGEST_STEP_S: Final = Decimal("1e12")

# How errors that count the texts of an array speak of a single one.
_OF_ONE: Final = (
    (r"^1 of 1 texts are not dates; the first \(item 0\) is (['\"]).*?\1: ", "is no date: "),
    (r"^1 of 1 labels do not exist", "does not exist"),
    (r"the first \(item 0\) is|first, item 0:", "it is"),
    (r" ?\(item 0\)", ""),
)


def date_of(args: argparse.Namespace, option: str, reference: ReferenceData) -> Instants:
    """The date of an option."""
    from ..errors import TextError
    from ..instants import Instants

    text = getattr(args, option)
    try:
        return Instants.from_iso(text, args.scale, leap_seconds=reference.leap_seconds)
    except TextError as error:
        message = str(error)
        for pattern, words in _OF_ONE:
            message = re.sub(pattern, words, message)
        error.args = (f"--{option} {text}: {message}",)
        raise


def blocks_of(args: argparse.Namespace, first: Instants, reference: ReferenceData) -> Iterator[Instants]:
    """Dates of a table in blocks, each the exact sum of the first date and so many steps."""
    import numpy as np

    from .. import exact
    from ..errors import InvalidInput

    step = _step(args.step)
    whole, fraction = date_of(args, "until", reference).minus_exact(first)
    span = Fraction(int(whole)) + Fraction(float(fraction))
    if step <= 0 or span < 0:
        raise InvalidInput(f"a table runs forward: --until {args.until} by --step {args.step} does not")
    # A step such as 0.1 s may miss the last date by the rounding of its text.
    count = int((span + Fraction(1, 10**15)) / step) + 1
    if count > _MOST_ROWS:
        raise InvalidInput(
            f"a table has {_MOST_ROWS} rows at most, and --step {args.step} to --until {args.until} makes more; take a "
            "longer --step or several tables"
        )
    for start in range(0, count, _BLOCK_ROWS):
        rows = np.arange(start, min(start + _BLOCK_ROWS, count), dtype=np.int64)
        yield first.shifted(exact.multiply((rows, np.zeros(rows.shape)), exact.Factor.of(step)))


def _step(text: str) -> Fraction:
    """The step; its size is looked at before it becomes a ratio, which for 1e999999999 would never be done."""
    from ..errors import InvalidInput

    try:
        step = Decimal(text)
    except InvalidOperation as error:
        raise InvalidInput(f"--step is a decimal number of seconds, got {text!r:.60}") from error
    if step.is_finite() and step <= 0:
        return Fraction(0)
    if not (step.is_finite() and _SHORTEST_STEP_S <= step <= _LONGEST_STEP_S):
        raise InvalidInput(f"--step lies between {_SHORTEST_STEP_S:e} and {_LONGEST_STEP_S:e} s, got {text!r:.60}")
    return Fraction(step)
