"""CCS, the calendar segmented code in BCD, and the ASCII codes A and B (CCSDS 301.0-B-4, 3.4 and 3.5)."""

from __future__ import annotations

import re
from typing import Any, Final, Literal

import numpy as np
import numpy.typing as npt

from ...constants import DAY_S
from ...errors import InvalidInput, OutOfSpan, TextError
from ...exact import IntArray
from ...formats import gregorian, labels
from ...formats.decimals import check_digits, from_digits
from ...formats.leap_seconds import LeapSeconds
from ...instants import Instants
from ...scales import Scale
from ..calendar import from_calendar
from .octets import Octets, split, with_preamble

__all__ = ["from_ascii", "from_ccs", "to_ascii", "to_ccs"]

_IDENTIFIER: Final = 0b101
_ASCII: Final = re.compile(r"\d{4}-(?:\d\d-\d\d|\d{3})T\d\d:\d\d:\d\d(?:\.\d{1,18})?Z?\Z", re.ASCII)


def from_ccs(code: Any, *, p_field: bytes | int | None = None, leap_seconds: LeapSeconds | None = None) -> Instants:
    """Read calendar segmented codes.

    Parameters
    ----------
    code : bytes, list of bytes, or uint8 array (..., octets)
        Each octet two decimal digits (BCD): year (two octets), month and day or day of year (two octets), hour,
        minute, second, and up to six octets of decimals.
    p_field : bytes or int, optional
        The preamble as agreed on; None where each code begins with it.
    leap_seconds : LeapSeconds, optional

    Returns
    -------
    Instants
        UTC.

    Raises
    ------
    InvalidInput
        Octets that are no such code, or no decimal digits, with the mask.
    TextError
        Dates that do not exist, with the mask.
    """
    preamble, octets = split(code, p_field, "CCS", (_IDENTIFIER,), lambda p: 7 + _decimals(p))
    high, low = octets >> 4, octets & 0xF
    bad = np.asarray(((high > 9) | (low > 9)).any(axis=-1))
    if np.any(bad):
        raise InvalidInput(
            f"{int(np.count_nonzero(bad))} of {bad.size} codes hold octets that are not two decimal digits (BCD)",
            mask=bad,
        )
    two = (10 * high + low).astype(np.int64)
    year = 100 * two[..., 0] + two[..., 1]
    month, day = two[..., 2], two[..., 3]
    if preamble[0] & 0b1000:
        ordinal = 100 * month + day
        bad = np.asarray((ordinal < 1) | (ordinal > 365 + gregorian.is_leap_year(year)))
        if np.any(bad):
            raise TextError(f"{int(np.count_nonzero(bad))} of {bad.size} codes have no such day of the year", mask=bad)
        _, month, day = gregorian.date_from_mjd(gregorian.mjd_from_date(year, 1, ordinal))
    decimals = np.zeros(year.shape, dtype=np.int64)
    for i in range(7, octets.shape[-1]):
        decimals = 100 * decimals + two[..., i]
    fraction = from_digits(decimals, 2 * _decimals(preamble))
    return from_calendar(
        year, month, day, two[..., 4], two[..., 5], two[..., 6], fraction, scale="UTC", leap_seconds=leap_seconds
    )


