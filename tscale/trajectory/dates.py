"""The dates of a trajectory as counts of one of two scales: TT near the Earth, TDB elsewhere."""

from __future__ import annotations

from typing import Literal, NamedTuple, TypeAlias

import numpy as np

from .. import exact
from ..constants import L_B, L_G
from ..counts import fixed_count, tdb_from_tcb, tt_from_tcg
from ..errors import InvalidInput
from ..exact import Pair
from ..instants import Instants
from ..scales import Scale

__all__ = ["Counts", "NativeScale", "counts_of", "since"]

NativeScale: TypeAlias = Literal["TT", "TDB"]


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
    if t.scale == "TDB":
        return Counts("TDB", t.pair, 1.0)
    if t.scale == "TCB":
        return Counts("TDB", tdb_from_tcb(t.pair), float(1 - L_B))
    if t.scale == "TCG":
        return Counts("TT", tt_from_tcg(t.pair), float(1 - L_G))
    kind = Scale.parse(t.scale)
    if kind.count_minus_tai is not None:
        return Counts("TT", fixed_count(t.pair, kind, Scale.parse("TT")), 1.0)
    raise InvalidInput(
        f"the dates of a trajectory cannot be {t.scale}: allowed are UTC, TAI, TT, TCG, GPS, GST, BDT, GLONASS, TDB "
        "and TCB; convert them with tscale.chain first"
    )


def since(pair: Pair, origin: Pair) -> exact.FloatArray:
    """`pair - origin` in seconds, rounded once; its sign is exact."""
    return np.asarray((pair[0] - origin[0]) + (pair[1] - origin[1]), dtype=np.float64)
