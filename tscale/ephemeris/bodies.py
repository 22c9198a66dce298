"""Names and numbers of bodies: the NAIF integer codes in common use for SPK kernels."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Final

from ..errors import InvalidInput

__all__ = ["BODY_IDS", "PLANETARY_BODIES", "body_id", "body_name"]

BODY_IDS: Final[Mapping[str, int]] = MappingProxyType(
    {
        "barycenter": 0,
        "mercury": 1,
        "venus": 2,
        "earth-moon barycenter": 3,
        "mars": 4,
        "jupiter": 5,
        "saturn": 6,
        "uranus": 7,
        "neptune": 8,
        "pluto": 9,
        "sun": 10,
        "moon": 301,
        "earth": 399,
    }
)
"""Number by name. A planet other than the Earth stands for its system's centre of mass, which is what planetary
kernels hold; Mercury and Venus have no moons, so that theirs are the planets themselves."""

PLANETARY_BODIES: Final = (10, 1, 2, 399, 301, 4, 5, 6, 7, 8, 9)
"""Every body of a planetary ephemeris that pulls: Sun, planets (systems), Earth, Moon, Pluto (system)."""

_NAMES: Final = MappingProxyType({number: name for name, number in BODY_IDS.items()})


def body_id(body: str | int) -> int:
    """Return the NAIF number of a body given by name (any case) or by number.

    Raises
    ------
    InvalidInput
        For a name that is not known; the message lists those that are.
    """
    if isinstance(body, str):
        number = BODY_IDS.get(body.strip().lower())
        if number is None:
            raise InvalidInput(
                f"unknown body {body!r}: known names are {', '.join(BODY_IDS)}; give any other body by its NAIF number"
            )
        return number
    if isinstance(body, bool) or not hasattr(body, "__index__"):
        raise InvalidInput(f"a body is a name or a NAIF number, got {body!r} ({type(body).__name__})")
    return body.__index__()


def body_name(number: int) -> str:
    """Name and number for messages: `earth (399)`."""
    name = _NAMES.get(number)
    return f"body {number}" if name is None else f"{name} ({number})"
