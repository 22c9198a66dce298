"""The header of an HDU whose times were carried elsewhere: every keyword of time changed so that they agree."""

from __future__ import annotations

import math
import re
from collections.abc import Callable, Sequence
from dataclasses import dataclass, field, replace
from decimal import Decimal
from fractions import Fraction
from typing import Any, Final

from ..constants import DAY_S
from ..errors import TscaleError
from ..instants import Instants
from ..scales import Node
from ..source import Source
from . import words
from .cards import Cards
from .frame import TimeFrame, read_time_frame
from .header_times import ABSOLUTE, RELATIVE, HeaderTime, same_time
from .layout import Column
from .observer import is_icrs
from .reckoning import Reckoning, UtcRelative
from .reference_time import REFERENCE_KEYWORDS

__all__ = ["Target", "end_frame", "ephemeris_name", "rewritten"]

_LIMITS: Final = ("TDMIN", "TDMAX", "TLMIN", "TLMAX")
_DIRECTIONS: Final = (("RA_NOM", "DEC_NOM"), ("RA_OBJ", "DEC_OBJ"))
_OWN_DIRECTION: Final = ("RA_TREF", "DEC_TREF")
_MJD_DECIMALS: Final = 10  # of a day: 9 us, below the 11 digits after which a float64 has none
_DATE_DECIMALS: Final = (6, 12)  # of a second, at the least and the most for the sake of another keyword


@dataclass(frozen=True)
class Target:
    """Where times go.

    Attributes
    ----------
    start, end : Node
    moved : bool
        Whether a signal is carried to another place.
    map : callable
        Instants at the start to instants at the end.
    source : Source or None
        Where the signal comes from.
    ephemeris : str or None
        For PLEPHEM, where one was used.
    mjd : Fraction or None
        A new reference time, or None to keep the number of the old one.
    """

    start: Node
    end: Node
    map: Callable[[Instants], Instants] = field(repr=False)
    source: Source | None = None
    ephemeris: str | None = None
    mjd: Fraction | None = None
    utc: UtcRelative | None = None
    leap_seconds: Any = field(default=None, repr=False)

    @property
    def moved(self) -> bool:
        """Whether a signal is carried to another place."""
        return self.start.place != self.end.place


def ephemeris_name(name: str) -> str:
    """The name of an ephemeris as PLEPHEM writes it, from the name of its file: DE440 of de440_1960_2060.bsp."""
    match = re.match(r"([A-Za-z]+)-?(\d+[A-Za-z]?)(?![A-Za-z0-9])", name)
    return (match[1] + match[2]).upper() if match else name.rpartition(".")[0] or name


def end_frame(frame: TimeFrame, target: Target) -> TimeFrame:
    """The frame in which the times will be."""
    return replace(
        frame,
        scale=target.end.scale,
        position=target.end.place or frame.position,
        mjd=frame.mjd if target.mjd is None else target.mjd,
        offset_s=Fraction(0),
        factor=Fraction(1),
        zero=Fraction(0),
        times={},
        utc=target.utc,
        leap_seconds=target.leap_seconds,
    )


def rewritten(cards: Cards, frame: TimeFrame, columns: Sequence[Column], target: Target) -> tuple[Cards, list[str]]:
    """The new header, without HISTORY, and notes on what could not be carried.

    Raises
    ------
    TscaleError
        Where a time of the header is outside what the chain covers; names the keyword.
    """
    made = cards.copy()
    for key, value in cards.given.items():  # what was said in place of the header, or inherited, stands in it now
        made.set(key, value)
    after = end_frame(frame, target)
    notes: list[str] = []
    name = f"{after.scale} at {after.position}"
    made.set("TIMESYS", words.fits_scale(after.scale), "time scale of all times here")
    made.set("TREFPOS", words.fits_place(after.position), "where the dated events are", after="TIMESYS")
    _set_direction(made, target, notes)
    _set_reference(made, after, target)
    for key in ("TIMEOFFS", "TIMEZERO"):
        if frame.offset_s and key in made:
            made.set(key, 0.0, "contained in the times now")
    for column in columns:
        _set_column(made, column, after, notes)
    _set_times(made, frame, after, target, name, notes)
    _check(made, columns, target)
    return made, notes


def _set_direction(made: Cards, target: Target, notes: list[str]) -> None:
    if target.ephemeris is not None:
        made.set("PLEPHEM", target.ephemeris, "solar-system ephemeris used", after="TREFPOS")
    elif target.moved:
        made.delete("PLEPHEM")
    if not target.moved:
        return
    if target.source is None or target.end.place != "BARYCENTER":
        made.delete("TREFDIR")
        if target.end.place == "BARYCENTER":
            notes.append("TREFDIR was not written: the direction is not known of a compiled chain, give it apart")
        return
    names = next((pair for pair in _DIRECTIONS if _states(made, pair, target.source)), None)
    if names is None:
        names = _OWN_DIRECTION
        made.set(names[0], float(target.source.ra_deg), "[deg] ICRS direction of TREFDIR", after="TREFPOS")
        made.set(names[1], float(target.source.dec_deg), "[deg] ICRS direction of TREFDIR", after=names[0])
    made.set("TREFDIR", ",".join(names), "direction to which path lengths were taken", after="TREFPOS")


