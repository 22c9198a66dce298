"""Pictures of residuals (needs matplotlib): of every conversion against a library, and of a table with its causes."""

from __future__ import annotations

import os
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from ..exact import BoolArray, FloatArray
from ..plots.common import (
    BLUE,
    GREY,
    VERMILLION,
    check_picture,
    date_axis,
    dates_of,
    figure_of,
    parts_of,
    plain,
    quantity,
    save_figure,
    tidy,
    unit_of,
)
from .comparison import Comparison
from .explanation import Explanation
from .library_report import LibraryReport
from .residuals import Residuals

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["check_picture", "libraries_figure", "residuals_figure", "save_picture"]

_COLUMNS: Final = 4
_MARK: Final[dict[str, Any]] = {"linestyle": "none", "marker": "o", "markersize": 2.2, "markeredgewidth": 0.0}
_PREFIXES: Final = ((1e-6, "\u00b5"), (1e-3, "m"), (1.0, ""), (1e3, "k"))
_CROSS: Final[dict[str, Any]] = {"linestyle": "none", "marker": "x", "markersize": 4.0}
_MOST_POINTS: Final = 20_000


def libraries_figure(report: LibraryReport) -> Figure:
    """A small panel for every conversion: the differences against date, and the tolerance as a band."""
    shown = [c for c in report.comparisons if c.ran]
    columns = min(_COLUMNS, max(len(shown), 1))
    rows = max(1, -(-len(shown) // columns))
    figure = figure_of(3.4 * columns, 0.6 + 1.75 * rows)
    panels: Any = figure.subplots(rows, columns, squeeze=False)
    for axes, comparison in zip(panels.flat, shown, strict=False):
        _panel(axes, comparison)
    for axes in panels.flat[len(shown) :]:
        axes.set_axis_off()
    figure.suptitle(
        f"ours minus theirs, {report.start[:10]} to {report.stop[:10]}; shaded: tolerance",
        x=0.01,
        ha="left",
        fontsize="medium",
        fontweight="bold",
    )
    return figure


def _panel(axes: Axes, comparison: Comparison) -> None:
    kind = comparison.conversion
    assert comparison.t is not None
    assert comparison.residual is not None
    year = 2000.0 + comparison.t.whole / 31557600.0
    if kind.unit == "s":
        size, unit = unit_of(kind.tolerance)
    else:
        size, prefix = next((s, p) for s, p in _PREFIXES if kind.tolerance < 1e3 * s)
        unit = prefix + kind.unit
    good = comparison.passed
    axes.axhspan(-kind.tolerance / size, kind.tolerance / size, color="0.93", zorder=0)
    axes.plot(year, comparison.residual / size, color=BLUE if good else VERMILLION, zorder=2, **_MARK)
    tidy(axes)
    most = max(kind.tolerance, comparison.largest) / size
    axes.set_ylim(-1.15 * most, 1.15 * most)
    axes.set_ylabel(unit, fontsize="x-small")
    axes.tick_params(labelsize="x-small")
    words = f"{kind.name} \u2013 {kind.library}{'' if good else ' (fails)'}"
    axes.set_title(plain(words, 46), fontsize="x-small", loc="left", color="black" if good else VERMILLION)


def residuals_figure(residuals: Residuals, explanation: Explanation | None = None, title: str = "") -> Figure:
    """Residuals of a table against date, and below what is left once the causes are taken out."""
    dates = dates_of(residuals.t)
    order = np.argsort(dates, kind="stable")
    order = order[:: max(1, -(-len(order) // _MOST_POINTS))]
    dates = dates[order]
    figures = f"{residuals.n} dates: largest {quantity(residuals.max_s)}, rms {quantity(residuals.rms_s)}"
    lines = [residuals.path, figures]
    shown = [(residuals.residual_s[order], "theirs minus ours")]
    if explanation is not None:
        lines += [
            f"{c.label}: {c.amplitude:+.5g}{f' {c.unit}' if c.unit else ''} \u00b1 {c.sigma:.2g}"
            for c in explanation.found
        ]
        lines.append(f"left: rms {quantity(explanation.unexplained_rms_s)}; {explanation.told}")
        if explanation.found:
            shown.append((explanation.unexplained_s[order], "what is left"))
    figure, parts = parts_of(title or "residuals", lines, [2.9] * len(shown))
    aside = np.isin(order, [] if explanation is None else explanation.set_aside)
    for part, (value, words) in zip(parts, shown, strict=True):
        axes = part.subplots()
        _points(axes, dates, value, words, aside)
        date_axis(axes, dates, f"date ({residuals.t.scale})")
    return figure


def _scale(value: FloatArray) -> tuple[float, str]:
    return unit_of(float(np.max(np.abs(value), initial=0.0)) or 1.0)


def _points(axes: Axes, dates: Any, value: FloatArray, words: str, aside: BoolArray) -> None:
    """Points about zero; rows that were set aside do not stretch the axis, and are said where they lie beyond it."""
    kept = value[~aside]
    size, unit = _scale(kept)
    axes.axhline(0.0, color=GREY, linewidth=0.8, zorder=1)
    axes.plot(dates[~aside], kept / size, color=BLUE, zorder=2, **_MARK)
    axes.plot(dates[aside], value[aside] / size, color=VERMILLION, zorder=3, **_CROSS)
    low, high = float(np.min(kept)) / size, float(np.max(kept)) / size
    margin = 0.06 * (high - low) or 0.1 * abs(high) or 1.0
    axes.set_ylim(min(low - margin, 0.0 - margin * (low > -margin)), max(high + margin, 0.0 + margin * (high < margin)))
    beyond = int(np.count_nonzero(aside & (np.abs(value / size) > max(abs(low), abs(high)) + margin)))
    if beyond:
        axes.set_title(f"{beyond} rows set aside lie beyond", fontsize="x-small", loc="right", color=VERMILLION)
    tidy(axes)
    axes.set_ylabel(f"{words} ({unit})", fontsize="small")


def save_picture(figure: Figure, path: str | os.PathLike[str]) -> None:
    """Write a figure (.png, .pdf, .svg) that takes its name only when it is whole."""
    save_figure(figure, path)
