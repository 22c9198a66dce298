"""Fields of J2 .. J6 and of spherical harmonics against a general library for them, and against calculus."""

from __future__ import annotations

import numpy as np
import pyshtools
import pytest

from tscale import constants
from tscale.earth.gravity import EARTH_ZONAL, GRS80, GravityField, HarmonicField, ZonalField
from tscale.errors import InvalidInput

RADIUS_M = constants.EARTH_FIELD_RADIUS_M
GM = constants.EARTH_GM_TT_M3_S2


def points(number: int, lowest_m: float, highest_m: float, seed: int = 1) -> np.ndarray:
    """Random positions, with both poles, one near a pole and one on the equator in front."""
    rng = np.random.default_rng(seed)
    unit = rng.normal(size=(number, 3))
    unit[:4] = [[0.0, 0.0, 1.0], [0.0, 0.0, -1.0], [1e-9, 1e-6, 1.0], [0.0, 1.0, 0.0]]
    unit /= np.linalg.norm(unit, axis=-1)[:, np.newaxis]
    return unit * rng.uniform(lowest_m, highest_m, number)[:, np.newaxis]


def coefficients(degree: int, size: float = 1e-5, seed: int = 2) -> tuple[np.ndarray, np.ndarray]:
    """C and S of an invented field that falls off like a planet's, size/n^2."""
    rng = np.random.default_rng(seed)
    c, s = np.tril(rng.normal(size=(2, degree + 1, degree + 1))) * size
    fall = np.maximum(1.0, np.arange(degree + 1.0))[:, np.newaxis] ** 2
    c, s = c / fall, s / fall
    c[0, 0], s[:, 0] = 1.0, 0.0
    return c, s


def library_potential(c: np.ndarray, s: np.ndarray, r: np.ndarray) -> np.ndarray:
    """pyshtools: the sum of the harmonics at one point after the other, radial factors put into the coefficients."""
    found = []
    for x, y, z in r:
        distance = np.sqrt(x * x + y * y + z * z)
        scaled = np.array([c, s]) * ((RADIUS_M / distance) ** np.arange(len(c)))[np.newaxis, :, np.newaxis]
        lat, lon = np.degrees(np.arctan2(z, np.hypot(x, y))), np.degrees(np.arctan2(y, x))
        found.append(GM / distance * pyshtools.expand.MakeGridPoint(scaled, lat, lon, norm=1, csphase=1))
    return np.array(found)


def library_acceleration(c: np.ndarray, s: np.ndarray, r: np.ndarray) -> np.ndarray:
    """pyshtools: gravity in spherical components (r, colatitude, longitude), turned to x, y, z."""
    found = []
    for x, y, z in r:
        flat, distance = np.hypot(x, y), np.sqrt(x * x + y * y + z * z)
        lat, lon = np.degrees(np.arctan2(z, flat)), np.degrees(np.arctan2(y, x))
        g = pyshtools.gravmag.MakeGravGridPoint(np.array([c, s]), GM, RADIUS_M, distance, lat, lon)
        out = np.array([x, y, z]) / distance
        south = np.array([x * z / flat, y * z / flat, -flat]) / distance
        east = np.array([-y / flat, x / flat, 0.0])
        found.append(g[0] * out + g[1] * south + g[2] * east)
    return np.array(found)


def zonal_as_harmonic(field: ZonalField) -> tuple[np.ndarray, np.ndarray]:
    c = np.zeros((field.max_degree + 1, field.max_degree + 1))
    c[0, 0] = 1.0
    c[2:, 0] = -np.array(field.j) / np.sqrt(2 * np.arange(2, field.max_degree + 1) + 1)
    return c, np.zeros_like(c)


def test_coefficients_are_those_of_the_conventions() -> None:
    # TN36 Table 6.2 (zero-tide C20, C30, C40) and EGM2008 (C50, C60), in the digits that are printed.
    normalised = (-0.48416948e-3, 0.9571612e-6, 0.5399659e-6, 0.68670291e-7, -0.14995393e-6)
    for n, (j, c) in enumerate(zip(EARTH_ZONAL.j, normalised, strict=True), start=2):
        assert j == pytest.approx(-np.sqrt(2 * n + 1) * c, rel=1e-7, abs=0)
    # TN36 Table 1.1; GM in TT-compatible units is smaller by L_G.
    assert EARTH_ZONAL.j[0] == 1.0826359e-3
    assert pytest.approx(3.986004418e14 * (1 - float(constants.L_G)), rel=1e-10) == EARTH_ZONAL.gm_m3_s2
    # W0 of TT: L_G c^2, defining, with W0 to 1e-8 of itself.
    assert float(constants.L_G) * constants.C_M_S**2 == pytest.approx(constants.W0_M2_S2, abs=1e-3)


