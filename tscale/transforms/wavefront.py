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

Left out: the delay within other stars, the Galaxy's gravity and acceleration, radial motion of the source; the
Earth's own field, which has no finite value at the geocentre (it varies by 20 ps over the sky of a site); near the limb
of a giant planet its flattening (0.1 to 0.3 ns for Jupiter) and its distance from the centre of mass of its system (200
km, 0.1 ns).
"""

from __future__ import annotations

from fractions import Fraction
from typing import Final, NamedTuple

import numpy as np

from .. import exact
from ..body_shape import MEAN_RADIUS_M
from ..constants import C_M_S
from ..earth.frames import dot
from ..earth.moving import Event
from ..earth.observer import Observer
from ..earth.site import Site
from ..ephemeris import body_id
from ..errors import NotConverged
from ..exact import BoolArray, FloatArray, Pair
from ..instants import Instants
from ..source import Source
from ..tables.reference import ReferenceData
from .barycentric import event_from_tt
from .observer_place import Barycentric, near_earth, observer_state, roemer_m
from .shapiro import Ray, passage, shapiro_terms
from .terrestrial import require_scale

__all__ = [
    "DELAYING_BODIES",
    "WavefrontTerms",
    "barycenter_to_observer",
    "hidden_by",
    "observer_state",
    "observer_to_barycenter",
    "observer_tt_to_barycenter",
    "wavefront_terms",
]

DELAYING_BODIES: Final = ("sun", "mercury", "venus", "mars", "jupiter", "saturn", "uranus", "neptune", "moon")
"""Bodies whose gravitational delay is taken into account."""

ROEMER: Final = "Roemer delay"

_GRID_PER_S: Final = 2.0**20


class WavefrontTerms(NamedTuple):
    """t_bary - t_obs in parts, seconds."""

    terms_s: dict[str, FloatArray]
    """Each term by name; t_bary = t_obs + their sum."""
    rate: FloatArray
    """d(t_bary - t_obs)/dt_obs; zeros if it was not asked for."""
    beyond_s: FloatArray
    """The part of the Roemer delay, below 1 ns, that is added to its float64 of 500 s (ulp 0.06 ps) exactly."""

    def exact(self) -> dict[str, Pair]:
        """The terms as exact pairs."""
        pairs = {name: exact.from_seconds(value) for name, value in self.terms_s.items()}
        pairs[ROEMER] = exact.add_seconds(pairs[ROEMER], self.beyond_s)
        return pairs

    def later(self, t: Pair) -> Pair:
        """`t` plus the terms, each added exactly to the pair."""
        for value in (*self.terms_s.values(), self.beyond_s):
            t = exact.add_seconds(t, value)
        return t


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
    event: Event | None = None,
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
    event : Event, optional
        What is at the observer at `tdb`, if it is known already; for one near the Earth.
    """
    # What is left of the rounding of positions is 0.01 ps. So that a date and the one found on the way back, 1e-16
    # s apart, see the same of it, all is evaluated on the nearest of a grid of 1 us and carried on in a straight line.
    grid = np.round(tdb[1] * _GRID_PER_S) / _GRID_PER_S
    beyond_s = tdb[1] - grid
    tdb = exact.normalise(tdb[0], grid)
    if observer is None or (isinstance(observer, Barycentric) and not observer.geocentric):
        x, v, sun, sun_velocity = observer_state(tdb, reference, observer, with_velocity=with_rate, loose=loose)
        near = np.zeros(3) if observer is None else x
    else:
        here = None if event is None else event.moved(-beyond_s)
        (x, v, sun, sun_velocity), near = near_earth(tdb, reference, observer, with_rate, loose, here)
    far = (near * 0.0, near * 0.0) if near is x else reference.ephemeris.position_apart_km("earth", tdb)
    # The direction is the one at the barycentric date; the first guess of that date is good to 4e-7 s
    # even for the largest proper motion known, and a microsecond moves no direction by 1e-17 rad.
    guess = source.direction(tdb)
    at_bary = exact.add_seconds(tdb, dot(guess, x) / C_M_S)
    toward, moved, place_rate = source.motion_apart(at_bary)
    place = toward + moved
    length = np.sqrt(dot(place, place))[..., np.newaxis]
    k = place / length
    # k - toward without the rounding of k; `toward` is a unit vector but for its own rounding.
    beyond_unit = float(sum(Fraction(float(part)) ** 2 for part in toward) - 1)
    excess = (2.0 * dot(moved, toward) + dot(moved, moved) + beyond_unit)[..., np.newaxis]
    turned = moved - place * (excess / (length * (1.0 + length)))
    along, left_m = roemer_m(toward, turned, (*far, near))
    along_v = dot(k, v)
    along_v_s = along_v / C_M_S
    roemer_s = along / C_M_S
    product, error = exact.two_product(roemer_s, C_M_S)
    left_s = ((along - product) - error + left_m) / C_M_S
    terms: dict[str, FloatArray] = {ROEMER: roemer_s}
    rate = np.zeros_like(along)
    if with_rate:
        k_rate = (place_rate - k * dot(k, np.broadcast_to(place_rate, k.shape))[..., np.newaxis]) / length
        along_v = along_v + dot(k_rate, x) * (1.0 + along_v / C_M_S)
        rate = along_v / C_M_S
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
    delays, delay_rate = shapiro_terms(
        tdb,
        Ray(x, v, seen, sun, sun_velocity),
        reference.ephemeris,
        bodies,
        second_order=second_order,
        with_rate=with_rate,
    )
    terms |= delays
    rate = rate + delay_rate if with_rate else rate
    return WavefrontTerms(terms, np.asarray(rate), np.asarray(along_v_s * beyond_s + left_s))


