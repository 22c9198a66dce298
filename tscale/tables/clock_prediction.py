"""Past the last comparison of a clock, or before the first: a line from a stretch of the log, and what it is worth."""

from __future__ import annotations

from typing import Any, NamedTuple

import numpy as np

from .. import exact
from ..errors import InvalidInput, warn_extrapolation
from ..exact import BoolArray, FloatArray, IntArray, Pair
from .clock_bends import Bend, Stencil
from .clock_curve import ClockCurve
from .common import since

__all__ = ["Forecast", "Prediction", "forecast", "predicted_by", "warn_predicted"]


class Forecast(NamedTuple):
    """An interval of a curve that is predicted, and the comparisons that it hangs on."""

    interval: int
    nodes: IntArray
    """Two comparisons for a line, three for a parabola; the first is where the prediction starts."""

    def weights(self, curve: ClockCurve, at: Pair) -> FloatArray:
        """Weights (..., k) of the nodes in the values predicted at instants (Lagrange)."""
        own = self.nodes
        start = (curve.reference[0][own[0]], curve.reference[1][own[0]])
        knots = since(start, (curve.reference[0][own], curve.reference[1][own]))
        ahead = since(start, at)
        weights = [
            np.prod([(ahead - knots[j]) / (knots[i] - knots[j]) for j in range(len(own)) if j != i], axis=0)
            for i in range(len(own))
        ]
        return np.stack(weights, axis=-1)


class Prediction(NamedTuple):
    """How a log goes on past its comparisons: what `ClockLog.predicted` was asked."""

    fit_s: float
    """Stretch of the log that the rate is taken from."""
    drift: bool
    until: Pair | None
    """Where it ends, a count of the reference; None where it does not go on after the last comparison."""
    start: Pair | None
    """Where it begins, the same before the first."""

    def of(self, curve: ClockCurve, name: str) -> tuple[ClockCurve, tuple[Forecast, ...]]:
        """The curve of the comparisons made longer, and the intervals that are predicted; errors as `forecast`."""
        found: list[Forecast] = []
        if self.until is not None:
            curve, ahead = forecast(curve, name, self.until, self.fit_s, self.drift, after=True)
            found.append(ahead)
        if self.start is not None:
            curve, back = forecast(curve, name, self.start, self.fit_s, self.drift, after=False)
            found = [Forecast(ahead.interval + 1, ahead.nodes + 1) for ahead in found] + [back]
        return curve, tuple(found)


def forecast(
    curve: ClockCurve, name: str, end: Pair, fit_s: float, drift: bool, after: bool
) -> tuple[ClockCurve, Forecast]:
    """Lengthen a curve to `end` (one instant) by the line or parabola through a stretch of `fit_s` seconds.

    Raises
    ------
    InvalidInput
        Where `end` is not past the comparisons, or the stretch does not hold the comparisons needed.
    """
    last = len(curve.gap) - 1
    edge = last if after else 0
    # Distances from the edge, positive away from the log; sign turns both directions into one.
    sign = 1.0 if after else -1.0
    from_edge = sign * since((curve.reference[0][edge], curve.reference[1][edge]), curve.reference)
    ahead = float(sign * since((curve.reference[0][edge], curve.reference[1][edge]), end))
    where = "after the last" if after else "before the first"
    if not ahead > 0.0:
        raise InvalidInput(f"a prediction for {name!r} ends {where} comparison; this end lies {-ahead:.6g} s within")
    inside = np.flatnonzero(from_edge >= -fit_s * (1.0 + 1e-12))
    far = int(inside[0] if after else inside[-1])
    low, high = min(far, edge), max(far, edge)
    if high - low < (2 if drift else 1):
        raise InvalidInput(
            f"the stretch of {fit_s:g} s at the {'end' if after else 'start'} of {name!r} holds {high - low + 1} "
            f"comparisons; {'three' if drift else 'two'} or more are needed: give a longer fit_s"
        )
    # A rate step or reset at the far end of the stretch comes before all of it.
    if curve.broken[low:high].any() or curve.corner[low + 1 : high + after].any() or (not after and curve.corner[low]):
        raise InvalidInput(
            f"the stretch of {fit_s:g} s at the {'end' if after else 'start'} of {name!r} holds a reset of unknown "
            "size, a rate step or the seam of two logs: its rate is not that of the clock; give a shorter fit_s"
        )
    phase = np.concatenate([[0.0], np.cumsum(curve.change_s[low:high])])
    phase = phase - phase[edge - low]
    nodes = [edge, far]
    if drift:
        middle = int(np.argmin(np.abs(from_edge[low + 1 : high] - from_edge[far] / 2.0))) + low + 1
        nodes = [edge, middle, far]
    # Newton's form through the nodes, the first at zero: y ahead + d ahead (ahead - t_1).
    t = from_edge[nodes]
    x = phase[np.array(nodes) - low]
    rate = x[1] / t[1]
    curving = 0.0 if not drift else (x[2] / t[2] - rate) / (t[2] - t[1])
    change = rate * ahead + curving * ahead * (ahead - t[1])
    slope_at_edge = rate - curving * t[1]
    slope_at_end = slope_at_edge + 2.0 * curving * ahead
    bends = (slope_at_edge * ahead - change, slope_at_end * ahead - change) if drift else (0.0, 0.0)
    found = Forecast(last if after else 0, np.array(nodes) + (0 if after else 1))
    if not after:  # as seen along the interval, which then ends at the edge
        bends = (-bends[1], -bends[0])
    return _lengthened(curve, end, change, bends, after), found


