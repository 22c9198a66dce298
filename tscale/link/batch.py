"""A batch of links solved in chunks, so that memory does not grow with it, and its faults told in one go."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Final, NamedTuple

import numpy as np

from .. import exact
from ..errors import TscaleError, gathered_extrapolations
from ..exact import BoolArray, FloatArray, IntArray, Pair
from .ends import End
from .solve import Options, Solved, solve

if TYPE_CHECKING:
    from ..tables.reference import ReferenceData

__all__ = ["Batch", "Failure", "raise_failures", "solve_batch"]

_CHUNK: Final = 8192


class Failure(NamedTuple):
    """An error, and which links of the flat batch it is about."""

    error: TscaleError
    links: IntArray


class Batch(NamedTuple):
    """Solutions of a flat batch."""

    solved: Solved | None
    """Of the links that `rows` names, of all if nothing failed; None if all did."""
    rows: IntArray
    other: Pair
    """TDB counts of the event that was sought, of the same links."""
    failures: list[Failure]


def solve_batch(
    known: Pair, known_is_receive: bool, ends: tuple[End, End], reference: ReferenceData, options: Options
) -> Batch:
    """Solve a flat batch. Links that an error names by its mask are put aside, and the others solved.

    Raises
    ------
    TscaleError
        Those that concern no single link.
    """
    whole, fraction = known
    parts: list[Solved] = []
    kept: list[IntArray] = []
    failures: list[Failure] = []
    with gathered_extrapolations(size=whole.size):
        for start in range(0, max(whole.size, 1), _CHUNK):
            rows = np.arange(start, min(start + _CHUNK, whole.size), dtype=np.int64)
            # Only a batch without links is solved empty: ends that are not ours need not know of such.
            while rows.size or not whole.size:
                try:
                    with gathered_extrapolations(repeats=True):
                        parts.append(solve((whole[rows], fraction[rows]), known_is_receive, *ends, reference, options))
                    kept.append(rows)
                    break
                except TscaleError as error:
                    bad = error.mask
                    if bad is None or bad.shape != rows.shape or not np.any(bad):
                        raise
                    failures.append(Failure(error, rows[bad]))
                    rows = rows[~bad]
    if not parts:
        none = np.zeros(0, dtype=np.int64)
        return Batch(None, none, (none, np.zeros(0)), failures)
    solved, rows = _joined(parts), np.concatenate(kept)
    light = exact.from_seconds(np.zeros(rows.shape))
    for value in solved.terms_s.values():
        light = exact.add_seconds(light, value)
    given = whole[rows], fraction[rows]
    other = exact.subtract(given, light) if known_is_receive else exact.add(given, light)
    return Batch(solved, rows, other, failures)


def raise_failures(failures: Sequence[Failure], shape: tuple[int, ...]) -> None:
    """Raise one error for all failures of the kind of the first, with the mask of the whole batch; none: return."""
    if not failures:
        return
    first = failures[0].error
    size = int(np.prod(shape, dtype=np.int64))
    alike = [failure for failure in failures if type(failure.error) is type(first)]
    mask = _mask(alike, size)
    message = str(first)
    if len(alike) > 1 or first.mask is None or first.mask.size != size:
        message = f"{int(mask.sum())} of {size} links cannot be solved; of the first of them: {message}"
    others = _mask([failure for failure in failures if type(failure.error) is not type(first)], size) & ~mask
    if np.any(others):
        message += f" ({int(others.sum())} more links cannot be solved for another reason)"
    first.args = (message,)
    first.mask = mask.reshape(shape)
    raise first


def _mask(failures: Sequence[Failure], size: int) -> BoolArray:
    mask = np.zeros(size, dtype=np.bool_)
    for failure in failures:
        mask[failure.links] = True
    return mask


def _joined(parts: Sequence[Solved]) -> Solved:
    first = parts[0]
    return Solved(
        {name: np.concatenate([part.terms_s[name] for part in parts]) for name in first.terms_s},
        np.concatenate([part.range_m for part in parts]),
        np.concatenate([part.range_rate_m_s for part in parts]),
        np.concatenate([part.light_time_rate for part in parts]),
        _perhaps([part.transmit_elevation_deg for part in parts]),
        _perhaps([part.receive_elevation_deg for part in parts]),
        {words: np.concatenate([part.ways[words] for part in parts]) for words in first.ways},
        max(part.iterations for part in parts),
    )


def _perhaps(parts: Sequence[FloatArray | None]) -> FloatArray | None:
    present = [part for part in parts if part is not None]
    return np.concatenate(present) if present else None
