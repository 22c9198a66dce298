"""All that `tscale clock` has found, for its tables, files and pictures."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, NamedTuple

from .clock_ends import ClockEnd
from .clock_levelling import Levelling
from .clock_orbit import BodySummary, OrbitSummary
from .clock_rates import Found, Model

if TYPE_CHECKING:
    from .clock_budget import RateBudget

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
