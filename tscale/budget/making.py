"""From a chain to its budget: what the steps contribute, and what the caller states beside them."""

from __future__ import annotations

from dataclasses import replace
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from ..exact import FloatArray
from .assumptions import Assumptions
from .budget import Budget
from .contribution import Contribution, Omission, gathered
from .correlation import INDEPENDENT
from .places import left_out

if TYPE_CHECKING:
    from ..chains import Chain
    from ..instants import Instants

__all__ = ["budget_of"]

_TABLES: Final = ("clock", "tt_bipm", "earth_orientation")


def budget_of(
    chain: Chain,
    t: Instants,
    *,
    assumptions: Assumptions | None = None,
    coverage_factor: float = 2.0,
    probability: float | None = None,
    **stated: Any,
) -> Budget:
    """Work out the uncertainty budget of a chain's results (JCGM 100:2008).

    Parameters
    ----------
    chain : Chain
        What maps the instants.
    t : Instants
        Instants of the start node, any shape.
    assumptions : Assumptions, optional
        Standard uncertainties that no table states.
    coverage_factor : float
        k of the expanded uncertainty.
    probability : float, optional
        Level of confidence, such as 0.95: k is then that of Student's distribution with the effective degrees of
        freedom of each instant.
    **stated
        Single members of `Assumptions` by name, such as `site_sigma_m=0.01`.

    Returns
    -------
    Budget
        Lines, combined and expanded uncertainty, covariances, and what is not included.

    Raises
    ------
    InvalidInput
        For names that `Assumptions` does not have, and for negative or infinite uncertainties.

    Notes
    -----
    The law of propagation to first order. Sensitivities leave out the rates of the steps that follow (1e-4 at most, in
    a wavefront) and the change of small terms by an input of a large one, such as the Shapiro delay's by the source's
    direction.
    """
    given = Assumptions.of(assumptions, stated)
    found = list(chain.contributions(t, given))
    omissions = [
        Omission(part.quantity, "its table gives it without uncertainty")
        for part in found
        if part.handle and part.handle[0] in _TABLES and part.sigma.size and not np.any(part.sigma)
    ]
    found.extend(_of_readings(t.shape, given))
    if given.ephemeris is not None:
        found.append(_between_kernels(chain, t, given.ephemeris))
    one = np.ones(t.shape)
    found.extend(left_out(name, name, "s", one, bound_s) for name, bound_s in given.bounds)
    if given.resolution_s is None and given.reading_sigma_s is None:
        omissions.append(Omission("noise of the readings", "not stated; give reading_sigma_s or resolution_s"))
    if not given.truncation:
        omissions.append(Omission("what the models leave out", "not counted, by truncation=False"))
    return Budget(
        [_with_dof(part, given) for part in gathered(found)],
        [*omissions, *chain.omissions(given)],
        t.shape,
        title=str(chain),
        correlations=given.correlations,
        factor=coverage_factor,
        probability=probability,
    )


def _of_readings(shape: tuple[int, ...], given: Assumptions) -> list[Contribution]:
    """Contributions of the readings themselves."""
    found = []
    for name, sigma, distribution in (
        ("resolution", None if given.resolution_s is None else given.resolution_s / np.sqrt(12.0), "rectangular"),
        ("noise", given.reading_sigma_s, "normal"),
    ):
        if sigma is not None:
            found.append(
                Contribution(
                    "readings",
                    f"{name} of the readings",
                    "s",
                    np.ones(shape),
                    np.full(shape, sigma),
                    distribution="rectangular" if distribution == "rectangular" else "normal",
                    correlation=INDEPENDENT,
                )
            )
    return found


def _between_kernels(chain: Chain, t: Instants, other: Any) -> Contribution:
    """The whole effect of another ephemeris on the results, as one error of the size of the difference.

    The time ephemeris stays the same: its uncertainty has a line of its own.
    """
    reference = chain.reference
    moved = reference.replace(ephemeris=other, time_ephemeris=reference.time_ephemeris)
    difference: FloatArray = np.asarray(chain.replaced(reference=moved)(t).minus(chain(t)), dtype=np.float64)
    name = f"ephemeris: {getattr(other, 'name', 'other')} minus {reference.ephemeris.name}"
    return Contribution("ephemeris", name, "1", difference, np.ones(t.shape), np.zeros(t.shape))


def _with_dof(part: Contribution, given: Assumptions) -> Contribution:
    """A source whose degrees of freedom are stated was evaluated from observations."""
    dof = given.dof.get(part.quantity, given.dof.get(part.source))
    return part if dof is None else replace(part, dof=float(dof), kind="A")
