"""Counts of scales that differ by constants alone: fixed offsets from TAI, and the rates L_G and L_B.

Plain functions of (whole, fraction) pairs, each rounded once. UTC stands here too, because its count is SI seconds
elapsed; its leap seconds are in the labels.
"""

from __future__ import annotations

from typing import Final

import numpy as np

from . import exact
from .constants import L_B, L_G, T0_COUNT, TDB0_S, TT_MINUS_TAI
from .errors import ScaleMismatch
from .exact import Factor, Pair
from .scales import Scale

__all__ = ["fixed_count", "tai_from_tt", "tcb_from_tdb", "tcg_from_tt", "tdb_from_tcb", "tt_from_tcg"]

_T0: Final = exact.normalise(*T0_COUNT)
_TDB_AT_T0: Final = exact.add(_T0, exact.from_seconds(TDB0_S))
_TT_MINUS_TAI: Final = exact.normalise(*TT_MINUS_TAI)
_TCG_GAIN: Final = Factor.of(L_G / (1 - L_G))
_TT_LOSS: Final = Factor.of(-L_G)
_TCB_GAIN: Final = Factor.of(L_B / (1 - L_B))
_TDB_LOSS: Final = Factor.of(-L_B)


def fixed_count(count: Pair, start: Scale, end: Scale) -> Pair:
    """Count on one scale at a fixed distance from TAI as a count on another: UTC, TAI, TT, GPS, GST, BDT, GLONASS.

    Raises
    ------
    ScaleMismatch
        For a scale that is not at a fixed distance from TAI.
    """
    here, there = _count_minus_tai(start), _count_minus_tai(end)
    if here[1] == there[1]:
        return np.asarray(count[0] + (there[0] - here[0])), np.asarray(count[1])
    # By way of TAI, so that 32.184 s is taken off as it was put on: the double nearest 0.816 is not 1 - 0.184.
    return exact.add(exact.subtract(count, here), there)


def tai_from_tt(tt: Pair) -> Pair:
    """TAI count of a TT count: TT - TAI = 32.184 s (IAU 1991 A4)."""
    return exact.subtract(tt, _TT_MINUS_TAI)


def tcg_from_tt(tt: Pair) -> Pair:
    """TCG count of a TT count: TCG - TT = L_G/(1 - L_G) (TT - T0), IERS Conventions 2010 eq. 10.1."""
    return exact.affine(tt, _T0, _TCG_GAIN)


def tt_from_tcg(tcg: Pair) -> Pair:
    """TT count of a TCG count: TT = TCG - L_G (TCG - T0), IAU 2000 Resolution B1.9."""
    return exact.affine(tcg, _T0, _TT_LOSS)


def tcb_from_tdb(tdb: Pair) -> Pair:
    """TCB count of a TDB count, the inverse of `tdb_from_tcb`."""
    return exact.affine(tdb, _TDB_AT_T0, _TCB_GAIN, -TDB0_S)


def tdb_from_tcb(tcb: Pair) -> Pair:
    """TDB count of a TCB count: TDB = TCB - L_B (TCB - T0) + TDB0, IAU 2006 Resolution B3."""
    return exact.affine(tcb, _T0, _TDB_LOSS, TDB0_S)


def _count_minus_tai(scale: Scale) -> Pair:
    offset = scale.count_minus_tai
    if offset is None:
        raise ScaleMismatch(
            f"{scale.name} is not at a fixed distance from TAI; UTC, TAI, TT, GPS, GST, BDT and GLONASS are"
        )
    return np.asarray(offset[0], dtype=np.int64), np.asarray(offset[1], dtype=np.float64)
