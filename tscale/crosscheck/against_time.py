"""Conversions of dates against pyerfa and astropy."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Final

import numpy as np

from .. import exact
from ..chains import chain
from ..exact import FloatArray
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from .comparison import Conversion, Epochs, Result

__all__ = ["TIME_CONVERSIONS", "astropy_time"]

_FLOAT_DAYS: Final = "the fraction of a day is a float64 on their side: 10 ps, twice or three times rounded"


def _erfa(start: str, end: str, name: str) -> Callable[[Epochs], Result]:
    """A function of ERFA from two-part Julian Dates to such."""

    def run(epochs: Epochs) -> Result:
        import erfa

        t = epochs.on(start)
        ours = chain(start, end, reference=epochs.reference)(t.at(None))
        leaps = epochs.reference.leap_seconds
        day, fraction = t.to_jd(leap_seconds=leaps)
        first, second = getattr(erfa, name)(day.astype(np.float64), fraction)
        theirs = _of_days(np.asarray(first), np.asarray(second), end, leaps)
        return Result(epochs.utc, ours.minus(theirs))

    return run


def _of_days(first: FloatArray, second: FloatArray, scale: str, leaps: LeapSeconds) -> Instants:
    whole = np.floor(first)
    return Instants.from_jd(whole.astype(np.int64), (first - whole) + second, scale, leap_seconds=leaps)


def astropy_time(epochs: Epochs, *, with_site: bool = True) -> Any:
    """The epochs as an astropy Time of scale utc, at the site."""
    from astropy import units
    from astropy.coordinates import EarthLocation
    from astropy.time import Time

    day, fraction = epochs.utc.to_jd(leap_seconds=epochs.reference.leap_seconds)
    location = EarthLocation.from_geocentric(*epochs.site.position_m, unit=units.m) if with_site else None
    return Time(day.astype(np.float64), fraction, format="jd", scale="utc", location=location)


def _astropy(end: str) -> Callable[[Epochs], Result]:
    def run(epochs: Epochs) -> Result:
        from ..interop import from_astropy

        theirs = from_astropy(getattr(astropy_time(epochs), end.lower()), epochs.on(end).place)
        return Result(epochs.utc, epochs.on(end).minus(theirs))

    return run


def _geocentric_tdb(epochs: Epochs) -> Result:
    import erfa

    tdb = epochs.on("TDB")
    day, fraction = epochs.jd_tdb
    ours = -epochs.reference.time_ephemeris.tt_minus_tdb_s(tdb.pair)
    return Result(epochs.utc, ours - erfa.dtdb(day, fraction, 0.0, 0.0, 0.0, 0.0))


def _topocentric_series(epochs: Epochs) -> Result:
    import erfa

    day, fraction = epochs.jd_tdb
    _, ut = chain("UTC", "UT1", reference=epochs.reference)(epochs.utc).to_mjd()
    x, y, z = epochs.site.position_m
    here = erfa.dtdb(day, fraction, ut, np.arctan2(y, x), np.hypot(x, y) / 1e3, z / 1e3)
    series = here - erfa.dtdb(day, fraction, ut, 0.0, 0.0, 0.0)
    ledger = chain("UTC", "TCB", site=epochs.site, reference=epochs.reference).ledger(epochs.utc)
    return Result(epochs.utc, ledger["topocentric v.r/c^2"] - series)


def _gps(epochs: Epochs) -> Result:
    ours = chain("UTC", "GPS", reference=epochs.reference)(epochs.utc)
    start = Instants.from_iso("1980-01-06T00:00:00", scale="GPS")
    theirs = exact.from_seconds(np.asarray(astropy_time(epochs, with_site=False).gps))
    return Result(epochs.utc, exact.seconds(exact.subtract(exact.subtract(ours.pair, start.pair), theirs)))


def _read(epochs: Epochs) -> Result:
    """Labels that we write, read by ERFA's calendar."""
    import erfa

    leaps = epochs.reference.leap_seconds
    texts = epochs.utc.to_iso(12, leap_seconds=leaps).tolist()
    parts = [(int(t[:4]), int(t[5:7]), int(t[8:10]), int(t[11:13]), int(t[14:16]), float(t[17:])) for t in texts]
    first, second = erfa.dtf2d("UTC", *(np.array(column) for column in zip(*parts, strict=True)))
    return Result(epochs.utc, epochs.utc.minus(_of_days(np.asarray(first), np.asarray(second), "UTC", leaps)))


