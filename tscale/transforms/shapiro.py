"""Gravitational delay of light from a far source: where it passes a body, and the Sun's higher orders."""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np

from ..body_shape import MEAN_RADIUS_M
from ..constants import AU_M, C_M_S, SUN_RADIUS_M
from ..earth.frames import dot
from ..ephemeris import Ephemeris, body_id
from ..errors import GeometryError, OutOfSpan
from ..exact import BoolArray, FloatArray, Pair

__all__ = ["HigherOrders", "Ray", "higher_orders", "passage", "shapiro_terms"]

_BLOCK: Final = 8192
"""Instants handled at a time, so that the states of all bodies stay in the processor's cache."""


class Ray(NamedTuple):
    """The observer's barycentric state, the direction of the source, and the Sun's state; (..., 3) each."""

    x_m: FloatArray
    v_m_s: FloatArray
    seen: FloatArray
    sun_m: FloatArray
    sun_v_m_s: FloatArray


def shapiro_terms(
    tdb: Pair, ray: Ray, ephemeris: Ephemeris, bodies: tuple[str, ...], *, second_order: bool, with_rate: bool
) -> tuple[dict[str, FloatArray], FloatArray]:
    """Minus the gravitational delay of each body, s, by name, and the rate of their sum (zeros without `with_rate`).

    Parameters
    ----------
    tdb : Pair
        TDB count at which the light meets the observer, any shape.
    ray : Ray
    ephemeris : Ephemeris
    bodies : tuple of str
    second_order : bool
        Add the Sun's second and third order.

    Raises
    ------
    OutOfSpan
        Where the ephemeris does not reach, with the mask.
    GeometryError
        For events within half a radius of a body's centre, with the mask.
    """
    names = [f"minus Shapiro delay, {body}" for body in bodies]
    if second_order and "sun" in bodies:
        names += ["minus Shapiro delay, sun, second order", "minus Shapiro delay, sun, third order"]
    shape = np.shape(ray.x_m)[:-1]
    flat = Ray(*(np.broadcast_to(vectors, (*shape, 3)).reshape(-1, 3) for vectors in ray))
    whole, fraction = np.broadcast_to(tdb[0], shape).reshape(-1), np.broadcast_to(tdb[1], shape).reshape(-1)
    out = np.zeros((len(names) + 1, whole.size))
    inside = np.zeros(whole.size, dtype=np.bool_)
    try:
        for i in range(0, whole.size, _BLOCK):
            part = slice(i, i + _BLOCK)
            block = Ray(*(vectors[part] for vectors in flat))
            _terms_of_block(
                out[:, part],
                inside[part],
                (whole[part], fraction[part]),
                block,
                ephemeris,
                bodies,
                second_order,
                with_rate,
            )
    except OutOfSpan:
        ephemeris.positions(bodies, tdb)  # raises it again, with the mask of all dates
        raise
    if np.any(inside):
        raise GeometryError(
            f"{int(np.count_nonzero(inside))} of {inside.size} events lie deep inside one of {', '.join(bodies)}, "
            "where its gravity delays no signal by a finite time; leave them out (see .mask), or name the other "
            "bodies in bodies= of transforms.wavefront_terms",
            mask=inside.reshape(shape),
        )
    columns = out.reshape(len(out), *shape)
    return dict(zip(names, columns[:-1], strict=True)), columns[-1]


def _terms_of_block(
    out: FloatArray,
    inside: BoolArray,
    tdb: Pair,
    ray: Ray,
    ephemeris: Ephemeris,
    bodies: tuple[str, ...],
    second_order: bool,
    with_rate: bool,
) -> None:
    """Fill the rows of `out`, a term each, the rate last; mark the events within half a radius of a body's centre."""
    others = tuple(body for body in bodies if body != "sun")
    places, speeds = ephemeris.states(others, tdb)
    states = dict(zip(others, zip(places, speeds, strict=True), strict=True)) | {"sun": (ray.sun_m, ray.sun_v_m_s)}
    for row, body in enumerate(bodies):
        body_m, body_v = states[body]
        r, distance, depth = passage(ray.x_m, ray.seen, body_m, body_v)
        within = distance < 0.5 * MEAN_RADIUS_M[body_id(body)]
        if np.any(within):
            inside |= within
            depth = np.where(within, AU_M, depth)
            distance = np.where(within, AU_M, distance)
        gm = ephemeris.gm_m3_s2(body)
        # In the frame of the moving body: light against its motion is held up longer (8 ps at the limb of Jupiter).
        factor = (2.0 * gm / C_M_S**3) * (1.0 + dot(ray.seen, body_v) / C_M_S)
        out[row] = factor * np.log(depth / AU_M)
        if with_rate:
            w = ray.v_m_s - body_v
            out[-1] += factor * (dot(r, w) / distance + dot(ray.seen, w)) / depth
        if second_order and body == "sun":
            higher = higher_orders(r, ray.seen, ray.v_m_s - body_v, gm)
            out[-3], out[-2] = higher.second_s, higher.third_s
            if with_rate:
                out[-1] += higher.rate


