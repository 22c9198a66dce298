"""Events dated in a body's own coordinate time: at its centre, on its surface, or anywhere near it.

IAU 2000 Resolution B1.5, which IAU 2024 Resolution II takes over for the Moon, written for any body B:

    TCB - T = D(TCB) + q,   q = v_B.r / c^2 + [(3 w + v_B^2/2) v_B.r - 4 w_i.r] / c^4,   r = x - x_B,

where D is the integral at the body's centre, kept by `BodyTimeEphemeris`, w and w_i the scalar and vector potential of
all other bodies there, and r the barycentric difference at one TCB. q is the *position term*: what two events at one
TCB are apart in T because they are not at one place. It is no rate of any clock: at the geocentre TCL has it with
128 us and the period of the synodic month, and over the months it adds up to nothing.
"""

from __future__ import annotations

from typing import Final, NamedTuple, TypeAlias

import numpy as np

from .. import exact
from ..constants import C_M_S, L_B
from ..earth.frames import dot
from ..earth.moving import observer_event
from ..earth.observer import Observer
from ..ephemeris import Ephemeris
from ..ephemeris.bodies import PLANETARY_BODIES, body_name
from ..ephemeris.body_time import BodyTimeEphemeris
from ..errors import InvalidInput, ScaleMismatch
from ..exact import FloatArray, Pair
from ..surface import SurfaceSite, contracted
from ..tables.reference import ReferenceData
from ..trajectory import Trajectory

__all__ = [
    "BODY_LIMIT_M",
    "Place",
    "PositionTerms",
    "body_time_from_tdb",
    "body_time_rate",
    "coordinate_time",
    "event_offset",
    "position_rate",
    "position_terms",
    "tdb_from_body_time",
]

_C2: Final = C_M_S**2
_TCB_METRE: Final = float(1 / (1 - L_B))

BODY_LIMIT_M: Final = 1e10
"""Distance from a body up to which events are dated in its coordinate time, m: what the terms of order c^-4 leave out
grows as its square and reaches 2e-12 s there."""

Place: TypeAlias = "SurfaceSite | Observer | Trajectory | str | int | None"
"""Where an event is: on another body, at a site or trajectory, at the centre of a body, or (None) at the centre of the
body whose time is asked for."""


class PositionTerms(NamedTuple):
    """TCB - T of an event minus that of the body's centre at the same TCB, seconds."""

    first_s: FloatArray
    """v_B.r / c^2."""
    second_s: FloatArray
    """The companion of order c^-4."""

    @property
    def total_s(self) -> FloatArray:
        """Both terms."""
        return self.first_s + self.second_s


def coordinate_time(body: str | int, reference: ReferenceData | Ephemeris) -> BodyTimeEphemeris:
    """Find the planetocentric coordinate time of a body: TCL of the Moon, TCG of the Earth, the like of any other.

    Parameters
    ----------
    body : str or int
        Name or NAIF number: the Sun, a planet (its system), the Earth, the Moon or Pluto's system.
    reference : ReferenceData or Ephemeris
        The planetary ephemeris to integrate along. A century takes 0.3 s (0.6 s for the Moon), once a process.

    Raises
    ------
    InvalidInput
        For a body without one.
    OutOfSpan
        For a kernel that neither reaches T0 nor overlaps the shipped one.
    """
    return BodyTimeEphemeris.of(reference if isinstance(reference, Ephemeris) else reference.ephemeris, body)


