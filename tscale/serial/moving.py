"""Places and motions as fields of a document: sites, sources, bodies, trajectories, free clocks, gravity fields."""

from __future__ import annotations

from pathlib import Path
from typing import Any, Final, TypeVar

import numpy as np

from ..clocks.proper_clock import ProperClock
from ..earth.gravity.field import ZonalField
from ..earth.gravity.harmonic import HarmonicField
from ..earth.site import Site
from ..errors import DataFileError, InvalidInput
from ..source import Source
from ..surface import BodyCentre, SurfaceSite
from ..trajectory import Trajectory
from ..trajectory.flight import FlightLegs
from ..trajectory.kepler import KeplerOrbit
from ..trajectory.knots import Knots
from ..trajectory.pieces import Piece, SegmentMotion
from .dated import checked_pair
from .kind import Context, Fields, Kind, of_class
from .values import damaged

__all__ = ["MOVING"]

_Held = TypeVar("_Held")
_TRAJECTORY: Final = ("name", "scale", "geocentric", "pieces")
_SPK: Final = ("path", "sha256", "target")
# Arrays by name: in the object, and their shapes (n dates; c coefficients of a polynomial, 3 or 6 components).
_KNOTS: Final = {"nodes_s": "_nodes", "coefficients": "_coefficients"}
_LEGS: Final = {
    "arc_rad": "arc_rad",
    "length_s": "length_s",
    "turn_rad_s": "_turn_rad_s",
    "climb_m_s": "_climb_m_s",
    "start": "_start",
    "ahead": "_ahead",
    "height_m": "_height_m",
}


class _Segments:
    """The pieces of a trajectory from an SPK kernel: the kernel's path and hash, and the body's number."""

    def __init__(self, path: Path, sha256: str, target: int) -> None:
        self.path, self.sha256, self.target = path, sha256, target


def _take_trajectory(orbit: Trajectory) -> Fields:
    fields = {name: getattr(orbit, name) for name in _TRAJECTORY}
    motions = [piece.motion for piece in orbit.pieces]
    first = motions[0] if motions else None
    if isinstance(first, SegmentMotion):
        kernel = first._kernel
        fields["pieces"] = _Segments(kernel.path, kernel.sha256, first._segment.target)
    return fields


def _make_trajectory(fields: Fields, context: Context) -> Trajectory:
    pieces = fields["pieces"]
    if fields["scale"] not in ("TT", "TDB") or not isinstance(fields["geocentric"], bool):
        raise damaged("a Trajectory is dated in TT or TDB, and geocentric or not")
    if not isinstance(fields["name"], str) or not isinstance(fields.get("path"), Path | None):
        raise damaged("a Trajectory has a name, and a path or none")
    if isinstance(pieces, _Segments):
        from ..ephemeris.daf import file_sha256

        path = _found(pieces.path, context)
        if file_sha256(path) != pieces.sha256:
            raise DataFileError(
                f"{path} is not the kernel that the trajectory {fields['name']!r} was taken from: its SHA-256 is not "
                f"{pieces.sha256}. Give the folder of that kernel with folder=",
                path=path,
            )
        return Trajectory.from_spk(path, pieces.target)
    if not isinstance(pieces, tuple) or not pieces or not all(isinstance(piece, Piece) for piece in pieces):
        raise damaged("a Trajectory is made of pieces")
    return Trajectory(**{**fields, "path": None})  # where its file lay on another machine is nothing of an orbit


def _found(path: Path, context: Context) -> Path:
    """A file where it was, or of the same name in the folder that the reader names."""
    places = [] if context.folder is None else [Path(context.folder) / path.name]
    for place in [*places, path]:
        if place.is_file():
            return place
    raise DataFileError(
        f"the kernel {path} is not there: bring it back, or give the folder in which it is now with folder=", path=path
    )


def _make_piece(fields: Fields, context: Context) -> Piece:
    for name in ("first", "last"):
        if fields[name] is not None:
            fields[name] = checked_pair(fields[name], (), f"the {name} date of a piece")
    if (
        type(fields["center"]) is not int
        or fields["axes"] not in ("ICRF", "ITRS")
        or not hasattr(fields["motion"], "state")
    ):
        raise damaged("a piece is a motion about a body by its number, on axes ICRF or ITRS")
    return Piece(**fields)


def _take_knots(knots: Knots) -> Fields:
    return {
        "name": knots.name,
        "method": knots.method,
        "degree": knots.degree,
        "dates": (knots._whole, knots._fraction),
        **{name: getattr(knots, held) for name, held in _KNOTS.items()},
    }


