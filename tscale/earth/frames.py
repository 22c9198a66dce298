"""From geocentric to barycentric vectors: the terms of order c^-2 between GCRS and BCRS.

IERS Conventions (2010), eq. 11.19, takes a TT-compatible geocentric vector r to the TDB-compatible barycentric

    r (1 - U/c^2 - L_C) - (V.r) V / (2 c^2)

with U the potential of the other bodies at the geocentre and V its barycentric velocity: 0.2 m (0.6 ns) on the
ground. For satellites the terms with the acceleration A of the geocentre are added (IAU 2000 Resolution B1.3):

    -[r (A.r) - A r^2 / 2] / c^2

0.2 mm at 4e7 m, 40 mm at 1e9 m. A is the Sun's pull and U the Sun's potential plus 2.4e-12 c^2 for all others; what
that leaves out is 0.01 mm on the ground and 1 mm at 1e9 m.
"""

from __future__ import annotations

from typing import Final

import numpy as np

from ..constants import C_M_S, L_C
from ..exact import FloatArray

__all__ = ["bcrs_offset", "bcrs_offset_velocity", "dot", "gcrs_offset", "gcrs_offset_velocity"]

_C2: Final = C_M_S**2
_OTHER_POTENTIAL: Final = 2.4e-12
"""Mean potential of the planets and the Moon at the geocentre over c^2 (from DE440, 1.9e-12 to 2.7e-12)."""


def dot(a: FloatArray, b: FloatArray) -> FloatArray:
    """Scalar product along the last axis, which has length 3."""
    return np.asarray(a[..., 0] * b[..., 0] + a[..., 1] * b[..., 1] + a[..., 2] * b[..., 2])


def _change(r: FloatArray, velocity: FloatArray, acceleration: FloatArray, potential: FloatArray) -> FloatArray:
    """What a geocentric vector is longer by than its barycentric counterpart, m."""
    scale = L_C + _OTHER_POTENTIAL + potential / _C2 + dot(acceleration, r) / _C2
    along_v = dot(velocity, r) * (0.5 / _C2)
    along_a = dot(r, r) * (-0.5 / _C2)
    return np.asarray(
        r * scale[..., np.newaxis] + velocity * along_v[..., np.newaxis] + acceleration * along_a[..., np.newaxis]
    )


def bcrs_offset(
    r_gcrs_m: FloatArray, velocity_m_s: FloatArray, acceleration_m_s2: FloatArray, potential_m2_s2: FloatArray
) -> FloatArray:
    """Barycentric TDB-compatible offset from the geocentre of a TT-compatible GCRS vector.

    Parameters
    ----------
    r_gcrs_m : (..., 3) array
        Geocentric vector, m.
    velocity_m_s, acceleration_m_s2 : (..., 3) arrays
        Of the geocentre, barycentric.
    potential_m2_s2 : (...) array
        Potential of the Sun at the geocentre, m2/s2.
    """
    return r_gcrs_m - _change(r_gcrs_m, velocity_m_s, acceleration_m_s2, potential_m2_s2)


def gcrs_offset(
    offset_m: FloatArray, velocity_m_s: FloatArray, acceleration_m_s2: FloatArray, potential_m2_s2: FloatArray
) -> FloatArray:
    """Undo `bcrs_offset` (to order c^-4: 1e-9 m at 1e9 m)."""
    return offset_m + _change(offset_m, velocity_m_s, acceleration_m_s2, potential_m2_s2)


def bcrs_offset_velocity(
    r_gcrs_m: FloatArray,
    v_gcrs_m_s: FloatArray,
    velocity_m_s: FloatArray,
    acceleration_m_s2: FloatArray,
    potential_m2_s2: FloatArray,
    tt_rate: FloatArray | float = 1.0,
) -> FloatArray:
    """Derivative of `bcrs_offset` by TDB; `tt_rate` is dTT/dTDB, v_gcrs_m_s = dr/dTT.

    The changes of U and A are left out: 2e-10 m/s on the ground, 1e-8 m/s at 1e9 m.
    """
    v = v_gcrs_m_s * np.asarray(tt_rate)[..., np.newaxis]
    return np.asarray(v - _change_rate(r_gcrs_m, v, velocity_m_s, acceleration_m_s2, potential_m2_s2))


def gcrs_offset_velocity(
    offset_m: FloatArray,
    offset_rate_m_s: FloatArray,
    velocity_m_s: FloatArray,
    acceleration_m_s2: FloatArray,
    potential_m2_s2: FloatArray,
) -> FloatArray:
    """Derivative of `gcrs_offset` by TDB."""
    return offset_rate_m_s + _change_rate(offset_m, offset_rate_m_s, velocity_m_s, acceleration_m_s2, potential_m2_s2)


def _change_rate(
    r: FloatArray, v: FloatArray, velocity: FloatArray, acceleration: FloatArray, potential: FloatArray
) -> FloatArray:
    """Derivative of `_change` with U and A held."""
    scale = L_C + _OTHER_POTENTIAL + potential / _C2 + dot(acceleration, r) / _C2
    scale_rate = dot(acceleration, v) / _C2
    along_v, along_v_rate = dot(velocity, r) * (0.5 / _C2), (dot(acceleration, r) + dot(velocity, v)) * (0.5 / _C2)
    along_a_rate = dot(r, v) * (-1.0 / _C2)
    return np.asarray(
        v * scale[..., np.newaxis]
        + r * scale_rate[..., np.newaxis]
        + velocity * along_v_rate[..., np.newaxis]
        + acceleration * (along_v + along_a_rate)[..., np.newaxis]
    )
