"""What `evaluate` and the mapping of Instants accept."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt

from ..errors import InvalidInput, ScaleMismatch
from ..exact import Pair
from ..instants import Instants
from ..scales import Node

__all__ = ["check_kind", "check_out", "checked_counts", "checked_threads", "overwritten"]


def check_kind(t: object, node: Node, what: object) -> None:
    """Let pass Instants of a node alone."""
    if not isinstance(t, Instants):
        raise InvalidInput(
            f"a compiled chain maps Instants, got {type(t).__name__}; make them with Instants.from_iso or another "
            "from_..., or give plain arrays to evaluate"
        )
    if t.scale != node.scale.name or (node.place is not None and t.place not in (None, node.place)):
        raise ScaleMismatch(f"{what} takes {node} on this side, got instants of {t.node}")


def checked_threads(threads: Any) -> int:
    """Return a number of threads."""
    if isinstance(threads, bool) or not isinstance(threads, (int, np.integer)) or threads < 1:
        raise InvalidInput(f"threads is a whole number from 1 up, got {threads!r}")
    return int(threads)


def checked_counts(whole: Any, fraction: Any) -> Pair:
    """Return both parts as int64 and float64 arrays of one shape, without a copy if they are."""
    try:
        w, f = np.broadcast_arrays(np.asarray(whole), np.asarray(fraction))
    except ValueError as error:
        raise InvalidInput(f"whole seconds and fractions must have shapes that broadcast: {error}") from error
    if w.dtype.kind not in "iu" or (w.dtype == np.uint64 and (w > np.uint64(2**62)).any()) or f.dtype.kind not in "fiu":
        raise InvalidInput(
            f"counts are (int64 whole, float64 fraction), got {w.dtype} and {f.dtype}; normalise them as Instants do"
        )
    return w.astype(np.int64, copy=False), f.astype(np.float64, copy=False)


def check_out(out: Any, shape: tuple[int, ...]) -> None:
    """Let pass a pair of arrays that results can be written into."""
    try:
        whole, fraction = out
        apart = not np.shares_memory(whole, fraction)
        good = (
            (whole.dtype, fraction.dtype) == (np.int64, np.float64)
            and whole.shape == shape == fraction.shape
            and all(a.flags.writeable and (a.ndim == 1 or a.flags.c_contiguous) for a in (whole, fraction))
        )
    except (TypeError, ValueError, AttributeError):
        good = False
    if not good:
        raise InvalidInput(
            f"out is a pair of writable arrays, int64 and float64, contiguous and of shape {shape}; got {_kinds(out)}"
        )
    if not apart:
        raise InvalidInput("the two arrays of out share memory: each needs its own")


def _kinds(out: Any) -> str:
    if not isinstance(out, (tuple, list)):
        return type(out).__name__
    return ", ".join(f"{getattr(a, 'dtype', type(a).__name__)} {getattr(a, 'shape', '')}" for a in out)


def overwritten(given: Pair, out: Pair) -> bool:
    """Whether some of what is given would be written over before it is read, and has to be copied first.

    Each instant is read before it is written, so that each part may be written into itself; shifted against itself, or
    into the other part, it may not.
    """
    return any(
        np.may_share_memory(a, b) and not (i == j and _same_memory(a, b))
        for i, a in enumerate(given)
        for j, b in enumerate(out)
    )


def _same_memory(a: npt.NDArray[Any], b: npt.NDArray[Any]) -> bool:
    """Whether two arrays are one and the same items in memory."""
    same = a.__array_interface__["data"] == b.__array_interface__["data"]
    return same and a.strides == b.strides and a.shape == b.shape
