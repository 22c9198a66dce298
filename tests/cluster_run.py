"""Map dask arrays on a cluster of two worker processes, one of which is killed on the way; run by test_cluster.py.

With the chain itself, or with `compiled` as its argument with a compiled one.
"""

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
START = 790_000_000


def dates(block: int) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(block)
    return START + block * 86_400 + rng.integers(0, 86_400, SIZE), rng.random(SIZE)


def part(index: int, block_info: dict[int, dict[str, tuple[int, ...]]] | None = None) -> np.ndarray:
    assert block_info is not None
    time.sleep(0.05)  # so that work is under way when the worker dies
    return dates(block_info[0]["chunk-location"][0])[index]


def mapping(compiled: bool) -> tscale.Chain | tscale.CompiledChain:
    chain = tscale.chain("UTC", "TDB@GEOCENTER")
    if not compiled:
        return chain
    ends = tscale.Instants.from_seconds([START, START + BLOCKS * 86_400], 0.0, scale="UTC")
    return chain.compile(ends[0], ends[1], tolerance_s=1e-15)


def main(compiled: bool) -> None:
    warnings.simplefilter("ignore")
    chain = mapping(compiled)
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
        under_way = not all(future.done() for future in futures)
        os.kill(min(before), signal.SIGKILL)
        mapped = client.gather(futures)
        after = set(client.run(os.getpid).values())
    alone = [chain(tscale.Instants.from_seconds(*dates(block), scale="UTC")) for block in range(BLOCKS)]
    same = np.array_equal(mapped[0], np.concatenate([t.whole for t in alone]))
    same &= np.array_equal(mapped[1], np.concatenate([t.fraction for t in alone]))
    lost = under_way and min(before) not in after
    print(f"{type(chain).__name__}: worker lost: {lost}; same bytes: {same}; dates: {len(mapped[0])}")
    sys.stdout.flush()


if __name__ == "__main__":
    with dask.config.set({"distributed.logging.distributed": "critical"}):
        main(sys.argv[1:] == ["compiled"])
