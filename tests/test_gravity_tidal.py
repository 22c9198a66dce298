"""The tide-raising potential against point masses, published sizes and its own mean."""

from __future__ import annotations

from decimal import Decimal, getcontext
from fractions import Fraction

import numpy as np
import pytest

import tscale
from tscale.constants import C_M_S
from tscale.earth.gravity import (
    ground_tidal_potential_m2_s2,
    ground_tide_factor,
    permanent_tide_m2_s2,
    tidal_potential_m2_s2,
)
from tscale.earth.gravity.tidal import PERMANENT_C20
from tscale.errors import InvalidInput, OutOfSpan
from tscale.exact import Pair

A_M = 6378137.0


def dates(number: int, step_s: int = 86_400 * 11 + 7_001, start: int = 0) -> Pair:
    return start + step_s * np.arange(number), np.full(number, 0.25)


def exact_difference(r: np.ndarray, d: np.ndarray, gm: float) -> float:
    """GM/|d - r| - GM/d - GM r.d/d^3 in 60 digits, as the definition reads."""
    getcontext().prec = 60

    def root(vector: list[Fraction]) -> Decimal:
        square = sum(x * x for x in vector)
        return (Decimal(square.numerator) / Decimal(square.denominator)).sqrt()

    near, far = [Fraction(float(x)) for x in r], [Fraction(float(x)) for x in d]
    distance = root(far)
    along = sum(a * b for a, b in zip(near, far, strict=True))
    linear = Decimal(along.numerator) / Decimal(along.denominator) / distance**3
    return float(Decimal(gm) * (1 / root([b - a for a, b in zip(near, far, strict=True)]) - 1 / distance - linear))


@pytest.mark.parametrize("height_m", [0.0, 2e7, 3e8])
def test_against_point_masses(reference: tscale.ReferenceData, height_m: float) -> None:
    tt = dates(12)
    rng = np.random.default_rng(4)
    r = rng.normal(size=(12, 3))
    r *= (A_M + height_m) / np.linalg.norm(r, axis=-1)[:, np.newaxis]
    for body in ("moon", "sun", "venus"):
        d = reference.ephemeris.position(body, tt, "earth")
        gm = reference.ephemeris.gm_m3_s2(body)
        expected = np.array([exact_difference(one, far, gm) for one, far in zip(r, d, strict=True)])
        found = tidal_potential_m2_s2(r, tt, reference, (body,))
        # Roundings of GM r^2/d^3, which the sum of degrees may undershoot.
        size = gm * np.linalg.norm(r, axis=-1) ** 2 / np.linalg.norm(d, axis=-1) ** 3
        assert np.max(np.abs(found - expected) / size) < 3e-15
    both = tidal_potential_m2_s2(r, tt, reference)
    parts = [tidal_potential_m2_s2(r, tt, reference, (body,)) for body in ("moon", "sun")]
    np.testing.assert_allclose(both, parts[0] + parts[1], rtol=1e-13)


def test_degrees(reference: tscale.ReferenceData) -> None:
    tt = dates(400)
    r = np.array([A_M, 0.0, 0.0])
    d = reference.ephemeris.positions(("moon", "sun"), tt, "earth")
    expected = np.zeros((2, 400))
    for body, one in zip(("moon", "sun"), d, strict=True):
        gm = reference.ephemeris.gm_m3_s2(body)
        distance = np.linalg.norm(one, axis=-1)
        s, ratio = one[:, 0] / distance, A_M / distance
        second = gm / distance * ratio**2 * (3 * s**2 - 1) / 2
        expected += second, second + gm / distance * ratio**3 * (5 * s**3 - 3 * s) / 2
    exact = tidal_potential_m2_s2(r, tt, reference)
    for degree, series, left in ((2, expected[0], 0.08), (3, expected[1], 1.5e-3)):
        found = tidal_potential_m2_s2(r, tt, reference, max_degree=degree)
        np.testing.assert_allclose(found, series, rtol=0, atol=1e-14)
        # What is left out: the next power of r/d = 1/56 at the Moon's perigee, of 4.4 m2/s2.
        assert left / 4 < np.max(np.abs(exact - found)) < left


