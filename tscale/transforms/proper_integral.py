"""Elapsed proper time: the rate of a clock integrated from a coincidence on, to 1e-18 of the time elapsed.

Blocks of 8 days on either side of the coincidence are integrated when they are first needed, always whole and each by
itself, and added up from the coincidence outward: what is found does not depend on what was asked before.
"""

from __future__ import annotations

import math
import threading
from collections import OrderedDict
from fractions import Fraction
from typing import Any, Final

import numpy as np

from .. import exact
from ..constants import L_G
from ..earth.gravity.field import GravityField
from ..earth.observer import Observer
from ..ephemeris.chebyshev import broadcast_pair, date_text
from ..errors import NotConverged, OutOfSpan, unsaid_extrapolations
from ..exact import Factor, FloatArray, IntArray, Pair
from ..tables.reference import ReferenceData
from .proper_models import model_of, total_of
from .proper_panels import Integral, integrate
from .proper_reach import reach
from .proper_tides import Tides, checked_tides
from .proper_time import checked_gravity

__all__ = ["SET_RATE", "ProperIntegral"]

SET_RATE: Final = "set rate offset"
"""Name of the term of a clock that is set to run fast or slow."""

_BLOCK_S: Final = 8 * 86400
_FIRST_PANEL_S: Final = 86400
_BLOCKS_KEPT: Final = 256
_SLACK_S: Final = 1e-9
_SLIVER_S: Final = 1e-8
_MOST_ROUNDS: Final = 12
_ENOUGH_S: Final = 1e-10
_ORIGIN: Final[Pair] = (np.asarray(0), np.asarray(0.0))
_TCG_PER_TT: Final = float(1 / (1 - L_G))
_TCG_GAIN: Final = float(L_G / (1 - L_G))


