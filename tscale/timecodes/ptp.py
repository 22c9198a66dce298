"""IEEE 1588 (PTP) timestamps: seconds (48 bits) and nanoseconds of TAI since 1970-01-01T00:00:00 TAI.

IEEE Std 1588-2008, 5.3.3 (Timestamp), 5.3.2 (TimeInterval, in units of 2**-16 ns) and 7.2.2 (the epoch).
"""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt

from ..constants import DAY_S, MJD_J2000
from ..errors import InvalidInput, OutOfSpan
from ..exact import IntArray, add, normalise
from ..formats.checks import integers, together
from ..formats.decimals import from_digits, to_digits
from ..instants import Instants
from .binary import unsigned

__all__ = ["PtpStamp", "from_ptp", "to_ptp"]

_ORIGIN: Final = (40587 - MJD_J2000) * DAY_S - DAY_S // 2
_NANO: Final = 10**9
_UNIT: Final = 2**16


class PtpStamp(NamedTuple):
    """A timestamp in its fields."""

    seconds: IntArray
    """`secondsField`, 48 bits."""
    nanoseconds: IntArray
    """`nanosecondsField`, 0 to 999 999 999."""
    correction: IntArray
    """What is left, in units of 2**-16 ns, as in a `correctionField`: -32768 to 32768."""


def from_ptp(seconds: npt.ArrayLike, nanoseconds: npt.ArrayLike, correction: npt.ArrayLike = 0) -> Instants:
    """Date PTP timestamps in TAI.

    Parameters
    ----------
    seconds, nanoseconds : int array
        The two fields of a Timestamp.
    correction : int array
        A `correctionField`, in units of 2**-16 ns, to be added.

    Raises
    ------
    InvalidInput
        Fields out of range, with the mask. A port that keeps the arbitrary (ARB) timescale has no date.
    """
    whole = unsigned(seconds, 48, "secondsField")
    nano = integers(nanoseconds, "nanosecondsField", "give whole nanoseconds")
    units = integers(correction, "correctionField", "give units of 2**-16 ns")
    whole, nano, units = together(whole, nano, units)
    bad = np.asarray((nano < 0) | (nano >= _NANO))
    if np.any(bad):
        raise InvalidInput(
            f"nanosecondsField must be below 1e9; {int(np.count_nonzero(bad))} of {bad.size} are not (see .mask)",
            mask=bad,
        )
    ns, rest = np.divmod(units, _UNIT)
    carry, part = np.divmod(ns, _NANO)
    shift = normalise(carry, from_digits(np.asarray(part), 9) + rest * (1e-9 / _UNIT))
    return Instants._of(add((np.asarray(whole + _ORIGIN), from_digits(nano, 9)), shift), "TAI")


def to_ptp(t: Instants) -> PtpStamp:
    """PTP timestamps of TAI instants: the nearest nanosecond, and a correction for the rest, good to 2**-17 ns (8 fs).

    Raises
    ------
    InvalidInput
        Another scale than TAI.
    OutOfSpan
        Before 1970 or beyond 48 bits of seconds, with the mask.
    """
    if t.scale != "TAI":
        raise InvalidInput(f"PTP counts TAI, got {t.scale}; convert with tscale.chain first")
    whole, nano = to_digits(t.whole, t.fraction, 9)
    seconds = np.asarray(whole - _ORIGIN)
    bad = np.asarray((seconds < 0) | (seconds >= 2**48))
    if np.any(bad):
        raise OutOfSpan(
            f"{int(np.count_nonzero(bad))} of {bad.size} instants are before 1970 or beyond 48 bits of seconds (see "
            ".mask)",
            mask=bad,
        )
    # Both parts are below 1 and nearly equal, so that the difference is exact; a second carried over counts too.
    left_s = (t.whole - whole) + (t.fraction - nano / _NANO)
    return PtpStamp(seconds, nano, np.rint(left_s * 1e9 * _UNIT).astype(np.int64))
