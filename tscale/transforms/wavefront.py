"""A plane or spherical wavefront from a distant source: its dates at an observer and at the barycentre.

In TDB-compatible units, with x the observer, b = R (k0 + mu t) the source and R its distance,

    t_bary = t_obs - (|b - x| - |b|) / c - (gravitational delay),

the time at which the wavefront would pass the barycentre if no mass bent or slowed it. The first
part is split into the Roemer delay n.x/c (infinitely far source) and the curvature (parallax) term.
The gravitational delay of each body, at the place it had when the light passed it, is

    -(2GM/c^3) (1 + n.v/c) ln((r + n.r) / au),  r from the body to the observer, v the body's velocity

(the limit of IERS Conventions 2010 eq. 11.17 for a far source; the factor from Kopeikin and Schaefer 1999, Phys.
Rev. D 60, 124002). Its constant is a convention: a delay
is counted from light that arrives at 90 degrees from a body 1 au away.

Left out: the delay within other stars, the Galaxy's gravity and acceleration, radial motion of the
source, and the Earth's own field (up to 60 ps, it has no finite value at the geocentre) unless asked for.
"""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np

from .. import exact
from ..constants import AU_M, C_M_S, SUN_RADIUS_M
from ..earth.frames import dot
from ..earth.moving import observer_event
from ..earth.observer import Observer
from ..errors import NotConverged
from ..exact import BoolArray, FloatArray, Pair
from ..instants import Instants
from ..source import Source
from ..tables.reference import ReferenceData
from .terrestrial import require_scale

__all__ = [
    "DELAYING_BODIES",
    "WavefrontTerms",
    "barycenter_to_observer",
    "behind_the_sun",
    "observer_state",
    "observer_to_barycenter",
    "wavefront_terms",
]

DELAYING_BODIES: Final = ("sun", "mercury", "venus", "mars", "jupiter", "saturn", "uranus", "neptune", "moon")
"""Bodies whose gravitational delay is taken into account."""


