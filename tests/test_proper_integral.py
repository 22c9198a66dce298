"""Elapsed proper time: against an independent quadrature, its derivative, its ends, and that history matters not."""

from __future__ import annotations

import math
import threading

import numpy as np
import pytest
from numpy.polynomial import legendre

import tscale
from tscale import exact
from tscale.earth.gravity import ZonalField
from tscale.transforms.proper_integral import ProperIntegral
from tscale.transforms.proper_panels import integrate
from tscale.transforms.proper_time import TERMS, rate_terms

START = tscale.Instants.from_iso("2022-02-01T06:00:00.25", scale="TT")
SITE = tscale.Site.from_geodetic("hill", 11.3, 48.0, 590.0, geopotential_number_m2_s2=5400.0)


def orbit(a_m: float, e: float) -> tscale.Trajectory:
    return tscale.Trajectory.from_kepler(START, a_m, e, 55.0, 10.0, 20.0, 30.0, name="orbit")


CLOCKS = {
    "ground": SITE,
    "low": orbit(6.9e6, 0.02),
    "navigation": orbit(2.656e7, 0.02),
    "transfer": orbit(2.44e7, 0.72),
}


def integral(kind: str, reference: tscale.ReferenceData, **options) -> ProperIntegral:
    return ProperIntegral(CLOCKS[kind], START.pair, reference, **options)


@pytest.mark.parametrize("kind", CLOCKS)
def test_an_independent_quadrature(reference: tscale.ReferenceData, kind: str) -> None:
    # 40 Gauss points on each of 400 equal pieces of 3 days, which hold the rate of a low orbit far beyond 1e-19.
    # Allowed is 1e-18 of the time elapsed.
    span_s = 3 * 86400.0
    node, weight = legendre.leggauss(40)
    length = span_s / 400
    offset = (np.arange(400)[:, None] + 0.5 * (node + 1.0)) * length
    t = START.shifted(offset)
    terms = rate_terms(CLOCKS[kind], t.pair, reference).named()
    found = integral(kind, reference).terms_s(START.shifted(span_s).pair)
    for name in TERMS:
        expected = float(np.sum(terms[name] @ weight) * 0.5 * length) / (1 - 6.969290134e-10)
        assert float(found[name]) == pytest.approx(expected, abs=1e-18 * span_s), name


@pytest.mark.parametrize("kind", CLOCKS)
def test_the_integral_and_its_rate(reference: tscale.ReferenceData, kind: str) -> None:
    running = integral(kind, reference)
    t = START.shifted(np.linspace(-2.0e6, 2.0e6, 200))
    step = 30.0
    gained = [running.gained_s(t.shifted(step * k).pair) for k in (-2, -1, 1, 2)]
    slope = (gained[0] - 8 * gained[1] + 8 * gained[2] - gained[3]) / (12 * step)
    # Of 5e-4 s, 2e6 s from the start, the last bit is 1e-19; over 30 s 1e-20. Five points leave h^4 y''''/30: 3e-16 of
    # a perigee's 1e-10.
    assert np.max(np.abs(slope - running.rate(t.pair))) < (2e-20 if kind == "ground" else 3e-15)
    total = np.sum(list(running.terms_s(t.pair).values()), axis=0)
    # The elapsed TCG is longer than the elapsed TT by L_G/(1 - L_G) of it; roundings of 1e-3 s remain.
    longer = exact.seconds(exact.subtract(t.pair, running.anchor)) * (6.969290134e-10 / (1 - 6.969290134e-10))
    np.testing.assert_allclose(running.gained_s(t.pair), total + longer, rtol=0, atol=2e-18)


