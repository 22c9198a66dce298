"""Cubics between comparisons: what they add to the straight line, and which comparisons they hang on.

Piecewise cubic Bessel interpolation (C. de Boor, A Practical Guide to Splines, chapter IV): the slope at a comparison
is that of the parabola through it and its two neighbours; at the end of a piece, that of the last parabola. It is
chosen here because a clock with a constant drift is met exactly, because a constant rate added to the offsets adds just
that (the sign of a rate means nothing, so nothing is gained from keeping offsets monotone), because a bad comparison
spoils four intervals and no more, and because it is linear in the comparisons, so that uncertainties propagate.
"""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from ..exact import BoolArray, FloatArray, IntArray

__all__ = ["Bend", "Stencil"]


class Bend(NamedTuple):
    """Slope times length, less the change over the interval: at its start and its end, s."""

    start_s: FloatArray
    end_s: FloatArray

    def value(self, index: IntArray, part: FloatArray) -> FloatArray:
        """Cubic less straight line, s; `part` runs from 0 to 1."""
        rest = 1.0 - part
        return np.asarray(part * rest * (self.start_s[index] * rest - self.end_s[index] * part))

    def slope(self, index: IntArray, part: FloatArray) -> FloatArray:
        """Derivative of `value` by `part`."""
        first, last = self.start_s[index], self.end_s[index]
        return np.asarray(first * (1.0 - part) * (1.0 - 3.0 * part) + last * part * (3.0 * part - 2.0))

    def least_slope(self) -> FloatArray:
        """Smallest derivative in each interval."""
        index = np.arange(len(self.start_s))
        twice = 3.0 * (self.start_s + self.end_s)
        top = np.divide(2.0 * self.start_s + self.end_s, twice, out=np.zeros(len(index)), where=twice != 0.0)
        parts = (np.zeros(len(index)), np.ones(len(index)), np.clip(top, 0.0, 1.0))
        return np.asarray(np.min([self.slope(index, part) for part in parts], axis=0))


class Stencil(NamedTuple):
    """The slopes at both ends of each interval as (1 - share) d[first] + share d[first + 1], d the mean slopes."""

    start: IntArray
    start_share: FloatArray
    end: IntArray
    end_share: FloatArray

    @classmethod
    def of(cls, length_s: FloatArray, gap: BoolArray, corner: BoolArray) -> Stencil:
        """Take parabolas where neither a gap nor a corner is in the way."""
        count = len(gap)
        own = np.arange(count)
        smooth = np.zeros(count + 1, dtype=np.bool_)
        smooth[1:count] = ~gap[:-1] & ~gap[1:] & ~corner[1:]
        before, after = np.roll(length_s, 1), np.roll(length_s, -1)
        earlier = before / (before + length_s)
        later = length_s / (length_s + after)
        at_start, at_end = smooth[:-1], smooth[1:]
        start = np.where(at_start, own - 1, own)
        start_share = np.where(at_start, earlier, np.where(at_end, -later, 0.0))
        end = np.where(at_end, own, np.where(at_start, own - 1, own))
        end_share = np.where(at_end, later, np.where(at_start, 2.0 - earlier, 0.0))
        return cls(start, start_share, end, end_share)

    def bend(self, change_s: FloatArray, length_s: FloatArray) -> Bend:
        """What the slopes make of the changes over the intervals."""
        mean = change_s / length_s

        def bent(first: IntArray, share: FloatArray) -> FloatArray:
            second = np.minimum(first + 1, len(mean) - 1)
            return np.asarray(length_s * ((1.0 - share) * (mean[first] - mean) + share * (mean[second] - mean)))

        return Bend(bent(self.start, self.start_share), bent(self.end, self.end_share))

    def weights(self, index: IntArray, part: FloatArray, length_s: FloatArray) -> tuple[IntArray, FloatArray]:
        """Comparisons (..., 8) that the offset at `part` of intervals hangs on, and their weights; some twice."""
        last = len(length_s) - 1
        own = length_s[index]
        rest = 1.0 - part
        nodes = [index, np.minimum(index + 1, last)]
        bow = part * rest * (part - rest)  # of the change, which both bends are counted from
        weights = [rest - bow, part + bow]
        for first, share, lever in (
            (self.start[index], self.start_share[index], part * rest * rest * own),
            (self.end[index], self.end_share[index], -part * part * rest * own),
        ):
            second, third = np.minimum(first + 1, last), np.minimum(first + 2, last)
            early, late = lever * (1.0 - share) / length_s[first], lever * share / length_s[second]
            nodes += [first, second, third]
            weights += [-early, early - late, late]
        return np.stack(nodes, axis=-1), np.stack(weights, axis=-1)
