"""Julian Dates and Modified Julian Dates, as whole day + fraction of that day.

A float64 fraction of a day resolves 1.1e-16 d, 10 ps, near the end of the day. Reading is exact to the 0.1 fs of a
label, so a date that was read is written back as it was (for fractions from 2**-16 d on; to 0.1 fs below).
On a UTC day with a leap second the fraction is that of the true day of 86401 s: the quasi-JD of IAU SOFA ("SOFA
Time Scale and Calendar Tools", section 3.5.1). Give a `DayLength()` (or None) for fractions in units of 86400 s always.
"""

from __future__ import annotations

from typing import Any, Final

import numpy as np
import numpy.typing as npt

from ..errors import InvalidInput
from ..exact import FloatArray, IntArray, bare, normalise, two_product, two_sum
from .checks import Label, days, finite, together
from .checks import label as checked
from .labels import DayLength

__all__ = ["jd_from_label", "label_from_jd", "label_from_mjd", "mjd_from_label"]

_JD_OF_MJD_0: Final = 2400001  # the Julian day that begins at noon of MJD 0 (JD = MJD + 2400000.5)
_MOST: Final = 2.0**46


def mjd_from_label(
    day: npt.ArrayLike,
    second_whole: npt.ArrayLike,
    second_fraction: npt.ArrayLike,
    day_length: DayLength | None = None,
) -> tuple[IntArray, FloatArray]:
    """Write labels as MJD.

    Parameters
    ----------
    day, second_whole, second_fraction : array-like
        Labels (see `labels`).
    day_length : DayLength, optional
        Of the scale; None means 86400 s always.

    Returns
    -------
    day : int64 array
    fraction : float64 array
        In [0, 1), rounded to nearest: the last 5 ps of a day become the next day.

    Raises
    ------
    InvalidInput
        With the mask, for labels inside a leap second where days of 86400 s were asked for.
    """
    day, high, low = _day_fraction(day, second_whole, second_fraction, day_length)
    return normalise(day, high + low)


def jd_from_label(
    day: npt.ArrayLike,
    second_whole: npt.ArrayLike,
    second_fraction: npt.ArrayLike,
    day_length: DayLength | None = None,
) -> tuple[IntArray, FloatArray]:
    """Write labels as JD = MJD + 2400000.5: whole days that begin at noon, and fraction. As `mjd_from_label`."""
    day, high, low = _day_fraction(day, second_whole, second_fraction, day_length)
    shifted, error = two_sum(high, -0.5)
    return normalise(day + _JD_OF_MJD_0, shifted + (error + low))


def label_from_mjd(day: npt.ArrayLike, fraction: npt.ArrayLike, day_length: DayLength | None = None) -> Label:
    """Read MJD.

    Parameters
    ----------
    day : int array
        Integers, or floats without a fraction.
    fraction : float array
        Finite. Outside [0, 1) whole days are carried first, each as one day whatever its length.
    day_length : DayLength, optional
        Of the scale; None means 86400 s always.

    Returns
    -------
    (MJD day, whole seconds of the day, fraction of a second)

    Raises
    ------
    InvalidInput
        With the mask, for a day with a fraction or values that are not finite.
    """
    part = _fractions(fraction)
    return _label(days(day), part, np.zeros(part.shape), day_length)


def label_from_jd(day: npt.ArrayLike, fraction: npt.ArrayLike, day_length: DayLength | None = None) -> Label:
    """Read JD: whole days that begin at noon, and fraction. As `label_from_mjd`."""
    high, low = two_sum(_fractions(fraction), 0.5)
    return _label(days(day) - _JD_OF_MJD_0, high, low, day_length)


def _fractions(fraction: Any) -> FloatArray:
    part = finite(bare(fraction, "d"), "fractions of a day")
    far = np.asarray(np.abs(part) > _MOST)
    if np.any(far):
        raise InvalidInput("fractions of a day must be below 2**46; put whole days into the day number", mask=far)
    return part


def _label(day: IntArray, high: FloatArray, low: FloatArray, day_length: DayLength | None) -> Label:
    """Label of day + (high + low), exact up to one rounding of the fraction of a second."""
    day, high, low = together(day, high, low)
    length = day_length or DayLength()
    carry = np.floor(high)
    # The unevaluated sum: a tiny negative fraction is just below 1 of the day before, and 1.0 cannot say so alone.
    rest, error = two_sum(high, -carry)
    back = (rest + (error + low)) < 0.0
    carry = carry - back
    rest, extra = two_sum(rest, back.astype(np.float64))
    low = low + error + extra
    day = days(day + carry.astype(np.int64))
    seconds, seconds_fraction = length(day)
    size = seconds.astype(np.float64)
    product, error = two_product(rest, size)
    floor = np.floor(product)
    whole, part = normalise(
        floor.astype(np.int64), (product - floor) + (error + (low * size + rest * seconds_fraction))
    )
    # Rounding may have reached the end of the day.
    full = (whole > seconds) | ((whole == seconds) & (part >= seconds_fraction))
    return length.from_elapsed((np.asarray(day + full), np.where(full, 0, whole), np.where(full, 0.0, part)))


def _day_fraction(day: Any, whole: Any, fraction: Any, day_length: DayLength | None) -> tuple[IntArray, Any, Any]:
    """Fraction of the day as an unevaluated sum of two floats."""
    length = day_length or DayLength()
    day, whole, fraction = length.to_elapsed(checked(day, whole, fraction))
    seconds, seconds_fraction = length(day)
    bad = np.asarray((whole < 0) | (whole > seconds) | ((whole == seconds) & (fraction >= seconds_fraction)))
    if np.any(bad):
        raise InvalidInput(
            f"{int(np.count_nonzero(bad))} of {bad.size} labels lie beyond the end of their day; inside a leap "
            "second there is no fraction of a day of 86400 s: use utc_day='true', or ISO 8601 texts",
            mask=bad,
        )
    size = seconds.astype(np.float64)
    high, low = two_sum(whole.astype(np.float64), fraction)
    quotient = high / (size + seconds_fraction)
    product, error = two_product(quotient, size)
    rest = ((high - product) - error) + (low - quotient * seconds_fraction)
    return day, quotient, rest / size