def test_zonal_potential_against_the_library() -> None:
    r = points(300, 6.36e6, 4.3e7)
    expected = library_potential(*zonal_as_harmonic(EARTH_ZONAL), r)
    np.testing.assert_allclose(EARTH_ZONAL.potential_m2_s2(r), expected, rtol=1e-15)
    assert np.max(np.abs(EARTH_ZONAL.potential_m2_s2(r) * np.linalg.norm(r, axis=-1) / GM - 1.0)) > 5e-4


def test_zonal_acceleration_against_the_library() -> None:
    r = points(100, 6.36e6, 4.3e7)[3:]  # the library's components are singular at the poles
    expected = library_acceleration(*zonal_as_harmonic(EARTH_ZONAL), r)
    assert np.max(np.abs(EARTH_ZONAL.acceleration_m_s2(r) - expected)) < 2e-14  # ten roundings of 9.8 m/s2


@pytest.mark.parametrize("degree", [2, 3, 36, 360])
def test_harmonic_field_against_the_library(degree: int) -> None:
    c, s = coefficients(degree)
    c[2, 0] = -4.84e-4
    field = HarmonicField("invented", GM, RADIUS_M, c, s)
    r = points(40, 6.37e6, 7e6)
    # A few roundings of 6e7 m2/s2; one tenth of a millimetre of height.
    np.testing.assert_allclose(field.potential_m2_s2(r), library_potential(c, s, r), rtol=1.5e-15)
    expected = library_acceleration(c, s, r[3:])
    assert np.max(np.abs(field.acceleration_m_s2(r[3:]) - expected)) < 1e-13 * max(1, degree / 10)


