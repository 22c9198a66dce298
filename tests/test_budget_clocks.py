"""Budgets of clock logs: calibrations that all readings share, and clocks that wander off their comparisons."""

from __future__ import annotations

import math
import warnings
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import tscale
from tscale import exact
from tscale.budget import monte_carlo
from tscale.budget.perturbed import moved_log
from tscale.budget.wander import Wander
from tscale.errors import DataFileError, InvalidInput
from tscale.exact import FloatArray
from tscale.tables.circular_t import read_circular
from tscale.tables.clock_noise import ClockNoise

from .test_tables_clock_noise import LAWS

CIRCULAR = Path(__file__).parent / "data" / "circular" / "circular_t_229.txt"
DAY = 86400.0
START = tscale.Instants.from_iso("2025-03-01T00:00:00", scale="UTC")


def days(at: Any) -> tscale.Instants:
    return START.shifted(DAY * np.asarray(at, dtype=np.float64))


def clock_log(**options: Any) -> tscale.ClockLog:
    return tscale.ClockLog.from_rows("maser", days(np.arange(11)), 1e-9 * np.arange(11.0) ** 2, **options)


# ---- what all comparisons share --------------------------------------------------------------------


def test_a_month_of_a_circular_keeps_its_calibration() -> None:
    """UTC(CH) in the BIPM's Circular T 229 (2007): uA = 0.7 ns, uB = 5.1 ns. A mean of many keeps all of uB."""
    log = read_circular(CIRCULAR, "CH")
    np.testing.assert_allclose(log.comparisons.common_s, 5.1e-9, rtol=1e-15)
    np.testing.assert_allclose(log.comparisons.uncertainty_s, np.hypot(0.7e-9, 5.1e-9), rtol=1e-15)
    chain = tscale.chain("UTC(CH)", "UTC", clocks=[log])
    t = tscale.Instants.from_mjd(np.arange(54099, 54130, 5), 0.0, scale="UTC")
    budget = chain.budget(tscale.chain("UTC", "UTC(CH)", clocks=[log])(t))
    lines = {line.quantity.partition(", ")[2]: line for line in budget.lines}
    assert lines["calibration"].correlation == "common to all readings of the log"
    np.testing.assert_allclose(lines["calibration"].contribution_s, 5.1e-9, rtol=1e-12)
    np.testing.assert_allclose(lines["comparisons"].contribution_s, 0.7e-9, rtol=1e-9)
    assert budget.mean_sigma_s() == pytest.approx(math.hypot(5.1e-9, 0.7e-9 / math.sqrt(7)), rel=1e-9, abs=0)
    assert not any("calibration" in item.source for item in budget.not_included)
    # Halfway between two values their own errors are averaged, the shared one is not.
    half = exact.add_seconds(t.pair, 2.5 * DAY)
    want = math.hypot(5.1e-9, 0.7e-9 / math.sqrt(2))
    np.testing.assert_allclose(log.uncertainty_s((half[0][:6], half[1][:6])), want, rtol=1e-9)


def test_u_alone_is_all_shared(tmp_path: Path) -> None:
    text = CIRCULAR.read_text()
    path = tmp_path / "one.txt"
    for cells, own in (("-  -  5.1", 0.0), ("0.7  5.1  5.2", 0.7)):
        path.write_text(text.replace("0.7  5.1  5.1", cells))
        held = read_circular(path, "CH").comparisons
        np.testing.assert_allclose(held.common_s, 5.1e-9, rtol=1e-15)
        np.testing.assert_allclose(held.uncertainty_s, 1e-9 * np.hypot(own, 5.1), rtol=1e-15)
    path.write_text(text.replace("0.7  5.1  5.1", "0.7  5.1  5.3"))
    with pytest.raises(DataFileError, match=r"u is 5\.3 ns, where uA = 0\.7 and uB = 5\.1 make 5\.15") as caught:
        read_circular(path, "CH")
    assert caught.value.row is not None
    assert text.splitlines()[caught.value.row - 1].startswith("CH ")
    given = read_circular(CIRCULAR.with_name("circular_t_201.txt"), "CH", uncertainty_s=4e-9)
    np.testing.assert_array_equal(given.comparisons.common_s, 4e-9)


