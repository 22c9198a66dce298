"""Cross-checks as JSON: their numbers come back to the last bit."""

from __future__ import annotations

import json

import numpy as np
import pytest

import tscale
from tscale.serial import from_json, to_json


@pytest.fixture(scope="module")
def found() -> tscale.crosscheck.Explanation:
    """Another program that took the leap seconds from a table with one too few, and 1 us of noise."""
    random = np.random.default_rng(5)
    t = tscale.Instants(np.sort(random.integers(4 * 10**8, 7 * 10**8, 200)), random.random(200), "UTC")
    chain = tscale.chain("UTC", "TT")
    return tscale.crosscheck.explain(t, chain(t).shifted(-1.0 + 1e-6 * random.standard_normal(200)), chain=chain)


def test_residuals(found: tscale.crosscheck.Explanation) -> None:
    residuals = found.residuals
    back = from_json(to_json(residuals))
    assert back["kind"] == "Residuals"
    assert np.array_equal(back["residual_s"], residuals.residual_s)
    for name in ("t", "theirs", "ours"):
        assert (back[name] == getattr(residuals, name)).all()
        assert back[name].node == getattr(residuals, name).node
    # The residuals are those of the dates beside them.
    assert np.array_equal(back["theirs"].minus(back["ours"]), back["residual_s"])
    assert {name: back[name] for name in residuals.facts()} == residuals.facts()
    assert json.loads(to_json(residuals))["rms_s"] == residuals.rms_s


def test_explanations(found: tscale.crosscheck.Explanation) -> None:
    assert found.found  # the leap second
    text = to_json(found)
    back = from_json(text)
    assert back["kind"] == "Explanation"
    assert back["verdict"] == found.verdict
    assert np.array_equal(back["unexplained_s"], found.unexplained_s)
    assert np.array_equal(back["residuals"]["residual_s"], found.residuals.residual_s)
    for cause, held in zip(found.found, back["causes"], strict=True):
        assert (held["name"], held["amplitude"], held["sigma"]) == (cause.name, cause.amplitude, cause.sigma)
        assert held["alternatives"] == cause.alternatives
    assert back["looked_for"] == found.looked_for
    assert back["unexplained_rms_s"] == found.unexplained_rms_s
    # What holds no chain any more is the same document again.
    assert to_json(found) == text


def test_two_dates_have_no_uncertainty_of_a_trend() -> None:
    t = tscale.Instants.from_iso(["2024-01-01", "2025-01-01"], "UTC")
    chain = tscale.chain("UTC", "TAI")
    residuals = tscale.crosscheck.against(t, chain(t).shifted([1e-9, 2e-9]), chain=chain)
    assert from_json(to_json(residuals))["trend_sigma_s_per_year"] is None
