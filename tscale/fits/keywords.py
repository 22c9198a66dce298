"""Single keywords of time, read with the defaults of the standard, which are noted where they are taken."""

from __future__ import annotations

from fractions import Fraction
from typing import Final

from ..errors import InvalidInput
from ..scales import Scale
from . import words
from .cards import Cards

__all__ = [
    "bin_position_of",
    "column_number_of",
    "direction_of",
    "ephemeris_of",
    "offset_of",
    "position_of",
    "scale_of",
    "seconds_of",
    "stored_of",
    "unit_of",
]

_DEFAULTS: Final = {"TIMESYS": "UTC", "TREFPOS": "TOPOCENTER", "TIMEUNIT": "s"}


def column_number_of(cards: Cards, column: str | int | None) -> int | None:
    """The number of a column given by its number or name."""
    if column is None or isinstance(column, int):
        return column
    fields = cards.integer("TFIELDS", 0, 999)
    names = [(cards.text(f"TTYPE{n}") or "").upper() for n in range(1, fields + 1)]
    if names.count(column.upper()) != 1:
        raise InvalidInput(f"{cards.where} has no single column {column!r}; it has {', '.join(names)}")
    return names.index(column.upper()) + 1


def scale_of(cards: Cards, number: int | None, notes: list[str]) -> Scale:
    """The scale by TCTYPn, where that names one, or by TIMESYS."""
    kind = None if number is None else cards.text(f"TCTYP{number}")
    if kind is not None and kind.upper().partition("(")[0] not in (*words.time_words(), "TIME"):
        raise cards.fault(f"TCTYP{number} is {kind!r}: the column holds no times by it")
    own = kind is not None and kind.upper() != "TIME"
    keyword = f"TCTYP{number}" if own else "TIMESYS"
    text = kind if own else cards.text("TIMESYS")
    if text is None:
        notes.append("TIMESYS is not given: UTC by the standard")
        text = _DEFAULTS["TIMESYS"]
    try:
        scale, note = words.scale_of(text)
    except InvalidInput as error:
        raise cards.fault(f"{keyword}: {error}") from error
    if note:
        notes.append(f"{keyword}: {note}")
    return scale


def position_of(cards: Cards, number: int | None, notes: list[str], scale: Scale) -> str:
    """The reference position by TRPOSn or TREFPOS, one that goes with the scale."""
    keyword = f"TRPOS{number}"
    text = None if number is None else cards.text(keyword)
    if text is None:
        keyword, text = "TREFPOS", cards.text("TREFPOS")
    stated = text is not None
    if text is None:
        notes.append("TREFPOS is not given: TOPOCENTER by the standard")
        text = _DEFAULTS["TREFPOS"]
    try:
        position = words.place_of(text)
    except InvalidInput as error:
        raise cards.fault(f"{keyword}: {error}") from error
    if position == "BARYCENTER" and scale.name not in words.BARYCENTRIC:
        message = f"{keyword} is BARYCENTER and TIMESYS {scale}: at the barycentre times are TDB or TCB"
        raise cards.contradiction(message, keyword, "TIMESYS")
    if scale.name in words.BARYCENTRIC and position != "BARYCENTER":
        if not stated:
            raise cards.fault(
                f"TIMESYS is {scale} and TREFPOS is missing: its default TOPOCENTER does not go with {scale}. Add "
                "TREFPOS to the header, or say it in cards={'TREFPOS': ...}"
            )
        notes.append(f"{scale} at {position}: dates of events there, with no path length taken off")
    return position


def unit_of(cards: Cards, keywords: tuple[str, ...], notes: list[str]) -> str:
    """The unit by the first of these keywords that is there."""
    for keyword in keywords:
        text = cards.text(keyword)
        if text is not None:
            if text not in words.UNITS_S:
                raise cards.fault(f"{keyword} is {text!r}, no unit of time; allowed are {', '.join(words.UNITS_S)}")
            return text
    notes.append("TIMEUNIT is not given: s by the standard")
    return _DEFAULTS["TIMEUNIT"]


def offset_of(cards: Cards) -> Fraction:
    """TIMEOFFS, and TIMEZERO, which says the same in older headers, in TIMEUNIT."""
    values = {key: Fraction(cards.number(key) or 0) for key in ("TIMEOFFS", "TIMEZERO")}
    if all(values.values()):
        raise cards.fault(
            "TIMEOFFS and TIMEZERO are both there and not 0: whether they add up cannot be told. Say the sum in one "
            "and 0 in the other, by cards={'TIMEOFFS': ..., 'TIMEZERO': 0}"
        )
    return sum(values.values(), Fraction(0))


def stored_of(cards: Cards, number: int | None) -> tuple[Fraction, Fraction]:
    """TSCALn and TZEROn; further rules of a column are refused."""
    if number is None:
        return Fraction(1), Fraction(0)
    factor, zero = cards.number(f"TSCAL{number}"), cards.number(f"TZERO{number}")
    if factor is not None and factor == 0:
        raise cards.fault(f"TSCAL{number} is 0: every row would have the same time")
    place, value, step = (cards.number(f"{key}{number}") for key in ("TCRPX", "TCRVL", "TCDLT"))
    if (step is not None and step != 1) or (value or 0) != (place or 0):
        raise cards.fault(
            f"TCRPX{number}, TCRVL{number} and TCDLT{number} make times of column {number} by a further linear rule, "
            "which is not read here; write the times themselves"
        )
    return Fraction(1 if factor is None else factor), Fraction(zero or 0)


def direction_of(cards: Cards, text: str | None) -> tuple[str, ...] | None:
    """The two names of TREFDIR, which must be there."""
    if text is None:
        return None
    names = tuple(name.strip() for name in text.split(","))
    fields = cards.integer("TFIELDS", 0, 999) if "TFIELDS" in cards else 0
    columns = {(cards.text(f"TTYPE{n}") or "").upper() for n in range(1, fields + 1)}
    missing = [name for name in names if name.upper() not in cards and name.upper() not in columns]
    if len(names) != 2 or missing:
        raise cards.fault(f"TREFDIR names two keywords or columns of this header, and is {text!r}")
    return names


def ephemeris_of(position: str, notes: list[str]) -> str | None:
    """The ephemeris where PLEPHEM is not given."""
    if position != "BARYCENTER":
        return None
    notes.append("PLEPHEM is not given: DE405 by the standard")
    return "DE405"


def bin_position_of(cards: Cards) -> float:
    """TIMEPIXR."""
    value = cards.number("TIMEPIXR")
    if value is not None and not 0 <= value <= 1:
        raise cards.fault(f"TIMEPIXR is a part of a bin, from 0 to 1, and is {value}")
    return 0.5 if value is None else float(value)


def seconds_of(cards: Cards, keyword: str, unit_s: Fraction) -> float | None:
    """A length of time in TIMEUNIT as seconds; None without it."""
    value = cards.number(keyword)
    if value is not None and value < 0:
        raise cards.fault(f"{keyword} cannot be negative: {value}")
    return None if value is None else float(Fraction(value) * unit_s)
