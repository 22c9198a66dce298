"""The command `tscale convert`: the same numbers as the library, whole files or none, errors by file and line."""

from __future__ import annotations

import csv
import io
import os
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

import tscale
from tscale import exact
from tscale.cli import conversion
from tscale.cli.main import main
from tscale.cli.walk import Walk, add_notes

EXAMPLES = Path(__file__).parents[1] / "examples"
READINGS = EXAMPLES / "readings.csv"
SITE = ["--site", str(EXAMPLES / "site.toml")]
CLOCKS = ["--clock", str(EXAMPLES / "maser.csv"), "--clock", str(EXAMPLES / "utc_krl.csv")]
SOURCE = ["--source", str(EXAMPLES / "source.toml")]


def rows_of(path: Path) -> list[dict[str, str]]:
    with path.open(encoding="utf-8", newline="") as file:
        return list(csv.DictReader(line for line in file if not line.startswith("#")))


def write(path: Path, *lines: str) -> str:
    path.write_text("".join(line + "\n" for line in lines), encoding="utf-8")
    return str(path)


@pytest.fixture
def sent(monkeypatch: pytest.MonkeyPatch) -> object:
    def send(text: str) -> None:
        monkeypatch.setattr(sys, "stdin", io.TextIOWrapper(io.BytesIO(text.encode())))

    return send


def test_same_as_the_library(tmp_path: Path, reference: tscale.ReferenceData) -> None:
    out = tmp_path / "out.csv"
    wanted = ["--to", "TCB", "--to", "TDB", "--to", "TDB@BARYCENTER"]
    status = main(
        ["convert", str(READINGS), str(out), *wanted, *SITE, *CLOCKS, *SOURCE, "--digits", "15", "--ledger", "--sigma"]
    )
    assert status == 0
    got = rows_of(out)
    given = rows_of(READINGS)
    assert len(got) == len(given) == 672
    t = tscale.Instants.from_iso([row["reading"] for row in given], scale="CLOCK(maser)")
    for end in ("TCB@TOPOCENTER", "TDB@TOPOCENTER", "TDB@BARYCENTER"):
        c = tscale.chain(
            "CLOCK(maser)",
            end,
            site=tscale.Site.load(EXAMPLES / "site.toml"),
            clocks=[tscale.ClockLog.load(EXAMPLES / name) for name in ("maser.csv", "utc_krl.csv")],
            source=tscale.Source.load(EXAMPLES / "source.toml"),
            reference=reference,
        )
        assert [row[end] for row in got] == c(t).to_iso(15).tolist()
        sigma = np.array([float(row[f"sigma {end} (s)"]) for row in got])
        np.testing.assert_allclose(sigma, c.sigma_s(t), rtol=6e-4)  # four digits are written
        ledger = c.ledger(t)
        for name in ledger:
            written = np.array([float(row[f"{name} (s)"]) for row in got])
            # 1 fs is written, and read back here as one float64: 6e-14 s at 431 s.
            np.testing.assert_allclose(written, ledger[name], rtol=0, atol=1e-13)
    for before, after in zip(given, got, strict=True):
        assert {name: after[name] for name in before} == before


def test_terms_add_up_to_the_difference_of_the_dates(tmp_path: Path) -> None:
    out = tmp_path / "out.csv"
    assert main(["convert", str(READINGS), str(out), "--to", "TDB", *SITE, *CLOCKS, "--ledger", "--digits", "18"]) == 0
    row = rows_of(out)[-1]
    total = sum(int(row[name].replace(".", "")) for name in row if name.endswith(" (s)"))  # in fs, as integers
    # Both labels as if of one uniform calendar: the difference of what the two faces show.
    start = tscale.Instants.from_iso(row["reading"], scale="TT")
    end = tscale.Instants.from_iso(row["TDB@TOPOCENTER"], scale="TT")
    whole, fraction = end.minus_exact(start)
    assert abs(total - (int(whole) * 10**15 + float(fraction) * 1e15)) <= 5  # nine terms, each rounded to 1 fs


def test_comments_and_columns_stay(tmp_path: Path) -> None:
    given = 'note,"t, UTC"\r\n# kept\r\n"a,b",2025-01-01T00:00:00\r\n\r\n"say ""x""",2025-01-01T00:00:01\r\n'
    path, out = tmp_path / "in.csv", tmp_path / "out.csv"
    path.write_bytes(given.encode())
    assert main(["convert", str(path), str(out), "--to", "TAI", "--column", "t, UTC", "--digits", "0"]) == 0
    assert out.read_bytes().decode() == (
        'note,"t, UTC",TAI\r\n# kept\r\n"a,b",2025-01-01T00:00:00,2025-01-01T00:00:37\r\n\r\n'
        '"say ""x""",2025-01-01T00:00:01,2025-01-01T00:00:38\r\n'
    )


