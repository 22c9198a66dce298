"""Event lists carried to another time scale or place: times, intervals and headers; all else byte for byte."""

from __future__ import annotations

import os
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace
from fractions import Fraction
from pathlib import Path
from typing import Any, Final

import numpy as np

from ..errors import InvalidInput, gathered_extrapolations
from ..files.atomic import replaced
from ..files.stream import Mapping as Chained
from ..files.stream import evaluator
from ..source import Source
from .cards import Value
from .layout import read_layout
from .plan import Part, made_of, planned, target_of
from .reading import row_blocks
from .reckoning import UtcRelative
from .rewrite import Target
from .writing import ConvertedColumn, HduWriter, Progress, copy_bytes

__all__ = ["ConvertedColumn", "ConvertedEvents", "convert_events"]

_COARSE_S: Final = 1e-9


@dataclass(frozen=True)
class ConvertedEvents:
    """What `convert_events` did.

    Attributes
    ----------
    path : Path
        The file that was written.
    start, end : str
        The nodes.
    columns : tuple of ConvertedColumn
    headers : tuple of str
        HDUs whose keywords of time were changed.
    notes : tuple of str
        What a reader should know: defaults taken, keywords left or taken out, how coarsely times are stored.
    """

    path: Path
    start: str
    end: str
    columns: tuple[ConvertedColumn, ...]
    headers: tuple[str, ...]
    notes: tuple[str, ...]

    @property
    def rows(self) -> int:
        """Rows carried in all, of tables and intervals."""
        return sum(column.rows for column in self.columns)

    @property
    def spacing_s(self) -> float:
        """The largest spacing of any column, s."""
        return max((column.spacing_s for column in self.columns), default=0.0)


def convert_events(
    source: str | os.PathLike[str],
    target: str | os.PathLike[str],
    chain: Chained,
    *,
    columns: Sequence[str] = ("TIME",),
    keep: Sequence[str | int] = (),
    rebase: bool = False,
    direction: Source | None = None,
    cards: Mapping[str, Value] | None = None,
    utc: UtcRelative | None = None,
    threads: int = 1,
    progress: Callable[[int, int], None] | None = None,
) -> ConvertedEvents:
    """Carry all times of a FITS file through a chain.

    Columns named in `columns` in every binary table, START and STOP of good time intervals, and the keywords of time in
    the headers of these and of every other HDU that states a time frame. The values of TIMESYS, TREFPOS, TREFDIR,
    PLEPHEM, reference and offset change with them, what was done is added as HISTORY, and DATASUM and CHECKSUM are made
    anew where they are. All other bytes stay as they are: other columns, variable-length data, images, cards.
    Uncertainties (TIMSYER, TIMRDER), bins (TIMEDEL) and durations other than TELAPSE are left: they change by 1e-4 at
    the most. So is DATE, when a header was first written.

    Parameters
    ----------
    source, target : path
        The same is allowed: the target takes its name when all is done.
    chain : Chain or CompiledChain
        Its start must be what the headers say: UTC@TOPOCENTER ...
    columns : sequence of str
        Names of columns, which must be 1D (float64).
    keep : sequence of str or int
        Extensions to leave as they are, by name or number.
    rebase : bool
        Make the day of the first event the reference time. As seconds since a reference years away a float64 resolves
        1e-7 s; within a day 1e-11 s.
    direction : Source, optional
        For TREFDIR where the chain is compiled; a Chain knows its source.
    cards : mapping, optional
        Values in place of those in the headers, where these are incomplete or wrong.
    utc : {"elapsed", "labels"}, optional
        How seconds of UTC since a reference are counted over leap seconds; see `Reckoning`.
    threads : int
        Blocks worked on at once; the results are the same for any number.
    progress : callable, optional
        Called with rows done and rows in all.

    Raises
    ------
    DataFileError
        For a file that is damaged or contradicts itself.
    InvalidInput
        For columns that do not hold float64, frames other than the chain's start, and words that FITS does not have.
    OutOfSpan
        For events outside what the chain covers; names the row.
    """
    layout = read_layout(source, cards)
    evaluate = evaluator(chain)
    with gathered_extrapolations():
        aim = target_of(chain, direction, utc)
        parts = planned(layout, aim, columns, keep, utc)
        if rebase:
            aim = _rebased(aim, parts, source)
        told = Progress(progress, sum(part.hdu.rows for part in parts if part.columns))
        done: list[ConvertedColumn] = []
        notes: list[str] = []
        made = made_of(chain)
        with open(source, "rb") as file, replaced(target) as text:
            out = _seekable(text, target)
            for part in parts:
                notes += part.notes
                if part.frame is None:
                    copy_bytes(file, out, part.hdu.start, part.hdu.end)
                    continue
                writer = HduWriter(part, part.frame, aim, made, evaluate, threads)
                done += writer.write(file, out, told)
                notes += writer.notes
    notes += _coarse(done, rebase)
    headers = tuple(part.hdu.title for part in parts if part.frame is not None)
    return ConvertedEvents(
        Path(target), str(aim.start), str(aim.end), tuple(done), headers, tuple(dict.fromkeys(notes))
    )


def _seekable(text: Any, target: str | os.PathLike[str]) -> Any:
    """The bytes below a text file, where one can go back in it."""
    out = text.buffer
    if not out.seekable():
        raise InvalidInput(
            f"{os.fspath(target)} cannot be written: headers are completed when the rows are known, which a pipe does "
            "not allow; name a file"
        )
    return out


def _rebased(target: Target, parts: Sequence[Part], path: Any) -> Target:
    """The target with the day of the first event as reference."""
    for part in parts:
        for found in part.columns:
            with open(path, "rb") as file:
                for _, rows in row_blocks(file, found.hdu, 4096):
                    numbers = found.numbers(rows)
                    numbers = numbers[np.isfinite(numbers)]
                    if numbers.size:
                        t = target.map(found.frame.instants(numbers[:1]).at(target.start.place))
                        day, _ = t.to_mjd(leap_seconds=target.leap_seconds)
                        return replace(target, mjd=Fraction(int(day[0])))
    raise InvalidInput(f"{os.fspath(path)}: there is no event to name the day of; leave rebase out")


def _coarse(done: Sequence[ConvertedColumn], rebased: bool) -> list[str]:
    worst = max(done, key=lambda column: column.spacing_s)
    if rebased or worst.spacing_s <= _COARSE_S:
        return []
    return [
        f"times are numbers up to {worst.spacing_s:.1e} s apart ({worst.extension}, {worst.column}); counted from the "
        "day of the first event (rebase) they would be finer"
    ]
