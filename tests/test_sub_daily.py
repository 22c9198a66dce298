"""Tidal variations of Earth orientation within a day: the IERS's values, its routine spelt out, and what they do."""

from __future__ import annotations

import csv
import pickle
import warnings
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

import tscale
from tscale import exact
from tscale.errors import DataFileError
from tscale.tables import EarthOrientation, sub_daily_lines
from tscale.tables.sub_daily import sub_daily_terms
from tscale.tables.sub_daily_lines import ocean_lines, sub_daily_series, ut1_libration_lines
from tscale.transforms.terrestrial import tai_to_ut1, ut1_to_tai

UAS = np.pi / 648000e6
DATA = Path(sub_daily_lines.__file__).with_name("data")
PLAIN = EarthOrientation.default()
WITH = PLAIN.with_sub_daily()
# Most of the span of the table: 1965-02 to 2025-05.
FIRST_S, LAST_S = -1_100_000_000, 800_000_000


def of_lines(lines, mjd):
    angle = lines.angle_of(np.array([mjd - 51544.5]))
    return (np.cos(angle) @ lines.amplitude.real - np.sin(angle) @ lines.amplitude.imag)[0]


def some_dates(count, seed=7):
    rng = np.random.default_rng(seed)
    return rng.integers(FIRST_S, LAST_S, count), rng.random(count)


def test_ocean_tides_at_the_check_date():
    # IERS Conventions (2010), chapter 8 software, ORTHO_EOP, test case MJD 47100: (uas, uas, us). 1e-8: angles of 1e5
    # rad, rounded to 1.5e-11 there, times 160 uas.
    published = np.array([-162.8386373279636530, 117.7907525842668974, -23.39092370609808214])
    np.testing.assert_allclose(of_lines(ocean_lines(), 47100.0) / [UAS, UAS, 1e-6], published, rtol=0, atol=1e-8)


@pytest.mark.parametrize(("mjd", "published"), [(44239.1, 2.441143834386761746), (55227.4, -2.655705844335680244)])
def test_libration_at_the_check_dates(mjd, published):
    # IERS Conventions (2010), chapter 5 software for Table 5.1b, its two test cases (us). 3e-8 us: a rounding of its
    # sidereal time to 1e-8 rad.
    value = of_lines(ut1_libration_lines(), mjd)
    assert value[2] * 1e6 == pytest.approx(published, abs=3e-8)
    assert value[:2].tolist() == [0.0, 0.0]


def test_the_routine_spelt_out():
    """Sample the potential at three dates and weight it, as the conventions' routine does, without any shortcut."""
    with (DATA / "iers2010_orthoweights.csv").open() as file:
        rows = list(csv.reader(line for line in file if not line.startswith("#")))[1:]
    weights = {row[0]: [float(v) for v in row[1:] if v] for row in rows}
    lines = np.loadtxt(DATA / "iers2010_tidal_lines.csv", delimiter=",", skiprows=3)
    assert len(lines) == 71
    days = np.array([-20000.25, -5000.0, -0.125, 0.0, 12345.678, 18000.5])

    def potential(mjd, order):
        mine = lines[lines[:, 1] == order]
        angle = mine[:, 3] + mine[:, 4] * (mjd - 37076.5) - (np.pi / 2 if order == 1 else 0.0)
        return (mine[:, 2] * np.cos(angle)).sum(), -(mine[:, 2] * np.sin(angle)).sum()

    for day in days:
        factors = []
        for order in (1, 2):
            sp = weights[f"sp_order{order}"]
            (a, b), (a_later, b_later), (a_before, b_before) = (
                potential(51544.5 + day + shift, order) for shift in (0.0, -2.0, 2.0)
            )
            factors += [sp[0] * a, sp[0] * b]
            factors += [sp[1] * a - sp[2] * (a_later + a_before), sp[1] * b - sp[2] * (b_later + b_before)]
            factors += [
                sp[3] * a - sp[4] * (a_later + a_before) + sp[5] * (b_later - b_before),
                sp[3] * b - sp[4] * (b_later + b_before) - sp[5] * (a_later - a_before),
            ]
        expected = [np.dot(weights[which], factors) for which in ("x", "y", "ut1")]
        got = of_lines(ocean_lines(), 51544.5 + day) / [UAS, UAS, 1e-6]
        # 1e-6 uas or us: angles of 5e5 rad are rounded to 1e-10 rad here.
        np.testing.assert_allclose(got, expected, rtol=0, atol=1e-6)


