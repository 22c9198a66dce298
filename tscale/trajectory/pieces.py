"""The parts that a trajectory is made of: a motion about one centre, over one span of dates."""

from __future__ import annotations

from dataclasses import dataclass
from hashlib import sha256
from typing import TYPE_CHECKING, Final, Literal, Protocol, TypeAlias

import numpy as np

from ..ephemeris.chebyshev import date_text
from ..errors import DataFileError
from ..exact import FloatArray, IntArray, Pair
from .dates import since

if TYPE_CHECKING:
    from ..ephemeris import Ephemeris
    from ..ephemeris.segments import Segment

__all__ = ["Axes", "Motion", "Piece", "SegmentMotion", "cover_words", "piece_numbers", "segment_pieces"]

Axes: TypeAlias = Literal["ICRF", "ITRS"]

_KM_M = 1e3
_SLACK_S: Final = 1e-9
"""How far past an end a date may lie: what its roundings on the way through other scales come to, as in the tables."""
# Bodies that planetary ephemerides hold: the barycentre, the planets (systems), the Sun, the Moon and the Earth.
_PLANETARY = frozenset((*range(11), 301, 399))


class Motion(Protocol):
    """Where something is with respect to its centre."""

    def state(self, count: Pair) -> tuple[FloatArray, FloatArray]:
        """Position (m) and velocity (m/s), (n, 3) each, at 1-d counts inside the span of the piece or 1 ns outside it.

        In that nanosecond the motion at the end goes on or stands still.
        """
        ...


@dataclass(frozen=True, eq=False)
class Piece:
    """A motion, its centre (NAIF number), its axes, and the first and last count it may be asked for (None: no end)."""

    motion: Motion
    center: int
    axes: Axes
    first: Pair | None
    last: Pair | None

    @property
    def span(self) -> tuple[float, float]:
        """First and last count, s; infinite where there is no end."""
        first = -np.inf if self.first is None else float(self.first[0] + self.first[1])
        return first, np.inf if self.last is None else float(self.last[0] + self.last[1])


def piece_numbers(pieces: tuple[Piece, ...], count: Pair) -> IntArray:
    """Which piece answers for each 1-d count: the last that covers it, -1 for none.

    Ends are compared exactly. Counts that no piece covers, but which lie within 1 ns of an end, belong to
    that piece: dates that were carried through another scale come back to their own end with a rounding (0.1 fs). A
    low orbit moves by 8 um in that time.
    """
    which = np.full(count[0].shape, -1, dtype=np.int64)
    _claim(pieces, count, which, 0.0)
    left = np.flatnonzero(which < 0)
    if left.size:
        near = np.full(left.shape, -1, dtype=np.int64)
        _claim(pieces, (count[0][left], count[1][left]), near, _SLACK_S)
        which[left] = near
    return which


def _claim(pieces: tuple[Piece, ...], count: Pair, which: IntArray, slack_s: float) -> None:
    for number, piece in enumerate(pieces):
        inside = np.ones(which.shape, dtype=np.bool_)
        if piece.first is not None:
            inside &= since(count, piece.first) >= -slack_s
        if piece.last is not None:
            inside &= since(count, piece.last) <= slack_s
        which[inside] = number


def cover_words(pieces: tuple[Piece, ...]) -> str:
    """Spell out the spans of pieces, neighbours joined."""
    spans: list[tuple[float, float]] = []
    for first, last in sorted(piece.span for piece in pieces):
        if spans and first <= spans[-1][1]:
            spans[-1] = (spans[-1][0], max(last, spans[-1][1]))
        else:
            spans.append((first, last))
    texts = [" to ".join(date_text(x) if np.isfinite(x) else "any date" for x in span) for span in spans[:5]]
    return ", ".join(texts) + (f" and {len(spans) - 5} more spans" if len(spans) > 5 else "")


class SegmentMotion:
    """One segment of an SPK kernel, and the bodies of the same kernel between its centre and a planetary one."""

    def __init__(self, segment: Segment, kernel: Ephemeris, top: int) -> None:
        self._segment = segment
        self._kernel = kernel
        self._top = top

    @property
    def sha256(self) -> str:
        """Hash of what the motion is: the kernel, and which segment of it."""
        segment = self._segment
        facts = (self._kernel.sha256, segment.target, segment.center, segment.start_s, segment.end_s, self._top)
        return sha256(repr(facts).encode()).hexdigest()

    def state(self, count: Pair) -> tuple[FloatArray, FloatArray]:
        """See `Motion.state`; the bodies above end where the segment does, so counts are moved to its ends."""
        count = self._clipped(count)
        position, velocity = self._segment.evaluate(count[0], count[1], True, {})
        if velocity is None:
            raise DataFileError(f"{self._kernel.name} gives no velocities", path=self._kernel.path)
        r, v = position.T * _KM_M, velocity.T * _KM_M
        if self._top != self._segment.center:
            up_r, up_v = self._kernel.state(self._segment.center, count, self._top)
            r, v = r + up_r, v + up_v
        return r, v

    def _clipped(self, count: Pair) -> Pair:
        whole, fraction = count
        for end_s, sign in ((self._segment.start_s, 1), (self._segment.end_s, -1)):
            end = _pair(end_s)
            past = sign * since(count, end) < 0.0
            if past.any():
                whole, fraction = np.where(past, end[0], whole), np.where(past, end[1], fraction)
        return whole, fraction


def segment_pieces(kernel: Ephemeris, segments: tuple[Segment, ...], target: int) -> tuple[Piece, ...]:
    """Make one piece of each segment of `target`, in the order of the file: where two cover a date the last counts."""
    centers = {s.target: s.center for s in segments}
    pieces = []
    for segment in segments:
        if segment.target != target:
            continue
        top, seen = segment.center, {target}
        while top not in _PLANETARY and top in centers and top not in seen:
            seen.add(top)
            top = centers[top]
        pieces.append(
            Piece(SegmentMotion(segment, kernel, top), top, "ICRF", _pair(segment.start_s), _pair(segment.end_s))
        )
    return tuple(pieces)


def _pair(count_s: float) -> Pair:
    whole = np.floor(count_s)
    return np.asarray(int(whole)), np.asarray(count_s - whole)
