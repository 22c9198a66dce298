"""Readers of the two IERS Earth orientation layouts: finals2000A and C04.

Both are lines of fixed columns with fixed decimals. The columns are read as whole numbers for all lines at once and
divided by a power of ten, which rounds exactly as reading each text would.

Sources: ReadMe.finals2000A (USNO) for the one; the format line in the head of `eopc04.1962-now` (IERS EOP Product
Centre, 20 C04 series, consistent with ITRF2020) for the other.
"""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from pathlib import Path
from typing import Any, Final, NamedTuple

import numpy as np
import numpy.typing as npt

from ..errors import DataFileError
from ..exact import BoolArray, FloatArray, IntArray
from .common import mjd_date, read_file
from .eop_rows import EOPRows

__all__ = ["installed_rows", "parse_c04", "parse_earth_orientation", "parse_finals", "widened"]

Bytes = npt.NDArray[np.uint8]

_SPACE, _PLUS, _MINUS, _POINT, _ZERO = (int(byte) for byte in b" +-.0")
_MEASURED: Final = ord("I")
_PREDICTED: Final = ord("P")

# Past the end of the predicted celestial pole offsets (three months ahead, where UT1 goes on for a year) zero is
# nearer the truth than the last value: over C04 1990-2026 the offsets are 0.22 and 0.20 mas rms, while a value held for
# 290 days is off by 0.27 mas.
_POLE_OFFSET_UNKNOWN_MAS: Final = 0.25


# What Bulletin A states for its predictions is too little: over five issues from November 2023 to November 2025, each
# followed for a year, UT1 was off by 1.8 times the stated error and the pole by 2.2 times (rms; they fit to a month in
# UT1 and ten days in the pole). Twice what is stated fits: 0.9 and 1.1.
_PREDICTION_FACTOR: Final = 2.0
_POLE_PREDICTION_FACTOR: Final = 1.5


# The largest steps from day to day in both files, 1962 to 2026, are 4.3 ms in UT1 (less leap seconds, and 0.11 s where
# UTC was stepped before 1972), 0.036 arcsec in the pole, 3.3 mas in the celestial pole offsets.
_LARGEST_STEPS: Final = (0.01, 0.1, 0.1, 10.0, 10.0)
_UNITS: Final = ("s", "arcsec", "arcsec", "mas", "mas")
_LEAP_STEP_S: Final = 1.0
_EARLY_STEP_S: Final = 0.12
_LEAP_SECONDS_FROM_MJD: Final = 41317


class _Column(NamedTuple):
    name: str
    first: int  # bytes as the documents count them, from 1
    last: int
    decimals: int


_FINALS: Final = (
    _Column("UT1-UTC", 59, 68, 7),
    _Column("PM-x", 19, 27, 6),
    _Column("PM-y", 38, 46, 6),
    _Column("dX", 98, 106, 3),
    _Column("dY", 117, 125, 3),
    _Column("error in UT1-UTC", 69, 78, 7),
    _Column("error in PM-x", 28, 36, 6),
    _Column("error in PM-y", 47, 55, 6),
    _Column("error in dX", 107, 115, 3),
    _Column("error in dY", 126, 134, 3),
)
_FINALS_MJD: Final = _Column("MJD", 8, 15, 2)
_FINALS_FLAGS: Final = (_Column("polar motion flag", 17, 17, 0), _Column("UT1 flag", 58, 58, 0))

