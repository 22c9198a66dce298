"""A check of a budget by Monte Carlo: the inputs are moved and the chain is run again (JCGM 101:2008)."""

from __future__ import annotations

import operator
from collections.abc import Sequence
from dataclasses import replace
from typing import TYPE_CHECKING, Any, Final, TypeAlias

import numpy as np

from ..errors import InvalidInput, gathered_extrapolations
from ..exact import FloatArray, IntArray
from .assumptions import Assumptions
from .budget import Budget
from .correlation import Exponential, Rows, unit_draws
from .making import budget_of
from .perturbed import OrientationErrors, ShiftedTimeEphemeris, moved_log, moved_source, moved_tt_bipm
from .table import aligned

if TYPE_CHECKING:
    from ..chains import Chain
    from ..instants import Instants

__all__ = ["MonteCarlo", "monte_carlo"]

_MOST_NUMBERS: Final = 50_000_000


class MonteCarlo:
    """Results of a chain for inputs drawn from their distributions, beside the linear law.

    Attributes
    ----------
    deviations_s : float array
        (draws, ...): each result minus that of the chain as it is, s.
    budget : Budget
        The linear law for the same inputs.
    moved : tuple of str
        Quantities whose errors went through the chain, by way of its tables, place and source.
    added : tuple of str
        Quantities without a table to move - noise of readings, bounds of what models leave out, values held past a
        table - whose errors were added to the result by their sensitivities.
    """

    def __init__(self, deviations_s: FloatArray, budget: Budget, moved: Sequence[str], added: Sequence[str]) -> None:
        self.deviations_s = deviations_s
        self.budget = budget
        self.moved = tuple(moved)
        self.added = tuple(added)

    @property
    def draws(self) -> int:
        """Number of draws."""
        return len(self.deviations_s)

    @property
    def mean_s(self) -> FloatArray:
        """Mean deviation of each instant, s: what the linear law takes to be zero."""
        return np.asarray(self.deviations_s.mean(axis=0))

    @property
    def sigma_s(self) -> FloatArray:
        """Standard deviation of each instant, s."""
        return np.asarray(self.deviations_s.std(axis=0, ddof=1))

    @property
    def statistical_error_s(self) -> FloatArray:
        """Standard uncertainty of `sigma_s` itself by the number of draws, sigma / sqrt(2 (M - 1)), s."""
        return np.asarray(self.sigma_s / np.sqrt(2.0 * (self.draws - 1)))

    @property
    def pull(self) -> FloatArray:
        """`sigma_s` minus the linear law, in units of its statistical error."""
        error = self.statistical_error_s
        off = self.sigma_s - self.budget.combined_s
        return np.asarray(
            np.where(error > 0.0, off / np.where(error > 0.0, error, 1.0), np.where(off == 0.0, 0.0, np.inf))
        )

    def agrees(self, limit: float = 4.0) -> bool:
        """Whether the linear law is met everywhere within `limit` statistical errors."""
        return bool(np.all(np.abs(self.pull) <= limit))

    def quantile_s(self, probability: float) -> FloatArray:
        """Quantile of the deviations of each instant, s."""
        if not 0.0 <= probability <= 1.0:
            raise InvalidInput(f"a quantile is asked for by a probability from 0 to 1, got {probability!r}")
        return np.asarray(np.quantile(self.deviations_s, probability, axis=0))

    def interval_s(self, probability: float = 0.95) -> tuple[FloatArray, FloatArray]:
        """Probabilistically symmetric coverage interval of the deviations, s (JCGM 101:2008, 7.7)."""
        if not 0.0 < probability < 1.0:
            raise InvalidInput(f"a coverage probability lies between 0 and 1, got {probability!r}")
        return self.quantile_s(0.5 * (1.0 - probability)), self.quantile_s(0.5 * (1.0 + probability))

    def covariance(self) -> FloatArray:
        """Covariance between instants, s2, (n, n) in flattened order."""
        flat = self.deviations_s.reshape(self.draws, -1)
        return np.atleast_2d(np.cov(flat, rowvar=False))

    def table(self) -> str:
        """Both laws for every instant."""
        rows: list[Sequence[str]] = [("instant", "linear u/s", "Monte Carlo u/s", "+-", "pull", "2.5 %", "97.5 %")]
        low, high = self.interval_s()
        columns = (self.budget.combined_s, self.sigma_s, self.statistical_error_s, self.pull, low, high)
        for number, row in enumerate(zip(*(np.ravel(column).tolist() for column in columns), strict=True)):
            linear, sigma, error, pull, below, above = row
            cells = f"{linear:.4e}", f"{sigma:.4e}", f"{error:.1e}", f"{pull:+.2f}", f"{below:+.2e}", f"{above:+.2e}"
            rows.append((str(number), *cells))
        return "\n".join([*aligned(rows, left=()), f"{self.draws} draws"])

    def __repr__(self) -> str:
        return f"<MonteCarlo of {self.draws} draws, shape={self.deviations_s.shape[1:]}>"


