"""Tide of the solid Earth: how far the Moon and the Sun move a place on the ground (IERS Conventions 2010, 7.1.1).

Both steps of the conventions are here. Step 1: degree 2 with Love numbers that depend on latitude (eqs. 7.2, 7.5),
degree 3 (eq. 7.6), the parts of h and l that lag (eqs. 7.10, 7.11), and those of l that depend on latitude within
the once- and twice-daily tides (eqs. 7.8, 7.9). Step 2: what single lines add (`tides_lines`).

The displacement is the whole one, with its permanent part (up to 0.12 m at the poles): positions of the ITRF are
"conventional tide free", from which this leads to where the ground is (section 7.1.1, "instantaneous").
Left out are the load of the ocean's tides (up to some 5 cm at a coast), the pole tide (up to 2.5 cm) and the weight of
the air (1 cm).

The work is done on three axes that turn with the place: out from the Earth's axis through the meridian, east, and along
the axis. Each is an orthonormal set, so that vectors of the ITRS and the GCRS are brought to them alike.
"""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, Final, NamedTuple

import numpy as np
import numpy.typing as npt

from ..errors import InvalidInput
from ..exact import FloatArray, Pair
from .orientation import Orientation
from .rotation import era_rad, orientation
from .tides_lines import line_sums, line_sums_table

if TYPE_CHECKING:
    from ..ephemeris import Ephemeris
    from ..tables.reference import ReferenceData

__all__ = ["solid_tide_m", "tidal_site_state"]

Parts = tuple[Any, Any, Any]
Motion = tuple[Parts, Parts]

# Constants of TN36 section 7.1.1 and its routine; bodies by their mass in Earths.
_MASS_RATIO: Final = {"moon": 0.0123000371, "sun": 332946.0482}
_RADIUS_M: Final = 6378136.6
_H0, _H2, _L0, _L2 = 0.6078, -0.0006, 0.0847, 0.0002
_H3, _L3 = 0.292, 0.015
_H_LAG_DAY, _L_LAG_DAY = -0.0025, -0.0007
_H_LAG_HALF, _L_LAG_HALF = -0.0022, -0.0007
_L1_DAY, _L1_HALF = 0.0012, 0.0024
_SUN_TURN_RAD_S: Final = (0.0, -1.99099e-7 * 0.397777, 1.99099e-7 * 0.917482)  # a year, about the ecliptic's pole
_BLOCK: Final = 4096


class _Place(NamedTuple):
    """Geocentric latitude and longitude of a place."""

    sine: Any
    cosine: Any
    lon_rad: Any

    @classmethod
    def of(cls, r_m: FloatArray) -> _Place:
        across = np.hypot(r_m[..., 0], r_m[..., 1])
        radius = np.hypot(across, r_m[..., 2])
        return cls(r_m[..., 2] / radius, across / radius, np.arctan2(r_m[..., 1], r_m[..., 0]))


def solid_tide_m(
    r_itrs_m: npt.ArrayLike, moon_itrs_m: npt.ArrayLike, sun_itrs_m: npt.ArrayLike, tt: Pair, ut1: Pair
) -> FloatArray:
    """Displacement of places on the ground, for positions of Moon and Sun that are at hand.

    `Site(..., solid_tide=True)` does all this by itself, and faster.

    Parameters
    ----------
    r_itrs_m : float array (..., 3)
        Place, m, on the ground.
    moon_itrs_m, sun_itrs_m : float array (..., 3)
        Geocentric positions on the axes of the ITRS, m; 1e-6 of them is 1 um.
    tt, ut1 : Pair
        Counts of the date.

    Returns
    -------
    float array, broadcast shape + (3,)
        ITRS components, m, to be added to a tide-free position.

    Raises
    ------
    InvalidInput
        For vectors that have no three components on their last axis or are not finite.
    """
    place_m, moon, sun = (_vectors(v, w) for v, w in ((r_itrs_m, "place"), (moon_itrs_m, "Moon"), (sun_itrs_m, "Sun")))
    place = _Place.of(place_m)
    sine, cosine = np.sin(place.lon_rad), np.cos(place.lon_rad)
    days = [(np.asarray(count[0], dtype=np.int64) + np.asarray(count[1])) / 86400.0 for count in (tt, ut1)]
    bodies: dict[str, Motion] = {}
    for name, (x, y, z) in (("moon", np.moveaxis(moon, -1, 0)), ("sun", np.moveaxis(sun, -1, 0))):
        bodies[name] = (x * cosine + y * sine, y * cosine - x * sine, z), (0.0, 0.0, 0.0)
    angle = era_rad(ut1) + place.lon_rad
    (out, east, along), _ = _displacement(place, bodies, np.sin(angle), np.cos(angle), 0.0, line_sums(*days))
    parts = np.broadcast_arrays(out * cosine - east * sine, out * sine + east * cosine, along)
    return np.stack(parts, axis=-1)


