"""The rows of a leap-second table as arrays, ready for lookup."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from fractions import Fraction
from itertools import pairwise
from typing import Any, Final

import numpy as np

from ..constants import MJD_J2000
from ..errors import InvalidInput
from ..exact import BoolArray, FloatArray, IntArray, Pair, normalise, two_product, two_sum
from .leap_second_rows import LeapRow

__all__ = ["Spans"]

_DAY: Final = 86400
_NS: Final = 1_000_000_000
_FAR: Final = np.iinfo(np.int64).max // 2  # days of the last span: more than any count holds


@dataclass(frozen=True)
class Spans:
    """Columns by row; `end_*` and `days` describe the last day of each row that has a next one."""

    day: IntArray
    """First day, MJD."""
    days: IntArray
    """Number of days."""
    offset_ns: IntArray
    """TAI - UTC at the start, ns."""
    rate_ns: IntArray
    """Growth of TAI - UTC, ns per label second."""
    count_whole: IntArray
    """UTC count at the start: whole seconds ..."""
    count_ns: IntArray
    """... and ns."""
    end_whole: IntArray
    """Length of the last day in label seconds: whole ..."""
    end_fraction: FloatArray
    """... and fraction, rounded to nearest."""
    slow_high: FloatArray
    """rate / (1 + rate) to 106 bits: high ..."""
    slow_low: FloatArray
    """... and low."""
    plain_shift: IntArray
    """TAI - UTC - 32 in whole seconds; meaningful from `plain_row` on."""
    plain_row: int
    """First row from which on no row drifts or starts at a fraction of a second."""
    plain_from: int
    """Its first day."""
    shortest: int
    """Every label below this many seconds exists on every day."""

    @classmethod
    def of(cls, rows: Sequence[LeapRow]) -> Spans:
        """Check rows and lay them out; `InvalidInput` says what is wrong with them."""
        _check_rows(rows)
        n = len(rows)
        counts_ns = [((row.mjd - MJD_J2000) * _DAY - 43200 - 32) * _NS + row.start_ns for row in rows]
        ends = [Fraction(_DAY)] * n
        for i in range(n - 1):
            elapsed_s = Fraction(counts_ns[i + 1] - counts_ns[i], _NS)
            length = elapsed_s / (1 + Fraction(rows[i].rate_ns_s, _NS)) - (rows[i + 1].mjd - rows[i].mjd - 1) * _DAY
            if abs(length - _DAY) >= _DAY // 2:
                raise InvalidInput(
                    f"TAI - UTC may step by less than half a day at a time; row {i + 1} (MJD {rows[i + 1].mjd}) "
                    f"steps by {float(length - _DAY)} s"
                )
            ends[i] = length
        slow = [Fraction(row.rate_ns_s, _NS + row.rate_ns_s) for row in rows]
        plain_row = n
        while plain_row and rows[plain_row - 1].rate_ns_s == 0 and counts_ns[plain_row - 1] % _NS == 0:
            plain_row -= 1
        days = [rows[i + 1].mjd - rows[i].mjd for i in range(n - 1)] + [_FAR]
        return cls(
            day=_ints(row.mjd for row in rows),
            days=_ints(days),
            offset_ns=_ints(row.start_ns for row in rows),
            rate_ns=_ints(row.rate_ns_s for row in rows),
            count_whole=_ints(count // _NS for count in counts_ns),
            count_ns=_ints(count % _NS for count in counts_ns),
            end_whole=_ints(end // 1 for end in ends),
            end_fraction=_floats(float(end % 1) for end in ends),
            slow_high=_floats(float(value) for value in slow),
            slow_low=_floats(float(value - Fraction(float(value))) for value in slow),
            plain_shift=_ints(row.start_ns // _NS - 32 for row in rows),
            plain_row=plain_row,
            plain_from=rows[plain_row].mjd if plain_row < n else _FAR,
            shortest=min(_DAY, *(int(end // 1) for end in ends)),
        )

    def row_of_day(self, day: IntArray, first: int) -> Any:
        """Row of each day, all of them at or after `first`; one number where it is the last row for all."""
        if first >= self.day[-1]:
            return len(self.day) - 1
        return np.searchsorted(self.day, day, side="right") - 1

    def last_day(self, day: IntArray) -> tuple[IntArray, BoolArray]:
        """Row of each day, and whether the day is the last of its row."""
        row = np.asarray(np.searchsorted(self.day, day, side="right") - 1)
        return row, np.asarray(day - self.day[row] == self.days[row] - 1)

    def row_of_count(self, whole: IntArray, fraction: FloatArray) -> Any:
        """Row of each UTC count, -1 before the first; one number where it is the last row for all."""
        if whole.size and int(whole.min()) > self.count_whole[-1]:
            return len(self.day) - 1
        row = np.asarray(np.searchsorted(self.count_whole, whole, side="right") - 1)
        at = np.maximum(row, 0)
        return row - ((whole == self.count_whole[at]) & (fraction < self.count_ns[at] / 1e9))

    def count(self, row: Any, day: IntArray, whole: IntArray, fraction: FloatArray) -> Pair:
        """UTC count of labels; the fraction is rounded once."""
        label_s = (day - self.day[row]) * _DAY + whole
        rate = self.rate_ns[row]
        # Whole nanoseconds of the start and the drift, and what they leave below a second as a sum of two floats.
        seconds, rest_ns = np.divmod(self.count_ns[row] + label_s * rate, _NS)
        high = rest_ns / 1e9
        product, error = two_product(high, 1e9)
        low = ((rest_ns - product) - error) / 1e9
        total, error = two_sum(high, fraction)
        carry = np.floor(total)
        rest = (total - carry) + (error + (low + fraction * (rate * 1e-9)))
        return normalise(self.count_whole[row] + label_s + seconds + carry.astype(np.int64), rest)

    def label_elapsed(self, row: Any, whole: IntArray, fraction: FloatArray) -> tuple[IntArray, FloatArray]:
        """Label seconds since the start of the row; the fraction is rounded once."""
        start_ns = self.count_ns[row]
        high = start_ns / 1e9
        product, error = two_product(high, 1e9)
        low = ((start_ns - product) - error) / 1e9
        elapsed = whole - self.count_whole[row]
        part, part_error = two_sum(fraction, -high)
        # label = elapsed - elapsed * rate / (1 + rate)
        seconds = elapsed.astype(np.float64)
        slow, slow_error = two_product(seconds, self.slow_high[row])
        total, total_error = two_sum(part, -slow)
        carry = np.floor(total)
        rest = total_error + part_error - low - slow_error - seconds * self.slow_low[row] - part * self.slow_high[row]
        label = normalise(elapsed + carry.astype(np.int64), (total - carry) + rest)
        # The start of a row may lie half an ulp above the float that stands for it.
        before = label[0] < 0
        return np.where(before, 0, label[0]), np.where(before, 0.0, label[1])

    def before_end(
        self, row: Any, days: IntArray, whole: IntArray, fraction: FloatArray
    ) -> tuple[IntArray, FloatArray]:
        """Keep labels that rounding has put on the end of their row just inside it."""
        end_whole, end_fraction = self.end_whole[row], self.end_fraction[row]
        over = (days == self.days[row] - 1) & (
            (whole > end_whole) | ((whole == end_whole) & (fraction >= end_fraction))
        )
        if not np.any(over):
            return whole, fraction
        inside = np.where(end_fraction > 0.0, np.nextafter(end_fraction, 0.0), np.nextafter(1.0, 0.0))
        return np.where(over, end_whole - (end_fraction == 0.0), whole), np.where(over, inside, fraction)


def _check_rows(rows: Sequence[LeapRow]) -> None:
    if not rows:
        raise InvalidInput("a leap-second table needs at least one row")
    for before, after in pairwise(rows):
        if after.mjd <= before.mjd:
            raise InvalidInput(f"the days of a leap-second table must increase; MJD {after.mjd} follows {before.mjd}")
    if any(abs(row.rate_ns_s) > 1000 for row in rows):
        raise InvalidInput("the drift of UTC must stay below 1e-6 (it was 3e-8 at most)")
    if any(
        abs(row.mjd) > 10**8 or abs(row.reference_mjd) > 10**8 or abs(row.tai_minus_utc_ns) > 10**18 for row in rows
    ):
        raise InvalidInput("rows must lie within 1e8 days of MJD 0, and TAI - UTC within 1e9 s")
    origin = [row for row in rows if row.mjd <= MJD_J2000]
    if not origin or origin[-1].rate_ns_s or origin[-1].tai_minus_utc_ns != 32 * _NS:
        raise InvalidInput("TAI - UTC must be a constant 32 s on 2000-01-01 (MJD 51544), where all counts start")


def _ints(values: Any) -> IntArray:
    array = np.array([int(value) for value in values], dtype=np.int64)
    array.flags.writeable = False
    return array


def _floats(values: Any) -> FloatArray:
    array = np.array(list(values), dtype=np.float64)
    array.flags.writeable = False
    return array
