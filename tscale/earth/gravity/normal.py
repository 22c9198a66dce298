"""Normal gravity of the Earth, and heights above the geoid as geopotential numbers.

The normal fields of GRS80 and WGS84 are level ellipsoids (`NormalField`, closed formulas).

The geopotential number C = W0 - W of a point is the mean gravity along the plumb line from the geoid times the
orthometric height H. Real mean gravity is not known without a survey. In its place stands

* by default, mean normal gravity of GRS80 to second order in H/a (Heiskanen & Moritz 1967, eq. 4-42):
  C = gamma0 H [1 - (1 + f + m - 2 f sin^2 phi) H/a + (H/a)^2]. What that costs: mean gravity that differs from normal
  by 50 mGal, 5e-5 of C (5.5e-18 in frequency at H = 1000 m); in high mountains up to 300 mGal, 3e-4 of C;
* with gravity g measured at the point, Helmert's mean gravity g + 4.24e-7/s^2 H (eq. 4-25, Poincare-Prey reduction
  through rock of 2670 kg/m3), which holds for a point on the ground and leaves the terrain, 1 to 50 mGal.

C counts from W0 = 62636856.0 m2/s2, the level of TT; the zero of a national height system is off by up to 2 m (2e-16).
"""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from ...constants import (
    GRS80_A_M,
    GRS80_GM_M3_S2,
    GRS80_J2,
    NORMAL_OMEGA_RAD_S,
    WGS84_A_M,
    WGS84_GM_M3_S2,
    WGS84_INVERSE_FLATTENING,
)
from ...errors import InvalidInput
from ...exact import FloatArray
from .arguments import broadcast, latitudes_and
from .level_ellipsoid import HIGHEST_M, LOWEST_M, TOO_HIGH, NormalField

__all__ = ["GRS80", "WGS84", "NormalField", "geopotential_number_m2_s2", "height_above_geoid_m"]

GRS80: Final = NormalField.from_j2(
    "GRS80", a_m=GRS80_A_M, j2=GRS80_J2, gm_m3_s2=GRS80_GM_M3_S2, omega_rad_s=NORMAL_OMEGA_RAD_S
)
"""Geodetic Reference System 1980 (Moritz 2000)."""

WGS84: Final = NormalField.from_flattening(
    "WGS84",
    a_m=WGS84_A_M,
    inverse_flattening=WGS84_INVERSE_FLATTENING,
    gm_m3_s2=WGS84_GM_M3_S2,
    omega_rad_s=NORMAL_OMEGA_RAD_S,
)
"""World Geodetic System 1984 (NIMA TR8350.2)."""

_ROCK_S2: Final = 4.24e-7
"""Half the decrease of gravity with depth in rock, over depth, 1/s2 (Heiskanen & Moritz eq. 4-25)."""

_GROUND_M: Final = 9_000.0
_ON_GROUND: Final = "gravity_m_s2 is for points on the ground"


def geopotential_number_m2_s2(
    height_above_geoid_m: npt.ArrayLike,
    lat_deg: npt.ArrayLike,
    *,
    normal: NormalField = GRS80,
    gravity_m_s2: npt.ArrayLike | None = None,
) -> FloatArray:
    """W0 - W of a point from its orthometric height; see the module for what it rests on.

    Parameters
    ----------
    height_above_geoid_m : float array
        Orthometric height, -12 km to 50 km, m.
    lat_deg : float array
        Geodetic latitude within +-90, degrees; broadcasts with the height.
    normal : NormalField
        Normal field whose mean gravity is taken.
    gravity_m_s2 : float array, optional
        Gravity measured at the point, 9.7 to 9.9 m/s2: then Helmert's mean gravity is taken instead, and the point lies
        on the ground, up to 9 km.

    Returns
    -------
    float array
        m2/s2, positive above the geoid; over c^2 it is the fractional frequency by which a clock runs fast of TT.

    Raises
    ------
    InvalidInput
        Out of range, with the mask.

    Notes
    -----
    Against the closed normal potential the expansion leaves out 4e-3 m2/s2 (4e-20 in frequency) at 10 km and
    0.26 m2/s2 (3e-18) at 50 km.
    """
    highest, hint = (HIGHEST_M, TOO_HIGH) if gravity_m_s2 is None else (_GROUND_M, _ON_GROUND)
    sin2, height = latitudes_and(lat_deg, height_above_geoid_m, "height_above_geoid_m", LOWEST_M, highest, hint)
    if gravity_m_s2 is not None:
        g, height = _measured(gravity_m_s2, height)
        return np.asarray((g + _ROCK_S2 * height) * height)
    return _number(normal, sin2, height)


def height_above_geoid_m(
    geopotential_number_m2_s2: npt.ArrayLike,
    lat_deg: npt.ArrayLike,
    *,
    normal: NormalField = GRS80,
    gravity_m_s2: npt.ArrayLike | None = None,
) -> FloatArray:
    """Orthometric height of a point from its W0 - W: undo `geopotential_number_m2_s2`, same approximation, to 1e-9 m.

    Parameters
    ----------
    geopotential_number_m2_s2 : float array
        W0 - W, -1.19e5 to 4.89e5 m2/s2 (-12 km to 50 km).
    lat_deg, normal, gravity_m_s2
        As there.

    Returns
    -------
    float array
        m.

    Raises
    ------
    InvalidInput
        Out of range, with the mask.
    """
    highest, hint = (4.89e5, TOO_HIGH) if gravity_m_s2 is None else (_GROUND_M * 9.9, _ON_GROUND)
    sin2, number = latitudes_and(
        lat_deg, geopotential_number_m2_s2, "geopotential_number_m2_s2", -1.19e5, highest, hint
    )
    if gravity_m_s2 is not None:
        g, number = _measured(gravity_m_s2, number)
        return np.asarray(2.0 * number / (g + np.sqrt(g * g + 4.0 * _ROCK_S2 * number)))
    gamma0, slope = normal.somigliana_m_s2(sin2), normal.slope(sin2)
    height = number / gamma0
    # Newton: the relative error squares from 8e-3 at the highest, below one rounding after four.
    for _ in range(4):
        ratio = height / normal.a_m
        local = gamma0 * (1.0 - 2.0 * slope * ratio + 3.0 * ratio * ratio)
        height = height + (number - _number(normal, sin2, height)) / local
    return np.asarray(height)


def _number(normal: NormalField, sin2: FloatArray, height: FloatArray) -> FloatArray:
    ratio = height / normal.a_m
    return np.asarray(normal.somigliana_m_s2(sin2) * height * (1.0 - normal.slope(sin2) * ratio + ratio * ratio))


def _measured(gravity_m_s2: npt.ArrayLike, other: FloatArray) -> tuple[FloatArray, FloatArray]:
    g, other = broadcast(gravity_m_s2, "gravity_m_s2", other, "the place")
    bad = ~((g >= 9.7) & (g <= 9.9))
    if np.any(bad):
        raise InvalidInput(
            f"{int(np.count_nonzero(bad))} of {bad.size} values of gravity_m_s2 are out of range (first "
            f"{g[bad][0]:.6g}): gravity on the ground lies within 9.7 to 9.9 m/s2 (1 mGal is 1e-5 m/s2)",
            mask=np.asarray(bad),
        )
    return g, other
