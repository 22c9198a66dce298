"""There and back: every ordered pair of scales closes to 1 fs, a wavefront to 0.1 ps."""

from __future__ import annotations

import itertools

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import tscale
from tscale import exact

from .strategies import END_2059, START_1962, dates, fractions, wholes

SITE = tscale.Site.from_itrf("test site", 4_051_700.0, 417_300.0, 4_890_200.0)
SCALES = ("UTC", "TAI", "TT", "TCG", "TCB", "TDB", "GPS", "GST", "BDT", "GLONASS")
PAIRS = list(itertools.permutations(SCALES, 2))
UT1_END = 870_000_000  # 2027-07, inside the Earth orientation table

pytestmark = pytest.mark.filterwarnings("ignore::tscale.errors.ExtrapolationWarning")


def misclosure_s(chain: tscale.Chain, t: tscale.Instants) -> float:
    back = chain.inverse(chain(t))
    return float(np.max(np.abs(exact.seconds(exact.subtract(back.pair, t.pair)))))


@pytest.mark.parametrize("pair", PAIRS, ids="-".join)
@pytest.mark.parametrize("place", ["TOPOCENTER", "GEOCENTER"])
def test_every_ordered_pair_closes(pair: tuple[str, str], place: str) -> None:
    # 400 dates per pair at the hazards; 0.34 fs is three roundings of a fraction near 1 (1 fs is allowed).
    @given(whole=st.lists(wholes(), min_size=40, max_size=40), fraction=st.lists(fractions, min_size=40, max_size=40))
    @settings(max_examples=10)
    def run(whole: list[int], fraction: list[float]) -> None:
        t = tscale.Instants.from_seconds(whole, fraction, scale=pair[0])
        assert misclosure_s(chain, t) <= 0.34e-15

    site = SITE if place == "TOPOCENTER" else None
    chain = tscale.chain(f"{pair[0]}@{place}", f"{pair[1]}@{place}", site=site)
    run()


@pytest.mark.parametrize("other", SCALES)
@pytest.mark.parametrize("onward", [True, False])
def test_ut1_closes(other: str, onward: bool) -> None:
    start, end = ("UT1", other) if onward else (other, "UT1")

    @given(whole=st.lists(wholes(end=UT1_END), min_size=40, max_size=40), fraction=fractions)
    def run(whole: list[int], fraction: float) -> None:
        t = tscale.Instants.from_seconds(whole, fraction, scale=start)
        assert misclosure_s(chain, t) <= 0.45e-15

    chain = tscale.chain(start, end, site=SITE)
    run()


@pytest.mark.parametrize(("start", "end"), [("CLOCK(maser)", "TCB"), ("TCB", "CLOCK(maser)"), ("TT(BIPM25)", "TDB")])
def test_clocks_and_realisations_close(start: str, end: str) -> None:
    epoch = tscale.Instants.from_mjd(58000 + 5 * np.arange(201), 0.0, scale="UTC")
    wander = 1e-6 + 1e-9 * np.cumsum(np.sin(np.arange(201) ** 2))
    log = tscale.ClockLog.from_rows("maser", epoch, wander, np.full(201, 1e-10))
    table = tscale.TTBIPM.from_rows("TT(BIPM25)", 58000 + 10 * np.arange(100), 27.67e-6 + 1e-11 * np.arange(100))
    reference = tscale.ReferenceData.load(tt_bipm=table)
    rng = np.random.default_rng(6)
    whole, fraction = rng.integers(560_000_000, 620_000_000, 50_000), rng.random(50_000)
    chain = tscale.chain(start, end, site=SITE, clocks=[log], reference=reference)
    assert misclosure_s(chain, tscale.Instants.from_seconds(whole, fraction, scale=start)) <= 0.6e-15


@given(
    t=dates("UTC"), ra=st.floats(0.0, 360.0), dec=st.floats(-90.0, 90.0), parallax=st.sampled_from([0.0, 1.0, 768.0])
)
@settings(max_examples=200)
@pytest.mark.parametrize("end", ["TDB@BARYCENTER", "TCB@BARYCENTER", "TDB@GEOCENTER", "UTC@GEOCENTER"])
def test_a_wavefront_closes(end: str, t: tscale.Instants, ra: float, dec: float, parallax: float) -> None:
    # Positions at 1.5e11 m have an ulp of 0.1 ps, but dates 1e-16 s apart see the same rounding: 2 fs.
    source = tscale.Source(ra, dec, pm_ra_cosdec_mas_yr=-800.0, pm_dec_mas_yr=10300.0, parallax_mas=parallax)
    chain = tscale.chain("UTC@TOPOCENTER", end, site=SITE, source=source)
    assert misclosure_s(chain, t) <= 2e-15


def test_a_wavefront_closes_over_the_whole_span() -> None:
    rng = np.random.default_rng(2)
    n = 100_000
    t = tscale.Instants.from_seconds(rng.integers(START_1962, END_2059, n), rng.random(n), scale="UTC")
    source = tscale.Source(266.4, -29.0, parallax_mas=0.12, name="near the ecliptic")
    assert misclosure_s(tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=source), t) <= 1e-15


