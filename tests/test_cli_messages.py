"""What the command says of faults: the file once, the line, the value, what to write instead."""

from __future__ import annotations

import sys
from pathlib import Path

import pytest

from tscale.cli.command import _located
from tscale.cli.main import main
from tscale.cli.streams import note

EXAMPLES = Path(__file__).parents[1] / "examples"
CLOCKS = ["--clock", str(EXAMPLES / "maser.csv"), "--clock", str(EXAMPLES / "utc_krl.csv")]
LOG = "epoch,offset_s,uncertainty_s,reference,clock\n"


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "t.csv").write_text("t\n2025-01-01\n")
    return tmp_path


def complaint(capsys: pytest.CaptureFixture[str], *words: str) -> str:
    """The one line that a command ends with."""
    assert main(list(words)) == 2
    text = capsys.readouterr().err
    assert text.startswith("tscale: error: ")
    assert text.count("\n") == 1
    return text.removeprefix("tscale: error: ").removesuffix("\n")


@pytest.mark.parametrize(
    ("first", "layout"),
    [
        ("2025-01-01T00:00:00", "iso"),
        (" 2025-001 ", "iso"),
        ("1950-01-01", "iso"),  # before UTC, and a date all the same
        ("60676.25", "mjd"),
        ("2460676", "jd"),
        ("-3", "seconds"),
    ],
)
def test_a_file_without_header_loses_no_reading(
    folder: Path, capsys: pytest.CaptureFixture[str], first: str, layout: str
) -> None:
    (folder / "in.csv").write_text(f"# a comment\nx,{first}\ny,{first}\n")
    words = ("in.csv", "out.csv", "--to", "TAI", "--input-format", layout, "--column", first.strip())
    text = complaint(capsys, "convert", *words)
    assert text.startswith(f"in.csv:2: the first line holds a date, '{first.strip()}', where the header should be")
    assert "put a line with the names of the columns above it" in text
    assert not (folder / "out.csv").exists()


def test_headers_that_only_look_like_numbers(folder: Path) -> None:
    (folder / "in.csv").write_text("2025\n2025-01-01\n")
    assert main(["convert", "in.csv", "out.csv", "--to", "TAI", "--digits", "0"]) == 0
    (folder / "in.csv").write_text("1st,2\n3,4\n")
    assert main(["convert", "in.csv", "out.csv", "--to", "TAI", "--from", "TT", "--input-format", "seconds"]) == 0


@pytest.mark.parametrize(
    ("value", "options", "words"),
    [
        ("nan", ["--to", "TAI"], "in.csv:4: 'nan' is no date: write YYYY-MM-DD"),
        ("", ["--to", "TAI"], "in.csv:4: '' is no date: it is empty"),
        ("'x'", ["--to", "TAI"], """in.csv:4: "'x'" is no date: write YYYY-MM-DD"""),
        ("2025-02-30", ["--to", "TAI"], "in.csv:4: '2025-02-30' is no date: there is no such day in the calendar"),
        ("2025-03-03T23:59:60", ["--to", "TAI"], "in.csv:4: '2025-03-03T23:59:60' does not exist in the UTC table"),
        ("1950-01-01", ["--to", "TAI"], "in.csv:4: '1950-01-01' is before the UTC table"),
        ("2061-01-01", ["--to", "TDB@GEOCENTER"], "in.csv:4: '2061-01-01' lies outside the span of"),
        ("2055-01-01", ["--to", "UT1"], "in.csv:4: '2055-01-01' is not in the Earth orientation table"),
        ("2025-06-01", ["--to", "TAI", *CLOCKS], "in.csv:4: '2025-06-01' cannot be dated with the log 'maser.csv' of"),
        ("2025-06-01", ["--to", "TAI", *CLOCKS], ": outside the comparisons (2025-03-03T00:00:00 to"),
    ],
)
def test_faults_of_one_row_speak_of_this_row(
    folder: Path, capsys: pytest.CaptureFixture[str], value: str, options: list[str], words: str
) -> None:
    (folder / "in.csv").write_text(f'a,t\n1,2025-03-05\n# note\n2,"{value}"\n3,2025-03-06\n4,"{value}"\n')
    text = complaint(capsys, "convert", "in.csv", "out.csv", "--column", "t", *options)
    assert words in text
    for block_relative in (" of 4", " of 1 ", "item", "mask"):
        assert block_relative not in text.replace("of 1 to", "")
    assert text.count("in.csv") == 1


