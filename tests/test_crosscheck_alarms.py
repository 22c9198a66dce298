"""How often noise alone is given a name."""

from __future__ import annotations

import numpy as np
import pytest

from tests.crosscheck_support import COUNT, dates, noise, right
from tscale.crosscheck.catalogue import Columns, catalogue, columns
from tscale.crosscheck.path import Path
from tscale.crosscheck.remainder import leftovers
from tscale.crosscheck.search import FALSE_ALARM, Problem, search

FLOOR_S = 2e-13


@pytest.fixture(scope="module")
def evaluated() -> Columns:
    """The catalogue at the dates, once for all series of noise."""
    path = Path(right(), dates())
    return columns(path, catalogue(path), FLOOR_S)


def alarms(evaluated: Columns, rho: float, trials: int) -> int:
    count = 0
    for seed in range(trials):
        level = 10.0 ** (-10 + 5 * seed / trials)  # 0.1 ns to 10 us
        problem = Problem(noise(level, 9000 + seed, rho), evaluated.values, evaluated.signatures, FLOOR_S)
        count += any(evaluated.signatures[k].named for k, _ in search(problem)[0].members)
    return count


@pytest.mark.parametrize("rho", [0.0, 0.5])
def test_rate_of_false_alarms(evaluated: Columns, rho: float) -> None:
    # Stated: below 1e-3. Of 60 series one may be named: the chance of two at that rate is 0.2 %. Measured with 600
    # series each: none of white noise, none of noise of first order with 0.5 and 0.8, one with 0.95.
    assert FALSE_ALARM == 1e-3
    assert alarms(evaluated, rho, 60) <= 1


def test_the_test_can_fail(evaluated: Columns) -> None:
    # With a threshold that lets one in ten pass, the same series are named now and then.
    from tscale.crosscheck import search as module

    usual = module.FALSE_ALARM
    try:
        module.FALSE_ALARM = 1e6  # type: ignore[misc]
        assert alarms(evaluated, 0.5, 20) > 5
    finally:
        module.FALSE_ALARM = usual  # type: ignore[misc]


def test_noise_is_not_called_unexplained() -> None:
    # 100 series; the chance of a false word is 1e-3 each for mean, drift and the sky's periods, and for all others.
    seconds = dates().whole - dates().whole[0] + dates().fraction
    told = [leftovers(seconds, noise(1e-9, seed), None, FLOOR_S) for seed in range(100)]
    assert sum(bool(t) for t in told) <= 2
    assert leftovers(seconds, noise(1e-9, 1) + 1e-9, None, FLOOR_S)
    assert leftovers(seconds, np.zeros(COUNT), None, FLOOR_S) == ()


def test_the_nearest_of_many_amplitudes(evaluated: Columns) -> None:
    counted = [k for k, s in enumerate(evaluated.signatures) if len(s.allowed or ()) > 2]
    assert counted
    problem = Problem(np.zeros(COUNT), evaluated.values, evaluated.signatures, FLOOR_S)
    for k in counted:
        allowed = np.array(evaluated.signatures[k].allowed)
        for amplitude in (-1e9, -60.0, -3.4, -3.6, -0.2, 0.2, 17.0, 59.7, 61.0, 1e9):
            assert problem.nearest(k, amplitude) == allowed[np.argmin(np.abs(allowed - amplitude))]
