"""`tscale convert`: a column of dates carried to other scales and places, row by row."""

from __future__ import annotations

import argparse
import contextlib
import io
import os
import re
import sys
import warnings
from collections.abc import Iterator, Sequence
from typing import TYPE_CHECKING, Any, Final, TextIO

from .options import add_observer, add_tables, clocks_of, observer_of, reference_of, source_of

if TYPE_CHECKING:
    from ..chains import Chain
    from ..errors import TscaleError
    from ..files import DelimitedReader, RowBlock
    from ..tables.clock_log import ClockLog
    from ..tables.reference import ReferenceData

__all__ = ["add_parser", "run"]

_BLOCK_ROWS: Final = 65536  # rows in memory at a time
_TERM_DIGITS: Final = 15
_LAYOUTS: Final = ("iso", "mjd", "jd", "seconds")
_SUFFIX: Final = {"iso": "", "mjd": " (MJD)", "jd": " (JD)", "seconds": " (s)"}

_EPILOG: Final = """\
A node is a scale, or a scale at a place: UTC, UTC(k), CLOCK(name), UT1, TAI, TT, TT(BIPMyy), GPS, GST, BDT, GLONASS,
TCG, TCB, TDB; @TOPOCENTER, @GEOCENTER, @BARYCENTER. At one place the same event gets another date. Another place is
where the signal of the source is dated, and needs the source.

INPUT is comma-separated text (UTF-8) with a header line. Its columns are copied as they stand and new ones are put
behind them. Lines that begin with # and blank lines are copied. OUTPUT is renamed into place when all went well, so it
may be INPUT itself. On the standard output rows appear as they are done; the exit status tells whether all were.

Layouts of dates: iso is ISO 8601 with up to 18 decimals; mjd and jd are decimal numbers, read and written digit by
digit, with a UTC day that ends with a leap second 86401 s long; seconds counts from 2000-01-01T12:00:00 of the scale.

examples:
  tscale convert readings.csv out.csv --to TDB --site site.toml
  tscale convert readings.csv out.csv --clock maser.csv --clock utc_krl.csv --site site.toml --to TCB --to TDB --ledger
  tscale convert - - --input-format mjd --from TT --to TDB@GEOCENTER < dates.csv
"""

_OPTION_FOR: Final = {
    "site=": "--site FILE (or --orbit FILE)",
    "source=": "--source FILE (or --ra and --dec)",
    "clocks=": "--clock FILE",
    "tt_bipm=": "--tt-bipm FILE",
}


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
    parser.add_argument("input", metavar="INPUT", help="CSV file with a header, or - for the standard input")
    parser.add_argument("output", metavar="OUTPUT", help="CSV file, or - for the standard output")
    parser.add_argument(
        "--from", dest="start", metavar="NODE", help="what the dates are (default: the first --clock, else UTC)"
    )
    parser.add_argument(
        "--to", dest="ends", metavar="NODE", action="append", required=True, help="what is wanted; repeatable"
    )
    parser.add_argument("--ledger", action="store_true", help="add a column for every term, in seconds")
    parser.add_argument("--sigma", action="store_true", help="add the standard uncertainty of every result, in seconds")
    parser.add_argument(
        "--rate",
        action="store_true",
        help="add d(result)/d(reading) - 1: for a signal, a frequency at the start is 1 + rate times that at the end",
    )
    add_observer(parser)
    text = parser.add_argument_group("text")
    text.add_argument("--column", metavar="NAME", help="column with the dates (default: the first)")
    text.add_argument("--delimiter", metavar="CHAR", default=",", help="also: comma, semicolon, tab, pipe")
    text.add_argument("--input-format", choices=_LAYOUTS, default="iso", help="layout of the dates read (%(default)s)")
    text.add_argument("--output-format", choices=_LAYOUTS, default="iso", help="of those written (%(default)s)")
    text.add_argument(
        "--digits", metavar="N", type=int, help="decimals written, to 18 (12 of a second, 17 of a day: 1 ps)"
    )
    text.add_argument("--no-progress", action="store_true", help="no progress bar")
    text.add_argument("--quiet", action="store_true", help="no summary")
    add_tables(parser)
    parser.set_defaults(run=run)