class WavefrontTerms(NamedTuple):
    """t_bary - t_obs in parts, seconds."""

    terms_s: dict[str, FloatArray]
    """Each term by name; t_bary = t_obs + their sum."""
    rate: FloatArray
    """d(t_bary - t_obs)/dt_obs; zeros if it was not asked for."""

    def later(self, t: Pair) -> Pair:
        """`t` plus the terms, each added exactly to the pair."""
        for value in self.terms_s.values():
            t = exact.add_seconds(t, value)
        return t


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
        TDB-compatible BCRS, m and m/s; `v_m_s` has no meaning without `with_velocity`.
    """
    if observer is None:
        (earth, sun), (velocity, sun_velocity) = reference.ephemeris.states(("earth", "sun"), tdb)
        return earth, velocity, sun, sun_velocity
    event = observer_event(tdb, reference, observer, loose=loose)
    if with_velocity:
        x, v = event.bcrs_state(1.0 + reference.time_ephemeris.rate(tdb))
    else:
        x = v = event.bcrs_position()
    return x, v, event.bodies.sun_m, event.bodies.sun_v_m_s


def wavefront_terms(
    tdb: Pair,
    reference: ReferenceData,
    source: Source,
    observer: Observer | None = None,
    *,
    bodies: tuple[str, ...] = DELAYING_BODIES,
    second_order: bool = False,
    with_rate: bool = True,
    loose: bool = False,
) -> WavefrontTerms:
    """Every term of t_bary - t_obs for a wavefront met by an observer at TDB dates `tdb`.

    Parameters
    ----------
    tdb : Pair
        TDB count at which the wavefront meets the observer.
    reference : ReferenceData
        Ephemeris, time ephemeris, Earth orientation.
    source : Source
        Where the light comes from.
    observer : Observer or None
        Site or trajectory; None is the geocentre.
    bodies : tuple of str
        Bodies whose gravity delays the light.
    second_order : bool
        Add the Sun's delays of second and third order in GM/c^2 (18 ns and 30 ps at the limb, below 0.1 ns beyond 4
        degrees).
    with_rate : bool
        Whether the rate is wanted: it costs a fifth of the whole.
    loose : bool
        See `earth.moving.observer_event`; for dates that are still being sought.
    """
    x, v, sun, sun_velocity = observer_state(tdb, reference, observer, with_velocity=with_rate, loose=loose)
    # The direction is the one at the barycentric date; the first guess of that date is good to 4e-7 s
    # even for the largest proper motion known, and a microsecond moves no direction by 1e-17 rad.
    guess = source.direction(tdb)
    at_bary = exact.add_seconds(tdb, dot(guess, x) / C_M_S)
    place, place_rate = source.motion(at_bary)
    length = np.sqrt(dot(place, place))[..., np.newaxis]
    k = place / length
    along = dot(k, x)
    along_v = dot(k, v) if with_rate else along
    terms: dict[str, FloatArray] = {"Roemer delay": along / C_M_S}
    rate = np.zeros_like(along)
    if with_rate:
        k_rate = (place_rate - k * dot(k, np.broadcast_to(place_rate, k.shape))[..., np.newaxis]) / length
        rate = along_v / C_M_S + dot(k_rate, x) * ((1.0 + along_v / C_M_S) / C_M_S)
    seen = k
    if source.parallax_mas:
        distance = source.distance_m * length[..., 0]
        square = dot(x, x)
        # With b = distance k: |b - x| - |b| = -k.x + (x.x + k.x closer) / (|b - x| + |b|), no cancellation.
        path = np.sqrt(distance**2 - 2.0 * distance * along + square)
        closer = (square - 2.0 * distance * along) / (path + distance)
        terms["parallax (curvature)"] = (square + along * closer) / ((path + distance) * -C_M_S)
        if with_rate:
            rate = rate - (dot(x, v) + along_v * closer) / (path * C_M_S)
        seen = (k * distance[..., np.newaxis] - x) / path[..., np.newaxis]
    others = tuple(body for body in bodies if body != "sun")
    places, speeds = reference.ephemeris.states(others, tdb)
    for body in bodies:
        at = None if body == "sun" else others.index(body)
        body_m, body_v = (sun, sun_velocity) if at is None else (places[at], speeds[at])
        r, distance, depth = _passage(x, seen, body_m, body_v)
        # In the frame of the moving body: light against its motion is held up longer (8 ps at the limb of Jupiter).
        factor = (2.0 * reference.ephemeris.gm_m3_s2(body) / C_M_S**3) * (1.0 + dot(seen, body_v) / C_M_S)
        terms[f"minus Shapiro delay, {body}"] = factor * np.log(depth / AU_M)
        if with_rate:
            w = v - body_v
            rate = rate + factor * (dot(r, w) / distance + dot(seen, w)) / depth
    if second_order:
        second, third = _higher_orders(x, seen, sun, reference.ephemeris.gm_m3_s2("sun"))
        terms["minus Shapiro delay, sun, second order"] = second
        terms["minus Shapiro delay, sun, third order"] = third
    return WavefrontTerms(terms, np.asarray(rate))


def _passage(
    x: FloatArray, seen: FloatArray, body_m: FloatArray, body_v: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Vector r from a body to the observer when the light passed it, its length, and r + n.r.

    The body is moved back in a straight line by its light time: its acceleration would move it by
    less than 1 km, 0.1 ps at the limb of Jupiter.
    """
    r = x - body_m
    light_s = np.sqrt(dot(r, r)) / C_M_S
    r += body_v * light_s[..., np.newaxis]
    distance = np.sqrt(dot(r, r))
    # r + n.r = r (1 - cos angle): at the limb of Jupiter cancellation leaves 8 digits, 1e-16 s of 9 ns. The floor
    # only keeps the logarithm finite for a source exactly behind the centre of a body.
    return r, distance, np.maximum(distance + dot(seen, r), 1e-15 * distance)


