"""Proper time of a clock near the Earth: d(tau)/d(TCG) - 1, term by term, to 1e-18.

From the metric of the GCRS (IAU 2000 Resolution B1.3; Soffel et al. 2003, AJ 126, 2687, eqs. 27 to 31),

    G00 = -1 + 2 W/c^2 - 2 W^2/c^4,   Gij = delta_ij (1 + 2 W/c^2),

a clock at velocity v in the potential W ticks

    d(tau)/d(TCG) = 1 - (v^2/2 + W)/c^2 - (v^4/8 + 3 v^2 W/2 - W^2/2)/c^4,

W = U + tidal potential, U the Earth's own. Left out: the vector potential of the Earth's spin, 4 W_a v^a/c^4 (1e-21 on
the ground, 2e-20 in a low orbit), the non-geodesic motion of the geocentre (3e-21), and the tides of the planets
(1e-21).

Observers are asked in TT-compatible units. Velocities and quotients GM/r have the same value in them as in TCG units,
and so has every term here.

A clock on the ground. The geopotential W of levelling holds the rotation of the Earth, v^2/2. Of a clock with
geopotential number C = W0 - W (or a height above the geoid, from which C follows) the gravitational term is
-(W0 - C - v^2/2)/c^2, so that kinematic and gravitational together are -(W0 - C)/c^2. The motion of the pole
within the Earth is then left out (up to 2e-18 at middle latitudes).
"""

from __future__ import annotations

from typing import Any, Final, NamedTuple

import numpy as np

from ..constants import C_M_S, W0_M2_S2
from ..earth.cip_table import cip
from ..earth.frames import dot
from ..earth.gravity.field import EARTH_ZONAL, GravityField, ZonalField
from ..earth.gravity.normal import geopotential_number_m2_s2
from ..earth.observer import Observer
from ..earth.rotation import itrs_from_gcrs
from ..earth.site import Site
from ..errors import InvalidInput, MissingPiece, ScaleMismatch
from ..exact import FloatArray, Pair
from ..tables.reference import ReferenceData
from .barycentric import GEOCENTRIC_LIMIT_M
from .proper_tides import Kind, Tides, checked_tides, tide_m2_s2

__all__ = [
    "TERMS",
    "RateTerms",
    "checked_gravity",
    "geopotential_number_of",
    "missing_potential",
    "potential_along",
    "rate_terms",
    "uses_orientation",
]

_C2: Final = C_M_S**2

TERMS: Final = ("kinematic", "gravitational", "tidal", "second order")
"""Names of the terms, as ledgers show them."""


class RateTerms(NamedTuple):
    """d(tau)/d(TCG) - 1 in parts, dimensionless, each in the shape of the dates."""

    kinematic: FloatArray
    """-v^2/(2 c^2), v the velocity in the GCRS."""
    gravitational: FloatArray
    """-U/c^2, U the Earth's own gravitational potential."""
    tidal: FloatArray
    """-W_tidal/c^2: Moon and Sun, and what the yielding Earth adds."""
    second_order: FloatArray
    """-(v^4/8 + 3 v^2 W/2 - W^2/2)/c^4."""

    @property
    def total(self) -> FloatArray:
        """d(tau)/d(TCG) - 1."""
        # The small ones first.
        return np.asarray(self.second_order + self.tidal + self.kinematic + self.gravitational)

    def named(self) -> dict[str, FloatArray]:
        """Each term by the name that ledgers show."""
        return dict(zip(TERMS, self, strict=True))


