"""Pictures of links: light time, range rate and gravitational delays over a span (needs matplotlib)."""

from __future__ import annotations

import os
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any, Final

import numpy as np
import numpy.typing as npt

from ..errors import InvalidInput
from ..exact import FloatArray
from ..link import LinkSolution, TwoWaySolution
from .common import check_picture, figure_of, plain, save_figure

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

    from ..instants import Instants

__all__ = ["link_figure", "save_link_picture"]

_PULL: Final = "Shapiro delay, "
_SHOWN_FROM_S: Final = 1e-14  # a line that never rises above this tells nothing
# After Okabe and Ito, whose colours are told apart with any colour vision; one for each body.
_COLOURS: Final = {
    "sun": "#D55E00",
    "jupiter": "#0072B2",
    "saturn": "#CC79A7",
    "earth": "#009E73",
    "moon": "#7F7F7F",
    "venus": "#E69F00",
    "mars": "#A52A2A",
    "mercury": "#000000",
    "uranus": "#56B4E9",
    "neptune": "#4B3F9E",
    "pluto": "#8C6D31",
}
_STYLES: Final = {"second order": "--", "third order": ":"}
_LENGTHS: Final = ((1e-9, "ns"), (1e-6, "\u00b5s"), (1e-3, "ms"), (1.0, "s"))


def link_figure(solution: LinkSolution | TwoWaySolution | Sequence[Any], title: str = "") -> Figure:
    """Draw light time, range rate and gravitational delays against the date of transmission.

    Parameters
    ----------
    solution : LinkSolution, TwoWaySolution, or a sequence of one kind
        At least two dates in all; a sequence is drawn as one. Of a round trip the upper two panels show the whole
        and the up leg, the lowest the sum of both legs.
    title : str
        Default: the names of both ends.

    Returns
    -------
    matplotlib.figure.Figure
        Not tied to any window: save it with `savefig`.

    Raises
    ------
    InvalidInput
        Fewer than two dates.
    MissingPiece
        matplotlib is not installed.
    """
    parts: list[Any] = list(solution) if isinstance(solution, Sequence) else [solution]
    if not parts or sum(part.occulted.size for part in parts) < 2:
        raise InvalidInput("a picture of a link needs two dates or more")
    both = isinstance(parts[0], TwoWaySolution)
    dates = np.concatenate([_dates(part.transmit) for part in parts])
    order = np.argsort(dates)
    dates = dates[order]

    def joined(pick: Any) -> FloatArray:
        return np.concatenate([np.asarray(pick(part)).reshape(-1) for part in parts])[order]

    figure = figure_of(9.0, 8.2)
    top, middle, bottom = figure.subplots(3, 1, sharex=True, height_ratios=(1.0, 1.0, 1.7))
    total = joined(lambda part: part.round_trip_s if both else part.light_time_s)
    _line(top, dates, *_scaled(total), "round trip" if both else "light time")
    rate = joined(lambda part: part.up.range_rate_m_s if both else part.range_rate_m_s)
    _line(middle, dates, rate / 1e3, "km/s", "range rate, up" if both else "range rate")
    if np.min(rate) <= 0.0 <= np.max(rate):
        middle.axhline(0.0, color="0.6", linewidth=0.8, zorder=0)
    _delays(bottom, dates, _pulls(parts, joined), "both legs, by body" if both else "by body")
    blocked = joined(lambda part: part.occulted).astype(np.bool_)
    if blocked.any():
        for axes in (top, middle, bottom):
            axes.fill_between(
                dates,
                0.0,
                1.0,
                where=_widened(blocked),
                step="mid",
                transform=axes.get_xaxis_transform(),
                color="0.85",
                linewidth=0.0,
                zorder=-1,
            )
        top.plot([], [], color="0.8", linewidth=8.0, label="path blocked by a body or the ground")
        top.legend(loc="lower right", bbox_to_anchor=(1.0, 1.0), frameon=False, fontsize="small", borderaxespad=0.2)
    from matplotlib import dates as ticks

    untyped: Any = ticks
    locator = untyped.AutoDateLocator(minticks=4, maxticks=8)
    bottom.xaxis.set_major_locator(locator)
    bottom.xaxis.set_major_formatter(untyped.ConciseDateFormatter(locator, show_offset=False))
    bottom.set_xlim(dates[0], dates[-1])
    bottom.set_xlabel(f"date of transmission (TDB), from {str(dates[0])[:10]}")
    near, far = (parts[0].up if both else parts[0]).ends
    title = title or f"{near} to {far}{' and back' if both else ''}"
    top.set_title(plain(title), loc="left", fontsize="medium", fontweight="bold")
    figure.align_ylabels([top, middle, bottom])
    return figure


