"""The examples run as they stand, in a folder of their own, and say what they should."""

from __future__ import annotations

import os
import re
import subprocess
import sys
from pathlib import Path

import pytest

from tscale.cli.main import main

ROOT = Path(__file__).parent.parent


def output(script: str, folder: Path, *words: str) -> str:
    environment = {**os.environ, "PYTHONPATH": str(ROOT), "MPLBACKEND": "Agg"}
    command = [sys.executable, str(ROOT / "examples" / script), *words]
    done = subprocess.run(command, cwd=folder, env=environment, capture_output=True, text=True, check=False)
    assert done.returncode == 0, done.stderr
    return done.stdout


def test_arrival_times_are_flat(tmp_path: Path) -> None:
    text = output("arrival_times.py", tmp_path, "--plot", "residuals.png")
    assert "noise put in: 80 ns; residuals are flat" in text
    rows = [line.split() for line in text.splitlines()[1:10]]
    # The noise put in is 80 ns; without its parallax each pulsar is off by hundreds of ns.
    assert all(60.0 < float(row[-3]) < 100.0 for row in rows)
    assert all(float(row[-1]) > 200.0 for row in rows)
    assert (tmp_path / "residuals.png").read_bytes().startswith(b"\x89PNG")
    assert os.listdir(tmp_path) == ["residuals.png"]


def test_convert_readings(tmp_path: Path) -> None:
    assert "TDB@BARYCENTER" in output("convert_readings.py", tmp_path)


def test_a_cluster_gives_the_bytes_of_one_process(tmp_path: Path) -> None:
    text = output("on_a_cluster.py", tmp_path, "--readings", "300000")
    assert "300000 readings; the same bytes as in this process alone: True" in text


def test_compare_clocks(tmp_path: Path) -> None:
    text = output("walk_clocks.py", tmp_path, "--plot", "flight.png")
    assert "and the ridge is 580.20 m above the bay, u = 0.05 m" in text
    # IS-GPS-200: -4.4647e-10. arXiv 2406.16147: 56.0256 us a day.
    assert "set it to -4.4647e-10" in text
    assert "56.0252 us a day on TT" in text
    assert (tmp_path / "flight.png").read_bytes().startswith(b"\x89PNG")


def test_walk_to_a_pulsar(tmp_path: Path) -> None:
    text = output("walk_pulsar.py", tmp_path)
    rms = re.search(r"residuals ([\d.]+) ns rms", text)
    assert rms is not None
    assert 45.0 < float(rms[1]) < 55.0  # 50 ns were put in
    assert os.listdir(tmp_path) == []


def test_walk_along_a_link(tmp_path: Path) -> None:
    text = output("walk_link.py", tmp_path)
    delay = re.search(r"([\d.]+) us at (2026-01-\d\d)", text)
    assert delay is not None
    # Mars is in conjunction on 2026-01-09, 0.94 deg from the Sun (almanac, from memory). Closed form, one way, with
    # the distances of that day: 2 GM/c^3 ln(4 * 0.983 au * 1.45 au / (0.983 au sin 0.94 deg)^2) = 98.1 us.
    assert delay[2] == "2026-01-09"
    assert float(delay[1]) == pytest.approx(98.1, rel=0, abs=0.5)
    assert os.listdir(tmp_path) == []


def test_walk_through_a_cross_check(tmp_path: Path) -> None:
    text = output("walk_crosscheck.py", tmp_path)
    assert "leap second of 2017-01-01 (MJD 57754) left out" in text
    assert "what is left is noise" in text


def test_the_project_of_the_examples(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    given = [str(ROOT / "examples" / "readings.csv"), "--project", str(ROOT / "examples" / "project.toml")]
    assert main(["budget", *given, "--to", "TDB@BARYCENTER"]) == 0
    text = capsys.readouterr().out
    assert "CLOCK(maser) - UTC(KRL), wander of the clock" in text.partition("not included")[0]
    assert "tide of the solid Earth, left out" not in text
    words = ["convert", given[0], str(tmp_path / "out.csv"), *given[1:], "--to", "TDB@BARYCENTER", "--sigma"]
    assert main(words) == 0
