"""PROPER(name) in chains: closure to a femtosecond over a year, ledgers that add up, and what is refused."""

from __future__ import annotations

import pickle
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import tscale
from tscale import exact
from tscale.earth.gravity import HarmonicField

from .strategies import fractions

EPOCH = tscale.Instants.from_iso("2023-01-01T00:00:00", scale="UTC")
YEAR_S = 31_557_600
SITE = tscale.Site.from_geodetic("hill", 11.3, 48.0, 590.0, geopotential_number_m2_s2=5400.0)


def orbit(a_m: float, e: float, name: str) -> tscale.Trajectory:
    return tscale.Trajectory.from_kepler(EPOCH, a_m, e, 55.0, 10.0, 20.0, 30.0, name=name)


OBSERVERS = {
    "ground": SITE,
    "navigation": orbit(2.656e7, 0.02, "navigation satellite"),
    "low": orbit(6.9e6, 0.01, "low satellite"),
    "moon": tscale.SurfaceSite("crater", "moon", 20.0, -85.0),
}


def clock(kind: str, **options) -> tscale.ProperClock:
    return tscale.ProperClock("x", OBSERVERS[kind], EPOCH, **options)


CHAINS = {
    (kind, end): tscale.chain("PROPER(x)", end, site=OBSERVERS[kind], clocks=[clock(kind)])
    for kind in OBSERVERS
    for end in ("TCG", "TCB", "UTC")
}


@pytest.mark.parametrize(
    ("kind", "end"),
    [(k, e) for k in OBSERVERS for e in ("TCG", "TCB", "UTC") if e == "TCB" or k in ("ground", "navigation")],
)
@given(whole=st.lists(st.integers(-YEAR_S, YEAR_S), min_size=30, max_size=30), fraction=fractions)
@settings(max_examples=20)
def test_closure_over_a_year(kind: str, end: str, whole: list[int], fraction: float) -> None:
    # 1 fs is allowed; three roundings of a fraction near 1 are 0.34 fs.
    chain = CHAINS[kind, end]
    t = tscale.Instants.from_seconds(725_803_200 + np.array(whole), fraction, scale="PROPER(x)")
    back = chain.inverse(chain(t))
    assert float(np.max(np.abs(exact.seconds(exact.subtract(back.pair, t.pair))))) <= 0.4e-15
    assert back.place == "TOPOCENTER"


@given(
    offset=st.floats(-1e-3, 1e-3) | st.sampled_from([-1e-3, 1e-3, -4.4647e-10, 1e-6]),
    whole=st.lists(st.integers(-YEAR_S, YEAR_S), min_size=5, max_size=5),
    fraction=fractions,
)
@settings(max_examples=25, deadline=None)
def test_a_set_rate_is_exact(offset: float, whole: list[int], fraction: float) -> None:
    # Of a clock that is set fast against one beside it that is not: (1 + offset) of the elapsed time as a fraction of
    # integers, and back, both to 1 fs.
    plain, fast = clock("ground"), tscale.ProperClock("y", SITE, EPOCH, rate_offset=offset)
    chain = tscale.chain("PROPER(x)", "PROPER(y)", site=SITE, clocks=[plain, fast])
    start = CHAINS["ground", "UTC"].inverse(EPOCH)
    t = tscale.Instants.from_seconds(int(start.whole) + np.array(whole), fraction, scale="PROPER(x)")
    out = chain(t)
    assert float(np.max(np.abs(exact.seconds(exact.subtract(chain.inverse(out).pair, t.pair))))) <= 1e-15
    origin = Fraction(int(start.whole)) + Fraction(float(start.fraction))
    for i in range(5):
        before, after = (Fraction(int(x.whole[i])) + Fraction(float(x.fraction[i])) - origin for x in (t, out))
        assert abs(float(after - before * (1 + Fraction(offset)))) <= 1e-15
    apart = exact.subtract(chain.ledger(t).total_exact, exact.subtract(out.pair, t.pair))
    assert np.max(np.abs(exact.seconds(apart))) <= 1e-15


def test_a_set_rate_has_its_own_line() -> None:
    # A year of 1e-3: 31 557.6 s of the clock that the ledger counts to 0.1 fs, none of it under gravity.
    made = clock("ground", rate_offset=1e-3)
    chain = tscale.chain("PROPER(x)", "TCG", site=SITE, clocks=[made])
    t = chain.inverse(tscale.chain("UTC", "TCG", site=SITE)(EPOCH.shifted(float(YEAR_S))))
    c2 = 299792458.0**2
    found, ledger = chain.ledger(t), CHAINS["ground", "TCG"].ledger(CHAINS["ground", "TCG"].inverse(chain(t)))
    assert float(found["set rate offset"]) == pytest.approx(-1e-3 * YEAR_S * (1 + 5400.0 / c2), abs=2e-8)
    assert float(found["gravitational"]) == pytest.approx(float(ledger["gravitational"]), abs=2e-15)


