"""The rate of a clock near the Earth, term by term, against the metric itself, published figures and other frames."""

from __future__ import annotations

from decimal import Decimal, localcontext
from fractions import Fraction

import numpy as np
import pytest

import tscale
from tscale import exact
from tscale.constants import C_M_S, L_B, L_G
from tscale.earth.gravity import (
    EARTH_ZONAL,
    ZonalField,
    geopotential_number_m2_s2,
    ground_tide_factor,
    permanent_tide_m2_s2,
    tidal_potential_m2_s2,
)
from tscale.earth.moving import bcrs_state
from tscale.transforms.barycentric import tdb_from_tt
from tscale.transforms.proper_bcrs import barycentric_terms
from tscale.transforms.proper_models import is_near_earth, model_of
from tscale.transforms.proper_scales import rate_against, tdb_per_tt
from tscale.transforms.proper_tides import bulge_m2_s2
from tscale.transforms.proper_time import rate_terms

C2 = C_M_S**2
T = tscale.Instants.from_iso("2021-05-03T00:00:00", scale="TT").shifted(np.arange(40) * 7.3e4)


def levelled(number: float = 5400.0, lat_deg: float = 48.0) -> tscale.Site:
    return tscale.Site.from_geodetic("hill", 11.3, lat_deg, 590.0, geopotential_number_m2_s2=number)


def orbit(a_m: float, e: float = 0.01) -> tscale.Trajectory:
    return tscale.Trajectory.from_kepler(T[0], a_m, e, 55.0, 10.0, 20.0, 30.0, name="orbit")


@pytest.mark.parametrize("a_m", [6.8e6, 2.656e7, 3.8e8])
def test_the_terms_are_those_of_the_metric(reference: tscale.ReferenceData, a_m: float) -> None:
    # d(tau)/dT = sqrt(-G00 - Gij v^i v^j/c^2) with the metric of IAU 2000 B1.3, in 50 digits.
    clock = orbit(a_m)
    found = rate_terms(clock, T.pair, reference)
    _, v = clock.gcrs(T.pair, reference)
    for i in range(0, 40, 13):
        with localcontext() as context:
            context.prec = 50
            square = sum(Decimal(float(x)) ** 2 for x in v[i]) / Decimal(C2)
            potential = -Decimal(float(found.gravitational[i])) - Decimal(float(found.tidal[i]))
            g00, gij = 1 - 2 * potential + 2 * potential**2, 1 + 2 * potential
            rate = (g00 - gij * square).sqrt() - 1
        # Terms of order c^-6 are 4e-28; float64 holds terms of 7e-10 to 1e-25.
        assert float(rate - Decimal(float(found.total[i]))) == pytest.approx(0.0, abs=3e-25)


def test_a_levelled_clock_runs_by_its_geopotential_number(reference: tscale.ReferenceData) -> None:
    # By the definition of TT: 1 + C/c^2 (IAU 2000 B1.9), but for the second order and tides.
    clock = levelled()
    found = rate_terms(clock, T.pair, reference, tides=False)
    assert np.array_equal(found.tidal, np.zeros(40))
    np.testing.assert_allclose(found.kinematic + found.gravitational, (5400.0 - 62636856.0) / C2, rtol=0, atol=2e-25)
    # -(v^4/8 + 3 v^2 U/2 - U^2/2)/c^4: U^2/2 is 2.43e-19, and v^2 = (310 m/s)^2.
    assert found.second_order == pytest.approx(2.41e-19, abs=1e-21)
    against_tt = tscale.proper_rate(clock, T, tides=False)
    np.testing.assert_allclose(
        against_tt, 5400.0 / C2 + found.second_order, rtol=0, atol=1e-20
    )  # W0/c^2 is L_G to 6e-21
    # v is that of the parallel, 7.292115e-5 rad/s times its radius; the day's length varies it by 5e-8.
    across = np.hypot(*clock.position_m[:2]) * 7.292115147e-5
    np.testing.assert_allclose(found.kinematic, -(across**2) / (2 * C2), rtol=1e-5)