_C04: Final = (
    _Column("UT1-UTC", 51, 62, 7),
    _Column("x", 27, 38, 6),
    _Column("y", 39, 50, 6),
    _Column("dX", 63, 74, 6),
    _Column("dY", 75, 86, 6),
    _Column("UT1-UTC Er", 147, 158, 7),
    _Column("x Er", 123, 134, 6),
    _Column("y Er", 135, 146, 6),
    _Column("dX Er", 159, 170, 6),
    _Column("dY Er", 171, 182, 6),
)
_C04_MJD: Final = _Column("MJD", 17, 26, 2)
_C04_HEAD: Final = (
    ("20 C04", "the series"),
    ("IAU 2000", "the model that dX and dY belong to"),
    ("format(4(i4),f10.2,2(f12.6),f12.7,2(f12.6),2(f12.6),f12.7,2(f12.6),f12.7,2(f12.6),2(f12.6),f12.7)", "the format"),
    (
        'YR MM DD HH MJD x(") y(") UT1-UTC(s) dX(") dY(") xrt("/day) yrt("/day) LOD(s) x Er y Er UT1-UTC Er dX Er '
        "dY Er xrt Er yrt Er LOD Er",
        "the columns",
    ),
)


class _Lines:
    """Lines of a file as a table of bytes, one row of memory per column of text."""

    def __init__(self, content: bytes, width: int, path: Path) -> None:
        self.path = path
        lines = content.splitlines()
        kept = [number for number, line in enumerate(lines, 1) if line.strip() and not line.startswith(b"#")]
        if not kept:
            raise DataFileError(f"{path} holds no Earth orientation row", path=path)
        self.number = np.array(kept)
        lengths = [len(lines[number - 1]) for number in kept]
        if len(kept) > 1 and lengths[-1] < min(lengths[:-1]):
            raise DataFileError(
                f"{path}, line {kept[-1]}: the last line has {lengths[-1]} bytes, all before have {min(lengths[:-1])} "
                "or more: the file is cut short; restore it from its source",
                row=kept[-1],
                path=path,
            )
        text = np.array([lines[number - 1] for number in kept], dtype=f"S{width}")
        table = text.view(np.uint8).reshape(len(kept), width)
        self.table: Bytes = np.where(table == 0, np.uint8(_SPACE), table).T.copy()

    def keep(self, rows: slice) -> None:
        self.number = self.number[rows]
        self.table = self.table[:, rows]

    def fail(self, bad: BoolArray, column: str, complaint: str) -> DataFileError:
        row = int(self.number[np.flatnonzero(bad)[0]])
        return DataFileError(
            f"{self.path}, line {row}: {column} {complaint}; restore the file from its source", row=row, path=self.path
        )

    def blanks(self, columns: Sequence[_Column]) -> tuple[BoolArray, BoolArray]:
        """Where any of the columns is blank, and where any is not."""
        each = [(self.table[column.first - 1 : column.last] == _SPACE).all(axis=0) for column in columns]
        return np.logical_or.reduce(each), ~np.logical_and.reduce(each)

    def number_of(self, column: _Column) -> FloatArray:
        """Values of a column; `DataFileError` with the line where a text is not a number of its layout."""
        block = self.table[column.first - 1 : column.last]
        point = len(block) - 1 - column.decimals
        value = np.zeros(block.shape[1], dtype=np.int64)
        negative = np.zeros(block.shape[1], dtype=np.bool_)
        begun = np.zeros(block.shape[1], dtype=np.bool_)
        bad = block[point] != _POINT
        for place, byte in enumerate(block):
            if place == point:
                begun[:] = True
                continue
            digit = byte - np.uint8(_ZERO)  # wraps round: only digits come out below ten
            is_digit = digit < 10
            if is_digit.all():
                value *= 10
                value += digit
                begun[:] = True
                continue
            sign = (byte == _MINUS) | (byte == _PLUS)
            bad |= ~is_digit & (begun | ~(sign | (byte == _SPACE)))
            negative |= byte == _MINUS
            begun |= is_digit | sign
            value = np.where(is_digit, value * 10 + digit, value)
        if bad.any():
            at = np.flatnonzero(bad)[0]
            raise self.fail(bad, column.name, f"in bytes {column.first}-{column.last} is {bytes(block[:, at])!r}")
        # Both numbers are exact in float64, so the quotient is the float64 nearest to the text.
        return np.asarray(np.where(negative, -value, value) / 10.0**column.decimals)

    def check_steps(self, mjd: IntArray, numbers: FloatArray, columns: range) -> None:
        """Refuse steps from day to day that no real table has, of some columns (n, ...): a digit was damaged."""
        for place in columns:
            step = np.abs(np.diff(numbers[place], prepend=numbers[place, :1]))
            bad = step > _LARGEST_STEPS[place]
            if place == 0:
                leap = np.abs(step - _LEAP_STEP_S) <= _LARGEST_STEPS[0]
                bad &= ~(leap | ((mjd <= _LEAP_SECONDS_FROM_MJD) & (step <= _EARLY_STEP_S)))
            if bad.any():
                moved = (
                    f"moves by {step[bad][0]:.4g} {_UNITS[place]} from the day before: a digit is wrong in one of them"
                )
                raise self.fail(bad, _FINALS[place].name, moved)

    def days(self, column: _Column) -> IntArray:
        mjd = self.number_of(column)
        day = mjd.astype(np.int64)
        bad = day != mjd
        if bad.any():
            raise self.fail(bad, "MJD", "is not at 0h UTC")
        step = np.diff(day, prepend=day[0] - 1) != 1
        if step.any():
            raise self.fail(step, "MJD", "does not follow the day before (a row is missing, doubled or out of order)")
        return day


