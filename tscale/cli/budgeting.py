"""`tscale budget`: the uncertainty budget of a conversion at one date."""

from __future__ import annotations

import argparse
import re
from typing import Any, Final

from .input_dates import add_text, dates_of_input
from .options import add_observer, add_tables
from .stated import add_stated, option_of, stated_of
from .streams import note, standard_output
from .supplies import supplied

__all__ = ["add_parser", "run"]

_EPILOG: Final = """\
One line for every source of uncertainty: its standard uncertainty, the sensitivity of the result to it, and its share
(GUM, JCGM 100:2008). What no table states counts only when it is given; what is not given stands below the table.

examples:
  tscale budget readings.csv --clock maser.csv --clock utc_krl.csv --site site.toml --source star.toml \\
    --to TDB@BARYCENTER --site-sigma-m 0.05 --source-position-sigma-mas 1
  tscale budget --date 2025-03-03T12:00:00 --to UT1
"""


def add_parser(subparsers: argparse._SubParsersAction[Any]) -> None:
    """Add the subcommand."""
    parser = subparsers.add_parser(
        "budget",
        help="the uncertainty budget of a conversion at one date",
        description="Tell what the uncertainty of a conversion is made of, for the first date of INPUT or one given.",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    when = parser.add_mutually_exclusive_group(required=True)
    when.add_argument("input", metavar="INPUT", nargs="?", help="CSV file with a header, or - for the standard input")
    when.add_argument("--date", metavar="DATE", help="ISO 8601 date on the scale of the start")
    parser.add_argument("--from", dest="start", metavar="NODE", help="what the dates are (default: as for convert)")
    parser.add_argument("--to", dest="end", metavar="NODE", required=True, help="what is wanted")
    parser.add_argument("--json", action="store_true", help="the same as JSON")
    add_stated(parser)
    add_observer(parser)
    add_text(parser)
    add_tables(parser)
    parser.set_defaults(run=run)


def run(args: argparse.Namespace) -> int:
    """Print the budget."""
    from ..instants import Instants

    standard_output()
    (chain,) = supplied(args).chains([args.end])
    scale, table = chain.start.scale.name, chain.reference.leap_seconds
    if args.date is not None:
        t = Instants.from_iso([args.date], scale, leap_seconds=table)
    else:
        t = dates_of_input(args, scale, table)[:1]
    budget = chain.budget(t, **stated_of(args))
    if args.json:
        print(budget.to_json())
        return 0
    (date,) = t.to_iso(12, leap_seconds=table).tolist()
    print(f"{chain.start} {date}\n")
    print(_spoken(budget.table()))
    for text in chain.notes(t):
        note(text)
    return 0


def _spoken(table: str) -> str:
    """The table with options of the command where it speaks of arguments."""
    table = re.sub(r"\b[a-z_]+_(?:s|m|mas|mas_yr)\b", lambda word: option_of(word[0]) or word[0], table)
    return table.replace("give it with with_noise", "give it by [noise.CLOCK] in the file of --project")
