"""TT and TCG: two names for geocentric coordinate time, a constant rate apart."""

from __future__ import annotations

from typing import Final

from .. import exact
from ..constants import L_G, T0_COUNT
from ..exact import Factor, Pair
from ..instants import Instants
from .terrestrial import require_scale

__all__ = ["tcg_from_tt", "tcg_to_tt", "tt_from_tcg", "tt_to_tcg"]

_GAIN: Final = Factor.of(L_G / (1 - L_G))
_LOSS: Final = Factor.of(-L_G)
_T0: Final[Pair] = exact.normalise(*T0_COUNT)


def tcg_from_tt(tt: Pair) -> Pair:
    """TCG count of a TT count: TCG - TT = L_G/(1 - L_G) (TT - T0), IERS Conventions 2010 eq. 10.1."""
    return exact.add(tt, exact.multiply(exact.subtract(tt, _T0), _GAIN))


def tt_from_tcg(tcg: Pair) -> Pair:
    """TT count of a TCG count: TT = TCG - L_G (TCG - T0), IAU 2000 Resolution B1.9."""
    return exact.add(tcg, exact.multiply(exact.subtract(tcg, _T0), _LOSS))


def tt_to_tcg(t: Instants) -> Instants:
    """TT to TCG (IAU 2000 B1.9), anywhere; exact to 0.5 fs."""
    require_scale(t, "TT")
    return Instants._of(tcg_from_tt(t.pair), "TCG", t.place)


def tcg_to_tt(t: Instants) -> Instants:
    """TCG to TT (IAU 2000 B1.9), anywhere; exact to 0.5 fs."""
    require_scale(t, "TCG")
    return Instants._of(tt_from_tcg(t.pair), "TT", t.place)
