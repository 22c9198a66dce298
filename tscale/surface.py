"""A place on the surface of another body: the Moon, Mars, Venus or Mercury."""

from __future__ import annotations

import math
import os
from dataclasses import dataclass, field
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from .body_shape import FIGURES, REFERENCE_POTENTIAL_M2_S2, ROTATIONS, Rotation, own_body
from .constants import C_M_S, DAY_S, GM_M3_S2
from .earth.frames import dot
from .earth.moving import gcrs_state
from .ephemeris.bodies import body_id, body_name
from .errors import DataFileError, InvalidInput, MissingPiece
from .exact import FloatArray, Pair
from .storage import toml_table

if TYPE_CHECKING:
    from .tables.reference import ReferenceData

__all__ = ["BodyCentre", "SurfaceSite"]

_KEYS: Final = ("name", "body", "lon_deg", "lat_deg", "height_m", "height_above_geoid_m", "potential_m2_s2")
_LIMITS: Final = dict(zip(_KEYS[2:], (360.0, 90.0, 1e5, 1e5, 1e9), strict=True))


@dataclass(frozen=True)
class SurfaceSite:
    """A named point that turns with the Moon, Mars, Venus or Mercury.

    Coordinates refer to the body's reference ellipsoid and rotation elements of the IAU (WGCCRE 2015): the rotation
    is good to 100-200 m on the Moon (main libration terms of the mean Earth/polar axis frame), some metres on Mars.

    Parameters
    ----------
    name : str
        Name, printable.
    body : str or int
        `moon`, `mars`, `venus`, `mercury`, or the NAIF number; kept as the number.
    lon_deg : float
        East longitude within +-360, degrees.
    lat_deg : float
        Latitude of the ellipsoid's normal within +-90, degrees.
    height_m : float
        Height above the ellipsoid, m, within +-100 km.
    height_above_geoid_m : float, optional
        Height above the body's reference equipotential surface (selenoid, areoid), m, for the rate of a clock. If not
        given `height_m` stands for it: the surfaces are up to 0.5 km apart on the Moon, 2 km on Mars, which is 9e-15
        and 8e-14 in rate.
    potential_m2_s2 : float, optional
        Gravity potential of the place with that of the rotation, positive, m2/s2, where it has been measured;
        instead of a height.

    Raises
    ------
    InvalidInput
        Values that are not finite or out of range, or a body without rotation elements.
    """

    name: str
    body: str | int
    lon_deg: float
    lat_deg: float
    height_m: float = 0.0
    height_above_geoid_m: float | None = None
    potential_m2_s2: float | None = None
    _fixed_m: FloatArray = field(init=False, repr=False, compare=False)
    _up: FloatArray = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        if not isinstance(self.name, str) or not self.name.strip() or not self.name.isprintable():
            raise InvalidInput(f"the name of a surface site is a printable text, got {self.name!r}")
        number = body_id(self.body)
        if own_body(number) not in ROTATIONS:
            known = ", ".join(body_name(n) for n in sorted(ROTATIONS))
            hint = "; for the Earth use Site" if number == 399 else ""
            raise InvalidInput(
                f"surface site {self.name!r}: no rotation elements for {body_name(number)}; known are {known}{hint}"
            )
        object.__setattr__(self, "body", number)
        for what, limit in _LIMITS.items():
            value: Any = getattr(self, what)
            if value is None and what in _KEYS[5:]:
                continue
            if (
                isinstance(value, bool)
                or not isinstance(value, int | float | np.integer | np.floating)
                or not math.isfinite(value)
            ):
                raise InvalidInput(f"surface site {self.name!r}: {what} must be a finite number, got {value!r}")
            if abs(float(value)) > limit:
                raise InvalidInput(
                    f"surface site {self.name!r}: {what} must lie within +-{limit:g}, got {value!r}; "
                    "check order and units"
                )
            object.__setattr__(self, what, float(value))
        if self.potential_m2_s2 is not None and self.height_above_geoid_m is not None:
            raise InvalidInput(
                f"surface site {self.name!r}: give height_above_geoid_m or potential_m2_s2, not both: each tells the "
                "rate of a clock"
            )
        if self.potential_m2_s2 is not None and not self.potential_m2_s2 > 0.0:
            raise InvalidInput(
                f"surface site {self.name!r}: potential_m2_s2 is positive (GM/r and more), got {self.potential_m2_s2!r}"
            )
        figure = FIGURES[own_body(number)]
        lon, lat = math.radians(self.lon_deg), math.radians(self.lat_deg)
        up = np.array([math.cos(lat) * math.cos(lon), math.cos(lat) * math.sin(lon), math.sin(lat)])
        squash = (figure.polar_m / figure.equatorial_m) ** 2
        normal = figure.equatorial_m / math.sqrt(math.cos(lat) ** 2 + squash * math.sin(lat) ** 2)
        fixed = up * (np.array([normal, normal, normal * squash]) + self.height_m)
        for key, value in (("_fixed_m", fixed), ("_up", up)):
            value.flags.writeable = False
            object.__setattr__(self, key, value)

    @classmethod
    def load(cls, path: str | os.PathLike[str]) -> SurfaceSite:
        """Read a TOML file with a `[surface]` table whose keys are the parameters of this class.

        Raises
        ------
        DataFileError
            Missing or damaged file, unknown or missing keys, values out of range; with the path.
        InvalidInput
            Something that is no path.
        """
        if not isinstance(path, str | os.PathLike):
            raise InvalidInput(f"SurfaceSite.load takes the path of a TOML file, got {path!r:.60}")
        path = Path(path)
        table = toml_table(path, "surface", _KEYS[:4], _KEYS)
        try:
            return cls(**table)
        except InvalidInput as error:
            raise DataFileError(f"{path}: {error}", path=path) from error

    def offset(self, tdb: Pair) -> tuple[FloatArray, FloatArray]:
        """Position (m) and velocity (m/s) from the body's centre on the ICRF axes, each (..., 3), at TDB counts."""
        return _turned(_rotation(self), self._fixed_m, _pair(tdb))

    def up(self, tdb: Pair) -> FloatArray:
        """Unit normal of the ellipsoid on the ICRF axes, (..., 3), at TDB counts."""
        return _turned(_rotation(self), self._up, _pair(tdb))[0]

    def pole(self, tdb: Pair) -> FloatArray:
        """Unit vector along the body's axis of rotation, to its north, on the ICRF axes, (..., 3), at TDB counts."""
        return _turned(_rotation(self), np.array([0.0, 0.0, 1.0]), _pair(tdb))[0]

    @property
    def uses_earth_orientation(self) -> bool:
        """False: the place does not turn with the Earth."""
        return False

    def gravity_potential_m2_s2(self) -> float:
        """Gravity potential W of the place with that of the rotation, m2/s2, by which a clock there runs slow.

        As given, else that of the body's reference surface (`body_shape.REFERENCE_POTENTIAL_M2_S2`) less the work up
        to the height above it, along gravity GM/r^2 less the centrifugal part. The flattening and the lumps of the
        body that this leaves out are below 0.3 % of that work: 1e-16 for a height of 1 km on Mars.

        Raises
        ------
        MissingPiece
            For a body without a published reference potential (Mercury, Venus).
        """
        if self.potential_m2_s2 is not None:
            return self.potential_m2_s2
        assert isinstance(self.body, int)
        body = own_body(self.body)
        if body not in REFERENCE_POTENTIAL_M2_S2:
            raise MissingPiece(
                f"surface site {self.name!r}: no reference potential is known for {body_name(self.body)}; known are "
                f"those of {', '.join(body_name(n) for n in sorted(REFERENCE_POTENTIAL_M2_S2))}: give potential_m2_s2="
            )
        height = self.height_m if self.height_above_geoid_m is None else self.height_above_geoid_m
        ground = float(np.linalg.norm(self._fixed_m - self.height_m * self._up))
        # The prime meridian's rate is that of the rotation to 1e-4, and all of it is 1e-3 of gravity.
        spin_rad_s = math.radians(ROTATIONS[body].w.polynomial_deg[1]) / DAY_S
        across = spin_rad_s * math.cos(math.radians(self.lat_deg))
        work = GM_M3_S2[body] * height / (ground * (ground + height)) - 0.5 * across**2 * height * (2 * ground + height)
        return REFERENCE_POTENTIAL_M2_S2[body] - work

    def gcrs(self, tt: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray]:
        """Geocentric position (m) and velocity (m/s) on the GCRS axes, TT-compatible, (..., 3), at TT counts.

        So a place on another body is an observer, whose events have a TT (the Moon) or at least a TDB (all).
        """
        return gcrs_state(lambda tdb: self.state_bcrs(tdb, reference), _pair(tt), reference)

    def state_bcrs(self, tdb: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray]:
        """Barycentric position (m) and velocity (m/s), TDB-compatible, each (..., 3), at TDB counts.

        The Lorentz contraction of the body is included (1 cm on Mars); the scale between the body's own
        coordinates and TDB-compatible ones (a few cm) is left out, below the accuracy of the rotation elements.
        """
        tdb = _pair(tdb)
        centre, velocity = reference.ephemeris.state(self.body, tdb)
        r, v = self.offset(tdb)
        return centre + contracted(r, velocity), velocity + v


