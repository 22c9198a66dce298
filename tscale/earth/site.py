"""A place on the ground: where a clock or a telescope stands in the terrestrial system."""

from __future__ import annotations

import math
import os
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final, SupportsFloat

import numpy as np

from ..constants import JULIAN_YEAR_S
from ..errors import InvalidInput
from ..exact import FloatArray, Pair, bare
from ..storage import write_atomically
from .geodesy import Ellipsoid, geocentric_from_geodetic, geodetic_from_geocentric
from .gravity.level_ellipsoid import HIGHEST_M, LOWEST_M
from .rotation import gcrs_state_from_itrs
from .site_file import read_site, site_text
from .tides import tidal_site_state

if TYPE_CHECKING:
    from ..tables.reference import ReferenceData

__all__ = ["Site"]

_LOWEST_M: Final = 6.2e6
_HIGHEST_M: Final = 6.5e6
_FASTEST_M_YR: Final = 1.0  # the fastest plates move 0.2 m a year
_UNITS: Final = {"m": "m", "deg": "deg", "m_yr": "m / yr", "m2_s2": "m2 / s2"}  # by the endings of names


@dataclass(frozen=True)
class Site:
    """A named point of the International Terrestrial Reference System.

    Make one with `from_itrf`, `from_geodetic` or `load`.

    Parameters
    ----------
    name : str
        Name, printable.
    position_m : (float, float, float)
        ITRF x, y, z at the epoch, m; between 6200 and 6500 km from the geocentre.
    velocity_m_yr : (float, float, float)
        ITRF velocity, m per Julian year.
    epoch_jyear : float
        Epoch of the position as a decimal Julian year of TT (2000.0 is 2000-01-01T12:00:00).
    frame : str
        Realisation that the position refers to (a label: ITRF2020, WGS84 ...).
    geopotential_number_m2_s2 : float or None
        W0 - W of the clock's reference point, m2/s2, if it was levelled.
    height_above_geoid_m : float or None
        Orthometric height, -12 km to 50 km, m, if known.
    solid_tide : bool
        Whether the Moon and the Sun move the site (see `tides`): up to 0.4 m, 1.3 ns in a wavefront. Coordinates stay
        the tide-free ones of the ITRF; `gcrs` gives the place that the tide has moved. Default False.

    Raises
    ------
    InvalidInput
        Values that are not finite or out of range; the message says what is allowed.

    Notes
    -----
    Bare numbers have the units that the names end with. Quantities of a general library (astropy's, such as
    `6371 * u.km`), which convert themselves, are taken wherever a length, an angle, a velocity or a geopotential
    number is.
    """

    name: str
    position_m: tuple[float, float, float]
    velocity_m_yr: tuple[float, float, float] = (0.0, 0.0, 0.0)
    epoch_jyear: float = 2010.0
    frame: str = field(default="ITRF", kw_only=True)
    geopotential_number_m2_s2: float | None = field(default=None, kw_only=True)
    height_above_geoid_m: float | None = field(default=None, kw_only=True)
    solid_tide: bool = field(default=False, kw_only=True)

    def __post_init__(self) -> None:
        for what, text in (("name", self.name), ("frame", self.frame)):
            if not isinstance(text, str) or not text.strip() or not text.isprintable():
                raise InvalidInput(f"the {what} of a site is a printable text, got {text!r}")
        object.__setattr__(self, "position_m", _three(self.name, "position_m", self.position_m))
        object.__setattr__(self, "velocity_m_yr", _three(self.name, "velocity_m_yr", self.velocity_m_yr))
        radius_m = math.hypot(*self.position_m)
        if not _LOWEST_M <= radius_m <= _HIGHEST_M:
            hint = ": these look like kilometres, give metres" if 6200 <= radius_m <= 6500 else ""
            raise InvalidInput(
                f"site {self.name!r} lies {radius_m:.6g} m from the geocentre{hint}; a site on the ground has x, y, z "
                f"in metres with a distance of {_LOWEST_M:.2g} to {_HIGHEST_M:.2g} m (use a Trajectory for orbits)"
            )
        if math.hypot(*self.velocity_m_yr) > _FASTEST_M_YR:
            raise InvalidInput(
                f"site {self.name!r} moves at {self.velocity_m_yr} m/yr; allowed is up to {_FASTEST_M_YR} m/yr "
                "(are these mm/yr?)"
            )
        for what in ("epoch_jyear", "geopotential_number_m2_s2", "height_above_geoid_m"):
            value = getattr(self, what)
            if value is not None:
                object.__setattr__(self, what, _number(self.name, what, value))
        height_m = self.height_above_geoid_m
        if height_m is not None and not LOWEST_M <= height_m <= HIGHEST_M:
            raise InvalidInput(
                f"site {self.name!r}: height_above_geoid_m is {height_m!r}; a site on the ground has one of "
                f"{LOWEST_M:g} to {HIGHEST_M:g} m, which normal gravity reaches"
            )
        if not isinstance(self.solid_tide, bool):
            raise InvalidInput(f"site {self.name!r}: solid_tide is True or False, got {self.solid_tide!r}")
        if not 1900.0 <= self.epoch_jyear <= 2200.0:
            raise InvalidInput(
                f"site {self.name!r}: epoch_jyear is {self.epoch_jyear!r}; give a Julian year of 1900 to 2200, "
                "such as 2010.0"
            )

    @classmethod
    def from_itrf(
        cls,
        name: str,
        x_m: SupportsFloat,
        y_m: SupportsFloat,
        z_m: SupportsFloat,
        *,
        velocity_m_yr: tuple[float, float, float] = (0.0, 0.0, 0.0),
        epoch_jyear: float = 2010.0,
        frame: str = "ITRF",
        geopotential_number_m2_s2: float | None = None,
        height_above_geoid_m: float | None = None,
        solid_tide: bool = False,
    ) -> Site:
        """Build a site from its ITRF coordinates, in metres or quantities; see the class for the rest."""
        return cls(
            name,
            (_number(name, "x_m", x_m), _number(name, "y_m", y_m), _number(name, "z_m", z_m)),
            velocity_m_yr,
            epoch_jyear,
            frame=frame,
            geopotential_number_m2_s2=geopotential_number_m2_s2,
            height_above_geoid_m=height_above_geoid_m,
            solid_tide=solid_tide,
        )

    @classmethod
    def from_geodetic(
        cls,
        name: str,
        lon_deg: SupportsFloat,
        lat_deg: SupportsFloat,
        height_m: SupportsFloat,
        *,
        ellipsoid: Ellipsoid = "WGS84",
        velocity_m_yr: tuple[float, float, float] = (0.0, 0.0, 0.0),
        epoch_jyear: float = 2010.0,
        frame: str = "ITRF",
        geopotential_number_m2_s2: float | None = None,
        height_above_geoid_m: float | None = None,
        solid_tide: bool = False,
    ) -> Site:
        """Build a site from east longitude, geodetic latitude and height above the ellipsoid: degrees and m, or
        quantities.
        """
        lon = _number(name, "lon_deg", lon_deg)
        lat = _number(name, "lat_deg", lat_deg)
        x_m, y_m, z_m = geocentric_from_geodetic(lon, lat, _number(name, "height_m", height_m), ellipsoid).tolist()
        return cls(
            name,
            (x_m, y_m, z_m),
            velocity_m_yr,
            epoch_jyear,
            frame=frame,
            geopotential_number_m2_s2=geopotential_number_m2_s2,
            height_above_geoid_m=height_above_geoid_m,
            solid_tide=solid_tide,
        )

    @classmethod
    def load(cls, path: str | os.PathLike[str]) -> Site:
        """Read a site from a TOML file (layout: see `site_file`).

        Raises
        ------
        DataFileError
            Missing or damaged file, unknown or missing keys, values out of range; with the path.
        """
        return read_site(Path(path), cls.from_itrf, cls.from_geodetic)

    def save(self, path: str | os.PathLike[str]) -> None:
        """Write the site to a TOML file; `load` gives the same site back, bit for bit."""
        write_atomically(Path(path), site_text(self._facts()).encode())

    def _facts(self) -> Mapping[str, Any]:
        return {
            "name": self.name,
            "itrf": dict(zip(("x_m", "y_m", "z_m"), self.position_m, strict=True)),
            "velocity_m_yr": list(self.velocity_m_yr),
            "epoch_jyear": self.epoch_jyear,
            "frame": self.frame,
            "geopotential_number_m2_s2": self.geopotential_number_m2_s2,
            "height_above_geoid_m": self.height_above_geoid_m,
            "solid_tide": self.solid_tide or None,
        }

    @cached_property
    def _geodetic(self) -> tuple[float, float, float]:
        lon, lat, height = geodetic_from_geocentric(self.position_m)
        return float(lon), float(lat), float(height)

    @property
    def lon_deg(self) -> float:
        """East longitude, degrees in (-180, 180]."""
        return self._geodetic[0]

    @property
    def lat_deg(self) -> float:
        """Geodetic latitude on WGS84, degrees."""
        return self._geodetic[1]

    @property
    def height_m(self) -> float:
        """Height above the WGS84 ellipsoid, m."""
        return self._geodetic[2]

    def itrf_at(self, tt: Pair) -> FloatArray:
        """ITRF position at TT counts, m: the position at the epoch carried by the velocity, free of tide; (..., 3)."""
        whole, fraction = np.broadcast_arrays(np.asarray(tt[0]), np.asarray(tt[1]))
        position = np.array(self.position_m)
        if not any(self.velocity_m_yr):
            return np.broadcast_to(position, (*whole.shape, 3)).copy()
        years = (whole + fraction) / JULIAN_YEAR_S - (self.epoch_jyear - 2000.0)
        return np.asarray(position + years[..., np.newaxis] * np.array(self.velocity_m_yr))

    def gcrs(self, tt: Pair, reference: ReferenceData) -> tuple[FloatArray, FloatArray]:
        """Geocentric position (m) and velocity (m/s) on the GCRS axes at TT counts.

        Parameters
        ----------
        tt : Pair
            TT count, any shape.
        reference : ReferenceData
            Its Earth orientation is used (IERS 2010 rotation: see `rotation`), and its ephemeris for the tide.

        Returns
        -------
        r_m, v_m_s : float array, shape of `tt` + (3,)
            TT-compatible. The velocity is the derivative of the position by TT, but for plate motion (nm/s), which it
            leaves out; see `rotation` for what turns the Earth.

        Raises
        ------
        OutOfSpan
            Where the Earth orientation table does not reach, or for the tide the ephemeris.
        """
        position = self.itrf_at(tt) if any(self.velocity_m_yr) else np.array(self.position_m)
        if self.solid_tide:
            return tidal_site_state(position, np.array(self.position_m), tt, reference)
        return gcrs_state_from_itrs(position, None, tt, reference)


def _number(site: str, what: str, value: Any) -> float:
    unit = next((unit for ending, unit in _UNITS.items() if what.endswith(f"_{ending}")), "")
    try:
        found = bare(value, unit) if unit else value
    except InvalidInput as error:
        raise InvalidInput(f"site {site!r}: {what}: {error}") from error
    try:
        if isinstance(found, (bool, str)):
            raise TypeError("not a number")
        number = float(found)
    except (TypeError, ValueError, OverflowError) as error:
        raise InvalidInput(f"site {site!r}: {what} must be a number, got {value!r}") from error
    if not math.isfinite(number):
        raise InvalidInput(f"site {site!r}: {what} must be finite, got {value!r}")
    return number


def _three(site: str, what: str, values: Any) -> tuple[float, float, float]:
    try:
        x, y, z = values
    except (TypeError, ValueError) as error:
        raise InvalidInput(f"site {site!r}: {what} has three numbers x, y, z, got {values!r}") from error
    return _number(site, what, x), _number(site, what, y), _number(site, what, z)
