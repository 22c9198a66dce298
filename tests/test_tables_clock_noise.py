"""Clock noise and prediction: the laws against closed forms, a published data set and simulated clocks."""

from __future__ import annotations

import pickle
import warnings
from collections.abc import Callable
from pathlib import Path

import allantools
import numpy as np
import pytest

import tscale
from tscale import ClockLog, Instants, exact
from tscale.errors import ExtrapolationWarning, InvalidInput, OutOfSpan
from tscale.exact import FloatArray
from tscale.tables.clock_noise import ClockNoise, allan_deviation

START = int(Instants.from_iso("2025-03-01T00:00:00", scale="UTC").whole)
LN2 = np.log(2.0)


def instants(seconds: object, scale: str = "UTC") -> Instants:
    return Instants.from_seconds(START, np.asarray(seconds, dtype=np.float64), scale=scale)


# ---- the laws --------------------------------------------------------------------------------------


def test_prediction_laws_in_closed_form() -> None:
    """Line through readings S apart, t ahead. White: increments are independent, a^2 t (1 + t/S). Random walk: with
    the rate a Wiener process of 3 c^2 per second, c^2 t^2 (t + S). Flicker: b^2/(2 ln 2) t (1 + t/S) (S ln(1 + t/S) +
    t ln(1 + S/t)). To 1e-7: differences of cubes lose half of the digits where t is small.
    """
    t = np.array([1.0, 60.0, 3600.0, 86400.0, 1e7])
    for fit in (60.0, 86400.0, 3e6):
        white = np.sqrt(t * (1 + t / fit))
        walk = t * np.sqrt(t + fit)
        flicker = np.sqrt(t * (1 + t / fit) * (fit * np.log1p(t / fit) + t * np.log1p(fit / t)) / (2 * LN2))
        for law, noise in (
            (white, ClockNoise(white_frequency=1.0)),
            (flicker, ClockNoise(flicker_frequency=1.0)),
            (walk, ClockNoise(random_walk_frequency=1.0)),
        ):
            got = noise.prediction_s(t, fit)
            np.testing.assert_allclose(got, law, rtol=1e-5, atol=0)
            assert noise.prediction_s(0.0, fit) == 0.0
        phase = ClockNoise(white_phase_s=2.0).prediction_s(t, fit)
        np.testing.assert_allclose(phase, 2 * np.sqrt(1 + (1 + t / fit) ** 2 + (t / fit) ** 2), rtol=1e-12, atol=0)


def test_a_prediction_over_its_own_fit_is_the_allan_deviation() -> None:
    """The error is then a second difference: sqrt(2) tau sigma_y(tau), by definition (NIST SP 1065, equation 8)."""
    noise = ClockNoise(2e-13, 1e-15, 3e-19, 5e-11)
    tau = np.logspace(0, 7, 15)
    np.testing.assert_allclose(noise.prediction_s(tau, tau), np.sqrt(2) * tau * noise.deviation(tau), rtol=1e-9, atol=0)


def test_no_prediction_beats_the_optimum() -> None:
    """Allan 1987 (IEEE Trans. UFFC-34, 647), table II, from memory: tau sigma_y for white and random-walk frequency
    noise, tau sigma_y / sqrt(ln 2) for flicker. The line reaches the first with a long fit and the last with a short.
    """
    tau = 1000.0
    fit = np.logspace(0, 8, 50)
    white, flicker, walk = (ClockNoise(*level) for level in ((1.0,), (0.0, 1.0), (0.0, 0.0, 1.0)))
    assert np.all(white.prediction_s(tau, fit) >= tau * white.deviation(tau))
    assert np.all(flicker.prediction_s(tau, fit) >= tau / np.sqrt(LN2))
    assert np.all(walk.prediction_s(tau, fit) >= tau * walk.deviation(tau))
    assert float(white.prediction_s(tau, 1e8)) == pytest.approx(tau * float(white.deviation(tau)), rel=1e-4, abs=0)
    assert float(walk.prediction_s(tau, 1.0)) == pytest.approx(tau * float(walk.deviation(tau)), rel=1e-3, abs=0)
    assert flicker.prediction_s(tau, fit).min() == pytest.approx(np.sqrt(2) * tau, rel=1e-2, abs=0)


