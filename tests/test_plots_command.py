"""`tscale plot`: pictures from files and from spans, and what is said when they cannot be."""

from __future__ import annotations

import sys
from pathlib import Path

import pytest

from tests.plots_support import EXAMPLES, OPTIONS
from tscale.cli.main import main

READINGS = str(EXAMPLES / "readings.csv")
PREDICTED = Path(__file__).parent / "data" / "eop_predictions" / "finals2000A_2025-05-23.txt"
SITE = ["--site", str(EXAMPLES / "site.toml")]
SPAN = ["--start", "2025-03-03T06:00:00", "--stop", "2025-03-10T00:00:00"]


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    return tmp_path


def test_pictures_of_a_file_of_readings(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["plot", "ledger", READINGS, *OPTIONS, "--to", "TDB", "--output", "l.svg", "--title", "T<&>"]) == 0
    assert (folder / "l.svg").read_bytes().startswith(b"<?xml")
    given = ["plot", "budget", READINGS, *OPTIONS, "--to", "TDB", "--reading-sigma-s", "1e-9", "--output"]
    assert main([*given, "a.png"]) == 0
    assert main([*given, "b.png"]) == 0
    assert (folder / "a.png").read_bytes() == (folder / "b.png").read_bytes()
    assert capsys.readouterr().err == ""


def test_dates_in_a_gap_are_left_out_and_said(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["plot", "ledger", *SPAN, "--step", "3600", *OPTIONS, "--to", "TDB", "--output", "l.png"]) == 0
    err = capsys.readouterr().err
    # The log has no comparison from 18h of the 7th to 6h of the 8th; both ends can be used. maser.csv is 4 us ahead.
    assert err.startswith(
        "tscale: note: 12 of 163 dates are left out of the picture: 12 of 163 readings cannot be dated"
    )
    assert "mask" not in err
    far = ["--start", "2026-03-01", "--stop", "2026-03-02"]
    assert main(["plot", "ledger", *far, *OPTIONS, "--to", "TDB", "--output", "m.png"]) == 2
    assert "outside the comparisons" in capsys.readouterr().err
    assert not (folder / "m.png").exists()


def test_logs(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    log = str(EXAMPLES / "maser.csv")
    assert main(["plot", "log", log, "--output", "a.pdf"]) == 0
    assert "maser.csv: warning: line 23: failed comparison" in capsys.readouterr().err
    noise = ["--white-frequency", "2e-13", "--flicker-frequency", "3e-15"]
    ahead = ["--until", "2025-03-20", "--fit-s", "172800", *noise]
    assert main(["plot", "log", log, "--no-inspection", *ahead, "--output", "b.pdf"]) == 0
    assert capsys.readouterr().err == ""
    assert main(["plot", "log", log, *noise, "--interpolation", "cubic", "--output", "c.pdf"]) == 0
    assert main(["plot", "log", log, "--max-gap-s", "1", "--output", "d.pdf"]) == 0
    assert "findings more, as in the picture" in capsys.readouterr().err
    assert main(["plot", "log", log, "--until", "2025-03-20", "--output", "e.pdf"]) == 2
    assert "--until needs --fit-s S" in capsys.readouterr().err
    assert main(["plot", "log", log, "--drift", "--output", "e.pdf"]) == 2
    assert "say --until DATE" in capsys.readouterr().err
    assert main(["plot", "log", "none.csv", "--output", "e.pdf"]) == 2
    assert "none.csv" in capsys.readouterr().err
    assert not (folder / "e.pdf").exists()


def test_what_other_tables_move(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    import astropy_iers_data

    later = astropy_iers_data.IERS_A_FILE
    span = ["--start", "2025-05-25", "--stop", "2025-07-30", "--step", "100000"]
    given = ["plot", "what-if", *span, *SITE, "--to", "TDB", "--earth-orientation", str(PREDICTED)]
    assert main([*given, "--with-earth-orientation", later, "--output", "w.svg"]) == 0
    assert (folder / "w.svg").stat().st_size > 10_000
    assert "use predicted Earth orientation" in capsys.readouterr().err
    assert main([*given, "--output", "v.svg"]) == 2
    assert "nothing is replaced" in capsys.readouterr().err


@pytest.mark.parametrize(
    ("words", "message"),
    [
        (["ledger", "--output", "a.png"], "give the dates by INPUT, or by --start DATE and --stop DATE"),
        (["ledger", READINGS, *SPAN, "--output", "a.png"], "give the dates by INPUT, or by"),
        (["ledger", READINGS, "--step", "5", "--output", "a.png"], "--step goes with --start and --stop"),
        (["ledger", "--start", "2025-01-01", "--output", "a.png"], "belong together"),
        (["ledger", "--start", "2025-01-02", "--stop", "2025-01-01", "--output", "a.png"], "comes after --start"),
        (["ledger", *SPAN, "--step", "1e9", "--output", "a.png"], "takes 2 to 100000 dates"),
        (["ledger", *SPAN, "--step", "1e-9", "--output", "a.png"], "take a longer --step"),
        (["ledger", *SPAN, "--step", "1e999999999", "--output", "a.png"], "lies between"),
        (["ledger", *SPAN, "--step", "soon", "--output", "a.png"], "decimal number of seconds"),
        (["ledger", "--start", "now", "--stop", "2025-01-01", "--output", "a.png"], "--start now is no date of UTC"),
        (["ledger", *SPAN, "--output", "a.jpg"], "must end in .png, .pdf, .svg"),
        (["ledger", *SPAN, "--output", "none/a.png"], "no folder"),
        (["budget", *SPAN, "--to", "TT", "--output", "a.png"], "nothing to draw"),
        (["budget", *SPAN, "--site-sigma-m", "-1", *SITE, "--output", "a.png"], "site_sigma_m must be zero or more"),
    ],
)
def test_pictures_that_cannot_be(
    words: list[str], message: str, folder: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    end = [] if "--to" in words else ["--to", "TAI" if words[0] == "ledger" else "TDB"]
    assert main(["plot", *words, *end]) == 2
    err = capsys.readouterr().err
    assert err.startswith("tscale: error: ")
    assert message in err
    assert err.count("\n") == 1
    assert list(folder.iterdir()) == []


def test_without_matplotlib(folder: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    monkeypatch.setitem(sys.modules, "matplotlib", None)
    assert main(["plot", "ledger", *SPAN, "--to", "TAI", "--output", "a.png"]) == 2
    assert "pip install 'tscale[plot]'" in capsys.readouterr().err
    assert main(["report", READINGS, *OPTIONS, "--to", "TDB", "--output", "a.html"]) == 2
    assert "pip install 'tscale[plot]'" in capsys.readouterr().err
    assert main(["report", READINGS, *OPTIONS, "--to", "TDB", "--no-pictures", "--output", "a.html"]) == 0


def test_readings_from_the_standard_input(folder: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    import io

    text = "day;t\n1;60735.25\n2;60736.25\n"
    monkeypatch.setattr("sys.stdin", io.StringIO(text))
    options = ["--delimiter", "semicolon", "--column", "t", "--input-format", "mjd", "--from", "UTC", *SITE]
    assert main(["plot", "ledger", "-", *options, "--to", "TDB", "--output", "a.png"]) == 0
    assert (folder / "a.png").exists()


def test_help_names_the_pictures(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit) as ended:
        main(["plot", "--help"])
    assert ended.value.code == 0
    out = capsys.readouterr().out
    for name in ("ledger", "budget", "log", "what-if"):
        assert name in out
