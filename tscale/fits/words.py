"""The words of the FITS time standard: time scales, reference positions, units.

Rots et al. 2015, A&A 574, A36, tables 2, 3 and 5; FITS Standard 4.0, section 9, tables 30, 31 and 34.
"""

from __future__ import annotations

import re
from fractions import Fraction
from typing import Final

from ..errors import InvalidInput
from ..scales import PLACES, Scale

__all__ = ["BARYCENTRIC", "UNITS_S", "fits_place", "fits_scale", "place_of", "scale_of", "time_words"]

BARYCENTRIC: Final = ("TDB", "TCB")
"""The scales that go with BARYCENTER, which goes with no others."""

_SCALES: Final = ("TAI", "TT", "UT1", "UTC", "GPS", "TCG", "TCB", "TDB")
_OLD: Final = {"TDT": "TT", "ET": "TT", "IAT": "TAI", "GMT": "UTC", "UT": "UTC"}
_REALISED: Final = re.compile(r"([A-Z0-9]+)\(([^()\s]*)\)\Z")
_POSITIONS: Final = (
    "TOPOCENTER", "GEOCENTER", "BARYCENTER", "RELOCATABLE", "CUSTOM", "HELIOCENTER", "GALACTIC", "EMBARYCENTER",
    "MERCURY", "VENUS", "MARS", "JUPITER", "SATURN", "URANUS", "NEPTUNE",
)  # fmt: skip
_SIGNIFICANT: Final = 8  # characters that tell one position from another

UNITS_S: Final = {
    "s": Fraction(1),
    "min": Fraction(60),
    "h": Fraction(3600),
    "d": Fraction(86400),
    "a": Fraction(31557600),
    "yr": Fraction(31557600),
    "cy": Fraction(3155760000),
    # The mean tropical year of 2000 (365.2421897 d) and that of 1900, of which Besselian epochs are counted
    # (365.242198781 d; Lieske 1979, A&A 73, 282). Both said in a note where they are used.
    "ta": Fraction("365.2421897") * 86400,
    "Ba": Fraction("365.242198781") * 86400,
}
"""Units of time, in seconds."""


def time_words() -> tuple[str, ...]:
    """Every word that TIMESYS may be, without realisations."""
    return (*_SCALES, *_OLD, "LOCAL")


def scale_of(text: str) -> tuple[Scale, str | None]:
    """Our scale for a value of TIMESYS, and a note where it is another word.

    Raises
    ------
    InvalidInput
        For a word that the standard does not have, and LOCAL, which names no scale.
    """
    word = text.strip().upper()
    match = _REALISED.match(word)
    name, realisation = (match[1], match[2]) if match else (word, None)
    if name == "LOCAL":
        raise InvalidInput("LOCAL is a simulated or unreliable time that nothing ties to another one")
    if name == "UT" and realisation is not None:
        if realisation not in ("1", "UT1"):
            raise InvalidInput(f"{text} names a realisation of universal time that is not known here; allowed is UT1")
        return Scale.parse("UT1"), f"{text} is read as UT1"
    ours = _OLD.get(name, name)
    if ours not in _SCALES:
        raise InvalidInput(
            f"{text!r} is no time scale of the standard; it has {', '.join(time_words())}, and realisations in "
            "brackets such as TT(BIPM23)"
        )
    note = f"{text} is an old name, read as {ours}" if ours != name else None
    if realisation in (None, "") or (ours, realisation) == ("TT", "TAI"):
        return Scale.parse(ours), note
    if ours in ("TT", "UTC"):
        return Scale.parse(f"{ours}({realisation})"), note
    return Scale.parse(ours), f"{text} is read as {ours}; the realisation {realisation} is let be"


def place_of(text: str) -> str:
    """The reference position that a value of TREFPOS names; its first 8 characters tell.

    Raises
    ------
    InvalidInput
        For a word that the standard does not have.
    """
    word = text.strip().upper()
    for position in _POSITIONS:
        if word == position or (len(word) >= _SIGNIFICANT and position.startswith(word)):
            return position
    raise InvalidInput(f"{text!r} is no reference position of the standard; it has {', '.join(_POSITIONS)}")


def fits_scale(scale: Scale) -> str:
    """How TIMESYS names one of our scales.

    Raises
    ------
    InvalidInput
        For a scale that the standard has no word for.
    """
    if scale.family in _SCALES:
        return scale.name
    raise InvalidInput(f"the FITS standard has no word for {scale}; TIMESYS may be {', '.join(_SCALES)}")


def fits_place(place: str) -> str:
    """How TREFPOS names one of our places.

    Raises
    ------
    InvalidInput
        For a place that the standard has no word for.
    """
    if place in _POSITIONS and place in PLACES:
        return place
    raise InvalidInput(f"the FITS standard has no word for {place}; TREFPOS may be {', '.join(_POSITIONS)}")
