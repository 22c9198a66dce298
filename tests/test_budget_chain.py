"""Budgets of chains: lines, covariances, what is not included, text and JSON."""

from __future__ import annotations

import json
import math
from types import SimpleNamespace
from typing import Any

import numpy as np
import pytest

import tscale
from tscale.budget import Assumptions, budget_of
from tscale.errors import InvalidInput, OutOfSpan

C_M_S = 299792458.0
SITE = tscale.Site.from_itrf("test site", 4_051_700.0, 417_300.0, 4_890_200.0)
SOURCE = tscale.Source(83.6, 22.0, name="test source")
T = tscale.Instants.from_iso(["2024-05-01T07:30:00", "2024-05-01T19:30:00", "2024-08-03T01:00:00"], scale="UTC")
STATED = {
    "site_sigma_m": (0.01, 0.02, 0.03),
    "source_position_sigma_mas": 0.5,
    "proper_motion_sigma_mas_yr": 0.01,
    "parallax_sigma_mas": 0.05,
    "resolution_s": 1e-9,
    "reading_sigma_s": 2e-9,
    "ephemeris_sigma_m": 100.0,
}


@pytest.fixture(scope="module")
def chain() -> tscale.Chain:
    return tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE)


@pytest.fixture(scope="module")
def log() -> tscale.ClockLog:
    epoch = tscale.Instants.from_mjd([60400, 60410, 60420, 60440], 0.0, scale="UTC")
    return tscale.ClockLog.from_rows("maser", epoch, [0.0, 1e-6, 2e-6, 4e-6], [1e-9, 2e-9, 1e-9, 3e-9])


def test_lines_add_up(chain: tscale.Chain) -> None:
    budget = chain.budget(T, **STATED)
    squares = sum(line.contribution_s**2 for line in budget.lines)
    np.testing.assert_allclose(budget.combined_s, np.sqrt(squares), rtol=1e-12)
    np.testing.assert_allclose(sum(line.share_percent for line in budget.lines), 100.0, rtol=1e-12)
    np.testing.assert_allclose(budget.expanded_s, 2.0 * budget.combined_s, rtol=1e-15)
    for line in budget.lines:
        assert line.contribution_s.shape == line.sigma.shape == line.sensitivity.shape == (3,)
        np.testing.assert_allclose(np.abs(line.sensitivity) * line.sigma, line.contribution_s, rtol=1e-12)
    by_name = {line.quantity: line for line in budget.lines}
    # JCGM 100:2008, F.2.2.1: a resolution of d has d / sqrt(12).
    assert by_name["resolution of the readings"].contribution_s[0] == pytest.approx(
        1e-9 / math.sqrt(12), rel=1e-12, abs=0
    )
    assert by_name["resolution of the readings"].distribution == "rectangular"
    # The three axes of an isotropic error along a unit vector make up the whole of it.
    axes = [by_name[f"geocentre from the barycentre, {axis}"].contribution_s for axis in "xyz"]
    np.testing.assert_allclose(np.sqrt(sum(part**2 for part in axes)), 100.0 / C_M_S, rtol=1e-12)
    assert {item.source for item in budget.not_included}.isdisjoint({"place of test site", "ephemeris"})


def test_default_contents_are_those_of_the_chain(chain: tscale.Chain) -> None:
    budget = chain.budget(T)
    known = chain.uncertainty_s(T)
    assert list(budget.by_source()) == list(known)
    for name, value in budget.by_source().items():
        np.testing.assert_array_equal(value, known[name])
    np.testing.assert_allclose(budget.combined_s, chain.sigma_s(T), rtol=1e-12)


