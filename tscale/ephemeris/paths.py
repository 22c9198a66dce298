"""Which segments lead from one body to another, and on which dates."""

from __future__ import annotations

from collections.abc import Iterable
from itertools import pairwise
from typing import NamedTuple

import numpy as np

from ..errors import MissingPiece
from ..exact import BoolArray, FloatArray
from .bodies import body_name
from .segments import Segment

__all__ = ["Leg", "Part", "Paths"]


class Leg(NamedTuple):
    """One step of a path: the segments of `target` from `center`, added or taken away."""

    sign: int
    target: int
    center: int


class Part(NamedTuple):
    """The instants that share one path; `mask` is None for all of them."""

    mask: BoolArray | None
    legs: tuple[Leg, ...]


class Paths:
    """The tree of bodies of one kernel.

    Where several segments cover a date the last in the file counts (NAIF SPK Required Reading, "Segment order and
    priority"), so that a spacecraft may hang on one body first and on another later.
    """

    def __init__(self, segments: Iterable[Segment]) -> None:
        self._by_target: dict[int, list[Segment]] = {}
        self._by_pair: dict[tuple[int, int], list[Segment]] = {}
        for segment in segments:
            self._by_target.setdefault(segment.target, []).insert(0, segment)
            self._by_pair.setdefault((segment.target, segment.center), []).insert(0, segment)

    @property
    def bodies(self) -> frozenset[int]:
        """Every body of the tree."""
        return frozenset(number for pair in self._by_pair for number in pair)

    @property
    def span(self) -> tuple[float, float]:
        """First and last count between which every body is covered, s."""
        groups = self._by_target.values()
        return max(min(s.start_s for s in group) for group in groups), min(
            max(s.end_s for s in group) for group in groups
        )

    def segments(self, leg: Leg) -> list[Segment]:
        """Segments of a leg, the one that takes precedence first."""
        return self._by_pair[leg.target, leg.center]

    def covered(self, leg: Leg) -> tuple[float, float]:
        """First and last count of a leg, s."""
        group = self.segments(leg)
        return min(s.start_s for s in group), max(s.end_s for s in group)

    def plan(self, target: int, center: int, count_s: FloatArray) -> tuple[list[Part], BoolArray, tuple[Leg, ...]]:
        """Paths from `center` to `target` at 1-d counts (only compared with spans).

        Returns
        -------
        parts : list of Part
        outside : bool array (n,)
            True where some leg has no segment.
        legs : tuple of Leg
            Every leg that may be needed.

        Raises
        ------
        MissingPiece
            If no chain of segments joins the two bodies.
        """
        parts: list[Part] = []
        outside = np.zeros(count_s.shape, dtype=np.bool_)
        self._split(target, center, count_s, {}, None, parts, outside)
        return parts, outside, tuple({leg: None for part in parts for leg in part.legs})

    def _split(
        self,
        target: int,
        center: int,
        count_s: FloatArray,
        fixed: dict[int, int],
        mask: BoolArray | None,
        parts: list[Part],
        outside: BoolArray,
    ) -> None:
        """Fix the centre of each body that has several, date by date, until one path is left for each group."""
        up, down = self._ascent(target, fixed), self._ascent(center, fixed)
        for body in (up[-1], down[-1]):
            if body not in fixed and len({s.center for s in self._by_target.get(body, ())}) > 1:
                chosen = np.full(count_s.shape, np.iinfo(np.int64).min)
                for segment in reversed(self._by_target[body]):
                    chosen[(count_s >= segment.start_s) & (count_s <= segment.end_s)] = segment.center
                for middle in sorted({s.center for s in self._by_target[body]}):
                    group = (chosen == middle) if mask is None else (chosen == middle) & mask
                    self._split(target, center, count_s, {**fixed, body: middle}, group, parts, outside)
                missing = chosen == np.iinfo(np.int64).min
                outside |= missing if mask is None else missing & mask
                return
        if up[-1] != down[-1] and not set(up) & set(down):
            raise MissingPiece(
                f"no chain of segments joins {body_name(target)} and {body_name(center)}: the first hangs on "
                f"{body_name(up[-1])}, the second on {body_name(down[-1])}: open a kernel that holds both"
            )
        # Legs that both ascents share cancel exactly, so they are left out.
        while len(up) > 1 and len(down) > 1 and up[-2] == down[-2]:
            up.pop()
            down.pop()
        legs = tuple([Leg(1, a, b) for a, b in pairwise(up)] + [Leg(-1, a, b) for a, b in pairwise(down)])
        for leg in legs:
            covers = np.zeros(count_s.shape, dtype=np.bool_)
            for segment in self.segments(leg):
                covers |= (count_s >= segment.start_s) & (count_s <= segment.end_s)
            outside |= ~covers if mask is None else ~covers & mask
        parts.append(Part(mask, legs))

    def _ascent(self, body: int, fixed: dict[int, int]) -> list[int]:
        """Return the bodies from `body` upwards, to the root or to the first whose centre is still open."""
        path = [body]
        while path[-1] in self._by_target:
            centers = {s.center for s in self._by_target[path[-1]]}
            if path[-1] in fixed:
                upper = fixed[path[-1]]
            elif len(centers) == 1:
                (upper,) = centers
            else:
                break
            if upper in path:
                raise MissingPiece(f"the segments of {body_name(upper)} run in a circle: the kernel is damaged")
            path.append(upper)
        return path
