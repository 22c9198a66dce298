"""Gravitational delay of light between two points, with its rate, and what stands in the way.

For a body of mass parameter GM at rest, with r1, r2 from the body to both ends and rho between them,

    (2 GM / c^3) ln[(r1 + r2 + rho) / (r1 + r2 - rho)]                  IERS Conventions 2010, eq. 11.17.

A moving body is treated in its own frame: r1 and r2 are taken at the dates of the two events from the straight
line that touches the body's orbit at the light's closest approach, and the delay is (1 - k.v/c) times that above
(k along the light, v the body's velocity): 5 ps for the Sun and 8 ps for Jupiter at the limb (Kopeikin and
Schaefer 1999, Phys. Rev. D 60, 124002, to first order in v/c).

The Sun's second order, m = GM/c^2, psi the angle between r1 and r2:

    (m^2 rho / (c r1 r2)) [15/4 psi/sin(psi) - 4/(1 + cos psi)]

(Le Poncin-Lafitte, Linet and Teyssandier 2004, Class. Quantum Grav. 21, 4463, from memory; its second part, the
bending, is that of IERS Conventions 2010, eq. 11.14), and the leading part of the third, 8 m^3 / (c (r1 + r2 - rho)^2),
which Fermat's principle gives for a thin lens (32 ps for a far source at the limb, as in Linet and Teyssandier 2013,
Class. Quantum Grav. 30, 175008, from memory). The three together agree with rays traced through the exact static
field between the Earth and Mars to 0.4 ps, the rounding of that check.

Left out: the Sun's flattening (2 ps at the limb) and spin, the planets' flattening (below 0.1 ps), refraction in
the solar corona, the air and interplanetary plasma.
"""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final, NamedTuple

import numpy as np

from .. import exact
from ..body_shape import MEAN_RADIUS_M, own_body
from ..constants import C_M_S
from ..earth.frames import dot
from ..ephemeris import Ephemeris, body_id, body_name
from ..errors import GeometryError
from ..exact import BoolArray, FloatArray, Pair

__all__ = ["Gravity", "Ray", "gravity"]

_SUN: Final = 10
_FAR_S: Final = 10.0


class Ray(NamedTuple):
    """A light path as a straight line: the date it starts, its duration, and both ends' barycentric states."""

    transmit_tdb: Pair
    light_s: FloatArray
    x_transmit_m: FloatArray
    v_transmit_m_s: FloatArray
    x_receive_m: FloatArray
    v_receive_m_s: FloatArray


class Gravity(NamedTuple):
    """Delays by name (s), their partial rates, and the bodies in the way."""

    terms_s: dict[str, FloatArray]
    total_s: FloatArray
    by_receive: FloatArray
    """Partial derivative of the total by the date of reception."""
    by_transmit: FloatArray
    """Partial derivative of the total by the date of transmission."""
    blocked: dict[int, BoolArray]
    """Where the line passes through a body between its ends."""


class _Lens(NamedTuple):
    """The geometry of one body, in its own frame (first order)."""

    r1: FloatArray
    r2: FloatArray
    w1: FloatArray
    w2: FloatArray
    factor: FloatArray


