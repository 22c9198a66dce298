"""Checks of pieces against the chain itself, at dates that no fit has seen."""

from __future__ import annotations

from typing import Final

import numpy as np

from .. import exact
from ..exact import BoolArray, FloatArray, IntArray, Pair
from .certificate import Check
from .direct import Direct
from .piece_table import PieceTable, Scratch

__all__ = ["check_pieces", "draws_for"]

_SEED: Final = 20310301
_SPREAD_S: Final = 4.0
_PART_OF_PIECE: Final = 0.01
_MOST_DRAWS: Final = 16
_EDGE: Final = 0.985
_PART: Final = 4096


def draws_for(noise_s: float, tolerance_s: float) -> int | None:
    """Values to average so that rounding takes no more than half the tolerance at four deviations; None: too many."""
    needed = int(np.ceil((8.0 * noise_s / tolerance_s) ** 2))
    return max(1, needed) if needed <= _MOST_DRAWS else None


def check_pieces(direct: Direct, table: PieceTable, noise_s: float, tolerance_s: float) -> tuple[Check, IntArray]:
    """Compare every piece with the chain; returns what was found, and the pieces that miss the tolerance.

    Two dates on each: one at random (the seed is fixed), one at alternate ends.
    """
    draws = draws_for(noise_s, tolerance_s)
    assert draws is not None
    pieces = np.flatnonzero(np.isfinite(table.powers[0]))
    rng = np.random.default_rng(_SEED)
    worst, where, worst_single = -1.0, (0, 0.0), 0.0
    bad: list[IntArray] = []
    for k in range(0, len(pieces), _PART):
        part = pieces[k : k + _PART]
        ends = np.where(part % 2 == 0, -_EDGE, _EDGE)
        u = np.stack([rng.uniform(-_EDGE, _EDGE, len(part)), ends], axis=1)
        error, single, at = _errors(direct, table, part, u, draws, rng)
        size = np.abs(error)
        top = int(np.argmax(size))
        if size.flat[top] > worst:
            worst, where = float(size.flat[top]), (int(at[0].flat[top]), float(at[1].flat[top]))
        worst_single = max(worst_single, float(single.max()))
        missed: BoolArray = ~(size <= tolerance_s)
        bad.append(part[missed.any(axis=1)])
    check = Check(worst, where, worst_single, noise_s, 2 * len(pieces), draws, len(pieces), table.degree)
    return check, np.concatenate(bad)


def _errors(
    direct: Direct, table: PieceTable, pieces: IntArray, u: FloatArray, draws: int, rng: np.random.Generator
) -> tuple[FloatArray, FloatArray, Pair]:
    """Mean errors at u (-1 to 1) on pieces, both (n, 2), the largest single ones, and the dates."""
    start = table.start_whole[pieces], table.start_fraction[pieces]
    length = exact.seconds(exact.subtract((table.start_whole[pieces + 1], table.start_fraction[pieces + 1]), start))[
        :, None
    ]
    spread = np.minimum(_SPREAD_S, _PART_OF_PIECE * length)[..., None]
    strewn = 0.5 * length[..., None] * (1.0 + u[..., None])
    if draws > 1:
        strewn = strewn + spread * rng.uniform(-0.5, 0.5, (*u.shape, draws))
    at = exact.add_seconds((start[0][:, None, None], start[1][:, None, None]), strewn)
    flat = at[0].reshape(-1), at[1].reshape(-1)
    theirs = direct(flat)
    ours = np.empty_like(flat[0]), np.empty_like(flat[1])
    table.map(*flat, ours, Scratch(min(len(flat[0]), 16384)))
    error = exact.seconds(exact.subtract(ours, theirs)).reshape(strewn.shape)
    return error.mean(axis=2), np.abs(error).max(axis=2), (at[0][..., 0], at[1][..., 0])
