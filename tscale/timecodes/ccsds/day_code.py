"""CDS, the day segmented code (CCSDS 301.0-B-4, 3.3): day, millisecond of the day, and parts of a millisecond."""

from __future__ import annotations

from typing import Any, Final, Literal

import numpy as np

from ...errors import InvalidInput, OutOfSpan
from ...formats import labels
from ...formats.decimals import from_digits
from ...formats.leap_seconds import LeapSeconds
from ...instants import Instants
from ...scales import Scale
from ..binary import octets_of
from .octets import Octets, number, split, with_preamble

__all__ = ["from_cds", "to_cds"]

_MJD_1958: Final = 36204
_IDENTIFIER: Final = 0b100
_DIGITS: Final = {"ms": 3, "us": 6, "ps": 12}
_SUB_OCTETS: Final = {0b00: 0, 0b01: 2, 0b10: 4}


def from_cds(
    code: Any,
    *,
    p_field: bytes | int | None = None,
    epoch_mjd: int | None = None,
    leap_seconds: LeapSeconds | None = None,
) -> Instants:
    """Read day segmented codes.

    Parameters
    ----------
    code : bytes, list of bytes, or uint8 array (..., octets)
    p_field : bytes or int, optional
        The preamble as agreed on; None where each code begins with it.
    epoch_mjd : int, optional
        MJD of the agency's epoch, for codes whose P-field says so; else days count from 1958-01-01.
    leap_seconds : LeapSeconds, optional

    Returns
    -------
    Instants
        UTC. The milliseconds of a day with a leap second go on past 86 399 999.

    Raises
    ------
    InvalidInput
        Octets that are no such code, sub-millisecond parts out of range (with the mask), or an epoch that is missing
        or too much.
    TextError
        A millisecond that its day has not, with the mask.
    """
    preamble, octets = split(code, p_field, "CDS", (_IDENTIFIER,), lambda p: sum(_sizes(p)))
    if bool(preamble[0] & 0b1000) != (epoch_mjd is not None):
        raise InvalidInput("epoch_mjd= goes with a P-field that says the epoch is an agency's; else it is 1958-01-01")
    long_day, _, sub = _sizes(preamble)
    day = number(octets[..., :long_day]) + (_MJD_1958 if epoch_mjd is None else _day(epoch_mjd))
    milli, rest = number(octets[..., long_day : long_day + 4]), number(octets[..., long_day + 4 :])
    limit = {0: 1, 2: 1000, 4: 10**9}[sub]
    bad = np.asarray(rest >= limit)
    if np.any(bad):
        raise InvalidInput(
            f"{int(np.count_nonzero(bad))} of {bad.size} codes have {limit} or more parts of a millisecond (see .mask)",
            mask=bad,
        )
    second, milli = np.divmod(milli, 1000)
    fraction = from_digits(np.asarray(milli * 10**9 + rest * (10**9 // limit)), 12)
    utc = Scale.parse("UTC")
    pair = labels.count(utc, (np.asarray(day), np.asarray(second), fraction), leap_seconds)
    labels.warn_if_expired(utc, pair, leap_seconds)
    return Instants._of(pair, utc)


def to_cds(
    t: Instants,
    *,
    unit: Literal["ms", "us", "ps"] = "us",
    day_octets: Literal[2, 3] = 2,
    epoch_mjd: int | None = None,
    p_field: bool = True,
    leap_seconds: LeapSeconds | None = None,
) -> Octets:
    """Write day segmented codes of UTC instants, rounded to the unit.

    Parameters
    ----------
    t : Instants
    unit : {"ms", "us", "ps"}
        Resolution: no sub-millisecond part, one of 16 bits, or one of 32.
    day_octets : {2, 3}
    epoch_mjd : int, optional
        MJD of an agency's epoch, in place of 1958-01-01.
    p_field : bool
        Put the preamble before each code.
    leap_seconds : LeapSeconds, optional

    Returns
    -------
    uint8 array, shape of `t` + (octets,)

    Raises
    ------
    InvalidInput
        Another scale than UTC, or options that are not allowed.
    OutOfSpan
        Days before the epoch or beyond the octets of the day, with the mask.
    """
    if unit not in _DIGITS or day_octets not in (2, 3):
        raise InvalidInput(f"unit must be ms, us or ps, and day_octets 2 or 3; got {unit!r} and {day_octets!r}")
    if t.scale != "UTC":
        raise InvalidInput(f"CDS is a code of UTC, got {t.scale}; convert with tscale.chain first")
    utc, digits = Scale.parse("UTC"), _DIGITS[unit]
    labels.warn_if_expired(utc, t.pair, leap_seconds)
    face = labels.label(utc, t.pair, leap_seconds)
    day, second, numerator = labels.round_label(*face, digits, labels.day_length(utc, leap_seconds))
    day = day - (_MJD_1958 if epoch_mjd is None else _day(epoch_mjd))
    bad = np.asarray((day < 0) | (day >= 2 ** (8 * day_octets)))
    if np.any(bad):
        raise OutOfSpan(
            f"{int(np.count_nonzero(bad))} of {bad.size} instants are before the epoch or beyond {day_octets} octets "
            "of days (see .mask)",
            mask=bad,
        )
    milli, rest = np.divmod(numerator, 10 ** (digits - 3))
    sub = {"ms": 0b00, "us": 0b01, "ps": 0b10}[unit]
    first = _IDENTIFIER << 4 | (epoch_mjd is not None) << 3 | (day_octets == 3) << 2 | sub
    parts = [octets_of(day, day_octets), octets_of(second * 1000 + milli, 4), octets_of(rest, _SUB_OCTETS[sub])]
    return with_preamble(bytes([first]), np.concatenate(parts, axis=-1), sent=p_field)


def _sizes(preamble: bytes) -> tuple[int, int, int]:
    """Octets of day, millisecond and sub-millisecond part."""
    sub = preamble[0] & 0b11
    if len(preamble) > 1 or sub not in _SUB_OCTETS:
        raise InvalidInput(
            f"P-field {preamble.hex()} has a second octet or the reserved resolution 11, which CDS has not"
        )
    return (3 if preamble[0] & 0b100 else 2), 4, _SUB_OCTETS[sub]


def _day(mjd: Any) -> int:
    if isinstance(mjd, bool) or not isinstance(mjd, int | np.integer):
        raise InvalidInput(f"epoch_mjd is a whole MJD, got {mjd!r}")
    return int(mjd)