def gravity(
    ray: Ray, ephemeris: Ephemeris, bodies: Sequence[str | int], *, second_order: bool, clear: frozenset[int]
) -> Gravity:
    """Every gravitational delay along a ray.

    Parameters
    ----------
    ray : Ray
    ephemeris : Ephemeris
        For the bodies' states and mass parameters.
    bodies : sequence of str or int
        Bodies that delay the light and may stand in its way. None may lie at an end of the ray.
    second_order : bool
        Add the Sun's second and third order.
    clear : frozenset of int
        Bodies that are not looked at as obstacles (those that an end stands on).

    Raises
    ------
    GeometryError
        An end nearer to a body's centre than half its radius (with the mask).
    """
    numbers = [body_id(body) for body in bodies]
    shape = ray.light_s.shape
    total, by_receive, by_transmit = np.zeros(shape), np.zeros(shape), np.zeros(shape)
    terms: dict[str, FloatArray] = {}
    blocked: dict[int, BoolArray] = {}
    for number, lens in zip(numbers, _lenses(ray, ephemeris, numbers), strict=True):
        gm = ephemeris.gm_m3_s2(number)
        r1, r2 = np.sqrt(dot(lens.r1, lens.r1)), np.sqrt(dot(lens.r2, lens.r2))
        _refuse_inside(number, r1, r2)
        line = lens.r2 - lens.r1
        rho = np.sqrt(dot(line, line))
        # (r1 + r2)^2 - rho^2 = 2 q with q = r1 r2 + r1.r2 = |r1 x r2|^2 / (r1 r2 - r1.r2): nothing cancels in front
        # of the Sun. The floor only keeps a line through a body's very centre finite.
        cosine = dot(lens.r1, lens.r2)
        cross = np.cross(lens.r1, lens.r2)
        square = dot(cross, cross)
        ahead = cosine < 0.0
        q = np.where(ahead, square / np.where(ahead, r1 * r2 - cosine, 1.0), r1 * r2 + cosine)
        q = np.maximum(q, 1e-24 * r1 * r2)
        around = r1 + r2
        factor = (2.0 * gm / C_M_S**3) * lens.factor
        name = body_name(number).split(" (")[0]
        terms[f"Shapiro delay, {name}"] = factor * np.log((around + rho) ** 2 / (2.0 * q))
        # Derivatives of rho and r1 + r2 by the date of either end.
        rho_1, rho_2 = -dot(line, lens.w1) / rho, dot(line, lens.w2) / rho
        around_1, around_2 = dot(lens.r1, lens.w1) / r1, dot(lens.r2, lens.w2) / r2
        by_transmit = by_transmit + factor * (around * rho_1 - rho * around_1) / q
        by_receive = by_receive + factor * (around * rho_2 - rho * around_2) / q
        if own_body(number) in MEAN_RADIUS_M and own_body(number) not in clear:
            along = -dot(lens.r1, line)
            between = (along > 0.0) & (along < rho**2)
            blocked[number] = between & (square < (MEAN_RADIUS_M[own_body(number)] * rho) ** 2)
        if number == _SUN and second_order:
            m = gm / C_M_S**2
            # Inside the Sun the expansion means nothing; such a line is marked as blocked.
            outside = ~blocked[number] if number in blocked else np.ones(shape, dtype=np.bool_)
            psi = np.arctan2(np.sqrt(square), cosine)
            ratio = np.where(psi > 1e-8, psi * r1 * r2 / np.where(psi > 1e-8, np.sqrt(square), 1.0), 1.0)
            second = (m * m / C_M_S) * rho * (3.75 * ratio / (r1 * r2) - 4.0 / q)
            third = (2.0 * m**3 / C_M_S) * (around + rho) ** 2 / q**2
            terms["Shapiro delay, sun, second order"] = np.where(outside, second, 0.0)
            terms["Shapiro delay, sun, third order"] = np.where(outside, third, 0.0)
            # The rate is that of the bending, all but 1% of the whole; what is left out is below 1e-14.
            bend = np.where(outside, -4.0 * m * m / C_M_S, 0.0)
            q_1, q_2 = around * around_1 - rho * rho_1, around * around_2 - rho * rho_2
            by_transmit = by_transmit + bend * (rho_1 - rho * q_1 / q) / q
            by_receive = by_receive + bend * (rho_2 - rho * q_2 / q) / q
    for value in terms.values():
        total = total + value
    return Gravity(terms, total, by_receive, by_transmit, blocked)


def _refuse_inside(number: int, r1: FloatArray, r2: FloatArray) -> None:
    """Raise for an end deep within a body, where a point mass has no delay of finite size."""
    inside = np.minimum(r1, r2) < 0.5 * MEAN_RADIUS_M.get(own_body(number), 0.0)
    if np.any(inside):
        name = body_name(number).split(" (")[0]
        raise GeometryError(
            f"{int(inside.sum())} of {inside.size} links have an end deep inside {name}; if that end is {name} itself, "
            f"give it by name, or leave {name} out of bodies=",
            mask=np.asarray(inside),
        )


def _lenses(ray: Ray, ephemeris: Ephemeris, numbers: Sequence[int]) -> list[_Lens]:
    """Each body on the straight line that touches its orbit where the light passes it."""
    half = 0.5 * ray.light_s
    places, speeds = ephemeris.states(numbers, exact.add_seconds(ray.transmit_tdb, half))
    line = ray.x_receive_m - ray.x_transmit_m
    along = line / np.sqrt(dot(line, line))[..., np.newaxis]
    found = []
    for number, place, speed in zip(numbers, places, speeds, strict=True):
        share = _closest(ray, place, speed, half)
        since = share * ray.light_s
        # Between the middle and the closest approach a body bends by a t^2/2: below 2 m in 10 s.
        if np.any(np.abs(since - half) > _FAR_S):
            place, speed = ephemeris.state(number, exact.add_seconds(ray.transmit_tdb, since))
        else:
            since = half
        r1 = ray.x_transmit_m - (place - speed * since[..., np.newaxis])
        r2 = ray.x_receive_m - (place + speed * (ray.light_s - since)[..., np.newaxis])
        factor = 1.0 - dot(along, speed) / C_M_S
        found.append(_Lens(r1, r2, ray.v_transmit_m_s - speed, ray.v_receive_m_s - speed, factor))
    return found


def _closest(ray: Ray, place: FloatArray, speed: FloatArray, half: FloatArray) -> FloatArray:
    """Share of the path at which the light is closest to a body, kept to 0 ... 1."""
    motion = speed * half[..., np.newaxis]
    r1 = ray.x_transmit_m - (place - motion)
    line = ray.x_receive_m - (place + motion) - r1
    return np.asarray(np.clip(-dot(r1, line) / dot(line, line), 0.0, 1.0))
