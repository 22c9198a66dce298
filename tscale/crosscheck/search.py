"""The search for the smallest set of signatures that brings residuals down to noise.

Sets are grown one signature at a time, and the best of every size are kept (all single ones among them, so that two
mistakes that hide each other are found together). Sets of different sizes are compared by

    m ln(sum of squares) + cost of every signature,

m being the number of independent values that the remaining residuals are worth. A signature with a given size
costs 2 ln(K/alpha), K the number of signatures looked at: under noise alone the chance that any of them gains as much
is below alpha. A fitted amplitude costs ln(m) more (Schwarz 1978, Ann. Stat. 6, 461; with the choice among K as in Chen
and Chen 2008, Biometrika 95, 759), a whole number out of N another 2 ln(N/2).
"""

from __future__ import annotations

import math
from bisect import bisect_left
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Final

import numpy as np

from ..exact import FloatArray
from .noise import independent_values
from .signature import Signature

__all__ = ["FALSE_ALARM", "Found", "Problem", "search"]

FALSE_ALARM: Final = 1e-3
"""Chance, at most, that noise alone is given a name."""

_WIDTHS: Final = (10_000, 10_000, 8, 6, 6, 4)
_FEW: Final = 4
_BEST: Final = 8
_COLLINEAR: Final = 1e-12
_FITTED_COST: Final = 6.0  # so that of several that fit alike by chance none beats a mistake of the right size
_PLAIN_COST: Final = 10.0  # so that what has a name is preferred to a plain offset that does as well


@dataclass(frozen=True, eq=False)
class Found:
    """A set of signatures: columns and amplitudes, and what they leave."""

    members: tuple[tuple[int, float], ...]
    residual: FloatArray
    squares: float


@dataclass(frozen=True)
class Problem:
    """Residuals in order of time, and the columns that may explain them.

    Attributes
    ----------
    residual : (n,) array
        Weighted, s.
    values : (n, K) array
        Weighted, s for an amplitude of 1.
    signatures : sequence of Signature
        One for each column.
    floor_s : float
        What neither side can resolve: smaller residuals are as good as none.
    """

    residual: FloatArray
    values: FloatArray
    signatures: Sequence[Signature]
    floor_s: float

    def cost(self, column: int, independent: float) -> float:
        """What a signature must gain to be taken."""
        signature = self.signatures[column]
        base = 2.0 * math.log(max(len(self.signatures), 1) / FALSE_ALARM)
        if signature.allowed is None:
            return base + math.log(independent) + _FITTED_COST + (0.0 if signature.named else _PLAIN_COST)
        return base + 2.0 * math.log(max(len(signature.allowed) / 2.0, 1.0))

    def gain(self, before: float, after: float, independent: float) -> float:
        """Twice the gain in the logarithm of the likelihood between two sums of squares."""
        least = self.residual.size * self.floor_s**2
        return independent * math.log((before + least) / (after + least))

    def score(self, members: Sequence[tuple[int, float]], squares: float, independent: float) -> float:
        """What sets are compared by; less is better."""
        return self.gain(squares, 0.0, independent) + sum(self.cost(column, independent) for column, _ in members)

    def nearest(self, column: int, amplitude: float) -> float:
        """The amplitude nearest to a fitted one that the signature can have."""
        signature = self.signatures[column]
        if signature.allowed is None:
            return amplitude
        few = signature.allowed
        if len(few) > 2:
            at = bisect_left(few, amplitude)
            few = few[max(at - 1, 0) : at + 1]
        allowed = few[0] if len(few) == 1 or abs(few[0] - amplitude) <= abs(few[1] - amplitude) else few[1]
        if signature.spread:
            return allowed * min(max(amplitude / allowed, 1.0 - signature.spread), 1.0 + signature.spread)
        return allowed

    def basis(self, members: Sequence[tuple[int, float]]) -> FloatArray:
        """Orthonormal basis of the columns whose amplitude is fitted."""
        free = [column for column, _ in members if self.signatures[column].allowed is None]
        if not free:
            return np.zeros((self.residual.size, 0))
        columns = self.values[:, free]
        scaled = columns / np.sqrt(np.sum(columns**2, axis=0))
        return np.asarray(np.linalg.qr(scaled)[0])

    def fitted(self, members: Sequence[tuple[int, float]], residual: FloatArray | None = None) -> Found:
        """Fit the free amplitudes of a set (to a residual from which all of it is taken out already, if given)."""
        if residual is None:
            left = self.residual.copy()
            for column, amplitude in members:
                left = left - amplitude * self.values[:, column]
        else:
            left = residual
        free = [i for i, (column, _) in enumerate(members) if self.signatures[column].allowed is None]
        amplitudes = [amplitude for _, amplitude in members]
        if free:
            columns = self.values[:, [members[i][0] for i in free]]
            size = np.sqrt(np.sum(columns**2, axis=0))
            for _ in range(2):  # the second takes out what rounding left of a large residual
                step = np.linalg.lstsq(columns / size, left, rcond=1e-10)[0] / size
                left = left - columns @ step
                for i, change in zip(free, step.tolist(), strict=True):
                    amplitudes[i] += change
        pairs = tuple((column, amplitudes[i]) for i, (column, _) in enumerate(members))
        return Found(pairs, left, float(left @ left))


