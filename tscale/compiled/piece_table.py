"""PieceTable: polynomial pieces of `out - in` over a span of counts, and their evaluation at the speed of memory.

On each piece, with x the seconds from an integral count c near its middle,

    out = in + S + P(x),    x = (whole - c) + fraction,    P(x) = p0 + x (p1 + x (p2 + ...)),

S whole seconds. What is added to the fraction is a second or less, so that the sum rounds by an ulp of 1 (0.1 fs) also
where `out - in` is 500 s; whole seconds are carried as integers. All ways of evaluation below do the same
operations in the same order: they agree to the last bit, whatever the order and the number of the instants.
"""

from __future__ import annotations

from bisect import bisect_right
from typing import Any, Final

import numpy as np

from ..errors import InvalidInput
from ..exact import BoolArray, FloatArray, IntArray, Pair

__all__ = ["BLOCK", "OutsidePieces", "PieceTable", "Scratch"]

BLOCK: Final = 16384
"""Instants handled at a time, so that all that is known of them stays in the processor's cache."""

_FEW: Final = 1200
"""Neighbours in one piece below which it is quicker to look up the coefficients of each instant."""

# Integral floats below 2**51 in size and int64 turn into each other by adding 1.5 * 2**52 and reading the same bits as
# the other kind: an addition, where a cast is several times as slow.
_SHIFT: Final = 1.5 * 2.0**52
_SHIFT_BITS: Final = int(np.array(_SHIFT).view(np.int64))

_MOST_CELLS: Final = 2**22


class OutsidePieces(Exception):
    """Some of the instants lie in no piece: `PieceTable.inside` tells which."""


class Scratch:
    """Buffers of one thread."""

    __slots__ = ("i", "p", "q", "x")

    def __init__(self, size: int) -> None:
        self.x, self.p, self.q = np.empty(size), np.empty(size), np.empty(size)
        self.i = np.empty(size, dtype=np.int64)


