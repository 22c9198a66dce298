"""What closed formulas say of an orbit about the Earth, and whole periods of a clock on another body."""

from __future__ import annotations

import math
from typing import TYPE_CHECKING, Any, Final, NamedTuple, cast

from .ends import ClockEnd
from .rates import Found, Model

if TYPE_CHECKING:
    from ...transforms.planetary import Compared, SurfaceClockSummary

__all__ = ["BodySummary", "OrbitSummary", "body_summary", "orbit_summary"]

_WHOLE_D: Final = {301: 6585.321, 4: 5495.84}
"""Days after which the periods of a body come round together: 223 synodic and 239 anomalistic months of the Moon; 8
years of Mars, 7 synodic periods and (but for 17 days) 15 years of the Earth."""
_YEARS_D: Final = {1: 879.69, 2: 2247.01}
_NEAREST_M: Final = 6.3e6
_FARTHEST_M: Final = 1e10


class OrbitSummary(NamedTuple):
    """An orbit about the Earth by its mean osculating elements and the closed formulas of `clocks.orbits`."""

    a_m: float
    e: float
    i_deg: float
    period_s: float
    revolutions: float
    """In the span; what is left of a whole one shows in the mean over the span, by the eccentricity."""
    gravitational: float
    kinematic: float
    j2: float
    total: float
    factory_offset: float
    """To be set before launch, so that the clock keeps TT in orbit."""
    eccentricity_amplitude_s: float
    """Of the periodic term -(2/c^2) r.v."""
    j2_amplitude_s: float
    """Of the periodic part of J2 beside the eccentricity term, at half a revolution."""
    two_body: bool
    """Whether the path comes from elements, and so knows no J2."""


class BodySummary(NamedTuple):
    """A clock on another body over whole periods."""

    start: str
    stop: str
    summary: SurfaceClockSummary


def orbit_summary(end: ClockEnd, found: Found, model: Model) -> OrbitSummary | None:
    """Summary of an orbit; None for a path that is none (a flight, a hyperbola, a site)."""
    import numpy as np

    from ...clocks import eccentricity_term_s, j2_term_s, orbit_rate
    from ...clocks.dates import tt_at
    from ...constants import EARTH_GM_TT_M3_S2 as GM
    from ...trajectory.kepler import KeplerOrbit

    if end.kind != "orbit":
        return None
    observer: Any = end.observer
    r_m, v_m_s = observer.gcrs(tt_at(found.span.dates, observer, model.reference), model.reference)
    distance = np.linalg.norm(r_m, axis=-1)
    a = 1.0 / (2.0 / distance - np.sum(v_m_s * v_m_s, axis=-1) / GM)
    turn = np.cross(r_m, v_m_s)
    toward = np.cross(v_m_s, turn) / GM - r_m / distance[..., np.newaxis]
    eccentricity = np.linalg.norm(toward, axis=-1)
    if not (np.all((a > _NEAREST_M) & (a < _FARTHEST_M)) and np.all(eccentricity < 1.0)):
        return None
    axis, e = float(np.mean(a)), float(np.mean(eccentricity))
    inclination = float(np.degrees(np.mean(np.arccos(turn[..., 2] / np.linalg.norm(turn, axis=-1)))))
    rate = orbit_rate(axis, inclination)
    period, span_s = 2.0 * math.pi * math.sqrt(axis**3 / GM), float(found.span.stop.minus(found.span.start))
    quarter = math.degrees(0.5 * math.pi - e)  # mean anomaly where the eccentric one is 90 degrees
    return OrbitSummary(
        axis,
        e,
        inclination,
        period,
        span_s / period,
        float(rate.gravitational),
        float(rate.kinematic),
        float(rate.j2),
        float(rate.total),
        float(rate.factory_offset),
        abs(float(eccentricity_term_s(axis, e, quarter))),
        abs(float(j2_term_s(axis, inclination, 45.0))),
        all(isinstance(piece.motion, KeplerOrbit) for piece in observer.pieces),
    )


def body_summary(end: ClockEnd, found: Found, model: Model) -> BodySummary | None:
    """Mean and periodic terms over whole periods about the middle of the span; None where there is no such thing.

    There is none for clocks elsewhere, against TCG or TCL, and where the ephemeris does not reach over one of them.
    """
    from ...body_shape import own_body
    from ...clocks.dates import tt_at
    from ...constants import DAY_S
    from ...instants import Instants
    from ...transforms.planetary import surface_clock_summary

    if end.kind != "surface" or model.against in ("TCG", "TCL"):
        return None
    site: Any = end.observer
    against = cast("Compared", model.against if model.against in ("TDB", "TCB") else "TT")
    body = own_body(site.body)
    whole_s = (_WHOLE_D | _YEARS_D)[body] * DAY_S
    first, last = (int(tt_at(t, None, model.reference)[0]) for t in found.span[:2])
    spans = model.reference.ephemeris.span, model.reference.time_ephemeris.span
    lowest, highest = max(span[0] for span in spans) + DAY_S, min(span[1] for span in spans) - DAY_S
    count = min(max(1, math.ceil((last - first) / whole_s)), int((highest - lowest) / whole_s))
    if count < 1:
        return None
    start = min(max((first + last - count * whole_s) // 2, lowest), highest - count * whole_s)
    ends = [Instants.from_seconds(int(x), 0.0, scale="TDB") for x in (start, start + count * whole_s)]
    summary = surface_clock_summary(site, model.reference, *ends, against=against)
    first_text, last_text = (str(t.to_iso(0))[:10] for t in ends)
    return BodySummary(first_text, last_text, summary)
