"""`tscale clock`: rates, budgets, comparisons, levelling, orbits and other bodies, against published values."""

from __future__ import annotations

import csv
import json
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import tscale
from tscale.cli import main as entry
from tscale.constants import EARTH_FIELD_RADIUS_M, EARTH_GM_TT_M3_S2
from tscale.earth.gravity import HarmonicField

from .clock_support import FILES, MARCH, ORBIT, site, text

C2 = 299792458.0**2
DAY_US = 86400e6


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    for name, content in FILES.items():
        (tmp_path / name).write_text(content, encoding="utf-8")
    monkeypatch.chdir(tmp_path)
    return tmp_path


@pytest.fixture
def found(folder: Path, capsys: pytest.CaptureFixture[str]) -> Any:
    """What a command finds, as JSON."""

    def run(*words: str) -> Any:
        assert entry.main(["clock", *words, "--json"]) == 0
        return json.loads(capsys.readouterr().out)

    return run


# ---- one clock -----------------------------------------------------------------------------------


def test_a_clock_on_the_geoid_keeps_tt(found: Any) -> None:
    # TT is defined by it. L_G is W0/c^2 rounded to 1e-19, and has no second order, W0^2/(2 c^4) = 2.4e-19.
    rate = found("geoid.toml", *MARCH, "--no-tides")["rate"]
    assert rate == pytest.approx(2.4e-19, rel=0, abs=0.5e-19)