def parse_finals(content: bytes, path: Path) -> EOPRows:
    """Bulletin A columns of a finals2000A file; ends with the last row that has UT1 and pole.

    Celestial pole offsets, which end some nine months before UT1, are taken as zero with 0.25 mas of uncertainty
    from there on (their rms).
    """
    lines = _Lines(content, 187, path)
    blank, some = lines.blanks((*_FINALS[:3], *_FINALS[5:8]))
    end = int(blank.argmax()) if blank.any() else len(blank)
    if some[end:].any():
        here = np.arange(len(blank)) == (end if not blank[end:].all() else end + int(some[end:].argmax()))
        raise lines.fail(here, "UT1 or pole", "is missing between rows that have it, or the row is cut short")
    if end == 0:
        raise lines.fail(blank, "UT1 or pole", "is missing in every row")
    lines.keep(slice(0, end))
    mjd = lines.days(_FINALS_MJD)
    predicted = np.zeros(end, dtype=np.bool_)
    for column in _FINALS_FLAGS:
        flag = lines.table[column.first - 1]
        bad = (flag != _MEASURED) & (flag != _PREDICTED)
        if bad.any():
            raise lines.fail(bad, column.name, "is neither I (measured) nor P (predicted)")
        predicted |= flag == _PREDICTED
    no_offset, some = lines.blanks((*_FINALS[3:5], *_FINALS[8:]))
    known = int(no_offset.argmax()) if no_offset.any() else end
    if some[known:].any():
        here = np.arange(end) == (known if not no_offset[known:].all() else known + int(some[known:].argmax()))
        raise lines.fail(here, "dX or dY", "is missing between rows that have it, or the row is cut short")
    if end > 1 and known == end - 1:
        here = np.arange(end) == known
        raise lines.fail(here, "dX or dY", "is missing in the last row alone: the file is cut short")
    measured = no_offset & ~predicted
    if measured.any():
        raise lines.fail(measured, "dX or dY", "is missing where UT1 and pole are measured: the row is cut short")
    numbers = np.zeros((10, end))
    for place in (0, 1, 2, 5, 6, 7):
        numbers[place] = lines.number_of(_FINALS[place])
    lines.check_steps(mjd, numbers, range(3))
    lines.keep(slice(0, known))
    for place in (3, 4, 8, 9):
        numbers[place, known:] = 0.0 if place < 5 else _POLE_OFFSET_UNKNOWN_MAS
        numbers[place, :known] = lines.number_of(_FINALS[place])
    lines.check_steps(mjd[:known], numbers[:, :known], range(3, 5))
    return EOPRows(mjd, numbers[:5].T, numbers[5:].T, predicted)


