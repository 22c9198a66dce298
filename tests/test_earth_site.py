"""Sites and geodetic coordinates."""

import dataclasses
import pickle

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tscale.earth import Observer, Site, geocentric_from_geodetic, geodetic_from_geocentric
from tscale.errors import DataFileError, InvalidInput

from .earth_support import held


@pytest.mark.parametrize(
    ("ellipsoid", "published"),
    [
        # ERFA t_erfa_c.c, gd2gc(e=3.1, p=-0.5, h=2500), tolerance 1e-7 m there; 2e-7 m here for the degrees between.
        ("WGS84", [-5599000.5577049947, 233011.67223479203, -3040909.4706983363]),
        ("GRS80", [-5599000.5577260984, 233011.6722356702949, -3040909.4706095476]),
    ],
)
def test_gd2gc_vector(ellipsoid, published):
    got = geocentric_from_geodetic(np.degrees(3.1), np.degrees(-0.5), 2500.0, ellipsoid)
    np.testing.assert_allclose(got, published, rtol=0, atol=2e-7)


def test_gc2gd_vector():
    # ERFA t_erfa_c.c, gc2gd of (2e6, 3e6, 5.244e6) m on WGS84: tolerances 1e-14 rad and 1e-8 m.
    lon, lat, height = geodetic_from_geocentric([2e6, 3e6, 5.244e6])
    assert lon == pytest.approx(np.degrees(0.9827937232473290680), abs=1e-12)
    assert lat == pytest.approx(np.degrees(0.97160184819075459), abs=1e-12)
    assert height == pytest.approx(331.4172461426059892, abs=1e-8)


def test_site_of_the_sofa_time_scale_example():
    # SOFA, Time Scale and Calendar Tools, worked example (Hawaii); x, y, z by ERFA gd2gc, 1e-6 m.
    site = Site.from_geodetic("hawaii", -(155 + 55 / 60 + 59.6 / 3600), 19 + 28 / 60 + 52.5 / 3600, 0.0)
    expected = [-5492333.306498737, -2453018.5089117205, 2113645.653406073]
    np.testing.assert_allclose(site.position_m, expected, rtol=0, atol=1e-6)


@given(lon=st.floats(-179.9, 179.9), lat=st.floats(-90, 90), height=st.floats(-500, 9000))
def test_geodetic_there_and_back(lon, lat, height):
    site = Site.from_geodetic("there", lon, lat, height)
    # 1e-8 m of height, and 1e-7 m along the ground: a few ulp of the coordinates.
    assert site.height_m == pytest.approx(height, abs=2e-8)
    assert site.lat_deg == pytest.approx(lat, abs=1e-12)
    if abs(lat) < 89.9:
        assert site.lon_deg == pytest.approx(lon, abs=1e-10)


@pytest.mark.parametrize("lat", [90.0, -90.0])
def test_the_poles(lat):
    site = Site.from_geodetic("pole", 25.0, lat, 2800.0)
    assert site.lat_deg == pytest.approx(lat, abs=1e-12)
    assert site.height_m == pytest.approx(2800.0, abs=1e-8)
    r, v = site.gcrs((np.int64(0), np.float64(0.0)), held(x_rad=1e-6))
    # At the pole only polar motion (1e-6 rad of 6.4e6 m) and precession move the ground: below a mm/s.
    assert np.linalg.norm(v) < 1e-3
    assert np.linalg.norm(r) == pytest.approx(np.linalg.norm(site.position_m), abs=1e-8)


def test_arrays_of_geodetic_positions_keep_their_shape():
    lon, lat = np.meshgrid([0.0, 90.0, -120.0], [-45.0, 10.0])
    xyz = geocentric_from_geodetic(lon, lat, 100.0)
    assert xyz.shape == (2, 3, 3)
    for back, given_value in zip(geodetic_from_geocentric(xyz), (lon, lat, 100.0), strict=True):
        np.testing.assert_allclose(back, np.broadcast_to(given_value, (2, 3)), rtol=0, atol=1e-8)


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ((10.0, 90.001, 0.0), "lat_deg within"),
        ((361.0, 0.0, 0.0), "lon_deg"),
        ((10.0, 0.0, np.nan), "height_m must be finite"),
        ((np.inf, 0.0, 0.0), "lon_deg must be finite"),
        ((10.0, "20", 0.0), "lat_deg must be a number"),
    ],
)
def test_geodetic_out_of_range(arguments, words):
    with pytest.raises(InvalidInput, match=words):
        Site.from_geodetic("bad", *arguments)


def test_out_of_range_arrays_carry_the_mask():
    with pytest.raises(InvalidInput) as caught:
        geocentric_from_geodetic([0.0, 0.0], [91.0, 0.0], 0.0)
    assert caught.value.mask.tolist() == [True, False]
    with pytest.raises(InvalidInput) as caught:
        geodetic_from_geocentric([[np.nan, 0.0, 0.0], [7e6, 0.0, 0.0]])
    assert caught.value.mask.tolist() == [True, False]
    with pytest.raises(InvalidInput, match="last axis"):
        geodetic_from_geocentric(3.0)
    with pytest.raises(InvalidInput, match="WGS84, GRS80"):
        geodetic_from_geocentric([7e6, 0.0, 0.0], "bessel")


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"position_m": (6378.0, 0.0, 0.0)}, "kilometres"),
        ({"position_m": (0.0, 0.0, 0.0)}, "metres"),
        ({"position_m": (42e6, 0.0, 0.0)}, "Trajectory"),
        ({"position_m": (np.nan, 0.0, 0.0)}, "position_m must be finite"),
        ({"position_m": (6.4e6, 0.0)}, "three numbers"),
        ({"position_m": 6.4e6}, "three numbers"),
        ({"velocity_m_yr": (20.0, 0.0, 0.0)}, "mm/yr"),
        ({"epoch_jyear": 51544.5}, "1900 to 2200"),
        ({"epoch_jyear": "2010-01-01"}, "must be a number"),
        ({"name": ""}, "name"),
        ({"name": 3}, "name"),
        ({"name": "two\nlines"}, "printable"),
        ({"geopotential_number_m2_s2": np.inf}, "finite"),
        ({"height_above_geoid_m": True}, "number"),
    ],
)
def test_bad_sites(change, words):
    good = {"name": "x", "position_m": (6.378e6, 0.0, 0.0)}
    Site(**good)
    with pytest.raises(InvalidInput, match=words):
        Site(**(good | change))


