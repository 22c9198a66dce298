"""Ends of links that tests can reason about: straight lines and circles with known light times."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from tscale.exact import FloatArray, Pair
from tscale.tables.reference import ReferenceData


@dataclass(frozen=True)
class StraightLine:
    """A point in uniform motion through `at_m` at TDB count 0."""

    name: str
    at_m: tuple[float, float, float]
    velocity_m_s: tuple[float, float, float]

    def state_bcrs(self, tdb: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray]:
        count = tdb[0] + tdb[1]
        velocity = np.broadcast_to(np.array(self.velocity_m_s), (*count.shape, 3))
        return np.array(self.at_m) + count[..., np.newaxis] * velocity, velocity


@dataclass(frozen=True)
class Circle:
    """A point on a circle about a centre in uniform motion, in the x-y plane of the centre."""

    name: str
    centre: StraightLine
    radius_m: float
    rate_rad_s: float

    def state_bcrs(self, tdb: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray]:
        count = tdb[0] + tdb[1]
        angle = self.rate_rad_s * count
        place, speed = self.centre.state_bcrs(tdb, reference)
        out = np.stack([np.cos(angle), np.sin(angle), np.zeros_like(angle)], axis=-1)
        on = np.stack([-np.sin(angle), np.cos(angle), np.zeros_like(angle)], axis=-1)
        return place + self.radius_m * out, speed + self.radius_m * self.rate_rad_s * on
