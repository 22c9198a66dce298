"""How far a clock wanders off its comparisons at one instant and at another: one law between them and past the last.

The error at each instant is a contrast of readings (see `tables.clock_noise`): those of some comparisons, by weights,
less that at the instant itself. The covariance of two contrasts is the sum over all pairs of weights times the
generalised covariance of the noise (G. Matheron, Adv. Appl. Prob. 5 (1973) 439), as their variances are. So what is
predicted a day ahead and two days ahead goes together as a clock does that drifts away from one straight line.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np

from ..exact import FloatArray
from ..tables.clock_noise import ClockNoise
from .correlation import unit_draws

__all__ = ["Wander"]

_FEW: Final = 512
"""Instants up to which the whole matrix is cheap."""
_CELLS: Final = 2**20
"""Of the even grid for the flicker noise of more instants than that."""
_FAR: Final = 1000.0


@dataclass(frozen=True, eq=False)
class Wander:
    """Contrasts of a clock's readings, one for each instant.

    Parameters
    ----------
    times_s, weights : (n, k) arrays
        Readings that make up the error at each instant, s from anywhere, and their weights.
    noise : ClockNoise
    """

    times_s: FloatArray
    weights: FloatArray
    noise: ClockNoise

    @property
    def words(self) -> str:
        """For tables."""
        return "wanders on by its noise"

    def covariance(self) -> FloatArray:
        """Covariance between the instants, s2, (n, n)."""
        times, where = np.unique(self.times_s, return_inverse=True)
        where = where.reshape(self.times_s.shape)
        unit = max(float(np.ptp(times)), np.finfo(np.float64).tiny)
        apart = np.abs(times[:, None] - times) / unit
        noise = self.noise
        steady = noise.random_walk_frequency**2 * unit**3 / 4.0 * apart**3
        steady -= noise.white_frequency**2 * unit / 2.0 * apart
        total = self._between(steady, where)
        # Of contrasts one after the other neither kind of noise leaves anything: what is left there are roundings.
        used = self.weights != 0.0
        first = np.where(used, self.times_s, np.inf).min(axis=1)
        last = np.where(used, self.times_s, -np.inf).max(axis=1)
        total[(last[:, None] < first) | (first[:, None] > last)] = 0.0
        if noise.white_phase_s:
            total += self._between(noise.white_phase_s**2 * np.eye(len(times)), where)
        if noise.flicker_frequency:
            level = noise.flicker_frequency**2 * unit**2 / (4.0 * np.log(2.0))
            total += self._between(level * apart**2 * np.log(np.where(apart > 0.0, apart, 1.0)), where)
        np.fill_diagonal(total, self.noise.contrast_s(self.times_s, self.weights) ** 2)
        return total

    def matrix(self, n: int) -> FloatArray:
        """Correlation coefficients; of instants at comparisons, where nothing wanders, none."""
        total = self.covariance()
        scale = np.sqrt(np.diag(total))
        scale = np.where(scale > 0.0, scale, 1.0)
        total /= scale
        total /= scale[:, None]
        np.clip(total, -1.0, 1.0, out=total)
        np.fill_diagonal(total, 1.0)
        return total

    def variance_of_sum(self, signed: FloatArray) -> float:
        """Variance of the one contrast that the sum of all is; its load on the clock's rate, and on the rate's rate."""
        if len(signed) <= _FEW:
            return float(signed @ self.matrix(len(signed)) @ signed)
        sigma = self.noise.contrast_s(self.times_s, self.weights)
        own = np.where(sigma > 0.0, signed / np.where(sigma > 0.0, sigma, 1.0), 0.0)
        times, where = np.unique(self.times_s, return_inverse=True)
        loads: FloatArray = np.bincount(where.ravel(), (self.weights * own[:, None]).ravel(), len(times)).astype(
            np.float64
        )
        step = np.diff(times)
        rate = -np.cumsum(loads)[:-1]  # of each second of the clock's rate in the sum
        after = np.concatenate([[0.0], np.cumsum(rate * step)])
        squares = after[:-1] ** 2 + after[:-1] * after[1:] + after[1:] ** 2
        noise = self.noise
        return float(
            noise.white_frequency**2 * np.sum(rate**2 * step)
            + noise.random_walk_frequency**2 * np.sum(squares * step)
            + noise.white_phase_s**2 * np.sum(loads**2)
            + noise.flicker_frequency**2 * _flicker(times, loads)
        )

    def draw(self, rng: np.random.Generator, draws: int, n: int, distribution: str) -> FloatArray:
        """Normal errors of unit variance with these correlations."""
        values, vectors = np.linalg.eigh(self.matrix(n))
        unit = unit_draws(rng, "normal", (draws, n))
        return np.asarray((unit * np.sqrt(np.maximum(values, 0.0))) @ vectors.T)

    def _between(self, kernel: FloatArray, where: np.ndarray[tuple[int, ...], np.dtype[np.intp]]) -> FloatArray:
        """W K W^T for weights that stand in few columns."""
        columns = range(where.shape[1])
        half = sum((self.weights[:, a, None] * kernel[where[:, a]] for a in columns), np.zeros((1, 1)))
        return np.asarray(sum((half[:, where[:, b]] * self.weights[:, b] for b in columns), np.zeros((1, 1))))


def _flicker(times: FloatArray, loads: FloatArray) -> float:
    """Variance of a contrast by flicker frequency noise of level 1, on an even grid.

    Each load is shared by the two points next to it, so that offsets and rates stay without effect.
    """
    cell_s = float(np.ptp(times)) / _CELLS
    place = (times - times[0]) / cell_s
    low = np.minimum(place.astype(np.int64), _CELLS - 1)
    part = place - low
    grid = np.bincount(low, loads * (1.0 - part), _CELLS + 1) + np.bincount(low + 1, loads * part, _CELLS + 1)
    rate = np.fft.rfft(-np.cumsum(grid)[:-1], 2 * _CELLS)
    alike = np.fft.irfft(np.abs(rate) ** 2, 2 * _CELLS)[:_CELLS]
    # Second differences of t^2 ln t; far out, where they are lost in roundings, by its derivatives.
    far = np.arange(_CELLS, dtype=np.float64)
    near = far[: int(_FAR)]
    grown = np.arange(-1.0, _FAR + 1.0) ** 2 * np.log(np.maximum(np.abs(np.arange(-1.0, _FAR + 1.0)), 1.0))
    bend = 2.0 * np.log(np.maximum(far, 1.0)) + 3.0 - 1.0 / (6.0 * np.maximum(far, 1.0) ** 2)
    bend[: len(near)] = np.diff(grown, 2)
    both = np.concatenate([[1.0], np.full(_CELLS - 1, 2.0)])
    return float(-np.sum(both * alike * bend) * cell_s**2 / (4.0 * np.log(2.0)))