@pytest.mark.parametrize("kind", OBSERVERS)
def test_the_ledger_adds_up(kind: str) -> None:
    t = tscale.Instants.from_seconds(725_803_200 + np.linspace(-3e6, 3e6, 7).astype(int), 0.3, scale="PROPER(x)")
    chain = CHAINS[kind, "TCB"]
    ledger, out = chain.ledger(t), chain(t)
    apart = exact.subtract(ledger.total_exact, exact.subtract(out.pair, t.pair))
    assert np.max(np.abs(exact.seconds(apart))) <= 6e-16  # nine terms, each rounded to 0.1 fs
    assert "set at the coincidence" in ledger
    assert "Einstein integral at the geocentre" in ledger


def test_what_the_ledger_says_of_a_clock_on_the_ground() -> None:
    # 100 days: (W0 - C)/c^2 of it for potential and speed together; C/c^2 of it, 519 ns, against TT.
    t = tscale.chain("UTC", "PROPER(x)", site=SITE, clocks=[clock("ground")])(EPOCH.shifted(8.64e6))
    ledger = CHAINS["ground", "TCG"].ledger(t)
    c2 = 299792458.0**2
    # The gravitational term takes the roundings of all, 0.4 fs.
    both = float(ledger["kinematic"] + ledger["gravitational"])
    assert both == pytest.approx(8.64e6 * (62636856.0 - 5400.0) / c2 / (1 - 6.969290134e-10), abs=4e-16)
    assert abs(float(ledger["tidal"])) < 4e-17 * 8.64e6
    gained = exact.seconds(exact.subtract(t.pair, tscale.chain("UTC", "TT")(EPOCH.shifted(8.64e6)).pair))
    assert float(gained) == pytest.approx(8.64e6 * 5400.0 / c2, abs=3e-17 * 8.64e6)  # tides: 3e-17 at most on average


def test_readings_set_and_default() -> None:
    tt = tscale.chain("UTC", "TT")(EPOCH)
    at_start = tscale.chain("UTC", "PROPER(x)", site=SITE, clocks=[clock("ground")])(EPOCH)
    assert (at_start.whole, at_start.fraction) == (tt.whole, pytest.approx(tt.fraction, abs=2e-16))
    tcg = tscale.chain("UTC", "TCG", site=SITE)(EPOCH)
    by_tcg = tscale.ProperClock("x", SITE, tcg)
    shown = tscale.chain("TCG", "PROPER(x)", site=SITE, clocks=[by_tcg])(tcg)
    assert abs(float(exact.seconds(exact.subtract(shown.pair, tcg.pair)))) <= 2e-16
    reading = tscale.Instants.from_iso("2000-01-01T12:00:05.5", scale="PROPER(x)")
    at_five = tscale.chain("UTC", "PROPER(x)", site=SITE, clocks=[clock("ground", reading=reading)])(EPOCH)
    assert at_five.to_iso(9) == "2000-01-01T12:00:05.500000000"


@pytest.mark.parametrize("scale", ["UTC", "TAI", "TT", "GPS", "TCG", "TCB", "TDB", "UT1"])
def test_a_coincidence_on_any_scale(scale: str) -> None:
    same = tscale.chain("UTC", scale, site=SITE)(EPOCH)
    reading = tscale.Instants.from_seconds(0, 0.0, scale="PROPER(x)")
    made = tscale.ProperClock("x", SITE, same, reading, tides=False)
    later = tscale.chain("UTC", "PROPER(x)", site=SITE, clocks=[made])(EPOCH.shifted(1000.0))
    gained = exact.seconds(exact.subtract(later.pair, exact.normalise(1000, 0.0)))
    # 6.0e-14 of 1000 s, and second order 2e-19 of it; the coincidence itself goes through scales in roundings of 0.1 fs
    # (UT1: interpolated, 5e-16).
    assert float(gained) == pytest.approx(1000.0 * 5400.0 / 299792458.0**2, abs=1.5e-15)


def test_the_site_may_be_left_out() -> None:
    with_site = CHAINS["navigation", "UTC"]
    without = tscale.chain("PROPER(x)", "UTC", clocks=[clock("navigation")])
    t = tscale.Instants.from_iso("2023-04-01T00:00:00", scale="PROPER(x)")
    assert (without(t) == with_site(t)).all()
    assert without(t).place == "TOPOCENTER"
    back = tscale.chain("UTC", "PROPER(x)", clocks=[clock("navigation")])
    assert abs(float(exact.seconds(exact.subtract(back(without(t)).pair, t.pair)))) <= 0.4e-15


