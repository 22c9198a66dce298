"""`tscale what-if`: what other tables would move in a conversion, term by term."""

from __future__ import annotations

import argparse
from collections.abc import Callable
from typing import TYPE_CHECKING, Any, Final

from .input_dates import add_text, dates_of_input
from .options import add_observer, add_tables, clocks_of, observer_of, reference_of, source_of, start_of
from .streams import standard_output

if TYPE_CHECKING:
    from ..chains import Chain
    from ..instants import Instants
    from ..scenarios import WhatIf
    from ..tables.reference import ReferenceData

__all__ = ["add_parser", "add_replacements", "compared", "run"]

_TABLES: Final = {
    "leap_seconds": "leap seconds, such as those that a later bulletin brought",
    "earth_orientation": "Earth orientation, such as later finals",
    "tt_bipm": "BIPM table of TT(BIPMyy), also of another year",
    "ephemeris": "SPK kernel; its own time ephemeris goes with it",
    "time_ephemeris": "SPK kernel with TT - TDB",
}

_EPILOG: Final = """\
INPUT is read as by `tscale convert`. The dates are held as they are written, so that later leap seconds move what a UTC
date means. For every term the least, the most and the rms of what moved is told, and for every step the rms pull: what
moved over the standard uncertainties of what is not the same, before and after; what both share has no part in it.

example:
  tscale what-if readings.csv --site site.toml --source star.toml --to TDB@BARYCENTER \\
    --with-earth-orientation later_finals.txt
"""


def add_parser(subparsers: argparse._SubParsersAction[Any]) -> None:
    """Add the subcommand."""
    parser = subparsers.add_parser(
        "what-if",
        help="what other tables would move, term by term",
        description="Convert a column of dates twice, with the usual tables and with others, and tell what moved.",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    parser.add_argument("input", metavar="INPUT", help="CSV file with a header, or - for the standard input")
    parser.add_argument("--from", dest="start", metavar="NODE", help="what the dates are (default: as for convert)")
    parser.add_argument("--to", dest="end", metavar="NODE", required=True, help="what is wanted")
    add_replacements(parser)
    parser.add_argument("--json", action="store_true", help="the summary and both provenances as JSON")
    add_observer(parser)
    add_text(parser)
    add_tables(parser)
    parser.set_defaults(run=run)


def add_replacements(parser: argparse.ArgumentParser) -> None:
    """Add the options that name what takes the place of what."""
    others = parser.add_argument_group("what is replaced", "at least one")
    for name, words in _TABLES.items():
        others.add_argument(f"--with-{name.replace('_', '-')}", metavar="FILE", help=words)
    others.add_argument(
        "--with-clock", metavar="FILE", action="append", default=[], help="log in place of that of the same clock"
    )
    others.add_argument("--with-site", metavar="FILE", help="TOML file with a [site] table")
    others.add_argument("--with-source", metavar="FILE", help="TOML file with a [source] table")


def run(args: argparse.Namespace) -> int:
    """Print what moved."""
    standard_output()
    before, t, found = compared(args, _input)
    if args.json:
        print(found.to_json(indent=2))
        return 0
    print(f"{before}\n{t.size} dates of {before.start}: what moves is after less before\n")
    print(found.table())
    return 0


def compared(
    args: argparse.Namespace, dates: Callable[[argparse.Namespace, Chain], Instants]
) -> tuple[Chain, Instants, WhatIf]:
    """The chain that the options name, the dates for it, and what the replacements move."""
    from ..chains import chain
    from ..earth.site import Site
    from ..errors import InvalidInput
    from ..scenarios import what_if
    from ..source import Source

    given = {name: path for name in _TABLES if (path := getattr(args, f"with_{name}")) is not None}
    if not (given or args.with_clock or args.with_site or args.with_source):
        raise InvalidInput("nothing is replaced: give at least one option --with-...")
    reference = reference_of(args)
    clocks = clocks_of(args, reference)
    site, source = observer_of(args, reference), source_of(args)
    start = args.start if args.start is not None else start_of(clocks)
    before = chain(start, args.end, site=site, clocks=clocks, source=source, reference=reference,
                   second_order=bool(args.second_order))  # fmt: skip
    t = dates(args, before)
    other = _replaced(args, reference, given)
    # Logs are read again where the leap seconds changed: their epochs are labels too.
    fresh = argparse.Namespace(**{**vars(args), "clock": args.with_clock, "from_project": frozenset()})
    logs = clocks_of(fresh, other)
    if "leap_seconds" in given:
        replaced = {log.scale for log in logs}
        logs += [log for log in clocks_of(args, other) if log.scale not in replaced]
    found = what_if(
        before,
        t,
        reference=other,
        clocks=logs,
        site=None if args.with_site is None else Site.load(args.with_site),
        source=None if args.with_source is None else Source.load(args.with_source),
    )
    return before, t, found


def _input(args: argparse.Namespace, chain: Chain) -> Instants:
    return dates_of_input(args, chain.start.scale.name, chain.reference.leap_seconds)


def _replaced(args: argparse.Namespace, reference: ReferenceData, given: dict[str, str]) -> ReferenceData:
    """The bundle with the other tables; what else was given as a file is read again, by the other leap seconds."""
    tables: dict[str, Any] = dict(given)
    if "leap_seconds" in given:
        tables = {"earth_orientation": args.earth_orientation, "tt_bipm": args.tt_bipm, **tables}
    if "ephemeris" in given:
        tables.setdefault("time_ephemeris", None)
    return reference.replace(**tables)