def test_a_column_of_what_is_shared(tmp_path: Path) -> None:
    path = tmp_path / "maser.csv"
    head = "epoch,offset_s,uncertainty_s,common_s\n2025-03-01,1e-7,5e-9,4e-9\n2025-03-02,2e-7,5e-9,"
    path.write_text(head + "3e-9\n")
    log = tscale.ClockLog.load(path)
    at = days([0.0, 0.5]).pair
    np.testing.assert_allclose(log.uncertainty_s(at), [5e-9, np.hypot(3.5e-9, 2.5e-9)], rtol=1e-12)
    assert tscale.ClockLog.inspect(path).loads
    for bad in ("6e-9", "-1e-9", "x"):
        path.write_text(head + bad + "\n")
        with pytest.raises(DataFileError, match="common_s") as caught:
            tscale.ClockLog.load(path)
        assert caught.value.row == 3
        assert [finding.rows for finding in tscale.ClockLog.inspect(path).of("bad number")] == [(3,)]
    with pytest.raises(InvalidInput, match="common_s") as wrong:
        clock_log(uncertainty_s=1e-9, common_s=np.where(np.arange(11) == 4, 2e-9, 0.0))
    assert wrong.value.mask is not None
    assert np.flatnonzero(wrong.value.mask).tolist() == [4]
    alone = tscale.chain("CLOCK(maser)", "UTC", clocks=[clock_log(uncertainty_s=1e-9)])
    assert any("common_s" in item.reason for item in alone.omissions(tscale.budget.Assumptions()))


# ---- how far a clock wanders -----------------------------------------------------------------------


@pytest.mark.parametrize(("simulate", "noise"), LAWS)
def test_differences_of_predictions_against_simulated_clocks(
    simulate: Callable[..., FloatArray], noise: ClockNoise
) -> None:
    """1500 clocks predicted from 16 days of comparisons: the scatter of differences between errors 1 and 2, 10 and 11,
    1 and 10 days ahead, and on both sides of the last comparison; known to 1/sqrt(3000) = 1.8 %, met within four times
    that. Days are of 16 steps, which stand for continuous noise to 1/32: 2 % more.
    """
    step, fit, last = 16, 16, 24
    frequency = simulate(np.random.default_rng(11), 1500, step * 40)
    phase = np.concatenate([np.zeros((1500, 1)), np.cumsum(frequency, axis=1)], axis=1)
    level = ClockNoise(*(value * scale for value, scale in zip(
        (noise.white_frequency, noise.flicker_frequency, noise.random_walk_frequency),
        (math.sqrt(DAY / step), 1.0, 1.0 / math.sqrt(DAY / step)), strict=True)))  # fmt: skip
    log = tscale.ClockLog.from_rows("maser", days(np.arange(last + 1)), 0.0)
    longer = log.predicted(level, fit_s=fit * DAY, until=days(last + 12))
    ahead = np.array([-10.5, -0.5, 1.0, 2.0, 10.0, 11.0])
    chain = tscale.chain("UTC", "CLOCK(maser)", clocks=[longer])
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", tscale.ExtrapolationWarning)
        budget = chain.budget(days(last + ahead))
    errors = []
    for at in last + ahead:
        here = phase[:, round(step * at)]
        if at > last:
            rate = (phase[:, step * last] - phase[:, step * (last - fit)]) / fit
            errors.append(phase[:, step * last] + rate * (at - last) - here)
        else:
            low = math.floor(at)
            errors.append(0.5 * (phase[:, step * low] + phase[:, step * (low + 1)]) - here)
    found = np.array(errors) * DAY / step
    covariance = budget.covariance()
    for i, j in ((2, 3), (4, 5), (2, 4), (0, 1), (1, 2), (1, 5)):
        w = np.zeros(6)
        w[i], w[j] = -1.0, 1.0
        scatter = np.sqrt(np.mean((found[j] - found[i]) ** 2))
        assert scatter == pytest.approx(math.sqrt(w @ covariance @ w), rel=0.083, abs=0), (i, j)
        assert budget.mean_sigma_s(w) == pytest.approx(math.sqrt(w @ covariance @ w), rel=1e-6, abs=0)


NOISES = [ClockNoise(1e-13), ClockNoise(0, 1e-15), ClockNoise(0, 0, 1e-18), ClockNoise(0, 0, 0, 1e-10)]