@dataclass(frozen=True)
class BodyCentre:
    """The centre of a body as an observer, so that events there have a TT and a TDB."""

    body: int

    @property
    def name(self) -> str:
        """For ledgers and messages."""
        return f"the centre of {body_name(self.body)}"

    @property
    def uses_earth_orientation(self) -> bool:
        """False: the place does not turn with the Earth."""
        return False

    def state_bcrs(self, tdb: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray]:
        """Barycentric position (m) and velocity (m/s), TDB-compatible, each (..., 3), at TDB counts."""
        return reference.ephemeris.state(self.body, _pair(tdb))

    def gcrs(self, tt: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray]:
        """Geocentric position (m) and velocity (m/s) on the GCRS axes, TT-compatible, (..., 3), at TT counts."""
        return gcrs_state(lambda tdb: self.state_bcrs(tdb, reference), _pair(tt), reference)


def contracted(r_m: FloatArray, velocity_m_s: FloatArray) -> FloatArray:
    """`r_m` as seen in the frame in which its body moves at `velocity_m_s`: r - (V.r) V / (2 c^2)."""
    return np.asarray(r_m - velocity_m_s * (dot(velocity_m_s, r_m) * (0.5 / C_M_S**2))[..., np.newaxis])


def _pair(tdb: Any) -> Pair:
    """Counts as two arrays of one shape."""
    try:
        whole, fraction = tdb
        whole, fraction = np.broadcast_arrays(np.asarray(whole), np.asarray(fraction))
        if whole.dtype.kind not in "iu" or fraction.dtype.kind not in "iuf":
            raise TypeError("the first part is integers, the second floats")
    except (TypeError, ValueError) as error:
        raise InvalidInput(
            f"TDB counts are a pair (whole seconds, fraction) such as Instants.pair, got {tdb!r:.60}: {error}"
        ) from error
    return whole.astype(np.int64, copy=False), fraction.astype(np.float64, copy=False)