def test_the_table_is_the_series():
    whole, fraction = some_dates(3000)
    # Both sides of the edges of pages (4096 days) and records (half a day).
    edges = np.concatenate([np.arange(-3, 4) * 4096 * 86400, 43200 * np.arange(-50, 50)])
    whole = np.concatenate([whole, edges, edges - 1])
    fraction = np.concatenate([fraction, np.zeros(edges.size), np.full(edges.size, np.nextafter(1.0, 0.0))])
    values, _ = sub_daily_terms((whole, fraction))
    # 1e-14 s and 1e-6 uas: the days of the series are float64, 2e-12 d.
    error = values - np.moveaxis(sub_daily_series((whole + fraction) / 86400), -1, 0)
    assert np.abs(error[:2]).max() < 1e-6 * UAS
    assert np.abs(error[2]).max() < 1e-14


def test_the_table_has_no_steps():
    edges = 43200 * np.arange(-40000, 40000)
    before, _ = sub_daily_terms((edges - 1, np.full(edges.size, np.nextafter(1.0, 0.0))))
    after, _ = sub_daily_terms((edges, np.zeros(edges.size)))
    # 0.01 fs of UT1, 1e-18 rad of the pole: UT1 closes to 1 fs over these edges.
    assert np.abs(after - before)[2].max() < 1e-17
    assert np.abs(after - before)[:2].max() < 1e-18


def test_rates_are_derivatives():
    whole, fraction = some_dates(2000)
    step = 120
    differences = [sub_daily_terms((whole + k * step, fraction))[0] for k in (-2, -1, 1, 2)]
    slope = (8 * (differences[2] - differences[1]) - (differences[3] - differences[0])) / (12 * step)
    rates = sub_daily_terms((whole, fraction))[1]
    # Truncation (w h)^4 / 30 = 3e-9 of 7e-9; rounding of the differences 1e-17 s / 120 s.
    assert np.abs(slope - rates)[2].max() < 1e-16
    assert np.abs(slope - rates)[:2].max() < 1e-20
    assert np.abs(rates[2]).max() > 5e-9


def test_shapes_and_inputs():
    whole, fraction = some_dates(24)
    kept = whole.copy(), fraction.copy()
    values, rates = sub_daily_terms((whole.reshape(2, 3, 4), fraction.reshape(2, 3, 4)))
    assert values.shape == rates.shape == (3, 2, 3, 4)
    strided = sub_daily_terms((whole[::2], fraction[::2]))
    np.testing.assert_array_equal(strided[0], values.reshape(3, -1)[:, ::2])
    one = sub_daily_terms((whole[5], fraction[5]))
    assert one[0].shape == (3,)
    np.testing.assert_array_equal(one[1], rates.reshape(3, -1)[:, 5])
    assert sub_daily_terms((whole[:0], fraction[:0]))[0].shape == (3, 0)
    np.testing.assert_array_equal(np.stack(kept), np.stack((whole, fraction)))


def test_a_damaged_installation_is_named(monkeypatch, tmp_path):
    monkeypatch.setattr(sub_daily_lines, "_FOLDER", tmp_path)
    with pytest.raises(DataFileError, match="install the package again") as caught:
        sub_daily_lines._rows("iers2010_tidal_lines.csv")
    assert caught.value.path == tmp_path / "iers2010_tidal_lines.csv"
    (tmp_path / "iers2010_tidal_lines.csv").write_text("# nothing\nhead\n")
    with pytest.raises(DataFileError, match="empty"):
        sub_daily_lines._rows("iers2010_tidal_lines.csv")


# ---- the option of Earth orientation ---------------------------------------------------------------