def test_a_height_stands_for_a_geopotential_number(reference: tscale.ReferenceData) -> None:
    high = tscale.Site.from_geodetic("hill", 11.3, 48.0, 590.0, height_above_geoid_m=545.0)
    number = float(geopotential_number_m2_s2(545.0, 48.0))
    both = tscale.Site.from_geodetic(
        "hill", 11.3, 48.0, 590.0, height_above_geoid_m=545.0, geopotential_number_m2_s2=number + 1.0
    )
    one, two = tscale.proper_rate(high, T), tscale.proper_rate(both, T)
    # A number that is given counts before a height: 1 m2/s2 is 1.1127e-17.
    np.testing.assert_allclose(two - one, 1.0 / C2, rtol=0, atol=1e-24)


def test_a_site_in_a_field(reference: tscale.ReferenceData) -> None:
    # The bare site's potential from the zonal field; its geoid is within 120 m (1.3e-14) of the true one.
    bare = tscale.Site.from_geodetic("hill", 11.3, 48.0, 590.0)
    found = rate_terms(bare, T.pair, reference, gravity=EARTH_ZONAL, tides=False)
    np.testing.assert_allclose(found.gravitational, -EARTH_ZONAL.potential_m2_s2(bare.position_m) / C2, rtol=1e-15)
    level = tscale.Site.from_geodetic("hill", 11.3, 48.0, 590.0, height_above_geoid_m=590.0)
    difference = tscale.proper_rate(bare, T, gravity=EARTH_ZONAL) - tscale.proper_rate(level, T)
    assert np.max(np.abs(difference)) < 1.3e-14


def test_tides_on_the_ground(reference: tscale.ReferenceData) -> None:
    clock = levelled()
    r, _ = clock.gcrs(T.pair, reference)
    direct, mean = tidal_potential_m2_s2(r, T.pair, reference), permanent_tide_m2_s2(r)
    share = ground_tide_factor()
    expected = {
        "zero_tide": share * (direct - mean) + mean,
        "mean_tide": share * (direct - mean),
        "tide_free": share * direct,
    }
    for system, potential in expected.items():
        found = rate_terms(clock, T.pair, reference, tides=system).tidal  # type: ignore[arg-type]
        np.testing.assert_allclose(found, -potential / C2, rtol=0, atol=1e-26)
    np.testing.assert_allclose(
        rate_terms(clock, T.pair, reference).tidal, -expected["zero_tide"] / C2, rtol=0, atol=1e-26
    )
    # "Up to 3 m2/s2, 3.3e-17" (project page of a national laboratory on clocks and tides): within a factor of 1.5.
    dense = T[0].shifted(np.arange(0, 30 * 86400, 1800.0))
    swing = tscale.proper_rate(levelled(lat_deg=20.0), dense) - 5400.0 / C2
    assert 3.3e-17 / 1.5 < np.max(np.abs(swing)) < 3.3e-17 * 1.5


@pytest.mark.parametrize(("a_m", "bulge"), [(6.8e6, 0.219), (2.656e7, 2.4e-4)])
def test_tides_in_orbit(reference: tscale.ReferenceData, a_m: float, bulge: float) -> None:
    # The Earth's bulges add k2 (R/r)^5 = 0.3019 (6378/6800)^5 of what is not permanent.
    clock = orbit(a_m, 0.0)
    r, _ = clock.gcrs(T.pair, reference)
    direct, mean = tidal_potential_m2_s2(r, T.pair, reference), permanent_tide_m2_s2(r)
    found = rate_terms(clock, T.pair, reference).tidal * -C2
    np.testing.assert_allclose(found, direct + bulge * (direct - mean), rtol=0, atol=3e-3 * np.max(np.abs(direct)))
    if a_m > 2e7:  # "below 1e-15 in frequency" (IERS Conventions 2010, 10.2)
        assert np.max(np.abs(found)) / C2 < 1e-15


