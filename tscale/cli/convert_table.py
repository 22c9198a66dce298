"""`tscale convert` of Parquet and Arrow tables, by chains or by compiled ones."""

from __future__ import annotations

import argparse
import sys
from typing import Any, Final

from .streams import standard_output
from .supplies import supplied

__all__ = ["is_table", "run_table"]

_ENDINGS: Final = (".parquet", ".arrow", ".feather")
_OF_TEXT: Final = ("delimiter", "input_format", "output_format", "digits", "provenance", "provenance_file")
_USUAL: Final = {"delimiter": ",", "input_format": "iso", "output_format": "iso"}


def is_table(path: str) -> bool:
    """Whether an input is a table by its name, or a folder (of tables)."""
    import os

    return path.lower().endswith(_ENDINGS) or os.path.isdir(path)


def run_table(args: argparse.Namespace) -> int:
    """Convert a table."""
    from ..errors import InvalidInput
    from ..files.tables import convert_table

    for name in _OF_TEXT:
        if getattr(args, name) not in (None, False, _USUAL.get(name)):
            raise InvalidInput(f"--{name.replace('_', '-')} is for text, and {args.input} is a table")
    mappings, leap_seconds = _mappings(args)
    report = None if args.quiet else standard_output()
    bar = _Bar(args.no_progress)
    try:
        done = convert_table(
            mappings,
            args.input,
            args.output,
            column=args.column,
            ledger=args.ledger,
            sigma=args.sigma,
            rate=args.rate,
            leap_seconds=leap_seconds,
            threads=args.threads,
            progress=bar.tell,
        )
    finally:
        bar.close()
    if report is not None:
        kept = f" ({done.found} were there already)" if done.found else ""
        print(f"{args.input}: {done.rows} rows{kept} to {args.output}", file=report)
        for mapping in mappings:
            print(f"  {mapping}", file=report)
    return 0


def _mappings(args: argparse.Namespace) -> tuple[list[Any], Any]:
    from ..compiled import load_compiled
    from ..errors import InvalidInput

    if not args.compiled:
        given = supplied(args)
        return list(given.chains(args.ends)), given.reference.leap_seconds
    if args.ends or args.start is not None:
        raise InvalidInput("a compiled chain has its own ends: give --compiled, or --from and --to, not both")
    from ..formats.leap_seconds import LeapSeconds

    leap_seconds = None if args.leap_seconds is None else LeapSeconds.load(args.leap_seconds)
    return [load_compiled(path) for path in args.compiled], leap_seconds


class _Bar:
    """A progress bar of rows, that appears on a terminal when the work takes longer than a second."""

    def __init__(self, silent: bool) -> None:
        self._silent = silent or sys.stderr is None or not sys.stderr.isatty()
        self._bar: Any = None

    def tell(self, done: int, total: int) -> None:
        if self._bar is None:
            from tqdm import tqdm

            self._bar = tqdm(total=total, unit="rows", unit_scale=True, delay=1.0, disable=self._silent, leave=False)
        self._bar.update(done - self._bar.n)

    def close(self) -> None:
        if self._bar is not None:
            self._bar.close()
