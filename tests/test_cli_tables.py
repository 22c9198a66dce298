"""`tscale convert` of Parquet and Arrow tables, `tscale compile`, and options of sites and logs."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest

import tscale
from tscale.cli.main import main
from tscale.files.arrow_columns import date_columns, instants_of
from tscale.files.tables import convert_table

EXAMPLES = Path(__file__).parents[1] / "examples"
OBSERVER = ["--site", str(EXAMPLES / "site.toml"), "--source", str(EXAMPLES / "source.toml")]


def events(n: int = 2000) -> tscale.Instants:
    rng = np.random.default_rng(8)
    start = int(tscale.Instants.from_iso("2025-03-03", "UTC").whole)
    return tscale.Instants.from_seconds(start + rng.integers(0, 86_400, n), rng.random(n), scale="UTC")


def saved(path: Path, t: tscale.Instants) -> Path:
    pq.write_table(date_columns("time", t).append_column("count", pa.array(np.arange(t.size))), path)
    return path


def chain() -> tscale.Chain:
    site, source = tscale.Site.load(EXAMPLES / "site.toml"), tscale.Source.load(EXAMPLES / "source.toml")
    return tscale.chain("UTC", "TDB@BARYCENTER", site=site, source=source)


def test_a_table_is_converted_by_the_options_of_text(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    t = events()
    source, target = saved(tmp_path / "in.parquet", t), tmp_path / "out.arrow"
    ends = ["--to", "TDB@BARYCENTER", "--to", "TT"]
    assert main(["convert", str(source), str(target), *ends, *OBSERVER, "--sigma", "--threads", "2"]) == 0
    assert f"{source}: 2000 rows to {target}" in capsys.readouterr().out
    after = pa.ipc.open_file(str(target)).read_all()
    got, want = instants_of(after, "TDB@BARYCENTER"), chain()(t)
    assert np.array_equal(got.whole, want.whole)
    assert np.array_equal(got.fraction, want.fraction)
    assert np.array_equal(after["TDB@BARYCENTER_sigma_s"], chain().sigma_s(t))
    assert after["count"].to_pylist() == list(range(2000))
    assert instants_of(after, "TT@TOPOCENTER").place == "TOPOCENTER"


def test_a_chain_is_compiled_and_used_without_its_tables(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    t = events()
    source, compiled = saved(tmp_path / "in.parquet", t), tmp_path / "day.chain"
    span = ["--start", "2025-03-03", "--stop", "2025-03-04T00:00:01"]
    assert main(["compile", str(compiled), "--from", "UTC", "--to", "TDB@BARYCENTER", *span, *OBSERVER]) == 0
    said = capsys.readouterr().out
    assert "UTC@TOPOCENTER" in said
    assert "TDB@BARYCENTER" in said
    out = tmp_path / "parts"
    for found in ("", " (2000 were there already)"):
        assert main(["convert", str(source), str(out), "--compiled", str(compiled)]) == 0
        assert f"2000 rows{found} to {out}" in capsys.readouterr().out
    got = instants_of(pq.read_table(out / "part-00000.parquet"), "TDB@BARYCENTER")
    assert np.max(np.abs(got - chain()(t))) < 3e-13  # s: the tolerance, and two roundings of positions at 1 au


def test_what_does_not_go_together_is_refused(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    source, out = str(saved(tmp_path / "in.parquet", events(5))), str(tmp_path / "out.parquet")
    text = str(tmp_path / "in.csv")
    Path(text).write_text("time\n2025-03-03\n")
    for arguments, words in (
        ([source, out], "say what is wanted with --to NODE"),
        ([source, out, "--to", "TT", "--input-format", "mjd"], "--input-format is for text, and the input"),
        ([source, out, "--to", "TT", "--digits", "3"], "--digits is for text, and the output"),
        ([text, out[:-8] + ".xlsx", "--to", "TT"], "would be text under a name of .xlsx"),
        ([source, out, "--to", "TT", "--provenance"], "take --provenance-file FILE"),
        ([source, out, "--to", "TT", "--compiled", "x"], "not both"),
        ([source, out, "--compiled", text], "in.csv"),
        ([text, out[:-8] + ".txt", "--to", "TT", "--threads", "2"], "--compiled and --threads are for tables"),
        ([source, out[:-8] + ".txt", "--to", "TT"], "no table by its name"),
        ([source, "-", "--to", "TT"], "not to the standard output"),
        ([source, out, "--to", "TDB"], "--site FILE"),
        ([source, out, "--to", "TT", "--column", "when"], "no column of dates 'when' (there: time)"),
        ([source, out, "--to", "TT", "--from", "GPS"], "are UTC by their metadata, not GPS"),
    ):
        assert main(["convert", *arguments]) == 2
        assert words in capsys.readouterr().err
    assert not Path(out).exists()


def test_tides_and_sub_daily_rotation_are_options(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    source = saved(tmp_path / "in.parquet", events(200))
    results = {}
    for option in ([], ["--solid-tide"], ["--sub-daily"]):
        out = tmp_path / "out.parquet"
        assert main(["convert", str(source), str(out), "--to", "TDB@BARYCENTER", *OBSERVER, *option]) == 0
        results["".join(option)] = instants_of(pq.read_table(out), "TDB@BARYCENTER")
    # Sizes by the IERS Conventions (2010), chapters 7 and 8: 0.4 m and 3 cm, over c.
    for option, least, most in (("--solid-tide", 5e-11, 1.4e-9), ("--sub-daily", 1e-12, 1.5e-10)):
        moved = np.max(np.abs(results[option] - results[""]))
        assert least < moved < most
    capsys.readouterr()
    assert main(["convert", str(source), str(tmp_path / "o.parquet"), "--to", "TT", "--solid-tide"]) == 2
    assert "give it by --site FILE" in capsys.readouterr().err


def test_a_laboratory_is_taken_out_of_a_circular(tmp_path: Path) -> None:
    circular = next(iter(sorted((Path(__file__).parent / "data" / "circular").glob("*229*"))))
    source = tmp_path / "readings.csv"
    source.write_text("time\n2007-01-01T00:00:00\n")
    out = tmp_path / "out.csv"
    assert main(["convert", str(source), str(out), "--to", "UTC", "--clock", f"{circular}:CH", "--quiet"]) == 0
    # BIPM Circular T 229: UTC - UTC(CH) = -65.1 ns at 2006-12-31 (MJD 54100 - 1 is -56.0, 54104 -65.1).
    offset = float(
        tscale.Instants.from_iso(out.read_text().splitlines()[1].split(",")[1], "UTC")
        - tscale.Instants.from_iso("2007-01-01T00:00:00", "UTC")
    )
    assert offset == pytest.approx(-56.0e-9 + (54101 - 54099) / 5 * (-65.1e-9 + 56.0e-9), abs=1e-12)


def test_layouts_of_text_on_either_side_of_a_table(tmp_path: Path) -> None:
    source, table, out = tmp_path / "in.csv", tmp_path / "t.parquet", tmp_path / "out.csv"
    source.write_text("day;n\n58849.5;1\n58850.25;2\n")
    words = ["--from", "UTC", "--to", "TAI", "--quiet"]
    assert main(["convert", str(source), str(table), *words, "--input-format", "mjd", "--delimiter", ";"]) == 0
    want = tscale.chain("UTC", "TAI")(tscale.Instants.from_mjd([58849, 58850], [0.5, 0.25], "UTC"))
    assert np.all(instants_of(pq.read_table(table), "TAI") == want)
    layout = ["--column", "TAI", "--from", "TAI", "--to", "GPS", "--output-format", "seconds", "--digits", "3"]
    made = tmp_path / "made.json"
    assert main(["convert", str(table), str(out), *layout, "--provenance-file", str(made), "--quiet"]) == 0
    assert '"rows": 2' in made.read_text()
    last = out.read_text().splitlines()[-1].replace('"', "").split(",")
    # In text every column of dates is written alike: seconds since 2000-01-01T12:00:00 of its scale.
    assert last[2:] == [f"{want.whole[1]}.000", f"{want.whole[1] - 19}.000"]


def test_the_status_of_each_row_goes_along_with_its_sigma(tmp_path: Path) -> None:
    t = tscale.Instants.from_iso(["2020-03-01", "2026-12-24", "2040-01-01"], "UTC")
    source, out = saved(tmp_path / "in.parquet", t), tmp_path / "out.parquet"
    with pytest.warns(tscale.ExtrapolationWarning):
        convert_table(chain(), source, out, sigma=True)
    assert pq.read_table(out)["TDB@BARYCENTER_status"].to_pylist() == ["measured", "predicted", "held+expired"]