def test_contrasts() -> None:
    noise = ClockNoise(white_frequency=1e-13)
    assert float(noise.contrast_s([0, 10, 30], [1, -1.5, 0.5])) == pytest.approx(
        # Increments: 10 s with weight -1, 20 s with weight 0.5.
        1e-13 * np.sqrt(10 * 1 + 20 * 0.25),
        rel=1e-12,
        abs=0,
    )
    # A reading that is named twice is one reading.
    both = ClockNoise(1e-13, 1e-15, 1e-18, 1e-10)
    assert float(both.contrast_s([0, 10, 30, 10], [1, -1, 0.5, -0.5])) == pytest.approx(
        float(both.contrast_s([0, 10, 30], [1, -1.5, 0.5])), rel=1e-12, abs=0
    )
    for weights in ([1, 0, 0], [1, -1, 0]):
        with pytest.raises(InvalidInput, match="no contrast"):
            noise.contrast_s([0, 10, 30], weights)
    # A year later nothing has changed.
    assert float(both.contrast_s(np.array([0, 10, 30]) + 3e7, [1, -1.5, 0.5])) == pytest.approx(
        float(both.contrast_s([0, 10, 30], [1, -1.5, 0.5])), rel=1e-9, abs=0
    )


def test_levels_are_checked() -> None:
    for bad in ({"white_frequency": -1e-13}, {"flicker_frequency": np.nan}, {"white_phase_s": np.inf}, {}):
        with pytest.raises(InvalidInput):
            ClockNoise(**bad)
    with pytest.raises(InvalidInput, match="above zero"):
        ClockNoise(1e-13).deviation([1.0, 0.0])
    with pytest.raises(InvalidInput, match="ahead"):
        ClockNoise(1e-13).prediction_s(-1.0, 10.0)
    assert str(ClockNoise(1e-13, 0.0, 2e-19)) == "white_frequency 1e-13, random_walk_frequency 2e-19"


# ---- deviations ------------------------------------------------------------------------------------


def test_the_thousand_point_data_set() -> None:
    """NIST SP 1065, section 12.4: 1000 frequencies by a congruential generator; overlapping Allan deviations of
    averages of 1, 10 and 100 (table 31, from memory): 2.922319e-1, 9.159953e-2, 3.241343e-2, to their printed digits.
    """
    value, values = 1234567890, []
    for _ in range(1000):
        values.append(value / 2147483647)
        value = 16807 * value % 2147483647
    phase = np.concatenate([[0.0], np.cumsum(values)])
    tau, deviation = allan_deviation(phase, 1.0)
    assert tau.tolist() == [1, 2, 4, 8, 16, 32, 64, 128]
    assert deviation[0] == pytest.approx(2.922319e-1, abs=5e-8)
    for average, printed in ((10, 9.159953e-2), (100, 3.241343e-2)):
        second = phase[2 * average :] - 2 * phase[average:-average] + phase[: -2 * average]
        assert np.sqrt(np.mean(second**2) / 2) / average == pytest.approx(printed, abs=5e-9)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        theirs = allantools.oadev(phase, rate=1.0, data_type="phase", taus=tau)[1]
    np.testing.assert_allclose(deviation, theirs, rtol=1e-12, atol=0)


def test_levels_from_a_curve_and_back() -> None:
    noise = ClockNoise(2e-13, 1e-15, 3e-19, 5e-11)
    tau = np.logspace(0, 6, 25)
    again = ClockNoise.from_deviation(tau, noise.deviation(tau))
    for part, value in vars(noise).items():
        assert getattr(again, part) == pytest.approx(value, rel=1e-6, abs=0)
    # Levels that the curve has not are zero, not negative.
    only = ClockNoise.from_deviation(tau, 1e-15 * np.ones(25))
    assert only.flicker_frequency == pytest.approx(1e-15, rel=1e-9, abs=0)
    assert max(only.white_frequency / 1e-15, only.random_walk_frequency / 1e-15) < 1e-4
    assert ClockNoise.from_deviation(100.0, 1e-14).deviation(100.0) == pytest.approx(1e-14, rel=1e-9, abs=0)
    for bad in ([0.0, 1e-14], [np.nan, 1e-14]):
        with pytest.raises(InvalidInput):
            ClockNoise.from_deviation([1.0, 10.0], bad)
    with pytest.raises(InvalidInput):
        ClockNoise.from_deviation([1.0, 10.0], [1e-13, 1e-14, 1e-15])


