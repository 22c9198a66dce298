"""Gravity models in the open text layout of the ICGEM service (.gfc): a head of keywords, then a row per coefficient.

Layout: Barthelmes & Foerste 2011, *The ICGEM-format* (versions icgem1.0 and 2.0). The head ends with `end_of_head`; of
it are read `format`, `product_type`, `modelname`, `earth_gravity_constant` (or `gravity_constant`), `radius`,
`max_degree`, `errors`, `norm` and `tide_system`; other lines are comments. A row is

    gfc  L  M  C  S  [sigma_C  sigma_S  [formal sigma_C  sigma_S]]

with D or E exponents. A model that changes in time has rows of the same kind with more columns: gfct (the value at t0),
trnd (per year), acos and asin (with a period in years),

    C(t) = C(t0) + trnd (t - t0) + sum [acos cos(2 pi (t - t0)/T) + asin sin(2 pi (t - t0)/T)],

and in icgem2.0 the interval from t0 to t1 in which each holds. It is evaluated at one stated epoch, or refused.

Degree 0 that is not given is 1, and degree 1 that is not given is 0, which is what GM and the centre of mass mean; from
degree 2 on every coefficient must be there.
"""

from __future__ import annotations

import math
import re
from datetime import datetime
from pathlib import Path
from typing import Final, NamedTuple, NoReturn

import numpy as np

from ...errors import InvalidInput
from ...exact import FloatArray
from .icgem_head import TIDE_SYSTEMS, VARIABLE, GfcFile, Head, read_head

__all__ = ["MAX_DEGREE", "TIDE_SYSTEMS", "Coefficients", "gfc_bytes", "read_gfc"]

MAX_DEGREE: Final = 2700
"""Highest degree that the recursions here hold in float64."""

_DATE: Final = re.compile(r"(\d{8})(?:\.(\d{1,4}))?", re.ASCII)
_J2000: Final = datetime(2000, 1, 1, 12)


class Coefficients(NamedTuple):
    """What a file holds: fully normalised C_nm and S_nm, row n and column m, with the constants that go with them."""

    name: str
    gm_m3_s2: float
    radius_m: float
    c: FloatArray
    s: FloatArray
    tide_system: str


class _Term(NamedTuple):
    """A row that changes a coefficient in time; `start` is NaN where the gfct row tells it."""

    row: int
    key: str
    degree: int
    order: int
    c: float
    s: float
    start: float
    period: float


def read_gfc(path: Path, max_degree: int | None = None, epoch_jyear: float | None = None) -> Coefficients:
    """Read a gravity model of the ICGEM layout, whole or up to a degree.

    Parameters
    ----------
    path : Path
        The .gfc file.
    max_degree : int, optional
        Rows of higher degree are passed over, with no more than a look at their keyword and degree.
    epoch_jyear : float, optional
        Julian year of TT at which a model that varies with time is evaluated; needed for such a one.

    Raises
    ------
    DataFileError
        Missing file, another product, format, normalisation or keyword, rows that are damaged, double or missing, or
        that vary with time without an epoch or not at the epoch; with the path and the row, counted from 1.
    InvalidInput
        `max_degree` that is not an integer from 2 to the file's own, or an epoch out of range.
    """
    if epoch_jyear is not None and not 1800.0 <= epoch_jyear <= 2200.0:
        raise InvalidInput(f"epoch_jyear is a Julian year of 1800 to 2200 such as 2026.5, got {epoch_jyear!r}")
    file = GfcFile(path)
    rows = file.rows()
    head = read_head(file, rows)
    keep = head.max_degree if max_degree is None else max_degree
    if isinstance(keep, bool) or not isinstance(keep, int) or not 2 <= keep <= head.max_degree:
        raise InvalidInput(
            f"max_degree must be an integer of 2 to {head.max_degree}, the degree of {path}, got {max_degree!r}",
            path=path,
        )
    if keep > MAX_DEGREE:
        raise InvalidInput(
            f"{path} reaches degree {keep}; here at most {MAX_DEGREE} is evaluated: give max_degree", path=path
        )
    table = _Table(file, head, keep, epoch_jyear)
    for words in rows:
        table.take(words)
    table.finish()
    return Coefficients(head.name, head.gm_m3_s2, head.radius_m, table.c, table.s, head.tide_system)


