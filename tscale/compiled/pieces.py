"""From long fits to the short pieces of low degree that are evaluated and kept."""

from __future__ import annotations

from typing import Any, Final

import numpy as np

from ..exact import FloatArray, IntArray
from .breaks import Section
from .direct import moved
from .fits import SIZES_S, Fits, grid_cuts
from .piece_table import PieceTable

__all__ = ["pieces_of_fits"]

_DEGREE: Final = 6
_NODES: Final = 14
_SLACK_S: Final = 1e-12
"""How far outside the span an instant may lie: what its roundings on the way through other scales come to."""

_TOUCH_S: Final = 1e-15
_ROUNDING: Final = 2.2e-16
_FINER: Final = 1.0 / 64.0
_FAR: Final = 16.0


def pieces_of_fits(fits: Fits, origin: int, tolerance_s: float) -> tuple[PieceTable, IntArray]:
    """Cut fits into pieces, as long as a polynomial of degree 6 allows on each fit.

    Returns
    -------
    table : PieceTable
    fit : (n,) int array
        Number of the fit that each piece of the table comes from; -1 for a hole.
    """
    parents: list[IntArray] = []
    cuts: list[Fits] = []
    local: list[FloatArray] = []
    left = np.arange(len(fits.size))
    for size in range(len(SIZES_S)):
        now = left[fits.size[left] <= size]
        if not now.size:
            continue
        cut, parent = _cut(fits, now, origin, size)
        found = _local(fits, cut, parent)
        beyond = np.abs(found[_DEGREE + 1 :]).sum(axis=0)
        bad = beyond > tolerance_s / 8.0 + 4e-16 * np.abs(found).sum(axis=0)
        again = np.unique(parent[bad]) if size < len(SIZES_S) - 1 else now[:0]
        keep = ~np.isin(parent, again)
        parents.append(parent[keep])
        cuts.append(cut.take(keep))
        local.append(found[:, keep])
        left = np.concatenate([left[fits.size[left] > size], again])
    parent = np.concatenate(parents)
    rows = [np.concatenate([cut[k] for cut in cuts]) for k in range(5)]
    order = np.lexsort((rows[1], rows[0]))
    parent, none = parent[order], np.zeros((1, len(order)))
    pieces = Fits._make([*(row[order] for row in rows), fits.shift_s[parent], fits.slope[parent], none])
    return _table(pieces, parent, fits.middle[parent], np.concatenate(local, axis=1)[:, order], origin, tolerance_s)


def _cut(fits: Fits, which: IntArray, origin: int, size: int) -> tuple[Fits, IntArray]:
    own = [
        Section((int(aw), float(af)), (int(bw), float(bf)))
        for aw, af, bw, bf in zip(*(part[which].tolist() for part in fits[:4]), strict=True)
    ]
    cut = grid_cuts(own, origin, size)
    # Both are in order, and every fit starts with a piece of its own.
    starts = {section.first for section in own}
    firsts = zip(cut.first_whole.tolist(), cut.first_fraction.tolist(), strict=True)
    number = np.cumsum([first in starts for first in firsts]) - 1
    return cut, which[number]


def _local(fits: Fits, cut: Fits, parent: IntArray) -> FloatArray:
    """Chebyshev coefficients (14, n) of pieces, by interpolation of the fits they are part of."""
    angle = np.pi * (np.arange(_NODES) + 0.5) / _NODES
    offset = (cut.first_whole - fits.first_whole[parent]).astype(np.float64)
    middle = offset + 0.5 * (cut.start_s + cut.stop_s)
    half = 0.5 * (cut.stop_s - cut.start_s)
    of_middle = 0.5 * (fits.start_s + fits.stop_s)[parent]
    of_half = 0.5 * (fits.stop_s - fits.start_s)[parent]
    u = ((middle - of_middle) + half * np.cos(angle)[:, None]) / of_half
    coefficients = fits.chebyshev[:, parent]
    # Clenshaw's recurrence; the constant is left out until the sums are made, so that they round less.
    twice = 2.0 * u
    b1, b2 = np.zeros_like(u), np.zeros_like(u)
    for k in range(len(coefficients) - 1, 0, -1):
        b1, b2 = twice * b1 - b2 + coefficients[k], b1
    y = u * b1 - b2
    weights = np.cos(np.outer(np.arange(_NODES), angle)) * (2.0 / _NODES)
    weights[0] *= 0.5
    found = weights @ y
    found[0] += coefficients[0]
    return np.asarray(found)


