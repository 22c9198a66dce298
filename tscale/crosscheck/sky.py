"""Signatures of mistakes in a wavefront: terms left out or of the wrong sign, another source, another ephemeris."""

from __future__ import annotations

import math
from collections.abc import Callable, Iterator
from dataclasses import replace
from functools import partial
from typing import Final

import numpy as np

from ..constants import C_M_S, JULIAN_YEAR_S, L_B
from ..earth.frames import dot
from ..exact import FloatArray
from ..instants import Instants
from ..source import Source
from .front import Front, Pieces, total_of
from .path import Path
from .signature import Signature, bound

__all__ = ["sky_signatures"]

_MAS: Final = math.pi / (180.0 * 3600.0e3)
_GIANTS: Final = ("jupiter", "saturn", "uranus", "neptune")


def sky_signatures(path: Path, number: int, front: Front) -> Iterator[Signature]:
    """All that can go wrong with a wavefront; `number` is its step on the path."""
    changes = _changes(front.source)
    for signature in (*_left_out(number, front), *_of_source(number, front), *_of_ephemeris(number, front)):
        change = changes.get(signature.name)
        yield signature if change is None else replace(signature, change=change, joined=front.joined_s)


def _changes(source: Source) -> dict[str, Callable[[Pieces, float], Pieces]]:
    """The mistakes that are made in source and site, and what they make of these."""
    bare = source.pm_ra_cosdec_mas_yr / max(math.cos(math.radians(source.dec_deg)), 1e-9)
    return {
        "geocentre in place of the site (Roemer delay)": lambda p, a: p._replace(site=None),
        "parallax left out": lambda p, a: p.with_source(parallax_mas=0.0),
        "proper motion left out": lambda p, a: p.with_source(pm_ra_cosdec_mas_yr=0.0, pm_dec_mas_yr=0.0),
        "cos(declination) of the proper motion": lambda p, a: p.with_source(pm_ra_cosdec_mas_yr=bare),
        "epoch of the source": lambda p, a: p.later(a),
        "direction of the source in right ascension": lambda p, a: p.turned(a, north=False),
        "direction of the source in declination": lambda p, a: p.turned(a, north=True),
    }


def _left_out(number: int, front: Front) -> Iterator[Signature]:
    def roemer(t: Instants) -> FloatArray:
        return front.terms(t).terms_s["Roemer delay"]

    yield Signature(
        "not carried to the barycentre", "all terms of the wavefront left out", lambda a, b: -front.total_s(a), number
    )
    yield Signature(
        "Roemer delay with the wrong sign",
        "subtracted in place of added, or a source on the other side",
        lambda a, b: -2.0 * roemer(a),
        number,
    )
    if front.site is not None and getattr(front.site, "geocentric", True):
        yield Signature(
            "geocentre in place of the site (Roemer delay)",
            "the site vector left out: 21 ms within the day",
            lambda a, b: total_of(front.other(a, site=None)) - front.total_s(a),
            number,
        )
        yield Signature(
            "site vector turned by the aberration",
            "a site vector treated as a direction of light: 2.1 us",
            lambda a, b: _aberration_s(front, a),
            number,
        )
        yield Signature(
            "site vector not taken to the barycentric frame",
            "scale and Lorentz terms left out (IERS Conventions 2010, eq. 11.19): 0.6 ns",
            lambda a, b: _frame_s(front, a),
            number,
        )
    if front.source.parallax_mas:
        yield Signature(
            "parallax left out",
            "the curvature of the wavefront: r^2/(2 c d)",
            lambda a, b: -front.terms(a).terms_s["parallax (curvature)"],
            number,
        )
    yield Signature(
        "Shapiro delay of the Sun left out",
        "up to 120 us at its limb",
        lambda a, b: -front.shapiro_s(a, sun=True),
        number,
        (1.0, 2.0),
    )
    yield Signature(
        "Shapiro delay of the planets left out",
        "up to 190 ns at Jupiter's limb",
        lambda a, b: -front.shapiro_s(a, sun=False),
        number,
        (1.0, 2.0),
    )
    second = front.second_order
    yield Signature(
        f"second-order delay of the Sun {'left out' if second else 'put in'}",
        "18 ns at its limb",
        lambda a, b: total_of(front.other(a, second=not second)) - front.total_s(a),
        number,
    )
    yield Signature(
        "Roemer delay in TCB units (L_B)",
        "lengths of a TDB-compatible ephemeris taken for TCB-compatible ones, or the reverse: 7.7 us",
        lambda a, b: float(L_B) * roemer(a),
        number,
        (1.0, -1.0),
    )


def _aberration_s(front: Front, t: Instants) -> FloatArray:
    earth, velocity = front.reference.ephemeris.state("earth", t.pair)
    r = front.state(t)[0] - earth
    radius = np.sqrt(dot(r, r))[..., np.newaxis]
    up, beta = r / radius, velocity / C_M_S
    moved = (beta - up * dot(up, beta)[..., np.newaxis]) * -radius
    return dot(moved, front.toward(t)) / C_M_S


