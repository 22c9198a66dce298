"""A chain over a dask cluster: compiled here once, used by workers that hold neither kernel nor tables.

Starts a cluster of two processes on this machine; `--scheduler tcp://HOST:8786` takes one that is there. The results
are compared with those of this process alone: all of them if there are few, of many a SHA-256 of each block, for the
readings of a billion stay on the workers.

    python examples/on_a_cluster.py
    python examples/on_a_cluster.py --readings 1e9
"""

from __future__ import annotations

import argparse
import hashlib
from pathlib import Path

import dask
import dask.array as da
import numpy as np
from dask.distributed import Client, LocalCluster

import tscale

HERE = Path(__file__).parent
BLOCK = 1_000_000
SAMPLE = 100  # blocks that are done again in this process, where not all are


def number(text: str) -> int:
    """A whole number, also as 1e9."""
    value = float(text)
    if not value.is_integer() or not 2 <= value <= 1e13:
        raise ValueError
    return int(value)


def digest(whole: np.ndarray, fraction: np.ndarray) -> np.ndarray:
    """SHA-256 of the bytes of a block of results."""
    return np.frombuffer(hashlib.sha256(whole.tobytes() + fraction.tobytes()).digest(), dtype=np.uint8)


def main() -> None:
    arguments = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    arguments.add_argument("--scheduler", metavar="ADDRESS", help="of a cluster that is running")
    arguments.add_argument("--readings", metavar="N", type=number, default=1_000_000)
    arguments.add_argument(
        "--fetch-up-to", metavar="N", type=number, default=10_000_000, help="readings of which all results are fetched"
    )
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
    n, block = args.readings, min(BLOCK, max(1, args.readings // 10))
    whole = start + da.arange(n, chunks=block, dtype=np.int64) * (7 * 86400) // n
    fraction = da.random.default_rng(3).random(n, chunks=block)
    dates = tscale.cluster.map_arrays(compiled, whole, fraction)

    workers = (
        LocalCluster(n_workers=2, threads_per_worker=1, dashboard_address=None) if args.scheduler is None else None
    )
    if n <= args.fetch_up_to:
        wanted, again = list(dates), list(dates)
        what = f"{n} readings"
    else:
        seals = da.map_blocks(digest, *dates, dtype=np.uint8, chunks=((32,) * whole.numblocks[0],))
        picked = np.unique(np.linspace(0, whole.numblocks[0] - 1, SAMPLE).astype(int))
        wanted, again = [seals], [seals.blocks[k] for k in picked]
        what = f"{n} readings, of {len(picked)} of their {whole.numblocks[0]} blocks the SHA-256"
    ends = [part[[0, -1]] for part in dates]
    with Client(workers if workers is not None else args.scheduler) as client:
        *found, end_whole, end_fraction = client.gather(client.compute([*wanted, *ends]))
    if workers is not None:
        workers.close()

    alone = dask.compute(*again, scheduler="single-threaded")
    if n > args.fetch_up_to:
        found = [found[0].reshape(-1, 32)[k] for k in picked]
    same = all(np.array_equal(a, b) for a, b in zip(found, alone, strict=True))
    print(f"{what}; the same bytes as in this process alone: {same}")
    print(tscale.Instants.from_seconds(end_whole, end_fraction, scale="TDB").to_iso(9))
    if not same:
        raise SystemExit(1)


if __name__ == "__main__":
    main()