def run(args: argparse.Namespace) -> int:
    """Convert a file."""
    from ..chains import chain
    from ..errors import InvalidInput, MissingPiece
    from ..files import DelimitedReader, replaced
    from ..files.date_text import default_digits
    from ..files.delimited import delimiter_of
    from ..formats.decimals import check_digits

    digits = default_digits(args.output_format) if args.digits is None else check_digits(args.digits)
    if len(set(args.ends)) != len(args.ends):
        raise InvalidInput(f"each --to is given once; got {', '.join(args.ends)}")
    reference = reference_of(args)
    clocks = clocks_of(args, reference)
    site, source = observer_of(args, reference), source_of(args)
    start = args.start if args.start is not None else (clocks[0].scale if clocks else "UTC")
    try:
        chains = [
            chain(
                start,
                end,
                site=site,
                clocks=clocks,
                source=source,
                reference=reference,
                second_order=args.second_order,
            )
            for end in args.ends
        ]
    except MissingPiece as error:
        options = [option for word, option in _OPTION_FOR.items() if word in str(error)]
        hint = f" (on the command line: {', '.join(options)})" if options else ""
        raise MissingPiece(f"{error}{hint}") from error
    report = sys.stderr if args.output == "-" else sys.stdout
    with _opened(args.input) as (stream, name, size):
        reader = DelimitedReader(stream, name, column=args.column, delimiter=delimiter_of(args.delimiter))
        work = _Conversion(args, reader, chains, clocks, reference, digits)
        with contextlib.nullcontext(sys.stdout) if args.output == "-" else replaced(args.output) as target:
            work.copy(target, size)
    if not args.quiet:
        print(work.summary(), file=report)
    return 0


@contextlib.contextmanager
def _opened(path: str) -> Iterator[tuple[TextIO, str, int | None]]:
    """Lines of the input with their ends, its name for messages, and its size in bytes if it has one."""
    if path == "-":
        yield io.TextIOWrapper(sys.stdin.buffer, encoding="utf-8", newline=""), "<stdin>", None
        return
    with open(path, encoding="utf-8", newline="") as stream:
        yield stream, path, os.fstat(stream.fileno()).st_size or None


