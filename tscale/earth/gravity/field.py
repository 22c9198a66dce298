"""What a gravity field is, and the field of a body that is symmetric about its axis: J2, J3 ...

The potential counts positive: GM/r for a point mass. Positions are body-fixed, from its centre of mass, z along its
axis; a zonal field only needs that z, so that positions on the axes of its equator of date serve as well.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final, Protocol, runtime_checkable

import numpy as np
import numpy.typing as npt

from ...constants import EARTH_FIELD_RADIUS_M, EARTH_GM_TT_M3_S2, EARTH_ZONAL_J
from ...errors import InvalidInput
from ...exact import FloatArray
from .arguments import norms, positions

__all__ = ["EARTH_ZONAL", "GravityField", "ZonalField", "check_scale"]

DEEPEST: Final = 0.9
"""Nearest place to the centre at which a series is evaluated, in reference radii: below the surface of every body whose
radius is that of its coefficients, and far from where a truncated series is sure to have lost its meaning."""


@runtime_checkable
class GravityField(Protocol):
    """A gravitational potential fixed to a body (without that of its rotation)."""

    @property
    def name(self) -> str:
        """Name for ledgers and messages."""
        ...

    def potential_m2_s2(self, r_m: npt.ArrayLike) -> FloatArray:
        """Gravitational potential, positive, m2/s2, (...) at body-fixed positions (..., 3), m."""
        ...

    def acceleration_m_s2(self, r_m: npt.ArrayLike) -> FloatArray:
        """Gradient of the potential, m/s2, (..., 3) on the axes of the positions."""
        ...


@dataclass(frozen=True)
class ZonalField:
    """Gravitational potential GM/r [1 - sum J_n (R/r)^n P_n(z/r)] of any body.

    Parameters
    ----------
    name : str
        Name for ledgers and messages.
    gm_m3_s2 : float
        GM of the body in the units of the positions, m3/s2.
    radius_m : float
        Radius R to which the coefficients refer, m.
    j : tuple of float
        J2, J3 ... without gaps; empty for a point mass. At most up to J100.

    Raises
    ------
    InvalidInput
        Values that are not finite or not positive where they must be.
    """

    name: str
    gm_m3_s2: float
    radius_m: float
    j: tuple[float, ...] = ()

    def __post_init__(self) -> None:
        gm, radius = check_scale(self.name, self.gm_m3_s2, self.radius_m)
        try:
            j = tuple(float(value) for value in self.j)
        except (TypeError, ValueError) as error:
            raise InvalidInput(f"field {self.name!r}: j is a tuple of J2, J3 ..., got {self.j!r:.60}") from error
        if len(j) > 99 or not all(abs(value) < 1.0 for value in j):
            raise InvalidInput(
                f"field {self.name!r}: j holds J2, J3 ... up to at most J100, each finite and below 1 in size (they "
                f"are not normalised), got {self.j!r:.80}"
            )
        for key, value in (("gm_m3_s2", gm), ("radius_m", radius), ("j", j)):
            object.__setattr__(self, key, value)

    @property
    def max_degree(self) -> int:
        """Highest degree, 1 for a point mass."""
        return 1 + len(self.j)

    def potential_m2_s2(self, r_m: npt.ArrayLike) -> FloatArray:
        """Potential at body-fixed positions; see `GravityField`.

        Raises
        ------
        InvalidInput
            Not finite, not vectors, or below 0.9 of the reference radius, with the mask.
        """
        r = positions(r_m, f"field {self.name}", DEEPEST * self.radius_m)
        distance = norms(r)
        s, ratio = r[..., 2] / distance, self.radius_m / distance
        before, legendre = np.ones_like(s), s
        scale, total = ratio, np.zeros_like(s)
        for n, j in enumerate(self.j, start=2):
            before, legendre = legendre, ((2 * n - 1) * s * legendre - (n - 1) * before) / n
            scale = scale * ratio
            total = total + j * scale * legendre
        return np.asarray(self.gm_m3_s2 / distance * (1.0 - total))

    def acceleration_m_s2(self, r_m: npt.ArrayLike) -> FloatArray:
        """Gradient of the potential; see `GravityField`. Errors as for `potential_m2_s2`."""
        r = positions(r_m, f"field {self.name}", DEEPEST * self.radius_m)
        distance = norms(r)
        s, ratio = r[..., 2] / distance, self.radius_m / distance
        before, legendre = np.ones_like(s), s
        # Derivatives of the Legendre polynomials: P'_n = P'_(n-2) + (2 n - 1) P_(n-1).
        slope_before, slope = np.zeros_like(s), np.ones_like(s)
        scale, radial, along = ratio, np.ones_like(s), np.zeros_like(s)
        for n, j in enumerate(self.j, start=2):
            slope_before, slope = slope, slope_before + (2 * n - 1) * legendre
            before, legendre = legendre, ((2 * n - 1) * s * legendre - (n - 1) * before) / n
            scale = scale * ratio
            # Along r: -(n + 1) P_n - s P'_n, which is -P'_(n+1).
            radial = radial - j * scale * ((n + 1) * legendre + s * slope)
            along = along - j * scale * slope
        pull = self.gm_m3_s2 / distance**2
        out = np.asarray(r * (-pull * radial / distance)[..., np.newaxis])
        out[..., 2] += pull * along
        return out


def check_scale(name: object, gm_m3_s2: float, radius_m: float) -> tuple[float, float]:
    """GM and radius of a field as floats, after a look at the name and the units."""
    if not isinstance(name, str) or not name.strip() or not name.isprintable():
        raise InvalidInput(f"the name of a gravity field is a printable text, got {name!r}")
    for what, value, lowest, highest in (("gm_m3_s2", gm_m3_s2, 1e2, 1e22), ("radius_m", radius_m, 1e2, 1e10)):
        if isinstance(value, bool) or not isinstance(value, int | float | np.integer | np.floating):
            raise InvalidInput(f"field {name!r}: {what} must be a number, got {value!r:.60}")
        if not lowest <= float(value) <= highest:
            raise InvalidInput(
                f"field {name!r}: {what} is {value!r}, allowed is {lowest:g} to {highest:g}; check its units (SI)"
            )
    return float(gm_m3_s2), float(radius_m)


EARTH_ZONAL: Final = ZonalField("Earth J2..J6", EARTH_GM_TT_M3_S2, EARTH_FIELD_RADIUS_M, EARTH_ZONAL_J)
"""The Earth to J6 in TT-compatible units, zero-tide. It leaves out all that depends on longitude: degree and order 2
alone make up to 340 m2/s2 on the ground (4e-15) and 5 m2/s2 at the height of a navigation satellite (5e-17)."""
