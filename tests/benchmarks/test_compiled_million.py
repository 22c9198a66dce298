"""Certificates against a million random dates of the chain itself, with a fixed seed."""

from __future__ import annotations

import numpy as np
import pytest

import tscale

SITE = tscale.Site.from_itrf("north", 1_200_000.0, -4_600_000.0, 4_230_000.0)
SOURCE = tscale.Source(83.6, 22.0, pm_dec_mas_yr=3.0, parallax_mas=0.5)
N = 1_000_000


@pytest.mark.parametrize(("end", "tolerance_s"), [("TDB", 1e-15), ("TDB@BARYCENTER", 1e-13), ("TDB@BARYCENTER", 3e-13)])
@pytest.mark.parametrize("way", ["forward", "inverse"])
def test_a_million_dates(end: str, tolerance_s: float, way: str) -> None:
    chain = tscale.chain("UTC", end, site=SITE, source=SOURCE)
    compiled = chain.compile("2024-05-01", "2024-06-01", tolerance_s=tolerance_s)
    span = compiled.span if way == "forward" else compiled.inverse_span
    t = span[:1].shifted(np.random.default_rng(2024).random(N) * span[1].minus(span[0]))
    ours, theirs = (compiled(t), chain(t)) if way == "forward" else (compiled.inverse(t), chain.inverse(t))
    error = ours.minus(theirs)
    facts = compiled.certificate
    worst, spread = float(np.max(np.abs(error))), float(np.std(error))
    print(
        f"\n{end}, {way}, to {tolerance_s:g} s: worst of {N} dates {worst:.2e} s, rms {spread:.2e} s; the chain's own "
        f"rounding {facts.noise_s:.2e} s rms; certificate {facts.max_error_s:.2e} s"
    )
    assert worst <= tolerance_s