def save_link_picture(
    solution: LinkSolution | TwoWaySolution | Sequence[Any], path: str | os.PathLike[str], title: str = ""
) -> None:
    """Write `link_figure` to a file (.png, .pdf or .svg) that takes its name only when it is whole."""
    check_picture(path)
    save_figure(link_figure(solution, title), path)


def _dates(t: Instants) -> npt.NDArray[Any]:
    """Counts as numpy dates to 1 ms, which a picture does not resolve."""
    millis = t.whole * 1000 + np.rint(t.fraction * 1e3).astype(np.int64)
    dates: npt.NDArray[Any] = np.datetime64("2000-01-01T12:00:00", "ms") + millis.reshape(-1)
    return dates


def _scaled(value_s: FloatArray) -> tuple[FloatArray, str]:
    """Seconds in the unit that suits them."""
    largest = float(np.max(np.abs(value_s)))
    unit, name = next(((unit, name) for unit, name in _LENGTHS if largest < 1e3 * unit), (60.0, "min"))
    if unit == 60.0 and largest > 7200.0:
        unit, name = 3600.0, "h"
    return value_s / unit, name


def _line(axes: Axes, dates: npt.NDArray[Any], value: FloatArray, unit: str, label: str) -> None:
    axes.plot(dates, value, color="#0072B2", linewidth=1.6)
    axes.set_ylabel(f"{label} ({unit})")
    axes.grid(color="0.92")
    axes.ticklabel_format(axis="y", useOffset=False)
    axes.margins(y=0.08)


def _pulls(parts: Sequence[Any], joined: Any) -> dict[str, FloatArray]:
    """Size of each gravitational delay by body; both legs of a round trip together."""
    legs = ("up: ", "down: ") if isinstance(parts[0], TwoWaySolution) else ("",)
    names = [name.removeprefix(legs[0]) for name in parts[0].ledger if name.startswith(legs[0] + _PULL)]
    found = {}
    for name in names:
        value = joined(lambda part, name=name: sum(part.ledger[leg + name] for leg in legs))
        found[name.removeprefix(_PULL)] = np.abs(value)
    return found


def _delays(axes: Axes, dates: npt.NDArray[Any], pulls: dict[str, FloatArray], label: str) -> None:
    shown = {name: value for name, value in pulls.items() if np.max(value) >= _SHOWN_FROM_S}
    ranked = sorted(shown, key=lambda name: -float(np.median(shown[name])))
    for name in ranked:
        body, _, order = name.partition(", ")
        # Below the floor of the panel a line would only stretch the scale.
        value = np.where(shown[name] > 0.0, shown[name], np.nan)
        axes.plot(dates, value, _STYLES.get(order, "-"), color=_COLOURS.get(body, "#404040"), linewidth=1.4, label=name)
    axes.set_yscale("log")
    if ranked:
        low = min(float(np.min(shown[name])) for name in ranked)
        axes.set_ylim(bottom=max(low * 0.5, 0.1 * _SHOWN_FROM_S))
        legend = axes.legend(
            loc="upper left", bbox_to_anchor=(1.0, 1.0), frameon=False, fontsize="small", title=label, alignment="left"
        )
        legend.get_title().set_fontsize("small")
    axes.set_ylabel("size of gravitational delay (s)")
    axes.grid(color="0.92")


def _widened(mask: npt.NDArray[np.bool_]) -> npt.NDArray[np.bool_]:
    """The mask with one more date on each side, so that a lone date is seen."""
    wide = mask.copy()
    wide[1:] |= mask[:-1]
    wide[:-1] |= mask[1:]
    return wide
