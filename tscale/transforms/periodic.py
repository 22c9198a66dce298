"""A secular rate and periodic terms of the difference of two time scales, by least squares at stated periods."""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt

from ..constants import DAY_S
from ..errors import InvalidInput

__all__ = ["LUNAR_PERIODS_D", "MARTIAN_PERIODS_D", "PeriodicFit", "PeriodicTerm", "fit_periodic"]

_ARGUMENT_RATES: Final = {"l": 13.06499295, "l'": 0.98560028, "F": 13.22935024, "D": 12.19074912}
"""Rates of Delaunay's arguments, degrees a day (Simon et al. 1994, A&A 282, 663): mean anomaly of the Moon and of the
Sun, argument of the Moon's latitude, elongation of the Moon from the Sun."""


def _lunar(*multiples: tuple[str, int, int, int, int]) -> Mapping[str, float]:
    rates = np.array(list(_ARGUMENT_RATES.values()))
    return MappingProxyType({name: 360.0 / abs(float(np.dot(times, rates))) for name, *times in multiples})


LUNAR_PERIODS_D: Final = _lunar(
    ("l, anomalistic month", 1, 0, 0, 0),
    ("2D - l, evection", -1, 0, 0, 2),
    ("2D, half synodic month", 0, 0, 0, 2),
    ("D, synodic month", 0, 0, 0, 1),
    ("l', anomalistic year", 0, 1, 0, 0),
    ("2l, half anomalistic month", 2, 0, 0, 0),
    ("l - D", 1, 0, 0, -1),
    ("l + D", 1, 0, 0, 1),
    ("D - l'", 0, -1, 0, 1),
    ("D + l'", 0, 1, 0, 1),
    ("2D - 2l", -2, 0, 0, 2),
    ("2D - l - l'", -1, -1, 0, 2),
    ("2D - l'", 0, -1, 0, 2),
    ("2D + l", 1, 0, 0, 2),
    ("l - l'", 1, -1, 0, 0),
    ("l + l'", 1, 1, 0, 0),
    ("3D - l", -1, 0, 0, 3),
    ("3D", 0, 0, 0, 3),
    ("2D - 2F", 0, 0, -2, 2),
)
"""Periods in days of the Moon's coordinate time against the Earth's, by their Delaunay arguments."""

MARTIAN_PERIODS_D: Final[Mapping[str, float]] = MappingProxyType(
    {
        "anomalistic year of Mars": 686.9957,
        "half year of Mars": 343.4979,
        "third of a year of Mars": 228.9986,
        "quarter of a year of Mars": 171.7489,
        "fifth of a year of Mars": 137.3991,
        "anomalistic year": 365.2596,
        "half anomalistic year": 182.6298,
        "Mars and Jupiter, synodic": 816.44,
        "Mars and Jupiter, half synodic": 408.22,
        "Mars, Jupiter twice": 1005.98,
        "Mars and Saturn, synodic": 733.83,
        "Earth and Jupiter, synodic": 398.88,
        "Earth and Saturn, synodic": 378.09,
        "Earth and Mars, synodic": 779.94,
        "Mars and Jupiter, 2 to 1": 2235.0,
        "Jupiter": 4332.59,
        "Saturn": 10759.2,
    }
)
"""Periods in days of the coordinate time of Mars against the Earth's, from mean motions (as above)."""


class PeriodicTerm(NamedTuple):
    """amplitude cos(2 pi (t - epoch)/period - phase)."""

    name: str
    period_d: float
    amplitude_s: float
    phase_rad: float


class PeriodicFit(NamedTuple):
    """What a difference of two scales is made of.

    Attributes
    ----------
    rate : float
        Secular rate, dimensionless.
    offset_s : float
        Value at the epoch without the periodic terms, s.
    terms : tuple of PeriodicTerm
        Largest first.
    residual_rms_s : float
        What the terms do not explain, s.
    """

    rate: float
    offset_s: float
    terms: tuple[PeriodicTerm, ...]
    residual_rms_s: float

    @property
    def us_per_day(self) -> float:
        """Secular rate, microseconds per day."""
        return self.rate * (DAY_S * 1e6)

    def table(self) -> str:
        """Rate and terms as lines of text."""
        lines = [f"secular rate {self.rate:+.6e} = {self.us_per_day:+.4f} us/day"]
        lines += [f"{term.amplitude_s * 1e6:10.4f} us at {term.period_d:10.3f} d  {term.name}" for term in self.terms]
        return "\n".join([*lines, f"rms of the rest {self.residual_rms_s * 1e9:.1f} ns"])


def fit_periodic(elapsed_s: npt.ArrayLike, difference_s: npt.ArrayLike, periods_d: Mapping[str, float]) -> PeriodicFit:
    """Fit a line and a cosine and a sine at each period to a difference of two scales.

    Parameters
    ----------
    elapsed_s : float array (n,)
        Time since the epoch, s.
    difference_s : float array (n,)
        The difference, s.
    periods_d : mapping
        Period in days by name.

    Raises
    ------
    InvalidInput
        Fewer samples than unknowns, values that are not finite, periods that are not positive, too close to each other
        for the span, or sampled less than twice.
    """
    t, y = np.asarray(elapsed_s, dtype=np.float64), np.asarray(difference_s, dtype=np.float64)
    periods = np.array(list(periods_d.values()), dtype=np.float64)
    if t.ndim != 1 or t.shape != y.shape or t.size < 2 * periods.size + 2:
        raise InvalidInput(
            f"a fit of {periods.size} periods takes {2 * periods.size + 2} samples or more of one time and one "
            f"difference each, got shapes {t.shape} and {y.shape}"
        )
    if not (np.isfinite(t).all() and np.isfinite(y).all() and np.all(np.isfinite(periods) & (periods > 0.0))):
        raise InvalidInput("times, differences and periods must be finite, and periods positive")
    span_d = float(np.ptp(t)) / DAY_S
    if periods.size and 2.0 * float(np.max(np.diff(np.sort(t)))) > periods.min() * DAY_S:
        raise InvalidInput(f"the shortest period, {periods.min():g} d, is sampled less than twice: give denser dates")
    cycles = np.sort(span_d / periods)
    if periods.size and (cycles[0] < 1.0 or np.any(np.diff(cycles) < 0.5)):
        raise InvalidInput(
            f"over {span_d:.0f} d the periods {', '.join(f'{p:g}' for p in periods)} d do not all come round, or some "
            "stay less than half a cycle apart, and cannot be told from each other: give a longer span or fewer periods"
        )
    middle = 0.5 * (t.min() + t.max())
    angle = (2.0 * np.pi / (periods * DAY_S)) * t[:, np.newaxis]
    scaled = (t - middle) / (0.5 * np.ptp(t))
    design = np.column_stack((np.ones_like(t), scaled, np.cos(angle), np.sin(angle)))
    solution, _, rank, _ = np.linalg.lstsq(design, y, rcond=None)
    if rank < design.shape[1]:
        raise InvalidInput("the periods cannot be told from each other at these dates: give fewer periods")
    rest = y - design @ solution
    rate = float(solution[1] / (0.5 * np.ptp(t)))
    cosine, sine = solution[2 : 2 + periods.size], solution[2 + periods.size :]
    terms = [
        PeriodicTerm(name, float(period), float(np.hypot(a, b)), float(np.arctan2(b, a)))
        for name, period, a, b in zip(periods_d, periods, cosine, sine, strict=True)
    ]
    terms.sort(key=lambda term: -term.amplitude_s)
    return PeriodicFit(rate, float(solution[0]) - rate * middle, tuple(terms), float(np.sqrt(np.mean(np.square(rest)))))