def test_nothing_unknown_is_zero_in_silence(chain: tscale.Chain) -> None:
    missing = {item.source: item.reason for item in chain.budget(T).not_included}
    for name in ("place of test site", "position of the source", "parallax of the source", "ephemeris"):
        assert "not stated; give" in missing[name]
    assert "noise of the readings" in missing
    assert "2e-17" in missing["mean rate of the time ephemeris"]
    assert "what the models leave out" in {item.source for item in chain.budget(T, truncation=False).not_included}
    exact = tscale.EarthOrientation.constant()
    lazy = tscale.chain("UTC", "UT1", reference=tscale.ReferenceData(earth_orientation=exact)).budget(
        T, truncation=False
    )
    assert float(lazy.combined_s[0]) == 0.0
    assert any("without uncertainty" in item.reason for item in lazy.not_included)
    assert "not included: UT1 - TAI" in lazy.table()


@pytest.mark.parametrize("shape", [(), (1,), (2, 3), (0,)])
def test_shapes(chain: tscale.Chain, shape: tuple[int, ...]) -> None:
    t = tscale.Instants.from_mjd(
        np.full(shape, 60431), np.linspace(0.0, 0.5, int(np.prod(shape))).reshape(shape), scale="UTC"
    )
    budget = chain.budget(t, **STATED)
    n = int(np.prod(shape))
    assert budget.combined_s.shape == budget.expanded_s.shape == budget.effective_dof.shape == shape
    assert budget.covariance().shape == (n, n)
    np.testing.assert_allclose(np.diag(budget.covariance()), budget.combined_s.ravel() ** 2, rtol=1e-9)
    if n:
        assert budget.table(n - 1)
        # A mean of instants is what the covariance says.
        assert budget.mean_sigma_s() == pytest.approx(math.sqrt(budget.covariance().sum()) / n, rel=1e-9, abs=0)
    assert json.loads(budget.to_json())["shape"] == list(shape)


def test_covariance_between_instants(log: tscale.ClockLog) -> None:
    # Two instants between the same two comparisons share their errors by the weights; two far apart share none.
    t = tscale.Instants.from_mjd([60402, 60408, 60430], 0.0, scale="UTC")
    chain = tscale.chain("CLOCK(maser)", "UTC", clocks=[log])
    readings = tscale.chain("UTC", "CLOCK(maser)", clocks=[log])(t)
    found = chain.budget(readings).covariance()
    w = np.array([[0.8, 0.2, 0, 0], [0.2, 0.8, 0, 0], [0, 0, 0.5, 0.5]])
    np.testing.assert_allclose(found, w @ np.diag([1e-18, 4e-18, 1e-18, 9e-18]) @ w.T, rtol=1e-9, atol=1e-30)
    # The log itself says the same.
    np.testing.assert_allclose(np.sqrt(np.diag(found)), log.uncertainty_s(t.pair), rtol=1e-9)
    # One error for all comparisons: straight between their sizes.
    common = chain.budget(readings, comparison_decay_s=math.inf)
    sigma = w @ np.array([1e-9, 2e-9, 1e-9, 3e-9])
    np.testing.assert_allclose(common.covariance(), np.outer(sigma, sigma), rtol=1e-9)


def test_predicted_rows_are_told() -> None:
    first = tscale.EarthOrientation.default().predicted_from_mjd
    assert first is not None
    for days, words in (([-9, -5], ""), ([-9, 20], ", some predicted"), ([9, 20], ", all predicted")):
        t = tscale.Instants.from_mjd(np.add(first, days), 0.3, scale="UTC")
        line = tscale.chain("UTC", "UT1").budget(t).lines[0]
        assert line.correlation == f"shared by rows near in time{words}"
    # Errors of predictions a month apart go together, those of measurements do not.
    t = tscale.Instants.from_mjd(np.add(first, [-40, -10, 20, 50]), 0.3, scale="UTC")
    found = tscale.chain("UTC", "UT1").budget(t, truncation=False).covariance()
    r = found / np.sqrt(np.outer(np.diag(found), np.diag(found)))
    assert r[0, 1] < 1e-5 < 0.8 < r[2, 3] < 0.85


