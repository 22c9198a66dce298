"""Surface sites: the rotation of the Moon, Mars, Mercury and Venus, against almanac examples and older elements."""

from __future__ import annotations

import math
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import tscale
from tscale import Instants, errors
from tscale.body_shape import ROTATIONS
from tscale.constants import C_M_S
from tscale.link import SurfaceSite, one_way

J2000 = Instants.from_seconds(0, 0.0, scale="TDB")


def facing(body: str, target: str, t: Instants, light_s: float = 0.0) -> tuple[float, float]:
    """East longitude and planetocentric latitude (deg) of the point that has `target` in its zenith."""
    ephemeris = tscale.Ephemeris.default()
    then = t.shifted(-light_s).pair
    axes = [SurfaceSite("axis", body, lon, lat).up(then) for lon, lat in ((0.0, 0.0), (90.0, 0.0), (0.0, 90.0))]
    line = ephemeris.position(target, t.pair) - ephemeris.position(body, then)
    x, y, z = (float(np.sum(axis * line)) for axis in axes)
    return math.degrees(math.atan2(y, x)), math.degrees(math.asin(z / float(np.linalg.norm(line))))


def test_libration_of_the_moon() -> None:
    # Meeus, Astronomical Algorithms (1998), example 53.a, from memory: 1992 April 12, 0h TD, total libration
    # l = -1.23, b = +4.20 degrees. 0.05 degrees: his axes are those of the older libration theory (0.02 to 0.03).
    lon, lat = facing("moon", "earth", Instants.from_iso("1992-04-12T00:00:00", scale="TDB"), 1.28)
    assert lon == pytest.approx(-1.23, abs=0.05)
    assert lat == pytest.approx(4.20, abs=0.05)


def test_the_moon_keeps_its_face_to_the_earth() -> None:
    # Greatest libration 7.9 degrees in longitude (8.2 with the diurnal part), 6.9 in latitude; its mean is nil.
    t = Instants.from_seconds(np.arange(0, 18 * 365) * 86400, 0.0, scale="TDB")
    points = np.array([facing("moon", "earth", t[i]) for i in range(0, t.size, 7)])
    assert 7.0 < np.max(np.abs(points[:, 0])) < 8.2
    assert 6.3 < np.max(np.abs(points[:, 1])) < 7.1
    assert np.all(np.abs(points.mean(axis=0)) < 0.2)


def test_mars_in_the_almanac() -> None:
    # Meeus (1998), example 42.a, from memory: 1992 November 9, 0h UT: D_E = +12.44, D_S = -2.76, central meridian
    # 111.55 degrees west. His pole and meridian are those of the report of 1982: 0.03 degrees.
    t = Instants.from_iso("1992-11-09T00:00:59", scale="TDB")
    ephemeris = tscale.Ephemeris.default()
    light_s = float(np.linalg.norm(ephemeris.position("mars", t.pair) - ephemeris.position("earth", t.pair))) / C_M_S
    lon, lat = facing("mars", "earth", t, light_s)
    assert (-lon) % 360.0 == pytest.approx(111.55, abs=0.05)
    assert lat == pytest.approx(12.44, abs=0.03)
    # Towards the Sun the light has yet to come, which moves it by less than 0.01 degrees.
    assert facing("mars", "sun", t.shifted(-light_s))[1] == pytest.approx(-2.76, abs=0.03)


@pytest.mark.parametrize(
    ("body", "pole_deg", "meridian_deg", "day_deg"),
    [
        # Elements at J2000 of the reports of 2006 (Seidelmann et al. 2007, Celest. Mech. 98, 155), from memory.
        (1, (281.01, 61.45), 329.548, 6.1385025),
        (2, (272.76, 67.16), 160.20, -1.4813688),
        (4, (317.68143, 52.88650), 176.630, 350.89198226),
    ],
)
def test_elements_against_the_older_report(
    body: int, pole_deg: tuple[float, float], meridian_deg: float, day_deg: float
) -> None:
    rotation = ROTATIONS[body]
    zero = np.zeros(())
    assert math.degrees(float(rotation.ra.at(zero)[0])) == pytest.approx(pole_deg[0], abs=0.002)
    assert math.degrees(float(rotation.dec.at(zero)[0])) == pytest.approx(pole_deg[1], abs=0.04)
    # Mercury's meridian was moved by 0.06 degrees with the radar librations.
    assert math.degrees(float(rotation.w.at(zero)[0])) == pytest.approx(meridian_deg, abs=0.07)
    a, b = (math.degrees(float(rotation.w.at(np.asarray(day))[0])) for day in (0.0, 1.0))
    assert (b - a - day_deg + 180.0) % 360.0 - 180.0 == pytest.approx(0.0, abs=2e-3)


def test_mercury_turns_three_times_in_two_years() -> None:
    # At every perihelion one of the "hot poles" at longitudes 0 and 180 degrees faces the Sun, in turn.
    t = Instants.from_seconds(np.arange(0, 4 * 88 * 24) * 3600, 0.0, scale="TDB")
    place = tscale.Ephemeris.default().position("mercury", t.pair, center="sun")
    r = np.linalg.norm(place, axis=-1)
    nearest = np.flatnonzero((r[1:-1] < r[:-2]) & (r[1:-1] < r[2:])) + 1
    longitudes = [facing("mercury", "sun", t[i])[0] for i in nearest]
    assert len(longitudes) == 4
    turned = [(lon + 90.0) % 180.0 - 90.0 for lon in longitudes]
    assert np.all(np.abs(turned) < 0.5)
    assert np.all(np.abs(np.diff(np.unwrap(np.radians(longitudes)))) > 3.0)


