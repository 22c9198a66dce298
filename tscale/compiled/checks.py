"""Checks of pieces against the chain itself, at dates that no fit has seen."""

from __future__ import annotations

from typing import Final

import numpy as np

from .. import exact
from ..exact import FloatArray, IntArray, Pair
from .certificate import Check
from .direct import Direct, moved
from .hints import Count
from .piece_table import PieceTable, Scratch

__all__ = ["check_pieces", "draws_for"]

_SEED: Final = 20310301
_SPREAD_S: Final = 4.0
_PART_OF_PIECE: Final = 0.01
_MOST_DRAWS: Final = 16
_EDGE: Final = 0.985
_PART: Final = 4096
_LEAST_GAP_S: Final = 2.0**-34
"""Bends nearer to each other than this (58 ps) are one."""

_MORE: Final = 16
_SUSPECT: Final = 0.25
"""Part of the tolerance above which more dates are looked at between two bends."""


def draws_for(noise_s: float, tolerance_s: float) -> int | None:
    """Values to average so that rounding takes no more than half the tolerance at four deviations; None: too many."""
    needed = int(np.ceil((8.0 * noise_s / tolerance_s) ** 2))
    return max(1, needed) if needed <= _MOST_DRAWS else None


def check_pieces(
    direct: Direct, table: PieceTable, noise_s: float, tolerance_s: float, bends: list[Count]
) -> tuple[Check, IntArray]:
    """Compare every piece with the chain; returns what was found, and the pieces that miss the tolerance.

    Two dates on each piece: one at random (the seed is fixed), one at alternate ends. And two at random between every
    two neighbours of `bends`, which are all dates in order at which the chain may take up another polynomial: where
    these are denser than the dates of a fit, what goes on between two of them is seen by no fit and by no date
    of a piece. Where an error comes near to the tolerance, sixteen more.
    """
    draws = draws_for(noise_s, tolerance_s)
    assert draws is not None
    look = _Looks(direct, table, draws, tolerance_s)
    pieces = np.flatnonzero(np.isfinite(table.powers[0]))
    start = table.start_whole[pieces], table.start_fraction[pieces]
    length = exact.seconds(exact.subtract((table.start_whole[pieces + 1], table.start_fraction[pieces + 1]), start))
    ends = np.where(pieces % 2 == 0, -_EDGE, _EDGE)
    u = np.stack([look.rng.uniform(-_EDGE, _EDGE, len(pieces)), ends], axis=1)
    look.at(start, length, 0.5 * (1.0 + u))

    start, length = _gaps(table, bends)
    # One in each half, as an error that changes its sign on the way is zero in one place; away from the ends, where
    # what goes off and comes back is small.
    parts = np.array([0.2, 0.55]) + 0.25 * look.rng.random((len(length), 2))
    size = look.at(start, length, parts)
    near = np.flatnonzero((size > _SUSPECT * tolerance_s).any(axis=1))
    parts = (np.arange(_MORE) + look.rng.random((len(near), _MORE))) / _MORE
    look.at((start[0][near], start[1][near]), length[near], 0.01 + 0.98 * parts)
    check = Check(look.worst, look.where, look.worst_single, noise_s, look.sites, draws, len(pieces), table.degree)
    return check, np.unique(np.concatenate(look.bad))


def _gaps(table: PieceTable, bends: list[Count]) -> tuple[Pair, FloatArray]:
    """Where gaps between neighbouring bends start, and how long they are; those in a hole are left out."""
    w, f = np.array([bend[0] for bend in bends], dtype=np.int64), np.array([bend[1] for bend in bends])
    length = (w[1:] - w[:-1]) + (f[1:] - f[:-1])
    wide = length > _LEAST_GAP_S
    start, length = (w[:-1][wide], f[:-1][wide]), length[wide]
    inside = table.inside(*moved(start, 0.5 * length))
    return (start[0][inside], start[1][inside]), length[inside]


class _Looks:
    """What comparisons have found so far."""

    def __init__(self, direct: Direct, table: PieceTable, draws: int, tolerance_s: float) -> None:
        self.direct, self.table, self.draws, self.tolerance_s = direct, table, draws, tolerance_s
        self.rng = np.random.default_rng(_SEED)
        self.worst, self.where, self.worst_single = -1.0, (0, 0.0), 0.0
        self.sites = 0
        self.bad: list[IntArray] = [np.zeros(0, dtype=np.int64)]

    def at(self, start: Pair, length_s: FloatArray, parts: FloatArray) -> FloatArray:
        """Compare at `parts` (n, k), 0 to 1, of spans (n); returns the sizes of the mean errors there."""
        sizes = np.empty(parts.shape)
        for k in range(0, len(length_s), _PART):
            part = slice(k, k + _PART)
            sizes[part] = self._some((start[0][part], start[1][part]), length_s[part, None], parts[part])
        self.sites += parts.size
        return sizes

    def _some(self, start: Pair, length_s: FloatArray, parts: FloatArray) -> FloatArray:
        strewn = (length_s * parts)[..., None]
        if self.draws > 1:
            spread = np.minimum(_SPREAD_S, _PART_OF_PIECE * length_s)[..., None]
            strewn = strewn + spread * self.rng.uniform(-0.5, 0.5, (*parts.shape, self.draws))
        at = exact.add_seconds((start[0][:, None, None], start[1][:, None, None]), strewn)
        flat = at[0].reshape(-1), at[1].reshape(-1)
        theirs = self.direct(flat)
        ours = np.empty_like(flat[0]), np.empty_like(flat[1])
        self.table.map(*flat, ours, Scratch(min(len(flat[0]), 16384)))
        error = exact.seconds(exact.subtract(ours, theirs)).reshape(strewn.shape)
        sizes: FloatArray = np.abs(error.mean(axis=2))
        first = at[0][..., 0], at[1][..., 0]
        top = int(np.argmax(sizes))
        if sizes.flat[top] > self.worst:
            self.worst, self.where = float(sizes.flat[top]), (int(first[0].flat[top]), float(first[1].flat[top]))
        self.worst_single = max(self.worst_single, float(np.abs(error).max()))
        missed = ~(sizes <= self.tolerance_s)
        self.bad.append(self.table.pieces_of(first[0][missed], first[1][missed]))
        return sizes
