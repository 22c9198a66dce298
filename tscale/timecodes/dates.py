"""numpy's datetime64 and Python's datetime: types without leap seconds, read and written without a guess.

Both count days of 86400 s. Their labels are read as those of the scale that is named. A label inside a leap second
has no place in them: by choice that raises, or the last moment before it is given.
"""

from __future__ import annotations

import datetime as stdlib
from typing import Any, Final, Literal, TypeAlias

import numpy as np
import numpy.typing as npt

from ..constants import DAY_S
from ..errors import InvalidInput, OutOfSpan
from ..exact import BoolArray, IntArray
from ..formats import labels
from ..formats.decimals import from_digits
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from ..scales import Scale, check_place

__all__ = ["from_datetime", "from_datetime64", "to_datetime", "to_datetime64"]

InLeap: TypeAlias = Literal["raise", "clamp"]
_MJD_1970: Final = 40587
_MOST: Final = 2**62
_DIGITS: Final = {"s": 0, "ms": 3, "us": 6, "ns": 9, "ps": 12, "fs": 15, "as": 18}
_LONGER: Final = {"W": 7 * DAY_S, "D": DAY_S, "h": 3600, "m": 60}


def from_datetime64(
    values: Any, scale: str, place: str | None = None, *, leap_seconds: LeapSeconds | None = None
) -> Instants:
    """Instants whose labels on `scale` are numpy datetime64 values, of any unit from weeks to attoseconds.

    Raises
    ------
    InvalidInput
        Not-a-time, with the mask; years and months; anything that is no datetime64.
    """
    array = np.asarray(values)
    unit = np.datetime_data(array.dtype)[0] if array.dtype.kind == "M" else ""
    step = np.datetime_data(array.dtype)[1] if array.dtype.kind == "M" else 1
    if unit not in _DIGITS and unit not in _LONGER:
        raise InvalidInput(
            f"dates must be datetime64 with one of the units {', '.join([*_LONGER, *_DIGITS])}, got {array.dtype}"
        )
    bad = np.isnat(array)
    if np.any(bad):
        raise InvalidInput(f"{int(np.count_nonzero(bad))} of {bad.size} values are NaT; drop them first", mask=bad)
    ticks = np.ascontiguousarray(array.astype(array.dtype.newbyteorder("="))).view(np.int64).reshape(array.shape)
    digits = _DIGITS.get(unit, 0)
    factor = step * _LONGER.get(unit, 1)
    far = np.asarray((ticks > _MOST // factor) | (ticks < -_MOST // factor))
    if np.any(far):
        raise InvalidInput(
            f"{int(np.count_nonzero(far))} of {far.size} dates lie beyond what an int64 of seconds holds (see .mask)",
            mask=far,
        )
    whole, numerator = np.divmod(ticks * factor, 10**digits)
    day, second = np.divmod(np.asarray(whole), DAY_S)
    return _instants(day + _MJD_1970, second, from_digits(np.asarray(numerator), digits), scale, place, leap_seconds)


def to_datetime64(
    t: Instants,
    unit: Literal["s", "ms", "us", "ns", "ps", "fs", "as"] = "ns",
    *,
    inside: InLeap = "raise",
    leap_seconds: LeapSeconds | None = None,
) -> npt.NDArray[np.datetime64]:
    """The labels of instants as datetime64, rounded to the unit.

    Parameters
    ----------
    t : Instants
    unit : str
        Nanoseconds reach from 1678 to 2262, attoseconds 9 s around 1970.
    inside : {"raise", "clamp"}
        For labels inside a leap second: raise, or give the last unit of the second before.

    Raises
    ------
    InvalidInput
        Labels inside a leap second, with the mask; an unknown unit.
    OutOfSpan
        Dates that the unit does not reach, with the mask.
    """
    if unit not in _DIGITS:
        raise InvalidInput(f"the unit must be one of {', '.join(_DIGITS)}, got {unit!r}")
    digits = _DIGITS[unit]
    day, second, numerator = _rounded(t, digits, inside, leap_seconds)
    whole = (day - _MJD_1970) * DAY_S + second
    most = (2**63 - 1) // 10**digits - 1
    far = np.asarray(np.abs(whole) > most)
    if np.any(far):
        raise OutOfSpan(
            f"{int(np.count_nonzero(far))} of {far.size} dates are beyond the reach of datetime64[{unit}]; take a "
            "longer unit (see .mask)",
            mask=far,
        )
    dates: npt.NDArray[np.datetime64] = (whole * 10**digits + numerator).astype(f"datetime64[{unit}]")
    return dates


def from_datetime(
    values: Any, scale: str = "UTC", place: str | None = None, *, leap_seconds: LeapSeconds | None = None
) -> Instants:
    """Instants of Python datetimes: one, or an array-like of them.

    A datetime with a time zone is an instant of UTC, whatever its zone; one without is a label of `scale`.

    Raises
    ------
    InvalidInput
        Anything but datetimes; datetimes with a zone for a scale other than UTC.
    """
    array = np.asarray(values, dtype=object)
    flat = array.reshape(-1)
    rows = np.empty((3, flat.size), dtype=np.int64)
    for i, value in enumerate(flat):
        if not isinstance(value, stdlib.datetime):
            raise InvalidInput(f"item {i} is {type(value).__name__}, not a datetime.datetime")
        if value != value:
            raise InvalidInput(f"item {i} is {value!r}, no date; drop it first")
        if getattr(value, "nanosecond", 0):
            raise InvalidInput(f"item {i}, {value}, has nanoseconds, which a datetime has not: use from_datetime64")
        if value.tzinfo is not None and value.utcoffset() is not None:
            if scale != "UTC":
                raise InvalidInput(f"item {i} has a time zone, which says UTC; it cannot be a label of {scale}")
            try:
                value = value.astimezone(stdlib.UTC)
            except OverflowError as error:
                raise InvalidInput(f"item {i}, {value}, is in UTC outside the years 1 to 9999") from error
        rows[:, i] = (
            value.toordinal() - 678576,  # the ordinal of MJD 0
            (value.hour * 60 + value.minute) * 60 + value.second,
            value.microsecond,
        )
    day, second, micro = (row.reshape(array.shape) for row in rows)
    return _instants(day, second, from_digits(micro, 6), scale, place, leap_seconds)


def to_datetime(
    t: Instants, *, inside: InLeap = "raise", leap_seconds: LeapSeconds | None = None
) -> npt.NDArray[np.object_]:
    """The labels of instants as Python datetimes, rounded to 1 us; those of UTC carry `timezone.utc`.

    Parameters
    ----------
    t : Instants
    inside : {"raise", "clamp"}
        For labels inside a leap second: raise, or give the last microsecond of the second before.

    Raises
    ------
    InvalidInput
        Labels inside a leap second, with the mask.
    OutOfSpan
        Years outside 1 to 9999, with the mask.
    """
    day, second, micro = _rounded(t, 6, inside, leap_seconds)
    ordinal = day + 678576
    far = np.asarray((ordinal < 1) | (ordinal > stdlib.date.max.toordinal()))
    if np.any(far):
        raise OutOfSpan(
            f"{int(np.count_nonzero(far))} of {far.size} dates are outside the years 1 to 9999 of datetime", mask=far
        )
    zone = stdlib.UTC if t.scale == "UTC" else None
    out = np.empty(t.shape, dtype=object)
    flat = out.reshape(-1)
    for i, (d, s, m) in enumerate(zip(ordinal.flat, second.flat, micro.flat, strict=True)):
        start = stdlib.datetime.combine(stdlib.date.fromordinal(int(d)), stdlib.time(), zone)
        flat[i] = start + stdlib.timedelta(seconds=int(s), microseconds=int(m))
    return out


def _instants(
    day: IntArray, second: IntArray, fraction: Any, scale: str, place: str | None, table: LeapSeconds | None
) -> Instants:
    kind = Scale.parse(scale)
    pair = labels.count(kind, (np.asarray(day), np.asarray(second), fraction), table)
    labels.warn_if_expired(kind, pair, table)
    return Instants._of(pair, kind, check_place(place))


def _rounded(t: Instants, digits: int, inside: str, table: LeapSeconds | None) -> tuple[IntArray, IntArray, IntArray]:
    """Labels rounded to decimals, with seconds of the day below 86400."""
    if inside not in ("raise", "clamp"):
        raise InvalidInput(f"inside must be 'raise' or 'clamp', got {inside!r}")
    kind = Scale.parse(t.scale)
    labels.warn_if_expired(kind, t.pair, table)
    face = labels.label(kind, t.pair, table)
    late: BoolArray = np.asarray(face[1] >= DAY_S)
    if inside == "raise" and np.any(late):
        raise InvalidInput(
            f"{int(np.count_nonzero(late))} of {late.size} labels are inside a leap second, which this type cannot "
            "hold: say inside='clamp', or use to_calendar or to_iso (see .mask)",
            mask=late,
        )
    day, second, numerator = labels.round_label(*face, digits, labels.day_length(kind, table))
    # Inside a leap second, or rounded up into one.
    late = np.asarray(second >= DAY_S)
    if kind.label_offset_s:  # the leap second of GLONASS is in the night of the next day
        return (
            np.asarray(day + late),
            np.where(late, kind.label_offset_s - 1, second),
            np.where(late, 10**digits - 1, numerator),
        )
    return day, np.where(late, DAY_S - 1, second), np.where(late, 10**digits - 1, numerator)
