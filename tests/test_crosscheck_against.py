"""Results of another program against a chain: differences, figures, tables in files."""

from __future__ import annotations

import json
from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

import tscale
from tscale import Instants
from tscale.cli.main import main
from tscale.crosscheck import against
from tscale.crosscheck.explanation import explained
from tscale.crosscheck.noise import independent_values, outliers, rms
from tscale.files.arrow_columns import date_columns

TO_TT = tscale.chain("UTC", "TT")


def dates(count: int = 50, scale: str = "UTC") -> Instants:
    return Instants(np.arange(count) * 1_000_003 + 300_000_000, np.linspace(0.0, 0.9, count), scale)


@given(shift=st.floats(-1e-6, 1e-6), whole=st.integers(-(10**9), 10**9))
def test_the_difference_is_exact(shift: float, whole: int) -> None:
    # In rational arithmetic: theirs minus ours, rounded once to a float64, and the date itself to 0.11 fs.
    t = Instants([whole], [0.3], "TT")
    theirs = tscale.chain("TT", "TAI")(t).shifted(shift)
    found = against(t, theirs, chain=tscale.chain("TT", "TAI"))
    ours = tscale.chain("TT", "TAI")(t)
    parts = [Fraction(int(x.whole[0])) + Fraction(float(x.fraction[0])) for x in (theirs, ours)]
    assert found.residual_s[0] == float(parts[0] - parts[1])
    assert abs(found.residual_s[0] - shift) < 1.2e-16


def test_figures() -> None:
    t = dates(5)
    found = against(t, TO_TT(t).shifted([1e-6, -3e-6, 2e-6, 0.0, 0.0]), chain=TO_TT)
    assert found.n == 5
    # 1e-16 s: the resolution of the dates.
    assert found.max_s == pytest.approx(3e-6, abs=1.2e-16)
    assert found.rms_s == pytest.approx(np.sqrt(14e-12 / 5), abs=1.2e-16)
    assert found.mean_s == pytest.approx(0.0, abs=1.2e-16)
    facts = json.loads(found.to_json())
    assert facts["n"] == 5
    assert facts["residual_s"][1] == pytest.approx(-3e-6, abs=1.2e-16)
    assert "row 1" in found.table()


def test_trend() -> None:
    t = dates(400)
    years = (t.whole - t.whole[0] + t.fraction) / 31557600.0
    noise = 1e-9 * np.random.default_rng(3).standard_normal(400)
    line = against(t, TO_TT(t).shifted(4e-7 * years + noise), chain=TO_TT).trend
    assert line.per_year_s == pytest.approx(4e-7, abs=4 * line.per_year_sigma_s)
    # White noise about a line: sigma / sqrt(sum (x - mean)^2), to a fifth (the number of independent values is found).
    expected = 1e-9 / np.sqrt(np.sum((years - years.mean()) ** 2))
    assert line.per_year_sigma_s == pytest.approx(expected, rel=0.3, abs=0)


def test_shapes_and_places() -> None:
    site = tscale.Site.from_geodetic("Heron Flat", 133.0, -23.0, 500.0)
    to_tdb = tscale.chain("UTC", "TDB", site=site)
    grid = dates(12).reshape(3, 4)
    out = to_tdb(grid)
    assert against(grid, out, chain=to_tdb).max_s == 0.0
    assert against(grid.at("TOPOCENTER"), Instants(*out.pair, "TDB"), chain=to_tdb).n == 12
    assert against(grid[1, 2], out[1, 2], chain=to_tdb).n == 1
    with pytest.raises(tscale.errors.ScaleMismatch, match="at TDB@GEOCENTER, where the chain ends at TDB@TOPO"):
        against(grid, out.at("GEOCENTER"), chain=to_tdb)
    with pytest.raises(tscale.errors.ScaleMismatch, match="t_out is at TT"):
        against(grid, TO_TT(grid), chain=to_tdb)
    with pytest.raises(tscale.errors.InvalidInput, match="row by row, got shapes"):
        against(grid, out[:2], chain=to_tdb)
    with pytest.raises(tscale.errors.InvalidInput, match="no rows"):
        against(grid[:0], out[:0], chain=to_tdb)
    with pytest.raises(tscale.errors.InvalidInput, match="t_out must be Instants, got list"):
        against(grid, [1.0], chain=to_tdb)  # type: ignore[arg-type]


def test_a_compiled_chain_is_compared_too() -> None:
    t = Instants.from_iso("2024-03-01T00:00:00", scale="UTC").shifted(np.arange(20) * 3600.0)
    to_tdb = tscale.chain("UTC", "TDB@GEOCENTER")
    compiled = to_tdb.compile("2024-02-25", "2024-03-05")
    assert against(t, compiled(t), chain=to_tdb).max_s < 1e-13  # what it is certified to
    found = against(t, to_tdb(t), chain=compiled)
    assert found.max_s < 1e-13
    with pytest.raises(tscale.errors.InvalidInput, match=r"only residuals of a tscale\.Chain"):
        explained(found)


def test_independent_values() -> None:
    # Noise of first order with rho: n (1 - rho)/(1 + rho) values; to a third, which 2000 values allow.
    random = np.random.default_rng(1)
    for rho in (0.0, 0.5, 0.9):
        x = random.standard_normal(2000)
        for i in range(1, 2000):
            x[i] = rho * x[i - 1] + np.sqrt(1 - rho**2) * x[i]
        expected = 2000 * (1 - rho) / (1 + rho)
        assert 0.6 * expected < independent_values(x) < 1.35 * expected
    assert independent_values(np.ones(100)) < 10.0  # an offset is one value
    assert independent_values(np.zeros(9)) == 9.0


