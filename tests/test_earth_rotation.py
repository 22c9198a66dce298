"""Earth rotation against published vectors and against pyerfa's own series and matrices."""

import datetime
from pathlib import Path
from types import SimpleNamespace

import erfa
import numpy as np
import pytest
from astropy import units as u
from astropy.coordinates import EarthLocation
from astropy.time import Time
from astropy.utils import iers
from astropy_iers_data import IERS_B_FILE
from hypothesis import given
from hypothesis import strategies as st

from tscale.earth import Site, cip_table, gcrs_from_itrs, gcrs_state_from_itrs, itrs_from_gcrs, itrs_state_from_gcrs
from tscale.earth.orientation import Orientation
from tscale.earth.rotation import era_rad, orientation
from tscale.errors import ExtrapolationWarning, InvalidInput
from tscale.formats.leap_seconds import LeapSeconds
from tscale.tables.earth_orientation import EarthOrientation

from .earth_support import ARCSEC, erfa_celestial_to_terrestrial, held

POINT_M = np.array([-5492333.306, -2453018.509, 2113645.653])
# TT counts of 1962-01-01 and 2060-01-01.
FIRST, LAST = -1199188800, 1893412800


def count(*date):
    return int((datetime.datetime(*date) - datetime.datetime(2000, 1, 1, 12)).total_seconds())


def counts(n, seed=1):
    random = np.random.default_rng(seed)
    return random.integers(FIRST, LAST, n), random.random(n)


def test_attitude_example_of_sofa():
    # SOFA, Tools for Earth Attitude, example 5.5 (IAU 2006/2000A, CIO based, with polar motion), 2007-04-05T12:00:00
    # UTC. Printed to 15 decimals; 1e-14 is the tolerance that the example allows.
    table = EarthOrientation.constant(
        ut1_minus_utc_s=-0.072073685,
        x_arcsec=0.0349282,
        y_arcsec=0.4833163,
        dx_mas=0.1750,
        dy_mas=-0.2259,
        start_mjd=54194,
        end_mjd=54197,
    )
    tt = (np.int64(count(2007, 4, 5, 12) + 65), np.float64(0.184))
    published = [
        [+0.973104317697535, +0.230363826239128, -0.000703163482198],
        [-0.230363800456037, +0.973104570632801, +0.000118545366625],
        [+0.000711560162668, +0.000046626403995, +0.999999745754024],
    ]
    matrix = itrs_from_gcrs(np.eye(3), tt, SimpleNamespace(earth_orientation=table)).T
    np.testing.assert_allclose(matrix, published, rtol=0, atol=1e-14)


def test_era_of_the_same_example():
    # Same source: UT1 JD 2454195.5 + 0.499999165813831 gives ERA 0.23245155366208 rad (from memory; 1e-12 rad).
    ut1 = (np.int64(count(2007, 4, 5, 11) + 3599), np.float64(1 - 0.072073685))
    assert era_rad(ut1) == pytest.approx(0.23245155366208, abs=1e-12)


def test_era00_vector():
    # ERFA t_erfa_c.c, era00(2400000.5, 54388.0) = 0.4022837240028158102 rad; its own tolerance 1e-12.
    midnight = np.int64((54388 - 51544) * 86400 - 43200)
    assert era_rad((midnight, np.float64(0.0))) == pytest.approx(0.4022837240028158102, abs=1e-12)


def test_series_and_table_reach_the_xys06a_vector():
    # ERFA t_erfa_c.c, xys06a(2400000.5, 53736.0). 2e-14 rad is what the table is made to (0.1 um on the ground).
    tt = (np.int64((53736 - 51544) * 86400 - 43200), np.float64(0.0))
    published = [0.5791308482835292617e-3, 0.4020580099454020310e-4, -0.1220032294164579896e-7]
    np.testing.assert_allclose(cip_table.series(tt), published, rtol=0, atol=1e-15)
    np.testing.assert_allclose(cip_table.cip(tt)[0], published, rtol=0, atol=2e-14)