@pytest.mark.parametrize(("body", "speed_m_s"), [("mars", 240.7), ("moon", 4.6), ("venus", 1.8), ("mercury", 3.0)])
def test_velocity_is_the_derivative(body: str, speed_m_s: float) -> None:
    # Equatorial speeds 2 pi R / period: handbook values to their last digit.
    site = SurfaceSite("place", body, 25.0, 0.0)
    t = J2000.shifted(np.array([0.3, 8.7e7, -4.4e8]))
    step = 64.0
    before, after = site.offset(t.shifted(-step).pair)[0], site.offset(t.shifted(step).pair)[0]
    _, v = site.offset(t.pair)
    # w^2 step^2 / 6 of the speed for Mars, 1e-9 m of rounding over 128 s.
    assert np.max(np.abs((after - before) / (2 * step) - v)) < 1e-3
    assert np.allclose(np.linalg.norm(v, axis=-1), speed_m_s, rtol=0, atol=0.06)


def test_heights_on_the_ellipsoid() -> None:
    # Mars, WGCCRE 2015: equatorial radius 3396.19 km, polar 3376.20 km.
    assert np.linalg.norm(SurfaceSite("a", "mars", 10.0, 0.0).offset(J2000.pair)[0]) == pytest.approx(
        3396190.0, abs=1e-6
    )
    assert np.linalg.norm(SurfaceSite("a", 4, 0.0, 90.0, 50.0).offset(J2000.pair)[0]) == pytest.approx(
        3376250.0, abs=1e-6
    )
    site = SurfaceSite("a", "moon", 30.0, 40.0, 1000.0)
    assert np.allclose(site.offset(J2000.pair)[0], 1738400.0 * site.up(J2000.pair), rtol=0, atol=1e-8)


def test_state_is_the_centre_plus_the_contracted_offset(reference: tscale.ReferenceData) -> None:
    site = SurfaceSite("a", "mars", 30.0, 40.0)
    t = J2000.shifted(np.arange(50) * 4.0e6)
    x, v = site.state_bcrs(t.pair, reference)
    centre, speed = reference.ephemeris.state("mars", t.pair)
    difference = np.linalg.norm(x - centre, axis=-1) - np.linalg.norm(site.offset(t.pair)[0], axis=-1)
    # R V^2 / 2 c^2 = 11 to 15 mm when the radius lies along the motion of Mars, never longer; 3e-5 m of rounding.
    assert np.all(difference < 1e-4)
    assert -0.016 < difference.min() < -0.008
    assert np.allclose(v - speed, site.offset(t.pair)[1], rtol=0, atol=1e-11)


def test_link_from_the_moon_is_dated_in_utc(reference: tscale.ReferenceData) -> None:
    lander = SurfaceSite("Basalt Step", "moon", 5.0, 10.0)
    t = Instants.from_iso(["2024-03-01T00:00:00", "2024-03-09T12:00:00"], scale="UTC")
    found = one_way(transmit=t, transmitter=lander, receiver="earth", reference=reference)
    # There and back by two passes over the Moon's own place in the relation: a few femtoseconds.
    assert np.max(np.abs(found.transmit_on("UTC").minus(t))) < 5e-15
    assert np.all((found.light_time_s > 1.18) & (found.light_time_s < 1.36))
    assert found.transmit_elevation_deg is not None
    assert np.all(found.transmit_elevation_deg > 60.0)


@pytest.mark.parametrize(
    "wrong",
    [
        {"name": ""},
        {"body": "earth"},
        {"body": "jupiter"},
        {"body": "vulcan"},
        {"lon_deg": 361.0},
        {"lat_deg": float("nan")},
        {"lat_deg": -91},
        {"height_m": 2e5},
        {"height_m": "12"},
        {"lon_deg": True},
    ],
)
def test_wrong_places_are_refused(wrong: dict[str, Any]) -> None:
    with pytest.raises(errors.InvalidInput):
        SurfaceSite(**{"name": "a", "body": "moon", "lon_deg": 0.0, "lat_deg": 0.0, **wrong})


def test_file(tmp_path: Path) -> None:
    path = tmp_path / "camp.toml"
    path.write_text(
        '[surface]\nname = "Ochre Camp"\nbody = "mars"\nlon_deg = 137.4\nlat_deg = -4.6\nheight_m = -4500\n'
    )
    assert SurfaceSite.load(path) == SurfaceSite("Ochre Camp", "mars", 137.4, -4.6, -4500.0)
    for text in ("nonsense", "[surface]\nname = 'a'\n", "[site]\nname = 'a'\n"):
        path.write_text(text)
        with pytest.raises(errors.DataFileError) as caught:
            SurfaceSite.load(path)
        assert caught.value.path == path
    path.write_text('[surface]\nname = "a"\nbody = "mars"\nlon_deg = 0\nlat_deg = 0\nspin = 1\n')
    with pytest.raises(errors.DataFileError, match="spin"):
        SurfaceSite.load(path)
    path.write_text('[surface]\nname = "a"\nbody = "mars"\nlon_deg = 0\nlat_deg = 99\n')
    with pytest.raises(errors.DataFileError, match="lat_deg"):
        SurfaceSite.load(path)
    with pytest.raises(errors.DataFileError, match="nowhere"):
        SurfaceSite.load(tmp_path / "nowhere.toml")