def _written(epochs: Epochs) -> Result:
    """Julian Dates of TT that we write, put into words by ERFA and read by us."""
    import erfa

    tt = epochs.on("TT").at(None)
    day, fraction = tt.to_jd()
    year, month, number, clock = erfa.d2dtf("TT", 9, day.astype(np.float64), fraction)
    parts = zip(year, month, number, clock["h"], clock["m"], clock["s"], clock["f"], strict=True)
    texts = [f"{y:04d}-{m:02d}-{d:02d}T{h:02d}:{mi:02d}:{s:02d}.{f:09d}" for y, m, d, h, mi, s, f in parts]
    return Result(epochs.utc, tt.minus(Instants.from_iso(texts, scale="TT")))


def _itself(layout: str) -> Callable[[Epochs], Result]:
    """A way out and in again, against the integers that the instants are."""

    def run(epochs: Epochs) -> Result:
        t, leaps = epochs.utc, epochs.reference.leap_seconds
        if layout == "ISO":
            back = Instants.from_iso(t.to_iso(18, leap_seconds=leaps), scale="UTC", leap_seconds=leaps)
        elif layout == "JD":
            back = Instants.from_jd(*t.to_jd(leap_seconds=leaps), scale="UTC", leap_seconds=leaps)
        else:
            from ..interop import from_astropy, to_astropy

            back = from_astropy(to_astropy(t, leap_seconds=leaps), leap_seconds=leaps)
        return Result(t, back.minus(t))

    return run


TIME_CONVERSIONS: Final = (
    Conversion("UTC - TAI", "ERFA utctai", "erfa", "s", 3e-11, _FLOAT_DAYS, _erfa("UTC", "TAI", "utctai")),
    Conversion("TAI - TT", "ERFA taitt", "erfa", "s", 3e-11, _FLOAT_DAYS, _erfa("TAI", "TT", "taitt")),
    Conversion("TT - TCG", "ERFA tttcg", "erfa", "s", 3e-11, _FLOAT_DAYS, _erfa("TT", "TCG", "tttcg")),
    Conversion("TDB - TCB", "ERFA tdbtcb", "erfa", "s", 3e-11, _FLOAT_DAYS, _erfa("TDB", "TCB", "tdbtcb")),
    Conversion(
        "UTC - UT1",
        "astropy",
        "astropy",
        "s",
        7e-5,
        "they interpolate the IERS table in a straight line: an eighth of what the length of day changes from row to "
        "row, 0.3 ms with the fortnightly tide, 0.5 ms in noisy rows",
        _astropy("UT1"),
    ),
    Conversion(
        "GPS seconds",
        "astropy",
        "astropy",
        "s",
        2.5e-7,
        "one float64 of 1e9 s on their side: steps of 0.12 or 0.24 us",
        _gps,
    ),
    Conversion(
        "TDB - TT, geocentre",
        "ERFA dtdb",
        "erfa",
        "s",
        1.5e-8,
        "an analytic series of 787 terms: 3 ns by its own "
        "words, and a drift of 0.25 ns a year against every new integration, within the 2e-17 of L_C",
        _geocentric_tdb,
    ),
    Conversion(
        "TDB - TT, topocentric",
        "ERFA dtdb",
        "erfa",
        "s",
        1e-8,
        "its topocentric part (Moyer 1981, Murray 1983) takes a circular orbit and a few planets",
        _topocentric_series,
    ),
    Conversion(
        "UTC - TDB at a site", "astropy", "astropy", "s", 2.5e-8, "the series of both lines above", _astropy("TDB")
    ),
    Conversion("ISO 8601 text read", "ERFA dtf2d", "erfa", "s", 3e-11, _FLOAT_DAYS, _read),
    Conversion(
        "calendar of a Julian Date",
        "ERFA d2dtf",
        "erfa",
        "s",
        6e-10,
        "9 decimals are written: half a unit of the last, and the fraction of a day",
        _written,
    ),
    Conversion(
        "ISO 8601 there and back",
        "itself",
        "",
        "s",
        1.2e-16,
        "dates are held to 0.11 fs, the text has 18 decimals",
        _itself("ISO"),
    ),
    Conversion(
        "Julian Date there and back",
        "itself",
        "",
        "s",
        1e-11,
        "a float64 fraction of a day resolves 10 ps",
        _itself("JD"),
    ),
    Conversion(
        "astropy Time there and back",
        "itself",
        "astropy",
        "s",
        5e-12,
        "half a unit of the last place of a fraction of a day",
        _itself("astropy"),
    ),
)
