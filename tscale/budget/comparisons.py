"""Contributions of a comparison log: the comparisons' errors, own and shared, and what the clock wanders off them."""

from __future__ import annotations

import numpy as np

from .. import exact
from ..exact import Pair
from ..tables.clock_errors import carried
from ..tables.clock_log import ClockLog
from ..tables.common import since
from .assumptions import Assumptions
from .contribution import Contribution, Omission
from .correlation import Rows
from .rows import phases
from .wander import Wander

__all__ = ["clock_contributions", "clock_omissions"]


def clock_contributions(log: ClockLog, reference: Pair, assumptions: Assumptions) -> list[Contribution]:
    """Contributions of a log to the reference scale at counts of it.

    Each comparison has an error of its own (unless `comparison_decay_s` says otherwise), and all share that of their
    calibration; both are carried to the instants by the weights of the interpolation or the prediction: halfway between
    two comparisons of 1 ns each it is 0.7 ns by their own errors, and 1 ns by a shared one.
    """
    shape = np.shape(reference[0])
    at, interval = log._at_reference((np.ravel(reference[0]), np.ravel(reference[1])))
    curve = log._curve
    found = carried(curve, log._forecasts, at, interval)
    own = log._measured
    node = found.node - own.start  # among the comparisons: ends of predictions are none
    first = (curve.reference[0][own.start], curve.reference[1][own.start])
    phase = phases(since(first, (curve.reference[0][own], curve.reference[1][own])), assumptions.comparison_decay_s)
    words = "own to each comparison" if phase is None else "shared by comparisons near in time"
    # The point that a prediction ends in has no weight, and no number here.
    rows = Rows(np.clip(node, 0, len(log) - 1), found.weight, curve.sigma_s[own], phase, words)
    offset = exact.seconds(log.offset(reference))
    one = np.full(shape, -1.0)
    name = f"{log.scale} - {log.reference}"
    parts = [
        Contribution(
            source=log.scale,
            quantity=f"{name}, comparisons",
            unit="s",
            sensitivity=one,
            sigma=rows.at().reshape(shape),
            value=offset,
            correlation=rows,
            handle=("clock", log.scale),
        )
    ]
    common_s = curve.common_s[own]
    if common_s.any():
        shared = Rows(rows.index, rows.weight, common_s, np.zeros(len(common_s)), "common to all readings of the log")
        parts.append(
            Contribution(
                source=log.scale,
                quantity=f"{name}, calibration",
                unit="s",
                sensitivity=one,
                sigma=shared.at().reshape(shape),
                value=np.zeros(shape),
                correlation=shared,
                handle=("calibration", log.scale),
            )
        )
    if log.noise is not None:
        times_s, weights = found.contrast()
        start_s = since(first, (curve.reference[0][interval], curve.reference[1][interval]))
        law = Wander(times_s + start_s[:, None], weights, log.noise)
        sigma = log.noise.contrast_s(times_s, weights).reshape(shape)
        parts.append(
            Contribution(log.scale, f"{name}, wander of the clock", "s", one, sigma, np.zeros(shape), correlation=law)
        )
    return parts


def clock_omissions(log: ClockLog) -> list[Omission]:
    """What a log cannot say."""
    found = []
    if not log._curve.common_s.any():
        found.append(
            Omission(
                f"calibration of {log.scale}, common to all its comparisons",
                f"not told apart by the log {log.name}; give it as common_s, a column beside uncertainty_s",
            )
        )
    if log.noise is None and log.interpolation != "step":
        found.append(
            Omission(
                f"wander of {log.scale} between comparisons",
                f"noise of the clock not stated by the log {log.name}; give it with with_noise",
            )
        )
    return found
