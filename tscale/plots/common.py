"""What all pictures share: colours, units, date axes, lines with breaks, files that are the same in every run."""

from __future__ import annotations

import contextlib
import io
import os
import re
import textwrap
import warnings
from collections.abc import Iterator, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

import numpy as np
import numpy.typing as npt

from ..errors import ExtrapolationWarning, InvalidInput, MissingPiece
from ..exact import BoolArray, FloatArray
from ..instants import Instants
from ..storage import write_atomically

if TYPE_CHECKING:
    from matplotlib.axes import Axes
    from matplotlib.figure import Figure

__all__ = [
    "BLACK",
    "BLUE",
    "GREEN",
    "GREY",
    "ORANGE",
    "PALETTE",
    "PURPLE",
    "SKY",
    "VERMILLION",
    "broken_at",
    "check_picture",
    "date_axis",
    "dates_of",
    "draw_line",
    "figure_of",
    "parts_of",
    "plain",
    "quantity",
    "save_figure",
    "side_legend",
    "styles",
    "svg_text",
    "tidy",
    "unit_of",
]

# After Okabe and Ito (Color Universal Design, 2008), whose colours are told apart with any colour vision; without
# yellow, which is lost on white paper.
BLUE: Final = "#0072B2"
VERMILLION: Final = "#D55E00"
GREEN: Final = "#009E73"
PURPLE: Final = "#CC79A7"
ORANGE: Final = "#E69F00"
SKY: Final = "#56B4E9"
BLACK: Final = "#000000"
GREY: Final = "#7F7F7F"
PALETTE: Final = (BLUE, VERMILLION, GREEN, PURPLE, ORANGE, SKY, GREY)

WIDTH_IN: Final = 9.0

_KINDS: Final = (".png", ".pdf", ".svg")
_STYLES: Final = ("-", "--", "-.", ":")
_UNITS: Final = ((1e-15, "fs"), (1e-12, "ps"), (1e-9, "ns"), (1e-6, "\u00b5s"), (1e-3, "ms"), (1.0, "s"))
_FEW: Final = 40  # up to so many dates, each is marked
_EPOCH_MJD: Final = 40587  # 1970-01-01
_SETTINGS: Final = {
    "svg.hashsalt": "tscale",
    "svg.fonttype": "path",
    "font.family": "sans-serif",
    "font.sans-serif": ["DejaVu Sans"],  # comes with matplotlib: the same on every machine
    "axes.unicode_minus": True,
    "path.simplify": True,
}
_METADATA: Final[dict[str, dict[str, Any]]] = {
    "svg": {"Date": None, "Creator": None, "Format": None, "Type": None},
    "pdf": {"CreationDate": None, "ModDate": None},
    "png": {},
}


# ---- files ---------------------------------------------------------------------------------------


def check_picture(path: str | os.PathLike[str]) -> Path:
    """Say early what would stop a picture: no matplotlib, no folder, or an ending that is not .png, .pdf or .svg."""
    target = Path(path)
    if target.suffix.lower() not in _KINDS:
        raise InvalidInput(f"{path} cannot be a picture: the name must end in {', '.join(_KINDS)}")
    if not target.parent.is_dir():
        raise InvalidInput(f"{path} cannot be written: there is no folder {target.parent}; make it first")
    try:
        import matplotlib  # noqa: F401
    except ImportError as error:
        raise MissingPiece("pictures need matplotlib: pip install 'tscale[plot]'") from error
    return target


def figure_of(width_in: float, height_in: float) -> Figure:
    """An empty figure of a size in inches, tied to no window; `MissingPiece` without matplotlib."""
    check_picture("figure.png")
    from matplotlib.figure import Figure

    return Figure(figsize=(width_in, height_in), layout="constrained", dpi=120)


def save_figure(figure: Figure, path: str | os.PathLike[str]) -> None:
    """Write a figure to a file (.png, .pdf or .svg) that takes its name only when it is whole.

    The same figure gives the same bytes: no date is written into the file.

    Raises
    ------
    InvalidInput
        For another ending, or a folder that does not exist.
    """
    target = check_picture(path)
    write_atomically(target, _bytes(figure, target.suffix.lower()[1:]))


