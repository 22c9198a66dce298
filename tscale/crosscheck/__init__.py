"""Cross-checks: against general libraries, against a table of another program, and why results differ.

    report = tscale.crosscheck.against(t_in, t_out, chain=c)      # .n, .max_s, .rms_s, .table()
    found = tscale.crosscheck.explain(t_in, t_out, chain=c)       # .causes, .unexplained_rms_s, .table()
    checks = tscale.crosscheck.libraries()                        # pyerfa, astropy, skyfield

Names are imported when they are first used.
"""

from __future__ import annotations

from importlib import import_module
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from .comparison import Comparison
    from .explanation import Cause, Explanation, explain
    from .library_report import LibraryReport, libraries
    from .residuals import Residuals, against
    from .signature import Signature

__all__ = [
    "Cause",
    "Comparison",
    "Explanation",
    "LibraryReport",
    "Residuals",
    "Signature",
    "against",
    "explain",
    "libraries",
]

_HOMES = {
    "Cause": "explanation",
    "Comparison": "comparison",
    "Explanation": "explanation",
    "LibraryReport": "library_report",
    "Residuals": "residuals",
    "Signature": "signature",
    "against": "residuals",
    "explain": "explanation",
    "libraries": "library_report",
}


def __getattr__(name: str) -> Any:
    """Import a public name from its module when it is first asked for."""
    if name in _HOMES:
        return getattr(import_module(f".{_HOMES[name]}", __name__), name)
    raise AttributeError(f"module {__name__!r} has no attribute {name!r}; it offers {', '.join(__all__)}")


def __dir__() -> list[str]:
    return sorted(__all__)
