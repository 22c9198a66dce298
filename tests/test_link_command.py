"""`tscale link` and its picture."""

from __future__ import annotations

import csv
import runpy
import sys
import warnings
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import tscale
from tscale import Instants, errors
from tscale.cli import main as entry

SITE = """\
[site]
name = "Heron Flat"
geodetic = { lon_deg = 133.0, lat_deg = -23.0, height_m = 500.0 }
"""
CAMP = """\
[surface]
name = "Ochre Camp"
body = "mars"
lon_deg = 137.4
lat_deg = -4.6
"""
ORBIT = """\
[orbit]
name = "Lantern"
center = "mars"
epoch = "2024-05-05T00:00:00"
scale = "TDB"
a_m = 7.2e6
e = 0.35
i_deg = 63
node_deg = 40.0
periapsis_deg = 120.0
mean_anomaly_deg = 10.0
"""


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    for name, text in (("site.toml", SITE), ("camp.toml", CAMP), ("orbit.toml", ORBIT)):
        (tmp_path / name).write_text(text)
    monkeypatch.chdir(tmp_path)
    return tmp_path


def run(*words: str) -> int:
    return entry.main(["link", *words])


TABLE = ("--until", "2024-05-05T10:00:00", "--step", "1800")


def test_one_date(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert run("--from", "site.toml", "--to", "mars", "--transmit", "2024-05-05T01:00:00") == 0
    out = capsys.readouterr().out
    site = tscale.Site.load("site.toml")
    t = Instants.from_iso("2024-05-05T01:00:00", scale="UTC")
    found = tscale.link.one_way(transmit=t, transmitter=site, receiver="mars")
    assert str(found.receive.to_iso(12)) in out
    assert f"{float(found.light_time_s):.15f}" in out
    assert "Shapiro delay, sun, second order" in out
    assert "elevation at transmit" in out


def test_table_to_a_file_with_every_term(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    words = ("--from", "orbit.toml", "--to", "site.toml", "--receive", "2024-05-05T00:00:00", *TABLE)
    assert run(*words, "--output", "pass.csv", "--ledger") == 0
    assert capsys.readouterr().out == ""
    with open("pass.csv", newline="") as file:
        rows = list(csv.DictReader(file))
    assert len(rows) == 21
    assert rows[1]["receive (UTC)"] == "2024-05-05T00:30:00.000000000000"
    assert {row["path"] for row in rows} == {"clear", "blocked"}
    terms = [name for name in rows[0] if name.startswith(("geometric", "Shapiro"))]
    for row in rows:
        total = sum(float(row[name]) for name in terms)
        # Fifteen decimals of a double of 1000 s.
        assert total == pytest.approx(float(row["light time (TDB s)"]), abs=1e-12)
        assert float(row["range (m)"]) == pytest.approx(float(row["geometric range (s)"]) * 299792458.0, abs=1e-3)


def test_round_trip_table_on_standard_output(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    words = ("--from", "site.toml", "--to", "camp.toml", "--two-way", "--turnaround", "1.5")
    assert run(*words, "--transmit", "2024-05-05T00:00:00", *TABLE, "--other-scale", "TCB") == 0
    rows = list(csv.DictReader(capsys.readouterr().out.splitlines()))
    assert len(rows) == 21
    sent = Instants.from_iso([row["transmit (UTC)"] for row in rows], scale="UTC")
    back = Instants.from_iso([row["receive (UTC)"] for row in rows], scale="UTC")
    trip = np.array([float(row["round trip (TDB s)"]) for row in rows])
    # TDB and UTC run apart by 5e-10 at most on the ground (3.3e-10 of the year, 1.5e-10 of the day), over 2000 s.
    assert np.max(np.abs(back.minus(sent) - trip)) < 1e-6
    assert "bounce (TCB)" in rows[0]


def test_step_of_a_tenth_meets_the_last_date(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    words = ("--from", "earth", "--to", "moon", "--scale", "TDB", "--transmit", "2024-05-05T00:00:00")
    assert run(*words, "--until", "2024-05-05T00:00:01", "--step", "0.1") == 0
    rows = capsys.readouterr().out.splitlines()
    assert len(rows) == 12
    assert rows[-1].startswith("2024-05-05T00:00:01.000000000000,")


def test_kernel_and_message_ends(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    kernel = tscale.Ephemeris.default().path
    words = ("--scale", "TDB", "--transmit", "2024-05-05T00:00:00")
    # What a file holds is a spacecraft to us, and deep within Mars it would have no delay of finite size.
    assert run("--from", f"{kernel}:4", "--to", "399", *words) == 2
    error = capsys.readouterr().err
    assert "inside mars" in error
    assert error.endswith("say --without mars\n")
    assert run("--from", f"{kernel}:4", "--to", "399", *words, "--without", "mars") == 0
    by_file = capsys.readouterr().out
    assert run("--from", "mars", "--to", "earth", *words) == 0
    assert capsys.readouterr().out == by_file


def test_orbit_message_as_an_end(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    # States of the orbit of elements, once a minute in an Orbit Ephemeris Message (CCSDS 502.0-B): the same link.
    t = Instants.from_iso("2024-05-05T00:00:00", scale="TDB")
    orbit = tscale.Trajectory.from_kepler(t, 7.2e6, 0.35, 63.0, 40.0, 120.0, 10.0, center="mars")
    reference = tscale.ReferenceData.default()
    dates = t.shifted(np.arange(0.0, 3601.0, 60.0))
    states = np.hstack(orbit.state_bcrs(dates.pair, reference)) - np.hstack(
        reference.ephemeris.state("mars", dates.pair)
    )
    lines = [
        f"{date} " + " ".join(f"{x / 1e3:.12f}" for x in state)
        for date, state in zip(dates.to_iso(3), states, strict=True)
    ]
    head = (
        "CCSDS_OEM_VERS = 2.0\nCREATION_DATE = 2024-05-01T00:00:00\nORIGINATOR = KESTREL RIDGE\nMETA_START\n"
        "OBJECT_NAME = LANTERN\nOBJECT_ID = 2024-900A\nCENTER_NAME = MARS\nREF_FRAME = ICRF\nTIME_SYSTEM = TDB\n"
        "START_TIME = 2024-05-05T00:00:00\nSTOP_TIME = 2024-05-05T01:00:00\nINTERPOLATION = HERMITE\n"
        "INTERPOLATION_DEGREE = 7\nMETA_STOP\n"
    )
    (folder / "orbit.oem").write_text(head + "\n".join(lines) + "\n")
    words = ("--to", "earth", "--scale", "TDB", "--transmit", "2024-05-05T00:30:30")
    ranges = []
    for end in ("orbit.oem", "orbit.toml"):
        assert run("--from", end, *words) == 0
        ranges.append(float(next(x for x in capsys.readouterr().out.splitlines() if x.startswith("range ")).split()[1]))
    # Positions of 2e11 m in double precision less those of Mars: 3e-5 m each.
    assert ranges[0] == pytest.approx(ranges[1], abs=2e-7)


@pytest.mark.parametrize(
    ("words", "message"),
    [
        (("--from", "marss", "--to", "earth", "--transmit", "2024-05-05"), "marss"),
        (("--from", "mars", "--to", "earth", "--transmit", "2024-05-05"), "use TDB or TCB"),
        (("--from", "earth", "--to", "mars", "--transmit", "2024-05-05", "--step", "60"), "--until"),
        (("--from", "earth", "--to", "mars", "--transmit", "2024-05-05", "--ledger"), "--until"),
        (("--from", "earth", "--to", "mars", "--transmit", "2024-05-05", "--turnaround", "3"), "--two-way"),
        (("--from", "earth", "--to", "mars", "--transmit", "2024-05-05", "--digits", "40"), "18"),
        (("--from", "earth", "--to", "mars", "--transmit", "2024-05-05T10:00:00", *TABLE[:3], "-60"), "forward"),
        (("--from", "earth", "--to", "mars", "--transmit", "2024-05-05", *TABLE[:3], "1e-9"), "10000000 rows at most"),
        (("--from", "earth", "--to", "mars", "--transmit", "2024-05-05", *TABLE[:3], "1e999999999"), "--step lies"),
        (("--from", "earth", "--to", "mars", "--transmit", "2024-05-05", *TABLE[:3], "1e-9999999"), "--step lies"),
        (("--from", "earth", "--to", "mars", "--transmit", "2024-05-05", *TABLE[:3], "1e-16"), "--step lies"),
        (("--from", "earth", "--to", "mars", "--transmit", "2024-05-05", *TABLE[:3], "inf"), "--step lies"),
        (("--from", "earth", "--to", "mars", "--transmit", "2024-05-05", *TABLE[:3], "nan"), "--step lies"),
        (("--from", "earth", "--to", "mars", "--transmit", "yesterday"), "--transmit yesterday: is no date: "),
        (("--from", "earth", "--to", "mars", "--receive", "2024-05-05T25:00:00"), "--receive 2024-05-05T25:00:00: "),
        (
            ("--from", "earth", "--to", "mars", "--transmit", "2024-05-05", "--until", "later", "--step", "60"),
            "--until later: ",
        ),
        (
            ("--from", "earth", "--to", "mars", "--transmit", "2024-05-05", "--without", "499", "--without", "3"),
            "--without earth-moon barycenter (3)",
        ),
        (
            ("--from", "site.toml", "--to", "venus", "--transmit", "2024-05-05T12:00:00", "--two-way"),
            "the round trip between Heron Flat and venus has",
        ),
        (("--from", "earth", "--to", "mars", "--transmit", "2024-05-05", *TABLE[:3], "soon"), "soon"),
        (("--from", "site.toml", "--to", "nowhere.toml", "--transmit", "2024-05-05"), "nowhere.toml"),
        (
            ("--from", "site.toml", "--to", "venus", "--transmit", "2024-05-05T12:00:00"),
            "the link from Heron Flat to venus has",
        ),
        (("--from", "site.toml", "--to", "venus", "--transmit", "2024-05-05T12:00:00"), "Say --occultation ignore to"),
        (("--from", "earth", "--to", "mars", "--transmit", "2024-05-05", *TABLE, "--plot", "a.txt"), ".png"),
    ],
)
def test_errors_are_one_line_and_leave_no_file(
    folder: Path, capsys: pytest.CaptureFixture[str], words: tuple[str, ...], message: str
) -> None:
    before = sorted(folder.iterdir())
    output = ("--output", "out.csv") if "--until" in words else ()
    assert run(*words, *output) == 2
    captured = capsys.readouterr()
    assert captured.err.startswith("tscale: error: ")
    assert captured.err.count("\n") == 1
    assert message in captured.err
    assert "item 0" not in captured.err
    assert len(captured.err) < 400
    assert sorted(folder.iterdir()) == before


@pytest.mark.parametrize(
    ("text", "message"),
    [("[orbit]\nname = 'a'\n", "needs"), ("nonsense", "is not TOML"), (SITE + CAMP, "one table"), ("", "one table")],
)
def test_wrong_files_of_ends(folder: Path, capsys: pytest.CaptureFixture[str], text: str, message: str) -> None:
    (folder / "end.toml").write_text(text)
    assert run("--from", "earth", "--to", "end.toml", "--transmit", "2024-05-05") == 2
    assert "end.toml" in (err := capsys.readouterr().err)
    assert message in err


def test_wrong_orbits(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    for old, new in (("e = 0.35", "e = 'round'"), ("e = 0.35", "e = -0.1"), ("TDB", "UTC"), ("mars", "vulcan")):
        (folder / "end.toml").write_text(ORBIT.replace(old, new))
        assert run("--from", "earth", "--to", "end.toml", "--transmit", "2024-05-05") == 2
        assert "end.toml" in capsys.readouterr().err


def test_predictions_are_noted(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    words = ("--from", "site.toml", "--to", "moon", "--transmit", "2035-05-05", "--occultation", "ignore")
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        assert run(*words) == 0
    captured = capsys.readouterr()
    assert "tscale: note: " in captured.err
    held = "1 of 1 instants are past the end of the Earth orientation, which is held"
    assert f"note: {held}\n" in captured.out


def test_notes_of_a_table_are_summed_over_its_blocks(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    # 10000 rows, two blocks; leap seconds have expired and the Earth orientation is held for all of them.
    words = ("--from", "site.toml", "--to", "moon", "--transmit", "2035-05-05", "--until", "2035-05-05T02:46:39")
    assert run(*words, "--step", "1", "--output", "moon.csv") == 0
    err = capsys.readouterr().err
    assert "tscale: note: 10000 of 10000 instants are past the end of the Earth orientation, which is held\n" in err
    assert "tscale: note: 10000 of 10000 instants are past the expiry of the leap-second table" in err


# ---- pictures ------------------------------------------------------------------------------------


def solution(both: bool = False, n: int = 60) -> Any:
    t = Instants.from_iso("2023-11-10T00:00:00", scale="TDB").shifted(np.arange(n) * 21600.0)
    if both:
        return tscale.link.two_way(transmit=t, station="earth", target="mars", occultation="ignore")
    return tscale.link.one_way(transmit=t, transmitter="earth", receiver="mars", occultation="ignore")


@pytest.mark.parametrize("both", [False, True])
def test_figure_has_units_and_every_visible_delay(both: bool) -> None:
    from tscale import plots

    figure = plots.link_figure(solution(both))
    top, middle, bottom = figure.axes
    assert top.get_ylabel() == ("round trip (min)" if both else "light time (min)")
    assert "km/s" in middle.get_ylabel()
    assert "(s)" in bottom.get_ylabel()
    assert "TDB" in bottom.get_xlabel()
    assert "2023-11-10" in bottom.get_xlabel()
    labels = [text.get_text() for text in bottom.get_legend().get_texts()]
    assert labels[0] == "sun"
    assert {"jupiter", "sun, second order", "sun, third order"} <= set(labels)
    assert any("blocked" in text.get_text() for text in top.get_legend().get_texts())
    drawn = top.get_lines()[0].get_ydata()
    expected = solution(both).round_trip_s if both else solution(both).light_time_s
    assert np.allclose(drawn * 60.0, expected, rtol=1e-12)


@pytest.mark.parametrize("kind", ["png", "pdf", "svg"])
def test_pictures_are_whole_files(kind: str, tmp_path: Path) -> None:
    from tscale import plots

    path = tmp_path / f"link.{kind}"
    plots.save_link_picture(solution(), path)
    magic = {"png": b"\x89PNG", "pdf": b"%PDF", "svg": b"<?xml"}[kind]
    assert path.read_bytes().startswith(magic)
    assert list(tmp_path.iterdir()) == [path]


def test_pictures_that_cannot_be(tmp_path: Path) -> None:
    from tscale import plots

    with pytest.raises(errors.InvalidInput, match="two dates"):
        plots.link_figure(solution(n=1))
    with pytest.raises(errors.InvalidInput, match="no folder"):
        plots.save_link_picture(solution(), tmp_path / "none" / "a.png")
    with pytest.raises(errors.InvalidInput, match=r"\.png"):
        plots.save_link_picture(solution(), tmp_path / "a.jpg")


def test_table_with_picture(folder: Path) -> None:
    words = ("--from", "earth", "--to", "moon", "--transmit", "2024-05-05T00:00:00", *TABLE)
    assert run(*words, "--output", "moon.csv", "--plot", "moon.png") == 0
    assert (folder / "moon.png").stat().st_size > 20000
    assert (folder / "moon.csv").is_file()


def test_example_runs(folder: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    script = Path(tscale.__file__).parents[1] / "examples" / "link_pass.py"
    if not script.is_file():
        pytest.fail("the examples stand beside the package in a checkout")
    monkeypatch.setattr(sys, "argv", [str(script), "--output", "link_pass.csv", "--plot", "pass.png"])
    runpy.run_path(str(script), run_name="__main__")
    out = capsys.readouterr().out
    assert "packets" in out
    rows = list(csv.DictReader((folder / "link_pass.csv").read_text(encoding="utf-8").splitlines()))
    assert len(rows) == 181
    assert {row["path"] for row in rows} == {"clear", "blocked"}
    # Half a light day is far out: Mars stood 0.88 au from the Earth in March 2025.
    assert all(870.0 < float(row["round trip, s of the maser"]) < 890.0 for row in rows)
    assert sorted(p.name for p in folder.iterdir() if "link" in p.name or p.suffix == ".png") == [
        "link_pass.csv",
        "pass.png",
    ]