class PieceTable:
    """Pieces in increasing order, without overlap. Immutable, and safe between threads.

    Parameters
    ----------
    start_whole, start_fraction : (n,) arrays
        Where each piece starts; it ends where the next one starts. The first and the last mark what is outside the
        span, and others may mark holes in it: their coefficients are NaN.
    center : (n,) int array
        Count from which x is measured.
    shift_s : (n,) int array
        S, whole seconds.
    powers : (degree + 1, n) float array
        p0, p1 ..., s by powers of s.
    origin, cell_s : int
        Where cells start by which pieces are looked up, not after the first piece, and how long they are.
    """

    def __init__(
        self,
        start_whole: IntArray,
        start_fraction: FloatArray,
        center: IntArray,
        shift_s: IntArray,
        powers: FloatArray,
        origin: int,
        cell_s: int,
    ) -> None:
        self.start_whole, self.start_fraction = start_whole, start_fraction
        self.center, self.shift_s, self.powers = center, shift_s, powers
        self.origin, self.cell_s = origin, cell_s
        cells = (int(start_whole[-1]) - origin) // cell_s + 1
        step_s = cell_s * -(-cells // _MOST_CELLS)
        cells = (int(start_whole[-1]) - origin) // step_s + 1
        edges = origin + step_s * np.arange(cells + 1, dtype=np.int64)
        first = _last_not_after((start_whole, start_fraction), edges[:-1], np.zeros(cells))
        # Cells in which a piece starts, other than at their edge.
        mixed = np.searchsorted(start_whole, edges[1:], side="left") - 1 > first
        self._step_s, self._end = step_s, int(edges[-1])
        self._first, self._mixed = np.ascontiguousarray(first, dtype=np.intp), mixed
        # Between these counts pieces and cells are one and the same, if nothing breaks but at edges of cells.
        inner = slice(1, cells - 1)
        self._offset = int(first[1] - 1) if cells > 1 else 0
        steady = np.array_equal(first[inner], np.arange(1, cells - 1) + self._offset) and not mixed[inner].any()
        self._regular = (origin + step_s, int(edges[-2])) if steady else (0, 0)
        self._minus_center = _SHIFT_BITS - center
        self._shift_less_bits = shift_s - _SHIFT_BITS
        for value in vars(self).values():
            if isinstance(value, np.ndarray):
                value.flags.writeable = False

    def __reduce__(self) -> tuple[Any, ...]:
        parts = (self.start_whole, self.start_fraction, self.center, self.shift_s, self.powers)
        return PieceTable, (*parts, self.origin, self.cell_s)

    def __len__(self) -> int:
        return int(np.count_nonzero(np.isfinite(self.powers[0])))

    @property
    def degree(self) -> int:
        """Degree of the polynomials."""
        return len(self.powers) - 1

    # ---- look up ---------------------------------------------------------------------------------

    def pieces_of(self, whole: IntArray, fraction: FloatArray) -> IntArray:
        """Number of the piece of each 1-d count; far outside, of the first or last."""
        far = (whole < self.origin) | (whole >= self._end)
        if not far.any():
            return self._near_pieces_of(whole, fraction)
        piece = np.zeros(whole.shape, dtype=np.int64)
        piece[whole >= self._end] = len(self.start_whole) - 1
        near = ~far
        piece[near] = self._near_pieces_of(whole[near], fraction[near])
        return piece

    def _near_pieces_of(self, whole: IntArray, fraction: FloatArray) -> IntArray:
        cell = np.subtract(whole, self.origin)
        np.floor_divide(cell, self._step_s, out=cell)
        piece: IntArray = self._first.take(cell)
        at = np.flatnonzero(self._mixed.take(cell))
        if at.size:
            found = _last_not_after((self.start_whole, self.start_fraction), whole[at], fraction[at])
            piece[at] = np.maximum(found, 0)
        return piece

    def inside(self, whole: IntArray, fraction: FloatArray) -> BoolArray:
        """Whether each 1-d count lies in a piece."""
        return np.asarray(np.isfinite(self.powers[0].take(self.pieces_of(whole, fraction))))

    # ---- many ------------------------------------------------------------------------------------

    def map(self, whole: IntArray, fraction: FloatArray, out: Pair, scratch: Scratch) -> None:
        """Evaluate 1-d counts into `out`, which may be the input itself; as many at a time as `scratch` is long.

        Raises
        ------
        OutsidePieces
            With `out` written in part.
        InvalidInput
            For fractions outside [0, 1).
        """
        block = len(scratch.x)
        for i in range(0, len(whole), block or 1):
            part = slice(i, i + block)
            self._map_block(whole[part], fraction[part], out[0][part], out[1][part], scratch)

    def _map_block(self, w: IntArray, f: FloatArray, ow: IntArray, of: FloatArray, scratch: Scratch) -> None:
        if not (f.min() >= 0.0 and f.max() < 1.0):
            raise InvalidInput(
                "fractions must lie in [0, 1): normalise the pairs first, as Instants do",
                mask=~((f >= 0.0) & (f < 1.0)),
            )
        low, high = int(w.min()), int(w.max())
        if low < self.origin or high >= self._end:
            raise OutsidePieces
        cuts = self._cuts(w, f, low, high)
        if cuts is None:
            self._each(w, f, ow, of, scratch, low, high)
        else:
            for piece, i, j in cuts:
                self._run(piece, w[i:j], f[i:j], ow[i:j], of[i:j], scratch)
        top = of.max()
        if not top < 1.0:
            if np.isnan(top):
                raise OutsidePieces
            # A sum below zero by less than half an ulp of 1 leaves a fraction that rounds to 1.
            full = of >= 1.0
            ow[full] += 1
            of[full] = 0.0

    def _cuts(self, w: IntArray, f: FloatArray, low: int, high: int) -> list[tuple[int, int, int]] | None:
        """Runs (piece, from, to) of neighbours in one piece, where there are few; None elsewhere."""
        ends = self.pieces_of(np.array([low, high]), np.array([0.0, np.nextafter(1.0, 0.0)]))
        a, b = int(ends[0]), int(ends[1])
        if a == b:
            return [(a, 0, len(w))]
        if (b - a) * _FEW > len(w) or not (w[1:] >= w[:-1]).all():
            return None
        cuts, i = [], 0
        for piece in range(a + 1, b + 1):
            start, least = self.start_whole[piece], self.start_fraction[piece]
            j = int(np.searchsorted(w, start, side="left"))
            if least > 0.0:
                # Those in the second in which the piece starts are told apart by their fractions, if these are sorted.
                same = f[j : int(np.searchsorted(w, start, side="right"))]
                if (same[1:] < same[:-1]).any():
                    return None
                j += int(np.searchsorted(same, least, side="left"))
            if j > i:
                cuts.append((piece - 1, i, j))
            i = j
        if i < len(w):
            cuts.append((b, i, len(w)))
        return cuts

    def _run(self, piece: int, w: IntArray, f: FloatArray, ow: IntArray, of: FloatArray, scratch: Scratch) -> None:
        """Instants of one piece."""
        n = len(w)
        x, p, i = scratch.x[:n], scratch.p[:n], scratch.i[:n]
        np.add(w, self._minus_center[piece], out=i)
        np.subtract(i.view(np.float64), _SHIFT, out=x)
        np.add(x, f, out=x)
        powers = self.powers[:, piece].tolist()
        if len(powers) == 1:
            p[...] = powers[0]
        else:
            np.multiply(x, powers[-1], out=p)
            for power in powers[-2:0:-1]:
                np.add(p, power, out=p)
                np.multiply(p, x, out=p)
            np.add(p, powers[0], out=p)
        _carry(w, f, p, self._shift_less_bits[piece], ow, of, x)

    def _each(
        self, w: IntArray, f: FloatArray, ow: IntArray, of: FloatArray, scratch: Scratch, low: int, high: int
    ) -> None:
        """Instants in any order: the coefficients of each are looked up."""
        n = len(w)
        x, p, q, i = scratch.x[:n], scratch.p[:n], scratch.q[:n], scratch.i[:n]
        if self._regular[0] <= low and high < self._regular[1]:
            np.subtract(w, self.origin - self._offset * self._step_s, out=i)
            piece = np.floor_divide(i, self._step_s)
        else:
            piece = self._near_pieces_of(w, f)
        np.take(self._minus_center, piece, out=i, mode="clip")
        np.add(w, i, out=i)
        np.subtract(i.view(np.float64), _SHIFT, out=x)
        np.add(x, f, out=x)
        powers = self.powers
        np.take(powers[-1], piece, out=p, mode="clip")
        for power in powers[-2::-1]:
            np.multiply(p, x, out=p)
            np.take(power, piece, out=q, mode="clip")
            np.add(p, q, out=p)
        np.take(self._shift_less_bits, piece, out=i, mode="clip")
        _carry(w, f, p, i, ow, of, x)

    # ---- one -------------------------------------------------------------------------------------

    def one(self, whole: int, fraction: float) -> tuple[int, float]:
        """A single count: the same to the last bit, without the cost of arrays."""
        cell = (whole - self.origin) // self._step_s
        if not 0 <= cell < len(self._first):
            raise OutsidePieces
        piece = int(self._first[cell])
        if self._mixed[cell]:
            # The last that starts not after it: by whole seconds, then back over those that start later in its second.
            piece = bisect_right(self.start_whole, whole, piece) - 1
            while piece > 0 and self.start_whole[piece] == whole and self.start_fraction[piece] > fraction:
                piece -= 1
        x = float(whole - int(self.center[piece])) + fraction
        powers = self.powers[:, piece].tolist()
        value = powers.pop()
        while powers:
            value = value * x + powers.pop()
        total = fraction + value
        if total != total:
            raise OutsidePieces
        carry = total // 1.0
        rest = total - carry
        whole += int(self.shift_s[piece]) + int(carry)
        return (whole, rest) if rest < 1.0 else (whole + 1, 0.0)

    # ---- rate ------------------------------------------------------------------------------------

    def slope(self, whole: IntArray, fraction: FloatArray) -> FloatArray:
        """d(out)/d(in) - 1 at 1-d counts: the derivatives of the polynomials; NaN outside."""
        out = np.empty(len(whole))
        for i in range(0, len(whole), BLOCK):
            part = slice(i, i + BLOCK)
            piece = self.pieces_of(whole[part], fraction[part])
            x = (whole[part] - self.center.take(piece)) + fraction[part]
            total = np.where(np.isfinite(self.powers[0].take(piece)), 0.0, np.nan)
            for k in range(self.degree, 0, -1):
                total = total * x + k * self.powers[k].take(piece)
            out[part] = total
        return out


def _last_not_after(starts: Pair, whole: IntArray, fraction: FloatArray) -> IntArray:
    """Index of the last start that is not after each count, compared exactly; -1 before the first."""
    index = np.asarray(np.searchsorted(starts[0], whole, side="right") - 1)
    while True:
        near = np.maximum(index, 0)
        late = (index >= 0) & (starts[0][near] == whole) & (starts[1][near] > fraction)
        if not late.any():
            return index
        index = index - late


def _carry(w: IntArray, f: FloatArray, p: FloatArray, shift: Any, ow: IntArray, of: FloatArray, x: FloatArray) -> None:
    """W + shift and f + p with the whole seconds of the latter carried over; `shift` is less _SHIFT_BITS."""
    np.add(f, p, out=p)
    np.floor(p, out=x)
    np.subtract(p, x, out=of)
    np.add(x, _SHIFT, out=x)
    np.add(w, x.view(np.int64), out=ow)
    np.add(ow, shift, out=ow)
