"""A few thousand instants of a kernel at a time: each leg of a path is evaluated once, and legs are added up."""

from __future__ import annotations

from typing import Final, TypeAlias

import numpy as np
import numpy.typing as npt

from ..exact import FloatArray
from .paths import Leg, Paths
from .segments import ChebyshevSegment, Located, Segment

__all__ = ["Chunk"]

_KM_M: Final = 1e3
_Motion: TypeAlias = tuple[FloatArray, FloatArray | None]


class Chunk:
    """A few thousand instants and what has been evaluated at them so far."""

    def __init__(self, whole: npt.NDArray[np.int64], fraction: FloatArray, rate: bool) -> None:
        self._whole, self._fraction, self._rate = whole, fraction, rate
        self._located: Located = {}
        self._done: dict[tuple[int, int], _Motion] = {}

    def sum(self, paths: Paths, legs: tuple[Leg, ...]) -> _Motion:
        """Position in m and velocity in m/s along a path, (3, n)."""
        shape = (3, self._whole.size)
        position, velocity = np.zeros(shape), np.zeros(shape) if self._rate else None
        for leg in legs:
            pair = leg.target, leg.center
            if pair not in self._done:
                self._done[pair] = self._leg(paths.segments(leg))
            step, speed = self._done[pair]
            position += leg.sign * step
            if velocity is not None and speed is not None:
                velocity += leg.sign * speed
        position *= _KM_M
        if velocity is not None:
            velocity *= _KM_M
        return position, velocity

    def apart(self, paths: Paths, legs: tuple[Leg, ...]) -> tuple[FloatArray, FloatArray]:
        """Position in km along a path, each (3, n): the constants of the records of the longest leg, and all else."""
        lone = [paths.segments(leg) for leg in legs]
        rest = np.zeros((3, self._whole.size))
        constant, size = np.zeros_like(rest), 0.0
        for leg, segments in zip(legs, lone, strict=True):
            segment = segments[0] if len(segments) == 1 else None
            if isinstance(segment, ChebyshevSegment) and self._whole.size:
                fixed, moving = segment.evaluate_apart(self._whole, self._fraction, self._located)
                length = float(np.max(np.abs(fixed)))
                if length > size:
                    rest += constant
                    constant, size = leg.sign * fixed, length
                else:
                    rest += leg.sign * fixed
                rest += leg.sign * moving
            else:
                rest += leg.sign * self._leg(segments)[0]
        return constant, rest

    def _leg(self, segments: list[Segment]) -> _Motion:
        if len(segments) == 1:
            return segments[0].evaluate(self._whole, self._fraction, self._rate, self._located)
        count = self._whole + self._fraction
        position = np.empty((3, count.size))
        velocity = np.empty_like(position) if self._rate else None
        left = np.ones(count.size, dtype=np.bool_)
        for segment in segments:
            mine = left & (count >= segment.start_s) & (count <= segment.end_s)
            if mine.any():
                step, speed = segment.evaluate(self._whole[mine], self._fraction[mine], self._rate, {})
                position[:, mine] = step
                if velocity is not None and speed is not None:
                    velocity[:, mine] = speed
                left &= ~mine
        return position, velocity
