"""Theirs less ours: the differences of two sets of results, exactly taken, and what they amount to."""

from __future__ import annotations

import json
import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np

from .. import exact
from ..chains import Chain
from ..constants import JULIAN_YEAR_S
from ..errors import InvalidInput, ScaleMismatch
from ..exact import FloatArray
from ..instants import Instants
from .noise import independent_values, rms

__all__ = ["Residuals", "Trend", "against", "trend_of"]


@dataclass(frozen=True)
class Trend:
    """A straight line through residuals."""

    mean_s: float
    per_year_s: float
    per_year_sigma_s: float
    """NaN where it is not known: fewer than three dates, or all at once."""


def trend_of(t: Instants, residual_s: FloatArray) -> Trend:
    """Mean and slope by least squares, the latter with its uncertainty for correlated residuals."""
    x = exact.seconds(exact.subtract(t.pair, (t.whole[0], t.fraction[0]))) / JULIAN_YEAR_S
    mean = float(np.mean(residual_s))
    x = x - np.mean(x)
    power = float(x @ x)
    if residual_s.size < 3 or not power:
        return Trend(mean, 0.0, math.nan)
    slope = float(x @ (residual_s - mean)) / power
    left = (residual_s - mean - slope * x)[np.argsort(x, kind="stable")]
    worth = independent_values(left)
    sigma = math.sqrt(float(left @ left) / max(residual_s.size - 2, 1) / power * (residual_s.size / worth))
    return Trend(mean, slope, sigma)


@dataclass(frozen=True, eq=False)
class Residuals:
    """Results of another program minus those of a chain, at the same instants.

    Attributes
    ----------
    t : Instants
        Where both start, one-dimensional.
    theirs, ours : Instants
        Both results.
    residual_s : float array
        Theirs minus ours, SI seconds, subtracted exactly and rounded once.
    path : str
        The chain.
    """

    t: Instants
    theirs: Instants
    ours: Instants
    residual_s: FloatArray
    path: str
    _chain: Any

    @property
    def n(self) -> int:
        """Number of dates."""
        return int(self.residual_s.size)

    @property
    def max_s(self) -> float:
        """Largest residual in size."""
        return float(np.max(np.abs(self.residual_s)))

    @property
    def rms_s(self) -> float:
        """Root mean square of the residuals."""
        return rms(self.residual_s)

    @property
    def mean_s(self) -> float:
        """Mean of the residuals."""
        return float(np.mean(self.residual_s))

    @property
    def scatter_s(self) -> float:
        """Root mean square about the mean."""
        return rms(self.residual_s - self.mean_s)

    @property
    def trend(self) -> Trend:
        """A straight line through the residuals."""
        return trend_of(self.t, self.residual_s)

    def table(self) -> str:
        """The figures, a line each."""
        line = self.trend
        sigma = "" if math.isnan(line.per_year_sigma_s) else f" +- {line.per_year_sigma_s:.2g}"
        worst = int(np.argmax(np.abs(self.residual_s)))
        rows = [
            ("chain", self.path),
            ("dates", f"{self.n}"),
            ("largest", f"{self.residual_s[worst]:+.6e} s, row {worst}"),
            ("rms", f"{self.rms_s:.6e} s"),
            ("mean", f"{self.mean_s:+.6e} s"),
            ("rms about the mean", f"{self.scatter_s:.6e} s"),
            ("trend", f"{line.per_year_s:+.3e}{sigma} s/yr"),
        ]
        width = max(len(name) for name, _ in rows)
        return "\n".join([*(f"{name:<{width}}  {text}" for name, text in rows), "residuals are theirs minus ours"])

    def facts(self) -> dict[str, Any]:
        """The figures as plain numbers; None where one is not known."""
        line = self.trend
        sigma = None if math.isnan(line.per_year_sigma_s) else line.per_year_sigma_s
        return {
            "chain": self.path,
            "n": self.n,
            "max_s": self.max_s,
            "rms_s": self.rms_s,
            "mean_s": self.mean_s,
            "scatter_s": self.scatter_s,
            "trend_s_per_year": line.per_year_s,
            "trend_sigma_s_per_year": sigma,
        }

    def to_json(self, *, residuals: bool = True, indent: int | None = None) -> str:
        """The figures, and with `residuals` every residual, as JSON."""
        facts = self.facts()
        if residuals:
            facts["residual_s"] = self.residual_s.tolist()
        return json.dumps(facts, indent=indent, allow_nan=False)

    def __repr__(self) -> str:
        return f"<Residuals of {self.n} dates, rms {self.rms_s:.3e} s, max {self.max_s:.3e} s>"


def against(t_in: Instants, t_out: Instants, *, chain: Chain | Callable[[Instants], Instants]) -> Residuals:
    """Compare the results of another program with those of a chain.

    Parameters
    ----------
    t_in : Instants
        What the other program was given; any shape.
    t_out : Instants
        What it gave, row by row.
    chain : Chain
        What it should have done (a compiled chain, or any function from Instants to Instants, will do, too).

    Raises
    ------
    InvalidInput
        No rows, or another number of rows.
    ScaleMismatch
        Dates on another scale or at another place than the ends of the chain.
    """
    for name, value in (("t_in", t_in), ("t_out", t_out)):
        if not isinstance(value, Instants):
            raise InvalidInput(f"{name} must be Instants, got {type(value).__name__}; make them with Instants.from_...")
    if t_in.shape != t_out.shape:
        raise InvalidInput(
            f"t_in and t_out belong together row by row, got shapes {t_in.shape} and {t_out.shape}: bring the rows "
            "into line first"
        )
    if t_in.size == 0:
        raise InvalidInput("there are no rows to compare")
    start = t_in.ravel()
    ours = chain(start)
    theirs = t_out.ravel()
    if theirs.scale != ours.scale or theirs.place not in (None, ours.place):
        raise ScaleMismatch(f"t_out is at {theirs.node}, where the chain ends at {ours.node}: name the node it is at")
    theirs = theirs.at(ours.place)
    return Residuals(start, theirs, ours, theirs.minus(ours), str(chain), chain)
