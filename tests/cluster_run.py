"""Map dask arrays on a cluster of two worker processes, one of which is killed on the way; run by test_cluster.py."""

from __future__ import annotations

import os
import signal
import sys
import time
import warnings

import dask
import dask.array as da
import numpy as np
from dask.distributed import Client, LocalCluster

import tscale
from tscale import cluster

BLOCKS, SIZE = 40, 4000


def dates(block: int) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(block)
    return 790_000_000 + block * 86_400 + rng.integers(0, 86_400, SIZE), rng.random(SIZE)


def part(index: int, block_info: dict[int, dict[str, tuple[int, ...]]] | None = None) -> np.ndarray:
    assert block_info is not None
    time.sleep(0.05)  # so that work is under way when the worker dies
    return dates(block_info[0]["chunk-location"][0])[index]


def main() -> None:
    warnings.simplefilter("ignore")
    chain = tscale.chain("UTC", "TDB@GEOCENTER")
    chunks = ((SIZE,) * BLOCKS,)
    seeds = da.zeros(BLOCKS * SIZE, chunks=chunks)
    whole, fraction = (
        seeds.map_blocks(lambda _, block_info=None, i=i: part(i, block_info), dtype=kind)
        for i, kind in enumerate((np.int64, np.float64))
    )
    result = cluster.map_arrays(chain, whole, fraction)
    with (
        LocalCluster(n_workers=2, threads_per_worker=1, dashboard_address=None) as workers,
        Client(workers) as client,
    ):
        futures = client.compute(list(result))
        before = set(client.run(os.getpid).values())
        time.sleep(0.7)
        os.kill(min(before), signal.SIGKILL)
        mapped = client.gather(futures)
        after = set(client.run(os.getpid).values())
    alone = [chain(tscale.Instants.from_seconds(*dates(block), scale="UTC")) for block in range(BLOCKS)]
    same = np.array_equal(mapped[0], np.concatenate([t.whole for t in alone]))
    same &= np.array_equal(mapped[1], np.concatenate([t.fraction for t in alone]))
    print(f"worker lost: {min(before) not in after}; same bytes: {same}; dates: {len(mapped[0])}")
    sys.stdout.flush()


if __name__ == "__main__":
    with dask.config.set({"distributed.logging.distributed": "critical"}):
        main()
