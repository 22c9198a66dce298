"""The rate of a clock on the surface of another body, term by term, against coordinate times and a clock on the geoid.

The proper time of a clock at rest on a body runs against the body's own coordinate time T by

    dtau/dT - 1 = -(W + tide)/c^2,

W the gravity potential of the place with that of the rotation (IAU 2000 Resolution B1.4 in the body's own system, to
order c^-2: what is of order c^-4 is 5e-22 on the Moon, 1e-20 on Mars), and T against TDB by the integral at the body's
centre less the change of the position term (`body_events`).

Against TT it has to be said which TT goes with an event of the clock:

- that of the **clock's own event** (`simultaneity="TT"`), as geocentric coordinate time dates it: what published
  figures of the Moon are about, and the rate of a chain to TT@TOPOCENTER. It goes as far as the geocentric system does.
- that of the **geocentre at the same TDB** (`simultaneity="TDB"`): the only one for Mars and beyond.

They differ by the position term v_E.(x - x_E)/c^2 of the event, which on the Moon swings by 128 us with the synodic
month (3e-10 in rate) and adds up to nothing. It says how distant events are called simultaneous, not how a clock goes.
"""

from __future__ import annotations

from typing import Final, Literal, NamedTuple, TypeAlias

import numpy as np

from ..constants import C_M_S, L_B, L_G
from ..earth.frames import dot
from ..earth.gravity.tidal import tidal_potential_m2_s2
from ..earth.moving import TT_PER_TCG, tdb_from_tt_at_geocentre
from ..ephemeris.bodies import PLANETARY_BODIES
from ..errors import InvalidInput, ScaleMismatch
from ..exact import FloatArray, Pair
from ..instants import Instants
from ..surface import SurfaceSite
from ..tables.reference import ReferenceData
from ..trajectory.dates import counts_of
from .body_events import BODY_LIMIT_M, coordinate_time, event_offset, position_rate, tdb_from_body_time

__all__ = [
    "Against",
    "Simultaneity",
    "SurfaceRateTerms",
    "default_simultaneity",
    "simultaneity_rate",
    "surface_proper_rate",
    "surface_rate_terms",
    "surface_tide_m2_s2",
]

Against: TypeAlias = Literal["TT", "TCG", "TCB", "TDB", "TCL", "own"]
Simultaneity: TypeAlias = Literal["TT", "TDB"]

_ALLOWED: Final = ("TT", "TCG", "TCB", "TDB", "TCL", "own")
_C2: Final = C_M_S**2
_PER_TCB: Final = float(1 / (1 - L_B))
_EARTH: Final = 399
_MOON: Final = 301


class SurfaceRateTerms(NamedTuple):
    """Parts of dtau/dt - 1 of a clock on the surface of another body, t the scale it is compared with.

    Attributes
    ----------
    own_potential : float array
        -W/c^2: gravity and rotation of the body.
    tide : float array
        Minus the tide-raising potential of the other bodies over c^2.
    body_time : float array
        dT/dTDB - 1 at the body's centre: its motion and the potential of the others.
    place_on_body : float array
        Minus the change of v_B.r/c^2 as the body turns: 2e-12 on the Moon, 6e-11 a day on Mars; adds up to nothing.
    scale : float array
        Minus dt/dTDB - 1 of the scale compared with (of TT and TCG: at the geocentre).
    simultaneity : float array
        Change of v_E.(x - x_E)/c^2 of the clock's event, where TT or TCG of that event is the scale; else 0.
    products : float array
        Products of the others, 1e-17.
    """

    own_potential: FloatArray
    tide: FloatArray
    body_time: FloatArray
    place_on_body: FloatArray
    scale: FloatArray
    simultaneity: FloatArray
    products: FloatArray

    @property
    def total(self) -> FloatArray:
        """dtau/dt - 1."""
        return np.asarray(sum(self[1:], self.own_potential))


def surface_tide_m2_s2(site: SurfaceSite, tdb: Pair, reference: ReferenceData) -> FloatArray:
    """Tide-raising potential at a place on another body, of all bodies of the ephemeris, m2/s2.

    The body is taken as rigid: what yields adds (k2 - h2), -2 % on the Moon. The Earth's at the Moon is up to 21 m2/s2
    (2.3e-16), most of it constant, for the Moon keeps one side to the Earth; the Sun's on Mars 0.1 m2/s2 (1e-18).
    """
    body = _body(site, reference)
    r, _ = event_offset(body, site, tdb, reference)
    others = tuple(number for number in PLANETARY_BODIES if number != body)
    return tidal_potential_m2_s2(r, tdb, reference, others, center=body)


