"""Pictures of two clocks compared: what one gains on the other, and the terms that make it."""

from __future__ import annotations

import os
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any, Final

import numpy as np
import numpy.typing as npt

from ..clocks import ClockComparison, RateLedger
from ..errors import InvalidInput
from ..exact import FloatArray
from ..instants import Instants
from .common import (
    BLACK,
    BLUE,
    VERMILLION,
    check_picture,
    date_axis,
    dates_of,
    draw_line,
    parts_of,
    plain,
    quantity,
    save_figure,
    side_legend,
    styles,
    tidy,
    unit_of,
)

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = ["clock_figure", "rate_figure", "save_clock_picture", "save_rate_picture"]

_DECADES: Final = 9.0
_DAY_S: Final = 86400.0
_STRAIGHT: Final = 1e-6
"""Of what is accumulated: less than this beside the mean rate is not drawn apart."""


def clock_figure(comparison: ClockComparison, t: Instants, title: str = "") -> Figure:
    """Draw what clock a gains on clock b: accumulated time, what is left of it beside the mean rate, rates by term.

    Parameters
    ----------
    comparison : ClockComparison
    t : Instants
        Dates between its start and stop on a coordinate time, two or more.
    title : str
        Default: the names of the clocks.

    Raises
    ------
    InvalidInput
        Fewer than two dates.
    MissingPiece
        matplotlib is not installed.
    """
    if not isinstance(t, Instants) or t.size < 2:
        raise InvalidInput("a picture of two clocks needs two dates or more")
    check_picture("figure.png")
    t = t.ravel()
    dates = dates_of(t)
    order = np.argsort(dates, kind="stable")
    dates, gained = dates[order], comparison.series_s(t)[order]
    elapsed = t.minus(t[order[0]])[order]
    line = gained[0] + (gained[-1] - gained[0]) * elapsed / elapsed[-1] if elapsed[-1] else gained
    beside = gained - line
    bent = bool(np.max(np.abs(beside)) > _STRAIGHT * np.ptp(gained))
    rates = {name: rate for name, rate in comparison.rates.items() if rate}
    lines = [
        f"{quantity(comparison.accumulated_s, 6, sign=True)} in {comparison.duration_s / 86400.0:.6g} days of "
        f"{comparison.against}; mean rate {_number(comparison.rate)}, "
        f"{quantity(comparison.rate * _DAY_S, 6, sign=True)} a day"
    ]
    series = [("accumulated", gained, BLUE), *([("less a straight line", beside, VERMILLION)] if bent else [])]
    heights = [2.2 * len(series) + 0.3, 0.9 + 0.3 * (len(rates) + 1)]
    figure, (above, below) = parts_of(title or f"{comparison.a} minus {comparison.b}", lines, heights)
    rows = above.subplots(len(series), 1, sharex=True, squeeze=False)[:, 0]
    for axes, (words, value, colour) in zip(rows, series, strict=True):
        size, unit = unit_of(float(np.max(np.abs(value))))
        draw_line(axes, dates, value / size, color=colour, linewidth=1.6)
        axes.set_ylabel(f"{words} ({unit})", fontsize="small")
        axes.margins(y=0.08)
        tidy(axes)
    date_axis(rows[-1], dates, t.scale)
    above.align_ylabels(rows)
    _rate_bars(below.subplots(), {**rates, "all": comparison.rate}, plain(comparison.a, 40))
    return figure


def save_clock_picture(comparison: ClockComparison, t: Instants, path: str | os.PathLike[str], title: str = "") -> None:
    """Write `clock_figure` to a file (.png, .pdf or .svg)."""
    check_picture(path)
    save_figure(clock_figure(comparison, t, title), path)


def rate_figure(ledger: RateLedger, t: Instants, title: str = "") -> Figure:
    """Draw the rate of a clock over time, term by term, each term about its mean, which the legend states.

    Parameters
    ----------
    ledger : RateLedger
        `proper_ledger(clock, t)`.
    t : Instants
        The same dates, two or more; any order.
    title : str
        Default: the clock and the coordinate time.

    Raises
    ------
    InvalidInput
        Fewer than two dates, or not those of the ledger.
    MissingPiece
        matplotlib is not installed.
    """
    if not isinstance(t, Instants) or t.shape != ledger.shape or t.size < 2:
        raise InvalidInput(
            f"the dates are those of the ledger, {ledger.shape}, two or more; got {getattr(t, 'shape', t)!r:.60}"
        )
    check_picture("figure.png")
    dates = dates_of(t)
    order = np.argsort(dates, kind="stable")
    dates = dates[order]
    terms: dict[str, FloatArray] = {name: value.reshape(-1)[order] for name, value in ledger.items()}
    terms = {name: value for name, value in terms.items() if np.any(value)}
    terms["all"] = ledger.total.reshape(-1)[order]
    panels = _alike(terms)
    heights = [1.5 + 0.3 * max(0, len(panel) - 3) for panel in panels]
    heights[-1] += 0.4
    words = title or f"Rate of {ledger.clock} against {ledger.against}"
    figure, (part,) = parts_of(words, ["each term about its mean over the dates"], [sum(heights)])
    rows = part.subplots(len(panels), 1, sharex=True, squeeze=False, height_ratios=heights)[:, 0]
    for axes, names in zip(rows, panels, strict=True):
        _rate_lines(axes, dates, {name: terms[name] for name in names})
    date_axis(rows[-1], dates, t.scale)
    part.align_ylabels(rows)
    return figure