def test_c2t06a_vector():
    # ERFA t_erfa_c.c, c2t06a at TT = UT1 = 2400000.5 + 53736.0. Its tolerance is 1e-12; c2t06a has no dX, dY.
    reference = held(ut1_minus_tai_s=32.184, x_rad=2.55060238e-7, y_rad=1.860359247e-6)
    tt = (np.int64((53736 - 51544) * 86400 - 43200), np.float64(0.0))
    published = [
        [-0.1810332128305897282, 0.9834769806938592296, 0.6555550962998436505e-4],
        [-0.9834768134136214897, -0.1810332203649130832, 0.5749800844905594110e-3],
        [0.5773474024748545878e-3, 0.3961816829632690581e-4, 0.9999998325501747785],
    ]
    np.testing.assert_allclose(itrs_from_gcrs(np.eye(3), tt, reference).T, published, rtol=0, atol=1e-12)


def orientation_of_pvtob(x_rad, y_rad, s_prime_rad, angle_rad):
    zero = np.float64(0.0)
    angle = np.float64(angle_rad + s_prime_rad)
    # pvtob turns at the rate of the Earth rotation angle, 1.00273781191135448 turns a day.
    rate = np.float64(2 * np.pi * 1.00273781191135448 / 86400)
    return Orientation(zero, zero, zero, zero, angle, rate, np.float64(x_rad), np.float64(y_rad), zero, zero)


def test_pvtob_vector():
    # ERFA t_erfa_c.c, pvtob(2.0, 0.5, 3000, 1e-6, -0.5e-6, 1e-8, 5.0): its tolerances 1e-5 m and 1e-9 m/s (1e-7 here,
    # because its rate constant of rotation is rounded to 1e-11).
    ground = erfa.gd2gc(1, 2.0, 0.5, 3000.0)
    r, v = orientation_of_pvtob(1e-6, -0.5e-6, 1e-8, 5.0).celestial_state(ground)
    np.testing.assert_allclose(r, [4225081.367071159207, 3681943.215856198144, 3041149.399241260785], rtol=0, atol=1e-5)
    np.testing.assert_allclose(v, [-268.4915389365998787, 308.0977983288903123, 0.0], rtol=0, atol=1e-7)


def test_pom00_vector():
    # ERFA t_erfa_c.c, pom00(2.55060238e-7, 1.860359247e-6, -0.1367174580728891460e-10): elements 11, 13, 23, tolerances
    # 1e-12 and 1e-16.
    o = orientation_of_pvtob(2.55060238e-7, 1.860359247e-6, -0.1367174580728891460e-10, 0.0)
    matrix = o.terrestrial(np.eye(3)).T
    assert matrix[0, 0] == pytest.approx(0.9999999999999674721, abs=1e-12)
    assert matrix[0, 2] == pytest.approx(0.2550602379999972345e-6, abs=1e-16)
    assert matrix[1, 2] == pytest.approx(-0.1860359246998866389e-5, abs=1e-16)


def test_table_against_the_series_over_a_century():
    # The issue of the table: 0.1 mm is asked for; 1e-13 rad (0.6 um) is what the last digits of the series allow.
    tt = counts(3000)
    value, rate = cip_table.cip(tt)
    np.testing.assert_allclose(value, cip_table.series(tt), rtol=0, atol=1e-13)
    hour = 3600
    slope = (cip_table.series((tt[0] + hour, tt[1])) - cip_table.series((tt[0] - hour, tt[1]))) / (2 * hour)
    # Rates reach 7e-12 rad/s; 2e-15 rad/s is 1e-8 m/s on the ground, the error of the difference over 2 h.
    np.testing.assert_allclose(rate, slope, rtol=0, atol=2e-15)


@pytest.mark.parametrize("year", [1850, 1959, 2061, 2200])
def test_outside_the_table_the_series_is_used(year):
    tt = (np.array([count(year, 3, 1), count(2000, 3, 1)]), np.array([0.25, 0.5]))
    value, rate = cip_table.cip(tt)
    np.testing.assert_array_equal(value[0], cip_table.series(tt)[0])
    np.testing.assert_array_equal(value[1], cip_table.cip((tt[0][1], tt[1][1]))[0])
    day = 8640
    slope = (cip_table.series((tt[0] + day, tt[1])) - cip_table.series((tt[0] - day, tt[1]))) / (2 * day)
    np.testing.assert_allclose(rate, slope, rtol=0, atol=1e-14)