def passage(
    x: FloatArray, seen: FloatArray, body_m: FloatArray, body_v: FloatArray
) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Vector r from a body to the observer when the light passed it, its length, and r + n.r.

    The body is moved back in a straight line by its light time: its acceleration would move Jupiter by 500 m, 0.3 ps at
    its limb.
    """
    r = x - body_m
    light_s = np.sqrt(dot(r, r)) / C_M_S
    r += body_v * light_s[..., np.newaxis]
    distance = np.sqrt(dot(r, r))
    # r + n.r = r (1 - cos angle): at the limb of Jupiter cancellation leaves 8 digits, 1e-16 s of 9 ns. The floor
    # only keeps the logarithm finite for a source exactly behind the centre of a body.
    return r, distance, np.maximum(distance + dot(seen, r), 1e-15 * distance)


class HigherOrders(NamedTuple):
    """Minus the delays of second and third order, s, and the rate of their sum."""

    second_s: FloatArray
    third_s: FloatArray
    rate: FloatArray


def higher_orders(r: FloatArray, seen: FloatArray, w: FloatArray, gm: float) -> HigherOrders:
    """Minus the Sun's delays of second order and the leading part of the third, for a far source, and their rate.

    With m = GM/c^2, psi between r (Sun to observer) and the source direction n, d = r + n.r:

        (m^2/c) [15/4 psi/(r sin psi) - 4/d],   8 m^3/(c d^2)

    (far-source limit of Le Poncin-Lafitte, Linet and Teyssandier 2004, Class. Quantum Grav. 21, 4463, from memory; its
    second part is the bending of IERS Conventions 2010, eq. 11.14; the third order as in `link.delay`). They lose
    their meaning within the Sun and are zero there. `w` is the velocity of the observer past the Sun.
    """
    distance = np.sqrt(dot(r, r))
    cosine = np.clip(dot(seen, r) / distance, -1.0, 1.0)
    cross = np.cross(seen, r)
    across = np.sqrt(dot(cross, cross))
    outside = (cosine > 0.0) | (across > SUN_RADIUS_M)
    sine = across / distance
    safe = np.where(sine > 1e-8, sine, 1.0)
    psi = np.arctan2(sine, cosine)
    ratio = np.where(sine > 1e-8, psi / safe, 1.0)
    # d = r + n.r, as |r x n|^2 / (r - n.r) where the Sun is in front of the source.
    front = np.where(cosine > 0.0, 1.0, 1.0 - cosine)
    d = distance * np.where(cosine > 0.0, 1.0 + cosine, safe**2 / front)
    m = gm / C_M_S**2
    second = (-m * m / C_M_S) * (3.75 * ratio / distance - 4.0 / d)
    third = (-8.0 * m**3 / C_M_S) / d**2
    speed = dot(r, w) / distance
    d_rate = speed + dot(seen, w)
    cosine_rate = (dot(seen, w) - cosine * speed) / distance
    ratio_rate = np.where(sine > 1e-8, -cosine_rate * (safe - psi * cosine) / safe**3, 0.0)
    rate = (-m * m / C_M_S) * (3.75 * (ratio_rate - ratio * speed / distance) / distance + 4.0 * d_rate / d**2)
    rate += (16.0 * m**3 / C_M_S) * d_rate / d**3
    return HigherOrders(*(np.where(outside, value, 0.0) for value in (second, third, rate)))
