"""Results that were rounded on the way: found by the steps that they lie on, which no regression sees.

Dates that lie on a grid of steps q have a phase 2 pi d/q near 0, d being the distance from the nearest point of the
grid; those of other dates are spread evenly, and the mean of their cosines is 0 with a standard deviation of 1/sqrt(2n)
(the test of Rayleigh for a known direction; Mardia and Jupp 2000, Directional Statistics, 6.3.1).
"""

from __future__ import annotations

import math
from typing import Final, NamedTuple

import numpy as np

from ..constants import DAY_S
from ..exact import FloatArray
from ..formats import labels
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from ..scales import Scale
from .clock_faces import in_one_float

__all__ = ["Grid", "grids", "lies_on", "rounded"]

_SIGMAS: Final = 6.0


class Grid(NamedTuple):
    """One way to round a date."""

    name: str
    description: str
    layout: str
    digits: int = 0


_GRIDS: Final = (
    Grid("Julian Date in one float64 in the result", "rounded to steps of 40 us", "jd"),
    Grid("Modified Julian Date in one float64 in the result", "rounded to steps of 0.6 us", "mjd"),
    Grid("seconds from 1970 in one float64 in the result", "rounded to steps of 0.1 or 0.2 us", "unix"),
    *(
        Grid(f"result rounded to {digits} decimals of a second", "as it was written", "decimals", digits)
        for digits in (0, 3, 6, 9)
    ),
)


def _off_s(t: Instants, grid: Grid, leaps: LeapSeconds) -> tuple[FloatArray, FloatArray]:
    """Distance to the nearest point of a grid, s, and the step of the grid there."""
    if grid.layout != "decimals":
        day = labels.label(Scale.parse(t.scale), t.pair, leaps)[0].astype(np.float64)
        if grid.layout == "unix":
            step = np.spacing(np.maximum(np.abs(day - 40587.0) * DAY_S, 1.0))
        else:
            step = np.spacing(np.abs(day) + (2400000.5 if grid.layout == "jd" else 0.0)) * DAY_S
        return in_one_float(t, grid.layout, leaps), step
    size = 10.0**grid.digits
    ticks = t.fraction * size
    return np.asarray((np.rint(ticks) - ticks) / size), np.full(t.shape, 1.0 / size)


def rounded(t: Instants, grid: Grid, leaps: LeapSeconds) -> Instants:
    """Instants as they would be kept."""
    return t.shifted(_off_s(t, grid, leaps)[0])


def _alignment(t: Instants, grid: Grid, leaps: LeapSeconds) -> float:
    off, step = _off_s(t, grid, leaps)
    return float(np.mean(np.cos(2.0 * math.pi * off / step)))


def lies_on(result: Instants, grid: Grid, leaps: LeapSeconds) -> bool:
    """Whether dates lie on a grid."""
    return _alignment(result, grid, leaps) * math.sqrt(2.0 * result.size) > _SIGMAS


def grids(theirs: Instants, ours: Instants, leaps: LeapSeconds) -> list[Grid]:
    """The grids that the results of another program lie on and ours do not, coarsest first."""
    found = [
        grid
        for grid in _GRIDS
        if lies_on(theirs, grid, leaps) and _alignment(ours, grid, leaps) < 0.5 * _alignment(theirs, grid, leaps)
    ]
    return sorted(found, key=lambda grid: -float(np.max(_off_s(theirs, grid, leaps)[1])))
