"""Fractions of a second between float64 and up to 18 decimals, each way rounded once and correctly."""

from __future__ import annotations

from typing import Any, Final

import numpy as np

from ..errors import InvalidInput
from ..exact import FloatArray, IntArray, two_product

__all__ = ["MOST_DIGITS", "check_digits", "from_digits", "to_digits"]

MOST_DIGITS: Final = 18
"""10**18 is the largest power of ten that an int64 holds, and 1e-18 s is a hundredth of what the fraction resolves."""


def check_digits(digits: Any) -> int:
    """Check a number of decimals."""
    if isinstance(digits, bool) or not isinstance(digits, (int, np.integer)) or not 0 <= digits <= MOST_DIGITS:
        raise InvalidInput(f"digits must be a whole number from 0 to {MOST_DIGITS}, got {digits!r}")
    return int(digits)


def from_digits(numerator: IntArray, digits: int) -> FloatArray:
    """Round numerator / 10**digits to the nearest float64; a value that rounds to 1 stays just below.

    `numerator` lies in [0, 10**digits).
    """
    power = 10.0**digits  # exact up to 10**22
    high = numerator.astype(np.float64)
    quotient = high / power
    if digits > 15:
        low = (numerator - high.astype(np.int64)).astype(np.float64)
        product, error = two_product(quotient, power)
        # The remainder has at most 42 bits here, so it is exact, and so is the side of a tie on which it falls.
        quotient = quotient + (((high - product) - error) + low) / power
    return np.minimum(quotient, 1.0 - 2.0**-53)


def to_digits(whole: IntArray, fraction: FloatArray, digits: int) -> tuple[IntArray, IntArray]:
    """Round to `digits` decimals, ties to even: (whole seconds, numerator over 10**digits).

    Whole seconds grow by one where the fraction rounds up to 1. The float64 is taken at its exact binary value.
    """
    product, error = two_product(fraction, 10.0**digits)
    floor = np.floor(product)
    rest = product - floor
    if digits > 15:
        # From 2**52 on the product is whole, and the rounding error of the product holds what is below it.
        large = product >= 2.0**52
        step = np.where(large, np.floor(error), 0.0)
        floor_int = floor.astype(np.int64) + step.astype(np.int64)
        error = error - step
    else:
        floor_int = floor.astype(np.int64)
    above_half = (rest - 0.5) + error
    parity = whole if digits == 0 else floor_int
    numerator = floor_int + ((above_half > 0.0) | ((above_half == 0.0) & (parity & 1 == 1)))
    full = numerator >= 10**digits
    return whole + full, np.where(full, numerator - 10**digits, numerator)
