"""What the rate of a clock is made of, wherever it is: on or about the Earth, on another body, or elsewhere.

Each model gives d(tau)/d(TCG) - 1 in named parts that add up to it, by TT counts. Which TT and TCG go with an event of
the clock:

* up to 1e10 m from the Earth (and so on and about the Moon) those of the event itself, as the geocentric system dates
  it;
* beyond, where that does not reach, those of the geocentre at the same TDB. A trajectory counts as beyond that leaves
  the 1e10 m anywhere in its span.
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Any, Final, Protocol, TypeAlias

import numpy as np

from .. import exact
from ..constants import L_B, L_G
from ..earth.frames import dot
from ..earth.gravity.field import GravityField
from ..earth.observer import Observer
from ..errors import InvalidInput, MissingPiece, OutOfSpan
from ..exact import FloatArray, Pair
from ..surface import SurfaceSite
from ..tables.reference import ReferenceData
from .barycentric import GEOCENTRIC_LIMIT_M, tdb_from_tt
from .proper_bcrs import barycentric_terms, earth_figure
from .proper_scales import tdb_per_tt
from .proper_tides import Tides
from .proper_time import TERMS, rate_terms, uses_orientation
from .surface_clock import SurfaceRateTerms, default_simultaneity, surface_rate_terms

__all__ = ["NearEarth", "OnBody", "RateModel", "Terms", "ThroughSpace", "is_near_earth", "model_of", "total_of"]

Terms: TypeAlias = dict[str, FloatArray]

_TCB_GAIN: Final = float(L_B / (1 - L_B))
_EARTH: Final = 399
_MOON: Final = 301
_LOOKS: Final = 33


class RateModel(Protocol):
    """The rate of one clock."""

    @property
    def observer(self) -> Observer:
        """Where the clock is."""
        ...

    @property
    def dates_own_event(self) -> bool:
        """Whether TT and TCG are those of the clock's own event; else those of the geocentre at the same TDB."""
        ...

    @property
    def needs_orientation(self) -> bool:
        """Whether the rate rests on Earth orientation."""
        ...

    @property
    def needs_ephemeris(self) -> bool:
        """Whether the rate rests on the ephemeris."""
        ...

    @property
    def names(self) -> tuple[str, ...]:
        """Names of the terms."""
        ...

    def terms(self, tt: Pair, reference: ReferenceData) -> Terms:
        """Parts of d(tau)/d(TCG) - 1."""
        ...


@dataclass(frozen=True, eq=False)
class NearEarth:
    """A clock on the Earth or up to 1e10 m from it; see `proper_time`."""

    observer: Observer
    gravity: GravityField | None
    tides: Tides
    dates_own_event: bool = True
    names: tuple[str, ...] = TERMS

    @property
    def needs_orientation(self) -> bool:
        """Whether the observer or the field turns with the Earth."""
        return uses_orientation(self.observer, self.gravity)

    @property
    def needs_ephemeris(self) -> bool:
        """For tides."""
        return bool(self.tides)

    def terms(self, tt: Pair, reference: ReferenceData) -> Terms:
        """See `rate_terms`."""
        return rate_terms(self.observer, tt, reference, gravity=self.gravity, tides=self.tides).named()


@dataclass(frozen=True, eq=False)
class OnBody:
    """A clock on the surface of another body; see `surface_clock`."""

    observer: SurfaceSite
    needs_orientation: bool = False
    needs_ephemeris: bool = True
    names: tuple[str, ...] = tuple(name.replace("_", " ") for name in SurfaceRateTerms._fields)

    @property
    def dates_own_event(self) -> bool:
        """On the Moon."""
        assert isinstance(self.observer.body, int)
        return default_simultaneity(self.observer.body) == "TT"

    def terms(self, tt: Pair, reference: ReferenceData) -> Terms:
        """See `surface_rate_terms`."""
        own = self.observer if self.dates_own_event else None
        tdb = tdb_from_tt(tt, reference, own)
        return dict(zip(self.names, surface_rate_terms(self.observer, tdb, reference, "TCG"), strict=True))