def test_table_and_series_meet_at_the_ends():
    start_s, end_s = cip_table._table().span
    for edge in (int(start_s), int(end_s)):
        tt = (np.array([edge - 1, edge, edge + 1]), np.full(3, 0.5))
        np.testing.assert_allclose(cip_table.cip(tt)[0], cip_table.series(tt), rtol=0, atol=1e-13)
        rate = cip_table.cip(tt)[1]
        # 1e-14 rad/s is 6e-8 m/s on the ground.
        np.testing.assert_allclose(rate - rate[1], 0.0, rtol=0, atol=1e-14)


small = st.floats(-3e-6, 3e-6)  # 0.6 arcsec, the size of polar motion


@given(
    whole=st.integers(FIRST, LAST),
    fraction=st.floats(0, 1, exclude_max=True),
    ut1=st.floats(-60, -30),
    pole=st.tuples(small, small, small, small),
)
def test_against_the_matrices_of_pyerfa(whole, fraction, ut1, pole):
    names = ("x_rad", "y_rad", "dx_rad", "dy_rad")
    values = {"ut1_minus_tai_s": ut1, **dict(zip(names, pole, strict=True))}
    tt = (np.array([whole]), np.array([fraction]))
    matrix = erfa_celestial_to_terrestrial(tt, values)[0]
    # 2e-6 m: both sides round the Earth rotation angle to 1e-13 rad (0.1 mm is asked for).
    np.testing.assert_allclose(gcrs_from_itrs(POINT_M, tt, held(**values))[0], matrix.T @ POINT_M, rtol=0, atol=2e-6)
    np.testing.assert_allclose(itrs_from_gcrs(POINT_M, tt, held(**values))[0], matrix @ POINT_M, rtol=0, atol=2e-6)


@given(whole=st.integers(FIRST, LAST), fraction=st.floats(0, 1, exclude_max=True), pole=st.tuples(small, small))
def test_states_there_and_back(whole, fraction, pole):
    reference = held(ut1_minus_tai_s=-40.0, x_rad=pole[0], y_rad=pole[1])
    tt = (np.int64(whole), np.float64(fraction))
    v_m_s = np.array([120.0, -7000.0, 3.0])
    r, v = gcrs_state_from_itrs(POINT_M, v_m_s, tt, reference)
    back_r, back_v = itrs_state_from_gcrs(r, v, tt, reference)
    np.testing.assert_allclose(back_r, POINT_M, rtol=0, atol=1e-8)  # a few ulp of 5e6 m
    np.testing.assert_allclose(back_v, v_m_s, rtol=0, atol=1e-11)  # a few ulp of 7e3 m/s


def test_velocity_is_the_derivative_of_the_position():
    reference = held(ut1_minus_tai_s=-37.1, x_rad=1e-6, y_rad=2e-6, dx_rad=1e-9, dy_rad=-1e-9)
    tt = counts(500)
    _, v = gcrs_state_from_itrs(POINT_M, None, tt, reference)
    step = 60  # s; the sum below is the derivative to h^6 w^7 r / 140 = 1e-15 m/s, and to 1e-6 m / 60 s by rounding
    at = {k: gcrs_from_itrs(POINT_M, (tt[0] + k * step, tt[1]), reference) for k in (-3, -2, -1, 1, 2, 3)}
    slope = (45 * (at[1] - at[-1]) - 9 * (at[2] - at[-2]) + (at[3] - at[-3])) / (60 * step)
    # 1e-7 m/s: the rounding of the angle; precession and nutation themselves are 4e-5 m/s.
    np.testing.assert_allclose(v, slope, rtol=0, atol=1e-7)


def slope_of(position, tt, step):
    """Five-point difference of a function of TT counts."""
    at = {k: position((tt[0] + k * step, tt[1])) for k in (-2, -1, 1, 2)}
    return (8 * (at[1] - at[-1]) - (at[2] - at[-2])) / (12 * step)