@given(dates("UTC", end=UT1_END))
def test_the_ledger_adds_up(t: tscale.Instants) -> None:
    # Label of the end minus label of the start, both as exact pairs: what the terms must add up to, to 1 fs.
    chain = tscale.chain("UTC", "TDB", site=SITE)
    out = chain(t)
    ledger = chain.ledger(t)
    tai_minus_utc = tscale.LeapSeconds.default().tai_minus_utc(t.pair)
    labels = exact.add_seconds(exact.subtract(out.pair, exact.add(t.pair, exact.normalise(32, 0.0))), tai_minus_utc)
    assert abs(exact.seconds(exact.subtract(ledger.total_exact, labels))) <= 1e-15
    assert np.sum(list(ledger.values())) == pytest.approx(float(ledger.total), abs=3e-14)  # float64 sum of 70 s


def test_a_reversed_chain_is_the_inverse() -> None:
    t = tscale.Instants.from_iso("1995-06-30T12:00:00.125", scale="UTC")
    onward, backward = tscale.chain("UTC", "TCB", site=SITE), tscale.chain("TCB", "UTC", site=SITE)
    out = onward(t)
    assert (backward(out) == onward.inverse(out)).all()
    forth, back = onward.ledger(t), backward.ledger(out)
    assert float(forth.total) == pytest.approx(-float(back.total), abs=1e-14)
    assert set(forth) == {"TAI - UTC", "TT - TAI", "TCG - TT", *list(forth)[3:]}
    assert "UTC - TAI" in back


@pytest.mark.parametrize("a_m", [7.0e6, 4.2e7, 3.8e8, 1.0e9])
def test_moving_observers_close(a_m: float) -> None:
    epoch = tscale.Instants.from_iso("2010-01-01T00:00:00", scale="TT")
    orbit = tscale.Trajectory.from_kepler(epoch, a_m, 0.05, 51.0, 10.0, 20.0, 30.0, name="orbit")
    rng = np.random.default_rng(4)
    t = tscale.Instants.from_seconds(rng.integers(300_000_000, 900_000_000, 2000), rng.random(2000), scale="TT")
    assert misclosure_s(tscale.chain("TT", "TDB", site=orbit), t) <= 1e-15
    source = tscale.Source(120.0, -35.0, parallax_mas=50.0)
    assert misclosure_s(tscale.chain("TT", "TDB@BARYCENTER", site=orbit, source=source), t) <= 2e-15


def test_a_spacecraft_at_another_planet_closes_and_refuses_terrestrial_dates() -> None:
    epoch = tscale.Instants.from_iso("2031-03-01T00:00:00", scale="TDB")
    probe = tscale.Trajectory.from_kepler(epoch, 9.0e6, 0.3, 40.0, 10.0, 20.0, 30.0, center="mars", name="probe")
    t = epoch.shifted(np.linspace(-1e7, 1e7, 500))
    source = tscale.Source(120.0, -35.0)
    chain = tscale.chain("TDB@TOPOCENTER", "TDB@BARYCENTER", site=probe, source=source)
    assert misclosure_s(chain, t) <= 2e-15
    with pytest.raises(tscale.errors.ScaleMismatch, match="TDB or TCB"):
        tscale.chain("TT", "TDB", site=probe)(tscale.Instants.from_iso("2031-03-01", scale="TT"))


def test_both_ends_of_a_barycentric_trajectory_are_reached() -> None:
    knots = tscale.Instants.from_iso("2031-03-01T00:00:00", scale="TDB").shifted(600.0 * np.arange(40))
    probe = tscale.Trajectory.from_kepler(knots[0], 9.0e6, 0.3, 40.0, 10.0, 20.0, 30.0, center="mars")
    r_m, v_m_s = probe.state_bcrs(knots.pair, tscale.ReferenceData.default())
    path = tscale.Trajectory.from_states(knots, r_m, v_m_s, frame="BCRS")
    chain = tscale.chain("TDB@TOPOCENTER", "TDB@BARYCENTER", site=path, source=tscale.Source(120.0, -35.0))
    ends = tscale.Instants.concatenate([knots[:1], knots[-1:], knots[:1].shifted(1e-3), knots[-1:].shifted(-0.1)])
    assert misclosure_s(chain, ends) <= 2e-15
    with pytest.raises(tscale.errors.OutOfSpan):
        chain(knots[-1:].shifted(0.01))
    with pytest.raises(tscale.errors.OutOfSpan):
        chain.inverse(chain(knots[-1:]).shifted(0.01))


def test_the_way_back_at_the_start_of_the_earth_orientation_table() -> None:
    t = tscale.Instants.from_iso("1962-01-01T00:05:00", scale="UTC")
    chain = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=tscale.Source(280.0, -23.0))
    assert misclosure_s(chain, t) <= 1e-15
