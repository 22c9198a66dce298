"""The uncertainties that a difference is measured by: of what is not the same before and after, and of nothing else.

What both runs share - the log of a clock when another table is tried, the place of the site - moves neither, so that it
has no part in how much their difference should be.
"""

from __future__ import annotations

from collections.abc import Collection, Iterable, Mapping
from typing import Final

import numpy as np

from ..budget.contribution import Contribution, gathered
from ..budget.rows import EOP_COLUMNS
from ..chains import Chain
from ..exact import FloatArray
from ..instants import Instants
from .replaced import Replaced

__all__ = ["quadrature", "step_sigmas", "total_sigma"]

_OF_HANDLE: Final = {
    "tt_bipm": "TT(BIPM)",
    "earth_orientation": "Earth orientation",
    "time_ephemeris": "time ephemeris",
    "site": "observer",
    "source": "source",
}


def total_sigma(chain: Chain, t: Instants, changed: Collection[str]) -> FloatArray | None:
    """Standard uncertainty of the results by the pieces that changed, s; None where no such piece states one."""
    return _sigma(chain, chain.contributions(t), changed)


def step_sigmas(
    chain: Chain, t: Instants, changed: Collection[str], other: Replaced | None = None
) -> dict[str, FloatArray]:
    """The same for the steps that have one, by the names of the old chain."""
    found = {}
    for step, at in zip(chain.steps, chain._walk(t, chain.steps), strict=False):
        sigma = _sigma(chain, step.contributed(at), changed)
        if sigma is not None:
            name = f"{step.start} -> {step.end}"
            found[name if other is None else other.old(name)] = sigma
    return found


def quadrature(first: FloatArray | None, second: FloatArray | None) -> FloatArray | None:
    """Both in quadrature, or the one there is."""
    if first is None or second is None:
        return second if first is None else first
    return np.asarray(np.hypot(first, second))


def _sigma(chain: Chain, parts: Iterable[Contribution], changed: Collection[str]) -> FloatArray | None:
    logs = {log.scale: f"{log.scale} by {log.reference}" for log in chain._supplies.clocks}
    squares = [part.signed_s**2 for part in gathered(parts) if _piece(part, logs) in changed]
    return None if not squares else np.asarray(np.sqrt(sum(squares[1:], squares[0])))


def _piece(part: Contribution, logs: Mapping[str, str]) -> str:
    """What an input quantity belongs to, as changes are named."""
    if part.source in logs:
        return logs[part.source]
    if part.handle:
        return _OF_HANDLE.get(str(part.handle[0]), "")
    return "Earth orientation" if part.quantity.removesuffix(", held") in EOP_COLUMNS else part.source
