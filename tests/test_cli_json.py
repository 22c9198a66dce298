"""What commands say to programs (`--json`), to a terminal, and to a shell; `tscale inspect` and `tscale budget`."""

from __future__ import annotations

import argparse
import csv
import io
import itertools
import json
import re
import shutil
import subprocess
import sys
from pathlib import Path

import pytest
import tqdm

import tscale
from tscale.cli import conversion
from tscale.cli.command import parser
from tscale.cli.main import main

EXAMPLES = Path(__file__).parents[1] / "examples"
READINGS = str(EXAMPLES / "readings.csv")
SITE = ["--site", str(EXAMPLES / "site.toml")]
CLOCKS = ["--clock", str(EXAMPLES / "maser.csv"), "--clock", str(EXAMPLES / "utc_krl.csv")]
STAR = ["--source", str(EXAMPLES / "source.toml")]


def commands() -> dict[str, argparse.ArgumentParser]:
    (action,) = [action for action in parser()._actions if isinstance(action, argparse._SubParsersAction)]
    return dict(action.choices)


def said(capsys: pytest.CaptureFixture[str], *words: str) -> str:
    assert main(list(words)) == 0
    return capsys.readouterr().out


# ---- the same habits everywhere ---------------------------------------------------------------------


def test_every_command_has_examples() -> None:
    for name, command in commands().items():
        assert re.search(rf"\nexamples?:\n.*tscale {name}", command.format_help(), re.DOTALL), name


def test_an_option_is_called_the_same_everywhere() -> None:
    """One name, one kind of value; and a file, a number of seconds, a date are spelled one way."""
    metavars: dict[str, set[object]] = {}
    for command in commands().values():
        for action in command._actions:
            for option in action.option_strings:
                if action.nargs != 0 and not isinstance(action, argparse.BooleanOptionalAction):
                    metavars.setdefault(option, set()).add(action.metavar)
    two = {"--from", "--to"}  # nodes of a chain, ends of a link
    assert {option: seen for option, seen in metavars.items() if len(seen) > 1 and option not in two} == {}


def test_what_is_said_to_programs_is_a_flag() -> None:
    for name, command in commands().items():
        flags = [action for action in command._actions if "--json" in action.option_strings]
        if name not in ("plot", "report", "completion", "events"):
            assert [flag.nargs for flag in flags] == [0], name


# ---- JSON ------------------------------------------------------------------------------------------


