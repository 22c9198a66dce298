"""Pictures of what other tables move: every term over time, against the uncertainties that are stated."""

from __future__ import annotations

import os
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any, Final

import numpy as np
import numpy.typing as npt

from ..errors import InvalidInput
from ..exact import FloatArray
from ..instants import Instants
from ..scenarios import Moved, WhatIf
from .common import (
    BLACK,
    SKY,
    broken_at,
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

__all__ = ["save_what_if_picture", "what_if_figure"]

_RATIO: Final = 30.0
_MOST_PANELS: Final = 8
_WIDEST_BAND: Final = 30.0
"""Times what moved: a wider band is stated, not drawn."""


def what_if_figure(found: WhatIf, t: Instants, title: str = "", *, smallest_s: float = 1e-15) -> Figure:
    """Draw what moved against the dates: step by step, terms that moved alike in one panel, and the sum of all.

    The band is the standard uncertainty of what changed, before and after in quadrature, as far as it enters the step
    (or the result), without what both share; one that would flatten the lines is stated in the legend instead.

    Parameters
    ----------
    found : WhatIf
    t : Instants
        The dates that it was made of, two or more; any order.
    title : str
    smallest_s : float
        Terms that nowhere moved by this are counted, not drawn.

    Raises
    ------
    InvalidInput
        Fewer than two dates, or not those of `found`.
    MissingPiece
        matplotlib is not installed.
    """
    if not isinstance(t, Instants) or t.shape != found.total_s.shape:
        raise InvalidInput(f"the dates are those asked of, {found.total_s.shape}, got {getattr(t, 'shape', t)!r:.60}")
    if t.size < 2:
        raise InvalidInput(f"what moved over time needs two dates or more, got {t.size}")
    check_picture("figure.png")
    dates = dates_of(t)
    order = np.argsort(dates, kind="stable")
    dates = dates[order]
    panels = _panels(found, smallest_s)
    still = len(found.terms) - sum(moved.largest_s >= smallest_s for moved in found.terms)
    changed = [f"{change.what}: {change.before or 'none'} -> {change.after or 'none'}" for change in found.changes]
    heights = [1.5 + 0.16 * max(0, len(panel) - 4) for _, panel in panels]
    heights[-1] += 0.4
    below = f"{still} of {len(found.terms)} terms did not move by {quantity(smallest_s)}." if still else ""
    figure, (part,) = parts_of(title or "What moves: after less before", changed, [sum(heights)], below)
    rows = part.subplots(len(panels), 1, sharex=True, squeeze=False, height_ratios=heights)[:, 0]
    bands = {step.step: step.sigma_s for step in found.steps}
    shown: set[str] = set()
    for axes, (step, panel) in zip(rows, panels, strict=True):
        sigma = found.total.sigma_s if step is None else None if step in shown else bands.get(step)
        shown.add(step or "")
        _draw(axes, dates, panel, order, sigma)
        axes.set_title(plain(step or "sum of all", 110), loc="left", fontsize="x-small", color="0.3", pad=3.0)
    date_axis(rows[-1], dates, t.scale)
    part.align_ylabels(rows)
    return figure


def save_what_if_picture(
    found: WhatIf, t: Instants, path: str | os.PathLike[str], title: str = "", *, smallest_s: float = 1e-15
) -> None:
    """Write `what_if_figure` to a file (.png, .pdf or .svg)."""
    check_picture(path)
    save_figure(what_if_figure(found, t, title, smallest_s=smallest_s), path)


def _panels(found: WhatIf, smallest_s: float) -> list[tuple[str | None, list[Moved]]]:
    """Terms by step, in the order of the chain, and within a step by size; the sum of all last."""
    for ratio in (_RATIO, 1000.0, np.inf):
        panels: list[tuple[str | None, list[Moved]]] = []
        for step in dict.fromkeys(moved.step for moved in found.terms):
            own = [moved for moved in found.terms if moved.step == step and moved.largest_s >= smallest_s]
            for moved in sorted(own, key=lambda moved: -moved.largest_s):
                if panels and panels[-1][0] == step and moved.largest_s * ratio >= panels[-1][1][0].largest_s:
                    panels[-1][1].append(moved)
                else:
                    panels.append((step, [moved]))
        if len(panels) < _MOST_PANELS:
            break
    return [*panels, (None, [found.total])]


def _draw(
    axes: Axes, dates: npt.NDArray[Any], panel: Sequence[Moved], order: npt.NDArray[Any], sigma: FloatArray | None
) -> None:
    largest = max(moved.largest_s for moved in panel)
    widest = 0.0 if sigma is None else float(np.max(sigma))
    drawn = sigma is not None and widest > 0.0 and (largest == 0.0 or widest <= _WIDEST_BAND * largest)
    size, unit = unit_of(max(largest, widest if drawn else 0.0))
    if sigma is not None and drawn:
        band = np.broadcast_to(sigma, (order.size,)) if sigma.ndim == 0 else sigma.reshape(-1)
        band = band[order] / size
        breaks = np.flatnonzero(broken_at(dates))
        x = np.insert(dates, breaks, dates[breaks])
        edge = np.insert(band, breaks, np.nan)
        axes.fill_between(x, -edge, edge, color=SKY, alpha=0.3, linewidth=0.0, label="\u00b1u stated")
    elif widest:
        axes.plot([], [], " ", label=f"u stated: {quantity(widest)}")
    named = [moved for moved in panel if moved.term]
    looks = styles(len(named)) if named else [{"color": BLACK, "linestyle": "-"}]
    for moved, look in zip(panel, looks, strict=True):
        label = plain(moved.term or "total", 44) + (f" (only {moved.only})" if moved.only else "")
        draw_line(axes, dates, moved.moved_s.reshape(-1)[order] / size, label=label, linewidth=1.4, **look)
    axes.axhline(0.0, color="0.6", linewidth=0.8, zorder=1)
    axes.set_ylabel(f"moved ({unit})", fontsize="small")
    axes.margins(y=0.1)
    tidy(axes)
    side_legend(axes)
