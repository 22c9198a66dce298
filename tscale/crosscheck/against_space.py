"""Places, delays and light times against pyerfa, astropy and skyfield."""

from __future__ import annotations

import importlib
from typing import Any, Final

import numpy as np

from ..chains import chain
from ..constants import AU_M, C_M_S, DAY_S
from ..counts import tai_from_tt
from ..earth.frames import dot
from ..exact import FloatArray
from ..instants import Instants
from ..transforms.wavefront import wavefront_terms
from .against_time import astropy_time
from .comparison import Conversion, Epochs, Result

__all__ = ["SPACE_CONVERSIONS"]

_TARGETS: Final = ("mercury", "venus", "moon", "mars", "jupiter", "saturn")
_ALONE: Final = ("moon",)


def _largest(vectors: FloatArray) -> FloatArray:
    """Component of largest size of each vector, with its sign."""
    at = np.argmax(np.abs(vectors), axis=-1)[..., np.newaxis]
    return np.take_along_axis(vectors, at, axis=-1)[..., 0]


def _site_vector(epochs: Epochs) -> Result:
    """The whole rotation with pyerfa's own series and matrices, from the same UT1 and pole."""
    import erfa

    tt = epochs.on("TT")
    eop = epochs.reference.earth_orientation.at(tai_from_tt(tt.pair))
    day, fraction = (np.asarray(part, dtype=np.float64) for part in tt.to_jd())
    x, y, s = erfa.xys06a(day, fraction)
    celestial = erfa.c2ixys(x + eop.dx_rad, y + eop.dy_rad, s)
    ut_day, ut_fraction = chain("UTC", "UT1", reference=epochs.reference)(epochs.utc).to_jd()
    polar = erfa.pom00(eop.x_rad, eop.y_rad, erfa.sp00(day, fraction))
    matrix = erfa.c2tcio(celestial, erfa.era00(ut_day.astype(np.float64), ut_fraction), polar)
    theirs = np.einsum("nji,j->ni", matrix, np.array(epochs.site.position_m))
    ours, _ = epochs.site.gcrs(tt.pair, epochs.reference)
    return Result(epochs.utc, _largest(ours - theirs))


def _earth_series(epochs: Epochs) -> Result:
    import erfa

    theirs = erfa.epv00(*epochs.jd_tdb)[0]["p"] * AU_M
    ours = epochs.reference.ephemeris.position("earth", epochs.on("TDB").pair, "sun")
    return Result(epochs.utc, _largest(ours - theirs))


def _earth_speed(epochs: Epochs) -> Result:
    import erfa

    theirs = erfa.epv00(*epochs.jd_tdb)[1]["v"] * (AU_M / DAY_S)
    _, ours = epochs.reference.ephemeris.state("earth", epochs.on("TDB").pair)
    return Result(epochs.utc, _largest(ours - theirs))


def _astropy_vectors(epochs: Epochs) -> tuple[FloatArray, FloatArray]:
    """Barycentric Earth at the TDB of the site, and geocentric site, by astropy; m."""
    from astropy import coordinates, units
    from astropy.time import Time

    kernel = str(epochs.reference.ephemeris.path)
    moment = Time(*epochs.jd_tdb, format="jd", scale="tdb")
    with coordinates.solar_system_ephemeris.set(kernel):
        earth = coordinates.get_body_barycentric("earth", moment).xyz.to_value(units.m).T
    time = astropy_time(epochs)
    site = time.location.get_gcrs_posvel(time)[0].xyz.to_value(units.m).T
    return np.asarray(earth), np.asarray(site)


def _earth_same_kernel(epochs: Epochs) -> Result:
    earth, _ = _astropy_vectors(epochs)
    ours = epochs.reference.ephemeris.position("earth", epochs.on("TDB").pair)
    return Result(epochs.utc, _largest(ours - earth))


def _topocentric(epochs: Epochs) -> Result:
    import erfa

    _, site = _astropy_vectors(epochs)
    velocity = erfa.epv00(*epochs.jd_tdb)[1]["v"] * (AU_M / DAY_S)
    ledger = chain("UTC", "TCB", site=epochs.site, reference=epochs.reference).ledger(epochs.utc)
    return Result(epochs.utc, ledger["topocentric v.r/c^2"] - dot(velocity, site) / C_M_S**2)