def test_a_zonal_field_needs_no_more_than_the_pole(reference: tscale.ReferenceData) -> None:
    # The same potential by the full rotation to the ITRS: the pole lies within 0.6" of the CIP, 2e-18 in J2.
    class Turned:
        name = "turned"

        def potential_m2_s2(self, r_m: np.ndarray) -> np.ndarray:
            return EARTH_ZONAL.potential_m2_s2(r_m)

        def acceleration_m_s2(self, r_m: np.ndarray) -> np.ndarray:
            return EARTH_ZONAL.acceleration_m_s2(r_m)

    clock = orbit(6.8e6)
    by_pole = rate_terms(clock, T.pair, reference).gravitational
    by_rotation = rate_terms(clock, T.pair, reference, gravity=Turned()).gravitational
    assert 1e-21 < np.max(np.abs(by_pole - by_rotation)) < 3e-18
    without = rate_terms(clock, T.pair, reference, gravity=ZonalField("point", EARTH_ZONAL.gm_m3_s2, 6378136.3))
    assert np.ptp(by_pole - without.gravitational) > 3e-13  # what J2 is worth there


@pytest.mark.parametrize(
    ("a_m", "within"),
    [(6.8e6, 4e-19), (2.656e7, 4e-19), (4.2e7, 4e-19), (1.0e8, 4e-19), (3.8e8, 1e-18), (1.5e9, 4e-18), (8e9, 2e-17)],
)
def test_the_barycentric_metric_says_the_same(reference: tscale.ReferenceData, a_m: float, within: float) -> None:
    # d(tau)/d(TCB) by way of TCG and the time ephemeris, and straight from the barycentric metric with the Earth as a
    # point mass: two ways that share no formula. The yielding of the Earth, which is no point, is taken off. What is
    # left grows with the distance: roundings of the topocentric terms and what they leave out.
    t = T[0].shifted(np.arange(400) * 1.7e5)
    gm = reference.ephemeris.gm_m3_s2("earth") * float((1 - L_G) / (1 - L_B))
    clock = orbit(a_m, 0.02)
    r, _ = clock.gcrs(t.pair, reference)
    parts = rate_terms(clock, t.pair, reference, gravity=ZonalField("point", gm, 6378136.3))
    total = parts.total + bulge_m2_s2(r, t.pair, reference) / C2
    by_tcg = rate_against(total, "TCB", clock, t.pair, reference)
    tdb = tdb_from_tt(t.pair, reference, clock)
    direct = barycentric_terms(*bcrs_state(clock, tdb, reference), tdb, reference.ephemeris).total
    assert np.max(np.abs(direct - by_tcg)) < within


def test_an_orbit_in_the_tides_of_the_planets(reference: tscale.ReferenceData) -> None:
    # Where the planets begin to count the rate has no step that a quadrature would see (1e-19), and an orbit across it
    # is integrated.
    high = orbit(3.0e7, 0.1)
    t = T[0].shifted(np.linspace(0.0, 5.2e4, 400))
    found = rate_terms(high, t.pair, reference).tidal * -C2
    r, _ = high.gcrs(t.pair, reference)
    two = tidal_potential_m2_s2(r, t.pair, reference)
    beside = np.abs(found - two - bulge_m2_s2(r, t.pair, reference)) / C2
    inside = np.linalg.norm(r, axis=-1) < 3e7
    assert inside.any()
    assert not inside.all()
    assert beside[inside].max() < 1e-24
    assert 1e-22 < beside.max() < 1e-19
    one = tscale.compare_clocks(high, levelled(), T[0], T[0].shifted(5.2e4))
    assert np.isfinite(one.accumulated_s)


@pytest.mark.parametrize("a_m", [6.8e6, 2.656e7, 1e8])
def test_an_orbit_by_its_barycentric_states(reference: tscale.ReferenceData, a_m: float) -> None:
    # The same clock by elements in the GCRS and by BCRS states every 10 s, with the Earth's figure (3.1e-13 in the low
    # orbit). What differs: GM of the Earth, 4e-10 (2e-19), and the topocentric terms as above.
    clock = orbit(a_m, 0.001)
    tdb = tscale.chain("TT", "TDB", site=clock)(T[0]).at(None).shifted(np.arange(0.0, 3000.0, 10.0))
    path = tscale.Trajectory.from_states(tdb, *bcrs_state(clock, tdb.pair, reference), frame="BCRS", name="states")
    t = tdb[20:-20].at("TOPOCENTER")
    for against in ("TCB", "TT"):
        difference = tscale.proper_rate(path, t, against) - tscale.proper_rate(clock, t, against)
        assert np.max(np.abs(difference)) < 4e-19
    if a_m < 7e6:
        assert np.max(np.abs(tscale.proper_ledger(path, t)["figure of the Earth"])) > 1e-13
    assert tscale.compare_clocks(path, clock, t[0], t[-1]).rate == pytest.approx(0.0, abs=4e-19)


