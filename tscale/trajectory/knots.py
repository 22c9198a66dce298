"""Tabulated states and the polynomials between them.

Between two knots the path is one polynomial through the nearest knots: of positions and velocities (Hermite) or of each
alone (Lagrange). It is kept in Newton's form with the nearest knot first (confluent divided differences; de
Boor, A Practical Guide to Splines, chapter 1), so that it costs two multiplications a degree and loses nothing near
a knot.
"""

from __future__ import annotations

from typing import Any, Final, Literal, TypeAlias

import numpy as np

from ..errors import InvalidInput
from ..exact import FloatArray, IntArray, Pair
from .arguments import check_motion
from .dates import since

__all__ = ["Knots", "Method", "check_degree"]

Method: TypeAlias = Literal["hermite", "lagrange"]

_CHUNK: Final = 8192
_HIGHEST_DEGREE: Final = 27


class Knots:
    """States at increasing dates, interpolated.

    Parameters
    ----------
    dates : Pair
        Counts, shape (n,), increasing.
    position_m, velocity_m_s : float array (n, 3)
        States there.
    method : {"hermite", "lagrange"}
        Hermite polynomials pass through positions and velocities, and the velocity is the derivative of the position;
        Lagrange polynomials pass through positions, and others through velocities.
    degree : int
        Of the polynomials: odd for Hermite, of (degree + 1)/2 knots; of degree + 1 knots for Lagrange.
    name : str
        What the states are of, for messages.

    Raises
    ------
    InvalidInput
        Too few knots for the degree, shapes that do not fit, dates that do not increase, values that are not finite.
    """

    def __init__(
        self,
        dates: Pair,
        position_m: FloatArray,
        velocity_m_s: FloatArray,
        method: Method,
        degree: int,
        name: str,
    ) -> None:
        whole, fraction = np.array(dates[0], dtype=np.int64), np.array(dates[1], dtype=np.float64)
        states = _checked_states(whole, position_m, velocity_m_s, name)
        count = _knots_used(method, degree, whole.size, name)
        steps = (whole[1:] - whole[:-1]) + (fraction[1:] - fraction[:-1])
        if np.any(steps <= 0):
            bad = np.concatenate(([False], steps <= 0))
            raise InvalidInput(
                f"{name}: the dates must increase; {int(bad.sum())} of {bad.size} do not come after the one before "
                "(the mask marks them): sort the states and drop doubles",
                mask=bad,
            )
        check_motion((whole, fraction), states[:, :3], states[:, 3:], name)
        self.name = name
        self.method = method
        self.degree = degree
        self._whole, self._fraction = whole, fraction
        self._nodes, self._coefficients = _newton(whole, fraction, states, method, count)
        for array in (whole, fraction, self._nodes, self._coefficients):
            array.flags.writeable = False

    @property
    def first(self) -> Pair:
        """Date of the first knot."""
        return self._whole[0], self._fraction[0]

    @property
    def last(self) -> Pair:
        """Date of the last knot."""
        return self._whole[-1], self._fraction[-1]

    def state(self, count: Pair) -> tuple[FloatArray, FloatArray]:
        """Position (m) and velocity (m/s), (n, 3) each, at 1-d counts between the first and the last knot."""
        whole, fraction = count
        position, velocity = np.empty((whole.size, 3)), np.empty((whole.size, 3))
        # Which side of a knot a date falls on does not matter to 1e-7 s: both polynomials pass through it.
        starts = since((self._whole, self._fraction), self.first)[1:-1]
        for i in range(0, whole.size, _CHUNK):
            part = slice(i, i + _CHUNK)
            interval = np.searchsorted(starts, since((whole[part], fraction[part]), self.first), side="right")
            local = since((whole[part], fraction[part]), (self._whole[interval], self._fraction[interval]))
            value, slope = self._evaluate(interval, local)
            position[part] = value[:3].T
            velocity[part] = slope.T if self.method == "hermite" else value[3:].T
        return position, velocity

    def _evaluate(self, interval: IntArray, local_s: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Horner's rule in Newton's form, with the derivative of the position carried along."""
        terms = self._coefficients.shape[0]
        value = np.take(self._coefficients[-1], interval, axis=1)
        slope = np.zeros((3, interval.size))
        for k in range(terms - 2, -1, -1):
            step = local_s - self._nodes[k][interval]
            slope = slope * step + value[:3]
            value = value * step + np.take(self._coefficients[k], interval, axis=1)
        return value, slope


def _checked_states(whole: IntArray, position_m: FloatArray, velocity_m_s: FloatArray, name: str) -> FloatArray:
    position = np.asarray(position_m, dtype=np.float64)
    velocity = np.asarray(velocity_m_s, dtype=np.float64)
    if whole.ndim != 1 or position.shape != (whole.size, 3) or velocity.shape != (whole.size, 3):
        raise InvalidInput(
            f"{name}: n dates go with positions and velocities of shape (n, 3); got {whole.shape}, {position.shape} "
            f"and {velocity.shape}"
        )
    bad = np.asarray(~(np.isfinite(position).all(axis=1) & np.isfinite(velocity).all(axis=1)))
    if np.any(bad):
        raise InvalidInput(f"{name}: {int(bad.sum())} of {bad.size} states are not finite; drop them", mask=bad)
    return np.concatenate((position, velocity), axis=1)


def check_degree(degree: Any, before: str = "") -> None:
    """Refuse what is no degree of a polynomial here; `before` starts the message."""
    if isinstance(degree, bool) or not isinstance(degree, int) or not 1 <= degree <= _HIGHEST_DEGREE:
        raise InvalidInput(f"{before}degree must be an integer of 1 to {_HIGHEST_DEGREE}, got {degree!r:.40}")


def _knots_used(method: Method, degree: int, available: int, name: str) -> int:
    """Return the number of knots in one polynomial."""
    if method not in ("hermite", "lagrange"):
        raise InvalidInput(f"{name}: unknown interpolation {method!r}; known are hermite and lagrange")
    check_degree(degree, f"{name}: ")
    if method == "hermite" and (degree % 2 == 0 or degree < 3):
        raise InvalidInput(f"{name}: a Hermite polynomial has an odd degree from 3 on (3, 5, 7 ...), got {degree}")
    count = (degree + 1) // 2 if method == "hermite" else degree + 1
    if available < count:
        lower = 2 * available - 1 if method == "hermite" else available - 1
        hint = (
            f"give degree={lower} or more states"
            if lower >= 3 or (method == "lagrange" and lower >= 1)
            else "give more"
        )
        raise InvalidInput(f"{name}: degree {degree} ({method}) needs {count} states, got {available}: {hint}")
    return count


def _newton(
    whole: IntArray, fraction: FloatArray, states: FloatArray, method: Method, count: int
) -> tuple[FloatArray, FloatArray]:
    """Make nodes (terms, intervals), s from the interval's start, and coefficients (terms, components, intervals)."""
    intervals = whole.size - 1
    first = np.clip(np.arange(intervals) - (count // 2 - 1), 0, whole.size - count)
    window = first[:, np.newaxis] + np.arange(count)
    # Nearest knots first, seen from the middle of the interval: the trailing differences stay small.
    distance = np.abs(window - (np.arange(intervals)[:, np.newaxis] + 0.5))
    window = np.take_along_axis(window, np.argsort(distance, axis=1, kind="stable"), axis=1).T
    local = (whole[window] - whole[:-1]) + (fraction[window] - fraction[:-1])
    values = np.ascontiguousarray(np.moveaxis(states[window], -1, 1))  # (count, 6, intervals)
    if method == "lagrange":
        nodes, table = local, values
        slopes = None
    else:
        nodes, table = np.repeat(local, 2, axis=0), np.repeat(values[:, :3], 2, axis=0)
        slopes = values[:, 3:]
    terms = nodes.shape[0]
    coefficients = np.empty((terms, *table.shape[1:]))
    coefficients[0] = table[0]
    for level in range(1, terms):
        gap = nodes[level:] - nodes[:-level]
        if level == 1 and slopes is not None:
            # Between a knot and itself the difference quotient is the velocity.
            gap[::2] = 1.0
            table = (table[1:] - table[:-1]) / gap[:, np.newaxis]
            table[::2] = slopes
        else:
            table = (table[1:] - table[:-1]) / gap[:, np.newaxis]
        coefficients[level] = table[0]
    return nodes, coefficients
