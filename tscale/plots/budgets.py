"""Pictures of uncertainty budgets: bars by source for one instant, and the course of the uncertainties."""

from __future__ import annotations

import os
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from ..budget import Budget
from ..errors import InvalidInput
from ..exact import FloatArray
from ..instants import Instants
from .common import (
    BLACK,
    BLUE,
    ORANGE,
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

__all__ = ["budget_figure", "save_budget_picture"]

_MOST_BARS: Final = 14
_LEAST_LINE: Final = 1e-4
"""Of the largest: lines further below would only stretch the scale."""
_KIND: Final = {"A": (ORANGE, "type A", "//"), "B": (BLUE, "type B", "")}


def budget_figure(
    budget: Budget, t: Instants | None = None, *, instant: int = 0, title: str = "", lines: Sequence[str] = ()
) -> Figure:
    """Draw the standard uncertainties of one instant by quantity, and of all instants by source over time.

    Each bar states its share of the combined variance; the combined and the expanded uncertainty are marked. What is
    not in the budget is named below.

    Parameters
    ----------
    budget : Budget
        `chain.budget(t)`.
    t : Instants, optional
        The instants of the budget, for the lower panel; drawn where they are two or more.
    instant : int
        Which one the bars show, along the flattened array.
    title : str
    lines : sequence of str
        Small lines below the title.

    Raises
    ------
    InvalidInput
        For a budget without uncertainties, instants that are not its own, or an `instant` that it does not have.
    MissingPiece
        matplotlib is not installed.
    """
    row = budget._row(instant)
    if t is not None and (not isinstance(t, Instants) or t.shape != budget.shape):
        raise InvalidInput(f"the instants are those of the budget: {budget.shape}, got {getattr(t, 'shape', t)!r:.60}")
    if not np.any(budget.combined_s):
        raise InvalidInput("there is nothing to draw in this budget: no line has an uncertainty above zero")
    check_picture("figure.png")
    bars = _bars(budget, row)
    course = t is not None and t.size > 1
    left_out = "; ".join(plain(item.source) for item in budget.not_included)
    if t is not None:
        lines = [*lines, f"bars: {_date(t, row)} {t.scale}"]
    figure, parts = parts_of(
        title or "Uncertainty budget",
        lines,
        [1.0 + 0.25 * len(bars), *([3.0] if course else [])],
        f"Not included: {left_out}." if left_out else "",
    )
    _draw_bars(parts[0].subplots(), bars, budget, row)
    if course and t is not None:
        _draw_course(parts[1].subplots(), budget, t)
    return figure


def save_budget_picture(
    budget: Budget,
    path: str | os.PathLike[str],
    t: Instants | None = None,
    *,
    instant: int = 0,
    title: str = "",
    lines: Sequence[str] = (),
) -> None:
    """Write `budget_figure` to a file (.png, .pdf or .svg)."""
    check_picture(path)
    save_figure(budget_figure(budget, t, instant=instant, title=title, lines=lines), path)


def _date(t: Instants, row: int) -> str:
    return str(dates_of(t)[row])[:23]


def _at(values: Any, budget: Budget, row: int) -> float:
    return float(np.broadcast_to(np.asarray(values), budget.shape).reshape(-1)[row])


def _bars(budget: Budget, row: int) -> list[tuple[str, float, float, str]]:
    """Name, uncertainty, share and type, largest first; the smallest of many together."""
    found: list[tuple[str, float, float, str]] = [
        (line.quantity, _at(line.contribution_s, budget, row), _at(line.share_percent, budget, row), line.kind)
        for line in budget.lines
    ]
    found.sort(key=lambda bar: -bar[1])
    if len(found) <= _MOST_BARS:
        return found
    kept, rest = found[: _MOST_BARS - 1], found[_MOST_BARS - 1 :]
    together = float(np.sqrt(sum(bar[1] ** 2 for bar in rest)))
    share = sum(bar[2] for bar in rest)
    kinds = {bar[3] for bar in rest}
    return [
        *kept,
        (f"{len(rest)} smaller ones in quadrature", together, share, kinds.pop() if len(kinds) == 1 else "B"),
    ]


def _draw_bars(axes: Axes, bars: Sequence[tuple[str, float, float, str]], budget: Budget, row: int) -> None:
    combined, expanded = _at(budget.combined_s, budget, row), _at(budget.expanded_s, budget, row)
    factor = _at(budget.coverage_factor, budget, row)
    size, unit = unit_of(expanded)
    heights = np.arange(len(bars))[::-1]
    for kind, (colour, words, hatch) in _KIND.items():
        own = [i for i, bar in enumerate(bars) if bar[3] == kind]
        if own:
            axes.barh(
                heights[own],
                [bars[i][1] / size for i in own],
                height=0.62,
                color=colour,
                hatch=hatch,
                edgecolor="white",
                linewidth=0.0,
                label=words,
            )
    for value, style, words in (
        (combined, "-", f"combined, {quantity(combined)}"),
        (expanded, "--", f"expanded (k = {factor:.3g}), {quantity(expanded)}"),
    ):
        axes.axvline(value / size, color=BLACK, linestyle=style, linewidth=1.4, label=words, zorder=1)
    axes.set_yticks(heights, [plain(bar[0], 60) for bar in bars])
    axes.set_ylim(-0.7, len(bars) - 0.3)
    axes.set_xlim(0.0, 1.16 * expanded / size or 1.0)
    axes.set_xlabel(f"standard uncertainty of the result ({unit})", fontsize="small")
    tidy(axes, grid="x")
    axes.tick_params(axis="y", length=0.0, labelsize="x-small")
    beside = axes.twinx()
    beside.set_ylim(axes.get_ylim())
    beside.set_yticks(heights, [f"{quantity(value)}, {_percent(share)}" for _, value, share, _ in bars])
    beside.tick_params(axis="y", length=0.0, labelsize="x-small")
    beside.spines[:].set_visible(False)
    axes.legend(loc="lower left", bbox_to_anchor=(0.0, 1.0), ncols=4, frameon=False, fontsize="x-small")


def _percent(share: float) -> str:
    return "< 0.01 %" if 0.0 < share < 0.01 else f"{share:.2g} %" if share < 10.0 else f"{share:.1f} %"


def _draw_course(axes: Axes, budget: Budget, t: Instants) -> None:
    dates = dates_of(t)
    order = np.argsort(dates, kind="stable")
    dates = dates[order]

    def ordered(value: FloatArray) -> FloatArray:
        return np.broadcast_to(value, budget.shape).reshape(-1)[order]

    sources = {name: ordered(value) for name, value in budget.by_source().items()}
    combined = ordered(budget.combined_s)
    largest = float(combined.max())
    shown = {name: value for name, value in sources.items() if float(value.max()) > _LEAST_LINE * largest}
    ranked = sorted(shown, key=lambda name: -float(np.median(shown[name])))
    size, unit = unit_of(largest)
    draw_line(axes, dates, combined / size, color=BLACK, linewidth=2.2, label="combined")
    expanded = ordered(budget.expanded_s)
    draw_line(axes, dates, expanded / size, color=BLACK, linewidth=1.2, linestyle="--", label="expanded")
    for name, look in zip(ranked, styles(len(ranked)), strict=True):
        # Nothing is at zero on this scale.
        value = np.where(shown[name] > 0.0, shown[name] / size, np.nan)
        draw_line(axes, dates, value, linewidth=1.3, label=plain(name, 46), **look)
    axes.set_yscale("log")
    axes.set_ylim(bottom=max(_LEAST_LINE * largest / size, 0.5 * min(_least(shown[n]) for n in ranked) / size))
    axes.set_ylabel(f"uncertainty ({unit})", fontsize="small")
    date_axis(axes, dates, t.scale)
    tidy(axes)
    hidden = len(sources) - len(shown)
    if hidden:
        axes.plot([], [], " ", label=f"{hidden} more, below {quantity(_LEAST_LINE * largest)}")
    side_legend(axes)


def _least(value: FloatArray) -> float:
    return float(np.min(value[value > 0.0]))
