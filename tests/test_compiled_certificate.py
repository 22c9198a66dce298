"""Certificates of compiled chains: honest at dates that no fit has seen, for chains of every kind."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import tscale
from tscale.errors import InvalidInput, NotConverged, OutOfSpan, ScaleMismatch

SITE = tscale.Site.from_itrf("north", 1_200_000.0, -4_600_000.0, 4_230_000.0)
SOURCE = tscale.Source(83.6, 22.0, pm_dec_mas_yr=3.0, parallax_mas=0.5)
EPOCH = tscale.Instants.from_iso("2010-01-01T00:00:00", scale="TT")
LOW_ORBIT = tscale.Trajectory.from_kepler(EPOCH, 7.0e6, 0.001, 51.0, 10.0, 20.0, 30.0, name="low orbit")
HIGH_ORBIT = tscale.Trajectory.from_kepler(EPOCH, 2.66e7, 0.74, 63.0, 10.0, 270.0, 30.0, name="high orbit")


def dates(compiled: tscale.CompiledChain, n: int, seed: int, way: str = "forward") -> tscale.Instants:
    """Random dates over the span, ends included."""
    span = compiled.span if way == "forward" else compiled.inverse_span
    x = np.append(np.random.default_rng(seed).random(n) * span[1].minus(span[0]), 0.0)
    return tscale.Instants.concatenate([span[:1].shifted(x), span[1:]])


def errors_s(compiled: tscale.CompiledChain, chain: tscale.Chain, n: int, seed: int) -> tuple[np.ndarray, np.ndarray]:
    """Differences from the chain in both directions."""
    t, u = dates(compiled, n, seed), dates(compiled, n, seed + 1, "inverse")
    return compiled(t).minus(chain(t)), compiled.inverse(u).minus(chain.inverse(u))


@pytest.mark.parametrize("pair", [("UTC", "TDB"), ("UT1", "TCB"), ("GPS", "TCG"), ("TCB", "GLONASS"), ("TT", "UT1")])
def test_scales_at_a_site_are_kept_to_a_femtosecond(pair: tuple[str, str]) -> None:
    chain = tscale.chain(*pair, site=SITE)
    compiled = chain.compile("2016-12-25", "2017-01-12", tolerance_s=1e-15)  # over a leap second
    for error in errors_s(compiled, chain, 20_000, 1):
        # Single values of both round by 0.1 fs, at most three times each: within the tolerance all the same.
        assert np.max(np.abs(error)) <= 1e-15
    facts = compiled.certificate
    assert 0.0 < facts.max_error_s <= 1e-15
    assert facts.noise_s < 2e-16
    assert facts.rate_error < 1e-17  # of rates of 1e-8


def test_a_month_at_the_barycentre_is_kept_to_the_tolerance() -> None:
    chain = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE)
    compiled = chain.compile("2024-05-01", "2024-06-01", tolerance_s=1e-13)
    facts = compiled.certificate
    assert facts.max_error_s <= 1e-13
    for error in errors_s(compiled, chain, 100_000, 2):
        # Single values of the chain, their own rounding included.
        assert np.max(np.abs(error)) <= 1e-13
        assert abs(np.mean(error)) < 5e-15
    assert facts.rate_error < 1e-15


def test_averaged_over_seconds_the_rounding_of_the_chain_is_below_the_tolerance() -> None:
    chain = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE)
    loose = chain.compile("2024-05-01", "2024-05-02", tolerance_s=1e-12)
    noise_s = loose.certificate.forward.noise_s
    # Asked for a few deviations of what single values scatter by, means of several decide.
    tolerance_s = 4.0 * noise_s
    compiled = chain.compile("2024-05-01", "2024-05-02", tolerance_s=tolerance_s)
    assert compiled.certificate.forward.draws >= 4
    rng = np.random.default_rng(3)
    middle = dates(compiled, 1000, 4)
    strewn = middle.reshape(-1, 1).shifted(rng.uniform(-2.0, 2.0, (len(middle), 100)))
    strewn = strewn[((strewn >= compiled.span[0]) & (strewn <= compiled.span[1])).all(axis=1)]
    error = compiled(strewn).minus(chain(strewn)).mean(axis=1)
    assert len(error) > 900
    assert np.max(np.abs(error)) <= tolerance_s


@pytest.mark.parametrize("orbit", [LOW_ORBIT, HIGH_ORBIT], ids=["low", "high"])
def test_orbits(orbit: tscale.Trajectory) -> None:
    chain = tscale.chain("UTC", "TDB", site=orbit)
    compiled = chain.compile("2020-01-01", "2020-01-03", tolerance_s=2e-15)
    for error in errors_s(compiled, chain, 20_000, 5):
        assert np.max(np.abs(error)) <= 2e-15
    barycentric = tscale.chain("UTC", "TDB@BARYCENTER", site=orbit, source=SOURCE)
    compiled = barycentric.compile("2020-01-01", "2020-01-01T06:00:00", tolerance_s=1e-12)
    for error in errors_s(compiled, barycentric, 20_000, 5):
        assert np.max(np.abs(error)) <= 1e-12
    t = dates(compiled, 200, 6)
    assert np.max(np.abs(compiled.rate(t) - barycentric.rate(t))) < 1e-12  # of 1e-4


@pytest.mark.parametrize("knot_s", [60.0, 600.0])
def test_a_trajectory_bends_at_its_knots(knot_s: float) -> None:
    # A circle of 42 Mm through knots by cubics: 10 minutes apart they bend by much more than the tolerance.
    t = EPOCH.shifted(np.arange(0.0, 43_200.0 + 1.0, knot_s))
    angle = 7.292e-5 * t.minus(t[0])
    ring = np.stack([np.cos(angle), np.sin(angle), 0.0 * angle], axis=-1)
    ahead = np.stack([-np.sin(angle), np.cos(angle), 0.0 * angle], axis=-1)
    orbit = tscale.Trajectory.from_states(t, 4.2e7 * ring, 4.2e7 * 7.292e-5 * ahead, degree=3, name="ring")
    chain = tscale.chain("TT", "TDB", site=orbit)
    compiled = chain.compile(t[0], t[-1], tolerance_s=1e-15)
    for error in errors_s(compiled, chain, 20_000, 7):
        assert np.max(np.abs(error)) <= 1e-15


def test_a_line_of_sight_past_the_sun() -> None:
    source = tscale.Source(90.0, 23.4)  # the Sun passes it at a tenth of a degree on 21 June
    chain = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=source, second_order=True)
    compiled = chain.compile("2020-06-19", "2020-06-23", tolerance_s=2e-13)
    for error in errors_s(compiled, chain, 20_000, 8):
        assert np.max(np.abs(error)) <= 2e-13
    assert any("pass through the Sun" in note for note in compiled.notes)


def test_a_larger_tolerance_takes_fewer_polynomials() -> None:
    chain = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE)
    pieces = {}
    for tolerance_s in (1e-12, 1e-9, 1e-6):
        compiled = chain.compile("2020-01-01", "2020-01-09", tolerance_s=tolerance_s)
        pieces[tolerance_s] = compiled.certificate.forward.pieces
        for error in errors_s(compiled, chain, 10_000, 9):
            assert np.max(np.abs(error)) <= tolerance_s
    assert pieces[1e-12] > 3 * pieces[1e-9] > 3 * pieces[1e-6]


kinds = st.sampled_from(["UTC", "TAI", "TT", "GPS", "UT1", "TCG", "TCB", "TDB", "BDT"])


@given(
    first=kinds,
    last=kinds,
    where=st.sampled_from(["geocentre", "site", "orbit", "barycentre"]),
    start=st.integers(-400_000_000, 800_000_000),
    days=st.floats(0.001, 12.0),
    lon=st.floats(-180.0, 180.0),
    lat=st.floats(-90.0, 90.0),
    ra=st.floats(0.0, 360.0),
    dec=st.floats(-90.0, 90.0),
    exponent=st.floats(-12.5, -6.0),
)
@settings(max_examples=25)
def test_chains_at_random(
    first: str, last: str, where: str, start: int, days: float, lon: float, lat: float, ra: float, dec: float,
    exponent: float,
) -> None:  # fmt: skip
    site = None if where == "geocentre" else LOW_ORBIT if where == "orbit" else SITE
    if where == "site":
        site = tscale.Site.from_geodetic("somewhere", lon, lat, 100.0)
    days = min(days, 0.5) if where == "orbit" else days
    if where == "barycentre":
        chain = tscale.chain(first, "TDB@BARYCENTER", site=site, source=tscale.Source(ra, dec, parallax_mas=3.0))
    else:
        place = "@GEOCENTER" if site is None else ""
        chain = tscale.chain(f"{first}{place}", f"{last}{place}", site=site)
    begin = tscale.Instants.from_seconds(start, 0.25, scale=first)
    tolerance_s = 10.0**exponent
    compiled = chain.compile(begin, begin.shifted(days * 86400.0), tolerance_s=tolerance_s)
    for error in errors_s(compiled, chain, 2000, start % 1000):
        assert np.max(np.abs(error)) <= tolerance_s
    assert compiled.certificate.max_error_s <= tolerance_s


# ---- what cannot be certified --------------------------------------------------------------------


def test_below_the_rounding_of_the_chain_nothing_is_certified() -> None:
    chain = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE)
    with pytest.raises(NotConverged, match=r"the chain itself rounds by .*e-1[0-9] s rms") as caught:
        chain.compile("2020-01-01", "2020-01-02", tolerance_s=1e-15)
    assert "ask for tolerance_s=" in str(caught.value)


def test_past_the_end_of_a_table_nothing_is_compiled() -> None:
    chain = tscale.chain("UT1", "TT")
    with pytest.raises(OutOfSpan, match=r"cannot compile UT1 -> TAI -> TT.*Earth orientation table"):
        chain.compile("2020-01-01", "2035-01-01")


@pytest.mark.parametrize("tolerance", [0.0, -1e-13, 1e-16, float("nan"), float("inf"), 2.0, "small", None])
def test_tolerances_out_of_range(tolerance: object) -> None:
    with pytest.raises(InvalidInput, match="tolerance_s is a number of seconds from 1e-15"):
        tscale.chain("UTC", "TAI").compile("2020-01-01", "2020-01-02", tolerance_s=tolerance)  # type: ignore[arg-type]


def test_spans_that_are_none() -> None:
    chain = tscale.chain("UTC", "TAI")
    with pytest.raises(InvalidInput, match="stop must be after start"):
        chain.compile("2020-01-02", "2020-01-02")
    with pytest.raises(InvalidInput, match="start is one date"):
        chain.compile(58849.0, "2020-01-02")  # type: ignore[arg-type]
    two = tscale.Instants.from_iso(["2020-01-01", "2020-01-02"], scale="UTC")
    with pytest.raises(InvalidInput, match="stop is one date"):
        chain.compile("2020-01-01", two)
    with pytest.raises(ScaleMismatch):
        chain.compile(two[0], tscale.Instants.from_iso("2020-01-03", scale="TT"))


# ---- facts ---------------------------------------------------------------------------------------


def test_what_is_extrapolated_is_said_once_and_kept() -> None:
    chain = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE)
    with pytest.warns(tscale.ExtrapolationWarning) as caught:
        compiled = chain.compile("2031-01-01", "2031-01-04")
    texts = [str(warning.message) for warning in caught]
    assert sum("Earth orientation" in text for text in texts) == 1
    assert sum("leap-second" in text for text in texts) == 1
    assert len(texts) == 2
    assert any("Earth orientation, which is held" in note for note in compiled.notes)
    assert any("expiry of the leap-second table" in note for note in compiled.notes)
    compiled(dates(compiled, 10, 1))  # and not again: warnings are errors here


def test_the_certificate_names_every_table() -> None:
    log = tscale.ClockLog.from_rows("maser", tscale.Instants.from_mjd([58848, 58860], 0.0, scale="UTC"), [1e-6, 2e-6])
    chain = tscale.chain("CLOCK(maser)", "TDB@BARYCENTER", site=SITE, source=SOURCE, clocks=[log])
    facts = chain.compile("2020-01-01", "2020-01-02").certificate
    used = {item.table: item.sha256 for item in facts.tables}
    tables = chain.reference
    assert used == {
        "clock log CLOCK(maser)": log.sha256,
        "leap seconds": tables.leap_seconds.sha256,
        "Earth orientation": tables.earth_orientation.sha256,
        "ephemeris": tables.ephemeris.sha256,
        "time ephemeris": tables.time_ephemeris.sha256,
    }
    assert facts.chain == str(chain)
    assert facts.site == "north"
    assert "83.6" in str(facts.source)
    assert facts.span == ("2020-01-01T00:00:00.000000000", "2020-01-02T00:00:00.000000000")
    assert facts.version == tscale.__version__
    assert facts.points == sum(c.sites * c.draws for c in (facts.forward, facts.inverse)) > 100
    text = str(facts)
    assert log.sha256 in text
    assert "largest error" in text
    only = tscale.chain("TT", "TCG").compile("2020-01-01", "2020-02-01").certificate
    assert only.tables == ()
    assert only.site is only.source is None


def test_where_the_error_is_largest_is_told() -> None:
    chain = tscale.chain("UTC", "TDB", site=SITE)
    compiled = chain.compile("2020-01-01", "2020-01-05", tolerance_s=1e-12)
    check = compiled.certificate.forward
    t = tscale.Instants.from_seconds(*check.at, scale="UTC")
    # The certificate's own dates are strewn over no time where a single value is good enough.
    assert check.draws == 1
    assert abs(float(compiled(t).minus(chain(t)))) == pytest.approx(check.max_error_s, abs=2e-16)
