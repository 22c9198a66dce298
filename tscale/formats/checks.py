"""Checks of arrays at the door, shared by the formats."""

from __future__ import annotations

from typing import Any, Final, TypeAlias

import numpy as np

from ..constants import MJD_J2000
from ..errors import InvalidInput
from ..exact import BoolArray, FloatArray, IntArray, Pair, bare

__all__ = ["Label", "days", "finite", "first_item", "integers", "label", "pair", "together"]

Label: TypeAlias = tuple[IntArray, IntArray, FloatArray]
"""A label as (MJD day, whole seconds of the day, fraction of a second in [0, 1))."""

_APART: Final = "pass whole seconds and their fraction apart"
_MOST_DAYS: Final = 10**14  # 270 Gyr: any more and the seconds would not fit an int64
_MOST_SECONDS: Final = 86400 * (_MOST_DAYS - MJD_J2000 - 1)


def first_item(mask: BoolArray) -> int:
    """Flat index of the first True."""
    return int(np.flatnonzero(mask)[0])


def integers(values: Any, what: str, advice: str) -> IntArray:
    """Integers, or floats without a fraction up to 2**53 in size, as int64; else `InvalidInput` with the mask."""
    array = np.asarray(values)
    if array.dtype == np.int64:
        return array
    if array.dtype.kind == "f":
        loose = np.asarray(~((np.floor(array) == array) & (np.abs(array) <= 2.0**53)))
        if np.any(loose):
            at = first_item(loose)
            raise InvalidInput(f"{what} must be whole, got {array.ravel()[at]!r} (item {at}); {advice}", mask=loose)
    elif array.dtype.kind not in "iu" or (array.dtype == np.uint64 and np.any(array > np.uint64(2**63 - 1))):
        raise InvalidInput(f"{what} must be whole numbers that fit an int64, got {array.dtype}; {advice}")
    return array.astype(np.int64)


def days(values: Any) -> IntArray:
    """Day numbers as int64."""
    array = integers(bare(values, "d"), "a day number", "split a date into (day, fraction) and pass them apart")
    if array.size and (int(array.min()) < -_MOST_DAYS or int(array.max()) > _MOST_DAYS):
        mask = np.asarray((array < -_MOST_DAYS) | (array > _MOST_DAYS))
        raise InvalidInput("day numbers must lie within 1e14 of 0: the seconds must fit an int64", mask=mask)
    return array


def finite(values: Any, what: str) -> FloatArray:
    """Finite float64 values; else `InvalidInput` with the mask."""
    try:
        array = np.asarray(values, dtype=np.float64)
    except (TypeError, ValueError) as error:
        raise InvalidInput(f"{what} must be numbers: {error}") from error
    bad = np.asarray(~np.isfinite(array))
    if np.any(bad):
        raise InvalidInput(
            f"{what} must be finite; {int(np.count_nonzero(bad))} of {bad.size} are not (see .mask)", mask=bad
        )
    return array


def pair(seconds: Any) -> Pair:
    """Whole seconds and their fraction as arrays of one shape."""
    count = integers(seconds[0], "whole seconds", _APART)
    if count.size and (int(count.min()) < -_MOST_SECONDS or int(count.max()) > _MOST_SECONDS):
        far = np.asarray((count < -_MOST_SECONDS) | (count > _MOST_SECONDS))
        raise InvalidInput("counts must lie within 8.6e18 s (270 Gyr) of 0 to have a label", mask=far)
    whole, fraction = together(count, _fractions(seconds[1]))
    return whole, fraction


def label(day: Any, whole: Any, fraction: Any) -> Label:
    """Check the parts of a label and bring them to one shape."""
    parts = together(days(day), integers(whole, "whole seconds", _APART), _fractions(fraction))
    return parts[0], parts[1], parts[2]


def _fractions(values: Any) -> FloatArray:
    array = np.asarray(values, dtype=np.float64)
    if array.size and not (array.min() >= 0.0 and array.max() < 1.0):  # also for NaN
        bad = np.asarray(~((array >= 0.0) & (array < 1.0)))
        raise InvalidInput("the fraction of a second must be in [0, 1); carry whole seconds apart", mask=bad)
    return array


def together(*arrays: Any) -> tuple[Any, ...]:
    """Broadcast arrays, or say that their shapes do not go together."""
    try:
        return tuple(np.broadcast_arrays(*arrays))
    except ValueError as error:
        shapes = " and ".join(str(np.shape(array)) for array in arrays)
        raise InvalidInput(f"shapes {shapes} do not go together; give equal ones, or ones that broadcast") from error
