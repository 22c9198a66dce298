"""Dates as text in five layouts, read and written digit by digit.

`iso`
    ISO 8601, see `formats.iso8601`.
`mjd`, `jd`
    Modified Julian Date and Julian Date as a decimal number with up to 18 decimals. A day with a leap second is
    86401 s long (IAU SOFA's quasi-JD). No float64 is on the way: 17 decimals of a day resolve 0.9 ps.
`spreadsheet`
    ISO 8601 as `="..."`, which spreadsheet programs keep as text: of a plain date they make a number of their own, good
    to a millisecond. Read with or without this wrapping.
`seconds`
    Seconds since 2000-01-01T12:00:00 of the scale, as a decimal number with up to 18 decimals.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from fractions import Fraction
from typing import Any, Final

import numpy as np

from ..errors import InvalidInput, TextError
from ..exact import BoolArray, FloatArray, IntArray, Pair
from ..formats import decimals, labels
from ..formats.labels import DayLength
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from ..scales import Scale

__all__ = ["LAYOUTS", "default_digits", "fixed_decimals", "parse_decimals", "read_dates", "write_dates"]

LAYOUTS: Final = ("iso", "mjd", "jd", "seconds", "spreadsheet")

_DECIMAL: Final = re.compile(r"([+-]?)(\d{1,15})(?:\.(\d{0,18}))?", re.ASCII)
_WRAPPED: Final = re.compile(r'="([^"]*)"\Z')
_E9: Final = 10**9
_E18: Final = 10**18
_JD_OF_MJD_0: Final = 2400000  # JD = MJD + 2400000.5


def default_digits(layout: str) -> int:
    """Decimals that resolve a picosecond: 12 of a second, 17 of a day."""
    return 17 if _checked(layout) in ("mjd", "jd") else 12


def read_dates(
    texts: Sequence[str], layout: str, scale: str, place: str | None = None, *, leap_seconds: LeapSeconds | None = None
) -> Instants:
    """Read a column of dates.

    Parameters
    ----------
    texts : sequence of str
        Blanks around them are allowed.
    layout : {"iso", "mjd", "jd", "seconds", "spreadsheet"}
    scale : str
    place : str or None
    leap_seconds : LeapSeconds, optional

    Raises
    ------
    TextError
        For a text that is no date, or a label that does not exist, with the mask.
    OutOfSpan
        For UTC before the leap-second table, with the mask.
    """
    kind = Scale.parse(scale)
    if _checked(layout) == "spreadsheet":
        texts = [_WRAPPED.sub(r"\1", text.strip()) for text in texts]
        layout = "iso"
    if layout == "iso":
        # An array of texts would drop NUL characters at their ends in silence.
        bad = np.array(["\0" in text for text in texts], dtype=np.bool_)
        _refuse(bad, texts, "dates", "it holds a NUL character")
        return Instants.from_iso([text.strip() for text in texts], scale, place, leap_seconds=leap_seconds)
    whole, numerator = parse_decimals(texts)
    if layout == "seconds":
        return Instants(whole, decimals.from_digits(numerator, 18), scale, place)
    if layout == "jd":
        numerator = numerator + _E18 // 2
        carry = numerator >= _E18
        whole, numerator = whole - _JD_OF_MJD_0 - ~carry, np.where(carry, numerator - _E18, numerator)
    face = _label(whole, numerator, labels.day_length(kind, leap_seconds))
    pair = labels.count(kind, face, leap_seconds)
    return Instants(*pair, scale, place)


def write_dates(
    t: Instants, layout: str, digits: int | None = None, *, leap_seconds: LeapSeconds | None = None
) -> list[str]:
    """Write one-dimensional instants with `digits` decimals (default: to a picosecond), rounded to nearest.

    The layouts are those of `read_dates`. `mjd` and `jd` are written from the label by integer division, so that 17
    decimals are 17 true decimals.
    """
    digits = default_digits(layout) if digits is None else decimals.check_digits(digits)
    if _checked(layout) in ("iso", "spreadsheet"):
        texts = [str(text) for text in t.to_iso(digits, leap_seconds=leap_seconds).tolist()]
        return texts if layout == "iso" else [f'="{text}"' for text in texts]
    if layout == "seconds":
        return fixed_decimals(t.pair, digits)
    kind = Scale.parse(t.scale)
    length = labels.day_length(kind, leap_seconds)
    day, numerator, rest = _of_day(labels.label(kind, t.pair, leap_seconds), length)
    if layout == "jd":
        half = numerator >= _E18 // 2
        day, numerator = day + _JD_OF_MJD_0 + half, np.where(half, numerator - _E18 // 2, numerator + _E18 // 2)
    return _decimal_texts(day, *_shortened(day, numerator, rest, digits), digits)


def fixed_decimals(pair: Pair, digits: int) -> list[str]:
    """Write one-dimensional pairs as decimal numbers, rounded to nearest."""
    whole, numerator = decimals.to_digits(pair[0], pair[1], decimals.check_digits(digits))
    return _decimal_texts(whole, np.zeros_like(whole), numerator, digits)


def parse_decimals(texts: Sequence[str]) -> tuple[IntArray, IntArray]:
    """Read decimal numbers as (floor, numerator over 10**18), both exact.

    Raises
    ------
    TextError
        With the mask, for anything but a sign, up to 15 digits, and up to 18 decimals. Nothing is cut off.
    """
    whole, numerator = np.empty(len(texts), dtype=np.int64), np.empty(len(texts), dtype=np.int64)
    bad = np.zeros(len(texts), dtype=np.bool_)
    for index, text in enumerate(texts):
        found = _DECIMAL.fullmatch(text.strip())
        if found is None:
            bad[index] = True
            continue
        sign, front, back = found.groups()
        value, part = int(front), int((back or "").ljust(18, "0"))
        if sign == "-":
            value, part = (-value - 1, _E18 - part) if part else (-value, 0)
        whole[index], numerator[index] = value, part
    _refuse(bad, texts, "decimal numbers", "write a number such as 60676.25, with up to 18 decimals and no exponent")
    return whole, numerator


def _refuse(bad: BoolArray, texts: Sequence[str], what: str, advice: str) -> None:
    if bad.any():
        first = int(np.flatnonzero(bad)[0])
        raise TextError(
            f"{int(np.count_nonzero(bad))} of {bad.size} texts are not {what}; the first (item {first}) is "
            f"{texts[first]!r:.120}: {advice}",
            mask=bad,
        )


def _checked(layout: str) -> str:
    if layout not in LAYOUTS:
        raise InvalidInput(f"a layout of dates is one of {', '.join(LAYOUTS)}; got {layout!r}")
    return layout


def _label(day: IntArray, numerator: IntArray, length: DayLength) -> tuple[IntArray, IntArray, FloatArray]:
    """Label of whole days and 10**-18 of a day."""
    seconds, seconds_fraction = length(day)
    high, low = np.divmod(numerator, _E9)
    whole, rest = np.divmod(high * seconds, _E9)
    # rest * 1e9 + low * seconds < 1e18 + 1e14, over 1e18: whole and fraction of the seconds that are left.
    carry, rest = np.divmod(rest * _E9 + low * seconds, _E18)
    whole, fraction = whole + carry, decimals.from_digits(rest, 18)
    for i in np.flatnonzero(seconds_fraction):  # the few days of 1961 to 1971 that end with a part of a second
        product = Fraction(int(numerator[i]), _E18) * _days_length(seconds[i], seconds_fraction[i])
        whole[i] = product.numerator // product.denominator
        fraction[i] = min(float(product - int(whole[i])), 1.0 - 2.0**-53)
    return length.from_elapsed((day, whole, fraction))


def _of_day(face: Any, length: DayLength) -> tuple[IntArray, IntArray, IntArray]:
    """Day, numerator over 10**18 of it (cut), and what was cut: 0 nothing, 1 less than a half, 2 a half, 3 more."""
    day, whole, fraction = length.to_elapsed(face)
    seconds, seconds_fraction = length(day)
    carry, part = decimals.to_digits(whole, fraction, 18)
    high, low = np.divmod(part, _E9)
    # Long division in base 1e9: every step is below 1e14.
    first, rest = np.divmod(carry * _E9 + high, seconds)
    second, rest = np.divmod(rest * _E9 + low, seconds)
    numerator, cut = first * _E9 + second, np.where(rest > 0, 2 + np.sign(2 * rest - seconds), 0)
    for i in np.flatnonzero(seconds_fraction):
        of_day = (int(carry[i]) + Fraction(int(part[i]), _E18)) / _days_length(seconds[i], seconds_fraction[i])
        numerator[i] = int(of_day * _E18)
        beyond = of_day * _E18 - int(numerator[i])
        cut[i] = 0 if not beyond else 2 + (beyond > Fraction(1, 2)) - (beyond < Fraction(1, 2))
    return day, numerator, cut


def _days_length(seconds: Any, fraction: Any) -> Fraction:
    return int(seconds) + Fraction(float(fraction))


def _shortened(day: IntArray, numerator: IntArray, cut: IntArray, digits: int) -> tuple[IntArray, IntArray]:
    """(carry into the day, numerator over 10**digits), rounded to nearest, ties to even."""
    step = 10 ** (18 - digits)
    short, rest = np.divmod(numerator, step)
    # The distance to the half, in quarters of the last place that is known.
    beyond = 4 * rest + cut - 2 * step
    short = short + ((beyond > 0) | ((beyond == 0) & ((short if digits else day) & 1 == 1)))
    carry = short >= 10**digits
    return carry.astype(np.int64), np.where(carry, 0, short)


def _decimal_texts(whole: IntArray, carry: IntArray, numerator: IntArray, digits: int) -> list[str]:
    """Sign, digits, decimals; a negative number is turned from floor + part to size."""
    whole = whole + carry
    minus = whole < 0
    one = 10**digits
    size = np.where(minus & (numerator > 0), -whole - 1, np.abs(whole))
    part = np.where(minus & (numerator > 0), one - numerator, numerator)
    signs = ["-" if m else "" for m in minus.tolist()]
    if digits == 0:
        return [f"{s}{w}" for s, w in zip(signs, size.tolist(), strict=True)]
    return [f"{s}{w}.{n:0{digits}d}" for s, w, n in zip(signs, size.tolist(), part.tolist(), strict=True)]
