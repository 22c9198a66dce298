"""Jumps, outliers, rate steps, gaps and changes of spacing in a series of clock offsets.

How far each offset lies from the straight line between its neighbours is small and without memory for a clock that runs
evenly, whatever its offset and rate. A single bad offset disturbs three of these distances (-1/2, 1, -1/2), a jump two
(-1/2, 1/2), a change of rate one. What is large against the median absolute deviation is explained by the pattern that
fits best, taken out, and the rest looked at again.
"""

from __future__ import annotations

from bisect import bisect_left
from collections.abc import Sequence
from itertools import pairwise
from typing import Final, NamedTuple

import numpy as np

from ..exact import BoolArray, FloatArray, IntArray

__all__ = ["Anomaly", "anomalies", "irregular_spacing", "longest_increasing", "unit_slips"]

_MAD_TO_SIGMA: Final = 1.4826
"""Standard deviation of a normal distribution in median absolute deviations."""
_LEAST: Final = 7
_NEIGHBOURS: Final = 4
_LEAST_BLOCKS: Final = 40
_BLOCKS: Final = (4, 16, 64)
_REACH: Final = 3
_POWERS: Final = (3, 6, 9, -3, -6, -9)


class Anomaly(NamedTuple):
    """What disturbs a series, and where."""

    kind: str
    """`outlier`, `phase jump` or `rate step`."""
    place: int
    """The offset that is off, the first after the jump, or the one at which the rate changes."""
    size: float
    """Seconds, or seconds per second."""
    significance: float
    """In robust standard deviations."""


def anomalies(t_s: FloatArray, x_s: FloatArray, floor_s: float, threshold: float) -> list[Anomaly]:
    """Find what disturbs offsets `x_s` at increasing times `t_s` by more than `threshold` standard deviations.

    `floor_s` is the least standard deviation assumed, for series that are smoother than their own digits. Few offsets
    tell little of their own scatter: of n, the threshold is (1 + 12 / (n - 2)) times as high. With 6 the simulated
    share of undisturbed series, of white phase, white frequency or random-walk frequency noise, in which anything is
    found is then below 1 in 200 from 7 offsets on.

    Changes of rate that no single offset shows are looked for in the means of 4, 16 and 64 offsets as well.
    """
    found = _search(t_s, x_s, floor_s, threshold)
    for block in _BLOCKS:
        if len(t_s) // block >= _LEAST_BLOCKS:
            found += _slow_changes(t_s, _without(t_s, x_s, found), block, floor_s, threshold)
    return sorted(found, key=lambda anomaly: anomaly.place)


