"""Edges to barycentric coordinate time, and the wavefront that carries a signal to the barycentre."""

from __future__ import annotations

from typing import Final

import numpy as np

from .. import exact
from ..constants import C_M_S, EARTH_ANGULAR_VELOCITY_RAD_S, L_B, L_G
from ..counts import tai_from_tt
from ..earth.frames import dot
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
from .common import count_difference

__all__ = ["tcb_tdb_step", "tcg_tcb_step", "tt_barycentric_step", "wavefront_step"]


_TCB_GAIN: Final = float(L_B / (1 - L_B))

_NAMED: Final = {"sun": "the Sun", "moon": "the Moon", "earth": "the Earth"}

TIME_EPHEMERIS_SIGMA_S: Final = 2e-10
"""Standard uncertainty of TT - TDB at the geocentre, s: rms difference from an independently integrated
planetary ephemeris (type B)."""


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
        tdb = barycentric.tdb_from_tcb(after.pair)
        # TCG - TCB at the geocentre from TT - TDB: (1 - L_G)(1 - f) = (1 - L_B)(1 + P').
        gain = reference.time_ephemeris.rate(tdb)
        tcg_per_tcb = (gain * float(1 - L_B) - float(L_B - L_G)) / float(1 - L_G)
        if observer is not None:
            tcg_per_tcb = tcg_per_tcb - barycentric.topocentric_rate(
                reference.ephemeris, tdb, *observer.gcrs(geocentric.tt_from_tcg(before.pair), reference)
            )
        return np.asarray(-tcg_per_tcb / (1.0 + tcg_per_tcb))

    def uncertainty_s(before: Instants) -> dict[str, FloatArray]:
        found = {"time ephemeris": np.full(before.shape, TIME_EPHEMERIS_SIGMA_S)}
        if observer is not None and _turns_with_earth(observer):
            tt = geocentric.tt_from_tcg(before.pair)
            near = exact.add_seconds(tt, -reference.time_ephemeris.tt_minus_tdb_s(tt))
            _, velocity = reference.ephemeris.state("earth", near)
            found |= _orientation_sigma_s(tt, observer.gcrs(tt, reference)[0], velocity / C_M_S, reference)
        return found

    def notes(before: Instants) -> tuple[str, ...]:
        if observer is None or not _turns_with_earth(observer):
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
        uncertainty_s=uncertainty_s,
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
        tdb = after.pair if end == "TDB" else barycentric.tdb_from_tcb(after.pair)
        gain = reference.time_ephemeris.rate(tdb)
        if observer is not None:
            gain = gain - barycentric.topocentric_rate(reference.ephemeris, tdb, *observer.gcrs(before.pair, reference))
        of_tdb = -gain / (1.0 + gain)
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

    def uncertainty_s(before: Instants) -> dict[str, FloatArray]:
        if observer is None or not _turns_with_earth(observer):
            return {}
        event = observer_event(before.pair, reference, observer)
        return _orientation_sigma_s(event.tt, event.r_gcrs_m, source.direction(before.pair), reference)

    def notes(before: Instants) -> tuple[str, ...]:
        found: tuple[str, ...] = ()
        if observer is not None and _turns_with_earth(observer):
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
        uncertainty_s=uncertainty_s,
        notes=notes,
    )


def _turns_with_earth(observer: Observer) -> bool:
    """Whether the observer's place depends on Earth orientation; one that does not say is taken to be on the ground."""
    return bool(getattr(observer, "uses_earth_orientation", True))


def _orientation_sigma_s(
    tt: Pair, r_m: FloatArray, weight: FloatArray, reference: ReferenceData
) -> dict[str, FloatArray]:
    """Uncertainty of weight.r/c of a place that turns with the Earth: that of UT1 along its motion, and of the pole."""
    values = reference.earth_orientation.at(tai_from_tt(tt))
    along = (weight[..., 1] * r_m[..., 0] - weight[..., 0] * r_m[..., 1]) * (EARTH_ANGULAR_VELOCITY_RAD_S / C_M_S)
    pole = values.x_sigma_rad**2 + values.y_sigma_rad**2 + values.dx_sigma_rad**2 + values.dy_sigma_rad**2
    size = np.sqrt(dot(r_m, r_m) * dot(weight, weight)) / C_M_S
    return {
        "Earth orientation, UT1": np.asarray(np.abs(along) * values.ut1_sigma_s),
        "Earth orientation, pole": np.asarray(np.sqrt(pole) * size),
    }
