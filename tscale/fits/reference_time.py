"""The reference time of a header: MJDREF, JDREF or DATEREF, whole or in two parts, exact in all its digits."""

from __future__ import annotations

from decimal import Decimal
from fractions import Fraction
from typing import TYPE_CHECKING, Final

from ..constants import DAY_S
from ..formats import iso8601
from ..scales import Scale
from .cards import Cards

if TYPE_CHECKING:
    from ..formats.leap_seconds import LeapSeconds

__all__ = ["REFERENCE_KEYWORDS", "reference_mjd"]

_JD_OF_MJD_0: Final = Fraction(4800001, 2)
_FAMILIES: Final = (("MJDREF", Fraction(0)), ("JDREF", _JD_OF_MJD_0))
REFERENCE_KEYWORDS: Final = ("MJDREF", "MJDREFI", "MJDREFF", "JDREF", "JDREFI", "JDREFF", "DATEREF")
"""Every keyword that states a reference time."""


def reference_mjd(cards: Cards, scale: Scale, notes: list[str], leap_seconds: LeapSeconds | None = None) -> Fraction:
    """The reference time as a Modified Julian Date, exact.

    MJDREF stands before JDREF, JDREF before DATEREF; two parts before the single value, the single value before one
    part alone (FITS Standard 4.0, section 9.2.2). What is overruled must still agree to its own digits.

    Raises
    ------
    DataFileError
        Where two statements differ by more than the last digit of the less exact one.
    """
    stated: list[tuple[str, Fraction, Fraction]] = []  # keywords, MJD, size of the last digit
    for name, origin in _FAMILIES:
        stated += [(words, value - origin, digit) for words, value, digit in _family(cards, name, notes)]
    text = cards.text("DATEREF")
    if text is not None:
        stated.append(("DATEREF", *_date(cards, text, scale)))
    if not stated:
        notes.append("no reference time is given: MJDREF = 0 by the standard")
        return Fraction(0)
    first = stated[0]
    for other in stated[1:]:
        if abs(first[1] - other[1]) > max(first[2], other[2]):
            apart_s = float(abs(first[1] - other[1]) * DAY_S)
            message = f"{first[0]} and {other[0]} state reference times {apart_s:.6g} s apart"
            raise cards.contradiction(message, *first[0].split(" + "), *other[0].split(" + "))
        if first[1] != other[1]:
            apart_s = float(abs(first[1] - other[1]) * DAY_S)
            notes.append(f"{first[0]} is taken; {other[0]}, with fewer digits, is {apart_s:.3g} s from it")
    return first[1]


def _family(cards: Cards, name: str, notes: list[str]) -> list[tuple[str, Fraction, Fraction]]:
    """What the keywords of one family state, the one that counts first."""
    single, whole, part = (cards.number(key) for key in (name, f"{name}I", f"{name}F"))
    found = []
    if whole is not None and part is not None:
        found.append((f"{name}I + {name}F", Fraction(whole) + Fraction(part), _last_digit(part)))
    if single is not None:
        # What was meant may be what a float64 of the same digits is.
        found.append((name, Fraction(single), max(_last_digit(single), Fraction(1, 2**52) * abs(Fraction(single)))))
    if found or (whole is None and part is None):
        return found
    lone, other = (f"{name}I", f"{name}F") if part is None else (f"{name}F", f"{name}I")
    notes.append(f"{lone} stands alone: {other} = 0 by the standard")
    value = part if whole is None else whole
    assert value is not None
    return [(lone, Fraction(value), _last_digit(value))]


def _date(cards: Cards, text: str, scale: Scale) -> tuple[Fraction, Fraction]:
    from .header_times import checked_date

    checked_date(cards, "DATEREF", text)
    day, second, _ = iso8601.parse(text, allow_second_60=scale.utc_labels)
    decimals = text.partition(".")[2]
    rest = Fraction(int(decimals), 10 ** len(decimals)) if decimals else Fraction(0)
    return int(day) + (int(second) + rest) / DAY_S, Fraction(1, DAY_S * 10 ** len(decimals))


def _last_digit(value: Decimal) -> Fraction:
    exponent = value.as_tuple().exponent
    assert isinstance(exponent, int)
    return Fraction(10) ** exponent if exponent < 0 else Fraction(0)
