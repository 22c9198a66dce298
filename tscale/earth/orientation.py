"""The rotations between the terrestrial and the celestial system, in closed form, component by component.

No matrix is built per instant: that keeps a rotation of an array of instants near the cost of its sine and cosine.
Equations: IERS Technical Note 36, chapter 5.
"""

from __future__ import annotations

from typing import Any, Final, NamedTuple

import numpy as np

from ..exact import FloatArray

__all__ = ["Orientation"]

_BLOCK: Final = 8192


class Orientation(NamedTuple):
    """The orientation of the Earth at some instants; every member has their shape.

    Attributes
    ----------
    cip_x, cip_y : float array
        Celestial pole X, Y with dX, dY added (dimensionless).
    cip_x_rate, cip_y_rate : float array
        Their rates, 1/s.
    angle_rad, angle_rate_rad_s : float array
        Angle about the pole from the terrestrial to the celestial intermediate frame with both origins counted,
        ERA - s + s', and its rate.
    pole_x_rad, pole_y_rad : float array
        Pole of the ITRS, xp and yp.
    pole_x_rate_rad_s, pole_y_rate_rad_s : float array
        Their rates.
    """

    cip_x: FloatArray
    cip_y: FloatArray
    cip_x_rate: FloatArray
    cip_y_rate: FloatArray
    angle_rad: FloatArray
    angle_rate_rad_s: FloatArray
    pole_x_rad: FloatArray
    pole_y_rad: FloatArray
    pole_x_rate_rad_s: FloatArray
    pole_y_rate_rad_s: FloatArray

    def celestial(self, r_m: FloatArray) -> FloatArray:
        """ITRS vectors (..., 3) on the GCRS axes."""
        sine, cosine = self._turned()
        return _stack(*_pole_up(self, *_spin(sine, cosine, *_terrestrial_up(self, *_parts(r_m)))))

    def terrestrial(self, r_m: FloatArray) -> FloatArray:
        """GCRS vectors (..., 3) on the ITRS axes."""
        sine, cosine = self._turned()
        return _stack(*_terrestrial_down(self, *_spin(-sine, cosine, *_pole_down(self, *_parts(r_m)))))

    def celestial_state(self, r_m: FloatArray, v_m_s: FloatArray | None = None) -> tuple[FloatArray, FloatArray]:
        """Position and velocity on the GCRS axes; `v_m_s` is the velocity relative to the ITRS (None: at rest)."""
        shape, size = np.shape(self.angle_rad), np.size(self.angle_rad)
        if size <= _BLOCK or r_m.ndim > 1 or v_m_s is not None:
            return self._celestial_state(r_m, v_m_s)
        # One place at many instants, a block of which stays in the processor's cache: twice as fast.
        flat = Orientation(*(np.broadcast_to(part, shape).reshape(-1) for part in self))
        position, velocity = np.empty((size, 3)), np.empty((size, 3))
        for i in range(0, size, _BLOCK):
            part = slice(i, i + _BLOCK)
            position[part], velocity[part] = Orientation(*(column[part] for column in flat))._celestial_state(r_m, None)
        return position.reshape(*shape, 3), velocity.reshape(*shape, 3)

    def _celestial_state(self, r_m: FloatArray, v_m_s: FloatArray | None) -> tuple[FloatArray, FloatArray]:
        parts = _terrestrial_up(self, *_parts(r_m))
        vx, vy, vz = _turning(self, *parts)
        if v_m_s is not None:
            wx, wy, wz = _terrestrial_up(self, *_parts(v_m_s))
            vx, vy, vz = vx + wx, vy + wy, vz + wz
        sine, cosine = self._turned()
        x, y, z = _spin(sine, cosine, *parts)
        vx, vy, vz = _pole_up(self, *_spin(sine, cosine, vx, vy, vz))
        mx, my, mz = _pole_up_rate(self, x, y, z)
        return _stack(*_pole_up(self, x, y, z)), _stack(vx + mx, vy + my, vz + mz)

    def terrestrial_state(self, r_m: FloatArray, v_m_s: FloatArray) -> tuple[FloatArray, FloatArray]:
        """Position and velocity relative to the ITRS; the inverse of `celestial_state`."""
        parts = _parts(r_m)
        vx, vy, vz = _pole_down(self, *_parts(v_m_s))
        mx, my, mz = _pole_down_rate(self, *parts)
        sine, cosine = self._turned()
        x, y, z = _spin(-sine, cosine, *_pole_down(self, *parts))
        vx, vy, vz = _spin(-sine, cosine, vx + mx, vy + my, vz + mz)
        wx, wy, wz = _turning(self, x, y, z)
        return _stack(*_terrestrial_down(self, x, y, z)), _stack(*_terrestrial_down(self, vx - wx, vy - wy, vz - wz))

    def _turned(self) -> tuple[Any, Any]:
        """Sine and cosine of the angle about the pole."""
        return np.sin(self.angle_rad), np.cos(self.angle_rad)


def _parts(vectors: FloatArray) -> tuple[Any, Any, Any]:
    return vectors[..., 0], vectors[..., 1], vectors[..., 2]


