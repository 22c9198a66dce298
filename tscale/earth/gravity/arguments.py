"""What the functions of this room are given: positions and broadcast numbers, checked once."""

from __future__ import annotations

from typing import Any

import numpy as np
import numpy.typing as npt

from ...errors import InvalidInput
from ...exact import FloatArray

__all__ = ["broadcast", "latitudes_and", "norms", "positions"]


def positions(r_m: npt.ArrayLike, what: str, lowest_m: float = 0.0) -> FloatArray:
    """Positions as a float array (..., 3), finite and at least `lowest_m` from the centre."""
    r = _floats(r_m, "r_m")
    if r.ndim == 0 or r.shape[-1] != 3:
        raise InvalidInput(f"{what}: a position has x, y, z on its last axis, got shape {r.shape}")
    distance = norms(r)
    bad = ~(np.isfinite(distance) & (distance > 0.0) & (distance >= lowest_m))
    if np.any(bad):
        raise InvalidInput(
            f"{what}: {int(np.count_nonzero(bad))} of {bad.size} positions are not finite or less than {lowest_m:.6g} "
            f"m from the centre (first: {r[bad][0].tolist()} m); the field holds outside the body: give metres, from "
            "its centre",
            mask=np.asarray(bad),
        )
    return r


def norms(r_m: FloatArray) -> FloatArray:
    """Length of each vector, without overflow or underflow of its square."""
    return np.asarray(np.hypot(np.hypot(r_m[..., 0], r_m[..., 1]), r_m[..., 2]))


def latitudes_and(
    lat_deg: npt.ArrayLike, other: npt.ArrayLike, name: str, lowest: float, highest: float, hint: str
) -> tuple[FloatArray, FloatArray]:
    """sin^2 of the latitudes and the other quantity, which must lie within its limits; broadcast together."""
    lat, value = broadcast(lat_deg, "lat_deg", other, name)
    bad = ~((np.abs(lat) <= 90.0) & (value >= lowest) & (value <= highest))
    if np.any(bad):
        raise InvalidInput(
            f"{int(np.count_nonzero(bad))} of {bad.size} places are out of range (first: lat_deg {lat[bad][0]:.6g}, "
            f"{name} {value[bad][0]:.6g}): lat_deg must lie within +-90 and {name} within {lowest:g} to {highest:g}; "
            f"{hint}",
            mask=np.asarray(bad),
        )
    return np.asarray(np.sin(np.radians(lat)) ** 2), value


def broadcast(a: npt.ArrayLike, name_a: str, b: npt.ArrayLike, name_b: str) -> tuple[FloatArray, FloatArray]:
    """Two quantities as float arrays of one shape."""
    first, second = _floats(a, name_a), _floats(b, name_b)
    try:
        first, second = np.broadcast_arrays(first, second)
    except ValueError:
        raise InvalidInput(
            f"{name_a} of shape {first.shape} and {name_b} of shape {second.shape} must broadcast together"
        ) from None
    return first, second


def _floats(value: Any, name: str) -> FloatArray:
    try:
        array = np.asarray(value)
        if array.dtype.kind not in "iuf":
            raise TypeError(f"numbers of type {array.dtype}")
    except (TypeError, ValueError) as error:
        raise InvalidInput(f"{name} must be real numbers, got {value!r:.60}: {error}") from error
    return array.astype(np.float64, copy=False)
