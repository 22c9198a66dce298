"""Two clocks compared: published differences of height, and what the comparison itself promises."""

from __future__ import annotations

import pickle

import numpy as np
import pytest

import tscale
from tscale import exact
from tscale.clocks import orbit_rate
from tscale.earth.gravity import EARTH_ZONAL, geopotential_number_m2_s2

C2 = 299792458.0**2
START = tscale.Instants.from_iso("2024-03-01T00:00:00", scale="UTC")
STOP = START.shifted(10 * 86400.0)


def at_height(height_m: float, lat_deg: float = 45.0, name: str = "upper") -> tscale.Site:
    return tscale.Site.from_geodetic(name, 7.4, lat_deg, height_m + 50.0, height_above_geoid_m=height_m)


def with_number(number: float, lat_deg: float = 40.0, name: str = "upper") -> tscale.Site:
    return tscale.Site.from_geodetic(name, 7.4, lat_deg, 50.0, geopotential_number_m2_s2=number)


def rate(a: tscale.Site, b: tscale.Site) -> float:
    return tscale.compare_clocks(a, b, START, STOP).rate


def test_a_mountain_station_against_a_valley() -> None:
    # Nuovo Cimento B 37, 219 (1977): 3500 m against 250 m, predicted 3.54e-13, 30.6 ns a day (seen in the abstract);
    # measured 33.8 +- 6.8 and 36.5 +- 5.8 ns a day (from memory); often quoted is 34 ns a day.
    found = tscale.compare_clocks(at_height(3500.0), at_height(250.0, name="lower"), START, STOP)
    assert found.rate == pytest.approx(3.54e-13, abs=0.005e-13)
    per_day_ns = found.accumulated_s / 10 * 1e9
    assert per_day_ns == pytest.approx(30.6, abs=0.05)
    for measured, sigma in ((33.8, 6.8), (36.5, 5.8)):  # within two standard deviations of each
        assert abs(per_day_ns - measured) < 2.0 * sigma
    assert abs(per_day_ns - 34.0) < 0.2 * 34.0  # the experiment's own 20 %


def test_per_metre() -> None:
    # 9.80665/c^2 = 1.0911e-16 per metre; gravity at 45 degrees and sea level is 9.8062 m/s2.
    assert rate(at_height(1.0), at_height(0.0)) == pytest.approx(1.0911e-16, abs=0.0002e-16)
    # One millimetre: 1.09e-19 (Nature 602, 420, 2022: 1.09e-19 per mm); floats of 7e-10 resolve 1e-25.
    assert rate(at_height(0.001), at_height(0.0)) == pytest.approx(1.091e-19, abs=0.001e-19)


def test_33_centimetres() -> None:
    # Science 329, 1630 (2010): 33 cm at g = 9.796 m/s2, measured (4.1 +- 1.6)e-17 (from memory), predicted 3.6e-17.
    found = rate(at_height(1634.33, 40.0), at_height(1634.0, 40.0))
    assert found == pytest.approx(3.60e-17, abs=0.005e-17)
    assert abs(found - 4.1e-17) < 1.6e-17


def test_450_metres_of_a_tower() -> None:
    # Nature Photonics 14, 411 (2020): about 4.24 ns a day and 4.9e-14 over 450 m; 1% for the height as quoted.
    found = tscale.compare_clocks(at_height(450.0, 35.7), at_height(0.0, 35.7), START, STOP)
    assert found.rate == pytest.approx(4.9e-14, rel=0.01, abs=0)
    assert found.accumulated_s / 10 == pytest.approx(4.24e-9, rel=0.01, abs=0)


def test_levelling_over_15_km_and_457_km() -> None:
    # Nature Photonics 10, 662 (2016): 148.555 m2/s2 is 1652.9(5.9)e-18. arXiv 2309.14953: 3915.88 m2/s2 by geodesy is
    # 4.3570e-14, 3918.1(2.4) by clocks.
    assert rate(with_number(148.555), with_number(0.0)) == pytest.approx(1652.9e-18, abs=0.1e-18)
    found = rate(with_number(3915.88), with_number(0.0))
    assert found == pytest.approx(4.3570e-14, abs=0.0001e-14)
    assert abs(found * C2 - 3918.1) < 2.4