def _search(t: FloatArray, x: FloatArray, floor_s: float, threshold: float) -> list[Anomaly]:
    """What disturbs single distances."""
    if len(t) < _LEAST:
        return []
    rest = _distances(t, x)
    centre = float(np.median(rest))
    sigma = max(_MAD_TO_SIGMA * float(np.median(np.abs(rest - centre))), floor_s)
    threshold = threshold * (1.0 + 12.0 / len(rest))
    found: dict[tuple[str, int], Anomaly] = {}
    for _ in range(len(t) // 3 + 1):
        peak = int(np.argmax(np.abs(rest)))
        if not abs(rest[peak]) > threshold * sigma:
            break
        best, rest = _explained(t, rest, peak + 1, sigma)
        if (best.kind, best.place) in found or best.significance <= threshold:
            break
        found[best.kind, best.place] = best
    return list(found.values())


def _without(t: FloatArray, x: FloatArray, found: Sequence[Anomaly]) -> FloatArray:
    """The series with what was found taken out."""
    rest = x.copy()
    for kind, place, size, _ in found:
        if kind == "outlier":
            rest[place] -= size
        elif kind == "phase jump":
            rest[place:] -= size
        else:
            rest[place:] -= size * (t[place:] - t[place])
    return rest


def _slow_changes(t: FloatArray, x: FloatArray, block: int, floor_s: float, threshold: float) -> list[Anomaly]:
    """Changes of rate that stand out among the means of `block` offsets; each put where two lines fit best."""
    count = len(t) // block
    found: list[Anomaly] = []
    for _ in range(count // 3):
        # One at a time: a change in the midst of a block disturbs two distances.
        rest = _without(t, x, found)
        when, mean = (np.mean(series[: count * block].reshape(count, block), axis=1) for series in (t, rest))
        steps = [step for step in _search(when, mean, floor_s / np.sqrt(block), threshold) if step.kind == "rate step"]
        if not steps:
            break
        largest = max(steps, key=lambda step: step.significance)
        place, size = _corner(t, rest, slice(max(largest.place - 2, 0) * block, (largest.place + 3) * block), block)
        found.append(Anomaly("rate step", place, size, largest.significance))
    return found


def _corner(t: FloatArray, x: FloatArray, window: slice, margin: int) -> tuple[int, float]:
    """Where two lines that meet fit a stretch best, and by how much their slopes differ."""
    scale = t[window][-1] - t[window][0]
    own = (t[window] - t[window][0]) / scale
    best: tuple[float, int, float] | None = None
    for corner in range(margin, len(own) - margin):
        lines = np.stack([np.ones(len(own)), own, np.maximum(own - own[corner], 0.0)], axis=1)
        level, *_ = np.linalg.lstsq(lines, x[window])
        miss = float(np.sum((x[window] - lines @ level) ** 2))
        if best is None or miss < best[0]:
            best = miss, window.start + corner, float(level[2] / scale)
    assert best is not None
    return best[1], best[2]


def _distances(t: FloatArray, x: FloatArray) -> FloatArray:
    """Of all but the first and last offset from the line between their neighbours."""
    before, after = np.diff(t)[:-1], np.diff(t)[1:]
    return np.asarray(x[1:-1] - (x[:-2] * after + x[2:] * before) / (before + after))


def _explained(t: FloatArray, rest: FloatArray, place: int, sigma: float) -> tuple[Anomaly, FloatArray]:
    """Which single disturbance at or beside `place` explains the distances around it best, and what it leaves."""
    last = len(t) - 1
    low, high = max(place - _REACH, 0), min(place + _REACH, last)
    own = t[low : high + 1] - t[low]
    window = slice(low, high - 1)  # the distances of the offsets low + 1 ... high - 1
    seen = rest[window]
    best: tuple[float, Anomaly, FloatArray] | None = None
    # At the ends a jump, a bad offset and a rate step look alike: the offset at the end is blamed, the least claim.
    order = (
        (0, 1, 2)
        if place == 1
        else (place + 1, place, place - 1)
        if place == last - 1
        else (place, place - 1, place + 1)
    )
    for at in order:
        here = at - low
        shapes = {
            "outlier": (np.arange(len(own)) == here).astype(np.float64),
            "phase jump": (np.arange(len(own)) >= here).astype(np.float64),
            "rate step": np.maximum(own - own[here], 0.0),
        }
        for kind, shape in shapes.items():
            if (kind == "phase jump" and at == 0) or (kind == "rate step" and at != place):
                continue
            pattern = _distances(own, shape)
            strength = float(pattern @ pattern)
            if strength == 0.0:
                continue
            size = float(pattern @ seen) / strength
            left = seen - size * pattern
            miss = float(left @ left)
            if best is None or miss < best[0] * (1.0 - 1e-9) - 1e-6 * sigma**2:
                best = miss, Anomaly(kind, at, size, abs(size) * np.sqrt(strength) / sigma), left
    assert best is not None
    after = rest.copy()
    after[window] = best[2]
    return best[1], after


def unit_slips(x_s: FloatArray) -> list[tuple[int, int]]:
    """Offsets that fit in among their neighbours once divided by a power of 1000: (place, power of ten)."""
    found = []
    taken = np.zeros(len(x_s), dtype=np.bool_)
    if len(x_s) < _LEAST:
        return []
    windows = np.lib.stride_tricks.sliding_window_view(np.pad(x_s, 4, mode="reflect"), 9)
    middle = np.median(windows, axis=-1)
    # A glance at all before a closer look at the few that are far from their neighbours.
    for place in np.flatnonzero(np.abs(x_s - middle) > 0.5 * np.abs(middle)).tolist():
        around = [i for i in range(max(place - 4, 0), min(place + 5, len(x_s))) if i != place and not taken[i]]
        if len(around) < _NEIGHBOURS:
            continue
        near = float(np.median(x_s[around]))
        spread = _MAD_TO_SIGMA * float(np.median(np.abs(x_s[around] - near)))
        if near == 0.0 or abs(x_s[place] - near) <= 10.0 * spread + 0.9 * abs(near):
            continue
        for power in _POWERS:
            if abs(x_s[place] / 10.0**power - near) <= 0.3 * abs(near) + 3.0 * spread and x_s[place] != 0.0:
                found.append((place, power))
                taken[place] = True
                break
    return found


def irregular_spacing(t_s: FloatArray, max_gap_s: float | None) -> tuple[list[int], list[int]]:
    """Places after a gap, and places where the spacing becomes another for good (three times or more)."""
    spacing = np.diff(t_s)
    if len(spacing) < _LEAST:
        return ([] if max_gap_s is None else [int(i) + 1 for i in np.flatnonzero(spacing > max_gap_s)]), []
    # Runs of equal spacings, to 2 %; short ones are gaps or doubles, and do not break a run.
    changes = []
    run = float(np.median(spacing[:3]))
    for place in range(len(spacing) - 2):
        ahead = spacing[place : place + 3]
        if abs(ahead[0] / run - 1.0) > 0.02 and np.all(np.abs(ahead / ahead[0] - 1.0) <= 0.02):
            changes.append(place)
            run = float(ahead[0])
    limit = np.empty(len(spacing))
    edges = [0, *changes, len(spacing)]
    for start, stop in pairwise(edges):
        limit[start:stop] = 1.5 * np.median(spacing[start:stop])
    gaps = spacing > (limit if max_gap_s is None else max_gap_s)
    return [int(i) + 1 for i in np.flatnonzero(gaps)], [i + 1 for i in changes]


def longest_increasing(whole: IntArray, fraction: FloatArray) -> BoolArray:
    """Which items of the longest strictly increasing part there is: the fewest are left out."""
    keys = list(zip(whole.tolist(), fraction.tolist(), strict=True))
    tops: list[tuple[int, float]] = []
    ends: list[int] = []
    before = np.full(len(keys), -1)
    for place, key in enumerate(keys):
        level = bisect_left(tops, key)
        if level == len(tops):
            tops.append(key)
            ends.append(place)
        elif key < tops[level]:
            tops[level], ends[level] = key, place
        else:
            continue  # the same epoch again: the first of the two stays
        before[place] = ends[level - 1] if level else -1
    kept = np.zeros(len(keys), dtype=np.bool_)
    place = ends[-1] if ends else -1
    while place >= 0:
        kept[place] = True
        place = int(before[place])
    return kept
