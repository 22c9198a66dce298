"""The commands `tscale data`, `tscale --version` and `tscale --help`."""

from __future__ import annotations

import json
import shutil
import subprocess
import sys
from datetime import date
from pathlib import Path

import pytest
from jplephem.excerpter import write_excerpt
from jplephem.spk import SPK

import tscale
from tscale.cli import data
from tscale.cli.main import main
from tscale.ephemeris import shipped


def test_list(capsys: pytest.CaptureFixture[str], reference: tscale.ReferenceData) -> None:
    assert main(["data"]) == 0
    text = capsys.readouterr().out
    for fact in reference.describe():
        (line,) = [line for line in text.splitlines() if line.startswith(fact.table + "  ")]
        assert fact.name in line
        assert fact.start in line
        assert line.endswith(fact.sha256[:12])


def test_full_and_json(capsys: pytest.CaptureFixture[str], reference: tscale.ReferenceData) -> None:
    assert main(["data", "--full"]) == 0
    text = capsys.readouterr().out
    assert reference.leap_seconds.sha256 in text
    assert str(reference.leap_seconds.path) in text
    assert main(["data", "--json"]) == 0
    entries = json.loads(capsys.readouterr().out)
    assert [entry["table"] for entry in entries] == [fact.table for fact in reference.describe()]
    assert entries[0]["expires"] == reference.describe()[0].expires


def test_tables_that_end_are_noted(reference: tscale.ReferenceData) -> None:
    facts = reference.describe()
    assert data._overdue(facts, date(2020, 1, 1)) == []
    assert [note.split(":")[0] for note in data._overdue(facts, date(2059, 1, 1))] == [
        "leap seconds",
        "Earth orientation",
    ]


def test_verify(capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["data", "--verify"]) == 0
    assert "verified: de440_1960_2060.bsp" in capsys.readouterr().out


def test_verify_finds_damage(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    real = shipped.shipped_path
    copy = tmp_path / "cip_iau2006a_1960_2060.npz"
    shutil.copy(real(copy.name), copy)
    content = bytearray(copy.read_bytes())
    content[1000] ^= 1  # one bit
    copy.write_bytes(content)
    monkeypatch.setattr(shipped, "shipped_path", lambda name: copy if name == copy.name else real(name))
    assert main(["data", "--verify"]) == 2
    captured = capsys.readouterr()
    assert captured.err.startswith(f"tscale: error: {copy}: this file is damaged")
    assert "make_cip_table.py" in captured.err
    assert captured.out == ""


def test_verify_needs_no_default_tables_of_the_list() -> None:
    assert set(data._verify()) == set(shipped._read_manifest())


def test_missing_table(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    path = tmp_path / "leap.dat"
    assert main(["data", "--leap-seconds", str(path)]) == 2
    assert str(path) in capsys.readouterr().err


def excerpt(path: Path, start_jd: float, end_jd: float) -> str:
    with SPK.open(shipped.shipped_path(shipped.DEFAULT_KERNEL)) as kernel, path.open("w+b") as file:
        write_excerpt(kernel, file, start_jd, end_jd, kernel.daf.summaries())
    return str(path)


def test_kernel_that_does_not_reach_1977(
    capsys: pytest.CaptureFixture[str],
    tmp_path: Path,
    monkeypatch: pytest.MonkeyPatch,
    reference: tscale.ReferenceData,
) -> None:
    monkeypatch.setenv("TSCALE_CACHE", str(tmp_path / "cache"))
    recent = excerpt(tmp_path / "recent.bsp", 2460310.5, 2461406.5)
    shipped_name = reference.time_ephemeris.name
    assert main(["data", "--ephemeris", recent]) == 0
    assert f"anchored to {shipped_name}" in capsys.readouterr().out
    given = ["--time-ephemeris", str(reference.time_ephemeris.path)]
    assert main(["data", "--json", "--ephemeris", recent, *given]) == 0
    (entry,) = [x for x in json.loads(capsys.readouterr().out) if x["table"] == "time ephemeris"]
    assert entry["name"] == shipped_name
    assert entry["error"] is None


def test_a_table_that_fails_leaves_the_others(
    capsys: pytest.CaptureFixture[str], tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setenv("TSCALE_CACHE", str(tmp_path / "cache"))
    words = ["data", "--ephemeris", excerpt(tmp_path / "days.bsp", 2460310.5, 2460312.0)]
    assert main(words) == 2
    captured = capsys.readouterr()
    assert [line.split("  ")[0] for line in captured.out.splitlines()[1:5]] == [
        "leap seconds",
        "Earth orientation",
        "ephemeris",
        "time ephemeris",
    ]
    assert "days.bsp" in captured.out
    assert "(cannot be used)" in captured.out
    assert captured.err.startswith("tscale: error: time ephemeris: days.bsp covers only 2024-01-01")
    assert captured.err.count("\n") == 1
    assert main([*words, "--json"]) == 2
    captured = capsys.readouterr()
    assert "use a longer kernel" in json.loads(captured.out)[-1]["error"]


def test_version_and_help(capsys: pytest.CaptureFixture[str]) -> None:
    for arguments, words in ((["--version"], f"tscale {tscale.__version__}"), (["convert", "--help"], "--sigma")):
        with pytest.raises(SystemExit) as caught:
            main(arguments)
        assert caught.value.code == 0
        assert words in capsys.readouterr().out
    with pytest.raises(SystemExit) as caught:
        main([])
    assert caught.value.code == 2


def test_help_is_light() -> None:
    script = (
        "import sys\n"
        "from tscale.cli.command import parser\n"
        "parser().format_help()\n"
        "assert 'numpy' not in sys.modules, 'help loads numpy'\n"
    )
    done = subprocess.run(
        [sys.executable, "-c", script],
        capture_output=True,
        text=True,
        check=False,
        cwd=Path(tscale.__file__).parents[1],
    )
    assert done.returncode == 0, done.stderr