def test_logs_by_steps_and_cubics(log: tscale.ClockLog) -> None:
    t = tscale.Instants.from_mjd([60402, 60413, 60430], 0.5, scale="UTC")
    step: Any
    for interpolation in ("step", "cubic"):
        rows = log.comparisons
        step = tscale.ClockLog.from_rows(
            "maser", rows.epoch, rows.offset, rows.uncertainty_s, interpolation=interpolation
        )
        chain = tscale.chain("CLOCK(maser)", "UTC", clocks=[step])
        readings = tscale.chain("UTC", "CLOCK(maser)", clocks=[step])(t)
        # Moving one comparison moves the results by its weight: the weights that the budget carries errors by.
        variance = np.zeros(3)
        for k, sigma in enumerate(rows.uncertainty_s):
            moved = np.zeros(4)
            moved[k] = sigma
            shifted = (rows.offset[0], rows.offset[1] + moved)
            other = tscale.ClockLog.from_rows(
                "maser", rows.epoch, shifted, rows.uncertainty_s, interpolation=interpolation
            )
            variance += chain.replaced(clocks=[other])(readings).minus(chain(readings)) ** 2
        # The counts resolve 1e-16 s of 1e-9 s.
        np.testing.assert_allclose(chain.sigma_s(readings), np.sqrt(variance), rtol=1e-5)


def test_a_predicted_clock_wanders(log: tscale.ClockLog) -> None:
    noise = tscale.tables.clock_noise.ClockNoise(white_frequency=1e-12, flicker_frequency=1e-15)
    until = tscale.Instants.from_mjd(60470, 0.0, scale="UTC")
    ahead = log.predicted(noise, fit_s=20 * 86400.0, until=until)
    t = tscale.Instants.from_mjd([60405, 60450, 60465], 0.0, scale="UTC")
    with pytest.warns(tscale.ExtrapolationWarning):
        readings = tscale.chain("UTC", "CLOCK(maser)", clocks=[ahead])(t)
    with pytest.warns(tscale.ExtrapolationWarning):
        budget = tscale.chain("CLOCK(maser)", "UTC", clocks=[ahead]).budget(readings)
    stated = ahead.uncertainty_s(t.pair)
    # One law between the comparisons and past them, that of the log.
    np.testing.assert_allclose(budget.combined_s, stated, rtol=1e-9)
    lines = {line.quantity.partition(", ")[2]: line.contribution_s for line in budget.lines}
    assert (np.diff(lines["wander of the clock"]) > 0.0).all()
    assert not any("wander" in item.source for item in budget.not_included)


def test_realisations_of_tt() -> None:
    t = tscale.Instants.from_mjd([58479, 58484], 0.0, scale="UTC")
    for sigma, between in ((None, math.sqrt(0.5)), (5e-10, 1.0)):
        table = tscale.TTBIPM.from_rows("TT(BIPM25)", [58479, 58489], [27.6740e-6, 27.6745e-6], uncertainty_s=sigma)
        chain = tscale.chain("UTC", "TT(BIPM25)", reference=tscale.ReferenceData(tt_bipm=[table]))
        own = 1e-9 / math.sqrt(12) if sigma is None else sigma
        # Rounding is another in each row; a stated uncertainty is that of the whole realisation.
        np.testing.assert_allclose(chain.sigma_s(t), [own, own * between], rtol=1e-9)
        (line,) = chain.budget(t).lines
        assert line.distribution == ("rectangular" if sigma is None else "normal")
        assert float(line.value[0]) == pytest.approx(32.184 + 27.674e-6, rel=0, abs=1e-12)  # type: ignore[index]


