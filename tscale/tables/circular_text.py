"""The text of BIPM's monthly Circular T (its section on UTC - UTC(k)) and of the daily rapid product UTCr.

Layout of both: a title line (`CIRCULAR T 229`; `UTCr_1226`), prose with `TAI-UTC = 33 s` and the day from which that
holds, a line of dates at 0h UTC, a line `MJD` with the same days (five days apart, ending in 4 or 9; one day apart for
UTCr), a line with the unit, `[UTC-UTC(k)]/ns`, then a row for each laboratory: its acronym, its city in brackets, one
value in ns for each day, `-` where there is none. Since about 2005 three columns uA, uB, u follow (standard
uncertainties, ns), and perhaps the numbers of notes, in brackets. In Circular T the section is the first, and ends
where the second begins.

Sources: BIPM Circular T 201 (2004) and 229 (2007) for the two monthly layouts; that of UTCr is from memory of the files
`utcr_YYWW` of the BIPM.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from pathlib import Path
from typing import Final, NamedTuple

import numpy as np

from ..errors import DataFileError
from ..formats.leap_seconds import LeapSeconds
from .common import mjd_date, read_file

__all__ = ["CircularIssue", "CircularRow", "read_issue"]

_TITLE: Final = re.compile(r"\s*(?:(CIRCULAR\s+T)\s+(\d+)\b|(?:.*\b)?(UTCr)_(\d{4})\b)")
_SECTION: Final = re.compile(r"\s*(\d)\s*-\s+[A-Z]")
_MJD: Final = re.compile(r"\s*MJD((?:\s+\d+)+)\s*(.*)")
_DATES: Final = re.compile(r"\s*Date\s+(\d{4})(?:\s*/\s*(\d{1,4}))?\s+0\s*h\s+UTC\s+(.*)", re.IGNORECASE)
_UNIT: Final = re.compile(r"\[\s*(UTCr?)\s*-\s*UTC\(k\)\s*\]\s*/\s*(\w+)")
_LEAP: Final = re.compile(
    r"From\s+(\d{4})\s+([A-Za-z]+)\s+(\d{1,2}),\s*0\s*h\s+UTC(?:,\s*to\s+[^=]*?)?,\s*TAI\s*-\s*UTC\s*=\s*(\d+)\s*s"
)
_ROW: Final = re.compile(r"\s*([A-Z][A-Z0-9]{1,5})\s*\(([^()]*)\)([-+.,()\d\s]*)")
_CELL: Final = re.compile(r"(?<!\S)(?:[-+]?\d+\.\d|-)(?!\S)")
_NOTE_MARKS: Final = re.compile(r"((?:\s*\(\s*\d+(?:\s*,\s*\d+)*\s*\))+)\s*\Z")
_NOTE: Final = re.compile(r"\s*\((\d+)\)\s*(.*)")
# One decimal, so that columns that touch come apart; values of the nineties are whole ns.
_VALUE: Final = re.compile(r"\s*([-+]?\d+\.\d|[-+]?\d+(?![\d.])|-(?![\d.]))")
_MONTHS: Final = ("JAN", "FEB", "MAR", "APR", "MAY", "JUN", "JUL", "AUG", "SEP", "OCT", "NOV", "DEC")
_UNCERTAINTIES: Final = ("uA", "uB", "u")
_FEWEST_DAYS, _MOST_DAYS = 2, 10
# All three are printed to 0.1 ns: 0.05 (1 + (uA + uB) / u) at the most.
_ROUNDED_NS: Final = 0.125
_MONTHLY_STEP_DAYS: Final = 5


class CircularRow(NamedTuple):
    """What an issue says of one laboratory."""

    city: str
    values_ns: tuple[float | None, ...]
    """UTC - UTC(k) at each day, ns; None where there is none."""
    uncertainty_ns: tuple[float, float] | None
    """Standard uncertainties uA and uB, ns; None where none is stated."""
    notes: tuple[int, ...]
    """Numbers of the notes that the row points to."""
    line: int


class CircularIssue(NamedTuple):
    """One issue of Circular T or of UTCr."""

    title: str
    """`Circular T 229` or `UTCr 1226`."""
    mjd: tuple[int, ...]
    """Days, at 0h UTC."""
    rows: dict[str, CircularRow]
    """By acronym."""
    notes: dict[int, str]
    """Texts of the notes on the section: steps of a laboratory's clock, corrections."""
    has_uncertainty: bool
    rapid: bool
    """Whether the values refer to the rapid realisation UTCr."""
    sha256: str
    path: Path

    @property
    def step_days(self) -> int:
        """Days from one value to the next."""
        return 1 if self.rapid else _MONTHLY_STEP_DAYS


def read_issue(path: Path, leap_seconds: LeapSeconds) -> CircularIssue:
    """Read one file.

    Raises
    ------
    DataFileError
        With path and row: a file that is missing, of another kind or layout, cut short inside the section, with days
        that disagree with their dates, rows with too few or too many values, a laboratory twice, or a TAI - UTC that
        is not that of `leap_seconds`.
    """
    content, sha256 = read_file(path, "circular")
    try:
        lines = content.decode("utf-8-sig").splitlines()
    except UnicodeDecodeError:
        lines = content.decode("latin-1").splitlines()  # names of cities in older issues
    return _Reader(path, lines, leap_seconds).issue(sha256)


