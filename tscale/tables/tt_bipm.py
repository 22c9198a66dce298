"""TT(BIPM): realisations of Terrestrial Time that the BIPM computes afterwards, read from its TTBIPM files.

Layout of those files (BIPM Time Department, `ttbipm/TTBIPM.xx`): prose, then rows every ten days at 0h UTC with MJD,
TT(BIPMxx)-EAL-32.184 s and TT(BIPMxx)-TAI-32.184 s, both in microseconds. Three decimals up to MJD 52729, four after.
"""

from __future__ import annotations

import re
from dataclasses import dataclass
from pathlib import Path
from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt

from ..errors import DataFileError, InvalidInput, OutOfSpan
from ..exact import BoolArray, FloatArray, IntArray, Pair
from ..formats.leap_seconds import LeapSeconds
from .common import FrozenArrays, as_pair, locate, mjd_date, read_file, rows_hash, since, tai_of_days

__all__ = ["TTBIPM", "Extension"]

_STEP_DAYS: Final = 10
_LARGEST_STEP_US: Final = 2.0  # 0.8 us between the first rows, of 1975; since 1977 below 0.2
# Early rows lack the point after the MJD, and columns may touch. Both have three or both four decimals, which tells
# where one ends, and where a row was cut off.
_ROW: Final = re.compile(
    rb"\s*(\d{5})(?:\.\s*|\s+|(?=[-+]))"
    rb"(?:[-+]?\d*\.\d{3}\s*([-+]?\d*\.\d{3})|[-+]?\d*\.\d{4}\s*([-+]?\d*\.\d{4}))\s*"
)
# Two numbers or more behind the day, each step of the pattern up to the next point: no digit can belong to two of them,
# so that no line takes long.
_BARE: Final = re.compile(rb"\s*\d{5}\.?\s*+[-+]?+\d*+\.(?:\d++\s*+[-+]?+\d*+\.)++\d++\s*")
_NUMBERS: Final = re.compile(rb"\.\d{3,4}(?!\d)")
_LIKE_A_ROW: Final = re.compile(rb"\s*\d{5}(?:\.\s|\.$|\s|$|\.?\s*[-+]?\d*\.\d)")
_NAME: Final = re.compile(r"TTBIPM\.?(\d{2,4})", re.IGNORECASE)
_RESOLUTION_S: Final = 1e-9


class Extension(NamedTuple):
    """A straight line that carries a realisation past its last row, as the head of each file offers one.

    TT(BIPM) - TAI - 32.184 s = `offset_s` + `rate_s_per_day` * (MJD - `reference_mjd`), up to `end_mjd`.
    """

    reference_mjd: int
    offset_s: float
    rate_s_per_day: float
    end_mjd: int


