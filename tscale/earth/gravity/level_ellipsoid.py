"""The field of a rotating level ellipsoid, in closed formulas.

An ellipsoid of revolution that is an equipotential of its own gravity and rotation is given by four constants: its
radius a, GM, the angular velocity and either J2 (GRS80) or the flattening (WGS84). All else follows.

Sources: Moritz 2000, *Geodetic Reference System 1980*, J. Geodesy 74, 128 (there the formulas for e^2, U0 and normal
gravity); Heiskanen & Moritz 1967, *Physical Geodesy*, chapters 2 and 4 (equation numbers below); NIMA TR8350.2.
"""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property
from typing import Final

import numpy as np
import numpy.typing as npt

from ...errors import InvalidInput, NotConverged
from ...exact import FloatArray
from .arguments import latitudes_and, positions

__all__ = ["HIGHEST_M", "LOWEST_M", "TOO_HIGH", "NormalField"]

LOWEST_M: Final = -12_000.0
HIGHEST_M: Final = 50_000.0
"""Heights for which expansions to second order are offered, m."""

TOO_HIGH: Final = "above that use potential_m2_s2 of the normal field or a GravityField"


@dataclass(frozen=True)
class NormalField:
    """The field of a rotating level ellipsoid; `GRS80` and `WGS84` are at hand, others by `from_j2`, `from_flattening`.

    It is a `GravityField` too: `potential_m2_s2` and `acceleration_m_s2` give the gravitational part in closed form.

    Parameters
    ----------
    name : str
        Name for ledgers and messages.
    a_m : float
        Equatorial radius, m.
    gm_m3_s2 : float
        GM of the body with its atmosphere, m3/s2.
    omega_rad_s : float
        Angular velocity, rad/s.
    e2 : float
        First eccentricity squared, (a^2 - b^2)/a^2, above 0 and below 0.4.

    Raises
    ------
    InvalidInput
        Constants that are not finite, or not those of an oblate body.
    """

    name: str
    a_m: float
    gm_m3_s2: float
    omega_rad_s: float
    e2: float

    def __post_init__(self) -> None:
        if not isinstance(self.name, str) or not self.name.strip() or not self.name.isprintable():
            raise InvalidInput(f"the name of a normal field is a printable text, got {self.name!r}")
        for what, lowest, highest in (
            ("a_m", 1e3, 1e10),
            ("gm_m3_s2", 1e6, 1e22),
            ("omega_rad_s", 0.0, 1e-2),
            ("e2", 1e-8, 0.4),
        ):
            value = getattr(self, what)
            if isinstance(value, bool) or not isinstance(value, int | float | np.integer | np.floating):
                raise InvalidInput(f"normal field {self.name!r}: {what} must be a number, got {value!r}")
            if not lowest <= float(value) <= highest:
                raise InvalidInput(
                    f"normal field {self.name!r}: {what} is {value!r}, allowed is {lowest:g} to {highest:g}; check its "
                    "units (SI)"
                )
            object.__setattr__(self, what, float(value))

    @classmethod
    def from_flattening(
        cls, name: str, *, a_m: float, inverse_flattening: float, gm_m3_s2: float, omega_rad_s: float
    ) -> NormalField:
        """Make one from its radius and 1/f, as WGS84 is defined."""
        if not 4.0 < inverse_flattening < 1e8:
            raise InvalidInput(
                f"normal field {name!r}: inverse_flattening is {inverse_flattening!r}, allowed is 1/f from 4 to 1e8"
            )
        f = 1.0 / inverse_flattening
        return cls(name, a_m, gm_m3_s2, omega_rad_s, f * (2.0 - f))

    @classmethod
    def from_j2(cls, name: str, *, a_m: float, j2: float, gm_m3_s2: float, omega_rad_s: float) -> NormalField:
        """Make one from its radius and J2, as GRS80 is defined: e^2 solves its equation with J2 (Moritz 2000).

        e^2 = 3 J2 + (4/15) (omega^2 a^3/GM) e^3/(2 q0), a contraction for every body that holds together.

        Raises
        ------
        NotConverged
            For constants that belong to no level ellipsoid.
        """
        if not 0.0 < j2 < 0.1:
            raise InvalidInput(f"normal field {name!r}: j2 is {j2!r}, allowed is above 0 and below 0.1")
        spin = omega_rad_s**2 * a_m**3 / gm_m3_s2
        e2, last = 3.0 * j2 + spin, 0.0
        for _ in range(100):
            if not 0.0 < e2 < 0.5:
                break
            if abs(e2 - last) <= 2e-16 * e2:
                return cls(name, a_m, gm_m3_s2, omega_rad_s, e2)
            last = e2
            e2 = 3.0 * j2 + (4.0 / 15.0) * spin * e2**1.5 / (2.0 * float(_q(np.sqrt(e2 / (1.0 - e2)))))
        raise NotConverged(f"normal field {name!r}: no level ellipsoid has J2 = {j2} at this radius, GM and rotation")

    # ---- derived constants -----------------------------------------------------------------------

    @cached_property
    def flattening(self) -> float:
        """(a - b)/a."""
        return self.e2 / (1.0 + math.sqrt(1.0 - self.e2))

    @cached_property
    def b_m(self) -> float:
        """Polar radius, m."""
        return self.a_m * math.sqrt(1.0 - self.e2)

    @cached_property
    def linear_eccentricity_m(self) -> float:
        """E = sqrt(a^2 - b^2), m."""
        return self.a_m * math.sqrt(self.e2)

    @cached_property
    def m(self) -> float:
        """omega^2 a^2 b/GM."""
        return self.omega_rad_s**2 * self.a_m**2 * self.b_m / self.gm_m3_s2

    @cached_property
    def _e_prime(self) -> float:
        return math.sqrt(self.e2 / (1.0 - self.e2))

    @cached_property
    def _q0(self) -> float:
        return float(_q(np.asarray(self._e_prime)))

    @cached_property
    def u0_m2_s2(self) -> float:
        """Normal potential of gravity on the ellipsoid, m2/s2 (H&M 2-61)."""
        return self.gm_m3_s2 / self.linear_eccentricity_m * math.atan(self._e_prime) + (
            self.omega_rad_s**2 * self.a_m**2 / 3.0
        )

    @cached_property
    def j2(self) -> float:
        """Dynamical form factor (H&M 2-90)."""
        return self.e2 / 3.0 * (1.0 - 2.0 / 15.0 * self.m * self._e_prime / self._q0)

    @cached_property
    def gamma_e_m_s2(self) -> float:
        """Normal gravity at the equator, m/s2 (H&M 2-73)."""
        bulge = self.m * self._e_prime * float(_q_prime(np.asarray(self._e_prime))) / self._q0
        return self.gm_m3_s2 / (self.a_m * self.b_m) * (1.0 - self.m - bulge / 6.0)

    @cached_property
    def gamma_p_m_s2(self) -> float:
        """Normal gravity at the poles, m/s2 (H&M 2-74)."""
        bulge = self.m * self._e_prime * float(_q_prime(np.asarray(self._e_prime))) / self._q0
        return self.gm_m3_s2 / self.a_m**2 * (1.0 + bulge / 3.0)

    @cached_property
    def k(self) -> float:
        """Constant of Somigliana's formula, b gamma_p/(a gamma_e) - 1."""
        return self.b_m * self.gamma_p_m_s2 / (self.a_m * self.gamma_e_m_s2) - 1.0

    def zonal_coefficients(self, max_degree: int) -> tuple[float, ...]:
        """J2, J3 ... up to a degree, the odd ones 0 (H&M 2-92), as `ZonalField` takes them."""
        if isinstance(max_degree, bool) or not isinstance(max_degree, int) or not 2 <= max_degree <= 100:
            raise InvalidInput(f"max_degree must be an integer of 2 to 100, got {max_degree!r}")
        return tuple(self._zonal(degree) for degree in range(2, max_degree + 1))

    def _zonal(self, degree: int) -> float:
        if degree % 2:
            return 0.0
        n = degree // 2
        size = 3.0 * self.e2**n / ((2 * n + 1) * (2 * n + 3)) * (1.0 - n + 5.0 * n * self.j2 / self.e2)
        return -size if n % 2 == 0 else size

    # ---- gravity by latitude and height ----------------------------------------------------------

    def gravity_m_s2(self, lat_deg: npt.ArrayLike, height_m: npt.ArrayLike = 0.0) -> FloatArray:
        """Normal gravity at a geodetic latitude and a height above the ellipsoid.

        Somigliana's closed formula on the ellipsoid, gamma0 = gamma_e (1 + k sin^2 phi)/sqrt(1 - e^2 sin^2 phi), and
        to second order in the height gamma0 [1 - 2 (1 + f + m - 2 f sin^2 phi) h/a + 3 (h/a)^2] (H&M 2-123).

        Parameters
        ----------
        lat_deg : float array
            Geodetic latitude within +-90, degrees.
        height_m : float array
            Height above the ellipsoid, -12 km to 50 km, m; broadcasts with the latitude.

        Returns
        -------
        float array
            m/s2. Left out: 7e-7 m/s2 at 10 km, 2e-5 m/s2 at 50 km.

        Raises
        ------
        InvalidInput
            Out of range, with the mask.
        """
        sin2, height = latitudes_and(lat_deg, height_m, "height_m", LOWEST_M, HIGHEST_M, TOO_HIGH)
        ratio = height / self.a_m
        return np.asarray(self.somigliana_m_s2(sin2) * (1.0 - 2.0 * self.slope(sin2) * ratio + 3.0 * ratio * ratio))

    def somigliana_m_s2(self, sin2: FloatArray) -> FloatArray:
        """Gravity on the ellipsoid by sin^2 of the geodetic latitude, m/s2."""
        return np.asarray(self.gamma_e_m_s2 * (1.0 + self.k * sin2) / np.sqrt(1.0 - self.e2 * sin2))

    def slope(self, sin2: FloatArray) -> FloatArray:
        """1 + f + m - 2 f sin^2 phi: half the decrease of gravity with h/a."""
        return np.asarray(1.0 + self.flattening + self.m - 2.0 * self.flattening * sin2)

    # ---- the closed field outside ----------------------------------------------------------------

    def potential_m2_s2(self, r_m: npt.ArrayLike) -> FloatArray:
        """Gravitational potential (without that of the rotation), positive, at body-fixed positions (..., 3), m2/s2.

        Exact outside the ellipsoid (H&M 2-62), and its smooth continuation down to 0.95 b.

        Raises
        ------
        InvalidInput
            Not finite, not vectors, or deeper than that.
        """
        r = positions(r_m, f"normal field {self.name}", 0.95 * self.b_m)
        _, x, s2 = self._spheroidal(r)
        e = self.linear_eccentricity_m
        bulge = 0.5 * (self.omega_rad_s * self.a_m) ** 2 / self._q0
        return np.asarray(self.gm_m3_s2 / e * np.arctan(x) + bulge * _q(x) * (s2 - 1.0 / 3.0))

    def acceleration_m_s2(self, r_m: npt.ArrayLike) -> FloatArray:
        """Gravitational acceleration: the gradient of `potential_m2_s2`, (..., 3), m/s2; errors as there."""
        r = positions(r_m, f"normal field {self.name}", 0.95 * self.b_m)
        u, x, s2 = self._spheroidal(r)
        e, z = self.linear_eccentricity_m, r[..., 2]
        bulge = 0.5 * (self.omega_rad_s * self.a_m) ** 2 / self._q0
        wide = u * u + e * e
        # d/du at constant z/u, with dq/dx = q'(x)/(1 + x^2) and dx/du = -E/u^2; then d/d(z/u).
        along_u = -self.gm_m3_s2 / wide - bulge * _q_prime(x) * e / wide * (s2 - 1.0 / 3.0)
        along_s = 2.0 * bulge * _q(x) * (z / u)
        total = along_u - along_s * z / (u * u)
        # du/dr from (x^2 + y^2)/(u^2 + E^2) + z^2/u^2 = 1.
        flat = (r[..., 0] ** 2 + r[..., 1] ** 2) / wide**2 + z * z / u**4
        out = np.empty_like(r)
        out[..., :2] = r[..., :2] * (total / (wide * u * flat))[..., np.newaxis]
        out[..., 2] = total * z / (u**3 * flat) + along_s / u
        return out

    def centrifugal_m2_s2(self, r_m: npt.ArrayLike) -> FloatArray:
        """Potential of the rotation, omega^2 (x^2 + y^2)/2, m2/s2, at body-fixed positions (..., 3)."""
        r = positions(r_m, f"normal field {self.name}")
        return np.asarray(0.5 * self.omega_rad_s**2 * (r[..., 0] ** 2 + r[..., 1] ** 2))

    def gravity_potential_m2_s2(self, r_m: npt.ArrayLike) -> FloatArray:
        """Normal potential U of gravity: gravitation and rotation, m2/s2; U0 on the ellipsoid."""
        return np.asarray(self.potential_m2_s2(r_m) + self.centrifugal_m2_s2(r_m))

    def _spheroidal(self, r: FloatArray) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Polar radius u of the confocal ellipsoid through each point, E/u, and sin^2 of the reduced latitude."""
        e2, z2 = self.linear_eccentricity_m**2, r[..., 2] ** 2
        w = r[..., 0] ** 2 + r[..., 1] ** 2 + z2 - e2
        u2 = np.asarray(0.5 * (w + np.sqrt(w * w + 4.0 * e2 * z2)))
        u = np.sqrt(u2)
        return u, np.asarray(self.linear_eccentricity_m / u), np.asarray(z2 / u2)


def _terms(x: FloatArray) -> int:
    """Terms after which powers of x^2 have left float64."""
    largest = float(np.max(x * x, initial=1e-12))
    return 2 + math.ceil(-38.0 / math.log(min(largest, 0.9)))


def _q(x: FloatArray) -> FloatArray:
    """Sum q = [(1 + 3/x^2) atan x - 3/x]/2 (H&M 2-58), which as written loses six digits to cancellation.

    By series: q = 2 sum (-1)^(n+1) n x^(2n+1)/((2n+1)(2n+3)).
    """
    square, total = np.asarray(x * x), np.zeros_like(x)
    for n in range(_terms(x), 0, -1):
        total = n / ((2 * n + 1) * (2 * n + 3)) - square * total
    return np.asarray(2.0 * total * square * x)


def _q_prime(x: FloatArray) -> FloatArray:
    """Sum q' = 3 (1 + 1/x^2)(1 - atan(x)/x) - 1 (H&M 2-67) by its series, 6 sum (-1)^(n+1) x^(2n)/((2n+1)(2n+3))."""
    square, total = np.asarray(x * x), np.zeros_like(x)
    for n in range(_terms(x), 0, -1):
        total = 1.0 / ((2 * n + 1) * (2 * n + 3)) - square * total
    return np.asarray(6.0 * total * square)
