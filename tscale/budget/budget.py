"""Budget: the uncertainty of a chain's results, line by line (JCGM 100:2008, clause 8)."""

from __future__ import annotations

import json
import operator
from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from ..errors import InvalidInput
from ..exact import FloatArray
from .contribution import Contribution, Omission, by_source
from .correlation import Common
from .law import coverage_factor, effective_dof
from .table import number, table_text

__all__ = ["Budget", "BudgetLine"]

_LARGEST_COVARIANCE: Final = 4096


@dataclass(frozen=True, eq=False)
class BudgetLine:
    """One input quantity; arrays have the shape of the instants.

    Attributes
    ----------
    source, quantity, unit : str
        What it is counted under, what it is, and its unit.
    value : float array or None
        Its estimate.
    sigma : float array
        Its standard uncertainty, in its unit.
    sensitivity : float array
        d(result)/d(quantity), s per unit, signed.
    contribution_s : float array
        Standard uncertainty of the result by this quantity alone, s.
    share_percent : float array
        Its square as a part of the combined variance, per cent; correlated quantities make the sum differ from 100.
    kind, distribution, correlation : str
        Type A or B; its distribution; how its errors go together between instants.
    dof : float
        Degrees of freedom.
    """

    source: str
    quantity: str
    unit: str
    value: FloatArray | None
    sigma: FloatArray
    sensitivity: FloatArray
    contribution_s: FloatArray
    share_percent: FloatArray
    kind: str
    distribution: str
    correlation: str
    dof: float


