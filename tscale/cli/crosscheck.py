"""`tscale crosscheck`: our conversions against general libraries, or against a table of another program."""

from __future__ import annotations

import argparse
from collections.abc import Iterator
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

from .options import add_observer, add_tables
from .streams import opened, standard_output
from .supplies import supplied

if TYPE_CHECKING:
    from ..instants import Instants
    from ..tables.reference import ReferenceData

__all__ = ["add_parser", "run"]

_LAYOUTS: Final = ("iso", "mjd", "jd", "seconds", "spreadsheet")
_TABLES: Final = (".parquet", ".arrow", ".feather")
_BLOCK_ROWS: Final = 65536

_EPILOG: Final = """\
Without --table: every conversion against the same one of pyerfa, astropy and skyfield, as far as these are installed,
at random dates; with the largest difference, the rms, the drift, the tolerance, and the reason for it.

With --table: FILE holds what another program was given (--input-column) and what it gave (--output-column), row by row,
as CSV with a header, or as a Parquet or Arrow table. It is told how far that is from ours, and why: mistakes of a
catalogue (leap seconds, constants, rates, terms left out, dates rounded ...) are tried alone and together, and named
when they bring the difference down to noise.

exit status: 0 all within tolerance; 1 something is not; 2 not done. With --table the tolerance is that of --tolerance:
1 if the largest difference is beyond it. Without --tolerance nothing is asked of the differences, and the status is 0
however large they are.

examples:
  tscale crosscheck --plot residuals.png
  tscale crosscheck --only UT1 --only skyfield --count 2000
  tscale crosscheck --table pairs.csv --from UTC --to TDB@BARYCENTER --site site.toml --source star.toml
"""