def svg_text(figure: Figure) -> str:
    """A figure as SVG, with its texts as outlines: it looks alike on every machine."""
    return _bytes(figure, "svg").decode("utf-8")


def _bytes(figure: Figure, kind: str) -> bytes:
    picture = io.BytesIO()
    with _settled():
        _fix_layout(figure)
        figure.savefig(picture, format=kind, metadata=_METADATA[kind])
    return picture.getvalue()


def _fix_layout(figure: Figure) -> None:
    """Lay the figure out once and for all: the solver's last digits depend on where things lie in memory."""
    if figure.get_layout_engine() is None:
        return
    figure.draw_without_rendering()
    places = [(axes, axes.get_position()) for axes in figure.axes]
    figure.set_layout_engine("none")
    for part in figure.subfigs:
        part.bbox_relative.set_points(np.round(part.bbox_relative.get_points(), 5))
    for axes, place in places:
        left, bottom, width, height = (round(float(value), 5) for value in place.bounds)
        axes.set_position((left, bottom, width, height))


@contextlib.contextmanager
def _settled() -> Iterator[None]:
    """Settings of our own, whatever the user's are; letters that the font lacks are drawn as boxes."""
    import matplotlib

    context: Any = matplotlib.rc_context
    with warnings.catch_warnings(), context(_SETTINGS):
        warnings.filterwarnings("ignore", message="Glyph .* missing from", category=UserWarning)
        yield


# ---- texts and units -----------------------------------------------------------------------------


def plain(text: str, longest: int = 90) -> str:
    """Text out of files made safe to draw: no mathematics, no control characters, not too long."""
    text = "".join(c if c.isprintable() else c.encode("unicode_escape").decode() for c in str(text))
    if len(text) > longest:
        text = text[: longest - 4] + " ..."
    # A label that begins with _ would be left out of the legend.
    return re.sub(r"^_", " _", text).replace("$", r"\$")


def unit_of(largest_s: float) -> tuple[float, str]:
    """Size in seconds and name of the unit in which a value reads as 1 to 1000."""
    return next(((size, name) for size, name in _UNITS if abs(largest_s) < 999.999999 * size), _UNITS[-1])


def quantity(value_s: float, digits: int = 3, *, sign: bool = False) -> str:
    """A value in the unit that suits it, such as `1.74 ns`."""
    if value_s == 0.0:
        return "0 s"
    size, name = unit_of(float(f"{value_s:.{digits - 1}e}"))  # what rounds to 1000 ns is 1 us
    return f"{value_s / size:{'+' if sign else ''}.{digits}g} {name}".replace("-", "\u2212")