def _grown(problem: Problem, parent: Found, taken: frozenset[int]) -> list[tuple[float, int, float]]:
    """Sums of squares, columns and amplitudes for every signature added to a set."""
    basis = problem.basis(parent.members)
    values = problem.values
    norms = np.sum(values**2, axis=0)
    if basis.shape[1]:
        values = values - basis @ (basis.T @ values)
    rest = np.sum(values**2, axis=0)
    # A fitted amplitude needs a column that is not in the span of the others; a given one only changes what is left.
    usable = [k for k in range(len(norms)) if k not in taken and rest[k] > _COLLINEAR * norms[k]]
    if not usable:
        return []
    picked = values[:, usable]
    fitted = (picked.T @ parent.residual) / rest[usable]
    amplitudes = np.array([problem.nearest(k, a) for k, a in zip(usable, fitted.tolist(), strict=True)])
    left = parent.residual[:, np.newaxis] - picked * amplitudes
    squares = np.einsum("ij,ij->j", left, left)
    return [
        (square, k, amplitude)
        for square, k, amplitude in zip(squares.tolist(), usable, amplitudes.tolist(), strict=True)
        if abs(amplitude) <= problem.signatures[k].limit
    ]


def search(problem: Problem, held: Sequence[tuple[int, float]] = (), most: int = 5) -> list[Found]:
    """Sets that contain `held`, the best first; of every size the best few are among them.

    The residual of the problem is without the mistakes in `held` already, whose free amplitudes are fitted again.
    """
    start = problem.fitted(tuple((column, 0.0) for column, _ in held))
    levels: list[list[Found]] = [[start]]
    fitted = {k for k, signature in enumerate(problem.signatures) if signature.allowed is None}
    for width in _WIDTHS[:most]:
        grown: dict[frozenset[tuple[int, float]], tuple[float, Found, int, float]] = {}
        for parent in levels[-1]:
            taken = frozenset(column for column, _ in parent.members)
            kept = [(k, 0.0 if k in fitted else a) for k, a in parent.members[len(held) :]]
            for squares, column, amplitude in _grown(problem, parent, taken):
                key = frozenset((*kept, (column, 0.0 if column in fitted else amplitude)))
                if key not in grown or squares < grown[key][0]:
                    grown[key] = (squares, parent, column, amplitude)
        best = sorted(grown.values(), key=lambda item: item[0])[: max(1, width if len(levels) == 1 else min(width, 8))]
        if not best:
            break
        levels.append([_added(problem, *item[1:]) for item in best])
        if len(levels) > 2:
            before, after = min(f.squares for f in levels[-2]), min(f.squares for f in levels[-1])
            cheapest = min(problem.cost(k, 2.0) for k in range(len(problem.signatures)))
            if problem.gain(before, after, float(problem.residual.size)) < cheapest:
                break
    richest = min((f for level in levels for f in level), key=lambda f: f.squares)
    independent = independent_values(richest.residual)

    def score(found: Found) -> float:
        return problem.score(found.members[len(held) :], found.squares, independent)

    every = sorted((f for level in levels for f in level), key=score)
    few = [f for level in levels for f in sorted(level, key=lambda f: f.squares)[:_FEW] if f not in every[:_BEST]]
    return every[:_BEST] + few


def _added(problem: Problem, parent: Found, column: int, amplitude: float) -> Found:
    members = (*parent.members, (column, amplitude))
    residual = parent.residual - amplitude * problem.values[:, column]
    return problem.fitted(members, residual)
