"""What a log's source says of it reaches notes, provenance, pictures, pages and commands."""

from __future__ import annotations

import hashlib
import json
import re
from pathlib import Path

import numpy as np
import pytest

import tscale
from tests.plots_support import EXAMPLES, OPTIONS, texts
from tscale import plots
from tscale.budget import Assumptions
from tscale.cli.main import main
from tscale.errors import InvalidInput, MissingPiece
from tscale.report import report_html
from tscale.serial import from_json, to_json
from tscale.tables import TTBIPM
from tscale.tables.circular_t import read_circular
from tscale.tables.clock_noise import ClockNoise

CIRCULAR = Path(__file__).parent / "data" / "circular" / "circular_t_229.txt"
STEP = "Circular T 229, note 2: KRL : an invented step of UTC(KRL) of -1.0 ns on MJD 54107.3."
READINGS = str(EXAMPLES / "readings.csv")


# ---- notes of a circular ---------------------------------------------------------------------------


def test_a_step_noted_in_a_circular_is_told_everywhere() -> None:
    issues = [CIRCULAR, CIRCULAR.with_name("circular_t_230.txt")]
    log = read_circular(issues, "KRL")
    chain = tscale.chain("UTC(KRL)", "TAI", clocks=[log])
    t = tscale.Instants.from_iso(["2007-01-01T00:00:00", "2007-02-20T00:00:00"], scale="UTC(KRL)")
    assert STEP in chain.notes(t)
    assert STEP not in chain.notes(t[1:])  # the issue of that month has no note
    made = chain.provenance(t)
    assert made.clocks[0].remarks == (STEP,)
    assert f"# remark: UTC(KRL): {STEP}" in made.header()
    assert STEP in report_html(chain, t, pictures=False)
    assert STEP.replace("-", "\u2212") in texts(plots.clock_log_figure(log)).replace("-", "\u2212")
    assert from_json(to_json(log)).remarks == log.remarks
    assert made.clocks[0].files == tuple((path.name, hashlib.sha256(path.read_bytes()).hexdigest()) for path in issues)


def test_a_circular_is_not_inspected_as_csv(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["plot", "log", f"{CIRCULAR}:CH", "--output", str(tmp_path / "c.png")]) == 0
    assert capsys.readouterr().err == ""
    log = read_circular(CIRCULAR, "CH")
    t = tscale.Instants.from_iso("2007-01-05", scale="UTC(CH)")
    page = report_html(tscale.chain("UTC(CH)", "UTC", clocks=[log]), t, pictures=False)
    assert "Clock comparisons" in page
    assert "columns: the header" not in page


def test_acronyms_are_in_capitals() -> None:
    with pytest.raises(MissingPiece, match="did you mean 'CH'"):
        read_circular(CIRCULAR, "ch")


# ---- provenance of a prediction --------------------------------------------------------------------


def test_a_predicted_log_keeps_its_file_and_says_where_its_comparisons_end() -> None:
    path = EXAMPLES / "maser.csv"
    sha256 = hashlib.sha256(path.read_bytes()).hexdigest()
    log = tscale.ClockLog.load(path)
    longer = log.predicted(ClockNoise(white_frequency=2e-13), fit_s=172800.0, until="2025-03-15T00:00:00")
    chain = tscale.chain("CLOCK(maser)", "UTC(KRL)", clocks=[longer])
    (plain,) = tscale.chain("CLOCK(maser)", "UTC(KRL)", clocks=[log]).provenance().clocks
    made = chain.provenance()
    (record,) = made.clocks
    assert (record.start, record.end, record.comparisons) == (plain.start, plain.end, plain.comparisons)
    assert record.end == "2025-03-11T00:00:00"
    assert record.files == plain.files == (("maser.csv", sha256),)
    assert record.sha256 != sha256 == plain.sha256
    assert plain.predicted is None
    assert record.predicted == {
        "fit_s": 172800.0,
        "drift": False,
        "start": None,
        "until": "2025-03-15T00:00:00",
        "noise": "white_frequency 2e-13",
    }
    head = "\n".join(made.header())
    assert f"file: CLOCK(maser): maser.csv; SHA-256 {sha256}" in head
    assert "predicted: CLOCK(maser): fit_s 172800.0, drift False, until 2025-03-15T00:00:00" in head
    assert json.loads(made.to_json())["clocks"][0]["predicted"]["fit_s"] == 172800.0
    again = from_json(to_json(longer))
    assert again.prediction is not None
    assert tscale.chain("CLOCK(maser)", "UTC(KRL)", clocks=[again]).provenance().clocks == made.clocks


