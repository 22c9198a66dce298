"""The law of propagation of uncertainty for any model of any quantities (JCGM 100:2008), with its own check by
Monte Carlo (JCGM 101:2008).

The same law that chains use, for the measurements around them: a calibration, an antenna delay, a gravity survey.
"""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import Any, Final, TypeAlias

import numpy as np
import numpy.typing as npt

from ..errors import InvalidInput
from ..exact import FloatArray
from .contribution import Distribution, Kind
from .correlation import unit_draws
from .law import coverage_factor, effective_dof
from .table import aligned

__all__ = ["Evaluation", "Quantity", "correlation_of_readings", "evaluate", "sampled"]

Model: TypeAlias = Callable[..., Any]
Correlations: TypeAlias = "Mapping[tuple[str, str], float] | npt.ArrayLike | None"

# Differences are taken over a tenth of a standard uncertainty: rounding and the next order both stay below 1e-6.
_STEP: Final = 0.1
_DIVISORS: Final = {"rectangular": math.sqrt(3.0), "triangular": math.sqrt(6.0), "arcsine": math.sqrt(2.0)}


@dataclass(frozen=True)
class Quantity:
    """An input quantity: its estimate and the standard uncertainty of that.

    Parameters
    ----------
    name : str
    value, sigma : float
        Estimate and standard uncertainty, in one unit.
    kind : {"A", "B"}
        Type of evaluation.
    distribution : str
        normal, rectangular, triangular or arcsine.
    dof : float
        Degrees of freedom of `sigma`.
    unit : str
    """

    name: str
    value: float
    sigma: float
    kind: Kind = "B"
    distribution: Distribution = "normal"
    dof: float = math.inf
    unit: str = ""

    def __post_init__(self) -> None:
        if not (math.isfinite(self.value) and math.isfinite(self.sigma) and self.sigma >= 0.0 and self.dof > 0.0):
            raise InvalidInput(
                f"{self.name}: the value must be finite, sigma finite and zero or more, dof positive; got "
                f"{self.value!r}, {self.sigma!r}, {self.dof!r}"
            )

    @classmethod
    def of_readings(cls, name: str, readings: npt.ArrayLike, unit: str = "") -> Quantity:
        """Mean of repeated readings with its standard uncertainty, type A (4.2)."""
        data = _readings(name, readings)
        n = len(data)
        return cls(name, float(data.mean()), float(data.std(ddof=1) / math.sqrt(n)), "A", "normal", n - 1, unit)

    @classmethod
    def within(
        cls,
        name: str,
        value: float,
        half_width: float,
        distribution: Distribution = "rectangular",
        *,
        dof: float = math.inf,
        unit: str = "",
    ) -> Quantity:
        """A quantity known to lie within value +- half_width (4.3.7 to 4.3.9)."""
        if distribution not in _DIVISORS:
            raise InvalidInput(f"bounds go with {', '.join(_DIVISORS)}; got {distribution!r}")
        return cls(name, value, half_width / _DIVISORS[distribution], "B", distribution, dof, unit)

    @classmethod
    def combined(cls, name: str, value: float, parts: Sequence[tuple[float, float]], unit: str = "") -> Quantity:
        """A quantity with several effects upon it, each given as (standard uncertainty, degrees of freedom)."""
        sigma = math.sqrt(sum(part**2 for part, _ in parts))
        dof = float(effective_dof([part for part, _ in parts], [dof for _, dof in parts], sigma))
        return cls(name, value, sigma, "B", "normal", dof, unit)


