"""How the errors of one input quantity at different instants go together.

A constant offset shared by all readings is the same error each time and is not averaged away; the noise of a counter
is another each time and is. Between the two: errors that fade with time, and tables whose rows carry the errors.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, Protocol

import numpy as np

from ..exact import FloatArray, IntArray

__all__ = ["COMMON", "INDEPENDENT", "Common", "Correlation", "Exponential", "Independent", "Rows", "drift", "pair_sum"]


class Correlation(Protocol):
    """The correlation of unit errors at `n` instants, flattened."""

    @property
    def words(self) -> str:
        """For tables."""
        ...

    def matrix(self, n: int) -> FloatArray:
        """Correlation coefficients between all instants, (n, n)."""
        ...

    def variance_of_sum(self, signed: FloatArray) -> float:
        """Variance of the sum of contributions (n,), given with their signs, without an n x n matrix."""
        ...

    def draw(self, rng: np.random.Generator, draws: int, n: int, distribution: str) -> FloatArray:
        """Errors of unit variance, (draws, n)."""
        ...


def unit_draws(rng: np.random.Generator, distribution: str, shape: tuple[int, ...]) -> FloatArray:
    """Numbers of mean 0 and variance 1 from a distribution named in a budget."""
    if distribution == "rectangular":
        return np.asarray(rng.uniform(-np.sqrt(3.0), np.sqrt(3.0), shape))
    if distribution == "triangular":
        return np.asarray(rng.triangular(-np.sqrt(6.0), 0.0, np.sqrt(6.0), shape))
    if distribution == "arcsine":
        return np.asarray(np.sqrt(2.0) * np.sin(rng.uniform(-np.pi, np.pi, shape)))
    return np.asarray(rng.standard_normal(shape))


@dataclass(frozen=True)
class Common:
    """One error shared by all instants: a systematic offset."""

    words: str = "common to all"

    def matrix(self, n: int) -> FloatArray:
        """All ones."""
        return np.ones((n, n))

    def variance_of_sum(self, signed: FloatArray) -> float:
        """Square of the sum."""
        return float(signed.sum() ** 2)

    def draw(self, rng: np.random.Generator, draws: int, n: int, distribution: str) -> FloatArray:
        """One error per draw."""
        return np.broadcast_to(unit_draws(rng, distribution, (draws, 1)), (draws, n))


@dataclass(frozen=True)
class Independent:
    """Another error at every instant: white noise."""

    words: str = "independent"

    def matrix(self, n: int) -> FloatArray:
        """Ones on the diagonal."""
        return np.eye(n)

    def variance_of_sum(self, signed: FloatArray) -> float:
        """Sum of the squares."""
        return float((signed**2).sum())

    def draw(self, rng: np.random.Generator, draws: int, n: int, distribution: str) -> FloatArray:
        """One error per draw and instant."""
        return unit_draws(rng, distribution, (draws, n))


_DENSE: Final = 256
"""Rows up to which whole matrices are cheaper."""

COMMON: Final = Common()
INDEPENDENT: Final = Independent()


@dataclass(frozen=True, eq=False)
class Exponential:
    """Errors whose correlation falls as exp(-|t - t'| / decay).

    Parameters
    ----------
    at_s : float array
        The instants, seconds from anywhere; flattened.
    decay_s : float
        Decay time, s.
    """

    at_s: FloatArray
    decay_s: float

    @property
    def words(self) -> str:
        """For tables."""
        return f"fades in {_duration(self.decay_s)}"

    def matrix(self, n: int) -> FloatArray:
        """exp(-|t - t'| / decay)."""
        at = self._phase()
        return np.asarray(np.exp(-np.abs(at[:, None] - at)))

    def variance_of_sum(self, signed: FloatArray) -> float:
        """Double sum over the sorted instants."""
        phase = self._phase()
        order = np.argsort(phase, kind="stable")
        return pair_sum(signed[order], phase[order])

    def draw(self, rng: np.random.Generator, draws: int, n: int, distribution: str) -> FloatArray:
        """Normal errors along the sorted instants; other distributions have no such process."""
        phase = self._phase()
        order = np.argsort(phase, kind="stable")
        out = np.empty((draws, n))
        out[:, order] = drift(rng, draws, phase[order])
        return out

    def _phase(self) -> FloatArray:
        return np.asarray((self.at_s - np.min(self.at_s, initial=np.inf)).ravel() / self.decay_s)


@dataclass(frozen=True, eq=False)
class Rows:
    """Errors that sit in the rows of a table and are interpolated between them: covariance = W C W^T.

    Parameters
    ----------
    index, weight : (n, k) arrays
        Rows that each instant is interpolated from, and their weights.
    sigma : (m,) float array
        Standard uncertainties of the rows.
    phase : (m,) float array or None
        Rows k and l have correlation exp(-|phase_k - phase_l|), phases increasing; None: independent rows.
    words : str
        For tables.
    """

    index: IntArray
    weight: FloatArray
    sigma: FloatArray
    phase: FloatArray | None
    words: str

    def at(self) -> FloatArray:
        """Standard uncertainty at each instant, (n,)."""
        part = self.weight * self.sigma[self.index]
        square = (part**2).sum(axis=-1)
        for a in range(part.shape[1]):
            for b in range(a + 1, part.shape[1]):
                if self.phase is not None:
                    apart = np.abs(self.phase[self.index[:, a]] - self.phase[self.index[:, b]])
                    square = square + 2.0 * part[:, a] * part[:, b] * np.exp(-apart)
                else:
                    square = square + 2.0 * part[:, a] * part[:, b] * (self.index[:, a] == self.index[:, b])
        return np.asarray(np.sqrt(np.maximum(square, 0.0)))

    def matrix(self, n: int) -> FloatArray:
        """W C W^T, divided by the standard uncertainties."""
        rows, where = np.unique(self.index, return_inverse=True)
        where = where.reshape(self.index.shape)
        total = self._dense(rows, where) if len(rows) <= _DENSE else self._paired(rows, where)
        sigma = self.at()
        scale = np.where(sigma > 0.0, sigma, 1.0)
        total /= scale
        total /= scale[:, None]
        np.fill_diagonal(total, 1.0)
        return total

    def variance_of_sum(self, signed: FloatArray) -> float:
        """Weights are summed row by row first."""
        sigma = self.at()
        own = np.where(sigma > 0.0, signed / np.where(sigma > 0.0, sigma, 1.0), 0.0)
        rows, where = np.unique(self.index, return_inverse=True)
        loads = np.bincount(where.ravel(), (self.weight * own[:, None]).ravel(), len(rows)) * self.sigma[rows]
        return float((loads**2).sum()) if self.phase is None else pair_sum(loads, self.phase[rows])

    def errors(self, rng: np.random.Generator, draws: int, distribution: str) -> tuple[IntArray, FloatArray]:
        """Rows in use, and errors for them (draws, rows)."""
        rows = np.unique(self.index)
        if self.phase is None:
            unit = unit_draws(rng, distribution, (draws, len(rows)))
        elif np.ptp(self.phase[rows]) == 0.0:
            unit = np.broadcast_to(unit_draws(rng, distribution, (draws, 1)), (draws, len(rows)))
        else:
            unit = drift(rng, draws, self.phase[rows])
        return rows, unit * self.sigma[rows]

    def draw(self, rng: np.random.Generator, draws: int, n: int, distribution: str) -> FloatArray:
        """Errors of the rows, interpolated, of unit variance."""
        rows, errors = self.errors(rng, draws, distribution)
        found = (errors[:, np.searchsorted(rows, self.index)] * self.weight).sum(axis=-1)
        sigma = self.at()
        return np.asarray(found / np.where(sigma > 0.0, sigma, 1.0))

    def _dense(self, rows: IntArray, where: IntArray) -> FloatArray:
        """W C W^T with whole matrices, for few rows."""
        loads = np.zeros((len(where), len(rows)))
        np.add.at(loads, (np.arange(len(where))[:, None], where), self.weight * self.sigma[self.index])
        if self.phase is None:
            return np.asarray(loads @ loads.T)
        phase = self.phase[rows]
        return np.asarray(loads @ np.exp(-np.abs(phase[:, None] - phase)) @ loads.T)

    def _paired(self, rows: IntArray, where: IntArray) -> FloatArray:
        """W C W^T for many rows: pairs of instants without a row between them one by one, all others as products."""
        part = self.weight * self.sigma[self.index]
        # A row of no weight is none: it would make neighbours of instants far apart.
        own = np.argmax(np.abs(self.weight), axis=1)[:, None]
        where = np.where(self.weight == 0.0, np.take_along_axis(where, own, axis=1), where)
        order = np.argsort(where.min(axis=1), kind="stable")
        part, where = part[order], where[order]
        first, last = where.min(axis=1), where.max(axis=1)
        total = np.zeros((len(where), len(where)))
        phase = None if self.phase is None else self.phase[rows]
        if phase is not None:
            # From each instant forward to its last row, across to the first row of the other, and on.
            ahead = (part * np.exp(phase[where] - phase[last][:, None])).sum(axis=1)
            behind = (part * np.exp(phase[first][:, None] - phase[where])).sum(axis=1)
            across = np.minimum(phase[last][:, None] - phase[first], 0.0)
            total += np.triu(np.exp(across) * np.outer(ahead, behind), 1)
        near = np.searchsorted(first, last, side="right") - np.arange(len(first))
        i = np.repeat(np.arange(len(first)), near)
        j = i + np.arange(len(i)) - np.repeat(np.cumsum(near) - near, near)
        value = np.zeros(len(i))
        for a in range(where.shape[1]):
            for b in range(where.shape[1]):
                r, s = where[i, a], where[j, b]
                value += part[i, a] * part[j, b] * (r == s if phase is None else np.exp(-np.abs(phase[r] - phase[s])))
        total[i, j] = value
        total = total + np.triu(total, 1).T
        back = np.argsort(order, kind="stable")
        return np.asarray(total[np.ix_(back, back)])


def pair_sum(signed: FloatArray, phase: FloatArray) -> float:
    """Sum over all i, j of s_i s_j exp(-|p_i - p_j|) for increasing phases, in n log n operations."""
    # What came before fades: a_i = d_i (a_{i-1} + s_{i-1}); its reach is doubled until it goes back to the start.
    fade = np.exp(-np.diff(phase, prepend=phase[:1]))
    before = fade * np.concatenate([[0.0], signed[:-1]]) if len(signed) else np.zeros(0)
    shift = 1
    while shift < len(signed):
        before[shift:] = before[shift:] + fade[shift:] * before[:-shift]
        fade[shift:] = fade[shift:] * fade[:-shift]
        shift *= 2
    return float((signed**2).sum() + 2.0 * (signed * before).sum())


def drift(rng: np.random.Generator, draws: int, phase: FloatArray) -> FloatArray:
    """Normal errors of unit variance, (draws, n), with correlation exp(-|p_i - p_j|) along increasing phases."""
    unit = rng.standard_normal((draws, len(phase)))
    keep = np.exp(-np.diff(phase))
    fresh = np.sqrt(-np.expm1(-2.0 * np.diff(phase)))
    for i in range(1, len(phase)):
        unit[:, i] = keep[i - 1] * unit[:, i - 1] + fresh[i - 1] * unit[:, i]
    return np.asarray(unit)


def _duration(seconds: float) -> str:
    for size, unit in ((31557600.0, "a"), (86400.0, "d"), (3600.0, "h")):
        if seconds >= size:
            return f"{seconds / size:.3g} {unit}"
    return f"{seconds:.3g} s"
