"""Levelling with clocks: from a frequency difference to geopotential and height, against published pairs."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

import tscale
from tscale.earth.gravity import geopotential_number_m2_s2, height_above_geoid_m

C2 = 299792458.0**2
height_from_frequency = tscale.height_from_frequency


def test_a_published_pair_of_laboratories() -> None:
    # Nature Photonics 10, 662 (2016): 1652.9(5.9)e-18 is 148.555 m2/s2 and 1516(5) cm; gravity there 9.798 m/s2.
    found = height_from_frequency(1652.9e-18, 5.9e-18, gravity_m_s2=9.798)
    assert float(found.geopotential_number_m2_s2) == pytest.approx(148.555, abs=0.01)
    assert float(found.height_m) == pytest.approx(15.16, abs=0.005)
    assert float(found.height_sigma_m) == pytest.approx(0.05, abs=0.005)
    assert float(found.geopotential_sigma_m2_s2) == pytest.approx(5.9e-18 * C2, rel=1e-12, abs=0)


def test_two_clocks_on_one_table() -> None:
    # Science 329, 1630 (2010): (4.1 +- 1.6)e-17 is 37 +- 15 cm (from memory), the ladder said 33 cm.
    found = height_from_frequency(4.1e-17, 1.6e-17, lat_deg=40.0, height_above_geoid_m=1634.0)
    assert float(found.height_m) == pytest.approx(0.37, abs=0.01)
    assert float(found.height_sigma_m) == pytest.approx(0.15, abs=0.01)
    assert abs(float(found.height_m) - 0.33) < float(found.height_sigma_m)


def test_457_km_apart() -> None:
    # arXiv 2309.14953: 3918.1(2.4) m2/s2 by clocks, 3915.88(0.30) by geodesy.
    found = height_from_frequency(3918.1 / C2, 2.4 / C2, lat_deg=50.0)
    # The height that geodesy's number has by the closed inverse lies within the sigma of the clocks', 0.24 m.
    by_geodesy = float(height_above_geoid_m(3915.88, 50.0))
    assert float(found.height_sigma_m) == pytest.approx(2.4 / 9.81, rel=1e-3, abs=0)
    assert 0.2 < float(found.height_m) - by_geodesy < float(found.height_sigma_m)


@given(
    lat=st.floats(-90.0, 90.0),
    base=st.floats(-400.0, 5000.0),
    difference=st.floats(-3000.0, 3000.0) | st.floats(-0.1, 0.1),
)
def test_there_and_back(lat: float, base: float, difference: float) -> None:
    lower, upper = (geopotential_number_m2_s2(h, lat) for h in (base, base + difference))
    found = height_from_frequency((upper - lower) / C2, lat_deg=lat, height_above_geoid_m=base)
    # Numbers of 5e4 m2/s2 are rounded to 1e-11: 1e-12 m.
    assert float(found.height_m) == pytest.approx(difference, abs=5e-12)


def test_a_comparison_read_backwards() -> None:
    t = tscale.Instants.from_iso("2024-03-01T00:00:00", scale="TT")
    a = tscale.Site.from_geodetic("a", 7.0, 47.0, 1500.0, height_above_geoid_m=1450.0)
    b = tscale.Site.from_geodetic("b", 7.0, 47.0, 400.0, height_above_geoid_m=352.5)
    rate = tscale.compare_clocks(a, b, t, t.shifted(86400.0), tides=False).rate
    found = height_from_frequency(rate, lat_deg=47.0, height_above_geoid_m=352.5)
    assert float(found.height_m) == pytest.approx(
        1097.5, abs=3e-6
    )  # second order, U dC/c^4, is 8e-23: 0.8 um; TT for TCG as much


def test_arrays_broadcast() -> None:
    y = np.array([[1e-17], [2e-17]])
    found = height_from_frequency(y, 1e-18, lat_deg=np.array([0.0, 45.0, 90.0]))
    assert found.height_m.shape == found.height_sigma_m.shape == found.geopotential_number_m2_s2.shape == (2, 3)
    # Gravity grows to the pole by 0.5%.
    np.testing.assert_allclose(found.height_m[:, 0] / found.height_m[:, 2], 9.8321863685 / 9.7803267715, rtol=1e-9)
    zero = height_from_frequency(0.0, 1e-18, lat_deg=45.0)
    assert float(zero.height_m) == 0.0
    assert float(zero.height_sigma_m) == pytest.approx(1e-18 * C2 / 9.806199, rel=1e-6, abs=0)
    assert y[0, 0] == 1e-17


@pytest.mark.parametrize(
    ("act", "match"),
    [
        (lambda: height_from_frequency(1e-17), "one of them"),
        (lambda: height_from_frequency(1e-17, lat_deg=40.0, gravity_m_s2=9.8), "one of them"),
        (lambda: height_from_frequency(1e-9, lat_deg=40.0), "fractions"),
        (lambda: height_from_frequency(1e-17, -1e-18, lat_deg=40.0), "negative"),
        (lambda: height_from_frequency(np.nan, lat_deg=40.0), "finite"),
        (lambda: height_from_frequency("1e-17", lat_deg=40.0), "number"),
        (lambda: height_from_frequency(1e-17, gravity_m_s2=1.6), "9.7"),
        (lambda: height_from_frequency(1e-17, lat_deg=95.0), "lat_deg"),
        (lambda: height_from_frequency([1e-17, 2e-17], [1e-18, 1e-18, 1e-18], lat_deg=40.0), "broadcast"),
    ],
)
def test_errors_teach(act, match: str) -> None:
    with pytest.raises(tscale.errors.InvalidInput, match=match):
        act()