class _Surroundings(NamedTuple):
    """Motion of a body and the potentials and pull of the others at its centre, barycentric."""

    v_m_s: FloatArray
    potential_m2_s2: FloatArray
    vector_m3_s3: FloatArray
    acceleration_m_s2: FloatArray

    @classmethod
    def at(cls, ephemeris: Ephemeris, body: int, tdb: Pair) -> _Surroundings:
        positions, velocities = ephemeris.states(PLANETARY_BODIES, tdb)
        here = PLANETARY_BODIES.index(body)
        vector, acceleration = np.zeros_like(positions[here]), np.zeros_like(positions[here])
        potential = np.zeros(acceleration.shape[:-1])
        for number, position, velocity in zip(PLANETARY_BODIES, positions, velocities, strict=True):
            if number != body:
                toward = position - positions[here]
                distance2 = dot(toward, toward)
                pull = ephemeris.gm_m3_s2(number) / np.sqrt(distance2)
                potential += pull
                vector += velocity * pull[..., np.newaxis]
                acceleration += toward * (pull / distance2)[..., np.newaxis]
        return cls(velocities[here], potential, vector, acceleration)

    @property
    def stretch(self) -> FloatArray:
        """(3 w + v^2/2)/c^2."""
        return np.asarray((3.0 * self.potential_m2_s2 + 0.5 * dot(self.v_m_s, self.v_m_s)) / _C2)

    def terms(self, r_m: FloatArray) -> PositionTerms:
        first = dot(self.v_m_s, r_m) * (_TCB_METRE / _C2)
        return PositionTerms(first, first * self.stretch - dot(self.vector_m3_s3, r_m) * (4.0 / _C2**2))

    def rate(self, r_m: FloatArray, rate_m_s: FloatArray) -> FloatArray:
        growth = (dot(self.acceleration_m_s2, r_m) + dot(self.v_m_s, rate_m_s)) / _C2
        return np.asarray(growth * (1.0 + self.stretch) - dot(self.vector_m3_s3, rate_m_s) * (4.0 / _C2**2))


def position_terms(body: str | int, tdb: Pair, r_m: FloatArray, reference: ReferenceData) -> PositionTerms:
    """Position terms q of TCB - T.

    Parameters
    ----------
    body : str or int
        Body whose coordinate time is T.
    tdb : Pair
        TDB counts of the events, any shape.
    r_m : float array (..., 3)
        Barycentric, TDB-compatible vectors from the body's centre to the events, m.
    reference : ReferenceData
        Its ephemeris is used.

    Notes
    -----
    Terms of order c^-4 that are quadratic in r are left out: 4e-15 s for TCL at the geocentre, 1e-19 s on the Moon.
    """
    number = coordinate_time(body, reference).body
    return _Surroundings.at(reference.ephemeris, number, tdb).terms(np.asarray(r_m, dtype=np.float64))


def position_rate(
    body: str | int, tdb: Pair, r_m: FloatArray, rate_m_s: FloatArray, reference: ReferenceData
) -> FloatArray:
    """Derivative of the position terms by TCB for an event that moves by dr/dt = `rate_m_s`; see `position_terms`.

    The motion of the body is that of Newtonian points, 1e-7 of it: 3e-18 for the geocentre dated in TCL.
    """
    number = coordinate_time(body, reference).body
    return _Surroundings.at(reference.ephemeris, number, tdb).rate(np.asarray(r_m), np.asarray(rate_m_s))


def event_offset(
    body: int, place: Place, tdb: Pair, reference: ReferenceData, *, loose: bool = False
) -> tuple[FloatArray, FloatArray]:
    """Barycentric TDB-compatible vector (m) from a body's centre to a place, and its rate (m/s), each (..., 3).

    With `loose`, past the span of a trajectory a straight line from its end is followed, as an iteration may need.
    """
    shape = (*np.broadcast_shapes(np.shape(tdb[0]), np.shape(tdb[1])), 3)
    if place is None:
        return np.zeros(shape), np.zeros(shape)
    ephemeris = reference.ephemeris
    if isinstance(place, str | int):
        return ephemeris.state(place, tdb, body)
    if isinstance(place, SurfaceSite) and BodyTimeEphemeris.number(place.body) == body:
        _, velocity = ephemeris.state(body, tdb)
        r, v = place.offset(tdb)
        return contracted(r, velocity), v
    if isinstance(place, SurfaceSite):
        x, v = place.state_bcrs(tdb, reference)
    elif isinstance(place, Trajectory) and not place.geocentric:
        inside = place.clip_tdb(tdb, reference) if loose else tdb
        x, v = place.state_bcrs(inside, reference)
        if loose:
            x = x + v * exact.seconds(exact.subtract(tdb, inside))[..., np.newaxis]
    elif isinstance(place, Observer):
        event = observer_event(tdb, reference, place, loose=loose)
        r, v = event.offset(), event.offset_rate(1.0 + reference.time_ephemeris.rate(tdb))
        center, center_v = ephemeris.state("earth", tdb, body)
        return center + r, center_v + v
    else:
        raise InvalidInput(
            f"an event is at a Site, a Trajectory, a SurfaceSite or the centre of a body (name or number), got "
            f"{place!r:.60}"
        )
    center, center_v = ephemeris.state(body, tdb)
    return np.asarray(x - center), np.asarray(v - center_v)


