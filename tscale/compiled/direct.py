"""A chain in one of its two directions as a function of counts: what is to be approximated, and how noisy it is."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final, NamedTuple

import numpy as np

from .. import exact
from ..errors import NotConverged, OutOfSpan
from ..exact import BoolArray, FloatArray, IntArray, Pair
from ..instants import Instants
from ..scales import Node

if TYPE_CHECKING:
    from ..chains import Chain
    from ..step import Step

__all__ = ["Delta", "Direct", "moved", "since_count"]

_SPREAD_S: Final = 4.0
"""Width over which dates are strewn to see the rounding of the chain: positions, which move by kilometres a second, go
through all their roundings in a millisecond, the direction of a source in seconds."""

_DEGREE: Final = 5


class Delta(NamedTuple):
    """`out - in` of some counts, as an exact pair, and where there is one."""

    whole: IntArray
    fraction: FloatArray
    valid: BoolArray

    def less(self, whole: int | IntArray) -> FloatArray:
        """As one float, less whole seconds; NaN where there is none."""
        return np.where(self.valid, (self.whole - whole) + self.fraction, np.nan)


class Direct:
    """One direction of a chain.

    Attributes
    ----------
    start, end : Node
    steps : tuple of Step
        In the order and the direction in which they are taken.
    """

    def __init__(self, chain: Chain, *, onward: bool) -> None:
        self.chain, self.onward = chain, onward
        self.start: Node = chain.start if onward else chain.end
        self.end: Node = chain.end if onward else chain.start
        self.steps: tuple[Step, ...] = (
            chain.steps if onward else tuple(step.reversed() for step in reversed(chain.steps))
        )

    def __call__(self, at: Pair) -> Pair:
        """Map counts; errors are those of the chain."""
        t = Instants._of(at, self.start.scale, self.start.place)
        return (self.chain(t) if self.onward else self.chain.inverse(t)).pair

    def delta(self, at: Pair) -> Delta:
        """`out - in` of 1-d counts; those that the chain refuses, by an error with its mask, are told apart."""
        whole, fraction = np.zeros(len(at[0]), dtype=np.int64), np.zeros(len(at[0]))
        left = np.arange(len(at[0]))
        while left.size:
            part = (at[0][left], at[1][left])
            try:
                out = self(part)
            except (OutOfSpan, NotConverged) as error:
                if error.mask is None or error.mask.shape != left.shape or not error.mask.any():
                    raise
                left = left[~error.mask]
                continue
            whole[left], fraction[left] = exact.subtract(out, part)
            break
        valid = np.zeros(len(at[0]), dtype=np.bool_)
        valid[left] = True
        return Delta(whole, fraction, valid)

    def noise_s(self, at: Pair, draws: int = 48) -> FloatArray:
        """Standard deviation of the chain's own rounding at 1-d counts: scatter about a polynomial over seconds."""
        rng = np.random.default_rng(20000101)
        shifts = np.sort(rng.uniform(-0.5, 0.5, (len(at[0]), draws)), axis=1) * _SPREAD_S
        spread = moved((at[0][:, None], at[1][:, None]), shifts)
        delta = self.delta((spread[0].reshape(-1), spread[1].reshape(-1)))
        first = np.repeat(delta.whole.reshape(shifts.shape)[:, 0], draws)
        y = delta.less(first).reshape(shifts.shape)
        found = []
        for x, values in zip(shifts / _SPREAD_S, y, strict=True):
            use = np.isfinite(values)
            if np.count_nonzero(use) < draws // 2:
                continue
            middle = values[use].mean()
            fit = np.polynomial.polynomial.polyfit(x[use], values[use] - middle, _DEGREE)
            rest = values[use] - middle - np.polynomial.polynomial.polyval(x[use], fit)
            found.append(np.sqrt(np.sum(rest**2) / (np.count_nonzero(use) - _DEGREE - 1)))
        return np.array(found)


def moved(at: Pair, seconds: FloatArray) -> Pair:
    """Counts later by float64 seconds."""
    return exact.add_seconds(at, seconds)


def since_count(at: Pair, whole: int | IntArray) -> FloatArray:
    """Seconds of counts since an integral one nearby, as one float."""
    return np.asarray((at[0] - whole) + at[1])
