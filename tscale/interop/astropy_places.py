"""Sites and sources from and to astropy's `EarthLocation` and `SkyCoord`."""

from __future__ import annotations

from typing import Any, Final

import numpy as np

from ..earth.site import Site
from ..errors import InvalidInput
from ..source import Source
from .optional import needed

__all__ = ["location_of", "site_of", "sky_coord_of", "source_of"]

_MOTION: Final = "mas / yr"
_STILL_KM_S: Final = 1e-6  # below 1 mm/s a radial velocity is what turning the frame has rounded to


def site_of(location: Any, name: str | None) -> Site:
    """A Site of an `EarthLocation`; see `from_astropy`."""
    _one(location, "an EarthLocation", "sites")
    x_m, y_m, z_m = (float(axis.to_value("m")) for axis in (location.x, location.y, location.z))
    return Site(_name(location, name) or "site", (x_m, y_m, z_m))


def location_of(site: Site) -> Any:
    """An `EarthLocation` of a Site; see `to_astropy`."""
    kind = needed("astropy.coordinates").EarthLocation
    metre = needed("astropy.units").m
    location = kind.from_geocentric(*(value * metre for value in site.position_m))
    location.info.name = site.name
    return location


def source_of(coord: Any, name: str | None, epoch: str | None, drop_radial_velocity: bool) -> Source:
    """A Source of a `SkyCoord`; see `from_astropy`."""
    _one(coord, "a SkyCoord", "sources")
    called = _name(coord, name)
    try:
        icrs = coord if coord.frame.name == "icrs" else coord.icrs
    except Exception as error:
        raise InvalidInput(f"astropy cannot turn this SkyCoord ({coord.frame.name}) into ICRS: {error}") from error
    moving = "s" in icrs.data.differentials
    motion = (0.0, 0.0)
    if moving:
        motion = (_motion(icrs, "pm_ra_cosdec"), _motion(icrs, "pm_dec"))
        radial = _radial(icrs)
        if abs(radial) > _STILL_KM_S and not drop_radial_velocity:
            raise InvalidInput(
                f"this SkyCoord has a radial velocity of {radial:.6g} km/s, which a Source has not: say "
                "drop_radial_velocity=True to leave it out"
            )
    epoch = _epoch(icrs, epoch, any(motion))
    fields: dict[str, Any] = {} if epoch is None else {"epoch": epoch}
    return Source(
        float(icrs.ra.to_value("deg")),
        float(icrs.dec.to_value("deg")),
        *motion,
        _parallax_mas(icrs),
        name=called or "",
        **fields,
    )


def _motion(coord: Any, which: str) -> float:
    value = float(getattr(coord, which).to_value(_MOTION))
    if not np.isfinite(value):
        raise InvalidInput(f"{which} of this SkyCoord is {value}; give it both components of its proper motion")
    return value


def _radial(coord: Any) -> float:
    """Radial velocity, km/s; 0 where there is none (astropy fills in zero or NaN)."""
    try:
        value = float(coord.radial_velocity.to_value("km / s"))
    except (AttributeError, ValueError, TypeError):  # no distance, no velocity along it
        return 0.0
    return value if np.isfinite(value) else 0.0


def _parallax_mas(coord: Any) -> float:
    """Parallax of a distance that is a length; 0 for a bare direction."""
    if not coord.distance.unit.is_equivalent("m"):
        return 0.0
    return float(coord.distance.to_value("mas", equivalencies=needed("astropy.units").parallax()))


def _epoch(coord: Any, epoch: str | None, moving: bool) -> str | None:
    """When the direction holds, as a label of TDB; None where it does not matter."""
    obstime = getattr(coord, "obstime", None)
    if obstime is not None:
        if epoch is not None:
            raise InvalidInput(f"this SkyCoord has an obstime ({obstime}), so epoch= has no place: leave it out")
        _one(obstime, "an obstime", "dates")
        tdb = obstime.tdb.copy()
        tdb.precision = 9
        return str(tdb.isot)
    if epoch is None and moving:
        raise InvalidInput(
            "this SkyCoord has proper motion but no obstime: say when its direction holds, as in epoch='2016-01-01'"
        )
    return epoch


def sky_coord_of(source: Source) -> Any:
    """A `SkyCoord` of a Source; see `to_astropy`."""
    units, coordinates = needed("astropy.units"), needed("astropy.coordinates")
    rate = units.Unit(_MOTION)
    fields = {"obstime": needed("astropy.time").Time(source.epoch, scale="tdb")}
    if source.parallax_mas:
        fields["distance"] = coordinates.Distance(parallax=source.parallax_mas * units.mas)
    coord = coordinates.SkyCoord(
        ra=source.ra_deg * units.deg,
        dec=source.dec_deg * units.deg,
        pm_ra_cosdec=source.pm_ra_cosdec_mas_yr * rate,
        pm_dec=source.pm_dec_mas_yr * rate,
        **fields,
    )
    if source.name:
        coord.info.name = source.name
    return coord


def _name(value: Any, name: str | None) -> str | None:
    found = name if name is not None else value.info.name
    return None if found is None else str(found)


def _one(value: Any, what: str, ours: str) -> None:
    if value.shape != ():
        raise InvalidInput(f"{what} of shape {value.shape} is several {ours}: take them one by one, as value[i]")