def _table(
    pieces: Fits, parent: IntArray, middles: IntArray, local: FloatArray, origin: int, tolerance_s: float
) -> tuple[PieceTable, IntArray]:
    half = 0.5 * (pieces.stop_s - pieces.start_s)
    middle = 0.5 * (pieces.start_s + pieces.stop_s)
    center = np.floor(middle)
    centers = pieces.first_whole + center.astype(np.int64)
    # What the mean rate comes to at the centre is exact, and so is its difference from a whole number.
    risen = pieces.slope * (centers - middles)
    whole_s = np.rint(local[0] + risen)
    powers = _powers(local[: _DEGREE + 1], middle - center, half, tolerance_s / 256.0)
    if len(powers) == 1 and pieces.slope.any():
        powers = np.concatenate([powers, np.zeros_like(powers)])
    powers[0] += risen - whole_s
    if len(powers) > 1:
        powers[1] += pieces.slope
    first = pieces.first_whole.copy(), pieces.first_fraction.copy()
    last = pieces.last_whole, pieces.last_fraction
    first_ = moved((first[0][:1], first[1][:1]), np.array([-_SLACK_S]))
    first[0][0], first[1][0] = first_[0][0], first_[1][0]
    apart = (first[0][1:] - last[0][:-1]) + (first[1][1:] - last[1][:-1])
    holes = np.flatnonzero(apart > _TOUCH_S)
    hole_at = moved((last[0][holes], last[1][holes]), np.full(len(holes), 3e-16))
    end = moved((last[0][-1:], last[1][-1:]), np.array([_SLACK_S]))

    def with_holes(values: Any, hole: Any, before: Any, after: Any) -> Any:
        inner = np.insert(values, holes + 1, hole, axis=-1)
        ends = [np.full((*values.shape[:-1], 1), end, dtype=values.dtype) for end in (before, after)]
        return np.concatenate([ends[0], inner, ends[1]], axis=-1)

    shift = pieces.shift_s + whole_s.astype(np.int64)
    sizes = np.asarray(SIZES_S)[pieces.size]
    fine = np.sort(sizes)
    cell_s = int(fine[int(len(fine) * _FINER)])
    start = int(first[0][0])
    table = PieceTable(
        with_holes(first[0], hole_at[0], -(2**62), end[0][0]),
        with_holes(first[1], hole_at[1], 0.0, end[1][0]),
        with_holes(centers, centers[holes], centers[0], centers[-1]),
        with_holes(shift, 0, 0, 0),
        with_holes(powers, np.nan, np.nan, np.nan),
        start - (start - origin) % cell_s,
        cell_s,
    )
    return table, with_holes(parent, -1, -1, -1)


def _powers(local: FloatArray, off_s: FloatArray, half_s: FloatArray, least_s: float) -> FloatArray:
    """Powers of seconds from the centre, which lies `off_s` before the middle; trailing ones below `least_s` go."""
    to_powers = np.zeros((_DEGREE + 1, _DEGREE + 1))
    for k in range(_DEGREE + 1):
        to_powers[: k + 1, k] = np.polynomial.chebyshev.cheb2poly(np.eye(_DEGREE + 1)[k])[: k + 1]
    # On slivers between two bends what is beyond the rate is the chain's rounding, and moving the origin by thousands
    # of their lengths would raise it beyond all measure: the tail of the series goes while it comes to little.
    tail = np.cumsum(np.abs(local[::-1]), axis=0)[::-1]
    local = np.where((np.abs(off_s) > _FAR * half_s) & (tail <= 64.0 * least_s), 0.0, local)
    of_u = to_powers @ local
    # Moving the origin of a piece of less than a second blows up its higher coefficients until their sums round by more
    # than the tolerance; those that come to nothing on the piece itself go instead.
    blown_up = ((np.abs(off_s) + half_s) / half_s) ** np.arange(_DEGREE + 1)[:, None]
    of_u[(np.abs(of_u) <= 64.0 * least_s) & (np.abs(of_u) * blown_up > least_s / _ROUNDING)] = 0.0
    needed = np.flatnonzero((np.abs(of_u[1:]) > least_s).any(axis=1))
    degree = int(needed[-1]) + 1 if needed.size else 0
    # Horner's rule with u = (x - off) / half, on polynomials in x.
    powers = np.zeros((degree + 1, local.shape[1]))
    powers[0] = of_u[degree]
    for k in range(degree - 1, -1, -1):
        powers /= half_s
        raised = -off_s * powers
        raised[1:] += powers[:-1]
        raised[0] += of_u[k]
        powers = raised
    return powers
