"""One HDU written anew: its header, its rows block by block, what follows them, and its sums."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Sequence
from contextvars import Context, copy_context
from dataclasses import dataclass
from typing import Any, BinaryIO, Final

import numpy as np

from ..errors import DataFileError, InvalidInput, TscaleError
from ..exact import FloatArray
from ..files.stream import Evaluator, in_order
from . import checksum
from .cards import Cards
from .frame import TimeFrame
from .plan import Part
from .reading import TimeColumn, block_rows, row_blocks
from .rewrite import Target, end_frame, rewritten

__all__ = ["ConvertedColumn", "HduWriter", "Progress", "copy_bytes"]

_BLOCK_BYTES: Final = 1 << 23


@dataclass(frozen=True)
class ConvertedColumn:
    """A column that was carried.

    Attributes
    ----------
    extension, column : str
    rows : int
    undefined : int
        Rows without a time (NaN), which stay so.
    spacing_s : float
        How far apart neighbouring float64 numbers are at the largest time of the column, s: a time is stored to half
        of it.
    """

    extension: str
    column: str
    rows: int
    undefined: int
    spacing_s: float


class Progress:
    """Tells how many rows of all are done."""

    def __init__(self, tell: Callable[[int, int], None] | None, total: int) -> None:
        self._tell, self._total, self._done = tell, total, 0

    def add(self, rows: int) -> None:
        """Rows more are done."""
        self._done += rows
        if self._tell is not None:
            self._tell(self._done, self._total)


class HduWriter:
    """Writes one HDU."""

    def __init__(
        self, part: Part, frame: TimeFrame, target: Target, made: Sequence[str], evaluate: Evaluator, threads: int
    ) -> None:
        self.part, self.hdu = part, part.hdu
        self.columns = part.columns
        self.target, self.evaluate, self.threads = target, evaluate, threads
        self.cards, self.notes = rewritten(part.cards, frame, [found.column for found in part.columns], target)
        self.after = [end_frame(found.frame, target).column_reckoning for found in part.columns]
        self.made = made
        self.largest = [0.0] * len(part.columns)
        self.undefined = [0] * len(part.columns)
        self._summing = "DATASUM" in self.cards or "CHECKSUM" in self.cards
        self._total, self._spare = 0, b""

    def write(self, file: BinaryIO, out: BinaryIO, told: Progress) -> list[ConvertedColumn]:
        """Write at the end of `out`; the header comes last, for it tells of the rows."""
        at = out.tell()
        out.write(self._header().to_bytes())
        if self.columns:
            for data, largest, undefined in in_order(self._in_context, self._items(file), self.threads):
                self._put(out, memoryview(data.reshape(-1)))
                self.largest = [max(pair) for pair in zip(self.largest, largest, strict=True)]
                self.undefined = [sum(pair) for pair in zip(self.undefined, undefined, strict=True)]
                told.add(len(data))
            self._put_rest(file, out, self.hdu.data + self.hdu.rows * self.hdu.row_bytes)
        else:
            self._put_rest(file, out, self.hdu.data)
        end = out.tell()
        out.seek(at)
        out.write(self._summed(self._header()).to_bytes())
        out.seek(end)
        return self._results()

    def _put(self, out: BinaryIO, raw: Any) -> None:
        out.write(raw)
        if self._summing:
            if self._spare:  # of rows whose last block is no whole words
                raw = self._spare + bytes(raw)
            whole = len(raw) // 4 * 4
            self._total = checksum.added(self._total, checksum.summed(raw[:whole]))
            self._spare = bytes(raw[whole:])

    def _put_rest(self, file: BinaryIO, out: BinaryIO, start: int) -> None:
        """What follows the rows: variable-length data and padding."""
        file.seek(start)
        left = self.hdu.end - start
        while left:
            raw = file.read(min(_BLOCK_BYTES, left))
            if not raw:
                raise self.cards.fault("the file became shorter while it was read")
            self._put(out, raw)
            left -= len(raw)

    def _items(self, file: BinaryIO) -> Iterator[tuple[Context, tuple[int, Any]]]:
        # Each with the context of this thread, so that what is extrapolated is gathered from all threads.
        for block in row_blocks(file, self.hdu, block_rows(self.hdu)):
            yield copy_context(), block

    def _in_context(self, item: tuple[Context, tuple[int, Any]]) -> tuple[Any, list[float], list[int]]:
        return item[0].run(self._carried, item[1])

    def _carried(self, item: tuple[int, Any]) -> tuple[Any, list[float], list[int]]:
        first, rows = item
        largest, undefined = [], []
        for found, after in zip(self.columns, self.after, strict=True):
            numbers = found.numbers(rows)
            gone = np.isnan(numbers)
            some = bool(gone.any())
            chosen = numbers[~gone] if some else numbers
            new = self._new(found, after, chosen, first, gone)
            column = found.column
            # In its place, big-endian; undefined ones keep their bytes.
            place = rows[:, column.offset : column.offset + column.width]
            raw = new.astype(">f8").view(np.uint8).reshape(-1, 8)
            if some:
                place[~gone] = raw
            else:
                place[:] = raw
            largest.append(float(np.max(np.abs(new), initial=0.0)))
            undefined.append(int(np.count_nonzero(gone)))
        return rows, largest, undefined

    def _new(self, found: TimeColumn, after: Any, numbers: FloatArray, first: int, gone: Any) -> FloatArray:
        try:
            if np.isinf(numbers).any():
                raise InvalidInput("a time is infinite", mask=np.isinf(numbers))
            return np.asarray(after.numbers(self.evaluate(found.frame.count(numbers))), dtype=np.float64)
        except TscaleError as error:
            at = ""
            if error.mask is not None and error.mask.any():
                at = f" row {first + int(np.flatnonzero(~gone)[int(np.argmax(error.mask))]) + 1},"
            error.args = (f"{self.hdu.cards.path}, {self.hdu.title}, column {found.column.name},{at} {error}",)
            error.path = error.path or self.hdu.cards.path
            raise

    def _header(self) -> Cards:
        made = self.cards.copy()
        lines = [*self.made]
        for at, found in enumerate(self.columns):
            # Short, so that each stays one card: they are written before the rows are known, and again behind them.
            name = f"column {found.column.name[:16]}"
            lines.append(f"{name}: numbers up to {self.after[at].spacing_s(self.largest[at]):.2e} s apart")
            lines.append(f"{name}: rows without a time: {self.undefined[at]}")
        made.add_history(lines)
        return made

    def _summed(self, made: Cards) -> Cards:
        if "DATASUM" in made:
            made.set("DATASUM", str(self._total), "data unit checksum")
        if "CHECKSUM" in made:
            made.set("CHECKSUM", checksum.BLANK_CHECKSUM, "HDU checksum")
            whole = checksum.added(checksum.summed(made.to_bytes()), self._total)
            made.set("CHECKSUM", checksum.encoded(whole), "HDU checksum")
        return made

    def _results(self) -> list[ConvertedColumn]:
        return [
            ConvertedColumn(
                self.hdu.title,
                found.column.name,
                self.hdu.rows,
                self.undefined[at],
                self.after[at].spacing_s(self.largest[at]),
            )
            for at, found in enumerate(self.columns)
        ]


def copy_bytes(file: BinaryIO, out: BinaryIO, start: int, end: int) -> None:
    """Copy a part of a file as it is."""
    file.seek(start)
    left = end - start
    while left:
        raw = file.read(min(_BLOCK_BYTES, left))
        if not raw:
            raise DataFileError("the file became shorter while it was read")
        out.write(raw)
        left -= len(raw)
