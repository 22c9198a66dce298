"""What the offset of a log is uncertain by: errors of comparisons, by the weights of the interpolation, and noise.

One law for all of a log, between the comparisons and past them. The offset at an instant is a weighted sum of those of
some comparisons. An error that all comparisons share - the calibration of the link - is carried by the sum of the
weights; errors of their own add in quadrature: halfway between two comparisons of 1 ns each, 0.7 ns. And the clock
itself wanders from that sum as far as its noise lets it (`clock_noise`).
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from ..exact import FloatArray, IntArray, Pair
from .clock_curve import ClockCurve
from .clock_noise import ClockNoise
from .clock_prediction import Forecast
from .common import since

__all__ = ["Carried", "carried", "offset_sigma"]


class Carried(NamedTuple):
    """Comparisons (..., k) that offsets hang on."""

    node: IntArray
    weight: FloatArray
    time_s: FloatArray
    """When they were made, s from the start of the interval."""
    ahead_s: FloatArray
    """The instants (...) themselves, s from there."""

    def own_s(self, sigma_s: FloatArray) -> FloatArray:
        """Standard uncertainty by errors of its own at each comparison."""
        part = self.weight * sigma_s[self.node]
        square = (part**2).sum(axis=-1)
        for a in range(part.shape[-1]):
            for b in range(a + 1, part.shape[-1]):
                square += np.where(self.node[..., a] == self.node[..., b], 2.0 * part[..., a] * part[..., b], 0.0)
        return np.asarray(np.sqrt(np.maximum(square, 0.0)))

    def common_s(self, common_s: FloatArray) -> FloatArray:
        """Standard uncertainty by one error shared by all comparisons."""
        return np.asarray(np.abs((self.weight * common_s[self.node]).sum(axis=-1)))

    def contrast(self) -> tuple[FloatArray, FloatArray]:
        """Times and weights (..., k + 1) of what the clock wanders: the sum less the reading at the instant."""
        one = np.full((*self.ahead_s.shape, 1), -1.0)
        times = np.concatenate([self.time_s, self.ahead_s[..., None]], axis=-1)
        return times, np.concatenate([self.weight, one], axis=-1)


def carried(curve: ClockCurve, forecasts: tuple[Forecast, ...], at: Pair, index: IntArray) -> Carried:
    """What the offsets at instants in intervals `index` hang on."""
    node, weight = curve.weights(at, index)
    for forecast in forecasts:
        mine = index == forecast.interval
        if mine.any():
            width = max(node.shape[-1], len(forecast.nodes))
            spare = (*((0, 0) for _ in index.shape), (0, width - node.shape[-1]))
            node, weight = np.pad(node, spare), np.pad(weight, spare)
            # Places to spare stand for the first of the comparisons, with no weight.
            node[mine], weight[mine] = forecast.nodes[0], 0.0
            node[mine, : len(forecast.nodes)] = forecast.nodes
            weight[mine, : len(forecast.nodes)] = forecast.weights(curve, (at[0][mine], at[1][mine]))
    whole, fraction = curve.reference
    start = (whole[index], fraction[index])
    time_s = since((start[0][..., None], start[1][..., None]), (whole[node], fraction[node]))
    return Carried(node, weight, time_s, since(start, at))


def offset_sigma(
    curve: ClockCurve, noise: ClockNoise | None, forecasts: tuple[Forecast, ...], at: Pair, index: IntArray
) -> FloatArray:
    """Standard uncertainty of the offset, s."""
    found = carried(curve, forecasts, at, index)
    sigma = np.hypot(found.own_s(curve.sigma_s), found.common_s(curve.common_s))
    return np.asarray(sigma if noise is None else np.hypot(sigma, noise.contrast_s(*found.contrast())))