def to_ccs(
    t: Instants,
    *,
    decimals: int = 6,
    day_of_year: bool = False,
    p_field: bool = True,
    leap_seconds: LeapSeconds | None = None,
) -> Octets:
    """Write calendar segmented codes of UTC instants.

    Parameters
    ----------
    t : Instants
    decimals : int
        Decimals of the second, an even number up to 12; rounded to nearest.
    day_of_year : bool
        Day of year in place of month and day.
    p_field : bool
        Put the preamble before each code.
    leap_seconds : LeapSeconds, optional

    Returns
    -------
    uint8 array, shape of `t` + (octets,)

    Raises
    ------
    InvalidInput
        Another scale than UTC, or a number of decimals that is not allowed.
    OutOfSpan
        Years that four digits do not hold, with the mask.
    """
    if isinstance(decimals, bool) or not isinstance(decimals, int) or decimals not in range(0, 13, 2):
        raise InvalidInput(f"decimals must be an even number from 0 to 12, got {decimals!r}")
    mjd, second, numerator = _rounded(t, "CCS", decimals, leap_seconds)
    year, month, day = gregorian.date_from_mjd(mjd)
    if day_of_year:
        month, day = np.divmod(mjd - gregorian.mjd_from_date(year, 1, 1) + 1, 100)
    minute = np.minimum(second // 60, DAY_S // 60 - 1)
    pairs = [year // 100, year % 100, month, day, minute // 60, minute % 60, second - 60 * minute]
    pairs += [numerator // 100 ** (decimals // 2 - 1 - i) % 100 for i in range(decimals // 2)]
    digits = np.stack([np.asarray(pair) for pair in pairs], axis=-1)
    octets = (digits // 10 << 4 | digits % 10).astype(np.uint8)
    first = _IDENTIFIER << 4 | day_of_year << 3 | decimals // 2
    return with_preamble(bytes([first]), octets, sent=p_field)


def from_ascii(text: Any, *, leap_seconds: LeapSeconds | None = None) -> Instants:
    """Read ASCII codes A (`1988-01-18T17:20:43.123456Z`) and B (`1988-018T17:20:43.123456Z`) as UTC.

    Parameters
    ----------
    text : str or array-like of str
        The closing Z may be missing, as the standard allows; nothing else may.

    Raises
    ------
    TextError
        With the mask: other layouts of ISO 8601 too, and dates that do not exist.
    """
    array = np.asarray(text)
    good = np.array([isinstance(item, str) and bool(_ASCII.match(item)) for item in array.reshape(-1)], dtype=np.bool_)
    if not np.all(good):
        at = int(np.flatnonzero(~good)[0])
        raise TextError(
            f"{int(np.count_nonzero(~good))} of {good.size} texts are no CCSDS ASCII codes; the first (item {at}) is "
            f"{str(array.reshape(-1)[at])!r}: the layouts are YYYY-MM-DDThh:mm:ss.d...Z and YYYY-DDDThh:mm:ss.d...Z",
            mask=~good.reshape(array.shape),
        )
    return Instants.from_iso(array, "UTC", leap_seconds=leap_seconds)


def to_ascii(
    t: Instants,
    *,
    code: Literal["A", "B"] = "A",
    digits: int = 6,
    terminator: bool = True,
    leap_seconds: LeapSeconds | None = None,
) -> npt.NDArray[np.str_]:
    """Write ASCII codes of UTC instants, rounded to `digits` (0 to 18) decimals, with the closing Z or without.

    Raises
    ------
    InvalidInput
        Another scale than UTC, or options that are not allowed.
    OutOfSpan
        Years that four digits do not hold, with the mask.
    """
    if code not in ("A", "B"):
        raise InvalidInput(f"the ASCII codes are 'A' and 'B', got {code!r}")
    mjd, _, _ = _rounded(t, "an ASCII code", check_digits(digits), leap_seconds)
    texts = t.to_iso(digits, leap_seconds=leap_seconds)
    if code == "B":
        year, _, _ = gregorian.date_from_mjd(mjd)
        ordinal = mjd - gregorian.mjd_from_date(year, 1, 1) + 1
        flat = zip(texts.reshape(-1).tolist(), np.ravel(ordinal).tolist(), strict=True)
        texts = np.array([f"{item[:5]}{n:03d}{item[10:]}" for item, n in flat], dtype=np.str_).reshape(t.shape)
    return np.char.add(texts, "Z") if terminator else texts


def _rounded(t: Instants, what: str, digits: int, table: LeapSeconds | None) -> tuple[IntArray, IntArray, IntArray]:
    if t.scale != "UTC":
        raise InvalidInput(f"{what} is of UTC, got {t.scale}; convert with tscale.chain first")
    utc = Scale.parse("UTC")
    labels.warn_if_expired(utc, t.pair, table)
    face = labels.label(utc, t.pair, table)
    mjd, second, numerator = labels.round_label(*face, digits, labels.day_length(utc, table))
    year, _, _ = gregorian.date_from_mjd(mjd)
    far = np.asarray((year < 1) | (year > 9999))
    if np.any(far):
        raise OutOfSpan(f"{int(np.count_nonzero(far))} of {far.size} dates are outside the years 1 to 9999", mask=far)
    return mjd, second, numerator


def _decimals(preamble: bytes) -> int:
    """Octets of decimals."""
    count = preamble[0] & 0b111
    if len(preamble) > 1 or count > 6:
        raise InvalidInput(f"P-field {preamble.hex()} has a second octet or 7 octets of decimals, which CCS has not")
    return count