# ---- simulated clocks ------------------------------------------------------------------------------


def white(random: np.random.Generator, count: int, length: int) -> FloatArray:
    """Frequencies averaged over 1 s, with an Allan deviation of 1 at 1 s."""
    return random.standard_normal((count, length))


def flicker(random: np.random.Generator, count: int, length: int) -> FloatArray:
    """Fractional differencing of order 1/2 of white noise (Kasdin 1995, Proc. IEEE 83, 802): S_y = 1 / (pi f) per unit
    of variance, so that the Allan variance is 2 ln 2 / pi. The first three quarters, which still warm up, are left out.
    """
    k = np.arange(1, 4 * length)
    filtered = np.concatenate([[1.0], np.cumprod((k - 0.5) / k)])
    spectrum = np.fft.rfft(random.standard_normal((count, 4 * length)), 8 * length) * np.fft.rfft(filtered, 8 * length)
    return np.fft.irfft(spectrum)[:, 3 * length : 4 * length] / np.sqrt(2 * LN2 / np.pi)


def random_walk(random: np.random.Generator, count: int, length: int) -> FloatArray:
    """Frequency a Wiener process of 3 per second, by steps of 1 s: Allan variance tau."""
    return np.cumsum(np.sqrt(3.0) * random.standard_normal((count, length)), axis=1)


LAWS: list[tuple[Callable[..., FloatArray], ClockNoise]] = [
    (white, ClockNoise(white_frequency=1.0)),
    (flicker, ClockNoise(flicker_frequency=1.0)),
    (random_walk, ClockNoise(random_walk_frequency=1.0)),
]


@pytest.mark.parametrize(("simulate", "noise"), LAWS)
def test_growth_of_prediction_errors(simulate: Callable[..., FloatArray], noise: ClockNoise) -> None:
    """1500 clocks: the scatter of prediction errors is known to 1/sqrt(3000) = 1.8 %, and is met within four times
    that. Steps of 1 s stand for continuous noise to about 1/64 of the shortest span: 1 % more.
    """
    length = 1024
    frequency = simulate(np.random.default_rng(20250301), 1500, length)
    phase = np.concatenate([np.zeros((1500, 1)), np.cumsum(frequency, axis=1)], axis=1)
    for fit, ahead in ((256, 64), (256, 256), (256, 700), (64, 128), (512, 500)):
        edge = length - ahead
        line = phase[:, edge] + (phase[:, edge] - phase[:, edge - fit]) * ahead / fit
        scatter = np.sqrt(np.mean((phase[:, edge + ahead] - line) ** 2))
        assert scatter == pytest.approx(float(noise.prediction_s(ahead, fit)), rel=0.083, abs=0)
    # Between two readings: a bridge.
    for part in (0.1, 0.5, 0.8):
        at = round(512 * part)
        inside = phase[:, 512 + at] - (phase[:, 512] * (512 - at) + phase[:, 1024] * at) / 512
        want = noise.contrast_s([0, at, 512], [at / 512 - 1, 1, -at / 512])
        assert np.sqrt(np.mean(inside**2)) == pytest.approx(float(want), rel=0.083, abs=0)


@pytest.mark.parametrize("drift", [False, True])
@pytest.mark.parametrize("after", [True, False])
@pytest.mark.parametrize(("simulate", "noise"), LAWS)
def test_predicted_logs_against_simulated_clocks(
    simulate: Callable[..., FloatArray], noise: ClockNoise, after: bool, drift: bool
) -> None:
    """200 clocks, hourly readings over 64 h, errors 16 h past the log over the sigma that the log states: an rms of 1
    to 4 / sqrt(400) = 20 %.
    """
    # Levels at 1 s from those at one hour, in which the clocks are simulated.
    hour = 3600.0
    scale = 1e-14
    levels = ClockNoise(
        noise.white_frequency * scale * np.sqrt(hour),
        noise.flicker_frequency * scale,
        noise.random_walk_frequency * scale / np.sqrt(hour),
    )
    frequency = simulate(np.random.default_rng(8), 200, 96)
    phase = scale * hour * np.concatenate([np.zeros((200, 1)), np.cumsum(frequency, axis=1)], axis=1)
    ratios = []
    own = slice(0, 65) if after else slice(32, 97)
    target = 80 if after else 16
    for x in phase:
        log = ClockLog.from_rows("maser", instants(hour * np.arange(97)[own]), x[own])
        far = instants(hour * (96 if after else 0))
        ends = {"until": far} if after else {"start": far}
        longer = log.predicted(levels, fit_s=32 * hour, drift=drift, **ends)
        at = instants(hour * target).pair
        sigma = float(longer.uncertainty_s(at))
        ratios.append((float(exact.seconds(longer.offset(at))) - x[target]) / sigma)
    assert np.sqrt(np.mean(np.square(ratios))) == pytest.approx(1.0, abs=0.2)


