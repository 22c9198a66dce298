"""Rows of Earth orientation: checked on the way in, turned into polynomials of TAI on the way out."""

from __future__ import annotations

from typing import Any, Final, NamedTuple

import numpy as np
import numpy.typing as npt

from .. import exact
from ..constants import DAY_S
from ..errors import InvalidInput
from ..exact import BoolArray, FloatArray, IntArray, Pair
from ..formats.leap_seconds import LeapSeconds
from .common import locate, mjd_date, since, tai_of_days
from .node_cubics import lagrange_cubics

__all__ = [
    "EOPMotion",
    "EOPNodes",
    "EOPRows",
    "EOPValues",
    "checked_rows",
    "constant_rows",
    "nodes_of",
]

_ARCSEC: Final = float(np.pi) / 648000.0
_TO_SI: Final = np.array([1.0, _ARCSEC, _ARCSEC, _ARCSEC / 1000.0, _ARCSEC / 1000.0])
_LARGEST_STEP_DAYS: Final = 10


class EOPRows(NamedTuple):
    """Columns of an Earth orientation table, one row per day at 0h UTC."""

    mjd: IntArray
    values: FloatArray
    """(n, 5): UT1-UTC s, x arcsec, y arcsec, dX mas, dY mas."""
    sigmas: FloatArray
    """(n, 5): their standard uncertainties in the same units."""
    predicted: BoolArray


class EOPValues(NamedTuple):
    """Earth orientation at instants, each array in their shape.

    The pole is (x, y) of polar motion and (dX, dY) the celestial pole offsets to IAU 2006/2000A. `*_sigma_*` are
    standard uncertainties. `status` is 0 measured, 1 predicted, 2 extrapolated.
    """

    ut1_minus_tai_s: FloatArray
    x_rad: FloatArray
    y_rad: FloatArray
    dx_rad: FloatArray
    dy_rad: FloatArray
    ut1_sigma_s: FloatArray
    x_sigma_rad: FloatArray
    y_sigma_rad: FloatArray
    dx_sigma_rad: FloatArray
    dy_sigma_rad: FloatArray
    status: npt.NDArray[np.int8]


class EOPMotion(NamedTuple):
    """Earth orientation and its time derivatives at instants, each array in their shape.

    The first five are those of `EOPValues`, to the same bit; `*_rate*` are the derivatives by TAI of the polynomials
    between the rows, zero where the values are held. At a row, where two polynomials meet, it is that of the later.
    """

    ut1_minus_tai_s: FloatArray
    x_rad: FloatArray
    y_rad: FloatArray
    dx_rad: FloatArray
    dy_rad: FloatArray
    ut1_minus_tai_rate: FloatArray
    """d(UT1-TAI)/dTAI, s/s."""
    x_rate_rad_s: FloatArray
    y_rate_rad_s: FloatArray
    dx_rate_rad_s: FloatArray
    dy_rate_rad_s: FloatArray