def body_time_from_tdb(tdb: Pair, body: str | int, reference: ReferenceData, place: Place = None) -> Pair:
    """Count of a body's coordinate time of an event that TDB dates.

    Parameters
    ----------
    tdb : Pair
        TDB counts of the event, any shape.
    body : str or int
        Body whose coordinate time is wanted.
    reference : ReferenceData
        Ephemeris, and what the place needs.
    place : SurfaceSite, Site, Trajectory, str, int or None
        Where the event is; None is the body's centre, a name or number another body's.

    Raises
    ------
    OutOfSpan
        Where ephemeris, Earth orientation or trajectory do not reach, with the mask.
    ScaleMismatch
        For an event more than `BODY_LIMIT_M` from the body.
    """
    time = coordinate_time(body, reference)
    count = time.from_tdb(tdb)
    if place is None:
        return count
    return exact.add_seconds(count, -_terms(time, place, tdb, reference).total_s)


def tdb_from_body_time(count: Pair, body: str | int, reference: ReferenceData, place: Place = None) -> Pair:
    """TDB count of an event that a body's coordinate time dates; the inverse of `body_time_from_tdb` to 0.4 fs."""
    time = coordinate_time(body, reference)
    near = time.to_tdb(count)
    if place is None:
        return near
    # The terms move by 3e-10 of an error of the date: from 2e-4 s to 1e-13 s, to 1e-22 s.
    for loose in (True, True, False):
        terms = _terms(time, place, near, reference, loose=loose)
        near = time.to_tdb(exact.add_seconds(count, terms.total_s))
    return near


def body_time_rate(tdb: Pair, body: str | int, reference: ReferenceData, place: Place = None) -> FloatArray:
    """dT/dTDB - 1 along the path of a place, T the coordinate time of a body; see `body_time_from_tdb`.

    To 1e-17; the change of the factor of the order c^-4 is left out.
    """
    time = coordinate_time(body, reference)
    rate = time.rate(tdb)
    if place is None:
        return rate
    r_m, v_m_s = _near(time, place, tdb, reference)
    return np.asarray(rate - _Surroundings.at(reference.ephemeris, time.body, tdb).rate(r_m, v_m_s) * _TCB_METRE)


def _near(
    time: BodyTimeEphemeris, place: Place, tdb: Pair, reference: ReferenceData, *, loose: bool = False
) -> tuple[FloatArray, FloatArray]:
    """`event_offset`, refused too far from the body."""
    offset = event_offset(time.body, place, tdb, reference, loose=loose)
    far = dot(offset[0], offset[0]) > BODY_LIMIT_M**2
    if np.any(far):
        raise ScaleMismatch(
            f"{int(np.count_nonzero(far))} of {far.size} events are over {BODY_LIMIT_M:.0e} m from "
            f"{body_name(time.body)}, where its coordinate time does not reach: date them in TDB or TCB",
            mask=np.asarray(far),
        )
    return offset


def _terms(
    time: BodyTimeEphemeris, place: Place, tdb: Pair, reference: ReferenceData, *, loose: bool = False
) -> PositionTerms:
    r_m, _ = _near(time, place, tdb, reference, loose=loose)
    return _Surroundings.at(reference.ephemeris, time.body, tdb).terms(r_m)
