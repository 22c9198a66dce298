"""Head of a .gfc file: its keywords, and the text from which all of the file is read."""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from functools import partial
from pathlib import Path
from typing import Final, NamedTuple, NoReturn

from ...errors import DataFileError

__all__ = ["TIDE_SYSTEMS", "VARIABLE", "GfcFile", "Head", "read_head"]

_LONGEST_LINE: Final = 1 << 20
_LONGEST_HEAD: Final = 100_000

TIDE_SYSTEMS: Final = ("tide_free", "zero_tide", "mean_tide", "unknown")

VARIABLE: Final = ("gfct", "trnd", "dot", "acos", "asin")
"""Keywords of rows that make a model vary with time."""

_SIGMAS: Final = {"no": 0, "unknown": 2, "calibrated": 2, "formal": 2, "calibrated_and_formal": 4}
_ALLOWED: Final = {
    "format": ("icgem1.0", "icgem2.0"),
    "product_type": ("gravity_field",),
    "norm": ("fully_normalized",),
    "errors": tuple(_SIGMAS),
    "tide_system": TIDE_SYSTEMS,
}
_GM: Final = ("earth_gravity_constant", "gravity_constant")
_KEYS: Final = (*_ALLOWED, *_GM, "modelname", "radius", "max_degree")
_NEEDED: Final = ("product_type", "modelname", "radius", "max_degree")
_D_NUMBER: Final = re.compile(r"[+-]?(\d+\.?\d*|\.\d+)[dD][+-]?\d+", re.ASCII)
_EXPONENT: Final = str.maketrans("dD", "ee")


class Head(NamedTuple):
    """What the head says: the model's name, constants and highest degree, and how its rows are laid out."""

    name: str
    gm_m3_s2: float
    radius_m: float
    max_degree: int
    errors: str
    tide_system: str
    intervals: bool
    """Rows that vary with time carry an interval (icgem2.0)."""

    @property
    def sigmas(self) -> int:
        """Columns of uncertainties."""
        return _SIGMAS[self.errors]


class GfcFile:
    """A file being read: where it stands, for messages."""

    def __init__(self, path: Path) -> None:
        self.path, self.row = path, 0

    def fail(self, what: str, row: int | None = None) -> NoReturn:
        """Raise `DataFileError` at a row, by default the current one."""
        row = self.row if row is None else row
        raise DataFileError(f"{self.path}, row {row}: {what}", path=self.path, row=row)

    def number(self, text: str, what: str, row: int | None = None) -> float:
        """Read a finite number with an E or D exponent."""
        try:
            value = float(text)
        except ValueError:
            value = float(text.translate(_EXPONENT)) if _D_NUMBER.fullmatch(text) else math.inf
        if not math.isfinite(value) or "_" in text:
            self.fail(f"{what} must be a finite number such as -0.484165143790815D-03, got {text!r:.40}", row)
        return value

    def integer(self, text: str, what: str, lowest: int, highest: int, row: int | None = None) -> int:
        """Read an integer within limits."""
        if not (text.isascii() and text.isdigit() and len(text) < 9 and lowest <= int(text) <= highest):
            self.fail(f"{what} must be an integer of {lowest} to {highest}, got {text!r:.40}", row)
        return int(text)

    def rows(self) -> Iterator[list[str]]:
        """Every row that is not blank, as words."""
        if "\0" in str(self.path):
            raise DataFileError(f"cannot read {str(self.path)!r}: a path cannot hold a NUL character", path=self.path)
        try:
            # Comments of the head may be in any encoding; all that is read here is ASCII.
            with self.path.open(encoding="latin-1") as stream:
                for self.row, line in enumerate(iter(partial(stream.readline, _LONGEST_LINE), ""), start=1):
                    if len(line) == _LONGEST_LINE:
                        self.fail(f"a line of {_LONGEST_LINE} characters or more: it is no .gfc file")
                    words = line.split()
                    if words:
                        yield words
        except OSError as error:
            raise DataFileError(f"cannot read {self.path}: {error.strerror or error}", path=self.path) from error


def read_head(file: GfcFile, rows: Iterator[list[str]]) -> Head:
    """Read up to `end_of_head`; all before `begin_of_head`, where that is given, is comment."""
    lines: list[tuple[int, list[str]]] = []
    for words in rows:
        if words[0] == "end_of_head":
            break
        if file.row > _LONGEST_HEAD:
            file.fail(f"no end_of_head in {_LONGEST_HEAD} rows: it is no .gfc file")
        if words[0] == "begin_of_head":
            lines.clear()
        elif words[0] == "gfc" or words[0] in VARIABLE:
            file.fail(f"a row of {words[0]} before end_of_head: the head must end with that keyword")
        elif words[0] in _KEYS:
            lines.append((file.row, words))
    else:
        file.fail("the file ends before end_of_head: it is no .gfc file, or cut off")
    found: dict[str, tuple[str, int]] = {}
    for row, words in lines:
        key = words[0]
        if len(words) < 2:
            file.fail(f"{key} has no value", row)
        if key in found:
            file.fail(f"{key} stands in row {found[key][1]} already", row)
        if key in _ALLOWED and words[1] not in _ALLOWED[key]:
            file.fail(f"{key} {words[1]!r:.40} is not read here; allowed is {', '.join(_ALLOWED[key])}", row)
        found[key] = words[1], row
    lacking = [key for key in _NEEDED if key not in found]
    given = [key for key in _GM if key in found]
    if not given:
        lacking.append(_GM[0])
    if lacking:
        file.fail(f"the head lacks {', '.join(lacking)}")
    if len(given) > 1:
        file.fail(f"the head gives both {' and '.join(given)}; give one")

    def constant(key: str, lowest: float, highest: float) -> float:
        text, row = found[key]
        value = file.number(text, key, row)
        if not lowest <= value <= highest:
            file.fail(f"{key} must lie within {lowest:g} to {highest:g} (SI units), got {text}", row)
        return value

    text, row = found["max_degree"]
    return Head(
        found["modelname"][0],
        constant(given[0], 1e2, 1e22),
        constant("radius", 1e2, 1e10),
        file.integer(text, "max_degree", 2, 99_999, row),
        found.get("errors", ("no", 0))[0],
        found.get("tide_system", ("unknown", 0))[0],
        found.get("format", ("icgem1.0", 0))[0] == "icgem2.0",
    )
