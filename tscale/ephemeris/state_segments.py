"""Segments of tabulated states, as spacecraft kernels hold them: Lagrange and Hermite interpolation.

NAIF SPK Required Reading, "Type 8" and "Type 12" (equal steps), "Type 9" and "Type 13" (any steps).
"""

from __future__ import annotations

from pathlib import Path
from typing import Final

import numpy as np
import numpy.typing as npt

from ..errors import DataFileError
from ..exact import FloatArray
from .daf import Array, Container

__all__ = ["STATE_TYPES", "StateSegment", "check_finite"]

STATE_TYPES: Final = (8, 9, 12, 13)
"""Lagrange (8, 9) and Hermite (12, 13) on equal (8, 12) and unequal (9, 13) steps."""

_HERMITE: Final = (12, 13)
_EQUAL: Final = (8, 12)
_DIRECTORY_STEP: Final = 100  # every 100th epoch is repeated in a directory, which is not needed here


class StateSegment:
    """States at epochs; each date is interpolated in a window of the epochs around it."""

    def __init__(self, array: Array, where: str, container: Container) -> None:
        self.target, self.center = array.target, array.center
        self.start_s, self.end_s = array.start_s, array.end_s
        self.grid: tuple[float, float] | None = None
        self._hermite = array.data_type in _HERMITE
        words = np.asarray(array.words, dtype=np.float64)
        damage = DataFileError(
            f"{where} is damaged: its trailer does not fit its {words.size} words: fetch the file again",
            path=container.path,
        )
        trailer = words[-2:]
        if words.size < 9 or not (np.isfinite(trailer).all() and (trailer == np.floor(trailer)).all()):
            raise damage
        if not (0 <= trailer[0] <= words.size and 1 <= trailer[1] <= words.size):
            raise damage
        # The trailer gives the degree (Lagrange) or the window less one (Hermite): the same number of states.
        window, count = int(words[-2]) + 1, int(words[-1])
        equal = array.data_type in _EQUAL
        if words.size != (6 * count + 4 if equal else 7 * count + (count - 1) // _DIRECTORY_STEP + 2):
            raise damage
        self._states = words[: 6 * count].reshape(-1, 6)
        self._epochs = words[-4] + words[-3] * np.arange(count) if equal else words[6 * count : 7 * count]
        if not (np.diff(self._epochs) > 0).all():
            raise damage
        self._window = min(window, count)
        self._where, self._path = where, container.path

    def evaluate(
        self, whole: npt.NDArray[np.int64], fraction: FloatArray, rate: bool, located: object
    ) -> tuple[FloatArray, FloatArray | None]:
        """See `Segment.evaluate`."""
        size = self._window
        count = whole + fraction  # only to find the window
        after = np.clip(np.searchsorted(self._epochs, count, side="right"), 1, max(1, len(self._epochs) - 1))
        if size % 2:
            # The epoch nearest to the date stands in the middle.
            before = self._epochs[after - 1]
            nearer = after - (count - before <= self._epochs[np.minimum(after, len(self._epochs) - 1)] - count)
            first = nearer - size // 2
        else:
            first = after - size // 2
        pick = np.clip(first, 0, len(self._epochs) - size)[:, None] + np.arange(size)
        # Seconds from the date to each epoch, without rounding the date.
        ahead = (self._epochs[pick] - whole[:, None]) - fraction[:, None]
        states = self._states[pick]  # (n, window, 6)
        with np.errstate(invalid="ignore", over="ignore", divide="ignore"):
            if self._hermite:
                position, velocity = _hermite(ahead, states[..., :3], states[..., 3:])
            else:
                both = _neville(ahead, states)
                position, velocity = both[:, :3], both[:, 3:]
            check_finite(self._where, self._path, position, velocity)
        return position.T, velocity.T if rate else None


def check_finite(where: str, path: Path, *values: FloatArray | None) -> None:
    """Refuse what a damaged segment gives: no date has a position that is infinite or no number.

    Called where numpy does not warn of overflow.
    """
    # The sum takes a fraction of the time of a look at each value, and is finite only if all are.
    if not all(value is None or np.isfinite(np.sum(value)) for value in values):
        raise DataFileError(
            f"{where} is damaged: the numbers there give no finite position: fetch the file again", path=path
        )


def _neville(ahead: FloatArray, values: FloatArray) -> FloatArray:
    """Value at 0 of the polynomial through `values` (n, window, k) at `ahead` (n, window)."""
    table = values
    size = ahead.shape[1]
    for order in range(1, size):
        left, right = ahead[:, :-order, None], ahead[:, order:, None]
        table = (right * table[:, :-1] - left * table[:, 1:]) / (right - left)
    return table[:, 0]


def _hermite(ahead: FloatArray, values: FloatArray, rates: FloatArray) -> tuple[FloatArray, FloatArray]:
    """Value and derivative at 0 of the polynomial that has `values` and `rates` (n, window, 3) at `ahead`."""
    node = np.repeat(ahead, 2, axis=1)
    column = np.repeat(values, 2, axis=1)
    coefficients = [column[:, 0]]
    for order in range(1, node.shape[1]):
        gap = (node[:, order:] - node[:, :-order])[..., None]
        if order == 1:
            gap[:, ::2] = 1.0  # doubled nodes: the divided difference is the rate
            column = (column[:, 1:] - column[:, :-1]) / gap
            column[:, ::2] = rates
        else:
            column = (column[:, 1:] - column[:, :-1]) / gap
        coefficients.append(column[:, 0])
    value = coefficients[-1]
    slope = np.zeros_like(value)
    for order in range(len(coefficients) - 2, -1, -1):
        away = -node[:, order, None]
        slope = slope * away + value
        value = value * away + coefficients[order]
    return value, slope
