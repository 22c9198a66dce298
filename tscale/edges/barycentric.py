"""Edges to barycentric coordinate time, and the wavefront that carries a signal to the barycentre."""

from __future__ import annotations

from typing import Final

import numpy as np

from .. import exact
from ..budget.assumptions import Assumptions
from ..budget.contribution import Contribution, Omission
from ..budget.correlation import Exponential
from ..budget.directions import EARTH_DELAY_S, sun_left_out, wavefront_contributions, wavefront_omissions
from ..budget.places import left_out, place_contributions, place_omissions, turns_with_earth
from ..constants import C_M_S, JULIAN_YEAR_S, L_B, L_G
from ..counts import tai_from_tt
from ..earth.moving import observer_event
from ..earth.observer import Observer
from ..exact import FloatArray, Pair
from ..instants import Instants
from ..scales import Node, Scale
from ..source import Source
from ..step import Step, Terms
from ..tables.notes import orientation_notes
from ..tables.reference import ReferenceData
from ..transforms import barycentric, geocentric, wavefront
from ..transforms.proper_scales import tdb_per_tt
from .common import count_difference

__all__ = ["tcb_tdb_step", "tcg_tcb_step", "tt_barycentric_step", "tt_wavefront_step", "wavefront_step"]


_TCB_GAIN: Final = float(L_B / (1 - L_B))
_TCB_GAIN_ON_TCG: Final = float((L_B - L_G) / (1 - L_B))
"""dTCB/dTCG - 1 where TDB and TT run alike."""

_NAMED: Final = {"sun": "the Sun", "moon": "the Moon", "earth": "the Earth"}

_MEAN_RATE: Final = Omission(
    "mean rate of the time ephemeris",
    "shared by all who use one ephemeris: 2e-17, 0.6 ns a year from 1977 (IERS Conventions 2010, Table 1.1)",
)


def tcb_tdb_step(place: str | None) -> Step:
    """TCB to TDB."""
    return Step(
        start=Node(Scale.parse("TCB"), place),
        end=Node(Scale.parse("TDB"), place),
        title="rate L_B and TDB0",
        source="IAU 2006 Resolution B3",
        forward=barycentric.tcb_to_tdb,
        backward=barycentric.tdb_to_tcb,
        terms=lambda before, after: {"TDB - TCB": count_difference(before, after)},
        rate=lambda before, after: np.full(before.shape, -float(L_B)),
    )


def tcg_tcb_step(place: str, observer: Observer | None, reference: ReferenceData) -> Step:
    """TCG to TCB of one event: the integral at the geocentre, and at an observer the topocentric terms."""

    def terms(before: Instants, after: Instants) -> Terms:
        total = count_difference(before, after)
        if observer is None:
            return {"Einstein integral at the geocentre": total}
        tdb = barycentric.tdb_from_tcb(after.pair)
        r_m, _ = observer.gcrs(geocentric.tt_from_tcg(before.pair), reference)
        parts = barycentric.topocentric_terms(reference.ephemeris, tdb, r_m)
        return {
            "Einstein integral at the geocentre": exact.add_seconds(total, -parts.total_s),
            "topocentric v.r/c^2": exact.from_seconds(parts.first_s),
            "topocentric, order c^-4": exact.from_seconds(parts.second_s),
        }

    def rate(before: Instants, after: Instants) -> FloatArray:
        of_tdb = tdb_per_tt(observer, geocentric.tt_from_tcg(before.pair), reference)
        return np.asarray(of_tdb + _TCB_GAIN_ON_TCG + of_tdb * _TCB_GAIN_ON_TCG)

    def contributions(before: Instants, assumptions: Assumptions) -> list[Contribution]:
        tt = geocentric.tt_from_tcg(before.pair)
        found = _time_ephemeris(tt, reference, assumptions)
        if observer is not None:
            near = exact.add_seconds(tt, -reference.time_ephemeris.tt_minus_tdb_s(tt))
            _, velocity = reference.ephemeris.state("earth", near)
            r_m, _ = observer.gcrs(tt, reference)
            found += place_contributions(observer, tt, r_m, velocity / C_M_S**2, reference, assumptions)
        return found

    def omissions(assumptions: Assumptions) -> list[Omission]:
        return [_MEAN_RATE] if observer is None else [_MEAN_RATE, *place_omissions(observer, assumptions)]

    def notes(before: Instants) -> tuple[str, ...]:
        if observer is None or not turns_with_earth(observer):
            return ()
        return orientation_notes(tai_from_tt(geocentric.tt_from_tcg(before.pair)), reference)

    return Step(
        start=Node(Scale.parse("TCG"), place),
        end=Node(Scale.parse("TCB"), place),
        title="time ephemeris" if observer is None else f"time ephemeris and place of {observer.name}",
        source="IAU 2000 Resolution B1.5",
        forward=lambda t: barycentric.tcg_to_tcb(t, reference, observer),
        backward=lambda t: barycentric.tcb_to_tcg(t, reference, observer),
        terms=terms,
        rate=rate,
        contributions=contributions,
        omissions=omissions,
        notes=notes,
    )