def test_degree_2190_against_the_library() -> None:
    # One row of ones at the highest degree of the published models, alone.
    top = 2190
    c = np.zeros((top + 1, top + 1))
    c[top] = 1.0
    field = HarmonicField("row", GM, RADIUS_M, c, np.zeros_like(c))
    unit = points(6, 1.0, 1.0)
    found = field.potential_m2_s2(unit * RADIUS_M) * RADIUS_M / GM
    for value, (x, y, z) in zip(found, unit, strict=True):
        legendre = pyshtools.legendre.PlmBar(top, z)[top * (top + 1) // 2 :]
        expected = np.sum(legendre * np.cos(np.arctan2(y, x) * np.arange(top + 1)))
        # Values are of the order 100; the two recursions part by 1e-11 of that, and the
        # library is given z, whose rounding counts 2190^2-fold near a pole.
        assert value == pytest.approx(expected, abs=3e-8, rel=1e-9)


def test_zonal_is_harmonic_of_order_0() -> None:
    r = points(50, 6.4e6, 1e7)
    same = HarmonicField("same", EARTH_ZONAL.gm_m3_s2, EARTH_ZONAL.radius_m, *zonal_as_harmonic(EARTH_ZONAL))
    np.testing.assert_allclose(same.potential_m2_s2(r), EARTH_ZONAL.potential_m2_s2(r), rtol=1e-15)
    assert np.max(np.abs(same.acceleration_m_s2(r) - EARTH_ZONAL.acceleration_m_s2(r))) < 1e-14


FIELDS = [EARTH_ZONAL, GRS80, HarmonicField("invented 40", GM, RADIUS_M, *coefficients(40))]


@pytest.mark.parametrize("field", FIELDS, ids=lambda field: field.name)
def test_acceleration_is_the_gradient(field: GravityField) -> None:
    r, step = points(60, 6.4e6, 9e6), 20.0
    for axis in range(3):
        d = np.zeros(3)
        d[axis] = step
        slope = (field.potential_m2_s2(r + d) - field.potential_m2_s2(r - d)) / (2 * step)
        # Rounding of 6e7 m2/s2 over 40 m (1e-9); third derivatives of degree 40: 40^3 1e-8 GM/r^4 step^2/6 (1e-11).
        assert np.max(np.abs(slope - field.acceleration_m_s2(r)[:, axis])) < 3e-9


@pytest.mark.parametrize("field", FIELDS, ids=lambda field: field.name)
def test_laplace(field: GravityField) -> None:
    # Divergence of the acceleration by differences of fourth order; each of its three terms is up to 3e-6 1/s2.
    r, step = points(60, 6.4e6, 9e6), 2000.0
    divergence = np.zeros(len(r))
    for axis in range(3):
        d = np.zeros(3)
        d[axis] = step
        near = field.acceleration_m_s2(r + d)[:, axis] - field.acceleration_m_s2(r - d)[:, axis]
        far = field.acceleration_m_s2(r + 2 * d)[:, axis] - field.acceleration_m_s2(r - 2 * d)[:, axis]
        divergence += (8 * near - far) / (12 * step)
    # Rounding 1e-15/2000 s-2 and step^4/30 times the fifth derivative, 1e-13 of GM/r^3 times 40^5 1e-8.
    assert np.max(np.abs(divergence)) < 2e-17


def test_any_body() -> None:
    # The Moon: J2 = 2.033e-4 (from memory). At its pole J2 takes J2 GM/R from the potential.
    moon = ZonalField("Moon", constants.GM_M3_S2[301], 1.738e6, (2.033e-4,))
    point = ZonalField("point", constants.GM_M3_S2[301], 1.738e6)
    pole = np.array([0.0, 0.0, 1.738e6])
    difference = moon.potential_m2_s2(pole) - point.potential_m2_s2(pole)
    assert difference == pytest.approx(-2.033e-4 * constants.GM_M3_S2[301] / 1.738e6, rel=1e-9)
    np.testing.assert_allclose(point.acceleration_m_s2(pole), [0.0, 0.0, -constants.GM_M3_S2[301] / 1.738e6**2])
    assert (moon.max_degree, point.max_degree) == (2, 1)


@pytest.mark.parametrize("field", FIELDS, ids=lambda field: field.name)
def test_shapes(field: GravityField) -> None:
    assert isinstance(field, GravityField)
    r = points(12, 6.5e6, 7e6)
    before = r.copy()
    wide = np.repeat(r, 2, axis=0)[::2].reshape(3, 4, 3)  # strided
    potential, acceleration = field.potential_m2_s2(wide), field.acceleration_m_s2(wide)
    assert (potential.shape, acceleration.shape) == ((3, 4), (3, 4, 3))
    one = field.potential_m2_s2(r[5])
    assert np.shape(one) == ()
    assert one == potential[1, 1]
    np.testing.assert_array_equal(field.acceleration_m_s2(r[5].tolist()), acceleration[1, 1])
    assert field.potential_m2_s2(np.empty((0, 3))).shape == (0,)
    assert field.potential_m2_s2(np.broadcast_to(r[0], (2, 3))).tolist() == [field.potential_m2_s2(r[0])] * 2
    np.testing.assert_array_equal(r, before)


@pytest.mark.parametrize("field", FIELDS, ids=lambda field: field.name)
def test_bad_positions_carry_a_mask(field: GravityField) -> None:
    r = np.array([[7e6, 0.0, 0.0], [7000.0, 0.0, 0.0], [np.nan, 0.0, 7e6]])
    for call in (field.potential_m2_s2, field.acceleration_m_s2):
        with pytest.raises(InvalidInput, match="give metres") as caught:
            call(r)
        assert caught.value.mask is not None
        assert caught.value.mask.tolist() == [False, True, True]
        with pytest.raises(InvalidInput, match="last axis"):
            call(r[:, :2])


@pytest.mark.parametrize(
    "call",
    [
        lambda: ZonalField("", GM, RADIUS_M),
        lambda: ZonalField("km", 398600.4, 6378.1, (1e-3,)).potential_m2_s2([6000.0, 0.0]),
        lambda: ZonalField("gm", -GM, RADIUS_M),
        lambda: ZonalField("radius", GM, "6378"),  # type: ignore[arg-type]
        lambda: ZonalField("j", GM, RADIUS_M, (1.0, np.nan)),
        lambda: ZonalField("j", GM, RADIUS_M, 1e-3),  # type: ignore[arg-type]
        lambda: HarmonicField("c", GM, RADIUS_M, np.ones(3), np.ones(3)),
        lambda: HarmonicField("c", GM, RADIUS_M, np.ones((3, 3)), np.zeros((3, 3))),
        lambda: HarmonicField("s", GM, RADIUS_M, np.eye(3), np.eye(3)),
        lambda: HarmonicField("s", GM, RADIUS_M, np.eye(3), np.zeros((4, 4))),
        lambda: HarmonicField("nan", GM, RADIUS_M, np.eye(3) * np.nan, np.zeros((3, 3))),
        lambda: HarmonicField("text", GM, RADIUS_M, [["a"]], [["b"]]),  # type: ignore[arg-type]
        lambda: HarmonicField("tide", GM, RADIUS_M, np.eye(3), np.zeros((3, 3)), "low_tide"),
    ],
)
def test_faults_are_told(call) -> None:
    with pytest.raises(InvalidInput):
        call()


def test_coefficients_cannot_change() -> None:
    c, s = coefficients(3)
    field = HarmonicField("fixed", GM, RADIUS_M, c, s)
    c[2, 0] = 7.0
    assert field.c[2, 0] != 7.0
    with pytest.raises(ValueError, match="read-only"):
        field.c[2, 0] = 1.0