# ---- what a budget leaves out ----------------------------------------------------------------------


def test_realisations_are_told_as_left_out() -> None:
    """TT by definition differs from TT(BIPM) by 27.7 us; a satellite system keeps its time to some ns."""

    def left_out(end: str, **options: object) -> dict[str, str]:
        chain = tscale.chain("UTC", end, **options)  # type: ignore[arg-type]
        return {item.source: item.reason for item in chain.omissions(Assumptions())}

    assert "27.7 us" in left_out("TT")["TT as TAI realises it"]
    assert "TT as TAI realises it" in left_out("TDB@GEOCENTER")
    for system in ("GPS", "GST", "BDT", "GLONASS"):
        assert "Circular T" in left_out(system)[f"{system} as its system keeps it"]
    assert left_out("TAI") == {}
    rows = ([54289, 54299], [26.9755e-6, 26.9783e-6])
    for sigma, said in ((None, True), (1e-9, False)):
        table = TTBIPM.from_rows("BIPM08", *rows, uncertainty_s=sigma)
        reference = tscale.ReferenceData(tt_bipm=[table])
        assert ("TT(BIPM08) itself" in left_out("TT(BIPM08)", reference=reference)) is said


def test_the_rounding_of_a_realisation_is_that_of_its_decimals(tmp_path: Path) -> None:
    """TTBIPM files have three decimals of a us up to MJD 52729, four after."""
    path = tmp_path / "TTBIPM.08"
    path.write_text(
        "52719. -700.100   27.400\n52729. -700.200   27.401\n52739. -700.3000   27.4020\n52749. -700.4 27.4\n"
    )
    path.write_text(path.read_text().replace("-700.4 27.4", "-700.4000   27.4030"))
    table = TTBIPM.load(path)
    t = tscale.Instants.from_mjd([52719, 52729, 52739, 52749, 52744], 0.0, scale="UTC")
    chain = tscale.chain("UTC", "TT(BIPM08)", reference=tscale.ReferenceData(tt_bipm=[table]))
    want = np.array([1e-9, 1e-9, 1e-10, 1e-10, 1e-10 / np.sqrt(2)]) / np.sqrt(12)
    np.testing.assert_allclose(chain.sigma_s(t), want, rtol=1e-9)
    np.testing.assert_allclose(table.uncertainty_s(tscale.chain("UTC", "TAI")(t).pair)[3:], want[3], rtol=1e-12)


# ---- pictures, pages and commands ------------------------------------------------------------------


def test_gaps_that_only_an_inspection_found_are_hatched(tmp_path: Path) -> None:
    path = tmp_path / "m.csv"
    hours = [*range(12), *range(20, 24)]
    rows = "".join(f"2025-03-03T{hour:02d}:00:00,{1e-9 * hour:.12f},1e-11\n" for hour in hours)
    path.write_text("epoch,offset_s,uncertainty_s\n" + rows)
    log, report = tscale.ClockLog.load(path), tscale.ClockLog.inspect(path)
    for axes in plots.clock_log_figure(log, report).axes:
        (patch,) = [patch for patch in axes.patches if patch.get_hatch()]
        assert patch.get_label() == "long interval, interpolated"
        assert patch.get_width() == pytest.approx(9 / 24, rel=1e-9, abs=0)
    closed = plots.clock_log_figure(tscale.ClockLog.load(path, max_gap_s=7200.0), report)
    assert not any(patch.get_hatch() for axes in closed.axes for patch in axes.patches)  # shaded as a gap already