class ProperIntegral:
    """Reading of a clock minus TT, both counted from a coincidence; with its terms. Safe between threads.

    Parameters
    ----------
    observer : Observer
        Site or trajectory.
    anchor : Pair
        TT count of the coincidence, scalar.
    reference : ReferenceData
    gravity, tides
        See `rate_terms`.
    rate_offset : float
        Fractional frequency by which the clock is set fast.

    Raises
    ------
    OutOfSpan
        If the coincidence lies where the clock's rate is not known.
    """

    def __init__(
        self,
        observer: Observer,
        anchor: Pair,
        reference: ReferenceData,
        *,
        gravity: GravityField | None = None,
        tides: Tides = True,
        rate_offset: float = 0.0,
    ) -> None:
        self._given = (observer, anchor, reference, gravity, tides, rate_offset)
        self.observer = observer
        self.anchor: Pair = (np.asarray(anchor[0], dtype=np.int64), np.asarray(anchor[1], dtype=np.float64))
        self.reference = reference
        self.model = model_of(observer, checked_gravity(gravity), checked_tides(tides))
        self.rate_offset = rate_offset
        # Exact: of 1e-3 in a year a float would lose 4 ps.
        self._fast = Factor.of(Fraction(rate_offset))
        self._slow = Factor.of(1 / (1 + Fraction(rate_offset)) - 1)
        self._reach = reach(
            observer,
            self.anchor,
            reference,
            needs_orientation=self.model.needs_orientation,
            needs_ephemeris=self.model.needs_ephemeris,
        )
        self._lock = threading.Lock()
        # Sums of blocks (high and low part) by the block that starts or ends there; blocks themselves can be made
        # again.
        zero = np.zeros(len(self.model.names) + 1)
        self._sums: dict[int, tuple[FloatArray, FloatArray]] = {0: (zero, zero)}
        self._blocks: OrderedDict[int, Integral] = OrderedDict()
        if not (self._reach.first_s <= _SLACK_S and self._reach.last_s >= -_SLACK_S):
            self._require_inside(self.anchor)

    def __reduce__(self) -> tuple[Any, ...]:
        # What was summed is made again; it comes out the same.
        return _rebuilt, self._given

    # ---- what is asked ---------------------------------------------------------------------------

    def free_s(self, tt: Pair) -> FloatArray:
        """Elapsed proper time less elapsed TT since the coincidence, s, at TT counts of any shape."""
        high, low = self._evaluate(tt, slice(len(self.model.names), None))
        return np.asarray(high[0] + low[0])

    def set_part(self, tt: Pair) -> Pair:
        """What the set rate has added to the reading since the coincidence, to 0.1 fs."""
        proper = exact.add_seconds(exact.subtract(broadcast_pair(tt), self.anchor), self.free_s(tt))
        return exact.multiply(proper, self._fast)

    def gained_s(self, tt: Pair) -> FloatArray:
        """Elapsed reading less elapsed TT since the coincidence as one float, s, at TT counts of any shape."""
        gained_s = self.free_s(tt)
        return gained_s if not self.rate_offset else np.asarray(gained_s + exact.seconds(self.set_part(tt)))

    def reading(self, tt: Pair, set_to: Pair) -> Pair:
        """What the clock shows, where it showed `set_to` more than TT at the coincidence."""
        shown = exact.add(exact.add_seconds(tt, self.free_s(tt)), set_to)
        return shown if not self.rate_offset else exact.add(shown, self.set_part(tt))

    def terms_s(self, tt: Pair) -> dict[str, FloatArray]:
        """Elapsed reading less elapsed TCG since the coincidence in parts, s; at TT counts of any shape."""
        high, low = self._evaluate(tt, slice(0, len(self.model.names)))
        parts = np.asarray((high + low) * _TCG_PER_TT)
        found = dict(zip(self.model.names, parts, strict=True))
        if self.rate_offset:
            found[SET_RATE] = exact.seconds(self.set_part(tt))
        return found

    def rate(self, tt: Pair) -> FloatArray:
        """d(reading)/d(TT) - 1."""
        per_tt = _against_tt(total_of(self.model.terms(tt, self.reference)))
        return np.asarray(per_tt + self.rate_offset + per_tt * self.rate_offset)

    def tt_of_elapsed(self, elapsed: Pair) -> Pair:
        """TT count at which the clock has gone on by `elapsed` since the coincidence; undoes `reading` to 0.3 fs.

        The set rate is taken out first. Each round leaves of the error before it as much as the rate is, 1e-8 at most.

        Raises
        ------
        OutOfSpan
            Where the clock's rate is not known, with the mask.
        """
        proper = exact.affine(elapsed, _ORIGIN, self._slow) if self.rate_offset else elapsed
        first = exact.add(self.anchor, proper)
        tt = self._clipped(first)
        for _ in range(_MOST_ROUNDS):
            found = exact.add_seconds(first, -self.free_s(tt))
            nearer = self._clipped(found)
            step_s = np.max(np.abs(exact.seconds(exact.subtract(nearer, tt))), initial=0.0)
            tt = nearer
            if step_s < _ENOUGH_S:
                self._require_inside(found)
                return found
        raise NotConverged(f"readings of the clock at {self.observer.name} still move by {step_s:.3g} s of TT")

    # ---- blocks ----------------------------------------------------------------------------------

    def _evaluate(self, tt: Pair, rows: slice) -> tuple[FloatArray, FloatArray]:
        """Integrals from the coincidence to TT counts, (rows, *shape), in two parts to be added."""
        tt = broadcast_pair(tt)
        self._require_inside(tt)
        elapsed = exact.subtract(tt, self.anchor)
        shape = elapsed[0].shape
        number = (elapsed[0] // _BLOCK_S).reshape(-1)
        # A date at an end may fall on the edge of a block of which nothing, or a sliver of roundings, is inside.
        if np.isfinite(self._reach.last_s):
            number = np.minimum(number, math.ceil((self._reach.last_s - _SLIVER_S) / _BLOCK_S) - 1)
        if np.isfinite(self._reach.first_s):
            number = np.maximum(number, math.floor((self._reach.first_s + _SLIVER_S) / _BLOCK_S))
        local_s = (elapsed[0].reshape(-1) - number * _BLOCK_S).astype(np.float64) + elapsed[1].reshape(-1)
        count = len(range(*rows.indices(len(self.model.names) + 1)))
        high, low = np.empty((count, number.size)), np.empty((count, number.size))
        for block in _outward(number):
            index = np.flatnonzero(number == block)
            integral, (sum_high, sum_low) = self._block(block)
            origin_s = max(self._reach.first_s - block * _BLOCK_S, 0.0)
            value = integral.value(local_s[index] - origin_s, rows)
            high[:, index] = sum_high[rows, None]
            low[:, index] = sum_low[rows, None] + value
        return high.reshape(count, *shape), low.reshape(count, *shape)

    def _block(self, number: int) -> tuple[Integral, tuple[FloatArray, FloatArray]]:
        """A block and what the integrals are at its start."""
        with self._lock:
            for before in range(number):  # the sum at the start of block n is that of blocks 0 to n - 1
                if before + 1 not in self._sums:
                    self._sums[before + 1] = _sum(self._sums[before], self._made(before).totals_s)
            for after in range(-1, number - 1, -1):
                if after not in self._sums:
                    self._sums[after] = _sum(self._sums[after + 1], -self._made(after).totals_s)
            return self._made(number), self._sums[number]

    def _made(self, number: int) -> Integral:
        if number in self._blocks:
            self._blocks.move_to_end(number)
            return self._blocks[number]
        found = self._integrated(number)
        self._blocks[number] = found
        if len(self._blocks) > _BLOCKS_KEPT:
            self._blocks.popitem(last=False)
        return found

    def _integrated(self, number: int) -> Integral:
        """Integrate one block, cut at its seams and at the ends of what is known."""
        start = exact.add(self.anchor, exact.normalise(number * _BLOCK_S, 0.0))
        begin_s = max(self._reach.first_s - number * _BLOCK_S, 0.0)
        end_s = min(self._reach.last_s - number * _BLOCK_S, float(_BLOCK_S))
        seams_s = self._reach.seams_s - number * _BLOCK_S
        edges = np.concatenate((np.arange(0.0, _BLOCK_S, _FIRST_PANEL_S), seams_s, [begin_s, end_s]))
        edges = np.unique(edges[(edges >= begin_s) & (edges <= end_s)])
        # Slivers that come of the same seam dated twice, 1 us apart at most, are not worth a panel.
        edges = np.concatenate(([begin_s], edges[1:-1][np.diff(edges[:-1]) > 1e-5], [end_s]))

        def rates(offset_s: FloatArray) -> FloatArray:
            tt = exact.add_seconds(start, offset_s + begin_s)
            terms = self.model.terms(tt, self.reference)
            return np.stack((*terms.values(), _against_tt(total_of(terms))))

        # Earth orientation that is held costs 1e-19 at a node of a quadrature; notes tell of the dates that were given.
        with unsaid_extrapolations():
            return integrate(rates, edges - begin_s, self.observer.name)

    # ---- ends ------------------------------------------------------------------------------------

    def _clipped(self, tt: Pair) -> Pair:
        since_s = exact.seconds(exact.subtract(tt, self.anchor))
        for end_s, past in ((self._reach.first_s, since_s < self._reach.first_s), (self._reach.last_s, None)):
            outside = since_s > end_s if past is None else past
            if np.any(outside):
                limit = exact.add_seconds(self.anchor, end_s)
                tt = (np.where(outside, limit[0], tt[0]), np.where(outside, limit[1], tt[1]))
        return tt

    def _require_inside(self, tt: Pair) -> None:
        since_s = exact.seconds(exact.subtract(tt, self.anchor))
        bad = np.asarray((since_s < self._reach.first_s - _SLACK_S) | (since_s > self._reach.last_s + _SLACK_S))
        if np.any(bad):
            ends = [float(exact.seconds(exact.add_seconds(self.anchor, x))) for x in self._reach[:2] if np.isfinite(x)]
            words = " to ".join(date_text(end) for end in ends)
            raise OutOfSpan(
                f"{int(np.count_nonzero(bad))} of {bad.size} dates of the clock at {self.observer.name} lie where its "
                f"trajectory, the Earth orientation or the ephemeris does not reach ({words} TT, without a gap from "
                "the coincidence on): leave them out (see the mask), or give what reaches them",
                mask=bad,
            )


def _rebuilt(
    observer: Observer,
    anchor: Pair,
    reference: ReferenceData,
    gravity: GravityField | None,
    tides: Tides,
    rate_offset: float,
) -> ProperIntegral:
    return ProperIntegral(observer, anchor, reference, gravity=gravity, tides=tides, rate_offset=rate_offset)


def _against_tt(y: FloatArray) -> FloatArray:
    """d(tau)/d(TT) - 1 from d(tau)/d(TCG) - 1."""
    return np.asarray(_TCG_GAIN + y * _TCG_PER_TT)


def _outward(number: IntArray) -> list[int]:
    return sorted(set(number.tolist()), key=abs)


def _sum(sums: tuple[FloatArray, FloatArray], more: FloatArray) -> tuple[FloatArray, FloatArray]:
    high, error = exact.two_sum(sums[0], more)
    return np.asarray(high), np.asarray(sums[1] + error)