def save_rate_picture(ledger: RateLedger, t: Instants, path: str | os.PathLike[str], title: str = "") -> None:
    """Write `rate_figure` to a file (.png, .pdf or .svg)."""
    check_picture(path)
    save_figure(rate_figure(ledger, t, title), path)


def _alike(terms: Mapping[str, FloatArray]) -> list[list[str]]:
    """Names of terms that swing alike, largest first."""
    swings = {name: float(np.ptp(value)) for name, value in terms.items()}
    panels: list[list[str]] = []
    for name in sorted(terms, key=lambda name: -swings[name]):
        if panels and swings[name] * 30.0 >= swings[panels[-1][0]]:
            panels[-1].append(name)
        elif panels and swings[panels[-1][0]] < 1e-19:
            panels[-1].append(name)  # nothing is to be seen of either
        else:
            panels.append([name])
    return panels


def _rate_lines(axes: Axes, dates: npt.NDArray[Any], terms: Mapping[str, FloatArray]) -> None:
    swing = max(float(np.max(np.abs(value - value.mean()))) for value in terms.values())
    power = int(np.floor(np.log10(swing))) if swing > 0.0 else 0
    named = [name for name in terms if name != "all"]
    looks: dict[str, dict[str, Any]] = dict(zip(named, styles(len(named), dashes=True), strict=True))
    looks["all"] = {"color": BLACK, "linestyle": "-"}
    for name, value in terms.items():
        mean = float(value.mean())
        label = f"{plain(name, 40)}\n   about {_number(mean)}"
        draw_line(axes, dates, (value - mean) / 10.0**power, label=label, linewidth=1.4, **looks[name])
    axes.set_ylabel(f"rate (10$^{{{power}}}$)", fontsize="small")
    axes.margins(y=0.1)
    tidy(axes)
    side_legend(axes)


def _rate_bars(axes: Axes, rates: Mapping[str, float], clock: str) -> None:
    """Sizes of the mean rates on a logarithmic axis, with their signs by colour, hatching and number."""
    names = list(rates)
    heights = np.arange(len(names))[::-1]
    sizes = np.abs(np.array([rates[name] for name in names]))
    largest = float(sizes.max()) or 1e-18
    low = 10.0 ** np.floor(np.log10(max(largest * 10.0**-_DECADES, min(float(s) for s in sizes if s) * 0.3)))
    for sign, colour, hatch, words in ((1.0, BLUE, "", f"{clock} gains"), (-1.0, VERMILLION, "//", f"{clock} loses")):
        own = [i for i, name in enumerate(names) if rates[name] * sign > 0.0]
        if own:
            axes.barh(
                heights[own], np.maximum(sizes[own], low) - low, left=low, height=0.6, color=colour, hatch=hatch,
                edgecolor="white", linewidth=0.0, label=words,
            )  # fmt: skip
    axes.set_xscale("log")
    axes.set_xlim(low, 3.0 * largest)
    axes.set_ylim(-0.6, len(names) - 0.4)
    axes.set_yticks(heights, [plain(name, 50) for name in names])
    axes.set_xlabel("size of the mean rate", fontsize="small")
    tidy(axes, grid="x")
    axes.tick_params(axis="y", length=0.0)
    beside = axes.twinx()
    beside.set_ylim(axes.get_ylim())
    beside.set_yticks(heights, [_number(rates[name]) for name in names])
    beside.tick_params(axis="y", length=0.0, labelsize="x-small")
    beside.spines[:].set_visible(False)
    axes.legend(loc="lower left", bbox_to_anchor=(0.0, 1.0), ncols=2, frameon=False, fontsize="x-small")


def _number(rate: float) -> str:
    return f"{rate:+.4e}".replace("-", "\u2212")
