"""The checks of what a link is given."""

from __future__ import annotations

import math
import numbers
from collections.abc import Iterable
from typing import Any, Final

import numpy as np

from ..body_shape import own_body
from ..ephemeris import body_id
from ..errors import InvalidInput
from ..exact import FloatArray, Pair
from ..instants import Instants
from ..tables.clock_arguments import kind_words
from ..tables.reference import ReferenceData
from .solve import Options

__all__ = ["checked_instants", "checked_options", "checked_reference", "with_turnaround"]

_EARTH_AND_MOON: Final = 3


def checked_reference(reference: Any) -> ReferenceData:
    """The tables in use."""
    if reference is None:
        return ReferenceData.default()
    if not isinstance(reference, ReferenceData):
        raise InvalidInput(f"reference must be a ReferenceData, got {type(reference).__name__}")
    return reference


def checked_instants(t: Any) -> Instants:
    """The dates given."""
    if not isinstance(t, Instants):
        raise InvalidInput(
            f"the dates of a link are Instants, got {type(t).__name__}; make them with Instants.from_iso"
        )
    return t


def with_turnaround(t: Instants, turnaround_s: Any) -> tuple[Instants, FloatArray]:
    """Dates and turnaround of one shape, the turnaround a copy."""
    try:
        given = np.asarray(turnaround_s)
        if given.dtype.kind not in "iuf":
            raise TypeError("not numbers")
        turnaround = given.astype(np.float64)
    except (TypeError, ValueError) as error:
        raise InvalidInput(f"turnaround_s must be a number or an array of numbers, got {turnaround_s!r:.60}") from error
    bad = ~(np.isfinite(turnaround) & (turnaround >= 0.0))
    if np.any(bad):
        raise InvalidInput(f"turnaround_s must be finite and 0 or more, got {turnaround_s!r:.60}", mask=np.asarray(bad))
    try:
        whole, fraction, turnaround = np.broadcast_arrays(*t.pair, turnaround)
    except ValueError as error:
        raise InvalidInput(f"turnaround_s of shape {turnaround.shape} does not go with dates of {t.shape}") from error
    pair: Pair = (whole, fraction)
    return t if whole.shape == t.shape else Instants._of(pair, t.scale, t.place), np.array(turnaround)


def checked_options(bodies: Any, second_order: Any, occultation: Any, tolerance_s: Any, max_iterations: Any) -> Options:
    """The options of both calls."""
    if not isinstance(occultation, str) or occultation not in ("error", "ignore"):
        raise InvalidInput(f'occultation must be "error" or "ignore", got {kind_words(occultation)}')
    if not isinstance(second_order, bool | np.bool_):
        raise InvalidInput(f"second_order must be True or False, got {kind_words(second_order)}")
    if isinstance(tolerance_s, bool) or not isinstance(tolerance_s, numbers.Real):
        raise InvalidInput(f"tolerance_s must be one number of seconds, got {kind_words(tolerance_s)}")
    tolerance = float(tolerance_s)
    if not (math.isfinite(tolerance) and tolerance > 0.0):
        raise InvalidInput(f"tolerance_s must be a positive number of seconds, got {tolerance_s!r}")
    if isinstance(max_iterations, bool) or not isinstance(max_iterations, numbers.Integral) or max_iterations < 3:
        raise InvalidInput(f"max_iterations must be a whole number, 3 or more, got {kind_words(max_iterations)}")
    return Options(_checked_bodies(bodies), bool(second_order), occultation == "ignore", tolerance, int(max_iterations))


def _checked_bodies(bodies: Any) -> tuple[int, ...]:
    if isinstance(bodies, str) or not isinstance(bodies, Iterable):
        raise InvalidInput(f"bodies is a sequence such as ('sun', 'jupiter'), () for none, got {kind_words(bodies)}")
    found = tuple(body_id(body) for body in bodies)
    if _EARTH_AND_MOON in found:
        raise InvalidInput(
            "bodies holds the earth-moon barycenter (3), but the Earth-Moon system is two bodies: give earth and moon"
        )
    own = [own_body(number) for number in found]
    if len(set(own)) < len(own):
        raise InvalidInput(f"bodies names one body twice: {', '.join(map(str, found))}")
    return found
