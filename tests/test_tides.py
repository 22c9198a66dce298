"""Solid Earth tide of a site: published cases, the physics worked out another way, and what it does to a signal."""

from __future__ import annotations

import pickle
from types import SimpleNamespace

import numpy as np
import pytest

import tscale
from tscale import Site, exact
from tscale.constants import C_M_S
from tscale.earth.rotation import gcrs_from_itrs, itrs_from_gcrs
from tscale.earth.tides import solid_tide_m
from tscale.earth.tides_lines import line_sums, line_sums_table
from tscale.errors import DataFileError, InvalidInput, OutOfSpan
from tscale.tables import EarthOrientation

KESTREL = {"lon_deg": 127.3518, "lat_deg": -26.1473, "height_m": 612.4}
STILL = Site.from_geodetic("Kestrel Ridge", **KESTREL)
MOVED = Site.from_geodetic("Kestrel Ridge", **KESTREL, solid_tide=True)


def some_dates(count, seed=3):
    """From 1965 to 2025."""
    rng = np.random.default_rng(seed)
    return rng.integers(-1_100_000_000, 800_000_000, count), rng.random(count)


def tide_m(tt, reference, site=MOVED, still=STILL):
    return site.gcrs(tt, reference)[0] - still.gcrs(tt, reference)[0]


# IERS Conventions (2010), chapter 7 software, two test cases of the routine for the tide of a station (from memory):
# station, Sun, Moon in the terrestrial system, m; 0h UTC of the day; TAI-UTC, s; displacement, m.
CASES = [
    (
        (4075578.385, 931852.890, 4801570.154),
        (137859926952.015, 54228127881.4350, 23509422341.6960),
        (-179996231.920342, -312468450.131567, -169288918.592160),
        (2009, 4, 13, 34),
        (0.07700420357108125891, 0.06304056321824967613, 0.05516568152597246810),
    ),
    (
        (1112189.660, -4842955.026, 3985352.284),
        (-54537460436.2357, 130244288385.279, 56463429031.5996),
        (300396716.912, 243238281.451, 120548075.939),
        (2012, 7, 13, 35),
        (-0.02036831479592075833, 0.05658254776225972449, -0.07597679676871742227),
    ),
]


def counts_of(date):
    year, month, day, leap = date
    days = (np.datetime64(f"{year}-{month:02d}-{day:02d}") - np.datetime64("2000-01-01")).astype(int)
    start = np.int64(86400 * days - 43200)
    return (start + leap + 32, np.float64(0.184)), (start, np.float64(0.0))


@pytest.mark.parametrize(("station", "sun", "moon", "date", "published"), CASES)
def test_published_displacements(station, sun, moon, date, published):
    # 1e-15 m: printed to more digits than a float64 holds, and the same formulas.
    np.testing.assert_allclose(solid_tide_m(station, moon, sun, *counts_of(date)), published, rtol=0, atol=1e-15)


def test_many_places_and_dates_at_once():
    pairs = [counts_of(case[3]) for case in CASES]
    tt, ut1 = ((np.array([p[k][0] for p in pairs]), np.array([p[k][1] for p in pairs])) for k in (0, 1))
    stations, suns, moons = (np.array([case[k] for case in CASES]) for k in (0, 1, 2))
    kept = stations.copy()
    both = solid_tide_m(stations, moons, suns, tt, ut1)
    np.testing.assert_allclose(both, [case[4] for case in CASES], rtol=0, atol=1e-15)
    every = solid_tide_m(stations[:, np.newaxis], moons, suns, tt, ut1)
    assert every.shape == (2, 2, 3)
    np.testing.assert_allclose(every[[0, 1], [0, 1]], both, rtol=0, atol=1e-17)
    np.testing.assert_array_equal(stations, kept)


@pytest.mark.parametrize(
    ("change", "words"),
    [({0: (1.0, 2.0)}, "place"), ({1: (np.nan, 1.0, 1.0)}, "Moon"), ({2: (0.0, 0.0, 0.0)}, "Sun"), ({0: 3.0}, "place")],
)
def test_bad_vectors(change, words):
    vectors = {0: CASES[0][0], 1: CASES[0][2], 2: CASES[0][1]} | change
    with pytest.raises(InvalidInput, match=words):
        solid_tide_m(*vectors.values(), *counts_of(CASES[0][3]))


