"""Rows of TAI - UTC in exact integers, and those of the drift years 1961-1971."""

from __future__ import annotations

from collections.abc import Sequence
from decimal import Decimal, InvalidOperation
from fractions import Fraction
from typing import Any, Final, NamedTuple

from ..errors import InvalidInput

__all__ = ["DRIFT_ROWS", "FIRST_STEP", "LeapRow", "day_number", "exact_number", "nanoseconds", "row_of"]


class LeapRow(NamedTuple):
    """One span of UTC: TAI - UTC = `tai_minus_utc_ns` + `rate_ns_s` * (label seconds since `reference_mjd`).

    All in integers: every published row is exact in nanoseconds.
    """

    mjd: int
    """First day of the span, from 0h UTC."""
    tai_minus_utc_ns: int
    """TAI - UTC at 0h UTC of `reference_mjd`, ns."""
    reference_mjd: int
    rate_ns_s: int = 0
    """Growth of TAI - UTC, ns per second of UTC."""

    @property
    def start_ns(self) -> int:
        """TAI - UTC at 0h UTC of the first day, ns."""
        return self.tai_minus_utc_ns + (self.mjd - self.reference_mjd) * 86400 * self.rate_ns_s


# US Naval Observatory, tai-utc.dat (the rates there are per day: 0.001296 s/d = 15 ns/s, 0.0011232 s/d = 13 ns/s,
# 0.002592 s/d = 30 ns/s).
DRIFT_ROWS: Final = (
    LeapRow(37300, 1_422_818_000, 37300, 15),
    LeapRow(37512, 1_372_818_000, 37300, 15),
    LeapRow(37665, 1_845_858_000, 37665, 13),
    LeapRow(38334, 1_945_858_000, 37665, 13),
    LeapRow(38395, 3_240_130_000, 38761, 15),
    LeapRow(38486, 3_340_130_000, 38761, 15),
    LeapRow(38639, 3_440_130_000, 38761, 15),
    LeapRow(38761, 3_540_130_000, 38761, 15),
    LeapRow(38820, 3_640_130_000, 38761, 15),
    LeapRow(38942, 3_740_130_000, 38761, 15),
    LeapRow(39004, 3_840_130_000, 38761, 15),
    LeapRow(39126, 4_313_170_000, 39126, 30),
    LeapRow(39887, 4_213_170_000, 39126, 30),
)
"""TAI - UTC from 1961-01-01 to 1971-12-31."""

FIRST_STEP: Final = LeapRow(41317, 10_000_000_000, 41317)
"""TAI - UTC from 1972-01-01."""


_LARGEST_S: Final = 10**9


def nanoseconds(seconds: Any, what: str) -> int:
    """Seconds as an exact whole number of ns; a float counts as the shortest decimal that means it."""
    value = exact_number(seconds)
    if value is None or abs(value) > _LARGEST_S or (value * 10**9).denominator != 1:
        raise InvalidInput(
            f"{what} must be a finite, whole number of nanoseconds and at most {_LARGEST_S} s, got {seconds!r:.60} s"
        )
    return int(value * 10**9)


def exact_number(number: Any) -> Fraction | None:
    """A number or its text, exactly; None for what is none, or has hundreds of digits."""
    if isinstance(number, int | Fraction):
        return Fraction(number)
    try:
        value = Decimal(str(number))
    except InvalidOperation:
        return None
    # An exponent of some digits would make a fraction of a billion of them.
    return Fraction(value) if value.is_finite() and abs(value.adjusted()) < 100 else None


def day_number(mjd: Any) -> int | None:
    """Check a whole day (MJD), or None."""
    if mjd is None:
        return None
    if isinstance(mjd, bool) or int(mjd) != mjd:
        raise InvalidInput(f"a leap-second table counts in whole days (MJD), got {mjd!r}")
    return int(mjd)


def row_of(row: Sequence[Any]) -> LeapRow:
    """Make a row of (mjd, tai_minus_utc_s) or (mjd, tai_minus_utc_s, reference_mjd, rate_s_per_day)."""
    if isinstance(row, LeapRow):
        return row
    if len(row) not in (2, 4):
        raise InvalidInput(
            f"a row is (mjd, tai_minus_utc_s) or (mjd, tai_minus_utc_s, reference_mjd, rate_s_per_day), got {row!r}"
        )
    mjd = day_number(row[0])
    reference = day_number(row[2]) if len(row) == 4 else mjd
    if mjd is None or reference is None:
        raise InvalidInput(f"a row needs its day (MJD), got {row!r}")
    rate_ns_day = Fraction(0)
    if len(row) == 4:
        rate_ns_day = Fraction(nanoseconds(row[3], "the drift per day"), 86400)
        if rate_ns_day.denominator != 1:
            raise InvalidInput(
                f"the drift must be a whole number of ns per second (86.4 us per day), got {row[3]!r} s per day"
            )
    return LeapRow(mjd, nanoseconds(row[1], "TAI - UTC"), reference, int(rate_ns_day))
