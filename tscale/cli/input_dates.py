"""Dates for one picture, report or comparison: those of a column of a file, or evenly spaced ones."""

from __future__ import annotations

import argparse
import re
from decimal import Decimal, InvalidOperation
from fractions import Fraction
from pathlib import Path
from typing import TYPE_CHECKING, Final

from .streams import note, opened

if TYPE_CHECKING:
    from ..chains import Chain
    from ..formats.leap_seconds import LeapSeconds
    from ..instants import Instants

__all__ = ["add_span", "add_text", "dates_of_input", "dates_of_span", "drawn_dates", "thinned"]

_LAYOUTS: Final = ("iso", "mjd", "jd", "seconds", "spreadsheet")
_BLOCK_ROWS: Final = 65536
_USUAL: Final = 400
_MOST: Final = 100_000
_DRAWN: Final = 4000


def add_text(parser: argparse.ArgumentParser) -> None:
    """Add the options that say how INPUT is read."""
    text = parser.add_argument_group("text")
    text.add_argument("--column", metavar="NAME", help="column with the dates (default: the first)")
    text.add_argument("--delimiter", metavar="CHAR", default=",", help="also: comma, semicolon, tab, pipe")
    text.add_argument("--input-format", choices=_LAYOUTS, default="iso", help="layout of the dates (%(default)s)")


def add_span(parser: argparse.ArgumentParser) -> None:
    """Add the options for evenly spaced dates in place of INPUT."""
    span = parser.add_argument_group("dates, in place of INPUT")
    span.add_argument("--start", dest="first", metavar="DATE", help="first date, ISO 8601 on the scale of the start")
    span.add_argument("--stop", dest="last", metavar="DATE", help="last date")
    span.add_argument("--step", metavar="S", help=f"seconds from date to date (default: {_USUAL} dates)")


def dates_of_input(
    args: argparse.Namespace, scale: str, leap_seconds: LeapSeconds, lines: list[int] | None = None
) -> Instants:
    """All dates of `args.input`, with their lines added to `lines`; an error names its line."""
    from ..errors import DataFileError, TscaleError
    from ..files import DelimitedReader
    from ..files.date_text import read_dates
    from ..files.delimited import delimiter_of
    from ..instants import Instants

    parts = []
    with opened(args.input) as source:
        reader = DelimitedReader(source.lines, source.name, column=args.column, delimiter=delimiter_of(args.delimiter))
        for block in reader.blocks(_BLOCK_ROWS, source.ready):
            if not len(block):
                continue
            try:
                parts.append(read_dates(block.column, args.input_format, scale, leap_seconds=leap_seconds))
            except TscaleError as error:
                if error.mask is not None and error.mask.any():
                    error.row = block.lines[int(error.mask.argmax())]
                error.path = error.path or Path(source.name)
                raise
            if lines is not None:
                lines.extend(block.lines)
    if not parts:
        raise DataFileError("there are no rows below the header", path=args.input)
    return Instants.concatenate(parts)


def dates_of_span(args: argparse.Namespace, scale: str, leap_seconds: LeapSeconds) -> Instants:
    """Dates from `--start` to `--stop`, each the exact sum of the first and so many steps."""
    import numpy as np

    from .. import exact
    from ..errors import InvalidInput

    first, last = (_date(args, name, scale, leap_seconds) for name in ("first", "last"))
    whole, fraction = last.minus_exact(first)
    span = Fraction(int(whole)) + Fraction(float(fraction))
    if span <= 0:
        raise InvalidInput(f"--stop comes after --start; got --start {args.first} --stop {args.last}")
    step = span / (_USUAL - 1) if args.step is None else _step(args.step)
    # A step such as 0.1 s may miss the last date by the rounding of its text.
    count = int((span + Fraction(1, 10**15)) / step) + 1
    if not 2 <= count <= _MOST:
        raise InvalidInput(
            f"a picture takes 2 to {_MOST} dates, and --step {args.step} from --start to --stop makes {count}; take "
            f"{'a longer' if count > 2 else 'a shorter'} --step, or none for {_USUAL} dates"
        )
    rows = np.arange(count, dtype=np.int64)
    return first.shifted(exact.multiply((rows, np.zeros(count)), exact.Factor.of(step)))


def drawn_dates(args: argparse.Namespace, chain: Chain) -> Instants:
    """The dates of a picture of a chain, by INPUT or by `--start` and `--stop`.

    Of evenly spaced dates those that the chain cannot carry, as in the gaps of a clock log, are left out, and said.
    """
    from ..errors import InvalidInput

    scale, table = chain.start.scale.name, chain.reference.leap_seconds
    spanned = args.first is not None or args.last is not None
    if (args.input is None) == (not spanned):
        raise InvalidInput("give the dates by INPUT, or by --start DATE and --stop DATE")
    if args.input is not None:
        if args.step is not None:
            raise InvalidInput("--step goes with --start and --stop; the dates of INPUT stand as they are")
        t, every = thinned(dates_of_input(args, scale, table))
        if every > 1:
            note(f"one of {every} dates of {args.input} is drawn")
        return t
    if args.first is None or args.last is None:
        raise InvalidInput("--start and --stop belong together: give both")
    return _carried(chain, dates_of_span(args, scale, table))


def thinned(t: Instants, most: int = _DRAWN) -> tuple[Instants, int]:
    """Every n-th date, so that there are no more than `most`, and n."""
    every = -(-t.size // most)
    return t[::every], every


def _carried(chain: Chain, t: Instants) -> Instants:
    from ..errors import OutOfSpan

    asked = t.size
    reasons = []
    while True:
        try:
            chain(t)
        except OutOfSpan as error:
            if error.mask is None or error.mask.shape != t.shape or error.mask.all():
                raise
            t = t[~error.mask]
            reasons.append(re.sub(r" \(see \.mask\)", "", str(error)))
        else:
            break
    if reasons:
        note(f"{asked - t.size} of {asked} dates are left out of the picture: {'; '.join(reasons)}")
    return t


def _date(args: argparse.Namespace, name: str, scale: str, leap_seconds: LeapSeconds) -> Instants:
    from ..errors import TextError
    from ..instants import Instants

    text = getattr(args, name)
    option = "--start" if name == "first" else "--stop"
    try:
        return Instants.from_iso(text, scale, leap_seconds=leap_seconds)
    except TextError as error:
        why = str(error).rpartition(f"{text!r}: ")[2]
        error.args = (f"{option} {text} is no date of {scale}: {why}",)
        raise


def _step(text: str) -> Fraction:
    """The step; its size is looked at before it becomes a ratio, which for 1e999999999 would never be done."""
    from ..errors import InvalidInput

    try:
        step = Decimal(text)
    except InvalidOperation as error:
        raise InvalidInput(f"--step is a decimal number of seconds, got {text!r:.60}") from error
    if not (step.is_finite() and Decimal("1e-15") <= step <= Decimal("1e12")):
        raise InvalidInput(f"--step lies between 1e-15 and 1e12 s, got {text!r:.60}")
    return Fraction(step)
