"""Chains over dask arrays and dataframes: on the threads of one machine or the workers of many (needs dask).

The mapping goes into the graph once, as a value of its own: the scheduler keeps it and hands it to each worker that
needs it, so that a worker that is lost takes nothing with it. A compiled chain needs no kernel and no tables on the
workers. Blocks are mapped alone, in order, and give the same bytes wherever they are worked on.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

import numpy as np

from .errors import InvalidInput, MissingPiece
from .exact import FloatArray, IntArray
from .files.stream import Mapping, evaluator, mapping_digest

if TYPE_CHECKING:
    import dask.array as da
    import dask.dataframe as dd

__all__ = ["map_arrays", "map_frame"]

_PARTS = np.dtype([("whole", np.int64), ("fraction", np.float64)])


def map_arrays(mapping: Mapping, whole: da.Array, fraction: da.Array) -> tuple[da.Array, da.Array]:
    """Map counts kept as two dask arrays.

    Parameters
    ----------
    mapping : Chain or CompiledChain
    whole : dask array of int64
        Whole seconds since 2000-01-01T12:00:00 of the mapping's start scale, any shape.
    fraction : dask array of float64
        Fraction of a second in [0, 1), in the same shape and chunks.

    Returns
    -------
    whole, fraction : dask array
        Counts of the mapping's end scale; nothing is computed yet. Compute both together
        (`dask.compute(whole, fraction)`): they share their work.

    Raises
    ------
    InvalidInput
        Arrays of other types, shapes or chunks. What the mapping raises comes when the arrays are computed.
    MissingPiece
        dask is not installed.
    """
    da = _dask("dask.array")
    for name, array, kind in (("whole", whole, np.int64), ("fraction", fraction, np.float64)):
        if not isinstance(array, da.Array) or array.dtype != kind:
            raise InvalidInput(
                f"{name} must be a dask array of {np.dtype(kind).name}, got {type(array).__name__} of "
                f"{getattr(array, 'dtype', 'no dtype')}"
            )
    if whole.chunks != fraction.chunks:
        raise InvalidInput(
            f"whole and fraction must have the same shape and chunks, got {whole.chunks} and {fraction.chunks}; "
            "rechunk one like the other"
        )
    both = da.map_blocks(
        _block, whole, fraction, _shared(mapping), dtype=_PARTS, meta=np.empty((0,) * whole.ndim, _PARTS)
    )
    return both["whole"], both["fraction"]


def map_frame(mapping: Mapping, frame: dd.DataFrame, column: str = "time", result: str | None = None) -> dd.DataFrame:
    """Add the two columns of converted dates to a dask dataframe.

    Parameters
    ----------
    mapping : Chain or CompiledChain
    frame : dask dataframe
        With the dates in `COLUMN_whole_s` (int64) and `COLUMN_fraction_s` (float64).
    column : str
        Name of the dates.
    result : str, optional
        Name of the new dates, by default the end node of the mapping.

    Raises
    ------
    InvalidInput
        No such columns, or columns of another type, or new ones that are there already.
    MissingPiece
        dask is not installed.
    """
    _dask("dask.dataframe")
    name = str(mapping.end) if result is None else result
    for ending, kind in (("whole_s", np.int64), ("fraction_s", np.float64)):
        if f"{column}_{ending}" not in frame.columns or frame.dtypes[f"{column}_{ending}"] != kind:
            raise InvalidInput(
                f"the frame has no column {column}_{ending} of {np.dtype(kind).name}; there are "
                + ", ".join(f"{key} ({value})" for key, value in frame.dtypes.items())
            )
        if f"{name}_{ending}" in frame.columns:
            raise InvalidInput(f"the frame has a column {name}_{ending} already; name the new one otherwise (result=)")
    meta = frame._meta.assign(
        **{f"{name}_whole_s": np.empty(0, np.int64), f"{name}_fraction_s": np.empty(0, np.float64)}
    )
    untyped: Any = frame
    mapped: dd.DataFrame = untyped.map_partitions(_partition, _shared(mapping), column, name, meta=meta)
    return mapped


def _dask(module: str) -> Any:
    try:
        return __import__(module, fromlist=["_"])
    except ImportError as error:
        raise MissingPiece("clusters need dask: pip install 'tscale[cluster]'") from error


def _shared(mapping: Mapping) -> Any:
    """The mapping as one value of the graph, under a name that tells what it is."""
    evaluator(mapping)  # refuses what is no mapping, here and not on a worker
    return _dask("dask").delayed(mapping, pure=True, name=f"tscale-{mapping_digest(mapping)}", traverse=False)


def _block(whole: IntArray, fraction: FloatArray, mapping: Mapping) -> Any:
    out = np.empty(whole.shape, _PARTS)
    if whole.size:
        mapped = evaluator(mapping)((whole, fraction))
        out["whole"], out["fraction"] = mapped
    return out


def _partition(frame: Any, mapping: Mapping, column: str, name: str) -> Any:
    pair = (frame[f"{column}_whole_s"].to_numpy(), frame[f"{column}_fraction_s"].to_numpy())
    whole, fraction = evaluator(mapping)(pair) if len(frame) else pair
    return frame.assign(**{f"{name}_whole_s": whole, f"{name}_fraction_s": fraction})
