"""Uncertainty budgets after the GUM (JCGM 100:2008), and their check by Monte Carlo (JCGM 101:2008).

Names are imported when they are first used: every chain needs the contributions, few need the rest.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from . import gum
    from .assumptions import Assumptions
    from .budget import Budget, BudgetLine
    from .contribution import Contribution, Omission
    from .correlation import Common, Correlation, Exponential, Independent, Rows
    from .law import coverage_factor, effective_dof
    from .making import budget_of
    from .trials import MonteCarlo, monte_carlo

__all__ = [
    "Assumptions",
    "Budget",
    "BudgetLine",
    "Common",
    "Contribution",
    "Correlation",
    "Exponential",
    "Independent",
    "MonteCarlo",
    "Omission",
    "Rows",
    "budget_of",
    "coverage_factor",
    "effective_dof",
    "gum",
    "monte_carlo",
]

_HOMES = {
    "Assumptions": "assumptions",
    "Budget": "budget",
    "BudgetLine": "budget",
    "Common": "correlation",
    "Contribution": "contribution",
    "Correlation": "correlation",
    "Exponential": "correlation",
    "Independent": "correlation",
    "MonteCarlo": "trials",
    "Omission": "contribution",
    "Rows": "correlation",
    "budget_of": "making",
    "coverage_factor": "law",
    "effective_dof": "law",
    "monte_carlo": "trials",
}


def __getattr__(name: str) -> Any:
    """Import a public name from its module when it is first asked for."""
    if name == "gum":
        return import_module(".gum", __name__)
    if name in _HOMES:
        return getattr(import_module(f".{_HOMES[name]}", __name__), name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}; it offers {', '.join(__all__)}")


def __dir__() -> list[str]:
    return sorted(__all__)