def test_the_site_comes_from_a_clock_that_is_meant() -> None:
    # The place of a clock that is no end of the chain is not guessed to be that of the event.
    with pytest.raises(tscale.errors.MissingPiece, match="give site="):
        tscale.chain("UTC", "TDB", clocks=[clock("ground")])
    both = [clock("low"), tscale.ProperClock("y", SITE, EPOCH)]
    chain = tscale.chain("PROPER(y)", "TDB", clocks=both)
    t = tscale.Instants.from_iso("2023-04-01T00:00:00", scale="PROPER(y)")
    given = tscale.chain("PROPER(y)", "TDB", site=SITE, clocks=both)
    assert (chain(t) == given(t)).all()
    assert (chain.inverse(chain(t)).at("TOPOCENTER").minus(t.at("TOPOCENTER"))) == pytest.approx(0.0, abs=0.4e-15)


def test_rate_and_notes() -> None:
    chain = CHAINS["ground", "UTC"]
    t = tscale.Instants.from_iso("2023-04-01T00:00:00", scale="PROPER(x)")
    tt = tscale.chain("PROPER(x)", "TT", site=SITE, clocks=[clock("ground")])(t)
    own = tscale.proper_rate(SITE, tt)
    assert float(chain.rate(t)) == pytest.approx(float(-own / (1 + own)), abs=1e-24)
    assert "potential at hill from its geopotential number" in chain.notes(t)
    assert CHAINS["low", "UTC"].notes(t)[0] == "potential at low satellite from Earth J2..J6"


def test_uncertainty_of_the_potential_grows_with_time() -> None:
    made = clock("ground", geopotential_sigma_m2_s2=0.3)
    chain = tscale.chain("PROPER(x)", "TT", site=SITE, clocks=[made])
    start = tscale.chain("UTC", "PROPER(x)", site=SITE, clocks=[made])(EPOCH)
    sigma = chain.uncertainty_s(start.shifted(np.array([-1e6, 0.0, 2e6])))["geopotential at hill"]
    np.testing.assert_allclose(sigma, 0.3 / 299792458.0**2 * np.array([1e6, 0.0, 2e6]), rtol=1e-9, atol=1e-28)
    assert not CHAINS["ground", "TCG"].uncertainty_s(start)


def test_a_free_clock_beside_a_log() -> None:
    epoch = tscale.Instants.from_mjd(59900 + 10 * np.arange(30), 0.0, scale="UTC")
    log = tscale.ClockLog.from_rows("maser", epoch, np.linspace(0.0, 1e-6, 30), np.full(30, 1e-10))
    chain = tscale.chain("CLOCK(maser)", "PROPER(x)", site=SITE, clocks=[log, clock("ground")])
    t = tscale.Instants.from_iso("2023-02-01T00:00:00", scale="CLOCK(maser)")
    back = chain.inverse(chain(t))
    assert abs(float(exact.seconds(exact.subtract(back.pair, t.pair)))) <= 0.6e-15
    assert str(chain).startswith("CLOCK(maser)@TOPOCENTER -> UTC@TOPOCENTER")
    assert "PROPER(x)" in str(chain)


def test_chains_travel_between_processes() -> None:
    t = tscale.Instants.from_iso("2023-04-01T00:00:00", scale="PROPER(x)")
    for kind in ("ground", "navigation"):
        chain = CHAINS[kind, "TCB"]
        again = pickle.loads(pickle.dumps(chain))
        assert (again(t) == chain(t)).all()


def test_a_clock_about_the_moon() -> None:
    # TT and TCG of its own events, as on the Moon.
    epoch = tscale.Instants.from_iso("2023-01-01", scale="TDB")
    orbiter = tscale.Trajectory.from_kepler(epoch, 1.8374e6, 0.0, 90.0, 0.0, 0.0, 0.0, center="moon", name="orbiter")
    made = tscale.ProperClock("x", orbiter, epoch)
    t = tscale.Instants.from_iso("2023-01-01", scale="PROPER(x)").shifted(np.linspace(-1e6, 1e6, 50))
    for end in ("TT", "TCB"):
        chain = tscale.chain("PROPER(x)", end, site=orbiter, clocks=[made])
        out = chain(t)
        assert np.max(np.abs(exact.seconds(exact.subtract(chain.inverse(out).pair, t.pair)))) <= 1e-15
        rate = (1 + tscale.proper_rate(orbiter, out, end)) * (1 + chain.rate(t)) - 1
        np.testing.assert_allclose(rate, 0.0, rtol=0, atol=4e-16)  # 1 + 1e-8, rounded
    assert str(chain).startswith("PROPER(x)@TOPOCENTER -> TCG@TOPOCENTER")


