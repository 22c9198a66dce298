"""Clocks as users meet them: their rates, two of them compared, heights from frequencies, clocks in orbit."""

from __future__ import annotations

from .comparison import ClockComparison, compare_clocks
from .heights import HeightDifference, height_from_frequency
from .orbits import OrbitRate, eccentricity_constant_s_m05, eccentricity_term_s, j2_term_s, orbit_rate
from .proper_clock import ProperClock
from .rate_ledger import RateLedger
from .rates import proper_ledger, proper_rate

__all__ = [
    "ClockComparison",
    "HeightDifference",
    "OrbitRate",
    "ProperClock",
    "RateLedger",
    "compare_clocks",
    "eccentricity_constant_s_m05",
    "eccentricity_term_s",
    "height_from_frequency",
    "j2_term_s",
    "orbit_rate",
    "proper_ledger",
    "proper_rate",
]
