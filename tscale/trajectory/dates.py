"""The dates of a trajectory as counts of one of two scales: TT near the Earth, TDB elsewhere."""

from __future__ import annotations

from typing import Final, Literal, NamedTuple, TypeAlias

import numpy as np

from .. import exact
from ..constants import L_B, L_G, T0_COUNT, TDB0_S, TT_MINUS_TAI
from ..errors import InvalidInput
from ..exact import Factor, Pair
from ..instants import Instants
from ..scales import Scale

__all__ = ["Counts", "NativeScale", "counts_of", "since"]

NativeScale: TypeAlias = Literal["TT", "TDB"]

_T0: Final[Pair] = exact.normalise(*T0_COUNT)
_TDB_AT_T0: Final[Pair] = exact.add(_T0, exact.from_seconds(TDB0_S))
_TT_MINUS_TAI: Final[Pair] = exact.normalise(*TT_MINUS_TAI)


class Counts(NamedTuple):
    """Dates on a native scale.

    Attributes
    ----------
    scale : {"TT", "TDB"}
    pair : Pair
    length : float
        What a length that is compatible with the scale of the dates is multiplied by to be compatible with `scale`
        (1 - L_G for TCG, 1 - L_B for TCB, else 1; TN36 eq. 1.1 and 1.2). Velocities keep their value.
    """

    scale: NativeScale
    pair: Pair
    length: float


def counts_of(t: Instants) -> Counts:
    """Carry dates to TT (from UTC, TAI, TT, TCG and GNSS scales) or to TDB (from TDB and TCB), exactly.

    Raises
    ------
    InvalidInput
        For any other scale: it needs more than constants to be carried.
    """
    offset = Scale.parse(t.scale).count_minus_tai
    if t.scale == "TT":
        return Counts("TT", t.pair, 1.0)
    if t.scale == "TDB":
        return Counts("TDB", t.pair, 1.0)
    if t.scale == "TCG":
        since_t0 = exact.subtract(t.pair, _T0)
        return Counts("TT", exact.add(t.pair, exact.multiply(since_t0, Factor.of(-L_G))), float(1 - L_G))
    if t.scale == "TCB":
        since_t0 = exact.subtract(t.pair, _T0)
        tdb = exact.add(exact.add(_TDB_AT_T0, since_t0), exact.multiply(since_t0, Factor.of(-L_B)))
        return Counts("TDB", tdb, float(1 - L_B))
    if offset is not None:
        tai = exact.subtract(t.pair, (np.asarray(offset[0]), np.asarray(offset[1])))
        return Counts("TT", exact.add(tai, _TT_MINUS_TAI), 1.0)
    raise InvalidInput(
        f"the dates of a trajectory cannot be {t.scale}: allowed are UTC, TAI, TT, TCG, GPS, GST, BDT, GLONASS, TDB "
        "and TCB; convert them with tscale.chain first"
    )


def since(pair: Pair, origin: Pair) -> exact.FloatArray:
    """`pair - origin` in seconds, rounded once; its sign is exact."""
    return np.asarray((pair[0] - origin[0]) + (pair[1] - origin[1]), dtype=np.float64)
