"""The two ends of a link: sites, spacecraft, bodies and surface sites, brought to one form.

Each end is an *anchor* (a body of the ephemeris) and an *offset* from it. The light path between two ends that
share an anchor, or whose anchors share a centre, is then formed from short vectors: 1e-16 of the distance
between the ends is lost to rounding, where the difference of two barycentric positions loses 0.1 ps.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Final, Protocol, TypeAlias, runtime_checkable

import numpy as np

from .. import exact
from ..constants import C_M_S
from ..earth.frames import dot
from ..earth.moving import observer_event
from ..earth.observer import Observer
from ..earth.rotation import gcrs_from_itrs
from ..earth.site import Site
from ..ephemeris.bodies import body_id, body_name
from ..errors import InvalidInput
from ..exact import FloatArray, Pair
from ..surface import SurfaceSite, contracted
from ..trajectory import Trajectory

if TYPE_CHECKING:
    from ..tables.reference import ReferenceData

__all__ = ["End", "Moving", "Participant", "as_end"]

_EARTH: Final = 399
_PLACES: Final = {
    0: "BARYCENTER",
    399: "GEOCENTER",
    301: "SELENOCENTER",
    1: "MERCURY",
    2: "VENUS",
    4: "MARS",
    5: "JUPITER",
    6: "SATURN",
    7: "URANUS",
    8: "NEPTUNE",
}


@runtime_checkable
class Moving(Protocol):
    """Anything whose barycentric state is known at TDB counts, such as a `Trajectory`."""

    def state_bcrs(self, tdb: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray]:
        """Barycentric position (m) and velocity (m/s), TDB-compatible, ICRF axes, each (..., 3)."""
        ...


Participant: TypeAlias = "Site | SurfaceSite | Observer | Moving | str | int"
"""What a link may be given as its end: a body is a name or a NAIF number."""


@dataclass(frozen=True)
class End(ABC):
    """One end of a link.

    Attributes
    ----------
    name : str
        For messages and tables.
    anchor : int
        NAIF number of the body that the offset is counted from (0: the solar-system barycentre).
    """

    name: str
    anchor: int

    @property
    def place(self) -> str | None:
        """Place name of events at this end, where there is a word for it."""
        return None

    @property
    def centre_of(self) -> int | None:
        """The body whose centre this end is, or None."""
        return None

    @property
    def ground(self) -> int | None:
        """The body on whose surface this end stands, or None."""
        return None

    @property
    def span(self) -> tuple[float, float] | None:
        """First and last TDB count (s) at which this end is known, or None for that of the ephemeris."""
        return None

    @abstractmethod
    def offset(self, tdb: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray]:
        """Barycentric TDB-compatible offset from the anchor (m) and its rate (m/s), each (..., 3)."""

    def up(self, tdb: Pair, reference: ReferenceData) -> FloatArray | None:
        """Unit vector to the zenith, (..., 3), of an end on the ground; else None."""
        return None


@dataclass(frozen=True)
class BodyEnd(End):
    """The centre of a body of the ephemeris."""

    @property
    def place(self) -> str | None:
        return _PLACES.get(self.anchor)

    @property
    def centre_of(self) -> int | None:
        return self.anchor

    def offset(self, tdb: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray]:
        shape = (*np.shape(tdb[0]), 3)
        return np.zeros(shape), np.zeros(shape)


@dataclass(frozen=True)
class ObserverEnd(End):
    """A site or an Earth-centred trajectory: a geocentric vector taken to the barycentric frame."""

    observer: Observer

    @property
    def place(self) -> str | None:
        return "TOPOCENTER"

    @property
    def ground(self) -> int | None:
        return _EARTH if isinstance(self.observer, Site) else None

    @property
    def span(self) -> tuple[float, float] | None:
        return _span_of(self.observer)

    def offset(self, tdb: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray]:
        event = observer_event(tdb, reference, self.observer)
        return event.offset(), event.offset_rate(1.0 + reference.time_ephemeris.rate(tdb))

    def up(self, tdb: Pair, reference: ReferenceData) -> FloatArray | None:
        if not isinstance(self.observer, Site):
            return None
        lon, lat = np.radians(self.observer.lon_deg), np.radians(self.observer.lat_deg)
        normal = np.array([np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat)])
        tt = exact.add_seconds(tdb, reference.time_ephemeris.tt_minus_tdb_s(tdb))
        return gcrs_from_itrs(normal, tt, reference)


@dataclass(frozen=True)
class SurfaceEnd(End):
    """A site on another body."""

    site: SurfaceSite

    @property
    def ground(self) -> int | None:
        return self.anchor

    def offset(self, tdb: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray]:
        r, v = self.site.offset(tdb)
        return contracted(r, reference.ephemeris.state(self.anchor, tdb)[1]), v

    def up(self, tdb: Pair, reference: ReferenceData) -> FloatArray | None:
        return self.site.up(tdb)


@dataclass(frozen=True)
class MovingEnd(End):
    """Anything with a barycentric state of its own; a trajectory about one centre keeps to that."""

    moving: Moving

    @property
    def span(self) -> tuple[float, float] | None:
        return _span_of(self.moving)

    def offset(self, tdb: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray]:
        if self.anchor != 0 and isinstance(self.moving, Trajectory):
            return self.moving.state_from_center(tdb, reference)
        position, velocity = self.moving.state_bcrs(tdb, reference)
        return np.asarray(position, dtype=np.float64), np.asarray(velocity, dtype=np.float64)


def as_end(participant: Any, role: str) -> End:
    """Bring a participant to its form; `role` is its argument's name, for messages."""
    if isinstance(participant, (str, int, np.integer)) and not isinstance(participant, bool):
        number = body_id(participant if isinstance(participant, str) else int(participant))
        return BodyEnd(body_name(number).split(" (")[0], number)
    if isinstance(participant, SurfaceSite):
        assert isinstance(participant.body, int)
        return SurfaceEnd(participant.name, participant.body, participant)
    if isinstance(participant, Site):
        return ObserverEnd(participant.name, _EARTH, participant)
    name = str(getattr(participant, "name", "") or type(participant).__name__)
    if isinstance(participant, Trajectory):
        if participant.geocentric:
            return ObserverEnd(name, _EARTH, participant)
        centres = {piece.center for piece in participant.pieces}
        return MovingEnd(name, centres.pop() if len(centres) == 1 else 0, participant)
    if isinstance(participant, Moving):
        return MovingEnd(name, 0, participant)
    if isinstance(participant, Observer):
        return ObserverEnd(name, _EARTH, participant)
    raise InvalidInput(
        f"{role} must be a Site, a SurfaceSite, a Trajectory or a body (name or NAIF number), "
        f"got {type(participant).__name__}"
    )


