"""`--project`: a file that names site, clocks, source and tables once."""

from __future__ import annotations

import csv
import json
from pathlib import Path

import astropy_iers_data
import pytest

import tscale
from tscale.cli.main import main

EXAMPLES = Path(__file__).parents[1] / "examples"
OPTIONS = [
    *("--site", str(EXAMPLES / "site.toml"), "--source", str(EXAMPLES / "source.toml")),
    *("--clock", str(EXAMPLES / "maser.csv"), "--clock", str(EXAMPLES / "utc_krl.csv")),
]
PROJECT = """\
site = "site.toml"
clocks = ["maser.csv", "utc_krl.csv"]
source = "source.toml"
"""
READINGS = str(EXAMPLES / "readings.csv")


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A working folder, and in `obs` beside it the files of a project."""
    (tmp_path / "obs").mkdir()
    for name in ("site.toml", "source.toml", "maser.csv", "utc_krl.csv"):
        (tmp_path / "obs" / name).write_bytes((EXAMPLES / name).read_bytes())
    (tmp_path / "work").mkdir()
    monkeypatch.chdir(tmp_path / "work")
    return tmp_path / "obs"


def project(folder: Path, text: str = PROJECT) -> list[str]:
    (folder / "ridge.toml").write_text(text)
    return ["--project", "../obs/ridge.toml"]


def rows(path: str) -> list[dict[str, str]]:
    with open(path, encoding="utf-8", newline="") as file:
        return list(csv.DictReader(line for line in file if not line.startswith("#")))


def converted(*words: str) -> str:
    assert main(["convert", READINGS, "out.csv", "--to", "TDB@BARYCENTER", "--quiet", *words]) == 0
    return Path("out.csv").read_text()


def test_it_stands_for_the_options_it_names(folder: Path) -> None:
    assert converted(*project(folder)) == converted(*OPTIONS)
    text = PROJECT + 'solid_tide = true\nsub_daily = true\nsecond_order = true\ninterpolation = "cubic"\n'
    all_options = ["--solid-tide", "--sub-daily", "--second-order", "--interpolation", "cubic"]
    assert converted(*project(folder, text)) == converted(*OPTIONS, *all_options)
    assert converted(*project(folder, text)) != converted(*OPTIONS)


def test_options_win(folder: Path) -> None:
    given = project(folder, PROJECT + "solid_tide = true\nsub_daily = true\nsecond_order = true\n")
    assert converted(*given, "--no-solid-tide", "--no-sub-daily", "--no-second-order") == converted(*OPTIONS)
    assert converted(*given, "--ra", "10", "--dec", "-20") == converted(
        *(*OPTIONS[:2], *OPTIONS[4:], "--ra", "10", "--dec", "-20", "--solid-tide", "--sub-daily", "--second-order")
    )
    # The clocks given are all there are: the reference of the maser is then unknown.
    words = ["convert", READINGS, "out.csv", "--to", "TDB", *given, "--clock", OPTIONS[5]]
    assert main(words) == 2
    orbit = str(EXAMPLES / "link_pass.toml")
    assert "Heron" in orbiting(given, orbit)


def orbiting(given: list[str], orbit: str) -> str:
    """An orbit in place of the site and of its tide; only its chain is looked at."""
    from tscale.cli.command import parser
    from tscale.cli.project import with_project
    from tscale.cli.supplies import supplied

    args = parser().parse_args(["convert", "-", "-", "--to", "TDB", "--from", "TDB", *given, "--orbit", orbit])
    return str(supplied(with_project(args)).site)


def test_one_project_serves_all_commands(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    given = project(folder)
    date = "2025-03-03T12:30:00"
    assert main(["budget", "--date", date, "--to", "TDB@BARYCENTER", *given, "--json"]) == 0
    assert main(["link", "--from", "moon", "--to", "mars", "--transmit", date, "--scale", "TDB", *given]) == 0
    assert main(["data", *given]) == 0
    capsys.readouterr()
    assert main(["compile", "day.chain", "--to", "TDB", "--start", date, "--stop", "2025-03-03T15:00:00", *given,
                 "--json"]) == 0  # fmt: skip
    certificate = json.loads(capsys.readouterr().out)
    assert certificate["site"] == "Kestrel Ridge"
    assert certificate["chain"].startswith("CLOCK(maser)")


def test_what_the_project_has_beside_is_no_matter_for_a_note(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    words = ["convert", READINGS, "out.csv", "--from", "UTC", "--to", "TAI"]
    assert main([*words, *project(folder)]) == 0
    assert "was not used" not in capsys.readouterr().out
    assert main([*words, *OPTIONS]) == 0
    assert capsys.readouterr().out.count("was not used") == 4


def test_noise_and_prediction(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """The last comparison of the maser is of 2025-03-10; past it the log goes on with a growing uncertainty."""
    last = tscale.ClockLog.load(folder / "maser.csv").span[-1]
    dates = [last.shifted(seconds).to_iso(0).item() for seconds in (-3600, 3600, 86400)]
    Path("in.csv").write_text("\n".join(["t", *dates]) + "\n")
    words = ["convert", "in.csv", "out.csv", "--to", "UTC(KRL)", "--sigma"]
    assert main([*words, *project(folder)]) == 2
    assert "outside the comparisons" in capsys.readouterr().err
    noise = "[noise.maser]\nwhite_frequency = 2e-13\nflicker_frequency = 3e-15\n"
    ahead = f'[predict.maser]\nfit_s = 172800\nuntil = "{last.shifted(2 * 86400).to_iso(0).item()}"\n'
    assert main([*words, *project(folder, PROJECT + noise + ahead)]) == 0
    found = rows("out.csv")
    place = next(name for name in found[0] if name.startswith("status "))
    assert [row[place] for row in found] == ["none", "clock predicted", "clock predicted"]
    log = tscale.ClockLog.load(folder / "maser.csv").predicted(
        tscale.tables.ClockNoise(white_frequency=2e-13, flicker_frequency=3e-15),
        fit_s=172800,
        until=last.shifted(2 * 86400),
    )
    chain = tscale.chain("CLOCK(maser)", "UTC(KRL)", clocks=[log])
    t = tscale.Instants.from_iso(dates, scale="CLOCK(maser)")
    with pytest.warns(tscale.ExtrapolationWarning):
        mapped = chain(t)
    assert [row[place.removeprefix("status ")] for row in found] == mapped.to_iso(12).tolist()
    with pytest.warns(tscale.ExtrapolationWarning):
        sigma = chain.sigma_s(t)
    assert [float(row[f"sigma {place.removeprefix('status ')} (s)"]) for row in found] == pytest.approx(
        sigma, rel=1e-3, abs=1e-20
    )
    assert sigma[0] < sigma[1] < sigma[2]


def test_imported_tables_by_name(folder: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("TSCALE_CACHE", str(tmp_path / "cache"))
    leap = Path(astropy_iers_data.IERS_LEAP_SECOND_FILE)
    assert main(["data", "--import", str(leap), "--name", "leap"]) == 0
    assert converted(*project(folder, PROJECT + 'leap_seconds = "imported:leap"\n')) == converted(*OPTIONS)


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ('observatory = "x"\n', "unknown key observatory in the project; allowed are site, solid_tide"),
        ("site = 3\n", "site must be a file name, got 3"),
        ('clocks = ["a.csv", 1]\n', "clocks must be a file name or a list of them"),
        ('solid_tide = "yes"\n', "solid_tide must be true or false, got 'yes'"),
        ("max_gap_s = true\n", "max_gap_s must be a number"),
        ('interpolation = "quintic"\n', "interpolation must be linear, cubic or step, got 'quintic'"),
        ("[site]\nname = 'x'\n", "site must be a file name, got {'name': 'x'}"),
        ("noise = 3\n", "noise is given by clock, in a table such as [noise.maser]"),
        ("[noise.maser]\nwhite = 1.0\n", "unknown key white in [noise.maser]; allowed are white_frequency"),
        ("[noise.maser]\nwhite_frequency = -1.0\n", "[noise] of CLOCK(maser): white_frequency is a level of noise"),
        ("[noise.caesium]\nwhite_frequency = 1e-12\n", "[noise] of CLOCK(caesium) belongs to no log of the project"),
        ("[predict.maser]\nfit_s = 1e5\n", "[predict] of CLOCK(maser) needs [noise] of it"),
        ("[noise.maser]\nwhite_frequency = 1e-13\n[predict.maser]\nfit_s = 'long'\n", "it needs fit_s"),
        ("[noise.maser]\nwhite_frequency = 1e-13\n[predict.maser]\nfit_s = 1e5\ndrift = 1\n", "drift must be true or"),
        ("[noise.maser]\nwhite_frequency = 1e-13\n[predict.maser]\nfit_s = 1e5\n", "say until when to predict"),
        ("site = \n", "is not TOML"),
    ],
)
def test_faults_are_told(folder: Path, capsys: pytest.CaptureFixture[str], text: str, words: str) -> None:
    if text.startswith(("[noise", "[predict")):
        text = PROJECT + text
    assert main(["convert", READINGS, "out.csv", "--to", "TDB", *project(folder, text)]) == 2
    said = capsys.readouterr().err
    assert words in said
    assert "ridge.toml" in said
    assert not Path("out.csv").exists()


def test_no_project_is_looked_for(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """No hidden state: what lies in the working folder changes nothing."""
    Path("tscale.toml").write_text("nonsense = 1\n")
    assert converted(*OPTIONS)
    assert main(["convert", READINGS, "out.csv", "--to", "TDB", "--project", "none.toml"]) == 2
    assert "none.toml" in capsys.readouterr().err
