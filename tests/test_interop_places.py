"""Sites, sources and quantities from and to astropy, against astropy's own coordinates and units."""

from __future__ import annotations

import pickle
from collections.abc import Callable
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest
from astropy import units as u
from astropy.coordinates import AltAz, Angle, Distance, EarthLocation, SkyCoord
from astropy.time import Time, TimeDelta
from hypothesis import given
from hypothesis import strategies as st

import tscale
from tscale.errors import InvalidInput
from tscale.interop import from_astropy, metres, seconds, to_astropy

SITE = tscale.Site.from_itrf("Heron Fen", -3949312.107, 3402411.622, -3664703.19)
STAR = tscale.Source(
    ra_deg=187.2519,
    dec_deg=-12.6408,
    pm_ra_cosdec_mas_yr=-41.7,
    pm_dec_mas_yr=18.3,
    parallax_mas=6.2,
    epoch="2016-01-01T00:00:00",
    name="Lantern",
)


# ---- EarthLocation -------------------------------------------------------------------------------


def test_a_location_is_a_site_to_the_bit() -> None:
    location = EarthLocation.from_geocentric(*(x * u.m for x in SITE.position_m))
    ours = from_astropy(location, name="Heron Fen")
    assert isinstance(ours, tscale.Site)
    assert ours == SITE
    back = to_astropy(ours)
    assert [float(x.to_value(u.m)) for x in (back.x, back.y, back.z)] == list(SITE.position_m)
    assert back.info.name == "Heron Fen"
    assert from_astropy(back) == SITE


@given(
    lon=st.floats(-180.0, 180.0), lat=st.floats(-90.0, 90.0), height=st.floats(-400.0, 9000.0)
)  # the range of the ground
def test_geodetic_coordinates_agree(lon: float, lat: float, height: float) -> None:
    # Both take WGS84: astropy by ERFA's gd2gc, ours by its own closed form. An ulp of pi, as a longitude, is 3e-9 m.
    theirs = EarthLocation.from_geodetic(lon * u.deg, lat * u.deg, height * u.m)
    ours = tscale.Site.from_geodetic("here", lon_deg=lon, lat_deg=lat, height_m=height)
    assert np.max(np.abs(np.subtract(from_astropy(theirs).position_m, ours.position_m))) < 1e-8


def test_kilometres_are_no_trap() -> None:
    location = EarthLocation.from_geocentric(-3949.312107 * u.km, 3402.411622 * u.km, -3664.70319 * u.km)
    assert np.allclose(from_astropy(location).position_m, SITE.position_m, rtol=0.0, atol=1e-9)


def test_what_is_no_site() -> None:
    with pytest.raises(InvalidInput, match="take them one by one"):
        from_astropy(EarthLocation.from_geodetic([1.0, 2.0] * u.deg, [3.0, 4.0] * u.deg))
    with pytest.raises(InvalidInput, match="0 m from the geocentre"):
        from_astropy(EarthLocation.from_geocentric(0.0, 0.0, 0.0, unit=u.m))


# ---- SkyCoord ------------------------------------------------------------------------------------


def test_a_source_goes_there_and_back() -> None:
    coord = to_astropy(STAR)
    assert coord.frame.name == "icrs"
    assert coord.obstime.scale == "tdb"
    assert (float(coord.ra.deg), float(coord.dec.deg)) == (STAR.ra_deg, STAR.dec_deg)
    back = from_astropy(coord)
    assert back.name == "Lantern"
    assert (back.ra_deg, back.dec_deg) == (STAR.ra_deg, STAR.dec_deg)
    # Through astropy's velocity in other units, or 1/(1/x) in parsec: two roundings.
    assert back.pm_ra_cosdec_mas_yr == pytest.approx(-41.7, rel=4e-16, abs=0.0)
    assert back.pm_dec_mas_yr == pytest.approx(18.3, rel=4e-16, abs=0.0)
    assert back.parallax_mas == pytest.approx(6.2, rel=4e-16, abs=0.0)
    assert tscale.Instants.from_iso(back.epoch, scale="TDB") == tscale.Instants.from_iso(STAR.epoch, scale="TDB")


