"""`tscale convert`: which clock is meant, what was not used, status and rate columns, orbits."""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np
import pytest

import tscale
from tscale.cli.main import main

EXAMPLES = Path(__file__).parents[1] / "examples"
SITE = ["--site", str(EXAMPLES / "site.toml")]
MASER, UTC_KRL = str(EXAMPLES / "maser.csv"), str(EXAMPLES / "utc_krl.csv")
SOURCE = ["--source", str(EXAMPLES / "source.toml")]
HEAD = "epoch,offset_s,uncertainty_s,reference,clock\n"


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    return tmp_path


def write(path: str, *dates: str) -> str:
    Path(path).write_text("".join(f"{line}\n" for line in ("t", *dates)))
    return path


def converted(*words: str) -> list[dict[str, str]]:
    assert main(["convert", "in.csv", "out.csv", *words]) == 0
    with open("out.csv", encoding="utf-8", newline="") as file:
        return list(csv.DictReader(file))


# ---- clocks --------------------------------------------------------------------------------------


def test_the_order_of_logs_decides_nothing(folder: Path) -> None:
    write("in.csv", "2025-03-05T00:00:00", "2025-03-06T12:00:00")
    assert converted("--to", "TAI", "--clock", MASER, "--clock", UTC_KRL) == converted(
        "--to", "TAI", "--clock", UTC_KRL, "--clock", MASER
    )
    given = converted("--to", "TAI", "--clock", UTC_KRL, "--clock", MASER, "--from", "UTC(KRL)")
    assert given != converted("--to", "TAI", "--clock", UTC_KRL, "--clock", MASER)


def log(path: str, clock: str, reference: str) -> str:
    rows = "".join(f"{date},1,0,{reference},{clock}\n" for date in ("2025-01-01", "2026-01-01"))
    Path(path).write_text(HEAD + rows)
    return path