def counts_inside_days(n, seed):
    """TT counts from 1962 to the last row before 2026-11, 10 minutes or more from 0h UTC, where two cubics meet."""
    random = np.random.default_rng(seed)
    whole, fraction = LeapSeconds.default().count_from_label(
        random.integers(37665, 61340, n), random.integers(600, 85800, n), random.random(n)
    )
    return whole + 64, fraction + 0.184


# 60 s: the five-point difference leaves h^4 w^5 r / 30 = 6e-9 m/s (w = 7.3e-5 rad/s, r = 6.4e6 m), and the rounding of
# the angle of rotation, some 3e-7 m, leaves 1e-8 m/s. The rate of UT1 is 2e-5 m/s, the drift of the pole 1e-6 m/s.
DIFFERENCE_M_S = 1e-7


def test_velocity_of_a_site_is_the_derivative_of_its_position_from_1962_to_2026():
    reference = SimpleNamespace(earth_orientation=EarthOrientation.default())
    tt = counts_inside_days(4000, 5)
    for place in (POINT_M, np.array([0.0, 1e5, 6.357e6]), np.array([6.378e6, 0.0, 0.0])):
        site = Site.from_itrf("somewhere", *place)
        _, v = site.gcrs(tt, reference)
        slope = slope_of(lambda at, site=site: site.gcrs(at, reference)[0], tt, 60)
        np.testing.assert_allclose(v, slope, rtol=0, atol=DIFFERENCE_M_S)


def test_velocity_relative_to_the_ground_is_the_derivative_from_1962_to_2026():
    reference = SimpleNamespace(earth_orientation=EarthOrientation.default())
    tt = counts_inside_days(2000, 6)
    # At rest on the GCRS axes, and seen from the ground.
    r, v = itrs_state_from_gcrs(POINT_M, np.zeros(3), tt, reference)
    slope = slope_of(lambda at: itrs_from_gcrs(POINT_M, at, reference), tt, 60)
    np.testing.assert_allclose(v, slope, rtol=0, atol=DIFFERENCE_M_S)
    back_r, back_v = gcrs_state_from_itrs(r, v, tt, reference)
    np.testing.assert_allclose(back_r, np.broadcast_to(POINT_M, r.shape), rtol=0, atol=1e-8)  # a few ulp of 5e6 m
    np.testing.assert_allclose(back_v, 0.0, rtol=0, atol=1e-11)  # a few ulp of 460 m/s, and 1e-12 of 1e-6 m/s


def test_the_length_of_day_is_in_the_speed_of_the_ground():
    # The IERS gives the excess length of day beside UT1 in its C04 rows. A point of the equator moves at the rate of
    # the Earth rotation angle, 7.2921151467064e-5 rad/s (IERS Conventions 2010, table 1.1), slowed down by LOD/86400 s;
    # precession and the drift of the pole move it along the axis and leave the speed alone.
    lines = [line.split() for line in Path(IERS_B_FILE).read_text().splitlines() if not line.startswith("#")]
    mjd, lod_s = np.array([[float(cells[4]), float(cells[12])] for cells in lines]).T
    assert lod_s.max() > 0.004  # 2e-5 m/s
    whole, fraction = LeapSeconds.default().count_from_label(mjd.astype(int), 0, 0.0)
    reference = SimpleNamespace(earth_orientation=EarthOrientation.default())
    _, v = Site.from_itrf("equator", 6378137.0, 0.0, 0.0).gcrs((whole + 64, fraction + 0.184), reference)
    off = np.linalg.norm(v, axis=-1) - 7.2921151467064e-5 * 6378137.0 * (1 - lod_s / 86400)
    # Their LOD is a smoothed derivative: 0.02 ms rms off the slope of the cubics (0.13 ms since 2000, 1.4 ms at most in
    # the noisy rows of the 1970s).
    assert np.sqrt(np.mean(off**2)) < 1.5e-7
    assert np.abs(off[mjd > 51544]).max() < 1e-6


