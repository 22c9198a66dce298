"""Geocentric to barycentric vectors against the full transformation of IAU 2000 Resolution B1.3."""

from __future__ import annotations

import numpy as np
import pytest

import tscale
from tscale.constants import C_M_S, L_B, L_G
from tscale.earth.frames import bcrs_offset, bcrs_offset_velocity, gcrs_offset, gcrs_offset_velocity
from tscale.earth.moving import EarthAndSun
from tscale.ephemeris import PLANETARY_BODIES


def full_gcrs(reference: tscale.ReferenceData, tdb: tscale.exact.Pair, offset_m: np.ndarray) -> np.ndarray:
    """TT-compatible GCRS vector of a TDB-compatible barycentric offset, with all bodies' potentials and pulls.

    r = r_B + [v (v.r_B)/2 + w r_B + r_B (a.r_B) - a r_B^2/2] / c^2 in TCB and TCG units (IAU 2000 B1.3).
    """
    positions, velocities = reference.ephemeris.states(PLANETARY_BODIES, tdb)
    here = PLANETARY_BODIES.index(399)
    v = velocities[here]
    w, a = np.zeros(v.shape[:-1]), np.zeros(v.shape)
    for body, position in zip(PLANETARY_BODIES, positions, strict=True):
        if body != 399:
            toward = position - positions[here]
            distance = np.linalg.norm(toward, axis=-1)
            w += reference.ephemeris.gm_m3_s2(body) / distance
            a += toward * (reference.ephemeris.gm_m3_s2(body) / distance**3)[:, None]
    r = offset_m / float(1 - L_B)
    dot = lambda p, q: np.sum(p * q, axis=-1)[:, None]  # noqa: E731
    change = 0.5 * v * dot(v, r) + w[:, None] * r + r * dot(a, r) - 0.5 * a * dot(r, r)
    return (r + change / C_M_S**2) * float(1 - L_G)


@pytest.mark.parametrize(
    ("radius_m", "tolerance_m"),
    # The Moon's and planets' shares of potential and pull that the mean leaves out grow with r and r^2.
    [(6.4e6, 1e-5), (4.2e7, 1e-4), (3.8e8, 5e-4), (1.0e9, 2e-3)],
)
def test_offsets_against_the_full_transformation(
    reference: tscale.ReferenceData, radius_m: float, tolerance_m: float
) -> None:
    rng = np.random.default_rng(8)
    n = 400
    tdb = (rng.integers(-1_200_000_000, 1_800_000_000, n), rng.random(n))
    direction = rng.normal(size=(n, 3))
    r = direction / np.linalg.norm(direction, axis=-1, keepdims=True) * radius_m
    bodies = EarthAndSun.at(reference.ephemeris, tdb)
    args = (bodies.earth_v_m_s, bodies.acceleration_m_s2, bodies.potential_m2_s2)
    offset = bcrs_offset(r, *args)
    assert np.max(np.abs(full_gcrs(reference, tdb, offset) - r)) < tolerance_m
    # The change itself is 3e-8 of the vector, and is undone to order c^-4.
    assert np.max(np.abs(offset - r)) > 2e-8 * radius_m
    assert np.max(np.abs(gcrs_offset(offset, *args) - r)) < 3e-15 * radius_m


def test_velocities_are_derivatives(reference: tscale.ReferenceData) -> None:
    # With the Earth's state held, along a straight line of 7 km/s: central differences over 2 s, exact for a quadratic.
    rng = np.random.default_rng(9)
    tdb = (rng.integers(-1_200_000_000, 1_800_000_000, 50), rng.random(50))
    bodies = EarthAndSun.at(reference.ephemeris, tdb)
    args = (bodies.earth_v_m_s, bodies.acceleration_m_s2, bodies.potential_m2_s2)
    r, v = rng.normal(size=(50, 3)) * 3e8, rng.normal(size=(50, 3)) * 7e3
    numeric = (bcrs_offset(r + v, *args) - bcrs_offset(r - v, *args)) / 2 - v
    # The geocentre's own acceleration turns the Lorentz term as time passes, which a held state does not show.
    turning = (args[0] * np.sum(args[1] * r, axis=-1)[:, None] + args[1] * np.sum(args[0] * r, axis=-1)[:, None]) / (
        2 * C_M_S**2
    )
    analytic = bcrs_offset_velocity(r, v, *args) - v
    assert np.max(np.abs(analytic - (numeric - turning))) < 3e-7  # roundings of 3e8 m over 2 s
    assert np.max(np.abs(turning)) > 1e-6
    back = gcrs_offset_velocity(bcrs_offset(r, *args), bcrs_offset_velocity(r, v, *args), *args)
    assert np.max(np.abs(back - v)) < 1e-9
