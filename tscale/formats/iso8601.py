"""ISO 8601 texts to labels and back, whole arrays at a time.

Read: `YYYY-MM-DD` or `YYYY-DDD` (day of year), then nothing, or `T` or a blank and `hh:mm`, `hh:mm:ss` or
`hh:mm:ss.f` with 1 to 18 decimals after a full stop or a comma, then `Z` where the scale allows it. Years outside 0000
to 9999 take a sign and at least five digits. A leap second is second 60 of the last minute (ITU-R TF.460-6).
"""

from __future__ import annotations

import re
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from ..errors import InvalidInput, TextError
from ..exact import BoolArray, FloatArray, IntArray
from . import decimals, gregorian
from .checks import Label, first_item
from .checks import label as checked
from .iso8601_faults import fault
from .labels import DayLength, round_label

__all__ = ["format", "parse"]

_DATE: Final = r"(?P<year>\d{4}|[+-]\d{5,12})-(?:(?P<month>\d\d)-(?P<day>\d\d)|(?P<ordinal>\d{3}))"
_SECOND: Final = r"(?P<second>\d\d|[1-9]\d{2,4})(?:[.,](?P<decimals>\d{1,18}))?"
_CLOCK: Final = rf"[T ](?P<hour>\d\d):(?P<minute>\d\d)(?::{_SECOND})?(?P<z>Z)?"
_LAYOUT: Final = re.compile(rf"{_DATE}(?:{_CLOCK})?\Z", re.ASCII)
_LONGEST: Final = 100  # the longest date has 53 characters
_CHUNK: Final = 16384  # texts at a time, so that the columns stay in the cache
_ZERO: Final = ord("0")


def parse(texts: Any, *, allow_z: bool = False, allow_second_60: bool = False, label_offset_s: int = 0) -> Label:
    """Read texts.

    Parameters
    ----------
    texts : str, or array-like of str, any shape
        No text may have blanks around it.
    allow_z : bool
        Accept a closing `Z`, which says UTC.
    allow_second_60 : bool
        Accept seconds from 60 on in the last minute of a UTC day; whether that day has them is for
        `LeapSeconds.count_from_label` to say.
    label_offset_s : int
        Label minus UTC label, s: moves the minute that may have a second 60 (10800: 02:59).

    Returns
    -------
    day : int64 array
        MJD.
    second_whole : int64 array
        Seconds of the day; from 86400 on in a leap second (see `labels` for one that is not at the end of the day).
    second_fraction : float64 array
        The decimals, correctly rounded, in [0, 1).

    Raises
    ------
    TextError
        With the mask, the first bad text, its place and what is wrong with it. Nothing is ever cut off.
    """
    array = _as_texts(texts)
    flat = np.ascontiguousarray(array).reshape(-1)
    day = np.empty(flat.shape, dtype=np.int64)
    whole = np.empty(flat.shape, dtype=np.int64)
    fraction = np.empty(flat.shape, dtype=np.float64)
    good = np.zeros(flat.shape, dtype=np.bool_)
    reader = _Reader(allow_z, allow_second_60, label_offset_s)
    for start in range(0, flat.size, _CHUNK):
        part = slice(start, start + _CHUNK)
        reader.read(flat[part], day[part], whole[part], fraction[part], good[part])
    if not good.all():
        bad = ~good
        at = first_item(bad)
        text = str(flat[at])[: _LONGEST + 1]
        raise TextError(
            f"{int(np.count_nonzero(bad))} of {bad.size} texts are not dates; the first (item {at}) is {text!r}: "
            + fault(text, allow_z=allow_z, allow_second_60=allow_second_60, last_minute=reader.last_minute),
            mask=bad.reshape(array.shape),
        )
    return day.reshape(array.shape), whole.reshape(array.shape), fraction.reshape(array.shape)


