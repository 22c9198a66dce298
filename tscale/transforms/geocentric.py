"""TT and TCG: two names for geocentric coordinate time, a constant rate apart."""

from __future__ import annotations

from ..counts import tcg_from_tt, tt_from_tcg
from ..instants import Instants
from .terrestrial import require_scale

__all__ = ["tcg_from_tt", "tcg_to_tt", "tt_from_tcg", "tt_to_tcg"]


def tt_to_tcg(t: Instants) -> Instants:
    """TT to TCG (IAU 2000 B1.9), anywhere; any shape, rounded once (0.06 fs). `ScaleMismatch` for another scale."""
    require_scale(t, "TT")
    return Instants._of(tcg_from_tt(t.pair), "TCG", t.place)


def tcg_to_tt(t: Instants) -> Instants:
    """TCG to TT (IAU 2000 B1.9), anywhere; any shape, rounded once (0.06 fs). `ScaleMismatch` for another scale."""
    require_scale(t, "TCG")
    return Instants._of(tt_from_tcg(t.pair), "TT", t.place)
