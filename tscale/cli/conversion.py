"""One run of `tscale convert` over one input: read, convert and write, block by block."""

from __future__ import annotations

import argparse
import json
import re
import sys
import warnings
from collections.abc import Iterable, Iterator, Sequence
from pathlib import Path
from typing import Any, Final, TextIO

import numpy as np

from ..chains import Chain
from ..earth.observer import Observer
from ..errors import DataFileError, ExtrapolationWarning, OutOfSpan, TextError, TscaleError
from ..files.date_text import fixed_decimals, read_dates, write_dates
from ..files.delimited import DelimitedReader, RowBlock, delimiter_hint, encode_row
from ..instants import Instants
from ..provenance import provenance_of
from ..tables.clock_log import ClockLog
from ..tables.reference import ReferenceData
from .project import from_project
from .streams import Input, is_standard_output
from .summary import record, summary, unused
from .walk import Walk, add_notes, note_texts

__all__ = ["Conversion"]

_BLOCK_ROWS: Final = 65536  # rows in memory at a time
_TERM_DIGITS: Final = 15
_GIVEN: Final = ("site", "orbit", "source", "clock", "tt_bipm")
_SUFFIX: Final = {"iso": "", "mjd": " (MJD)", "jd": " (JD)", "seconds": " (s)", "spreadsheet": ""}

# How errors that count the values of an array speak of a single one.
_OF_ONE: Final = (
    (r"^1 of 1 texts are not (date|decimal number)s; the first \(item 0\) is (['\"]).*?\2: ", r"is no \1: "),
    (r"^1 of 1 labels do not exist", "does not exist"),
    (r"^1 of 1 events at (.+?) are ", r"the event at \1 is "),
    (r"^1 of 1 \w+ are ", "is "),
    (r"^1 of 1 \w+ lie ", "lies "),
    (r"^1 of 1 \w+ ", ""),
    (r"first, item 0: |the first \(item 0\) is ", "it is "),
    (r" ?\(item 0\)", ""),
    (r": 1 (outside|in a gap|skipped)", r": \1"),
)


