"""Leap seconds since 1972 from the two open file layouts that list them."""

from __future__ import annotations

import hashlib
import re
from pathlib import Path
from typing import Final, NamedTuple

import numpy as np

from ..errors import DataFileError
from ..storage import read_bytes
from .gregorian import date_from_mjd
from .leap_second_rows import FIRST_STEP, LeapRow, exact_number, nanoseconds

__all__ = ["LeapFile", "read_leap_file"]

_NTP_TO_MJD: Final = 15020  # MJD of 1900-01-01, the origin of NTP seconds (RFC 5905, section 6)
_NTP_DIGITS: Final = 12
_ROWS_REACH_MJD: Final = 51179
# First days after the leap seconds since then (IERS Bulletins C 30, 36, 43, 49 and 52).
_LATER_STEPS_MJD: Final = (53736, 54832, 56109, 57204, 57754)
_MONTHS: Final = ("january", "february", "march", "april", "may", "june", "july", "august",
    "september", "october", "november", "december")  # fmt: skip


_LIST_MARKS: Final = ("#$", "#@", "#h")


class LeapFile(NamedTuple):
    """What a leap-second file says."""

    rows: tuple[LeapRow, ...]
    expires_mjd: int | None
    issued: str | None
    sha256: str


def read_leap_file(path: Path) -> LeapFile:
    """Read `Leap_Second.dat` (IERS) or `leap-seconds.list` (IETF/IANA), told apart by the `#$`, `#@` or `#h`
    of the latter.

    Raises
    ------
    DataFileError
        With path and row: for a file that cannot be read, a row that is not understood, a date that
        contradicts its MJD, a checksum that does not fit, or a table that does not begin on 1972-01-01 with
        TAI - UTC = 10 s.
    """
    try:
        content = read_bytes(path)
    except OSError as error:
        raise DataFileError(f"cannot read the leap-second table {path}: {error}", path=path) from error
    try:
        lines = content.decode("utf-8-sig").splitlines()
    except UnicodeDecodeError as error:
        damaged = content.count(b"\n", 0, error.start) + 1
        raise DataFileError(
            f"cannot read the leap-second table {path}, row {damaged}: {error}; it is no plain text, or damaged",
            row=damaged,
            path=path,
        ) from error
    is_list = any(line.startswith(_LIST_MARKS) for line in lines)
    expires, issued = _list_header(lines, path) if is_list else _dat_header(lines, path)
    rows: list[LeapRow] = []
    for number, line in enumerate(lines, start=1):
        fields = line.partition("#")[0].split()
        if not fields:
            continue
        try:
            row = _list_row(fields) if is_list else _dat_row(fields)
        except ValueError as error:
            raise DataFileError(
                f"{path}, row {number}: {line.strip()!r:.120} is not a row of a leap-second table ({error})",
                row=number,
                path=path,
            ) from error
        if not rows and row != FIRST_STEP:
            raise DataFileError(
                f"{path}, row {number}: the table must begin on 1972-01-01 (MJD 41317) with TAI - UTC = 10 s, "
                f"got MJD {row.mjd} with {row.tai_minus_utc_ns / 1e9} s; the file may be cut short",
                row=number,
                path=path,
            )
        if rows:
            _check_step(rows[-1], row, number, path)
        rows.append(row)
    if not rows:
        raise DataFileError(
            f"{path} holds no leap-second rows; expected the layout of Leap_Second.dat (IERS) or "
            "leap-seconds.list (IANA)",
            path=path,
        )
    if rows[-1].mjd < _ROWS_REACH_MJD:
        raise DataFileError(
            f"{path}, row {len(lines)}: the last row is of MJD {rows[-1].mjd}, where the table has one of 1999-01-01 "
            f"(MJD {_ROWS_REACH_MJD}) at least; the file is cut short",
            row=len(lines),
            path=path,
        )
    lost = [mjd for mjd in _LATER_STEPS_MJD if rows[-1].mjd < mjd < (expires or 0)]
    if lost:
        raise DataFileError(
            f"{path}, row {len(lines)}: the table is vouched for until MJD {expires}, but ends with the step of MJD "
            f"{rows[-1].mjd}, before that of MJD {lost[0]}; the file is cut short: get a fresh copy",
            row=len(lines),
            path=path,
        )
    if expires is not None and expires <= rows[-1].mjd:
        raise DataFileError(
            f"{path}: the table expires on MJD {expires}, before its last step on MJD {rows[-1].mjd}; its head or its "
            "rows are damaged",
            path=path,
        )
    return LeapFile(tuple(rows), expires, issued, hashlib.sha256(content).hexdigest())


