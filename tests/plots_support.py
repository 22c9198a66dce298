"""Shared pieces of the tests of pictures and reports: the invented observatory of the examples."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np

import tscale

EXAMPLES = Path(__file__).parents[1] / "examples"
SITE = tscale.Site.load(EXAMPLES / "site.toml")
STAR = tscale.Source.load(EXAMPLES / "source.toml")
OPTIONS = [
    *("--clock", str(EXAMPLES / "maser.csv"), "--clock", str(EXAMPLES / "utc_krl.csv")),
    *("--site", str(EXAMPLES / "site.toml"), "--source", str(EXAMPLES / "source.toml")),
]
HEAD = "epoch,offset_s,uncertainty_s,reference,clock,use,reset_s\n"


def logs() -> list[tscale.ClockLog]:
    return [tscale.ClockLog.load(EXAMPLES / name) for name in ("maser.csv", "utc_krl.csv")]


def chain(end: str = "TDB@BARYCENTER") -> Any:
    return tscale.chain("CLOCK(maser)", end, site=SITE, clocks=logs(), source=STAR)


def readings(count: int = 60, step_s: float = 3600.0) -> tscale.Instants:
    start = tscale.Instants.from_iso("2025-03-03T01:00:00", scale="CLOCK(maser)")
    return start.shifted(np.arange(count) * step_s)


def texts(figure: Any) -> str:
    """All texts of a figure, as they were given."""
    from matplotlib.text import Text

    return "\n".join(found.get_text() for found in figure.findobj(Text) if found.get_text())


def lines(figure: Any) -> dict[str, Any]:
    """Lines of a figure by the first line of their labels."""
    found = {}
    for axes in figure.axes:
        for line in axes.get_lines():
            found.setdefault(str(line.get_label()).split("\n")[0], line)
    return found


def factor(axes: Any) -> float:
    """Seconds in the unit of a vertical axis."""
    unit = axes.get_ylabel().rpartition("(")[2].rstrip(")")
    return {"fs": 1e-15, "ps": 1e-12, "ns": 1e-9, "\u00b5s": 1e-6, "ms": 1e-3, "s": 1.0}[unit]