def test_outliers_and_rms() -> None:
    x = np.random.default_rng(2).standard_normal(200)
    x[[7, 90]] = [40.0, -25.0]
    assert np.flatnonzero(outliers(x)).tolist() == [7, 90]
    assert not outliers(np.array([0.0, 0.0, 1.0, 0.0])).any()
    assert rms(np.array([3e-200, 4e-200])) == pytest.approx(np.sqrt(12.5) * 1e-200, rel=1e-14, abs=0)


def write_pairs(path: Path, t: Instants, theirs: Instants) -> None:
    rows = [f"{i},{a},{b}" for i, (a, b) in enumerate(zip(t.to_iso(12), theirs.to_iso(12), strict=True))]
    path.write_text("# from elsewhere\nnumber,given,got\n" + "\n".join(rows) + "\n")


def test_the_command_on_a_text(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    t = dates(60)
    pairs, picture = tmp_path / "pairs.csv", tmp_path / "made.svg"
    # 10 ns of noise on 19 s too few: their program took GPS time for TAI.
    noise = 1e-8 * np.random.default_rng(5).standard_normal(60)
    write_pairs(pairs, t, TO_TT(t).shifted(noise - 19.0))
    columns = ["--input-column", "given", "--output-column", "got", "--from", "UTC", "--to", "TT"]
    arguments = ["crosscheck", "--table", str(pairs), *columns]
    assert main([*arguments, "--plot", str(picture)]) == 0
    out = capsys.readouterr().out
    assert "19 s (TAI - GPS time)" in out
    assert "what is left is noise" in out
    assert main([*arguments, "--json"]) == 0
    facts = json.loads(capsys.readouterr().out)
    assert facts["causes"][0]["name"] == "19 s (TAI - GPS time)"
    assert facts["unexplained_rms_s"] == pytest.approx(1e-8, rel=0.3, abs=0)
    assert picture.read_text().startswith("<?xml")
    assert main([*arguments, "--tolerance", "20"]) == 0
    assert main([*arguments, "--tolerance", "1e-3", "--no-explain"]) == 1
    out = capsys.readouterr().out
    assert "BEYOND the tolerance of 0.001 s" in out


def test_the_command_on_a_table(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    pa, parquet = pytest.importorskip("pyarrow"), pytest.importorskip("pyarrow.parquet")
    t = dates(30)
    given_columns, got = date_columns("given", t), date_columns("got", TO_TT(t).shifted(2.0**-20))
    table = given_columns
    for name in got.schema.names:
        table = table.append_column(got.schema.field(name), got.column(name))
    path = tmp_path / "pairs.parquet"
    parquet.write_table(table, path)
    arguments = ["crosscheck", "--table", str(path), "--to", "TT", "--no-explain"]
    assert main([*arguments, "--input-column", "given", "--output-column", "got"]) == 0
    assert "9.536743e-07 s" in capsys.readouterr().out
    # Without names: the first and the second column of dates, whatever else is before, between and behind them.
    assert main(arguments) == 0
    assert "9.536743e-07 s" in capsys.readouterr().out
    stamps = pa.array(np.arange(30), pa.timestamp("us"))
    for at, name in ((4, "seen"), (2, "written"), (0, "drawn")):
        table = table.add_column(at, name, pa.array(["x"] * 30) if name != "seen" else stamps)
    parquet.write_table(table, path)
    assert main(arguments) == 0
    assert "9.536743e-07 s" in capsys.readouterr().out
    assert main([*arguments, "--input-column", "got"]) == 2
    assert "name two different columns" in capsys.readouterr().err
    parquet.write_table(given_columns, path)
    assert main(arguments) == 2
    assert "counts or timestamps are given, and two are needed; name both columns" in capsys.readouterr().err


def test_the_help_says_what_decides(capsys: pytest.CaptureFixture[str]) -> None:
    with pytest.raises(SystemExit):
        main(["crosscheck", "--help"])
    out = " ".join(capsys.readouterr().out.split())
    assert "Without --tolerance nothing is asked of the differences, and the status is 0 however large they are" in out
    assert "of a Parquet or Arrow table the first of dates" in out


def test_faults_name_the_line(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "pairs.csv"
    path.write_text("a,b\n2024-01-01T00:00:00,2024-01-01T00:01:09.184\n2024-01-02T00:00:00,yesterday\n")
    assert main(["crosscheck", "--table", str(path), "--to", "TT"]) == 2
    assert f"{path}:3" in capsys.readouterr().err
    assert main(["crosscheck", "--table", str(path)]) == 2
    assert "--to NODE" in capsys.readouterr().err
    path.write_text("a\n2024-01-01T00:00:00\n")
    assert main(["crosscheck", "--table", str(path), "--to", "TT"]) == 2
    assert "second column" in capsys.readouterr().err
    path.write_text("a,b\n2024-01-01T00:00:00,2024-01-01T00:01:09.184\n")
    assert main(["crosscheck", "--table", str(path), "--to", "TT", "--input-column", "b"]) == 2
    assert "both 'b': name two different columns" in capsys.readouterr().err
    assert main(["crosscheck", "--table", "-", "--to", "TT"]) == 2
    assert "read twice" in capsys.readouterr().err
