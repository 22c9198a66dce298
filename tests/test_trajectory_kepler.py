"""Kepler's equation and two-body orbits."""

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tscale import Instants, Trajectory
from tscale.constants import GM_M3_S2
from tscale.errors import InvalidInput
from tscale.trajectory.kepler import KeplerOrbit, eccentric_anomaly, hyperbolic_anomaly

EPOCH = Instants.from_seconds(0, 0.25, "TT")


def test_published_solutions():
    # Vallado, Fundamentals of Astrodynamics and Applications, examples 2-1 and 2-3 (from memory, the printed digits).
    assert np.degrees(eccentric_anomaly(np.radians(235.4), 0.4)) == pytest.approx(220.512074, abs=1e-6)
    assert hyperbolic_anomaly(np.radians(235.4), 2.4) == pytest.approx(1.601376144, abs=1e-9)


eccentricities = st.one_of(st.floats(0, 0.999999), st.sampled_from([0.0, 1 - 1e-9, 0.5]))


@given(mean=st.floats(-50, 50), e=eccentricities)
def test_elliptic_equation_holds(mean, e):
    anomaly = eccentric_anomaly(mean, e)
    # 1e-15 of the largest term; beyond one turn an anomaly itself is only known to its own last bit.
    assert abs(anomaly - e * np.sin(anomaly) - mean) <= 4e-15 * max(1.0, abs(mean))


@given(mean=st.floats(-1e4, 1e4), e=st.floats(1 + 1e-9, 50))
def test_hyperbolic_equation_holds(mean, e):
    anomaly = hyperbolic_anomaly(mean, e)
    size = max(1.0, abs(mean) * max(1.0, abs(anomaly)))  # the last bit of H, times the slope
    assert abs(e * np.sinh(anomaly) - anomaly - mean) <= 4e-15 * size


def test_near_parabolic_and_tiny_anomalies():
    mean = np.array([0.0, 1e-300, 1e-12, 1e-6, 1e-3, np.pi - 1e-12, np.pi])
    for e in (1 - 1e-12, 0.9999):
        anomaly = eccentric_anomaly(mean, e)
        assert np.all(np.abs(anomaly - e * np.sin(anomaly) - mean) < 1e-15)
        assert np.all(np.diff(anomaly) >= 0)
    anomaly = hyperbolic_anomaly(mean, 1 + 1e-12)
    assert np.all(np.abs((1 + 1e-12) * np.sinh(anomaly) - anomaly - mean) < 4e-15)


def test_broadcast_shapes_and_bad_values():
    assert eccentric_anomaly(np.ones((3, 1)), [0.1, 0.2]).shape == (3, 2)
    assert eccentric_anomaly(1.0, 0.1).shape == ()
    for bad in ((1.0, 1.0), (1.0, -0.1), (np.nan, 0.1), (1.0, np.nan)):
        with pytest.raises(InvalidInput):
            eccentric_anomaly(*bad)
    with pytest.raises(InvalidInput):
        hyperbolic_anomaly(1.0, 0.9)


def test_elements_to_state_example():
    # Vallado, example 2-6 (from memory): p = 11067.790 km, e = 0.83285, i = 87.87, node 227.89, periapsis 53.38, true
    # anomaly 92.335 degrees with GM = 398600.4418 km3/s2. Printed to 1 m and 1e-6 km/s; a in the elements carries 5
    # digits of e, so 30 m and 3 cm/s.
    e, nu = 0.83285, np.radians(92.335)
    a_m = 11067790.0 / (1 - e**2)
    anomaly = 2 * np.arctan(np.sqrt((1 - e) / (1 + e)) * np.tan(nu / 2))
    mean_deg = np.degrees(anomaly - e * np.sin(anomaly))
    orbit = Trajectory.from_kepler(EPOCH, a_m, e, 87.87, 227.89, 53.38, mean_deg, gm_m3_s2=398600.4418e9)
    r, v = orbit.gcrs(EPOCH.pair, None)
    np.testing.assert_allclose(r, [6525344, 6861535, 6449125], rtol=0, atol=30)
    np.testing.assert_allclose(v, [4902.276, 5533.124, -1975.709], rtol=0, atol=0.03)