def _states(cards: Cards, pair: tuple[str, str], source: Source) -> bool:
    ra, dec = cards.number(pair[0]), cards.number(pair[1])
    if ra is None or dec is None or not is_icrs(cards):
        return False
    return float(ra) == source.ra_deg and float(dec) == source.dec_deg


def _set_reference(made: Cards, after: TimeFrame, target: Target) -> None:
    if target.mjd is None:
        return
    split = "MJDREFI" in made or "MJDREFF" in made
    place = (made.order(REFERENCE_KEYWORDS) or ["TREFPOS"])[-1]
    day = int(target.mjd)
    for key, value in (("MJDREF", float(day)), *((("MJDREFI", day), ("MJDREFF", 0.0)) if split else ())):
        made.set(key, value, f"[d] reference time, {after.scale}", after=place)
    for key in REFERENCE_KEYWORDS:
        if key != "MJDREF" and not (split and key in ("MJDREFI", "MJDREFF")):
            made.delete(key)


def _set_column(made: Cards, column: Column, after: TimeFrame, notes: list[str]) -> None:
    n = column.number
    for key, value in ((f"TSCAL{n}", 1.0), (f"TZERO{n}", 0.0)):
        if key in made:
            made.set(key, value, "contained in the times now")
    kind = made.text(f"TCTYP{n}") if f"TCTYP{n}" in made else None
    if kind is not None and kind.upper() != "TIME":
        made.set(f"TCTYP{n}", words.fits_scale(after.scale), "time scale of the column")
    if f"TRPOS{n}" in made:
        made.set(f"TRPOS{n}", words.fits_place(after.position), "where its events are")
    if f"TRDIR{n}" in made:
        direction = made.text("TREFDIR")
        made.delete(f"TRDIR{n}")
        if direction is not None:
            made.set(f"TRDIR{n}", direction, "direction to which path lengths were taken", after=f"TTYPE{n}")
    for key in _LIMITS:
        if f"{key}{n}" in made:
            made.delete(f"{key}{n}")
            notes.append(f"{made.where}: {key}{n} was taken out: it held for the times before")


def _set_times(made: Cards, frame: TimeFrame, after: TimeFrame, target: Target, name: str, notes: list[str]) -> None:
    unit_s = words.UNITS_S[frame.unit]
    reckoning = Reckoning(after.scale, after.mjd, Fraction(0), unit_s, after.utc, after.leap_seconds)
    carried: dict[str, Instants] = {}
    for key in (*RELATIVE, *ABSOLUTE):
        if key not in frame.times:
            continue
        base = key if key in RELATIVE else same_time(key, frame.times)
        if base not in carried:
            carried[base] = _carried(made, base, frame.times[base], frame, target)
        held = frame.times[key]
        if key in RELATIVE:
            made.set(key, float(reckoning.numbers(carried[key].pair)), f"[{frame.unit}] since the reference, {name}")
        elif held.digit_s >= DAY_S and base == key:
            notes.append(f"{made.where}: {key} states a whole day and was left")
        elif key.startswith("DATE"):
            digit_s = frame.times[base].digit_s
            if base in RELATIVE:  # what is written of it has all digits of a float64
                digit_s = reckoning.spacing_s(float(reckoning.numbers(carried[base].pair)))
            _set_date(made, key, held, _date_decimals(held, digit_s), carried[base], name, target)
        else:
            day, fraction = carried[base].to_mjd(leap_seconds=target.leap_seconds)
            decimals = 0 if held.digit_s >= DAY_S else max(held.decimals, _MJD_DECIMALS)
            value = Decimal(int(day)) + Decimal(float(fraction))
            made.set(key, round(value, decimals) if decimals else int(day), f"[d] {name}")
    if "TELAPSE" in made and {"TSTART", "TSTOP"} <= carried.keys():
        elapsed_s = carried["TSTOP"].minus(carried["TSTART"])
        made.set("TELAPSE", float(elapsed_s / float(unit_s)), f"[{frame.unit}] TSTOP - TSTART")


def _date_decimals(held: HeaderTime, digit_s: float) -> int:
    """Decimals with which a date says what a keyword does whose last digit is worth `digit_s`.

    A whole second of the input is seldom one after its way to another place: cut to it, the date would no longer be
    that of the event.
    """
    least, most = _DATE_DECIMALS
    fine = most if digit_s == 0 else math.ceil(-math.log10(digit_s))
    return max(held.decimals, least, min(fine, most))


def _set_date(made: Cards, key: str, held: HeaderTime, decimals: int, t: Instants, name: str, target: Target) -> None:
    text = str(t.to_iso(decimals, leap_seconds=target.leap_seconds))
    date, _, clock = text.partition("T")
    if held.clock is not None:
        made.set(held.clock, clock, f"{name}")
    whole_day = held.clock is not None or held.digit_s >= DAY_S
    made.set(key, date if whole_day else text, f"{name}")


def _carried(made: Cards, key: str, held: HeaderTime, frame: TimeFrame, target: Target) -> Instants:
    try:
        return target.map(held.instants.at(target.start.place))
    except TscaleError as error:
        error.args = (f"{made.path}, {made.where}, {key}: {error}",)
        error.path = error.path or made.path
        raise


def _check(made: Cards, columns: Sequence[Column], target: Target) -> None:
    """What was written is read again: it has to agree with itself."""
    options = {"utc": target.utc, "leap_seconds": target.leap_seconds}
    for number in (None, *(column.number for column in columns)):
        read_time_frame(made, number, **options)