class Budget:
    """The uncertainty budget of results; made by `chain.budget(t)` or `budget_of`.

    Attributes
    ----------
    contributions : tuple of Contribution
        The input quantities.
    not_included : tuple of Omission
        What is not in the budget, and why.
    title : str
        What was measured: the chain.
    shape : tuple of int
        Of the instants.
    """

    def __init__(
        self,
        contributions: Sequence[Contribution],
        not_included: Sequence[Omission],
        shape: tuple[int, ...],
        *,
        title: str = "",
        correlations: Sequence[tuple[str, str, float]] = (),
        factor: float = 2.0,
        probability: float | None = None,
    ) -> None:
        self.contributions = tuple(contributions)
        self.not_included = tuple(not_included)
        self.shape = shape
        self.title = title
        self.correlations = tuple(correlations)
        self.probability = probability
        self._pairs = _pairs(self.contributions, self.correlations)
        self._variance = self._combined()
        self.coverage_factor = self._factors(factor)

    # ---- results ---------------------------------------------------------------------------------

    @property
    def combined_s(self) -> FloatArray:
        """Combined standard uncertainty, s: of each instant by itself (JCGM 100:2008, eq. 10 and 13)."""
        return np.asarray(np.sqrt(self._variance))

    @property
    def expanded_s(self) -> FloatArray:
        """Expanded uncertainty, s: `coverage_factor` times the combined one."""
        return np.asarray(self.coverage_factor * self.combined_s)

    @property
    def effective_dof(self) -> FloatArray:
        """Effective degrees of freedom (Welch-Satterthwaite, JCGM 100:2008, eq. G.2b); infinite without type A."""
        parts = [part.signed_s for part in self.contributions]
        return effective_dof(parts, [part.dof for part in self.contributions], self.combined_s)

    @property
    def lines(self) -> tuple[BudgetLine, ...]:
        """One line per input quantity, in the order of the chain."""
        total = np.where(self._variance > 0.0, self._variance, 1.0)
        return tuple(
            BudgetLine(
                part.source,
                part.quantity,
                part.unit,
                part.value,
                part.sigma,
                part.sensitivity,
                np.abs(part.signed_s),
                100.0 * part.signed_s**2 / total,
                part.kind,
                part.distribution,
                part.correlation.words,
                part.dof,
            )
            for part in self.contributions
        )

    def by_source(self) -> dict[str, FloatArray]:
        """Standard uncertainty of the result by source, s: the lines of one source in quadrature."""
        return dict(by_source(self.contributions))

    # ---- between instants ------------------------------------------------------------------------

    def covariance(self) -> FloatArray:
        """Covariance between the results at all instants, s2, (n, n) for n instants in flattened order.

        Raises
        ------
        InvalidInput
            For more than 4096 instants: 134 MB and more. Ask for some of them, or for `mean_sigma_s`, which needs no
            such matrix.
        """
        n = int(np.prod(self.shape, dtype=np.int64))
        if n > _LARGEST_COVARIANCE:
            raise InvalidInput(
                f"the covariance of {n} instants would be a matrix of {n}^2 = {n * n / 1e6:.0f} million numbers; ask "
                f"for up to {_LARGEST_COVARIANCE} of them, as in chain.budget(t[::{-(-n // _LARGEST_COVARIANCE)}]), or "
                "for mean_sigma_s() of all"
            )
        total = np.zeros((n, n))
        flat = [self._flat(part) for part in self.contributions]
        for part, signed in zip(self.contributions, flat, strict=True):
            total += np.outer(signed, signed) * part.correlation.matrix(n)
        for a, b, r in self._pairs:
            cross = np.outer(flat[a], flat[b])
            total += r * (cross + cross.T)
        return total

    def mean_sigma_s(self, weights: npt.ArrayLike | None = None) -> float:
        """Standard uncertainty of the mean of all results, s: what is common to all is not averaged away.

        Parameters
        ----------
        weights : float array, optional
            Of a weighted mean, in the shape of the instants; any linear combination of sum 0 as well, such as
            (-1, 1) for a difference, which is then not divided by its sum.
        """
        n = int(np.prod(self.shape, dtype=np.int64))
        try:
            given = np.ones(self.shape) if weights is None else np.asarray(weights, dtype=np.float64)
            own = np.broadcast_to(given, self.shape).ravel()
        except (TypeError, ValueError) as error:
            raise InvalidInput(f"weights are numbers in the shape of the instants, {self.shape}: {error}") from error
        if n == 0 or not np.isfinite(own).all() or not own.any():
            raise InvalidInput("a mean needs instants, and finite weights that are not all zero")
        total = float(own.sum())
        own = own if abs(total) < 1e-12 * float(np.abs(own).sum()) else own / total
        flat = [self._flat(part) * own for part in self.contributions]
        variance = sum(
            part.correlation.variance_of_sum(signed) for part, signed in zip(self.contributions, flat, strict=True)
        )
        for a, b, r in self._pairs:
            variance += 2.0 * r * float(flat[a].sum() * flat[b].sum())
        return float(np.sqrt(max(variance, 0.0)))

    # ---- for readers -----------------------------------------------------------------------------

    def table(self, instant: int = 0) -> str:
        """A readable budget of one instant (`instant` counts along the flattened array)."""
        row = self._row(instant)
        return table_text(self, row)

    def to_dict(self) -> dict[str, Any]:
        """All of it as plain lists and numbers, for JSON; infinite degrees of freedom are None."""
        return {
            "title": self.title,
            "shape": list(self.shape),
            "combined_s": self.combined_s.ravel().tolist(),
            "expanded_s": self.expanded_s.ravel().tolist(),
            "coverage_factor": np.broadcast_to(self.coverage_factor, self.shape).ravel().tolist(),
            "level_of_confidence": self.probability,
            "effective_degrees_of_freedom": [number(v) for v in self.effective_dof.ravel().tolist()],
            "lines": [
                {
                    "source": line.source,
                    "quantity": line.quantity,
                    "unit": line.unit,
                    "type": line.kind,
                    "distribution": line.distribution,
                    "between_instants": line.correlation,
                    "degrees_of_freedom": number(line.dof),
                    "value": None if line.value is None else self._list(line.value),
                    "standard_uncertainty": self._list(line.sigma),
                    "sensitivity_s_per_unit": self._list(line.sensitivity),
                    "contribution_s": self._list(line.contribution_s),
                    "share_percent": self._list(line.share_percent),
                }
                for line in self.lines
            ],
            "correlations": [list(item) for item in self.correlations],
            "not_included": [{"source": item.source, "reason": item.reason} for item in self.not_included],
        }

    def to_json(self, *, indent: int | None = 2) -> str:
        """`to_dict` as JSON text; the same budget gives the same bytes."""
        return json.dumps(self.to_dict(), indent=indent, allow_nan=False, ensure_ascii=False)

    def __repr__(self) -> str:
        return f"<Budget of {len(self.contributions)} lines, shape={self.shape}>"

    # ---- inside ----------------------------------------------------------------------------------

    def _combined(self) -> FloatArray:
        total = np.zeros(self.shape)
        for part in self.contributions:
            total = total + part.signed_s**2
        for a, b, r in self._pairs:
            total = total + 2.0 * r * self.contributions[a].signed_s * self.contributions[b].signed_s
        return np.maximum(total, 0.0)

    def _factors(self, factor: float) -> FloatArray:
        if self.probability is None:
            if isinstance(factor, (bool, str)) or not 0.0 < float(factor) < np.inf:
                raise InvalidInput(f"a coverage factor is a positive number, usually 2; got {factor!r}")
            return np.asarray(float(factor))
        dof = np.floor(np.minimum(self.effective_dof, 1e9))
        found, where = np.unique(dof, return_inverse=True)
        factors = np.array([coverage_factor(self.probability, value) for value in found.tolist()])
        return np.asarray(factors[where].reshape(self.shape))

    def _flat(self, part: Contribution) -> FloatArray:
        return np.broadcast_to(part.signed_s, self.shape).ravel()

    def _list(self, values: npt.ArrayLike) -> list[float]:
        return [float(value) for value in np.broadcast_to(np.asarray(values), self.shape).ravel()]

    def _row(self, instant: Any) -> int:
        size = int(np.prod(self.shape, dtype=np.int64))
        try:
            row = operator.index(instant)
        except TypeError as error:
            raise InvalidInput(f"instant is the number of an instant, from 0; got {instant!r}") from error
        if not -size <= row < size:
            raise InvalidInput(f"instant {row} is not among the {size} of this budget")
        return row % size


def _pairs(
    contributions: Sequence[Contribution], correlations: Sequence[tuple[str, str, float]]
) -> list[tuple[int, int, float]]:
    """Numbers of the correlated contributions, and their coefficient."""
    names = [part.quantity for part in contributions]
    found = []
    for first, second, r in correlations:
        for name in (first, second):
            if name not in names:
                raise InvalidInput(f"no quantity {name!r} to correlate in this budget; it has {', '.join(names)}")
            if not isinstance(contributions[names.index(name)].correlation, Common):
                raise InvalidInput(
                    f"the errors of {name!r} differ from instant to instant; correlations join quantities whose errors "
                    "are common to all instants"
                )
        found.append((names.index(first), names.index(second), float(r)))
    if found:
        coefficients = np.eye(len(names))
        for a, b, r in found:
            coefficients[a, b] = coefficients[b, a] = r
        if np.linalg.eigvalsh(coefficients)[0] < -1e-12:
            raise InvalidInput("these correlation coefficients contradict each other: their matrix has negative roots")
    return found