def test_published_size(reference: tscale.ReferenceData) -> None:
    # Tidal potential up to about 3 m2/s2, 3.3e-17 in frequency (a project for clocks in geodesy, ITOC; its figure is
    # rounded: factor 1.5). Largest on the equator when Moon and Sun stand in line: 4.4 + 1.7 m2/s2 at most.
    tt = dates(20_000, 86_400 // 5)
    lat = np.radians([0.0, 45.0])[:, np.newaxis]
    turn = 2 * np.pi * (tt[0] % 86_164) / 86_164.1
    r = A_M * np.stack([np.cos(lat) * np.cos(turn), np.cos(lat) * np.sin(turn), np.sin(lat) + 0 * turn], axis=-1)
    equator, middle = tidal_potential_m2_s2(r, tt, reference)
    swing = (middle.max() - middle.min()) / 2
    assert 3.0 / 1.5 < swing < 3.0 * 1.5
    assert 3.3e-17 / 1.5 < swing / C_M_S**2 < 3.3e-17 * 1.5
    assert 4.5 < equator.max() < 6.2
    assert -3.1 < equator.min() < -2.3
    # Harmonic: its mean over a sphere is 0 (the six ends of three axes, exact to degree 3).
    ends = np.concatenate([np.eye(3), -np.eye(3)])[:, np.newaxis] * A_M
    few = (tt[0][::500], tt[1][::500])
    assert np.max(np.abs(tidal_potential_m2_s2(ends, few, reference).mean(axis=0))) < 1.2e-3  # degree 4


def test_permanent_tide_is_the_mean(reference: tscale.ReferenceData) -> None:
    # Mean over two turns of the Moon's nodes, 37.2 years, and over longitude. A0 H0 are for 2000 and the equator of
    # date; the axes of the GCRS part from it by 0.1 deg. Half a per cent covers both and the end of the mean.
    number = 4001
    tt = dates(number, int(37.2 * 365.25 * 86400 / number), -580_000_000)
    for lat in np.radians([0.0, 40.0, 90.0]):
        lon = np.arange(4)[:, np.newaxis] * np.pi / 2
        r = A_M * np.stack([np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat) + 0 * lon], axis=-1)
        mean = tidal_potential_m2_s2(r, tt, reference, max_degree=2).mean()
        permanent = permanent_tide_m2_s2(r[0, 0])
        assert mean == pytest.approx(permanent, abs=0.005 * 1.944)
        # 9.9 - 29.6 sin^2 cm of height (the usual figures, from memory; they are rounded, and g is not 9.8 everywhere).
        assert permanent / 9.8 == pytest.approx(0.099 - 0.296 * np.sin(lat) ** 2, abs=2e-3)
    assert pytest.approx(-1.39142e-8, abs=1e-13, rel=0) == PERMANENT_C20  # TN36 eq. 6.14, digits of its factors


def test_ground_factor() -> None:
    assert ground_tide_factor() == pytest.approx(1 + 0.30190 - 0.6078, abs=1e-15, rel=0)
    assert ground_tide_factor() == pytest.approx(0.69, abs=0.01)  # the usual figure
    assert ground_tide_factor(0.0, 0.0) == 1.0


