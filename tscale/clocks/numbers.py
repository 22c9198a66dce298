"""Numbers given to functions of clocks."""

from __future__ import annotations

from typing import Any

import numpy as np

from ..errors import InvalidInput
from ..exact import FloatArray

__all__ = ["numbers"]


def numbers(**values: Any) -> list[FloatArray]:
    """Arrays of finite numbers that broadcast together."""
    arrays = []
    for name, value in values.items():
        given = np.asarray(value)
        if given.dtype.kind not in "iuf":
            raise InvalidInput(f"{name} must be a number or an array of numbers, got {value!r:.60}")
        bad = np.asarray(~np.isfinite(given))
        if np.any(bad):
            raise InvalidInput(f"{name} must be finite; {int(bad.sum())} of {bad.size} are not (see .mask)", mask=bad)
        arrays.append(given.astype(np.float64))
    try:
        return list(np.broadcast_arrays(*arrays))
    except ValueError as error:
        raise InvalidInput(f"{', '.join(values)} must have shapes that broadcast: {error}") from error