def test_the_same_direction_decades_later(reference: tscale.ReferenceData) -> None:
    # Astropy's space motion (ERFA pmsafe) against our straight line, over 20 years. Both are straight lines; pmsafe
    # adds the light-time effect of the motion, of the order of v/c of it: 20 yr * 46 mas/yr * 1e-4 < 0.1 mas.
    later = Time("2036-01-01T00:00:00", scale="tdb")
    theirs = to_astropy(STAR).apply_space_motion(new_obstime=later).cartesian.xyz.to_value(u.pc)
    ours = STAR.direction(from_astropy(later).pair)
    theirs = theirs / np.linalg.norm(theirs)
    assert np.degrees(np.linalg.norm(ours - theirs)) * 3600e3 < 0.1
    moved = np.degrees(np.linalg.norm(ours - STAR.direction(tscale.Instants.from_iso(STAR.epoch, "TDB").pair))) * 3600e3
    assert moved == pytest.approx(20.0 * np.hypot(41.7, 18.3), rel=1e-3, abs=0.0)


def test_other_frames_are_turned_by_astropy() -> None:
    # The north galactic pole of J2000 in ICRS: 192.859508 and 27.128336 deg (The Hipparcos Catalogue, ESA SP-1200,
    # vol. 1, eq. 1.5.9: the numbers that define it there).
    pole = from_astropy(SkyCoord(l=0.0 * u.deg, b=90.0 * u.deg, frame="galactic"))
    assert pole.ra_deg == pytest.approx(192.85948, rel=0.0, abs=3e-5)
    assert pole.dec_deg == pytest.approx(27.12825, rel=0.0, abs=1e-4)
    # Proper motion turns along, and keeps its size.
    there = to_astropy(STAR).galactic
    back = from_astropy(there)
    assert np.hypot(back.pm_ra_cosdec_mas_yr, back.pm_dec_mas_yr) == pytest.approx(
        np.hypot(41.7, 18.3), rel=1e-12, abs=0.0
    )
    assert (back.ra_deg, back.dec_deg) == pytest.approx((187.2519, -12.6408), rel=1e-13, abs=0.0)


def test_catalogue_epochs() -> None:
    # An epoch in TCB, as Gaia's catalogues state it: its TDB label is 16 s behind.
    coord = SkyCoord(
        10.0 * u.deg,
        20.0 * u.deg,
        pm_ra_cosdec=1 * u.mas / u.yr,
        pm_dec=0 * u.mas / u.yr,
        obstime=Time(2016.0, format="jyear", scale="tcb"),
    )
    ours = tscale.Instants.from_iso(from_astropy(coord).epoch, scale="TDB")
    wanted = tscale.chain("TCB@BARYCENTER", "TDB@BARYCENTER")(
        tscale.Instants.from_iso("2016-01-01T12:00:00", scale="TCB")
    )
    assert abs(ours.at("BARYCENTER").minus(wanted)) < 1e-4  # astropy's jyear is a float64: 20 us; a text of 9 decimals
    assert from_astropy(SkyCoord(1 * u.deg, 2 * u.deg), epoch="2015-06-01").epoch == "2015-06-01"
    assert from_astropy(SkyCoord(1 * u.deg, 2 * u.deg)).parallax_mas == 0.0


def test_what_is_no_source() -> None:
    rate = {"pm_ra_cosdec": 1 * u.mas / u.yr, "pm_dec": 2 * u.mas / u.yr}
    with pytest.raises(InvalidInput, match="no obstime"):
        from_astropy(SkyCoord(1 * u.deg, 2 * u.deg, **rate))
    assert from_astropy(SkyCoord(1 * u.deg, 2 * u.deg, **rate), epoch="2020-01-01").pm_dec_mas_yr == 2.0
    dated = Time("2020-01-01", scale="tdb")
    with pytest.raises(InvalidInput, match="epoch= has no place"):
        from_astropy(SkyCoord(1 * u.deg, 2 * u.deg, obstime=dated), epoch="2020-01-01")
    away = SkyCoord(1 * u.deg, 2 * u.deg, distance=10 * u.pc, radial_velocity=12 * u.km / u.s, obstime=dated, **rate)
    with pytest.raises(InvalidInput, match="radial velocity of 12 km/s"):
        from_astropy(away)
    dropped = from_astropy(away, drop_radial_velocity=True)
    assert dropped.parallax_mas == pytest.approx(100.0, rel=1e-14, abs=0.0)
    with pytest.raises(InvalidInput, match="take them one by one"):
        from_astropy(SkyCoord([1, 2] * u.deg, [3, 4] * u.deg))
    with pytest.raises(InvalidInput, match="into ICRS"):
        from_astropy(SkyCoord(alt=10 * u.deg, az=20 * u.deg, frame=AltAz()))
    with pytest.raises(InvalidInput, match="to_astropy writes"):
        to_astropy("a star")  # type: ignore[arg-type]


