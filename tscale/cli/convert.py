"""`tscale convert`: a column of dates carried to other scales and places, row by row."""

from __future__ import annotations

import argparse
import sys
from typing import Any, Final

from .convert_table import is_table, run_table
from .options import add_observer, add_tables
from .streams import is_standard_output, note, opened, standard_output, written
from .supplies import supplied

__all__ = ["add_parser", "run"]

_OTHER_KINDS: Final = (".xlsx", ".xls", ".ods", ".gz", ".bz2", ".xz", ".zip", ".zst", ".fits", ".json", ".h5")
_LAYOUTS: Final = ("iso", "mjd", "jd", "seconds", "spreadsheet")

_EPILOG: Final = """\
A node is a scale, or a scale at a place: UTC, UTC(k), CLOCK(name), UT1, TAI, TT, TT(BIPMyy), GPS, GST, BDT, GLONASS,
TCG, TCB, TDB; @TOPOCENTER, @GEOCENTER, @BARYCENTER. At one place the same event gets another date. Another place is
where the signal of the source is dated, and needs the source.

INPUT is comma-separated text (UTF-8) with a header line. Its columns are copied as they stand and new ones are put
behind them. Lines that begin with # and blank lines are copied, a mark of byte order is dropped, and every line ends as
the first one does (CRLF, or else LF). OUTPUT is renamed into place when all went well, so it may be INPUT itself. On
the standard output and in a pipe rows appear as they come in; the exit status tells whether all were done.

INPUT may also be a Parquet or Arrow table (.parquet, .arrow, .feather), or a folder of such. Its dates are a column
NAME in two, NAME_whole_s (int64) and NAME_fraction_s (float64), timestamps, or texts; results are two columns each.
OUTPUT is a table too, or a folder that is filled part by part: work broken off goes on there where it was.

Layouts of dates: iso is ISO 8601 with up to 18 decimals; mjd and jd are decimal numbers, read and written digit by
digit, with a UTC day that ends with a leap second 86401 s long; seconds counts from 2000-01-01T12:00:00 of the scale;
spreadsheet is ISO 8601 as ="...", which spreadsheet programs leave alone.

--sigma adds `sigma NODE (s)` and `status NODE` (in a table `NODE_sigma_s` and `NODE_status`). The status names the
worst that the result rests on: Earth orientation that was measured, predicted, or held past the end of its table; then,
with + between, `clock predicted` past the comparisons of a log that the project predicts, and `expired` where UTC is
past the expiry of the leap seconds; none where nothing of this matters. Notes on it end the summary, or go to the error
stream with --quiet.

The summary goes to the standard output, or to the error stream where the rows go there. --project FILE names a TOML
file with what many commands share; names of files in it are meant from its own folder:

  site = "site.toml"                            # or orbit
  clocks = ["maser.csv", "utc_krl.csv"]
  source = "source.toml"
  earth_orientation = "finals2000A.all"         # and leap_seconds, tt_bipm, ephemeris, time_ephemeris
  solid_tide = true                             # and sub_daily, second_order, interpolation, max_gap_s
  [noise.maser]                                 # Allan deviations at 1 s, for its uncertainty between comparisons
  white_frequency = 2e-13
  flicker_frequency = 3e-15                     # and random_walk_frequency, white_phase_s
  [predict.maser]                               # past its last comparison, by the rate of the last fit_s seconds
  fit_s = 864000
  until = "2025-04-01"                          # and start, drift

examples:
  tscale convert readings.csv out.csv --to TDB --site site.toml
  tscale convert readings.csv out.csv --clock maser.csv --clock utc_krl.csv --site site.toml --to TCB --to TDB --ledger
  tscale convert readings.csv out.csv --project ridge.toml --to TDB@BARYCENTER --sigma --json
  tscale convert - - --input-format mjd --from TT --to TDB@GEOCENTER < dates.csv
"""


