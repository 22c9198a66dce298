"""The linear law against Monte Carlo: inputs drawn, chains run again (JCGM 101:2008), for chains of every kind."""

from __future__ import annotations

import math
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

import tscale
from tscale.budget import MonteCarlo, monte_carlo
from tscale.errors import InvalidInput

SITE = tscale.Site.from_itrf("test site", 4_051_700.0, 417_300.0, 4_890_200.0)
SOURCE = tscale.Source(83.6, 22.0, 150.0, -220.0, 40.0, name="test source")
LIMIT = 3.5
"""Statistical errors by which a standard deviation may be off: 5e-4 of all drawn by chance are off by more."""


def readings() -> tuple[tscale.Chain, tscale.Instants, dict[str, Any]]:
    """A maser by a laboratory's UTC, by UTC, to a realisation of TT: two logs, a table of rounded rows."""
    days = np.arange(58470, 58500, 5)
    labels = tscale.Instants.from_mjd(days, 0.0, scale="UTC")
    table = tscale.TTBIPM.from_rows(
        "TT(BIPM25)", [58469, 58479, 58489, 58499], [27.6735e-6, 27.674e-6, 27.6745e-6, 27.6752e-6]
    )
    site_utc = tscale.ClockLog.from_rows("UTC(KST)", labels, days * 1e-10 - 5e-6, 1e-9, interpolation="cubic")
    own = tscale.Instants.from_mjd(days, 0.25, scale="UTC(KST)")
    maser = tscale.ClockLog.from_rows("maser", own, (days - 58470) * 3e-8, np.linspace(2e-10, 8e-10, len(days)))
    reference = tscale.ReferenceData(tt_bipm=[table])
    chain = tscale.chain("CLOCK(maser)", "TT(BIPM25)", clocks=[maser, site_utc], reference=reference)
    t = tscale.Instants.from_mjd([58476, 58478, 58490], 0.5, scale="CLOCK(maser)")
    return chain, t, {"resolution_s": 2e-9}


def rotation() -> tuple[tscale.Chain, tscale.Instants, dict[str, Any]]:
    """UT1 from the shipped table: measured, predicted, and between the two."""
    table = tscale.EarthOrientation.default()
    first = table.predicted_from_mjd
    assert first is not None
    t = tscale.Instants.from_mjd([first - 30, first - 1, first + 20, first + 21], 0.4, scale="UTC")
    return tscale.chain("UTC", "UT1"), t, {"truncation": False}


def date_at_a_site() -> tuple[tscale.Chain, tscale.Instants, dict[str, Any]]:
    """TDB of an event on the ground, with a poor Earth orientation and a poorly known place."""
    rows = tscale.EarthOrientation.from_rows(
        np.arange(60420, 60440), -0.01, 0.03, 0.4, ut1_sigma_s=0.05, x_sigma_arcsec=0.5, y_sigma_arcsec=0.8
    )
    chain = tscale.chain("UTC", "TDB", site=SITE, reference=tscale.ReferenceData(earth_orientation=rows))
    t = tscale.Instants.from_mjd([60430, 60430], [0.1, 0.35], scale="UTC")
    return chain, t, {"site_sigma_m": (100.0, 50.0, 80.0), "time_ephemeris_sigma_s": 5e-12, "truncation": False}


def wavefront() -> tuple[tscale.Chain, tscale.Instants, dict[str, Any]]:
    """A wavefront from a site to the barycentre, all of the source's elements uncertain and two of them correlated."""
    chain = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE)
    t = tscale.Instants.from_iso(["2024-05-01T07:30:00", "2024-06-20T19:00:00"], scale="UTC")
    stated = {
        "source_position_sigma_mas": (0.3, 0.4),
        "proper_motion_sigma_mas_yr": (0.02, 0.01),
        "parallax_sigma_mas": 1.0,
        "correlations": [("right ascension cos dec", "proper motion in right ascension cos dec", -0.7)],
    }
    return chain, t, stated


def from_the_barycentre() -> tuple[tscale.Chain, tscale.Instants, dict[str, Any]]:
    """The other way: when a wavefront at the barycentre reaches a site, in UTC; what models leave out is added."""
    chain = tscale.chain("TDB@BARYCENTER", "UTC@TOPOCENTER", site=SITE, source=SOURCE)
    t = tscale.Instants.from_iso(["2024-05-01T07:30:00", "2024-05-01T13:00:00"], scale="TDB")
    return chain, t, {"site_sigma_m": 0.3, "reading_sigma_s": 2e-10, "bounds": [("cable", 1e-9)]}


Setting = Callable[[], tuple[tscale.Chain, tscale.Instants, dict[str, Any]]]


