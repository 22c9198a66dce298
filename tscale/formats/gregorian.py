"""The proleptic Gregorian calendar in integers, for any year that an int64 holds.

Years are counted from 1 March, so that the leap day is the last of its year (Explanatory Supplement to the
Astronomical Almanac, 3rd ed., section 15.11).
"""

from __future__ import annotations

from typing import Any, Final

import numpy as np

from ..exact import BoolArray, IntArray

__all__ = ["date_from_mjd", "is_leap_year", "mjd_from_date", "month_length"]

_MARCH_0: Final = 678881  # days from 0000-03-01 to 1858-11-17, the origin of MJD
_MONTH_DAYS: Final = (0, 31, 28, 31, 30, 31, 30, 31, 31, 30, 31, 30, 31)


def is_leap_year(year: Any) -> BoolArray:
    """Tell which years have 366 days."""
    year = np.asarray(year)
    return np.asarray((year % 4 == 0) & ((year % 100 != 0) | (year % 400 == 0)))


def month_length(year: Any, month: Any) -> IntArray:
    """Days in months 1 to 12."""
    month = np.asarray(month)
    return np.asarray(np.array(_MONTH_DAYS)[month] + ((month == 2) & is_leap_year(year)))


def mjd_from_date(year: Any, month: Any, day: Any) -> IntArray:
    """MJD of dates; the day may run over the month (month 1, day 60 is day 60 of the year)."""
    shift = np.asarray(month, dtype=np.int64) + 9
    year = np.asarray(year, dtype=np.int64) + shift // 12 - 1
    since_march = (153 * (shift % 12) + 2) // 5
    return np.asarray(365 * year + year // 4 - year // 100 + year // 400 + since_march + day - 1 - _MARCH_0)


def date_from_mjd(mjd: Any) -> tuple[IntArray, IntArray, IntArray]:
    """Year, month and day of MJDs."""
    days = np.asarray(mjd, dtype=np.int64) + _MARCH_0
    century = (4 * days + 3) // 146097
    rest = days - 146097 * century // 4
    year = (4 * rest + 3) // 1461
    rest = rest - 1461 * year // 4
    month = (5 * rest + 2) // 153
    day = rest - (153 * month + 2) // 5 + 1
    late = month >= 10
    return np.asarray(100 * century + year + late), np.asarray(month + 3 - 12 * late), np.asarray(day)