def _stack(x: Any, y: Any, z: Any) -> FloatArray:
    shape = np.broadcast_shapes(np.shape(x), np.shape(y), np.shape(z))
    out = np.empty((*shape, 3))
    out[..., 0], out[..., 1], out[..., 2] = x, y, z
    return out


def _sine_cosine(angle: FloatArray) -> tuple[Any, Any]:
    """Sine and cosine of the pole's small angles, to the last bit below 1e-3 rad (200 arcsec), without libm."""
    square = angle * angle
    return angle * (1.0 - square / 6.0), 1.0 - square * (0.5 - square / 24.0)


def _terrestrial_up(o: Orientation, x: Any, y: Any, z: Any) -> tuple[Any, Any, Any]:
    """R2(xp) R1(yp)."""
    sine_x, cosine_x = _sine_cosine(o.pole_x_rad)
    sine_y, cosine_y = _sine_cosine(o.pole_y_rad)
    y, z = cosine_y * y + sine_y * z, cosine_y * z - sine_y * y
    return cosine_x * x - sine_x * z, y, sine_x * x + cosine_x * z


def _terrestrial_down(o: Orientation, x: Any, y: Any, z: Any) -> tuple[Any, Any, Any]:
    sine_x, cosine_x = _sine_cosine(o.pole_x_rad)
    sine_y, cosine_y = _sine_cosine(o.pole_y_rad)
    x, z = cosine_x * x + sine_x * z, cosine_x * z - sine_x * x
    return x, cosine_y * y - sine_y * z, sine_y * y + cosine_y * z


def _turning(o: Orientation, x: Any, y: Any, z: Any) -> tuple[Any, Any, Any]:
    """Velocity of a point at rest on the ground that `_terrestrial_up` brought to (x, y, z), on the same axes.

    The spin about z, and the drift of the pole: the derivative of R2(xp) R1(yp) by xp and yp, with sin xp = xp and
    cos xp = 1 beside it (1e-12 of 1e-6 m/s).
    """
    wz = o.angle_rate_rad_s - o.pole_x_rad * o.pole_y_rate_rad_s
    wx, wy = -o.pole_y_rate_rad_s, -o.pole_x_rate_rad_s
    return wy * z - wz * y, wz * x - wx * z, wx * y - wy * x


def _spin(sine: Any, cosine: Any, x: Any, y: Any, z: Any) -> tuple[Any, Any, Any]:
    """R3(-angle)."""
    return cosine * x - sine * y, sine * x + cosine * y, z


# Q(X, Y, s) = M(X, Y) R3(s), TN36 eq. 5.10 with Z = sqrt(1 - X^2 - Y^2) and a = 1/(1 + Z); R3(s) is in the angle.


def _pole_up(o: Orientation, x: Any, y: Any, z: Any) -> tuple[Any, Any, Any]:
    """M(X, Y)."""
    big_z = np.sqrt(1.0 - (o.cip_x * o.cip_x + o.cip_y * o.cip_y))
    along = o.cip_x * x + o.cip_y * y
    lift = z - along / (1.0 + big_z)
    return x + o.cip_x * lift, y + o.cip_y * lift, big_z * z - along


def _pole_down(o: Orientation, x: Any, y: Any, z: Any) -> tuple[Any, Any, Any]:
    big_z = np.sqrt(1.0 - (o.cip_x * o.cip_x + o.cip_y * o.cip_y))
    along = o.cip_x * x + o.cip_y * y
    lift = z + along / (1.0 + big_z)
    return x - o.cip_x * lift, y - o.cip_y * lift, big_z * z + along


def _pole_terms(o: Orientation, x: Any, y: Any) -> tuple[Any, Any, Any, Any, Any]:
    """Give a, a', Z', X x + Y y, and the derivative of the last at fixed x, y."""
    big_z = np.sqrt(1.0 - (o.cip_x * o.cip_x + o.cip_y * o.cip_y))
    z_rate = -(o.cip_x * o.cip_x_rate + o.cip_y * o.cip_y_rate) / big_z
    a = 1.0 / (1.0 + big_z)
    return a, -z_rate * a * a, z_rate, o.cip_x * x + o.cip_y * y, o.cip_x_rate * x + o.cip_y_rate * y


def _pole_up_rate(o: Orientation, x: Any, y: Any, z: Any) -> tuple[Any, Any, Any]:
    """Apply M': what precession and nutation add to a velocity."""
    a, a_rate, z_rate, along, along_rate = _pole_terms(o, x, y)
    lift, lift_rate = z - a * along, -a_rate * along - a * along_rate
    return (
        o.cip_x_rate * lift + o.cip_x * lift_rate,
        o.cip_y_rate * lift + o.cip_y * lift_rate,
        z_rate * z - along_rate,
    )


def _pole_down_rate(o: Orientation, x: Any, y: Any, z: Any) -> tuple[Any, Any, Any]:
    """Apply the transposed M'."""
    a, a_rate, z_rate, along, along_rate = _pole_terms(o, x, y)
    lift, lift_rate = z + a * along, a_rate * along + a * along_rate
    return (
        -o.cip_x_rate * lift - o.cip_x * lift_rate,
        -o.cip_y_rate * lift - o.cip_y * lift_rate,
        z_rate * z + along_rate,
    )