def test_a_spacecraft_about_the_moon_has_the_tt_of_its_events(reference: tscale.ReferenceData) -> None:
    epoch = tscale.Instants.from_iso("2024-03-01", scale="TDB")
    orbiter = tscale.Trajectory.from_kepler(epoch, 1.8374e6, 0.0, 90.0, 0.0, 0.0, 0.0, center="moon", name="orbiter")
    t = epoch.shifted(np.arange(0.0, 28 * 86400.0, 20011.0)).at("TOPOCENTER")
    by_tdb, by_tt = (tscale.proper_rate(orbiter, t, against) for against in ("TDB", "TT"))
    slow = tscale.chain("TDB", "TT", site=orbiter).rate(t)
    # 1e-16: (1 + by_tdb)/(1 + slow) - 1.
    assert np.max(np.abs((by_tdb - slow) / (1.0 + slow) - by_tt)) < 1e-16
    # The same path by its geocentric states: another model, which shares no formula with this one.
    tt = tscale.Instants.from_iso("2024-03-01", scale="TT").shifted(np.arange(0.0, 8000.0, 20.0))
    states = tscale.Trajectory.from_states(tt, *orbiter.gcrs(tt.pair, reference), name="geocentric")
    same = tt[20:-20:7]
    # Positions at the Moon, 3.8e8 m, come from barycentric ones of 1.5e11 m, rounded to 1.5e-5 m: 2e-22.
    assert np.max(np.abs(tscale.proper_rate(states, same) - tscale.proper_rate(orbiter, same))) < 1e-18


def test_which_tt_goes_with_barycentric_states(reference: tscale.ReferenceData) -> None:
    t = tscale.Instants.from_iso("2024-03-01", scale="TDB").shifted(np.arange(0.0, 864000.0, 14400.0))
    earth_r, earth_v = reference.ephemeris.state("earth", t.pair)
    way = earth_r / np.linalg.norm(earth_r, axis=-1, keepdims=True)

    def model(distance_m: np.ndarray | float, speed_m_s: float = 0.0, **options):
        x = earth_r + way * np.reshape(distance_m, (-1, 1))
        v = earth_v + way * speed_m_s + 2e-7 * np.cross([0.0, -0.398, 0.917], way) * np.reshape(distance_m, (-1, 1))
        path = tscale.Trajectory.from_states(t, x, v, frame="BCRS", degree=3, name="probe")
        return model_of(path, None, True)

    assert model(1.5e9).dates_own_event
    assert not model(2e10).dates_own_event
    # One that goes from here to beyond is dated by the geocentre all along.
    assert not model(5e9 + 1e4 * np.arange(0.0, 864000.0, 14400.0), 1e4).dates_own_event

    class Probe:
        name, geocentric, scale = "probe", False, "TDB"

        def gcrs(self, tt, reference):
            raise AssertionError

    # An observer of no pieces that says it is not geocentric is not taken for one in the Earth's field.
    assert not is_near_earth(Probe())
    assert not model_of(Probe(), None, True).dates_own_event


def test_a_set_rate_multiplies() -> None:
    # (1 + y)(1 + offset) - 1 in fractions: of y = -1.5e-8 the product is 1.5e-11.
    made = tscale.ProperClock("x", levelled(), T[0], rate_offset=1e-3)
    plain, found = (float(tscale.proper_rate(clock, T[1], "TCB")) for clock in (levelled(), made))
    expected = (1 + Fraction(plain)) * (1 + Fraction(1e-3)) - 1
    assert abs(float(Fraction(found) - expected)) < 3e-19
    assert float(tscale.proper_ledger(made, T[1], "TCB").total) == pytest.approx(found, abs=3e-19)


