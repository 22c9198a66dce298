"""Normal gravity and geopotential numbers against the published constants of GRS80 and WGS84."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tscale import constants
from tscale.constants import C_M_S
from tscale.earth import geocentric_from_geodetic
from tscale.earth.gravity import (
    GRS80,
    WGS84,
    HarmonicField,
    NormalField,
    geopotential_number_m2_s2,
    height_above_geoid_m,
)
from tscale.errors import InvalidInput, NotConverged

# Moritz 2000, J. Geodesy 74, 128 (GRS80) and NIMA TR8350.2 (WGS84; its U0 and J2 from memory), with half a unit of the
# last digit that is printed as the tolerance.
PUBLISHED = [
    (GRS80, "b_m", 6356752.3141, 5e-5),
    (GRS80, "e2", 0.00669438002290, 5e-15),
    (GRS80, "flattening", 0.00335281068118, 5e-15),
    (GRS80, "linear_eccentricity_m", 521854.0097, 5e-5),
    (GRS80, "m", 0.00344978600308, 5e-15),
    (GRS80, "u0_m2_s2", 62636860.850, 5e-4),
    (GRS80, "gamma_e_m_s2", 9.7803267715, 5e-11),
    (GRS80, "gamma_p_m_s2", 9.8321863685, 5e-11),
    (GRS80, "k", 0.001931851353, 5e-13),
    (GRS80, "j2", 108263e-8, 1e-17),
    (WGS84, "b_m", 6356752.3142, 5e-5),
    (WGS84, "e2", 0.00669437999013, 1.2e-14),  # its own 1/f gives ...9990141
    (WGS84, "m", 0.00344978650684, 5e-15),
    (WGS84, "u0_m2_s2", 62636851.7146, 5e-5),
    (WGS84, "gamma_e_m_s2", 9.7803253359, 5e-11),
    (WGS84, "gamma_p_m_s2", 9.8321849378, 1e-10),  # 9.83218493786, printed cut off
    (WGS84, "k", 0.00193185265241, 1e-13),  # printed from values of gravity with 12 digits
    (WGS84, "j2", 0.00108262982131, 5e-15),
]


@pytest.mark.parametrize(("normal", "what", "published", "tolerance"), PUBLISHED)
def test_derived_constants(normal: NormalField, what: str, published: float, tolerance: float) -> None:
    assert getattr(normal, what) == pytest.approx(published, abs=tolerance, rel=0)


@pytest.mark.parametrize(
    ("degree", "published"), [(4, -0.00000237091222), (6, 0.00000000608347), (8, -0.00000000001427)]
)
def test_even_zonal_coefficients_of_grs80(degree: int, published: float) -> None:
    # Moritz 2000, derived geometric constants.
    j = GRS80.zonal_coefficients(8)
    assert j[degree - 2] == pytest.approx(published, abs=5e-15, rel=0)
    assert j[0] == pytest.approx(GRS80.j2, rel=0, abs=5e-19)
    assert j[1::2] == (0.0, 0.0, 0.0)


def test_flattening_of_grs80_follows_from_its_j2() -> None:
    assert 1.0 / GRS80.flattening == pytest.approx(constants.GRS80_INVERSE_FLATTENING, abs=5e-10, rel=0)
    again = NormalField.from_flattening(
        "again",
        a_m=GRS80.a_m,
        inverse_flattening=1.0 / GRS80.flattening,
        gm_m3_s2=GRS80.gm_m3_s2,
        omega_rad_s=GRS80.omega_rad_s,
    )
    assert again.j2 == pytest.approx(constants.GRS80_J2, rel=0, abs=1e-16)


@pytest.mark.parametrize(
    ("normal", "expected"),
    [
        (GRS80, (9.793248703607993, 9.8061992025227, 9.819178385019711)),
        (WGS84, (9.793247269219156, 9.806197769377702, 9.819176953119456)),
    ],
)
def test_somigliana(normal: NormalField, expected: tuple[float, ...]) -> None:
    # Somigliana's formula with the published a, b, gamma_e, gamma_p, which have 11 digits: 1e-10 m/s2.
    found = normal.gravity_m_s2([30.0, 45.0, 60.0])
    np.testing.assert_allclose(found, expected, rtol=0, atol=1e-10)
    assert normal.gravity_m_s2(0.0) == pytest.approx(normal.gamma_e_m_s2, rel=0, abs=4e-15)
    assert normal.gravity_m_s2(-90.0) == pytest.approx(normal.gamma_p_m_s2, rel=0, abs=4e-15)


def test_somigliana_is_the_gradient_of_the_closed_potential() -> None:
    lat = np.linspace(-90.0, 90.0, 37)
    r = geocentric_from_geodetic(20.0, lat, 0.0, "GRS80")
    np.testing.assert_allclose(GRS80.gravity_potential_m2_s2(r), GRS80.u0_m2_s2, rtol=1e-14)
    for height, tolerance in ((0.0, 1e-13), (1e3, 1.1e-7), (1e4, 7e-7), (5e4, 2.1e-5)):
        # Left out by the second order: what the docstring says.
        r = geocentric_from_geodetic(20.0, lat, height, "GRS80")
        g = GRS80.acceleration_m_s2(r)
        g[:, :2] += GRS80.omega_rad_s**2 * r[:, :2]
        np.testing.assert_allclose(np.linalg.norm(g, axis=-1), GRS80.gravity_m_s2(lat, height), rtol=0, atol=tolerance)


def test_closed_field_by_its_own_series() -> None:
    # Heiskanen & Moritz 2-92: J2 .. J20 of the level ellipsoid; J22 is below 1e-26.
    top = 20
    c = np.zeros((top + 1, top + 1))
    c[0, 0] = 1.0
    degrees = np.arange(2, top + 1)
    c[2:, 0] = -np.array(WGS84.zonal_coefficients(top)) / np.sqrt(2 * degrees + 1)
    series = HarmonicField("series", WGS84.gm_m3_s2, WGS84.a_m, c, np.zeros_like(c))
    rng = np.random.default_rng(5)
    r = rng.normal(size=(200, 3))
    r *= (WGS84.a_m * rng.uniform(1.0, 7.0, 200) / np.linalg.norm(r, axis=-1))[:, np.newaxis]
    np.testing.assert_allclose(WGS84.potential_m2_s2(r), series.potential_m2_s2(r), rtol=1.5e-15)
    difference = WGS84.acceleration_m_s2(r) - series.acceleration_m_s2(r)
    assert np.max(np.abs(difference)) < 1e-14  # rounding of 9.8 m/s2


def test_gradient_of_the_closed_field_at_pole_and_equator() -> None:
    r = np.array([[0.0, 0.0, 6.4e6], [6.5e6, 0.0, 0.0], [0.0, -7e6, 1.0], [4e6, 3e6, -5e6]])
    step = 50.0
    for axis in range(3):
        d = np.zeros(3)
        d[axis] = step
        slope = (GRS80.potential_m2_s2(r + d) - GRS80.potential_m2_s2(r - d)) / (2 * step)
        # Rounding of the potential, 1e-8 m2/s2, over 100 m; third derivative 4e-12 times step^2/6.
        np.testing.assert_allclose(slope, GRS80.acceleration_m_s2(r)[:, axis], rtol=0, atol=3e-9)


def test_redshift_per_metre() -> None:
    # 1.09e-16 per metre, the usual figure; gh/c^2 with standard gravity is 1.0911e-16.
    y = geopotential_number_m2_s2(1.0, 45.5) / C_M_S**2
    assert y == pytest.approx(9.80665 / C_M_S**2, rel=1e-4, abs=0)
    assert y == pytest.approx(1.09e-16, rel=2e-3, abs=0)


def test_published_geopotential_number_of_a_laboratory() -> None:
    # 16167.80 m2/s2 of a laboratory on a plateau (2003, Metrologia 40, 66).
    number = 16167.80
    # Its height, about 1650 m (from memory), by either mean gravity. They differ by 0.4 m, as gravity there, 9.7961
    # m/s2 (from memory), is 50 mGal below normal.
    normal, helmert = height_above_geoid_m(number, 40.0), height_above_geoid_m(number, 40.0, gravity_m_s2=9.7961)
    assert abs(normal - 1650.0) < 1.0
    assert abs(helmert - 1650.0) < 1.0
    assert 0.1 < helmert - normal < 0.6


def test_mean_gravity_through_rock() -> None:
    # Poincare-Prey: in rock of 2670 kg/m3 gravity falls with height by the free-air gradient less 4 pi G rho (G of
    # CODATA), and the mean over H is half of that above its surface value. Heiskanen & Moritz print 0.0424 mGal/m, with
    # G = 6.67e-11: one unit of the last digit.
    in_air = float(GRS80.gravity_m_s2(45.0, 0.0) - GRS80.gravity_m_s2(45.0, 1.0))
    half = (in_air - 4 * np.pi * 6.6743e-11 * 2670.0) / 2
    number = geopotential_number_m2_s2(2000.0, 45.0, gravity_m_s2=9.8)
    assert number / 2000.0 - 9.8 == pytest.approx(half * 2000.0, abs=0.0001e-5 * 2000.0)


@pytest.mark.parametrize(("height", "tolerance"), [(1e3, 6e-5), (1e4, 4.1e-3), (5e4, 0.27), (-1.2e4, 0.012)])
def test_geopotential_number_against_the_closed_potential(height: float, tolerance: float) -> None:
    lat = np.linspace(-90.0, 90.0, 37)
    closed = GRS80.u0_m2_s2 - GRS80.gravity_potential_m2_s2(geocentric_from_geodetic(0.0, lat, height, "GRS80"))
    found = geopotential_number_m2_s2(height, lat)
    assert np.max(np.abs(found - closed)) < tolerance  # what the docstring says is left out


@given(
    height=st.floats(-12_000.0, 50_000.0),
    lat=st.floats(-90.0, 90.0),
    g=st.none() | st.floats(9.76, 9.84),
    normal=st.sampled_from([GRS80, WGS84]),
)
def test_heights_come_back(height: float, lat: float, g: float | None, normal: NormalField) -> None:
    height = min(height, 9000.0) if g is not None else height
    number = geopotential_number_m2_s2(height, lat, normal=normal, gravity_m_s2=g)
    back = height_above_geoid_m(number, lat, normal=normal, gravity_m_s2=g)
    assert abs(float(back) - height) < 1e-9


def test_any_shape_and_nothing_changed() -> None:
    lat = np.array([[10.0], [50.0]])
    height = np.arange(12.0)[::3] * 100.0
    for function in (GRS80.gravity_m_s2, lambda a, b: geopotential_number_m2_s2(b, a)):
        found = function(lat, height)
        assert found.shape == (2, 4)
        assert found[1, 2] == function(50.0, 600.0)
    assert np.shape(GRS80.gravity_m_s2(45.0)) == ()
    np.testing.assert_array_equal(height, [0.0, 300.0, 600.0, 900.0])
    r = np.array([7e6, 1.0, 2.0])
    assert GRS80.potential_m2_s2(np.broadcast_to(r, (3, 2, 3))).shape == (3, 2)
    assert GRS80.acceleration_m_s2(r).shape == (3,)
    assert np.shape(GRS80.potential_m2_s2(r)) == ()


def test_a_sphere_all_but() -> None:
    # Slow and nearly round: the field of a point mass.
    ball = NormalField.from_j2("ball", a_m=1e6, j2=1e-7, gm_m3_s2=1e12, omega_rad_s=1e-9)
    assert ball.u0_m2_s2 == pytest.approx(1e6, rel=1e-6)
    assert ball.gamma_e_m_s2 == pytest.approx(1.0, rel=1e-6)
    assert ball.k == pytest.approx(-3e-7, rel=1e-4, abs=0)  # f = 1.5 J2, and gravity falls to the poles by as much
    assert ball.j2 == pytest.approx(1e-7, rel=1e-9, abs=0)


@pytest.mark.parametrize(
    ("call", "words"),
    [
        (lambda: geopotential_number_m2_s2([0.0, 60_000.0], 45.0), "within -12000 to 50000"),
        (lambda: geopotential_number_m2_s2([0.0, np.nan], 45.0), "within -12000 to 50000"),
        (lambda: GRS80.gravity_m_s2([45.0, 91.0]), "lat_deg must lie within"),
        (lambda: height_above_geoid_m([0.0, 1e6], 10.0), "within -119000 to 489000"),
        (lambda: geopotential_number_m2_s2([1.0, 2.0], 10.0, gravity_m_s2=[9.8, 980.6]), "9.7 to 9.9"),
        (lambda: GRS80.potential_m2_s2([[7e6, 0.0, 0.0], [6378.0, 0.0, 0.0]]), "give metres"),
    ],
)
def test_ranges_carry_a_mask(call, words: str) -> None:
    with pytest.raises(InvalidInput, match=words) as caught:
        call()
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True]


@pytest.mark.parametrize(
    "call",
    [
        lambda: GRS80.gravity_m_s2("north"),
        lambda: GRS80.gravity_m_s2([1.0, 2.0], [1.0, 2.0, 3.0]),
        lambda: GRS80.potential_m2_s2([1.0, 2.0]),
        lambda: GRS80.zonal_coefficients(1),
        lambda: geopotential_number_m2_s2(1.0, 1.0, gravity_m_s2="9.8"),
        lambda: NormalField("", 6e6, 4e14, 7e-5, 0.006),
        lambda: NormalField("km", 6378.137, 398600.0, 7e-5, 0.006),
        lambda: NormalField("round", 6e6, 4e14, 7e-5, 0.0),
        lambda: NormalField("text", 6e6, "4e14", 7e-5, 0.006),  # type: ignore[arg-type]
        lambda: NormalField("nan", math.nan, 4e14, 7e-5, 0.006),
        lambda: NormalField.from_j2("j", a_m=6e6, j2=-1e-3, gm_m3_s2=4e14, omega_rad_s=7e-5),
        lambda: NormalField.from_flattening("f", a_m=6e6, inverse_flattening=0.0033, gm_m3_s2=4e14, omega_rad_s=7e-5),
    ],
)
def test_faults_are_told(call) -> None:
    with pytest.raises(InvalidInput):
        call()


def test_a_body_that_flies_apart() -> None:
    with pytest.raises(NotConverged, match="no level ellipsoid"):
        NormalField.from_j2("fast", a_m=6e6, j2=1e-3, gm_m3_s2=4e14, omega_rad_s=2e-3)