def test_a_distance_is_a_parallax() -> None:
    coord = SkyCoord(1 * u.deg, 2 * u.deg, distance=Distance(parallax=768.5 * u.mas))
    ours = from_astropy(coord, name="near")
    # 1 pc is 648000/pi au (IAU 2015 Resolution B2, note 4).
    assert ours.distance_m == pytest.approx(coord.distance.to_value(u.m), rel=1e-14, abs=0.0)
    assert ours.name == "near"


# ---- Quantity ------------------------------------------------------------------------------------


def test_quantities() -> None:
    assert metres([1.0, 2.0] * u.km).tolist() == [1000.0, 2000.0]
    assert seconds(3 * u.min) == 180.0
    assert tscale.Site.from_itrf("Heron Fen", *metres(np.array(SITE.position_m) * u.m)) == SITE
    for wrong in (3.0, 3 * u.m):
        with pytest.raises(InvalidInput):
            seconds(wrong)
    with pytest.raises(InvalidInput, match="no unit"):
        metres(12.0)
    with pytest.raises(InvalidInput, match="NaN or infinite"):
        metres(np.nan * u.m)
    with pytest.raises(InvalidInput, match="got a date"):
        seconds(Time("2020-01-01"))


@given(first=st.integers(-(10**6), 10**6), second=st.floats(-0.5, 0.5, allow_nan=False))
def test_time_deltas_are_exact(first: int, second: float) -> None:
    delta = TimeDelta(float(first), second, format="jd")
    whole, fraction = seconds(delta)
    exact = (Fraction(float(delta.jd1)) + Fraction(float(delta.jd2))) * 86400
    assert abs(Fraction(int(whole)) + Fraction(float(fraction)) - exact) <= Fraction(2, 10**16)


def test_units_are_not_dropped_on_the_way() -> None:
    t = tscale.Instants.from_iso("2025-01-01T00:00:00", scale="TT")
    assert t.shifted(3 * u.min) == t.shifted(180.0)
    assert t + 1 * u.day == t.shifted(86400.0)
    assert t - 2 * u.ms == t.shifted(-0.002)
    assert tscale.Instants.from_seconds(5 * u.day) == tscale.Instants.from_seconds(432000)
    assert tscale.Instants.from_mjd(60000 * u.day, 6 * u.hour, "TT") == tscale.Instants.from_mjd(60000, 0.25, "TT")
    with pytest.raises(InvalidInput, match="cannot be given in s"):
        t.shifted(3 * u.m)
    with pytest.raises(InvalidInput, match="timedelta64"):
        t.shifted(np.timedelta64(3, "m"))
    with pytest.raises(InvalidInput):
        tscale.Trajectory.from_kepler(t, 7000 * u.km, 0.0, 1.0, 2.0, 3.0, 4.0)


