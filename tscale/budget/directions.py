"""Contributions of a wavefront: the source's direction and distance, the ephemeris, and delays left out."""

from __future__ import annotations

from typing import Final

import numpy as np

from .. import exact
from ..constants import AU_M, C_M_S, JULIAN_YEAR_S
from ..earth.frames import dot
from ..exact import FloatArray, Pair
from ..source import Source
from ..tables.reference import ReferenceData
from ..transforms.shapiro import higher_orders, passage
from .assumptions import Assumptions
from .contribution import Contribution, Omission
from .places import left_out

__all__ = ["sky_axes", "sun_left_out", "wavefront_contributions", "wavefront_omissions"]

EARTH_DELAY_S: Final = 2e-11
"""Half the range of the Earth's own gravitational delay over the sky of a site, which the wavefront leaves out, s."""

_DEG: Final = float(np.pi) / 180.0
_MAS: Final = _DEG / 3.6e6


def wavefront_contributions(
    tdb: Pair, x_m: FloatArray, source: Source, assumptions: Assumptions, *, earthly: bool
) -> list[Contribution]:
    """Contributions to the date at the barycentre by where the source is and where the barycentre is.

    Parameters
    ----------
    tdb : Pair
        Dates at which the wavefront meets the observer.
    x_m : (..., 3) array
        The observer from the barycentre, m.
    source : Source
        Where the light comes from.
    assumptions : Assumptions
        What the caller states.
    earthly : bool
        Whether x is made of the geocentre and a geocentric vector, so that an error of the geocentre counts.
    """
    east, north = sky_axes(source)
    across = dot(x_m, np.broadcast_to(east, x_m.shape)), dot(x_m, np.broadcast_to(north, x_m.shape))
    years = exact.seconds(exact.subtract(tdb, source._epoch.pair)) / JULIAN_YEAR_S
    shape = years.shape
    found: list[Contribution] = []

    def add(line: str, quantity: str, unit: str, sensitivity: FloatArray, sigma: float, value: float, of: str) -> None:
        found.append(
            Contribution(
                line,
                quantity,
                unit,
                np.asarray(sensitivity),
                np.full(shape, sigma),
                np.full(shape, value),
                handle=("source", of) if of else (),
            )
        )

    if assumptions.source_position_sigma_mas is not None:
        ra_mas, dec_mas = assumptions.stated("source_position_sigma_mas")
        line = "position of the source"
        add(line, "right ascension cos dec", "deg", across[0] * (_DEG / C_M_S), ra_mas / 3.6e6, source.ra_deg, "ra_deg")
        add(line, "declination", "deg", across[1] * (_DEG / C_M_S), dec_mas / 3.6e6, source.dec_deg, "dec_deg")
    if assumptions.proper_motion_sigma_mas_yr is not None:
        sigmas = assumptions.stated("proper_motion_sigma_mas_yr")
        for number, of in enumerate(("pm_ra_cosdec_mas_yr", "pm_dec_mas_yr")):
            name = f"proper motion in {('right ascension cos dec', 'declination')[number]}"
            sensitivity = across[number] * years * (_MAS / C_M_S)
            add("proper motion of the source", name, "mas/yr", sensitivity, sigmas[number], getattr(source, of), of)
    if assumptions.parallax_sigma_mas is not None:
        # The curvature, -(|x|^2 - (k.x)^2) / 2cR with R = au / parallax.
        sensitivity = (across[0] ** 2 + across[1] ** 2) * (-0.5 * _MAS / (C_M_S * AU_M))
        sigma = assumptions.parallax_sigma_mas
        # A draw below zero would be no distance.
        of = "parallax_mas" if source.parallax_mas > 8.0 * sigma else ""
        add("parallax of the source", "parallax", "mas", sensitivity, sigma, source.parallax_mas, of)
    if earthly and assumptions.ephemeris_sigma_m is not None:
        toward = source.direction(tdb)
        for number, axis in enumerate("xyz"):
            found.append(
                Contribution(
                    "ephemeris",
                    f"geocentre from the barycentre, {axis}",
                    "m",
                    toward[..., number] / C_M_S,
                    np.full(shape, assumptions.stated("ephemeris_sigma_m")[number]),
                    x_m[..., number],
                )
            )
    return found


def sun_left_out(
    x_m: FloatArray, sun_m: FloatArray, sun_v_m_s: FloatArray, toward: FloatArray, reference: ReferenceData
) -> Contribution:
    """What leaving out the Sun's delays of second and third order may cost: its size at these instants."""
    r, _, _ = passage(x_m, toward, sun_m, sun_v_m_s)
    parts = higher_orders(r, toward, -sun_v_m_s, reference.ephemeris.gm_m3_s2("sun"))
    size = np.abs(parts.second_s + parts.third_s)
    name = "second-order delay of the Sun, left out"
    return left_out(name, name, "s", np.ones(size.shape), size)


def wavefront_omissions(source: Source, assumptions: Assumptions, *, earthly: bool) -> list[Omission]:
    """What a budget cannot say of a wavefront."""
    found = []
    for name, given in (
        ("position of the source", "source_position_sigma_mas"),
        ("proper motion of the source", "proper_motion_sigma_mas_yr"),
        ("parallax of the source", "parallax_sigma_mas"),
    ):
        if getattr(assumptions, given) is None:
            found.append(Omission(name, f"not stated; give {given}"))
    if earthly and assumptions.ephemeris is None and assumptions.ephemeris_sigma_m is None:
        found.append(Omission("ephemeris", "not stated; give ephemeris, another kernel, or ephemeris_sigma_m"))
    found.append(Omission("shape of the giant planets", "not part of the model: 0.3 ns for a source at Jupiter's limb"))
    found.append(Omission("delay in the air and in plasma on the way", "not part of the model"))
    found.append(Omission("delay within other stars and the Galaxy", "not part of the model"))
    return found


def sky_axes(source: Source) -> tuple[FloatArray, FloatArray]:
    """Unit vectors to the east and to the north at the source."""
    ra, dec = source.ra_deg * _DEG, source.dec_deg * _DEG
    east = np.array([-np.sin(ra), np.cos(ra), 0.0])
    return east, np.array([-np.sin(dec) * np.cos(ra), -np.sin(dec) * np.sin(ra), np.cos(dec)])