def test_levels_of_a_simulated_log() -> None:
    """A maser-like clock read every 10 minutes for 3 months: white 3e-13 at 1 s, read to 10 ps."""
    random = np.random.default_rng(3)
    count, spacing = 12960, 600.0
    x = np.concatenate([[0.0], np.cumsum(3e-13 * np.sqrt(spacing) * random.standard_normal(count))])
    x += 1e-11 * random.standard_normal(count + 1)
    log = ClockLog.from_rows("maser", instants(spacing * np.arange(count + 1)), x, 1e-11)
    noise = ClockNoise.from_log(log)
    assert noise.white_frequency == pytest.approx(3e-13, rel=0.1, abs=0)
    assert noise.white_phase_s == pytest.approx(1e-11, rel=0.1, abs=0)
    assert noise.flicker_frequency < 3e-15  # a tenth of what the white noise is at the spacing's own 1.2e-14
    for length, complaint in ((15, "16 or more"), (40, "straight line")):
        with pytest.raises(InvalidInput, match=complaint):
            ClockNoise.from_log(ClockLog.from_rows("maser", instants(10.0 * np.arange(length)), 1e-9))


def test_the_longest_run() -> None:
    t = np.array([0, 10, 20, 30, 40, 55, 65, 75, 85, 95, 105, 115, 125], dtype=np.float64)
    x = 1e-9 * np.arange(13.0) ** 2
    log = ClockLog.from_rows("maser", instants(t), x, rate_step=np.arange(13) == 7)
    spacing, run = log.longest_run()
    assert spacing == 10.0
    np.testing.assert_allclose(run, x[7:] - x[7], rtol=0, atol=1e-21)
    missing = ClockLog.from_rows("maser", instants(t), x, missing=np.arange(13) >= 10)
    assert len(missing.longest_run()[1]) == 5


# ---- logs with noise -------------------------------------------------------------------------------


def test_wander_between_comparisons() -> None:
    """Linear: the Brownian bridge, sigma^2 t (1 - t/T), beside the comparisons' own errors; none at a comparison."""
    t = 86400.0 * np.arange(4)
    log = ClockLog.from_rows("maser", instants(t), 0.0, 1e-10)
    noisy = log.with_noise(ClockNoise(white_frequency=1e-12))
    s = np.array([[0.0, 21600.0], [43200.0, 86400.0]])
    part = s / 86400.0
    own = 1e-10 * np.hypot(part, 1 - part)
    want = np.hypot(own, 1e-12 * np.sqrt(s * (1 - part)))
    np.testing.assert_allclose(noisy.uncertainty_s(instants(s).pair), want, rtol=1e-9, atol=0)
    np.testing.assert_allclose(log.uncertainty_s(instants(s).pair), own, rtol=1e-12, atol=0)
    # A cubic hangs on four comparisons, which makes its share of white noise the larger.
    cubic = ClockLog.from_rows("maser", instants(t), 0.0, 0.0, interpolation="cubic").with_noise(noisy.noise)
    middle = instants(86400.0 * 1.5).pair
    weights = np.array([-1, 9, 9, -1, -16]) / 16
    days = np.array([0, 1, 2, 3, 1.5]) * 86400.0
    assert float(cubic.uncertainty_s(middle)) == pytest.approx(
        float(noisy.noise.contrast_s(days, weights)), rel=1e-9, abs=0
    )
    with pytest.raises(InvalidInput, match="step log"):
        ClockLog.from_rows("maser", instants(t), 0.0, interpolation="step").with_noise(noisy.noise)