def test_a_laboratory_on_a_plateau_against_the_geoid() -> None:
    # Metrologia 40, 66 (2003): the correction is -1798.91e-16 for a geopotential number of 16167.80 m2/s2.
    clock = with_number(16167.80)
    found = rate(clock, with_number(0.0))
    assert found == pytest.approx(1798.91e-16, abs=0.01e-16)
    # Against TT itself: on average the same but for tides (2e-17) and second order (2e-19).
    dates = START.shifted(np.arange(0, 28 * 86400, 3600.0))
    assert float(np.mean(tscale.proper_rate(clock, dates))) == pytest.approx(found, abs=2e-17)


def test_a_tower_of_22_metres() -> None:
    # Phys. Rev. Lett. 4, 337 (1960): 22.5 m, 2.46e-15 (from memory); 1%.
    assert rate(at_height(22.5, 42.4), at_height(0.0, 42.4)) == pytest.approx(2.46e-15, rel=0.01, abs=0)


def test_a_clock_carried_up_a_mountain() -> None:
    # 1340 m for 40 hours: 22.3 ns predicted from the track (report of 2006 on a private experiment of 2005); 10% for
    # the track not being a step.
    a, b = at_height(1640.0, 46.8), at_height(300.0, 46.8, "home")
    found = tscale.compare_clocks(a, b, START, START.shifted(40 * 3600.0))
    assert found.rate == pytest.approx(1.46e-13, rel=0.01, abs=0)
    assert found.accumulated_s == pytest.approx(22.3e-9, rel=0.1, abs=0)


def test_a_rocket_at_its_apogee() -> None:
    # Phys. Rev. Lett. 45, 2081 (1980): 4.5e-10 at 10000 km; the potential against the ground is 4.2456e-10 of it (own
    # calculation GM/c^2 (1/R - 1/(R + h))).
    t = tscale.Instants.from_iso("2024-03-01T00:00:00", scale="TT")
    high = tscale.Trajectory.from_kepler(t, 6.378137e6 + 1e7, 0.0, 0.0, 0.0, 0.0, 0.0, name="rocket")
    ground = with_number(0.0, 0.0)
    terms = {c.name: tscale.proper_ledger(c, t) for c in (high, ground)}
    potential = float(terms["rocket"]["gravitational"] - terms["upper"]["gravitational"])
    assert potential == pytest.approx(4.2456e-10, rel=2e-3, abs=0)  # J2 at the equator is 1.6e-3 of the ground's GM/R
    assert potential == pytest.approx(4.5e-10, rel=0.07, abs=0)


def test_slow_motion() -> None:
    # 10 m/s: v^2/(2 c^2) = 5.563e-16 (the idea of Science 329, 1630). A clock in the ITRS that stands still has v = 0.
    t = tscale.Instants.from_iso("2024-03-01T00:00:00", scale="TT").shifted(60.0 * np.arange(8))
    x = np.zeros((8, 3))
    x[:, 2] = 6.3568e6 + np.zeros(8)
    x[:, 0] = 10.0 * 60.0 * np.arange(8)
    v = np.broadcast_to([10.0, 0.0, 0.0], (8, 3))
    mover = tscale.Trajectory.from_states(t, x, v, frame="ITRS", name="sledge")
    assert float(tscale.proper_ledger(mover, t[0])["kinematic"]) == pytest.approx(-5.563e-16, abs=0.003e-16)


def test_what_two_clocks_share_cancels() -> None:
    a, b = at_height(800.0), at_height(800.0, name="twin")
    found = tscale.compare_clocks(a, b, START, STOP)
    assert found.accumulated_s == 0.0
    assert set(found.ledger.values()) == {0.0}
    assert tscale.compare_clocks(with_number(10.0), with_number(20.0), START, STOP).ledger["kinematic"] == 0.0


@pytest.mark.parametrize("against", ["TT", "TCG", "TDB", "TCB", "UTC"])
def test_the_comparison_adds_up(against: str) -> None:
    orbit = tscale.Trajectory.from_kepler(START, 2.656e7, 0.01, 55.0, 10.0, 20.0, 30.0, name="satellite")
    ground = at_height(300.0, name="station")
    found = tscale.compare_clocks(orbit, ground, START, STOP, against=against)
    # Dates of TDB at two places are found to 0.1 fs each.
    assert sum(found.ledger.values()) == pytest.approx(found.accumulated_s, abs=4e-16 if "B" in against else 2e-18)
    assert found.rate == found.accumulated_s / found.duration_s
    assert sum(found.rates.values()) == pytest.approx(found.rate, abs=5e-22)
    assert found.duration_s == pytest.approx(
        864000.0 * {"TCG": 1 + 6.97e-10, "TCB": 1 + 1.55e-8}.get(against, 1), abs=3e-4
    )
    other = tscale.compare_clocks(ground, orbit, START, STOP, against=against)
    # The other way round the dates of TDB are events at the other clock, 5 us away: of a rate of 4.5e-10 nothing is
    # left.
    assert other.accumulated_s == pytest.approx(-found.accumulated_s, abs=1e-14)
    lines = found.table().splitlines()
    assert lines[0].endswith(against)
    assert lines[-1].startswith("satellite - station")
    assert ("difference of dates" in found.ledger) == (against in ("TDB", "TCB"))