def _check_step(before: LeapRow, row: LeapRow, number: int, path: Path) -> None:
    """Leap seconds are of one second, and come at the end of a month (ITU-R TF.460-6, annex 1, section 2.1)."""
    complaint = ""
    if row.mjd <= before.mjd:
        complaint = f"MJD {row.mjd} does not follow {before.mjd}"
    elif abs(row.tai_minus_utc_ns - before.tai_minus_utc_ns) != 10**9:
        complaint = (
            f"TAI - UTC goes from {before.tai_minus_utc_ns / 1e9:g} to {row.tai_minus_utc_ns / 1e9:g} s, where a leap "
            "second is one second: a row is missing or damaged, or the rule is a later one"
        )
    elif date_from_mjd(row.mjd)[2] != 1:
        complaint = f"MJD {row.mjd} is not the first day of a month"
    if complaint:
        raise DataFileError(f"{path}, row {number}: {complaint}", row=number, path=path)


def _mjd_of(year: int, month: int, day: int) -> int:
    """MJD of a Gregorian date; `ValueError` where there is no such date."""
    return int(np.datetime64(f"{year:04d}-{month:02d}-{day:02d}", "D").astype(np.int64)) + 40587


def _dat_header(lines: list[str], path: str | Path) -> tuple[int | None, str | None]:
    expires: int | None = None
    issued: str | None = None
    for number, line in enumerate(lines, start=1):
        found = re.search(r"^#.*expires on\s+(\d{1,2})\s+([A-Za-z]+)\s+(\d{4})", line)
        if found:
            try:
                expires = _mjd_of(int(found[3]), _MONTHS.index(found[2].lower()) + 1, int(found[1]))
            except ValueError as error:
                raise DataFileError(f"{path}, row {number}: no such date: {line!r}", row=number, path=path) from error
        found = re.search(r"^#.*Bulletin\s+(?:C\s*)?(\d+)\s+issued in\s+([A-Za-z]+\s+\d{4})", line)
        if found:
            issued = f"Bulletin C {found[1]}, {found[2]}"
    return expires, issued


def _dat_row(content: list[str]) -> LeapRow:
    if len(content) != 5:
        raise ValueError("expected MJD, day, month, year, TAI-UTC")
    mjd = exact_number(content[0])
    day, month, year = (int(part) for part in content[1:4])
    if mjd != _mjd_of(year, month, day):
        raise ValueError(f"MJD and date disagree: {year:04d}-{month:02d}-{day:02d} is MJD {_mjd_of(year, month, day)}")
    return LeapRow(int(mjd), nanoseconds(content[4], "TAI - UTC"), int(mjd))


def _list_header(lines: list[str], path: str | Path) -> tuple[int | None, str | None]:
    values: dict[str, tuple[int, str]] = {}
    for number, line in enumerate(lines, start=1):
        if line.startswith(_LIST_MARKS):
            values[line[:2]] = (number, line[2:].strip())
    missing = [mark for mark in _LIST_MARKS if mark not in values]
    if missing:
        raise DataFileError(
            f"{path}: no line {' and '.join(missing)}, which a leap-seconds.list has (update, expiry, checksum): the "
            "file is cut short; get a fresh copy",
            row=len(lines),
            path=path,
        )
    for mark in ("#@", "#$"):
        number, value = values[mark]
        if not (value.isdecimal() and len(value) <= _NTP_DIGITS):
            raise DataFileError(
                f"{path}, row {number}: {mark} must be followed by NTP seconds, got {value!r:.60}",
                row=number,
                path=path,
            )
    digits = values["#$"][1] + values["#@"][1]
    digits += "".join("".join(line.partition("#")[0].split()) for line in lines)
    expected = hashlib.sha1(digits.encode(), usedforsecurity=False).hexdigest()
    number, words = values["#h"]
    # Leading zeros of a word may be left out.
    if "".join(word.zfill(8) for word in words.split()) != expected:
        raise DataFileError(
            f"{path}, row {number}: the checksum is not that of the rows; "
            "the file is damaged or was edited: get a fresh copy",
            row=number,
            path=path,
        )
    issued = str(np.datetime64("1900-01-01", "s") + np.timedelta64(int(values["#$"][1]), "s"))[:10]
    return int(values["#@"][1]) // 86400 + _NTP_TO_MJD, issued


def _list_row(content: list[str]) -> LeapRow:
    if len(content) != 2 or len(content[0]) > _NTP_DIGITS:
        raise ValueError("expected NTP seconds and TAI-UTC")
    day, rest = divmod(int(content[0]), 86400)
    if rest:
        raise ValueError("the NTP seconds are not those of 0h")
    return LeapRow(day + _NTP_TO_MJD, nanoseconds(content[1], "TAI - UTC"), day + _NTP_TO_MJD)
