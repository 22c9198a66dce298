"""Gravitational delay of light from a far source: where it passes a body, and the Sun's higher orders."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np

from ..constants import C_M_S, SUN_RADIUS_M
from ..earth.frames import dot
from ..exact import FloatArray

__all__ = ["HigherOrders", "higher_orders", "passage"]


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
