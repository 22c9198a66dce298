"""What a reader should know of values that rest on predictions, on held values or on an expired table."""

from __future__ import annotations

from collections.abc import Mapping
from typing import TYPE_CHECKING, Final

import numpy as np

from ..exact import BoolArray, Pair

if TYPE_CHECKING:
    from .reference import ReferenceData

__all__ = ["leap_second_flags", "leap_second_notes", "orientation_flags", "orientation_notes", "worded"]

_STATUS: Final = (
    (1, "use predicted Earth orientation"),
    (2, "are past the end of the Earth orientation, which is held"),
)


def orientation_flags(tai: Pair, reference: ReferenceData) -> dict[str, BoolArray]:
    """Where the Earth orientation at TAI counts is predicted, and where it is held; in words."""
    status = reference.earth_orientation.status(tai)
    return {words: np.asarray(status == code) for code, words in _STATUS}


def leap_second_flags(utc: Pair, reference: ReferenceData) -> dict[str, BoolArray]:
    """Which UTC counts are past the expiry of the leap-second table; in words."""
    table = reference.leap_seconds
    return {f"are past the expiry of the leap-second table {table.name}": table.is_expired(utc)}


def worded(flags: Mapping[str, BoolArray]) -> tuple[str, ...]:
    """`3 of 50 instants ...` for every flag that is set anywhere."""
    counts = {words: int(np.count_nonzero(mask)) for words, mask in flags.items()}
    return tuple(f"{n} of {flags[words].size} instants {words}" for words, n in counts.items() if n)


def orientation_notes(tai: Pair, reference: ReferenceData) -> tuple[str, ...]:
    """How much of the Earth orientation used at TAI counts is predicted or held."""
    return worded(orientation_flags(tai, reference))


def leap_second_notes(utc: Pair, reference: ReferenceData) -> tuple[str, ...]:
    """How many UTC counts are past the expiry of the leap-second table."""
    return worded(leap_second_flags(utc, reference))