def _rotation(site: SurfaceSite) -> Rotation:
    assert isinstance(site.body, int)
    return ROTATIONS[own_body(site.body)]


def _turned(rotation: Rotation, fixed: FloatArray, tdb: Pair) -> tuple[FloatArray, FloatArray]:
    """Turn a body-fixed vector to the ICRF axes: about z by W, about x by 90 deg - dec, about z by 90 deg + ra."""
    whole, fraction = tdb
    day, second = np.divmod(whole, DAY_S)
    part = (second + fraction) / DAY_S
    days = np.asarray(day + part)
    w, w_rate = rotation.w.at(day.astype(np.float64), part)
    dec, dec_rate = rotation.dec.at(days / rotation.pole_unit_days)
    ra, ra_rate = rotation.ra.at(days / rotation.pole_unit_days)
    pole_s = DAY_S * rotation.pole_unit_days
    r = np.broadcast_to(fixed, (*days.shape, 3))
    v = np.zeros_like(r)
    for axes, angle, rate in (
        ((0, 1), w, w_rate / DAY_S),
        ((1, 2), np.pi / 2.0 - dec, -dec_rate / pole_s),
        ((0, 1), np.pi / 2.0 + ra, ra_rate / pole_s),
    ):
        r, v = _turn(axes, angle, rate, r, v)
    return r, v


def _turn(
    axes: tuple[int, int], angle: FloatArray, rate: FloatArray, r: FloatArray, v: FloatArray
) -> tuple[FloatArray, FloatArray]:
    """Rotate position and velocity by an angle in the plane of two axes, itself changing at `rate` (rad/s)."""
    first, second = axes
    cosine, sine = np.cos(angle), np.sin(angle)
    turned, moving = r.copy(), v.copy()
    turned[..., first] = cosine * r[..., first] - sine * r[..., second]
    turned[..., second] = sine * r[..., first] + cosine * r[..., second]
    moving[..., first] = cosine * v[..., first] - sine * v[..., second] - rate * turned[..., second]
    moving[..., second] = sine * v[..., first] + cosine * v[..., second] + rate * turned[..., first]
    return turned, moving