def styles(count: int, *, dashes: bool = False) -> list[dict[str, Any]]:
    """Colours, and line styles where these do not suffice; with `dashes` each its own, as lines may coincide."""
    return [
        {"color": PALETTE[i % len(PALETTE)], "linestyle": _STYLES[(i if dashes else i // len(PALETTE)) % len(_STYLES)]}
        for i in range(count)
    ]


# ---- dates ---------------------------------------------------------------------------------------


def dates_of(t: Instants) -> npt.NDArray[Any]:
    """Labels as numpy dates to 1 us, flat."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", ExtrapolationWarning)  # notes and tables say so
        day, fraction = t.ravel().to_mjd()
    micros = (day - _EPOCH_MJD) * 86_400_000_000 + np.rint(fraction * 86_400e6).astype(np.int64)
    dates: npt.NDArray[Any] = np.datetime64("1970-01-01T00:00:00", "us") + micros
    return dates


def broken_at(dates: npt.NDArray[Any]) -> BoolArray:
    """Where, in dates in order, a line should break before a date: half as far again as an even spacing, or ten times
    an uneven one.
    """
    apart = np.diff(dates).astype(np.float64)
    found = np.zeros(len(dates), dtype=np.bool_)
    if len(apart) > 1:
        usual = float(np.median(apart))
        even = np.count_nonzero(np.abs(apart - usual) <= 0.01 * usual) >= 0.8 * len(apart)
        found[1:] = apart > (1.5 if even else 10.0) * max(usual, 1.0)
    return found


def draw_line(axes: Axes, dates: npt.NDArray[Any], value: FloatArray, **style: Any) -> Any:
    """Draw a line against dates in order, broken where dates are missing; few dates, and lone ones, are marked."""
    breaks = np.flatnonzero(broken_at(dates))
    ends = np.concatenate([[0], breaks, [len(dates)]])
    lone = bool(np.any(np.diff(ends) == 1))
    if len(dates) <= _FEW or lone:
        style = {"marker": "o", "markersize": 3.0, **style}
    (line,) = axes.plot(np.insert(dates, breaks, dates[breaks]), np.insert(value, breaks, np.nan), **style)
    return line


def date_axis(axes: Axes, dates: npt.NDArray[Any], words: str) -> None:
    """Dress the horizontal axis: dates in order, and what they are."""
    from matplotlib import dates as ticks

    untyped: Any = ticks
    locator = untyped.AutoDateLocator(minticks=4, maxticks=8)
    axes.xaxis.set_major_locator(locator)
    axes.xaxis.set_major_formatter(untyped.ConciseDateFormatter(locator, show_offset=False))
    if dates[0] != dates[-1]:
        margin = (dates[-1] - dates[0]) // 100
        axes.set_xlim(dates[0] - margin, dates[-1] + margin)
    axes.set_xlabel(f"{plain(words)}, from {str(dates[0])[:10]}", fontsize="small")


# ---- dress ---------------------------------------------------------------------------------------


def tidy(axes: Axes, *, grid: str = "both") -> None:
    """Light grid, no box, no offsets at the ends of axes."""
    axes.grid(color="0.9", linewidth=0.7, axis=grid)  # type: ignore[arg-type]
    axes.set_axisbelow(True)
    axes.spines[["top", "right"]].set_visible(False)
    axes.tick_params(labelsize="small")
    if axes.get_yscale() == "linear":
        with contextlib.suppress(AttributeError):  # ticks that are names have no offset
            axes.ticklabel_format(axis="y", useOffset=False)


def side_legend(axes: Axes, title: str = "") -> None:
    """The legend beside the panel, where it covers nothing."""
    legend = axes.legend(
        loc="upper left",
        bbox_to_anchor=(1.01, 1.02),
        frameon=False,
        fontsize="x-small",
        title=title or None,
        alignment="left",
        borderaxespad=0.0,
        handlelength=2.2,
    )
    legend.get_title().set_fontsize("x-small")


def parts_of(title: str, lines: Sequence[str], heights: Sequence[float], below: str = "") -> tuple[Figure, list[Any]]:
    """A figure with a header, parts of heights in inches, and a text below; returns it and the parts for panels."""
    above = [row for line in lines for row in textwrap.wrap(plain(line, 400), int(WIDTH_IN * 13.0))]
    foot = textwrap.wrap(below, int(WIDTH_IN * 13.5)) if below else []
    every = [0.36 + 0.15 * len(above), *heights, *([0.12 + 0.15 * len(foot)] if foot else [])]
    figure = figure_of(WIDTH_IN, sum(every))
    parts: list[Any] = list(figure.subfigures(len(every), 1, squeeze=False, height_ratios=every)[:, 0])
    high = every[0]
    parts[0].text(0.01, 1.0 - 0.08 / high, plain(title), fontweight="bold", fontsize="medium", va="top")
    parts[0].text(0.01, 1.0 - 0.30 / high, "\n".join(above), fontsize="x-small", color="0.3", va="top")
    if foot:
        parts[-1].text(0.01, 1.0, "\n".join(foot), fontsize="x-small", va="top")
    return figure, parts[1 : 1 + len(heights)]
