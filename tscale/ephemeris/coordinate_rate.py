"""Rate of a body's own coordinate time (TCG, TCL ...) against TCB at the body's centre, to order c^-4.

IAU 2000 Resolutions B1.4 (potentials of the barycentric metric) and B1.5 (TCB - TCG); Soffel et al. 2003, AJ 126,
2687, eqs. (8)-(10), (40)-(44) and (58). The kernel's units are TDB-compatible: velocities and quotients GM/x have the
same value in TDB and in TCB units, and nothing else enters.
"""

from __future__ import annotations

import numpy as np

from ..constants import C_M_S
from ..errors import InvalidInput
from ..exact import FloatArray, Pair
from .bodies import PLANETARY_BODIES, body_id, body_name
from .kernel import Ephemeris

__all__ = ["coordinate_rate"]


def coordinate_rate(ephemeris: Ephemeris, body: str | int, tdb: Pair) -> FloatArray:
    """1 - dT/dTCB at the centre of a body, T its own coordinate time (TCG for the Earth, TCL for the Moon).

    Parameters
    ----------
    ephemeris : Ephemeris
        Must hold the Sun, the planets, the Earth, the Moon and Pluto.
    body : str or int
        Body at whose centre T is taken; its own potential is left out, as in the body's coordinate time.
    tdb : (int64 array, float64 array)
        TDB counts, any shape.

    Returns
    -------
    float array
        Dimensionless, about 1.48e-8 for the Earth.

    Notes
    -----
    With v the velocity of the body, r_A = x - x_A, w0 = sum GM_A/r_A over the other bodies:

    1 - dT/dTCB = (v^2/2 + w0)/c^2 + (v^4/8 + 3 v^2 w0/2 - w0^2/2 - 4 v.w - D)/c^4,

    w = sum (GM_A/r_A) v_A and, from B1.4,

    D = sum (GM_A/r_A) [-2 v_A^2 + sum_{B != A} GM_B/r_AB + (r_A.v_A)^2/(2 r_A^2) + r_A.a_A/2].

    Left out: the asteroids (4e-18) and the bodies beyond Neptune (some 0.06 Earth masses near 44 au: 4e-17, 1.3 ns a
    year), both all but constant and below or near the 2e-17 to which L_C is known; the Sun's oblateness (2.3e-20 at
    the Earth, with J2 = 2.2e-7) and spin (4e-21, with 1.9e41 kg m2/s); at the Moon, the Earth's oblateness (0.5 to
    2.1e-18 over a month, 1.3e-18 on average).

    Raises
    ------
    OutOfSpan, MissingPiece
        As `Ephemeris.state`.
    """
    number = body_id(body)
    if number not in PLANETARY_BODIES:
        raise InvalidInput(
            f"no coordinate time for {body_name(number)}: allowed are "
            f"{', '.join(body_name(b) for b in PLANETARY_BODIES)}"
        )
    bodies = PLANETARY_BODIES
    here = bodies.index(number)
    shape = np.broadcast_shapes(np.shape(tdb[0]), np.shape(tdb[1]))
    flat = (np.broadcast_to(tdb[0], shape).reshape(-1), np.broadcast_to(tdb[1], shape).reshape(-1))
    position, velocity = ephemeris.states(bodies, flat)
    gm = np.array([ephemeris.gm_m3_s2(b) for b in bodies])

    potential, acceleration = _newton(position, gm)
    v, w0 = velocity[here], potential[here]
    v2 = _dot(v, v)
    vector = np.zeros_like(w0)  # v.w
    delta = np.zeros_like(w0)
    for a in range(len(bodies)):
        if a == here:
            continue
        r = position[here] - position[a]
        r2 = _dot(r, r)
        u = gm[a] / np.sqrt(r2)
        vector += u * _dot(v, velocity[a])
        delta += u * (
            -2.0 * _dot(velocity[a], velocity[a])
            + potential[a]
            + 0.5 * (_dot(r, velocity[a]) ** 2 / r2 + _dot(r, acceleration[a]))
        )
    second = 0.5 * v2 + w0
    fourth = v2 * v2 / 8.0 + 1.5 * v2 * w0 - 0.5 * w0 * w0 - 4.0 * vector - delta
    rate: FloatArray = second / C_M_S**2 + fourth / C_M_S**4
    return rate.reshape(shape)


def _dot(a: FloatArray, b: FloatArray) -> FloatArray:
    product: FloatArray = np.einsum("nk,nk->n", a, b)
    return product


def _newton(position: FloatArray, gm: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Potential (bodies, n) and acceleration (bodies, n, 3) at each body from all others."""
    potential = np.zeros(position.shape[:2])
    acceleration = np.zeros(position.shape)
    for a in range(len(gm)):
        for b in range(a):
            r = position[a] - position[b]
            inverse = 1.0 / np.sqrt(_dot(r, r))
            potential[a] += gm[b] * inverse
            potential[b] += gm[a] * inverse
            r *= (inverse**3)[:, None]
            acceleration[a] -= gm[b] * r
            acceleration[b] += gm[a] * r
    return potential, acceleration
