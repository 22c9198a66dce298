"""The edge between TCL and TCB: the integral at the Moon's centre, and where the event is."""

from __future__ import annotations

from typing import Final

import numpy as np

from .. import exact
from ..budget.assumptions import Assumptions
from ..budget.contribution import Contribution, Omission
from ..budget.correlation import Exponential
from ..budget.places import place_contributions, place_omissions, turns_with_earth
from ..constants import C_M_S, JULIAN_YEAR_S, L_B
from ..counts import tai_from_tt, tdb_from_tcb
from ..earth.moving import tt_from_tdb_at_geocentre
from ..earth.observer import Observer, nearest_inside
from ..exact import FloatArray
from ..instants import Instants
from ..scales import Node, Scale
from ..step import Step, Terms
from ..surface import SurfaceSite
from ..tables.notes import orientation_notes
from ..tables.reference import ReferenceData
from ..transforms import body_events, lunar
from .common import count_difference

__all__ = ["tcl_tcb_step"]

_TCB_GAIN: Final = float(L_B / (1 - L_B))
_SURFACE_SIGMA_M: Final = 150.0
"""Standard uncertainty of a place on the Moon from the rotation elements behind `SurfaceSite`, m (type B)."""


def tcl_tcb_step(place: str, observer: Observer | None, reference: ReferenceData) -> Step:
    """TCL to TCB of one event at the Moon's centre, at the geocentre or at an observer.

    Parameters
    ----------
    place : str
        SELENOCENTER, GEOCENTER or TOPOCENTER.
    observer : Observer or None
        Who is at TOPOCENTER: a site on the Earth or the Moon, or a trajectory.
    reference : ReferenceData
        Ephemeris, and what the observer needs.
    """
    where: body_events.Place = observer if place == "TOPOCENTER" else "earth" if place == "GEOCENTER" else None

    def terms(before: Instants, after: Instants) -> Terms:
        total = count_difference(before, after)
        if where is None:
            return {"Einstein integral at the selenocentre": total}
        tdb = tdb_from_tcb(after.pair)
        r_m, _ = body_events.event_offset(lunar.MOON, where, tdb, reference)
        parts = body_events.position_terms(lunar.MOON, tdb, r_m, reference)
        return {
            "Einstein integral at the selenocentre": exact.add_seconds(total, -parts.total_s),
            "position (simultaneity) v_M.r/c^2": exact.from_seconds(parts.first_s),
            "position, order c^-4": exact.from_seconds(parts.second_s),
        }

    def rate(before: Instants, after: Instants) -> FloatArray:
        tdb = tdb_from_tcb(after.pair)
        tcl_per_tdb = body_events.body_time_rate(tdb, lunar.MOON, reference, where)
        return np.asarray((_TCB_GAIN - tcl_per_tdb) / (1.0 + tcl_per_tdb))

    def contributions(before: Instants, assumptions: Assumptions) -> list[Contribution]:
        at_s = np.asarray(np.ravel(before.whole) + np.ravel(before.fraction), dtype=np.float64)
        integral = Contribution(
            source="time ephemeris of the Moon",
            quantity="TCL - TCB at the selenocentre",
            unit="s",
            sensitivity=np.full(before.shape, -1.0),
            sigma=np.full(before.shape, assumptions.time_ephemeris_sigma_s),
            correlation=Exponential(at_s, JULIAN_YEAR_S),
        )
        found = [integral]
        if not isinstance(where, Observer):
            return found
        tdb = lunar.tdb_from_tcl(before.pair, reference, where)
        _, velocity = reference.ephemeris.state("moon", tdb)
        if isinstance(where, SurfaceSite):
            speed = np.linalg.norm(velocity, axis=-1) / C_M_S**2
            sigma = np.full(before.shape, _SURFACE_SIGMA_M)
            place = Contribution("place on the Moon", f"place of {where.name} along the Moon's way", "m", speed, sigma)
            return [*found, place]
        tt = tt_from_tdb_at_geocentre(tdb, reference)
        r_m, _ = where.gcrs(nearest_inside(where, tt), reference)
        return found + place_contributions(where, tt, r_m, velocity / C_M_S**2, reference, assumptions)

    def omissions(assumptions: Assumptions) -> list[Omission]:
        if not isinstance(where, Observer) or isinstance(where, SurfaceSite):
            return []
        return place_omissions(where, assumptions)

    def notes(before: Instants) -> tuple[str, ...]:
        if not isinstance(where, Observer) or isinstance(where, SurfaceSite) or not turns_with_earth(where):
            return ()
        tdb = lunar.tdb_from_tcl(before.pair, reference, where)
        return orientation_notes(tai_from_tt(tt_from_tdb_at_geocentre(tdb, reference)), reference)

    return Step(
        start=Node(Scale.parse("TCL"), place),
        end=Node(Scale.parse("TCB"), place),
        title="time ephemeris of the Moon"
        + (f" and place of {observer.name}" if isinstance(where, Observer) and observer is not None else ""),
        source="IAU 2024 Resolution II, IAU 2000 Resolution B1.5",
        forward=lambda t: lunar.tcl_to_tcb(t, reference, where),
        backward=lambda t: lunar.tcb_to_tcl(t, reference, where),
        terms=terms,
        rate=rate,
        contributions=contributions,
        omissions=omissions,
        notes=notes,
    )
