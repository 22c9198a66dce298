"""The times that a header itself states: TSTART and TSTOP, DATE-OBS, MJD-BEG and their like."""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass, replace
from fractions import Fraction
from itertools import combinations
from typing import Final

import numpy as np

from ..constants import DAY_S
from ..errors import TscaleError
from ..exact import Pair
from ..instants import Instants
from ..scales import Scale
from .cards import Cards
from .reckoning import Reckoning

__all__ = ["ABSOLUTE", "RELATIVE", "HeaderTime", "check_agreement", "checked_date", "read_times", "same_time"]

RELATIVE: Final = ("TSTART", "TSTOP")
ABSOLUTE: Final = tuple(f"{kind}-{when}" for kind in ("DATE", "MJD") for when in ("OBS", "BEG", "AVG", "END"))
_SAME: Final = (("TSTART", "DATE-BEG", "MJD-BEG"), ("TSTOP", "DATE-END", "MJD-END"), ("DATE-OBS", "MJD-OBS"),
                ("DATE-AVG", "MJD-AVG"))  # fmt: skip
_DATE: Final = re.compile(r"(?:\d{4}|[+-]\d{5})-\d\d-\d\d(?:T\d\d:\d\d:\d\d(?:\.\d{1,18})?)?\Z")
_OLD_DATE: Final = re.compile(r"(\d\d)/(\d\d)/(\d\d)\Z")  # of the years 1900 to 1999
_JYEAR: Final = Fraction(36525, 100)
_BYEAR: Final = Fraction("365.242198781")  # Lieske 1979, A&A 73, 282
_MJD_B1900: Final = Fraction("15019.81352")


@dataclass(frozen=True)
class HeaderTime:
    """One time of a header.

    Attributes
    ----------
    instants : Instants
        A single one.
    digit_s : float
        What its last digit is worth, s; 86400 for a date without a time.
    decimals : int
        Decimals it is written with.
    clock : str or None
        Keyword of an older header that holds the time of the day, such as TIME-OBS.
    """

    instants: Instants
    digit_s: float
    decimals: int
    clock: str | None = None


def read_times(cards: Cards, relative: Reckoning) -> dict[str, HeaderTime]:
    """Every time that a header states, by keyword; JEPOCH is TDB and BEPOCH TT (ephemeris time)."""
    scale = relative.scale
    found: dict[str, HeaderTime] = {}
    for key in RELATIVE:
        value = cards.number(key)
        if value is not None:
            digits = max(0, -int(value.as_tuple().exponent))
            digit = max(Fraction(10) ** -digits, Fraction(float(np.spacing(abs(float(value))))))
            moved = replace(relative, zero_s=relative.zero_s + Fraction(value) * relative.unit_s)
            found[key] = HeaderTime(_instants(moved, cards, key), float(digit * relative.unit_s), digits)
    for key in ABSOLUTE:
        if key not in cards:
            continue
        if key.startswith("DATE"):
            text = cards.text(key)
            if text is not None:
                found[key] = _from_date(cards, key, text, relative)
        else:
            found[key] = _from_days(cards, key, scale, relative)
    for key, name, origin, year, first in (
        ("JEPOCH", "TDB", Fraction(103089, 2), _JYEAR, 2000),
        ("BEPOCH", "TT", _MJD_B1900, _BYEAR, 1900),
    ):
        value = cards.number(key)
        if value is not None:
            digits = max(0, -int(value.as_tuple().exponent))
            mjd = origin + (Fraction(value) - first) * year
            made = _instants(Reckoning(Scale.parse(name), mjd, Fraction(0), Fraction(1)), cards, key)
            found[key] = HeaderTime(made, float(Fraction(10) ** -digits * year * DAY_S), digits)
    return found


def _from_date(cards: Cards, key: str, text: str, relative: Reckoning) -> HeaderTime:
    text = checked_date(cards, key, text)
    clock = f"TIME{key[4:]}" if "T" not in text and cards.text(f"TIME{key[4:]}") else None
    if clock is not None:
        text = checked_date(cards, f"{key} with {clock}", f"{text}T{cards.text(clock)}")
    try:
        t = Instants.from_iso(text, relative.scale.name, leap_seconds=relative.leap_seconds)
    except TscaleError as error:
        raise cards.fault(f"{key}: {error}") from error
    decimals = len(text.partition(".")[2])
    return HeaderTime(t, 10.0**-decimals if "T" in text else float(DAY_S), decimals, clock)


def _from_days(cards: Cards, key: str, scale: Scale, relative: Reckoning) -> HeaderTime:
    value = cards.number(key)
    if value is None:
        raise cards.fault(f"{key} has no value")
    digits = max(0, -int(value.as_tuple().exponent))
    digit = max(Fraction(10) ** -digits, Fraction(float(np.spacing(abs(float(value))))))
    days = Reckoning(scale, Fraction(value), Fraction(0), Fraction(DAY_S), "labels", relative.leap_seconds)
    return HeaderTime(_instants(days, cards, key), float(digit * DAY_S), digits)


def _instants(reckoning: Reckoning, cards: Cards, key: str) -> Instants:
    try:
        pair: Pair = reckoning.count(np.array(0.0))
    except TscaleError as error:
        error.args = (f"{cards.where}, {key}: {error}",)
        error.path = error.path or cards.path
        raise
    return Instants._of(pair, reckoning.scale)


def checked_date(cards: Cards, key: str, text: str) -> str:
    """A date in the form of the standard; one of the old form DD/MM/YY is written anew.

    Raises
    ------
    DataFileError
        For any other form, also for one that ends in Z.
    """
    old = _OLD_DATE.match(text)
    if old and key == "DATE-OBS":
        return f"19{old[3]}-{old[2]}-{old[1]}"
    if not _DATE.match(text):
        raise cards.fault(
            f"{key} is {text!r}, no date of the standard: CCYY-MM-DD, or CCYY-MM-DDThh:mm:ss with decimals and without "
            "a letter for the zone"
        )
    return text


def check_agreement(cards: Cards, times: Mapping[str, HeaderTime]) -> None:
    """Refuse a header that states one time in two ways that differ by more than their last digits.

    Raises
    ------
    DataFileError
        Naming the keywords.
    """
    for group in _SAME:
        for one, other in combinations([key for key in group if key in times], 2):
            if not _agree(times[one], times[other]):
                apart_s = _apart_s(times[one], times[other])
                message = f"{one} and {other} state the same time, and are {apart_s:.6g} s apart"
                raise cards.contradiction(message, one, other)
    if {"TSTART", "TSTOP"} <= times.keys() and bool(times["TSTOP"].instants < times["TSTART"].instants):
        raise cards.contradiction("TSTOP is before TSTART", "TSTART", "TSTOP")


def same_time(key: str, times: Mapping[str, HeaderTime]) -> str:
    """The keyword with the most exact statement of the same time."""
    same = next((group for group in _SAME if key in group), (key,))
    there = [name for name in (*same, key) if name in times]
    if key in ("DATE-OBS", "MJD-OBS"):  # often, and not always, where the observation begins
        begins = [name for name in ("TSTART", "DATE-BEG", "MJD-BEG") if name in times]
        there += [name for name in begins if any(_agree(times[name], times[at]) for at in there)]
    return str(min(there, key=lambda name: times[name].digit_s))


def _agree(one: HeaderTime, other: HeaderTime) -> bool:
    return _apart_s(one, other) <= one.digit_s + other.digit_s


def _apart_s(one: HeaderTime, other: HeaderTime) -> float:
    """How far two times are from each other, s."""
    return abs(float(one.instants.minus(other.instants)))
