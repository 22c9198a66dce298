"""What the chain asks of an observer, be it a site on the ground or a moving observatory."""

from __future__ import annotations

from typing import TYPE_CHECKING, Final, Protocol, runtime_checkable

import numpy as np

from .. import exact
from ..exact import FloatArray, Pair

if TYPE_CHECKING:
    from ..tables.reference import ReferenceData

__all__ = ["SLACK_S", "Observer", "nearest_inside", "require_inside"]

SLACK_S: Final = 1e-6
"""How far past its end a trajectory is followed in a straight line, s: over the grid on which wavefronts are dated,
exact to 1e-10 m."""


@runtime_checkable
class Observer(Protocol):
    """Something with a name and a geocentric position at every instant.

    `Site` and trajectories are observers; those with a span offer `clip` too (see `nearest_inside`). The
    geocentre is not one: it has no topocentric terms, and the chain treats it as a place.
    """

    @property
    def name(self) -> str:
        """Name for ledgers and messages."""
        ...

    def gcrs(self, tt: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray]:
        """Geocentric position (m) and velocity (m/s) on the GCRS axes in TT-compatible units.

        Parameters
        ----------
        tt : Pair
            TT count, any shape.
        reference : ReferenceData
            Tables in use (Earth orientation for a site).

        Returns
        -------
        r_m, v_m_s : float array, shape of `tt` + (3,)
        """
        ...


def nearest_inside(observer: Observer, tt: Pair) -> Pair:
    """TT counts moved to the nearest ones at which the observer can be asked.

    An observer with a span says so by a method `clip(tt) -> Pair`; the same object comes back for one without.
    """
    clip = getattr(observer, "clip", None)
    return tt if clip is None else clip(tt)


def require_inside(observer: Observer, tt: Pair, reference: ReferenceData) -> None:
    """Raise the observer's own `OutOfSpan` for TT counts more than `SLACK_S` outside its span."""
    outside_s = np.abs(exact.seconds(exact.subtract(tt, nearest_inside(observer, tt))))
    if np.any(outside_s > SLACK_S):
        observer.gcrs(tt, reference)