def test_decimal_dates(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (folder / "in.csv").write_text("t\n60000\n6e4\n")
    text = complaint(capsys, "convert", "in.csv", "out.csv", "--to", "TAI", "--input-format", "mjd")
    assert text.startswith("in.csv:3: '6e4' is no decimal number: write a number such as")


@pytest.mark.parametrize(
    ("content", "words"),
    [
        (
            b"t,n\n2025-01-01,1\n2025-01-02,\xe9\n2025-01-03,1\n",
            "in.csv:3: this line is no UTF-8 text (byte 0xe9 after",
        ),
        (b"t,\xe9\n2025-01-01,1\n", "in.csv:1: this line is no UTF-8 text"),
        (b"t,n\n2025-01-01,1\n2025-01-02\0,1\n", "in.csv:3: this line holds a NUL character"),
        ("t\n2025-01-01\n".encode("utf-16"), "in.csv:1: "),
        (b't,n\n2025-01-01,"1\n' + b"2025-01-01,2\n" * 20000, "in.csv:2: this row cannot be read: field larger than"),
        (b't,n\n2025-01-01,"1\n' + b"2025-01-01,2\n" * 20000, "is a quote left open?"),
        (b't,n\n2025-01-01,"1\n2025-01-01,2\n', "is a quote left open?"),
        (b"t;n\n2025-01-01;1,5\n", "in.csv:2: this row has 2 fields, the header has 1: t;n (the header holds ';'"),
        (b"t;n\n2025-01-01;1\n", "up to 18 decimals (the header holds ';': --delimiter semicolon)"),
        (b"t\tn\n2025-01-01\t1\n", "(the header holds '\\t': --delimiter tab)"),
    ],
)
def test_files_that_are_no_table(folder: Path, capsys: pytest.CaptureFixture[str], content: bytes, words: str) -> None:
    (folder / "in.csv").write_bytes(content)
    assert words in complaint(capsys, "convert", "in.csv", "out.csv", "--to", "TAI")
    assert not (folder / "out.csv").exists()


def test_the_hint_of_a_delimiter_stands_with_a_column_that_is_missing(
    folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    (folder / "in.csv").write_text("t|n\n2025-01-01|1\n")
    text = complaint(capsys, "convert", "in.csv", "out.csv", "--to", "TAI", "--column", "n")
    assert text.endswith("(the header holds '|': --delimiter pipe)")
    (folder / "in.csv").write_text("t,n;m\n2025-01-01,1\n2025-01-32,1\n")
    assert "--delimiter" not in complaint(capsys, "convert", "in.csv", "out.csv", "--to", "TAI")


@pytest.mark.parametrize(
    ("content", "words"),
    [
        ("", "the clock log log.csv is empty"),
        ("epoch;offset_s;uncertainty_s\n2025-01-01;1;0\n", "(the header holds ';': a log is separated by commas)"),
        (
            LOG + "2025-01-01,1e12,0,UTC,x\n",
            "log.csv:2: offset_s is '1e12'; a finite number of seconds from -1e9 to 1e9",
        ),
        (
            LOG + "2025-01-01,1,inf,UTC,x\n",
            "log.csv:2: uncertainty_s is 'inf'; a finite number of seconds from -1e9 to 1e9",
        ),
        (LOG + "2025-01-01\0,1,0,UTC,x\n", "log.csv:2: a NUL character"),
        (LOG + "2025-01-01,1,0,UTC,x\n2025-01-01,1,0,UTC,é\n", "log.csv:3: not UTF-8 text"),
        (LOG + "2025-01-01,1,0,UTC,x\n2025-01-01,1,0,UTC,x\n", "log.csv:3: this epoch is not after the one before"),
    ],
)
def test_clock_logs(folder: Path, capsys: pytest.CaptureFixture[str], content: str, words: str) -> None:
    (folder / "log.csv").write_bytes(content.encode("latin-1"))
    text = complaint(capsys, "convert", "t.csv", "out.csv", "--to", "TAI", "--clock", "log.csv")
    assert words in text
    assert text.count("log.csv") == 1


def test_other_files(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    (folder / "s.toml").write_text('[site]\nname = "x"\nlon_deg = 1\nlat_deg = 2\nheight_m = 3\n')
    text = complaint(capsys, "convert", "t.csv", "out.csv", "--to", "TAI", "--site", "s.toml")
    assert text.endswith("; write geodetic = { lon_deg = ..., lat_deg = ..., height_m = ... }")
    (folder / "s.toml").write_text('[site]\nname = "x"\nx_m = 1\n')
    text = complaint(capsys, "convert", "t.csv", "out.csv", "--to", "TAI", "--site", "s.toml")
    assert text.endswith("; write itrf = { x_m = ..., y_m = ..., z_m = ... }")
    (folder / "s.toml").write_text("[site\n")
    text = complaint(capsys, "convert", "t.csv", "out.csv", "--to", "TAI", "--site", "s.toml")
    assert text.startswith("s.toml:1 is not TOML")
    (folder / "l.dat").write_text("# rows\nnonsense\n")
    assert complaint(capsys, "data", "--leap-seconds", "l.dat").startswith("l.dat:2: 'nonsense' is not a row")
    (folder / "x.txt").write_text("".join(f" {53000 + 10 * i}  32.0000 27.0000\n" for i in range(3)))
    text = complaint(capsys, "data", "--tt-bipm", "x.txt")
    assert "rename the file as the BIPM does, to TTBIPM.23" in text
    assert "name='BIPM23'" in text
    assert text.count("x.txt") == 1
    (folder / "x.txt").rename("TTBIPM.23")
    assert main(["data", "--tt-bipm", "TTBIPM.23"]) == 0
    for option in ("--leap-seconds", "--earth-orientation", "--tt-bipm", "--ephemeris"):
        text = complaint(capsys, "data", option, "none.dat")
        assert text.count("none.dat") == 1
        assert "Errno" not in text


def test_a_truncated_kernel(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    from tscale import Ephemeris

    kernel = Ephemeris.default().path
    assert kernel is not None
    (folder / "trunc.bsp").write_bytes(kernel.read_bytes()[:5000])
    for words in (
        ("data", "--ephemeris", "trunc.bsp"),
        ("link", "--from", "trunc.bsp:4", "--to", "mars", "--scale", "TDB", "--transmit", "2025-01-01"),
    ):
        assert complaint(capsys, *words).count("trunc.bsp") == 1


def test_places_are_said_once() -> None:
    path = Path("a.csv")
    assert _located("a.csv, line 3: no", path, 3) == "a.csv:3: no"
    assert _located("a.csv, row 3: no", path, 3) == "a.csv:3: no"
    assert _located("a.csv: no", path, 3) == "a.csv:3: no"
    assert _located(f"{path.resolve()} is cut", path, None) == "a.csv is cut"
    assert _located("the log a.csv, line 3, is no log", path, 3) == "the log a.csv:3, is no log"
    assert _located("'a.csv' is no log", path, None) == "'a.csv' is no log"
    assert _located("no", path, None) == "a.csv: no"
    assert _located("no", None, None) == "no"
    assert _located("this is a date", Path("a"), 2) == "a:2: this is a date"  # a word, not the file
    assert _located("ba.csv holds no b/a.csv", path, 1) == "a.csv:1: ba.csv holds no b/a.csv"


@pytest.mark.skipif(sys.platform != "linux", reason="/proc takes no files, from nobody")
def test_the_temporary_file_is_not_named(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    text = complaint(capsys, "convert", "t.csv", "/proc/x.csv", "--to", "TAI")
    assert text == "/proc/x.csv: No such file or directory"


def test_messages_are_one_plain_line(capsys: pytest.CaptureFixture[str]) -> None:
    note("a\nb\x0ec " + "9" * 5000, "error")
    said = capsys.readouterr().err
    assert said.count("\n") == 1
    assert "a\\nb\\x0ec" in said
    assert "(5000 characters)" in said
    assert len(said) < 120
