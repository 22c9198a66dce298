"""The words of dating: scales, places, and nodes (a scale at a place).

A *scale* says how an instant is counted (TT, TDB, UTC ...); a *place* says where the dated event
is (TOPOCENTER, GEOCENTER, BARYCENTER ...), in the words of the FITS time standard (Rots et al.
2015, A&A 574, A36, tables 2 and 5). A node is written `TDB@BARYCENTER`.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from functools import lru_cache
from typing import Final

from .constants import TT_MINUS_TAI
from .errors import InvalidInput

__all__ = ["BODY_PLACES", "PLACES", "Node", "Scale", "check_place"]

BODY_PLACES: Final = (
    "SELENOCENTER",
    "MERCURY",
    "VENUS",
    "MARS",
    "JUPITER",
    "SATURN",
    "URANUS",
    "NEPTUNE",
)
PLACES: Final = ("TOPOCENTER", "GEOCENTER", "BARYCENTER", *BODY_PLACES)
"""Every place name that is understood."""

_FAMILY: Final = re.compile(r"(TT|UTC|CLOCK|PROPER)\(([^()\s@]+)\)\Z")

# The scale's own count minus the TAI count, as (whole s, fraction): both counts start at the label
# 2000-01-01T12:00:00, where TAI - UTC was 32 s. GPS and Galileo time keep the 19 s of 1980 and BeiDou
# time the 33 s of 2006 (IS-GPS-200; Galileo OS-SIS-ICD; BDS-SIS-ICD); GLONASS time is UTC + 3 h.
_COUNT_MINUS_TAI: Final[dict[str, tuple[int, float]]] = {
    "UTC": (-32, 0.0),
    "TAI": (0, 0.0),
    "TT": TT_MINUS_TAI,
    "GPS": (-19, 0.0),
    "GST": (-19, 0.0),
    "BDT": (-33, 0.0),
    "GLONASS": (10800 - 32, 0.0),
}
_OTHERS: Final = ("UT1", "TCG", "TCB", "TDB", "TCL")


@dataclass(frozen=True)
class Scale:
    """One time scale.

    Attributes
    ----------
    name : str
        As written: `TT`, `UTC(KST)`, `TT(BIPM23)` ...
    family : str
        The word before the bracket: `TT`, `UTC`, `CLOCK`, `PROPER`, or the name itself.
    realisation : str or None
        The word in the bracket.
    utc_labels : bool
        True where labels carry leap seconds (UTC, UTC(k), clocks, GLONASS).
    label_offset_s : int
        Label minus UTC label, s (10800 for GLONASS, else 0).
    count_minus_tai : (int, float) or None
        This scale's count minus the TAI count where that is a constant, else None.
    """

    name: str
    family: str
    realisation: str | None
    utc_labels: bool
    label_offset_s: int
    count_minus_tai: tuple[int, float] | None

    @classmethod
    def parse(cls, name: str) -> Scale:
        """Look a scale up by name; unknown names raise `InvalidInput` with the list."""
        if not isinstance(name, str):
            raise InvalidInput(f"a scale is named by a text, got {name!r}; for example scale='UTC'")
        return _parse_scale(name)

    def __str__(self) -> str:
        return self.name


@lru_cache(maxsize=512)
def _parse_scale(name: str) -> Scale:
    match = _FAMILY.match(name)
    if match:
        family, realisation = match.groups()
        if family in ("UTC", "CLOCK"):
            return Scale(name, family, realisation, True, 0, None)
        return Scale(name, family, realisation, False, 0, None)
    if name in _COUNT_MINUS_TAI:
        labels = name in ("UTC", "GLONASS")
        offset = 10800 if name == "GLONASS" else 0
        return Scale(name, name, None, labels, offset, _COUNT_MINUS_TAI[name])
    if name in _OTHERS:
        return Scale(name, name, None, False, 0, None)
    known = ", ".join((*_COUNT_MINUS_TAI, *_OTHERS))
    raise InvalidInput(
        f"unknown scale {name!r}; known are {known}, and TT(realisation), UTC(laboratory), CLOCK(name), PROPER(name), "
        "in capitals"
    )


def check_place(place: str | None) -> str | None:
    """Return `place` if it is a known place or None, else raise `InvalidInput`."""
    if place is not None and place not in PLACES:
        raise InvalidInput(f"unknown place {place!r}; known are {', '.join(PLACES)}, or None for unstated")
    return place


@dataclass(frozen=True)
class Node:
    """A scale at a place; `place=None` where it is left to the chain."""

    scale: Scale
    place: str | None

    @classmethod
    def parse(cls, text: str) -> Node:
        """Read `TDB` or `TDB@BARYCENTER`."""
        if not isinstance(text, str):
            raise InvalidInput(f"a node is written SCALE or SCALE@PLACE, got {text!r}")
        name, separator, place = text.partition("@")
        return cls(Scale.parse(name), check_place(place) if separator else None)

    def __str__(self) -> str:
        return self.scale.name if self.place is None else f"{self.scale.name}@{self.place}"