def test_values_are_the_plain_ones_and_the_terms():
    tai = some_dates(2000)
    plain, tidal = PLAIN.at(tai), WITH.at(tai)
    terms, rates = sub_daily_terms(exact.add_seconds(tai, plain.ut1_minus_tai_s))
    # 7e-15 s: one rounding of 32 s; the pole is rounded to 1e-22 rad.
    np.testing.assert_allclose(tidal.ut1_minus_tai_s - plain.ut1_minus_tai_s, terms[2], rtol=0, atol=1e-14)
    np.testing.assert_allclose(tidal.x_rad - plain.x_rad, terms[0], rtol=0, atol=1e-21)
    np.testing.assert_allclose(tidal.y_rad - plain.y_rad, terms[1], rtol=0, atol=1e-21)
    for name in tidal._fields[3:]:
        np.testing.assert_array_equal(getattr(tidal, name), getattr(plain, name))
    motion, still = WITH.motion(tai), PLAIN.motion(tai)
    for name in motion._fields[:5]:
        np.testing.assert_array_equal(getattr(motion, name), getattr(tidal, name))
    # The rounding of rates of 4e-8 and 1e-14.
    np.testing.assert_allclose(motion.ut1_minus_tai_rate - still.ut1_minus_tai_rate, rates[2], rtol=0, atol=1e-22)
    np.testing.assert_allclose(motion.x_rate_rad_s - still.x_rate_rad_s, rates[0], rtol=0, atol=1e-27)
    np.testing.assert_array_equal(WITH.status(tai), PLAIN.status(tai))
    np.testing.assert_allclose(WITH.ut1_minus_tai_s(tai), motion.ut1_minus_tai_s, rtol=0, atol=1e-14)
    # ut1_rate works the cubic out in another order than motion: 1e-16 of 4e-8.
    np.testing.assert_allclose(WITH.ut1_rate(tai), motion.ut1_minus_tai_rate, rtol=0, atol=1e-22)


def test_size_of_the_terms():
    # IERS Conventions (2010), 8.2: "below the milliarcsecond level", UT1 within 0.1 ms (from memory).
    terms, _ = sub_daily_terms(some_dates(20000))
    assert 0.5e-3 < np.abs(terms[:2]).max() / UAS * 1e-6 < 1.0e-3
    assert 60e-6 < np.abs(terms[2]).max() < 100e-6


def test_the_table_says_what_is_in_it():
    assert (PLAIN.sub_daily, WITH.sub_daily) == (False, True)
    assert WITH.with_sub_daily() is WITH
    assert WITH.name == f"{PLAIN.name} + sub-daily tides"
    assert WITH.sha256 != PLAIN.sha256
    assert len(WITH.sha256) == 64
    assert WITH.sha256 == PLAIN.with_sub_daily().sha256
    assert (WITH.span, WITH.issued, WITH.path) == (PLAIN.span, PLAIN.issued, PLAIN.path)
    reference = tscale.ReferenceData.default()
    tidal = reference.replace(earth_orientation=WITH)
    assert tidal.fingerprint != reference.fingerprint
    assert "Earth orientation" in [f.table for f in tidal.describe() if f.name == WITH.name]
    copy = pickle.loads(pickle.dumps(WITH))
    assert (copy.sub_daily, copy.sha256) == (True, WITH.sha256)
    tai = some_dates(10)
    np.testing.assert_array_equal(copy.at(tai).ut1_minus_tai_s, WITH.at(tai).ut1_minus_tai_s)


def test_past_the_end_the_tides_go_on():
    late = (np.array([1_000_000_000, 1_000_020_000]), np.zeros(2))
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", tscale.ExtrapolationWarning)
        plain, tidal = PLAIN.motion(late), WITH.motion(late)
        assert WITH.at(late).status.tolist() == [2, 2]
        np.testing.assert_array_equal(WITH.at(late).ut1_sigma_s, PLAIN.at(late).ut1_sigma_s)
    assert plain.ut1_minus_tai_rate.tolist() == [0.0, 0.0]
    assert np.all(tidal.ut1_minus_tai_rate != 0.0)
    assert np.ptp(tidal.ut1_minus_tai_s) > 1e-6
    with pytest.raises(tscale.TscaleError, match="sub-daily"):
        WITH.ut1_minus_tai(late)


def test_no_jump_at_a_leap_second():
    # 2016-12-31T23:59:60 UTC is the TAI count 536500836; the terms change by up to 7e-9 s in a second.
    tai = (np.array([536500834, 536500835, 536500836, 536500837, 536500838]), np.zeros(5))
    bends = np.diff(WITH.ut1_minus_tai_s(tai) - PLAIN.ut1_minus_tai_s(tai), 2)
    # They bend by up to 1e-12 s per second squared; a leap in the argument would show as 1e-9 s.
    assert np.abs(bends).max() < 2e-12


@given(whole=st.integers(FIRST_S, LAST_S), fraction=st.floats(0.0, 1.0, exclude_max=True))
def test_ut1_closes_both_ways(whole, fraction):
    for there, back, scale in ((tai_to_ut1, ut1_to_tai, "TAI"), (ut1_to_tai, tai_to_ut1, "UT1")):
        t = tscale.Instants.from_seconds(whole, fraction, scale=scale)
        again = back(there(t, WITH), WITH)
        assert abs(float(exact.seconds(exact.subtract(again.pair, t.pair)))) < 1e-15


