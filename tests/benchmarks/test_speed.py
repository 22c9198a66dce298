"""Speed, as ratios within one run: `python -m pytest tests/benchmarks -s`.

Ordinary test runs skip this folder's timings. Each benchmark times a general library beside ours, in turns and on the
same dates, and prints and checks the ratio of the medians.
"""

from __future__ import annotations

import statistics
import subprocess
import sys
import time
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

import tscale
from tscale.ephemeris.shipped import shipped_path
from tscale.ephemeris.time_integral import integrate_tt_minus_tdb, pin_at_t0

N = 100_000
SITE = tscale.Site.from_itrf("north", 1_200_000.0, -4_600_000.0, 4_230_000.0)
SOURCE = tscale.Source(83.6, 22.0, pm_dec_mas_yr=3.0, parallax_mas=0.5)


def seconds(work: Callable[[], Any], rounds: int = 3) -> float:
    found = []
    for _ in range(rounds):
        start = time.perf_counter()
        work()
        found.append(time.perf_counter() - start)
    return statistics.median(found)


@pytest.fixture(scope="module")
def dates() -> tscale.Instants:
    rng = np.random.default_rng(1)  # random epochs 1973-2026, in no order
    return tscale.Instants.from_seconds(rng.integers(-850_000_000, 840_000_000, N), rng.random(N), scale="UTC")


@pytest.fixture(scope="module")
def general(dates: tscale.Instants) -> Callable[[], Any]:
    """The general astronomy library's Time of the same dates, made anew each time: it caches conversions."""
    from astropy import coordinates
    from astropy import units as u
    from astropy.time import Time
    from astropy.utils import iers

    iers.conf.auto_download = False
    location = coordinates.EarthLocation.from_geocentric(1_200_000.0, -4_600_000.0, 4_230_000.0, unit=u.m)
    day, fraction = dates.to_jd()
    return lambda: Time(day.astype(float), fraction, format="jd", scale="utc", location=location)


def test_utc_to_tdb_at_a_site(benchmark: Any, dates: tscale.Instants, general: Callable[[], Any]) -> None:
    chain = tscale.chain("UTC", "TDB", site=SITE)
    theirs = seconds(lambda: general().tdb.jd2)
    benchmark.pedantic(chain, args=(dates,), rounds=7, warmup_rounds=1)
    ratio = theirs / benchmark.stats.stats.median
    benchmark.extra_info["ratio to astropy"] = ratio
    print(f"\nUTC -> TDB at a site: {benchmark.stats.stats.median / N * 1e6:.2f} us, {ratio:.1f} x astropy")
    assert ratio >= 6.0


def test_utc_to_tdb_at_the_barycentre(benchmark: Any, dates: tscale.Instants, general: Callable[[], Any]) -> None:
    from astropy import units as u
    from astropy.coordinates import SkyCoord

    chain = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE)
    there = SkyCoord(83.6 * u.deg, 22.0 * u.deg, frame="icrs")
    kernel = str(shipped_path("de440_1960_2060.bsp"))

    def theirs() -> Any:
        t = general()
        return t.tdb + t.light_travel_time(there, kind="barycentric", ephemeris=kernel)

    other = seconds(theirs)
    benchmark.pedantic(chain, args=(dates,), rounds=7, warmup_rounds=1)
    ratio = other / benchmark.stats.stats.median
    benchmark.extra_info["ratio to astropy"] = ratio
    print(f"\nUTC -> TDB@BARYCENTER: {benchmark.stats.stats.median / N * 1e6:.2f} us, {ratio:.1f} x astropy")
    assert ratio >= 25.0


def fresh(script: str) -> float:
    """Seconds that a script takes in a new interpreter, less the start of the interpreter itself."""
    run = [sys.executable, "-c", script]
    return seconds(lambda: subprocess.run(run, check=True), 5) - seconds(
        lambda: subprocess.run([sys.executable, "-c", "pass"], check=True), 5
    )


def test_import(benchmark: Any) -> None:
    took = fresh("import tscale; tscale.chain, tscale.Instants, tscale.Site, tscale.ReferenceData")
    benchmark.pedantic(lambda: None, rounds=1)
    benchmark.extra_info["seconds"] = took
    print(f"\nimport of every public name of a conversion: {took:.3f} s")
    assert took < 0.3


def test_first_conversion(benchmark: Any) -> None:
    took = fresh(
        "import tscale\n"
        "site = tscale.Site.from_itrf('north', 1.2e6, -4.6e6, 4.23e6)\n"
        "t = tscale.Instants.from_iso('2024-05-01T00:00:00', scale='UTC')\n"
        "source = tscale.Source(83.6, 22.0)\n"
        "tscale.chain('UTC', 'TDB@BARYCENTER', site=site, source=source)(t)\n"
    )
    benchmark.pedantic(lambda: None, rounds=1)
    benchmark.extra_info["seconds"] = took
    print(f"\nimport and first conversion to the barycentre: {took:.3f} s")
    assert took < 1.0


def test_building_the_time_ephemeris(benchmark: Any) -> None:
    ephemeris = tscale.Ephemeris.default()
    benchmark.pedantic(integrate_tt_minus_tdb, args=(ephemeris, pin_at_t0), rounds=3)
    print(f"\ntime ephemeris of a century: {benchmark.stats.stats.median:.2f} s")
    assert benchmark.stats.stats.median < 1.0
