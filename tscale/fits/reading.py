"""Times of a FITS table as instants: at once, in blocks, and good time intervals."""

from __future__ import annotations

import os
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, BinaryIO, Final, NamedTuple

import numpy as np

from ..constants import DAY_S
from ..errors import InvalidInput, OutOfSpan, TscaleError
from ..exact import FloatArray
from ..instants import Instants
from . import words
from .cards import Cards, Value
from .frame import TimeFrame, read_time_frame
from .layout import Column, Hdu, Layout, find_hdu, read_layout
from .reckoning import UtcRelative
from .reference_time import REFERENCE_KEYWORDS

if TYPE_CHECKING:
    from ..formats.leap_seconds import LeapSeconds

__all__ = [
    "GoodTime",
    "TimeColumn",
    "block_rows",
    "hdu_cards",
    "instant_blocks",
    "is_good_time",
    "read_good_time",
    "read_instants",
    "row_blocks",
    "time_column",
]

_BLOCK_BYTES: Final = 1 << 23
_MOST_ROWS: Final = 1 << 18
_INHERITED: Final = ("TIMESYS", "TREFPOS", "TREFDIR", "TIMEUNIT", "TIMEOFFS", "TIMEZERO", *REFERENCE_KEYWORDS)


class GoodTime(NamedTuple):
    """Intervals of good time."""

    start: Instants
    stop: Instants


@dataclass(frozen=True)
class TimeColumn:
    """A column with times, and how they are counted."""

    hdu: Hdu
    column: Column
    frame: TimeFrame

    def numbers(self, rows: Any) -> FloatArray:
        """The numbers stored in rows, (n, NAXIS1) bytes, as float64 arrays of their own."""
        column = self.column
        raw = np.ascontiguousarray(rows[:, column.offset : column.offset + column.width])
        assert column.dtype is not None
        stored = raw.view(column.dtype)[:, 0]
        if column.dtype.kind == "f":
            return stored.astype(np.float64)
        null = self.hdu.cards.number(f"TNULL{column.number}")
        bad = np.zeros(stored.shape, dtype=np.bool_) if null is None else stored == int(null)
        if column.code == "K":
            bad = bad | (np.abs(stored) > 2**53)
        if bad.any():
            raise self.fault(
                f"{int(np.count_nonzero(bad))} of {bad.size} values are undefined (TNULL{column.number}), or beyond "
                "what a float64 holds exactly"
            )
        return stored.astype(np.float64)

    def fault(self, message: str) -> TscaleError:
        """An error that names the column."""
        return InvalidInput(f"{self.hdu.cards.path}, {self.hdu.title}, column {self.column.name}: {message}",
                            path=self.hdu.cards.path)  # fmt: skip


def read_instants(
    path: str | os.PathLike[str],
    extension: str | int | tuple[str, int] = "EVENTS",
    column: str = "TIME",
    *,
    bin_centre: bool = False,
    cards: Mapping[str, Value] | None = None,
    utc: UtcRelative | None = None,
    leap_seconds: LeapSeconds | None = None,
) -> Instants:
    """Read a column of times, with the scale and the place that the header states.

    Parameters
    ----------
    path : path
    extension : str, int or (str, int)
        EXTNAME, number (0 is the primary HDU), or EXTNAME and EXTVER.
    column : str
        TTYPE of the column, in any case: float or integer numbers, which are read exactly.
    bin_centre : bool
        Move time stamps to the centres of their bins, by TIMEDEL and TIMEPIXR.
    cards, utc, leap_seconds
        See `read_time_frame`.

    Returns
    -------
    Instants
        One-dimensional, in the order of the rows.

    Raises
    ------
    DataFileError
        For a file that is damaged or contradicts itself.
    InvalidInput
        For undefined times, with the mask, and for what is not there.
    """
    options = {"bin_centre": bin_centre, "cards": cards, "utc": utc, "leap_seconds": leap_seconds}
    parts = list(instant_blocks(path, extension, column, **options))  # type: ignore[arg-type]
    return Instants.concatenate(parts)


def instant_blocks(
    path: str | os.PathLike[str],
    extension: str | int | tuple[str, int] = "EVENTS",
    column: str = "TIME",
    *,
    rows: int | None = None,
    bin_centre: bool = False,
    cards: Mapping[str, Value] | None = None,
    utc: UtcRelative | None = None,
    leap_seconds: LeapSeconds | None = None,
) -> Iterator[Instants]:
    """Read a column of times in blocks of `rows` (by default some 10^5), in bounded memory; as `read_instants`.

    Yields
    ------
    Instants
        At least one, which is empty for a table without rows.
    """
    if rows is not None and (not isinstance(rows, int) or isinstance(rows, bool) or rows < 1):
        raise InvalidInput(f"rows must be a whole number from 1, got {rows!r}")
    layout = read_layout(path, cards)
    found = time_column(layout, find_hdu(layout, extension), column, utc, leap_seconds)
    shift_s = found.frame.bin_centre_s if bin_centre else 0.0
    with open(path, "rb") as file:
        yielded = False
        for first, block in row_blocks(file, found.hdu, rows or block_rows(found.hdu)):
            t = _instants(found, found.numbers(block), first)
            yield t.shifted(shift_s) if shift_s else t
            yielded = True
    if not yielded:
        yield found.frame.instants(np.empty(0))


