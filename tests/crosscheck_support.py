"""Other programs with their mistakes, made without the catalogue: by other chains, tables and published formulas."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import replace
from functools import lru_cache

import numpy as np

import tscale
from tscale import Instants
from tscale.earth.rotation import orientation
from tscale.formats.leap_seconds import LeapSeconds
from tscale.transforms import observer_to_barycenter

SITE = tscale.Site.from_geodetic("Kestrel Ridge", 127.3518, -26.1473, 612.4)
SOURCE = tscale.Source(187.2519, -12.6408, pm_ra_cosdec_mas_yr=30.0, pm_dec_mas_yr=-20.0, parallax_mas=6.2)
COUNT = 400


@lru_cache(maxsize=1)
def dates() -> Instants:
    """UTC over 18 years, with four leap seconds in them."""
    random = np.random.default_rng(11)
    whole = np.sort(random.integers(200_000_000, 780_000_000, COUNT))
    return Instants(whole, random.random(COUNT), "UTC")


@lru_cache(maxsize=8)
def right(end: str = "TDB@BARYCENTER") -> tscale.Chain:
    """What a program should do."""
    return tscale.chain("UTC", end, site=SITE, source=SOURCE)


def noise(level_s: float, seed: int, rho: float = 0.0, count: int = COUNT) -> np.ndarray:
    """Normal noise; of first order with a correlation of neighbours `rho`."""
    x = np.random.default_rng(seed).standard_normal(count)
    for i in range(1, count if rho else 0):
        x[i] = rho * x[i - 1] + np.sqrt(1.0 - rho**2) * x[i]
    return level_s * x


def front(**changed: object) -> Instants:
    """UTC to TDB at the barycentre with another source, site or table."""
    pieces = {"site": SITE, "source": SOURCE, **changed}
    return tscale.chain("UTC", "TDB@BARYCENTER", **pieces)(dates())  # type: ignore[arg-type]


def from_tai(shift_s: object, scale: str = "TAI", **changed: object) -> Instants:
    """As if the TAI (or another scale) of the dates were so much later than it is."""
    there = tscale.chain("UTC", scale)(dates()).shifted(np.broadcast_to(np.asarray(shift_s, float), COUNT))
    return tscale.chain(scale, "TDB@BARYCENTER", site=SITE, source=SOURCE)(there)


def tdb_shifted(shift_s: object) -> Instants:
    """As if TDB at the site were so much later than it is."""
    tdb = right("TDB")(dates())
    return tscale.chain("TDB", "TDB@BARYCENTER", site=SITE, source=SOURCE)(tdb.shifted(shift_s))  # type: ignore[arg-type]


def _after(text: str) -> np.ndarray:
    return dates().whole >= Instants.from_iso(text, scale="UTC").whole


def _tai_minus_utc() -> np.ndarray:
    return LeapSeconds.default().tai_minus_utc(dates().pair)


def _terms() -> tscale.Ledger:
    return right().ledger(dates())


def _short_series() -> np.ndarray:
    # USNO Circular 179 (Kaplan 2005), eq. 2.6: TDB - TT, T in centuries of TT from J2000.0.
    t = tscale.chain("UTC", "TT")(dates()).whole / 3155760000.0
    return (
        0.001657 * np.sin(628.3076 * t + 6.2401)
        + 0.000022 * np.sin(575.3385 * t + 4.2970)
        + 0.000014 * np.sin(1256.6152 * t + 6.1969)
        + 0.000005 * np.sin(606.9777 * t + 4.0212)
        + 0.000005 * np.sin(52.9691 * t + 0.4444)
        + 0.000002 * np.sin(21.3299 * t + 5.5431)
        + 0.000010 * t * np.sin(628.3076 * t + 4.2490)
    )


def _tdb_minus_tt_geocentre() -> np.ndarray:
    tt = tscale.chain("UTC", "TT")(dates())
    return -right().reference.time_ephemeris.tt_minus_tdb_s(tt.pair)


def _without_pole() -> Instants:
    """The site where it would be if the pole of every date were that of the ITRS."""
    tt = tscale.chain("UTC", "TT")(dates())
    reference = right().reference
    found = orientation(tt.pair, reference)
    still = found._replace(pole_x_rad=0.0 * found.pole_x_rad, pole_y_rad=0.0 * found.pole_y_rad)
    moved_m = still.celestial(np.array(SITE.position_m)) - SITE.gcrs(tt.pair, reference)[0]
    toward = SOURCE.direction(right("TDB")(dates()).pair)
    return right()(dates()).shifted(np.sum(moved_m * toward, axis=-1) / 299792458.0)


def _julian_date(days_from: float) -> Instants:
    day, fraction = right()(dates()).to_mjd()
    single = (day + days_from) + fraction
    whole = np.floor(single)
    return Instants.from_mjd((whole - np.floor(days_from)).astype(int), (single - whole) - days_from % 1.0, "TDB")


def _given_as_julian_date() -> Instants:
    day, fraction = dates().to_jd()
    single = day + fraction
    return right()(Instants.from_jd(np.floor(single).astype(int), single - np.floor(single), "UTC"))


SINGLE: dict[str, Callable[[], Instants]] = {
    "all leap seconds left out": lambda: from_tai(-_tai_minus_utc()),
    "leap seconds with the wrong sign": lambda: from_tai(-2.0 * _tai_minus_utc()),
    "whole leap seconds": lambda: from_tai(-1.0),
    "leap second of 2017-01-01 (MJD 57754) left out": lambda: from_tai(-1.0 * _after("2017-01-01T00:00:00")),
    "leap seconds from 2012-07-01 (MJD 56109) on left out": lambda: from_tai(
        -1.0 * _after("2012-07-01") - 1.0 * _after("2015-07-01") - 1.0 * _after("2017-01-01")
    ),
    "32.184 s (TT - TAI) left out": lambda: from_tai(-32.184),
    "19 s (TAI - GPS time)": lambda: from_tai(-19.0),
    "TT(BIPM) in place of TT(TAI)": lambda: from_tai(27.66e-6),
    "UT1 in place of UTC at the start": lambda: from_tai(-(right("UT1").ledger(dates()).total)),
    "half a day": lambda: from_tai(43200.0),
    "TCB in place of TDB in the result (L_B)": lambda: Instants(
        *tscale.chain("UTC", "TCB@BARYCENTER", site=SITE, source=SOURCE)(dates()).pair, "TDB"
    ),
    "TCG in place of TT on the way (L_G)": lambda: tscale.chain("TT", "TDB@BARYCENTER", site=SITE, source=SOURCE)(
        Instants(*tscale.chain("UTC", "TCG")(dates()).pair, "TT")
    ),
    "TDB0 (65.5 us) left out": lambda: tdb_shifted(65.5e-6),
    "topocentric terms left out": lambda: tdb_shifted(
        -_terms()["topocentric v.r/c^2"] - _terms()["topocentric, order c^-4"]
    ),
    "Einstein integral (periodic terms) left out": lambda: tdb_shifted(-_tdb_minus_tt_geocentre()),
    "Einstein integral (periodic terms) with the wrong sign": lambda: tdb_shifted(-2.0 * _tdb_minus_tt_geocentre()),
    "short series of seven terms for the Einstein integral": lambda: tdb_shifted(
        _short_series() - _tdb_minus_tt_geocentre()
    ),
    "geocentre in place of the site (Roemer delay)": lambda: observer_to_barycenter(
        right("TDB")(dates()), right().reference, SOURCE, None
    ),
    "not carried to the barycentre": lambda: right("TDB")(dates()).at("BARYCENTER"),
    "Roemer delay with the wrong sign": lambda: right()(dates()).shifted(-2.0 * _terms()["Roemer delay"]),
    "parallax left out": lambda: front(source=replace(SOURCE, parallax_mas=0.0)),
    "Shapiro delay of the Sun left out": lambda: right()(dates()).shifted(-_terms()["minus Shapiro delay, sun"]),
    "proper motion left out": lambda: front(source=replace(SOURCE, pm_ra_cosdec_mas_yr=0.0, pm_dec_mas_yr=0.0)),
    "longitude of the site with the wrong sign": lambda: front(
        site=tscale.Site.from_geodetic("west", -127.3518, -26.1473, 612.4)
    ),
    "Sun in place of the barycentre": lambda: right()(dates()).shifted(
        -np.sum(
            right().reference.ephemeris.position("sun", right("TDB")(dates()).pair)
            * SOURCE.direction(right("TDB")(dates()).pair),
            axis=-1,
        )
        / 299792458.0
    ),
    "polar motion left out": _without_pole,
    "Julian Date in one float64 in the result": lambda: _julian_date(2400000.5),
    "Modified Julian Date in one float64 in the result": lambda: _julian_date(0.0),
    "Julian Date in one float64 at the start": _given_as_julian_date,
}
"""What a program with one mistake gives, by the name of the mistake."""

SMALLEST_S = {
    "TT(BIPM) in place of TT(TAI)": 27.66e-6,
    "TDB0 (65.5 us) left out": 65.5e-6,
    "topocentric terms left out": 1.3e-6,
    "polar motion left out": 1.2e-8,
    "parallax left out": 2.6e-6,
    "short series of seven terms for the Einstein integral": 2.3e-6,
    "Julian Date in one float64 in the result": 1.2e-5,
    "Modified Julian Date in one float64 in the result": 1.8e-7,
    "Julian Date in one float64 at the start": 1.2e-5,
}
"""Size (rms) of the small ones, s; all others are above 1e-5 s."""

PAIRS: dict[tuple[str, str], Callable[[], Instants]] = {
    ("leap second of 2017-01-01 (MJD 57754) left out", "parallax left out"): lambda: tscale.chain(
        "TAI", "TDB@BARYCENTER", site=SITE, source=replace(SOURCE, parallax_mas=0.0)
    )(tscale.chain("UTC", "TAI")(dates()).shifted(-1.0 * _after("2017-01-01T00:00:00"))),
    ("19 s (TAI - GPS time)", "proper motion left out"): lambda: tscale.chain(
        "TAI",
        "TDB@BARYCENTER",
        site=SITE,
        source=replace(SOURCE, pm_ra_cosdec_mas_yr=0.0, pm_dec_mas_yr=0.0),
    )(tscale.chain("UTC", "TAI")(dates()).shifted(-19.0)),
    ("32.184 s (TT - TAI) left out", "all leap seconds left out"): lambda: from_tai(-_tai_minus_utc() - 32.184),
    ("UTC in place of UT1 in the Earth's rotation", "polar motion left out"): lambda: front(
        reference=tscale.ReferenceData.load(earth_orientation=tscale.EarthOrientation.constant(ut1_minus_utc_s=0.0))
    ),
    ("geocentre in place of the site (Roemer delay)", "topocentric terms left out"): lambda: tscale.chain(
        "UTC@GEOCENTER", "TDB@BARYCENTER", source=SOURCE
    )(dates()),
    ("TCB in place of TDB in the result (L_B)", "parallax left out"): lambda: Instants(
        *tscale.chain("UTC", "TCB@BARYCENTER", site=SITE, source=replace(SOURCE, parallax_mas=0.0))(dates()).pair, "TDB"
    ),
    ("TDB0 (65.5 us) left out", "TT(BIPM) in place of TT(TAI)"): lambda: tdb_shifted(65.5e-6 + 27.66e-6),
    ("short series of seven terms for the Einstein integral", "topocentric terms left out"): lambda: tscale.chain(
        "TDB", "TDB@BARYCENTER", site=SITE, source=SOURCE
    )(Instants(*tscale.chain("UTC", "TT")(dates()).pair, "TDB").shifted(_short_series())),
    ("Shapiro delay of the Sun left out", "Shapiro delay of the planets left out"): lambda: right()(dates()).shifted(
        -sum(value for name, value in _terms().items() if "Shapiro" in name)
    ),
    ("proper motion left out", "longitude of the site with the wrong sign"): lambda: front(
        site=tscale.Site.from_geodetic("west", -127.3518, -26.1473, 612.4),
        source=replace(SOURCE, pm_ra_cosdec_mas_yr=0.0, pm_dec_mas_yr=0.0),
    ),
}
"""What a program with two mistakes gives."""