# ---- a site ----------------------------------------------------------------------------------------


def test_a_site_is_moved_by_the_published_formulas(reference):
    whole, fraction = tt = some_dates(1500)
    tai = exact.subtract(tt, (32, 0.184))
    ut1 = exact.add(tai, reference.earth_orientation.ut1_minus_tai(tai))
    moon, sun = (itrs_from_gcrs(reference.ephemeris.position(b, tt, "earth"), tt, reference) for b in ("moon", "sun"))
    expected = gcrs_from_itrs(solid_tide_m(STILL.position_m, moon, sun, tt, ut1), tt, reference)
    # The site takes the pole of rotation for that of the ITRS, 0.5 arcsec or 2.5e-6 rad of 0.35 m: 1 um.
    np.testing.assert_allclose(tide_m(tt, reference), expected, rtol=0, atol=1.5e-6)
    assert whole.shape == fraction.shape == expected.shape[:-1]


def test_lines_from_the_table():
    whole, fraction = some_dates(3000)
    edges = 43200 * np.concatenate([np.arange(-5, 5), 4096 * np.arange(-3, 4)])
    whole, fraction = np.concatenate([whole, edges, edges - 1]), np.concatenate([fraction, np.zeros(2 * edges.size)])
    day = (whole + fraction) / 86400
    # The cubics of half a day: 10 nm in the worst of the six sums.
    np.testing.assert_allclose(
        line_sums_table((whole, fraction)), line_sums(day, day - 60 / 86400), rtol=0, atol=1.5e-8
    )
    # TN36 section 7.1.1: 1.3 cm radially at K1, the largest correction of all (12.0 and 1.7 mm in step).
    assert 0.012 < np.hypot(*line_sums(day, day)[:2]).max() < 0.018


def test_the_velocity_is_the_derivative_of_the_position(reference):
    whole, fraction = some_dates(1000)
    step = 600

    def tide(k):
        return tide_m((whole + k * step, fraction), reference)

    slope = (8 * (tide(1) - tide(-1)) - (tide(2) - tide(-2))) / (12 * step)
    drift = MOVED.gcrs((whole, fraction), reference)[1] - STILL.gcrs((whole, fraction), reference)[1]
    # The slow part of single lines and the Sun's uneven pace are left out of the rate: 5e-9 m/s.
    np.testing.assert_allclose(drift, slope, rtol=0, atol=8e-9)
    assert 1.5e-5 < np.linalg.norm(drift, axis=-1).max() < 5e-5


def test_the_vertical_is_that_of_the_tidal_potential(reference):
    """h W/g with the potential of two point masses, less its value and slope at the geocentre: nothing expanded."""
    tt = some_dates(2000)
    r, _ = STILL.gcrs(tt, reference)
    potential = np.zeros(len(r))
    for body in ("moon", "sun"):
        d = reference.ephemeris.position(body, tt, "earth")
        gm, far = reference.ephemeris.gm_m3_s2(body), np.linalg.norm(d, axis=-1)
        # 1/|d - r| - 1/d without the loss of nine digits, then less the linear part.
        near = np.linalg.norm(d - r, axis=-1)
        dot, square = (d * r).sum(-1), (r * r).sum(-1)
        potential += gm * ((2 * dot - square) / (near * far * (near + far)) - dot / far**3)
    up = r / np.linalg.norm(r, axis=-1)[:, np.newaxis]
    height = (tide_m(tt, reference) * up).sum(-1)
    radius, gm_earth = np.linalg.norm(STILL.position_m), reference.ephemeris.gm_m3_s2("earth")
    expected = 0.6078 * potential / (gm_earth / radius**2)
    # Left out of h W/g: 12 mm times sin(2 lat) at K1, 1 mm of lag, 2 mm of degree 3 (half its h), 0.2 mm by latitude.
    assert np.abs(height - expected).max() < 0.016
    assert np.std(height - expected) < 0.1 * np.std(height)
    assert 0.3 < height.max() < 0.4


