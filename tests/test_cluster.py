"""Chains over dask arrays and dataframes, on threads and on worker processes that are lost on the way."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import dask
import dask.array as da
import dask.dataframe as dd
import numpy as np
import pandas as pd
import pytest

import tscale
from tscale import cluster
from tscale.errors import InvalidInput, OutOfSpan

CHAIN = tscale.chain("UTC", "TDB@GEOCENTER")


def events(n: int = 3000) -> tscale.Instants:
    rng = np.random.default_rng(11)
    return tscale.Instants.from_seconds(790_000_000 + rng.integers(0, 30_000_000, n), rng.random(n), scale="UTC")


def test_arrays_of_any_shape_give_the_bytes_of_one_process() -> None:
    t = events().reshape(30, 100)
    whole, fraction = (da.from_array(part, chunks=(7, 60)) for part in t.pair)
    mapped = cluster.map_arrays(CHAIN, whole, fraction)
    assert [part.dtype for part in mapped] == [np.int64, np.float64]
    got = dask.compute(*mapped, scheduler="threads")
    want = CHAIN(t)
    assert np.array_equal(got[0], want.whole)
    assert np.array_equal(got[1], want.fraction)


def test_frames_keep_their_columns_and_partitions() -> None:
    t = events()
    frame = pd.DataFrame({"time_whole_s": t.whole, "time_fraction_s": t.fraction, "energy": np.arange(t.size) / 7})
    lazy = cluster.map_frame(CHAIN, dd.from_pandas(frame, npartitions=5), result="tdb")
    assert lazy.npartitions == 5
    got = lazy.compute(scheduler="threads")
    want = CHAIN(t)
    assert list(got.columns) == [*frame.columns, "tdb_whole_s", "tdb_fraction_s"]
    pd.testing.assert_frame_equal(got[list(frame.columns)], frame)
    assert np.array_equal(got["tdb_whole_s"], want.whole)
    assert np.array_equal(got["tdb_fraction_s"], want.fraction)


def test_a_worker_that_is_killed_takes_nothing_with_it() -> None:
    done = subprocess.run(
        [sys.executable, Path(__file__).with_name("cluster_run.py")], capture_output=True, text=True, timeout=120
    )
    assert done.stdout.strip().endswith("worker lost: True; same bytes: True; dates: 160000"), done.stderr[-3000:]


def test_what_does_not_fit_is_refused_before_anything_is_computed() -> None:
    whole, fraction = (da.from_array(part, chunks=100) for part in events(400).pair)
    with pytest.raises(InvalidInput, match="whole must be a dask array of int64, got Array of float64"):
        cluster.map_arrays(CHAIN, fraction, fraction)
    with pytest.raises(InvalidInput, match="rechunk"):
        cluster.map_arrays(CHAIN, whole, fraction.rechunk(50))
    with pytest.raises(InvalidInput, match="a stream needs a Chain"):
        cluster.map_arrays("UTC", whole, fraction)  # type: ignore[arg-type]
    frame = dd.from_pandas(pd.DataFrame({"t_whole_s": [1], "t_fraction_s": ["x"]}), npartitions=1)
    with pytest.raises(InvalidInput, match="no column t_fraction_s of float64"):
        cluster.map_frame(CHAIN, frame, "t")
    twice = dd.from_pandas(pd.DataFrame({"t_whole_s": [1], "t_fraction_s": [0.5]}), npartitions=1)
    with pytest.raises(InvalidInput, match="already"):
        cluster.map_frame(CHAIN, twice, "t", "t")


def test_errors_of_the_chain_come_back_from_the_workers_with_their_mask() -> None:
    whole = da.from_array(np.array([790_000_000, 2**40]), chunks=2)
    mapped = cluster.map_arrays(CHAIN, whole, da.zeros(2, chunks=2))
    with pytest.raises(OutOfSpan) as caught:
        dask.compute(*mapped, scheduler="threads")
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True]
