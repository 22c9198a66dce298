"""One diagnosis: the catalogue evaluated, the search run, and what it finds made exact and tested again."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import Final, NamedTuple, TypeAlias

import numpy as np
import numpy.typing as npt

from .. import exact
from ..exact import BoolArray, FloatArray
from .catalogue import Columns, catalogue, columns
from .grids import Grid, grids, rounded
from .noise import independent_values, outliers, rms
from .path import LINEAR_S, Path
from .remainder import leftovers
from .residuals import Residuals
from .search import Found, Problem, search

__all__ = ["Diagnosis", "Made"]

_MOST_ROWS: Final = 4000
"""Rows that the search looks at; the result is fitted to all."""
_ROUNDS: Final = 4
_MANY: Final = 3
_EXACT_MEMBERS: Final = 3
_LARGE_S: Final = 1e-3
_AGREES_SIGMA: Final = 6.0
_TOLD_APART: Final = 9.0  # 3 sigma
_Members: TypeAlias = tuple[tuple[int, float], ...]
Rows: TypeAlias = npt.NDArray[np.intp]


class Made(NamedTuple):
    """What a diagnosis finds; `causes` are the fields of `Cause`."""

    causes: list[tuple[str, float, float, str, str, float, tuple[str, ...]]]
    unexplained_s: FloatArray
    independent: float
    set_aside: tuple[int, ...]
    looked_for: tuple[str, ...]
    unknown: tuple[tuple[str, str], ...]
    noise_s: float
    leftovers: tuple[str, ...]


class Diagnosis:
    """The work on one set of residuals.

    Parameters
    ----------
    residuals : Residuals
    sigma_s : float array or None
        Stated standard uncertainty of each row.
    """

    def __init__(self, residuals: Residuals, sigma_s: FloatArray | None) -> None:
        self.residuals = residuals
        self.order = np.lexsort((residuals.t.fraction, residuals.t.whole))
        self.sigma_s = None if sigma_s is None else sigma_s[self.order]
        self.weights = np.ones(residuals.n) if self.sigma_s is None else np.median(self.sigma_s) / self.sigma_s
        self.theirs = residuals.theirs[self.order]
        self.path = Path(residuals._chain, residuals.t[self.order])
        self.leaps = residuals._chain.reference.leap_seconds
        barycentric = any(step.start.place != step.end.place for step in self.path.steps)
        largest = residuals.max_s
        # A position of 1 au rounds to 0.1 ps, a date to 0.1 fs, and the residual as any float64.
        self.floor_s = max(2e-13 if barycentric else 1e-15, 2e-16 * largest)
        self._bent_once: set[int] = set()
        self.columns: Columns = columns(self.path, catalogue(self.path), self.floor_s)

    def run(self) -> Made:
        """All of it."""
        refused: set[int] = set()
        aside: BoolArray = np.zeros(self.residuals.n, dtype=np.bool_)
        for _ in range(8):
            members, left = self._found(refused, aside)
            wrong = self._disagreeing(members, left, aside)
            if wrong is not None:
                refused.add(wrong)
                continue
            far = outliers(left) & ~aside
            if far.any() and rms(left[far]) > 3.0 * self.floor_s and np.count_nonzero(far | aside) <= 0.05 * len(far):
                aside = aside | far
                continue
            fitted = {k for k, _ in members if self.columns.signatures[k].allowed is None}
            if len(fitted) < _MANY or not self._leftovers(left, aside):
                break
            # A sum of so many fitted amplitudes that still leaves something is a curve through it, no explanation.
            refused |= {k for k, s in enumerate(self.columns.signatures) if s.allowed is None and s.named}
        return self._told(members, left, aside)

    def _leftovers(self, left: FloatArray, aside: BoolArray) -> tuple[str, ...]:
        rows = np.flatnonzero(~aside)
        seconds = exact.seconds(exact.subtract(self.path.t.pair, self.path.t[0].pair))
        sigma_s = None if self.sigma_s is None else self.sigma_s[rows]
        return leftovers(seconds[rows], left[rows], sigma_s, self.floor_s)

    # ---- search --------------------------------------------------------------------------------------

    def _problem(self, left: FloatArray, keep: Rows) -> Problem:
        scale = self.weights[keep]
        return Problem(
            left[keep] * scale, self.columns.values[keep] * scale[:, np.newaxis], self.columns.signatures, self.floor_s
        )

    def _searched(self, left: FloatArray, rows: Rows, refused: set[int]) -> Problem:
        problem = self._problem(left, rows)
        for k in refused:
            problem.values[:, k] = 0.0
        return problem

    def _exactly_best(self, sets: Sequence[Found], rows: Rows) -> Found:
        """The best of some sets by what they leave when they are put into the chain together.

        Large mistakes change what others do: 1 km on the ground is 0.1 ns more for every 100 mas on the sky.
        """
        sizes = np.max(np.abs(self.columns.values), axis=0, initial=0.0)
        few = [s for s in sets if len(s.members) <= _EXACT_MEMBERS]
        if (
            len(sets[0].members) > _EXACT_MEMBERS
            or not sets[0].members
            or max(sizes[k] for k, _ in sets[0].members) < _LARGE_S
        ):
            return sets[0]
        whole = rows.size == self.residuals.n
        path = self.path if whole else Path(self.residuals._chain, self.path.t[rows])
        theirs, every = self.theirs[rows], np.zeros(self.residuals.n)
        lefts = []
        for found in few:
            made = path.run([(self.columns.signatures[k], a) for k, a in found.members])
            every[rows] = theirs.minus(made)
            left = self._problem(every, rows).fitted(tuple((k, 0.0) for k, _ in found.members))
            lefts.append((left.squares, independent_values(left.residual)))
        worth, any_problem = min(lefts)[1], self._problem(every, rows)
        scores = [any_problem.score(f.members, squares, worth) for f, (squares, _) in zip(few, lefts, strict=True)]
        return few[int(np.argmin(scores))]

    def _nearest(self, k: int, left: FloatArray) -> float:
        column = self.columns.values[:, k]
        return self._problem(left[:0], np.arange(0)).nearest(k, float(column @ left) / float(column @ column))

    def _bent(self, members: Sequence[tuple[int, float]]) -> bool:
        """Make the columns of large mistakes exact for the amplitude at hand: a wavefront bends."""
        changed = False
        for k, amplitude in members:
            signature = self.columns.signatures[k]
            if signature.allowed is None or signature.last_of or (amplitude == 1.0 and k not in self._bent_once):
                continue
            if abs(amplitude) * float(np.max(np.abs(self.columns.values[:, k]))) > LINEAR_S:
                self._bent_once.add(k)
                made = self.path.run([(signature, amplitude)]).minus(self.path.end) / amplitude
                changed |= bool(np.any(made != self.columns.values[:, k]))
                self.columns.values[:, k] = made
        return changed

    def _left(self, members: _Members) -> FloatArray:
        """Residuals once the mistakes have been put into the chain, each in its effect on the others."""
        made = self.path.run([(self.columns.signatures[k], a) for k, a in members])
        return self.theirs.minus(made)

    def _found(self, refused: set[int], aside: BoolArray) -> tuple[_Members, FloatArray]:
        rows = np.flatnonzero(~aside)
        thin = rows[:: max(1, math.ceil(rows.size / _MOST_ROWS))]
        members: _Members = ()
        left = self._left(members)
        self._bent([(k, self._nearest(k, left)) for k in range(len(self.columns.signatures))])
        for number in range(_ROUNDS):
            sets = search(self._searched(left, thin, refused), members)
            if number == 0 and self._bent(sets[0].members):
                sets = search(self._searched(left, thin, refused), members)
            found = sets[0] if number else self._exactly_best(sets, thin)
            new = found.members[len(members) :]
            members = (*((k, a + d) for (k, a), (_, d) in zip(members, found.members, strict=False)), *new)
            members, left = self._refitted(members, rows)
            members, left = self._pruned(members, left, rows)
            if not new:
                break
        return members, left

    def _refitted(self, members: _Members, rows: Rows) -> tuple[_Members, FloatArray]:
        """Fit the free amplitudes with the mistakes put in exactly."""
        left = self._left(members)
        adjustable = [i for i, (k, _) in enumerate(members) if self.columns.signatures[k].free]
        for _ in range(3 if adjustable else 0):
            problem = self._problem(left, rows)
            fitted = problem.fitted(tuple((k, 0.0) for k, _ in members))
            moved = tuple(
                (k, problem.nearest(k, a + d) if self.columns.signatures[k].spread else a + d)
                for (k, a), (_, d) in zip(members, fitted.members, strict=True)
            )
            if moved == members:
                break
            members = moved
            left = self._left(members)
        return members, left

    def _pruned(self, members: _Members, left: FloatArray, rows: Rows) -> tuple[_Members, FloatArray]:
        """Drop the mistakes that the residuals do not ask for, the least wanted first."""
        while members:
            problem = self._problem(left, rows)
            squares = float(problem.residual @ problem.residual)
            worth = independent_values(problem.residual)
            margins = []
            for i, (k, a) in enumerate(members):
                rest = members[:i] + members[i + 1 :]
                without = problem.residual + a * problem.values[:, k]
                fitted = problem.fitted(tuple((j, 0.0) for j, _ in rest), without)
                margins.append(problem.gain(fitted.squares, squares, worth) - problem.cost(k, worth))
            worst = int(np.argmin(margins))
            if margins[worst] >= 0.0:
                break
            members = members[:worst] + members[worst + 1 :]
            members, left = self._refitted(members, rows)
        return members, left

    # ---- tests of what was found ---------------------------------------------------------------------

    def _estimate(self, problem: Problem, members: _Members, at: int) -> tuple[float, float]:
        """Amplitude of one mistake as fitted, beside the free ones of the others, and its standard uncertainty."""
        k, amplitude = members[at]
        others = problem.basis([m for i, m in enumerate(members) if i != at])
        column = problem.values[:, k] - others @ (others.T @ problem.values[:, k])
        left = problem.residual - others @ (others.T @ problem.residual)
        power = float(column @ column)
        if not power:
            return amplitude, math.inf
        shift = float(column @ left) / power
        rest = left - shift * column
        worth = independent_values(rest)
        freedom = max(left.size - others.shape[1] - 1, 1)
        least = left.size * self.floor_s**2
        return amplitude + shift, math.sqrt((float(rest @ rest) + least) / freedom / power * left.size / worth)

    def _disagreeing(self, members: _Members, left: FloatArray, aside: BoolArray) -> int | None:
        """A mistake whose fitted amplitude is not one that it can have."""
        problem = self._problem(left, np.flatnonzero(~aside))
        for i, (k, a) in enumerate(members):
            if abs(a) > self.columns.signatures[k].limit:
                return k
            if self.columns.signatures[k].free:
                continue
            found, sigma = self._estimate(problem, members, i)
            if abs(found - a) > _AGREES_SIGMA * sigma + 1e-6 * abs(a):
                return k
        return None

    def _alternatives(self, problem: Problem, members: _Members, at: int) -> tuple[str, ...]:
        """Mistakes that would do as well in the place of one."""
        k, amplitude = members[at]
        signatures = self.columns.signatures
        worth = independent_values(problem.residual)
        squares = float(problem.residual @ problem.residual)
        rest = members[:at] + members[at + 1 :]
        without = problem.residual + amplitude * problem.values[:, k]
        basis = problem.basis(rest)
        bare = without - basis @ (basis.T @ without)
        names = []
        for j, other in enumerate(signatures):
            if any(j == taken for taken, _ in members):
                continue
            # A plain offset is worth a word beside what was fitted, not beside a mistake of a known size.
            dearer = problem.cost(j, worth) > problem.cost(k, worth)
            if dearer and (other.named or signatures[k].allowed is not None):
                continue
            column = problem.values[:, j] - basis @ (basis.T @ problem.values[:, j])
            power = float(column @ column)
            if not power:
                continue
            value = problem.nearest(j, float(column @ bare) / power)
            after = bare - value * column
            if problem.gain(float(after @ after), squares, worth) < _TOLD_APART:
                names.append(other.name)
        return tuple(names)

    # ---- the result ----------------------------------------------------------------------------------

    def _told(self, members: _Members, left: FloatArray, aside: BoolArray) -> Made:
        rows = np.flatnonzero(~aside)
        problem = self._problem(left, rows)
        causes = []
        plain = np.zeros_like(left)
        for i, (k, a) in enumerate(members):
            if not self.columns.signatures[k].named:
                plain = plain + a * self.columns.values[:, k]
                continue
            told = self.columns.signatures[k]
            amplitude, sigma = self._estimate(problem, members, i)
            size = rms(members[i][1] * self.columns.values[rows, k])
            others = self._alternatives(problem, members, i)
            if told.last_of in others:  # which of the two lies nearer is chance: they go by the name of the first
                others = tuple(told.name if name == told.last_of else name for name in others)
                told = next(s for s in self.columns.signatures if s.name == told.last_of)
            causes.append((told.name, amplitude, sigma, told.unit, told.description, size, others))
        for grid in grids(self.theirs, self.path.end, self.leaps)[:1]:
            rounding = self._rounding(members, left, rows, grid)
            if rounding is not None:
                causes.append(rounding[0])
                left = rounding[1]
                aside = aside & (np.abs(left) > 3.0 * max(rms(left[rows]), self.floor_s))
        rows = np.flatnonzero(~aside)
        worth = independent_values(left[rows])
        left = left + plain
        unexplained = np.empty_like(left)
        unexplained[self.order] = left
        return Made(
            causes,
            unexplained,
            worth,
            tuple(sorted(self.order[aside].tolist())),
            tuple(s.name for s in self.columns.signatures if s.named),
            self.columns.unknown,
            rms(left[rows]),
            self._leftovers(left, aside),
        )

    def _rounding(
        self, members: Sequence[tuple[int, float]], left: FloatArray, rows: Rows, grid: Grid
    ) -> tuple[tuple[str, float, float, str, str, float, tuple[str, ...]], FloatArray] | None:
        """The rounding of results as a cause, and what it leaves, if the pattern of its steps is in the residuals."""
        made = self.path.run([(self.columns.signatures[k], a) for k, a in members])
        kept = rounded(made, grid, self.leaps)
        pattern, after = kept.minus(made), self.theirs.minus(kept)
        power = float(pattern[rows] @ pattern[rows])
        if not power:
            return None
        amplitude = float(pattern[rows] @ left[rows]) / power
        rest = left[rows] - amplitude * pattern[rows]
        sigma = math.sqrt((float(rest @ rest) / rows.size + self.floor_s**2) / power)
        if abs(amplitude - 1.0) > max(_AGREES_SIGMA * sigma, 0.3):
            return None
        if rms(after[rows]) > rms(rest):
            after = left - pattern  # where the model is not good enough to say which way a date was rounded
        return (grid.name, amplitude, sigma, "", grid.description, rms(pattern[rows]), ()), after
