"""Links: when light sent from one place reaches another, and comes back.

    one_way(receive=t, receiver=site, transmitter="mars")
    two_way(transmit=t, station=site, target=orbiter)

An end is a `Site`, a `SurfaceSite`, a `Trajectory`, or the centre of a body (a name or NAIF number; a planet is
its system's centre of mass, which planetary kernels hold). Air, plasma and clocks' own delays are not part of a link.
"""

from __future__ import annotations

from ..surface import SurfaceSite
from .dating import GEOCENTRIC_REGION_M
from .ends import Moving, Participant
from .links import one_way, two_way
from .solution import LinkSolution, TwoWaySolution

__all__ = [
    "GEOCENTRIC_REGION_M",
    "LinkSolution",
    "Moving",
    "Participant",
    "SurfaceSite",
    "TwoWaySolution",
    "one_way",
    "two_way",
]
