"""Compiled chains beside a plain copy of the same arrays and a general library: `python -m pytest tests/benchmarks -s`.

Times are the least of several runs: whatever else the machine does only adds to them.
"""

from __future__ import annotations

import time
from collections.abc import Callable
from typing import Any

import numpy as np
import pytest

import tscale
from tscale.ephemeris.shipped import shipped_path

SITE = tscale.Site.from_itrf("north", 1_200_000.0, -4_600_000.0, 4_230_000.0)
SOURCE = tscale.Source(83.6, 22.0, pm_dec_mas_yr=3.0, parallax_mas=0.5)
CHAIN = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE)
N = 10_000_000


def least_s(work: Callable[[], Any], rounds: int = 5) -> float:
    found = []
    for _ in range(rounds):
        start = time.perf_counter()
        work()
        found.append(time.perf_counter() - start)
    return min(found)


@pytest.fixture(scope="module")
def month() -> tscale.CompiledChain:
    return CHAIN.compile("2024-05-01", "2024-06-01", tolerance_s=1e-13)


def events(month: tscale.CompiledChain, n: int) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(3)
    first, last = month.span.whole
    return rng.integers(first, last, n), rng.random(n)


def library_s_per_instant() -> float:
    """The general astronomy library's `Time.tdb` and barycentric `light_travel_time`, on 10^4 dates of the month."""
    from astropy import coordinates
    from astropy import units as u
    from astropy.time import Time
    from astropy.utils import iers

    iers.conf.auto_download = False
    n = 10_000
    location = coordinates.EarthLocation.from_geocentric(1_200_000.0, -4_600_000.0, 4_230_000.0, unit=u.m)
    there = coordinates.SkyCoord(83.6 * u.deg, 22.0 * u.deg, frame="icrs")
    kernel = str(shipped_path("de440_1960_2060.bsp"))
    day = 2460431.5 + 31.0 * np.random.default_rng(1).random(n)

    def work() -> Any:
        t = Time(day, format="jd", scale="utc", location=location)
        return t.tdb + t.light_travel_time(there, kind="barycentric", ephemeris=kernel)

    return least_s(work, 3) / n


def test_ten_million_instants(benchmark: Any, month: tscale.CompiledChain) -> None:
    random = events(month, N)
    order = np.argsort(random[0], kind="stable")
    by_date = random[0][order], random[1][order]
    out = np.empty(N, dtype=np.int64), np.empty(N)
    copy = least_s(lambda: (random[0].copy(), random[1].copy())) / N
    copy_into = least_s(lambda: (np.copyto(out[0], random[0]), np.copyto(out[1], random[1]))) / N
    library = library_s_per_instant()
    rows = {
        "by date": least_s(lambda: month.evaluate(*by_date)) / N,
        "by date, 2 threads": least_s(lambda: month.evaluate(*by_date, threads=2)) / N,
        "in no order": least_s(lambda: month.evaluate(*random)) / N,
        "in no order, 2 threads": least_s(lambda: month.evaluate(*random, threads=2)) / N,
        "back, by date": 0.0,
    }
    back = month.evaluate(*by_date)
    rows["back, by date"] = least_s(lambda: month.evaluate_inverse(*back)) / N
    into = least_s(lambda: month.evaluate(*by_date, out=out)) / N
    benchmark.pedantic(lambda: month.evaluate(*by_date, out=out), rounds=3)
    print(
        f"\n10^7 instants UTC -> TDB@BARYCENTER; a copy takes {copy * 1e9:.2f} ns, into arrays {copy_into * 1e9:.2f} ns"
    )
    print(f"{'':24s}{'ns':>8s}{'copies':>8s}{'x library':>11s}")
    for name, took in rows.items():
        print(f"{name:24s}{took * 1e9:8.2f}{took / copy:8.1f}{library / took:11.0f}")
    print(f"{'by date, into others':24s}{into * 1e9:8.2f}{into / copy_into:8.1f}{library / into:11.0f}")
    for name in ("by date", "in no order"):
        assert rows[name] <= 8.0 * copy
        assert library >= 2000.0 * rows[name]


def test_the_cost_per_instant_is_flat(benchmark: Any, month: tscale.CompiledChain) -> None:
    # Up to 10^9 by passes over parts of 10^7, as a stream would bring them; into arrays that are there.
    costs = {}
    print()
    for n in (100_000, 1_000_000, 10_000_000):
        whole, fraction = events(month, n)
        out = np.empty(n, dtype=np.int64), np.empty(n)
        rounds = 50 if n < 10_000_000 else 10
        costs[n] = least_s(lambda w=whole, f=fraction, o=out: month.evaluate(w, f, out=o), rounds) / n  # type: ignore[misc]
        print(f"{n:11d} instants in no order: {costs[n] * 1e9:.2f} ns each")
    passes = []
    for _ in range(100):
        start = time.perf_counter()
        month.evaluate(whole, fraction, out=out)
        passes.append(time.perf_counter() - start)
    # Of the last fifty passes the best ten: were there anything that grows with what has been done, it would show, and
    # whatever else the machine does in the meantime does not.
    costs[10**9] = float(np.mean(np.sort(passes[50:])[:10])) / n
    print(
        f"{10**9:11d} instants in no order: {costs[10**9] * 1e9:.2f} ns each in the best ten of the last fifty passes, "
        f"{sum(passes):.0f} s in all"
    )
    benchmark.pedantic(lambda: month.evaluate(whole, fraction, out=out), rounds=3)
    assert max(costs.values()) < 2.0 * min(costs.values())
    assert costs[10**9] * 1e9 < 40.0


def test_a_single_call(benchmark: Any, month: tscale.CompiledChain) -> None:
    one = tscale.Instants.from_iso("2024-05-07T01:02:03.25", scale="UTC")
    assert one.shape == ()

    def thousand() -> None:
        for _ in range(1000):
            month(one)

    took = least_s(thousand) / 1000
    listed = one.reshape(1)
    as_list = least_s(lambda: [month(listed) for _ in range(1000)]) / 1000
    benchmark(month, one)
    print(f"\none instant: {took * 1e6:.1f} us; as an array of one: {as_list * 1e6:.1f} us")
    assert took < 20e-6


def test_compiling_a_month(benchmark: Any, month: tscale.CompiledChain) -> None:
    took = least_s(lambda: CHAIN.compile("2024-05-01", "2024-06-01", tolerance_s=1e-13), 3)
    benchmark.pedantic(lambda: CHAIN.compile("2024-05-01", "2024-06-01", tolerance_s=1e-13), rounds=1)
    print(f"\na month to 1e-13 s, both directions with their certificate: {took:.2f} s, {len(month.to_bytes())} bytes")
    assert took < 1.0