def test_sites_and_sources_of_quantities() -> None:
    plain = tscale.Site.from_itrf(
        "x",
        6371000.0,
        1500.0,
        0.0,
        velocity_m_yr=(0.25, 0.5, 0.0),
        height_above_geoid_m=12.5,
        geopotential_number_m2_s2=125.0,
    )
    # All of these numbers are exact in either unit but the velocities, of one rounding.
    made = tscale.Site.from_itrf(
        "x",
        6371 * u.km,
        1.5 * u.km,
        0 * u.m,
        velocity_m_yr=[25.0, 50.0, 0.0] * u.cm / u.yr,
        height_above_geoid_m=1250 * u.cm,
        geopotential_number_m2_s2=125 * u.J / u.kg,
    )
    assert made.velocity_m_yr == pytest.approx(plain.velocity_m_yr, rel=4e-16, abs=0.0)
    assert made == tscale.Site(
        "x", plain.position_m, made.velocity_m_yr, height_above_geoid_m=12.5, geopotential_number_m2_s2=125.0
    )
    assert all(type(value) is float for value in (*made.position_m, made.geopotential_number_m2_s2))
    assert tscale.Site("x", [6371.0, 1.5, 0.0] * u.km).position_m == plain.position_m  # type: ignore[arg-type]
    ground = tscale.Site.from_geodetic("x", Angle("1h"), Angle("45d30m"), 0.25 * u.km)
    assert ground.position_m == tscale.Site.from_geodetic("x", 15.0, 45.5, 250.0).position_m
    star = tscale.Source(Angle("12h"), -1800 * u.arcmin, 0.25 * u.arcsec / u.yr, parallax_mas=0.5 * u.arcsec)
    # Units of angle differ by factors that are no float64: one rounding, 6e-15 deg.
    found = (star.ra_deg, star.dec_deg, star.pm_ra_cosdec_mas_yr, star.parallax_mas)
    assert found == pytest.approx((180.0, -30.0, 250.0, 500.0), rel=4e-16, abs=0.0)
    assert all(type(value) is float for value in (star.ra_deg, star.dec_deg, star.pm_ra_cosdec_mas_yr))


@pytest.mark.parametrize(
    ("make", "words"),
    [
        (lambda: tscale.Site.from_itrf("x", 6371 * u.km, 0 * u.s, 0.0), "'x': y_m: .* cannot be given in m"),
        (lambda: tscale.Site.from_geodetic("x", 1 * u.m, 2.0, 3.0), "'x': lon_deg: .* cannot be given in deg"),
        (
            lambda: tscale.Site.from_itrf("x", u.Quantity([6371, 1], "km"), 0.0, 0.0),
            "x_m must be a number, got <Quantity",
        ),
        (lambda: tscale.Site.from_itrf("x", 6371 * u.m, 0.0, 0.0), "6371 m from the geocentre"),
        (lambda: tscale.Site.from_itrf("x", 6371e3, 0.0, np.timedelta64(3, "s")), "'x': z_m: numbers of m"),
        (lambda: tscale.Source(1 * u.m, 2.0), "ra_deg: .* cannot be given in deg"),
        (lambda: tscale.Source(u.Quantity([1, 2], "deg"), 2.0), "ra_deg must be a finite number"),
        (lambda: tscale.Source(1.0, 2.0, parallax_mas=10 * u.pc), "parallax_mas: .* cannot be given in mas"),
        (lambda: tscale.Source(1.0, np.nan * u.deg), "dec_deg must be a finite number"),
    ],
)
def test_quantities_of_another_kind(make: Callable[[], object], words: str) -> None:
    with pytest.raises(InvalidInput, match=words):
        make()


def test_where_astropys_own_objects_are_read() -> None:
    there, star = to_astropy(SITE), to_astropy(STAR)
    with pytest.raises(InvalidInput, match=r"got EarthLocation; read it with tscale.interop.from_astropy\(site\)"):
        tscale.chain("UTC", "TDB", site=there)
    with pytest.raises(InvalidInput, match=r"got SkyCoord; read it with tscale.interop.from_astropy\(source\)"):
        tscale.chain("UTC", "TDB", source=star)
    with pytest.raises(InvalidInput, match=r"got Time; read it with tscale.interop.from_astropy\(t\)"):
        tscale.chain("UTC", "TAI")(Time("2025-01-01"))
    with pytest.raises(InvalidInput, match="got Quantity; make one with Source"):
        tscale.chain("UTC", "TDB", source=3 * u.deg)


def test_a_chain_by_way_of_astropy(reference: tscale.ReferenceData, tmp_path: Path) -> None:
    # The whole of a barycentring from astropy's objects is the one from ours.
    time = Time("2025-03-03T12:21:00.5", scale="utc")
    c = tscale.chain(
        "UTC", "TDB@BARYCENTER", site=from_astropy(to_astropy(SITE)), source=from_astropy(to_astropy(STAR))
    )
    ours = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=STAR)
    # The parallax comes back within 1e-15 of itself: 2 us of delay times that.
    assert abs(c(from_astropy(time)).minus(ours(from_astropy(time)))) < 1e-16
    assert pickle.loads(pickle.dumps(from_astropy(to_astropy(STAR)))) == from_astropy(to_astropy(STAR))
