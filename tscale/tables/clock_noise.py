"""The noise of a clock, by its levels: what the clock may wander between two comparisons and past the last.

White frequency noise, flicker frequency noise and random-walk frequency noise have Allan variances that go as 1/tau, as
a constant and as tau (IEEE Std 1139; W. J. Riley, Handbook of Frequency Stability Analysis, NIST SP 1065, section 5).
None of them has a variance of its own, but every *contrast* of clock readings has: a weighted sum of them that no
constant offset and no constant rate can change, such as the error of a prediction by the straight line through two
comparisons. Its variance is the sum over pairs of weights times a generalised covariance (G. Matheron, The intrinsic
random functions and their applications, Adv. Appl. Prob. 5 (1973) 439), here

    -a^2 |t| / 2   white,    b^2 t^2 ln|t| / (4 ln 2)   flicker,    c^2 |t|^3 / 4   random walk,

so scaled that the second difference of readings tau apart has the variance 2 tau^2 sigma_y(tau)^2, which is the
definition of the Allan variance (NIST SP 1065, equation 8).
"""

from __future__ import annotations

from dataclasses import dataclass
from itertools import combinations
from typing import TYPE_CHECKING, Any

import numpy as np
import numpy.typing as npt

from ..errors import InvalidInput
from ..exact import FloatArray

if TYPE_CHECKING:
    from .clock_log import ClockLog

__all__ = ["ClockNoise", "allan_deviation"]

_LEAST_RUN = 16


