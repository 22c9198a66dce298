"""`tscale inspect`: all that is odd in comparison logs, at once."""

from __future__ import annotations

import argparse
from typing import Any, Final

from .streams import standard_output

__all__ = ["add_parser", "run"]

_REFUSED: Final = 1

_EPILOG: Final = """\
Findings are errors (why the log cannot be used), warnings (what should be looked at: outliers, jumps, rate steps, gaps,
units that slipped) and notes. Nothing is changed. Exit status: 0 every log can be used, 1 one or more cannot.

examples:
  tscale inspect maser.csv utc_krl.csv
  tscale inspect maser.csv --threshold 4 --json
"""


def add_parser(subparsers: argparse._SubParsersAction[Any]) -> None:
    """Add the subcommand."""
    parser = subparsers.add_parser(
        "inspect",
        help="all that is odd in comparison logs",
        description="Look comparison logs over and tell all that is odd in them, line by line.",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    parser.add_argument("logs", metavar="LOG", nargs="+", help="comparison log (CSV)")
    parser.add_argument("--max-gap-s", metavar="S", type=float, help="comparisons further apart than this leave a gap")
    parser.add_argument(
        "--threshold", metavar="N", type=float, default=6.0, help="robust standard deviations to be odd (%(default)g)"
    )
    parser.add_argument(
        "--nominal", choices=("removed", "included"), help="of a reference that is not labelled like UTC"
    )
    parser.add_argument("--json", action="store_true", help="the findings as JSON: a list with an entry for each log")
    parser.add_argument("--leap-seconds", metavar="FILE", help="in place of the default table")
    parser.set_defaults(run=run)


def run(args: argparse.Namespace) -> int:
    """Print what was found."""
    from ..tables.clock_log import ClockLog
    from ..tables.reference import ReferenceData

    standard_output()
    table = ReferenceData.load(leap_seconds=args.leap_seconds).leap_seconds
    reports = [
        ClockLog.inspect(
            log, nominal=args.nominal, max_gap_s=args.max_gap_s, threshold=args.threshold, leap_seconds=table
        )
        for log in args.logs
    ]
    if args.json:
        import json

        print(json.dumps([report.to_dict() for report in reports], indent=2, ensure_ascii=False, allow_nan=False))
    else:
        print("\n\n".join(report.table() for report in reports))
    return 0 if all(report.loads for report in reports) else _REFUSED