def test_site_is_a_frozen_value_and_an_observer():
    site = Site.from_itrf("a", 6378000, 0, 0)
    assert site == Site.from_itrf("a", 6378000.0, 0.0, 0.0)
    assert hash(site) == hash(pickle.loads(pickle.dumps(site)))
    assert isinstance(site, Observer)
    with pytest.raises(dataclasses.FrozenInstanceError):
        site.name = "b"


def test_velocity_carries_the_position_from_its_epoch():
    site = Site.from_itrf("a", 6378000, 0, 0, velocity_m_yr=(0.0, 0.05, -0.02), epoch_jyear=2010.0)
    ten_years = (np.array([10 * 31557600, 20 * 31557600]), np.array([0.0, 0.0]))
    # 2010.0 and 2020.0: a Julian year is 31557600 s; 1e-9 m is one ulp of the coordinates.
    np.testing.assert_allclose(site.itrf_at(ten_years), [[6378000, 0, 0], [6378000, 0.5, -0.2]], rtol=0, atol=1e-9)
    fixed = Site.from_itrf("b", 6378000, 0.5, -0.2)
    later = (ten_years[0][1], ten_years[1][1])
    np.testing.assert_allclose(site.gcrs(later, held())[0], fixed.gcrs(later, held())[0], rtol=0, atol=1e-8)
    assert fixed.itrf_at(ten_years).shape == (2, 3)


def test_site_file_round_trip(tmp_path):
    site = Site.from_itrf(
        'Tern "Rock" \\ Süd',
        -4052051.8 + 1 / 3,
        4212836.1,
        -2545106.0,
        velocity_m_yr=(-0.04, -5e-5, 0.05),
        epoch_jyear=2015.0,
        frame="ITRF2020",
        geopotential_number_m2_s2=1840.5,
        height_above_geoid_m=-1e-7,
    )
    site.save(tmp_path / "site.toml")
    assert Site.load(tmp_path / "site.toml") == site
    assert [p.name for p in tmp_path.iterdir()] == ["site.toml"]


def test_site_file_with_geodetic_coordinates(tmp_path):
    path = tmp_path / "site.toml"
    path.write_text('[site]\nname = "Tern Rock"\ngeodetic = { lon_deg = 133.88, lat_deg = -23, height_m = 189.3 }\n')
    assert Site.load(path) == Site.from_geodetic("Tern Rock", 133.88, -23.0, 189.3)


ITRF = "itrf = { x_m = 6378000, y_m = 0, z_m = 0 }\n"


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("", r"no \[site\]"),
        ("[site\n", "not TOML"),
        ("[place]\n", "unknown key place in the file; allowed are site"),
        (f"[site]\n{ITRF}", "needs a name"),
        ('[site]\nname = "a"\n', "exactly one of itrf"),
        (f'[site]\nname = "a"\n{ITRF}geodetic = {{}}\n', "exactly one of itrf"),
        (f'[site]\nname = "a"\nheight = 3\n{ITRF}', "unknown key height .* allowed are name, itrf, geodetic"),
        ('[site]\nname = "a"\nitrf = { x_m = 6378000, y_m = 0 }\n', "itrf needs all of x_m, y_m, z_m"),
        ('[site]\nname = "a"\nitrf = { x_m = 6378000, y_m = 0, z_m = 0, w = 1 }\n', "unknown key w in itrf"),
        ('[site]\nname = "a"\nitrf = { x_m = 6378, y_m = 0, z_m = 0 }\n', "kilometres"),
        (f'[site]\nname = "a"\nvelocity_m_yr = 3\n{ITRF}', "three numbers"),
        (f"[site]\nname = 7\n{ITRF}", "printable"),
    ],
)
def test_bad_site_files(tmp_path, text, words):
    path = tmp_path / "site.toml"
    path.write_text(text)
    with pytest.raises(DataFileError, match=words) as caught:
        Site.load(path)
    assert caught.value.path == path


def test_bad_toml_names_the_line(tmp_path):
    path = tmp_path / "site.toml"
    path.write_text('[site]\nname = "a"\nitrf = {\n')
    with pytest.raises(DataFileError) as caught:
        Site.load(path)
    assert caught.value.row == 3 or caught.value.row is None  # the parser names no line at the end of the text
    path.write_text("[site]\nname = \nitrf = 1\n")
    with pytest.raises(DataFileError) as caught:
        Site.load(path)
    assert caught.value.row == 2


def test_missing_site_file(tmp_path):
    with pytest.raises(DataFileError, match="cannot read"):
        Site.load(tmp_path / "none.toml")


def test_a_height_above_the_geoid_that_no_site_has():
    with pytest.raises(InvalidInput, match=r"height_above_geoid_m is 60000.0; .*-12000 to 50000 m"):
        Site.from_geodetic("a", 10.0, 50.0, 100.0, height_above_geoid_m=6e4)
