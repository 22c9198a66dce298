"""The cross-check against general libraries: that it passes, that it can fail, and what it says."""

from __future__ import annotations

import json
import math
import sys
from pathlib import Path

import numpy as np
import pytest
from astropy_iers_data import IERS_LEAP_SECOND_FILE

import tscale
from tscale.cli.main import main
from tscale.crosscheck import LibraryReport, libraries
from tscale.crosscheck.comparison import Comparison
from tscale.crosscheck.library_report import CONVERSIONS


@pytest.fixture(scope="module")
def report() -> LibraryReport:
    return libraries(count=60, seed=4)


def test_every_conversion_lies_within_its_tolerance(report: LibraryReport) -> None:
    # pyerfa, astropy and skyfield as installed; each tolerance has its reason beside it.
    assert [c.name for c in report.comparisons] == [c.name for c in CONVERSIONS]
    assert {c.name: c.largest for c in report.comparisons if not c.passed} == {}
    assert report.passed
    assert all(c.n >= 60 for c in report.comparisons)
    assert all(len(c.reason) > 20 for c in CONVERSIONS)


def test_no_tolerance_is_idle(report: LibraryReport) -> None:
    # What is found is within a factor of 30 of what is allowed; text of 18 decimals comes back as it was.
    loose = {c.name for c in report.comparisons if c.largest < c.conversion.tolerance / 30}
    assert loose <= {"ISO 8601 there and back"}


def comparison(report: LibraryReport, name: str) -> Comparison:
    return next(c for c in report.comparisons if c.name == name)


def test_figures_are_those_of_the_residuals(report: LibraryReport) -> None:
    c = comparison(report, "TDB - TT, geocentre")
    assert c.residual is not None
    assert c.t is not None
    assert c.largest == float(np.max(np.abs(c.residual)))
    assert c.rms == pytest.approx(math.sqrt(float(np.mean(c.residual**2))), rel=1e-12, abs=0)
    years = c.t.whole / 31557600.0
    assert c.per_year == pytest.approx(float(np.polyfit(years, c.residual, 1)[0]), rel=1e-6, abs=0)
    # The drift of the analytic series: 0.25 ns a year (tests/test_time_ephemeris.py).
    assert c.per_year == pytest.approx(-0.25e-9, abs=0.08e-9)


def test_the_table_and_the_json_say_the_same(report: LibraryReport) -> None:
    facts = json.loads(report.to_json(residuals=True))
    assert facts["passed"] is True
    assert [f["name"] for f in facts["conversions"]] == [c.name for c in CONVERSIONS]
    assert len(facts["conversions"][0]["residual"]) == 60
    text = report.table()
    for c in CONVERSIONS:
        assert c.name in text
    assert "22 passed, 0 failed, 0 not run" in text
    assert "within the 2e-17 of L_C" in " ".join(text.split())


def test_a_wrong_table_fails() -> None:
    # UT1 held at UTC: up to 0.9 s off, and 0.4 km in the place of a site.
    wrong = tscale.ReferenceData.load(earth_orientation=tscale.EarthOrientation.constant(ut1_minus_utc_s=0.0))
    found = libraries(["UT1", "Roemer", "TAI"], count=20, reference=wrong)
    assert not found.passed
    assert {c.name for c in found.comparisons if not c.passed} == {"UTC - UT1", "Roemer delay, n.r/c"}
    assert "failed: UTC - UT1" in found.table()


def test_a_library_that_is_missing_is_said(monkeypatch: pytest.MonkeyPatch) -> None:
    import importlib.util

    usual = importlib.util.find_spec
    monkeypatch.setattr(importlib.util, "find_spec", lambda name, *a: None if name == "skyfield" else usual(name, *a))
    found = libraries(["skyfield", "TT - TCG"], count=5)
    light = comparison(found, "light time to bodies")
    assert not light.ran
    assert not light.passed
    assert "package skyfield is not installed" in found.table()
    assert "1 passed, 0 failed, 1 not run" in found.table()
    assert found.passed
    assert not libraries("skyfield", count=5).passed  # nothing ran


@pytest.mark.parametrize(
    ("arguments", "words"),
    [
        ({"only": ["tea time"]}, "no conversion is called 'tea time'; there are UTC - TAI"),
        ({"count": 2}, "3 or more; got 2"),
        ({"start": "2020-01-01", "stop": "2019-01-01"}, "ends \\(2019-01-01\\) before it begins"),
    ],
)
def test_refusals(arguments: dict[str, object], words: str) -> None:
    with pytest.raises(tscale.errors.InvalidInput, match=words):
        libraries(**arguments)  # type: ignore[arg-type]


def test_the_command(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    picture = tmp_path / "found.png"
    only = ["--only", "TT - TCG", "--only", "GPS", "--count", "25"]
    assert main(["crosscheck", *only]) == 0
    assert "2 passed, 0 failed, 0 not run" in capsys.readouterr().out
    assert main(["crosscheck", *only, "--json", "--plot", str(picture)]) == 0
    facts = json.loads(capsys.readouterr().out)
    assert [f["n"] for f in facts["conversions"]] == [25, 25]
    assert picture.read_bytes().startswith(b"\x89PNG")


def test_the_command_fails_by_its_exit_status(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    # The IERS table with a leap second that never was: UTC - TAI is 1 s off from 2025 on.
    table = tmp_path / "Leap_Second.dat"
    table.write_text(Path(IERS_LEAP_SECOND_FILE).read_text().rstrip() + "\n    60676.0    1  1 2025       38\n")
    span = ["--start", "2025-02-01", "--stop", "2025-12-01"]
    arguments = ["crosscheck", "--only", "UTC - TAI", "--count", "20", *span, "--leap-seconds", str(table)]
    assert main(arguments) == 1
    assert "failed: UTC - TAI" in capsys.readouterr().out
    assert main(["crosscheck", "--only", "nothing"]) == 2
    assert main(["crosscheck", "--tolerance", "1"]) == 2
    assert main(["crosscheck", "--table", "x.csv", "--count", "3"]) == 2
    assert "--table FILE is missing" in capsys.readouterr().err


def test_without_matplotlib(monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> None:
    monkeypatch.setitem(sys.modules, "matplotlib", None)
    assert main(["crosscheck", "--only", "GPS", "--plot", "a.png"]) == 2
    assert "pip install 'tscale[plot]'" in capsys.readouterr().err
