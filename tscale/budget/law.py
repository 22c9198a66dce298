"""Degrees of freedom and coverage factors (JCGM 100:2008, annex G)."""

from __future__ import annotations

import math
from collections.abc import Sequence
from statistics import NormalDist
from typing import Final

import numpy as np
import numpy.typing as npt

from ..errors import InvalidInput
from ..exact import FloatArray

__all__ = ["coverage_factor", "effective_dof", "student_t_probability"]

_MANY: Final = 1000


def effective_dof(signed: Sequence[npt.ArrayLike], dof: Sequence[float], combined: npt.ArrayLike) -> FloatArray:
    """Effective degrees of freedom by the Welch-Satterthwaite formula (JCGM 100:2008, eq. G.2b).

    Parameters
    ----------
    signed : sequence of float arrays
        Contributions u_i(y) to the standard uncertainty of the result.
    dof : sequence of float
        Their degrees of freedom; infinite for those that are exactly known.
    combined : float array
        Combined standard uncertainty.

    Returns
    -------
    float array
        Infinite where no contribution has finite degrees of freedom.
    """
    total = np.asarray(combined, dtype=np.float64)
    scale = np.where(total > 0.0, total, 1.0)
    below = np.zeros(total.shape)
    for part, degrees in zip(signed, dof, strict=True):
        if math.isfinite(degrees):
            below = below + (np.asarray(part) / scale) ** 4 / degrees
    with np.errstate(divide="ignore", over="ignore"):
        return np.asarray(np.where(below > 0.0, 1.0 / np.where(below > 0.0, below, 1.0), np.inf))


def coverage_factor(probability: float, dof: float = math.inf) -> float:
    """Coverage factor t_p(dof) of a level of confidence; of the normal distribution for infinite degrees of freedom.

    Degrees of freedom that are no whole number are cut to the next lower one, as JCGM 100:2008, G.4.1 advises.

    Raises
    ------
    InvalidInput
        For a probability outside (0, 1) or fewer than one degree of freedom.
    """
    if not 0.0 < probability < 1.0:
        raise InvalidInput(f"a level of confidence lies between 0 and 1, such as 0.95; got {probability!r}")
    if not dof >= 1.0:
        raise InvalidInput(
            f"{dof:.3g} effective degrees of freedom give no coverage factor: one or more are needed; observe more"
        )
    normal = NormalDist().inv_cdf(0.5 + probability / 2.0)
    if dof > _MANY:
        # Abramowitz and Stegun 26.7.5, two terms: 1e-8 is left.
        first, second = (normal**3 + normal) / 4.0, (5.0 * normal**5 + 16.0 * normal**3 + 3.0 * normal) / 96.0
        return normal + first / dof + second / dof**2
    degrees = math.floor(dof)
    low, high = 0.0, 1.0
    while student_t_probability(high, degrees) < probability:
        low, high = high, 2.0 * high
    while high - low > 1e-12 * high:
        middle = 0.5 * (low + high)
        low, high = (middle, high) if student_t_probability(middle, degrees) < probability else (low, middle)
    return high


def student_t_probability(t: float, dof: int) -> float:
    """Probability that |T| <= t for Student's distribution (Abramowitz and Stegun 26.7.3 and 26.7.4)."""
    angle = math.atan2(t, math.sqrt(dof))
    cosine2, sine = math.cos(angle) ** 2, math.sin(angle)
    if dof % 2:
        total, term = 0.0, math.cos(angle)
        for j in range(1, dof - 1, 2):
            total += term
            term *= cosine2 * (j + 1) / (j + 2)
        return 2.0 / math.pi * (angle + sine * total)
    total, term = 0.0, 1.0
    for j in range(0, dof - 1, 2):
        total += term
        term *= cosine2 * (j + 1) / (j + 2)
    return sine * total
