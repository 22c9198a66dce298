"""Where a chain may be expected to break: dates at which its tables, logs and kernels change polynomials."""

from __future__ import annotations

from collections.abc import Iterable, Iterator
from typing import TYPE_CHECKING, Any, Final, NamedTuple, TypeAlias

import numpy as np

from .. import exact
from ..counts import fixed_count, tcb_from_tdb, tcg_from_tt
from ..errors import OutOfSpan
from ..exact import BoolArray, FloatArray, Pair
from ..instants import Instants
from ..scales import Scale
from ..tables.common import tai_of_days
from .direct import Direct

if TYPE_CHECKING:
    from ..chains import Chain
    from ..step import Step

__all__ = ["Count", "Hints", "hints_inside", "needs_ephemeris"]

Count: TypeAlias = tuple[int, float]

_BARYCENTRIC: Final = ("TCB", "TDB")
_DYNAMIC: Final = frozenset(("TCB", "TDB", "TCL"))
_RECORDS_OF: Final = ("earth", "moon", "sun")


class Hints(NamedTuple):
    """Breaks to expect, on the start scale, in order: from each count on over some seconds (mostly none)."""

    at: Pair
    width_s: FloatArray
    gentle: BoolArray


def hints_inside(direct: Direct, first: Count, last: Count, apart_s: float) -> Hints:
    """Breaks to expect, those within some picoseconds taken together."""
    whole, fraction, gentle = [np.zeros(0, dtype=np.int64)], [np.zeros(0)], [np.zeros(0, dtype=np.bool_)]
    for number, scale, counts, soft in _expected(direct):
        part = _mapped_back(direct, number, scale, counts, first, last)
        after = ((part[0] - first[0]) + (part[1] - first[1])) > apart_s
        before = ((last[0] - part[0]) + (last[1] - part[1])) > apart_s
        whole.append(part[0][after & before])
        fraction.append(part[1][after & before])
        gentle.append(np.full(whole[-1].shape, soft))
    w, f, soft_ = np.concatenate(whole), np.concatenate(fraction), np.concatenate(gentle)
    order = np.lexsort((f, w))
    w, f, soft_ = w[order], f[order], soft_[order]
    heads = np.flatnonzero(np.append(True, (np.diff(w) + np.diff(f)) > apart_s)[: len(w)])
    tails = np.append(heads[1:], len(w)) - 1 if heads.size else heads
    width_s = (w[tails] - w[heads]) + (f[tails] - f[heads])
    together = np.logical_and.reduceat(soft_, heads) if heads.size else soft_
    return Hints((w[heads], f[heads]), width_s, np.asarray(together))


def needs_ephemeris(steps: Iterable[Step]) -> bool:
    """Whether any of the steps depends on where the bodies are."""
    for step in steps:
        names = {step.start.scale.name, step.end.scale.name}
        proper = "PROPER" in (step.start.scale.family, step.end.scale.family)
        if step.start.place != step.end.place or proper or (names & _DYNAMIC and names != {"TCB", "TDB"}):
            return True
    return False


def _expected(direct: Direct) -> Iterator[tuple[int | None, str, Pair, bool]]:
    """(number of the step before which the counts stand, or None; their scale; the counts; whether they are gentle)."""
    chain = direct.chain
    supplies: Any = chain._supplies
    scales = [direct.start.scale.name, *(step.end.scale.name for step in direct.steps)]
    for number, step in enumerate(direct.steps):
        names = {step.start.scale.name, step.end.scale.name}
        for log in supplies.clocks:
            if names != {log.scale, log.reference}:
                continue
            curve = log._curve
            if step.start.scale.name == log.reference:
                yield number, log.reference, curve.reference, False
            else:
                yield number, log.scale, curve.clock, False
                yield number, log.scale, curve.clock_end, False
    tables = chain.reference
    for table in tables.tt_bipm:
        if table.scale in scales:
            yield None, "TAI", tai_of_days(table.mjd, tables.leap_seconds)[0], True
    dated = needs_ephemeris(direct.steps)
    site = supplies.site if dated else None
    if "UT1" in scales or (site is not None and getattr(site, "uses_earth_orientation", True)):
        yield None, "TAI", tai_of_days(tables.earth_orientation.mjd, tables.leap_seconds)[0], True
    for scale, counts in _knots(site):
        yield None, scale, counts, True
    if dated:
        for grid in _record_grids(chain):
            yield None, "TDB", grid, True