def rate_terms(
    observer: Observer,
    tt: Pair,
    reference: ReferenceData,
    *,
    gravity: GravityField | None = None,
    tides: Tides = True,
) -> RateTerms:
    """d(tau)/d(TCG) - 1 of a clock at an observer, term by term.

    Parameters
    ----------
    observer : Observer
        A site on the ground or a trajectory, up to 1e10 m from the Earth.
    tt : Pair
        TT count, any shape.
    reference : ReferenceData
        Earth orientation for what turns with the Earth; the ephemeris for tides.
    gravity : GravityField, optional
        Earth's gravitational potential. For a trajectory the default is J2 to J6, `EARTH_ZONAL`, whose error near the
        ground is 4e-15 (what depends on longitude) and 2e-17 at the height of a navigation satellite. For a site it is
        needed if the site has neither a geopotential number nor a height above the geoid, which come first in this
        order. Its `tide_system` is heeded; of a file that does not state it, tide-free is taken (chains note it).
    tides : bool or {"zero_tide", "mean_tide", "tide_free"}
        Whether to add the tides of Moon and Sun, and of which tide system a levelled geopotential number is; True
        takes it for zero-tide. See `proper_tides` for what is counted where.

    Raises
    ------
    MissingPiece
        For a site of unknown potential.
    OutOfSpan
        Where the observer, the Earth orientation or the ephemeris does not reach, with the mask.
    ScaleMismatch
        More than 1e10 m from the Earth, where TCG does not reach.
    InvalidInput
        For what is no observer or no gravity field, and positions inside the Earth.
    """
    gravity, tides = checked_gravity(gravity), checked_tides(tides)
    if not isinstance(observer, Observer):
        raise InvalidInput(
            f"proper time near the Earth is that of a Site or a Trajectory, got {type(observer).__name__}; make one "
            "with Site.from_geodetic or Trajectory.from_kepler"
        )
    r_m, v_m_s = observer.gcrs(tt, reference)
    _require_near_earth(r_m, observer)
    square = dot(v_m_s, v_m_s)
    number = geopotential_number_of(observer)
    if isinstance(observer, Site):
        if number is not None:
            own = (W0_M2_S2 - number) - 0.5 * square
        elif gravity is not None:
            own = np.broadcast_to(gravity.potential_m2_s2(observer.itrf_at(tt)), square.shape)
        else:
            raise MissingPiece(missing_potential(observer))
    else:
        own = potential_along(EARTH_ZONAL if gravity is None else gravity, r_m, tt, reference)
    tidal = np.zeros_like(square)
    if tides:
        kind: Kind = "levelled" if number is not None else "ground" if isinstance(observer, Site) else "free"
        tidal = tide_m2_s2(kind, r_m, tt, reference, tides, gravity)
    whole = own + tidal
    second = square * square / 8.0 + 1.5 * square * whole - 0.5 * whole * whole
    return RateTerms(square * (-0.5 / _C2), own / -_C2, tidal / -_C2, second / -(_C2 * _C2))


def geopotential_number_of(observer: object) -> float | None:
    """W0 - W of a levelled site, m2/s2: as given, or from its height above the geoid; None for anything else."""
    if not isinstance(observer, Site):
        return None
    if observer.geopotential_number_m2_s2 is not None:
        return observer.geopotential_number_m2_s2
    if observer.height_above_geoid_m is not None:
        return float(geopotential_number_m2_s2(observer.height_above_geoid_m, observer.lat_deg))
    return None


def checked_gravity(gravity: Any) -> GravityField | None:
    """The field given, or an error that says what is none."""
    if gravity is not None and not isinstance(gravity, GravityField):
        raise InvalidInput(
            f"gravity= takes a gravity field, such as tscale.earth.gravity.EARTH_ZONAL or HarmonicField.load(path), "
            f"got {type(gravity).__name__}"
        )
    return gravity


def uses_orientation(observer: Observer, gravity: GravityField | None) -> bool:
    """Whether the rate rests on Earth orientation: the observer turns with the Earth, or the field does."""
    turning = gravity is not None and not isinstance(gravity, ZonalField) and not isinstance(observer, Site)
    return turning or bool(getattr(observer, "uses_earth_orientation", True))


def potential_along(field: GravityField, r_m: FloatArray, tt: Pair, reference: ReferenceData) -> FloatArray:
    """Potential at GCRS positions.

    A zonal field needs no more than the distance from the equator. That of the celestial pole serves, for which no
    Earth orientation has to be known: the pole wanders by 0.3" within the Earth, 1.5e-18 in J2, of a field that is good
    to 4e-15.
    """
    if not isinstance(field, ZonalField):
        return field.potential_m2_s2(itrs_from_gcrs(r_m, tt, reference))
    xys, _ = cip(tt)
    x, y = xys[..., 0], xys[..., 1]
    along = x * r_m[..., 0] + y * r_m[..., 1] + np.sqrt(1.0 - x * x - y * y) * r_m[..., 2]
    across = np.sqrt(np.maximum(dot(r_m, r_m) - along * along, 0.0))
    return field.potential_m2_s2(np.stack((across, np.zeros_like(along), along), axis=-1))


def _require_near_earth(r_m: FloatArray, observer: Observer) -> None:
    far = dot(r_m, r_m) > GEOCENTRIC_LIMIT_M**2
    if np.any(far):
        raise ScaleMismatch(
            f"{int(np.count_nonzero(far))} of {far.size} dates of {observer.name} are over {GEOCENTRIC_LIMIT_M:.0e} m "
            "from the Earth, where TCG does not reach (see the mask): leave them out",
            mask=np.asarray(far),
        )


def missing_potential(site: Site) -> str:
    """What to say of a site whose potential is not known."""
    return (
        f"the gravity potential at {site.name} is not known, and the ellipsoid height ({site.height_m:.1f} m) does not "
        "give it (the geoid lies up to 100 m from the ellipsoid, 1e-14 in frequency): give the site "
        "geopotential_number_m2_s2= or height_above_geoid_m=, or give gravity= with a field, such as "
        "HarmonicField.load('model.gfc')"
    )