class _Reader:
    """The lines of one file, and where in them the section stands."""

    def __init__(self, path: Path, lines: list[str], leap_seconds: LeapSeconds) -> None:
        self.path = path
        self.lines = lines
        self.leap_seconds = leap_seconds
        self.title, self.rapid, first = self._find_title()
        self.first, self.last = self._section(first)

    def fail(self, line: int | None, message: str) -> DataFileError:
        """Error at a line (from 1), or of the whole file."""
        place = f"{self.path}" if line is None else f"{self.path}, line {line}"
        return DataFileError(f"{place}: {message}", row=line, path=self.path)

    def _find_title(self) -> tuple[str, bool, int]:
        found = [(number, match) for number, text in enumerate(self.lines, 1) if (match := _TITLE.match(text))]
        monthly = [(number, match) for number, match in found if match[1]]
        if not found:
            raise self.fail(
                None,
                "no title line 'CIRCULAR T nnn' or 'UTCr_YYWW': this is not the text of BIPM's Circular T or UTCr",
            )
        titles = {match[2] for _, match in monthly} if monthly else {match[4] for _, match in found}
        if len(titles) > 1:
            raise self.fail(found[-1][0], f"a second issue begins here; keep one issue a file ({', '.join(titles)})")
        if monthly:
            return f"Circular T {monthly[0][1][2]}", False, monthly[0][0]
        return f"UTCr {found[0][1][4]}", True, found[0][0]

    def _section(self, title: int) -> tuple[int, int]:
        """First and last line of the section with the values."""
        if self.rapid:
            return title, len(self.lines)
        heads = [(number, match[1]) for number, text in enumerate(self.lines, 1) if (match := _SECTION.match(text))]
        first = next((number for number, digit in heads if digit == "1" and number > title), None)
        if first is None:
            raise self.fail(None, "section 1, the differences UTC - UTC(k), is missing; restore the file")
        last = next((number for number, digit in heads if digit == "2" and number > first), None)
        if last is None:
            raise self.fail(
                len(self.lines), "the text ends inside section 1 (no section 2 follows): the file is cut short"
            )
        return first, last - 1

    def issue(self, sha256: str) -> CircularIssue:
        """Read the section."""
        mjd, at, has_uncertainty = self._days()
        self._check_dates(mjd, at)
        self._check_leap_seconds()
        unit = self._unit()
        rows: dict[str, CircularRow] = {}
        notes: dict[int, str] = {}
        open_note: int | None = None
        for number in range(max(at, unit) + 1, self.last + 1):
            text = self.lines[number - 1]
            if not text.strip():
                open_note = None
                continue
            note = _NOTE.fullmatch(text)
            if note:
                open_note = int(note[1])
                notes[open_note] = note[2].strip()
                continue
            match = _ROW.fullmatch(text)
            if match is None and open_note is not None:
                notes[open_note] = f"{notes[open_note]} {text.strip()}"
                continue
            if match is None:
                if len(_CELL.findall(text)) >= _FEWEST_DAYS:
                    raise self.fail(number, f"a damaged row, {text.strip()[:60]!r}: ACRONYM (City) and values are read")
                continue
            if match[1] in rows:
                raise self.fail(number, f"{match[1]} stands here again, after line {rows[match[1]].line}")
            rows[match[1]] = self._row(number, match[2].strip(), match[3], len(mjd), has_uncertainty)
        if not rows:
            raise self.fail(at, "no row of a laboratory follows the days; restore the file from its source")
        for name, row in rows.items():
            lost = [mark for mark in row.notes if mark not in notes]
            if lost:
                raise self.fail(
                    row.line, f"{name} points to note {lost[0]}, which the section does not have; the file is cut short"
                )
        return CircularIssue(self.title, mjd, rows, notes, has_uncertainty, self.rapid, sha256, self.path)

    def _days(self) -> tuple[tuple[int, ...], int, bool]:
        """The days, the line they stand on, and whether columns of uncertainty follow."""
        for number in range(self.first, self.last + 1):
            match = _MJD.fullmatch(self.lines[number - 1])
            if match:
                break
        else:
            raise self.fail(self.first, "no line 'MJD' with the days follows; restore the file from its source")
        days = tuple(int(text) for text in match[1].split())
        step = 1 if self.rapid else _MONTHLY_STEP_DAYS
        if not _FEWEST_DAYS <= len(days) <= _MOST_DAYS or set(np.diff(days).tolist()) != {step}:
            raise self.fail(number, f"the days {', '.join(map(str, days))} are not MJD that follow {step} d apart")
        if not self.rapid and days[0] % 5 != 4:
            raise self.fail(number, f"MJD {days[0]}: the days of Circular T end in 4 or 9")
        # The heads of the last columns may also stand on the line above or below.
        heads = f"{match[2]} {' '.join(self.lines[max(number - 2, 0) : number + 1])}".split()
        named = [name for name in _UNCERTAINTIES if name in heads]
        if named and len(named) != len(_UNCERTAINTIES):
            raise self.fail(number, f"the columns of uncertainty are uA, uB and u, here {', '.join(named)}")
        return days, number, bool(named)

    def _check_dates(self, mjd: Sequence[int], at: int) -> None:
        """Compare the dates above the days with them, where there are any."""
        for number in range(self.first, at):
            match = _DATES.fullmatch(self.lines[number - 1])
            if match is None:
                continue
            stated = re.findall(r"\b([A-Z]{3})\s*(\d{1,2})\b", match[3].upper())
            found = [(month, int(day)) for month, day in stated if month in _MONTHS]
            dates = [mjd_date(day) for day in mjd]
            if found != [(_MONTHS[int(text[5:7]) - 1], int(text[8:])) for text in dates]:
                raise self.fail(
                    number, f"the dates are not those of MJD {mjd[0]} to {mjd[-1]}, {dates[0]} to {dates[-1]}"
                )
            years = {match[1], (match[1][: 4 - len(match[2])] + match[2]) if match[2] else match[1]}
            if {text[:4] for text in (dates[0], dates[-1])} - years:
                raise self.fail(number, f"year {'/'.join(sorted(years))} where MJD {mjd[0]} is {dates[0]}")
            return

    def _check_leap_seconds(self) -> None:
        """Compare what the text says of TAI - UTC with the table: days are counted with it."""
        text = " ".join(self.lines[: self.last])
        for match in _LEAP.finditer(text):
            at = next((n for n, line in enumerate(self.lines, 1) if match[0][-12:] in line), self.first)
            try:
                date = f"{match[1]}-{_MONTHS.index(match[2].upper()[:3]) + 1:02d}-{int(match[3]):02d}"
                day = int((np.datetime64(date, "D") - np.datetime64("1858-11-17", "D")).astype(int))
                table_s = float(self.leap_seconds.tai_minus_utc(self.leap_seconds.count_from_label(day, 0, 0.0)))
            except ValueError as error:
                raise self.fail(at, f"{match[0]!r} names no day on which TAI - UTC is known: {error}") from error
            if table_s != float(match[4]):
                raise self.fail(
                    at,
                    f"TAI - UTC is {match[4]} s from {date} by this text, {table_s:g} s by the leap-second table "
                    f"{self.leap_seconds.name!r}; one of them is damaged or out of date",
                )

    def _unit(self) -> int:
        """The line with the unit."""
        wanted = "UTCr" if self.rapid else "UTC"
        for number in range(self.first, self.last + 1):
            match = _UNIT.search(self.lines[number - 1])
            if match is None:
                continue
            if (match[1], match[2]) != (wanted, "ns"):
                raise self.fail(
                    number,
                    f"the values are {match[0]!r}, where [{wanted}-UTC(k)]/ns is read: a later layout, or another file",
                )
            return number
        raise self.fail(self.first, f"no line with the unit, [{wanted}-UTC(k)]/ns; a later layout, or a damaged file")

    def _row(self, number: int, city: str, rest: str, days: int, has_uncertainty: bool) -> CircularRow:
        marks = _NOTE_MARKS.search(rest)
        notes = tuple(int(mark) for mark in re.findall(r"\d+", marks[1])) if marks else ()
        cells: list[float | None] = []
        text, at = rest[: marks.start()] if marks else rest, 0
        while text[at:].strip():
            match = _VALUE.match(text, at)
            if match is None:
                raise self.fail(number, f"{text[at:].strip()[:20]!r} is no value in ns with one decimal, nor -")
            cells.append(None if match[1] == "-" else float(match[1]))
            at = match.end()
        wanted = days + 3 * has_uncertainty
        empty = all(cell is None for cell in cells)
        if len(cells) != wanted and not (empty and len(cells) == days):
            raise self.fail(
                number,
                f"{len(cells)} numbers in this row, where {days} days"
                f"{' and uA, uB, u need' if has_uncertainty else ' need'} {wanted}; restore the file from its source",
            )
        sigmas = [cell for cell in cells[days:] if cell is not None]
        if any(sigma < 0.0 for sigma in sigmas):
            raise self.fail(number, f"a negative uncertainty, {min(sigmas)} ns")
        stated = self._stated(number, cells[days:]) if has_uncertainty and len(cells) == wanted else None
        return CircularRow(city, tuple(cells[:days]), stated, notes, number)

    def _stated(self, number: int, cells: Sequence[float | None]) -> tuple[float, float] | None:
        """Standard uncertainties uA and uB; all of u for uB where it stands alone: what is common is not averaged."""
        a, b, u = cells
        if a is None or b is None:
            if u is None and a is None and b is None:
                return None
            if u is None:
                raise self.fail(number, "one of uA and uB stands alone; both and u are read, or u alone")
            return 0.0, u
        combined = float(np.hypot(a, b))
        if u is not None and abs(u - combined) > _ROUNDED_NS:
            raise self.fail(
                number,
                f"u is {u} ns, where uA = {a} and uB = {b} make {combined:.2f} in quadrature; a digit is wrong",
            )
        return a, b
