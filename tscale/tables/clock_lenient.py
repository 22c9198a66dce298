"""The lenient reader of clock comparison files: takes what it can, and notes what is wrong with the rest."""

from __future__ import annotations

import csv
from collections.abc import Mapping, Sequence
from decimal import Decimal, InvalidOperation
from typing import Any

import numpy as np

from ..errors import InvalidInput
from ..exact import FloatArray, IntArray
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from .clock_anomalies import longest_increasing
from .clock_files import LARGEST_OFFSET_S, NEEDED
from .clock_nominal import Nominal, reference_scale
from .clock_report import Finding

__all__ = ["LenientRows"]


class LenientRows:
    """Rows of a log that are still good, and what was found wrong with the others."""

    def __init__(self, leap_seconds: LeapSeconds, nominal: Nominal | None, shift: int) -> None:
        self.leap_seconds = leap_seconds
        self.nominal = nominal
        self.shift = shift
        self.findings: list[Finding] = []
        self.rows: list[tuple[int, dict[str, str]]] = []
        self.count = 0
        self.used = 0

    def say(
        self,
        kind: str,
        severity: str,
        rows: Sequence[int],
        text: str,
        size: float | None = None,
        epoch: str | None = None,
    ) -> None:
        """Note a finding."""
        self.findings.append(Finding(kind, severity, tuple(row - self.shift for row in rows), epoch, text, size))

    def read(self, content: bytes) -> None:
        """Take the rows apart; keep those that have a cell for each column."""
        header: list[str] | None = None
        for number, raw in enumerate(content.removeprefix(b"\xef\xbb\xbf").splitlines(), 1):
            try:
                line = raw.decode("utf-8")
                if "\0" in line:
                    raise ValueError("a NUL character")
                if not line.strip() or line.lstrip().startswith("#"):
                    continue
                cells = [cell.strip() for cell in next(csv.reader([line], skipinitialspace=True))]
            except (ValueError, csv.Error) as error:
                self.say("not text", "error", [number], f"no row of text: {error}")
                self.count += header is not None
                continue
            if header is None:
                header = cells
                lacking = [column for column in NEEDED if column not in header]
                if lacking or len(set(header)) != len(header):
                    what = f"missing: {', '.join(lacking)}" if lacking else "a column stands there twice"
                    self.say("columns", "error", [number], f"the header is {', '.join(header)}; {what}")
                    return
                continue
            self.count += 1
            if len(cells) != len(header):
                self.say("wrong cells", "error", [number], f"{len(cells)} cells under a header of {len(header)}")
                continue
            self.rows.append((number, dict(zip(header, cells, strict=True))))
        self._use()
        self._single("reference", "UTC")
        self._single("clock", "")
        for column in ("nominal", "interpolation", "max_gap_s"):
            self._single(column, "")

    def _use(self) -> None:
        kept = []
        for number, cell in self.rows:
            for column in ("use", "rate_step"):
                if cell.get(column, "") not in ("", "yes", "no"):
                    text = f"{column} is {cell[column]!r}; yes, no or an empty cell is needed"
                    self.say("bad word", "error", [number], text, epoch=cell["epoch"])
            if cell.get("use") == "no":
                self.say("not used", "note", [number], "the row says that it is not to be used", epoch=cell["epoch"])
                continue
            if cell.get("rate_step") == "yes":
                self.say(
                    "known rate step", "note", [number], "the row says that the rate was changed", epoch=cell["epoch"]
                )
            kept.append((number, cell))
        self.rows = kept

    def _single(self, column: str, default: str) -> None:
        """One value in every row; rows of another are set apart."""
        values = [cell.get(column) or default for _, cell in self.rows]
        kept = []
        before = values[0] if values else default
        changed: list[list[int]] = []
        for (number, cell), value in zip(self.rows, values, strict=True):
            if value == values[0]:
                kept.append((number, cell))
            elif value == before:
                changed[-1].append(number)
            else:
                changed.append([number])
            before = value
        cells = dict(self.rows)
        for numbers in changed:
            cell = cells[numbers[0]]
            text = f"{column} is {cell.get(column) or default!r} here and {values[0]!r} at the top"
            kind = f"other {column}" if column in ("reference", "clock") else "bad word"
            self.say(kind, "error", numbers, text, epoch=cell["epoch"])
        self.rows = kept

    def understand(self) -> bool:
        """Read dates and numbers; False where there is nothing to be read."""
        if not self.rows:
            return False
        first = self.rows[0][1]
        try:
            self.reference = reference_scale(first.get("reference") or "UTC").name
        except InvalidInput as error:
            self.say("other reference", "error", [self.rows[0][0]], str(error))
            return False
        self._dates()
        self._numbers()
        stated = first.get("nominal")
        if self.nominal is None and stated in ("removed", "included"):
            self.nominal = "removed" if stated == "removed" else "included"
        return True

    def _dates(self) -> None:
        try:
            texts = [cell["epoch"] for _, cell in self.rows]
            every = Instants.from_iso(texts, self.reference, leap_seconds=self.leap_seconds)
            good, dates = self.rows, list(zip(every.whole.tolist(), every.fraction.tolist(), strict=True))
        except ValueError:
            good, dates = [], []
            for number, cell in self.rows:
                try:
                    date = Instants.from_iso(cell["epoch"], self.reference, leap_seconds=self.leap_seconds)
                except ValueError as error:
                    self.say("bad date", "error", [number], _plain(str(error)), epoch=cell["epoch"])
                    continue
                good.append((number, cell))
                dates.append((int(date.whole), float(date.fraction)))
        whole: IntArray = np.array([date[0] for date in dates], dtype=np.int64)
        fraction: FloatArray = np.array([date[1] for date in dates], dtype=np.float64)
        kept = longest_increasing(whole, fraction)
        firsts: dict[tuple[int, float], int] = {}
        for (number, _), at, stays in zip(good, dates, kept, strict=True):
            if stays:
                firsts[at] = number
        for (number, cell), at, stays in zip(good, dates, kept, strict=True):
            if stays:
                continue
            if at in firsts:
                text = f"the epoch of line {firsts[at] - self.shift} again"
                self.say("duplicate epoch", "error", [number], text, epoch=cell["epoch"])
            else:
                self.say("reversed epoch", "error", [number], "an epoch out of order", epoch=cell["epoch"])
        self.rows = [row for row, stays in zip(good, kept, strict=True) if stays]
        self.epoch = (whole[kept], fraction[kept])

    def _numbers(self) -> None:
        """Read offsets, uncertainties and resets; NaN where there is none."""
        count = len(self.rows)
        self.offset = np.full((2, count), np.nan)
        self.sigma = np.full(count, np.nan)
        self.reset = np.zeros(count)
        for place, (number, cell) in enumerate(self.rows):
            epoch = cell["epoch"]
            size = cell.get("reset_s", "")
            if size:
                value = np.nan if size == "unknown" else self._number(cell, "reset_s", number)
                self.reset[place] = np.nan if value is None else value
                known = "an unknown amount" if np.isnan(self.reset[place]) else f"{self.reset[place]:g} s"
                said = None if np.isnan(self.reset[place]) else float(self.reset[place])
                self.say("reset", "note", [number], f"the row says that the clock was set by {known}", said, epoch)
            if not cell["offset_s"]:
                self.say("failed comparison", "warning", [number], "no offset: a gap", epoch=epoch)
                continue
            offset = self._number(cell, "offset_s", number)
            if not cell["uncertainty_s"]:
                self.say("no uncertainty", "error", [number], "an offset without an uncertainty", epoch=epoch)
            else:
                sigma = self._number(cell, "uncertainty_s", number)
                if sigma is not None and sigma < 0:
                    text = f"uncertainty_s is {cell['uncertainty_s']}; it is zero or more"
                    self.say("bad number", "error", [number], text, float(sigma), epoch)
                elif sigma is not None:
                    self.sigma[place] = float(sigma)
                    self._common(cell, number)
            if offset is not None:
                self.offset[:, place] = divmod(offset, 1)
        zero = np.flatnonzero(self.sigma == 0.0)
        if len(zero):
            text = f"{len(zero)} of {count} uncertainties are zero"
            self.say("zero uncertainty", "warning", [self.rows[i][0] for i in zero], text, 0.0)

    def _common(self, cell: Mapping[str, str], number: int) -> None:
        """Look at the part that all comparisons share."""
        if cell.get("common_s"):
            common, sigma = self._number(cell, "common_s", number), Decimal(cell["uncertainty_s"])
            if common is not None and not 0 <= common <= sigma:
                text = f"common_s is {cell['common_s']}; it is from zero to uncertainty_s, {cell['uncertainty_s']}"
                self.say("bad number", "error", [number], text, float(common), cell["epoch"])

    def _number(self, cell: Mapping[str, str], column: str, number: int) -> Any:
        try:
            value = Decimal(cell[column])
        except InvalidOperation:
            value = Decimal("NaN")
        if not value.is_finite() or "_" in cell[column] or value.copy_abs() > LARGEST_OFFSET_S:
            text = f"{column} is {cell[column]!r}; a finite number of seconds from -1e9 to 1e9 is needed"
            self.say("bad number", "error", [number], text, epoch=cell["epoch"])
            return None
        return value


def _plain(reason: str) -> str:
    """Why one text is no date, without the count of texts."""
    _, found, rest = reason.partition("(item 0) is ")
    if found:
        return rest.rpartition("': ")[2]
    return "there is no such second on that day" if "do not exist" in reason else reason
