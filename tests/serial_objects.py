"""Objects of every kind that can be stored, for the tests of JSON and pickle."""

from __future__ import annotations

import tempfile
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np

import tscale

EXAMPLES = Path(__file__).parents[1] / "examples"
SITE = tscale.Site.load(EXAMPLES / "site.toml")
STAR = tscale.Source.load(EXAMPLES / "source.toml")
READINGS = tscale.Instants.from_iso(["2025-03-03T12:21:00.639426798458", "2025-03-04T00:00:00.1"], scale="CLOCK(maser)")
UTC = tscale.Instants.from_iso(["2025-03-01T12:00:00", "2025-03-02T01:02:03.456789"], scale="UTC")
NOISE = tscale.ClockNoise(white_frequency=1e-13, flicker_frequency=1e-15)


def log(interpolation: Any = "linear") -> tscale.ClockLog:
    return tscale.ClockLog.load(EXAMPLES / "maser.csv", interpolation=interpolation)


def rows(start: str, **options: Any) -> tscale.ClockLog:
    epoch = tscale.Instants.from_iso(start, "UTC").shifted(np.arange(6) * 3600.0)
    return tscale.ClockLog.from_rows(
        "quartz", epoch, np.array([0.1, 0.2, 0.25, 0.35, 0.5, 0.4]) * 1e-6, 1e-9, **options
    )


def predicted(interpolation: Any, drift: bool) -> tscale.ClockLog:
    known = log(interpolation)
    ends = {"until": known.span[-1:].shifted(86400.25), "start": known.span[:1].shifted(-86400.0)}
    return known.predicted(NOISE, fit_s=5 * 86400.0, drift=drift, **ends)


def joined() -> tscale.ClockLog:
    return tscale.ClockLog.joined([rows("2025-03-01"), rows("2025-03-02")], within_s=86400.0)


def broken() -> tscale.ClockLog:
    return rows(
        "2025-03-01",
        reset_s=[0.0, 0.0, 1.5, 0.0, np.nan, 0.0],
        rate_step=[False, True, False, False, False, False],
        use=[True, True, True, False, True, True],
    )


LOGS: dict[str, Callable[[], tscale.ClockLog]] = {
    "linear log": log,
    "cubic log": lambda: log("cubic"),
    "step log": lambda: log("step"),
    "log with gaps": lambda: rows("2025-03-01", missing=[False, False, True, False, False, False], max_gap_s=1e5),
    "log with resets": broken,
    "predicted log": lambda: predicted("linear", False),
    "predicted cubic log": lambda: predicted("cubic", True),
    "joined log": joined,
}


def kepler(center: str = "earth") -> tscale.Trajectory:
    epoch = tscale.Instants.from_iso("2025-03-01", scale="UTC" if center == "earth" else "TDB")
    a_m = 7.0e6 if center == "earth" else 9.1e6
    return tscale.Trajectory.from_kepler(epoch, a_m, 0.01, 51.6, 20.0, 0.0, 0.0, center=center, name="orbiter")


def states(method: Any = "hermite", frame: Any = "GCRS") -> tscale.Trajectory:
    t = tscale.Instants.from_iso("2025-03-01T09:00:00", "TT").shifted(np.arange(40) * 300.0)
    angle = np.arange(40) * 0.3
    position = 7e6 * np.stack([np.cos(angle), np.sin(angle), 0.1 * np.sin(angle)], axis=-1)
    velocity = 7e3 * np.stack([-np.sin(angle), np.cos(angle), 0.1 * np.cos(angle)], axis=-1)
    return tscale.Trajectory.from_states(t, position, velocity, frame, method=method, name="tabulated")


def flight() -> tscale.Trajectory:
    with tempfile.TemporaryDirectory() as folder:
        path = Path(folder) / "flight.csv"
        path.write_text(
            "instant,lon_deg,lat_deg,height_m\n2025-03-01T09:00:00,10,50,100\n2025-03-01T10:30:00,12,51,9500\n"
            "2025-03-01T12:00:00,20,48,200\n",
            encoding="utf-8",
        )
        return tscale.Trajectory.from_flight(path)


def spk() -> tscale.Trajectory:
    return tscale.Trajectory.from_spk(next((EXAMPLES.parent / "ephemeris_cache").glob("*.bsp")), 301)


ORBITS: dict[str, Callable[[], tscale.Trajectory]] = {
    "kepler": kepler,
    "kepler about Mars": lambda: kepler("mars"),
    "states": states,
    "states, lagrange": lambda: states("lagrange"),
    "states, ITRS": lambda: states(frame="ITRS"),
    "flight": flight,
}

VALUES: dict[str, Callable[[], Any]] = {
    "instants": lambda: READINGS,
    "site": lambda: SITE,
    "plain site": lambda: tscale.Site.from_itrf("plain", 6371000, 0, 0),
    "crater": lambda: tscale.SurfaceSite("crater", "moon", 10, -20.5, height_m=30, height_above_geoid_m=25.5),
    "star": lambda: STAR,
    "noise": lambda: NOISE,
    "free clock": lambda: tscale.ProperClock(
        "caesium",
        tscale.Site.from_geodetic("lab", 1.0, 52.0, 30.0, height_above_geoid_m=3.0),
        UTC[0],
        tscale.Instants.from_seconds(5, 0.25, "PROPER(caesium)"),
    ),
    "provenance": lambda: to_barycentre()[0].provenance(READINGS),
    **LOGS,
    **ORBITS,
}


def to_barycentre() -> tuple[tscale.Chain, tscale.Instants]:
    logs = [log(), tscale.ClockLog.load(EXAMPLES / "utc_krl.csv")]
    return tscale.chain("CLOCK(maser)", "TDB@BARYCENTER", site=SITE, clocks=logs, source=STAR), READINGS


def from_free_clock() -> tuple[tscale.Chain, tscale.Instants]:
    clock = VALUES["free clock"]()
    t = tscale.Instants.from_seconds([5, 86405], [0.25, 0.5], "PROPER(caesium)")
    return tscale.chain("PROPER(caesium)", "TT", clocks=[clock]), t


CHAINS: dict[str, Callable[[], tuple[tscale.Chain, tscale.Instants]]] = {
    "to the barycentre": to_barycentre,
    "with second order": lambda: (
        tscale.chain("UTC", "TDB@BARYCENTER", site=kepler(), source=STAR, second_order=True),
        UTC,
    ),
    "without a site": lambda: (tscale.chain("UTC", "GPS"), UTC),
    "from a crater": lambda: (tscale.chain("UTC", "TDB", site=VALUES["crater"]()), UTC),
    "from a free clock": from_free_clock,
}


def link() -> Any:
    return tscale.link.one_way(transmit=UTC, transmitter=SITE, receiver=kepler("mars"), occultation="ignore")


def two_way() -> Any:
    return tscale.link.two_way(transmit=UTC[0], station=SITE, target=kepler("mars"), occultation="ignore")
