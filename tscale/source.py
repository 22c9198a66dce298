"""Source: a direction in the sky, with proper motion and parallax."""

from __future__ import annotations

import math
from dataclasses import dataclass, field, fields
from pathlib import Path
from typing import Final

import numpy as np

from . import exact
from .constants import AU_M, JULIAN_YEAR_S
from .errors import DataFileError, InvalidInput
from .exact import FloatArray, Pair
from .instants import Instants
from .storage import toml_table

__all__ = ["Source"]

_RAD_PER_MAS: Final = math.pi / (180.0 * 3600.0e3)
_UNITS: Final = {
    "ra_deg": "deg",
    "dec_deg": "deg",
    "pm_ra_cosdec_mas_yr": "mas / yr",
    "pm_dec_mas_yr": "mas / yr",
    "parallax_mas": "mas",
}


@dataclass(frozen=True)
class Source:
    """A source outside the solar system, in the ICRS as seen from the solar-system barycentre.

    The source moves along a straight line in space without radial velocity, the standard model of
    stellar motion (The Hipparcos Catalogue, ESA SP-1200, section 1.2.8, with zero radial velocity).

    Parameters
    ----------
    ra_deg, dec_deg : float
        ICRS direction at `epoch`, degrees; right ascension in [-360, 360], declination in [-90, 90].
    pm_ra_cosdec_mas_yr, pm_dec_mas_yr : float
        Proper motion, milliarcseconds per Julian year; the first contains cos(dec).
    parallax_mas : float
        Annual parallax, milliarcseconds; 0 means infinitely far.
    epoch : str
        ISO 8601 date (TDB at the barycentre) at which the direction holds.
    name : str
        For messages and tables.

    Notes
    -----
    Bare numbers have the units that the names end with. Quantities of a general library (astropy's, such as
    `83.6 * u.deg` or an `Angle`), which convert themselves, are taken too.
    """

    ra_deg: float
    dec_deg: float
    pm_ra_cosdec_mas_yr: float = 0.0
    pm_dec_mas_yr: float = 0.0
    parallax_mas: float = 0.0
    epoch: str = "2000-01-01T12:00:00"
    name: str = ""
    _epoch: Instants = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        for what, unit in _UNITS.items():
            given = getattr(self, what)
            try:
                value = exact.bare(given, unit)
            except InvalidInput as error:
                raise InvalidInput(f"source {self.name!r}: {what}: {error}") from error
            number = isinstance(value, int | float | np.number) and not isinstance(value, bool)
            if not number or not abs(value) < 1e300:
                raise InvalidInput(f"source {self.name!r}: {what} must be a finite number, got {given!r}")
            if value is not given:
                object.__setattr__(self, what, float(value))
        if abs(self.ra_deg) > 360.0:
            raise InvalidInput(
                f"source {self.name!r}: ra_deg must lie in [-360, 360] degrees (not hours), got {self.ra_deg}"
            )
        if abs(self.dec_deg) > 90.0:
            raise InvalidInput(f"source {self.name!r}: dec_deg must lie in [-90, 90], got {self.dec_deg}")
        if not 0.0 <= self.parallax_mas <= 1e4:
            raise InvalidInput(
                f"source {self.name!r}: parallax_mas must lie in [0, 10000], got {self.parallax_mas}; 0 is "
                "infinitely far, a negative measured parallax carries no distance: use 0; "
                "nearer things are ends of a link"
            )
        if math.hypot(self.pm_ra_cosdec_mas_yr, self.pm_dec_mas_yr) > 1e6:
            raise InvalidInput(f"source {self.name!r}: proper motion beyond 1000 arcsec/yr; the unit is mas/yr")
        object.__setattr__(self, "_epoch", Instants.from_iso(self.epoch, scale="TDB"))

    @classmethod
    def load(cls, path: str | Path) -> Source:
        """Read a TOML file with a `[source]` table whose keys are the parameters of this class."""
        path = Path(path)
        allowed = [item.name for item in fields(cls) if item.init]
        table = toml_table(path, "source", ("ra_deg", "dec_deg"), allowed)
        try:
            return cls(**table)
        except InvalidInput as error:
            raise DataFileError(f"{path}: {error}", path=path) from error

    @property
    def distance_m(self) -> float:
        """Distance at the epoch from the parallax, m; infinite for zero parallax."""
        return AU_M / (self.parallax_mas * _RAD_PER_MAS) if self.parallax_mas else math.inf

    def motion(self, tdb: Pair) -> tuple[FloatArray, FloatArray]:
        """Place and rate of the source in units of its distance at the epoch.

        Returns
        -------
        place : (..., 3) array
            k0 + mu (t - epoch), of length close to 1; dividing by its length gives the direction.
        rate_per_s : (3,) array
            mu, per second of TDB.
        """
        toward, moved, rate = self.motion_apart(tdb)
        return toward + moved, rate

    def motion_apart(self, tdb: Pair) -> tuple[FloatArray, FloatArray, FloatArray]:
        """Place at the epoch (3,), what has been added to it (..., 3), and rate; see `motion`."""
        ra, dec = math.radians(self.ra_deg), math.radians(self.dec_deg)
        toward = np.array([math.cos(dec) * math.cos(ra), math.cos(dec) * math.sin(ra), math.sin(dec)])
        east = np.array([-math.sin(ra), math.cos(ra), 0.0])
        north = np.array([-math.sin(dec) * math.cos(ra), -math.sin(dec) * math.sin(ra), math.cos(dec)])
        rate = (east * self.pm_ra_cosdec_mas_yr + north * self.pm_dec_mas_yr) * (_RAD_PER_MAS / JULIAN_YEAR_S)
        elapsed_s = exact.seconds(exact.subtract(tdb, self._epoch.pair))
        return toward, elapsed_s[..., np.newaxis] * rate, rate

    def direction(self, tdb: Pair) -> FloatArray:
        """Unit vector (..., 3) from the barycentre to the source at a barycentric TDB count."""
        place, _ = self.motion(tdb)
        return np.asarray(place / np.linalg.norm(place, axis=-1, keepdims=True))