def test_terms_add_up_and_are_told(found: Any, folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    one = found("ridge.toml", *MARCH)
    assert sum(term["rate"] for term in one["terms"].values()) == pytest.approx(one["rate"], rel=0, abs=1e-24)
    assert one["rate"] * one["duration_s"] == pytest.approx(one["accumulated_s"], rel=1e-15, abs=0)
    assert one["duration_s"] == pytest.approx(7 * 86400.0, rel=0, abs=1e-9)
    assert one["lowest_rate"] < one["rate"] < one["highest_rate"]
    # 600 m at 9.806 m/s2 less 1.5e-7 per metre of height squared: 1.0911e-16 per metre.
    assert one["rate"] == pytest.approx(600.0 * 1.0910e-16, rel=2e-4, abs=0)
    lines = text(capsys, "ridge.toml", *MARCH).splitlines()
    assert lines[0].startswith("clock    Kestrel Ridge  on the ground")
    head = next(line for line in lines if line.startswith("term"))
    assert head.split() == ["term", "rate", "(1e-15)", "ns/day", "gained", "(ns)"]
    shown = next(line for line in lines if line.startswith("Kestrel Ridge against TT")).split()
    assert float(shown[-3]) == pytest.approx(one["rate"] * 1e15, rel=0, abs=0.6e-5)
    assert float(shown[-2]) == pytest.approx(one["rate"] * 86400e9, rel=0, abs=0.6e-6)
    assert float(shown[-1]) == pytest.approx(one["accumulated_s"] * 1e9, rel=0, abs=0.6e-6)


@pytest.mark.parametrize("against", ["TCG", "TDB", "TCB"])
def test_it_is_what_a_chain_gives(found: Any, folder: Path, against: str) -> None:
    # Two ways: the sums of the command, and readings carried by a chain of steps.
    one = found("ridge.toml", *MARCH, "--against", against)
    ridge = tscale.Site.load("ridge.toml")
    start, stop = (tscale.Instants.from_iso(date, scale="UTC") for date in MARCH[1::2])
    clock = tscale.ProperClock("ridge", ridge, start)
    readings = tscale.chain("UTC", "PROPER(ridge)", site=ridge, clocks=[clock])
    other = tscale.chain("UTC", against, site=ridge)
    apart = [(chain(stop).minus_exact(chain(start))) for chain in (readings, other)]
    gained = float((apart[0][0] - apart[1][0]) + (apart[0][1] - apart[1][1]))
    # The fractions of two dates each are rounded to 0.1 fs.
    assert one["accumulated_s"] == pytest.approx(gained, rel=0, abs=1e-15)


def test_a_set_offset(found: Any) -> None:
    plain = found("orbit.toml", *MARCH)
    offset = plain["clocks"][0]["orbit"]["factory_offset"]
    assert offset < 0.0  # written -4.46e-10, which is no option
    made = found("orbit.toml", *MARCH, "--set-offset", repr(offset))
    assert made["terms"]["set rate offset"]["rate"] == pytest.approx(offset, rel=1e-9, abs=0)
    assert made["rate"] == pytest.approx(plain["rate"] + offset * (1 + plain["rate"]), rel=0, abs=1e-19)


def test_rows_and_steps(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    text(capsys, "ridge.toml", "bay.toml", *MARCH, "--step", "3600", "--output", "rows.csv")
    with open("rows.csv", newline="") as file:
        rows = list(csv.DictReader(file))
    assert len(rows) == 7 * 24 + 1
    assert rows[1]["UTC"] == "2025-03-01T01:00:00.000000"
    assert float(rows[0]["gained (s)"]) == 0.0
    ends = [tscale.Instants.from_iso(rows[i]["UTC"], scale="UTC") for i in (0, -1)]
    compared = tscale.compare_clocks(tscale.Site.load("ridge.toml"), tscale.Site.load("bay.toml"), *ends)
    assert float(rows[-1]["gained (s)"]) == pytest.approx(compared.accumulated_s, rel=0, abs=1e-18)
    for row in rows[::40]:
        terms = [float(value) for name, value in row.items() if name.startswith("rate ")]
        assert sum(terms) == pytest.approx(float(row["rate"]), rel=0, abs=1e-24)


def test_the_same_bytes_every_time(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    words = ("flight.csv", "ridge.toml", "--height-sigma", "30,0.03", "--speed-sigma", "2,0")
    contents = []
    for number in "12":
        files = [f"{kind}{number}.{kind}" for kind in ("png", "csv")]
        shown = text(capsys, *words, "--plot", files[0], "--output", files[1])
        shown += text(capsys, *words, "--json")
        contents.append([shown, *(Path(file).read_bytes() for file in files)])
    assert contents[0] == contents[1]
    assert contents[0][1].startswith(b"\x89PNG")


def test_a_picture_of_one_clock(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    text(capsys, "moon.toml", *MARCH, "--plot", "rate.svg")
    assert "<svg" in Path("rate.svg").read_text(encoding="utf-8")


# ---- budgets -------------------------------------------------------------------------------------


def test_sensitivities_are_derivatives(found: Any, folder: Path) -> None:
    words = ("--height-sigma", "0.03", *MARCH)
    one = found("ridge.toml", *words)
    line = {row["quantity"]: row for row in one["budget"]}["height above the geoid"]
    assert line["sigma"] == 0.03
    Path("raised.toml").write_text(FILES["ridge.toml"].replace("600.0", "601.0").replace("50.0", "51.0"))
    slope = found("raised.toml", *words)["rate"] - one["rate"]
    # Gravity at the height of the ellipsoid for that at the geoid's: 50 m, 1.5e-5 of it.
    assert line["sensitivity"] == pytest.approx(slope, rel=3e-4, abs=0)
    assert line["rate_sigma"] == pytest.approx(0.03 * line["sensitivity"], rel=1e-12, abs=0)
    flown, higher = found("flight.csv", "--height-sigma", "10"), found("higher.csv")
    line = {row["quantity"]: row for row in flown["budget"]}["mean distance from the geocentre"]
    # The flight that is higher is faster in space too: omega^2 r, 0.3 % of gravity, and its speed eastward.
    assert line["sensitivity"] == pytest.approx((higher["rate"] - flown["rate"]) / 100.0, rel=0.02, abs=0)


def test_a_budget_adds_in_squares(found: Any, capsys: pytest.CaptureFixture[str]) -> None:
    words = ("flight.csv", "ridge.toml", "--height-sigma", "30,0.03", "--speed-sigma", "2,0")
    two = found(*words)
    total = np.sqrt(sum(row["rate_sigma"] ** 2 for row in two["budget"]))
    assert two["rate_sigma"] == pytest.approx(total, rel=1e-9, abs=0)
    assert two["accumulated_sigma_s"] == pytest.approx(total * two["duration_s"], rel=1e-9, abs=0)
    speed = {row["quantity"]: row for row in two["budget"]}["mean speed"]
    assert speed["sensitivity"] == pytest.approx(-speed["value"] / C2, rel=1e-12, abs=0)
    assert {row["clock"] for row in two["budget"]} == {"flight", "Kestrel Ridge"}
    shown = text(capsys, *words)
    assert f"combined standard uncertainty  {total:.2e}" in shown
    assert "zero of the height system" in shown


def test_what_two_clocks_share_cancels(found: Any, folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    # One above the other: the gravity that is not known is the same for both, but for 10 of 600 m, and so are tides.
    Path("attic.toml").write_text(FILES["ridge.toml"].replace("600.0", "610.0").replace("50.0", "60.0"))
    two = found("attic.toml", "ridge.toml", *MARCH)
    assert [pair["r"] for pair in two["correlations"]] == pytest.approx([1.0, 1.0], rel=0, abs=1e-6)
    assert two["rate_sigma"] == pytest.approx(5e-4 * 10.0 / C2, rel=0.01, abs=0)
    # 40 km apart anomalies of gravity are half alike.
    Path("far.toml").write_text(FILES["ridge.toml"].replace("45.0", "45.3598"))
    apart = found("far.toml", "ridge.toml", *MARCH)
    assert apart["correlations"][0]["r"] == pytest.approx(0.5, rel=0, abs=0.01)
    assert "of both clocks, r = +0.5" in text(capsys, "far.toml", "ridge.toml", *MARCH)
    # On Mars the potential of the areoid is one number for all.
    camps = found("mars.toml", "mars.toml", *MARCH)
    assert max(pair["r"] for pair in camps["correlations"]) == 1.0


def test_gravity_left_out_is_of_its_real_size(found: Any, capsys: pytest.CaptureFixture[str]) -> None:
    # Degree 2 order 2 of the Earth (IERS Conventions 2010, table 6.2 from memory: 2.4393e-6 and -1.4003e-6, fully
    # normalised) is most of what J2 to J6 leave out at the height of a navigation satellite.
    c, s = np.zeros((3, 3)), np.zeros((3, 3))
    c[0, 0], c[2, 0], c[2, 2], s[2, 2] = 1.0, -4.841694e-4, 2.4393e-6, -1.4003e-6
    for path, keep in (("field.gfc", 1.0), ("round.gfc", 0.0)):
        c22, s22 = c.copy(), s.copy()
        c22[2, 2], s22[2, 2] = keep * c[2, 2], keep * s[2, 2]
        HarmonicField("degree 2", EARTH_GM_TT_M3_S2, EARTH_FIELD_RADIUS_M, c22, s22, "zero_tide").save(path)
    rates = []
    for gravity in ("field.gfc", "round.gfc"):
        text(capsys, "orbit.toml", *MARCH, "--gravity", gravity, "--output", "rates.csv")
        with open("rates.csv", newline="") as file:
            rates.append(np.array([float(row["rate"]) for row in csv.DictReader(file)]))
    stated = found("orbit.toml", *MARCH)["budget"][0]
    assert stated["quantity"] == "gravity that J2 to J6 leave out"
    assert np.std(rates[0] - rates[1]) == pytest.approx(stated["rate_sigma"], rel=0.6, abs=0)
    assert found("orbit.toml", *MARCH, "--gravity", "field.gfc")["budget"][0]["quantity"] == "gravity beyond degree 2"


def test_what_is_not_used_is_said(found: Any, folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    c, s = np.zeros((3, 3)), np.zeros((3, 3))
    c[0, 0], c[2, 0] = 1.0, -4.841694e-4
    HarmonicField("small", EARTH_GM_TT_M3_S2, EARTH_FIELD_RADIUS_M, c, s, "zero_tide").save("small.gfc")
    assert entry.main(["clock", "ridge.toml", *MARCH, "--gravity", "small.gfc"]) == 0
    assert "--gravity was not used" in capsys.readouterr().err
    by_field = found("hut.toml", *MARCH, "--gravity", "small.gfc")
    # A field to J2 is good to the undulation of the geoid, 30 m: 4e-15; 80 m above the ellipsoid are 8.7e-15.
    assert by_field["rate"] == pytest.approx(80.0 * 1.091e-16, rel=0, abs=4 * by_field["rate_sigma"])
    assert 2e-15 < by_field["rate_sigma"] < 8e-15


def test_tides(found: Any) -> None:
    with_tides, without = found("bay.toml", *MARCH), found("bay.toml", *MARCH, "--no-tides")
    tide = {row["quantity"]: row for row in without["budget"]}["tides, left out"]
    # Up to 3e-17 as a whole (for instance 3.3e-17 for 3 m2/s2).
    assert 1e-17 < tide["rate_sigma"] * np.sqrt(3.0) < 4e-17
    assert without["terms"]["tidal"]["rate"] == 0.0
    free = found("bay.toml", *MARCH, "--tide-system", "mean_tide")
    assert 1e-18 < abs(free["rate"] - with_tides["rate"]) < 3e-17


# ---- published -----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("upper", "lower", "lat_deg", "per_day_ns", "sigma_ns"),
    [
        # Nuovo Cimento B 37, 219 (1977): predicted 30.6 ns a day; measured 33.8 +- 6.8 (from memory).
        (3500.0, 250.0, 45.0, 30.6, 0.05),
        (3500.0, 250.0, 45.0, 33.8, 6.8),
        # Nature Photonics 14, 411 (2020): 450 m, about 4.24 ns a day; 1 % for the height as quoted.
        (450.0, 0.0, 35.7, 4.24, 0.0424),
    ],
)
def test_two_clocks_on_the_ground(
    found: Any, folder: Path, upper: float, lower: float, lat_deg: float, per_day_ns: float, sigma_ns: float
) -> None:
    for name, height in (("upper", upper), ("lower", lower)):
        Path(f"{name}.toml").write_text(site(name, f"height_above_geoid_m = {height}", lat_deg=lat_deg))
    rate = found("upper.toml", "lower.toml", *MARCH)["rate"]
    assert rate * 86400e9 == pytest.approx(per_day_ns, rel=0, abs=sigma_ns)


@pytest.mark.parametrize(
    ("measured", "sigma", "lat_deg", "potential", "potential_sigma", "height", "height_sigma"),
    [
        # Nature Photonics 10, 662 (2016): 1652.9(5.9)e-18 is 148.555 m2/s2, 15.16(5) m.
        (1652.9e-18, 5.9e-18, 35.7, 148.555, 0.01, 15.16, 0.006),
        # Science 329, 1630 (2010): 4.1(1.6)e-17 is 37(15) cm (from memory).
        (4.1e-17, 1.6e-17, 40.0, 3.68, 0.01, 0.37, 0.01),
        # arXiv 2309.14953: 3918.1(2.4) m2/s2; over gravity of 9.806 m/s2.
        (3918.1 / C2, 2.4 / C2, 45.0, 3918.1, 1e-2, 399.6, 0.2),
    ],
)
def test_levelling(
    found: Any,
    folder: Path,
    measured: float,
    sigma: float,
    lat_deg: float,
    potential: float,
    potential_sigma: float,
    height: float,
    height_sigma: float,
) -> None:
    Path("hut.toml").write_text(site("Osprey Hut", lat_deg=lat_deg))
    Path("bay.toml").write_text(site("Tern Bay", "geopotential_number_m2_s2 = 200.0", lat_deg=lat_deg))
    words = ("hut.toml", "bay.toml", *MARCH, "--measured", repr(measured), "--measured-sigma", repr(sigma))
    two = found(*words)
    levelling = two["levelling"]
    assert levelling["geopotential_m2_s2"] == pytest.approx(potential, rel=0, abs=potential_sigma)
    assert levelling["geopotential_sigma_m2_s2"] == pytest.approx(sigma * C2, rel=1e-12, abs=0)
    assert levelling["height_m"] == pytest.approx(height, rel=0, abs=height_sigma)
    # Of the measurement, and 50 mGal of gravity.
    expected = np.hypot(sigma * C2 / 9.806, 5e-4 / 9.806 * height)
    assert levelling["height_sigma_m"] == pytest.approx(expected, rel=1e-2, abs=0)
    # Tern Bay is 200 m2/s2 above the geoid: 20.40 m by 9.80 m/s2, to 0.1 % by latitude.
    assert levelling["height_of_a_m"] == pytest.approx(20.40 + levelling["height_m"], rel=0, abs=0.02)
    # The potential of the hut is not known: nothing is predicted.
    assert "rate" not in two
    assert levelling["pull"] is None


def test_levelling_meets_its_own_prediction(found: Any, capsys: pytest.CaptureFixture[str]) -> None:
    rate = found("ridge.toml", "bay.toml", *MARCH)["rate"]
    words = ("--measured", repr(rate), "--measured-sigma", "1e-18", "--height-sigma", "0.01,0.01")
    levelling = found("ridge.toml", "bay.toml", *MARCH, *words)["levelling"]
    assert levelling["height_of_a_m"] == pytest.approx(600.0, rel=0, abs=1e-6)
    assert levelling["pull"] == 0.0
    shown = text(capsys, "ridge.toml", "bay.toml", *MARCH, *words)
    assert "height of Kestrel Ridge above Tern Bay" in shown
    assert "measured minus predicted: +0.00 standard uncertainties" in shown


def test_a_navigation_satellite(found: Any, capsys: pytest.CaptureFixture[str]) -> None:
    # IS-GPS-200, 3.3.1.1: -4.4647e-10, 10.2299999954326 MHz for 10.23; 45.8 and -7.2 us a day as widely published.
    one = found("orbit.toml", *MARCH)
    orbit = one["clocks"][0]["orbit"]
    assert round(orbit["factory_offset"] * 1e10, 4) == -4.4647
    assert orbit["gravitational"] * DAY_US == pytest.approx(45.8, rel=0, abs=0.05)
    assert orbit["kinematic"] * DAY_US == pytest.approx(-7.2, rel=0, abs=0.05)
    # 2.2897 us times e, twice the area-constant term -(2/c^2) sqrt(a GM) e (IERS Conventions 2010, eq. 10.10).
    assert orbit["eccentricity_amplitude_s"] == pytest.approx(0.02 * 2.289738e-6, rel=1e-5, abs=0)
    assert (orbit["a_m"], orbit["e"], orbit["i_deg"]) == pytest.approx((26561750.0, 0.02, 55.0), rel=1e-9, abs=0)
    assert orbit["two_body"] is True
    shown = text(capsys, "orbit.toml", *MARCH, "--nominal-frequency", "10.23e6")
    assert "10,229,999.9954326 Hz" in shown
    # Over whole revolutions the integral meets the closed formula but for tides (1e-15): within 3e-14 for the last one.
    whole = ("--start", "2025-03-01", "--stop", "2025-03-10T23:20:20.2")  # 20 revolutions of 43082.01 s
    assert found("orbit.toml", *whole)["rate"] == pytest.approx(orbit["total"], rel=0, abs=2e-15)


def test_a_clock_on_the_moon(found: Any, capsys: pytest.CaptureFixture[str]) -> None:
    # arXiv 2406.16147: 56.0256 us a day against the geoid, 0.470 us at the anomalistic month.
    one = found("moon.toml", *MARCH)
    periods = one["clocks"][0]["whole_periods"]
    assert periods["mean_rate"] * DAY_US == pytest.approx(56.0256, rel=0, abs=0.002)
    largest = periods["terms"][0]
    assert largest["period_d"] == pytest.approx(27.55455, rel=0, abs=0.001)
    assert largest["amplitude_s"] == pytest.approx(0.470e-6, rel=0, abs=0.005e-6)
    assert periods["lowest_rate"] < one["rate"] < periods["highest_rate"]
    assert "27.555 d, l, anomalistic month" in text(capsys, "moon.toml", *MARCH)
    # In its own coordinate time only its potential is left: W/c^2, W = 2821713.3 m2/s2.
    own = found("moon.toml", *MARCH, "--against", "TCL")
    assert own["rate"] == pytest.approx(-2821713.3 / C2, rel=0, abs=3e-16)
    assert "whole_periods" not in own["clocks"][0]
    # Two clocks by their dates in TCL: the mean of the rates shown, and as by TT but for what the ends of the span cut.
    both, by_tt = (found("moon.toml", "ridge.toml", *MARCH, "--against", against) for against in ("TCL", "TT"))
    assert both["rate"] == pytest.approx(by_tt["rate"], rel=0, abs=1e-12)
    assert both["lowest_rate"] < both["rate"] < both["highest_rate"]


def test_a_clock_on_mars(found: Any) -> None:
    # arXiv 2507.21388: the rate varies by 226 us a day over a Martian year, to 10 %. Its mean of 477 is another average
    # than that over time (see test_planetary_clocks): 12 us a day.
    one = found("mars.toml", "geoid.toml", *MARCH)
    periods = one["clocks"][0]["whole_periods"]
    assert np.mean(periods["yearly_variation"]) * DAY_US == pytest.approx(226.0, rel=0.1, abs=0)
    assert periods["mean_rate"] * DAY_US == pytest.approx(477.0, rel=0, abs=12.0)
    assert one["clocks"][1].keys() == {"name", "file", "kind"}
    surface = {row["quantity"]: row for row in one["budget"]}["reference surface above the ellipsoid"]
    # 2 km at 3.7 m/s2, as a rectangle.
    assert surface["rate_sigma"] == pytest.approx(2000.0 * 3.71 / C2 / np.sqrt(3.0), rel=0.01, abs=0)
    # The rates of the dates are the growth of what is gained, over 1 h to the curvature of 6e-11 a day.
    found("mars.toml", "geoid.toml", *MARCH, "--step", "3600", "--output", "rows.csv")
    with open("rows.csv", encoding="utf-8") as rows:
        columns = [(float(row["rate"]), float(row["gained (s)"])) for row in csv.DictReader(rows)]
    rates, gained = np.array(columns).T
    assert np.abs((gained[2:] - gained[:-2]) / 7200.0 - rates[1:-1]).max() < 3e-12


# ---- other paths ---------------------------------------------------------------------------------


def test_an_orbit_about_mars(found: Any, folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    changed = ORBIT.replace('"earth"', '"mars"').replace('"UTC"', '"TDB"').replace("26561750.0", "7.2e6")
    Path("far.toml").write_text(changed)
    one = found("far.toml", *MARCH, "--scale", "TDB")
    assert one["clocks"][0] == {"name": "Lantern", "file": "far.toml", "kind": "spacecraft"}
    # Nothing is known of how well the path is known, and nothing is made up.
    assert one["rate_sigma"] is None
    assert "no standard uncertainty is known" in text(capsys, "far.toml", *MARCH, "--scale", "TDB")
    stated = found("far.toml", *MARCH, "--speed-sigma", "0.01", "--geopotential-sigma", "30")
    speed = stated["budget"][1]["value"]
    assert 20e3 < speed < 27e3  # Mars itself runs at 22 to 26.5 km/s
    assert stated["rate_sigma"] == pytest.approx(np.hypot(0.01 * speed, 30.0) / C2, rel=1e-9, abs=0)


def test_an_orbit_ephemeris_message_has_dates_of_its_own(found: Any, folder: Path) -> None:
    t = tscale.Instants.from_iso("2025-03-01T00:00:00", scale="TT").shifted(np.arange(0.0, 86401.0, 300.0))
    orbit = tscale.Trajectory.from_kepler(t[0], 7.0e6, 0.001, 98.0, 0.0, 0.0, 0.0)
    r, v = orbit.gcrs(t.pair, tscale.ReferenceData.default())
    facts = {
        "OBJECT_NAME": "HERON",
        "OBJECT_ID": "2025-001A",
        "CENTER_NAME": "EARTH",
        "REF_FRAME": "GCRF",
        "TIME_SYSTEM": "TT",
        "START_TIME": t.to_iso(3)[0],
        "STOP_TIME": t.to_iso(3)[-1],
        "INTERPOLATION": "HERMITE",
        "INTERPOLATION_DEGREE": "7",
    }
    lines = ["CCSDS_OEM_VERS = 2.0", "CREATION_DATE = 2025-01-01T00:00:00", "ORIGINATOR = TEST", "META_START"]
    lines += [f"{key} = {value}" for key, value in facts.items()] + ["META_STOP"]
    for date, x, u in zip(t.to_iso(3), r / 1e3, v / 1e3, strict=True):
        lines.append(" ".join([str(date), *(f"{value:.9f}" for value in [*x, *u])]))
    Path("heron.oem").write_text("\n".join(lines) + "\n")
    one = found("heron.oem", "--scale", "TT")
    assert (one["start"], one["stop"]) == ("2025-03-01T00:00:00", "2025-03-02T00:00:00")
    summary = one["clocks"][0]["orbit"]
    # Micrometres and um/s in the file: 1e-12 of the axis, and interpolation to 1 mm.
    assert summary["a_m"] == pytest.approx(7.0e6, rel=1e-8, abs=0)
    assert summary["two_body"] is False
    assert one["rate"] == pytest.approx(summary["total"], rel=0.01, abs=0)