def test_a_report_of_the_command_speaks_of_options(tmp_path: Path) -> None:
    out = tmp_path / "r.html"
    assert main(["report", READINGS, *OPTIONS, "--to", "TDB@BARYCENTER", "--no-pictures", "--output", str(out)]) == 0
    text = out.read_text()
    part = text[text.index("Not included") : text.index("Clock comparisons")]
    for option in ("--site-sigma-m", "--source-position-sigma-mas", "--budget-ephemeris", "--project"):
        assert option in part
    assert not re.search(r"\b(site_sigma_m|ephemeris_sigma_m|reading_sigma_s|with_noise)\b", part)


def test_the_budget_command(capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    given = ["budget", *OPTIONS, "--to", "UTC"]
    few = tmp_path / "few.csv"
    few.write_text("".join(Path(READINGS).read_text().splitlines(keepends=True)[:12]))
    assert main([*given, str(few), "--covariance", "--draws", "200"]) == 0
    out = capsys.readouterr().out
    assert "standard uncertainty of their mean" in out
    assert "200 draws" in out
    assert main([*given, str(few), "--covariance", "--draws", "200", "--json"]) == 0
    found = json.loads(capsys.readouterr().out)
    covariance = np.array(found["covariance_s2"])
    n = len(covariance)
    assert n > 5
    np.testing.assert_allclose(np.sqrt(np.diag(covariance)), found["combined_s"], rtol=1e-9)
    assert found["mean_sigma_s"] == pytest.approx(float(np.sqrt(covariance.sum())) / n, rel=1e-6, abs=0)
    # 200 draws tell a standard deviation to 5 %.
    np.testing.assert_allclose(found["monte_carlo"]["sigma_s"], found["combined_s"], rtol=0.2)
    assert main([*given, "--date", "2025-03-04", "--covariance"]) == 2
    assert "two or more as INPUT" in capsys.readouterr().err
    kernel = str(tscale.ReferenceData.default().ephemeris.path)
    there = ["budget", "--date", "2025-03-04", "--from", "UTC", *OPTIONS[:0], "--site", str(EXAMPLES / "site.toml"),
             "--source", str(EXAMPLES / "source.toml"), "--to", "TDB@BARYCENTER"]  # fmt: skip
    assert main([*there, "--budget-ephemeris", kernel, "--json"]) == 0
    lines = {line["source"]: line for line in json.loads(capsys.readouterr().out)["lines"]}
    assert lines["ephemeris"]["contribution_s"] == [0.0]  # the same kernel: no difference


def test_damaged_logs_name_the_inspection(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    log = tmp_path / "maser.csv"
    log.write_text("epoch,offset_s,uncertainty_s\n2025-03-01,1e-7,1e-9\n2025-13-02,1e-7,1e-9\n2025-03-0x,1e-7,1e-9\n")
    for words in (["plot", "log", str(log), "--output", str(tmp_path / "l.png")],
                  ["budget", "--date", "2025-03-01", "--clock", str(log), "--to", "UTC"]):  # fmt: skip
        assert main(words) == 2
        assert "`tscale inspect LOG` lists all" in capsys.readouterr().err
    bad = tscale.ClockLog.inspect(log).of("bad date")
    assert bad[0].text == "there is no such day in the calendar"
    assert bad[1].text.startswith("write YYYY-MM-DD")


@pytest.mark.parametrize("name", ["TAI", "UTC", "CLOCK(TT)", "TDB"])
def test_a_clock_is_no_scale(name: str) -> None:
    epoch = tscale.Instants.from_iso(["2025-03-01", "2025-03-02"], scale="UTC")
    with pytest.raises(InvalidInput, match="is a scale, which no clock is"):
        tscale.ClockLog.from_rows(name, epoch, 0.0)
