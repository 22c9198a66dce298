"""Exact two-part arithmetic: whole seconds as int64, fraction as float64 in [0, 1).

A pair `(whole, fraction)` resolves 0.11 fs everywhere. The two parts are never added into one
float on the way; `seconds` does it once, at the very end, for differences a caller asked for.

Error-free transformations after Dekker 1971 (Numer. Math. 18, 224) and Knuth, TAOCP vol. 2, 4.2.2.
"""

from __future__ import annotations

from fractions import Fraction
from typing import Any, Final, NamedTuple, TypeAlias

import numpy as np
import numpy.typing as npt

from .errors import InvalidInput

IntArray: TypeAlias = npt.NDArray[np.int64]
FloatArray: TypeAlias = npt.NDArray[np.float64]
BoolArray: TypeAlias = npt.NDArray[np.bool_]
Pair: TypeAlias = tuple[IntArray, FloatArray]
"""Seconds as (whole, fraction), any shape; the fraction lies in [0, 1)."""

MOST_S: Final = 2**62 - 1
"""Largest count or shift, s: 146 Gyr."""

_SPLITTER: Final = 134217729.0  # 2**27 + 1, halves a 53-bit significand


class Factor(NamedTuple):
    """A constant to 106 bits, as an unevaluated sum of two float64."""

    high: float
    low: float

    @classmethod
    def of(cls, value: Fraction) -> Factor:
        """Round an exact rational to a two-part constant."""
        high = float(value)
        return cls(high, float(value - Fraction(high)))


def two_sum(a: Any, b: Any) -> tuple[Any, Any]:
    """A + b as (rounded sum, exact error)."""
    total = a + b
    shadow = total - a
    return total, (a - (total - shadow)) + (b - shadow)


def two_product(a: Any, b: Any) -> tuple[Any, Any]:
    """A * b as (rounded product, exact error); |a|, |b| < 2**996."""
    product = a * b
    scaled = a * _SPLITTER
    a_high = scaled - (scaled - a)
    a_low = a - a_high
    scaled = b * _SPLITTER
    b_high = scaled - (scaled - b)
    b_low = b - b_high
    return product, ((a_high * b_high - product) + a_high * b_low + a_low * b_high) + a_low * b_low


def normalise(whole: Any, fraction: Any) -> Pair:
    """Carry whole seconds out of `fraction` so that it lies in [0, 1).

    `whole` must be integral; `fraction` finite and below 2**63 in size.
    """
    fraction = np.asarray(fraction, dtype=np.float64)
    carry = np.floor(fraction)
    rest = fraction - carry
    # A negative fraction below half an ulp of 1 leaves a rest that rounds to 1.
    full = rest >= 1.0
    if np.any(full):
        carry = carry + full
        rest = np.where(full, 0.0, rest)
    return np.asarray(whole, dtype=np.int64) + carry.astype(np.int64), rest


def add(a: Pair, b: Pair) -> Pair:
    """Sum of two normalised pairs; the fraction is rounded once."""
    total, error = two_sum(a[1], b[1])
    carry = np.floor(total)
    return normalise(a[0] + b[0] + carry.astype(np.int64), (total - carry) + error)


def subtract(a: Pair, b: Pair) -> Pair:
    """Difference of two normalised pairs; the fraction is rounded once."""
    total, error = two_sum(a[1], -b[1])
    carry = np.floor(total)
    return normalise(a[0] - b[0] + carry.astype(np.int64), (total - carry) + error)


def negate(a: Pair) -> Pair:
    """The pair of the opposite sign."""
    return normalise(-a[0], -a[1])


def from_seconds(seconds: Any) -> Pair:
    """A float64 number of seconds as a normalised pair, exactly."""
    return normalise(np.zeros(np.shape(seconds), dtype=np.int64), seconds)


def add_seconds(a: Pair, seconds: Any) -> Pair:
    """A pair plus float64 seconds; the fraction is rounded once."""
    return add(a, from_seconds(seconds))


def seconds(a: Pair) -> FloatArray:
    """The pair as one float64, rounded once. Only for differences, at the very end."""
    return np.asarray(a[0].astype(np.float64) + a[1], dtype=np.float64)


def multiply(a: Pair, factor: Factor) -> Pair:
    """A pair times a two-part constant, rounded once, for |product| < 2**62."""
    whole, pieces = _product(a[0], a[1], 0.0, factor)
    return _collect(whole, pieces)


