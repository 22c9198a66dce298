"""Clocks of an invented laboratory as files, for tests of `tscale clock`."""

from __future__ import annotations

import pytest

from tscale.cli import main as entry

MARCH = ("--start", "2025-03-01", "--stop", "2025-03-08")


def site(name: str, *lines: str, lat_deg: float = 45.0, height_m: float = 50.0) -> str:
    place = f"geodetic = {{ lon_deg = 7.4, lat_deg = {lat_deg!r}, height_m = {height_m!r} }}"
    return "\n".join(["[site]", f'name = "{name}"', place, *lines]) + "\n"


ORBIT = """\
[orbit]
name = "Lantern"
center = "earth"
epoch = "2025-03-01T00:00:00"
scale = "UTC"
a_m = 26561750.0
e = 0.02
i_deg = 55.0
node_deg = 10.0
periapsis_deg = 20.0
mean_anomaly_deg = 30.0
"""
FLIGHT = """\
instant,lon_deg,lat_deg,height_m
2025-03-01T00:00:00,10,45,{0}
2025-03-01T04:00:00,50,50,{0}
"""
FILES = {
    "ridge.toml": site("Kestrel Ridge", "height_above_geoid_m = 600.0"),
    "bay.toml": site("Tern Bay", "geopotential_number_m2_s2 = 200.0"),
    "hut.toml": site("Osprey Hut", height_m=80.0),
    "geoid.toml": site("Geoid", "geopotential_number_m2_s2 = 0.0"),
    "orbit.toml": ORBIT,
    "moon.toml": '[surface]\nname = "Ochre Camp"\nbody = "moon"\nlon_deg = 10.0\nlat_deg = -5.0\n',
    "mars.toml": '[surface]\nname = "Rust Camp"\nbody = "mars"\nlon_deg = 137.4\nlat_deg = -4.6\n',
    "flight.csv": FLIGHT.format(10000),
    "higher.csv": FLIGHT.format(10100),
}


def text(capsys: pytest.CaptureFixture[str], *words: str) -> str:
    assert entry.main(["clock", *words]) == 0
    return capsys.readouterr().out