def test_clock_on_the_ground(reference: tscale.ReferenceData) -> None:
    tt = dates(50)
    r = np.array([3.9e6, 3e5, 5.0e6])
    direct, mean = tidal_potential_m2_s2(r, tt, reference), permanent_tide_m2_s2(r)
    share = ground_tide_factor()
    response = share - 1.0
    found = {
        system: ground_tidal_potential_m2_s2(r, tt, reference, tide_system=system)
        for system in ("zero_tide", "tide_free", "mean_tide")
    }
    # The static part of each system plus the rest is one and the same clock, whichever the bookkeeping.
    np.testing.assert_allclose(found["tide_free"], direct + response * direct, atol=1e-14)
    np.testing.assert_allclose(found["zero_tide"] + response * mean, found["tide_free"], atol=1e-14)
    np.testing.assert_allclose(found["mean_tide"] + mean, found["zero_tide"], atol=1e-14)
    stiff = ground_tidal_potential_m2_s2(r, tt, reference, factor=1.0)
    np.testing.assert_allclose(stiff, direct, atol=1e-14)


def test_at_another_body(reference: tscale.ReferenceData) -> None:
    # The Earth's tide on the Moon's near side: GM r^2/d^3, 1738.1 km and 384400 km: 21.2 m2/s2 at the mean distance.
    tt = dates(10)
    earth = reference.ephemeris.position("earth", tt, "moon")
    distance = np.linalg.norm(earth, axis=-1, keepdims=True)
    found = tidal_potential_m2_s2(1.7381e6 * earth / distance, tt, reference, ("earth",), center="moon", max_degree=2)
    np.testing.assert_allclose(found, 398600.435507e9 * 1.7381e6**2 / distance[:, 0] ** 3, rtol=1e-13)
    assert 15.0 < found.min() < found.max() < 28.0


def test_shapes(reference: tscale.ReferenceData) -> None:
    tt = dates(4)
    r = np.array([[A_M, 0.0, 0.0], [0.0, 0.0, A_M]])
    found = tidal_potential_m2_s2(r[:, np.newaxis], tt, reference)
    assert found.shape == (2, 4)
    one = tidal_potential_m2_s2(r[1].tolist(), (tt[0][3], tt[1][3]), reference)
    assert np.shape(one) == ()
    assert one == found[1, 3]
    np.testing.assert_array_equal(r, [[A_M, 0.0, 0.0], [0.0, 0.0, A_M]])


@pytest.mark.parametrize(
    ("changes", "words"),
    [
        ({"bodies": "moon"}, "sequence of names"),
        ({"bodies": ()}, "sequence of names"),
        ({"bodies": ("moon", "phobos")}, "unknown body"),
        ({"bodies": ("moon", 301)}, "twice"),
        ({"bodies": ("moon", "earth")}, "other bodies than the one"),
        ({"bodies": ("barycenter",)}, "other bodies than the one"),
        ({"center": "moon"}, "other bodies than the one"),
        ({"max_degree": 4}, "2, 3 or None"),
        ({"r_gcrs_m": [1.0, 2.0]}, "last axis"),
        ({"r_gcrs_m": [A_M, np.nan, 0.0]}, "not finite"),
    ],
)
def test_faults_are_told(reference: tscale.ReferenceData, changes: dict[str, object], words: str) -> None:
    arguments = {"r_gcrs_m": [A_M, 0.0, 0.0], "tt": dates(1), "reference": reference} | changes
    with pytest.raises(InvalidInput, match=words):
        tidal_potential_m2_s2(**arguments)


def test_faults_of_the_ground(reference: tscale.ReferenceData) -> None:
    with pytest.raises(InvalidInput, match="zero_tide, tide_free or mean_tide"):
        ground_tidal_potential_m2_s2([A_M, 0.0, 0.0], dates(1), reference, tide_system="unknown")  # type: ignore[arg-type]
    with pytest.raises(InvalidInput, match="finite"):
        ground_tidal_potential_m2_s2([A_M, 0.0, 0.0], dates(1), reference, factor=np.nan)
    with pytest.raises(InvalidInput, match="Love number h2"):
        ground_tide_factor(0.3, -1.0)
    with pytest.raises(OutOfSpan):
        tidal_potential_m2_s2([A_M, 0.0, 0.0], (np.int64(10**11), np.float64(0.0)), reference)
