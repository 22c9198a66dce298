"""Reader of clock comparison files: CSV with a header, one comparison a row.

Columns, in any order: `epoch` (ISO 8601 label of the reference scale), `offset_s` (clock minus reference, s; empty
where the comparison failed), `uncertainty_s` (standard uncertainty, s). Where wanted:

- `reference` (default UTC) and `clock` (default: the file's name), the same in every row.
- `nominal`, the same in every row, needed for a reference whose labels have no leap seconds: `removed` or `included`,
  as `clock_nominal` tells.
- `interpolation` and `max_gap_s`, the same in every row: how this log is to be interpolated, where `ClockLog.load` is
  not told otherwise.
- `use`: `no` keeps a row in the file, and out of the log; `yes` or empty is an ordinary row.
- `reset_s`: the clock was set forward by so much at this epoch, between the reading and the offset of this row, which
  is that after; `unknown` where nobody knows by how much; empty where it was not set.
- `common_s`: the part of `uncertainty_s` that all comparisons share, such as that of a calibration; empty for none.
- `rate_step`: `yes` where the clock's rate was changed at this epoch; `no` or empty elsewhere.

Lines that start with `#` are comments. Other columns are let be.
"""

from __future__ import annotations

import csv
from decimal import Decimal, InvalidOperation
from pathlib import Path
from typing import Final, cast

import numpy as np

from ..errors import DataFileError, InvalidInput
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from .clock_nominal import Nominal, check_nominal, reference_scale, without_nominal
from .clock_rows import ClockRows, Interpolation, LogMark, check_options, clock_scale
from .common import read_file

__all__ = ["LARGEST_OFFSET_S", "NEEDED", "parse_clock_content", "parse_clock_file"]

NEEDED: Final = ("epoch", "offset_s", "uncertainty_s")
LARGEST_OFFSET_S: Final = 1e9


def parse_clock_file(
    path: Path, name: str | None, leap_seconds: LeapSeconds | None, nominal: Nominal | None = None
) -> ClockRows:
    """Read a comparison file; `DataFileError` with path and row for whatever is wrong with it."""
    content, sha256 = read_file(path, "clock log")
    return parse_clock_content(content, sha256, path, name, leap_seconds, nominal)


