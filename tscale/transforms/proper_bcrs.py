"""Proper time of a clock anywhere in the solar system, by the barycentric metric: d(tau)/d(TCB) - 1.

IAU 2000 Resolutions B1.3 and B1.4 for a clock at x with velocity v, in the field of the Sun, the planets, the Earth and
the Moon as point masses: with r_A = x - x_A, w0 = sum GM_A/r_A,

    1 - d(tau)/d(TCB) = (v^2/2 + w0)/c^2 + (v^4/8 + 3 v^2 w0/2 - w0^2/2 - 4 v.w - D)/c^4

and w, D as in `ephemeris.coordinate_rate`, which is this for a clock at the centre of a body without the body itself.
The Earth's own figure, J2 to J6 and the tidal bulges (3e-13 and 2e-17 in a low orbit), is apart: `earth_figure`. Left
out: the flattening of another body that is orbited (1.5e-14 in a low orbit of Mars), and what `coordinate_rate` leaves
out.
"""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np

from ..constants import C_M_S
from ..earth.frames import dot
from ..earth.gravity.field import EARTH_ZONAL
from ..ephemeris import PLANETARY_BODIES, Ephemeris
from ..exact import FloatArray, Pair
from ..tables.reference import ReferenceData
from .barycentric import GEOCENTRIC_LIMIT_M
from .proper_tides import bulge_m2_s2
from .proper_time import potential_along

__all__ = ["BarycentricTerms", "barycentric_terms", "earth_figure"]

_C2: Final = C_M_S**2


class BarycentricTerms(NamedTuple):
    """d(tau)/d(TCB) - 1 in parts, dimensionless."""

    kinematic: FloatArray
    """-v^2/(2 c^2), v the barycentric velocity."""
    gravitational: FloatArray
    """-w0/c^2: the Sun, the planets, the Earth and the Moon."""
    second_order: FloatArray
    """What is of order c^-4."""

    @property
    def total(self) -> FloatArray:
        """d(tau)/d(TCB) - 1."""
        return np.asarray(self.second_order + self.kinematic + self.gravitational)


def barycentric_terms(x_m: FloatArray, v_m_s: FloatArray, tdb: Pair, ephemeris: Ephemeris) -> BarycentricTerms:
    """d(tau)/d(TCB) - 1 of a clock by its barycentric state.

    Parameters
    ----------
    x_m, v_m_s : float array (..., 3)
        Barycentric, TDB-compatible. Velocities and quotients GM/r have the same value in TCB units.
    tdb : Pair
        TDB count, in the shape of the leading axes.
    ephemeris : Ephemeris
        Must hold the Sun, the planets, the Earth and the Moon.

    Raises
    ------
    OutOfSpan, MissingPiece
        As `Ephemeris.state`.
    """
    bodies = PLANETARY_BODIES
    positions, velocities = ephemeris.states(bodies, tdb)
    gm = [ephemeris.gm_m3_s2(body) for body in bodies]
    v2 = dot(v_m_s, v_m_s)
    w0, along, delta = np.zeros_like(v2), np.zeros_like(v2), np.zeros_like(v2)
    for a, (x_a, v_a) in enumerate(zip(positions, velocities, strict=True)):
        pull, acceleration = np.zeros_like(v2), np.zeros_like(x_a)
        for b, x_b in enumerate(positions):
            if b != a:
                apart = x_b - x_a
                distance = np.sqrt(dot(apart, apart))
                pull = pull + gm[b] / distance
                acceleration = acceleration + apart * (gm[b] / distance**3)[..., np.newaxis]
        r = x_m - x_a
        r2 = dot(r, r)
        u = gm[a] / np.sqrt(r2)
        w0 = w0 + u
        along = along + u * dot(v_m_s, v_a)
        delta = delta + u * (-2.0 * dot(v_a, v_a) + pull + 0.5 * (dot(r, v_a) ** 2 / r2 + dot(r, acceleration)))
    fourth = v2 * v2 / 8.0 + 1.5 * v2 * w0 - 0.5 * w0 * w0 - 4.0 * along - delta
    return BarycentricTerms(v2 * (-0.5 / _C2), w0 / -_C2, fourth / -(_C2 * _C2))


def earth_figure(x_m: FloatArray, tdb: Pair, reference: ReferenceData, *, bulges: bool) -> FloatArray:
    """What the Earth's figure adds to d(tau)/d(TCB) - 1: J2 to J6, and with `bulges` what Moon and Sun make of it.

    Parameters
    ----------
    x_m : float array (..., 3)
        Barycentric place of the clock.
    tdb : Pair
        TDB count, which serves as TT.
    reference : ReferenceData
        For the ephemeris.
    bulges : bool
        Whether to count the tidal bulges.

    Returns
    -------
    float array
        0 beyond 1e10 m, where it is 2e-22.

    Raises
    ------
    InvalidInput
        For positions inside the Earth, with the mask.
    """
    r_m = x_m - reference.ephemeris.position("earth", tdb)
    near = dot(r_m, r_m) < GEOCENTRIC_LIMIT_M**2
    if not np.any(near):
        return np.zeros(near.shape)
    # In the shape of the dates, so that a mask of errors has it too.
    r_m = np.where(near[..., np.newaxis], r_m, GEOCENTRIC_LIMIT_M)
    potential = potential_along(EARTH_ZONAL, r_m, tdb, reference) - EARTH_ZONAL.gm_m3_s2 / np.sqrt(dot(r_m, r_m))
    if bulges:
        potential = potential + bulge_m2_s2(r_m, tdb, reference)
    return np.where(near, potential / -_C2, 0.0)