def tidal_site_state(
    r_itrs_m: FloatArray, place_m: FloatArray, tt: Pair, reference: ReferenceData
) -> tuple[FloatArray, FloatArray]:
    """Position and velocity in the GCRS of a place at rest on the ground that the tide moves.

    Parameters
    ----------
    r_itrs_m : float array (3,) or (..., 3)
        Tide-free position at each date, m.
    place_m : float array (3,)
        Where the tide is computed, m: the position at any date will do.
    tt : Pair
        TT count, any shape.
    reference : ReferenceData
        Its Earth orientation, and its ephemeris for Moon and Sun.

    Returns
    -------
    r_m, v_m_s : float array, shape of `tt` + (3,)
        The velocity is the derivative of the position by TT, with the rate of the tide (up to 4e-5 m/s), which is
        worked out in closed form but for 5e-9 m/s (see `_sun_velocity` and `_by_line`).

    Raises
    ------
    OutOfSpan
        Where Earth orientation or ephemeris do not reach.

    Notes
    -----
    TT stands for the TDB of the ephemeris (2 ms: 2 m at the Moon), and the pole of rotation for that of the ITRS (2e-6
    rad): 1 um of the tide each at most.
    """
    whole, fraction = np.broadcast_arrays(np.asarray(tt[0], dtype=np.int64), np.asarray(tt[1], dtype=np.float64))
    turned = orientation((whole, fraction), reference)
    position, velocity = turned.celestial_state(r_itrs_m)
    moon, moon_v, sun = _moon_and_sun(reference.ephemeris, (whole, fraction))
    flat = Orientation(*(np.broadcast_to(part, whole.shape).reshape(-1) for part in turned))
    place = _Place.of(place_m)
    flat_r, flat_v = position.reshape(-1, 3), velocity.reshape(-1, 3)
    lines = line_sums_table((whole.reshape(-1), fraction.reshape(-1)))
    for i in range(0, whole.size, _BLOCK):
        part = slice(i, i + _BLOCK)
        here, passing, there = (_columns(v.reshape(-1, 3)[part]) for v in (moon, moon_v, sun))
        around = (here, passing), (there, _sun_velocity(there))
        turn = Orientation(*(column[part] for column in flat))
        moved, drift = _on_celestial_axes(place, turn, around, lines[:, part])
        for k in range(3):
            flat_r[part, k] += moved[k]
            flat_v[part, k] += drift[k]
    return flat_r.reshape(position.shape), flat_v.reshape(velocity.shape)


def _moon_and_sun(ephemeris: Ephemeris, tdb: Pair) -> tuple[FloatArray, FloatArray, FloatArray]:
    """Geocentric Moon, its velocity, and geocentric Sun."""
    if 3 not in ephemeris.bodies:
        moon, moon_v = ephemeris.state("moon", tdb, "earth")
        return moon, moon_v, ephemeris.position("sun", tdb, "earth")
    # The Earth stands opposite the Moon as seen from their barycentre: that spares half of the records to be read.
    moon, moon_v = ephemeris.state("moon", tdb, 3)
    sun = ephemeris.position("sun", tdb, 3)
    ratio = _MASS_RATIO["moon"]
    sun += ratio * moon
    return (1.0 + ratio) * moon, (1.0 + ratio) * moon_v, sun


def _sun_velocity(sun: Parts) -> Parts:
    """Velocity of the Sun, were its path a circle in the ecliptic: 1.7 % of it is 3e-9 m/s of the tide."""
    x, y, z = _SUN_TURN_RAD_S
    return y * sun[2] - z * sun[1], z * sun[0] - x * sun[2], x * sun[1] - y * sun[0]


