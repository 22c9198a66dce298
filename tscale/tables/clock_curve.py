"""The broken line between a reference and a clock, evaluated in both directions with one rounding each."""

from __future__ import annotations

from typing import Any, Final, NamedTuple

import numpy as np

from .. import exact
from ..exact import BoolArray, FloatArray, IntArray, Pair
from .common import locate, since

__all__ = ["ClockCurve", "Found"]

# What came through the curve may miss a comparison by a rounding on its way back: a thousand of those.
_SLACK_S: Final = 1e-12
_ZERO: Final[tuple[float, float]] = (0.0, 0.0)


class Found(NamedTuple):
    """Where instants lie on the curve."""

    interval: IntArray
    """Comparison at or before each instant."""
    outside: BoolArray
    """Before the first or after the last comparison."""
    gap: BoolArray
    """Between two comparisons that are not to be joined."""
    jump: BoolArray
    """Readings that a step skipped or showed twice."""

    @property
    def bad(self) -> BoolArray:
        """Instants without a counterpart."""
        return self.outside | self.gap | self.jump


class ClockCurve(NamedTuple):
    """Comparisons and what lies between them; all arrays have one item per comparison.

    An interval belongs to the comparison that it starts from, so that the last has none: its `gap` is True.
    """

    reference: Pair
    clock: Pair
    """Readings at the comparisons: reference + offset."""
    offset: Pair
    change_s: FloatArray
    """Change of the offset over the interval; zero where it holds until it steps."""
    length: tuple[FloatArray, FloatArray]
    """Length of the interval on the reference, s, as a sum of two floats."""
    clock_length: tuple[FloatArray, FloatArray]
    """The same on the clock, up to the next comparison, before any step."""
    gap: BoolArray
    sigma_s: FloatArray
    step: bool

    @classmethod
    def of(cls, reference: Pair, offset: Pair, sigma_s: FloatArray, gap: BoolArray, step: bool) -> ClockCurve:
        """Lay a curve through comparisons in increasing order."""
        after = (np.append(reference[0][1:], reference[0][-1] + 1), np.append(reference[1][1:], reference[1][-1]))
        apart = exact.subtract(after, reference)
        length = exact.two_sum(apart[0].astype(np.float64), apart[1])
        change_s = np.zeros(len(gap))
        if not step:
            change_s[:-1] = exact.seconds(
                exact.subtract((offset[0][1:], offset[1][1:]), (offset[0][:-1], offset[1][:-1]))
            )
        total, error = exact.two_sum(length[0], change_s)
        clock_length = exact.two_sum(total, error + length[1])
        clock = exact.add(reference, offset)
        return cls(reference, clock, offset, change_s, length, clock_length, gap, sigma_s, step)

    def backwards(self) -> BoolArray:
        """True at each comparison after which the clock would not run forwards."""
        bad = np.zeros(len(self.gap), dtype=np.bool_)
        bad[:-1] = since((self.clock[0][:-1], self.clock[1][:-1]), (self.clock[0][1:], self.clock[1][1:])) <= 0.0
        if self.step:
            # Held readings end in order too, or one reading would belong to more than two instants.
            end = exact.add(self.clock, exact.from_seconds(self.length[0]))
            bad[:-1] |= since((end[0][:-1], end[1][:-1]), (end[0][1:], end[1][1:])) <= 0.0
        return bad

    def find_reference(self, at: Pair) -> Found:
        """Look instants of the reference up."""
        index, outside, gap = self._find(self.reference, at)
        return Found(index, outside, gap, np.zeros(gap.shape, dtype=np.bool_))

    def find_clock(self, at: Pair) -> Found:
        """Look readings of the clock up."""
        index, outside, gap = self._find(self.clock, at)
        jump = np.zeros(gap.shape, dtype=np.bool_)
        if self.step:
            # Skipped: past the last reading that is held, but before the first of the next comparison.
            held_s = since((self.clock[0][index], self.clock[1][index]), at) - self.length[0][index]
            jump |= ~self.gap[index] & (held_s > _SLACK_S)
            # Shown twice: still held from the comparison before.
            before = np.maximum(index - 1, 0)
            held_s = since((self.clock[0][before], self.clock[1][before]), at) - self.length[0][before]
            jump |= (index > 0) & ~self.gap[before] & (held_s < -_SLACK_S)
        return Found(index, outside, gap, jump & ~outside & ~gap)

    def to_clock(self, at: Pair, index: IntArray) -> Pair:
        """Readings at instants of the reference that lie in intervals `index`."""
        return _moved(at, self._at(self.offset, index), self._extra(self.reference, self.length, at, index), 1)

    def to_reference(self, at: Pair, index: IntArray) -> Pair:
        """Instants of the reference at readings that lie in intervals `index`."""
        return _moved(at, self._at(self.offset, index), self._extra(self.clock, self.clock_length, at, index), -1)

    def offset_at(self, at: Pair, index: IntArray) -> Pair:
        """Clock minus reference at instants of the reference."""
        nothing = (np.zeros(index.shape, dtype=np.int64), np.zeros(index.shape))
        return _moved(nothing, self._at(self.offset, index), self._extra(self.reference, self.length, at, index), 1)

    def slope(self, index: IntArray) -> FloatArray:
        """d(clock - reference)/d(reference)."""
        return np.asarray(self.change_s[index] / self.length[0][index])

    def sigma_at(self, at: Pair, index: IntArray) -> FloatArray:
        """Standard uncertainty: straight between two comparisons, held after a single one."""
        if self.step:
            return np.asarray(self.sigma_s[index])
        following = np.minimum(index + 1, len(self.gap) - 1)
        u = np.where(self.gap[index], 0.0, since(self._at(self.reference, index), at) / self.length[0][index])
        return np.asarray(self.sigma_s[index] + u * (self.sigma_s[following] - self.sigma_s[index]))

    # ---- inside ----------------------------------------------------------------------------------

    def _find(self, knots: Pair, at: Pair) -> tuple[IntArray, BoolArray, BoolArray]:
        last = len(self.gap) - 1
        index = locate(knots, at)
        own = np.maximum(index, 0)
        bad = (index < 0) | (self.gap[own] & (since(self._at(knots, own), at) > _SLACK_S))
        if bad.any():
            following = np.minimum(index + 1, last)
            close = bad & (index < last) & (since(self._at(knots, following), at) > -_SLACK_S)
            own = np.where(close, following, own)
            bad &= ~close
        outside = bad & ((index < 0) | (index == last))
        return own, np.asarray(outside), np.asarray(bad & ~outside)

    def _extra(self, knots: Pair, length: tuple[FloatArray, FloatArray], at: Pair, index: IntArray) -> Any:
        """Change of the offset since the comparison, as a sum of two floats."""
        if self.step:
            return _ZERO
        elapsed = exact.subtract(at, self._at(knots, index))
        change = np.where(self.gap[index], 0.0, self.change_s[index])
        return _proportion(change, elapsed, (length[0][index], length[1][index]))

    @staticmethod
    def _at(pair: Pair, index: IntArray) -> Pair:
        return pair[0][index], pair[1][index]


def _proportion(change: FloatArray, elapsed: Pair, length: tuple[FloatArray, FloatArray]) -> tuple[Any, Any]:
    """`change * elapsed / length` as a sum of two floats: one alone is 0.1 fs off for a change of 1 s."""
    product, error = exact.two_product(change, elapsed[0].astype(np.float64))
    quotient = product / length[0]
    back, back_error = exact.two_product(quotient, length[0])
    rest = (product - back) - back_error + error + change * elapsed[1] - quotient * length[1]
    return quotient, rest / length[0]


def _moved(at: Pair, offset: Pair, extra: tuple[Any, Any], sign: int) -> Pair:
    """`at` + `sign` * (`offset` + `extra`), rounded once."""
    total, error = exact.two_sum(at[1], sign * offset[1])
    total, more = exact.two_sum(total, sign * extra[0])
    carry = np.floor(total)
    rest = (total - carry) + (error + more + sign * extra[1])
    return exact.normalise(at[0] + sign * offset[0] + carry.astype(np.int64), rest)
