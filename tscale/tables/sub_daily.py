"""Tidal variations of Earth orientation within a day, from a table that is made as it is needed.

The 82 lines of `sub_daily_lines` take some 7 us a date. They are tabulated instead, as Chebyshev
records of half a day in pages of 4096 days; a page takes some 30 ms to make and is kept for the life of the process. A
page is a function of its number alone. It differs from the lines by less than 1e-16 s in UT1 and 1e-15 rad in
the pole.
"""

from __future__ import annotations

from functools import lru_cache
from typing import Final

import numpy as np

from .. import exact
from ..ephemeris.chebyshev import ChebyshevTable
from ..exact import FloatArray, Pair
from .sub_daily_lines import EpochLines, ocean_lines, ut1_libration_lines

__all__ = ["add_sub_daily", "sub_daily_terms", "with_sub_daily_ut1"]

_PAGE_DAYS: Final = 4096
_PAGE_S: Final = _PAGE_DAYS * 86400
_RECORD_DAY: Final = 0.5
_ORDER: Final = 20
"""Coefficients of a record: the twice-daily lines turn by 3.4 rad in half of one, where J_20 is 2e-14."""
_PAGES_KEPT: Final = 16  # 180 years, of 8 MB each


def sub_daily_terms(ut1: Pair) -> tuple[FloatArray, FloatArray]:
    """Tidal variations within a day and their rates.

    Parameters
    ----------
    ut1 : Pair
        Count of UT1 without these variations, any shape. UTC would do as well but for its leaps, each of which would
        move UT1 by up to 7 ns; TT would put the tides 70 s off, 0.5 us.

    Returns
    -------
    values, rates : float array (3, ...)
        x rad, y rad, UT1 s, to be added to the values of a daily series, and their derivatives per second.
    """
    whole, fraction = np.broadcast_arrays(np.asarray(ut1[0], dtype=np.int64), np.asarray(ut1[1], dtype=np.float64))
    number = np.asarray(whole // _PAGE_S)
    pages = np.unique(number)
    if pages.size == 1:
        value, rate = _page(int(pages[0])).value_and_rate((whole, fraction))
        return np.moveaxis(value, -1, 0), np.moveaxis(rate, -1, 0)
    values, rates = np.empty((3, *whole.shape)), np.empty((3, *whole.shape))
    for page in pages:
        mine = number == page
        value, rate = _page(int(page)).value_and_rate((whole[mine], fraction[mine]))
        values[:, mine], rates[:, mine] = value.T, rate.T
    return values, rates


def add_sub_daily(tai: Pair, values: FloatArray, slopes: FloatArray | None = None) -> None:
    """Add the variations at TAI counts, and their rates, to rows of UT1-TAI, x, y (and more), in place."""
    terms, rates = sub_daily_terms(exact.add_seconds(tai, values[0]))
    for table, (x, y, ut1) in ((values, terms), (slopes, rates)):
        if table is not None:
            table[0] += ut1
            table[1] += x
            table[2] += y


def with_sub_daily_ut1(tai: Pair, ut1_minus_tai: Pair) -> Pair:
    """UT1-TAI at TAI counts with its variation, from what a daily series gives."""
    return exact.add_seconds(ut1_minus_tai, sub_daily_terms(exact.add(tai, ut1_minus_tai))[0][2])


@lru_cache(maxsize=_PAGES_KEPT)
def _page(number: int) -> ChebyshevTable:
    records = round(_PAGE_DAYS / _RECORD_DAY)
    centre = number * _PAGE_DAYS + (np.arange(records, dtype=np.float64) + 0.5) * _RECORD_DAY
    coefficients = _records(ocean_lines(), centre) + _records(ut1_libration_lines(), centre)
    coefficients.flags.writeable = False
    name = "sub-daily Earth orientation"
    return ChebyshevTable(float(number * _PAGE_S), 86400.0 * _RECORD_DAY, coefficients, name)


def _records(lines: EpochLines, centre_day: FloatArray) -> FloatArray:
    """Chebyshev coefficients (records, 3, order) of a sum of lines around the middles of records.

    Within a page every angle grows evenly: over 4096 days the rates of the Moon's arguments change by 1e-10 rad a day.
    """
    nodes = (np.arange(2 * _ORDER) + 0.5) * (np.pi / (2 * _ORDER))
    to_coefficients = np.cos(np.arange(_ORDER)[:, np.newaxis] * nodes) / _ORDER
    to_coefficients[0] *= 0.5
    half_rad = 0.5 * _RECORD_DAY * lines.rate_of(float(centre_day[len(centre_day) // 2]))
    turned = np.exp(1j * half_rad[:, np.newaxis] * np.cos(nodes)) @ to_coefficients.T
    weighted = (lines.amplitude[:, :, np.newaxis] * turned[:, np.newaxis, :]).reshape(len(turned), -1)
    angle = lines.angle_of(centre_day)
    flat = np.cos(angle) @ weighted.real - np.sin(angle) @ weighted.imag
    return np.asarray(flat.reshape(len(centre_day), 3, _ORDER))