def parse_clock_content(
    content: bytes, sha256: str, path: Path, name: str | None, leap_seconds: LeapSeconds | None, nominal: Nominal | None
) -> ClockRows:
    """Read the bytes of a comparison file; `path` is for the messages, and for the name of the clock."""
    numbers, cells = _cells(content, path)
    cells, numbers, marks = _used(cells, numbers, path)
    columns = {column: [row[column] for row in cells] for column in cells[0]}
    reference = _single(columns.get("reference"), "UTC", "reference", numbers, path)
    stated = _single(columns.get("nominal"), "", "nominal", numbers, path)
    interpolation = _single(columns.get("interpolation"), "", "interpolation", numbers, path)
    gap = _single(columns.get("max_gap_s"), "", "max_gap_s", numbers, path)
    clock = name if name is not None else _single(columns.get("clock"), path.stem, "clock", numbers, path)
    if nominal is not None and stated not in ("", nominal):
        raise DataFileError(f"{path}: the file says nominal: {stated}, not {nominal}", path=path)
    kind_of_offset = nominal if nominal is not None else stated or None
    try:
        scale, kind = clock_scale(clock), reference_scale(reference)
        check_nominal(kind.name, kind_of_offset)
        max_gap_s = float(_number(gap, "max_gap_s", numbers[0], path)) if gap else None
        check_options(cast(Interpolation, interpolation or "linear"), max_gap_s)
    except InvalidInput as error:
        raise DataFileError(f"{path}: {error}", path=path) from error
    try:
        epoch = Instants.from_iso(columns["epoch"], kind.name, leap_seconds=leap_seconds)
    except ValueError as error:
        mask = getattr(error, "mask", None)
        row = numbers[int(np.flatnonzero(mask)[0])] if mask is not None and np.any(mask) else None
        where = "" if row is None else f", line {row}"
        raise DataFileError(f"{path}{where}: {error}", row=row, path=path) from error
    missing = np.array([not text for text in columns["offset_s"]])
    offset, reset = (np.zeros((2, len(cells))) for _ in range(2))
    sigma, common = np.zeros((2, len(cells)))
    broken, corner = (np.zeros(len(cells), dtype=np.bool_) for _ in range(2))
    for place, (row, cell) in enumerate(zip(numbers, cells, strict=True)):
        if cell["offset_s"]:
            offset[:, place] = _exact_number(cell["offset_s"], "offset_s", row, path)
            sigma[place] = float(_number(cell["uncertainty_s"], "uncertainty_s", row, path))
            if sigma[place] < 0.0:
                raise DataFileError(
                    f"{path}, line {row}: uncertainty_s is {cell['uncertainty_s']}; a standard uncertainty is zero or "
                    "more",
                    row=row,
                    path=path,
                )
            if cell.get("common_s"):
                common[place] = float(_number(cell["common_s"], "common_s", row, path))
                if not 0.0 <= common[place] <= sigma[place]:
                    raise DataFileError(
                        f"{path}, line {row}: common_s is {cell['common_s']}; it is the part of uncertainty_s "
                        f"({cell['uncertainty_s']}) that all comparisons share, from zero to all of it",
                        row=row,
                        path=path,
                    )
        size = cell.get("reset_s", "")
        if size == "unknown":
            broken[place] = True
        elif size:
            reset[:, place] = _exact_number(size, "reset_s", row, path)
        corner[place] = _yes(cell.get("rate_step", ""), False, "rate_step", row, path)
        if size:
            known = None if broken[place] else float(reset[0, place] + reset[1, place])
            marks.append(LogMark("reset", cell["epoch"], row, known))
        if corner[place]:
            marks.append(LogMark("rate step", cell["epoch"], row, None))
    offsets = (offset[0].astype(np.int64), offset[1])
    if kind_of_offset == "included":
        offsets, large = without_nominal(offsets, epoch.pair, kind.name, leap_seconds or LeapSeconds.default())
        large &= ~missing
        if large.any():
            place = int(np.flatnonzero(large)[0])
            raise DataFileError(
                f"{path}, line {numbers[place]}: offset_s is {columns['offset_s'][place]}, which does not hold the "
                f"nominal difference from {kind.name}; if it holds the rest alone, write nominal: removed",
                row=numbers[place],
                path=path,
            )
    return ClockRows(
        scale.name,
        kind.name,
        epoch,
        offsets,
        missing,
        sigma,
        common,
        numbers,
        sha256,
        (reset[0].astype(np.int64), reset[1]),
        broken,
        corner,
        tuple(sorted(marks, key=lambda mark: mark.row or 0)),
        cast(Interpolation, interpolation) if interpolation else None,
        max_gap_s,
    )


def _used(
    cells: list[dict[str, str]], numbers: list[int], path: Path
) -> tuple[list[dict[str, str]], list[int], list[LogMark]]:
    """Set the rows apart that are not to be used; nothing else in them is looked at."""
    kept: list[dict[str, str]] = []
    rows: list[int] = []
    marks: list[LogMark] = []
    for row, cell in zip(numbers, cells, strict=True):
        if _yes(cell.get("use", ""), True, "use", row, path):
            kept.append(cell)
            rows.append(row)
            continue
        if cell.get("reset_s") or cell.get("rate_step") == "yes":
            raise DataFileError(
                f"{path}, line {row}: a row that is not used cannot say that the clock was reset or its rate changed; "
                "say it in the next row that is used",
                row=row,
                path=path,
            )
        marks.append(LogMark("not used", cell["epoch"], row, None))
    if not kept:
        raise DataFileError(f"{path}: every row says use: no; two or more comparisons are needed", path=path)
    return kept, rows, marks


