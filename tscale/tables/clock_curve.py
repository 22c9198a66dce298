"""The line between a reference and a clock, evaluated in both directions with one rounding each."""

from __future__ import annotations

from typing import Any, Final, NamedTuple

import numpy as np

from .. import exact
from ..errors import NotConverged
from ..exact import BoolArray, FloatArray, IntArray, Pair
from .clock_bends import Bend, Stencil
from .common import locate, since

__all__ = ["ClockCurve", "Found"]

# What came through the curve may miss a comparison by a rounding on its way back: a thousand of those.
_SLACK_S: Final = 1e-12
_PASSES: Final = 60


class Found(NamedTuple):
    """Where instants lie on the curve."""

    interval: IntArray
    """Comparison at or before each instant."""
    outside: BoolArray
    """Before the first or after the last comparison."""
    gap: BoolArray
    """Between two comparisons that are not to be joined."""
    jump: BoolArray
    """Readings that a step or a reset skipped or showed twice."""

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
    """Change of the offset over the interval, before any reset at its end; zero where it holds until it steps."""
    bend: Bend | None
    """What a cubic adds to the straight line."""
    stencil: Stencil | None
    """Which comparisons the slopes of a cubic come from."""
    length: tuple[FloatArray, FloatArray]
    """Length of the interval on the reference, s, as a sum of two floats."""
    clock_length: tuple[FloatArray, FloatArray]
    """The same on the clock, up to the next comparison, before any step."""
    clock_end: Pair
    """Reading at the end of the interval, before any step or reset there."""
    gap: BoolArray
    broken: BoolArray
    """Intervals over which the clock's phase is not known to go on: a reset of unknown size, another log."""
    corner: BoolArray
    """Comparisons at which the rate was changed."""
    sigma_s: FloatArray
    """Standard uncertainty of each comparison by errors of its own."""
    common_s: FloatArray
    """The same by the one error that all comparisons share, such as that of a calibration."""
    step: bool
    reset: Pair
    """By how much the clock was set forward at each comparison, whose offset is that after."""

    @property
    def jumps(self) -> bool:
        """Whether readings can be skipped or shown twice at all."""
        return self.step or bool(np.any(self.reset[0]) or np.any(self.reset[1]))

    @classmethod
    def of(
        cls,
        reference: Pair,
        offset: Pair,
        sigma_s: FloatArray,
        gap: BoolArray,
        kind: str,
        *,
        common_s: FloatArray | None = None,
        reset: Pair | None = None,
        broken: BoolArray | None = None,
        corner: BoolArray | None = None,
    ) -> ClockCurve:
        """Lay a curve through comparisons in increasing order."""
        none = np.zeros(len(gap), dtype=np.bool_)
        corner = none if corner is None else corner
        broken = none if broken is None else broken
        reset = exact.from_seconds(np.zeros(len(gap))) if reset is None else reset
        common_s = np.zeros(len(gap)) if common_s is None else common_s
        step = kind == "step"
        change_s = np.zeros(len(gap))
        if not step:
            change = exact.subtract((offset[0][1:], offset[1][1:]), (offset[0][:-1], offset[1][:-1]))
            change = exact.subtract(change, (reset[0][1:], reset[1][1:]))
            change_s[:-1] = exact.seconds(change)
        length = _lengths(reference)
        stencil = Stencil.of(length[0], gap, corner) if kind == "cubic" else None
        bend = None if stencil is None else stencil.bend(change_s, length[0])
        return cls.laid(reference, offset, change_s, bend, stencil, gap, broken, corner, sigma_s, common_s, step, reset)

    @classmethod
    def laid(
        cls,
        reference: Pair,
        offset: Pair,
        change_s: FloatArray,
        bend: Bend | None,
        stencil: Stencil | None,
        gap: BoolArray,
        broken: BoolArray,
        corner: BoolArray,
        sigma_s: FloatArray,
        common_s: FloatArray,
        step: bool,
        reset: Pair,
    ) -> ClockCurve:
        """Complete what is derived from comparisons and changes."""
        length = _lengths(reference)
        total, error = exact.two_sum(length[0], change_s)
        clock_length = exact.two_sum(total, error + length[1])
        clock = exact.add(reference, offset)
        end = exact.add(exact.add(clock, exact.from_seconds(clock_length[0])), exact.from_seconds(clock_length[1]))
        return cls(
            reference,
            clock,
            offset,
            change_s,
            bend,
            stencil,
            length,
            clock_length,
            end,
            gap,
            broken,
            corner,
            sigma_s,
            common_s,
            step,
            reset,
        )

    def backwards(self) -> BoolArray:
        """True at each comparison after which the clock would not run forwards."""
        bad = np.zeros(len(self.gap), dtype=np.bool_)
        bad[:-1] = since((self.clock[0][:-1], self.clock[1][:-1]), (self.clock[0][1:], self.clock[1][1:])) <= 0.0
        if self.jumps:
            # Readings before a jump end in order too, or one reading would belong to more than two instants.
            end = self.clock_end
            bad[1:-1] |= (
                ~self.gap[:-2]
                & ~self.gap[1:-1]
                & (since((end[0][:-2], end[1][:-2]), (end[0][1:-1], end[1][1:-1])) <= 0.0)
            )
            bad |= ~self.gap & (self.clock_length[0] <= 0.0)
        if self.bend is not None:
            bad |= ~self.gap & (self.length[0] + self.change_s + self.bend.least_slope() <= 0.0)
        return bad

    def find_reference(self, at: Pair) -> Found:
        """Look instants of the reference up."""
        index, outside, gap = self._find(self.reference, at)
        return Found(index, outside, gap, np.zeros(gap.shape, dtype=np.bool_))

    def find_clock(self, at: Pair) -> Found:
        """Look readings of the clock up."""
        index, outside, gap = self._find(self.clock, at)
        jump = np.zeros(gap.shape, dtype=np.bool_)
        if self.jumps:
            # Skipped: past the last reading of the interval, but before the first of the next comparison.
            jump |= ~self.gap[index] & (since(self._at(self.clock_end, index), at) > _SLACK_S)
            # Shown twice: still read after the comparison before.
            before = np.maximum(index - 1, 0)
            jump |= (index > 0) & ~self.gap[before] & (since(self._at(self.clock_end, before), at) < -_SLACK_S)
        return Found(index, outside, gap, jump & ~outside & ~gap)

    def to_clock(self, at: Pair, index: IntArray) -> Pair:
        """Readings at instants of the reference that lie in intervals `index`."""
        return _moved(at, self._at(self.offset, index), self._change(at, index), 1)

    def to_reference(self, at: Pair, index: IntArray) -> Pair:
        """Instants of the reference at readings that lie in intervals `index`."""
        offset = self._at(self.offset, index)
        first = _moved(at, offset, self._extra(self.clock, self.clock_length, at, index), -1)
        if self.bend is None:
            return first
        instant = first
        for _ in range(_PASSES):
            miss = exact.seconds(exact.subtract(at, self.to_clock(instant, index)))
            settled = np.max(np.abs(miss), initial=0.0) < 1e-10  # the next pass would change less than 1e-18 s
            instant = exact.add_seconds(instant, miss / (1.0 + self.slope(instant, index)))
            if settled:
                # With the offset there taken off once, the reading is rounded once.
                return _moved(at, offset, self._change(instant, index), -1)
        raise NotConverged(f"readings of the clock still miss by {np.max(np.abs(miss)):.3g} s after {_PASSES} passes")

    def offset_at(self, at: Pair, index: IntArray) -> Pair:
        """Clock minus reference at instants of the reference."""
        nothing = (np.zeros(index.shape, dtype=np.int64), np.zeros(index.shape))
        return _moved(nothing, self._at(self.offset, index), self._change(at, index), 1)

    def slope(self, at: Pair, index: IntArray) -> FloatArray:
        """d(clock - reference)/d(reference); before a gap, that of the interval that ends there."""
        before = np.maximum(index - 1, 0)
        held = self.gap[index] & ~self.gap[before]
        part = np.where(held, 1.0, self.part(at, index))
        index = np.where(held, before, index)
        change = self.change_s[index]
        if self.bend is not None:
            change = change + self.bend.slope(index, part)
        return np.asarray(change / self.length[0][index])

    def part(self, at: Pair, index: IntArray) -> FloatArray:
        """How far along their intervals instants are: 0 at the start, 1 at the end; 0 where a gap follows."""
        return np.where(self.gap[index], 0.0, since(self._at(self.reference, index), at) / self.length[0][index])

    def weights(self, at: Pair, index: IntArray) -> tuple[IntArray, FloatArray]:
        """Comparisons (..., k) that the offsets at instants in intervals `index` hang on, and weights; some twice."""
        if self.step:
            return index[..., None], np.ones((*index.shape, 1))
        part = self.part(at, index)
        if self.stencil is not None:
            return self.stencil.weights(index, part, self.length[0])
        following = np.minimum(index + 1, len(self.gap) - 1)
        return np.stack([index, following], axis=-1), np.stack([1.0 - part, part], axis=-1)

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

    def _change(self, at: Pair, index: IntArray) -> tuple[Any, Any]:
        """Change of the offset since the comparison at instants of the reference, as a sum of two floats."""
        extra = self._extra(self.reference, self.length, at, index)
        if self.bend is None:
            return extra
        total, error = exact.two_sum(extra[0], self.bend.value(index, self.part(at, index)))
        return total, error + extra[1]

    def _extra(self, knots: Pair, length: tuple[FloatArray, FloatArray], at: Pair, index: IntArray) -> tuple[Any, Any]:
        """The straight part of the change, as a sum of two floats."""
        if self.step:
            return 0.0, 0.0
        elapsed = exact.subtract(at, self._at(knots, index))
        change = np.where(self.gap[index], 0.0, self.change_s[index])
        return _proportion(change, elapsed, (length[0][index], length[1][index]))

    @staticmethod
    def _at(pair: Pair, index: IntArray) -> Pair:
        return pair[0][index], pair[1][index]


def _lengths(reference: Pair) -> tuple[FloatArray, FloatArray]:
    """From each comparison to the next; 1 s after the last, where it does not matter."""
    after = (np.append(reference[0][1:], reference[0][-1] + 1), np.append(reference[1][1:], reference[1][-1]))
    apart = exact.subtract(after, reference)
    high, low = exact.two_sum(apart[0].astype(np.float64), apart[1])
    return np.asarray(high), np.asarray(low)


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
