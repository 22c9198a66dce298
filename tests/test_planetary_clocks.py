"""Clocks on the Moon and Mars: published rates and variations, and the parts they are made of."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

import tscale
from tscale import exact
from tscale.body_shape import REFERENCE_POTENTIAL_M2_S2
from tscale.errors import DataFileError, InvalidInput, MissingPiece, OutOfSpan, ScaleMismatch
from tscale.transforms import planetary
from tscale.transforms.periodic import fit_periodic

C2 = 299792458.0**2
US_PER_DAY = 86400e6
MARS_YEAR_D = 686.980

CRATER = tscale.SurfaceSite("crater", "moon", 41.0, -12.5)
PLAIN = tscale.SurfaceSite("plain", "mars", 137.4, -4.6)


def daily(first: str, number: int, step_d: float = 1.0) -> tuple[np.ndarray, np.ndarray]:
    start = tscale.Instants.from_iso(first, scale="TDB").whole
    return start + np.round(np.arange(number) * step_d * 86400).astype(np.int64), np.zeros(number)


# ---- the surface ----------------------------------------------------------------------------------


def test_potentials_of_the_surfaces() -> None:
    # The Moon: W = 2821713.3 m2/s2 (Ardalan & Karimi 2014), 3.13958e-11, 2.7126 us a day; GM/(R c^2) at 1738.1 km is
    # 3.13854e-11. Mars: GM/(R c^2) at 3396.19 km is 12.1231 us a day, its flattening and rotation add 0.4 %.
    assert CRATER.gravity_potential_m2_s2() / C2 == pytest.approx(3.13958e-11, rel=1e-5, abs=1e-18)
    gm, radius = tscale.Ephemeris.default().gm_m3_s2("mars"), 3396.19e3
    assert gm / radius / C2 * US_PER_DAY == pytest.approx(12.1231, rel=0, abs=1e-4)
    # With J2 = 1.9566e-3 (Konopliv et al. 2016, Icarus 274, 253; from memory) and the rotation, on the equator.
    spin = 7.088218e-5
    level = gm / radius * (1.0 + 0.5 * 1.9566e-3) + 0.5 * (spin * radius) ** 2
    # The areoid's height over that ellipsoid's equator is below 1 km: 3.7e3 m2/s2.
    assert REFERENCE_POTENTIAL_M2_S2[4] == pytest.approx(level, rel=0, abs=3.7e3)


@pytest.mark.parametrize(("body", "gravity_m_s2"), [("moon", 1.624), ("mars", 3.71)])
def test_height_costs_gravity(body: str, gravity_m_s2: float) -> None:
    # Surface gravity of handbooks (mean of the Moon 1.624 m/s2, Mars 3.71): 0.5 %.
    low, high = (tscale.SurfaceSite("s", body, 0.0, 10.0, 0.0, height_above_geoid_m=h) for h in (0.0, 100.0))
    fall = low.gravity_potential_m2_s2() - high.gravity_potential_m2_s2()
    assert fall / 100.0 == pytest.approx(gravity_m_s2, rel=5e-3, abs=1e-9)
    # Of second order in height: GM h/(r (r + h)) against GM h/r^2.
    far = tscale.SurfaceSite("s", body, 0.0, 90.0, 0.0, height_above_geoid_m=20e3)
    radius = np.linalg.norm(far.offset((np.array(0), np.array(0.0)))[0])
    gm = tscale.Ephemeris.default().gm_m3_s2(body)
    work = low.gravity_potential_m2_s2() - far.gravity_potential_m2_s2()
    assert work == pytest.approx(gm / radius - gm / (radius + 20e3), rel=1e-9, abs=1e-9)


def test_what_a_site_may_say_of_its_potential(tmp_path: Path) -> None:
    assert tscale.SurfaceSite("s", "mars", 0, 0, 500.0).gravity_potential_m2_s2() == pytest.approx(
        tscale.SurfaceSite("s", "mars", 0, 0, 500.0, height_above_geoid_m=500.0).gravity_potential_m2_s2(), rel=1e-12
    )
    assert tscale.SurfaceSite("s", "venus", 0, 0, potential_m2_s2=5.4e7).gravity_potential_m2_s2() == 5.4e7
    with pytest.raises(MissingPiece, match=r"venus.*potential_m2_s2="):
        tscale.SurfaceSite("s", "venus", 0, 0).gravity_potential_m2_s2()
    with pytest.raises(InvalidInput, match="not both"):
        tscale.SurfaceSite("s", "mars", 0, 0, height_above_geoid_m=1.0, potential_m2_s2=1.2e7)
    for value in (-1.2e7, 0.0, np.inf, "high"):
        with pytest.raises(InvalidInput, match="potential_m2_s2"):
            tscale.SurfaceSite("s", "mars", 0, 0, potential_m2_s2=value)  # type: ignore[arg-type]
    path = tmp_path / "site.toml"
    path.write_text('[surface]\nname = "s"\nbody = "moon"\nlon_deg = 1\nlat_deg = 2\npotential_m2_s2 = 2.8e6\n')
    assert tscale.SurfaceSite.load(path).gravity_potential_m2_s2() == 2.8e6
    path.write_text('[surface]\nname = "s"\nbody = "moon"\nlon_deg = 1\nlat_deg = 2\npotential = 2.8e6\n')
    with pytest.raises(DataFileError, match="unknown key potential"):
        tscale.SurfaceSite.load(path)


# ---- rates ----------------------------------------------------------------------------------------


@pytest.mark.parametrize("against", ["TT", "TCG", "TCB", "TDB", "TCL"])
def test_terms_add_up_and_scales_differ_as_defined(reference: tscale.ReferenceData, against: str) -> None:
    tdb = daily("2020-01-01", 400, 1.3)
    terms = planetary.surface_rate_terms(CRATER, tdb, reference, against)  # type: ignore[arg-type]
    assert terms.total.shape == (400,)
    of_tdb = planetary.surface_rate_terms(CRATER, tdb, reference, "TDB").total
    tt = planetary.surface_rate_terms(CRATER, tdb, reference, "TT").total
    if against == "TCB":  # IAU 2006 Resolution B3
        assert np.abs(terms.total - ((1.0 + of_tdb) * (1.0 - 1.550519768e-8) - 1.0)).max() < 3e-16
    if against == "TCG":  # IAU 2000 Resolution B1.9
        assert np.abs(terms.total - (tt - 6.969290134e-10)).max() < 1e-17
    if against == "TCL":
        assert np.abs(terms.total + CRATER.gravity_potential_m2_s2() / C2).max() < 4e-16


@pytest.mark.parametrize("against", ["TT", "TCB", "TDB", "TCL"])
def test_rate_is_that_of_the_chain(reference: tscale.ReferenceData, against: str) -> None:
    # A clock in TCL loses its own potential and tide; TCL against the rest is the chain's own derivative, made of
    # other functions. 1e-17 each; products with the potential 3e-20.
    tdb = tscale.Instants.from_seconds(np.arange(60) * 5_000_000, 0.0, scale="TDB", place="TOPOCENTER")
    terms = planetary.surface_rate_terms(CRATER, tdb.pair, reference, against)  # type: ignore[arg-type]
    clock = terms.own_potential + terms.tide
    if against == "TCL":
        assert np.array_equal(terms.total, clock)
        return
    chain = tscale.chain("TCL", against, site=CRATER)
    slow = chain.rate(tscale.chain("TDB", "TCL", site=CRATER)(tdb))
    assert np.abs((1.0 + clock) / (1.0 + slow) - 1.0 - terms.total).max() < 3e-16  # formed in float64 near 1
    assert np.abs(clock - slow - clock * slow + slow**2 - terms.total).max() < 2e-17


def test_tide_on_the_moon(reference: tscale.ReferenceData) -> None:
    # GM_E R^2/r^3 of the Earth on the near side at the mean distance of 385 000 km: 21.1 m2/s2, and half of
    # that, opposite, a quarter of a turn away. Distances differ by 14 %, their cubes by half of the mean.
    near = planetary.surface_tide_m2_s2(
        tscale.SurfaceSite("near", "moon", 0.0, 0.0), daily("2020-01-01", 354), reference
    )
    side = planetary.surface_tide_m2_s2(
        tscale.SurfaceSite("side", "moon", 90.0, 0.0), daily("2020-01-01", 354), reference
    )
    expected = 3.986e14 * 1737.4e3**2 / 3.85e8**3
    assert near.mean() == pytest.approx(expected, rel=0.03, abs=1e-9)
    assert side.mean() == pytest.approx(-0.5 * expected, rel=0.05, abs=1e-9)
    assert np.ptp(near) < 0.5 * expected
    # By Legendre polynomials of the Earth: degree 3 is R/r of degree 2, 0.1 m2/s2 (1e-18) at the near side, degree 4
    # (R/r)^2 of it, 5e-4; the Sun's 0.06 m2/s2 and the planets' 1e-5 besides.
    site, tdb = tscale.SurfaceSite("near", "moon", 0.0, 0.0), daily("2020-01-01", 354)
    r, _ = site.offset(tdb)
    size = np.linalg.norm(r, axis=-1)
    by_hand = np.zeros(354)
    for body in ("earth", "sun"):
        d = reference.ephemeris.position(body, tdb, "moon")
        away = np.linalg.norm(d, axis=-1)
        s, ratio = np.sum(r * d, axis=-1) / (size * away), size / away
        degrees = ratio**2 * (1.5 * s**2 - 0.5) + ratio**3 * (2.5 * s**3 - 1.5 * s)
        by_hand += reference.ephemeris.gm_m3_s2(body) / away * degrees
    assert np.abs(near - by_hand).max() < 1e-3


def test_lunar_surface_against_the_geoid(reference: tscale.ReferenceData) -> None:
    # Ashby & Patla 2024, AJ 168, 112: 56.02 us/day; Turyshev et al. 2024/25, arXiv 2406.16147v5: 56.0256 us/day.
    found = planetary.surface_clock_summary(CRATER, reference, "1980-01-01", "2020-01-01")
    assert found.mean_rate * US_PER_DAY == pytest.approx(56.02, rel=0, abs=0.01)
    assert found.mean_rate * US_PER_DAY == pytest.approx(56.0256, rel=0, abs=0.002)
    # The rate swings by what 0.47 us at 27.55 d and 0.09 us at 31.8 d make of it, 2 pi a/T: 0.107 and 0.018 us/day,
    # with 0.025 at 14.8 d and less besides.
    assert 0.21 < (found.highest_rate - found.lowest_rate) * US_PER_DAY < 0.32
    assert found.fit is not None
    assert found.fit.terms[0].amplitude_s == pytest.approx(0.470e-6, rel=0, abs=0.005e-6)
    assert "us/day" in found.table()


def test_simultaneity_on_the_moon(reference: tscale.ReferenceData) -> None:
    # 128 us at 29.53 d: 2 pi 128/29.53 = 27 us/day, which is no rate of the clock and averages out.
    tdb = daily("2000-01-01", 7305)
    own, common = (
        planetary.surface_rate_terms(CRATER, tdb, reference, "TT", simultaneity=how) for how in ("TT", "TDB")
    )
    swing = (own.total - common.total) * US_PER_DAY
    assert np.abs(swing - planetary.simultaneity_rate(CRATER, tdb, reference) * US_PER_DAY).max() < 1e-6
    assert np.abs(swing).max() == pytest.approx(2.0 * np.pi * 128.0 / 29.530589, rel=0.2, abs=1e-9)
    assert abs(swing.mean()) < 0.05
    assert not common.simultaneity.any()


def test_mars_against_the_geoid(reference: tscale.ReferenceData) -> None:
    # Ashby & Patla 2025, arXiv 2507.21388v2: the rate varies by 226 us/day over a Martian year and that by about 40
    # us/day over seven synodic cycles; its mean is given as 477 us/day. An own sum over DE440, 1950 to 2050, gives
    # 488.0 as an average over time.
    found = planetary.surface_clock_summary(PLAIN, reference, "1962-01-01", "2056-01-12")  # 50 years of Mars
    yearly = found.yearly_variation * US_PER_DAY
    assert yearly.mean() == pytest.approx(226.0, rel=0.1, abs=1e-9)
    assert np.ptp(yearly) == pytest.approx(40.0, rel=0.3, abs=1e-9)
    assert found.mean_rate * US_PER_DAY == pytest.approx(488.0, rel=0, abs=2.0)
    assert found.mean_rate * US_PER_DAY == pytest.approx(477.0, rel=0, abs=12.0)
    assert found.fit is not None
    assert found.fit.us_per_day == pytest.approx(found.mean_rate * US_PER_DAY, rel=0, abs=0.5)
    # Kepler: 2 sqrt(GM a) e/c^2 is the largest term, 11.42 ms with a = 1.5237 au and e = 0.0934.
    expected = 2.0 * np.sqrt(1.32712440041e20 * 1.52371 * 149597870700.0) * 0.0934 / C2
    assert found.fit.terms[0].name == "anomalistic year of Mars"
    assert found.fit.terms[0].amplitude_s == pytest.approx(expected, rel=2e-3, abs=1e-9)


def test_two_means_of_the_rate_on_mars(reference: tscale.ReferenceData) -> None:
    # By time 488 us/day. By true anomaly (dt weighted with 1/r^2, equal steps of the angle from the Sun) 478.4: that is
    # near the published 477, which therefore looks like another average and not another physics.
    tdb = daily("1962-01-01", round(50 * MARS_YEAR_D))
    terms = planetary.surface_rate_terms(PLAIN, tdb, reference, "TT")
    rate = (terms.total - terms.place_on_body) * US_PER_DAY
    r = reference.ephemeris.position("mars", tdb, "sun")
    weight = 1.0 / np.sum(r * r, axis=-1)
    assert rate.mean() == pytest.approx(488.0, rel=0, abs=2.0)
    by_angle = float(np.sum(weight * rate) / np.sum(weight))
    assert by_angle == pytest.approx(478.4, rel=0, abs=1.0)
    assert by_angle == pytest.approx(477.0, rel=0, abs=2.0)


def test_turning_of_mars_is_diurnal(reference: tscale.ReferenceData) -> None:
    # v_M . (omega x r)/c^2 with 24 km/s and 241 m/s at the equator: 6.4e-11, gone after a whole day.
    whole = np.arange(0, 88643, 200, dtype=np.int64)
    terms = planetary.surface_rate_terms(PLAIN, (whole, np.zeros(whole.size)), reference, "TDB")
    assert 5e-11 < np.abs(terms.place_on_body).max() < 7.5e-11
    assert abs(terms.place_on_body.mean()) < 2e-12


@pytest.mark.parametrize("against", ["TT", "TCG", "TCB", "TDB", "TCL"])
def test_proper_rate_of_a_clock_on_the_moon(reference: tscale.ReferenceData, against: str) -> None:
    # By way of TCG here and of TDB there: 1e-17 each way.
    t = tscale.Instants.from_seconds(np.arange(40) * 654_321, 0.0, scale="TDB")
    found = tscale.proper_rate(CRATER, t, against)
    expected = planetary.surface_proper_rate(CRATER, t, against, reference)  # type: ignore[arg-type]
    assert np.abs(found - expected).max() < 2e-17
    lunar = tscale.chain("TDB", "TCL", site=CRATER)(t.at("TOPOCENTER"))
    assert np.abs(tscale.proper_rate(CRATER, lunar, against) - found).max() < 2e-18


def test_proper_rate_on_mars_and_about_the_moon(reference: tscale.ReferenceData) -> None:
    t = tscale.Instants.from_seconds(np.arange(40) * 654_321, 0.0, scale="TDB")
    for against in ("TT", "TDB", "TCB"):
        expected = planetary.surface_proper_rate(PLAIN, t, against, reference)
        assert np.abs(tscale.proper_rate(PLAIN, t, against) - expected).max() < 2e-17
    with pytest.raises(ScaleMismatch, match="coordinate time does not reach"):
        tscale.proper_rate(PLAIN, t, "TCL")
    # A circular orbit 100 km above the Moon against TCL: -3 GM/(2 r c^2); the tide of the Earth is 2.5e-16 there.
    epoch = tscale.Instants.from_iso("2020-01-01", scale="TDB")
    orbit = tscale.Trajectory.from_kepler(epoch, 1.8374e6, 0.0, 90.0, 0.0, 0.0, 0.0, center="moon")
    gm = reference.ephemeris.gm_m3_s2("moon")
    rate = tscale.proper_rate(orbit, epoch.shifted(np.arange(60) * 1000.0), "TCL")
    assert np.abs(rate + 1.5 * gm / 1.8374e6 / C2).max() < 5e-16


# ---- habits ---------------------------------------------------------------------------------------


def test_rates_by_instants_of_any_scale(reference: tscale.ReferenceData) -> None:
    t = tscale.Instants.from_iso(["2020-03-04T05:06:07", "2021-03-04T05:06:07"], scale="TDB").at("TOPOCENTER")
    expected = planetary.surface_proper_rate(CRATER, t, "TT", reference)
    for scale in ("TT", "UTC", "TCL", "TCB"):
        same = tscale.chain("TDB", scale, site=CRATER)(t)
        assert np.abs(planetary.surface_proper_rate(CRATER, same, "TT", reference) - expected).max() < 2e-18
    assert planetary.surface_proper_rate(CRATER, t[0], "TT", reference).shape == ()


def test_shapes_and_errors(reference: tscale.ReferenceData) -> None:
    grid = np.arange(12, dtype=np.int64).reshape(3, 4) * 86400
    before = grid.copy()
    found = planetary.surface_rate_terms(CRATER, (grid[:, ::2], np.zeros((3, 2))), reference, "TT")
    assert {part.shape for part in found} == {(3, 2)}
    assert np.array_equal(grid, before)
    scalar = planetary.surface_rate_terms(CRATER, (np.array(0), np.array(0.0)), reference, "TT")
    assert scalar.total == found.total[0, 0]
    tdb = daily("2020-01-01", 3)
    with pytest.raises(ScaleMismatch, match="not on the Moon"):
        planetary.surface_rate_terms(PLAIN, tdb, reference, "TCL")
    with pytest.raises(ScaleMismatch, match="no event has a TT") as caught:
        planetary.surface_rate_terms(PLAIN, tdb, reference, "TT", simultaneity="TT")
    assert caught.value.mask is not None
    assert caught.value.mask.all()
    for bad in ("UTC", None, 3):
        with pytest.raises(InvalidInput, match="compared with TT, TCG"):
            planetary.surface_rate_terms(PLAIN, tdb, reference, bad)  # type: ignore[arg-type]
    with pytest.raises(InvalidInput, match="SurfaceSite"):
        planetary.surface_rate_terms("moon", tdb, reference)  # type: ignore[arg-type]
    with pytest.raises(InvalidInput, match="simultaneity"):
        planetary.surface_rate_terms(CRATER, tdb, reference, "TT", simultaneity="GPS")  # type: ignore[arg-type]
    with pytest.raises(OutOfSpan):
        planetary.surface_rate_terms(CRATER, daily("2070-01-01", 3), reference)
    assert planetary.surface_rate_terms(PLAIN, tdb, reference, "own").total == pytest.approx(
        -PLAIN.gravity_potential_m2_s2() / C2, rel=1e-7, abs=1e-20
    )


def test_what_a_fit_refuses() -> None:
    t = np.arange(1000) * 86400.0
    with pytest.raises(InvalidInput, match="cannot be told"):
        fit_periodic(t, t * 0.0, {"a": 30.0, "b": 30.2})
    with pytest.raises(InvalidInput, match="come round"):
        fit_periodic(t, t * 0.0, {"a": 3000.0})
    with pytest.raises(InvalidInput, match="less than twice"):
        fit_periodic(t, t * 0.0, {"a": 1.5})
    with pytest.raises(InvalidInput, match="finite"):
        fit_periodic(t, np.full(1000, np.nan), {"a": 30.0})
    with pytest.raises(InvalidInput, match="samples"):
        fit_periodic(t[:3], t[:3], {"a": 30.0})
    found = fit_periodic(t, 1e-3 + 2e-10 * t + 5e-7 * np.cos(2 * np.pi * t / (30.0 * 86400.0) - 0.7), {"a": 30.0})
    assert found.rate == pytest.approx(2e-10, rel=1e-9, abs=1e-20)
    assert found.offset_s == pytest.approx(1e-3, rel=1e-9, abs=1e-14)
    assert found.terms[0].phase_rad == pytest.approx(0.7, rel=1e-6, abs=1e-9)


def test_dates_of_a_summary(reference: tscale.ReferenceData) -> None:
    for start, stop, words in (
        ("2020-01-01", "2019-01-01", "two steps"),
        ("2020-01-01", 3, "ISO 8601"),
        (tscale.Instants.from_iso("2020-01-01", scale="UT1"), "2021-01-01", "UT1"),
    ):
        with pytest.raises(InvalidInput, match=words):
            planetary.coordinate_time_terms("moon", reference, start, stop)  # type: ignore[arg-type]
    with pytest.raises(InvalidInput, match="no list of periods for venus"):
        planetary.coordinate_time_terms("venus", reference, "2000-01-01", "2020-01-01")
    with pytest.raises(InvalidInput, match="compared with TT, TDB or TCB"):
        planetary.coordinate_time_terms("moon", reference, "2000-01-01", "2020-01-01", against="TAI")  # type: ignore[arg-type]
    scales = [tscale.Instants.from_iso("2000-01-01", scale=scale) for scale in ("TT", "TCB", "UTC")]
    rates = [planetary.coordinate_time_terms("moon", reference, t, "2020-01-01").us_per_day for t in scales]
    assert np.ptp(rates) < 1e-4
    rate = planetary.coordinate_time_terms("venus", reference, "2000-01-01", "2020-01-01", periods_d={"year": 224.701})
    assert exact.from_seconds(rate.rate) is not None
    assert rate.rate < 0.0
