"""Contributions of the observer's place: Earth orientation, coordinates, and what its displacements leave out."""

from __future__ import annotations

from typing import Final

import numpy as np

from ..constants import EARTH_ANGULAR_VELOCITY_RAD_S
from ..counts import tai_from_tt
from ..earth.frames import dot
from ..earth.observer import Observer
from ..earth.orientation import Orientation
from ..earth.rotation import orientation
from ..earth.site import Site
from ..exact import FloatArray, Pair
from ..tables.reference import ReferenceData
from .assumptions import Assumptions
from .contribution import Contribution, Omission
from .correlation import COMMON, Exponential
from .rows import orientation_rows

__all__ = ["left_out", "orientation_contributions", "place_contributions", "place_omissions", "turns_with_earth"]

_SOURCES: Final = ("Earth orientation, UT1", *("Earth orientation, pole",) * 4)
_SUBDAILY_MODEL_M: Final = 2e-3
"""What the model of tides in Earth rotation may be off by: 0.02 mas, 2 us and the libration of the pole, m."""
_ROOT_3: Final = float(np.sqrt(3.0))


def turns_with_earth(observer: Observer) -> bool:
    """Whether the observer's place depends on Earth orientation; one that does not say is taken to be on the ground."""
    return bool(getattr(observer, "uses_earth_orientation", True))


def place_contributions(
    observer: Observer,
    tt: Pair,
    r_m: FloatArray,
    weight_s_m: FloatArray,
    reference: ReferenceData,
    assumptions: Assumptions,
) -> list[Contribution]:
    """Contributions to a result that holds the term weight.r.

    Parameters
    ----------
    observer : Observer
        Whose place it is.
    tt : Pair
        TT counts of the event.
    r_m : (..., 3) array
        Geocentric GCRS vector of the observer, m.
    weight_s_m : (..., 3) array
        Derivative of the result by `r_m`, s/m: v/c^2 in TCB - TCG, n/c in a wavefront.
    reference : ReferenceData
        Tables in use.
    assumptions : Assumptions
        What the caller states.

    Notes
    -----
    A small turn w of the Earth moves the result by w.(r x weight): UT1 turns about the celestial pole, polar motion
    about the terrestrial -y and -x axes (IERS Conventions 2010, eq. 5.3), dX and dY about the celestial y and -x axes,
    this to 0.3 %.
    """
    found: list[Contribution] = []
    axes, along = "celestial", weight_s_m
    if turns_with_earth(observer):
        turning = orientation(tt, reference)
        found.extend(orientation_contributions(turning, tt, r_m, weight_s_m, reference, assumptions))
        axes = "ITRF"
        if assumptions.site_sigma_m is not None:
            along = turning.terrestrial(weight_s_m)
    if assumptions.site_sigma_m is not None:
        found.extend(_coordinates(observer, axes, along, np.asarray(tt[0] + tt[1]), assumptions))
    if assumptions.truncation and isinstance(observer, Site):
        size = np.sqrt(dot(weight_s_m, weight_s_m))
        found.extend(
            left_out(source, f"{source}: {what}", "m", size, bound_m)
            for source, what, bound_m in _displacements(observer, reference, assumptions)
        )
    return found


def orientation_contributions(
    turning: Orientation,
    tt: Pair,
    r_m: FloatArray,
    weight_s_m: FloatArray,
    reference: ReferenceData,
    assumptions: Assumptions,
) -> list[Contribution]:
    """Contributions of UT1 and the pole to weight.r, for the Earth turned as at TT counts."""
    moment = np.cross(r_m, weight_s_m)
    on_ground = turning.terrestrial(moment)
    sensitivities = (
        on_ground[..., 2] * EARTH_ANGULAR_VELOCITY_RAD_S,
        -on_ground[..., 1],
        -on_ground[..., 0],
        moment[..., 1],
        -moment[..., 0],
    )
    rows = orientation_rows(reference.earth_orientation, tai_from_tt(tt), assumptions)
    found: list[Contribution] = []
    for column, (source, sensitivity) in enumerate(zip(_SOURCES, sensitivities, strict=True)):
        found.extend(rows.contributions(column, source, "rad" if column else "s", sensitivity))
    return found


def left_out(source: str, quantity: str, unit: str, sensitivity: FloatArray, bound: FloatArray | float) -> Contribution:
    """Something that a model leaves out and that lies within +-bound: rectangular, common to all instants."""
    sigma = np.broadcast_to(np.asarray(bound) / _ROOT_3, np.shape(sensitivity))
    return Contribution(
        source, quantity, unit, sensitivity, sigma, value=np.zeros(sigma.shape), distribution="rectangular"
    )


def place_omissions(observer: Observer, assumptions: Assumptions) -> list[Omission]:
    """What a budget cannot say of the observer's place."""
    found = []
    if assumptions.site_sigma_m is None:
        found.append(Omission(f"place of {observer.name}", "not stated; give site_sigma_m"))
    if hasattr(observer, "clip"):
        found.append(Omission(f"interpolation of {observer.name}", "not stated by the trajectory"))
    return found


def _coordinates(
    observer: Observer, axes: str, along_s_m: FloatArray, at_s: FloatArray, assumptions: Assumptions
) -> list[Contribution]:
    sigmas, decay_s = assumptions.stated("site_sigma_m"), assumptions.site_decay_s
    correlation = COMMON if np.isinf(decay_s) or decay_s == 0.0 else Exponential(at_s.ravel(), decay_s)
    position = observer.position_m if isinstance(observer, Site) else (None, None, None)
    shape = along_s_m.shape[:-1]
    return [
        Contribution(
            source=f"place of {observer.name}",
            quantity=f"{axes} {axis} of {observer.name}",
            unit="m",
            sensitivity=along_s_m[..., number],
            sigma=np.full(shape, sigmas[number]),
            value=None if position[number] is None else np.full(shape, position[number]),
            correlation=correlation,
            handle=("site", number) if correlation is COMMON and isinstance(observer, Site) else (),
        )
        for number, axis in enumerate("xyz")
    ]


def _displacements(site: Site, reference: ReferenceData, assumptions: Assumptions) -> list[tuple[str, str, float]]:
    """Displacements of the ground that the chain leaves out, with their bounds in m."""
    found = [("loads on the ground and pole tide, left out", "displacement", assumptions.load_bound_m)]
    if not site.solid_tide:
        found.insert(0, ("tide of the solid Earth, left out", "displacement", assumptions.tide_bound_m))
    if reference.earth_orientation.sub_daily:
        found.append(("tides in Earth rotation, beyond their model", "displacement", _SUBDAILY_MODEL_M))
    else:
        found.append(("tides in Earth rotation, left out", "displacement", assumptions.subdaily_bound_m))
    return found
