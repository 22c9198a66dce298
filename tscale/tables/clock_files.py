"""Reader of clock comparison files: CSV with a header, one comparison a row.

Columns, in any order: `epoch` (ISO 8601 label of the reference scale), `offset_s` (clock minus reference, s; empty
where the comparison failed), `uncertainty_s` (standard uncertainty, s); and, the same in every row, `reference` (a
scale labelled like UTC; default UTC) and `clock` (default: the file's name). Lines that start with `#` are comments.
Other columns are let be.
"""

from __future__ import annotations

import csv
from decimal import Decimal, InvalidOperation
from pathlib import Path
from typing import Final

import numpy as np

from ..errors import DataFileError, InvalidInput
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from .clock_rows import ClockRows, clock_scale, reference_scale
from .common import read_file

__all__ = ["parse_clock_file"]

_NEEDED: Final = ("epoch", "offset_s", "uncertainty_s")
_LARGEST_OFFSET_S: Final = 1e9


def parse_clock_file(path: Path, name: str | None, leap_seconds: LeapSeconds | None) -> ClockRows:
    """Read a comparison file; `DataFileError` with path and row for whatever is wrong with it."""
    content, sha256 = read_file(path, "clock log")
    numbers, cells = _cells(content, path)
    columns = {column: [row[column] for row in cells] for column in cells[0]}
    reference = _single(columns.get("reference"), "UTC", "reference", numbers, path)
    clock = name if name is not None else _single(columns.get("clock"), path.stem, "clock", numbers, path)
    try:
        scale, kind = clock_scale(clock), reference_scale(reference)
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
    whole = np.zeros(len(cells), dtype=np.int64)
    fraction = np.zeros(len(cells))
    sigma = np.zeros(len(cells))
    for place, (row, offset, uncertainty) in enumerate(
        zip(numbers, columns["offset_s"], columns["uncertainty_s"], strict=True)
    ):
        if offset:
            whole[place], fraction[place] = _exact_number(offset, "offset_s", row, path)
            sigma[place] = float(_number(uncertainty, "uncertainty_s", row, path))
            if sigma[place] < 0.0:
                raise DataFileError(
                    f"{path}, line {row}: uncertainty_s is {uncertainty}; a standard uncertainty is zero or more",
                    row=row,
                    path=path,
                )
    return ClockRows(scale.name, kind.name, epoch, (whole, fraction), missing, sigma, numbers, sha256)


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
            lacking = [column for column in _NEEDED if column not in header]
            if lacking or len(set(header)) != len(header):
                raise DataFileError(
                    f"{path}, line {number}: the header is {', '.join(header)}; needed are "
                    f"{', '.join(_NEEDED)}, each once (and, if wanted, reference and clock)"
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
    if not value.is_finite() or "_" in text or abs(value) > _LARGEST_OFFSET_S:
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