@dataclass(frozen=True, eq=False, repr=False)
class TTBIPM(FrozenArrays):
    """One realisation of TT. Make one with `load` or `from_rows`.

    Attributes
    ----------
    scale : str
        Name of the realisation as a scale: `TT(BIPM23)`.
    name : str
        Shown in messages and provenance.
    mjd : int array
        Days (MJD, 0h UTC) of the rows, with the end of the extension if there is one.
    sha256 : str
        Of the file's bytes, or of the rows.
    issued : str or None
        Date of the last row, before any extension.
    path : pathlib.Path or None
        The file.
    stated : bool
        Whether its uncertainty was told to `load`; else that of the rounding is all there is.

    Notes
    -----
    Straight lines between the rows: over ten days TT(BIPM)-TAI moves by a few ns and bends by less than the 0.1 ns of
    the table.
    """

    scale: str
    name: str
    mjd: IntArray
    sha256: str
    issued: str | None
    path: Path | None
    _tai: Pair
    _start_s: FloatArray
    _slope: FloatArray
    _sigma_s: FloatArray
    stated: bool = False

    @classmethod
    def load(
        cls,
        path: str | Path,
        *,
        name: str | None = None,
        extension: Extension | None = None,
        uncertainty_s: float | None = None,
        leap_seconds: LeapSeconds | None = None,
    ) -> TTBIPM:
        """Read a TTBIPM file; only its rows are read, never its prose.

        Parameters
        ----------
        path : str or Path
            The file.
        name : str, optional
            Realisation, `BIPM23` or `TT(BIPM23)`. Default: from the file name, so that `TTBIPM.08` is TT(BIPM08).
        extension : Extension, optional
            Line past the last row, as read by a person in the file's head. Without it the table ends at its last row.
        uncertainty_s : float, optional
            Standard uncertainty of the offset. Default: rounding of the rows, 1 ns / sqrt(12) for those with three
            decimals and 0.1 ns / sqrt(12) for those with four.
        leap_seconds : LeapSeconds, optional
            Says when 0h UTC was.

        Raises
        ------
        DataFileError
            With path and row, where the file is missing, damaged or holds no row.
        """
        path = Path(path)
        content, sha256 = read_file(path, "TT(BIPM) file")
        mjd, offset_us, resolution_s = _parse(content, path)
        if name is None:
            match = _NAME.match(path.name)
            if match is None:
                raise InvalidInput(
                    f"{path.name} does not name a realisation: rename the file as the BIPM does, to TTBIPM.23 for "
                    f"TT(BIPM23), or in Python give name='BIPM23'",
                    path=path,
                )
            name = f"BIPM{match[1]}"
        sigma = resolution_s / np.sqrt(12.0)
        return _build(
            mjd, offset_us * 1e-6, sigma, name, path.name, sha256, path, extension, uncertainty_s, leap_seconds
        )

    @classmethod
    def from_rows(
        cls,
        name: str,
        mjd: npt.ArrayLike,
        offset_s: npt.ArrayLike,
        *,
        extension: Extension | None = None,
        uncertainty_s: float | None = None,
        leap_seconds: LeapSeconds | None = None,
    ) -> TTBIPM:
        """Make a table from whole days (MJD) and TT(BIPM)-TAI-32.184 s; at least two rows, days increasing.

        Without `uncertainty_s` they are taken as rounded to 1 ns.
        """
        day, offset = np.asarray(mjd, dtype=np.float64), np.asarray(offset_s, dtype=np.float64)
        if day.ndim != 1 or day.shape != offset.shape or len(day) < 2:
            raise InvalidInput(
                f"TT(BIPM) rows are two lists of one length, 2 or more; got shapes {day.shape}, {offset.shape}"
            )
        bad = ~np.isfinite(offset) | (np.floor(day) != day) | (np.diff(day, prepend=day[0] - 1) <= 0)
        if bad.any():
            raise InvalidInput("TT(BIPM) rows need whole, increasing MJD and finite offsets (see .mask)", mask=bad)
        sha256 = rows_hash(day, offset)
        sigma = np.full(len(day), _RESOLUTION_S / np.sqrt(12.0))
        mjd = day.astype(np.int64)
        return _build(mjd, offset, sigma, name, name, sha256, None, extension, uncertainty_s, leap_seconds)

    @property
    def span(self) -> tuple[int, int]:
        """First and last day (MJD, 0h UTC), with the extension if one was given."""
        return int(self.mjd[0]), int(self.mjd[-1])

    def __repr__(self) -> str:
        return f"<TTBIPM {self.scale} {mjd_date(self.mjd[0])} to {mjd_date(self.mjd[-1])}>"

    def offset_s(self, tai: Pair) -> FloatArray:
        """TT(BIPM) - TAI - 32.184 s at TAI counts, s.

        Raises
        ------
        OutOfSpan
            Outside the rows (and the extension, if one was given), with the mask.
        """
        interval, elapsed_s = self._find(tai)
        return np.asarray(self._start_s[interval] + self._slope[interval] * elapsed_s)

    def rate(self, tai: Pair) -> FloatArray:
        """d(TT(BIPM))/d(TAI) - 1 at TAI counts."""
        return np.asarray(self._slope[self._find(tai)[0]])

    def uncertainty_s(self, tai: Pair) -> FloatArray:
        """Give the standard uncertainty of the offset at TAI counts, s: as told to `load`, else the rounding of the
        coarser of the two rows around.
        """
        interval, _ = self._find(tai)
        return np.asarray(np.maximum(self._sigma_s[interval], self._sigma_s[interval + 1]))

    def _find(self, tai: Pair) -> tuple[IntArray, FloatArray]:
        tai = as_pair(tai)
        first, last = (self._tai[0][0], self._tai[1][0]), (self._tai[0][-1], self._tai[1][-1])
        # A date that came back from TT(BIPM) may miss an end by a rounding.
        bad: BoolArray = np.asarray((since(first, tai) < -1e-9) | (since(last, tai) > 1e-9))
        if bad.any():
            raise OutOfSpan(
                f"{np.count_nonzero(bad)} of {bad.size} instants are outside the table of {self.scale}, {self.name!r}, "
                f"which spans {mjd_date(self.mjd[0])} to {mjd_date(self.mjd[-1])} (0h UTC); load a newer file, or give "
                f"the extension printed in its head",
                mask=bad,
            )
        interval = np.clip(locate(self._tai, tai), 0, len(self._slope) - 1)
        return interval, since((self._tai[0][interval], self._tai[1][interval]), tai)