@pytest.mark.parametrize("noise", NOISES)
def test_the_sum_of_many_instants_is_that_of_the_matrix(noise: ClockNoise) -> None:
    """Without the matrix, for 700 instants: white noise and random walk to roundings, flicker noise by a grid."""
    knots = DAY * np.arange(31.0)
    t = np.sort(np.random.default_rng(1).uniform(0.0, 30 * DAY, 700))
    i = np.minimum((t // DAY).astype(int), 29)
    part = t / DAY - i
    law = Wander(np.stack([knots[i], knots[i + 1], t], -1), np.stack([1 - part, part, -np.ones(700)], -1), noise)
    signed = noise.contrast_s(law.times_s, law.weights) / 700
    whole = signed @ law.matrix(700) @ signed
    assert law.variance_of_sum(signed) == pytest.approx(whole, rel=1e-5, abs=0)
    assert np.linalg.eigvalsh(law.covariance())[0] > -1e-10 * np.trace(law.covariance())


def test_hourly_comparisons_of_ten_years_lose_no_digits() -> None:
    """Readings of the clock an hour apart in ten years: neighbouring instants go together as in a log of a day."""
    hour = 3600.0
    noise = ClockNoise(0, 0, 1e-18)
    found = []
    for start in (0.0, 87600 * hour):
        at = start + hour * np.array([0.25, 0.75])
        times = np.stack([np.full(2, start), np.full(2, start + hour), at], -1)
        weights = np.array([[0.75, 0.25, -1.0], [0.25, 0.75, -1.0]])
        far = np.array([[0.0, hour, hour / 2]]) if start else np.array([[2 * hour, 3 * hour, 2.5 * hour]])
        both = Wander(np.concatenate([times, far]), np.concatenate([weights, [[0.5, 0.5, -1.0]]]), noise)
        found.append(both.matrix(3))
        assert found[-1][2, :2].tolist() == [0.0, 0.0]  # a contrast after the other has no part of its random walk
    np.testing.assert_allclose(found[0], found[1], rtol=0, atol=1e-9)


def test_trials_predict_again_from_moved_comparisons() -> None:
    noise = ClockNoise(white_frequency=1e-13)
    log = clock_log(uncertainty_s=5e-9, common_s=3e-9)
    for drift, interpolation in ((False, "linear"), (True, "cubic")):
        base = clock_log(uncertainty_s=5e-9, common_s=3e-9, interpolation=interpolation)
        longer = base.predicted(noise, fit_s=5 * DAY, until=days(20), start=days(-5), drift=drift)
        errors = np.linspace(-1e-9, 2e-9, 11)
        moved = moved_log(longer, np.arange(11), errors)
        again = clock_log(interpolation=interpolation, uncertainty_s=5e-9, common_s=3e-9)
        by_hand = moved_log(again, np.arange(11), errors).predicted(
            noise, fit_s=5 * DAY, until=days(20), start=days(-5), drift=drift
        )
        at = days([-4.0, 0.0, 5.5, 10.0, 17.0]).pair
        assert [part.tolist() for part in moved.offset(at)] == [part.tolist() for part in by_hand.offset(at)]
    longer = log.predicted(noise, fit_s=5 * DAY, until=days(20), start=days(-5))
    chain = tscale.chain("UTC", "CLOCK(maser)", clocks=[longer])
    t = days([-3.0, 4.5, 12.0, 19.0])
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", tscale.ExtrapolationWarning)
        trials = monte_carlo(chain, t, draws=600, seed=4)
    assert trials.moved == ("CLOCK(maser) - UTC, comparisons", "CLOCK(maser) - UTC, calibration")
    assert trials.added == ("CLOCK(maser) - UTC, wander of the clock",)
    assert trials.agrees(3.5)
    # Off the diagonal too: a coefficient r is known to (1 - r^2) / sqrt(600), 4 % at most; four times that.
    linear, drawn = trials.budget.covariance(), trials.covariance()
    scale = np.sqrt(np.outer(np.diag(linear), np.diag(linear)))
    np.testing.assert_allclose(drawn / scale, linear / scale, rtol=0, atol=0.16)
    assert abs(linear / scale)[2, 3] > 0.9