def _higher_orders(x: FloatArray, seen: FloatArray, sun: FloatArray, gm: float) -> tuple[FloatArray, FloatArray]:
    """Minus the Sun's delays of second order and the leading part of the third, for a far source.

    With m = GM/c^2 and psi between the Sun-observer and the source direction: (m^2/(c r)) [15/4 psi/sin(psi) -
    4/(1 + cos psi)] (far-source limit of Le Poncin-Lafitte, Linet and Teyssandier 2004, Class. Quantum Grav. 21,
    4463, from memory; its second part is the bending of IERS Conventions 2010, eq. 11.14), and 8 m^3/(c (r + n.r)^2)
    (as in `link.delay`). Both lose their meaning within the Sun and are zero there.
    """
    r = x - sun
    distance = np.sqrt(dot(r, r))
    cosine = np.clip(dot(seen, r) / distance, -1.0, 1.0)
    cross = np.cross(seen, r) / distance[..., np.newaxis]
    sine = np.sqrt(dot(cross, cross))
    outside = (cosine > 0.0) | (sine * distance > SUN_RADIUS_M)
    psi = np.arctan2(sine, cosine)
    safe = np.where(sine > 1e-8, sine, 1.0)
    ratio = np.where(sine > 1e-8, psi / safe, 1.0)
    # 1 + cos = sin^2 / (1 - cos), stable where the Sun is in front of the source.
    opening = np.where(cosine > 0.0, 1.0 + cosine, safe**2 / np.where(cosine > 0.0, 1.0, 1.0 - cosine))
    m = gm / C_M_S**2
    second = -(m * m / (C_M_S * distance)) * (3.75 * ratio - 4.0 / opening)
    third = (-8.0 * m**3 / C_M_S) / (distance * opening) ** 2
    return np.where(outside, second, 0.0), np.where(outside, third, 0.0)


def behind_the_sun(tdb: Pair, reference: ReferenceData, source: Source, observer: Observer | None = None) -> BoolArray:
    """Whether the line of sight passes through the Sun (nominal radius), where no light would arrive."""
    x, _, sun, _ = observer_state(tdb, reference, observer, with_velocity=False)
    r = x - sun
    toward = source.direction(tdb)
    along = dot(toward, r)
    return np.asarray((along < 0.0) & (dot(r, r) - along * along < SUN_RADIUS_M**2))


def observer_to_barycenter(
    t: Instants,
    reference: ReferenceData,
    source: Source,
    observer: Observer | None = None,
    *,
    second_order: bool = False,
) -> Instants:
    """TDB at which a wavefront meets an observer (None: the geocentre) -> TDB at the barycentre."""
    require_scale(t, "TDB")
    terms = wavefront_terms(t.pair, reference, source, observer, second_order=second_order, with_rate=False)
    return Instants._of(terms.later(t.pair), "TDB", "BARYCENTER")


def barycenter_to_observer(
    t: Instants,
    reference: ReferenceData,
    source: Source,
    observer: Observer | None = None,
    *,
    second_order: bool = False,
) -> Instants:
    """TDB at the barycentre -> TDB at which the wavefront meets an observer, by Newton's method.

    The start is off by 500 s at most; the steps leave 1e-5 s, then 1e-14 s, then the rounding of the
    positions. Raises `NotConverged` if the last step still exceeds 1e-12 s.
    """
    require_scale(t, "TDB")
    guess = t.pair
    for _ in range(6):
        terms = wavefront_terms(guess, reference, source, observer, second_order=second_order, loose=True)
        missing = exact.seconds(exact.subtract(terms.later(guess), t.pair))
        step = missing / (1.0 + terms.rate)
        guess = exact.add_seconds(guess, -step)
        if np.max(np.abs(step), initial=0.0) < 1e-8:  # quadratic: the next step would be below 1e-20 s
            if observer is not None and hasattr(observer, "clip"):
                observer_event(guess, reference, observer)  # raises where the date found lies outside its span
            return Instants._of(guess, "TDB", "GEOCENTER" if observer is None else "TOPOCENTER")
    raise NotConverged(f"a wavefront date still moves by {np.max(np.abs(step)):.3g} s after 6 Newton steps")