class Evaluation:
    """Result of a model: one value, or several from the same inputs.

    Attributes
    ----------
    value : float array
        () or (m,): the model at the estimates.
    sensitivities : float array
        (n,) or (m, n): derivatives of the model by the inputs.
    covariance : float array
        () or (m, m): of the results.
    quantities : tuple of Quantity
    """

    def __init__(
        self,
        value: FloatArray,
        sensitivities: FloatArray,
        coefficients: FloatArray,
        quantities: Sequence[Quantity],
        higher: FloatArray,
    ) -> None:
        self.value = value
        self.sensitivities = sensitivities
        self.quantities = tuple(quantities)
        self._coefficients = coefficients
        signed = sensitivities * np.array([q.sigma for q in quantities])
        self.contributions = signed
        self.covariance = np.asarray(signed @ coefficients @ signed.T)
        if np.ndim(higher):
            self.covariance = self.covariance + np.diag(higher)
        else:
            self.covariance = np.asarray(self.covariance + higher)

    @property
    def sigma(self) -> FloatArray:
        """Combined standard uncertainty (5.1, 5.2)."""
        return np.sqrt(self.covariance if self.covariance.ndim == 0 else np.diag(self.covariance))

    @property
    def correlation(self) -> FloatArray:
        """Correlation coefficients between the results."""
        return np.asarray(self.covariance / np.multiply.outer(self.sigma, self.sigma))

    @property
    def effective_dof(self) -> FloatArray:
        """Effective degrees of freedom (G.4.1); for independent inputs only."""
        if np.any(self._coefficients != np.eye(len(self.quantities))) and any(
            math.isfinite(q.dof) for q in self.quantities
        ):
            raise InvalidInput(
                "the formula for effective degrees of freedom holds for independent inputs; these are correlated: "
                "state a coverage factor instead of a level of confidence"
            )
        dof = [q.dof for q in self.quantities]
        return effective_dof(list(np.moveaxis(self.contributions, -1, 0)), dof, self.sigma)

    def expanded(self, *, factor: float | None = None, probability: float | None = None) -> FloatArray:
        """Expanded uncertainty by a coverage factor (2 if nothing is given) or by a level of confidence (G.4)."""
        if probability is None:
            return np.asarray((2.0 if factor is None else factor) * self.sigma)
        if factor is not None:
            raise InvalidInput("give a coverage factor or a level of confidence, not both")
        dof = self.effective_dof
        factors = [coverage_factor(probability, v) for v in np.ravel(dof).tolist()]
        return np.asarray(np.reshape(factors, dof.shape) * self.sigma)

    def table(self) -> str:
        """One row per input, then the results."""
        several = self.value.ndim == 1
        many = range(len(self.value)) if several else range(1)
        head = ["quantity", "value", "unit", "u", "type", "distribution", "dof"]
        head += [f"u_i(y{i + 1 if several else ''})" for i in many]
        rows: list[Sequence[str]] = [head]
        for number, q in enumerate(self.quantities):
            parts = np.atleast_2d(self.contributions)[:, number]
            cells = [q.name, f"{q.value:.9g}", q.unit, f"{q.sigma:.3g}", q.kind, q.distribution, f"{q.dof:.3g}"]
            rows.append([*cells, *(f"{abs(part):.3g}" for part in parts)])
        lines = aligned(rows, left=(0, 2, 4, 5))
        for value, sigma in zip(np.atleast_1d(self.value), np.atleast_1d(self.sigma), strict=True):
            lines.append(f"result {value:.9g}, combined standard uncertainty {sigma:.3g}")
        return "\n".join(lines)


def evaluate(
    model: Model,
    quantities: Sequence[Quantity],
    correlation: Correlations = None,
    *,
    second_order: bool = False,
) -> Evaluation:
    """Propagate standard uncertainties through a model.

    Parameters
    ----------
    model : callable
        Takes one float per quantity, in their order; returns a float, or several in a tuple.
    quantities : sequence of Quantity
    correlation : matrix or mapping, optional
        Correlation coefficients of the inputs: (n, n), or {(name, name): r}.
    second_order : bool
        Add the terms of the next order (5.1.2, note), for independent inputs; they matter where a first derivative
        is zero.

    Raises
    ------
    InvalidInput
        For a correlation that is none, or a model whose result is not finite.
    """
    coefficients = _coefficients(quantities, correlation)
    x = np.array([q.value for q in quantities], dtype=np.float64)
    u = np.array([q.sigma for q in quantities], dtype=np.float64)
    scale = np.where(u > 0.0, u, 1e-6 * np.maximum(np.abs(x), 1.0))

    def f(*moves: tuple[int, float]) -> FloatArray:
        at = x.copy()
        for i, steps in moves:
            at[i] += steps * scale[i]
        return np.asarray(model(*at.tolist()), dtype=np.float64)

    value = f()
    if value.ndim > 1 or not np.isfinite(value).all():
        raise InvalidInput(f"a model gives a finite number, or several in a tuple; this one gave {value!r}")
    n, h = len(x), _STEP

    def slope(i: int, *moves: tuple[int, float]) -> FloatArray:
        near = f(*moves, (i, h)) - f(*moves, (i, -h))
        far = f(*moves, (i, 2 * h)) - f(*moves, (i, -2 * h))
        return np.asarray((8.0 * near - far) / (12.0 * h))

    slopes = [slope(i) for i in range(n)]
    higher = np.zeros(value.shape)
    if second_order:
        if np.any(coefficients != np.eye(n)):
            raise InvalidInput("terms of the next order are known for independent inputs; these are correlated")
        live = [i for i in range(n) if u[i] > 0.0]
        for i in live:
            for j in live:
                mixed = (slope(i, (j, h)) - slope(i, (j, -h))) / (2.0 * h)
                third = (slope(i, (j, h)) - 2.0 * slopes[i] + slope(i, (j, -h))) / h**2
                higher = higher + 0.5 * mixed**2 + slopes[i] * third
    sensitivities = np.stack(slopes, axis=-1) / scale
    return Evaluation(value, sensitivities, coefficients, quantities, higher)


