"""Pictures of clock logs: comparisons, residuals, gaps, resets, what an inspection flagged, and predictions."""

from __future__ import annotations

import os
from typing import TYPE_CHECKING, Any, Final, NamedTuple

import numpy as np
import numpy.typing as npt

from .. import exact
from ..errors import TextError, gathered_extrapolations
from ..exact import FloatArray, Pair
from ..instants import Instants
from ..tables.clock_log import ClockLog
from ..tables.clock_report import ClockReport
from .common import (
    BLUE,
    GREEN,
    GREY,
    ORANGE,
    PURPLE,
    VERMILLION,
    check_picture,
    date_axis,
    dates_of,
    parts_of,
    quantity,
    save_figure,
    side_legend,
    tidy,
    unit_of,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["Line", "clock_log_figure", "fitted_line", "save_clock_log_picture"]

_FLAGS: Final = {
    "outlier": ("o", VERMILLION),
    "unit": ("D", VERMILLION),
    "phase jump": ("^", PURPLE),
    "rate step": ("s", ORANGE),
}
_INSIDE: Final = 1.0 - 1e-9  # of an interval: just before a comparison that a reset or a step may stand at
_FINE: Final = {"linear": 2, "step": 2, "cubic": 17}
_AHEAD: Final = 121


class Line(NamedTuple):
    """A straight line through the comparisons, by least squares with their uncertainties as weights."""

    start: Instants
    offset_s: float
    """At the start, less the first offset of the log."""
    rate: float
    """Seconds per second."""


class _Curve(NamedTuple):
    """Values at dates, less the first comparison's and with known resets taken out of `level_s`."""

    dates: npt.NDArray[Any]
    value_s: FloatArray
    residual_s: FloatArray
    sigma_s: FloatArray


def fitted_line(log: ClockLog) -> Line:
    """The straight line that the residuals are taken from, with known resets taken out."""
    held = log.comparisons
    x = _since(held.epoch, held.epoch[0])
    y = exact.seconds(exact.subtract(held.offset, (held.offset[0][0], held.offset[1][0]))) - np.cumsum(held.reset_s)
    sigma = held.uncertainty_s
    weight = 1.0 / np.where(sigma > 0.0, sigma, np.min(sigma[sigma > 0.0], initial=np.inf)) ** 2
    weight = np.where(np.isfinite(weight) & (weight > 0.0), weight, 1.0)
    middle, level = np.average(x, weights=weight), np.average(y, weights=weight)
    spread = float(np.average((x - middle) ** 2, weights=weight))
    rate = float(np.average((x - middle) * (y - level), weights=weight) / spread) if spread > 0.0 else 0.0
    return Line(held.epoch[0], float(level - rate * middle), rate)


def clock_log_figure(log: ClockLog, report: ClockReport | None = None, title: str = "") -> Figure:
    """Draw a log: offsets above, residuals from the straight line through them below.

    Gaps are shaded; hatched are those that the log runs on through and an inspection found. Resets, rate steps and rows
    that are not used are marked, and what an inspection flagged. Past the comparisons the prediction stands with bands
    of one and two standard uncertainties.

    Parameters
    ----------
    log : ClockLog
    report : ClockReport, optional
        `ClockLog.inspect` of the same file: outliers, jumps, changes of rate, wrong units.
    title : str

    Raises
    ------
    MissingPiece
        matplotlib is not installed.
    """
    check_picture("figure.png")
    line = fitted_line(log)
    held = log.comparisons
    own = _curve(log, held.epoch.pair, line)
    first = exact.seconds((held.offset[0][:1], held.offset[1][:1]))[0]
    words = f"straight line: {line.rate:+.3e} s/s".replace("-", "\u2212")
    lines = [f"{log.name}: {len(log)} comparisons, {log.interpolation} between them; {words}"]
    if report is not None:
        found = ", ".join(f"{count} \u00d7 {kind}" for kind, count in report.counts().items())
        lines.append(f"inspection: {found or 'nothing odd'}")
    lines += [remark.text for remark in log.remarks]
    figure, (part,) = parts_of(title or f"{log.scale} minus {log.reference}", lines, [5.6])
    top, bottom = part.subplots(2, 1, sharex=True)
    large = float(np.max(np.abs(own.value_s)))
    # A large offset is taken off, so that the course is seen.
    off = first if abs(first) > 2.0 * large else 0.0
    shift = first - off
    for axes, pick, added in ((top, 1, shift), (bottom, 2, 0.0)):
        drawn = [(own, 1.0), *((_curve(log, at, line), 2.0) for at in _ahead(log))]
        size, unit = unit_of(max(float(np.max(np.abs(c[pick] + added) + k * c.sigma_s)) for c, k in drawn) or 1e-12)
        _draw(axes, log, line, report, pick, added, size)
        what = "offset" if pick == 1 and not off else "change of offset" if pick == 1 else "residual"
        axes.set_ylabel(f"{what} ({unit})", fontsize="small")
        tidy(axes)
    if off:
        top.annotate(
            f"from {quantity(off, 9, sign=True)}", (0.01, 0.97), xycoords="axes fraction", va="top", fontsize="x-small"
        )
    span = dates_of(log.span)
    date_axis(bottom, span, log.reference)
    side_legend(top)
    part.align_ylabels([top, bottom])
    return figure


def save_clock_log_picture(
    log: ClockLog, path: str | os.PathLike[str], report: ClockReport | None = None, title: str = ""
) -> None:
    """Write `clock_log_figure` to a file (.png, .pdf or .svg)."""
    check_picture(path)
    save_figure(clock_log_figure(log, report, title), path)


def _draw(
    axes: Axes, log: ClockLog, line: Line, report: ClockReport | None, pick: int, added: float, size: float
) -> None:
    held = log.comparisons
    own = _curve(log, held.epoch.pair, line)
    # Between the comparisons, one stretch after the other: a reset is a break.
    joined = np.flatnonzero(~held.gap)
    if len(joined):
        at, stretches = _between(log, joined)
        course = _curve(log, at, line)
        y = np.insert((course[pick] + added) / size, stretches, np.nan)
        axes.plot(np.insert(course.dates, stretches, course.dates[stretches]), y, color=BLUE, linewidth=1.1, zorder=2)
    axes.errorbar(
        own.dates,
        (own[pick] + added) / size,
        yerr=own.sigma_s / size,
        fmt="o",
        markersize=3.0,
        color=BLUE,
        elinewidth=0.8,
        zorder=3,
        label="comparison, \u00b1u",
    )
    for number, gap in enumerate(np.flatnonzero(held.gap[:-1])):
        label = "gap" if number == 0 else None
        axes.axvspan(own.dates[gap], own.dates[gap + 1], color="0.88", linewidth=0.0, zorder=0, label=label)
    _draw_marks(axes, log)
    if report is not None:
        _draw_gaps(axes, log, report, own)
        _draw_flags(axes, log, report, own, (own[pick] + added) / size)
    for number, ahead in enumerate(_ahead(log)):
        course = _curve(log, ahead, line)
        y, band = (course[pick] + added) / size, course.sigma_s / size
        axes.plot(course.dates, y, color=GREEN, linestyle="--", linewidth=1.2, zorder=2)
        for k, alpha in ((2, 0.15), (1, 0.3)):
            words = f"predicted, \u00b1{k if k > 1 else ''}u" if number == 0 else None
            look: dict[str, Any] = {"color": GREEN, "alpha": alpha, "linewidth": 0.0, "label": words}
            axes.fill_between(course.dates, y - k * band, y + k * band, **look)
    axes.margins(y=0.1)


def _curve(log: ClockLog, at: Pair, line: Line) -> _Curve:
    """The log at counts of its reference."""
    held = log.comparisons
    with gathered_extrapolations(repeats=True):
        offset, sigma = log.offset(at), log.uncertainty_s(at)
    value = exact.seconds(exact.subtract(offset, (held.offset[0][0], held.offset[1][0])))
    t = Instants._of(at, log.reference)
    ahead = _since(t, line.start)
    resets = np.searchsorted(_since(held.epoch, line.start), ahead, side="right")
    level = np.concatenate([[0.0], np.cumsum(held.reset_s)])[resets]
    return _Curve(dates_of(t), value, value - level - line.offset_s - line.rate * ahead, sigma)


def _between(log: ClockLog, joined: npt.NDArray[Any]) -> tuple[Pair, npt.NDArray[Any]]:
    """Counts within the intervals that are joined, and where each interval but the first starts among them."""
    epoch = log.comparisons.epoch
    parts = np.linspace(0.0, 1.0, _FINE[log.interpolation])
    parts[-1] = _INSIDE
    length = _since(epoch[joined + 1], epoch[0]) - _since(epoch[joined], epoch[0])
    at = exact.add(
        (np.repeat(epoch.whole[joined], len(parts)), np.repeat(epoch.fraction[joined], len(parts))),
        exact.from_seconds((length[:, None] * parts).ravel()),
    )
    return at, np.arange(1, len(joined)) * len(parts)


def _ahead(log: ClockLog) -> list[Pair]:
    """Counts of predictions, after the last comparison and before the first."""
    epoch, span = log.comparisons.epoch, log.span
    found = []
    for near, far in ((epoch[-1], span[1]), (epoch[0], span[0])):
        length = float(far.minus(near))
        if length:
            start = (np.full(_AHEAD, near.whole), np.full(_AHEAD, near.fraction))
            steps = np.linspace(0.0, length, _AHEAD)
            at = exact.add(start, exact.from_seconds(steps))
            at[0][-1], at[1][-1] = far.whole, far.fraction
            found.append(at)
    return found


def _draw_marks(axes: Axes, log: ClockLog) -> None:
    """What the log says of its rows: along the lower edge, and lines where the clock was set or its rate changed."""
    said: set[str] = set()
    for mark in log.marks:
        at = _epoch(mark.epoch, log.reference)
        if at is None:
            continue
        label = None if mark.kind in said else mark.kind
        said.add(mark.kind)
        if mark.kind == "not used":
            axes.plot(
                at, [0.02], "x", color=GREY, transform=axes.get_xaxis_transform(), markersize=5.0, label=label, zorder=4
            )
        else:
            style = "-." if mark.kind == "reset" else ":"
            axes.axvline(at[0], color="0.25", linestyle=style, linewidth=1.1, label=label, zorder=1)


def _draw_gaps(axes: Axes, log: ClockLog, report: ClockReport, own: _Curve) -> None:
    """Long intervals that an inspection found and the log does not take for gaps: interpolated, perhaps wrongly."""
    label: str | None = "long interval, interpolated"
    joined = ~log.comparisons.gap
    for finding in report.of("gap"):
        at = _epoch(finding.epoch, log.reference)
        place = np.flatnonzero(own.dates == at[0]) if at is not None else np.zeros(0, dtype=np.intp)
        if len(place) and place[0] > 0 and joined[place[0] - 1]:
            look: dict[str, Any] = {"facecolor": "none", "edgecolor": "0.7", "hatch": "///", "linewidth": 0.0}
            axes.axvspan(own.dates[place[0] - 1], own.dates[place[0]], zorder=0, label=label, **look)
            label = None


def _draw_flags(axes: Axes, log: ClockLog, report: ClockReport, own: _Curve, value: FloatArray) -> None:
    for kind, (shape, colour) in _FLAGS.items():
        at = [found for finding in report.of(kind) if (found := _epoch(finding.epoch, log.reference)) is not None]
        places = [int(np.flatnonzero(own.dates == date[0])[0]) for date in at if date[0] in own.dates]
        if places:
            axes.plot(
                own.dates[places],
                value[places],
                shape,
                markersize=9.0,
                markerfacecolor="none",
                markeredgewidth=1.6,
                color=colour,
                label=kind,
                zorder=5,
            )


def _epoch(text: str | None, scale: str) -> npt.NDArray[Any] | None:
    """The date of a row, or None where the row's text is none."""
    try:
        return dates_of(Instants.from_iso([text or ""], scale))
    except (TextError, ValueError):
        return None


def _since(t: Instants, start: Instants) -> FloatArray:
    return t.minus(start.at(t.place))
