"""Chebyshev polynomials of a chain over intervals as long as they may be, by least squares over many dates.

The chain itself rounds, by femtoseconds where the signal goes 1 au. Long intervals with many more dates than
coefficients average that away, and what is fitted is nearer to the chain's meaning than the chain's own values. From
these fits the shorter pieces that are kept are derived without another call of the chain.
"""

from __future__ import annotations

from bisect import bisect_left, bisect_right
from dataclasses import dataclass
from itertools import pairwise
from typing import Any, Final, NamedTuple

import numpy as np

from ..errors import NotConverged, OutOfSpan
from ..exact import BoolArray, FloatArray, IntArray, Pair, two_product, two_sum
from .breaks import Section, unexpected_jump
from .direct import Direct
from .hints import Count

__all__ = ["SIZES_S", "Fits", "Fitter", "grid_cuts"]

SIZES_S: Final = (172800, 43200, 21600, 10800, 5400, 2700, 1350, 450, 150, 75, 25, 5, 1)
"""Lengths of intervals and pieces, s: each divides the one before, and from 43200 a day, so that 0h UTC is an edge."""

_DEGREE: Final = 14
_LOW_DEGREE: Final = 6
_SHORT: Final = 1.0 / 16.0
_BEYOND: Final = 6
"""Coefficients past the degree that are looked at: they tell how much is cut off."""

_NODES: Final = 40
_NODES_NOISY: Final = 320
_SLOPES: Final = 2.0**40
_STEEP: Final = 2.0**-8
_AT_ONCE: Final = 200_000
_SLIVER: Final = 1.0 / 16.0
_NEAR: Final = 1.0 / 256.0
_NEAREST_S: Final = 2.0**-34


class Fits(NamedTuple):
    """Intervals [first, last] in increasing order, and the polynomials on them.

    Attributes
    ----------
    first_whole, first_fraction, last_whole, last_fraction : (n,) arrays
    size : (n,) int array
        Index in `SIZES_S` of the size of grid cell that the interval lies in.
    shift_s : (n,) int array
        Whole seconds taken out.
    slope : (n,) array
        Mean rate, taken out so that what is left is small: a multiple of 2**-40, so that its product with whole
        seconds of an interval is exact.
    chebyshev : (15, n) array
        Coefficients of `out - in - shift_s - slope * (t - middle)`, s, in u from -1 to 1 over the interval.
    """

    first_whole: IntArray
    first_fraction: FloatArray
    last_whole: IntArray
    last_fraction: FloatArray
    size: IntArray
    shift_s: IntArray
    slope: FloatArray
    chebyshev: FloatArray

    @property
    def start_s(self) -> FloatArray:
        """First count less `first_whole`."""
        return self.first_fraction

    @property
    def stop_s(self) -> FloatArray:
        """Last count less `first_whole`."""
        return np.asarray((self.last_whole - self.first_whole) + self.last_fraction)

    @property
    def middle(self) -> IntArray:
        """Whole count in the middle."""
        return self.first_whole + np.floor(0.5 * (self.start_s + self.stop_s)).astype(np.int64)

    def take(self, index: Any) -> Fits:
        """Some of them."""
        return Fits._make([*(part[index] for part in self[:-1]), self.chebyshev[:, index]])