def sampled(
    model: Model,
    quantities: Sequence[Quantity],
    draws: int = 100_000,
    *,
    seed: int = 0,
    correlation: Correlations = None,
) -> FloatArray:
    """Results of a model for inputs drawn from their distributions (JCGM 101:2008, clause 7).

    The model is called once, with one array of `draws` numbers per quantity. A normal quantity with finite degrees of
    freedom is drawn from Student's distribution about its estimate (JCGM 101:2008, 6.4.9).

    Returns
    -------
    float array
        (draws,), or (m, draws) for several results.
    """
    coefficients = _coefficients(quantities, correlation)
    rng = np.random.default_rng(seed)
    if np.any(coefficients != np.eye(len(quantities))):
        if any(q.distribution != "normal" for q in quantities):
            raise InvalidInput("correlated quantities are drawn from a joint normal distribution; all must be normal")
        values, vectors = np.linalg.eigh(coefficients)
        unit = (vectors * np.sqrt(np.maximum(values, 0.0))) @ rng.standard_normal((len(quantities), draws))
        columns = list(unit)
    else:
        columns = [
            rng.standard_t(q.dof, draws)
            if q.distribution == "normal" and math.isfinite(q.dof)
            else unit_draws(rng, q.distribution, (draws,))
            for q in quantities
        ]
    return np.asarray(model(*(q.value + q.sigma * column for q, column in zip(quantities, columns, strict=True))))


def correlation_of_readings(*columns: npt.ArrayLike) -> FloatArray:
    """Correlation coefficients between means of quantities that were read at the same time (5.2.3)."""
    data = [_readings(f"column {i}", column) for i, column in enumerate(columns)]
    if len({len(column) for column in data}) != 1:
        raise InvalidInput("quantities read at the same time have as many readings each")
    return np.asarray(np.corrcoef(np.stack(data)))


def _readings(name: str, readings: npt.ArrayLike) -> FloatArray:
    data = np.asarray(readings, dtype=np.float64)
    if data.ndim != 1 or len(data) < 2 or not np.isfinite(data).all():
        raise InvalidInput(f"{name}: readings are a list of two or more finite numbers, got shape {data.shape}")
    return data


def _coefficients(quantities: Sequence[Quantity], correlation: Correlations) -> FloatArray:
    names = [q.name for q in quantities]
    if not names or len(set(names)) != len(names):
        raise InvalidInput(f"a model needs quantities of different names, got {', '.join(names) or 'none'}")
    found = np.eye(len(names))
    if isinstance(correlation, Mapping):
        for (first, second), r in correlation.items():
            if first not in names or second not in names or first == second:
                raise InvalidInput(f"no pair {first!r}, {second!r} to correlate among {', '.join(names)}")
            a, b = names.index(first), names.index(second)
            found[a, b] = found[b, a] = r
    elif correlation is not None:
        found = np.array(correlation, dtype=np.float64)
    bad = found.shape != (len(names),) * 2 or not np.allclose(found, found.T) or np.any(np.diag(found) != 1.0)
    if bad or not np.isfinite(found).all() or np.linalg.eigvalsh(found)[0] < -1e-12:
        raise InvalidInput(
            f"correlation coefficients of {len(names)} quantities are a symmetric matrix of {len(names)} rows with "
            "ones on its diagonal and no negative root"
        )
    return found