def test_velocity_where_values_are_held_is_the_derivative_too():
    table = EarthOrientation.default()
    tt = (np.array([4102444800 - 946728000, 3000000000]), np.array([0.25, 0.5]))
    reference = SimpleNamespace(earth_orientation=table)
    with pytest.warns(ExtrapolationWarning, match="2 of 2 instants"):
        _, v = gcrs_state_from_itrs(POINT_M, None, tt, reference)
    with pytest.warns(ExtrapolationWarning, match="2 of 2 instants"):
        slope = slope_of(lambda at: gcrs_from_itrs(POINT_M, at, reference), tt, 60)
    np.testing.assert_allclose(v, slope, rtol=0, atol=DIFFERENCE_M_S)


def test_velocity_of_a_moving_point_is_the_derivative_of_its_position():
    reference = held(x_rad=1e-6, y_rad=-2e-6)
    tt, v_m_s, step = counts(50), np.array([10.0, 200.0, -70.0]), 10
    _, v = gcrs_state_from_itrs(POINT_M, v_m_s, tt, reference)
    at = {k: gcrs_from_itrs(POINT_M + k * step * v_m_s, (tt[0] + k * step, tt[1]), reference) for k in (-2, -1, 1, 2)}
    slope = (8 * (at[1] - at[-1]) - (at[2] - at[-2])) / (12 * step)
    np.testing.assert_allclose(v, slope, rtol=0, atol=1e-6)  # rounding of the angle, 1e-6 m over 10 s


def test_shapes_strides_and_input_left_alone():
    reference = held()
    whole, fraction = counts(12)
    tt = (whole.reshape(3, 4), fraction.reshape(3, 4))
    all_r = gcrs_from_itrs(POINT_M, tt, reference)
    assert all_r.shape == (3, 4, 3)
    points = np.asfortranarray(np.tile(POINT_M, (4, 1)))[::-1]
    keep = (points.copy(), whole.copy(), fraction.copy())
    np.testing.assert_array_equal(
        gcrs_from_itrs(points, (tt[0][:, ::2][:, :1], tt[1][:, :1]), reference)[:, 0], all_r[:, 0]
    )
    np.testing.assert_array_equal(gcrs_from_itrs(POINT_M, (tt[0][1, 2], tt[1][1, 2]), reference), all_r[1, 2])
    np.testing.assert_array_equal(
        gcrs_from_itrs(POINT_M, (int(tt[0][1, 2]), float(tt[1][1, 2])), reference), all_r[1, 2]
    )
    np.testing.assert_array_equal(
        gcrs_from_itrs(POINT_M, (tt[0][::2, ::-1], tt[1][::2, ::-1]), reference), all_r[::2, ::-1]
    )
    for kept, now in zip(keep, (points, whole, fraction), strict=True):
        np.testing.assert_array_equal(kept, now)


class SameOrientation(iers.IERS):
    """The held values in the form that astropy asks for."""

    def ut1_utc(self, jd1, jd2=0.0, return_status=False):
        return np.full(np.shape(jd1), 0.2) * u.s

    def pm_xy(self, jd1, jd2=0.0, return_status=False):
        shape = np.shape(jd1.jd1 if isinstance(jd1, Time) else jd1)
        return np.full(shape, 0.11) * u.arcsec, np.full(shape, 0.35) * u.arcsec, np.zeros(shape, dtype=int)


def test_site_vectors_against_astropy():
    days = np.array([51600, 53737, 55200, 57000, 60300])
    moment = Time(days, 0.3141, format="mjd", scale="tt")
    leap = (moment.tai.mjd - moment.utc.mjd) * 86400
    tt = (np.int64(days - 51544) * 86400 - 43200 + 27138, np.full(5, 0.24))
    with iers.earth_orientation_table.set(SameOrientation()):
        moment.delta_ut1_utc = 0.2
        r, v = EarthLocation.from_geocentric(*POINT_M, unit=u.m).get_gcrs_posvel(moment)
    for index in range(5):
        reference = held(ut1_minus_tai_s=0.2 - np.round(leap[index]), x_rad=0.11 * ARCSEC, y_rad=0.35 * ARCSEC)
        mine = gcrs_state_from_itrs(POINT_M, None, (tt[0][index], tt[1][index]), reference)
        # 0.1 mm in position: astropy passes through its CIRS frame with the same series, and has no dX, dY.
        np.testing.assert_allclose(mine[0], r[index].xyz.to_value(u.m), rtol=0, atol=1e-4)
        # 1e-4 m/s in velocity: astropy leaves out precession and nutation (up to 5e-5 m/s).
        np.testing.assert_allclose(mine[1], v[index].xyz.to_value(u.m / u.s), rtol=0, atol=1e-4)


