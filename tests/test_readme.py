"""The README does what it says: its commands, its Python, its examples."""

from __future__ import annotations

import contextlib
import csv
import io
import re
import shlex
import subprocess
import sys
from pathlib import Path

import pytest

import tscale
from tscale.cli.main import main

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")


def blocks(language: str) -> list[str]:
    return re.findall(rf"^```{language}\n(.*?)^```$", README, re.MULTILINE | re.DOTALL)


def commands(block: str) -> list[list[str]]:
    """The words of each command of a block that joins them with `&&`."""
    words = shlex.split(block.replace("\\\n", " "))
    found: list[list[str]] = [[]]
    for word in words:
        if word == "&&":
            found.append([])
        else:
            found[-1].append(word)
    return found


def test_the_first_two_shell_blocks() -> None:
    first, second = blocks("sh")
    assert [words[0] for words in commands(first)] == ["python3", ".venv/bin/pip", ".venv/bin/tscale"]
    assert [words[0] for words in commands(second)] == ["python3", ".venv/bin/pip", ".venv/bin/python"]
    assert commands(second)[-1][1:3] == ["-m", "pytest"]


def test_the_main_job(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    words = commands(blocks("sh")[0])[-1]
    assert words[:4] == [".venv/bin/tscale", "convert", "examples/readings.csv", "readings_out.csv"]
    (tmp_path / "examples").symlink_to(ROOT / "examples")
    monkeypatch.chdir(tmp_path)
    assert main(words[1:]) == 0
    text = capsys.readouterr().out
    for name in ("CLOCK(maser) -> UTC(KRL) -> UTC -> TAI -> TT -> TCG -> TCB -> TDB", "Einstein integral", "total"):
        assert name in text
    with (tmp_path / "readings_out.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(line for line in file if not line.startswith("#")))
    assert len(rows) == 672
    for row in rows:
        # TDB runs with TT, 69.184 s ahead of UTC in 2025, within 2 ms; TCB is ahead of it by L_B times 48 years.
        read = tscale.Instants.from_iso(row["reading"], scale="TT")
        tdb = tscale.Instants.from_iso(row["TDB@TOPOCENTER"], scale="TT").minus(read)
        tcb = tscale.Instants.from_iso(row["TCB@TOPOCENTER"], scale="TT").minus(read)
        assert abs(tdb - 69.184) < 2e-3
        assert abs(tcb - tdb - 1.550519768e-8 * 86400 * (60737.5 - 43144)) < 0.01  # 6.5 days of L_B
    assert f"{len(rows)} readings" in README


def test_python_blocks(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(ROOT)
    names: dict[str, object] = {}
    shown = 0
    for block in blocks("python"):
        with contextlib.redirect_stdout(io.StringIO()):
            exec(compile(block, "README.md", "exec"), names)
        # A comment behind a print that begins like a result is that result; " ... " stands for what is left out.
        for expression, result in re.findall(r"^print\((.+)\)\s+# ((?:\[|CLOCK).*)$", block, re.MULTILINE):
            start, _, end = result.partition(" ... ")
            printed = str(eval(expression, names))
            assert printed.startswith(start)
            assert printed.endswith(end)
            assert end or printed == start
            shown += 1
    assert shown == 4
    assert isinstance(names["scenario"], tscale.ReferenceData)


def test_example_script() -> None:
    done = subprocess.run(
        [sys.executable, "-W", "error", str(ROOT / "examples" / "convert_readings.py")],
        capture_output=True,
        text=True,
        check=False,
        env={"PYTHONPATH": str(ROOT)},
    )
    assert done.returncode == 0, done.stderr
    assert "TDB@BARYCENTER" in done.stdout
    assert "total" in done.stdout


def test_example_files_are_those_of_their_script(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    script = ROOT / "examples" / "make_data.py"
    names: dict[str, object] = {"__name__": "make_data", "__file__": str(tmp_path / "make_data.py")}
    exec(compile(script.read_text(encoding="utf-8"), str(script), "exec"), names)
    names["main"]()  # type: ignore[operator]
    made = sorted(path.name for path in tmp_path.iterdir())
    assert made == ["maser.csv", "readings.csv", "site.toml", "source.toml", "utc_krl.csv"]
    for name in made:
        assert (tmp_path / name).read_bytes() == (ROOT / "examples" / name).read_bytes(), name


def test_links_of_the_readme_exist() -> None:
    for name in re.findall(r"`((?:examples|ephemeris_cache)/[\w./]*|LICENSE|DEVELOPERS\.md)`", README):
        assert (ROOT / name).exists(), name