@pytest.mark.parametrize(("a_m", "e"), [(7e6, 0.0), (26.5e6, 0.01), (24.4e6, 0.73), (-2e7, 1.5), (-8e6, 3.0)])
def test_equation_of_motion_and_integrals(a_m, e):
    gm = 3.986004415e14
    orbit = KeplerOrbit((np.int64(0), np.float64(0.0)), gm, a_m, e, 1.0, 2.0, 0.5, 0.3)
    whole = np.arange(-40000, 40000, 997)
    zero = np.zeros(whole.size)
    r, v = orbit.state((whole, zero))
    distance = np.linalg.norm(r, axis=1)
    # Vis viva and angular momentum, to rounding.
    energy = 0.5 * np.sum(v * v, axis=1) - gm / distance
    np.testing.assert_allclose(energy, -gm / (2 * a_m), rtol=1e-12 * np.max(gm / distance) / abs(gm / a_m))
    momentum = np.cross(r, v)
    np.testing.assert_allclose(
        momentum, np.tile(momentum[0], (whole.size, 1)), rtol=0, atol=1e-11 * np.abs(momentum).max()
    )
    # Newton's law by differences of the velocity over +-1 s: h^4 leaves 1e-9 of the pull, rounding 1e-12 m/s2.
    step = {k: orbit.state((whole + k, zero)) for k in (-2, -1, 1, 2)}
    pull = (8 * (step[1][1] - step[-1][1]) - (step[2][1] - step[-2][1])) / 12
    np.testing.assert_allclose(pull, -gm * r / distance[:, None] ** 3, rtol=0, atol=1e-7)
    speed = (8 * (step[1][0] - step[-1][0]) - (step[2][0] - step[-2][0])) / 12
    np.testing.assert_allclose(speed, v, rtol=0, atol=1e-6)


def test_decades_lose_nothing():
    # After a whole number of periods the state is the same. The count then resolves 0.1 fs; the period in float64 and
    # the 2e5 turns taken out of it exactly leave 1e-7 m.
    orbit = KeplerOrbit((np.int64(0), np.float64(0.0)), 3.986004415e14, 7e6, 0.1, 1.0, 2.0, 0.5, 0.3)
    period = 2 * np.pi / orbit.mean_motion_rad_s
    turns = 200_003
    from fractions import Fraction

    later = Fraction(period) * turns
    whole = int(later)
    r0, v0 = orbit.state((np.array([0]), np.array([0.0])))
    r1, v1 = orbit.state((np.array([whole]), np.array([float(later - whole)])))
    np.testing.assert_allclose(r1, r0, rtol=0, atol=1e-7)
    np.testing.assert_allclose(v1, v0, rtol=0, atol=1e-10)


def test_orbit_about_another_body_and_its_third_law():
    epoch = Instants.from_seconds(0, 0.0, "TDB")
    orbit = Trajectory.from_kepler(epoch, 3.9e6, 0.0, 90, 0, 0, 0, center="mars")
    assert orbit.scale == "TDB"
    assert not orbit.geocentric
    assert orbit.pieces[0].center == 4
    motion = orbit.pieces[0].motion
    assert motion.mean_motion_rad_s**2 * 3.9e6**3 == pytest.approx(GM_M3_S2[4], rel=1e-14)


def test_mass_of_the_earth_is_compatible_with_tt():
    orbit = Trajectory.from_kepler(EPOCH, 7e6, 0.0, 0, 0, 0, 0)
    # TN36 Table 1.1 and text: GM of the Earth, TT-compatible, 398600.4415 km3/s2 +- 0.0008.
    assert orbit.pieces[0].motion.gm_m3_s2 == pytest.approx(3.986004415e14, abs=8e5)


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"e": 1.0}, "ellipse"),
        ({"e": -0.1}, "ellipse"),
        ({"e": 1.5}, "negative for a hyperbola"),
        ({"a_m": -7e6}, "negative for a hyperbola"),
        ({"a_m": np.nan}, "a_m"),
        ({"i_deg": np.inf}, "i_rad"),
        ({"node_deg": "x"}, "node_deg must be real numbers"),
        ({"center": "mars"}, "TDB or TCB"),
        ({"center": 499, "epoch": Instants.from_seconds(0, 0.0, "TDB")}, "give gm_m3_s2"),
        ({"center": "vulcan"}, "vulcan"),
        ({"epoch": Instants.from_seconds([0, 1], 0.0, "TT")}, "one epoch"),
        ({"epoch": Instants.from_seconds(0, 0.0, "UT1")}, "UT1"),
        ({"gm_m3_s2": -1.0}, "positive"),
        ({"gm_m3_s2": "x"}, "gm_m3_s2 must be real numbers"),
        ({"a_m": [7e6, 8e6]}, "a_m must be one number"),
        ({"e": 0.1j}, "e must be real numbers, got complex128"),
        ({"epoch": "2025"}, "must be Instants, got '2025'"),
        ({"epoch": EPOCH.at("BARYCENTER")}, "dated at BARYCENTER"),
        ({"epoch": Instants.from_seconds(0, 0.0, "TDB", "GEOCENTER"), "center": "mars"}, "dated at GEOCENTER"),
        ({"name": None}, "name must be a text"),
    ],
)
def test_bad_elements(change, words):
    good = {
        "epoch": EPOCH,
        "a_m": 7e6,
        "e": 0.1,
        "i_deg": 1.0,
        "node_deg": 1.0,
        "periapsis_deg": 1.0,
        "mean_anomaly_deg": 1.0,
    }
    with pytest.raises(InvalidInput, match=words):
        Trajectory.from_kepler(**(good | change))
