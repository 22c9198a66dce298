"""Pictures of ledgers: every term over time, terms of like size in one panel."""

from __future__ import annotations

import os
from collections.abc import Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from ..errors import InvalidInput
from ..exact import FloatArray
from ..instants import Instants
from ..ledger import Ledger
from .common import (
    BLACK,
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

__all__ = ["Drawn", "grouped", "ledger_figure", "save_ledger_picture"]

TOTAL: Final = "total"
_STILL_S: Final = 1e-15  # ten times the resolution of dates
_RATIOS: Final = (30.0, 100.0, 300.0, 1000.0, np.inf)
_MOST_PANELS: Final = 7


@dataclass(frozen=True)
class Drawn:
    """A term: what is drawn of it, and what was taken off."""

    name: str
    value_s: FloatArray
    swing_s: float
    """From the least to the most."""
    off_s: float = 0.0
    """The first value, where it is large beside the swing."""


def ledger_figure(ledger: Ledger, t: Instants, title: str = "", lines: Sequence[str] = ()) -> Figure:
    """Draw every term of a ledger against the dates, terms that swing alike in one panel, from the largest on.

    A term that is large beside its swing is drawn from its first value on, which the legend states. Terms that do not
    move (by 1 fs) are stated as numbers below.

    Parameters
    ----------
    ledger : Ledger
        `chain.ledger(t)`.
    t : Instants
        The same dates, two or more; any order.
    title : str
    lines : sequence of str
        Small lines below the title, such as the path.

    Returns
    -------
    matplotlib.figure.Figure
        Not tied to any window.

    Raises
    ------
    InvalidInput
        Fewer than two dates, or not those of the ledger.
    MissingPiece
        matplotlib is not installed.
    """
    if not isinstance(t, Instants) or t.shape != ledger.shape:
        raise InvalidInput(f"the dates are those of the ledger: {ledger.shape}, got {getattr(t, 'shape', t)!r:.60}")
    if t.size < 2:
        raise InvalidInput(f"a ledger over time needs two dates or more, got {t.size}")
    check_picture("figure.png")
    dates = dates_of(t)
    order = np.argsort(dates, kind="stable")
    dates = dates[order]
    values = {name: ledger[name].reshape(-1)[order] for name in ledger}
    if len(values) > 1:
        values[TOTAL] = ledger.total.reshape(-1)[order]
    still = {name: value for name, value in values.items() if np.ptp(value) < _STILL_S}
    panels = grouped({name: value for name, value in values.items() if name not in still})
    words = _still_words(still)
    heights = [1.3 + 0.17 * max(0, _rows(panel) - 6) for panel in panels]
    heights = [*heights[:-1], heights[-1] + 0.4] if panels else []
    figure, parts = parts_of(title or "Ledger: every term over time", lines, [sum(heights)] if panels else [], words)
    if panels:
        rows = parts[0].subplots(len(panels), 1, sharex=True, squeeze=False, height_ratios=heights)[:, 0]
        for axes, panel in zip(rows, panels, strict=True):
            _panel(axes, dates, panel)
        date_axis(rows[-1], dates, t.scale)
        parts[0].align_ylabels(rows)
    return figure


def save_ledger_picture(
    ledger: Ledger, t: Instants, path: str | os.PathLike[str], title: str = "", lines: Sequence[str] = ()
) -> None:
    """Write `ledger_figure` to a file (.png, .pdf or .svg)."""
    check_picture(path)
    save_figure(ledger_figure(ledger, t, title, lines), path)


def grouped(values: dict[str, FloatArray]) -> list[list[Drawn]]:
    """Terms by their swing, largest first; in one panel none is less than a thirtieth of the largest, or less where
    there would be too many panels.
    """
    swings = {name: float(np.ptp(value)) for name, value in values.items()}
    ranked = sorted(values, key=lambda name: -swings[name])
    panels: list[list[str]] = []
    for ratio in _RATIOS:
        panels = []
        for name in ranked:
            if panels and swings[name] * ratio >= swings[panels[-1][0]]:
                panels[-1].append(name)
            else:
                panels.append([name])
        if len(panels) <= _MOST_PANELS:
            break
    return [[_drawn(name, values[name], swings[name], swings[panel[0]]) for name in panel] for panel in panels]


def _drawn(name: str, value: FloatArray, swing: float, widest: float) -> Drawn:
    first = float(value[0])
    if np.max(np.abs(value)) > 2.0 * widest:
        return Drawn(name, value - first, swing, first)
    return Drawn(name, value, swing)


def _rows(panel: Sequence[Drawn]) -> int:
    """Lines of the legend."""
    return sum(2 if term.off_s else 1 for term in panel)


def _panel(axes: Axes, dates: Any, panel: Sequence[Drawn]) -> None:
    size, unit = unit_of(max(float(np.max(np.abs(term.value_s))) for term in panel))
    named = [term for term in panel if term.name != TOTAL]
    looks: dict[str, dict[str, Any]] = dict(zip([term.name for term in named], styles(len(named)), strict=True))
    looks[TOTAL] = {"color": BLACK, "linestyle": "-"}
    for term in panel:
        label = plain(term.name, 44)
        if term.off_s:
            label += f"\n   from {quantity(term.off_s, 6, sign=True)}"
        width = 2.2 if term.name == TOTAL else 1.4
        draw_line(axes, dates, term.value_s / size, label=label, linewidth=width, **looks[term.name])
    shifted = [bool(term.off_s) for term in panel]
    words = "change" if all(shifted) else "value" if not any(shifted) else "value, change"
    axes.set_ylabel(f"{words} ({unit})", fontsize="x-small")
    axes.margins(y=0.08)
    tidy(axes)
    side_legend(axes)


def _still_words(still: dict[str, FloatArray]) -> str:
    """Constant terms as a sentence; what is zero is named last."""
    stated = [f"{plain(name)} {quantity(float(v[0]), 12, sign=True)}" for name, v in still.items() if np.any(v)]
    zero = [plain(name) for name, value in still.items() if not np.any(value)]
    parts = []
    if stated:
        parts.append(f"Constant: {'; '.join(stated)}.")
    if zero:
        parts.append(f"Zero: {', '.join(zero)}.")
    return " ".join(parts)