def read_good_time(
    path: str | os.PathLike[str],
    extension: str | int | tuple[str, int] | None = None,
    *,
    cards: Mapping[str, Value] | None = None,
    utc: UtcRelative | None = None,
    leap_seconds: LeapSeconds | None = None,
) -> GoodTime:
    """Read a table of good time intervals: its columns START and STOP.

    Parameters
    ----------
    path : path
    extension : str, int or (str, int), optional
        The one table of good time if not given.
    cards, utc, leap_seconds
        See `read_time_frame`.

    Raises
    ------
    DataFileError
        For a damaged file, or an interval that ends before it begins.
    InvalidInput
        Where there is no such table, or several and none is named.
    """
    layout = read_layout(path, cards)
    if extension is None:
        tables = [hdu for hdu in layout if is_good_time(hdu)]
        if len(tables) != 1:
            there = ", ".join(hdu.title for hdu in tables) or "none"
            raise InvalidInput(f"{path}: name the extension with good time intervals; there: {there}", path=layout.path)
        hdu = tables[0]
    else:
        hdu = find_hdu(layout, extension)
    columns = [time_column(layout, hdu, name, utc, leap_seconds) for name in ("START", "STOP")]
    parts: list[list[Instants]] = [[], []]
    with open(path, "rb") as file:
        for first, block in row_blocks(file, hdu, block_rows(hdu)):
            for found, part in zip(columns, parts, strict=True):
                part.append(_instants(found, found.numbers(block), first))
    start, stop = (
        Instants.concatenate(part or [found.frame.instants(np.empty(0))])
        for found, part in zip(columns, parts, strict=True)
    )
    backward = np.flatnonzero(stop < start)
    if backward.size:
        raise hdu.cards.fault(f"interval {backward[0] + 1} ends before it begins")
    return GoodTime(start, stop)


def is_good_time(hdu: Hdu) -> bool:
    """Whether an HDU is a table of good time intervals: GTI in its name or class, columns START and STOP."""
    if not hdu.is_table or not ("GTI" in hdu.name or (hdu.cards.text("HDUCLAS1") or "").upper() == "GTI"):
        return False
    return hdu.column("START") is not None and hdu.column("STOP") is not None


def hdu_cards(layout: Layout, hdu: Hdu) -> Cards:
    """The cards of an HDU; with INHERIT = T those of the primary HDU stand in for keywords of time that it lacks."""
    if hdu.number == 0 or not hdu.cards.true("INHERIT"):
        return hdu.cards
    primary = layout.hdus[0].cards
    lacking = {key for key in _INHERITED if key in primary and key not in hdu.cards}
    if any(key in hdu.cards for key in REFERENCE_KEYWORDS):
        lacking -= set(REFERENCE_KEYWORDS)
    texts = ("TIMESYS", "TREFPOS", "TREFDIR", "TIMEUNIT", "DATEREF")
    given: dict[str, Value] = {}
    for key in lacking:
        value = primary.text(key) if key in texts else primary.number(key)
        if value is not None:
            given[key] = value
    return Cards.of(hdu.cards, given)


def time_column(
    layout: Layout, hdu: Hdu, name: str, utc: UtcRelative | None = None, leap_seconds: LeapSeconds | None = None
) -> TimeColumn:
    """A column of times with its frame.

    Raises
    ------
    InvalidInput
        Where it is not there or holds no numbers.
    DataFileError
        For a header that contradicts itself, or says nothing of its times.
    """
    if not hdu.is_table:
        raise InvalidInput(f"{layout.path}, {hdu.title} is no binary table", path=layout.path)
    column = hdu.column(name)
    if column is None:
        there = ", ".join(column.name for column in hdu.columns())
        raise InvalidInput(f"{layout.path}, {hdu.title} has no column {name!r}; it has {there}", path=layout.path)
    if column.dtype is None:
        raise InvalidInput(
            f"{layout.path}, {hdu.title}: column {name} is {column.repeat}{column.code}; times are read from single "
            "numbers a row, such as 1D",
            path=layout.path,
        )
    cards = hdu_cards(layout, hdu)
    frame = read_time_frame(cards, column.number, utc=utc, leap_seconds=leap_seconds)
    stated = "TIMESYS" in cards or any(key in cards for key in REFERENCE_KEYWORDS)
    if not stated and words.UNITS_S[frame.column_unit] < DAY_S:
        raise cards.fault(
            f"column {name} counts {frame.column_unit}, and the header states neither TIMESYS nor a reference time: "
            "say them in cards={'TIMESYS': ..., 'MJDREF': ...}"
        )
    return TimeColumn(hdu, column, frame)


def block_rows(hdu: Hdu) -> int:
    """Rows that are read at once: a multiple of 4, so that all blocks but the last are whole words of a checksum."""
    return max(4, min(_MOST_ROWS, _BLOCK_BYTES // max(1, hdu.row_bytes)) // 4 * 4)


def row_blocks(file: BinaryIO, hdu: Hdu, rows: int) -> Iterator[tuple[int, Any]]:
    """Blocks of rows as (number of the first row from 0, writeable (n, NAXIS1) array of bytes)."""
    file.seek(hdu.data)
    for first in range(0, hdu.rows, rows):
        count = min(rows, hdu.rows - first)
        block = np.empty((count, hdu.row_bytes), dtype=np.uint8)
        reader: Any = file
        if block.size and reader.readinto(block) != block.size:
            raise hdu.cards.fault("the file became shorter while it was read")
        yield first, block


def _instants(found: TimeColumn, numbers: FloatArray, first: int) -> Instants:
    try:
        return found.frame.instants(numbers)
    except (InvalidInput, OutOfSpan) as error:
        at = "" if error.mask is None else f", the first in row {first + int(np.argmax(error.mask)) + 1}"
        error.args = (f"{found.hdu.cards.path}, {found.hdu.title}, column {found.column.name}{at}: {error}",)
        error.path = error.path or found.hdu.cards.path
        raise