def add_parser(subparsers: argparse._SubParsersAction[Any]) -> None:
    """Add the subcommand."""
    parser = subparsers.add_parser(
        "convert",
        help="carry a column of dates to other scales and places",
        description="Read a column of dates and write it again with the same dates on other scales or at other places.",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    parser.add_argument(
        "input", metavar="INPUT", help="CSV file with a header, a Parquet or Arrow table, or - for the standard input"
    )
    parser.add_argument("output", metavar="OUTPUT", help="CSV, Parquet or Arrow file, or - for the standard output")
    parser.add_argument(
        "--from",
        dest="start",
        metavar="NODE",
        help="what the dates are (default: UTC, or the clock of --clock that is no other's reference)",
    )
    parser.add_argument(
        "--to", dest="ends", metavar="NODE", action="append", default=[], help="what is wanted; repeatable"
    )
    parser.add_argument("--ledger", action="store_true", help="add a column for every term, in seconds")
    parser.add_argument(
        "--sigma", action="store_true", help="add the standard uncertainty of every result, and its status"
    )
    parser.add_argument(
        "--rate",
        action="store_true",
        help="add d(result)/d(reading) - 1: for a signal, a frequency at the start is 1 + rate times that at the end",
    )
    parser.add_argument(
        "--provenance",
        action="store_true",
        help="put comment lines at the head of OUTPUT: steps, tables with checksums, versions",
    )
    parser.add_argument("--provenance-file", metavar="FILE", help="write the same to FILE, as JSON")
    add_observer(parser)
    text = parser.add_argument_group("text")
    text.add_argument("--column", metavar="NAME", help="column with the dates (default: the first)")
    text.add_argument("--delimiter", metavar="CHAR", default=",", help="also: comma, semicolon, tab, pipe")
    text.add_argument("--input-format", choices=_LAYOUTS, default="iso", help="layout of the dates read (%(default)s)")
    text.add_argument("--output-format", choices=_LAYOUTS, default="iso", help="of those written (%(default)s)")
    text.add_argument(
        "--digits", metavar="N", type=int, help="decimals written, to 18 (12 of a second, 17 of a day: 1 ps)"
    )
    tables = parser.add_argument_group("Parquet and Arrow tables")
    tables.add_argument(
        "--compiled",
        metavar="FILE",
        action="append",
        default=[],
        help="a chain compiled by `tscale compile`, in place of --from and --to; needs no tables. Repeatable",
    )
    tables.add_argument("--threads", metavar="N", type=int, default=1, help="blocks worked on at once (%(default)s)")
    text.add_argument("--no-progress", action="store_true", help="no progress bar")
    says = parser.add_argument_group("what is said").add_mutually_exclusive_group()
    says.add_argument("--quiet", action="store_true", help="no summary; notes on the error stream")
    says.add_argument("--json", action="store_true", help="the summary as JSON")
    add_tables(parser)
    parser.set_defaults(run=run)


def run(args: argparse.Namespace) -> int:
    """Convert a file."""
    from ..errors import InvalidInput
    from ..files import DelimitedReader
    from ..files.date_text import default_digits
    from ..files.delimited import delimiter_of
    from ..formats.decimals import check_digits
    from .conversion import Conversion

    if not (args.ends or args.compiled):
        raise InvalidInput("say what is wanted with --to NODE, such as --to TDB")
    if is_table(args.input, args.output):
        return run_table(args)
    other = next((end for end in _OTHER_KINDS if args.output.lower().endswith(end)), None)
    if other is not None:
        raise InvalidInput(
            f"OUTPUT {args.output} would be text under a name of {other}: end it in .csv, .parquet or .arrow"
        )
    if args.compiled or args.threads != 1:
        raise InvalidInput("--compiled and --threads are for tables that end in .parquet, .arrow or .feather")
    digits = default_digits(args.output_format) if args.digits is None else check_digits(args.digits)
    if len(set(args.ends)) != len(args.ends):
        raise InvalidInput(f"each --to is given once; got {', '.join(args.ends)}")
    if args.provenance_file is not None and args.provenance_file in (args.input, args.output):
        raise InvalidInput(
            f"--provenance-file {args.provenance_file} is the input or the output; give it a name of its own"
        )
    if not (args.input and args.output):
        raise InvalidInput("INPUT and OUTPUT are names of files, or - for the standard streams; one given is empty")
    # Asked for before any work, so that a closed one is found out first.
    to_stream = is_standard_output(args.output)
    report = sys.stderr if args.quiet or to_stream else standard_output()
    given = supplied(args)
    chains = given.chains(args.ends)
    with opened(args.input) as source_lines:
        delimiter = delimiter_of(args.delimiter)
        reader = DelimitedReader(source_lines.lines, source_lines.name, column=args.column, delimiter=delimiter)
        work = Conversion(args, source_lines, reader, chains, given.clocks, given.site, digits)
        with written(args.output) as target:
            work.copy(target)
    if args.provenance_file is not None:
        with written(args.provenance_file) as target:
            target.write(work.provenance_json() + "\n")
    if args.quiet:
        for text in work.notes():
            note(text)
    elif report is not None:
        print(work.summary(), file=report)
    return 0