def add_parser(subparsers: argparse._SubParsersAction[Any]) -> None:
    """Add the subcommand."""
    parser = subparsers.add_parser(
        "crosscheck",
        help="compare with other libraries, or with a table of another program, and say why it differs",
        description="Compare our conversions with those of general libraries, or with a table of another program.",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    parser.add_argument("--json", action="store_true", help="the result as JSON, with every difference")
    parser.add_argument("--plot", metavar="FILE", help="draw the differences (.png, .pdf or .svg)")
    general = parser.add_argument_group("libraries")
    general.add_argument(
        "--only",
        metavar="NAME",
        action="append",
        default=[],
        help="conversion (or word out of it), or package; repeatable",
    )
    general.add_argument("--start", dest="first", metavar="DATE", help="begin of the span (UTC)")
    general.add_argument("--stop", dest="last", metavar="DATE", help="end of the span (UTC)")
    general.add_argument("--count", metavar="N", type=int, help="random dates (default 300)")
    general.add_argument("--seed", metavar="N", type=int, help="of the random dates (default 1)")
    table = parser.add_argument_group("table of another program")
    table.add_argument("--table", metavar="FILE", help="CSV file with a header, or .parquet, .arrow, .feather")
    table.add_argument(
        "--input-column",
        metavar="NAME",
        help="dates it was given (default: the first column; of a Parquet or Arrow table the first of dates, "
        "as counts or timestamps)",
    )
    table.add_argument("--output-column", metavar="NAME", help="dates it gave (default: the second)")
    table.add_argument("--from", dest="start", metavar="NODE", help="what the dates are (default: as for convert)")
    table.add_argument("--to", dest="end", metavar="NODE", help="what the results are")
    table.add_argument("--input-format", choices=_LAYOUTS, default="iso", help="layout of the dates (%(default)s)")
    table.add_argument("--output-format", choices=_LAYOUTS, help="layout of the results (default: as the dates)")
    table.add_argument("--delimiter", metavar="CHAR", default=",", help="also: comma, semicolon, tab, pipe")
    table.add_argument(
        "--tolerance",
        metavar="S",
        type=float,
        help="largest difference that passes, seconds (default: any; the exit status is then 0)",
    )
    table.add_argument("--no-explain", action="store_true", help="do not look for causes")
    add_observer(parser)
    add_tables(parser)
    parser.set_defaults(run=run)


def run(args: argparse.Namespace) -> int:
    """Compare, print, and tell by the exit status."""
    from ..errors import InvalidInput

    standard_output()
    if args.plot is not None:
        from ..plots.common import check_picture

        check_picture(args.plot)
    if args.table is None:
        beside = [name for name in ("input_column", "output_column", "start", "end", "output_format", "tolerance")
                  if getattr(args, name) is not None]  # fmt: skip
        if beside or args.no_explain:
            raise InvalidInput("--table FILE is missing: the other options given belong to it")
        return _libraries(args)
    if args.only or any(getattr(args, name) is not None for name in ("first", "last", "count", "seed")):
        raise InvalidInput("--only, --start, --stop, --count and --seed are for libraries; a --table has its own dates")
    return _table(args)


def _libraries(args: argparse.Namespace) -> int:
    from ..crosscheck import libraries
    from ..earth.site import Site
    from ..errors import InvalidInput
    from .options import observer_of, reference_of, source_of

    reference = reference_of(args)
    site = observer_of(args, reference)
    if site is not None and not isinstance(site, Site):
        raise InvalidInput("libraries are compared at a place on the Earth: give --site FILE with a [site] table")
    given = {"start": args.first, "stop": args.last, "count": args.count, "seed": args.seed}
    report = libraries(
        args.only,
        **{name: value for name, value in given.items() if value is not None},
        site=site,
        source=source_of(args),
        reference=reference,
    )
    if args.plot is not None:
        from ..crosscheck.picture import libraries_figure, save_picture

        save_picture(libraries_figure(report), args.plot)
    print(report.to_json(residuals=True) if args.json else report.table())
    return 0 if report.passed else 1


def _table(args: argparse.Namespace) -> int:
    from ..crosscheck import against
    from ..crosscheck.explanation import explained
    from ..errors import InvalidInput
    from ..instants import Instants

    if args.end is None:
        raise InvalidInput("say what the results are with --to NODE, such as --to TDB@BARYCENTER")
    if args.tolerance is not None and not args.tolerance >= 0.0:
        raise InvalidInput(f"--tolerance is a number of seconds, 0 or more; got {args.tolerance}")
    given = supplied(args)
    chain = given.chains([args.end])[0]
    first, second = _pairs(args, chain.start.scale.name, chain.end.scale.name, given.reference)
    t_in = Instants(*first.pair, chain.start.scale.name, chain.start.place)
    t_out = Instants(*second.pair, chain.end.scale.name, chain.end.place)
    residuals = against(t_in, t_out, chain=chain)
    explanation = None if args.no_explain or residuals.n < 4 else explained(residuals)
    if args.plot is not None:
        from ..crosscheck.picture import residuals_figure, save_picture

        save_picture(residuals_figure(residuals, explanation, Path(args.table).name), args.plot)
    good = args.tolerance is None or residuals.max_s <= args.tolerance
    if args.json:
        print((residuals if explanation is None else explanation).to_json())
        return 0 if good else 1
    print(residuals.table())
    if explanation is not None:
        print(f"\n{explanation.table()}")
    if args.tolerance is None:
        return 0
    print(f"\n{'within' if good else 'BEYOND'} the tolerance of {args.tolerance:g} s")
    return 0 if good else 1


def _pairs(args: argparse.Namespace, start: str, end: str, reference: ReferenceData) -> tuple[Instants, Instants]:
    """Both columns of the table."""
    if args.table.lower().endswith(_TABLES) or Path(args.table).is_dir():
        return _arrow(args, start, end, reference)
    layouts = (args.input_format, args.output_format or args.input_format)
    return (
        _column(args, args.input_column, 0, layouts[0], start, reference),
        _column(args, args.output_column, 1, layouts[1], end, reference),
    )


def _column(
    args: argparse.Namespace, name: str | None, number: int, layout: str, scale: str, reference: ReferenceData
) -> Instants:
    """One column of a text, by name or number; an error names its line."""
    from ..errors import DataFileError, InvalidInput, TscaleError
    from ..files import DelimitedReader
    from ..files.date_text import read_dates
    from ..files.delimited import delimiter_of
    from ..instants import Instants

    if args.table == "-":
        raise InvalidInput("--table is read twice, once for each column: give a file in place of the standard input")
    delimiter = delimiter_of(args.delimiter)
    if name is None and number:
        with opened(args.table) as source:
            header = DelimitedReader(source.lines, source.name, delimiter=delimiter).header
        if len(header) <= number:
            raise DataFileError("the results need a second column: name it with --output-column", path=args.table)
        name = header[number]
        _not_twice(args.input_column, name)
    parts = []
    with opened(args.table) as source:
        reader = DelimitedReader(source.lines, source.name, column=name, delimiter=delimiter)
        for block in reader.blocks(_BLOCK_ROWS, source.ready):
            if not len(block):
                continue
            try:
                parts.append(read_dates(block.column, layout, scale, leap_seconds=reference.leap_seconds))
            except TscaleError as error:
                if error.mask is not None and error.mask.any():
                    error.row = block.lines[int(error.mask.argmax())]
                error.path = error.path or Path(source.name)
                raise
    if not parts:
        raise DataFileError("there are no rows below the header", path=args.table)
    return Instants.concatenate(parts)


def _arrow(args: argparse.Namespace, start: str, end: str, reference: ReferenceData) -> tuple[Instants, Instants]:
    from ..errors import DataFileError, InvalidInput
    from ..files.arrow_columns import agreed, find_dates, pair_of
    from ..files.table_files import TableReader
    from ..instants import Instants
    from ..scales import Node, Scale

    reader = TableReader(args.table)
    there = _date_columns(reader.schema)
    if len(there) < 2 and None in (args.input_column, args.output_column):
        raise InvalidInput(
            f"{args.table}: columns of dates as counts or timestamps are {', '.join(there) or 'none'}, and two are "
            "needed; name both columns of the table, with --input-column and --output-column (texts go that way too)"
        )
    first, second = args.input_column or there[0], args.output_column or there[1]
    _not_twice(first, second)

    def column(name: str, scale: str) -> Instants:
        found = find_dates(reader.schema, name)
        agreed(found, Node(Scale.parse(scale), None))

        def parts() -> Iterator[Instants]:
            for _, batch in reader.batches(_BLOCK_ROWS):
                yield Instants(*pair_of(batch, found, scale, reference.leap_seconds), scale)

        made = list(parts())
        if not made:
            raise DataFileError("the table has no rows", path=args.table)
        return Instants.concatenate(made)

    return column(first, start), column(second, end)


def _date_columns(schema: Any) -> list[str]:
    """Names of the columns of dates in their order: pairs of counts by their common name, and timestamps."""
    from ..files.arrow_columns import find_dates

    names = [name.removesuffix("_whole_s") for name in schema.names if not name.endswith("_fraction_s")]
    found = []
    for name in dict.fromkeys(names):
        pair = f"{name}_whole_s" in schema.names and f"{name}_fraction_s" in schema.names
        if pair or str(schema.field(name).type).startswith("timestamp"):
            found.append(find_dates(schema, name).name)
    return found


def _not_twice(given: str | None, gave: str) -> None:
    from ..errors import InvalidInput

    if given == gave:
        raise InvalidInput(f"--input-column and --output-column are both {gave!r}: name two different columns")