@dataclass(frozen=True, eq=False)
class ThroughSpace:
    """A clock on a path about another centre than the Earth; see `proper_bcrs`."""

    observer: Any
    tides: Tides = True
    needs_orientation: bool = False
    needs_ephemeris: bool = True
    names: tuple[str, ...] = (
        "kinematic",
        "gravitational",
        "second order",
        "figure of the Earth",
        "TCG against TCB",
    )

    @cached_property
    def dates_own_event(self) -> bool:
        """Where the whole of the path is within 1e10 m of the Earth."""
        pieces = getattr(self.observer, "pieces", ())
        return bool(pieces) and all(_within_reach(piece) for piece in pieces)

    def terms(self, tt: Pair, reference: ReferenceData) -> Terms:
        """Parts of d(tau)/d(TCB) - 1, and what TCG (of the event, or at the geocentre) makes of it."""
        own = self.observer if self.dates_own_event else None
        tdb = tdb_from_tt(tt, reference, own)
        x_m, v_m_s = self.observer.state_bcrs(tdb, reference)
        parts = barycentric_terms(x_m, v_m_s, tdb, reference.ephemeris)
        figure = earth_figure(x_m, tdb, reference, bulges=bool(self.tides))
        y = parts.total + figure
        # d(TCB)/d(TDB), d(TDB)/d(TT), d(TT)/d(TCG), each less one.
        whole = y
        for slow in (_TCB_GAIN, tdb_per_tt(own, tt, reference), -float(L_G)):
            whole = whole + slow + whole * slow
        return dict(zip(self.names, (*parts, figure, np.asarray(whole - y)), strict=True))


def _within_reach(piece: Any) -> bool:
    """Whether a piece of a trajectory keeps within 1e10 m of the Earth.

    An orbit about the Earth or the Moon does; of another one states all along its span tell. The shipped ephemeris
    serves: the bodies of others are within kilometres.
    """
    if piece.center in (_EARTH, _MOON):
        return True
    if piece.first is None or piece.last is None:
        return False
    length_s = float(exact.seconds(exact.subtract(piece.last, piece.first)))
    one = (np.reshape(piece.first[0], 1), np.reshape(piece.first[1], 1))
    count = exact.add_seconds(one, np.linspace(0.0, length_s, _LOOKS))
    r_m, _ = piece.motion.state(count)
    try:
        r_m = r_m + ReferenceData.default().ephemeris.position(piece.center, count, _EARTH)
    except (OutOfSpan, MissingPiece):
        return False
    return bool(np.all(dot(r_m, r_m) <= GEOCENTRIC_LIMIT_M**2))


def is_near_earth(observer: Observer) -> bool:
    """Whether TT and TCG date the events of the observer, and the Earth's field is what it is in."""
    if isinstance(observer, SurfaceSite):
        return False
    pieces = getattr(observer, "pieces", ())
    if getattr(observer, "geocentric", True):
        return True
    return bool(pieces) and all(piece.center == _EARTH for piece in pieces)


def model_of(observer: Observer, gravity: GravityField | None, tides: Tides) -> RateModel:
    """The model for an observer: by its kind, and for a trajectory by what it is about.

    A trajectory about another centre than the Earth is one through space, wherever it goes, with the Earth's figure
    beside the point masses.
    """
    if not is_near_earth(observer):
        if gravity is not None:
            raise InvalidInput(
                f"gravity= is the Earth's field, and the clock at {observer.name} is not in it: leave it out"
            )
        return OnBody(observer) if isinstance(observer, SurfaceSite) else ThroughSpace(observer, tides)
    return NearEarth(observer, gravity, tides)


def total_of(terms: Terms) -> FloatArray:
    """Sum of the terms, the small ones first."""
    ordered = sorted(terms.values(), key=lambda term: float(np.max(np.abs(term), initial=0.0)))
    total = np.zeros(np.shape(ordered[0]))
    for term in ordered:
        total = total + term
    return np.asarray(total)