def parse_c04(content: bytes, path: Path) -> EOPRows:
    """Read a 20 C04 file: every row measured; celestial pole offsets are turned from arcseconds to mas.

    Its head says the series, the format and the columns; those of another are refused.
    """
    head = [" ".join(line.decode("latin-1")[1:].split()) for line in content.splitlines() if line.startswith(b"#")]
    for words, what in _C04_HEAD:
        if not any(words in line for line in head):
            raise DataFileError(
                f"{path}: {what} of the 20 C04 series, {words!r:.60}, is not in the head: the head is cut off, or this "
                "is another series or a later layout; get eopc04.1962-now of the 20 series",
                path=path,
            )
    lines = _Lines(content, 218, path)
    mjd = lines.days(_C04_MJD)
    numbers = np.array([lines.number_of(column) for column in _C04])
    numbers[[3, 4, 8, 9]] *= 1000.0
    lines.check_steps(mjd, numbers, range(5))
    return EOPRows(mjd, numbers[:5].T, numbers[5:].T, np.zeros(len(mjd), dtype=np.bool_))


def widened(rows: EOPRows) -> EOPRows:
    """The rows of a finals2000A file with uncertainties of predictions as large as their errors were found.

    So too the celestial pole offsets, which are off by 1.5 times what is stated, 0.2 mas.
    """
    sigmas = rows.sigmas.copy()
    sigmas[rows.predicted, :3] *= _PREDICTION_FACTOR
    # Zeros past the last offset have their rms already.
    offsets = rows.predicted & (rows.values[:, 3:] != 0.0).any(axis=1)
    sigmas[offsets, 3:] *= _POLE_PREDICTION_FACTOR
    return rows._replace(sigmas=sigmas)


def parse_earth_orientation(content: bytes, path: Path) -> EOPRows:
    """Read either layout, told apart by the place of the point in the MJD; predictions of finals2000A are `widened`."""
    line = next((row for row in content.splitlines() if row.strip() and not row.startswith(b"#")), b"")
    if len(line) >= 78 and _point_at(line, _FINALS_MJD):
        return widened(parse_finals(content, path))
    if len(line) >= 182 and _point_at(line, _C04_MJD):
        return parse_c04(content, path)
    raise DataFileError(
        f"{path} is neither of the two Earth orientation layouts that are read: finals2000A (MJD in bytes 8-15) or "
        f"C04 of the 20 series (MJD in bytes 17-26)",
        path=path,
    )


def _point_at(line: bytes, column: _Column) -> bool:
    text: Any = line[column.first - 1 : column.last]
    return bool(text[-3:-2] == b"." and text[:-3].strip().isdigit())


def installed_rows() -> tuple[EOPRows, str, str, Path]:
    """Rows, name, SHA-256 and folder of the installed `astropy-iers-data`: C04 to its end, then finals2000A."""
    from astropy_iers_data import IERS_A_FILE, IERS_B_FILE

    c04_path, finals_path = Path(IERS_B_FILE), Path(IERS_A_FILE)
    c04_bytes, c04_hash = read_file(c04_path, "C04 file")
    finals_bytes, finals_hash = read_file(finals_path, "finals2000A file")
    c04, finals = parse_c04(c04_bytes, c04_path), widened(parse_finals(finals_bytes, finals_path))
    later = finals.mjd > c04.mjd[-1]
    if finals.mjd[0] > c04.mjd[-1] + 1:
        raise DataFileError(
            f"{finals_path} starts on {mjd_date(finals.mjd[0])}, but {c04_path.name} ends on {mjd_date(c04.mjd[-1])}: "
            f"the days between are missing; update astropy-iers-data",
            path=finals_path,
        )
    rows = EOPRows(*(np.concatenate([old, new[later]]) for old, new in zip(c04, finals, strict=True)))
    sha256 = hashlib.sha256(f"{c04_hash} {finals_hash}".encode()).hexdigest()
    return rows, f"{c04_path.name} + {finals_path.name}", sha256, c04_path.parent
