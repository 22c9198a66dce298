"""The two ends of a link: sites, spacecraft, bodies and surface sites, brought to one form.

Each end is an *anchor* (a body of the ephemeris) and an *offset* from it. The light path between two ends that
share an anchor, or whose anchors share a centre, is then formed from short vectors: 1e-16 of the distance
between the ends is lost to rounding, where the difference of two barycentric positions loses 0.1 ps.
"""

from __future__ import annotations

from abc import ABC, abstractmethod
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Final, NamedTuple, Protocol, TypeAlias, runtime_checkable

import numpy as np

from .. import exact
from ..body_shape import FIGURES, Figure, own_body
from ..constants import WGS84_A_M, WGS84_INVERSE_FLATTENING
from ..earth.moving import observer_event
from ..earth.observer import Observer
from ..earth.rotation import orientation
from ..earth.site import Site
from ..ephemeris.bodies import body_id, body_name
from ..errors import InvalidInput
from ..exact import FloatArray, Pair
from ..surface import SurfaceSite, contracted
from ..trajectory import Trajectory

if TYPE_CHECKING:
    from ..tables.reference import ReferenceData

__all__ = ["End", "Moving", "Participant", "Stand", "absolute", "as_end"]

_EARTH: Final = 399
_EARTH_FIGURE: Final = Figure(WGS84_A_M, float(WGS84_A_M * (1.0 - 1.0 / WGS84_INVERSE_FLATTENING)))
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


class Stand(NamedTuple):
    """How an end stands on its body, on the ICRF axes."""

    up: FloatArray
    """Unit vector to the zenith, (..., 3)."""
    pole: FloatArray
    """Unit vector along the body's axis, (..., 3)."""
    figure: Figure
    """The body's ellipsoid."""


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

    def stand(self, tdb: Pair, reference: ReferenceData) -> Stand | None:
        """How an end on the ground stands on its body; else None."""
        return None

    @property
    def uses_earth_orientation(self) -> bool:
        """Whether the place of this end turns with the Earth."""
        return False


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

    def stand(self, tdb: Pair, reference: ReferenceData) -> Stand | None:
        if not isinstance(self.observer, Site):
            return None
        lon, lat = np.radians(self.observer.lon_deg), np.radians(self.observer.lat_deg)
        normal = np.array([np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat)])
        tt = exact.add_seconds(tdb, reference.time_ephemeris.tt_minus_tdb_s(tdb))
        axes = orientation(tt, reference)
        return Stand(axes.celestial(normal), axes.celestial(np.array([0.0, 0.0, 1.0])), _EARTH_FIGURE)

    @property
    def uses_earth_orientation(self) -> bool:
        # One that does not say is taken to be on the ground, as in chains.
        return bool(getattr(self.observer, "uses_earth_orientation", True))


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

    def stand(self, tdb: Pair, reference: ReferenceData) -> Stand | None:
        return Stand(self.site.up(tdb), self.site.pole(tdb), FIGURES[own_body(self.anchor)])


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
        state = self.moving.state_bcrs(tdb, reference)
        return state if isinstance(self.moving, Trajectory) else _checked_state(state, self.name, np.shape(tdb[0]))

    @property
    def uses_earth_orientation(self) -> bool:
        return bool(getattr(self.moving, "uses_earth_orientation", False))


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


def _checked_state(state: Any, name: str, shape: tuple[int, ...]) -> tuple[FloatArray, FloatArray]:
    """What a `state_bcrs` that is not ours gave back, as two vectors for each date."""
    whole = (*shape, 3)
    try:
        position, velocity = (np.broadcast_to(np.asarray(part, dtype=np.float64), whole) for part in state)
    except (TypeError, ValueError) as error:
        raise InvalidInput(
            f"state_bcrs of {name} must give back two float arrays of shape {whole}, position (m) and velocity (m/s): "
            f"{error}"
        ) from error
    bad = ~(np.isfinite(position) & np.isfinite(velocity)).all(axis=-1)
    if np.any(bad):
        raise InvalidInput(
            f"state_bcrs of {name} gave no finite position (m) and velocity (m/s) at {int(bad.sum())} of {bad.size} "
            "dates; it must raise OutOfSpan where it knows none",
            mask=np.asarray(bad),
        )
    return position, velocity


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
