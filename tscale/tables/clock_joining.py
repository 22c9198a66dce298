"""Several logs of one clock as one."""

from __future__ import annotations

from collections.abc import Sequence
from itertools import pairwise
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from ..errors import InvalidInput
from .clock_curve import ClockCurve
from .clock_rows import check_forwards
from .common import since

if TYPE_CHECKING:
    from .clock_log import ClockLog

__all__ = ["joinable", "joined_curve"]

_COLUMNS: Final = ("sigma_s", "common_s", "gap", "broken", "corner")


def joinable(logs: Sequence[ClockLog]) -> Sequence[ClockLog]:
    """The logs, or `InvalidInput` that says why they cannot be joined."""
    if not logs:
        raise InvalidInput("nothing to join: give at least one ClockLog")
    first = logs[0]
    for log in logs:
        for part in ("scale", "reference", "interpolation", "noise"):
            if getattr(log, part) != getattr(first, part):
                raise InvalidInput(
                    f"cannot join {first.name!r} and {log.name!r}: {part} is {getattr(first, part)!r} and "
                    f"{getattr(log, part)!r}; logs that are joined have the same"
                )
        if log.is_predicted:
            raise InvalidInput(f"cannot join {log.name!r}, which is predicted past its comparisons: join, then predict")
    return logs


def joined_curve(logs: Sequence[ClockLog], within_s: float, overlap: str) -> ClockCurve:
    """One curve through the comparisons of all.

    Over seams of up to `within_s` seconds it goes on; within the span of a log, those given before it have no say if
    `overlap` is `last`.
    """
    if overlap not in ("error", "last"):
        raise InvalidInput(f"overlap is 'error' or 'last', got {overlap!r}")
    if overlap == "error":
        _refuse_overlap(logs)
    curves = [log._curve for log in logs]
    kept = [np.ones(len(curve.gap), dtype=np.bool_) for curve in curves]
    for place, curve in enumerate(curves):
        first, last = ((curve.reference[0][end], curve.reference[1][end]) for end in (0, -1))
        for other in range(place):
            at = curves[other].reference
            kept[other] &= (since(first, at) < 0.0) | (since(last, at) > 0.0)
    picked = [np.flatnonzero(mask) for mask in kept]
    origin = np.repeat(np.arange(len(curves)), [len(own) for own in picked])
    row = np.concatenate(picked)

    def column(parts: Sequence[Any]) -> Any:
        return np.concatenate([part[own] for part, own in zip(parts, picked, strict=True)])[order]

    order = np.arange(len(row))
    whole, fraction = (column([curve.reference[part] for curve in curves]) for part in (0, 1))
    order = np.lexsort((fraction, whole))  # from here on columns come in the order of time
    reference, offset, reset = (
        (column([getattr(curve, part)[0] for curve in curves]), column([getattr(curve, part)[1] for curve in curves]))
        for part in ("reference", "offset", "reset")
    )
    sigma, common, gap, broken, corner = (column([getattr(curve, part) for curve in curves]) for part in _COLUMNS)
    origin, row = origin[order], row[order]
    seams = np.flatnonzero((origin[1:] != origin[:-1]) | (row[1:] != row[:-1] + 1))
    ends, starts = ((reference[0][place], reference[1][place]) for place in (seams, seams + 1))
    close = since(ends, starts) <= within_s
    # A log that begins with a reset or a rate step says so at its first comparison.
    gap[seams] = broken[seams] = ~close | corner[seams + 1]
    gap[-1] = broken[-1] = True
    kind = logs[0].interpolation
    curve = ClockCurve.of(
        reference, offset, sigma, gap, kind, common_s=common, reset=reset, broken=broken, corner=corner
    )
    check_forwards(curve, logs[0].scale, [], None)
    return curve


def _refuse_overlap(logs: Sequence[ClockLog]) -> None:
    ordered = sorted(logs, key=lambda log: (log.span.whole[0], log.span.fraction[0]))
    for before, after in pairwise(ordered):
        if not before.span[1] < after.span[0]:
            raise InvalidInput(
                f"{before.name!r} (to {before._ends()[1]}) and {after.name!r} (from {after._ends()[0]}) overlap; "
                f"cut one, so that each comparison of {before.scale} is in one log, or let the last given hold where "
                "they overlap: overlap='last'"
            )