def test_comments_at_the_end_of_full_blocks(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(conversion, "_BLOCK_ROWS", 1)
    path, out = write(tmp_path / "in.csv", "t", "2025-01-01", "# end", ""), tmp_path / "out.csv"
    assert main(["convert", path, str(out), "--to", "TAI", "--digits", "0"]) == 0
    assert out.read_text() == "t,TAI\n2025-01-01,2025-01-01T00:00:37\n# end\n\n"


def test_in_blocks_as_in_one(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    arguments = ["--to", "TDB", "--to", "UT1", *SITE, "--ledger", "--sigma", "--from", "UTC"]
    assert main(["convert", str(READINGS), str(tmp_path / "one.csv"), *arguments]) == 0
    one = capsys.readouterr().out.replace("one.csv", "")
    monkeypatch.setattr(conversion, "_BLOCK_ROWS", 100)
    assert main(["convert", str(READINGS), str(tmp_path / "many.csv"), *arguments]) == 0
    assert capsys.readouterr().out.replace("many.csv", "") == one
    assert (tmp_path / "one.csv").read_bytes() == (tmp_path / "many.csv").read_bytes()


def test_streams_and_decimal_dates(sent: object, capsys: pytest.CaptureFixture[str]) -> None:
    # SOFA Time Scale and Calendar Tools, section 2.4: 2006-01-15T21:24:37.5 UTC is 21:25:42.684 TT.
    sent("mjd\n53750.892100694444444\n")  # type: ignore[operator]
    assert main(["convert", "-", "-", "--input-format", "mjd", "--to", "TT", "--digits", "9"]) == 0
    captured = capsys.readouterr()
    assert captured.out == "mjd,TT\n53750.892100694444444,2006-01-15T21:25:42.684000000\n"
    assert "1 rows: <stdin> -> <stdout>" in captured.err
    sent("t\n0.000000000000000001\n")  # type: ignore[operator]
    options = ["--input-format", "seconds", "--output-format", "seconds", "--digits", "18", "--quiet"]
    assert main(["convert", "-", "-", "--from", "TT", "--to", "TAI", *options]) == 0
    captured = capsys.readouterr()
    assert captured.out.splitlines()[1].split(",")[1].startswith("-32.18399999999999")
    assert captured.err == ""


def test_summary(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    out = tmp_path / "out.csv"
    assert main(["convert", str(READINGS), str(out), "--to", "TCB", "--to", "TDB", *SITE, *CLOCKS]) == 0
    text = capsys.readouterr().out
    assert text.count("path at TOPOCENTER:") == 1  # the way to TCB is a part of the way to TDB
    assert "CLOCK(maser) -> UTC(KRL) -> UTC -> TAI -> TT -> TCG -> TCB -> TDB" in text
    assert "first reading, line 3 of" in text
    for term in ("TAI - UTC", "TCG - TT", "Einstein integral at the geocentre", "topocentric v.r/c^2", "total"):
        assert term in text
    assert f"672 rows: {READINGS} -> {out}" in text
    for table in ("maser.csv", "utc_krl.csv", "Leap_Second.dat", "de440_1960_2060.bsp"):
        assert table in text


def test_notes_are_summed(tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(conversion, "_BLOCK_ROWS", 2)
    late = [f"20{year}-01-01T00:00:00" for year in (40, 41, 42, 43, 44)]
    path = write(tmp_path / "in.csv", "t", "2020-01-01T00:00:00", *late)
    assert main(["convert", path, str(tmp_path / "out.csv"), "--to", "TDB", *SITE]) == 0
    text = capsys.readouterr().out
    assert "note: 5 of 6 instants are past the expiry of the leap-second table" in text
    assert "note: 5 of 6 instants are past the end of the Earth orientation" in text
    known: dict[str, list[int]] = {}
    add_notes(known, ["3 of 5 apples", "a plain note"])
    add_notes(known, ["4 of 5 apples", "a plain note"])
    assert known == {"apples": [7], "a plain note": [0]}


def test_output_may_be_the_input(tmp_path: Path) -> None:
    path = write(tmp_path / "t.csv", "t", "2025-01-01T00:00:00")
    assert main(["convert", path, path, "--to", "TAI", "--digits", "0"]) == 0
    assert Path(path).read_text() == "t,TAI\n2025-01-01T00:00:00,2025-01-01T00:00:37\n"
    before = Path(path).read_text()
    assert main(["convert", path, path, "--to", "TAI"]) == 2  # the column is there now
    assert Path(path).read_text() == before


def test_logs_of_one_clock_are_joined(tmp_path: Path) -> None:
    head = "epoch,offset_s,uncertainty_s,reference,clock"
    first = write(tmp_path / "a.csv", head, "2025-01-01T00:00:00,1,0,UTC,x", "2025-01-02T00:00:00,1,0,UTC,x")
    second = write(tmp_path / "b.csv", head, "2025-01-03T00:00:00,2,0,UTC,x", "2025-01-04T00:00:00,2,0,UTC,x")
    path = write(tmp_path / "t.csv", "t", "2025-01-01T12:00:01", "2025-01-03T12:00:02")
    out = tmp_path / "out.csv"
    arguments = ["--clock", second, "--clock", first, "--to", "UTC", "--digits", "0"]
    assert main(["convert", path, str(out), *arguments]) == 0
    assert [row["UTC"] for row in rows_of(out)] == ["2025-01-01T12:00:00", "2025-01-03T12:00:00"]
    path = write(tmp_path / "t.csv", "t", "2025-01-02T12:00:01")
    assert main(["convert", path, str(out), *arguments]) == 2  # between the logs is a gap


HEAD = "reading,n"
GOOD = "2025-03-03T00:00:00,1"


@pytest.mark.parametrize(
    ("lines", "arguments", "words"),
    [
        ([], ["--to", "TAI"], "in.csv: the input is empty"),
        ([HEAD], ["--to", "TAI"], "in.csv: there are no rows below the header"),
        ([HEAD, "# none yet"], ["--to", "TAI"], "in.csv: there are no rows below the header"),
        ([HEAD, GOOD], ["--to", "TAI", "--column", "date"], "in.csv:1: there is no column called 'date'"),
        ([HEAD, GOOD, "2025-03-03T00:00:00"], ["--to", "TAI"], "in.csv:3: this row has 1 field,"),
        ([HEAD, GOOD, "nan,2"], ["--to", "TAI"], "in.csv:3: 'nan' is no date: write"),
        ([HEAD, GOOD, ",2"], ["--to", "TAI"], "in.csv:3: "),
        ([HEAD, "# c", GOOD, "2025-03-03T23:59:60,2"], ["--to", "TAI"], "in.csv:4: '2025-03-03T23:59:60'"),
        ([HEAD, GOOD, "1950-01-01,2"], ["--to", "TAI"], "in.csv:3: '1950-01-01'"),
        ([HEAD, GOOD, "2061-01-01,2"], ["--to", "TDB@GEOCENTER"], "in.csv:3: '2061-01-01'"),
        (
            [HEAD, GOOD, "inf,2"],
            ["--to", "TAI", "--input-format", "mjd"],
            "in.csv:2: '2025-03-03T00:00:00' is no decimal number",
        ),
        ([HEAD, GOOD], ["--to", "TDB"], "--site FILE"),
        ([HEAD, GOOD], ["--to", "TDB@BARYCENTER", *SITE], "--source FILE (or --ra and --dec)"),
        ([HEAD, GOOD], ["--to", "TAI", *CLOCKS[:2]], "--clock FILE"),
        ([HEAD, GOOD], ["--to", "TT(BIPM23)"], "--tt-bipm FILE"),
        ([HEAD, "2025-06-01T00:00:00,1"], ["--to", "TAI", *CLOCKS], "in.csv:2: '2025-06-01T00:00:00'"),
        ([HEAD, GOOD], ["--to", "TIA"], "unknown scale 'TIA'"),
        ([HEAD, GOOD], ["--to", "TAI", "--to", "TAI"], "each --to is given once"),
        ([HEAD, GOOD], ["--to", "TAI", "--digits", "19"], "digits must be"),
        ([HEAD, GOOD], ["--to", "TAI", "--delimiter", "ab"], "a delimiter is one character"),
        ([HEAD, GOOD], ["--to", "TDB@BARYCENTER", "--ra", "10", *SITE], "--ra and --dec belong together"),
        ([HEAD, GOOD], ["--to", "TAI", "--ra", "10", "--dec", "1", *SOURCE], "not by both"),
        ([HEAD, GOOD], ["--to", "TAI", "--ephemeris", "no.bsp"], "no.bsp"),
    ],
)
def test_errors_leave_nothing_behind(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], lines: list[str], arguments: list[str], words: str
) -> None:
    path = write(tmp_path / "in.csv", *lines)
    assert main(["convert", path, str(tmp_path / "out.csv"), *arguments]) == 2
    captured = capsys.readouterr()
    assert captured.out == ""
    assert captured.err.startswith("tscale: error: ")
    assert captured.err.count("\n") == 1
    assert words in captured.err
    assert "Traceback" not in captured.err
    assert os.listdir(tmp_path) == ["in.csv"]


def test_an_error_late_in_the_file(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(conversion, "_BLOCK_ROWS", 10)
    path = write(tmp_path / "in.csv", "t", *["2025-01-01T00:00:00"] * 25, "2025-01-32T00:00:00")
    out = tmp_path / "out.csv"
    out.write_text("old")
    assert main(["convert", path, str(out), "--to", "TAI"]) == 2
    assert "in.csv:27: " in capsys.readouterr().err
    assert out.read_text() == "old"
    assert sorted(os.listdir(tmp_path)) == ["in.csv", "out.csv"]


@pytest.mark.parametrize(("source", "words"), [("no.csv", "no.csv: No such file"), (".", "holds no file that ends in")])
def test_files_that_cannot_be_read(tmp_path: Path, capsys: pytest.CaptureFixture[str], source: str, words: str) -> None:
    assert main(["convert", str(tmp_path / source), str(tmp_path / "out.csv"), "--to", "TAI"]) == 2
    assert words in capsys.readouterr().err
    assert os.listdir(tmp_path) == []


def test_a_pipe_that_nobody_reads(tmp_path: Path) -> None:
    path = write(tmp_path / "in.csv", "t", *["2025-01-01T00:00:00"] * 200000)
    command = [sys.executable, "-m", "tscale", "convert", path, "-", "--to", "TAI"]
    root = str(Path(tscale.__file__).parents[1])
    with subprocess.Popen(
        command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, env={**os.environ, "PYTHONPATH": root}
    ) as running:
        assert running.stdout is not None
        assert running.stderr is not None
        assert running.stdout.readline() == b"t,TAI\n"
        running.stdout.close()
        complaint = running.stderr.read()
        status = running.wait(timeout=60)
    assert status == 141  # as the shell reports a program that SIGPIPE ended
    assert complaint == b""


def test_the_walk_meets_each_step_once(reference: tscale.ReferenceData) -> None:
    site = tscale.Site.load(EXAMPLES / "site.toml")
    ends = ["TDB", "TCB", "UTC", "UT1", "GPS"]
    chains = [tscale.chain("UTC", end, site=site, reference=reference) for end in ends]
    t = tscale.Instants.from_iso(["2000-01-01T00:00:00", "2020-06-01T01:02:03.5"], scale="UTC")
    walk = Walk(chains, t)
    for chain, sigma in zip(chains, walk.sigma_s(), strict=True):
        np.testing.assert_allclose(sigma, chain.sigma_s(t), rtol=1e-12, atol=0)
        for name, value in chain.ledger(t).items():
            np.testing.assert_array_equal(exact.seconds(walk.terms()[name]), value)
    steps = [step for step, _, _ in walk.passed.values()]
    assert len({(str(s.start), str(s.end)) for s in steps}) == len(steps)


def test_cells_for_spreadsheets(tmp_path: Path) -> None:
    source, out = tmp_path / "in.csv", tmp_path / "out.csv"
    source.write_text("seen,n\n2025-03-03T12:21:00.639426798458,1\n")
    assert main(["convert", str(source), str(out), "--to", "TAI", "--output-format", "spreadsheet", "--quiet"]) == 0
    assert (
        out.read_text().splitlines()[1] == '2025-03-03T12:21:00.639426798458,1,"=""2025-03-03T12:21:37.639426798458"""'
    )
    again = tmp_path / "again.csv"
    words = ["--column", "TAI", "--from", "TAI", "--to", "UTC", "--input-format", "spreadsheet", "--quiet"]
    assert main(["convert", str(out), str(again), *words]) == 0
    assert again.read_text().splitlines()[1].endswith(",2025-03-03T12:21:00.639426798458")