def test_a_predicted_log(tmp_path: Path) -> None:
    day = 86400.0
    t = day * np.arange(11)
    x = 1e-6 + 2e-13 * t
    x[3] += 5e-10
    log = ClockLog.from_rows("maser", instants(t), x, 1e-10)
    noise = ClockNoise(white_frequency=1e-12)
    longer = log.predicted(noise, fit_s=5 * day, until="2025-03-31T00:00:00", start=instants(-10 * day))
    assert (len(log), len(longer), longer.issued, log.is_predicted, longer.is_predicted) == (
        11,
        11,
        "2025-03-11",
        False,
        True,
    )
    assert longer.span.to_iso(0).tolist() == ["2025-02-19T00:00:00", "2025-03-31T00:00:00"]
    assert longer.sha256 != log.sha256
    inside = instants(np.linspace(0, 10 * day, 50)).pair
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        assert [p.tolist() for p in longer.to_clock(inside)] == [p.tolist() for p in log.to_clock(inside)]
    assert longer.notes(inside) == ()
    at = instants(day * np.array([5.0, 12.0, 30.0]))
    with pytest.warns(ExtrapolationWarning, match=r"2 of 3 instants are predicted.*known to 3e-09 s"):
        reading = longer.to_clock(at.pair)
    with pytest.warns(ExtrapolationWarning, match="2 of 3 instants are predicted"):
        back = longer.to_reference(reading)
    assert np.max(np.abs(exact.seconds(exact.subtract(back, at.pair)))) <= 2e-16
    np.testing.assert_allclose(
        exact.seconds(longer.offset(at.pair)), 1e-6 + 2e-13 * day * np.array([5, 12, 30]), atol=2e-16
    )
    assert longer.notes(at.pair) == (
        "2 of 3 instants are predicted past the comparisons of CLOCK(maser), by its rate and noise model",
    )
    ahead = np.array([2.0, 20.0]) * day
    part = ahead / (5 * day)
    want = np.sqrt(noise.prediction_s(ahead, 5 * day) ** 2 + 1e-20 * ((1 + part) ** 2 + part**2))
    np.testing.assert_allclose(longer.uncertainty_s(at[1:].pair), want, rtol=1e-9, atol=0)
    np.testing.assert_allclose(longer.rate(at.pair), -2e-13, rtol=0, atol=1e-20)
    with pytest.raises(OutOfSpan, match=r"ClockLog\.predicted"):
        longer.to_clock(instants(31 * day).pair)
    # Before the first, the stretch holds the bad comparison of the third day, but not at its ends.
    early = float(exact.seconds(longer.offset(instants(-10 * day).pair)))
    assert early == pytest.approx(1e-6 - 2e-12 * day, abs=2e-16)
    again = pickle.loads(pickle.dumps(longer))
    assert again.uncertainty_s(at.pair).tolist() == longer.uncertainty_s(at.pair).tolist()


def test_a_prediction_with_drift_is_exact_for_a_parabola() -> None:
    day = 86400.0

    def clock(s: FloatArray) -> FloatArray:
        return 1e-6 + 2e-13 * s + 1.5e-20 * s**2

    t = day * np.array([0, 1, 2.2, 3, 4, 5.5, 6])
    for interpolation in ("linear", "cubic"):
        log = ClockLog.from_rows("maser", instants(t), clock(t), interpolation=interpolation)  # type: ignore[arg-type]
        ends = {"start": instants(-5 * day), "until": instants(11 * day)}
        longer = log.predicted(ClockNoise(1e-13), fit_s=6 * day, drift=True, **ends)
        s = day * np.array([-5.0, -3.3, -0.01, 6.01, 8.8, 11.0])
        at = instants(s).pair
        np.testing.assert_allclose(exact.seconds(longer.offset(at)), clock(s), rtol=0, atol=1e-15)
        np.testing.assert_allclose(longer.rate(at), -(2e-13 + 3e-20 * s), rtol=0, atol=1e-20)
        with pytest.warns(ExtrapolationWarning):
            back = longer.to_reference(longer.to_clock(at))
        assert np.max(np.abs(exact.seconds(exact.subtract(back, at)))) <= 4e-16
        # Between comparisons nothing has changed.
        inside = instants(np.linspace(0, 6 * day, 99)).pair
        assert [p.tolist() for p in longer.to_clock(inside)] == [p.tolist() for p in log.to_clock(inside)]
        for part, far in (("start", 11 * day), ("until", -5 * day)):
            with pytest.raises(InvalidInput, match=r"(first|last) comparison"):
                log.predicted(ClockNoise(1e-13), fit_s=6 * day, **{part: instants(far)})


