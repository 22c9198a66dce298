"""Events at a clock, dated on any coordinate time, in TT."""

from __future__ import annotations

from ..counts import fixed_count, tt_from_tcg
from ..earth.observer import Observer
from ..errors import InvalidInput, MissingPiece
from ..exact import Pair
from ..instants import Instants
from ..scales import Scale
from ..tables.reference import ReferenceData
from ..transforms.barycentric import tdb_from_tcb, tt_from_tdb
from ..transforms.lunar import tdb_from_tcl
from ..transforms.terrestrial import tt_bipm_to_tai, ut1_to_tai

__all__ = ["tt_at"]


def tt_at(t: Instants, observer: Observer | None, reference: ReferenceData) -> Pair:
    """TT counts of events at an observer (None: the geocentre), dated on any coordinate time.

    Raises
    ------
    MissingPiece
        For a realisation of TT whose table is not in `reference`.
    InvalidInput
        For a scale that is no coordinate time.
    """
    if t.scale == "TCG":
        return tt_from_tcg(t.pair)
    if t.scale == "TCL":
        return tt_from_tdb(tdb_from_tcl(t.pair, reference, observer or "earth"), reference, observer)
    if t.scale in ("TDB", "TCB"):
        return tt_from_tdb(t.pair if t.scale == "TDB" else tdb_from_tcb(t.pair), reference, observer)
    kind = Scale.parse(t.scale)
    if t.scale == "UT1":
        t = ut1_to_tai(t, reference.earth_orientation)
    elif kind.family == "TT" and kind.realisation is not None:
        table = next((table for table in reference.tt_bipm if table.scale == t.scale), None)
        if table is None:
            raise MissingPiece(f"no table for {t.scale}: give it with ReferenceData.load(tt_bipm=path)")
        t = tt_bipm_to_tai(t, table)
    elif kind.count_minus_tai is None:
        raise InvalidInput(
            f"dates on a coordinate time are needed (UTC, TAI, TT, TT(BIPM), UT1, GPS, GST, BDT, GLONASS, TCG, TCB, "
            f"TDB or TCL), got {t.scale}; convert them with tscale.chain first"
        )
    return fixed_count(t.pair, Scale.parse(t.scale), Scale.parse("TT"))