class _Table:
    """Coefficients as their rows come in."""

    def __init__(self, file: GfcFile, head: Head, keep: int, epoch: float | None) -> None:
        self.file, self.head, self.keep, self.epoch = file, head, keep, epoch
        shape = (keep + 1, keep + 1)
        self.c, self.s = np.zeros(shape), np.zeros(shape)
        self.seen = np.zeros(shape, dtype=np.int64)
        self.start: dict[tuple[int, int], float] = {}
        self.terms: list[_Term] = []
        self.elsewhen = 0  # last row whose interval does not hold the epoch

    def take(self, words: list[str]) -> None:
        file, key = self.file, words[0]
        if key != "gfc":
            self._variable(key)
        if len(words) < 2:
            file.fail(f"a row is {key} L M C S and so on, got one word: is the file cut off?")
        degree = file.integer(words[1], "the degree L", 0, self.head.max_degree)
        if degree > self.keep:
            return
        width = 5 + self.head.sigmas
        dates, period = 0, key in ("acos", "asin")
        if key != "gfc":
            dates = 2 if self.head.intervals else int(key == "gfct")
        if len(words) != width + dates + period:
            file.fail(
                f"a row of {key} has {width + dates + period} columns here ({key} L M C S, with errors "
                f"{self.head.errors!r} in the head {self.head.sigmas} sigmas, {dates} dates, {int(period)} periods), "
                f"got {len(words)}: is the file damaged or cut off?"
            )
        order = file.integer(words[2], "the order M", 0, degree)
        c, s = file.number(words[3], "C"), file.number(words[4], "S")
        if order == 0 and s != 0.0:
            file.fail(f"S of order 0 must be 0, got {words[4]}")
        for word in words[5:width]:
            if file.number(word, "a sigma") < 0.0:
                file.fail(f"a sigma must not be negative, got {word}")
        times = [self._jyear(word) for word in words[width : width + dates]]
        if len(times) == 2:
            if times[1] <= times[0]:
                file.fail(f"the interval from {words[width]} to {words[width + 1]} ends before it begins")
            if self.epoch is None or not times[0] <= self.epoch < times[1]:
                self.elsewhen = file.row
                return
        if key in ("gfc", "gfct"):
            if self.seen[degree, order]:
                file.fail(f"degree {degree}, order {order} stands in row {self.seen[degree, order]} already")
            self.seen[degree, order] = file.row
            self.c[degree, order], self.s[degree, order] = c, s
            if times:
                self.start[degree, order] = times[0]
            return
        length = file.number(words[-1], "the period") if period else math.inf
        if length <= 0.0:
            file.fail(f"the period must be a number of years above 0, got {words[-1]}")
        self.terms.append(_Term(file.row, key, degree, order, c, s, times[0] if times else math.nan, length))

    def _variable(self, key: str) -> None:
        if key not in VARIABLE:
            self.file.fail(f"unknown keyword {key!r:.40}; rows here begin with gfc, {', '.join(VARIABLE)}")
        if self.epoch is None:
            self.file.fail(
                f"{key} makes the model vary with time: give epoch_jyear to evaluate it at, or take a static model"
            )

    def _jyear(self, text: str) -> float:
        """Julian year of a date written yyyymmdd or yyyymmdd.hhmm."""
        match = _DATE.fullmatch(text)
        try:
            if match is None:
                raise ValueError("not eight digits")
            date = datetime.strptime(match[1] + (match[2] or "").ljust(4, "0"), "%Y%m%d%H%M")
        except ValueError:
            self.file.fail(f"a date is written yyyymmdd or yyyymmdd.hhmm, got {text!r:.40}")
        return 2000.0 + (date - _J2000).total_seconds() / (365.25 * 86400.0)

    def finish(self) -> None:
        """Add what varies with time, and see that all is there."""
        file, c, s, seen = self.file, self.c, self.s, self.seen
        for term in self.terms:
            place = term.degree, term.order
            start = term.start if math.isfinite(term.start) else self.start.get(place)
            if start is None or place not in self.start:
                file.fail(f"{term.key} of degree {place[0]}, order {place[1]} has no row gfct to start from", term.row)
            assert self.epoch is not None
            years = self.epoch - start
            angle = 2.0 * math.pi * years / term.period
            factor = {"acos": math.cos(angle), "asin": math.sin(angle)}.get(term.key, years)
            c[place] += factor * term.c
            s[place] += factor * term.s
        missing = np.argwhere(
            (seen == 0) & (np.arange(self.keep + 1)[:, None] >= 2) & np.tri(self.keep + 1, dtype=bool)
        )
        if len(missing):
            self._missing(len(missing), *missing[0].tolist())
        if not seen[0, 0]:
            c[0, 0] = 1.0
        elif abs(c[0, 0] - 1.0) > 1e-3:
            file.fail(f"C of degree 0 must be 1 to a part in 1000, got {c[0, 0]!r}", int(seen[0, 0]))

    def _missing(self, number: int, degree: int, order: int) -> NoReturn:
        what = f"{number} coefficients up to degree {self.keep} are missing, first degree {degree}, order {order}"
        if self.elsewhen:
            self.file.fail(f"{what}: epoch_jyear {self.epoch} lies outside the intervals of their rows", self.elsewhen)
        self.file.fail(f"the file ends, and {what}: it is cut off, or its max_degree is wrong")


def gfc_bytes(coefficients: Coefficients) -> bytes:
    """Text of a file that `read_gfc` reads back to the same bits, without sigmas."""
    name = "_".join(coefficients.name.split())
    if not name.isascii():
        raise InvalidInput(f"the name of a model must be ASCII to stand in a .gfc file, got {coefficients.name!r}")
    if len(coefficients.c) < 3:
        raise InvalidInput("a .gfc file holds degree 2 at least; this field ends before")
    lines = [
        "begin_of_head",
        "format icgem1.0",
        "product_type gravity_field",
        f"modelname {name}",
        f"earth_gravity_constant {coefficients.gm_m3_s2!r}",
        f"radius {coefficients.radius_m!r}",
        f"max_degree {len(coefficients.c) - 1}",
        "errors no",
        "norm fully_normalized",
        f"tide_system {coefficients.tide_system}",
        "end_of_head",
    ]
    for n, (c, s) in enumerate(zip(coefficients.c.tolist(), coefficients.s.tolist(), strict=True)):
        lines += [f"gfc {n} {m} {c[m]!r} {s[m]!r}" for m in range(n + 1)]
    return ("\n".join(lines) + "\n").encode("ascii")