def test_a_stretch_through_a_known_reset_and_a_gap() -> None:
    day = 86400.0
    t = day * np.arange(8)
    x = 1e-13 * t
    plain = ClockLog.from_rows("maser", instants(t), x)
    marked = ClockLog.from_rows(
        "maser",
        instants(t),
        x + 1e-3 * (t >= 4 * day),
        reset_s=1e-3 * (t == 4 * day),
        missing=t == 6 * day,
    )
    at = instants(9 * day).pair
    far = instants(10 * day)
    both = [
        float(exact.seconds(log.predicted(ClockNoise(1e-13), fit_s=6 * day, until=far).offset(at)))
        for log in (plain, marked)
    ]
    assert both[1] - both[0] == pytest.approx(1e-3, abs=1e-15)


def test_predictions_that_cannot_be_made() -> None:
    day = 86400.0
    noise = ClockNoise(1e-13)
    t = day * np.arange(8)
    far, near = instants(10 * day), instants(-day)
    log = ClockLog.from_rows("maser", instants(t), 1e-13 * t)
    with pytest.raises(InvalidInput, match="until="):
        log.predicted(noise, fit_s=day)
    with pytest.raises(InvalidInput, match="holds 1 comparisons; two"):
        log.predicted(noise, fit_s=day / 2, until=far)
    with pytest.raises(InvalidInput, match="three or more"):
        log.predicted(noise, fit_s=day, until=far, drift=True)
    with pytest.raises(InvalidInput, match="fit_s"):
        log.predicted(noise, fit_s=0.0, until=far)
    with pytest.raises(InvalidInput, match="one instant of UTC"):
        log.predicted(noise, fit_s=day, until=instants(t, "TAI"))
    with pytest.raises(InvalidInput, match="predicted already"):
        log.predicted(noise, fit_s=day, until=far).predicted(noise, fit_s=day, start=near)
    with pytest.raises(InvalidInput, match="join, then predict"):
        ClockLog.joined([log.predicted(noise, fit_s=day, until=far)])
    for marks, end in (
        ({"rate_step": t == 5 * day}, {"until": far}),
        ({"rate_step": t == 7 * day}, {"until": far}),
        ({"reset_s": np.where(t == 6 * day, np.nan, 0.0)}, {"until": far}),
        ({"rate_step": t == 0.0}, {"start": near}),
        ({"reset_s": 1e-6 * (t == 0.0)}, {"start": near}),
    ):
        broken = ClockLog.from_rows("maser", instants(t), 1e-13 * t, **marks)
        with pytest.raises(InvalidInput, match="shorter fit_s"):
            broken.predicted(noise, fit_s=4 * day, **end)
    ClockLog.from_rows("maser", instants(t), 1e-13 * t, rate_step=t == 5 * day).predicted(
        noise, fit_s=2 * day, until=far
    )
    with pytest.raises(InvalidInput, match="step log"):
        ClockLog.from_rows("maser", instants(t), 1e-13 * t, interpolation="step").predicted(noise, fit_s=day, until=far)


def test_a_chain_past_the_last_comparison() -> None:
    day = 86400.0
    t = day * np.arange(8)
    log = ClockLog.from_rows("maser", instants(t), 1e-13 * t, 1e-11)
    reading = instants(day * np.array([6.0, 9.0]), "CLOCK(maser)")
    with pytest.raises(OutOfSpan):
        tscale.chain("CLOCK(maser)", "TAI", clocks=[log])(reading)
    longer = log.predicted(ClockNoise(white_frequency=1e-12), fit_s=7 * day, until=instants(20 * day))
    path = tscale.chain("CLOCK(maser)", "TAI", clocks=[longer])
    with pytest.warns(ExtrapolationWarning, match="1 of 2 instants are predicted"):
        out = path(reading)
    with pytest.warns(ExtrapolationWarning):
        assert np.max(np.abs(path.inverse(out).minus(reading))) <= 1e-15
    with pytest.warns(ExtrapolationWarning):
        assert any("1 of 2 instants are predicted past" in note for note in path.ledger(reading).notes)
    with pytest.warns(ExtrapolationWarning):
        sigma = path.sigma_s(reading)
    assert sigma[1] == pytest.approx(float(longer.uncertainty_s(instants(9 * day).pair)), rel=1e-6, abs=0)
