"""One conversion of ours against the same one of another library."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any, NamedTuple

import numpy as np

from ..earth.site import Site
from ..exact import FloatArray
from ..instants import Instants
from ..source import Source
from ..tables.reference import ReferenceData
from .noise import rms
from .residuals import trend_of

__all__ = ["Comparison", "Conversion", "Epochs", "Result"]


@dataclass(frozen=True, eq=False)
class Epochs:
    """The dates that all conversions are compared at, and what they need beside them.

    Attributes
    ----------
    utc : Instants
        One-dimensional, in order.
    site : Site
    source : Source
    reference : ReferenceData
    """

    utc: Instants
    site: Site
    source: Source
    reference: ReferenceData
    _made: dict[str, Any] = field(default_factory=dict, repr=False)

    def on(self, node: str) -> Instants:
        """The same instants at another node; worked out once."""
        from ..chains import chain

        if node not in self._made:
            made = chain("UTC", node, site=self.site, source=self.source, reference=self.reference)
            self._made[node] = made(self.utc)
        found: Instants = self._made[node]
        return found

    @cached_property
    def jd_tdb(self) -> tuple[FloatArray, FloatArray]:
        """TDB at the site as a Julian Date in two parts."""
        day, fraction = self.on("TDB").to_jd()
        return day.astype(np.float64), fraction


class Result(NamedTuple):
    """Ours minus theirs."""

    t: Instants
    residual: FloatArray


@dataclass(frozen=True)
class Conversion:
    """What is compared, how closely it must agree, and why no more closely."""

    name: str
    library: str
    package: str
    unit: str
    tolerance: float
    reason: str
    run: Callable[[Epochs], Result]


@dataclass(frozen=True, eq=False)
class Comparison:
    """How one conversion compared.

    Attributes
    ----------
    conversion : Conversion
    t : Instants or None
    residual : float array or None
        Ours minus theirs, in `conversion.unit`; None where it was not run.
    missing : str
        Why it was not run.
    """

    conversion: Conversion
    t: Instants | None
    residual: FloatArray | None
    missing: str = ""

    @property
    def name(self) -> str:
        """Of the conversion."""
        return self.conversion.name

    @property
    def ran(self) -> bool:
        """Whether the other library is there."""
        return self.residual is not None

    @property
    def n(self) -> int:
        """Number of values compared."""
        return 0 if self.residual is None else int(self.residual.size)

    @property
    def largest(self) -> float:
        """Largest difference in size."""
        return math.nan if self.residual is None else float(np.max(np.abs(self.residual)))

    @property
    def rms(self) -> float:
        """Root mean square of the differences."""
        return math.nan if self.residual is None else rms(self.residual)

    @property
    def per_year(self) -> float:
        """Slope of a straight line through the differences, per Julian year."""
        if self.residual is None or self.t is None:
            return math.nan
        return trend_of(self.t, self.residual).per_year_s

    @property
    def passed(self) -> bool:
        """Whether all differences lie within the tolerance; not so for what was not run."""
        return self.residual is not None and bool(np.all(np.abs(self.residual) <= self.conversion.tolerance))

    def facts(self) -> dict[str, Any]:
        """As plain values."""
        kind = self.conversion
        ran = self.ran
        return {
            "name": kind.name,
            "library": kind.library,
            "unit": kind.unit,
            "ran": ran,
            "missing": self.missing,
            "n": self.n,
            "max": self.largest if ran else None,
            "rms": self.rms if ran else None,
            "trend_per_year": self.per_year if ran else None,
            "tolerance": kind.tolerance,
            "reason": kind.reason,
            "passed": self.passed,
        }
