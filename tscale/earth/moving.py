"""Between the geocentric and the barycentric state of one observer at one event.

An event has one TT and one TDB, which differ by the topocentric term V.r/c^2 from the pair at the geocentre (2 us on
the ground, in which a low satellite moves 2 cm). Both functions find the other date first and then change
the vectors with the scale and Lorentz terms of `frames`; each is the other's inverse to 1e-9 m near the Earth.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import TYPE_CHECKING, NamedTuple

import numpy as np

from .. import exact
from ..constants import C_M_S, L_C
from ..exact import FloatArray, Pair
from .frames import bcrs_offset, bcrs_offset_velocity, dot
from .observer import Observer

if TYPE_CHECKING:
    from ..tables.reference import ReferenceData

__all__ = ["bcrs_state", "gcrs_state", "tdb_from_tt_at_geocentre", "tt_from_tdb_at_geocentre"]

_C2 = C_M_S**2


class _Earth(NamedTuple):
    """What the change of frame needs of the geocentre at TDB dates."""

    position_m: FloatArray
    velocity_m_s: FloatArray
    acceleration_m_s2: FloatArray
    potential_m2_s2: FloatArray


def _earth(tdb: Pair, reference: ReferenceData) -> _Earth:
    ephemeris = reference.ephemeris
    position, velocity = ephemeris.state("earth", tdb)
    to_sun = ephemeris.position("sun", tdb) - position
    distance = np.sqrt(dot(to_sun, to_sun))
    potential = np.asarray(ephemeris.gm_m3_s2("sun") / distance)
    # The Sun's pull stands for the whole acceleration (1 % for the Moon's): it only enters divided by c^2.
    return _Earth(position, velocity, to_sun * (potential / distance**2)[..., np.newaxis], potential)


def tt_from_tdb_at_geocentre(tdb: Pair, reference: ReferenceData) -> Pair:
    """TT count at the geocentre of a TDB count."""
    return exact.add_seconds(tdb, reference.time_ephemeris.tt_minus_tdb_s(tdb))


def tdb_from_tt_at_geocentre(tt: Pair, reference: ReferenceData) -> Pair:
    """TDB count at the geocentre of a TT count: one Newton step from TDB = TT leaves 1e-21 s."""
    table = reference.time_ephemeris
    return exact.add_seconds(tt, -table.tt_minus_tdb_s(tt) / (1.0 + table.rate(tt)))


def bcrs_state(observer: Observer, tdb: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray]:
    """Barycentric position (m) and velocity (m/s) of an observer at TDB counts, TDB-compatible.

    Parameters
    ----------
    observer : Observer
        A site or a trajectory near the Earth.
    tdb : Pair
        TDB count of the observer's event, any shape.
    reference : ReferenceData
        Ephemeris, time ephemeris, and what the observer needs.

    Returns
    -------
    x_m, v_m_s : float array, shape of `tdb` + (3,)

    Raises
    ------
    OutOfSpan
        Where the ephemeris or the observer does not reach.
    """
    earth = _earth(tdb, reference)
    tt = tt_from_tdb_at_geocentre(tdb, reference)
    # The term is taken from the vector at TT of the geocentre: its change over 2 us is of order c^-4.
    r_m, _ = observer.gcrs(tt, reference)
    r_m, v_m_s = observer.gcrs(exact.add_seconds(tt, -dot(earth.velocity_m_s, r_m) / _C2), reference)
    tt_rate = 1.0 + reference.time_ephemeris.rate(tdb) - _topocentric_rate(earth, r_m, v_m_s)
    offset = bcrs_offset(r_m, earth.velocity_m_s, earth.potential_m2_s2)
    velocity = bcrs_offset_velocity(
        r_m, v_m_s, earth.velocity_m_s, earth.acceleration_m_s2, earth.potential_m2_s2, tt_rate
    )
    return earth.position_m + offset, earth.velocity_m_s + velocity


def gcrs_state(
    state: Callable[[Pair], tuple[FloatArray, FloatArray]], tt: Pair, reference: ReferenceData
) -> tuple[FloatArray, FloatArray]:
    """Geocentric state (m, m/s; GCRS, TT-compatible) at TT counts of something whose barycentric state is known.

    Parameters
    ----------
    state : callable
        Gives barycentric, TDB-compatible position and velocity at TDB counts.
    tt : Pair
        TT count of the event, any shape.
    reference : ReferenceData
        Ephemeris and time ephemeris.

    Notes
    -----
    The inverse of `bcrs_state`: r = d (1 + U/c^2 + L_C) + (V.d) V / (2 c^2) with d the barycentric offset from the
    geocentre at the event's own TDB. Terms with the Earth's acceleration, a r^2 / c^2, are left out as in `frames`:
    1 mm at 10^5 km, 15 cm at 1.5 million km.
    """
    near = tdb_from_tt_at_geocentre(tt, reference)
    x_m, _ = state(near)
    position, velocity = reference.ephemeris.state("earth", near)
    tdb = exact.add_seconds(near, dot(velocity, x_m - position) / _C2)
    earth = _earth(tdb, reference)
    x_m, v_m_s = state(tdb)
    d, d_rate = x_m - earth.position_m, v_m_s - earth.velocity_m_s
    scale = (1.0 + earth.potential_m2_s2 / _C2 + L_C)[..., np.newaxis]
    along = (dot(earth.velocity_m_s, d) / (2.0 * _C2))[..., np.newaxis]
    rate = _topocentric_rate(earth, d, d_rate)
    along_rate = (0.5 * rate)[..., np.newaxis]
    r = d * scale + earth.velocity_m_s * along
    r_rate = d_rate * scale + earth.velocity_m_s * along_rate + earth.acceleration_m_s2 * along
    tt_rate = 1.0 + reference.time_ephemeris.rate(tdb) - rate
    return np.asarray(r), np.asarray(r_rate / tt_rate[..., np.newaxis])


def _topocentric_rate(earth: _Earth, r_m: FloatArray, v_m_s: FloatArray) -> FloatArray:
    """Rate of V.r/c^2."""
    return np.asarray((dot(earth.acceleration_m_s2, r_m) + dot(earth.velocity_m_s, v_m_s)) / _C2)