def _yes(text: str, empty: bool, column: str, row: int, path: Path) -> bool:
    if text not in ("", "yes", "no"):
        raise DataFileError(
            f"{path}, line {row}: {column} is {text!r}; yes, no or an empty cell is needed", row=row, path=path
        )
    return text == "yes" or (not text and empty)


def _cells(content: bytes, path: Path) -> tuple[list[int], list[dict[str, str]]]:
    """Rows as column -> text, with the line each stands on."""
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        number = content.count(b"\n", 0, error.start) + 1
        raise DataFileError(
            f"{path}, line {number}: not UTF-8 text ({error.reason}); save the file as UTF-8", row=number, path=path
        ) from error
    header: list[str] | None = None
    numbers: list[int] = []
    rows: list[dict[str, str]] = []
    for number, line in enumerate(text.splitlines(), 1):
        if not line.strip() or line.lstrip().startswith("#"):
            continue
        if "\0" in line:
            raise DataFileError(f"{path}, line {number}: a NUL character; this is no text", row=number, path=path)
        try:
            cells = [cell.strip() for cell in next(csv.reader([line], skipinitialspace=True))]
        except csv.Error as error:
            raise DataFileError(f"{path}, line {number}: not a CSV row, {error}", row=number, path=path) from error
        if header is None:
            header = cells
            lacking = [column for column in NEEDED if column not in header]
            if lacking or len(set(header)) != len(header):
                raise DataFileError(
                    f"{path}, line {number}: the header is {', '.join(header)}; needed are "
                    f"{', '.join(NEEDED)}, each once (and, if wanted, reference and clock)"
                    + (f"; missing: {', '.join(lacking)}" if lacking else "")
                    + _delimiter_hint(header),
                    row=number,
                    path=path,
                )
            continue
        if len(cells) != len(header):
            raise DataFileError(
                f"{path}, line {number}: {len(cells)} cells under a header of {len(header)}", row=number, path=path
            )
        numbers.append(number)
        rows.append(dict(zip(header, cells, strict=True)))
    if not rows:
        raise DataFileError(
            f"the clock log {path} holds no comparison; one row each is needed under the header", path=path
        )
    return numbers, rows


def _delimiter_hint(header: list[str]) -> str:
    found = [character for character in ";\t|" if len(header) == 1 and character in header[0]]
    return f" (the header holds {found[0]!r}: a log is separated by commas)" if found else ""


def _single(values: list[str] | None, default: str, column: str, numbers: list[int], path: Path) -> str:
    """The one value of a column that must not vary."""
    if values is None or not any(values):
        return default
    for number, value in zip(numbers, values, strict=True):
        if value != values[0]:
            raise DataFileError(
                f"{path}, line {number}: {column} is {value!r} here and {values[0]!r} at the top; "
                f"one file holds one clock and one reference",
                row=number,
                path=path,
            )
    return values[0]


def _number(text: str, column: str, row: int, path: Path) -> Decimal:
    try:
        value = Decimal(text)
    except InvalidOperation:
        value = Decimal("NaN")
    if not value.is_finite() or "_" in text or value.copy_abs() > LARGEST_OFFSET_S:
        raise DataFileError(
            f"{path}, line {row}: {column} is {text!r}; a finite number of seconds from -1e9 to 1e9 is needed"
            + (" (or an empty cell where the comparison failed)" if column == "offset_s" else ""),
            row=row,
            path=path,
        )
    return value


def _exact_number(text: str, column: str, row: int, path: Path) -> tuple[int, float]:
    """Decimal text as whole seconds and a fraction that is rounded once."""
    value = _number(text, column, row, path)
    whole = int(value.to_integral_value(rounding="ROUND_FLOOR"))
    fraction = float(value - whole)
    return (whole, fraction) if fraction < 1.0 else (whole + 1, 0.0)
