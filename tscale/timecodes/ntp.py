"""NTP stamps of 64 bits: seconds of an era of 2**32 s, and a binary fraction (RFC 5905, section 6).

Seconds count from 1900-01-01T00:00:00, leap seconds left out, as POSIX time does from 1970.
"""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt

from ..errors import InvalidInput
from ..exact import IntArray
from ..formats.checks import together
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from .binary import to_numerator, unsigned
from .posix import Inside, Smear, from_posix, to_posix

__all__ = ["NtpStamp", "from_ntp", "to_ntp"]

_POSIX_IN_NTP: Final = 2208988800
_ERA_S: Final = 2**32


class NtpStamp(NamedTuple):
    """A stamp in its parts."""

    era: IntArray
    """0 from 1900 to 2036-02-07T06:28:15."""
    second: IntArray
    """Seconds of the era, 0 to 2**32 - 1."""
    fraction: IntArray
    """Numerator over 2**32."""

    @property
    def stamp(self) -> npt.NDArray[np.uint64]:
        """The 64 bits on the wire; they do not tell the era."""
        return (self.second.astype(np.uint64) << np.uint64(32)) | self.fraction.astype(np.uint64)


def from_ntp(
    second: npt.ArrayLike,
    fraction: npt.ArrayLike = 0,
    *,
    era: npt.ArrayLike | None = None,
    pivot: Instants | None = None,
    repeated: Inside = "after",
    smear: Smear | None = None,
    leap_seconds: LeapSeconds | None = None,
) -> Instants:
    """Date NTP stamps in UTC.

    Parameters
    ----------
    second, fraction : int array
        The two halves of the stamp, 32 bits each; for a stamp of 64 bits `stamp >> 32` and `stamp & 0xFFFFFFFF`.
    era : int array, optional
    pivot : Instants, optional
        One instant of UTC within 68 years of all, in place of the era. One of the two is needed.
    repeated, smear, leap_seconds
        As for `from_posix`.

    Raises
    ------
    InvalidInput
        Halves out of range, with the mask; neither or both of era and pivot.
    TextError, OutOfSpan
        As `from_posix`.
    """
    seconds, numerator = together(unsigned(second, 32, "an NTP second"), unsigned(fraction, 32, "an NTP fraction"))
    if (era is None) == (pivot is None):
        raise InvalidInput("an NTP stamp does not tell its era: give era=, or pivot= (one UTC instant within 68 years)")
    if pivot is not None:
        if pivot.size != 1:
            raise InvalidInput(f"the pivot is one instant, got shape {pivot.shape}")
        middle = to_posix(pivot.ravel(), leap_seconds=leap_seconds)[0][0] + _POSIX_IN_NTP
        eras = (middle - seconds + _ERA_S // 2) // _ERA_S
    else:
        given = np.asarray(era)
        if given.dtype.kind not in "iu" or np.any(np.abs(given.astype(np.int64)) > 2**20):
            raise InvalidInput(f"an era is a small whole number, such as 0 or 1; got {era!r}")
        eras = given
    seconds, numerator, eras = together(seconds, numerator, eras)
    posix = seconds + _ERA_S * eras.astype(np.int64) - _POSIX_IN_NTP
    return from_posix(posix, numerator * 2.0**-32, repeated=repeated, smear=smear, leap_seconds=leap_seconds)


def to_ntp(t: Instants, *, smear: Smear | None = None, leap_seconds: LeapSeconds | None = None) -> NtpStamp:
    """NTP stamps of UTC instants, rounded to 2**-32 s (0.23 ns); errors as `to_posix`."""
    whole, numerator = to_numerator(*to_posix(t, smear=smear, leap_seconds=leap_seconds), 32)
    era, second = np.divmod(whole + _POSIX_IN_NTP, _ERA_S)
    return NtpStamp(np.asarray(era), np.asarray(second), np.asarray(numerator))