def test_a_field_that_does_not_say_its_tide_system() -> None:
    c = np.diag([1.0, 0.0, 0.0])
    stated = [HarmonicField("f", 3.986004415e14, 6378136.3, c, 0.0 * c, *more) for more in ((), ("tide_free",))]
    bare = tscale.Site.from_geodetic("bare", 11.3, 48.0, 590.0)
    t = tscale.Instants.from_iso("2023-04-01T00:00:00", scale="PROPER(x)")
    notes = [
        tscale.chain("PROPER(x)", "TT", clocks=[tscale.ProperClock("x", bare, EPOCH, gravity=field)]).notes(t)
        for field in stated
    ]
    assert ["tide system of the gravity field: not stated" in " ".join(found) for found in notes] == [True, False]


def test_a_clock_that_tcg_does_not_reach() -> None:
    lander = tscale.SurfaceSite("lander", "mars", 137.4, -4.6)
    probe = tscale.Trajectory.from_kepler(
        tscale.Instants.from_iso("2023-01-01", scale="TDB"), 9.1e6, 0.28, 74, 12, 98, 211, center="mars", name="probe"
    )
    for observer in (lander, probe):
        made = tscale.ProperClock("x", observer, tscale.Instants.from_iso("2023-01-01", scale="TDB"))
        chain = tscale.chain("PROPER(x)", "TCB", site=observer, clocks=[made])
        t = tscale.Instants.from_iso("2023-01-01", scale="PROPER(x)").shifted(np.linspace(-1e6, 1e6, 50))
        out = chain(t)
        assert np.max(np.abs(exact.seconds(exact.subtract(chain.inverse(out).pair, t.pair)))) <= 0.4e-15
        apart = exact.subtract(chain.ledger(t).total_exact, exact.subtract(out.pair, t.pair))
        assert np.max(np.abs(exact.seconds(apart))) <= 6e-16
        rate = (1 + tscale.proper_rate(observer, out, "TCB")) * (1 + chain.rate(t)) - 1
        np.testing.assert_allclose(rate, 0.0, rtol=0, atol=3e-16)  # 1 + 1e-8, rounded
        with pytest.raises(tscale.errors.ScaleMismatch, match="TDB or TCB"):
            tscale.chain("PROPER(x)", "TT", site=observer, clocks=[made])(t)


@pytest.mark.parametrize(
    ("act", "error", "match"),
    [
        (
            lambda: tscale.chain("PROPER(y)", "UTC", clocks=[clock("ground")]),
            "MissingPiece",
            r"no clock for PROPER\(y\)",
        ),
        (lambda: tscale.chain("PROPER(x)", "UTC"), "MissingPiece", "ProperClock"),
        (
            lambda: tscale.chain("PROPER(x)", "UTC", site=OBSERVERS["low"], clocks=[clock("ground")]),
            "MissingPiece",
            "clock at hill, and the chain is at low satellite",
        ),
        (
            lambda: tscale.chain("PROPER(x)@GEOCENTER", "UTC", clocks=[clock("ground")]),
            "MissingPiece",
            r"write PROPER\(x\)@TOPOCENTER",
        ),
        (lambda: tscale.chain("PROPER(x)", "UTC", clocks=clock("ground")), "InvalidInput", r"clocks=\[clock\]"),
        (
            lambda: tscale.chain("UTC", "TT", clocks=[clock("ground"), clock("low")]),
            "InvalidInput",
            "a name of its own",
        ),
        (lambda: tscale.ProperClock("a b", SITE, EPOCH), "InvalidInput", "no spaces"),
        (lambda: tscale.ProperClock(3, SITE, EPOCH), "InvalidInput", "is a text"),
        (lambda: tscale.ProperClock("x", "hill", EPOCH), "InvalidInput", "a Site, a Trajectory"),
        (lambda: tscale.ProperClock("x", SITE, "2023-01-01"), "InvalidInput", "one instant"),
        (lambda: tscale.ProperClock("x", SITE, EPOCH.at("GEOCENTER")), "ScaleMismatch", "event at the clock"),
        (lambda: tscale.ProperClock("x", SITE, EPOCH, EPOCH), "ScaleMismatch", r"on PROPER\(x\)"),
        (lambda: clock("ground", rate_offset=0.1), "InvalidInput", "a fraction"),
        (lambda: clock("ground", rate_offset=float("nan")), "InvalidInput", "finite"),
        (lambda: clock("ground", geopotential_sigma_m2_s2=-1.0), "InvalidInput", "0 or more"),
        (lambda: clock("ground", tides="high"), "InvalidInput", "zero_tide"),
        (
            lambda: tscale.ProperClock("x", tscale.Site.from_geodetic("bare", 0, 0, 5.0), EPOCH),
            "MissingPiece",
            "ellipsoid height",
        ),
    ],
)
def test_errors_teach(act, error: str, match: str) -> None:
    with pytest.raises(getattr(tscale.errors, error), match=match):
        act()