class _Conversion:
    """One run over one input."""

    def __init__(
        self,
        args: argparse.Namespace,
        reader: DelimitedReader,
        chains: Sequence[Chain],
        clocks: Sequence[ClockLog],
        reference: ReferenceData,
        digits: int,
    ) -> None:
        self.args = args
        self.reader = reader
        self.chains = chains
        self.clocks = clocks
        self.reference = reference
        self.digits = digits
        self.delimiter = reader.delimiter
        self.names = [f"{chain.end}{_SUFFIX[args.output_format]}" for chain in chains]
        self.rows = 0
        self.notes: dict[str, list[int]] = {}
        self.first: dict[str, Any] = {}

    def copy(self, target: TextIO, size: int | None) -> None:
        """Read, convert and write block by block."""
        from tqdm import tqdm

        from ..errors import DataFileError, TscaleError

        silent = self.args.no_progress or not sys.stderr.isatty()
        # The bar appears only when the work takes longer than a second.
        with tqdm(total=size, unit="B", unit_scale=True, delay=1.0, disable=silent, leave=False) as bar:
            for block in self.reader.blocks(_BLOCK_ROWS):
                if not len(block):  # comments at the end
                    target.write(block.merged([], self.reader.newline) if self.rows else "")
                    continue
                try:
                    columns = self._columns(block)
                except TscaleError as error:
                    _point_to_line(error, block, self.reader.name)
                    raise
                if not self.rows:
                    self._write_header(target, list(columns))
                endings = ["".join(parts) for parts in zip(*self._separated(columns.values()), strict=True)]
                target.write(block.merged(endings, self.reader.newline))
                self.rows += len(block)
                bar.update(sum(map(len, block.texts)) + len(block))
        if not self.rows:
            raise DataFileError("there are no rows below the header", path=self.reader.name)

    def _separated(self, columns: Any) -> Iterator[list[str]]:
        for column in columns:
            yield [self.delimiter + text for text in column]

    def _columns(self, block: RowBlock) -> dict[str, list[str]]:
        """New columns by name."""
        from ..errors import ExtrapolationWarning
        from ..files.date_text import fixed_decimals, read_dates, write_dates
        from .walk import Walk, add_notes

        args, leap_seconds = self.args, self.reference.leap_seconds
        with warnings.catch_warnings():
            # The notes say the same, once for the whole file.
            warnings.simplefilter("ignore", ExtrapolationWarning)
            t = read_dates(block.column, args.input_format, self.chains[0].start.scale.name, leap_seconds=leap_seconds)
            results = [chain(t) for chain in self.chains]
            walk = Walk(self.chains, t)
            columns = {
                name: write_dates(result, args.output_format, self.digits, leap_seconds=leap_seconds)
                for name, result in zip(self.names, results, strict=True)
            }
            if args.sigma:
                for name, sigma in zip(self._ends(), walk.sigma_s(), strict=True):
                    columns[f"sigma {name} (s)"] = [f"{value:.3e}" for value in sigma.tolist()]
            if args.rate:
                for name, chain in zip(self._ends(), self.chains, strict=True):
                    columns[f"rate {name}"] = [f"{value:.17e}" for value in chain.rate(t).tolist()]
            if args.ledger:
                for name, value in walk.terms().items():
                    columns[f"{name} (s)"] = fixed_decimals(value, _TERM_DIGITS)
            add_notes(self.notes, walk.notes())
        if not self.rows:
            self.first = {
                "first": t[:1],
                "first_text": block.column[0].strip(),
                "first_line": block.lines[0],
                "results": [(end, columns[name][0]) for end, name in zip(self._ends(), self.names, strict=True)],
            }
        return columns

    def _ends(self) -> list[str]:
        return [str(chain.end) for chain in self.chains]

    def _write_header(self, target: TextIO, names: list[str]) -> None:
        from ..errors import DataFileError
        from ..files.delimited import encode_row

        taken = [name for name in names if name in self.reader.header]
        if taken:
            raise DataFileError(
                f"the header already has a column {', '.join(taken)}, which would be written again; rename it first",
                path=self.reader.name,
            )
        end = self.reader.newline
        target.write("".join(line + end for line in self.reader.preamble))
        target.write(self.delimiter.join([self.reader.header_text, encode_row(names, self.delimiter)]) + end)

    def summary(self) -> str:
        """Say what was done."""
        from ..errors import ExtrapolationWarning
        from .summary import summary

        with warnings.catch_warnings():
            warnings.simplefilter("ignore", ExtrapolationWarning)
            return summary(
                self.chains,
                self.clocks,
                self.reference,
                rows=self.rows,
                notes=self.notes,
                source=self.reader.name,
                target="<stdout>" if self.args.output == "-" else self.args.output,
                **self.first,
            )


def _point_to_line(error: TscaleError, block: RowBlock, name: str) -> None:
    """Tell an error that marks a row of the block the line it stands on."""
    import numpy as np

    mask = error.mask
    if error.path is not None or mask is None or mask.shape != (len(block),) or not mask.any():
        return
    first = int(np.flatnonzero(mask)[0])
    # Items are counted within the block, which is nothing to a reader of the file.
    message = re.sub(r" \(item \d+\)", "", str(error))
    text = block.column[first].strip()
    error.args = (message if repr(text) in message else f"{text!r}: {message}",)
    error.path, error.row = type(error)("", path=name).path, block.lines[first]
