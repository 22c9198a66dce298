"""A chain over a dask cluster: compiled here once, used by workers that hold neither kernel nor tables.

Starts a cluster of two processes on this machine; `--scheduler tcp://HOST:8786` takes one that is there.

    python examples/on_a_cluster.py
"""

from __future__ import annotations

import argparse
from pathlib import Path

import dask
import dask.array as da
import numpy as np
from dask.distributed import Client, LocalCluster

import tscale

HERE = Path(__file__).parent


def main() -> None:
    arguments = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    arguments.add_argument("--scheduler", metavar="ADDRESS", help="of a cluster that is running")
    arguments.add_argument("--readings", metavar="N", type=int, default=1_000_000)
    args = arguments.parse_args()

    chain = tscale.chain(
        "UTC",
        "TDB@BARYCENTER",
        site=tscale.Site.load(HERE / "site.toml"),
        source=tscale.Source.load(HERE / "source.toml"),
    )
    compiled = chain.compile("2025-03-01", "2025-03-08")
    print(compiled.certificate.table())

    # Readings of a week, as they might come out of an archive: made on the workers, block by block.
    start = int(tscale.Instants.from_iso("2025-03-01", "UTC").whole)
    n, block = args.readings, 100_000
    whole = start + da.arange(n, chunks=block, dtype=np.int64) * (7 * 86400) // n
    fraction = da.random.default_rng(3).random(n, chunks=block)
    dates = tscale.cluster.map_arrays(compiled, whole, fraction)

    workers = (
        LocalCluster(n_workers=2, threads_per_worker=1, dashboard_address=None) if args.scheduler is None else None
    )
    with Client(workers if workers is not None else args.scheduler) as client:
        out_whole, out_fraction = client.gather(client.compute(list(dates)))
    if workers is not None:
        workers.close()

    alone = dask.compute(*dates, scheduler="single-threaded")
    same = np.array_equal(out_whole, alone[0]) and np.array_equal(out_fraction, alone[1])
    print(f"{len(out_whole)} readings; the same bytes as in this process alone: {same}")
    print(tscale.Instants.from_seconds(out_whole[[0, -1]], out_fraction[[0, -1]], scale="TDB").to_iso(9))
    if not same:
        raise SystemExit(1)


if __name__ == "__main__":
    main()
