"""Pictures (matplotlib): ledgers, budgets, clock logs, what-if differences, compared clocks, links.

Every `..._figure` returns a matplotlib Figure that is tied to no window; every `save_...` writes one to a file whose
bytes are the same in every run (.png, .pdf or .svg). Names are imported when they are first used.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from .budgets import budget_figure, save_budget_picture
    from .changes import save_what_if_picture, what_if_figure
    from .clocks import clock_figure, rate_figure, save_clock_picture, save_rate_picture
    from .common import check_picture, save_figure, svg_text
    from .ledgers import ledger_figure, save_ledger_picture
    from .links import link_figure, save_link_picture
    from .logs import clock_log_figure, save_clock_log_picture

__all__ = [
    "budget_figure",
    "check_picture",
    "clock_figure",
    "clock_log_figure",
    "ledger_figure",
    "link_figure",
    "rate_figure",
    "save_budget_picture",
    "save_clock_log_picture",
    "save_clock_picture",
    "save_figure",
    "save_ledger_picture",
    "save_link_picture",
    "save_rate_picture",
    "save_what_if_picture",
    "svg_text",
    "what_if_figure",
]

_HOMES = {
    "budget_figure": "budgets",
    "check_picture": "common",
    "clock_figure": "clocks",
    "clock_log_figure": "logs",
    "ledger_figure": "ledgers",
    "link_figure": "links",
    "rate_figure": "clocks",
    "save_budget_picture": "budgets",
    "save_clock_log_picture": "logs",
    "save_clock_picture": "clocks",
    "save_figure": "common",
    "save_ledger_picture": "ledgers",
    "save_link_picture": "links",
    "save_rate_picture": "clocks",
    "save_what_if_picture": "changes",
    "svg_text": "common",
    "what_if_figure": "changes",
}


def __getattr__(name: str) -> Any:
    """Import a public name from its module when it is first asked for."""
    if name in _HOMES:
        return getattr(import_module(f".{_HOMES[name]}", __name__), name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}; it offers {', '.join(__all__)}")


def __dir__() -> list[str]:
    return sorted(__all__)