def _frame_s(front: Front, t: Instants) -> FloatArray:
    from ..earth.moving import observer_event

    event = observer_event(t.pair, front.reference, front.site)
    return dot(event.r_gcrs_m - event.offset(), front.toward(t)) / C_M_S


def _of_source(number: int, front: Front) -> Iterator[Signature]:
    source = front.source
    ra, dec = math.radians(source.ra_deg), math.radians(source.dec_deg)
    east = np.array([-math.sin(ra), math.cos(ra), 0.0])
    north = np.array([-math.sin(dec) * math.cos(ra), -math.sin(dec) * math.sin(ra), math.cos(dec)])
    for words, axis in (("right ascension", east), ("declination", north)):
        yield Signature(
            f"direction of the source in {words}",
            "or, which is the same, the axes of the ephemeris: 2.4 us for 1 mas",
            bound(_aside, front, axis),
            number,
            None,
            unit="mas",
            limit=1e7,
            exact=partial(_elsewhere, front, axis),
        )
    if source.pm_ra_cosdec_mas_yr or source.pm_dec_mas_yr:
        still = replace(source, pm_ra_cosdec_mas_yr=0.0, pm_dec_mas_yr=0.0)
        yield Signature(
            "proper motion left out",
            "the source at its place of the epoch",
            lambda a, b: total_of(front.other(a, still)) - front.total_s(a),
            number,
        )
        yield Signature(
            "epoch of the source",
            "its direction taken to hold so much later: 15.5 years from J2000.0 to J2015.5, -8.75 to J1991.25",
            lambda a, b: _later(front, a, 1.0),
            number,
            None,
            unit="yr",
            limit=500.0,
            exact=lambda a, b, years: _later(front, a, years),
        )
        plain = replace(source, pm_ra_cosdec_mas_yr=source.pm_ra_cosdec_mas_yr / max(math.cos(dec), 1e-9))
        if source.pm_ra_cosdec_mas_yr and abs(source.dec_deg) < 89.0:
            yield Signature(
                "cos(declination) of the proper motion",
                "the motion in right ascension with a factor cos dec too few",
                lambda a, b: total_of(front.other(a, plain)) - front.total_s(a),
                number,
            )


def _aside(t: Instants, after: Instants, front: Front, axis: FloatArray) -> FloatArray:
    return dot(front.state(t)[0], axis) * (_MAS / C_M_S)


def _elsewhere(front: Front, axis: FloatArray, t: Instants, after: Instants, mas: float) -> FloatArray:
    """Roemer delay of a source moved on the sky across the line of sight."""
    k = front.toward(t)
    moved = k + axis * (mas * _MAS)
    moved = moved / np.sqrt(dot(moved, moved))[..., np.newaxis]
    return dot(front.state(t)[0], moved - k) / C_M_S


def _later(front: Front, t: Instants, years: float) -> FloatArray:
    """A source whose direction is taken to hold so many years later."""
    epoch = front.source._epoch.shifted(years * JULIAN_YEAR_S)
    return total_of(front.other(t, replace(front.source, epoch=str(epoch.to_iso(9))))) - front.total_s(t)


def _of_ephemeris(number: int, front: Front) -> Iterator[Signature]:
    ephemeris = front.reference.ephemeris

    def toward(t: Instants, vector: FloatArray) -> FloatArray:
        return dot(vector, front.toward(t)) / C_M_S

    def heavier(a: Instants, b: Instants, body: str) -> FloatArray:
        # A heavier planet draws the barycentre towards itself.
        return -1e-11 * toward(a, ephemeris.position(body, a.pair))

    yield Signature(
        "Sun in place of the barycentre",
        "heliocentric dates: 2 to 4 s",
        lambda a, b: -toward(a, ephemeris.position("sun", a.pair)),
        number,
    )
    if front.site is None or getattr(front.site, "geocentric", True):
        share = ephemeris.gm_m3_s2(301) / (ephemeris.gm_m3_s2(301) + ephemeris.gm_m3_s2(399))
        yield Signature(
            "Earth-Moon barycentre in place of the Earth",
            "15 ms within the month",
            lambda a, b: share * toward(a, ephemeris.position("moon", a.pair, "earth")),
            number,
        )
    for body in _GIANTS:
        yield Signature(
            f"mass of {body.title()} in another ephemeris",
            "the barycentre moves with the planet; in 1e-11 of the Sun's mass",
            bound(heavier, body),
            number,
            None,
            unit="1e-11",
            limit=1e4,
        )
    yield Signature(
        "scale of another ephemeris",
        "the length of its astronomical unit, relative",
        lambda a, b: 1e-12 * front.terms(a).terms_s["Roemer delay"],
        number,
        None,
        unit="1e-12",
        limit=1e3,
    )