def _ours_roemer(epochs: Epochs) -> FloatArray:
    terms = wavefront_terms(epochs.on("TDB").pair, epochs.reference, epochs.source, epochs.site, with_rate=False)
    return terms.terms_s["Roemer delay"]


def _roemer(epochs: Epochs) -> Result:
    earth, site = _astropy_vectors(epochs)
    theirs = dot(earth + site, epochs.source.direction(epochs.on("TDB@BARYCENTER").pair)) / C_M_S
    return Result(epochs.utc, _ours_roemer(epochs) - theirs)


def _travel_time(epochs: Epochs) -> Result:
    from astropy import coordinates, units

    kernel = str(epochs.reference.ephemeris.path)
    time = astropy_time(epochs)
    toward = coordinates.SkyCoord(epochs.source.ra_deg * units.deg, epochs.source.dec_deg * units.deg, frame="icrs")
    with coordinates.solar_system_ephemeris.set(kernel):
        theirs = time.light_travel_time(toward, kind="barycentric", ephemeris=kernel).to_value(units.s)
    return Result(epochs.utc, _ours_roemer(epochs) - np.asarray(theirs))


def _light_time(epochs: Epochs) -> Result:
    api = importlib.import_module("skyfield.api")

    from ..link import one_way

    t = Instants(*epochs.on("TDB").pair, "TDB")
    day, fraction = epochs.jd_tdb
    found, dates = [], []
    timescale: Any = api.load.timescale(builtin=True)
    kernel: Any = api.load_file(str(epochs.reference.ephemeris.path))
    try:
        when = timescale.tdb_jd(day, fraction)
        for target in _TARGETS:
            name = target.upper() if target in _ALONE else f"{target.upper()} BARYCENTER"
            theirs = np.asarray(kernel["EARTH"].at(when).observe(kernel[name]).light_time) * DAY_S
            ours = one_way(
                receive=t,
                transmitter=target,
                receiver="earth",
                reference=epochs.reference,
                bodies=(),
                occultation="ignore",
            )
            found.append(ours.light_time_s - theirs)
            dates.append(epochs.utc)
    finally:
        kernel.close()
    return Result(Instants.concatenate(dates), np.concatenate(found))


SPACE_CONVERSIONS: Final = (
    Conversion(
        "site vector",
        "ERFA, IAU 2006/2000A",
        "erfa",
        "m",
        2e-6,
        "both sides round the Earth rotation angle to 1e-13 rad",
        _site_vector,
    ),
    Conversion(
        "Earth from the Sun, analytic",
        "ERFA epv00",
        "erfa",
        "m",
        1.3e4,
        "a series fitted to DE405: 11.2 km at most by its own words, and DE405 is 1 km off here",
        _earth_series,
    ),
    Conversion(
        "velocity of the Earth",
        "ERFA epv00",
        "erfa",
        "m/s",
        6e-3,
        "a series: 5 mm/s at most by its own words",
        _earth_speed,
    ),
    Conversion(
        "Earth, same kernel",
        "astropy",
        "astropy",
        "m",
        1e-4,
        "two-part dates in days: 10 ps, and vectors of 1 au in km, 3e-5 m on each leg",
        _earth_same_kernel,
    ),
    Conversion(
        "topocentric v.r/c^2",
        "astropy and ERFA",
        "astropy",
        "s",
        1e-12,
        "5 mm/s in their velocity of the Earth: 0.4 ps",
        _topocentric,
    ),
    Conversion(
        "Roemer delay, n.r/c",
        "astropy",
        "astropy",
        "s",
        1e-9,
        "scale and Lorentz terms of the site vector (IERS "
        "Conventions 2010, eq. 11.19) are not in n.r of their vectors: 0.6 ns; UT1 in a straight line: 0.1 ns",
        _roemer,
    ),
    Conversion(
        "light travel time to the barycentre",
        "astropy",
        "astropy",
        "s",
        2.3e-6,
        "they turn the site vector by the aberration of light: 20.5 arcsec of 6378 km, 2.1 us",
        _travel_time,
    ),
    Conversion(
        "light time to bodies",
        "skyfield",
        "skyfield",
        "s",
        2e-11,
        "they iterate to 1e-12 day: v/c of that, 10 ps, and the rounding of positions of 1e12 m",
        _light_time,
    ),
)
