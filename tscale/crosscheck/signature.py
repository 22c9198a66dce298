"""Signature: what one mistake of another program does to its results, as a function of time."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace
from typing import Any, TypeAlias

import numpy as np

from ..exact import FloatArray
from ..instants import Instants

__all__ = ["Effect", "Signature", "bound"]

Effect: TypeAlias = Callable[[Instants, Instants], FloatArray]
"""From the instants before and after a step, in its own direction, to the seconds that the mistake adds after it."""


def bound(function: Callable[..., FloatArray], *more: Any) -> Effect:
    """An effect out of a function that takes more than the instants."""
    return lambda before, after: function(before, after, *more)


@dataclass(frozen=True)
class Signature:
    """A mistake with at most one number in it.

    Attributes
    ----------
    name : str
        In a few words, as it stands in the list of causes.
    description : str
        What went wrong, with its size and its source.
    effect : callable
        Seconds added for an amplitude of 1; see `Effect`. It is made at instants that may carry other mistakes already.
    station : int
        Number of the node at which it is added: 0 is the start of the chain, i the end of its step i.
    allowed : tuple of float, or None
        Amplitudes that the mistake can have: (1,) for one that is made or not, (1, -1) for one of either sign, whole
        numbers for something counted, in ascending order. None: any.
    spread : float
        Of a mistake with a single size that is known only so far: largest deviation of the amplitude from 1.
    unit : str
        Of the amplitude; empty where it counts how often the mistake was made.
    at_node : bool
        The effect is added to the date at the node as it stands, whichever way the step before it goes.
    limit : float
        Size up to which a fitted amplitude makes sense.
    exact : callable, optional
        Seconds added for a given amplitude, where these do not grow with it in a straight line.
    named : bool
        False for a plain offset or drift, which is described but no explanation.
    change, joined : callable, optional
        For mistakes in the pieces that one step is made of, such as source and site: what an amplitude makes of the
        pieces, and what several changes in them add together, which is not the sum of what each adds alone.
    constant : bool
        Another program may as well put it in last: `last` is then a signature too.
    last_of : str
        Of one that is worked out at its station but put into the result: the name of the same put in at the station.
    """

    name: str
    description: str
    effect: Effect
    station: int
    allowed: tuple[float, ...] | None = (1.0,)
    spread: float = 0.0
    unit: str = ""
    at_node: bool = False
    limit: float = float("inf")
    exact: Callable[[Instants, Instants, float], FloatArray] | None = None
    named: bool = True
    change: Callable[[Any, float], Any] | None = None
    joined: Callable[[Instants, Sequence[tuple[Callable[[Any, float], Any], float]]], FloatArray] | None = None
    constant: bool = False
    last_of: str = ""

    def added_s(self, before: Instants, after: Instants, amplitude: float) -> FloatArray:
        """Seconds added for an amplitude."""
        if self.exact is not None:
            return self.exact(before, after, amplitude)
        return amplitude * np.asarray(self.effect(before, after), dtype=np.float64)

    @property
    def last(self) -> Signature:
        """The same, put into the result after all other steps."""
        return replace(
            self,
            name=f"{self.name} in the result",
            description=f"{self.description}; put in last",
            constant=False,
            last_of=self.name,
        )

    @property
    def free(self) -> bool:
        """Whether the amplitude is fitted rather than chosen."""
        return self.allowed is None or self.spread > 0.0
