"""The examples run as they stand, in a folder of their own, and say what they should."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

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
    text = output("compare_clocks.py", tmp_path, "--plot", "flight.png")
    assert "and the ridge is 580.20 m above the bay, u = 0.05 m" in text
    # IS-GPS-200: -4.4647e-10. arXiv 2406.16147: 56.0256 us a day.
    assert "set it to -4.4647e-10" in text
    assert "56.0252 us a day on TT" in text
    assert (tmp_path / "flight.png").read_bytes().startswith(b"\x89PNG")
