"""How much a series of residuals can tell: how many independent values it is worth, and its size without outliers."""

from __future__ import annotations

import math
from typing import Final

import numpy as np

from ..exact import BoolArray, FloatArray

__all__ = ["independent_values", "outliers", "rms"]

_LEAST: Final = 2.0
_PER_SIGMA: Final = 1.4826  # standard deviation over median absolute deviation, of a normal distribution


def rms(values: FloatArray) -> float:
    """Root mean square, formed so that neither 1e-18 s nor 1e9 s are lost; 0 of nothing."""
    largest = float(np.max(np.abs(values), initial=0.0))
    return largest * math.sqrt(float(np.mean((values / largest) ** 2))) if largest else 0.0


def independent_values(residual: FloatArray) -> float:
    """Number of independent values that residuals in order of time are worth, from 2 to their number.

    The variance of a mean of correlated values is larger by 1 + 2 sum(rho_k). The sum is taken as for noise of first
    order, (1 + rho_1)/(1 - rho_1), and with falling weights over sqrt(n) lags (Bartlett; Newey and West 1987,
    Econometrica 55, 703); the larger counts. The mean is not taken out: an offset that nothing explains is
    correlated, too.
    """
    n = residual.size
    largest = float(np.max(np.abs(residual), initial=0.0))
    if n < 4 or not largest:
        return float(max(n, _LEAST))
    x = residual / largest
    power = float(x @ x)
    lags = max(2, int(math.sqrt(n)))
    rho = np.array([float(x[:-k] @ x[k:]) / power for k in range(1, lags + 1)])
    first = min(max(float(rho[0]), 0.0), 1.0 - 1e-9)
    windowed = 1.0 + 2.0 * float(np.sum((1.0 - np.arange(1, lags + 1) / (lags + 1)) * rho))
    return float(max(_LEAST, n / max(1.0, (1.0 + first) / (1.0 - first), windowed)))


def outliers(residual: FloatArray, limit: float = 6.0, share: float = 0.05) -> BoolArray:
    """Values further out than `limit` robust standard deviations; none if more than `share` of all are."""
    centre = float(np.median(residual))
    spread = _PER_SIGMA * float(np.median(np.abs(residual - centre)))
    far = np.abs(residual - centre) > limit * spread
    if not spread or np.count_nonzero(far) > share * residual.size:
        return np.zeros(residual.shape, dtype=np.bool_)
    return np.asarray(far)
