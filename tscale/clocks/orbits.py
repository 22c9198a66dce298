"""Clocks in orbit by closed formulas: mean rate, what eccentricity and J2 add, and the frequency to set before launch.

For planning and as a check of `compare_clocks`, which integrates the whole rate along any trajectory.

With a the semi-major axis, mu the Earth's GM, R and J2 its radius and flattening coefficient, against TT:

* mean rate L_G - 3 mu/(2 a c^2) (Ashby 2003, Living Rev. Relativity 6, 1; IERS Conventions 2010, section 10.2);
* the secular part of J2, -(7/2) (mu/(a c^2)) J2 (R/a)^2 (1 - 3/2 sin^2 i), a being the mean of the osculating values
  (Kouba 2004, GPS Solut. 8, 170; from memory, and derived anew: with r the mean radius of a near-circular orbit v^2/2 +
  U is (mu/r)(3/2 + 5/4 q) and a = r (1 + 3/2 q), q = J2 (R/a)^2 (1 - 3/2 sin^2 i));
* the eccentricity's periodic term -(2/c^2) r.v = F e sqrt(a) sin E, F = -2 sqrt(mu)/c^2 (IS-GPS-200, 20.3.3.3.3.1);
* the periodic part of J2, at half the period, of the clock beside the eccentricity term, which satellite navigation
  takes by -(2/c^2) r.v of the true orbit: -(3/2) J2 (R/a)^2 (sqrt(mu a)/c^2) sin^2 i sin 2u (Kouba 2004); of the clock
  in a near-circular orbit alone a third of it (Ashby 2003: 6.95e-15 in the frequency of a GPS satellite, 24 ps).
"""

from __future__ import annotations

from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt

from ..constants import C_M_S, EARTH_FIELD_RADIUS_M, EARTH_GM_TT_M3_S2, EARTH_ZONAL_J, L_G
from ..errors import InvalidInput
from ..exact import FloatArray
from ..trajectory.kepler import eccentric_anomaly
from .numbers import numbers

__all__ = ["OrbitRate", "eccentricity_constant_s_m05", "eccentricity_term_s", "j2_term_s", "orbit_rate"]

_C2: Final = C_M_S**2
_J2: Final = EARTH_ZONAL_J[0]


class OrbitRate(NamedTuple):
    """Mean rate of a clock in an orbit about the Earth against TT, dimensionless."""

    gravitational: FloatArray
    """L_G - mu/(a c^2): higher than the geoid, the clock runs fast."""
    kinematic: FloatArray
    """-mu/(2 a c^2): the mean of -v^2/(2 c^2)."""
    j2: FloatArray
    """Secular part of J2."""

    @property
    def total(self) -> FloatArray:
        """d(tau)/d(TT) - 1, mean over a revolution."""
        return np.asarray(self.gravitational + self.kinematic + self.j2)

    @property
    def factory_offset(self) -> FloatArray:
        """Fractional frequency to set the clock off by before launch, so that it keeps TT in orbit."""
        return np.asarray(-self.total / (1.0 + self.total))


def orbit_rate(
    a_m: npt.ArrayLike,
    i_deg: npt.ArrayLike | None = None,
    *,
    gm_m3_s2: float = EARTH_GM_TT_M3_S2,
) -> OrbitRate:
    """Mean rate of a clock in orbit, from its semi-major axis; the eccentricity does not enter.

    Parameters
    ----------
    a_m : float array
        Semi-major axis (mean of the osculating values), above 6.3e6 m.
    i_deg : float array, optional
        Inclination, degrees, for the secular part of J2; left out without it.
    gm_m3_s2 : float
        GM of the Earth.

    Raises
    ------
    InvalidInput
        Values that are not finite or out of range, with the mask.
    """
    a, inclination = numbers(a_m=a_m, i_deg=90.0 if i_deg is None else i_deg)
    _require_orbit(a)
    level = gm_m3_s2 / (a * _C2)
    j2 = np.zeros_like(a)
    if i_deg is not None:
        flat = _J2 * (EARTH_FIELD_RADIUS_M / a) ** 2 * (1.0 - 1.5 * np.sin(np.radians(inclination)) ** 2)
        j2 = -3.5 * level * flat
    return OrbitRate(np.asarray(float(L_G) - level), np.asarray(-0.5 * level), np.asarray(j2))