@dataclass(frozen=True)
class Fitter:
    """How to fit: a chain, where it may bend, where grids start, and how good is good enough."""

    direct: Direct
    bends: tuple[Count, ...]
    """Where polynomials meet without a jump, in order: cut at only where a fit across them is not good."""
    origin: int
    tolerance_s: float
    noise_s: float

    def fit(self, sections: list[Section]) -> Fits:
        """Fit every section, on the longest intervals on which the polynomials reach the tolerance.

        Raises
        ------
        NotConverged, OutOfSpan
            Where no interval is short enough, or the chain refuses a date; with the date.
        """
        return self._fitted(grid_cuts(sections, self.origin, 0))

    def again(self, fits: Fits, bad: BoolArray) -> Fits:
        """Fit those marked `bad` again, on shorter intervals; errors as `fit`.

        They are cut at every bend: what a fit has passed over may go on between any two of them.
        """
        return _sorted([fits.take(~bad), self._fitted(self._shorter(fits, np.flatnonzero(bad), 0.0))])

    def _fitted(self, todo: Fits) -> Fits:
        done: list[Fits] = []
        while len(todo.size):
            fits, good = _fit(self.direct, todo, self.tolerance_s, self.noise_s)
            done.append(fits.take(good))
            todo = self._shorter(fits, np.flatnonzero(~good))
        return _sorted(done)

    def _bends_between(self, first: Count, last: Count, near: float) -> list[Count]:
        # One that is very near an end bends what is fitted by little; shorter intervals will be cut there.
        least = max(((last[0] - first[0]) + (last[1] - first[1])) * near, _NEAREST_S)
        inner = self.bends[bisect_right(self.bends, first) : bisect_left(self.bends, last)]
        return [
            bend
            for bend in inner
            if (bend[0] - first[0]) + (bend[1] - first[1]) > least and (last[0] - bend[0]) + (last[1] - bend[1]) > least
        ]

    def _shorter(self, fits: Fits, bad: IntArray, near: float = _NEAR) -> Fits:
        """The intervals `bad` cut where the chain may bend, or else by the next size of grid that cuts them."""
        parts: list[Fits] = [fits.take(bad[:0])]
        for k in bad.tolist():
            first = (int(fits.first_whole[k]), float(fits.first_fraction[k]))
            last = (int(fits.last_whole[k]), float(fits.last_fraction[k]))
            size = int(fits.size[k])
            inner = self._bends_between(first, last, near)
            if inner:
                ends = (first, *inner, last)
                parts.append(grid_cuts([Section(*pair) for pair in pairwise(ends)], self.origin, size))
                continue
            cuts = (grid_cuts([Section(first, last)], self.origin, finer) for finer in range(size + 1, len(SIZES_S)))
            cut = next((cut for cut in cuts if len(cut.size) > 1), None)
            if cut is None:
                jump = unexpected_jump(self.direct, first, last, max(self.tolerance_s, 12.0 * self.noise_s))
                if jump is None or not first < jump[0] < jump[1] < last:
                    raise NotConverged(
                        f"{self.direct.start} -> {self.direct.end} cannot be approximated to {self.tolerance_s:.3g} s "
                        f"near {first[0]} + {first[1]:.9f} s of {self.direct.start.scale} (since 2000-01-01T12:00:00): "
                        "it bends within a second; ask for a larger tolerance_s, or compile spans on either side"
                    )
                around = [Section(first, jump[0]), Section(jump[1], last)]
                cut = grid_cuts(around, self.origin, len(SIZES_S) - 1)
            parts.append(cut)
        return _sorted(parts)


def grid_cuts(sections: list[Section], origin: int, size: int) -> Fits:
    """Sections cut at the edges of a grid; nothing is fitted yet."""
    rows: list[tuple[int, float, int, float, int]] = []
    step = SIZES_S[size]
    for (aw, af), (bw, bf) in sections:
        # No slivers: an edge close to an end is left out, and its neighbour is longer by so much.
        edges = range(aw - (aw - origin) % step, bw + 1, step)
        near = step * _SLIVER
        inner = ((edge, 0.0) for edge in edges if edge - aw - af > near and bw + bf - edge > near)
        rows.extend((*a, *b, size) for a, b in pairwise([(aw, af), *inner, (bw, bf)]))
    whole, fraction, to_whole, to_fraction, sizes = zip(*rows, strict=True)
    count = len(rows)
    return Fits(
        np.array(whole, dtype=np.int64),
        np.array(fraction),
        np.array(to_whole, dtype=np.int64),
        np.array(to_fraction),
        np.array(sizes, dtype=np.int64),
        np.zeros(count, dtype=np.int64),
        np.zeros(count),
        np.zeros((_DEGREE + 1, count)),
    )


def _sorted(parts: list[Fits]) -> Fits:
    whole, fraction = (np.concatenate([part[k] for part in parts]) for k in (0, 1))
    order = np.lexsort((fraction, whole))
    rows = [np.concatenate([part[k] for part in parts])[order] for k in range(7)]
    return Fits._make([*rows, np.concatenate([part.chebyshev for part in parts], axis=1)[:, order]])


