"""What the chain asks of an observer, be it a site on the ground or a moving observatory."""

from __future__ import annotations

from typing import TYPE_CHECKING, Protocol, runtime_checkable

from ..exact import FloatArray, Pair

if TYPE_CHECKING:
    from ..tables.reference import ReferenceData

__all__ = ["Observer"]


@runtime_checkable
class Observer(Protocol):
    """Something with a name and a geocentric position at every instant.

    `Site` and Earth-centred trajectories are observers. The geocentre is not one: it has no topocentric
    terms, and the chain treats it as a place.
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