class Conversion:
    """One run over one input."""

    def __init__(
        self,
        args: argparse.Namespace,
        source: Input,
        reader: DelimitedReader,
        chains: Sequence[Chain],
        clocks: Sequence[ClockLog],
        site: Observer | None,
        digits: int,
    ) -> None:
        self.args = args
        self.source = source
        self.reader = reader
        self.chains = chains
        self.clocks = clocks
        self.site = site
        self.reference: ReferenceData = chains[0].reference
        self.digits = digits
        self.delimiter = reader.delimiter
        self.ends = [str(chain.end) for chain in chains]
        self.names = [f"{end}{_SUFFIX[args.output_format]}" for end in self.ends]
        self.rows = 0
        self._notes: dict[str, list[int]] = {}
        self.first: dict[str, Any] = {}

    def copy(self, target: TextIO) -> None:
        """Read, convert and write block by block."""
        from tqdm import tqdm

        self._check_header()
        silent = self.args.no_progress or sys.stderr is None or not sys.stderr.isatty()
        # The bar appears only when the work takes longer than a second.
        with tqdm(total=self.source.size, unit="B", unit_scale=True, delay=1.0, disable=silent, leave=False) as bar:
            for block in self.reader.blocks(_BLOCK_ROWS, self.source.ready):
                if not len(block):  # comments at the end
                    target.write(block.merged([], self.reader.newline) if self.rows else "")
                    continue
                try:
                    columns = self._columns(block)
                except TscaleError as error:
                    raise self._on_its_line(error, block) from error
                if not self.rows:
                    self._write_header(target, list(columns))
                endings = ["".join(parts) for parts in zip(*self._separated(columns.values()), strict=True)]
                target.write(block.merged(endings, self.reader.newline))
                if self.source.ready is not None:
                    target.flush()
                self.rows += len(block)
                bar.update(sum(map(len, block.texts)) + len(block))
        if not self.rows:
            raise DataFileError("there are no rows below the header", path=self.reader.name)

    def _separated(self, columns: Iterable[list[str]]) -> Iterator[list[str]]:
        for column in columns:
            yield [self.delimiter + text for text in column]

    def _read(self, texts: Sequence[str]) -> Instants:
        scale = self.chains[0].start.scale.name
        return read_dates(texts, self.args.input_format, scale, leap_seconds=self.reference.leap_seconds)

    def _check_header(self) -> None:
        """A file without a header would lose its first reading."""
        with warnings.catch_warnings():
            warnings.simplefilter("ignore", ExtrapolationWarning)
            try:
                self._read([self.reader.column])
            except OutOfSpan:
                pass  # a date all the same
            except TextError:
                return
        raise DataFileError(
            f"the first line holds a date, {self.reader.column!r}, where the header should be: put a line with the "
            "names of the columns above it",
            path=self.reader.name,
            row=self.reader.header_line,
        )

    def _columns(self, block: RowBlock) -> dict[str, list[str]]:
        """New columns by name."""
        args = self.args
        with warnings.catch_warnings():
            # The notes say the same, once for the whole file.
            warnings.simplefilter("ignore", ExtrapolationWarning)
            t = self._read(block.column)
            results = [chain(t) for chain in self.chains]
            walk = Walk(self.chains, t)
            columns = {
                name: write_dates(result, args.output_format, self.digits, leap_seconds=self.reference.leap_seconds)
                for name, result in zip(self.names, results, strict=True)
            }
            if args.output_format == "spreadsheet":  # its quotes are part of the cell
                columns = {
                    name: [encode_row([text], self.delimiter) for text in texts] for name, texts in columns.items()
                }
            if args.sigma:
                statuses = walk.statuses(self.reference, self.site, self.clocks)
                for name, sigma, status in zip(self.ends, walk.sigma_s(), statuses, strict=True):
                    columns[f"sigma {name} (s)"] = [f"{value:.3e}" for value in sigma.tolist()]
                    columns[f"status {name}"] = status
            if args.rate:
                for name, chain in zip(self.ends, self.chains, strict=True):
                    columns[f"rate {name}"] = [f"{value:.17e}" for value in chain.rate(t).tolist()]
            if args.ledger:
                for name, value in walk.terms().items():
                    columns[f"{name} (s)"] = fixed_decimals(value, _TERM_DIGITS)
            notes = walk.notes()
        add_notes(self._notes, notes)
        if not self.rows:
            self.first = {
                "first": t[:1],
                "first_text": block.column[0].strip(),
                "first_line": block.lines[0],
                "results": [(end, columns[name][0]) for end, name in zip(self.ends, self.names, strict=True)],
            }
        return columns

    def _write_header(self, target: TextIO, names: list[str]) -> None:
        taken = [name for name in names if name in self.reader.header]
        if taken:
            raise DataFileError(
                f"the header already has a column {', '.join(taken)}, which would be written again; rename it first",
                path=self.reader.name,
            )
        end = self.reader.newline
        made = self._provenance_lines() if self.args.provenance else []
        target.write("".join(line + end for line in (*made, *self.reader.preamble)))
        target.write(self.delimiter.join([self.reader.header_text, encode_row(names, self.delimiter)]) + end)

    def _provenance_lines(self) -> list[str]:
        """What the results are made of; lines that several chains share stand once."""
        return list(dict.fromkeys(line for chain in self.chains for line in provenance_of(chain).header()))

    def provenance_json(self) -> str:
        """The same as JSON, with the notes on the rows."""
        results = {end: provenance_of(chain).to_dict() for end, chain in zip(self.ends, self.chains, strict=True)}
        return json.dumps(
            {"results": results, "rows": self.rows, "notes": self.notes()}, sort_keys=True, indent=2, allow_nan=False
        )

    def _on_its_line(self, error: TscaleError, block: RowBlock) -> TscaleError:
        """The same error with the line of the first row at fault, in words that speak of this row alone."""
        mask = error.mask
        if error.row is not None or mask is None or mask.shape != (len(block),) or not mask.any():
            return error
        at = int(np.flatnonzero(mask)[0])
        text = block.column[at].strip()
        try:
            self._columns(RowBlock([block.column[at]], [block.texts[at]], [block.lines[at]]))
        except TscaleError as alone:
            error = alone
        message = str(error)
        for pattern, words in _OF_ONE:
            message = re.sub(pattern, words, message, flags=re.DOTALL)
        joint = " " if message.startswith(("is ", "lies ", "cannot ", "does ")) else ": "
        hint = delimiter_hint(self.reader.header) if isinstance(error, TextError) else ""
        return type(error)(f"{text!r}{joint}{message}{hint}", path=self.reader.name, row=block.lines[at])

    def notes(self) -> list[str]:
        """What a reader of the results should know."""
        args = self.args
        # A project serves many commands: only what was given for this one should be of use here.
        mine = {name: None if name in from_project(args) else getattr(args, name) for name in _GIVEN}
        site, source = (name and Path(name).name for name in (mine["site"] or mine["orbit"], mine["source"]))
        if source is None and args.ra is not None:
            source = "--ra and --dec"
        clocks = self.clocks if mine["clock"] else []
        tt_bipm = self.reference.tt_bipm if mine["tt_bipm"] else ()
        idle = unused(self.chains, clocks, tt_bipm, site=site, source=source)
        return [*note_texts(self._notes, self.rows), *idle]

    def summary(self) -> str:
        """Say what was done, in words or (`--json`) for programs."""
        facts = {
            "rows": self.rows,
            "notes": self.notes(),
            "source": self.reader.name,
            "target": "<stdout>" if is_standard_output(self.args.output) else self.args.output,
            **self.first,
        }
        with warnings.catch_warnings():
            warnings.simplefilter("ignore", ExtrapolationWarning)
            if self.args.json:
                return json.dumps(record(self.chains, self.clocks, **facts), indent=2, allow_nan=False)
            return summary(self.chains, self.clocks, **facts)