@pytest.mark.parametrize("against", ["TT", "TCG", "TDB", "TCB", "UTC", "GPS"])
@pytest.mark.parametrize("kind", ["ground", "orbit"])
def test_rates_against_other_scales(reference: tscale.ReferenceData, against: str, kind: str) -> None:
    # The change of the chain's own offset between the scales, by five-point differences. Roundings of dates (2e-16 s)
    # leave 1e-17 over 40 s and 4e-17 over 10 s; the fifth derivative of the orbit's 2 us leaves 1e-18.
    clock, step = (levelled(), 40.0) if kind == "ground" else (orbit(6.8e6), 10.0)
    t = T[7]
    given, tcg = (float(tscale.proper_rate(clock, t, scale)) for scale in (against, "TCG"))
    points = t.shifted(step * np.array([-2.0, -1.0, 1.0, 2.0]))

    def slope(scale: str) -> float:
        out = points if scale == "TT" else tscale.chain("TT", scale, site=clock)(points)
        moved = [exact.subtract(x.pair, (x.whole[:1], x.fraction[:1])) for x in (out, points)]
        gain = exact.seconds(exact.subtract(moved[0], moved[1]))
        return float((gain[0] - 8 * gain[1] + 8 * gain[2] - gain[3]) / (12 * step))

    # (1 + rate against X) (1 + d(X)/d(TT) - 1) is d(tau)/d(TT) for every X.
    one, two = given + slope(against) + given * slope(against), tcg + slope("TCG") + tcg * slope("TCG")
    assert one == pytest.approx(two, abs=1e-17 if kind == "ground" else 4e-17)


def test_the_rate_of_tdb_along_a_path_is_that_of_the_chain(reference: tscale.ReferenceData) -> None:
    clock = orbit(6.8e6)
    chain = tscale.chain("TT", "TDB", site=clock)
    # The chain's own derivative leaves out dTT/dTDB of the orbit's velocity: 7e-18 in a low orbit.
    np.testing.assert_allclose(tdb_per_tt(clock, T.pair, reference), chain.rate(T), rtol=0, atol=1e-17)
    np.testing.assert_allclose(
        tdb_per_tt(None, T.pair, reference), tscale.chain("TT@GEOCENTER", "TDB@GEOCENTER").rate(T), rtol=0, atol=1e-24
    )


def test_shapes_and_inputs() -> None:
    clock = levelled()
    grid = T.reshape(8, 5)
    before = grid.whole.copy(), grid.fraction.copy()
    rates = tscale.proper_rate(clock, grid)
    assert rates.shape == (8, 5)
    assert rates.dtype == np.float64
    assert np.array_equal(rates[3, 2], tscale.proper_rate(clock, grid[3, 2]))
    assert tscale.proper_rate(clock, grid[::3, ::-2]).shape == (3, 3)
    assert np.array_equal(tscale.proper_rate(clock, grid[::3, ::-2]), rates[::3, ::-2])
    assert tscale.proper_rate(clock, T[0]).shape == ()
    assert np.array_equal(before[0], grid.whole)
    assert np.array_equal(before[1], grid.fraction)
    ledger = tscale.proper_ledger(clock, grid)
    assert ledger.shape == (8, 5)
    assert list(ledger) == [
        "kinematic",
        "gravitational",
        "tidal",
        "second order",
        "TCG against TT",
    ]
    np.testing.assert_allclose(ledger.total, rates, rtol=0, atol=1e-25)
    text = ledger.table(3)
    assert "hill against TT" in text
    assert len(text.splitlines()) == 9
    with pytest.raises(tscale.errors.InvalidInput, match="row 40"):
        ledger.table(40)
    with pytest.raises(tscale.errors.InvalidInput, match="no term 'tide'"):
        ledger["tide"]


def test_dates_on_any_scale_are_the_same_dates() -> None:
    clock = levelled()
    rates = tscale.proper_rate(clock, T)
    for scale in ("UTC", "TCG", "TDB", "TCB", "GPS"):
        dates = tscale.chain("TT", scale, site=clock)(T)
        np.testing.assert_allclose(tscale.proper_rate(clock, dates), rates, rtol=0, atol=1e-26)


