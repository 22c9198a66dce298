"""Segments of an SPK kernel: where one body is with respect to another over a span of dates."""

from __future__ import annotations

from typing import Final, Protocol

import numpy as np
import numpy.typing as npt

from ..errors import DataFileError
from ..exact import FloatArray
from .bodies import body_name
from .chebyshev import ChebyshevTable
from .daf import Array, Container
from .state_segments import STATE_TYPES, StateSegment, check_finite

__all__ = [
    "CHEBYSHEV_TYPES",
    "READABLE_TYPES",
    "ChebyshevSegment",
    "ForeignSegment",
    "Located",
    "Segment",
    "read_segments",
]

READABLE_TYPES: Final = (2, 3, *STATE_TYPES)
"""SPK data types understood: Chebyshev positions (2), Chebyshev positions and velocities (3), tabulated states."""

CHEBYSHEV_TYPES: Final = (2, 3)

_ICRF_FRAME: Final = 1
_TRAILER_WORDS: Final = 4  # start, step, words per record, number of records
_RECORD_HEAD_WORDS: Final = 2  # midpoint and half length of a record, which the trailer gives as well

Located = dict[tuple[float, float, int], tuple[npt.NDArray[np.intp], FloatArray]]
"""Record numbers and arguments already found in one chunk of instants, by grid."""


class Segment(Protocol):
    """What the kernel needs of a segment."""

    target: int
    center: int
    start_s: float
    end_s: float
    grid: tuple[float, float] | None
    """Start and length of the records, s; None if it has none."""

    def evaluate(
        self, whole: npt.NDArray[np.int64], fraction: FloatArray, rate: bool, located: Located
    ) -> tuple[FloatArray, FloatArray | None]:
        """Position in km and velocity in km/s, each (3, n), at 1-d TDB counts inside the span."""


class ChebyshevSegment:
    """A segment of data type 2 or 3 (NAIF SPK Required Reading, "Type 2" and "Type 3")."""

    def __init__(self, array: Array, where: str, container: Container) -> None:
        self.target, self.center = array.target, array.center
        states = array.data_type == 3
        components = 6 if states else 3
        if array.words.size <= _TRAILER_WORDS:
            raise DataFileError(
                f"{where} is damaged: it has {array.words.size} words and no trailer: fetch the file again",
                path=container.path,
            )
        start_s, step_s, size, records = (float(x) for x in array.words[-_TRAILER_WORDS:])
        coefficients = (size - _RECORD_HEAD_WORDS) / components
        if not (
            np.isfinite([start_s, step_s]).all()
            and step_s > 0
            and records >= 1
            and coefficients >= 1
            and coefficients.is_integer()
            and size * records + _TRAILER_WORDS == array.words.size
        ):
            raise DataFileError(
                f"{where} is damaged: its trailer (start {start_s} s, step {step_s} s, {size} words in each of "
                f"{records} records) does not fit its {array.words.size} words: fetch the file again",
                path=container.path,
            )
        rows = array.words[:-_TRAILER_WORDS].reshape(int(records), int(size))[:, _RECORD_HEAD_WORDS:]
        self.table = ChebyshevTable(start_s, step_s, rows.reshape(int(records), components, int(coefficients)), where)
        self._states = states
        self._where, self._path = where, container.path
        self.grid: tuple[float, float] | None = (start_s, step_s)
        # The descriptor may claim less than its records hold, never more.
        self.start_s = max(array.start_s, self.table.span[0])
        self.end_s = min(array.end_s, self.table.span[1])

    def evaluate(
        self, whole: npt.NDArray[np.int64], fraction: FloatArray, rate: bool, located: Located
    ) -> tuple[FloatArray, FloatArray | None]:
        """See `Segment.evaluate`."""
        grid = self.table.grid
        if grid not in located:
            located[grid] = self.table.locate(whole, fraction)
        record, argument = located[grid]
        with np.errstate(invalid="ignore", over="ignore"):
            value, slope = self.table.evaluate(record, argument, rate and not self._states)
            check_finite(self._where, self._path, value, slope)
        return (value[:3], value[3:]) if self._states else (value, slope)

    def evaluate_apart(
        self, whole: npt.NDArray[np.int64], fraction: FloatArray, located: Located
    ) -> tuple[FloatArray, FloatArray]:
        """Position in km in the two parts of `ChebyshevTable.evaluate_apart`, each (3, n)."""
        grid = self.table.grid
        if grid not in located:
            located[grid] = self.table.locate(whole, fraction)
        with np.errstate(invalid="ignore", over="ignore"):
            constant, rest = self.table.evaluate_apart(*located[grid])
            check_finite(self._where, self._path, constant, rest)
        return constant[:3], rest[:3]


class ForeignSegment:
    """A segment of a data type that is not understood: an error as soon as it is needed, not before."""

    def __init__(self, array: Array, where: str, container: Container) -> None:
        self.target, self.center = array.target, array.center
        self.start_s, self.end_s = array.start_s, array.end_s
        self.grid: tuple[float, float] | None = None
        self._message = (
            f"{where} has SPK data type {array.data_type}; understood are types "
            f"{', '.join(map(str, READABLE_TYPES))}: convert the kernel to one of them, or sample its states and give "
            "them as a trajectory"
        )
        self._path = container.path

    def evaluate(
        self, whole: npt.NDArray[np.int64], fraction: FloatArray, rate: bool, located: Located
    ) -> tuple[FloatArray, FloatArray | None]:
        """Raise `DataFileError`."""
        raise self.error()

    def error(self) -> DataFileError:
        """Return the error that names the data type."""
        return DataFileError(self._message, path=self._path)


def read_segments(container: Container) -> tuple[Segment, ...]:
    """Read the segments of a container, in the order of the file.

    Raises
    ------
    DataFileError
        For a damaged segment, axes other than ICRF/J2000, or a file in which no segment is of a readable type.
    """
    segments: list[Segment] = []
    for number, array in enumerate(container.arrays, start=1):
        where = f"{container.path.name}, segment {number} ({body_name(array.target)} from {body_name(array.center)})"
        if array.frame != _ICRF_FRAME:
            raise DataFileError(
                f"{where} has axes number {array.frame}; understood is {_ICRF_FRAME} (ICRF/J2000): rotate its "
                "states to ICRF first",
                path=container.path,
            )
        kind: type[ChebyshevSegment | StateSegment | ForeignSegment] = ForeignSegment
        if array.data_type in CHEBYSHEV_TYPES:
            kind = ChebyshevSegment
        elif array.data_type in STATE_TYPES:
            kind = StateSegment
        segments.append(kind(array, where, container))
    first = segments[0]
    if isinstance(first, ForeignSegment) and all(isinstance(s, ForeignSegment) for s in segments):
        raise first.error()
    return tuple(segments)