def _fit(direct: Direct, todo: Fits, tolerance_s: float, noise_s: float) -> tuple[Fits, Any]:
    """One polynomial for each interval, and which of them are good."""
    length = todo.stop_s - todo.start_s
    shift = np.zeros(len(length), dtype=np.int64)
    slope = np.zeros(len(length))
    chebyshev = np.zeros((_DEGREE + 1, len(length)))
    # What breaks leave of a cell is likely to be all the smoother for its length.
    degree = np.where(length < _SHORT * np.asarray(SIZES_S)[todo.size], _LOW_DEGREE, _DEGREE)
    good = np.ones(len(length), dtype=np.bool_)
    # Where rounding is to be averaged away, few dates tell first which intervals are worth many.
    for nodes in (_NODES, _NODES_NOISY) if noise_s > tolerance_s / 64.0 else (_NODES,):
        for own in (_LOW_DEGREE, _DEGREE):
            index = np.flatnonzero(good & (degree == own))
            used = nodes * (own + 1) // (_DEGREE + 1)
            for part in np.array_split(index, -(-index.size * used // _AT_ONCE)) if index.size else []:
                shift[part], slope[part], found = _coefficients(direct, todo.take(part), used)
                chebyshev[:, part] = 0.0
                chebyshev[: own + 1, part] = found[: own + 1]
                beyond = np.sqrt(np.sum(found[own + 1 : own + 1 + _BEYOND] ** 2, axis=0))
                # Coefficients of pure rounding are of size noise * sqrt(2 / nodes).
                allowed = tolerance_s / 16.0 + 2.0 * noise_s * np.sqrt(2.0 * _BEYOND / used)
                good[part] = beyond <= allowed + 4e-16 * np.abs(found).sum(axis=0)
    return Fits._make([*todo[:5], shift, slope, chebyshev]), good


def _coefficients(direct: Direct, todo: Fits, nodes: int) -> tuple[IntArray, FloatArray, FloatArray]:
    """Discrete Chebyshev coefficients of the chain at the roots of T_nodes; their truncation is a least-squares fit."""
    angle = np.pi * (np.arange(nodes) + 0.5) / nodes
    u = np.cos(angle)
    at = _counts_at(todo, u)
    delta = direct.delta((at[0].reshape(-1), at[1].reshape(-1)))
    if not delta.valid.all():
        where = int(np.flatnonzero(~delta.valid)[0])
        raise OutOfSpan(
            f"{direct.start} -> {direct.end} has no answer at {int(at[0].reshape(-1)[where])} + "
            f"{at[1].reshape(-1)[where]:.9f} s of {direct.start.scale} (since 2000-01-01T12:00:00): compile spans on "
            "either side of it"
        )
    shape = at[0].shape
    shift = delta.whole.reshape(shape)[:, nodes // 2].copy()
    whole = (delta.whole.reshape(shape) - shift[:, None]).astype(np.float64)
    fraction = delta.fraction.reshape(shape)
    x = (at[0] - todo.middle[:, None]) + at[1]
    rise = ((whole[:, 0] - whole[:, -1]) + (fraction[:, 0] - fraction[:, -1])) / (x[:, 0] - x[:, -1])
    slope = np.where(np.abs(rise) < _STEEP, np.round(rise * _SLOPES) / _SLOPES, 0.0)
    # (whole - slope x) + fraction, where the first two are large and nearly the same.
    product, product_error = two_product(slope[:, None], x)
    rest, rest_error = two_sum(whole, -product)
    y = (rest + fraction) + (rest_error - product_error)
    # The middle of each is taken out before the sums, so that they round less.
    middle = y[:, nodes // 2]
    degrees = np.arange(min(nodes, _DEGREE + 1 + _BEYOND))
    weights = np.cos(np.outer(angle, degrees)) * (2.0 / nodes)
    weights[:, 0] *= 0.5
    found = ((y - middle[:, None]) @ weights).T
    found[0] += middle
    return shift, slope, np.asarray(found)


def _counts_at(fits: Fits, u: FloatArray) -> Pair:
    """Counts at u in [-1, 1] of each interval, (n, len(u))."""
    middle, half = 0.5 * (fits.start_s + fits.stop_s), 0.5 * (fits.stop_s - fits.start_s)
    x = middle[:, None] + half[:, None] * u
    whole = np.floor(x)
    return fits.first_whole[:, None] + whole.astype(np.int64), x - whole