def predicted_by(curve: ClockCurve, forecasts: tuple[Forecast, ...], at: Pair, index: IntArray) -> BoolArray:
    """Which instants of the reference are predicted, those at the comparisons themselves apart."""
    mask = np.zeros(index.shape, dtype=np.bool_)
    for found in forecasts:
        edge = found.nodes[0]
        mask |= (index == found.interval) & (since((curve.reference[0][edge], curve.reference[1][edge]), at) != 0.0)
    return mask


def warn_predicted(mask: BoolArray, name: str, worst_s: float) -> None:
    """Say that a log predicts, in the name of whoever called the package."""
    warn_extrapolation(
        f"instants are predicted past the comparisons of {name!r}, by its rate and noise model: known to {{worst}} s "
        "at the latest",
        int(np.count_nonzero(mask)),
        mask.size,
        worst_s,
    )


def _lengthened(curve: ClockCurve, end: Pair, change: float, bends: tuple[float, float], after: bool) -> ClockCurve:
    def grown(array: Any, value: float | bool) -> Any:
        return np.append(array, value) if after else np.insert(array, 0, value)

    edge = -1 if after else 0
    offset = exact.add_seconds((curve.offset[0][edge], curve.offset[1][edge]), change)
    change_s = curve.change_s.copy()
    gap, broken = curve.gap.copy(), curve.broken.copy()
    if after:
        gap[-1] = broken[-1] = False
        change_s[-1] = change
    bend = curve.bend
    if bend is not None or any(bends):
        first, last = (
            (np.zeros(len(gap)), np.zeros(len(gap))) if bend is None else (bend.start_s.copy(), bend.end_s.copy())
        )
        if after:
            first[-1], last[-1] = bends
            bend = Bend(np.append(first, 0.0), np.append(last, 0.0))
        else:
            bend = Bend(np.insert(first, 0, bends[0]), np.insert(last, 0, bends[1]))
    stencil = curve.stencil
    if stencil is not None:
        shift = 0 if after else 1
        stencil = Stencil(
            grown(stencil.start + shift, len(gap) if after else 0),
            grown(stencil.start_share, 0.0),
            grown(stencil.end + shift, len(gap) if after else 0),
            grown(stencil.end_share, 0.0),
        )
    return ClockCurve.laid(
        (grown(curve.reference[0], int(end[0])), grown(curve.reference[1], float(end[1]))),
        (grown(curve.offset[0], int(offset[0])), grown(curve.offset[1], float(offset[1]))),
        grown(change_s, 0.0 if after else -change),
        bend,
        stencil,
        grown(gap, bool(after)),
        grown(broken, bool(after)),
        grown(curve.corner, False),
        grown(curve.sigma_s, curve.sigma_s[edge]),
        grown(curve.common_s, curve.common_s[edge]),
        curve.step,
        (grown(curve.reset[0], 0), grown(curve.reset[1], 0.0)),
    )