def format(
    day: npt.ArrayLike,
    second_whole: npt.ArrayLike,
    second_fraction: npt.ArrayLike,
    digits: int = 12,
    *,
    day_length: DayLength | None = None,
) -> npt.NDArray[np.str_]:
    """Write labels as `YYYY-MM-DDThh:mm:ss.f` with `digits` decimals, rounded to nearest, ties to even.

    Parameters
    ----------
    day, second_whole, second_fraction : array-like
        Labels, as `parse` returns them.
    digits : int
        0 to 18; 18 decimals show the float64 fraction to 1e-18 s.
    day_length : DayLength, optional
        Of the scale (`labels.day_length`): it says where rounding up ends a day. None: 86400 s always.

    Returns
    -------
    str array, in the shape of the labels
    """
    label = checked(day, second_whole, second_fraction)
    days, whole, fraction = label[0].reshape(-1), label[1].reshape(-1), label[2].reshape(-1)
    parts = []
    for start in range(0, max(days.size, 1), _CHUNK):
        part = slice(start, start + _CHUNK)
        parts.append(_format((days[part], whole[part], fraction[part]), digits, day_length or DayLength()))
    return np.concatenate(parts).reshape(label[0].shape)


def _format(label: Label, digits: int, length: DayLength) -> npt.NDArray[np.str_]:
    """Write a chunk of one dimension."""
    days, whole, numerator = round_label(*label, digits, length)
    inside = whole >= 86400  # a leap second
    extra = np.where(inside, whole - (86400 + length.offset_s), 0)
    of_day = np.where(inside, (length.offset_s - 1) % 86400, whole)
    if length.offset_s:
        days = days + inside
    hour, rest = np.divmod(of_day, 3600)
    minute, second = np.divmod(rest, 60)
    second = second + np.where(inside, extra + 1, 0)
    year, month, month_day = gregorian.date_from_mjd(days)
    columns = (year, month, month_day, hour, minute, second, numerator)
    plain = (year >= 0) & (year <= 9999) & (second < 100)
    if plain.all():
        return _write(columns, digits, 0, 2)
    # Signed years and minutes of more than 100 s are as wide as they must be.
    year_digits = np.where((year >= 0) & (year <= 9999), 0, np.maximum(_width(np.abs(year)), 5))
    widths = year_digits * 10 + np.maximum(_width(second), 2)
    out: npt.NDArray[np.str_] | None = None
    for width in np.unique(widths)[::-1]:
        chosen = widths == width
        part = _write(tuple(column[chosen] for column in columns), digits, int(width) // 10, int(width) % 10)
        if out is None:
            longest = max(part.dtype.itemsize, 4 * (21 + 13 + digits))
            out = np.empty(year.shape, dtype=f"U{longest // 4}")
        out[chosen] = part
    assert out is not None
    return out.astype(f"U{int(np.char.str_len(out).max())}")


class _Reader:
    """Reads chunks of texts, one layout at a time."""

    def __init__(self, allow_z: bool, allow_second_60: bool, label_offset_s: int) -> None:
        self.allow_z = allow_z
        self.allow_second_60 = allow_second_60
        self.offset_s = label_offset_s
        self.last_minute = (label_offset_s // 60 - 1) % 1440

    def read(
        self, texts: npt.NDArray[np.str_], day: IntArray, whole: IntArray, fraction: FloatArray, good: BoolArray
    ) -> None:
        """Fill the rows of the texts that are dates, and mark them good."""
        width = texts.dtype.itemsize // 4
        if width == 0:
            return
        codes = texts.view(np.uint32).reshape(-1, width)
        # Code points above 255 become 255, which is neither digit nor mark.
        columns = np.minimum(codes, 255).astype(np.uint8).T.copy()
        left = np.arange(texts.size)
        while left.size:
            layout = _LAYOUT.match(str(texts[left[0]]))
            if layout is None:
                left = left[1:]
                continue
            alike, *label = self._read_layout(columns[:, left] if left.size < texts.size else columns, layout)
            rows = left[alike]
            for out, values in zip((day, whole, fraction, good), label, strict=True):
                out[rows] = values[alike]
            left = left[~alike]

    def _read_layout(self, columns: npt.NDArray[np.uint8], layout: re.Match[str]) -> tuple[Any, ...]:
        """Read the texts that are laid out like one; the others come back with alike = False."""
        text, width = layout.string, len(layout.string)
        digits = columns[:width] - np.uint8(_ZERO)
        alike = np.ones(columns.shape[1], dtype=np.bool_)
        for place, mark in enumerate(text):
            if mark.isdigit():
                alike &= digits[place] <= 9
            else:
                alike &= columns[place] == ord(mark)
        if width < len(columns):
            alike &= columns[width] == 0

        def number(group: str) -> Any:
            start, stop = layout.span(group)
            if start < 0:
                return 0
            kind = np.int64 if stop - start > 9 else np.int32
            value: npt.NDArray[Any] = np.zeros(columns.shape[1], dtype=kind)
            for place in range(start, stop):
                if text[place] not in "+-":
                    value *= 10
                    value += digits[place]
            return value.astype(np.int64)

        year = -number("year") if text[0] == "-" else number("year")
        minute_of_day = number("hour") * 60 + number("minute")
        second = number("second")
        good = (number("hour") < 24) & (number("minute") < 60)
        if layout["ordinal"]:
            month, day = np.ones(alike.shape, dtype=np.int64), number("ordinal")
            good &= (day >= 1) & (day <= 365 + gregorian.is_leap_year(year))
        else:
            month, day = number("month"), number("day")
            good &= (month >= 1) & (month <= 12)
            month = np.where(good, month, 1)
            good &= (day >= 1) & (day <= gregorian.month_length(year, month))
        if text[0] == "-":
            good &= year != 0
        if layout["z"] and not self.allow_z:
            good = np.zeros(alike.shape, dtype=np.bool_)
        mjd = gregorian.mjd_from_date(year, month, day)
        whole = minute_of_day * 60 + second
        late = np.asarray(second >= 60)
        if late.any():
            good &= ~late | (self.allow_second_60 & (minute_of_day == self.last_minute))
            if self.offset_s:
                # The leap second belongs to the UTC day before: see `labels`.
                mjd, whole = mjd - late, whole + late * 86400
        if len(layout["second"] or "") > 2:
            good &= second >= 10 ** (len(layout["second"]) - 1)
        if layout["decimals"]:
            fraction = decimals.from_digits(number("decimals"), len(layout["decimals"]))
        else:
            fraction = np.zeros(alike.shape)
        return alike, mjd, np.broadcast_to(whole, alike.shape), fraction, np.broadcast_to(good, alike.shape)


def _cut(texts: Any) -> Any:
    """Shorten texts that are too long for any date, still too long: an array is as wide as its longest text."""
    if isinstance(texts, str):
        return texts[: _LONGEST + 1]
    if isinstance(texts, list | tuple) and texts:
        nested = not isinstance(texts[0], str)
        try:
            if nested or max(map(len, texts)) > _LONGEST:
                return [_cut(text) for text in texts]
        except TypeError:  # something without a length, which is said elsewhere
            pass
    return texts


def _as_texts(texts: Any) -> npt.NDArray[np.str_]:
    try:
        array = np.asarray(_cut(texts))
    except ValueError as error:
        raise InvalidInput(f"dates must be texts in an array of one shape: {error}") from error
    if array.dtype.kind == "S":
        return np.char.decode(array, "latin-1")
    if array.dtype.kind == "O" and all(isinstance(text, str) for text in array.flat):
        return np.asarray(_cut(array.tolist()), dtype=np.str_).reshape(array.shape)
    if array.dtype.kind not in "UT" and array.size:
        raise InvalidInput(f"dates must be texts, got {array.dtype}; for numbers use from_mjd, from_jd or from_seconds")
    if array.dtype.kind != "U":
        return np.asarray(_cut(array.tolist()), dtype=np.str_).reshape(array.shape)
    return array.astype(array.dtype.newbyteorder("="), copy=False)


def _width(value: IntArray) -> IntArray:
    """Count decimal digits."""
    return np.asarray(np.char.str_len(value.astype(np.str_)), dtype=np.int64)


def _write(columns: tuple[IntArray, ...], digits: int, year_digits: int, second_digits: int) -> npt.NDArray[np.str_]:
    year, *clock, numerator = columns
    widths = [year_digits or 4, 2, 2, 2, 2, second_digits] + ([digits] if digits else [])
    marks = "--T::."
    total = sum(widths) + len(widths) - 1 + (year_digits > 0)
    out = np.empty((total, year.size), dtype=np.uint8)
    place = 0
    if year_digits:
        out[0] = np.where(year < 0, ord("-"), ord("+"))
        place = 1
    for index, (values, width) in enumerate(zip((np.abs(year), *clock, numerator), widths, strict=False)):
        rest = values if width > 9 else values.astype(np.int32)
        for position in range(place + width - 1, place - 1, -1):
            upper = rest // 10
            out[position] = rest - 10 * upper + _ZERO
            rest = upper
        place += width
        if place < total:
            out[place] = ord(marks[index])
            place += 1
    return np.ascontiguousarray(out.T.astype(np.uint32)).view(f"U{total}").reshape(-1)