def test_same_dates_of_tdb_are_not_the_same_of_tt() -> None:
    # v_E.(x_a - x_b)/c^2 at the ends: up to 4 us for two places on the ground.
    a, b = with_number(0.0, 0.0), tscale.Site.from_geodetic("b", -172.6, 0.0, 0.0, geopotential_number_m2_s2=0.0)
    stop = START.shifted(6 * 3600.0)
    found = tscale.compare_clocks(a, b, START, stop, against="TDB")
    ends = []
    for t in (START, stop):
        tdb = tscale.chain("UTC", "TDB", site=a)(t)
        at_b = tscale.chain("TDB", "UTC", site=b)(tdb)
        ends.append(exact.seconds(exact.subtract(t.pair, at_b.pair)))
    assert found.ledger["difference of dates"] == pytest.approx(
        float(ends[1] - ends[0]), abs=3e-15
    )  # in TCG: 7e-10 of it
    assert 1e-6 < abs(found.accumulated_s) < 9e-6
    assert tscale.compare_clocks(a, b, START, stop).accumulated_s == pytest.approx(0.0, abs=5e-17 * 21600)


def test_a_series() -> None:
    a, b = at_height(900.0), at_height(100.0, name="lower")
    found = tscale.compare_clocks(a, b, START, STOP)
    dates = START.shifted(np.array([[0.0, 864000.0], [432000.0, 1728000.0]]))
    series = found.series_s(dates)
    assert series.shape == (2, 2)
    assert series[0, 0] == pytest.approx(0.0, abs=1e-24)
    assert series[0, 1] == found.accumulated_s
    assert series[1, 1] == pytest.approx(2 * found.accumulated_s, rel=1e-6, abs=0)
    two = tscale.chain("UTC", "TCG", site=a)(dates)
    np.testing.assert_allclose(found.series_s(two), series, rtol=0, atol=1e-22)


def test_a_clock_set_for_its_orbit() -> None:
    # A factory offset from the closed formula keeps a circular orbit on TT to what the formula leaves out: J2 at this
    # inclination, some 1e-15, and tides.
    t = tscale.Instants.from_iso("2024-03-01T00:00:00", scale="TT")
    orbit = tscale.Trajectory.from_kepler(t, 2.656e7, 0.0, 54.7356, 0.0, 0.0, 0.0, name="satellite")
    offset = float(orbit_rate(2.656e7).factory_offset)
    made = tscale.ProperClock("satellite", orbit, t, rate_offset=offset)
    found = tscale.compare_clocks(made, with_number(0.0, name="geoid"), t, t.shifted(20 * 86400.0))
    assert abs(found.rate) < 2e-14
    assert found.ledger["set rate offset"] == pytest.approx(offset * found.duration_s, rel=1e-8, abs=0)


def test_far_clocks(reference: tscale.ReferenceData) -> None:
    # The Moon's surface: published 56.0256 us a day secular against the geoid (arXiv 2406.16147). Over 12 anomalistic
    # months the periodic terms and the position term (128 us, synodic) leave up to 1 us a day of each month's share.
    t = tscale.Instants.from_iso("2024-03-01T00:00:00", scale="TT")
    base = tscale.SurfaceSite("base", "moon", 0.0, 0.0)
    year = t.shifted(12 * 29.530589 * 86400.0)
    found = tscale.compare_clocks(base, with_number(0.0, name="geoid"), t, year)
    assert found.rate * 86400e6 == pytest.approx(56.0256, abs=0.02)
    lander = tscale.SurfaceSite("lander", "mars", 0.0, 0.0)
    mars = tscale.compare_clocks(lander, with_number(0.0, name="geoid"), t, t.shifted(30 * 86400.0), against="TDB")
    # Extremes over the Martian year from DE440, own calculation: 344 to 613 us a day.
    assert 344 < mars.rate * 86400e6 < 613
    with pytest.raises(tscale.errors.InvalidInput, match="not in it"):
        tscale.ProperClock("x", lander, t, gravity=EARTH_ZONAL)