def _on_celestial_axes(place: _Place, o: Orientation, around: tuple[Motion, Motion], lines: FloatArray) -> Motion:
    """Displacement and its rate on the axes of the GCRS, from the motions of Moon and Sun on these axes."""
    angle = o.angle_rad + place.lon_rad
    sine, cosine = np.sin(angle), np.cos(angle)
    # The three axes: M(X, Y) of `orientation`, applied to unit vectors, with Z = 1 - (X^2 + Y^2) / 2.
    x, y = o.cip_x, o.cip_y
    along_out, along_east = x * cosine + y * sine, y * cosine - x * sine
    out = (cosine - 0.5 * x * along_out, sine - 0.5 * y * along_out, -along_out)
    east = (-sine - 0.5 * x * along_east, cosine - 0.5 * y * along_east, -along_east)
    up = (x, y, 1.0 - 0.5 * (x * x + y * y))
    turn = o.angle_rate_rad_s
    bodies: dict[str, Motion] = {}
    for name, (where, speed) in zip(("moon", "sun"), around, strict=True):
        here = _dot(where, out), _dot(where, east), _dot(where, up)
        rate = _dot(speed, out) + turn * here[1], _dot(speed, east) - turn * here[0], _dot(speed, up)
        bodies[name] = here, rate
    (p, e, z), (dp, de, dz) = _displacement(place, bodies, sine, cosine, turn, lines)
    dp, de = dp - turn * e, de + turn * p
    moved = tuple(p * out[k] + e * east[k] + z * up[k] for k in range(3))
    drift = tuple(dp * out[k] + de * east[k] + dz * up[k] for k in range(3))
    return (moved[0], moved[1], moved[2]), (drift[0], drift[1], drift[2])


def _displacement(
    place: _Place, bodies: dict[str, Motion], sine: Any, cosine: Any, turn: Any, sums: FloatArray
) -> Motion:
    """Displacement and rate, both steps: out, east, along. `sine` and `cosine` are of the Earth's turn + longitude."""
    sphi, cphi = place.sine, place.cosine
    moved: list[Any] = [0.0] * 3
    drift: list[Any] = [0.0] * 3
    # Of both bodies together: z out, z east, out^2 - east^2, 2 out east (orders 1 and 2 of the tide); and their rates.
    product: list[Any] = [0.0] * 4
    product_rate: list[Any] = [0.0] * 4
    for name, (where, speed) in bodies.items():
        inverse = 1.0 / np.sqrt(_dot(where, where))
        f2 = _MASS_RATIO[name] * _RADIUS_M * (_RADIUS_M * inverse) ** 3
        n = no, ne, nz = tuple(part * inverse for part in where)
        v = tuple(part * inverse for part in speed)
        fall = _dot(n, v)  # r'/r
        v = vo, ve, vz = tuple(part - own * fall for part, own in zip(v, n, strict=True))
        height, height_rate = cphi * no + sphi * nz, cphi * vo + sphi * vz
        toward, toward_rate, lift, lift_rate = _in_phase(place, f2, _RADIUS_M * inverse, fall, height, height_rate)
        for k, up in enumerate((cphi, 0.0, sphi)):
            moved[k] = moved[k] + (toward * n[k] + lift * up)
            drift[k] = drift[k] + (toward_rate * n[k] + toward * v[k] + lift_rate * up)
        fno, fne = f2 * no, f2 * ne
        own_products = fno * nz, fne * nz, fno * no - fne * ne, 2.0 * fno * ne
        changes = (
            fno * vz + f2 * nz * vo,
            fne * vz + f2 * nz * ve,
            2.0 * (fno * vo - fne * ve),
            2.0 * (fno * ve + fne * vo),
        )
        for k in range(4):
            product[k] = product[k] + own_products[k]
            product_rate[k] = product_rate[k] + (changes[k] - 3.0 * fall * own_products[k])
    local, local_rate = _by_order(place, product), _by_order(place, product_rate)
    single, single_rate = _by_line(place, sine, cosine, turn, sums)
    for total, (radial, north, east) in (
        (moved, tuple(a + b for a, b in zip(local, single, strict=True))),
        (drift, tuple(a + b for a, b in zip(local_rate, single_rate, strict=True))),
    ):
        total[0] = total[0] + (radial * cphi - north * sphi)
        total[1] = total[1] + east
        total[2] = total[2] + (radial * sphi + north * cphi)
    return (moved[0], moved[1], moved[2]), (drift[0], drift[1], drift[2])


