"""What `tscale clock` says of faults: one line that tells what to give instead, and nothing left behind."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

from tscale.cli import main as entry

from .clock_support import FILES, MARCH


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    for name, content in FILES.items():
        (tmp_path / name).write_text(content, encoding="utf-8")
    monkeypatch.chdir(tmp_path)
    return tmp_path


BOTH = ("ridge.toml", "bay.toml", *MARCH)


@pytest.mark.parametrize(
    ("words", "match"),
    [
        (("moon", *MARCH), "centre of a body, where no clock is: give a TOML file with a [surface] table"),
        (("nowhere", *MARCH), "is no clock and no file; a clock is a TOML file"),
        (("none.csv", *MARCH), "cannot read the flight none.csv"),
        (("none.toml", *MARCH), "none.toml"),
        (("empty.toml", *MARCH), "one table of [site], [surface] and [orbit]"),
        (("ridge.toml",), "no dates: give --start DATE and --stop DATE"),
        (("ridge.toml", "--start", "2025-03-01"), "--start and --stop belong together"),
        (("ridge.toml", "--start", "2025-03-08", "--stop", "2025-03-01"), "--stop comes after --start"),
        (("ridge.toml", "--start", "yesterday", "--stop", "2025-03-01"), "--start yesterday: is no date"),
        (("ridge.toml", *MARCH, "--step", "soon"), "--step is a decimal number of seconds"),
        (("ridge.toml", *MARCH, "--step", "1e999999999"), "--step lies between"),
        (("ridge.toml", *MARCH, "--step", "0.001"), "take a longer --step"),
        (("ridge.toml", *MARCH, "--step", "1e9"), "take a shorter --step"),
        (("ridge.toml", *MARCH, "--against", "UT1"), "got --against UT1"),
        ((*BOTH, "--against", "own"), "compare them against TCG near the Earth"),
        (("ridge.toml", *MARCH, "--scale", "UT9"), "UT9"),
        (("ridge.toml", *MARCH, "--scale", "CLOCK(maser)"), "convert them with `tscale convert` first"),
        (("hut.toml", *MARCH), "write geopotential_number_m2_s2 or height_above_geoid_m into its file, or give a grav"),
        (("hut.toml", "bay.toml", *MARCH), "Osprey Hut is not known"),
        (("moon.toml", *MARCH, "--gravity", "x.gfc"), "--gravity is the Earth's field"),
        (("hut.toml", *MARCH, "--gravity", "x.gfc"), "x.gfc"),
        (("ridge.toml", *MARCH, "--max-degree", "5"), "--max-degree is of a gravity field"),
        (("ridge.toml", *MARCH, "--height-sigma", "tall"), "--height-sigma takes a number of zero or more"),
        (("ridge.toml", *MARCH, "--height-sigma", "-1"), "--height-sigma takes a number of zero or more"),
        (("ridge.toml", *MARCH, "--height-sigma", "1,2"), "for 1 clock"),
        ((*BOTH, "--geopotential-sigma", "1,2,3"), "for 2 clocks"),
        ((*BOTH, "--speed-sigma", "1"), "--speed-sigma is for a flight or an orbit"),
        ((*BOTH, "--measured", "1e-15"), "belong together"),
        ((*BOTH, "--measured", "1e-15", "--measured-sigma", "0"), "--measured-sigma one above zero"),
        ((*BOTH, "--measured", "1e-9", "--measured-sigma", "1e-17"), "give fractions, such as 4.1e-17"),
        (("ridge.toml", *MARCH, "--measured", "1e-15", "--measured-sigma", "1e-17"), "two clocks on the ground"),
        (("flight.csv", "bay.toml", "--measured", "1e-15", "--measured-sigma", "1e-17"), "got flight and site"),
        ((*BOTH, "--measured", "1e-15", "--measured-sigma", "1e-17", "--set-offset", "1e-12"), "leave --set-offset"),
        ((*BOTH, "--set-offset", "0.5"), "--set-offset is a fraction"),
        ((*BOTH, "--nominal-frequency", "1e7"), "closed orbit about the Earth"),
        (("orbit.toml", *MARCH, "--nominal-frequency", "-1e7"), "above zero"),
        ((*BOTH, "--output", "-"), "--output takes the name of a file"),
        ((*BOTH, "--plot", "picture.txt"), "the name must end in"),
        ((*BOTH, "--output", "nowhere/x.csv"), "nowhere"),
        (
            ("hut.toml", "bay.toml", *MARCH, "--measured", "1e-15", "--measured-sigma", "1e-17", "--plot", "x.png"),
            "the potential of a site is not known",
        ),
        (("flight.csv", "ridge.toml", *MARCH), "choose --start and --stop within that"),
        (("flight.csv", "later.csv"), "share no dates"),
    ],
)
def test_errors_teach(folder: Path, capsys: pytest.CaptureFixture[str], words: tuple[str, ...], match: str) -> None:
    Path("empty.toml").write_text("")
    Path("later.csv").write_text(FILES["flight.csv"].replace("2025-03-01", "2025-04-01"))
    before = sorted(os.listdir())
    assert entry.main(["clock", *words]) == 2
    caught = capsys.readouterr()
    assert caught.out == ""
    assert caught.err.startswith("tscale: error: ")
    assert caught.err.count("\n") == 1
    assert match in caught.err
    assert sorted(os.listdir()) == before


def test_help_has_examples(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as stopped:
        entry.main(["clock", "--help"])
    assert stopped.value.code == 0
    shown = capsys.readouterr().out
    assert "tscale clock laboratory.toml" in shown
    assert "a CCSDS Orbit Ephemeris Message" in shown
