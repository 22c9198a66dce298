"""`tscale events`: all times of a FITS event list carried to another scale or place, its headers with them."""

from __future__ import annotations

import argparse
from typing import TYPE_CHECKING, Any, Final

from .options import add_observer, add_tables
from .streams import note, standard_output
from .supplies import Supplied, supplied

if TYPE_CHECKING:
    from ..errors import MissingPiece, TscaleError
    from ..fits import ConvertedEvents
    from ..fits.cards import Cards, Value
    from ..fits.reading import TimeColumn

__all__ = ["add_parser", "run"]

# The options for what errors call arguments of `convert_events`.
_OPTION_FOR: Final = {
    "utc=": "--utc elapsed or --utc labels",
    "cards=": "--card KEY=VALUE",
    "keep=": "--keep EXTENSION",
    "keep names": "--keep EXTENSION",
    "leave rebase out": "--rebase",
    "give a Source": "--direction, --source FILE, or --ra and --dec",
}
_DIRECTIONS: Final = (("RA_NOM", "DEC_NOM"), ("RA_OBJ", "DEC_OBJ"))

_EPILOG: Final = """\
What the times are is read from the headers, by the FITS time standard (TIMESYS, TREFPOS, MJDREF ...); a header that
contradicts itself is an error. Carried are the column TIME of every table, good time intervals, and the keywords of
time in the headers, which then agree with each other. What was done, and with which tables, stands behind as HISTORY.
All else stays byte for byte. OUTPUT is renamed into place when all went well, so it may be INPUT itself.

Without --site or --orbit the observer is where OBSGEO says. The direction of the signal is given as for convert, or
taken from two keywords of the header by --direction.

examples:
  tscale events night.fits night_tdb.fits --to TDB@BARYCENTER --ra 187.2519 --dec -12.6408 --rebase
  tscale events orbit.fits out.fits --to TDB@BARYCENTER --orbit orbit.oem --direction RA_NOM,DEC_NOM
  tscale events long.fits out.fits --compiled month.chain --threads 2
"""