@pytest.mark.parametrize(
    ("act", "error", "match"),
    [
        (
            lambda: tscale.proper_rate(tscale.Site.from_geodetic("bare", 0, 0, 5.0), T),
            "MissingPiece",
            "ellipsoid height",
        ),
        (lambda: tscale.proper_rate(levelled(), T, "UT1"), "InvalidInput", "against TT"),
        (lambda: tscale.proper_rate(levelled(), T, "TTX"), "InvalidInput", "unknown scale"),
        (lambda: tscale.proper_rate(levelled(), T, 3), "InvalidInput", "against=3"),  # type: ignore[arg-type]
        (lambda: tscale.proper_rate("moon", T), "InvalidInput", "a Site, a Trajectory"),  # type: ignore[arg-type]
        (lambda: tscale.proper_rate(levelled(), 5.0), "InvalidInput", "from_iso"),  # type: ignore[arg-type]
        (lambda: tscale.proper_rate(levelled(), T, gravity=9.81), "InvalidInput", "gravity= takes"),  # type: ignore[arg-type]
        (lambda: tscale.proper_rate(levelled(), T, tides="wet"), "InvalidInput", "tide_free"),  # type: ignore[arg-type]
        (lambda: tscale.proper_rate(levelled(), T.at("GEOCENTER")), "ScaleMismatch", "at the clock"),
        (lambda: tscale.proper_rate(orbit(2.0e10), T), "ScaleMismatch", "does not reach"),
        (lambda: tscale.proper_rate(levelled(), T, reference="de440"), "InvalidInput", "ReferenceData"),  # type: ignore[arg-type]
        (
            lambda: tscale.proper_rate(levelled(), tscale.Instants.from_seconds(0, 0.0, scale="CLOCK(a)")),
            "InvalidInput",
            "coordinate time",
        ),
        (
            lambda: tscale.proper_rate(levelled(), tscale.Instants.from_seconds(0, 0.0, scale="TT(BIPM30)")),
            "MissingPiece",
            "no table",
        ),
    ],
)
def test_errors_teach(act, error: str, match: str) -> None:
    with pytest.raises(getattr(tscale.errors, error), match=match):
        act()


def test_a_clock_inside_the_earth_is_refused() -> None:
    with pytest.raises(tscale.errors.InvalidInput, match="from the centre"):
        tscale.proper_rate(orbit(5.0e6, 0.0), T)


@pytest.mark.parametrize("system", ["tide_free", "zero_tide", "mean_tide"])
def test_what_a_field_holds_of_the_permanent_tide(reference: tscale.ReferenceData, system: str) -> None:
    # A field of the zero tide holds k2 V0 already, one of the mean tide V0 itself as well. A site's ITRF place is
    # tide-free.
    class Stated:
        name = "stated"
        tide_system = system
        potential_m2_s2 = staticmethod(EARTH_ZONAL.potential_m2_s2)
        acceleration_m_s2 = staticmethod(EARTH_ZONAL.acceleration_m_s2)

    held = {"tide_free": 0.0, "zero_tide": 0.30190, "mean_tide": 1.30190}[system]
    bare = tscale.Site.from_geodetic("hill", 11.3, 48.0, 590.0)
    r, _ = bare.gcrs(T.pair, reference)
    direct, mean = tidal_potential_m2_s2(r, T.pair, reference), permanent_tide_m2_s2(r)
    found = rate_terms(bare, T.pair, reference, gravity=Stated()).tidal * -C2
    np.testing.assert_allclose(found, ground_tide_factor() * direct - held * mean, rtol=0, atol=1e-9)
    clock = orbit(6.8e6)
    r, _ = clock.gcrs(T.pair, reference)
    direct, mean = tidal_potential_m2_s2(r, T.pair, reference), permanent_tide_m2_s2(r)
    bulge = 0.30190 * (6378136.3 / np.linalg.norm(r, axis=-1)) ** 5
    held_there = {"tide_free": 0.0, "zero_tide": bulge, "mean_tide": 1.0 + bulge}[system]
    found = rate_terms(clock, T.pair, reference, gravity=Stated()).tidal * -C2
    np.testing.assert_allclose(found, (1.0 + bulge) * direct - held_there * mean, rtol=0, atol=1e-9)