def hidden_by(
    tdb: Pair, reference: ReferenceData, source: Source, observer: Observer | None = None
) -> dict[str, BoolArray]:
    """For each body whether it stands in the line of sight (mean radius; the Sun's nominal one): no light would arrive.

    The Earth is looked at for observers off the ground only: on it, what stands above the horizon is seen.

    Parameters
    ----------
    tdb, reference, source, observer
        As for `wavefront_terms`.
    """
    x, _, _, _ = observer_state(tdb, reference, observer, with_velocity=False)
    toward = source.direction(tdb)
    bodies = DELAYING_BODIES if observer is None or isinstance(observer, Site) else (*DELAYING_BODIES, "earth")
    places, speeds = reference.ephemeris.states(bodies, tdb)
    found = {}
    for body, place, speed in zip(bodies, places, speeds, strict=True):
        r, distance, _ = passage(x, toward, place, speed)
        along = dot(toward, r)
        found[body] = np.asarray((along < 0.0) & (distance**2 - along * along < MEAN_RADIUS_M[body_id(body)] ** 2))
    return found


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


def observer_tt_to_barycenter(
    t: Instants, reference: ReferenceData, source: Source, observer: Observer, *, second_order: bool = False
) -> Instants:
    """TT of an event at an observer near the Earth -> TDB at the barycentre: `tt_to_tdb` and then
    `observer_to_barycenter`, with the observer's place looked up once.
    """
    require_scale(t, "TT")
    tdb, event = event_from_tt(t.pair, reference, observer)
    terms = wavefront_terms(tdb, reference, source, observer, second_order=second_order, with_rate=False, event=event)
    return Instants._of(terms.later(tdb), "TDB", "BARYCENTER")


def barycenter_to_observer(
    t: Instants,
    reference: ReferenceData,
    source: Source,
    observer: Observer | None = None,
    *,
    second_order: bool = False,
) -> Instants:
    """TDB at the barycentre -> TDB at which the wavefront meets an observer, by Newton's method.

    The start, from the plane wave at the geocentre, is off by 50 ms for an observer near the Earth; the steps leave
    1e-13 s, then the rounding of the positions. Raises `NotConverged` if the sixth still moves a date by 1 ps.
    """
    require_scale(t, "TDB")
    barycentric = isinstance(observer, Barycentric) and not observer.geocentric
    near, _, _, _ = observer_state(t.pair, reference, observer if barycentric else None, loose=True)
    guess = exact.add_seconds(t.pair, dot(source.direction(t.pair), near) / -C_M_S)
    for _ in range(6):
        terms = wavefront_terms(guess, reference, source, observer, second_order=second_order, loose=True)
        missing = exact.seconds(exact.subtract(terms.later(guess), t.pair))
        step = missing / (1.0 + terms.rate)
        guess = exact.add_seconds(guess, -step)
        if np.max(np.abs(step), initial=0.0) < 1e-12:  # so that the grid used is that of the date found
            if observer is not None and hasattr(observer, "clip"):
                observer_state(guess, reference, observer)  # raises where the date found lies outside its span
            return Instants._of(guess, "TDB", "GEOCENTER" if observer is None else "TOPOCENTER")
    raise NotConverged(
        f"wavefront dates still move by {np.max(np.abs(step)):.3g} s after 6 Newton steps", mask=np.abs(step) >= 1e-12
    )