def _make_knots(fields: Fields, context: Context) -> Knots:
    dates = _dates(fields["dates"])
    nodes, coefficients = fields["nodes_s"], fields["coefficients"]
    spans = dates[0].size - 1
    for array, ndim in ((nodes, 2), (coefficients, 3)):
        if not isinstance(array, np.ndarray) or array.ndim != ndim or array.dtype != np.float64:
            raise damaged("nodes and coefficients of a path are arrays of float64")
    width = 3 if fields["method"] == "hermite" else 6
    if nodes.shape[1] != spans or coefficients.shape != (nodes.shape[0], width, spans) or not nodes.shape[0]:
        raise damaged(f"nodes {nodes.shape} and coefficients {coefficients.shape} for {spans + 1} dates")
    if fields["method"] not in ("hermite", "lagrange") or type(fields["degree"]) is not int:
        raise damaged("a path is interpolated by hermite or lagrange polynomials of some degree")
    held = {"_whole": dates[0], "_fraction": dates[1], "_nodes": nodes, "_coefficients": coefficients}
    return _remade(Knots.__new__(Knots), {name: fields[name] for name in ("name", "method", "degree")} | held)


def _take_legs(legs: FlightLegs) -> Fields:
    return {
        "dates": (legs._whole, legs._fraction),
        **{name: getattr(legs, held) for name, held in _LEGS.items()},
    }


def _make_legs(fields: Fields, context: Context) -> FlightLegs:
    dates = _dates(fields.pop("dates"))
    count = dates[0].size
    for name, array in fields.items():
        shape: tuple[int, ...] = (count,) if name == "height_m" else (count - 1,)
        shape += (3,) if name in ("start", "ahead") else ()
        if not isinstance(array, np.ndarray) or array.dtype != np.float64 or array.shape != shape:
            raise damaged(f"{name} of a flight of {count} way points is an array of float64 of shape {shape}")
    held = {_LEGS[name]: array for name, array in fields.items()}
    return _remade(FlightLegs.__new__(FlightLegs), {"_whole": dates[0], "_fraction": dates[1], **held})


def _dates(pair: Any) -> tuple[Any, Any]:
    whole, fraction = checked_pair(pair, None, "the dates of a path")
    if whole.ndim != 1 or whole.size < 2:
        raise damaged("a path has two or more dates in a row")
    return whole, fraction


def _remade(made: _Held, held: dict[str, Any]) -> _Held:
    """Put into an empty object what it held: its own making would round once more."""
    for name, value in held.items():
        if isinstance(value, np.ndarray):
            value.flags.writeable = False
        setattr(made, name, value)
    return made


def _make_kepler(fields: Fields, context: Context) -> KeplerOrbit:
    epoch = checked_pair(fields.pop("epoch"), (), "the epoch of an orbit")
    if not all(isinstance(value, int | float) and not isinstance(value, bool) for value in fields.values()):
        raise damaged("elements of an orbit are numbers")
    return KeplerOrbit(epoch, **fields)


def _make_body(fields: Fields, context: Context) -> BodyCentre:
    if type(fields["body"]) is not int:
        raise InvalidInput("a body is known by its number")
    return BodyCentre(**fields)


_PLAIN: Final = of_class(KeplerOrbit)
_PIECE: Final = of_class(Piece)
_BODY: Final = of_class(BodyCentre)

MOVING: Final = (
    *(of_class(cls) for cls in (Site, SurfaceSite, Source, ProperClock, ZonalField, HarmonicField)),
    Kind("BodyCentre", BodyCentre, _BODY.take, _make_body, _BODY.needed),
    Kind("Trajectory", Trajectory, _take_trajectory, _make_trajectory, _TRAJECTORY, ("path",)),
    Kind(
        "KernelSegments",
        _Segments,
        lambda held: {name: getattr(held, name) for name in _SPK},
        lambda fields, context: _Segments(**fields),
        _SPK,
    ),
    Kind("Piece", Piece, _PIECE.take, _make_piece, _PIECE.needed),
    Kind("Knots", Knots, _take_knots, _make_knots, ("name", "method", "degree", "dates", *_KNOTS)),
    Kind("FlightLegs", FlightLegs, _take_legs, _make_legs, ("dates", *_LEGS)),
    Kind("KeplerOrbit", KeplerOrbit, _PLAIN.take, _make_kepler, _PLAIN.needed),
)