def monte_carlo(
    chain: Chain,
    t: Instants,
    *,
    draws: int = 1000,
    seed: int = 0,
    assumptions: Assumptions | None = None,
    **stated: Any,
) -> MonteCarlo:
    """Draw the inputs of a chain from their distributions, run it again for each draw, and compare with its budget.

    Parameters
    ----------
    chain : Chain
    t : Instants
        Instants of the start node; a few, for each draw runs the whole chain (about 2 ms).
    draws : int
        Number of draws M, two or more; the standard deviation found is good to 1 / sqrt(2 (M - 1)).
    seed : int
        Of the random numbers: the same seed gives the same result.
    assumptions, **stated
        As for `budget_of`.

    Raises
    ------
    InvalidInput
        For too few draws, or so many that their results would not fit into memory.
    """
    try:
        draws = operator.index(draws)
    except TypeError as error:
        raise InvalidInput(f"draws is a whole number, got {draws!r}") from error
    if draws < 2 or draws * max(t.size, 1) > _MOST_NUMBERS:
        raise InvalidInput(
            f"{draws} draws of {t.size} instants: from 2 draws to {_MOST_NUMBERS:.0e} results are possible; take fewer "
            "instants"
        )
    given = Assumptions.of(assumptions, stated)
    budget = budget_of(chain, t, assumptions=given)
    inputs = _Inputs(chain, t, budget, draws, np.random.default_rng(seed))
    deviations = np.zeros((draws, *t.shape))
    with gathered_extrapolations(repeats=True):
        nominal = chain(t)
        if inputs.moved:
            for number in range(draws):
                deviations[number] = inputs.chain(number)(t).minus(nominal)
    deviations += inputs.added_s.reshape(deviations.shape)
    return MonteCarlo(
        deviations, budget, [part.quantity for part in inputs.moved], [part.quantity for part in inputs.added]
    )


Handle: TypeAlias = tuple[str | int, ...]