def _parse(content: bytes, path: Path) -> tuple[IntArray, FloatArray, FloatArray]:
    """Days, offsets (us), and the step that each is rounded to (s)."""
    days: list[int] = []
    steps: list[float] = []
    offsets: list[float] = []
    for number, line in enumerate(content.splitlines(), 1):
        match = _ROW.fullmatch(line)
        if match is None:
            # Before the first row prose may begin with a number, but not go on with two of a table's.
            like = days or _BARE.fullmatch(line) or len(_NUMBERS.findall(line)) > 1
            if like and _LIKE_A_ROW.match(line):
                raise DataFileError(
                    f"{path}, line {number}: a damaged row, {line.decode(errors='replace').strip()!r:.120}; MJD and "
                    "two numbers in us are read, both with three or both with four decimals",
                    row=number,
                    path=path,
                )
            continue
        day = int(match[1])
        if days and day != days[-1] + _STEP_DAYS:
            raise DataFileError(
                f"{path}, line {number}: MJD {day} ({mjd_date(day)}) after {days[-1]}, where rows are "
                f"{_STEP_DAYS} days apart; a row is missing, doubled or damaged",
                row=number,
                path=path,
            )
        offset_us = float(match[2] or match[3])
        if days and abs(offset_us - offsets[-1]) > _LARGEST_STEP_US:
            raise DataFileError(
                f"{path}, line {number}: TT(BIPM)-TAI moves from {offsets[-1]} to {offset_us} us, where ten days bring "
                f"less than {_LARGEST_STEP_US:g}; a digit is wrong in this row or the one before",
                row=number,
                path=path,
            )
        days.append(day)
        offsets.append(offset_us)
        steps.append(_RESOLUTION_S if match[2] else _RESOLUTION_S / 10.0)
    if len(days) < 2:
        raise DataFileError(
            f"{path} holds {len(days)} rows of MJD, TT(BIPM)-EAL, TT(BIPM)-TAI (us); two or more are needed", path=path
        )
    return np.array(days), np.array(offsets), np.array(steps)


def _build(
    mjd: IntArray,
    offset_s: FloatArray,
    rounding_s: FloatArray,
    name: str,
    table: str,
    sha256: str,
    path: Path | None,
    extension: Extension | None,
    uncertainty_s: float | None,
    leap_seconds: LeapSeconds | None,
) -> TTBIPM:
    scale = name if name.startswith("TT(") else f"TT({name})"
    if re.fullmatch(r"TT\([^()\s@]+\)", scale) is None:
        raise InvalidInput(f"{name!r} does not name a realisation; for example name='BIPM23'")
    sigma = rounding_s if uncertainty_s is None else np.full(len(mjd), float(uncertainty_s))
    if not np.all(np.isfinite(sigma) & (sigma >= 0.0)):
        raise InvalidInput(f"uncertainty_s must be finite and not negative, got {uncertainty_s!r}")
    issued = mjd_date(mjd[-1])
    first, last = offset_s[:-1], offset_s[1:]
    if extension is not None:
        origin, at_origin, rate, limit = extension
        if not (np.isfinite(at_origin) and np.isfinite(rate)) or limit <= mjd[-1]:
            raise InvalidInput(
                f"an extension needs finite numbers and an end after the last row, MJD {mjd[-1]} ({issued}); "
                f"got {extension}"
            )
        # The line itself from the last row on, also where that leaves a small step.
        first = np.append(first, at_origin + rate * (mjd[-1] - origin))
        last = np.append(last, at_origin + rate * (limit - origin))
        mjd, sigma = np.append(mjd, limit), np.append(sigma, sigma[-1])
        sha256 = rows_hash(np.frombuffer(sha256.encode(), dtype=np.uint8), np.array(extension, dtype=np.float64))
    leap = LeapSeconds.default() if leap_seconds is None else leap_seconds
    tai = tai_of_days(mjd, leap)[0]
    length_s = since((tai[0][:-1], tai[1][:-1]), (tai[0][1:], tai[1][1:]))
    slope, stated = (last - first) / length_s, uncertainty_s is not None
    return TTBIPM(scale, table, mjd, sha256, issued, path, tai, first, slope, sigma, stated)
