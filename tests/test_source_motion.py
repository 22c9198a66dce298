"""Where a source is at another date, against astropy."""

from __future__ import annotations

import astropy.units as u
import numpy as np
import pytest
from astropy.coordinates import SkyCoord
from astropy.time import Time

import tscale

MAS = np.pi / (180 * 3600e3)


@pytest.mark.parametrize("date", ["2031-03-01T00:00:00", "1995-07-01T00:00:00"])
def test_proper_motion_against_astropy(date: str) -> None:
    # 10.4 arcsec a year at declination 75 degrees over 40 years; found 1.3e-7 mas, a few roundings of 2e-8 mas.
    # At 1.8 pc, for astropy will not have a star that moves at a third of the speed of light.
    # Without its epoch the source would be off by 90 arcsec, with cos(dec) counted twice by 20 arcsec.
    source = tscale.Source(269.45, 74.69, -801.6, 10362.4, parallax_mas=548, epoch="1991-04-02T13:30:00")
    theirs = SkyCoord(
        ra=269.45 * u.deg,
        dec=74.69 * u.deg,
        pm_ra_cosdec=-801.6 * u.mas / u.yr,
        pm_dec=10362.4 * u.mas / u.yr,
        distance=1.825 * u.pc,
        radial_velocity=0 * u.km / u.s,
        obstime=Time("1991-04-02T13:30:00", scale="tdb"),
    ).apply_space_motion(new_obstime=Time(date, scale="tdb"))
    direction = theirs.cartesian.xyz.value
    ours = source.direction(tscale.Instants.from_iso(date, scale="TDB").pair)
    off = np.linalg.norm(np.cross(ours, direction / np.linalg.norm(direction)))
    assert off / MAS < 1e-5