def eccentricity_constant_s_m05(gm_m3_s2: float = EARTH_GM_TT_M3_S2) -> float:
    """F = -2 sqrt(mu)/c^2, s/m^0.5; with mu = 3.986005e14 that of IS-GPS-200."""
    (gm,) = numbers(gm_m3_s2=gm_m3_s2)
    if not gm > 0.0:
        raise InvalidInput(f"gm_m3_s2 must be positive, got {gm_m3_s2!r}")
    return float(-2.0 * np.sqrt(gm) / _C2)


def eccentricity_term_s(
    a_m: npt.ArrayLike, e: npt.ArrayLike, mean_anomaly_deg: npt.ArrayLike, *, gm_m3_s2: float = EARTH_GM_TT_M3_S2
) -> FloatArray:
    """What a clock in an eccentric orbit is ahead of its mean rate, F e sqrt(a) sin E = -(2/c^2) r.v, s.

    Parameters
    ----------
    a_m, e, mean_anomaly_deg : float array
        Semi-major axis (m), eccentricity (below 1), and mean anomaly (degrees); they broadcast.
    gm_m3_s2 : float
        GM of the Earth.

    Raises
    ------
    InvalidInput
        Values that are not finite or out of range.
    """
    a, eccentricity, mean = numbers(a_m=a_m, e=e, mean_anomaly_deg=mean_anomaly_deg)
    _require_orbit(a)
    anomaly = eccentric_anomaly(np.radians(mean), eccentricity)
    return np.asarray(eccentricity_constant_s_m05(gm_m3_s2) * eccentricity * np.sqrt(a) * np.sin(anomaly))


def j2_term_s(
    a_m: npt.ArrayLike,
    i_deg: npt.ArrayLike,
    latitude_argument_deg: npt.ArrayLike,
    *,
    beside_eccentricity_term: bool = True,
    gm_m3_s2: float = EARTH_GM_TT_M3_S2,
) -> FloatArray:
    """Periodic part of J2 (half a revolution) in the reading of a clock in a near-circular orbit, s.

    Parameters
    ----------
    a_m, i_deg, latitude_argument_deg : float array
        Semi-major axis (m), inclination and argument of latitude u (degrees); they broadcast.
    beside_eccentricity_term : bool
        True: what is left once -(2/c^2) r.v of the true orbit, which J2 makes breathe, is taken off. False: all that J2
        does to the clock, a third of it.
    gm_m3_s2 : float
        GM of the Earth.

    Raises
    ------
    InvalidInput
        Values that are not finite or out of range.
    """
    a, inclination, u = numbers(a_m=a_m, i_deg=i_deg, latitude_argument_deg=latitude_argument_deg)
    _require_orbit(a)
    size = 1.5 * _J2 * (EARTH_FIELD_RADIUS_M / a) ** 2 * np.sqrt(gm_m3_s2 * a) / _C2
    share = 1.0 if beside_eccentricity_term else 1.0 / 3.0
    return np.asarray(-share * size * np.sin(np.radians(inclination)) ** 2 * np.sin(np.radians(2.0 * u)))


def _require_orbit(a: FloatArray) -> None:
    bad = np.asarray(~((a > 6.3e6) & (a < 1e10)))
    if np.any(bad):
        raise InvalidInput(
            f"{int(np.count_nonzero(bad))} of {bad.size} semi-major axes are not those of orbits about the Earth, "
            "6.3e6 to 1e10 m (are these kilometres, or heights?)",
            mask=bad,
        )