@dataclass(frozen=True)
class ClockNoise:
    """Noise levels of a clock, as Allan deviations.

    Attributes
    ----------
    white_frequency : float
        Allan deviation of the white frequency noise at 1 s; it falls as tau**-1/2.
    flicker_frequency : float
        Allan deviation of the flicker frequency noise, at any tau: the floor.
    random_walk_frequency : float
        Allan deviation of the random-walk frequency noise at 1 s (a small number: it rises as tau**1/2).
    white_phase_s : float
        Standard deviation of white phase noise, s; each reading has its own.

    Raises
    ------
    InvalidInput
        For levels that are negative, not finite, or all zero.
    """

    white_frequency: float = 0.0
    flicker_frequency: float = 0.0
    random_walk_frequency: float = 0.0
    white_phase_s: float = 0.0

    def __post_init__(self) -> None:
        levels = vars(self)
        for name, value in levels.items():
            if isinstance(value, bool) or not isinstance(value, int | float) or not 0.0 <= value < np.inf:
                raise InvalidInput(f"{name} is a level of noise, finite and zero or more, got {value!r}")
        if not any(levels.values()):
            raise InvalidInput(f"a clock without noise does not exist: give one or more of {', '.join(levels)}")

    def __str__(self) -> str:
        return ", ".join(f"{name} {value:.3g}" for name, value in vars(self).items() if value)

    def deviation(self, tau_s: npt.ArrayLike) -> FloatArray:
        """Allan deviation at averaging times, of any shape (NIST SP 1065, section 5)."""
        tau = np.asarray(tau_s, dtype=np.float64)
        if not np.all(tau > 0.0):
            raise InvalidInput("averaging times are above zero", mask=~(tau > 0.0))
        return np.asarray(
            np.sqrt(
                self.white_frequency**2 / tau
                + self.flicker_frequency**2
                + self.random_walk_frequency**2 * tau
                + 3.0 * (self.white_phase_s / tau) ** 2
            )
        )

    def contrast_s(self, times_s: npt.ArrayLike, weights: npt.ArrayLike) -> FloatArray:
        """Give the standard deviation of weighted sums of the clock's readings, s.

        Parameters
        ----------
        times_s : (..., k) array
            When the readings are made; a time that comes twice is one reading.
        weights : (..., k) array
            They add up to zero, also when multiplied by the times.

        Raises
        ------
        InvalidInput
            For weights that an offset or a rate of the clock would change: there is no such deviation.
        """
        times, weight = np.broadcast_arrays(np.asarray(times_s, np.float64), np.asarray(weights, np.float64))
        # Times in units of their range, or the cubes and logarithms lose digits; a unit drops out of every contrast.
        origin = times[..., :1]
        unit = np.maximum(np.ptp(times, axis=-1, keepdims=True), np.finfo(np.float64).tiny)
        times = (times - origin) / unit
        size = np.abs(weight).sum(axis=-1)
        loose = np.maximum(np.abs(weight.sum(axis=-1)), np.abs((weight * times).sum(axis=-1))) > 1e-6 * size
        if loose.any():
            raise InvalidInput("these weights are no contrast: an offset or a rate would change the sum", mask=loose)
        unit = unit[..., 0]
        white, flicker, walk, alike = (np.zeros(size.shape) for _ in range(4))
        for i, j in combinations(range(times.shape[-1]), 2):
            apart = np.abs(times[..., i] - times[..., j])
            pair = 2.0 * weight[..., i] * weight[..., j]
            white -= pair * apart / 2.0
            walk += pair * apart**3 / 4.0
            flicker += pair * apart**2 * np.log(np.where(apart > 0.0, apart, 1.0))
            alike += np.where(apart == 0.0, pair, 0.0)
        alike += (weight**2).sum(axis=-1)
        total = (
            self.white_frequency**2 * unit * white
            + self.flicker_frequency**2 * unit**2 * flicker / (4.0 * np.log(2.0))
            + self.random_walk_frequency**2 * unit**3 * walk
            + self.white_phase_s**2 * alike
        )
        # Right at a reading the sum is zero but for roundings of either sign.
        return np.asarray(np.sqrt(np.maximum(total, 0.0)))

    def prediction_s(self, ahead_s: npt.ArrayLike, fit_s: npt.ArrayLike) -> FloatArray:
        """Give the standard deviation of a prediction along the straight line through two readings, s.

        Parameters
        ----------
        ahead_s : float array
            From the later of the two readings to the instant predicted, s.
        fit_s : float array
            From the earlier to the later, s.

        Notes
        -----
        White frequency noise alone gives a sqrt(ahead (1 + ahead/fit)), flicker noise sqrt(2) b ahead where both are
        equal, random walk c ahead sqrt(ahead + fit). The best that any prediction can do is a sqrt(ahead),
        b ahead / sqrt(ln 2) and c ahead**1.5 (D. W. Allan, Time and frequency characterization, estimation, and
        prediction of precision clocks and oscillators, IEEE Trans. UFFC-34 (1987) 647, table II).
        """
        ahead, fit = np.broadcast_arrays(np.asarray(ahead_s, np.float64), np.asarray(fit_s, np.float64))
        bad = ~((ahead >= 0.0) & (fit > 0.0))
        if bad.any():
            raise InvalidInput("a prediction goes ahead by zero or more seconds from a fit of more than zero", mask=bad)
        part = ahead / fit
        times = np.stack([-fit, np.zeros(fit.shape), ahead], axis=-1)
        return self.contrast_s(times, np.stack([part, -1.0 - part, np.ones(fit.shape)], axis=-1))

    # ---- ways in ---------------------------------------------------------------------------------

    @classmethod
    def from_deviation(
        cls, tau_s: npt.ArrayLike, deviation: npt.ArrayLike, *, degrees_of_freedom: npt.ArrayLike = 1.0
    ) -> ClockNoise:
        """Fit the levels to a curve of Allan deviations.

        The Allan variances are fitted by least squares, each to the same relative error (or, with
        `degrees_of_freedom`, to one of sqrt(2 / that)), by levels that are zero or more.

        Parameters
        ----------
        tau_s, deviation : (n,) arrays
            Averaging times, s, and Allan deviations there; all above zero.
        degrees_of_freedom : (n,) array
            Of each deviation.
        """
        try:
            tau, adev, freedom = (
                np.array(part, dtype=np.float64)
                for part in np.broadcast_arrays(np.atleast_1d(tau_s), deviation, degrees_of_freedom)
            )
        except (TypeError, ValueError) as error:
            raise InvalidInput(f"averaging times and deviations are numbers, as many of each: {error}") from error
        bad = ~np.isfinite([tau, adev, freedom]).all(axis=0) | ~((tau > 0.0) & (adev > 0.0) & (freedom > 0.0))
        if tau.ndim != 1 or bad.any():
            raise InvalidInput("averaging times and Allan deviations are finite and above zero", mask=bad)
        scale = np.sqrt(freedom) / adev**2
        laws = np.stack([1.0 / tau, np.ones(len(tau)), tau, 3.0 / tau**2]) * scale
        unit = np.linalg.norm(laws, axis=1)
        best: tuple[float, Any] = (np.inf, None)
        # Least squares with levels of zero or more: the best of all that are positive where they are not left out.
        for count in range(1, min(4, len(tau)) + 1):
            for chosen in combinations(range(4), count):
                level, *_ = np.linalg.lstsq((laws[list(chosen)] / unit[list(chosen), None]).T, scale * adev**2)
                if np.all(level >= 0.0):
                    variances = np.zeros(4)
                    variances[list(chosen)] = level / unit[list(chosen)]
                    miss = float(np.sum((variances @ laws - scale * adev**2) ** 2))
                    if miss < best[0] * (1.0 - 1e-12):
                        best = miss, variances
        return cls(*(float(level) for level in np.sqrt(best[1])))

    @classmethod
    def from_log(cls, log: ClockLog) -> ClockNoise:
        """Estimate the levels from the longest evenly spaced run of a log, between gaps and rate steps.

        Overlapping Allan deviations at 1, 2, 4 ... spacings are fitted as by `from_deviation`. What the comparisons
        themselves scatter by comes out as white phase noise. A log tells nothing of what is shorter than its spacing.

        Raises
        ------
        InvalidInput
            For a log without a run of 16 comparisons.
        """
        spacing_s, phase_s = log.longest_run()
        if len(phase_s) < _LEAST_RUN:
            raise InvalidInput(
                f"the longest evenly spaced run of {log.name!r} has {len(phase_s)} comparisons; {_LEAST_RUN} or more "
                "are needed to tell its noise"
            )
        tau_s, deviation = allan_deviation(phase_s, spacing_s)
        if not np.all(deviation > 0.0):
            raise InvalidInput(f"the offsets of {log.name!r} lie on a straight line, without any noise to be measured")
        freedom = len(phase_s) * spacing_s / tau_s
        return cls.from_deviation(tau_s, deviation, degrees_of_freedom=freedom)


def allan_deviation(phase_s: npt.ArrayLike, spacing_s: float) -> tuple[FloatArray, FloatArray]:
    """Overlapping Allan deviations at 1, 2, 4 ... spacings, up to a quarter of the record.

    Parameters
    ----------
    phase_s : (n,) array
        Offsets of the clock, evenly spaced, s; n >= 3.
    spacing_s : float
        From one to the next, s.

    Returns
    -------
    tau_s, deviation : (m,) arrays

    Source: NIST SP 1065, equation 11.
    """
    phase = np.asarray(phase_s, dtype=np.float64)
    if phase.ndim != 1 or len(phase) < 3 or not np.isfinite(phase).all() or not 0.0 < spacing_s < np.inf:
        raise InvalidInput("an Allan deviation needs three or more finite offsets in a row, and a spacing above zero")
    steps = [2**k for k in range(int(np.log2(max((len(phase) - 1) // 4, 1))) + 1)]
    tau = np.array(steps) * spacing_s
    second = [phase[2 * m :] - 2.0 * phase[m:-m] + phase[: -2 * m] for m in steps]
    return tau, np.array([np.sqrt(np.mean(d**2) / 2.0) for d in second]) / tau