def _knots(site: Any) -> Iterator[tuple[str, Pair]]:
    """Dates of the states that a trajectory is interpolated between, and the ends of its pieces."""
    for piece in getattr(site, "pieces", ()):
        for end in (piece.first, piece.last):
            if end is not None:
                yield site.scale, (np.atleast_1d(np.asarray(end[0])), np.atleast_1d(np.asarray(end[1], dtype=float)))
        motion = piece.motion
        if hasattr(motion, "_whole"):
            yield site.scale, (motion._whole, motion._fraction)
        elif hasattr(motion, "_segment"):
            for edges_s in _segment_edges(motion):
                yield site.scale, exact.from_seconds(edges_s)


def _segment_edges(motion: Any) -> Iterator[FloatArray]:
    """Where records or windows of states change in a segment of a kernel, and in those of the bodies above it."""
    segments, seen = [motion._segment], set()
    while segments:
        segment = segments.pop()
        if segment.grid is not None:
            start_s, step_s = segment.grid
            yield start_s + step_s * np.arange(int((segment.end_s - start_s) // step_s) + 1)
        elif hasattr(segment, "_epochs"):
            epochs = segment._epochs
            yield epochs
            if segment._window % 2:  # the window moves on in the middle between two epochs
                yield 0.5 * (epochs[1:] + epochs[:-1])
        seen.add(segment.center)
        if segment.center != motion._top:
            above = motion._kernel._paths._by_target.get(segment.center, ())
            segments += [other for other in above if other.center not in seen]


def _record_grids(chain: Chain) -> Iterator[Pair]:
    """Edges of the records of the ephemeris: polynomials meet there to some micrometres."""
    ephemeris = chain.reference.ephemeris
    for start_s, step_s in sorted({ephemeris.record_grid(body) for body in _RECORDS_OF}):
        low, high = ephemeris.span
        edges = start_s + step_s * np.arange(int((low - start_s) // step_s), int((high - start_s) // step_s) + 1)
        yield exact.from_seconds(edges)


def _mapped_back(direct: Direct, number: int | None, scale: str, counts: Pair, first: Count, last: Count) -> Pair:
    """Counts on a scale along the chain, on its start scale; those that have none there are left out."""
    nodes = [direct.start, *(step.end for step in direct.steps)]
    if number is None:
        names = [node.scale.name for node in nodes]
        # The place of the observer comes first in one direction and last in the other.
        matching = [k for k, name in enumerate(names) if name == scale and nodes[k].place != "BARYCENTER"]
        if matching:
            number = matching[0]
        else:
            number = next((k for k, node in enumerate(nodes) if node.place != "BARYCENTER"), 0)
            counts = _as_scale(counts, scale, nodes[number].scale)
    # Far from the span nothing is asked of the tables.
    near = (counts[0] >= first[0] - 90000) & (counts[0] <= last[0] + 90000)
    counts = counts[0][near], counts[1][near]
    for step in reversed(direct.steps[:number]):
        counts = _accepted(step.backward, counts, step.end.scale, step.end.place)
    return counts


def _accepted(back: Any, counts: Pair, scale: Scale, place: str | None) -> Pair:
    while len(counts[0]):
        try:
            found: Pair = back(Instants._of(counts, scale, place)).pair
            return found
        except OutOfSpan as error:
            if error.mask is None or error.mask.shape != counts[0].shape or not error.mask.any():
                raise
            counts = counts[0][~error.mask], counts[1][~error.mask]
    return counts


def _as_scale(counts: Pair, scale: str, wanted: Scale) -> Pair:
    """Counts on another scale to 3 ms or so: near enough where polynomials meet smoothly."""
    tt = counts if scale in _BARYCENTRIC else fixed_count(counts, Scale.parse(scale), Scale.parse("TT"))
    if wanted.count_minus_tai is not None:
        return fixed_count(tt, Scale.parse("TT"), wanted)
    if wanted.name == "TCG":
        return tcg_from_tt(tt)
    if wanted.name in ("TCB", "TDB"):
        return tcb_from_tdb(tt) if wanted.name == "TCB" else tt
    # TT(BIPM), a clock or a laboratory: within microseconds of TT or UTC as a rule.
    return tt if wanted.family == "TT" else fixed_count(tt, Scale.parse("TT"), Scale.parse("UTC"))