def add_parser(subparsers: argparse._SubParsersAction[Any]) -> None:
    """Add the subcommand."""
    parser = subparsers.add_parser(
        "events",
        help="carry the times of a FITS event list, and its headers, to another scale or place",
        description="Carry all times of a FITS file to another scale or place: columns, good time, and headers.",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    parser.add_argument("input", metavar="INPUT", help="FITS file")
    parser.add_argument("output", metavar="OUTPUT", help="FITS file")
    parser.add_argument("--to", dest="end", metavar="NODE", help="what is wanted, such as TDB@BARYCENTER")
    parser.add_argument(
        "--compiled", metavar="FILE", help="a chain compiled by `tscale compile`, in place of --to; needs no tables"
    )
    parser.add_argument("--rebase", action="store_true", help="count from the day of the first event: finer numbers")
    parser.add_argument(
        "--column", metavar="NAME", action="append", default=[], help="column with times (default: TIME); repeatable"
    )
    parser.add_argument(
        "--keep", metavar="EXTENSION", action="append", default=[], help="leave an extension as it is; repeatable"
    )
    parser.add_argument(
        "--card",
        metavar="KEY=VALUE",
        action="append",
        default=[],
        help="take a value in place of what headers say, where they are incomplete or wrong; repeatable",
    )
    parser.add_argument(
        "--utc",
        choices=("elapsed", "labels"),
        help="how seconds of UTC since a reference are counted where leap seconds lie between",
    )
    parser.add_argument(
        "--direction", metavar="RA,DEC", help="keywords of the header with the ICRS direction, as RA_NOM,DEC_NOM"
    )
    parser.add_argument("--threads", metavar="N", type=int, default=1, help="blocks worked on at once (%(default)s)")
    parser.add_argument("--no-progress", action="store_true", help="no progress bar")
    says = parser.add_mutually_exclusive_group()
    says.add_argument("--quiet", action="store_true", help="no summary; notes on the error stream")
    says.add_argument("--json", action="store_true", help="the summary as JSON")
    add_observer(parser)
    add_tables(parser)
    parser.set_defaults(run=run)


def run(args: argparse.Namespace) -> int:
    """Convert a file."""
    from ..errors import TscaleError

    try:
        return _run(args)
    except TscaleError as error:
        _add_options(error)
        raise


def _add_options(error: TscaleError) -> None:
    """Name the options for the arguments of functions that an error speaks of."""
    options = dict.fromkeys(option for word, option in _OPTION_FOR.items() if word in str(error))
    if options:
        error.args = (f"{error} (on the command line: {'; '.join(options)})",)


def _run(args: argparse.Namespace) -> int:
    from ..errors import InvalidInput
    from ..fits import convert_events
    from ..fits.layout import read_layout
    from ..fits.plan import first_times
    from .rows_bar import RowsBar

    if "-" in (args.input, args.output):
        raise InvalidInput("INPUT and OUTPUT are names of files: a FITS file is read and written at several places")
    if (args.end is None) == (args.compiled is None):
        raise InvalidInput("say what is wanted, either with --to NODE or with --compiled FILE")
    report = None if args.quiet else standard_output()
    cards = _cards(args.card)
    columns = tuple(args.column) or ("TIME",)
    keep = tuple(int(word) if word.isdigit() else word for word in args.keep)
    times = first_times(read_layout(args.input, cards), columns, keep, args.utc)
    source = _source(args, times)
    bar = RowsBar(args.no_progress)
    try:
        done = convert_events(
            args.input,
            args.output,
            _mapping(args, times, source),
            columns=columns,
            keep=keep,
            rebase=args.rebase,
            direction=source,
            cards=cards,
            utc=args.utc,
            threads=args.threads,
            progress=bar.tell,
        )
    finally:
        bar.close()
    for text in done.notes if report is None else ():
        note(text)
    if report is not None:
        print(_json(args, done) if args.json else _summary(args, done), file=report)
    return 0


def _cards(given: list[str]) -> dict[str, Value]:
    from decimal import Decimal, InvalidOperation

    from ..errors import InvalidInput

    found: dict[str, Value] = {}
    for text in given:
        key, equals, value = text.partition("=")
        if not equals or not key:
            raise InvalidInput(f"--card is KEY=VALUE, such as TREFPOS=BARYCENTER; got {text!r}")
        try:
            found[key.upper()] = Decimal(value)
        except InvalidOperation:
            found[key.upper()] = {"T": True, "F": False}.get(value, value)
    return found


def _source(args: argparse.Namespace, times: TimeColumn) -> Any:
    from ..errors import InvalidInput
    from ..fits import source_of as stated
    from .options import source_of
    from .project import from_project

    source = source_of(args)
    if args.direction is None:
        return source
    if from_project(args) & {"source", "ra", "dec"}:
        source = None  # what is said for this one file stands before what the project says for many
    names = tuple(word.strip().upper() for word in args.direction.split(","))
    if len(names) != 2:
        raise InvalidInput(f"--direction names two keywords, such as RA_NOM,DEC_NOM; got {args.direction!r}")
    if source is not None:
        raise InvalidInput("give the source by --direction, or by --source or --ra and --dec, not by both")
    return stated(times.hdu.cards, (names[0], names[1]))


def _mapping(args: argparse.Namespace, times: TimeColumn, source: Any) -> Any:
    if args.compiled is not None:
        from ..compiled import load_compiled

        return load_compiled(args.compiled)
    from ..errors import MissingPiece
    from ..fits import site_of

    args.start = str(times.frame.node)
    given: Supplied = supplied(args)._replace(source=source)
    if given.site is None and times.frame.observer_m is not None and times.frame.position == "TOPOCENTER":
        given = given._replace(site=site_of(times.hdu.cards))
    try:
        (chain,) = given.chains([args.end])
    except MissingPiece as error:
        _add_direction(error, times.hdu.cards)
        raise
    return chain


def _add_direction(error: MissingPiece, cards: Cards) -> None:
    """Where a source is missing and the header states a direction, say how to take it."""
    from ..fits.observer import is_icrs

    if "source=" in str(error) and is_icrs(cards):
        for pair in _DIRECTIONS:
            if all(key in cards for key in pair):
                error.args = (f"{error}. The header states a direction: --direction {','.join(pair)} takes it",)
                break


def _json(args: argparse.Namespace, done: ConvertedEvents) -> str:
    import json
    from dataclasses import asdict

    plain = {**asdict(done), "input": args.input, "output": args.output, "rows": done.rows}
    del plain["path"]
    return json.dumps(plain, indent=2, sort_keys=True)


def _summary(args: argparse.Namespace, done: ConvertedEvents) -> str:
    lines = [f"{done.start} -> {done.end}"]
    for column in done.columns:
        gone = f", {column.undefined} without a time" if column.undefined else ""
        spacing = f"numbers up to {column.spacing_s:.1e} s apart"
        lines.append(f"  {column.extension}, {column.column}: {column.rows} rows{gone}, {spacing}")
    lines.append(f"  headers: {', '.join(done.headers)}")
    lines += [f"note: {text}" for text in done.notes]
    lines.append(f"{args.input} -> {args.output}")
    return "\n".join(lines)