def surface_rate_terms(
    site: SurfaceSite,
    tdb: Pair,
    reference: ReferenceData,
    against: Against = "TDB",
    *,
    simultaneity: Simultaneity | None = None,
) -> SurfaceRateTerms:
    """Parts of the rate of a clock on the surface of another body.

    Parameters
    ----------
    site : SurfaceSite
    tdb : Pair
        TDB counts of the clock's events, any shape.
    reference : ReferenceData
        Ephemeris and time ephemeris.
    against : str
        TDB, TCB; TT, TCG; `own`: the coordinate time of the body the clock is on, whose name on the Moon is TCL.
    simultaneity : {"TT", "TDB"}, optional
        Which TT or TCG goes with an event of the clock (see the head of this module): its own (default on the
        Moon), or that of the geocentre at the same TDB (default elsewhere).

    Raises
    ------
    InvalidInput
        Another scale, or something that is no SurfaceSite.
    ScaleMismatch
        TCL for a clock that is not on the Moon; `simultaneity="TT"` farther than 1e10 m from the Earth.
    MissingPiece
        For a body without a reference potential.
    OutOfSpan
        Where the ephemeris does not reach, with the mask.
    """
    if not isinstance(site, SurfaceSite):
        raise InvalidInput(f"a clock on another body is at a SurfaceSite, got {site!r:.60}")
    if against not in _ALLOWED:
        raise InvalidInput(f"a clock on another body is compared with {', '.join(_ALLOWED)}; got {against!r:.40}")
    if simultaneity not in (None, "TT", "TDB"):
        raise InvalidInput(f"simultaneity is 'TT', 'TDB' or None, got {simultaneity!r:.40}")
    body = _body(site, reference)
    if against == "TCL" and body != _MOON:
        raise ScaleMismatch(
            f"TCL does not reach {site.name!r}, which is not on the Moon: compare with TDB, TCB, TT, or with the "
            "body's own coordinate time, against='own'"
        )
    tide = -surface_tide_m2_s2(site, tdb, reference) / _C2
    nothing = np.zeros_like(tide)
    own = nothing - site.gravity_potential_m2_s2() / _C2
    if against in ("TCL", "own"):
        return SurfaceRateTerms(own, tide, nothing, nothing, nothing, nothing, nothing)
    time_rate = coordinate_time(body, reference).rate(tdb)
    place = -position_rate(body, tdb, *event_offset(body, site, tdb, reference), reference) * _PER_TCB
    scale, shift = nothing + _scale_rate(tdb, reference, against), nothing
    if against in ("TT", "TCG") and (simultaneity or default_simultaneity(body)) == "TT":
        shift = simultaneity_rate(site, tdb, reference) * (TT_PER_TCG if against == "TT" else 1.0)
    clock, time = own + tide, time_rate + place
    of_tdb = clock + time + clock * time
    total = (of_tdb - scale + shift) / (1.0 + scale - shift)
    products = total - (clock + time - scale + shift)
    return SurfaceRateTerms(own, tide, time_rate, place, -scale, shift, products)


def surface_proper_rate(site: SurfaceSite, t: Instants, against: Against, reference: ReferenceData) -> FloatArray:
    """dtau/dt - 1 of a clock on the surface of another body at Instants of any scale tied to TT, TDB, TCB or TCL.

    `surface_rate_terms(...).total` with its default of simultaneity; see there. Of TT and the scales tied to it the
    geocentre's is meant; on the Moon the rate changes by 1e-18 in the seconds to the clock's own.
    """
    if t.scale == "TCL":
        tdb = tdb_from_body_time(t.pair, _MOON, reference)
    else:
        counts = counts_of(t)
        tdb = counts.pair if counts.scale == "TDB" else tdb_from_tt_at_geocentre(counts.pair, reference)
    return surface_rate_terms(site, tdb, reference, against).total


def default_simultaneity(body: int) -> Simultaneity:
    """TT of the event itself on the Moon, of the geocentre at the same TDB on bodies that TT does not reach."""
    return "TT" if body == _MOON else "TDB"


def simultaneity_rate(site: SurfaceSite, tdb: Pair, reference: ReferenceData) -> FloatArray:
    """Change by TDB of the position term v_E.(x - x_E)/c^2 of a place on another body, to order c^-4.

    Raises
    ------
    ScaleMismatch
        Farther than 1e10 m from the Earth, where no event has a TT.
    """
    r, v = event_offset(_EARTH, site, tdb, reference)
    far = dot(r, r) > BODY_LIMIT_M**2
    if np.any(far):
        raise ScaleMismatch(
            f"{site.name!r} is over 1e10 m from the Earth, where no event has a TT of its own: take that of the "
            "geocentre at the same TDB, simultaneity='TDB'",
            mask=np.asarray(far),
        )
    return np.asarray(position_rate("earth", tdb, r, v, reference) * _PER_TCB)


def _body(site: SurfaceSite, reference: ReferenceData) -> int:
    return coordinate_time(site.body, reference).body


def _scale_rate(tdb: Pair, reference: ReferenceData, against: str) -> FloatArray | float:
    """dt/dTDB - 1 of a scale."""
    if against == "TDB":
        return 0.0
    if against == "TCB":
        return float(L_B / (1 - L_B))
    rate = reference.time_ephemeris.rate(tdb)
    if against == "TT":
        return rate
    gain = float(L_G / (1 - L_G))
    return np.asarray(rate + gain + rate * gain)
