"""The celestial intermediate pole and origin, X, Y and s of IAU 2006/2000A, from a table.

The full series (IERS Conventions 2010, 5.5.4; `erfa.xys06a`) takes 30-40 us a date. Between 1960 and 2060 it is
read from Chebyshev records of 4 days that `ephemeris_cache/make_cip_table.py` fitted to it: they differ from
it by less than 2e-14 rad, 0.1 um at the Earth's surface. Outside the table the series itself is
evaluated: slower, the same answer.
"""

from __future__ import annotations

from functools import lru_cache
from typing import Final

import numpy as np

from ..ephemeris.chebyshev import ChebyshevTable
from ..ephemeris.shipped import shipped_path
from ..errors import DataFileError
from ..exact import FloatArray, Pair

__all__ = ["TABLE_NAME", "cip", "series"]

TABLE_NAME: Final = "cip_iau2006a_1960_2060.npz"
_JD_J2000: Final = 2451545.0
# The series is smooth over hours (its shortest period is 2 days), so a central difference over this step gives
# its rate to 1e-4 of the 7e-12 rad/s that it reaches.
_DIFFERENCE_DAY: Final = 0.0625


@lru_cache(maxsize=1)
def _table() -> ChebyshevTable:
    path = shipped_path(TABLE_NAME)
    try:
        with np.load(path, allow_pickle=False) as data:
            return ChebyshevTable(float(data["start_s"]), float(data["step_s"]), data["coefficients"])
    except (OSError, KeyError, ValueError) as error:
        raise DataFileError(
            f"the table of the celestial pole cannot be read ({error}); install the package again, or remake it with "
            "ephemeris_cache/make_cip_table.py",
            path=path,
        ) from error


def series(tt: Pair) -> FloatArray:
    """X, Y (rad) and s (rad) from the full IAU 2006/2000A series.

    Parameters
    ----------
    tt : Pair
        TT count, any shape.

    Returns
    -------
    float array (..., 3)
    """
    return _series(tt, 0.0)


def _series(tt: Pair, shift_day: float) -> FloatArray:
    import erfa

    day, second = np.divmod(np.asarray(tt[0]), 86400)
    return np.stack(erfa.xys06a(_JD_J2000 + day, (second + tt[1]) / 86400.0 + shift_day), axis=-1)


def cip(tt: Pair) -> tuple[FloatArray, FloatArray]:
    """X, Y and s of IAU 2006/2000A, and their rates.

    Parameters
    ----------
    tt : Pair
        TT count, any shape, any date.

    Returns
    -------
    xys_rad : float array (..., 3)
        CIP coordinates X, Y and CIO locator s; within 2e-14 rad of the series.
    rate_rad_s : float array (..., 3)
        Their rates.

    Raises
    ------
    DataFileError
        If the shipped table is missing or damaged.
    """
    table = _table()
    whole = np.asarray(tt[0], dtype=np.int64)
    fraction = np.asarray(tt[1], dtype=np.float64)
    start_s, end_s = table.span
    outside = np.asarray((whole < start_s) | (whole >= end_s))
    if not outside.any():
        return table.value_and_rate((whole, fraction))
    whole, fraction = np.broadcast_arrays(whole, fraction)
    value = np.empty((*whole.shape, 3))
    rate = np.empty_like(value)
    far = (whole[outside], fraction[outside])
    value[outside] = _series(far, 0.0)
    rate[outside] = (_series(far, _DIFFERENCE_DAY) - _series(far, -_DIFFERENCE_DAY)) / (2 * 86400.0 * _DIFFERENCE_DAY)
    inside = ~outside
    if inside.any():
        value[inside], rate[inside] = table.value_and_rate((whole[inside], fraction[inside]))
    return value, rate