def affine(a: Pair, origin: Pair, factor: Factor, offset_s: float = 0.0) -> Pair:
    """A + offset_s + factor (a - origin), rounded once: a linear relation between two scales."""
    fraction, rest = two_sum(a[1], -origin[1])
    whole, pieces = _product(a[0] - origin[0], fraction, rest, factor)
    return _collect(a[0] + whole, (a[1], offset_s, *pieces))


def _product(whole: Any, fraction: Any, rest: Any, factor: Factor) -> tuple[Any, tuple[Any, ...]]:
    """(whole + fraction + rest) times a constant: whole seconds, and floats below 1 to be added, large ones first.

    The whole part is split below 2**32, so that each partial product is exact also for counts that no float64 holds.
    """
    upper = (whole >> 32).astype(np.float64) * 4294967296.0
    lower = (whole & 0xFFFFFFFF).astype(np.float64)
    product, error = two_product(lower, factor.high)
    carry = np.floor(product)
    total = carry.astype(np.int64)
    small = error + lower * factor.low + (fraction * factor.high + rest * factor.high)
    if not np.any(upper):
        return total, (product - carry, small)
    high, high_error = two_product(upper, factor.high)
    high_carry = np.floor(high)
    low, low_error = two_product(upper, factor.low)
    low_carry = np.floor(low)
    total = total + high_carry.astype(np.int64) + low_carry.astype(np.int64)
    return total, (product - carry, high - high_carry, low - low_carry, high_error, small + low_error)


def _collect(whole: Any, pieces: tuple[Any, ...]) -> Pair:
    """Whole seconds plus floats: the floats are added without error, then rounded once."""
    total, error = pieces[0], 0.0
    for piece in pieces[1:]:
        total, slip = two_sum(total, piece)
        error = error + slip
    carry = np.floor(total)
    return normalise(whole + carry.astype(np.int64), (total - carry) + error)


def bare(values: Any, unit: str) -> Any:
    """Values as bare numbers of a unit, which is not dropped in silence.

    A quantity of a general library converts itself (`to_value(unit)`); numpy's own differences of dates are refused.
    """
    convert = getattr(values, "to_value", None)
    if convert is not None:
        try:
            return convert(unit)
        except (TypeError, ValueError) as error:
            raise InvalidInput(f"{values!r:.60} cannot be given in {unit}: {error}") from error
    if getattr(getattr(values, "dtype", None), "kind", None) in ("m", "M"):
        raise InvalidInput(
            f"numbers of {unit} are needed, got {values.dtype}: divide differences by np.timedelta64(1, 's'), read "
            "dates with tscale.timecodes.from_datetime64"
        )
    return values


def checked_parts(whole: Any, fraction: Any) -> Pair:
    """Broadcast a whole and a fractional part, or say which of them is wrong."""
    whole, fraction = bare(whole, "s"), bare(fraction, "s")
    whole_array = np.asarray(whole)
    if whole_array.dtype.kind == "f":
        # Integral floats are exact up to 2**53; anything else has lost or mixed in a fraction already.
        loose = ~((np.floor(whole_array) == whole_array) & (np.abs(whole_array) <= 2.0**53))
        if np.any(loose):
            raise InvalidInput(
                "whole seconds must be integral (and up to 2**53 in size if given as floats); "
                "pass the fraction apart, as (whole, fraction)",
                mask=np.asarray(loose),
            )
    elif whole_array.dtype.kind not in "iu":
        raise InvalidInput(
            f"whole seconds must be integers, got {whole_array.dtype}; pass (int64 whole, float64 fraction)"
        )
    if whole_array.dtype == np.uint64 and np.any(whole_array > np.uint64(2**63 - 1)):
        raise InvalidInput("whole seconds must fit an int64")
    try:
        if np.asarray(fraction).dtype.kind in "USO":
            raise TypeError("text or objects given")
        fraction_array = np.asarray(fraction, dtype=np.float64)
        both = np.broadcast_arrays(whole_array.astype(np.int64), fraction_array)
    except (TypeError, ValueError) as error:
        raise InvalidInput(f"seconds must be numbers of shapes that broadcast: {error}") from error
    # Half of what an int64 holds is left free, so that no carry, sum or difference of two wraps round.
    bad = (np.abs(both[0] + (both[0] < 0)) >= MOST_S) | ~np.isfinite(both[1]) | (np.abs(both[1]) >= 2.0**62)
    if np.any(bad):
        raise InvalidInput(
            f"{int(np.count_nonzero(bad))} of {bad.size} values are NaN, infinite or beyond 2**62 s (146 Gyr); "
            "drop them first (see .mask)",
            mask=np.asarray(bad),
        )
    return both[0], both[1]
