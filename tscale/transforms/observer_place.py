"""Where an observer is in the barycentric frame, and its projection on a direction, rounded less than a position is."""

from __future__ import annotations

from typing import Any, Protocol, TypeAlias, runtime_checkable

import numpy as np

from .. import exact
from ..earth.frames import dot
from ..earth.moving import Event, observer_event
from ..earth.observer import SLACK_S, Observer
from ..exact import FloatArray, Pair
from ..tables.reference import ReferenceData

__all__ = ["Barycentric", "State", "near_earth", "observer_state", "roemer_m"]

State: TypeAlias = tuple[FloatArray, FloatArray, FloatArray, FloatArray]
"""Barycentric place and velocity of an observer, and the Sun's."""


@runtime_checkable
class Barycentric(Protocol):
    """A trajectory; one that is not geocentric is followed in the barycentric frame alone."""

    @property
    def geocentric(self) -> bool:
        """Whether its own vectors are geocentric."""
        ...

    def state_bcrs(self, tdb: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray]:
        """Barycentric position (m) and velocity (m/s)."""
        ...

    def clip_tdb(self, tdb: Pair, reference: ReferenceData) -> Pair:
        """TDB counts moved into its span."""
        ...


def observer_state(
    tdb: Pair,
    reference: ReferenceData,
    observer: Observer | None,
    *,
    with_velocity: bool = True,
    loose: bool = False,
) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Barycentric place and velocity of the observer (None: the geocentre), and the Sun's state.

    Returns
    -------
    x_m, v_m_s, sun_m, sun_v_m_s : (..., 3) arrays
        TDB-compatible BCRS, m and m/s; without `with_velocity` v is good to 1e-4 m/s only.
    """
    if observer is None:
        (earth, sun), (velocity, sun_velocity) = reference.ephemeris.states(("earth", "sun"), tdb)
        return earth, velocity, sun, sun_velocity
    if isinstance(observer, Barycentric) and not observer.geocentric:
        asked = observer.clip_tdb(tdb, reference)
        ahead_s = exact.seconds(exact.subtract(tdb, asked))
        if not loose and np.any(np.abs(ahead_s) > SLACK_S):
            asked = tdb  # which raises
        x, v = observer.state_bcrs(asked, reference)
        x = x + v * ahead_s[..., np.newaxis]
        sun, sun_velocity = reference.ephemeris.state("sun", tdb)
        return x, v, sun, sun_velocity
    return near_earth(tdb, reference, observer, with_velocity, loose)[0]


def near_earth(
    tdb: Pair,
    reference: ReferenceData,
    observer: Observer,
    with_velocity: bool,
    loose: bool,
    event: Event | None = None,
) -> tuple[State, FloatArray]:
    """What `observer_state` gives of an observer near the Earth, and the vector from the geocentre, m."""
    if event is None:
        event = observer_event(tdb, reference, observer, loose=loose)
    offset = event.offset()
    own = event.offset_rate(1.0 + reference.time_ephemeris.rate(tdb)) if with_velocity else event.v_gcrs_m_s
    return (
        event.bodies.earth_m + offset,
        event.bodies.earth_v_m_s + own,
        event.bodies.sun_m,
        event.bodies.sun_v_m_s,
    ), offset


def roemer_m(toward: FloatArray, turned: FloatArray, parts: tuple[FloatArray, FloatArray, FloatArray]) -> Any:
    """k.x as a sum of two floats, m: k in the parts `toward` (3,) and `turned`, x in km, km and m.

    The product of the constant parts, up to 1.5e11 m, is taken without rounding; all others are smaller.
    """
    constant_km, rest_km, near_m = parts
    product, error = exact.two_product(toward, constant_km)
    first, slip = exact.two_sum(product[..., 0], product[..., 1])
    total, more = exact.two_sum(first, product[..., 2])
    small = dot(toward, rest_km) + dot(turned, constant_km + rest_km)
    small = small + (error[..., 0] + error[..., 1] + error[..., 2] + slip + more)
    high, low = exact.two_product(total, 1e3)
    # Added without rounding, so that a difference of 1e-8 m in the observer's place stays as small.
    rest, error = exact.two_sum(1e3 * small, dot(toward + turned, near_m))
    high, slip = exact.two_sum(high, rest)
    return high, slip + (low + error)