def test_convert(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    out = str(tmp_path / "out.csv")
    words = ["convert", READINGS, out, *SITE, *CLOCKS, "--to", "TCB", "--to", "TDB", "--json"]
    found = json.loads(said(capsys, *words))
    with open(out, encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(line for line in file if not line.startswith("#")))
    assert (found["rows"], found["output"]) == (len(rows), out)
    for result in found["results"]:
        assert result["first"] == rows[0][result["to"]]
        assert sum(result["terms_s"].values()) == pytest.approx(result["total_s"], abs=1e-13)
        assert result["path"][0] == found["from"] == "CLOCK(maser)@TOPOCENTER"
    assert {table["table"] for table in found["tables"]} >= {"leap seconds", "ephemeris", "Earth orientation"}
    assert all(re.fullmatch("[0-9a-f]{64}", table["sha256"]) for table in found["tables"])


def test_rows_and_summary_keep_apart(capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(sys, "stdin", io.StringIO("t\n2025-01-01\n"))
    assert main(["convert", "-", "-", "--to", "TAI", "--json"]) == 0
    streams = capsys.readouterr()
    assert streams.out == "t,TAI\n2025-01-01,2025-01-01T00:00:37.000000000000\n"
    assert json.loads(streams.err)["rows"] == 1


def test_convert_of_a_table(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    pa = pytest.importorskip("pyarrow")
    pq = pytest.importorskip("pyarrow.parquet")
    pq.write_table(pa.table({"t": ["2025-01-01", "2025-01-02"]}), tmp_path / "in.parquet")
    names = [str(tmp_path / name) for name in ("in.parquet", "out.parquet")]
    found = json.loads(said(capsys, "convert", *names, "--to", "TAI", "--column", "t", "--json"))
    assert (found["input"], found["output"], found["rows"]) == (*names, 2)


def test_link(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    ends = ["link", "--from", str(EXAMPLES / "site.toml"), "--to", "moon", "--transmit", "2025-03-01"]
    one = json.loads(said(capsys, *ends, "--json"))
    t = tscale.Instants.from_iso("2025-03-01", scale="UTC")
    link = tscale.link.one_way(transmit=t, transmitter=tscale.Site.load(EXAMPLES / "site.toml"), receiver="moon")
    assert one["light time (TDB s)"] == float(link.light_time_s)
    assert one["receive (TDB)"] == link.receive.to_iso(12)
    assert sum(value for name, value in one.items() if name.endswith(" (s)")) == pytest.approx(
        one["light time (TDB s)"], abs=1e-15
    )
    table = [*ends, "--until", "2025-03-02", "--step", "7200", "--ledger"]
    rows = json.loads(said(capsys, *table, "--json"))
    read = list(csv.DictReader(io.StringIO(said(capsys, *table))))
    assert len(rows) == len(read) == 13
    assert rows[0] == {name: value for name, value in one.items() if name != "notes"}
    for row, texts in zip(rows, read, strict=True):
        assert list(row) == list(texts)
        for name, value in row.items():
            # The table has its decimals cut: 5 of a degree at least.
            assert value == texts[name] if isinstance(value, str) else abs(value - float(texts[name])) <= 5.1e-6


def test_compile(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    file = str(tmp_path / "day.chain")
    span = ["--start", "2025-03-01", "--stop", "2025-03-01T06:00:00", "--tolerance-s", "1e-12"]
    found = json.loads(
        said(capsys, "compile", file, "--to", "TDB@GEOCENTER", "--from", "TT@GEOCENTER", *span, "--json")
    )
    assert found == json.loads(json.dumps(tscale.load_compiled(file).certificate.to_dict()))
    assert max(found["forward"]["max_error_s"], found["inverse"]["max_error_s"]) <= found["tolerance_s"] == 1e-12


# ---- inspect ---------------------------------------------------------------------------------------

HEAD = "epoch,offset_s,uncertainty_s,reference,clock\n"


def test_inspect(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    good = str(EXAMPLES / "maser.csv")
    assert tscale.ClockLog.inspect(good).table() in said(capsys, "inspect", good)
    bad = tmp_path / "bad.csv"
    bad.write_text(HEAD + "2025-01-02,1e-6,1e-9,UTC,a\n2025-01-01,x,1e-9,UTC,a\n")
    assert main(["inspect", good, str(bad)]) == 1  # not in order
    text = capsys.readouterr().out
    assert "error: line 3" in text
    assert main(["inspect", good, str(bad), "--json"]) == 1
    found = json.loads(capsys.readouterr().out)
    assert [report["loads"] for report in found] == [True, False]
    assert found[1] == tscale.ClockLog.inspect(bad).to_dict()
    assert main(["inspect", str(tmp_path / "none.csv")]) != 0


# ---- budget ----------------------------------------------------------------------------------------


def test_budget(capsys: pytest.CaptureFixture[str]) -> None:
    given = ["budget", READINGS, *SITE, *CLOCKS, *STAR, "--to", "TDB@BARYCENTER", "--site-sigma-m", "0.05"]
    text = said(capsys, *given)
    site, source = tscale.Site.load(EXAMPLES / "site.toml"), tscale.Source.load(EXAMPLES / "source.toml")
    logs = [tscale.ClockLog.load(EXAMPLES / name) for name in ("maser.csv", "utc_krl.csv")]
    chain = tscale.chain("CLOCK(maser)", "TDB@BARYCENTER", site=site, clocks=logs, source=source)
    t = tscale.Instants.from_iso(["2025-03-03T12:21:00.639426798458"], scale="CLOCK(maser)")
    budget = chain.budget(t, site_sigma_m=0.05)
    assert f"combined standard uncertainty  {budget.combined_s[0]:.3e} s" in text
    assert "give --source-position-sigma-mas" in text
    assert "[noise.CLOCK] in the file of --project" in text
    assert "_sigma_" not in text
    assert json.loads(said(capsys, *given, "--json")) == json.loads(budget.to_json())
    dated = [*given[:1], "--date", "2025-03-03T12:21:00.639426798458", *given[2:]]
    assert said(capsys, *dated) == text


# ---- terminals and shells --------------------------------------------------------------------------


class Terminal(io.StringIO):
    """An error stream that says it is a terminal."""

    def isatty(self) -> bool:
        return True


def test_progress_tells_rate_and_what_is_left(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """A bar with rate and time left, without colours, on a terminal and for long work alone."""
    (tmp_path / "in.csv").write_text("t\n" + "".join(f"2025-01-01T{hour:02}:00:00\n" for hour in range(24)))
    words = ["convert", str(tmp_path / "in.csv"), str(tmp_path / "out.csv"), "--to", "TAI", "--quiet"]
    monkeypatch.setattr(conversion, "_BLOCK_ROWS", 8)

    def shown(stream: io.StringIO, *more: str) -> str:
        monkeypatch.setattr(sys, "stderr", stream)
        assert main([*words, *more]) == 0
        return stream.getvalue()

    assert shown(Terminal()) == ""
    # The clock of the bar: two seconds between one look and the next.
    monkeypatch.setattr(tqdm.std, "time", itertools.count(0.0, 2.0).__next__)
    bar = shown(Terminal())
    assert re.search(r"\d+%\|.*\[\d\d:\d\d<\d\d:\d\d, .*B/s\]", bar), bar
    assert "\x1b[3" not in bar
    assert shown(io.StringIO()) == ""
    assert shown(Terminal(), "--no-progress") == ""


def test_completion(capsys: pytest.CaptureFixture[str]) -> None:
    bash = said(capsys, "completion", "bash")
    for name in commands():
        assert name in bash
    assert main(["completion", "zsh"]) == 0
    assert capsys.readouterr().out.startswith("#compdef tscale")
    shell = shutil.which("bash")
    if shell is None:
        pytest.skip("no bash here")

    def completed(*words: str) -> list[str]:
        line = " ".join(f"'{word}'" for word in words)
        script = f'{bash}\nCOMP_WORDS=({line}); COMP_CWORD={len(words) - 1}; _shtab_tscale; echo "${{COMPREPLY[@]}}"'
        done = subprocess.run([shell, "-c", script], capture_output=True, text=True, check=False, cwd=EXAMPLES)
        return done.stdout.split()

    assert completed("tscale", "conv") == ["convert"]
    assert "--leap-seconds" in completed("tscale", "convert", "--leap")
    assert {"TDB", "TDB@BARYCENTER"} <= set(completed("tscale", "convert", "--to", "TD"))
    assert completed("tscale", "convert", "--site", "sit") == ["site.toml"]


def test_completion_without_its_library(capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "shtab", None)
    assert main(["completion", "bash"]) == 2
    assert "pip install 'tscale[completion]'" in capsys.readouterr().err