class _Inputs:
    """Errors of all inputs for all draws, and the chains that they make."""

    def __init__(self, chain: Chain, t: Instants, budget: Budget, draws: int, rng: np.random.Generator) -> None:
        self._chain = chain
        # A clock that ticks its own time is bound to its site: errors of the place are added then.
        fixed = {"site"} if chain._supplies.free else set()
        live = [part for part in budget.contributions if np.any(part.sigma)]
        self.moved = [part for part in live if part.handle and part.handle[0] not in fixed]
        self.added = [part for part in live if not part.handle or part.handle[0] in fixed]
        self.added_s = np.zeros((draws, t.size))
        joint = _joint(budget, draws, rng)
        for part in self.added:
            shared = joint.get(part.quantity)
            law = part.correlation
            unit = law.draw(rng, draws, t.size, part.distribution) if shared is None else shared[:, np.newaxis]
            self.added_s += unit * np.broadcast_to(part.signed_s, t.shape).ravel()
        self._rows: dict[Handle, tuple[IntArray, FloatArray]] = {}
        self._single: dict[Handle, FloatArray] = {}
        self._drifts: dict[Handle, tuple[FloatArray, FloatArray]] = {}
        for part in self.moved:
            law = part.correlation
            if isinstance(law, Rows):
                self._rows[part.handle] = law.errors(rng, draws, part.distribution)
            elif isinstance(law, Exponential):
                errors = law.draw(rng, draws, t.size, part.distribution) * np.ravel(part.sigma)
                self._drifts[part.handle] = law.at_s, errors
            else:
                shared = joint.get(part.quantity)
                one = unit_draws(rng, part.distribution, (draws,)) if shared is None else shared
                self._single[part.handle] = one * float(np.ravel(part.sigma)[0])
        columns = {int(key[1]): value[0] for key, value in self._rows.items() if key[0] == "earth_orientation"}
        self._columns = sorted(columns)
        self._orientation = (
            OrientationErrors(chain.reference.earth_orientation, np.concatenate(list(columns.values())))
            if columns
            else None
        )

    def chain(self, number: int) -> Chain:
        """The chain of one draw."""
        supplies, reference = self._chain._supplies, self._chain.reference
        tables: dict[str, Any] = {}
        if self._orientation is not None:
            rows = {column: self._rows["earth_orientation", column] for column in self._columns}
            tables["earth_orientation"] = self._orientation.moved(
                {column: (index, errors[number]) for column, (index, errors) in rows.items()}
            )
        realisations = {table.scale: table for table in reference.tt_bipm}
        logs = {log.scale: log for log in supplies.clocks}
        for (kind, name), (index, errors) in self._rows.items():
            if kind == "tt_bipm":
                realisations[str(name)] = moved_tt_bipm(realisations[str(name)], index, errors[number])
            elif kind in ("clock", "calibration"):
                logs[str(name)] = moved_log(logs[str(name)], index, errors[number])
        tables["tt_bipm"] = list(realisations.values())
        clocks = [*logs.values(), *supplies.free]
        if any(step.end.scale.name in ("TCB", "TDB") for step in self._chain.steps):
            # Given, so that no draw integrates one anew.
            tables["time_ephemeris"] = reference.time_ephemeris
            drift = self._drifts.get(("time_ephemeris", 0))
            if drift is not None:
                tables["time_ephemeris"] = ShiftedTimeEphemeris(reference.time_ephemeris, drift[0], drift[1][number])
        pieces: dict[str, Any] = {"reference": reference.replace(**tables), "clocks": clocks}
        shift = [self._single.get(("site", axis)) for axis in range(3)]
        site: Any = supplies.site
        if any(axis is not None for axis in shift):
            position = [
                value if axis is None else value + float(axis[number])
                for value, axis in zip(site.position_m, shift, strict=True)
            ]
            pieces["site"] = replace(site, position_m=tuple(position))
        of_source = {str(key[1]): float(value[number]) for key, value in self._single.items() if key[0] == "source"}
        if of_source and supplies.source is not None:
            pieces["source"] = moved_source(supplies.source, of_source)
        return self._chain.replaced(**pieces)


def _joint(budget: Budget, draws: int, rng: np.random.Generator) -> dict[str, FloatArray]:
    """Unit errors of quantities that are correlated with one another, drawn from a joint normal distribution."""
    names = list(dict.fromkeys(name for first, second, _ in budget.correlations for name in (first, second)))
    if not names:
        return {}
    coefficients = np.eye(len(names))
    for first, second, r in budget.correlations:
        a, b = names.index(first), names.index(second)
        coefficients[a, b] = coefficients[b, a] = r
    values, vectors = np.linalg.eigh(coefficients)
    unit = (vectors * np.sqrt(np.maximum(values, 0.0))) @ rng.standard_normal((len(names), draws))
    return dict(zip(names, unit, strict=True))
