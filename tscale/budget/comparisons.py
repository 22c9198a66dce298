"""Contributions of a comparison log: the comparisons' own errors, and what the clock wanders between and past them."""

from __future__ import annotations

from typing import Final

import numpy as np

from .. import exact
from ..exact import BoolArray, FloatArray, IntArray, Pair
from ..tables.clock_log import ClockLog
from ..tables.clock_prediction import predicted_by
from ..tables.common import since
from .assumptions import Assumptions
from .contribution import Contribution, Omission
from .correlation import Exponential, Rows
from .rows import phases

__all__ = ["clock_contributions", "clock_omissions"]

_LONG_S: Final = 10 * 31557600.0


def clock_contributions(log: ClockLog, reference: Pair, assumptions: Assumptions) -> list[Contribution]:
    """Contributions of a log to the reference scale at counts of it.

    Each comparison has an error of its own (unless `comparison_decay_s` says otherwise), which is carried to the
    instants by the weights of the interpolation: halfway between two comparisons of 1 ns each it is 0.7 ns.
    """
    shape = np.shape(reference[0])
    at, interval = log._at_reference((np.ravel(reference[0]), np.ravel(reference[1])))
    curve = log._curve
    index, weight = _weights(log, at, interval)
    at_s = since((curve.reference[0][0], curve.reference[1][0]), curve.reference)
    phase = phases(at_s, assumptions.comparison_decay_s)
    words = "own to each comparison" if phase is None else "shared by comparisons near in time"
    rows = Rows(index, weight, curve.sigma_s, phase, words)
    offset = exact.seconds(log.offset(reference))
    one = np.full(shape, -1.0)
    name = f"{log.scale} - {log.reference}"
    found = [
        Contribution(
            source=log.scale,
            quantity=f"{name}, comparisons",
            unit="s",
            sensitivity=one,
            sigma=rows.at().reshape(shape),
            value=offset,
            correlation=rows,
            # A prediction is made of several comparisons at once; its errors are added by their weights.
            handle=() if log.is_predicted else ("clock", log.scale),
        )
    ]
    if log.noise is not None:
        predicted = predicted_by(curve, log._forecasts, at, interval)
        wander = _wander_s(log, at, interval)
        spacing_s = float(np.median(curve.length[0][:-1])) if len(curve.gap) > 1 else _LONG_S
        when_s = since((curve.reference[0][0], curve.reference[1][0]), at)
        for what, mask, decay_s in (
            ("wander between comparisons", ~predicted, spacing_s),
            # What has wandered off does not come back.
            ("wander past the comparisons", predicted, _LONG_S),
        ):
            if mask.any():
                sigma = np.where(mask, wander, 0.0).reshape(shape)
                law = Exponential(when_s, decay_s)
                found.append(
                    Contribution(log.scale, f"{name}, {what}", "s", one, sigma, np.zeros(shape), correlation=law)
                )
    return found


def clock_omissions(log: ClockLog) -> list[Omission]:
    """What a log cannot say."""
    if log.noise is not None or log.interpolation == "step":
        return []
    return [
        Omission(
            f"wander of {log.scale} between comparisons",
            f"noise of the clock not stated by the log {log.name}; give it with with_noise",
        )
    ]


def _weights(log: ClockLog, at: Pair, interval: IntArray) -> tuple[IntArray, FloatArray]:
    """Comparisons (n, k) that each offset hangs on, and their weights."""
    curve = log._curve
    if curve.step:
        return interval[:, None], np.ones((len(interval), 1))
    part = curve.part(at, interval)
    if curve.stencil is not None:
        index, weight = curve.stencil.weights(interval, part, curve.length[0])
    else:
        index = np.stack([interval, np.minimum(interval + 1, len(curve.gap) - 1)], axis=-1)
        weight = np.stack([1.0 - part, part], axis=-1)
    for forecast in log._forecasts:
        mine = interval == forecast.interval
        if mine.any():
            width = max(index.shape[1], len(forecast.nodes))
            spare = ((0, 0), (0, width - index.shape[1]))
            index, weight = np.pad(index, spare), np.pad(weight, spare)
            index[mine], weight[mine] = 0, 0.0
            index[mine, : len(forecast.nodes)] = forecast.nodes
            weight[mine, : len(forecast.nodes)] = forecast.weights(curve, (at[0][mine], at[1][mine]))[2]
    return index, weight


def _wander_s(log: ClockLog, at: Pair, interval: IntArray) -> FloatArray:
    """What the log's own uncertainty holds beside the comparisons', s."""
    curve = log._curve
    own = np.asarray(curve.sigma_at(at, interval)) ** 2
    for forecast in log._forecasts:
        mine: BoolArray = interval == forecast.interval
        if mine.any():
            weight = forecast.weights(curve, (at[0][mine], at[1][mine]))[2]
            own[mine] = np.sum((weight * curve.sigma_s[forecast.nodes]) ** 2, axis=-1)
    return np.sqrt(np.maximum(log.uncertainty_s(at) ** 2 - own, 0.0))
