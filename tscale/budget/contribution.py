"""Contribution: one input quantity with its standard uncertainty, and how far it carries into the result."""

from __future__ import annotations

from collections.abc import Iterable, Mapping
from dataclasses import dataclass, replace
from typing import Literal, NamedTuple, TypeAlias

import numpy as np

from ..errors import InvalidInput
from ..exact import FloatArray
from .correlation import COMMON, Correlation

__all__ = ["Contribution", "Distribution", "Kind", "Omission", "by_source", "gathered"]

Kind: TypeAlias = Literal["A", "B"]
Distribution: TypeAlias = Literal["normal", "rectangular", "triangular", "arcsine"]


class Omission(NamedTuple):
    """Something that is not in a budget, and why."""

    source: str
    reason: str


@dataclass(frozen=True, eq=False)
class Contribution:
    """What one input quantity contributes to the uncertainty of a result (JCGM 100:2008, 5.1).

    Arrays have the shape of the instants.

    Parameters
    ----------
    source : str
        Source of uncertainty that it is counted under; several quantities may share one.
    quantity : str
        The input quantity. Met in two steps it is one and the same: its sensitivities add, with their signs.
    unit : str
        Of the quantity.
    sensitivity : float array
        d(result)/d(quantity), s per unit, signed.
    sigma : float array
        Standard uncertainty of the quantity, in its unit.
    value : float array, optional
        Its estimate.
    kind : {"A", "B"}
        Type of evaluation: from the statistics of repeated observations, or otherwise.
    distribution : str
        Of the quantity about its estimate.
    correlation : Correlation
        Of its errors between instants.
    dof : float
        Degrees of freedom of `sigma`.
    handle : tuple
        Which table and column a Monte Carlo run has to move; empty: its errors are added to the result instead.
    """

    source: str
    quantity: str
    unit: str
    sensitivity: FloatArray
    sigma: FloatArray
    value: FloatArray | None = None
    kind: Kind = "B"
    distribution: Distribution = "normal"
    correlation: Correlation = COMMON
    dof: float = np.inf
    handle: tuple[str | int, ...] = ()

    @property
    def signed_s(self) -> FloatArray:
        """Sensitivity times standard uncertainty, s: of the sign of the sensitivity."""
        return np.asarray(self.sensitivity * self.sigma)

    def negated(self) -> Contribution:
        """The same input in a step taken the other way."""
        return replace(self, sensitivity=-self.sensitivity)

    def plus(self, other: Contribution) -> Contribution:
        """The same input met again in a later step."""
        if (self.unit, self.source) != (other.unit, other.source):
            raise InvalidInput(
                f"the input {self.quantity!r} is counted under {self.source!r} in {self.unit} by one step and under "
                f"{other.source!r} in {other.unit} by another; one quantity has one source and one unit"
            )
        # The two instants differ by the time between the steps, and so may the uncertainties: what adds up is s.
        scale = np.where(self.sigma > 0.0, other.sigma / np.where(self.sigma > 0.0, self.sigma, 1.0), 1.0)
        sigma = np.where(self.sigma > 0.0, self.sigma, other.sigma)
        return replace(self, sensitivity=self.sensitivity + other.sensitivity * scale, sigma=sigma)


def gathered(found: Iterable[Contribution]) -> list[Contribution]:
    """Contributions of all steps, each input quantity once."""
    known: dict[str, Contribution] = {}
    for part in found:
        known[part.quantity] = known[part.quantity].plus(part) if part.quantity in known else part
    return list(known.values())


def by_source(found: Iterable[Contribution]) -> Mapping[str, FloatArray]:
    """Standard uncertainty of the result by source, s: quantities of one source combined in quadrature."""
    squares: dict[str, FloatArray] = {}
    for part in gathered(found):
        square = part.signed_s**2
        squares[part.source] = squares[part.source] + square if part.source in squares else square
    return {source: np.asarray(np.sqrt(square)) for source, square in squares.items()}