def test_two_kernels(chain: tscale.Chain) -> None:
    class Moved(tscale.Ephemeris):
        """The same ephemeris, with the Earth 1 km further along x."""

        def __init__(self, base: tscale.Ephemeris) -> None:
            vars(self).update(vars(base))

        def position_apart_km(self, target: Any, tdb: Any) -> Any:
            constant, rest = super().position_apart_km(target, tdb)
            return constant, rest + np.array([1.0, 0.0, 0.0]) * (target in ("earth", 399))

    budget = chain.budget(T, ephemeris=Moved(chain.reference.ephemeris))
    line = next(line for line in budget.lines if line.source == "ephemeris")
    toward = math.cos(math.radians(22.0)) * math.cos(math.radians(83.6))
    # 1 km along x is 1000 k_x / c of Roemer delay; the rest is the Shapiro delay's share, 1e-8 of it.
    np.testing.assert_allclose(line.sensitivity, 1000.0 * toward / C_M_S, rtol=1e-4)
    np.testing.assert_array_equal(line.sigma, 1.0)
    assert "ephemeris" not in {item.source for item in budget.not_included}
    with pytest.raises(InvalidInput, match="one of them"):
        chain.budget(T, ephemeris=chain.reference.ephemeris, ephemeris_sigma_m=1.0)


def test_levels_of_confidence(chain: tscale.Chain) -> None:
    loose = chain.budget(T[:1], reading_sigma_s=2e-9, dof={"noise of the readings": 4})
    part = next(line for line in loose.lines if line.quantity == "noise of the readings")
    assert (part.kind, part.dof) == ("A", 4.0)
    # JCGM 100:2008, eq. G.2b: u^4 / (u_i^4 / nu_i).
    u = float(loose.combined_s[0])
    assert float(loose.effective_dof[0]) == pytest.approx(4.0 * (u / 2e-9) ** 4, rel=1e-9)
    student = chain.budget(T[:1], reading_sigma_s=2e-9, dof={"readings": 4}, probability=0.95)
    # t for 5 degrees of freedom is 2.57 (table G.2): 4 (1 + 0.77^2 / 2^2 + ...)^2 = 5.5.
    assert float(student.coverage_factor[0]) == pytest.approx(2.57, rel=0, abs=0.005)
    assert "level of confidence 95 %" in student.table()
    normal = chain.budget(T, probability=0.95)
    np.testing.assert_allclose(normal.coverage_factor, 1.95996, rtol=1e-5)


def test_correlated_inputs(chain: tscale.Chain) -> None:
    pair = ("right ascension cos dec", "declination")
    one, alone = (chain.budget(T, source_position_sigma_mas=1.0, correlations=given) for given in ([(*pair, 1.0)], []))
    a, b = (next(p.signed_s for p in alone.contributions if p.quantity == name) for name in pair)
    np.testing.assert_allclose(one.combined_s**2 - alone.combined_s**2, 2.0 * a * b, rtol=1e-6)
    np.testing.assert_allclose(np.diag(one.covariance()), one.combined_s**2, rtol=1e-9)
    assert one.mean_sigma_s() == pytest.approx(math.sqrt(one.covariance().sum()) / 3, rel=1e-9, abs=0)
    assert "r = +1" in one.table()
    with pytest.raises(InvalidInput, match="no quantity 'x'"):
        chain.budget(T, correlations=[("x", "declination", 0.5)])
    with pytest.raises(InvalidInput, match="instant to instant"):
        chain.budget(T, correlations=[("UT1 - TAI", "polar motion x", 0.5)])


def test_a_large_covariance_is_refused(chain: tscale.Chain) -> None:
    t = tscale.Instants.from_mjd(60431, np.linspace(0.0, 0.9, 20_000), scale="UTC")
    budget = tscale.chain("UTC", "TDB@GEOCENTER").budget(t)
    with pytest.raises(InvalidInput, match=r"t\[::5\].*mean_sigma_s"):
        budget.covariance()
    assert budget.mean_sigma_s() == pytest.approx(2e-10, rel=1e-2, abs=0)