def test_what_was_asked_before_does_not_matter(reference: tscale.ReferenceData) -> None:
    t = START.shifted(np.random.default_rng(3).uniform(-6e6, 6e6, 300))
    whole = integral("navigation", reference).gained_s(t.pair)
    running = integral("navigation", reference)
    one_by_one = np.array([float(running.gained_s(t[i].pair)) for i in reversed(range(300))])[::-1]
    assert np.array_equal(whole, one_by_one)
    shared, results = integral("navigation", reference), {}

    def ask(number: int) -> None:
        order = np.random.default_rng(number).permutation(300)
        found = np.empty(300)
        found[order] = shared.gained_s(t[order].pair)
        results[number] = found

    threads = [threading.Thread(target=ask, args=(number,)) for number in range(4)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert all(np.array_equal(whole, found) for found in results.values())
    assert len(results) == 4


def test_there_and_back(reference: tscale.ReferenceData) -> None:
    t = START.shifted(np.random.default_rng(5).uniform(-3e7, 3e7, 4000))
    for kind in ("ground", "navigation"):
        running = integral(kind, reference, rate_offset=3e-10)
        elapsed = exact.add_seconds(exact.subtract(t.pair, running.anchor), running.gained_s(t.pair))
        back = running.tt_of_elapsed(elapsed)
        # Three roundings of a fraction near 1.
        assert np.max(np.abs(exact.seconds(exact.subtract(back, t.pair)))) <= 3.4e-16


def test_a_set_rate_multiplies_the_proper_time(reference: tscale.ReferenceData) -> None:
    plain, fast = integral("navigation", reference), integral("navigation", reference, rate_offset=-4.4647e-10)
    t = START.shifted(5e6).pair
    elapsed = 5e6 + float(plain.gained_s(t))
    assert float(fast.gained_s(t) - plain.gained_s(t)) == pytest.approx(-4.4647e-10 * elapsed, abs=1e-18)
    assert float(fast.terms_s(t)["set rate offset"]) == pytest.approx(-4.4647e-10 * elapsed, abs=1e-18)


def test_tabulated_states_are_cut_at_their_knots(reference: tscale.ReferenceData) -> None:
    # The same orbit from states every 60 s: Hermite polynomials of degree 7 hold it to micrometres. Lower degrees bend
    # at every knot: the quadrature still meets an independent one, exact on each piece.
    knots = START.shifted(300.0 * np.arange(60))
    r, v = CLOCKS["low"].gcrs(knots.pair, reference)
    path = tscale.Trajectory.from_states(knots, r, v, degree=3, name="states")
    running = ProperIntegral(path, START.shifted(4000.0).pair, reference)
    node, weight = legendre.leggauss(30)
    t = START.shifted((300.0 * np.arange(59)[:, None]) + 150.0 * (node + 1.0))
    parts = rate_terms(path, t.pair, reference).total @ weight * 150.0
    ends = running.gained_s(knots.pair)
    gain = 6.969290134e-10 / (1 - 6.969290134e-10)
    expected = 300.0 * gain + parts * (1 + gain)
    np.testing.assert_allclose(np.diff(ends), expected, rtol=0, atol=300.0 * 2e-19)
    with pytest.raises(tscale.errors.OutOfSpan, match="without a gap") as caught:
        running.gained_s(START.shifted(np.array([-1.0, 5.0, 17701.0])).pair)
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [True, False, True]
    with pytest.raises(tscale.errors.OutOfSpan):
        ProperIntegral(path, START.shifted(-10.0).pair, reference)
    both = running.tt_of_elapsed(exact.add_seconds(exact.subtract(knots.pair, running.anchor), ends))
    assert np.max(np.abs(exact.seconds(exact.subtract(both, knots.pair)))) <= 2e-16  # the ends included


def test_the_ends_of_tables_are_those_of_the_clock(reference: tscale.ReferenceData) -> None:
    late = tscale.Instants.from_iso("1962-01-03T00:00:00", scale="TT")
    running = ProperIntegral(SITE, late.pair, reference)
    first = tscale.Instants.from_iso("1962-01-01T00:00:35", scale="TT")
    assert np.isfinite(running.gained_s(first.pair))
    with pytest.raises(tscale.errors.OutOfSpan, match="Earth orientation"):
        running.gained_s(first.shifted(-10.0).pair)
    with pytest.raises(tscale.errors.OutOfSpan, match="ephemeris"):
        running.gained_s(tscale.Instants.from_iso("2071-01-01", scale="TT").pair)


def test_past_the_earth_orientation_no_warning_of_nodes(reference: tscale.ReferenceData) -> None:
    # Warnings are errors here: at nodes of the quadrature, dates that no one gave, held Earth orientation is not told.
    late = tscale.Instants.from_iso("2035-01-03T00:00:00", scale="TT")
    assert abs(float(ProperIntegral(SITE, late.pair, reference).gained_s(late.shifted(86400.0).pair))) < 1e-7


def test_a_field_of_no_tides_needs_no_ephemeris(reference: tscale.ReferenceData) -> None:
    point = ZonalField("point", 3.986004415e14, 6378136.3)
    running = ProperIntegral(CLOCKS["navigation"], START.pair, reference, gravity=point, tides=False)
    assert running.terms_s(START.shifted(1e5).pair)["tidal"] == 0.0


def test_a_kink_is_followed_to_the_tolerance() -> None:
    # A rate of 1e-14 |x - c|/1000 s: the area of two triangles, met to 1e-18 of the time.
    kink = 321.1234567
    found = integrate(lambda x: 1e-17 * np.abs(x - kink)[None], np.array([0.0, 1000.0]), "a clock")
    expected = 0.5e-17 * (kink**2 + (1000.0 - kink) ** 2)
    assert found.totals_s[0] == pytest.approx(expected, abs=1e-18)


def test_a_jump_in_rate_is_refused() -> None:
    def jumping(x: np.ndarray) -> np.ndarray:
        return np.where(x > 321.1234567, 1e-12, 0.0)[None]

    with pytest.raises(tscale.errors.NotConverged, match="jumps"):
        integrate(jumping, np.array([0.0, 1000.0]), "a clock")


def test_panels_of_a_polynomial_are_exact() -> None:
    # Degree 11 is what 12 nodes hold: the integral of (x/50 - 1)^11 * 1e-10 to rounding.
    found = integrate(lambda x: 1e-10 * (x / 50.0 - 1.0)[None] ** 11, np.array([0.0, 30.0, 100.0]), "a clock")
    x = np.linspace(0.0, 100.0, 77)
    np.testing.assert_allclose(
        found.value(x, slice(0, 1))[0], 1e-10 * 50.0 / 12.0 * ((x / 50.0 - 1.0) ** 12 - 1.0), rtol=0, atol=1e-24
    )
    assert found.totals_s[0] == pytest.approx(0.0, abs=1e-24)


def states(first_s: float, last_s: float, step_s: float = 600.0, **options) -> tscale.Trajectory:
    """The low orbit from states, exact at its ends."""
    knots = START.shifted(np.linspace(first_s, last_s, round((last_s - first_s) / step_s) + 1))
    r, v = CLOCKS["low"].gcrs(knots.pair, tscale.ReferenceData.default())
    return tscale.Trajectory.from_states(knots, r, v, degree=11, name="states", **options)


@pytest.mark.parametrize("anchor_s", [-691200.0, -300.0, 0.0, 691200.0, 691500.0])
def test_ends_on_the_edge_of_a_block(reference: tscale.ReferenceData, anchor_s: float) -> None:
    # 8 days and 16 days, with the coincidence at either end or just beside an edge: dates at the ends, and a nanosecond
    # beyond.
    path = states(min(anchor_s, -691200.0), max(anchor_s, 691200.0), 600.0 if anchor_s % 600.0 == 0.0 else 300.0)
    running = ProperIntegral(path, START.shifted(anchor_s).pair, reference)
    ends = START.shifted(np.array([-691200.0, -1.0, 0.0, 1.0, 691200.0]))
    gained = running.gained_s(ends.pair)
    other = ProperIntegral(path, START.pair, reference).gained_s(ends.pair)
    np.testing.assert_allclose(gained - gained[2], other, rtol=0, atol=2e-18)
    near = running.gained_s(
        ends.shifted(np.array([-9e-10, 0.0, 0.0, 0.0, 9e-10 if anchor_s != 691500.0 else 0.0])).pair
    )
    np.testing.assert_allclose(near, gained, rtol=0, atol=1e-17)


def test_pieces_that_touch_and_pieces_with_a_gap(reference: tscale.ReferenceData) -> None:
    one, two, three = states(0.0, 6000.0), states(6000.0, 12000.0), states(15000.0, 21000.0)

    def joined(*parts: tscale.Trajectory) -> tscale.Trajectory:
        return tscale.Trajectory("pieces", "TT", True, tuple(piece for part in parts for piece in part.pieces))

    path = joined(one, two, three)
    running = ProperIntegral(path, START.shifted(3000.0).pair, reference)
    t = START.shifted(np.array([0.0, 5999.0, 6001.0, 12000.0]))
    whole = ProperIntegral(CLOCKS["low"], START.shifted(3000.0).pair, reference).gained_s(t.pair)
    np.testing.assert_allclose(running.gained_s(t.pair), whole, rtol=0, atol=1e-14)  # interpolated to 1e-3 m
    with pytest.raises(tscale.errors.OutOfSpan, match="gap") as caught:
        running.gained_s(START.shifted(np.array([5.0, 13000.0, 16000.0])).pair)
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True, True]
    later = ProperIntegral(path, START.shifted(16000.0).pair, reference)
    assert np.isfinite(later.gained_s(START.shifted(np.array([15000.0, 21000.0])).pair)).all()
    with pytest.raises(tscale.errors.OutOfSpan):
        ProperIntegral(path, START.shifted(13500.0).pair, reference)


