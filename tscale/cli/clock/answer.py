"""All that `tscale clock` has found, for its tables, files and pictures."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, NamedTuple

from .ends import ClockEnd
from .levelling import Levelling
from .orbit import BodySummary, OrbitSummary
from .rates import Found, Model

if TYPE_CHECKING:
    from .budget import RateBudget

__all__ = ["Answer"]


class Answer(NamedTuple):
    """One run."""

    ends: Sequence[ClockEnd]
    found: Found
    model: Model
    dates: tuple[str, str]
    """First and last, as text."""
    budget: RateBudget | None
    """Of the predicted rate; None where the potential of a site is not known, and so nothing is predicted."""
    orbits: Sequence[OrbitSummary | None]
    """By clock."""
    bodies: Sequence[BodySummary | None]
    """By clock."""
    levelling: Levelling | None
