"""A billion readings in a stream, and a table from file to file: time and memory."""

from __future__ import annotations

import json
import os
import subprocess
import sys
import time
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow.parquet as pq

import tscale
from tscale.files.arrow_columns import date_columns
from tscale.files.tables import convert_table


def streamed(count: float, threads: int) -> dict[str, Any]:
    script = Path(__file__).with_name("stream_run.py")
    done = subprocess.run(
        [sys.executable, script, str(count), str(threads)], capture_output=True, text=True, check=True
    )
    found: dict[str, Any] = json.loads(done.stdout)
    return found


def test_a_billion_readings_in_a_stream() -> None:
    threads = min(2, os.cpu_count() or 1)
    print()
    for count in (1e5, 1e6, 1e7, 1e8, 1e9):
        run = min((streamed(count, threads) for _ in range(3 if count < 1e8 else 1)), key=lambda run: run["took_s"])
        print(
            f"{run['done']:>12} readings, {threads} threads: {run['took_s']:8.3f} s, "
            f"{run['took_s'] / run['done'] * 1e9:6.1f} ns each, peak {run['peak_gib']:.2f} GiB"
        )
    assert run["done"] > 0.99e9
    assert run["took_s"] < 40.0
    assert run["peak_gib"] < 2.0


def test_a_table_from_file_to_file(tmp_path: Path) -> None:
    n = 20_000_000
    rng = np.random.default_rng(3)
    start = int(tscale.Instants.from_iso("2025-03-01", "UTC").whole)
    t = tscale.Instants.from_seconds(start + np.sort(rng.integers(0, 30 * 86400, n)), rng.random(n), scale="UTC")
    pq.write_table(date_columns("time", t), tmp_path / "in.parquet", use_dictionary=False, compression="none")
    compiled = tscale.chain("UTC", "TDB@GEOCENTER").compile("2025-03-01", "2025-04-01")
    print()
    for ending in ("parquet", "arrow"):
        begun = time.perf_counter()
        convert_table(compiled, tmp_path / "in.parquet", tmp_path / f"out.{ending}", threads=2)
        took_s = time.perf_counter() - begun
        size = (tmp_path / f"out.{ending}").stat().st_size / 2**20
        print(f"{n} rows to .{ending}: {took_s:.2f} s, {took_s / n * 1e9:.0f} ns a row, {size:.0f} MiB written")
