"""The rotation of the Earth: between the ITRS and the GCRS, by the IERS Conventions (2010).

CIO-based form (IERS Technical Note 36, 5.4 and 5.5):

    r_GCRS = Q(X, Y, s) . R3(-ERA) . R3(-s') R2(xp) R1(yp) . r_ITRS

with X, Y, s of IAU 2006/2000A plus the observed offsets dX, dY; the Earth rotation angle of UT1 (eq. 5.15);
the pole xp, yp of the Earth orientation in use, and s' = -47 uas per century (eq. 5.13). The rotations are applied
in closed form (`orientation.py`).

Velocities are the exact derivatives of the positions: they include the rotation about the pole at the rate of UT1
(its excess length of day, up to 4 ms of 86400 s, is 2e-5 m/s at the surface), precession and nutation, the drift of
the pole within the Earth (1e-6 m/s; 1e-5 m/s in the noisy rows of the 1960s) and that of dX, dY, all by the
polynomials that the Earth orientation table is interpolated with. At its rows, where two polynomials meet, the rate
of the later one is given.

Tidal terms within a day (chapters 5 and 8) are part of the Earth orientation in use, if it was made with them
(`EarthOrientation.with_sub_daily`).
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Final

import numpy as np
import numpy.typing as npt

from .. import exact
from ..constants import DAY_S, EARTH_ANGULAR_VELOCITY_RAD_S, TT_MINUS_TAI
from ..errors import InvalidInput
from ..exact import FloatArray, Pair
from .cip_table import cip
from .orientation import Orientation

if TYPE_CHECKING:
    from ..tables.reference import ReferenceData

__all__ = [
    "era_rad",
    "gcrs_from_itrs",
    "gcrs_state_from_itrs",
    "itrs_from_gcrs",
    "itrs_state_from_gcrs",
    "orientation",
]

_TWO_PI: Final = 2.0 * np.pi
_MORE_TURNS_A_DAY: Final = 0.00273781191135448
_CENTURY_S: Final = 36525.0 * 86400.0
_S_PRIME_RAD_S: Final = -47.0e-6 * (np.pi / 648000.0) / _CENTURY_S
_TT_MINUS_TAI: Final = exact.normalise(*TT_MINUS_TAI)


def era_rad(ut1: Pair) -> FloatArray:
    """Earth rotation angle in [0, 2 pi) of a UT1 count (IAU 2000 B1.8; TN36 eq. 5.15), good to 2e-15 rad.

    Parameters
    ----------
    ut1 : Pair
        Seconds since 2000-01-01T12:00:00 UT1, any shape.
    """
    # The whole turn a day is taken out in integers, and the 25 turns that the 0.0027 made since 2000 by whole days,
    # without rounding: what is left is rounded at the size of one turn.
    days, second = np.divmod(np.asarray(ut1[0], dtype=np.int64), DAY_S)
    part = (second + ut1[1]) / DAY_S
    turns, error = exact.two_product(days.astype(np.float64), _MORE_TURNS_A_DAY)
    turn = (turns - np.floor(turns)) + part
    turn = (turn - np.floor(turn)) + (0.7790572732640 + (part * _MORE_TURNS_A_DAY + error))
    return np.asarray(_TWO_PI * (turn - np.floor(turn)), dtype=np.float64)


def _tai(tt: Pair) -> Pair:
    return exact.subtract((np.asarray(tt[0], dtype=np.int64), np.asarray(tt[1], dtype=np.float64)), _TT_MINUS_TAI)


def orientation(tt: Pair, reference: ReferenceData) -> Orientation:
    """Give the orientation of the Earth at TT counts.

    Parameters
    ----------
    tt : Pair
        TT count, any shape.
    reference : ReferenceData
        Its Earth orientation gives UT1, the pole and dX, dY.

    Raises
    ------
    OutOfSpan
        Where the Earth orientation table does not reach.
    """
    tt = (np.asarray(tt[0], dtype=np.int64), np.asarray(tt[1], dtype=np.float64))
    tai = _tai(tt)
    eop = reference.earth_orientation.motion(tai)
    xys, rate = cip(tt)
    era = era_rad(exact.add_seconds(tai, eop.ut1_minus_tai_s))
    s_prime = _S_PRIME_RAD_S * (tt[0] + tt[1])
    return Orientation(
        xys[..., 0] + eop.dx_rad,
        xys[..., 1] + eop.dy_rad,
        rate[..., 0] + eop.dx_rate_rad_s,
        rate[..., 1] + eop.dy_rate_rad_s,
        era - xys[..., 2] + s_prime,
        EARTH_ANGULAR_VELOCITY_RAD_S * (1.0 + eop.ut1_minus_tai_rate) + _S_PRIME_RAD_S - rate[..., 2],
        eop.x_rad,
        eop.y_rad,
        eop.x_rate_rad_s,
        eop.y_rate_rad_s,
    )


def gcrs_from_itrs(r_itrs_m: npt.ArrayLike, tt: Pair, reference: ReferenceData) -> FloatArray:
    """Rotate ITRS positions to the GCRS axes.

    Parameters
    ----------
    r_itrs_m : float array (..., 3)
        Position, m; its leading axes broadcast with `tt`.
    tt : Pair
        TT count.
    reference : ReferenceData
        Tables in use.

    Returns
    -------
    float array, broadcast shape + (3,)
        Position on the GCRS axes, m; within 1 um of pyerfa's own chain of matrices at the Earth's surface.

    Raises
    ------
    InvalidInput
        A last axis other than 3, or values that are not finite.
    OutOfSpan
        Where the Earth orientation table does not reach.
    """
    return orientation(tt, reference).celestial(_vectors(r_itrs_m, "position"))


def itrs_from_gcrs(r_gcrs_m: npt.ArrayLike, tt: Pair, reference: ReferenceData) -> FloatArray:
    """Rotate GCRS positions to the ITRS axes; the inverse of `gcrs_from_itrs`."""
    return orientation(tt, reference).terrestrial(_vectors(r_gcrs_m, "position"))


def gcrs_state_from_itrs(
    r_itrs_m: npt.ArrayLike, v_itrs_m_s: npt.ArrayLike | None, tt: Pair, reference: ReferenceData
) -> tuple[FloatArray, FloatArray]:
    """Position and velocity in the GCRS of something at `r_itrs_m` that moves at `v_itrs_m_s` relative to the ITRS.

    Parameters
    ----------
    r_itrs_m : float array (..., 3)
        Position, m.
    v_itrs_m_s : float array (..., 3) or None
        Velocity relative to the turning Earth, m/s; None for something at rest on it.
    tt : Pair
        TT count.
    reference : ReferenceData
        Tables in use.

    Returns
    -------
    r_m, v_m_s : float array, broadcast shape + (3,)
        The velocity is the derivative of the position by TT.

    Raises
    ------
    InvalidInput, OutOfSpan
        As `gcrs_from_itrs`.
    """
    velocity = None if v_itrs_m_s is None else _vectors(v_itrs_m_s, "velocity")
    return orientation(tt, reference).celestial_state(_vectors(r_itrs_m, "position"), velocity)


def itrs_state_from_gcrs(
    r_gcrs_m: npt.ArrayLike, v_gcrs_m_s: npt.ArrayLike, tt: Pair, reference: ReferenceData
) -> tuple[FloatArray, FloatArray]:
    """Position and velocity relative to the ITRS; the inverse of `gcrs_state_from_itrs`."""
    return orientation(tt, reference).terrestrial_state(
        _vectors(r_gcrs_m, "position"), _vectors(v_gcrs_m_s, "velocity")
    )


def _vectors(value: npt.ArrayLike, what: str) -> FloatArray:
    vectors = np.asarray(value, dtype=np.float64)
    if vectors.ndim == 0 or vectors.shape[-1] != 3:
        raise InvalidInput(f"a {what} has x, y, z on its last axis, got shape {vectors.shape}")
    bad = ~np.isfinite(vectors).all(axis=-1)
    if np.any(bad):
        raise InvalidInput(
            f"{int(np.count_nonzero(bad))} {what} vectors are not finite; drop them", mask=np.asarray(bad)
        )
    return vectors
