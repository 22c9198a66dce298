"""TCL, the coordinate time of the Lunar Celestial Reference System, of events at the Moon, at the Earth and between.

IAU 2024 Resolution II sets the Lunar Celestial Reference System and TCL up as IAU 2000 Resolutions B1.3 to B1.5 do the
geocentric ones. Its text was not at hand here; the origin taken is that of TCG and TCB (IAU 1991 Resolution A4): **TCL
reads 1977-01-01T00:00:32.184 at the centre of the Moon at the event at which TCB reads that**. At the geocentre TCL
then differs from TCG at T0 by the position term of that date, -v_M.(x_E - x_M)/c^2.

TCL - TCB runs by the integral at the Moon's centre (-1.281 ms a day; +58.74 us a day against TT and TDB) plus the
position term of the event (`body_events`).
"""

from __future__ import annotations

from ..counts import tcb_from_tdb, tdb_from_tcb
from ..exact import Pair
from ..instants import Instants
from ..tables.reference import ReferenceData
from .body_events import Place, body_time_from_tdb, tdb_from_body_time
from .terrestrial import require_scale

__all__ = ["MOON", "tcb_to_tcl", "tcl_from_tdb", "tcl_to_tcb", "tcl_to_tdb", "tdb_from_tcl", "tdb_to_tcl"]

MOON = 301
"""NAIF number of the Moon."""


def tcl_from_tdb(tdb: Pair, reference: ReferenceData, place: Place = None) -> Pair:
    """TCL count of an event that TDB dates, at the Moon's centre or at `place`; see `body_time_from_tdb`."""
    return body_time_from_tdb(tdb, MOON, reference, place)


def tdb_from_tcl(tcl: Pair, reference: ReferenceData, place: Place = None) -> Pair:
    """TDB count of an event that TCL dates; the inverse of `tcl_from_tdb` to 0.4 fs."""
    return tdb_from_body_time(tcl, MOON, reference, place)


def tdb_to_tcl(t: Instants, reference: ReferenceData, place: Place = None) -> Instants:
    """TDB to TCL of the same event.

    Parameters
    ----------
    t : Instants
        TDB, any shape.
    reference : ReferenceData
        Ephemeris, and what the place needs.
    place : SurfaceSite, Site, Trajectory, str, int or None
        Where the event is: None is the centre of the Moon, "earth" the geocentre.

    Raises
    ------
    OutOfSpan
        Where the ephemeris, the Earth orientation or the trajectory does not reach, with the mask.
    ScaleMismatch
        For another scale than TDB, and for a place more than 1e10 m from the Moon.
    """
    require_scale(t, "TDB")
    return Instants._of(tcl_from_tdb(t.pair, reference, place), "TCL", t.place)


def tcl_to_tdb(t: Instants, reference: ReferenceData, place: Place = None) -> Instants:
    """TCL to TDB of the same event; inverse of `tdb_to_tcl` to 0.4 fs."""
    require_scale(t, "TCL")
    return Instants._of(tdb_from_tcl(t.pair, reference, place), "TDB", t.place)


def tcb_to_tcl(t: Instants, reference: ReferenceData, place: Place = None) -> Instants:
    """TCB to TCL of the same event; see `tdb_to_tcl`."""
    require_scale(t, "TCB")
    return Instants._of(tcl_from_tdb(tdb_from_tcb(t.pair), reference, place), "TCL", t.place)


def tcl_to_tcb(t: Instants, reference: ReferenceData, place: Place = None) -> Instants:
    """TCL to TCB of the same event; inverse of `tcb_to_tcl` to 0.6 fs."""
    require_scale(t, "TCL")
    return Instants._of(tcb_from_tdb(tdb_from_tcl(t.pair, reference, place)), "TCB", t.place)