@given(record=st.integers(FIRST_S // 43200, LAST_S // 43200), near_s=st.floats(-1e-9, 1e-9))
def test_ut1_closes_at_the_edges_of_the_table(record, near_s):
    ut1 = tscale.Instants.from_seconds(43200 * record, 0.0, scale="UT1").shifted(near_s)
    again = tai_to_ut1(ut1_to_tai(ut1, WITH), WITH)
    assert abs(float(exact.seconds(exact.subtract(again.pair, ut1.pair)))) < 1e-15


def test_ut1_of_a_chain(reference):
    t = tscale.Instants.from_iso(["1999-05-06T07:08:09.5", "2020-02-03T04:05:06"], scale="UTC")
    tidal = reference.replace(earth_orientation=WITH)
    with_terms, without = (tscale.chain("UTC", "UT1", reference=r)(t) for r in (tidal, reference))
    terms, _ = sub_daily_terms(without.pair)
    np.testing.assert_allclose(with_terms.minus(without), terms[2], rtol=0, atol=2e-16)
    assert np.abs(terms[2]).min() > 1e-6
    back = tscale.chain("UTC", "UT1", reference=tidal).inverse(with_terms)
    assert np.abs(back.minus(t)).max() < 1e-15


# ---- what they do to a site ------------------------------------------------------------------------

SITE = tscale.Site.from_geodetic("Kestrel Ridge", lon_deg=127.3518, lat_deg=-26.1473, height_m=612.4)


def test_a_site_moves_by_centimetres(reference):
    tt = some_dates(20000)
    tidal = reference.replace(earth_orientation=WITH)
    (r, v), (r0, v0) = SITE.gcrs(tt, tidal), SITE.gcrs(tt, reference)
    shift = np.linalg.norm(r - r0, axis=-1)
    # 0.09 ms of UT1 are 1.3 mas, and the pole's 0.9 mas: 4 cm and 3 cm of a radius of 6.4e6 m, never at one time.
    assert 0.025 < shift.max() < 0.045
    assert 0.005 < np.sqrt(np.mean(shift**2)) < 0.02
    # The rate of UT1 is 7e-9: 3e-6 m/s of 420 m/s.
    assert 1e-6 < np.linalg.norm(v - v0, axis=-1).max() < 1e-5


def test_the_velocity_of_a_site_is_the_derivative_of_its_position(reference):
    whole, fraction = some_dates(500)
    tidal = reference.replace(earth_orientation=WITH)
    step = 1200

    def shift(k):
        tt = (whole + k * step, fraction)
        return SITE.gcrs(tt, tidal)[0] - SITE.gcrs(tt, reference)[0]

    slope = (8 * (shift(1) - shift(-1)) - (shift(2) - shift(-2))) / (12 * step)
    drift = SITE.gcrs((whole, fraction), tidal)[1] - SITE.gcrs((whole, fraction), reference)[1]
    # The rotation angle is rounded to 1e-13 rad, 0.6 um: 1e-9 m/s in the slope; 1 % of the terms would be 3e-8 m/s.
    np.testing.assert_allclose(drift, slope, rtol=0, atol=3e-9)


def test_the_wavefront_of_a_star_moves_by_a_tenth_of_a_nanosecond(reference):
    t = tscale.Instants.from_seconds(*some_dates(4000), scale="UTC")
    star = tscale.Source(ra_deg=187.2519, dec_deg=-12.6408)
    tidal = reference.replace(earth_orientation=WITH)
    with_terms, without = (
        tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=star, reference=r) for r in (tidal, reference)
    )
    change = with_terms(t).minus(without(t))
    # 3 cm are 0.1 ns.
    assert 0.06e-9 < np.abs(change).max() < 0.15e-9
    assert with_terms.notes(t) == without.notes(t)
    # Uncertainties are those of the table's rows; sensitivities change by 1e-8.
    for line in ("Earth orientation, UT1", "Earth orientation, pole"):
        sigma_s, plain_s = with_terms.uncertainty_s(t)[line], without.uncertainty_s(t)[line]
        np.testing.assert_allclose(sigma_s, plain_s, rtol=1e-6, atol=1e-16)
        assert np.min(sigma_s) > 0.0
    back = with_terms.inverse(with_terms(t[:200]))
    assert np.abs(back.minus(t[:200].at("TOPOCENTER"))).max() < 1e-14