@pytest.mark.parametrize("lat_deg", [-90.0, -35.0, 0.0, 60.0])
def test_the_permanent_part_is_in(reference, lat_deg):
    """Mean over one turn of the Moon's node, against the permanent tide of the conventions."""
    still = Site.from_geodetic("mean", 15.0, lat_deg, 0.0)
    moved = Site.from_geodetic("mean", 15.0, lat_deg, 0.0, solid_tide=True)
    days = 6798.38  # the node's period
    count = np.linspace(-6e8, -6e8 + days * 86400, 40000, endpoint=False)
    whole = np.floor(count).astype(np.int64)
    tt = (whole, count - whole)
    tide = itrs_from_gcrs(tide_m(tt, reference, moved, still), tt, reference).mean(axis=0)
    x, y, z = np.array(still.position_m) / np.linalg.norm(still.position_m)
    p2, lat, lon = 1.5 * z * z - 0.5, np.arcsin(z), np.radians(15.0)
    up, north = np.array([x, y, z]), np.array([-z * np.cos(lon), -z * np.sin(lon), np.cos(lat)])
    # IERS Conventions (2010), eqs. 7.14a and 7.14b (from memory). 0.3 mm: periods that do not close in 18.6 years.
    assert tide @ up == pytest.approx((-0.1206 + 0.0001 * p2) * p2, abs=3e-4)
    assert tide @ north == pytest.approx((-0.0252 - 0.0001 * p2) * np.sin(2 * lat), abs=3e-4)


def test_shapes(reference):
    whole, fraction = some_dates(24)
    r, v = MOVED.gcrs((whole, fraction), reference)
    shaped = MOVED.gcrs((whole.reshape(2, 3, 4), fraction.reshape(2, 3, 4)), reference)
    assert shaped[0].shape == shaped[1].shape == (2, 3, 4, 3)
    np.testing.assert_array_equal(shaped[0].reshape(-1, 3), r)
    strided = MOVED.gcrs((whole[::3], fraction[::3]), reference)
    # Vectors of another length may be summed in another order: one ulp of the position.
    np.testing.assert_allclose(strided[1], v[::3], rtol=0, atol=1e-12)
    one = MOVED.gcrs((whole[7], fraction[7]), reference)
    assert one[0].shape == (3,)
    np.testing.assert_allclose(one[0], r[7], rtol=0, atol=2e-9)
    assert MOVED.gcrs((whole[:0], fraction[:0]), reference)[0].shape == (0, 3)
    mixed = MOVED.gcrs((whole[:, np.newaxis], fraction[:2]), reference)
    assert mixed[1].shape == (24, 2, 3)
    # More dates than are worked on at a time.
    many = MOVED.gcrs((np.repeat(whole, 400), np.repeat(fraction, 400)), reference)
    np.testing.assert_allclose(many[0][::400], r, rtol=0, atol=2e-9)


def test_a_site_on_a_moving_plate(reference):
    motion = {"velocity_m_yr": (0.03, -0.02, 0.05), "epoch_jyear": 2000.0}
    still = Site.from_geodetic("plate", **KESTREL, **motion)
    moved = Site.from_geodetic("plate", **KESTREL, **motion, solid_tide=True)
    tt = some_dates(300)
    # 2 m of plate motion turn the tide by 3e-7 rad; positions are rounded to 1e-9 m.
    np.testing.assert_allclose(tide_m(tt, reference, moved, still), tide_m(tt, reference), rtol=0, atol=3e-7)
    np.testing.assert_array_equal(moved.itrf_at(tt), still.itrf_at(tt))


def test_a_kernel_without_the_barycentre_of_earth_and_moon(reference):
    full = reference.ephemeris
    bare = SimpleNamespace(bodies=(10, 301, 399), state=full.state, position=full.position)
    tables = SimpleNamespace(earth_orientation=reference.earth_orientation, ephemeris=bare)
    tt = some_dates(300)
    for usual, other in zip(MOVED.gcrs(tt, reference), MOVED.gcrs(tt, tables), strict=True):
        # The mass of the Moon in Earths differs by 1e-9: 5 mm at the Earth; positions are rounded to 1e-9 m.
        np.testing.assert_allclose(usual, other, rtol=0, atol=3e-9)


