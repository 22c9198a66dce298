"""The edge between a clock's own proper time and geocentric coordinate time."""

from __future__ import annotations

from functools import cached_property
from typing import Final

import numpy as np

from .. import exact
from ..budget.assumptions import Assumptions
from ..budget.contribution import Contribution, Omission
from ..clocks.proper_clock import ProperClock
from ..constants import C_M_S, L_G
from ..counts import tai_from_tt, tcg_from_tt, tt_from_tcg
from ..earth.site import Site
from ..exact import FloatArray, Pair
from ..instants import Instants
from ..scales import Node, Scale
from ..step import Step, Terms
from ..surface import SurfaceSite
from ..tables.notes import orientation_notes
from ..tables.reference import ReferenceData
from ..transforms.barycentric import tdb_from_tt, tt_from_tdb
from ..transforms.proper_integral import SET_RATE, ProperIntegral
from ..transforms.proper_scales import tdb_per_tt
from ..transforms.proper_tides import UNKNOWN_TIDE_SYSTEM
from ..transforms.proper_time import geopotential_number_of
from .common import count_difference

__all__ = ["proper_step"]

_TCG_GAIN: Final = float(L_G / (1 - L_G))
_LARGEST: Final = "gravitational"


class _Running:
    """A clock's integral and what it showed at the coincidence, made when first needed; two threads make the same."""

    def __init__(self, clock: ProperClock, reference: ReferenceData) -> None:
        self.clock = clock
        self.reference = reference

    @cached_property
    def integral(self) -> ProperIntegral:
        return ProperIntegral(
            self.clock.observer,
            self.clock.coincidence_tt(self.reference),
            self.reference,
            gravity=self.clock.gravity,
            tides=self.clock.tides,
            rate_offset=self.clock.rate_offset,
        )

    @cached_property
    def set_to(self) -> Pair:
        """Reading less TT at the coincidence."""
        anchor = self.integral.anchor
        return exact.subtract(self.shown, anchor)

    @cached_property
    def shown(self) -> Pair:
        """Reading at the coincidence."""
        return self.clock.reading_at(self.integral.anchor, self.reference)

    def reading(self, tt: Pair) -> Pair:
        return self.integral.reading(tt, self.set_to)

    def tt(self, reading: Pair) -> Pair:
        return self.integral.tt_of_elapsed(exact.subtract(reading, self.shown))


def proper_step(place: str, clock: ProperClock, reference: ReferenceData) -> Step:
    """A clock's own reading to TCG, of events at the clock; to TDB for a clock that TCG does not reach."""
    running = _Running(clock, reference)
    observer, near = clock.observer, clock.dates_own_event
    own, end = Scale.parse(clock.scale), Scale.parse("TCG" if near else "TDB")

    def to_end(tt: Pair) -> Pair:
        return tcg_from_tt(tt) if near else tdb_from_tt(tt, reference)

    def tt_of(count: Pair) -> Pair:
        return tt_from_tcg(count) if near else tt_from_tdb(count, reference)

    def terms(before: Instants, after: Instants) -> Terms:
        tt, anchor = tt_of(after.pair), running.integral.anchor
        set_to = exact.subtract(to_end(anchor), running.shown)
        found = {name: exact.from_seconds(-value) for name, value in running.integral.terms_s(tt).items()}
        if SET_RATE in found:
            found[SET_RATE] = exact.negate(running.integral.set_part(tt))
        if not near:
            of_end, of_tcg = (
                exact.subtract(after.pair, to_end(anchor)),
                exact.subtract(tcg_from_tt(tt), tcg_from_tt(anchor)),
            )
            found["TDB against TCG at the geocentre"] = exact.subtract(of_end, of_tcg)
        # The largest term takes the roundings, so that all add up to the difference of the labels.
        rest = exact.subtract(count_difference(before, after), set_to)
        largest = _LARGEST if _LARGEST in found else next(iter(found))
        for name, value in found.items():
            if name != largest:
                rest = exact.subtract(rest, value)
        found[largest] = rest
        shape = np.shape(rest[1])
        return {
            "set at the coincidence": (np.broadcast_to(set_to[0], shape), np.broadcast_to(set_to[1], shape)),
            **found,
        }

    def rate(before: Instants, after: Instants) -> FloatArray:
        tt = tt_of(after.pair)
        own_rate = running.integral.rate(tt)
        end_rate = _TCG_GAIN if near else tdb_per_tt(None, tt, reference)
        return np.asarray((end_rate - own_rate) / (1.0 + own_rate))

    def contributions(before: Instants, assumptions: Assumptions) -> list[Contribution]:
        sigma = clock.geopotential_sigma_m2_s2
        if not sigma:
            return []
        elapsed_s = exact.seconds(exact.subtract(before.pair, running.shown))
        quantity = f"geopotential at {observer.name}"
        # In a deeper potential the clock runs slower, and more of TCG has gone by.
        return [Contribution(quantity, quantity, "m2/s2", elapsed_s / C_M_S**2, np.full(before.shape, sigma))]

    def omissions(assumptions: Assumptions) -> tuple[Omission, ...]:
        if clock.geopotential_sigma_m2_s2:
            return ()
        reason = "not stated: give the clock geopotential_sigma_m2_s2 (1 m2/s2 is 1.1e-17 in rate)"
        return (Omission(f"geopotential at {observer.name}", reason),)

    def notes(before: Instants) -> tuple[str, ...]:
        found: tuple[str, ...] = (_potential_words(clock),)
        if clock.tides and getattr(clock.gravity, "tide_system", None) == "unknown":
            found += (UNKNOWN_TIDE_SYSTEM,)
        levelled = geopotential_number_of(observer) is not None
        if levelled or not running.integral.model.needs_orientation:
            return found
        return (*found, *orientation_notes(tai_from_tt(running.tt(before.pair)), reference))

    return Step(
        start=Node(own, place),
        end=Node(end, place),
        title=f"proper time of {observer.name}",
        source="IAU 2000 Resolution B1.3",
        forward=lambda t: Instants._of(to_end(running.tt(t.pair)), end, place),
        backward=lambda t: Instants._of(running.reading(tt_of(t.pair)), own, place),
        terms=terms,
        rate=rate,
        contributions=contributions,
        omissions=omissions,
        notes=notes,
    )


def _potential_words(clock: ProperClock) -> str:
    """Where the potential comes from."""
    observer = clock.observer
    if isinstance(observer, Site):
        if observer.geopotential_number_m2_s2 is not None:
            where = "its geopotential number"
        elif observer.height_above_geoid_m is not None:
            where = "its height above the geoid with normal gravity"
        else:
            where = str(getattr(clock.gravity, "name", "the field given"))
    elif isinstance(observer, SurfaceSite):
        where = "the body's reference surface" if observer.potential_m2_s2 is None else "the site"
    elif not getattr(observer, "geocentric", True):
        where = "the Sun, the planets, the Earth and the Moon as point masses"
    else:
        where = "Earth J2..J6" if clock.gravity is None else clock.gravity.name
    return f"potential at {observer.name} from {where}"