class EOPNodes(NamedTuple):
    """Rows as polynomials of TAI, one per interval, in SI units."""

    tai: Pair
    length_s: FloatArray
    """(n - 1,): lengths of the intervals."""
    ut1_base: IntArray
    """(n,): whole seconds of UT1-TAI, kept apart from the polynomials so that these stay small and exact."""
    powers: FloatArray
    """(n - 1, 4, 5): UT1-TAI less its base s, x, y, dX, dY rad, by powers of the part of the interval elapsed."""
    sigmas: FloatArray
    """(n - 1, 2, 5): straight lines through the uncertainties."""
    status: npt.NDArray[np.int8]
    """(n,): 0 measured, 1 predicted."""
    daily: bool
    """Whether the rows are a day apart, give or take a step of UTC."""

    def within(self, tai: Pair) -> tuple[IntArray, FloatArray]:
        """Interval and seconds into it, of each instant or of the nearer end of the table."""
        last = len(self.length_s) - 1
        if not self.daily:
            interval = np.clip(locate(self.tai, tai), 0, last)
            elapsed_s = self._since(interval, tai)
            return interval, np.clip(elapsed_s, 0.0, self.length_s[interval])
        # Days of 86400 s, shifted by leap seconds: the day itself or a neighbour, found without a search.
        interval = np.clip((tai[0] - self.tai[0][0]) // DAY_S, 0, last)
        while True:
            elapsed_s = self._since(interval, tai)
            early = (elapsed_s < 0.0) & (interval > 0)
            late = (self._since(interval + 1, tai) >= 0.0) & (interval < last)
            if not (early.any() or late.any()):
                return interval, np.clip(elapsed_s, 0.0, self.length_s[interval])
            interval = interval + late - early

    def _since(self, row: IntArray, tai: Pair) -> FloatArray:
        return since((self.tai[0][row], self.tai[1][row]), tai)

    def ut1(self, interval: IntArray, elapsed_s: FloatArray) -> Pair:
        """UT1-TAI."""
        u = elapsed_s / self.length_s[interval]
        value = self.powers[interval, 3, 0]
        for power in (2, 1, 0):
            value = value * u + self.powers[interval, power, 0]
        return exact.normalise(self.ut1_base[interval], value)

    def ut1_rate(self, interval: IntArray, elapsed_s: FloatArray) -> FloatArray:
        """d(UT1-TAI)/dTAI."""
        length_s = self.length_s[interval]
        u = elapsed_s / length_s
        c1, c2, c3 = (self.powers[interval, power, 0] for power in (1, 2, 3))
        return np.asarray((c1 + u * (2.0 * c2 + u * 3.0 * c3)) / length_s)

    def status_in(self, interval: IntArray, elapsed_s: FloatArray) -> npt.NDArray[np.int8]:
        """Status on a row: its own; between two rows: the worse."""
        own = self.status[interval]
        return np.asarray(np.where(elapsed_s == 0.0, own, np.maximum(own, self.status[interval + 1])))


def checked_rows(mjd: npt.ArrayLike, values: tuple[Any, ...], sigmas: tuple[Any, ...], predicted: Any) -> EOPRows:
    """Broadcast five columns and their uncertainties to the days, or raise `InvalidInput`."""
    try:
        day = np.atleast_1d(np.asarray(mjd, dtype=np.float64))
        columns = [np.broadcast_to(np.asarray(column, dtype=np.float64), day.shape) for column in (*values, *sigmas)]
        flags = np.array(np.broadcast_to(np.asarray(predicted, dtype=np.bool_), day.shape))
    except (TypeError, ValueError) as error:
        raise InvalidInput(f"Earth orientation columns must be numbers, as many as days in mjd: {error}") from error
    table = np.stack(columns, axis=-1)
    bad = ~np.isfinite(table).all(axis=-1) | (table[..., 5:] < 0.0).any(axis=-1) | (day != np.floor(day))
    if day.ndim != 1 or bad.any():
        raise InvalidInput(
            "Earth orientation rows are a list: each needs a whole MJD, finite values, uncertainties of zero or more",
            mask=bad,
        )
    step = np.diff(day)
    if len(day) < 2 or (step <= 0).any() or (step > _LARGEST_STEP_DAYS).any():
        raise InvalidInput(
            f"Earth orientation needs two rows or more whose days increase by {_LARGEST_STEP_DAYS} at most; got "
            f"{len(day)} rows{f' with steps from {step.min():g} to {step.max():g} days' if len(day) > 1 else ''}"
        )
    return EOPRows(day.astype(np.int64), table[:, :5], table[:, 5:], flags)


def constant_rows(values: tuple[float, ...], start_mjd: int, end_mjd: int) -> EOPRows:
    """Repeat five values on every day of a span."""
    row = np.array(values, dtype=np.float64)
    if not np.isfinite(row).all() or not start_mjd < end_mjd:
        raise InvalidInput(
            f"constant Earth orientation needs finite values and start_mjd before end_mjd; got {row.tolist()} "
            f"from MJD {start_mjd}{_date(start_mjd)} to MJD {end_mjd}{_date(end_mjd)}"
        )
    mjd = np.arange(start_mjd, end_mjd + 1, dtype=np.int64)
    still = np.tile(row, (len(mjd), 1))
    return EOPRows(mjd, still, np.zeros_like(still), np.zeros(len(mjd), dtype=np.bool_))


def nodes_of(rows: EOPRows, leap_seconds: LeapSeconds, *, constant: bool = False) -> EOPNodes:
    """Polynomials through the rows; with `constant`, UT1-UTC is held over each day of UTC instead."""
    tai, tai_minus_utc_s = tai_of_days(rows.mjd, leap_seconds)
    base = -np.rint(tai_minus_utc_s)
    values = rows.values * _TO_SI
    small = values[:, 0] - (tai_minus_utc_s + base)
    if constant:
        powers = np.zeros((len(values) - 1, 4, 5))
        powers[:, 0] = values[:-1]
        # TAI-UTC in the drift years grows within the day.
        noon = leap_seconds.count_from_label(rows.mjd[:-1], 43200, 0.0)
        powers[:, 1, 0] = -2.0 * (leap_seconds.tai_minus_utc(noon) - tai_minus_utc_s[:-1])
    else:
        # UT1-TAI, which knows no leap second, is what the polynomials go through.
        values[:, 0] = small
        powers = lagrange_cubics(tai, values, base)
    powers[:, 0, 0] = small[:-1]
    sigmas = rows.sigmas * _TO_SI
    lines = np.stack([sigmas[:-1], np.diff(sigmas, axis=0)], axis=1)
    length_s = since((tai[0][:-1], tai[1][:-1]), (tai[0][1:], tai[1][1:]))
    daily = bool(np.all(np.abs(length_s - DAY_S) < 2.0))
    return EOPNodes(tai, length_s, base.astype(np.int64), powers, lines, rows.predicted.astype(np.int8), daily)


def _date(mjd: float) -> str:
    return f" ({mjd_date(mjd)})" if abs(mjd) < 1e6 else ""