def tt_barycentric_step(end: str, place: str, observer: Observer | None, reference: ReferenceData) -> Step:
    """TT to TDB or TCB of one event in one go, for speed and fewer roundings than by way of TCG."""

    def forward(t: Instants) -> Instants:
        tdb = barycentric.tt_to_tdb(t, reference, observer)
        return tdb if end == "TDB" else barycentric.tdb_to_tcb(tdb)

    def backward(t: Instants) -> Instants:
        return barycentric.tdb_to_tt(t if end == "TDB" else barycentric.tcb_to_tdb(t), reference, observer)

    def rate(before: Instants, after: Instants) -> FloatArray:
        of_tdb = tdb_per_tt(observer, before.pair, reference)
        return np.asarray(of_tdb if end == "TDB" else of_tdb + _TCB_GAIN + of_tdb * _TCB_GAIN)

    return Step(
        start=Node(Scale.parse("TT"), place),
        end=Node(Scale.parse(end), place),
        title="time ephemeris",
        source="IAU 2000 Resolution B1.5, IAU 2006 Resolution B3",
        forward=forward,
        backward=backward,
        terms=lambda before, after: {f"{end} - TT": count_difference(before, after)},
        rate=rate,
    )


def wavefront_step(
    place: str, observer: Observer | None, source: Source, reference: ReferenceData, second_order: bool
) -> Step:
    """TDB where a wavefront meets the observer (or the geocentre) to TDB at the barycentre."""

    def parts(before: Instants) -> wavefront.WavefrontTerms:
        return wavefront.wavefront_terms(before.pair, reference, source, observer, second_order=second_order)

    earthly = observer is None or getattr(observer, "geocentric", True)

    def contributions(before: Instants, assumptions: Assumptions) -> list[Contribution]:
        tdb, found = before.pair, []
        toward = source.direction(tdb)
        if observer is not None and earthly:
            event = observer_event(tdb, reference, observer)
            x_m, sun_m, sun_v_m_s = event.bcrs_position(), event.bodies.sun_m, event.bodies.sun_v_m_s
            found += place_contributions(observer, event.tt, event.r_gcrs_m, toward / C_M_S, reference, assumptions)
        else:
            x_m, _, sun_m, sun_v_m_s = wavefront.observer_state(tdb, reference, observer, with_velocity=False)
            if observer is not None:
                found += place_contributions(observer, tdb, x_m, toward / C_M_S, reference, assumptions)
        found += wavefront_contributions(tdb, x_m, source, assumptions, earthly=earthly)
        if assumptions.truncation and not second_order:
            found.append(sun_left_out(x_m, sun_m, sun_v_m_s, toward, reference))
        if assumptions.truncation and observer is not None and earthly:
            name = "gravitational delay of the Earth, left out"
            found.append(left_out(name, name, "s", np.ones(before.shape), EARTH_DELAY_S))
        return found

    def omissions(assumptions: Assumptions) -> list[Omission]:
        found = [] if observer is None else place_omissions(observer, assumptions)
        return [*found, *wavefront_omissions(source, assumptions, earthly=earthly)]

    def notes(before: Instants) -> tuple[str, ...]:
        found: tuple[str, ...] = ()
        if observer is not None and turns_with_earth(observer):
            found = orientation_notes(tai_from_tt(barycentric.tt_from_tdb(before.pair, reference, observer)), reference)
        hidden = wavefront.hidden_by(before.pair, reference, source, observer)
        counts = {_NAMED.get(body, body): int(np.count_nonzero(mask)) for body, mask in hidden.items()}
        found += tuple(f"{n} of {before.size} lines of sight pass through {body}" for body, n in counts.items() if n)
        return found

    tdb = Scale.parse("TDB")
    return Step(
        start=Node(tdb, place),
        end=Node(tdb, "BARYCENTER"),
        title=f"wavefront from {source.name or 'the source'}",
        source="Roemer, curvature; IERS Conventions (2010) eq. 11.17, 11.19",
        forward=lambda t: wavefront.observer_to_barycenter(t, reference, source, observer, second_order=second_order),
        backward=lambda t: wavefront.barycenter_to_observer(t, reference, source, observer, second_order=second_order),
        terms=lambda before, after: parts(before).exact(),
        rate=lambda before, after: parts(before).rate,
        contributions=contributions,
        omissions=omissions,
        notes=notes,
    )


def tt_wavefront_step(observer: Observer, source: Source, reference: ReferenceData, second_order: bool) -> Step:
    """TT at an observer near the Earth to TDB at the barycentre in one go, for speed: the place is looked up once."""
    dating = tt_barycentric_step("TDB", "TOPOCENTER", observer, reference)
    carrying = wavefront_step("TOPOCENTER", observer, source, reference, second_order)

    def rate(before: Instants, after: Instants) -> FloatArray:
        between = dating.forward(before)
        one, two = dating.rate(before, between), carrying.rate(between, after)
        return np.asarray(one + two + one * two)

    return Step(
        start=dating.start,
        end=carrying.end,
        title=carrying.title,
        source=f"{dating.source}; {carrying.source}",
        forward=lambda t: wavefront.observer_tt_to_barycenter(
            t, reference, source, observer, second_order=second_order
        ),
        backward=lambda t: dating.backward(carrying.backward(t)),
        terms=lambda before, after: {"TDB - TT": count_difference(before, after)},
        rate=rate,
    )


def _time_ephemeris(tt: Pair, reference: ReferenceData, assumptions: Assumptions) -> list[Contribution]:
    """The uncertainty of TT - TDB at the geocentre, which enters TCB - TCG with its sign reversed."""
    shape = np.shape(tt[0])
    at_s = np.asarray(np.ravel(tt[0]) + np.ravel(tt[1]), dtype=np.float64)
    return [
        Contribution(
            source="time ephemeris",
            quantity="TT - TDB at the geocentre",
            unit="s",
            sensitivity=np.full(shape, -1.0),
            sigma=np.full(shape, assumptions.time_ephemeris_sigma_s),
            value=reference.time_ephemeris.tt_minus_tdb_s(tt),
            correlation=Exponential(at_s, JULIAN_YEAR_S),
            handle=("time_ephemeris", 0),
        )
    ]