@pytest.mark.parametrize("phase_d", [0, 7, 15, 22])
def test_about_the_moon(phase_d: int) -> None:
    # 100 km above the Moon against a place on it. A circular orbit is -3 GM/(2 r c^2), the selenoid -2821713.3/c^2
    # (arXiv 2406.16147), together -1.135 us a day, at any phase. Dates on TDB and TT are alike at both; what the
    # orbiter's own place adds to them at the ends, 0.6 us, is 2 v r/c^2.
    epoch = tscale.Instants.from_iso("2024-03-01", scale="TDB")
    orbiter = tscale.Trajectory.from_kepler(epoch, 1.8374e6, 0.0, 90.0, 0.0, 0.0, 0.0, center="moon", name="orbiter")
    base = tscale.SurfaceSite("base", "moon", 0.0, 0.0)
    start = tscale.Instants.from_iso("2024-03-01", scale="TT").shifted(phase_d * 86400.0)
    stop = start.shifted(86400.0)
    truth = (2821713.3 - 1.5 * 4.9028001e12 / 1.8374e6) / C2 * 86400e6
    found = {
        against: tscale.compare_clocks(orbiter, base, start, stop, against=against).rate * 86400e6
        for against in ("TT", "TDB", "TCL", "own")
    }
    assert truth == pytest.approx(-1.135, abs=0.0005)
    assert found["TT"] == pytest.approx(found["TDB"], abs=1.0)
    assert found["TT"] == pytest.approx(truth, abs=0.05)
    # Tide of the Earth, 2e-16: 2e-5 us a day; and what the ends of a whole day cut of an orbit of 2 h.
    assert found["TCL"] == pytest.approx(truth, abs=0.0005)
    assert found["own"] == found["TCL"]
    # Each against the ground: no 27 us a day of simultaneity in one of them.
    ground = with_number(0.0, name="geoid")
    apart = [tscale.compare_clocks(clock, ground, start, stop).rate * 86400e6 for clock in (orbiter, base)]
    assert apart[0] - apart[1] == pytest.approx(found["TT"], abs=1e-6)


def test_two_clocks_on_one_body() -> None:
    # On opposite sides of Mars, 1000 m apart in height: dW/c^2, whatever part of a turn the span ends in. Against TT
    # the position of the two adds what the turning of Mars makes of it.
    start = tscale.Instants.from_iso("2024-03-01", scale="TT")
    stop = start.shifted(3.3 * 88642.66)
    low = tscale.SurfaceSite("low", "mars", 0.0, 0.0)
    high = tscale.SurfaceSite("high", "mars", 180.0, 0.0, height_above_geoid_m=1000.0)
    expected = (low.gravity_potential_m2_s2() - high.gravity_potential_m2_s2()) / C2
    assert expected == pytest.approx(1000.0 * 3.7 / C2, rel=0.01, abs=0)
    found = tscale.compare_clocks(low, high, start, stop, against="own")
    assert found.rate == pytest.approx(-expected, abs=1e-19)
    assert sum(found.ledger.values()) == pytest.approx(found.accumulated_s, abs=4e-16)
    assert abs(tscale.compare_clocks(low, high, start, stop).rate + expected) > 1e-12
    back = tscale.compare_clocks(high, low, start, stop, against="own")
    assert back.accumulated_s == pytest.approx(-found.accumulated_s, abs=1e-15)
    # On the Moon its own time is TCL, and reaches a clock on the Earth too.
    here, there = (tscale.SurfaceSite(name, "moon", lon, 0.0) for name, lon in (("here", 0.0), ("there", 90.0)))
    both = [tscale.compare_clocks(here, there, start, stop, against=against).rate for against in ("TCL", "own")]
    assert both[0] == both[1] == pytest.approx(0.0, abs=4e-16)  # tides of the Earth: 30 m2/s2
    ground = with_number(0.0, name="geoid")
    assert np.isfinite(tscale.compare_clocks(here, ground, start, stop, against="TCL").rate)
    for a, b in ((here, low), (ground, here), (ground, with_number(1.0))):
        with pytest.raises(tscale.errors.ScaleMismatch, match="against TCG near the Earth, TCL near the Moon, or TDB"):
            tscale.compare_clocks(a, b, start, stop, against="own")
    with pytest.raises(tscale.errors.ScaleMismatch, match="does not reach"):
        tscale.compare_clocks(low, high, start, stop, against="TCL")