def test_real_orientation_against_pyerfa():
    # C04 from the astropy-iers-data package at its nodes 0h UTC: 2006-01-15 and 2017-01-01.
    for mjd, tai_minus_utc, ut1_minus_utc, x, y in (
        (53750, 33, 0.3341036, 0.049146, 0.380119),
        (57754, 37, 0.5912870, None, None),
    ):
        orientation_table = EarthOrientation.default()
        tai = (np.array([(mjd - 51544) * 86400 - 43200 + tai_minus_utc]), np.array([0.0]))
        tt = (tai[0] + 32, tai[1] + 0.184)
        at = orientation_table.at(tai)
        values = {name: getattr(at, name)[0] for name in ("ut1_minus_tai_s", "x_rad", "y_rad", "dx_rad", "dy_rad")}
        assert values["ut1_minus_tai_s"] == pytest.approx(ut1_minus_utc - tai_minus_utc, abs=1e-7)  # last printed digit
        if x is not None:
            assert values["x_rad"] == pytest.approx(x * ARCSEC, abs=1e-6 * ARCSEC)  # last printed digit
            assert values["y_rad"] == pytest.approx(y * ARCSEC, abs=1e-6 * ARCSEC)
        matrix = erfa_celestial_to_terrestrial(tt, values)[0]
        mine = gcrs_from_itrs(POINT_M, tt, SimpleNamespace(earth_orientation=orientation_table))[0]
        np.testing.assert_allclose(mine, matrix.T @ POINT_M, rtol=0, atol=2e-6)  # rounding of the rotation angle


@pytest.mark.parametrize("bad", [5.0, [1.0, 2.0], np.ones((3, 2))])
def test_wrong_axis(bad):
    with pytest.raises(InvalidInput, match="last axis"):
        gcrs_from_itrs(bad, (0, 0.0), held())


def test_not_finite():
    with pytest.raises(InvalidInput, match="not finite") as caught:
        itrs_from_gcrs([[1.0, 2.0, np.nan], [1.0, 2.0, 3.0]], (0, 0.0), held())
    assert caught.value.mask.tolist() == [True, False]


def test_rate_of_the_angle_is_its_derivative():
    # With the drift of the origins in it: that of s reaches 1e-14 rad/s (6e-8 m/s on the ground, less than the
    # differences of positions above show). Over 4 h the angle rounds by 1e-14 rad of 1e4 s: 1e-18 rad/s.
    random = np.random.default_rng(12)
    whole, fraction = LeapSeconds.default().count_from_label(
        random.integers(41317, 61340, 400), random.integers(15000, 71000, 400), random.random(400)
    )
    reference = SimpleNamespace(earth_orientation=EarthOrientation.default())
    tt, mean = (whole + 64, fraction + 0.184), 2 * np.pi * 1.00273781191135448 / 86400
    step = 7200

    def turned(k):
        # What the angle has gained on an even rotation, without its whole turns.
        ahead = orientation((tt[0] + k * step, tt[1]), reference).angle_rad - now.angle_rad - mean * (k * step)
        return (ahead + np.pi) % (2 * np.pi) - np.pi

    now = orientation(tt, reference)
    slope = (8 * (turned(1) - turned(-1)) - (turned(2) - turned(-2))) / (12 * step)
    np.testing.assert_allclose(now.angle_rate_rad_s - mean, slope, rtol=0, atol=1e-15)
    s_rate = cip_table.cip(tt)[1][:, 2]
    assert 5e-15 < np.abs(s_rate).max() < 5e-14
