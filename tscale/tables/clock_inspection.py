"""Inspection of a clock log: all that is odd in it at once, where `ClockLog.load` stops at the first thing wrong.

Kinds of findings. Errors, for which `load` refuses the file: `not text`, `columns`, `wrong cells`, `bad date`,
`bad number`, `bad word`, `duplicate epoch`, `reversed epoch`, `other reference`, `other clock`, `no uncertainty`,
`nominal`, `refused` (anything else). Warnings: `outlier`, `phase jump`, `rate step`, `unit`, `zero uncertainty`, `gap`,
`failed comparison`, `spacing`. Notes: `not used`, `reset`, `known rate step`.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any, Final

import numpy as np

from ..errors import InvalidInput, TscaleError, gathered_extrapolations
from ..exact import FloatArray, IntArray
from ..formats.leap_seconds import LeapSeconds
from .clock_anomalies import anomalies, irregular_spacing, unit_slips
from .clock_files import parse_clock_content
from .clock_lenient import LenientRows
from .clock_nominal import Nominal, without_nominal
from .clock_report import SEVERITIES, ClockReport
from .clock_rows import checked_curve
from .common import read_file, since

__all__ = ["inspect_log"]

_LARGEST_SIGMA_S: Final = 1e-3
_DIGITS_S: Final = 1e-15


def inspect_log(
    source: str | Path | Sequence[Mapping[str, str]],
    *,
    nominal: Nominal | None = None,
    max_gap_s: float | None = None,
    threshold: float = 6.0,
    leap_seconds: LeapSeconds | None = None,
) -> ClockReport:
    """Look a log over.

    Parameters
    ----------
    source : path, or sequence of mappings
        A file as `clock_files` describes it, or its rows as column -> text.
    nominal : {"removed", "included"}, optional
        As for `ClockLog.load`.
    max_gap_s : float, optional
        Comparisons further apart than this leave a gap; default: half as far again as usual in the log.
    threshold : float
        How many robust standard deviations (from the median absolute deviation) an offset, a jump or a change of rate
        is to stand out by.

    Raises
    ------
    DataFileError
        For a file that cannot be read, or is empty.
    """
    if not threshold > 0.0:
        raise InvalidInput(f"threshold is a number of standard deviations above zero, got {threshold!r}")
    if isinstance(source, str | Path):
        path = Path(source)
        content, _ = read_file(path, "clock log")
        name = path.name
    else:
        path, name = None, "rows"
        columns = list(dict.fromkeys(column for row in source for column in row))
        lines = [columns, *([row.get(column) or "" for column in columns] for row in source)]
        content = "\n".join(
            ",".join('"' + str(cell).replace('"', '""') + '"' for cell in line) for line in lines
        ).encode()
    # Rows given as such are counted from 1 as well: the header that is put before them does not count.
    look = _Inspection(leap_seconds or LeapSeconds.default(), nominal, 0 if path is not None else 1)
    look.read(content)
    with gathered_extrapolations(repeats=True):
        if look.understand():
            look.compare(max_gap_s, threshold)
        look.load(content, path, max_gap_s)
    found = sorted(look.findings, key=lambda finding: (finding.rows[:1] or (0,), SEVERITIES.index(finding.severity)))
    return ClockReport(name, look.count, look.used, tuple(found))


class _Inspection(LenientRows):
    """The series of offsets, and what disturbs it."""

    def compare(self, max_gap_s: float | None, threshold: float) -> None:
        """Look at the series that the rows make."""
        place = np.flatnonzero(np.isfinite(self.offset[0]))
        self.used = len(place)
        if not len(place):
            return
        epoch = (self.epoch[0][place], self.epoch[1][place])
        pair = (self.offset[0][place].astype(np.int64), self.offset[1][place])
        if self.nominal == "included":
            pair, large = without_nominal(pair, epoch, self.reference, self.leap_seconds)
            for i in np.flatnonzero(large).tolist():
                text = f"offset_s does not hold the nominal difference from {self.reference}"
                self.say("nominal", "error", [self.rows[place[i]][0]], text, epoch=self.rows[place[i]][1]["epoch"])
        # Offsets from the first, with known resets taken out: small numbers, in which nothing is lost.
        x = (pair[0] - pair[0][0]) + (pair[1] - pair[1][0])
        x = x - np.nancumsum(self.reset)[place]
        level = float(pair[0][0] + pair[1][0])
        t = since((epoch[0][0], epoch[1][0]), epoch)
        self._spacing(t, place, max_gap_s)
        sigma = self.sigma[place]
        middle = float(np.nanmedian(sigma)) if np.isfinite(sigma).any() else 0.0
        if middle > _LARGEST_SIGMA_S:
            text = f"the uncertainties are {middle:g} s and more for half of the rows: are these nanoseconds?"
            self.say("unit", "warning", [], text, middle)
        slips = unit_slips(x + level)
        for i, power in slips:
            text = f"the offset fits in among its neighbours times 1e{-power}: is it in another unit?"
            self._point("unit", place[i], text, float(x[i] + level))
        good = np.ones(len(place), dtype=np.bool_)
        good[[i for i, _ in slips]] = False
        # A reset of unknown size starts the series anew.
        parts = np.cumsum(np.isnan(self.reset))[place]
        for part in np.unique(parts):
            own = np.flatnonzero(good & (parts == part))
            self._anomalies(t[own], x[own], place[own], max(_DIGITS_S, 0.1 * middle), threshold)

    def _anomalies(self, t: FloatArray, x: FloatArray, place: IntArray, floor_s: float, threshold: float) -> None:
        for found in anomalies(t, x, floor_s, threshold):
            stands = f"stands out by {found.significance:.3g} standard deviations"
            text = {
                "outlier": f"the offset is off by {found.size:.3g} s, which {stands}",
                "phase jump": f"the offset jumps by {found.size:.3g} s from the row before, which {stands}",
                "rate step": f"the rate changes by {found.size:.3g} s/s, which {stands}",
            }[found.kind]
            if found.place in (0, len(t) - 1):
                text += "; at the end of the series it may be a jump or a change of rate as well"
            self._point(found.kind, place[found.place], text, found.size)

    def _spacing(self, t: FloatArray, place: IntArray, max_gap_s: float | None) -> None:
        gaps, changes = irregular_spacing(t, max_gap_s)
        for i in gaps:
            apart = float(t[i] - t[i - 1])
            self._point("gap", place[i], f"{apart:g} s after the comparison before", apart)
        for i in changes:
            before, after = float(t[i - 1] - t[i - 2]) if i > 1 else float(t[1] - t[0]), float(t[i] - t[i - 1])
            self._point(
                "spacing", place[i], f"comparisons come every {after:g} s from here, every {before:g} s before", after
            )

    def _point(self, kind: str, place: Any, text: str, size: float) -> None:
        number, cell = self.rows[int(place)]
        self.say(kind, "warning", [number], text, size, cell["epoch"])

    def load(self, content: bytes, path: Path | None, max_gap_s: float | None) -> None:
        """Let the strict reader say what was missed."""
        if any(finding.severity == "error" for finding in self.findings):
            return
        where = path or Path("rows")
        try:
            rows = parse_clock_content(content, "", where, None, self.leap_seconds, self.nominal)
            checked_curve(rows, where.name, where, None, max_gap_s)
        except TscaleError as error:
            self.say("refused", "error", [] if error.row is None else [error.row], str(error))
