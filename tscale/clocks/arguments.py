"""The checks of what functions of clocks are given."""

from __future__ import annotations

from typing import Any, NamedTuple

from ..earth.gravity.field import GravityField
from ..earth.observer import Observer
from ..errors import InvalidInput, ScaleMismatch
from ..instants import Instants
from ..tables.clock_arguments import kind_words
from ..tables.reference import ReferenceData
from ..transforms.proper_models import is_near_earth, model_of
from ..transforms.proper_tides import Tides, checked_tides
from ..transforms.proper_time import checked_gravity
from .proper_clock import ProperClock

__all__ = ["Ticking", "as_ticking", "checked_dates", "checked_tables"]


class Ticking(NamedTuple):
    """Whatever was given as a clock: where it is and what its rate rests on."""

    name: str
    observer: Observer
    gravity: GravityField | None
    tides: Tides
    rate_offset: float

    @property
    def own_event(self) -> Observer | None:
        """The observer whose events TT and TCG date; None where these are the geocentre's at the same TDB."""
        return self.observer if model_of(self.observer, self.gravity, self.tides).dates_own_event else None


def as_ticking(clock: Any, gravity: GravityField | None, tides: Tides, what: str) -> Ticking:
    """A clock from a site, a trajectory or a `ProperClock`, which brings its own gravity and tides."""
    if isinstance(clock, ProperClock):
        return Ticking(
            clock.name,
            clock.observer,
            clock.gravity
            if clock.gravity is not None or not is_near_earth(clock.observer)
            else checked_gravity(gravity),
            clock.tides,
            clock.rate_offset,
        )
    if not isinstance(clock, Observer):
        raise InvalidInput(f"{what} is a Site, a Trajectory, a SurfaceSite or a ProperClock, got {kind_words(clock)}")
    # A field for both clocks is that of the one near the Earth.
    field = checked_gravity(gravity) if is_near_earth(clock) else None
    return Ticking(clock.name, clock, field, checked_tides(tides), 0.0)


def checked_tables(reference: Any) -> ReferenceData:
    """The tables in use."""
    if reference is None:
        return ReferenceData.default()
    if not isinstance(reference, ReferenceData):
        raise InvalidInput(
            f"reference= takes a ReferenceData, got {kind_words(reference)}; make one with ReferenceData.load()"
        )
    return reference


def checked_dates(t: Any, what: str) -> Instants:
    """Instants at the clock or without a place."""
    if not isinstance(t, Instants):
        raise InvalidInput(f"{what} is Instants, got {kind_words(t)}; make them with Instants.from_iso")
    if t.place not in (None, "TOPOCENTER"):
        raise ScaleMismatch(f"{what} dates events at the clock, got {t.place}; leave the place out or state TOPOCENTER")
    return t
