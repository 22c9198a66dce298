"""Quadrature with error control: rates over panels that are halved until the halves agree with the whole.

On each panel the rate is the polynomial through its Gauss-Legendre nodes. A panel is done when that polynomial meets
the rate at all nodes of its two halves to the tolerance; the halves, which are better by orders of magnitude, are kept.
The integral is a Chebyshev series on each.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from functools import lru_cache
from typing import Final, TypeAlias

import numpy as np
from numpy.polynomial import chebyshev, legendre

from ..errors import NotConverged
from ..exact import FloatArray

__all__ = ["TOLERANCE", "Integral", "integrate"]

TOLERANCE: Final = 1e-19
"""Largest error of a rate, relative to which panels are halved."""

_NODES: Final = 12
_MOST_HALVINGS: Final = 40
_AT_ONCE: Final = 4096
_MOST_PANELS: Final = 2**16

Rates: TypeAlias = Callable[[FloatArray], FloatArray]
"""From offsets (...) in seconds to rates (rows, ...)."""
_Panels: TypeAlias = tuple[FloatArray, FloatArray, FloatArray]
"""Starts, lengths, and rates at the nodes."""


@dataclass(frozen=True, eq=False)
class Integral:
    """Integrals of some rates from 0 on, as Chebyshev series on panels.

    Attributes
    ----------
    starts_s, lengths_s : float array (panels,)
        Where panels begin, and how long they are.
    coefficients : float array (panels, rows, terms)
        Each panel's constant holds what the panels before it add up to.
    totals_s : float array (rows,)
        Over all panels.
    """

    starts_s: FloatArray
    lengths_s: FloatArray
    coefficients: FloatArray
    totals_s: FloatArray

    def value(self, offset_s: FloatArray, rows: slice) -> FloatArray:
        """Integrals from the first panel's start to offsets (n,): (rows, n), seconds; by Clenshaw's recurrence.

        Past the ends, by roundings, they keep their value there.
        """
        panel = np.clip(np.searchsorted(self.starts_s, offset_s, side="right") - 1, 0, self.starts_s.size - 1)
        argument = np.clip(2.0 * (offset_s - self.starts_s[panel]) / self.lengths_s[panel] - 1.0, -1.0, 1.0)
        series = self.coefficients[panel, rows].transpose(2, 1, 0)
        b1 = b2 = np.zeros(series.shape[1:])
        for k in range(len(series) - 1, 0, -1):
            b1, b2 = 2.0 * argument * b1 - b2 + series[k], b1
        return np.asarray(argument * b1 - b2 + series[0])


@lru_cache(maxsize=1)
def _matrices() -> tuple[FloatArray, FloatArray, FloatArray]:
    """Nodes on (-1, 1); from rates there to those at the nodes of both halves; to the Chebyshev integral from -1."""
    node, weight = legendre.leggauss(_NODES)
    order = np.arange(_NODES)
    # Discrete orthogonality at Gauss nodes gives the Legendre coefficients of the interpolating polynomial.
    to_legendre = legendre.legvander(node, _NODES - 1).T * weight * (order[:, None] + 0.5)
    halves = np.concatenate((0.5 * (node - 1.0), 0.5 * (node + 1.0)))
    to_integral = np.zeros((_NODES + 1, _NODES))
    for k, row in enumerate(np.eye(_NODES)):
        series = chebyshev.chebint(chebyshev.poly2cheb(legendre.leg2poly(row)), lbnd=-1)
        to_integral[: len(series), k] = series
    found = node, legendre.legvander(halves, _NODES - 1) @ to_legendre, to_integral @ to_legendre
    arrays = [np.asarray(array, dtype=np.float64) for array in found]
    for array in arrays:
        array.flags.writeable = False
    return arrays[0], arrays[1], arrays[2]


def integrate(rates: Rates, edges_s: FloatArray, what: str) -> Integral:
    """Integrate rates from the first to the last of some edges, between which they are smooth.

    Parameters
    ----------
    rates : callable
        Several rates at once, dimensionless.
    edges_s : float array (n,)
        Ends of the first panels, increasing; the first is the origin of the offsets of the result.
    what : str
        Whose rate it is, for messages.

    Raises
    ------
    NotConverged
        When a rate jumps, so that halving does not help.
    """
    kept: list[_Panels] = []
    for i in range(0, edges_s.size - 1, _AT_ONCE):
        kept.extend(_refined(rates, edges_s[i : i + _AT_ONCE + 1], what))
    return _joined(kept)


def _refined(rates: Rates, edges_s: FloatArray, what: str) -> list[_Panels]:
    """Halve the panels between some edges until each is done."""
    node, to_halves, _ = _matrices()
    starts, lengths = edges_s[:-1], np.diff(edges_s)

    def at_nodes(starts: FloatArray, lengths: FloatArray) -> FloatArray:
        return rates(starts[:, None] + (node + 1.0) * (0.5 * lengths[:, None]))

    values = at_nodes(starts, lengths)
    kept: list[_Panels] = []
    for _ in range(_MOST_HALVINGS):
        half_starts = np.stack((starts, starts + 0.5 * lengths), axis=1).ravel()
        half_lengths = np.repeat(0.5 * lengths, 2)
        found = at_nodes(half_starts, half_lengths)
        foretold = (values @ to_halves.T).reshape(found.shape)
        # The last digits of a rate are rounding, which no halving removes.
        rounding = 1024.0 * np.finfo(np.float64).eps * np.abs(found).max(axis=(1, 2), keepdims=True)
        off = np.abs(foretold - found) > np.maximum(TOLERANCE, rounding)
        again = np.repeat(off.any(axis=(0, 2)).reshape(-1, 2).any(axis=1), 2)
        kept.append((half_starts[~again], half_lengths[~again], found[:, ~again]))
        if not again.any():
            return kept
        starts, lengths, values = half_starts[again], half_lengths[again], found[:, again]
        if starts.size > _MOST_PANELS:
            break
    raise NotConverged(
        f"the rate of {what} cannot be integrated to {TOLERANCE:g}: it jumps or is rough {starts[0]:.6f} s after the "
        "start of its first panel; give a trajectory whose velocity goes with its positions (method='hermite')"
    )


def _joined(kept: list[_Panels]) -> Integral:
    """Panels (starts, lengths, rates at nodes) in their order, as one integral."""
    _, _, to_integral = _matrices()
    all_starts = np.concatenate([part[0] for part in kept])
    order = np.argsort(all_starts, kind="stable")
    all_starts = all_starts[order]
    all_lengths = np.concatenate([part[1] for part in kept])[order]
    all_values = np.concatenate([part[2] for part in kept], axis=1)[:, order]
    coefficients = ((all_values @ to_integral.T) * (0.5 * all_lengths[:, None])).transpose(1, 0, 2)
    # A series at the end of its panel is the sum of its coefficients.
    sums = np.cumsum(coefficients.sum(axis=2), axis=0)
    coefficients = np.ascontiguousarray(coefficients)
    coefficients[1:, :, 0] += sums[:-1]
    return Integral(all_starts, all_lengths, coefficients, sums[-1])