@pytest.mark.parametrize(
    ("setting", "draws"),
    [(readings, 1500), (rotation, 1500), (date_at_a_site, 800), (wavefront, 600), (from_the_barycentre, 300)],
)
def test_linear_law(setting: Setting, draws: int) -> None:
    chain, t, stated = setting()
    found = monte_carlo(chain, t, draws=draws, seed=20_240_501, **stated)
    assert found.moved
    assert np.all(np.abs(found.pull) < LIMIT), found.table()
    assert found.agrees()
    # The mean is that of the chain as it is, within its own statistical error.
    assert np.all(np.abs(found.mean_s) < LIMIT * found.sigma_s / math.sqrt(draws))
    # Covariances too; one of M draws is good to sqrt((s_i^2 s_j^2 + c_ij^2) / (M - 1)).
    law, drawn = found.budget.covariance(), found.covariance()
    error = np.sqrt((np.outer(np.diag(law), np.diag(law)) + law**2) / (draws - 1))
    assert np.all(np.abs(drawn - law) < LIMIT * error), (drawn - law) / error
    # The check is not blind: without what joins the instants, or with all joined, it would have failed.
    off = ~np.eye(t.size, dtype=bool)
    assert np.any(np.abs(law[off]) > 5.0 * error[off])


def test_most_of_a_budget_goes_through_the_chain() -> None:
    chain, t, stated = readings()
    found = monte_carlo(chain, t, draws=50, **stated)
    assert set(found.moved) == {
        "CLOCK(maser) - UTC(KST), comparisons",
        "UTC(KST) - UTC, comparisons",
        "TT(BIPM25) - TAI",
    }
    assert found.added == ("resolution of the readings",)


def test_the_same_seed_gives_the_same_draws() -> None:
    chain, t, stated = readings()
    one, two, other = (monte_carlo(chain, t, draws=20, seed=seed, **stated).deviations_s for seed in (1, 1, 2))
    np.testing.assert_array_equal(one, two)
    assert not np.any(one == other)


def test_quantiles_and_text() -> None:
    t = tscale.Instants.from_mjd([60431], 0.0, scale="UTC")
    found = monte_carlo(tscale.chain("UTC", "TAI"), t, draws=20_000, seed=4, resolution_s=1.0)
    assert found.moved == ()
    low, high = found.interval_s(0.95)
    # A rectangle of width 1 s: 95 % of it, each end good to sqrt(0.025 0.975 / 20000) = 1.1 ms.
    assert float(high[0]) == pytest.approx(0.475, rel=0, abs=0.005)
    assert float(low[0]) == pytest.approx(-0.475, rel=0, abs=0.005)
    assert float(found.sigma_s[0]) == pytest.approx(1.0 / math.sqrt(12.0), rel=0.01)
    assert found.statistical_error_s[0] == pytest.approx(found.sigma_s[0] / math.sqrt(2 * 19_999), rel=1e-9)
    assert "20000 draws" in found.table()
    for bad in (found.interval_s, found.quantile_s):
        with pytest.raises(InvalidInput):
            bad(1.5)


def test_a_wrong_law_is_found() -> None:
    chain, t, stated = readings()
    found = monte_carlo(chain, t, draws=400, **stated)
    doubled = MonteCarlo(found.deviations_s * 1.3, found.budget, found.moved, found.added)
    assert not doubled.agrees()
    assert isinstance(repr(doubled), str)


@pytest.mark.parametrize("draws", [1, 0, -3, 2.5, "many", 10**9])
def test_odd_numbers_of_draws(draws: Any) -> None:
    chain, t, _ = rotation()
    with pytest.raises(InvalidInput):
        monte_carlo(chain, t, draws=draws)


def test_a_clock_of_its_own_time() -> None:
    start = tscale.Instants.from_iso("2024-05-01T00:00:00", scale="UTC")
    site = tscale.Site.from_itrf("ground", *SITE.position_m, geopotential_number_m2_s2=900.0)
    clock = tscale.ProperClock("ground", site, start, geopotential_sigma_m2_s2=10.0)
    t = tscale.chain("UTC", "PROPER(ground)", clocks=[clock])(start.shifted(np.array([1e5, 2e5])))
    found = monte_carlo(tscale.chain("PROPER(ground)", "TDB", clocks=[clock]), t, draws=40, site_sigma_m=3.0)
    assert {"ITRF x of ground", "geopotential at ground"} <= set(found.added)
    assert "UT1 - TAI" in found.moved
    assert found.agrees()
    # 10 m2/s2 is 1.1e-16 in rate, for 2e5 s.
    sigma = found.budget.by_source()["geopotential at ground"]
    assert sigma[1] == pytest.approx(10.0 / 299792458.0**2 * 2e5, rel=1e-6, abs=0)


def test_values_held_past_the_table_are_added() -> None:
    t = tscale.Instants.from_iso(["2040-01-01T05:00:00", "2041-01-01T05:00:00"], scale="TT")
    chain = tscale.chain("TT", "TDB", site=SITE)
    with pytest.warns(tscale.ExtrapolationWarning):
        found = monte_carlo(chain, t, draws=100, seed=1)
    assert "UT1 - TAI, held" in found.added
    # 0.65 s a year from 2027 on: 8 s of turn at 0.3 km/s, times v/c^2 up to 1e-4 / c, by the hour up to 0.8 ns.
    held = found.budget.by_source()["Earth orientation, UT1"]
    assert np.all((held > 5e-11) & (held < 1e-9))
    assert found.agrees()
