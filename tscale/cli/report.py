"""`tscale report`: a conversion as one HTML page, to be kept beside the results."""

from __future__ import annotations

import argparse
import warnings
from pathlib import Path
from typing import Any, Final

from .input_dates import add_text, dates_of_input
from .options import add_observer, add_tables
from .stated import add_stated, spoken, stated_of
from .streams import is_standard_output, note, written
from .supplies import supplied

__all__ = ["add_parser", "run"]

_EPILOG: Final = """\
The page holds the path with its documents, the first results, every term and the uncertainty budget of the first
reading, pictures, what the results rest on, and all tables with their SHA-256. It stands alone: nothing is fetched, no
script runs. Same inputs, same bytes.

example:
  tscale report readings.csv --clock maser.csv --clock utc_krl.csv --site site.toml --source star.toml \\
    --to TDB@BARYCENTER --output report.html
"""


def add_parser(subparsers: argparse._SubParsersAction[Any]) -> None:
    """Add the subcommand."""
    parser = subparsers.add_parser(
        "report",
        help="a conversion as one HTML page: terms, budget, pictures, provenance",
        description="Convert a column of dates and tell all about it on one HTML page. Pictures need matplotlib (the "
        "extra `plot`).",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    parser.add_argument("input", metavar="INPUT", help="CSV file with a header, or - for the standard input")
    parser.add_argument("--from", dest="start", metavar="NODE", help="what the dates are (default: as for convert)")
    parser.add_argument("--to", dest="end", metavar="NODE", required=True, help="what is wanted")
    parser.add_argument("--output", metavar="FILE", required=True, help="HTML file, or - for the standard output")
    parser.add_argument("--title", metavar="TEXT", default="", help="of the page")
    parser.add_argument("--rows", metavar="N", type=int, default=20, help="results to list (%(default)s)")
    parser.add_argument("--no-pictures", action="store_true", help="tables alone; needs no matplotlib")
    add_stated(parser)
    add_observer(parser)
    add_text(parser)
    add_tables(parser)
    parser.set_defaults(run=run)


def run(args: argparse.Namespace) -> int:
    """Write the page."""
    from ..errors import ExtrapolationWarning, InvalidInput, TscaleError
    from ..report import report_html

    if not args.no_pictures:
        from ..plots import check_picture

        check_picture("report.svg")  # before any work
    if not is_standard_output(args.output) and Path(args.output).suffix.lower() not in (".html", ".htm"):
        raise InvalidInput(f"{args.output} cannot be a report: the name must end in .html or .htm")
    (chain,) = supplied(args).chains([args.end])
    lines: list[int] = []
    t = dates_of_input(args, chain.start.scale.name, chain.reference.leap_seconds, lines)
    name = "the standard input" if args.input == "-" else Path(args.input).name
    try:
        with warnings.catch_warnings():
            warnings.simplefilter("ignore", ExtrapolationWarning)  # the notes say the same
            page = report_html(
                chain,
                t,
                title=args.title,
                name=name,
                rows=args.rows,
                lines=lines,
                pictures=not args.no_pictures,
                stated=stated_of(args),
                spoken=spoken,
            )
            notes = chain.notes(t)
    except TscaleError as error:
        if error.mask is not None and error.mask.shape == t.shape and error.mask.any() and error.row is None:
            error.row, error.path = lines[int(error.mask.argmax())], Path(args.input)
        raise
    with written(args.output) as target:
        target.write(page)
    for text in notes:
        note(text)
    return 0
