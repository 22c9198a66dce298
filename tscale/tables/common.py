"""What every table here needs: bytes and their hash, frozen arrays, dates for messages, the row before an instant."""

from __future__ import annotations

import hashlib
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from ..constants import MJD_J2000
from ..errors import DataFileError
from ..exact import FloatArray, IntArray, Pair
from ..formats.leap_seconds import LeapSeconds
from ..storage import read_bytes

__all__ = [
    "FrozenArrays",
    "as_pair",
    "locate",
    "mjd_date",
    "read_file",
    "rows_hash",
    "since",
    "tai_of_days",
    "utc_text",
]

_TAI_MINUS_UTC_COUNT: Final = 32


class FrozenArrays:
    """Base of the tables: arrays among the attributes are read-only, also after a copy through pickle."""

    def __post_init__(self) -> None:
        _freeze(vars(self).values())

    def __setstate__(self, state: Mapping[str, Any]) -> None:
        vars(self).update(state)
        _freeze(state.values())


def _freeze(values: Iterable[Any]) -> None:
    for value in values:
        if isinstance(value, np.ndarray):
            value.flags.writeable = False
        elif isinstance(value, tuple):
            _freeze(value)


def read_file(path: Path, what: str) -> tuple[bytes, str]:
    """Bytes of a file and their SHA-256, or `DataFileError` if there is nothing to read."""
    try:
        content = read_bytes(path)
    except OSError as error:
        raise DataFileError(f"cannot read the {what} {path}: {error.strerror or error}", path=path) from error
    if not content.strip():
        raise DataFileError(f"the {what} {path} is empty", path=path)
    return content, hashlib.sha256(content).hexdigest()


def rows_hash(*arrays: npt.NDArray[Any]) -> str:
    """SHA-256 of columns that come from no file."""
    digest = hashlib.sha256()
    for array in arrays:
        digest.update(np.ascontiguousarray(array).tobytes())
    return digest.hexdigest()


def mjd_date(mjd: float) -> str:
    """Calendar date of a Modified Julian Date, for messages."""
    return str(np.datetime64("2000-01-01", "D") + np.timedelta64(int(np.floor(mjd)) - MJD_J2000, "D"))


def utc_text(utc: Pair) -> str:
    """Label of one UTC count, to the second, for messages; by the default table, without a warning past its expiry."""
    day, second, _ = LeapSeconds.default().label_from_count(as_pair(utc))
    minute = min(int(second) // 60, 1439)  # a leap second belongs to the last minute of its day
    return f"{mjd_date(int(day))}T{minute // 60:02d}:{minute % 60:02d}:{int(second) - 60 * minute:02d}"


def as_pair(pair: Pair) -> Pair:
    """Make the two parts of a pair arrays of one shape."""
    whole, fraction = np.broadcast_arrays(np.asarray(pair[0], dtype=np.int64), np.asarray(pair[1], dtype=np.float64))
    return whole, fraction


def tai_of_days(mjd: npt.ArrayLike, leap_seconds: LeapSeconds) -> tuple[Pair, FloatArray]:
    """TAI count of 0h UTC of days (MJD), and TAI - UTC in force there, s."""
    utc = leap_seconds.count_from_label(np.asarray(mjd, dtype=np.int64), 0, 0.0)
    return (utc[0] + _TAI_MINUS_UTC_COUNT, utc[1]), leap_seconds.tai_minus_utc(utc)


def since(start: Pair, at: Pair) -> FloatArray:
    """Seconds from `start` to `at` as one float64: below 1e-10 s of error up to a day, sign exact."""
    return np.asarray((at[0] - start[0]) + (at[1] - start[1]), dtype=np.float64)


def locate(nodes: Pair, at: Pair) -> IntArray:
    """Index of the last node that is not after each instant; -1 before the first.

    Compared exactly: also nodes closer together than one float64 of the count resolves.
    """
    index = np.asarray(np.searchsorted(nodes[0], at[0], side="right") - 1)
    if not nodes[1].any():
        return index
    while True:
        candidate = np.maximum(index, 0)
        late = (index >= 0) & (nodes[0][candidate] == at[0]) & (nodes[1][candidate] > at[1])
        if not late.any():
            return index
        index = index - late
