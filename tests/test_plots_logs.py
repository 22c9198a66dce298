"""Pictures of clock logs: comparisons, residuals, gaps, resets, flags, predictions."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest

import tscale
from tests.plots_support import EXAMPLES, HEAD, factor, texts
from tscale import exact, plots
from tscale.plots.logs import fitted_line
from tscale.tables.clock_noise import ClockNoise


def labels(axes: Any) -> set[str]:
    return {text.get_text() for text in axes.get_legend().get_texts()}


def damaged(path: Path) -> Path:
    """A day of hourly comparisons on a line of 1e-13, with an outlier, a row not used, a failed one, and a reset."""
    rows = []
    for hour in range(24):
        offset = 4e-6 + 3.6e-10 * hour + (5e-9 if hour >= 18 else 0.0) + (40e-9 if hour == 6 else 0.0)
        text = "" if hour == 12 else f"{offset:.14f}"
        use, reset = "no" if hour == 3 else "", "5e-9" if hour == 18 else ""
        rows.append(f"2025-03-03T{hour:02d}:00:00,{text},1e-11,UTC,CLOCK(m),{use},{reset}\n")
    path.write_text(HEAD + "".join(rows))
    return path


def test_offsets_and_residuals() -> None:
    log = tscale.ClockLog.load(EXAMPLES / "maser.csv")
    figure = plots.clock_log_figure(log)
    top, bottom = figure.axes
    held = log.comparisons
    offset = exact.seconds(held.offset)
    seconds = held.epoch.minus(held.epoch[0])
    slope, level = np.polyfit(seconds / 86400.0, offset - offset[0], 1)
    points = [axes.containers[0].lines[0].get_ydata() for axes in (top, bottom)]
    # A fit of 32 points by another routine: equal weights, roundings only.
    np.testing.assert_allclose(points[0] * factor(top), offset - offset[0], rtol=0, atol=1e-18)
    np.testing.assert_allclose(
        points[1] * factor(bottom), offset - offset[0] - level - slope * seconds / 86400.0, rtol=0, atol=1e-17
    )
    assert fitted_line(log).rate == pytest.approx(slope / 86400.0, rel=1e-9, abs=0)
    assert {"comparison, \u00b1u", "gap"} <= labels(top)
    (gap,) = [patch for patch in top.patches if patch.get_label() == "gap"]
    from matplotlib.dates import num2date

    where = [num2date(x).strftime("%m-%dT%H") for x in (gap.get_x(), gap.get_x() + gap.get_width())]
    assert where == ["03-07T18", "03-08T06"]
    assert "maser.csv: 32 comparisons" in texts(figure)
    assert bottom.get_xlabel() == "UTC(KRL), from 2025-03-03"


def test_what_an_inspection_flags(tmp_path: Path) -> None:
    path = damaged(tmp_path / "m.csv")
    log, report = tscale.ClockLog.load(path), tscale.ClockLog.inspect(path)
    assert report.counts()["outlier"] == 1
    figure = plots.clock_log_figure(log, report)
    top, bottom = figure.axes
    assert {"outlier", "not used", "reset", "gap"} <= labels(top)
    (flag,) = [line for line in bottom.get_lines() if line.get_label() == "outlier"]
    assert np.asarray(flag.get_xdata()).astype("datetime64[h]").tolist() == [np.datetime64("2025-03-03T06").item()]
    assert "outlier" in texts(figure)
    # The line goes on through the known reset: beside the outlier nothing is left but its pull on the fit.
    residual = bottom.containers[0].lines[0].get_ydata() * factor(bottom)
    assert np.sort(np.abs(residual))[-2] < 8e-9
    assert np.sort(np.abs(residual))[-1] > 30e-9


def test_a_prediction_has_its_band() -> None:
    log = tscale.ClockLog.load(EXAMPLES / "maser.csv")
    ahead = log.predicted(ClockNoise(white_frequency=2e-13), fit_s=172800.0, until="2025-03-15T00:00:00")
    top, bottom = plots.clock_log_figure(ahead).axes
    assert {"predicted, \u00b1u", "predicted, \u00b12u"} <= labels(top)
    end = ahead.span[1:].pair
    sigma = float(ahead.uncertainty_s(end)[0])
    bands = [c for c in bottom.collections if str(c.get_label()).startswith("predicted")]
    heights = sorted(float(np.ptp(band.get_paths()[0].vertices[:, 1])) for band in bands)
    # The band is widest at its end, and leans with the prediction by far less.
    low = [float(band.get_paths()[0].vertices[:, 1].min()) for band in bands]
    assert heights[1] * factor(bottom) >= 4.0 * sigma
    assert (max(low) - min(low)) * factor(bottom) == pytest.approx(sigma, rel=0.05, abs=0)


@pytest.mark.parametrize("kind", ["linear", "cubic", "step"])
def test_every_interpolation_meets_the_comparisons(kind: Any) -> None:
    log = tscale.ClockLog.load(EXAMPLES / "utc_krl.csv", interpolation=kind)
    top = plots.clock_log_figure(log).axes[0]
    line = max(top.get_lines(), key=lambda line: len(line.get_xdata()))
    x = np.asarray(line.get_xdata()).astype("datetime64[us]")
    points = top.containers[0].lines[0]
    for date, value in zip(points.get_xdata()[:-1], points.get_ydata()[:-1], strict=True):
        found = np.asarray(line.get_ydata())[x == date.astype("datetime64[us]")]
        assert np.any(np.abs(found - value) < 1e-9 * np.abs(value))


def test_gaps_everywhere() -> None:
    log = tscale.ClockLog.load(EXAMPLES / "maser.csv", max_gap_s=1.0)
    assert "gap" in labels(plots.clock_log_figure(log).axes[0])


def test_no_uncertainties() -> None:
    t = tscale.Instants.from_iso(["2025-01-01", "2025-01-02", "2025-01-04"], scale="UTC")
    log = tscale.ClockLog.from_rows("m", t, [1e-6, 2e-6, 4e-6])
    assert fitted_line(log).rate == pytest.approx(1e-6 / 86400.0, rel=1e-9, abs=0)
    # A clock that keeps to the straight line has no residuals to scale by.
    assert plots.svg_text(plots.clock_log_figure(log)).startswith("<?xml")