def _by_order(place: _Place, product: list[Any]) -> Parts:
    """What lags, and l by latitude within each order: radial, north, east (eqs. 7.8 to 7.11)."""
    s, c = place.sine, place.cosine
    one_out, one_east, two_out, two_east = product
    cos2 = c * c - s * s
    radial = (3.0 * _H_LAG_DAY * s * c) * one_east + (0.75 * _H_LAG_HALF * c * c) * two_east
    north = (3.0 * _L_LAG_DAY * cos2) * one_east + (-1.5 * _L_LAG_HALF * s * c) * two_east
    north = north + (-3.0 * _L1_DAY * s * s) * one_out + (-1.5 * _L1_HALF * s * c) * two_out
    east = (-3.0 * _L_LAG_DAY * s) * one_out + (-1.5 * _L_LAG_HALF * c) * two_out
    east = east + (-3.0 * _L1_DAY * s * cos2) * one_east + (1.5 * _L1_HALF * s * s * c) * two_east
    return radial, north, east


def _by_line(place: _Place, sine: Any, cosine: Any, turn: Any, sums: FloatArray) -> Motion:
    """Step 2: radial, north, east, and the rates. The sums turn with the Earth; their own change, 3e-9 m/s, is out."""
    s, c = place.sine, place.cosine
    both, cos2 = 2.0 * s * c, c * c - s * s
    radial, radial_ahead = sums[0] * cosine - sums[1] * sine, sums[0] * sine + sums[1] * cosine
    across, across_ahead = sums[2] * cosine - sums[3] * sine, sums[2] * sine + sums[3] * cosine
    values = both * radial + (1.5 * s * s - 0.5) * sums[4], cos2 * across + both * sums[5], -s * across_ahead
    return values, ((-both * turn) * radial_ahead, (-cos2 * turn) * across_ahead, (-s * turn) * across)


def _in_phase(
    place: _Place, f2: Any, parallax: Any, fall: Any, cosine: Any, cosine_rate: Any
) -> tuple[Any, Any, Any, Any]:
    """Degrees 2 and 3: displacement toward the body and along the vertical, each with its rate (eqs. 7.5 and 7.6).

    `cosine` is that of the body's zenith distance, `fall` its r'/r.
    """
    bulge = 1.5 * place.sine * place.sine - 0.5
    h2, l2 = _H0 + _H2 * bulge, _L0 + _L2 * bulge
    square = cosine * cosine
    f3 = f2 * parallax
    toward2, lift2 = f2 * (3.0 * l2) * cosine, f2 * ((1.5 * h2 - 3.0 * l2) * square - 0.5 * h2)
    toward3 = f3 * (1.5 * _L3) * (5.0 * square - 1.0)
    lift3 = f3 * cosine * (2.5 * (_H3 - 3.0 * _L3) * square + 1.5 * (_L3 - _H3))
    toward_slope = f2 * (3.0 * l2) + f3 * (15.0 * _L3) * cosine
    lift_slope = f2 * (3.0 * h2 - 6.0 * l2) * cosine + f3 * (7.5 * (_H3 - 3.0 * _L3) * square + 1.5 * (_L3 - _H3))
    return (
        toward2 + toward3,
        toward_slope * cosine_rate - fall * (3.0 * toward2 + 4.0 * toward3),
        lift2 + lift3,
        lift_slope * cosine_rate - fall * (3.0 * lift2 + 4.0 * lift3),
    )


def _columns(vectors: FloatArray) -> Parts:
    x, y, z = np.ascontiguousarray(vectors.T)
    return x, y, z


def _dot(a: Any, b: Any) -> Any:
    return a[0] * b[0] + a[1] * b[1] + a[2] * b[2]


def _vectors(value: npt.ArrayLike, what: str) -> FloatArray:
    vectors = np.asarray(value, dtype=np.float64)
    bad = vectors.ndim == 0 or vectors.shape[-1] != 3 or not np.isfinite(vectors).all()
    if bad or not np.all(np.linalg.norm(vectors, axis=-1) > 0.0):
        raise InvalidInput(f"the position of the {what} is finite x, y, z on the last axis, not all 0; got {value!r}")
    return vectors