def test_beyond_the_ephemeris(reference):
    held = EarthOrientation.constant(start_mjd=41317, end_mjd=88000)
    far = tscale.ReferenceData(earth_orientation=held)
    tt = (np.array([0, 2_500_000_000]), np.zeros(2))
    assert STILL.gcrs(tt, far)[0].shape == (2, 3)
    with pytest.raises(OutOfSpan) as caught:
        MOVED.gcrs(tt, far)
    assert caught.value.mask.tolist() == [False, True]
    with pytest.raises(OutOfSpan, match="Earth orientation"):
        MOVED.gcrs((np.array([-2_000_000_000]), np.zeros(1)), reference)


def test_the_option_is_kept(tmp_path):
    assert STILL.solid_tide is False
    assert MOVED != STILL
    for site in (STILL, MOVED):
        site.save(tmp_path / "site.toml")
        assert ("solid_tide = true" in (tmp_path / "site.toml").read_text()) == site.solid_tide
        assert Site.load(tmp_path / "site.toml") == site
        assert pickle.loads(pickle.dumps(site)) == site
    assert Site.from_itrf("x", *STILL.position_m, solid_tide=True).solid_tide
    with pytest.raises(InvalidInput, match="solid_tide is True or False, got 'yes'"):
        Site.from_itrf("x", *STILL.position_m, solid_tide="yes")
    path = tmp_path / "site.toml"
    path.write_text(path.read_text().replace("= true", "= 1"))
    with pytest.raises(DataFileError, match="True or False") as caught:
        Site.load(path)
    assert caught.value.path == path


# ---- what it does to a signal ----------------------------------------------------------------------


def test_thirty_centimetres_are_a_nanosecond(reference):
    """The wavefront of a star overhead meets a raised site earlier, so that more is added on to the barycentre."""
    whole, fraction = some_dates(4000)
    height = np.linalg.norm(MOVED.gcrs((whole, fraction), reference)[0], axis=-1) - np.linalg.norm(STILL.position_m)
    k = int(np.argmax(height))
    t = tscale.Instants.from_seconds(whole[k], fraction[k], scale="TT")
    r, _ = STILL.gcrs(t.pair, reference)
    x, y, z = r / np.linalg.norm(r)
    star = tscale.Source(ra_deg=float(np.degrees(np.arctan2(y, x))) % 360, dec_deg=float(np.degrees(np.arcsin(z))))
    late, early = (
        tscale.chain("TT", "TDB@BARYCENTER", site=s, source=star, reference=reference)(t) for s in (MOVED, STILL)
    )
    gain_s = float(late.minus(early))
    assert height[k] > 0.3
    # The rounding of a barycentric position, 1.5e-5 m, is 0.05 ps; v.d/c^2 of the topocentric term 0.1 ps.
    assert gain_s == pytest.approx(height[k] / C_M_S, abs=3e-13)
    assert 1.0e-9 < gain_s < 1.3e-9


def test_a_link_feels_it(reference):
    t = tscale.Instants.from_iso("2021-12-04T03:00:00", scale="UTC")
    shift = {}
    for site in (STILL, MOVED):
        solution = tscale.link.one_way(receive=t, receiver=site, transmitter="moon", reference=reference)
        shift[site.solid_tide] = float(solution.light_time_s)
    tt = tscale.chain("UTC", "TT", reference=reference)(t).pair
    toward = reference.ephemeris.position("moon", tt, "earth") - STILL.gcrs(tt, reference)[0]
    expected = -(tide_m(tt, reference) @ (toward / np.linalg.norm(toward))) / C_M_S
    # The Moon moves on by 1 km during the light time, 3e-6 rad; light times close to 0.1 ps.
    assert shift[True] - shift[False] == pytest.approx(expected, abs=3e-13)
    assert abs(expected) > 1e-10


def test_to_the_barycentre_and_back(reference):
    star = tscale.Source(ra_deg=187.2519, dec_deg=-12.6408)
    chain = tscale.chain("UTC", "TDB@BARYCENTER", site=MOVED, source=star, reference=reference)
    t = tscale.Instants.from_seconds(*some_dates(500), scale="UTC")
    assert np.abs(chain.inverse(chain(t)).minus(t.at("TOPOCENTER"))).max() < 1e-14