def test_a_clock_set_far_off_closes_too(reference: tscale.ReferenceData) -> None:
    running = integral("ground", reference, rate_offset=1e-3)
    t = START.shifted(np.array([-3e7, 1e-4, 2.5e7])).pair
    reading = running.reading(t, (np.asarray(0), np.asarray(0.0)))
    elapsed = exact.subtract(reading, running.anchor)
    assert np.max(np.abs(exact.seconds(exact.subtract(running.tt_of_elapsed(elapsed), t)))) <= 5e-16


def test_sums_of_blocks_lose_nothing(reference: tscale.ReferenceData) -> None:
    # At the start of a block the integral is the sum of the blocks before it to the last bit; plain sums go wrong by
    # several of them over two years, 1e-17 s.
    running = integral("navigation", reference)
    numbers = np.arange(1, 92)
    starts = exact.add_seconds(running.anchor, numbers * 691200.0)
    found = running.free_s(starts)
    totals = [float(running._made(int(number)).totals_s[-1]) for number in range(91)]
    expected = np.array([math.fsum(totals[:number]) for number in numbers])
    assert np.all(np.abs(found - expected) <= np.spacing(expected))


def test_an_orbit_about_the_earth_by_its_barycentric_states(reference: tscale.ReferenceData) -> None:
    # The same orbit as states from the Earth's centre in ICRF axes dated in TDB, as an SPK kernel holds it: the Earth's
    # field with its flattening and tides is still what it is in. Its GCRS state is good to 1 mm: 1e-19.
    tdb = tscale.chain("TT@GEOCENTER", "TDB@GEOCENTER")(START.shifted(600.0 * np.arange(40))).at(None)
    from tscale.earth.moving import bcrs_state

    x, v = bcrs_state(CLOCKS["low"], tdb.pair, reference)
    earth, earth_v = reference.ephemeris.state("earth", tdb.pair)
    path = tscale.Trajectory.from_states(
        tdb, x - earth, v - earth_v, frame="BCRS", center="earth", degree=11, name="spk"
    )
    t = START.shifted(np.linspace(3000.0, 20000.0, 50))
    np.testing.assert_allclose(tscale.proper_rate(path, t), tscale.proper_rate(CLOCKS["low"], t), rtol=0, atol=1e-16)
    assert tscale.ProperClock("x", path, START.shifted(4000.0)).dates_own_event


def test_a_rough_rate_is_refused_before_memory_runs_out() -> None:
    with pytest.raises(tscale.errors.NotConverged, match="rough"):
        integrate(lambda x: 1e-12 * np.sin(1e7 * x * x)[None], np.array([0.0, 1000.0]), "a clock")


def test_more_panels_than_are_taken_at_once() -> None:
    edges = np.linspace(0.0, 100.0, 10_001)
    found = integrate(lambda x: 1e-10 * np.cos(x)[None], edges, "a clock")
    np.testing.assert_allclose(found.value(edges, slice(0, 1))[0], 1e-10 * np.sin(edges), rtol=0, atol=1e-22)
