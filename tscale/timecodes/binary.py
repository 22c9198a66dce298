"""Binary fractions of a second: between float64 and whole numerators over 2**bits, each way rounded once."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt

from ..errors import InvalidInput
from ..exact import FloatArray, IntArray
from ..formats.checks import integers

__all__ = ["from_numerator", "octets_of", "to_numerator", "to_octets", "unsigned"]

_BELOW_ONE = 1.0 - 2.0**-53


def unsigned(values: Any, bits: int, what: str) -> IntArray:
    """Whole numbers of so many bits, up to 63, as int64; else `InvalidInput` with the mask."""
    array = integers(values, what, "give whole numbers")
    bad = np.asarray((array < 0) | (array >= 2**bits))
    if np.any(bad):
        raise InvalidInput(
            f"{what} must be 0 to 2**{bits} - 1; {int(np.count_nonzero(bad))} of {bad.size} are not (see .mask)",
            mask=bad,
        )
    return array


def from_numerator(octets: npt.NDArray[np.uint8]) -> FloatArray:
    """The fraction that bytes (..., n) hold, the first the most significant, rounded to the nearest float64.

    A fraction that would round to 1 stays just below.
    """
    total = np.zeros(octets.shape[:-1])
    parts = [octets[..., i].astype(np.float64) * 256.0 ** -(i + 1) for i in range(octets.shape[-1])]
    # The low ones first in one sum below 2**-48, so that a single rounding is left.
    low = np.zeros_like(total)
    for part in reversed(parts[6:]):
        low = low + part
    for part in parts[:6]:
        total = total + part
    return np.asarray(np.minimum(total + low, _BELOW_ONE))


def to_numerator(whole: IntArray, fraction: FloatArray, bits: int) -> tuple[IntArray, IntArray]:
    """Round to `bits` (up to 62) binary places, ties to even: (whole seconds, numerator over 2**bits)."""
    # A power of two scales without error; from 2**52 on the product is whole already.
    numerator = np.rint(np.asarray(fraction) * 2.0**bits).astype(np.int64)
    full = numerator >= 2**bits
    return whole + full, np.where(full, 0, numerator)


def octets_of(values: IntArray, count: int) -> npt.NDArray[np.uint8]:
    """Non-negative whole numbers as `count` (up to 8) bytes, the most significant first; a new last axis."""
    wide = np.asarray(values, dtype=">u8")[..., np.newaxis].view(np.uint8)
    return np.ascontiguousarray(wide[..., 8 - count :])


def to_octets(whole: IntArray, fraction: FloatArray, count: int) -> tuple[IntArray, npt.NDArray[np.uint8]]:
    """Round a fraction to `count` (up to 10) bytes, ties to even: (whole seconds, bytes on a new last axis)."""
    if count <= 6:
        whole, numerator = to_numerator(whole, fraction, 8 * count)
        return whole, octets_of(numerator, count)
    scaled = np.asarray(fraction) * 2.0**48
    high = np.floor(scaled)
    low = np.rint((scaled - high) * 2.0 ** (8 * count - 48)).astype(np.int64)
    over = low >= 2 ** (8 * count - 48)
    upper = high.astype(np.int64) + over
    full = upper >= 2**48
    parts = octets_of(np.where(full, 0, upper), 6), octets_of(np.where(over, 0, low), count - 6)
    return whole + full, np.concatenate(parts, axis=-1)