def test_clocks_that_could_both_be_meant(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    write("in.csv", "2025-03-05")
    a, b = log("a.csv", "a", "UTC"), log("b.csv", "b", "UTC")
    words = ["convert", "in.csv", "out.csv", "--to", "TAI", "--clock", a, "--clock", b]
    assert main(words) == 2
    assert "the dates may be those of CLOCK(a), CLOCK(b): say which with --from" in capsys.readouterr().err
    assert main([*words, "--from", "CLOCK(b)"]) == 0
    assert "note: a.csv was not used" in capsys.readouterr().out
    ring = [log("c.csv", "c", "CLOCK(d)"), log("d.csv", "d", "CLOCK(c)")]
    assert main(["convert", "in.csv", "out.csv", "--to", "TAI", "--clock", ring[0], "--clock", ring[1]]) == 2
    assert "say which with --from" in capsys.readouterr().err


def test_one_clock_with_two_references(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    write("in.csv", "2025-03-05")
    a, b = log("a.csv", "a", "UTC"), log("b.csv", "a", "UTC(KRL)")
    for command in (["convert", "in.csv", "out.csv", "--to", "TAI"], ["link", "--from", "earth", "--to", "moon"]):
        date = ["--transmit", "2025-01-01"] if command[0] == "link" else []
        assert main([*command, *date, "--clock", a, "--clock", b]) == 2
        text = capsys.readouterr().err
        assert "a.csv compares CLOCK(a) with UTC, and b.csv with UTC(KRL)" in text


# ---- what was not used ---------------------------------------------------------------------------


def test_pieces_that_no_step_reads_are_noted(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    write("in.csv", "2025-03-05")
    rows = "".join(f" {60000 + 10 * i}  32.0000 27.0000\n" for i in range(99))
    Path("TTBIPM.23").write_text(rows)
    pieces = [*SITE, *SOURCE, "--clock", MASER, "--tt-bipm", "TTBIPM.23"]
    idle = ["maser.csv", "TTBIPM.23", "site.toml", "source.toml"]
    assert main(["convert", "in.csv", "out.csv", "--from", "TAI", "--to", "TT", *pieces]) == 0
    out = capsys.readouterr().out
    assert [line for line in out.splitlines() if "not used" in line] == [f"note: {x} was not used" for x in idle]
    assert main(["convert", "in.csv", "-", "--quiet", "--from", "TAI", "--to", "TT", *pieces]) == 0
    err = capsys.readouterr().err
    assert err.splitlines() == [f"tscale: note: {x} was not used" for x in idle]
    words = ["--from", "CLOCK(maser)", "--to", "TDB@BARYCENTER", "--to", "TT(BIPM23)", "--clock", UTC_KRL]
    assert main(["convert", "in.csv", "out.csv", "--quiet", *words, *pieces]) == 0
    assert capsys.readouterr() == ("", "")
    words = ["--to", "TDB@GEOCENTER", "--from", "TT@GEOCENTER", "--ra", "10", "--dec", "20"]
    assert main(["convert", "in.csv", "out.csv", "--quiet", *words]) == 0
    assert capsys.readouterr().err == "tscale: note: --ra and --dec was not used\n"


# ---- status --------------------------------------------------------------------------------------


def test_status_of_every_row(folder: Path, reference: tscale.ReferenceData, capsys: pytest.CaptureFixture[str]) -> None:
    table = reference.earth_orientation
    assert table.predicted_from_mjd is not None
    assert reference.leap_seconds.expires_mjd is not None
    days = {
        "measured": 58849,  # 2020-01-01
        "predicted": table.predicted_from_mjd + 3,
        "held": table.span[1] + 3,
    }
    days = {word + ("+expired" if day >= reference.leap_seconds.expires_mjd else ""): day for word, day in days.items()}
    write("in.csv", *(f"{day}.25" for day in days.values()))
    words = ("--input-format", "mjd", "--sigma", "--to", "TDB", "--to", "TCB", "--to", "TT", *SITE, "--quiet")
    rows = converted(*words)
    for end in ("TDB@TOPOCENTER", "TCB@TOPOCENTER"):
        assert [row[f"status {end}"] for row in rows] == list(days)
    late = ["expired" if "expired" in word else "none" for word in days]
    assert [row["status TT@TOPOCENTER"] for row in rows] == late
    err = capsys.readouterr().err
    assert err.count("tscale: note: ") == err.count("\n") == 3
    assert "1 of 3 instants are past the end of the Earth orientation" in err
    # From TT no leap second is read, and only UT1 and sites need the Earth orientation.
    words = ("--input-format", "mjd", "--sigma", "--from", "TT@GEOCENTER", "--to", "TCB@GEOCENTER", "--quiet")
    assert {row["status TCB@GEOCENTER"] for row in converted(*words)} == {"none"}
    rows = converted("--input-format", "mjd", "--sigma", "--from", "TT", "--to", "TDB@BARYCENTER", *SITE, *SOURCE)
    assert [row["status TDB@BARYCENTER"] for row in rows] == ["measured", "predicted", "held"]
    back = write("in.csv", *(row["TDB@BARYCENTER"] for row in rows))
    assert back == "in.csv"
    rows = converted("--sigma", "--from", "TDB@BARYCENTER", "--to", "TDB@TOPOCENTER", *SITE, *SOURCE)
    assert [row["status TDB@TOPOCENTER"] for row in rows] == ["measured", "predicted", "held"]


def test_status_of_ut1(folder: Path, reference: tscale.ReferenceData) -> None:
    first = reference.earth_orientation.predicted_from_mjd
    assert first is not None
    write("in.csv", "58849", str(first + 3))
    rows = converted("--input-format", "mjd", "--sigma", "--from", "TAI", "--to", "UT1")
    assert [row["status UT1"] for row in rows] == ["measured", "predicted"]


def test_an_orbit_rests_on_no_earth_orientation(folder: Path) -> None:
    write("in.csv", *orbit_message("sat.oem")[5:8].to_iso(9).tolist())
    rows = converted("--sigma", "--from", "TT", "--to", "TDB", "--orbit", "sat.oem")
    assert {row["status TDB@TOPOCENTER"] for row in rows} == {"none"}


# ---- rate, orbit, second order -------------------------------------------------------------------


def orbit_message(path: str) -> tscale.Instants:
    """Write states of a circle of 7000 km about the Earth, once a minute, as a CCSDS 502.0-B message; its dates."""
    t = tscale.Instants.from_iso("2024-05-05T00:00:00", scale="TT").shifted(np.arange(0.0, 7201.0, 60.0))
    rate = np.sqrt(3.986004418e14 / 7.0e6**3)  # rad/s, two-body
    angle = rate * np.arange(0.0, 7201.0, 60.0)
    zero = np.zeros(angle.shape)
    position = 7000.0 * np.stack([np.cos(angle), np.sin(angle), zero], axis=-1)
    velocity = 7000.0 * rate * np.stack([-np.sin(angle), np.cos(angle), zero], axis=-1)
    lines = [
        f"{date} " + " ".join(f"{x:.12f}" for x in state)
        for date, state in zip(t.to_iso(3), np.hstack([position, velocity]), strict=True)
    ]
    head = (
        "CCSDS_OEM_VERS = 2.0\nCREATION_DATE = 2024-05-01T00:00:00\nORIGINATOR = KESTREL RIDGE\nMETA_START\n"
        "OBJECT_NAME = WREN\nOBJECT_ID = 2024-901A\nCENTER_NAME = EARTH\nREF_FRAME = GCRF\nTIME_SYSTEM = TT\n"
        f"START_TIME = {t[0].to_iso(0)}\nSTOP_TIME = {t[-1].to_iso(0)}\nINTERPOLATION = HERMITE\n"
        "INTERPOLATION_DEGREE = 7\nMETA_STOP\n"
    )
    Path(path).write_text(head + "\n".join(lines) + "\n")
    return t


def test_orbit_and_rate_are_those_of_the_library(folder: Path, reference: tscale.ReferenceData) -> None:
    t = orbit_message("sat.oem")[10:110:7].shifted(12.345)
    texts = t.to_iso(15).tolist()
    write("in.csv", *texts)
    t = tscale.Instants.from_iso(texts, scale="TT")
    ends = ("TDB@TOPOCENTER", "TDB@BARYCENTER")
    words = ["--from", "TT", "--orbit", "sat.oem", *SOURCE, "--rate", "--digits", "15", "--second-order"]
    rows = converted(*words, "--to", ends[0], "--to", ends[1])
    orbit = tscale.Trajectory.from_oem("sat.oem")
    source = tscale.Source.load(EXAMPLES / "source.toml")
    for end in ends:
        chain = tscale.chain("TT", end, site=orbit, source=source, reference=reference, second_order=True)
        assert [row[end] for row in rows] == chain(t).to_iso(15).tolist()
        # Eighteen digits are written: the same float64.
        assert [float(row[f"rate {end}"]) for row in rows] == chain.rate(t).tolist()
    # The Doppler shift of an orbit of 7.5 km/s and of the Earth's 30 km/s: below their sum over c, 1.3e-4, and for a
    # wavefront it is there.
    rate = np.array([float(row["rate TDB@BARYCENTER"]) for row in rows])
    assert np.all(np.abs(rate) < 1.3e-4)
    assert np.ptp(rate) > 1e-6


def test_rate_is_the_slope_of_the_dates(folder: Path) -> None:
    write("in.csv", "2025-03-05T00:00:00", "2025-03-05T00:00:10", "2025-03-05T00:00:20")
    words = ["--from", "TT", "--to", "TDB@BARYCENTER", *SITE, *SOURCE, "--rate", "--digits", "15"]
    rows = converted(*words)
    out = tscale.Instants.from_iso([row["TDB@BARYCENTER"] for row in rows], scale="TDB", place="BARYCENTER")
    slope = float(out[2].minus_exact(out[0])[0]) + float(out[2].minus_exact(out[0])[1])
    # The third derivative of the diurnal term, 465 m/s/c * (7.3e-5)^2 * 100 s^2 / 6, is 1.4e-13; reading 1e-15 s.
    assert slope / 20.0 - 1.0 == pytest.approx(float(rows[1]["rate TDB@BARYCENTER"]), abs=5e-13)


def test_second_order_is_a_term_of_its_own(folder: Path, reference: tscale.ReferenceData) -> None:
    write("in.csv", "2025-03-05T00:00:00")
    # A source 0.5 degrees beside the Sun as seen from the Earth.
    tdb = tscale.Instants.from_iso("2025-03-05T00:01:09", scale="TDB").pair
    sun = reference.ephemeris.position("sun", tdb) - reference.ephemeris.position("earth", tdb)
    ra, dec = np.degrees(np.arctan2(sun[1], sun[0])), np.degrees(np.arcsin(sun[2] / np.linalg.norm(sun)))
    words = ["--to", "TDB@BARYCENTER", *SITE, "--ra", f"{ra}", "--dec", f"{dec + 0.5}", "--ledger"]
    plain = converted(*words)[0]
    full = converted(*words, "--second-order")[0]
    extra = {name.rpartition(", ")[2]: float(full[name]) for name in set(full) - set(plain)}
    assert set(extra) == {"second order (s)", "third order (s)"}
    # The light is bent while it is delayed: (2GM/c^2)^2 / (c r (1 - cos theta)), from the logarithm of the first order,
    # ln(r (1 - cos theta)), along a line moved by that bending; cf. IERS Conventions (2010) eq. 11.14.
    # The rest, 15 pi/4 (GM/c^2)^2 / (c b), is 1.3 % of it here; theta is that of the geocentre, to 0.5 %.
    m, r = 1476.625, np.linalg.norm(sun)
    expected = (2.0 * m) ** 2 / (r * (1.0 - np.cos(np.radians(0.5)))) / 299792458.0
    assert extra["second order (s)"] == pytest.approx(expected, rel=0.03)


def test_orbits_that_are_none(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    write("in.csv", "2025-03-05")
    orbit_message("sat.oem")
    for words, message in (
        ([*SITE, "--orbit", "sat.oem"], "not by both"),
        (["--orbit", "moon"], "--orbit moon is not an orbit"),
        (["--orbit", str(EXAMPLES / "site.toml")], "is not an orbit"),
        (["--orbit", "none.oem"], "'none.oem' is neither a body nor a file"),
        (["--orbit", "sat.oem"], "in.csv:2: '2025-03-05' "),
    ):
        assert main(["convert", "in.csv", "out.csv", "--to", "TDB", *words]) == 2
        text = capsys.readouterr().err
        assert message in text
        assert text.count("\n") == 1
