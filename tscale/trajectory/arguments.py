"""Checks of what trajectories are made from, before anything is computed from it."""

from __future__ import annotations

from typing import Any, Final

import numpy as np

from ..constants import C_M_S
from ..errors import InvalidInput
from ..exact import FloatArray, Pair
from ..instants import Instants

__all__ = ["check_dates", "check_motion", "check_name", "number", "numbers"]

_RATIO: Final = 10.0
"""How far dr/dt between two states may be from their mean speed. Units mixed up (km, m) give 1000; the chord of an
ellipse that is fit to be interpolated stays within a factor 2."""
_SLOW_M_S: Final = 1.0
"""Below this both may be rounding: an antenna on the ground in ITRS does not move."""


def check_dates(t: Any, what: str, *, geocentric: bool) -> None:
    """Refuse dates that are no `Instants`, or whose place contradicts the frame.

    A state is that of the observer (TOPOCENTER), dated in the coordinate time of its frame, whose origin may be named
    as the place too (as TREFPOS of the FITS time standard would): GEOCENTER for GCRS and ITRS, BARYCENTER for BCRS.

    Raises
    ------
    InvalidInput
    """
    if not isinstance(t, Instants):
        raise InvalidInput(
            f"{what} must be Instants, got {t!r:.60} ({type(t).__name__}): make them with "
            'tscale.Instants.from_iso("2025-01-01T00:00:00", scale="TT") or from_seconds'
        )
    origin = "GEOCENTER" if geocentric else "BARYCENTER"
    if t.place not in (None, "TOPOCENTER", origin):
        kind = "GCRS or ITRS axes" if geocentric else "BCRS (ICRF) axes"
        raise InvalidInput(
            f"{what} are dated at {t.place}, which does not go with an orbit on {kind}: allowed are no place, "
            f"TOPOCENTER (where the moving clock is) and {origin} (the origin of its coordinate time). Dates at which "
            "a signal passes another place are not those of the states; if they only carry the name, say "
            '.at("TOPOCENTER")'
        )


def check_name(name: Any) -> str:
    """Name of a trajectory, for messages: a text that is not empty."""
    if not isinstance(name, str) or not name.strip():
        raise InvalidInput(f"name must be a text that is not empty, such as 'probe'; got {name!r}")
    return name


def number(value: Any, what: str) -> float:
    """One real number as a float.

    Raises
    ------
    InvalidInput
        For anything else.
    """
    array = numbers(value, what)
    if array.ndim:
        raise InvalidInput(f"{what} must be one number, got an array of shape {array.shape}")
    return float(array)


def numbers(values: Any, what: str) -> FloatArray:
    """Real numbers as float64: no texts, nothing ragged, complex or masked.

    Raises
    ------
    InvalidInput
    """
    advice = "give an array of real numbers without units"
    if hasattr(values, "unit"):
        raise InvalidInput(f"{what} is in units of {values.unit}: convert it to SI and give the bare values")
    if np.ma.is_masked(values):
        raise InvalidInput(f"{what} has masked values: drop those states (t, positions and velocities) first")
    try:
        array = np.asarray(values)
    except (TypeError, ValueError) as error:
        raise InvalidInput(f"{what}: rows of different length, or no numbers ({error}): {advice}") from error
    if array.dtype.kind == "O":
        try:
            array = array.astype(np.float64)
        except (TypeError, ValueError, OverflowError) as error:
            raise InvalidInput(f"{what} holds something that is no real number ({error}): {advice}") from error
    if array.dtype.kind not in "iuf":
        raise InvalidInput(f"{what} must be real numbers, got {array.dtype} ({values!r:.60}): {advice}")
    return array.astype(np.float64)


def check_motion(dates: Pair, position_m: FloatArray, velocity_m_s: FloatArray, name: str) -> None:
    """Refuse velocities that nothing has, and positions and velocities that are not of one motion.

    Parameters
    ----------
    dates : Pair
        Counts, shape (n,), increasing.
    position_m, velocity_m_s : float array (n, 3)
        Finite states.
    name : str

    Raises
    ------
    InvalidInput
        A speed of c or more (the mask marks it), or dr/dt between more than half of the neighbouring states apart from
        their mean speed by a factor over 10.
    """
    speed = np.linalg.norm(velocity_m_s, axis=1)
    fast = speed >= C_M_S
    if np.any(fast):
        raise InvalidInput(
            f"{name}: {int(fast.sum())} of {fast.size} velocities are not below the speed of light (the largest is "
            f"{speed.max():.4g} m/s): give them in m/s",
            mask=fast,
        )
    if speed.size < 2:
        return
    step_s = np.diff(dates[0]) + np.diff(dates[1])
    chord = np.linalg.norm(np.diff(position_m, axis=0), axis=1) / step_s
    mean = (speed[1:] + speed[:-1]) / 2
    low, high = np.minimum(chord, mean), np.maximum(chord, mean)
    apart = (high > _RATIO * low) & (high > _SLOW_M_S)
    if 2 * int(apart.sum()) > apart.size:
        raise InvalidInput(
            f"{name}: positions and velocities are not of one motion: between {int(apart.sum())} of {apart.size} pairs "
            f"of neighbouring states the position changes by {np.median(chord):.4g} m/s in the middle of all, where "
            f"the velocities say {np.median(mean):.4g} m/s: give positions in m, velocities in m/s, both on the same "
            "axes, and states close enough together to be interpolated"
        )