def _span_of(participant: Any) -> tuple[float, float] | None:
    span = getattr(participant, "span", None)
    return None if span is None else (float(span[0]), float(span[1]))


def absolute(end: End, tdb: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray, FloatArray, FloatArray]:
    """Anchor's barycentric position and velocity, and the end's offset and its rate."""
    shape = (*np.shape(tdb[0]), 3)
    if end.anchor == 0:
        place, speed = np.zeros(shape), np.zeros(shape)
    else:
        place, speed = reference.ephemeris.state(end.anchor, tdb)
    offset, rate = end.offset(tdb, reference)
    return place, speed, offset, rate


def elevation_rad(up: FloatArray, toward: FloatArray, velocity_m_s: FloatArray) -> FloatArray:
    """Elevation at which an end on the ground sees the other, in its own frame (first-order aberration), no refraction.

    Parameters
    ----------
    up : (..., 3) array
        Unit vector to the zenith.
    toward : (..., 3) array
        Unit vector from this end to the other along the light path, barycentric.
    velocity_m_s : (..., 3) array
        Barycentric velocity of this end. Its sign is the caller's: + for light that comes in, - for light that leaves.
    """
    seen = toward + velocity_m_s / C_M_S
    return np.asarray(np.arcsin(np.clip(dot(up, seen) / np.sqrt(dot(seen, seen)), -1.0, 1.0)))
