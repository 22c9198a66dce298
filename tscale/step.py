"""Step: one invertible edge between two nodes, with its terms, rate, uncertainty and source."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass
from typing import TypeAlias

import numpy as np

from . import exact
from .budget.assumptions import DEFAULT, Assumptions
from .budget.contribution import Contribution, Omission, by_source
from .exact import FloatArray, Pair
from .instants import Instants
from .scales import Node

__all__ = ["Step", "Terms"]

Terms: TypeAlias = Mapping[str, Pair]


def _no_uncertainty(before: Instants) -> Mapping[str, FloatArray]:
    return {}


def _no_omissions(assumptions: Assumptions) -> tuple[Omission, ...]:
    return ()


def _no_notes(before: Instants) -> tuple[str, ...]:
    return ()


@dataclass(frozen=True)
class Step:
    """One edge of a chain: either the same event on another scale, or the signal at another place.

    Attributes
    ----------
    start, end : Node
        Scale and place before and after.
    title : str
        What happens, in a few words.
    source : str
        The document that defines it.
    forward, backward : callable
        Map instants of `start` to `end`, and back.
    terms : callable
        From the instants before and after to each term in seconds (exact pairs). The terms add up to the
        difference of the labels, so that UTC to TAI shows 37 s.
    rate : callable
        From the instants before and after to d(after)/d(before) - 1 of the counts.
    uncertainty_s : callable
        From the instants before to the standard uncertainties of the step by source, s; made from `contributions`
        where these are given.
    notes : callable
        From the instants before to what a reader should know: values predicted or extrapolated.
    contributions : callable or None
        From the instants before and the assumptions to the input quantities of the step with their uncertainties,
        sensitivities and correlations. None: `uncertainty_s` is all there is to say; see `contributed`.
    omissions : callable
        From the assumptions to what the step's contributions leave out, and why.
    """

    start: Node
    end: Node
    title: str
    source: str
    forward: Callable[[Instants], Instants]
    backward: Callable[[Instants], Instants]
    terms: Callable[[Instants, Instants], Terms]
    rate: Callable[[Instants, Instants], FloatArray]
    uncertainty_s: Callable[[Instants], Mapping[str, FloatArray]] = _no_uncertainty
    notes: Callable[[Instants], tuple[str, ...]] = _no_notes
    contributions: Callable[[Instants, Assumptions], Sequence[Contribution]] | None = None
    omissions: Callable[[Assumptions], Sequence[Omission]] = _no_omissions

    def __post_init__(self) -> None:
        given = self.contributions
        if given is not None and self.uncertainty_s is _no_uncertainty:
            object.__setattr__(self, "uncertainty_s", lambda before: by_source(given(before, DEFAULT)))

    def contributed(self, before: Instants, assumptions: Assumptions = DEFAULT) -> Sequence[Contribution]:
        """Contributions to the uncertainty of the instants after the step.

        Of a step that states standard uncertainties alone, each is an input of its own that all instants share: the
        cautious reading, by which nothing is averaged away.
        """
        if self.contributions is not None:
            return self.contributions(before, assumptions)
        one = np.ones(before.shape)
        return [
            Contribution(source, source, "s", one, np.broadcast_to(np.asarray(sigma, dtype=np.float64), before.shape))
            for source, sigma in self.uncertainty_s(before).items()
        ]

    def reversed(self) -> Step:
        """The same step the other way: terms and sensitivities change sign, the rate is inverted."""
        return Step(
            start=self.end,
            end=self.start,
            title=self.title,
            source=self.source,
            forward=self.backward,
            backward=self.forward,
            terms=lambda before, after: {_flip(k): exact.negate(v) for k, v in self.terms(after, before).items()},
            rate=lambda before, after: _inverse_rate(self.rate(after, before)),
            uncertainty_s=lambda before: self.uncertainty_s(self.backward(before)),
            notes=lambda before: self.notes(self.backward(before)),
            contributions=lambda before, assumptions: [
                part.negated() for part in self.contributed(self.backward(before), assumptions)
            ],
            omissions=self.omissions,
        )

    def __str__(self) -> str:
        return f"{self.start} -> {self.end}: {self.title} [{self.source}]"


def _inverse_rate(rate: FloatArray) -> FloatArray:
    # 1/(1 + x) - 1 without cancellation.
    return np.asarray(-rate / (1.0 + rate))


def _flip(term: str) -> str:
    # A term named as a difference keeps its sign right: -(UTC - TAI) is TAI - UTC.
    left, minus, right = term.partition(" - ")
    return f"{right} - {left}" if minus else term
