"""Moving clocks: spacecraft, orbits and tabulated states."""

from __future__ import annotations

from .trajectory import Trajectory

__all__ = ["Trajectory"]
