"""Cubic polynomials through the four nodes around each interval, for five columns at once."""

from __future__ import annotations

import numpy as np

from ..exact import FloatArray, IntArray, Pair
from .common import since

__all__ = ["evaluate", "evaluate_with_slope", "lagrange_cubics"]

_CHUNK = 8192
"""Instants handled at a time, so that the gathered coefficients stay in the processor's cache."""


def lagrange_cubics(nodes: Pair, values: FloatArray, whole: FloatArray) -> FloatArray:
    """Coefficients of the four-point Lagrange interpolation, one-sided in the first and last interval.

    Parameters
    ----------
    nodes : pair of (n,) arrays
        Increasing instants, n >= 2; with fewer than four nodes the order falls to n - 1.
    values : (n, m) array
        Columns.
    whole : (n,) array
        Whole numbers that are added to the first column. They enter as differences between neighbours only: a cubic
        through sums of some 30 s would miss its next node by 7e-15 s, one through the small parts meets it to 1e-16 s.

    Returns
    -------
    (n - 1, 4, m) array
        Powers 0 to 3 of u, which runs from 0 to 1 over the interval; the first column less `whole` at its start.

    Notes
    -----
    Four points are what the IERS recommends for its daily series (IERS Conventions 2010, section 5.5 and its routine
    for interpolation). The nodes need not be equally far apart: before 1972 days of UTC differ in length, and a leap
    second makes one longer.
    """
    count = len(values)
    order = min(4, count)
    interval = np.arange(count - 1)
    first = np.clip(interval - 1, 0, count - order)
    around = first[:, None] + np.arange(order)
    start = (nodes[0][:-1], nodes[1][:-1])
    length = since(start, (nodes[0][1:], nodes[1][1:]))
    at = since((start[0][:, None], start[1][:, None]), (nodes[0][around], nodes[1][around])) / length[:, None]
    # Newton's divided differences of value - value at the interval's start, expanded into powers.
    table = values[around] - values[:-1, None, :]
    table[..., 0] += whole[around] - whole[:-1, None]
    for level in range(1, order):
        span = (at[:, level:] - at[:, :-level])[:, :, None]
        table[:, level:] = (table[:, level:] - table[:, level - 1 : -1]) / span
    powers = np.zeros((count - 1, 4, values.shape[1]))
    for level in range(order - 1, -1, -1):
        # powers <- powers * (u - at[level]) + table[level], highest power first so that none is overwritten early.
        shift = at[:, level, None]
        for power in range(3, 0, -1):
            powers[:, power] = powers[:, power - 1] - shift * powers[:, power]
        powers[:, 0] = table[:, level] - shift * powers[:, 0]
    powers[:, 0] = values[:-1]  # the node itself, to the last digit
    return powers


def evaluate(powers: FloatArray, interval: IntArray, u: FloatArray) -> FloatArray:
    """Values (m, ...) of the polynomials of `interval` at `u`, both of one shape: column by column."""
    flat_interval, flat_u = interval.ravel(), u.ravel()
    out = np.empty((powers.shape[2], flat_u.size))
    for start in range(0, flat_u.size, _CHUNK):
        part = slice(start, start + _CHUNK)
        own = powers[flat_interval[part]]
        step = flat_u[part, None]
        total = own[:, -1] * step
        for power in range(powers.shape[1] - 2, 0, -1):
            total += own[:, power]
            total *= step
        total += own[:, 0]
        out[:, part] = total.T
    return out.reshape(len(out), *u.shape)


def evaluate_with_slope(powers: FloatArray, interval: IntArray, u: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Values as `evaluate`, to the same bit, and their derivatives by u."""
    flat_interval, flat_u = interval.ravel(), u.ravel()
    out = np.empty((powers.shape[2], flat_u.size))
    slopes = np.empty_like(out)
    for start in range(0, flat_u.size, _CHUNK):
        part = slice(start, start + _CHUNK)
        own = powers[flat_interval[part]]
        step = flat_u[part, None]
        slope = own[:, -1]
        total = slope * step
        for power in range(powers.shape[1] - 2, 0, -1):
            total += own[:, power]
            slope = slope * step
            slope += total
            total *= step
        total += own[:, 0]
        out[:, part], slopes[:, part] = total.T, slope.T
    return out.reshape(len(out), *u.shape), slopes.reshape(len(out), *u.shape)