@pytest.mark.parametrize("near", ["ground", "moon"])
def test_one_clock_that_tt_does_not_reach(near: str) -> None:
    # TT of the geocentre at the same TDB for both: the same instants, and but for the count of the duration (1e-8) the
    # same gain, as with dates alike on TDB.
    start = tscale.Instants.from_iso("2024-03-01T00:00:00", scale="UTC")
    stop = start.shifted(7.3 * 86400.0)
    mars = tscale.SurfaceSite("lander", "mars", 0.0, 0.0)
    other = with_number(0.0, name="geoid") if near == "ground" else tscale.SurfaceSite("base", "moon", 0.0, 0.0)
    found = tscale.compare_clocks(mars, other, start, stop)
    tdb = tscale.compare_clocks(
        mars, other, *(tscale.chain("UTC@GEOCENTER", "TDB@GEOCENTER")(t).at(None) for t in (start, stop)), against="TDB"
    )
    assert found.accumulated_s == pytest.approx(tdb.accumulated_s, abs=1e-15)
    assert found.duration_s == pytest.approx(7.3 * 86400.0, abs=1e-9)
    assert "difference of dates" in found.ledger
    assert sum(found.ledger.values()) == pytest.approx(found.accumulated_s, abs=4e-16)
    assert tscale.compare_clocks(other, mars, start, stop).accumulated_s == pytest.approx(
        -found.accumulated_s, abs=4e-16
    )


def test_equal_set_rates_leave_no_rounding() -> None:
    # 864 s of set rate at each: the difference is that of the proper times, 1.001 of it.
    a, b = (
        tscale.ProperClock(name, with_number(number), START, rate_offset=1e-3)
        for name, number in (("a", 900.0), ("b", 100.0))
    )
    found, plain = tscale.compare_clocks(a, b, START, STOP), rate(with_number(900.0), with_number(100.0))
    assert found.accumulated_s == pytest.approx(plain * 864000.0 * 1.001, abs=4e-16)
    assert found.ledger["set rate offset"] == pytest.approx(plain * 864.0, abs=4e-16)


@pytest.mark.parametrize(
    ("act", "match"),
    [
        (lambda: tscale.compare_clocks(at_height(1.0), at_height(0.0), STOP, START), "in order"),
        (lambda: tscale.compare_clocks(at_height(1.0), at_height(0.0), START, START), "in order"),
        (lambda: tscale.compare_clocks(at_height(1.0), at_height(0.0), START.shifted([0, 1]), STOP), "series_s"),
        (lambda: tscale.compare_clocks(at_height(1.0), "geoid", START, STOP), "b is a Site"),  # type: ignore[arg-type]
        (lambda: tscale.compare_clocks(at_height(1.0), at_height(0.0), START, STOP, against="UT1"), "against TT"),
        (lambda: tscale.compare_clocks(at_height(1.0), at_height(0.0), "2024", STOP), "from_iso"),  # type: ignore[arg-type]
    ],
)
def test_errors_teach(act, match: str) -> None:
    with pytest.raises(tscale.errors.InvalidInput, match=match):
        act()


def test_a_height_by_numbers_agrees() -> None:
    number = float(geopotential_number_m2_s2(3500.0, 45.0) - geopotential_number_m2_s2(250.0, 45.0))
    found = tscale.compare_clocks(at_height(3500.0), at_height(250.0), START, STOP, tides=False)
    # Second order is 2.5e-22, and TT for TCG 7e-10 of the whole.
    assert found.rate == pytest.approx(number / C2, abs=1e-21)


def test_a_comparison_can_be_sent_to_another_process() -> None:
    a, b = (
        tscale.Site.from_geodetic(name, 10.0, 45.0, height, height_above_geoid_m=height - 48.0)
        for name, height in (("low", 100.0), ("high", 2000.0))
    )
    start, stop = tscale.Instants.from_iso(["2025-01-01", "2025-01-03"], "UTC")
    found = tscale.compare_clocks(a, b, start, stop)
    again = pickle.loads(pickle.dumps(found))
    t = start.shifted(np.linspace(0.0, 172800.0, 7))
    assert np.array_equal(again.series_s(t), found.series_s(t))
    assert again.ledger == found.ledger