def test_text_and_json(chain: tscale.Chain) -> None:
    budget = chain.budget(T, **STATED, bounds=[("cable", 3e-9)])
    text = budget.table(1)
    assert text.splitlines()[0] == str(chain)
    for word in ("UT1 - TAI", "rectangular", "common to all", "cable", "k = 2", "share"):
        assert word in text
    found = json.loads(budget.to_json())
    assert found["combined_s"] == budget.combined_s.tolist()
    assert len(found["lines"]) == len(budget.lines)
    assert found["effective_degrees_of_freedom"] == [None] * 3
    assert budget.to_json() == chain.budget(T, **STATED, bounds=[("cable", 3e-9)]).to_json()
    cable = next(line for line in budget.lines if line.quantity == "cable")
    assert cable.contribution_s[0] == pytest.approx(3e-9 / math.sqrt(3.0), rel=1e-12, abs=0)
    for bad, words in ((3, "not among the 3"), ("x", "number of an instant")):
        with pytest.raises(InvalidInput, match=words):
            budget.table(bad)  # type: ignore[arg-type]
    assert "Budget of" in repr(budget)


def test_assumptions_as_one_value(chain: tscale.Chain) -> None:
    given = Assumptions(site_sigma_m=0.01, truncation=False)
    one, two = budget_of(chain, T, assumptions=given), chain.budget(T, site_sigma_m=0.01, truncation=False)
    np.testing.assert_array_equal(one.combined_s, two.combined_s)
    # Single names go over the value.
    three = chain.budget(T, assumptions=given, site_sigma_m=(0.02, 0.02, 0.02))
    pick = [next(line for line in b.lines if line.quantity == "ITRF x of test site") for b in (one, three)]
    np.testing.assert_allclose(pick[1].contribution_s, 2.0 * pick[0].contribution_s, rtol=1e-12)


@pytest.mark.parametrize(
    ("stated", "words"),
    [
        ({"site_sigma": 1.0}, "takes no site_sigma"),
        ({"site_sigma_m": -1.0}, "zero or more"),
        ({"site_sigma_m": (1.0, 2.0)}, "3 numbers"),
        ({"site_sigma_m": "1 cm"}, "must be a number|3 numbers"),
        ({"resolution_s": math.inf}, "finite"),
        ({"parallax_sigma_mas": math.nan}, "zero or more"),
        ({"ephemeris": "de440.bsp"}, "Ephemeris.open"),
        ({"ephemeris": SimpleNamespace(states=None)}, "Ephemeris.open"),
        ({"dof": {"readings": 0.5}}, "1 or more"),
        ({"correlations": [("a", "a", 0.5)]}, "correlation is"),
        ({"bounds": [(1, 2.0)]}, "bounds are pairs"),
        ({"assumptions": {}}, "budget.Assumptions"),
        ({"coverage_factor": 0.0}, "positive number"),
        ({"probability": 1.5}, "between 0 and 1"),
    ],
)
def test_what_is_refused(chain: tscale.Chain, stated: dict[str, Any], words: str) -> None:
    with pytest.raises(InvalidInput, match=words):
        chain.budget(T, **stated)


def test_dates_outside_the_tables_are_errors(chain: tscale.Chain) -> None:
    late = tscale.Instants.from_iso(["2024-05-01T00:00:00", "2070-01-01T00:00:00"], scale="TT")
    with pytest.raises(OutOfSpan) as caught:
        tscale.chain("TT", "TDB", site=SITE).budget(late)
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True]


def test_means_of_odd_weights(chain: tscale.Chain) -> None:
    budget = chain.budget(T)
    for bad in ([0.0, 0.0, 0.0], [1.0, math.nan, 1.0], "x", [1.0, 2.0]):
        with pytest.raises(InvalidInput):
            budget.mean_sigma_s(bad)
    w = np.array([1.0, 2.0, 0.5])
    expected = math.sqrt(w @ budget.covariance() @ w) / w.sum()
    assert budget.mean_sigma_s(w) == pytest.approx(expected, rel=1e-9, abs=0)
