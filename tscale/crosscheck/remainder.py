"""What is left when the causes are taken out: whether it is noise, and if not, what it looks like."""

from __future__ import annotations

import math
from typing import Final

import numpy as np

from ..exact import FloatArray
from .noise import independent_values, rms

__all__ = ["leftovers"]

_FALSE_ALARM: Final = 1e-3
_TOGETHER: Final = 0.1
_MOST_DATES: Final = 1500
_DAY_S: Final = 86400.0
_YEAR_D: Final = 365.25
_PERIODS: Final = (
    ("a day", 1.0),
    ("a sidereal day", 1.0 / 1.00273781191135448),
    ("half a day", 0.5),
    ("half a sidereal day", 0.5 / 1.00273781191135448),
    ("a week", 7.0),
    ("a sidereal month", 27.321661),
    ("a synodic month", 29.530589),
    ("half a year", _YEAR_D / 2),
    ("a year", _YEAR_D),
    ("Jupiter's synodic period", 398.884),
    ("Venus's synodic period", 583.921),
    ("Jupiter's period", 4332.59),
    ("the Moon's node's period", 6798.38),
    ("Saturn's period", 10759.22),
)


def leftovers(seconds: FloatArray, left: FloatArray, sigma_s: FloatArray | None, floor_s: float) -> tuple[str, ...]:
    """What residuals in order of time hold beside noise, in words; nothing if they are as good as noise.

    Looked at: the mean, a straight line, periods that the sky has, whether neighbours go together, and, where the
    uncertainty of each was stated, the size. The chance that noise alone is told of is below 1e-3 for all of
    mean, line and periods together.

    Parameters
    ----------
    seconds : float array
        Dates, s from anywhere.
    left : float array
        What is left, s.
    sigma_s : float array or None
        As stated by who gave the results.
    floor_s : float
        Below which nothing can be told.
    """
    size = rms(left)
    if size <= 3.0 * floor_s:
        return ()
    n = left.size
    needed = 2.0 * math.log((len(_PERIODS) + 2) / _FALSE_ALARM)
    worth = independent_values(left - np.mean(left))
    found = []
    mean = float(np.mean(left))
    if _gain(left, np.ones((n, 1)), worth) > needed:
        found.append(f"a mean of {mean:+.2e} s")
    x = seconds - np.mean(seconds)
    span = float(np.ptp(x))
    if span and n > 3:
        line = np.stack([np.ones(n), x / span], axis=1)
        slope = float(np.linalg.lstsq(line, left, rcond=None)[0][1])
        if _gain(left - mean, line, worth) > needed:
            found.append(f"a drift of {slope / span * _YEAR_D * _DAY_S:+.2e} s/yr")
    periodic = []
    for name, days in _PERIODS:
        if n < 8 or span < 0.75 * days * _DAY_S:
            continue
        phase = 2.0 * math.pi * x / (days * _DAY_S)
        wave = np.stack([np.ones(n), np.cos(phase), np.sin(phase)], axis=1)
        gain = _gain(left - mean, wave, worth)
        if gain > needed:
            fit = np.linalg.lstsq(wave, left, rcond=None)[0]
            periodic.append((gain, f"a period of {name} with an amplitude of {math.hypot(fit[1], fit[2]):.2e} s"))
    if periodic:
        found.append(max(periodic)[1])
    if not found:
        found.extend(_any_period(x, left - mean, worth))
    if not found and worth < _TOGETHER * n and n >= 20:
        found.append(f"{n} values that go together so much that they are worth {worth:.0f}")
    if sigma_s is not None:
        ratio = rms(left / sigma_s)
        if ratio > 1.0 + 4.0 / math.sqrt(2.0 * worth):
            found.append(f"an rms that is {ratio:.2g} times what sigma_s states")
    return tuple(found)


def _any_period(x: FloatArray, left: FloatArray, worth: float) -> list[str]:
    """The strongest period of all, if it stands out (Scargle 1982, ApJ 263, 835)."""
    step = max(1, -(-x.size // _MOST_DATES))
    x, left = x[::step], left[::step]
    span, power = float(np.ptp(x)), float(left @ left)
    if not span or not power or x.size < 8:
        return []
    cycles = np.arange(1, x.size + 1) * 0.5
    wave = np.exp((2j * math.pi / span) * np.multiply.outer(cycles, x))
    height = np.abs(wave @ left) ** 2 / power * min(worth / (x.size * step), 1.0)
    best = int(np.argmax(height))
    if height[best] <= math.log(cycles.size / _FALSE_ALARM):
        return []
    amplitude = 2.0 / x.size * float(np.abs(wave[best] @ left))
    days = span / cycles[best] / _DAY_S
    return [f"a period of about {days:.3g} days with an amplitude of {amplitude:.1e} s"]


def _gain(left: FloatArray, columns: FloatArray, worth: float) -> float:
    largest = float(np.max(np.abs(left)))
    if not largest:
        return 0.0
    y = left / largest
    rest = y - columns @ np.linalg.lstsq(columns, y, rcond=None)[0]
    before, after = float(y @ y), float(rest @ rest)
    return worth * math.log(before / max(after, 1e-30 * before))
