"""Two-body orbits: Kepler's equation, elliptic and hyperbolic, and states from elements.

Vallado, Fundamentals of Astrodynamics and Applications, chapter 2 (elements, perifocal frame).
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Final

import numpy as np
import numpy.typing as npt

from ..errors import InvalidInput, NotConverged
from ..exact import FloatArray, Pair, two_product

__all__ = ["KeplerOrbit", "eccentric_anomaly", "hyperbolic_anomaly"]

_TWO_PI: Final = 2.0 * np.pi
_MOST_STEPS: Final = 100
# A step from above that is this small, or that turns back, has reached the rounding of the equation itself.
_LAST_STEP: Final = 1e-15


def eccentric_anomaly(mean_rad: npt.ArrayLike, e: npt.ArrayLike) -> FloatArray:
    """Solve Kepler's equation E - e sin E = M, 0 <= e < 1.

    Parameters
    ----------
    mean_rad, e : float array
        Mean anomaly and eccentricity; they broadcast.

    Returns
    -------
    float array
        E in the same turn as M; the equation holds to 1e-15 of max(1, |M|).

    Notes
    -----
    Newton's steps from above the root, where the function is convex, fall onto it without fail; below e = 0.1 about
    four of them.
    """
    mean, e = np.broadcast_arrays(np.asarray(mean_rad, dtype=np.float64), np.asarray(e, dtype=np.float64))
    if np.any(~((e >= 0.0) & (e < 1.0))) or not np.isfinite(mean).all():
        raise InvalidInput("Kepler's equation takes finite mean anomalies and eccentricities of 0 <= e < 1")
    turns = np.round(mean / _TWO_PI) * _TWO_PI
    rest = mean - turns
    m = np.abs(rest)
    anomaly = np.minimum(np.minimum(m + e, m / (1.0 - e)), np.pi)
    for _ in range(_MOST_STEPS):
        step = (anomaly - e * np.sin(anomaly) - m) / (1.0 - e * np.cos(anomaly))
        anomaly = np.clip(anomaly - step, 0.0, np.pi)
        if np.all(step <= _LAST_STEP * anomaly):
            break
    _check(anomaly - e * np.sin(anomaly) - m, np.ones_like(m))
    return np.asarray(turns + np.copysign(anomaly, rest))


def hyperbolic_anomaly(mean_rad: npt.ArrayLike, e: npt.ArrayLike) -> FloatArray:
    """Solve the hyperbolic form e sinh H - H = M, e > 1; see `eccentric_anomaly`."""
    mean, e = np.broadcast_arrays(np.asarray(mean_rad, dtype=np.float64), np.asarray(e, dtype=np.float64))
    if np.any(~((e > 1.0) & np.isfinite(e))) or not np.isfinite(mean).all():
        raise InvalidInput("the hyperbolic Kepler equation takes finite mean anomalies and eccentricities of e > 1")
    m = np.abs(mean)
    # Three bounds from above: sinh H >= H, sinh H - H >= H^3/6, and the equation itself with the second put in.
    cube = np.cbrt(6.0 * m)
    anomaly = np.minimum(np.minimum(m / (e - 1.0), cube), np.arcsinh((m + cube) / e))
    for _ in range(_MOST_STEPS):
        step = (e * np.sinh(anomaly) - anomaly - m) / (e * np.cosh(anomaly) - 1.0)
        anomaly = np.maximum(anomaly - step, 0.0)
        if np.all(step <= _LAST_STEP * anomaly):
            break
    _check(e * np.sinh(anomaly) - anomaly - m, np.maximum(1.0, m * anomaly))
    return np.asarray(np.copysign(anomaly, mean))


def _check(residual: FloatArray, size: FloatArray) -> None:
    """Hold the equation to 4e-15 of its largest term."""
    bad = np.asarray(~(np.abs(residual) <= 4e-15 * size))
    if np.any(bad):
        raise NotConverged(
            f"Kepler's equation did not converge for {int(bad.sum())} of {bad.size} anomalies in {_MOST_STEPS} steps "
            "(see the mask); is the eccentricity within 1e-12 of 1?",
            mask=bad,
        )


@dataclass(frozen=True, eq=False)
class KeplerOrbit:
    """A two-body orbit on fixed axes.

    Attributes
    ----------
    epoch : Pair
        Count of the epoch.
    gm_m3_s2 : float
        Mass parameter in units compatible with the scale of the epoch.
    a_m : float
        Semi-major axis: positive with 0 <= e < 1, negative with e > 1.
    e : float
        Eccentricity.
    i_rad, node_rad, periapsis_rad, mean_anomaly_rad : float
        Inclination, right ascension of the ascending node, argument of periapsis, mean anomaly at the epoch.
    """

    epoch: Pair
    gm_m3_s2: float
    a_m: float
    e: float
    i_rad: float
    node_rad: float
    periapsis_rad: float
    mean_anomaly_rad: float

    def __post_init__(self) -> None:
        values = {k: v for k, v in vars(self).items() if k != "epoch"}
        wrong = [key for key, value in values.items() if not np.isfinite(value)]
        if wrong:
            raise InvalidInput(f"orbital elements must be finite; not so: {', '.join(wrong)}")
        if self.e < 0 or self.e == 1.0:
            raise InvalidInput(f"eccentricity must be 0 <= e < 1 (ellipse) or e > 1 (hyperbola), got {self.e!r}")
        if self.a_m == 0 or (self.a_m > 0) != (self.e < 1.0):
            raise InvalidInput(
                f"semi-major axis {self.a_m!r} m does not go with eccentricity {self.e!r}: a_m is positive for an "
                "ellipse (e < 1) and negative for a hyperbola (e > 1)"
            )
        if not self.gm_m3_s2 > 0:
            raise InvalidInput(f"the mass parameter must be positive, got {self.gm_m3_s2!r} m3/s2")

    @property
    def mean_motion_rad_s(self) -> float:
        """Mean motion, rad/s."""
        return float(np.sqrt(self.gm_m3_s2 / abs(self.a_m)) / abs(self.a_m))

    def mean_anomaly(self, count: Pair) -> FloatArray:
        """Mean anomaly at counts, rad; whole turns of an ellipse are taken out, so that nothing is lost over years."""
        whole = (count[0] - self.epoch[0]).astype(np.float64)
        fraction = count[1] - self.epoch[1]
        if self.e > 1.0:
            return np.asarray(self.mean_anomaly_rad + self.mean_motion_rad_s * (whole + fraction))
        period_s = _TWO_PI / self.mean_motion_rad_s
        turns, turns_error = two_product(np.round(whole / period_s), period_s)
        rest_s = (whole - turns) - turns_error + fraction
        return np.asarray(self.mean_anomaly_rad + self.mean_motion_rad_s * rest_s)

    def state(self, count: Pair) -> tuple[FloatArray, FloatArray]:
        """Position (m) and velocity (m/s) from the centre, (n, 3) each, at 1-d counts."""
        mean = self.mean_anomaly(count)
        if self.e < 1.0:
            anomaly = eccentric_anomaly(mean, self.e)
            sine, cosine = np.sin(anomaly), np.cos(anomaly)
            flat = np.sqrt((1.0 - self.e) * (1.0 + self.e))
            x, y = self.a_m * (cosine - self.e), self.a_m * flat * sine
            rate = self.mean_motion_rad_s / (1.0 - self.e * cosine)
            vx, vy = -self.a_m * rate * sine, self.a_m * flat * rate * cosine
        else:
            anomaly = hyperbolic_anomaly(mean, self.e)
            sine, cosine = np.sinh(anomaly), np.cosh(anomaly)
            flat = np.sqrt((self.e - 1.0) * (self.e + 1.0))
            x, y = self.a_m * (cosine - self.e), -self.a_m * flat * sine
            rate = self.mean_motion_rad_s / (self.e * cosine - 1.0)
            vx, vy = self.a_m * rate * sine, -self.a_m * flat * rate * cosine
        p, q = self._axes()
        return (
            x[..., np.newaxis] * p + y[..., np.newaxis] * q,
            vx[..., np.newaxis] * p + vy[..., np.newaxis] * q,
        )

    def _axes(self) -> tuple[FloatArray, FloatArray]:
        """Unit vectors to the periapsis, and 90 degrees ahead of it."""
        sw, cw = np.sin(self.periapsis_rad), np.cos(self.periapsis_rad)
        so, co = np.sin(self.node_rad), np.cos(self.node_rad)
        si, ci = np.sin(self.i_rad), np.cos(self.i_rad)
        toward = np.array([co * cw - so * sw * ci, so * cw + co * sw * ci, sw * si])
        ahead = np.array([-co * sw - so * cw * ci, -so * sw + co * cw * ci, cw * si])
        return toward, ahead
