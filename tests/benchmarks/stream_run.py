"""Stream readings of a month through a compiled chain and print what it took; run by test_stream_speed.py."""

from __future__ import annotations

import json
import sys
import time
from collections.abc import Iterator
from pathlib import Path

import numpy as np

import tscale
from tscale.exact import Pair
from tscale.files.stream import map_blocks

BLOCK = 2**17
MONTH_S = 30 * 86400


def blocks(start: int, count: int) -> Iterator[Pair]:
    """Readings in order over the month, made block by block."""
    fraction = np.random.default_rng(1).random(BLOCK)
    steps = np.arange(BLOCK, dtype=np.int64)
    for k in range(count):
        first, last = MONTH_S * k // count, MONTH_S * (k + 1) // count
        yield start + first + steps * (last - first) // BLOCK, fraction


def peak_gib() -> float:
    """Most memory that this process has held: `getrusage` would tell that of its parent where that is larger."""
    status = Path("/proc/self/status").read_text()
    return int(next(line for line in status.splitlines() if line.startswith("VmHWM:")).split()[1]) / 2**20


def main(count: int, threads: int) -> None:
    site = tscale.Site.from_geodetic("Kestrel Ridge", lon_deg=127.35, lat_deg=-26.15, height_m=612.0)
    source = tscale.Source(ra_deg=187.25, dec_deg=-12.64, parallax_mas=6.2)
    compiled = tscale.chain("UTC", "TDB@BARYCENTER", site=site, source=source).compile("2025-03-01", "2025-04-01")
    start = int(tscale.Instants.from_iso("2025-03-01", "UTC").whole)
    done, check = 0, 0.0
    begun = time.perf_counter()
    for whole, fraction in map_blocks(compiled, blocks(start, max(1, count // BLOCK)), threads=threads):
        done += whole.size
        check += float(fraction[-1])
    took_s = time.perf_counter() - begun
    print(json.dumps({"done": done, "took_s": took_s, "peak_gib": peak_gib(), "check": check}))


if __name__ == "__main__":
    main(int(float(sys.argv[1])), int(sys.argv[2]))
