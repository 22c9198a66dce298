"""Leap seconds and the drift years: UTC labels to elapsed SI seconds and back.

UTC is held as a *count*: SI seconds elapsed since the instant labelled 2000-01-01T12:00:00 UTC, that is the TAI
count less 32 s. A *label* is a day (MJD) and the seconds of that day as a clock face shows them: 86400 and more
inside a leap second (ITU-R TF.460-6, annex 1, section 2), and stretched by 13 to 30 parts in 10**9 from 1961 to 1971.
"""

from __future__ import annotations

import hashlib
from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from functools import lru_cache
from pathlib import Path
from typing import Any, Final

import numpy as np
import numpy.typing as npt

from ..constants import MJD_J2000
from ..errors import DataFileError, InvalidInput, OutOfSpan, TextError
from ..exact import BoolArray, FloatArray, IntArray, Pair
from .checks import Label, days, first_item, label, pair
from .gregorian import date_from_mjd
from .leap_second_files import read_leap_file
from .leap_second_rows import DRIFT_ROWS, LeapRow, day_number, row_of
from .leap_second_table import Spans

__all__ = ["LeapRow", "LeapSeconds", "day_words"]

_DAY: Final = 86400
_HALF: Final = 43200


def day_words(mjd: Any) -> str:
    """Spell a day for messages: calendar date and MJD."""
    year, month, day = date_from_mjd(mjd)
    return f"{year}-{month:02d}-{day:02d} (MJD {mjd})"


@dataclass(frozen=True)
class LeapSeconds:
    """A table of TAI - UTC.

    Make one with `default`, `load` or `from_rows`. After `expires_mjd` the last row goes on, as it must for any date
    to be given ahead; `is_expired` tells which instants that touches.

    Attributes
    ----------
    rows : tuple of LeapRow
        The spans of UTC, oldest first.
    name : str
        Where the table comes from.
    sha256 : str
        Of the bytes of the file, or of the rows if there is no file.
    expires_mjd : int or None
        MJD (UTC) up to which the issuer vouches for the table; None where nothing is said.
    issued : str or None
        Issue, in the words of the issuer.
    path : pathlib.Path or None
        The file.
    """

    rows: tuple[LeapRow, ...] = field(repr=False)
    name: str
    sha256: str
    expires_mjd: int | None = None
    issued: str | None = None
    path: Path | None = None
    _spans: Spans = field(init=False, repr=False, compare=False)

    def __post_init__(self) -> None:
        object.__setattr__(self, "_spans", Spans.of(self.rows))
        if self.expires_mjd is not None and self.expires_mjd <= self.start_mjd:
            raise InvalidInput(
                f"a table that starts on {day_words(self.start_mjd)} cannot expire on {day_words(self.expires_mjd)}"
            )

    @classmethod
    def default(cls) -> LeapSeconds:
        """Read the table of the installed `astropy-iers-data` package, preceded by the drift years (once)."""
        return _default()

    @classmethod
    def load(cls, path: str | Path) -> LeapSeconds:
        """Read an IERS `Leap_Second.dat` or an IETF/IANA `leap-seconds.list`; the drift years are put before it.

        Raises
        ------
        DataFileError
            With path and row, where the file is missing, damaged or of another kind.
        """
        path = Path(path)
        file = read_leap_file(path)
        try:
            return cls(DRIFT_ROWS + file.rows, path.name, file.sha256, file.expires_mjd, file.issued, path)
        except InvalidInput as error:
            raise DataFileError(f"{path}: {error}", path=path) from error

    @classmethod
    def from_rows(
        cls,
        rows: Iterable[Sequence[Any]],
        name: str = "rows",
        *,
        expires_mjd: int | None = None,
        issued: str | None = None,
    ) -> LeapSeconds:
        """Make a table of one's own, such as one with a negative leap second.

        Parameters
        ----------
        rows : iterable of (mjd, tai_minus_utc_s) or (mjd, tai_minus_utc_s, reference_mjd, rate_s_per_day)
            First day of each span and TAI - UTC in seconds: at any time of the span, or at 0h of `reference_mjd`
            with a growth per UTC day. Steps may have any sign and any size below half a day.
        name : str
            Shown in messages and provenance.
        expires_mjd : int, optional
            Day from which the table is no longer vouched for.
        issued : str, optional
            Free text.

        Raises
        ------
        InvalidInput
            Unless days increase, values are whole nanoseconds, rates are whole ns per second, and TAI - UTC is a
            constant 32 s on 2000-01-01 (on which every UTC count hangs).
        """
        made = tuple(row_of(row) for row in rows)
        canonical = "\n".join(" ".join(map(str, row)) for row in made)
        return cls(made, name, hashlib.sha256(canonical.encode()).hexdigest(), day_number(expires_mjd), issued)

    def with_step(self, mjd: int, tai_minus_utc_s: Any) -> LeapSeconds:
        """Append one more span: from 0h UTC of `mjd` on, TAI - UTC is `tai_minus_utc_s`.

        `mjd` must come after the last row. The expiry stays as it is (see `with_expiry`).
        """
        rows = (*self.rows, row_of((mjd, tai_minus_utc_s)))
        made = self.from_rows(rows, f"{self.name} with {tai_minus_utc_s} s from {day_words(rows[-1].mjd)}")
        return LeapSeconds(made.rows, made.name, made.sha256, self.expires_mjd, self.issued)

    def with_expiry(self, mjd: int | None) -> LeapSeconds:
        """Keep the rows, vouched for until another day (MJD, UTC), or None for no statement."""
        return LeapSeconds(self.rows, self.name, self.sha256, day_number(mjd), self.issued, self.path)

    @property
    def start_mjd(self) -> int:
        """First day (MJD, UTC) of the table; UTC is not defined here before it."""
        return self.rows[0].mjd

    @property
    def shortest_day_s(self) -> int:
        """Whole label seconds that every day has."""
        return self._spans.shortest

    @property
    def span(self) -> tuple[int, int | None]:
        """`(start_mjd, expires_mjd)`."""
        return self.start_mjd, self.expires_mjd

    def is_expired(self, utc: Pair) -> BoolArray:
        """Tell which UTC counts lie at or after the expiry of the table."""
        whole, part = pair(utc)
        if self.expires_mjd is None:
            return np.zeros(whole.shape, dtype=np.bool_)
        limit, fraction = self.count_from_label(self.expires_mjd, 0, 0.0)
        return np.asarray((whole > limit) | ((whole == limit) & (part >= fraction)))

    def tai_minus_utc(self, utc: Pair) -> FloatArray:
        """TAI - UTC label in force at a UTC count, s: the difference of clock faces; inside a leap second the old one.

        Raises
        ------
        OutOfSpan
            Before the table, with the mask.
        """
        whole, fraction = pair(utc)
        spans = self._spans
        row = self._row_of_count(whole, fraction)
        elapsed_s = (whole - spans.count_whole[row]) + (fraction - spans.count_ns[row] * 1e-9)
        growth = spans.rate_ns[row] / (1e9 + spans.rate_ns[row])
        return np.asarray(spans.offset_ns[row] / 1e9 + growth * elapsed_s, dtype=np.float64)

    def day_length(self, day: npt.ArrayLike) -> Pair:
        """Length of UTC days (MJD) in label seconds: 86401 with a leap second, 86399 with a negative one.

        In the drift years the step counts in stretched seconds: 1971-12-31 ends 0.107758/(1 + 3e-8) s past 86400.

        Raises
        ------
        OutOfSpan
            Before the table, with the mask.
        """
        day = days(day)
        self._check_start(np.asarray(day < self.start_mjd))
        whole, fraction = np.full(day.shape, _DAY, dtype=np.int64), np.zeros(day.shape)
        row, last = self._spans.last_day(day)
        if np.any(last):
            whole[last] = self._spans.end_whole[row[last]]
            fraction[last] = self._spans.end_fraction[row[last]]
        return whole, fraction

    def count_from_label(self, day: npt.ArrayLike, second_whole: npt.ArrayLike, second_fraction: npt.ArrayLike) -> Pair:
        """UTC count of labels.

        Parameters
        ----------
        day : int array
            MJD.
        second_whole : int array
            Whole seconds of the day, from 0; 86400 and more only inside a positive step at the end of its day.
        second_fraction : float array
            In [0, 1).

        Returns
        -------
        (int64, float64) arrays
            Seconds since 2000-01-01T12:00:00 UTC. Exact from 1972 on; before, the fraction is rounded once.

        Raises
        ------
        TextError
            For labels that do not exist, with the mask.
        OutOfSpan
            Before the table, with the mask.
        """
        day, whole, fraction = label(day, second_whole, second_fraction)
        spans = self._spans
        if day.size == 0:
            return whole.copy(), fraction.copy()
        first = int(day.min())
        if first < self.start_mjd:
            self._check_start(np.asarray(day < self.start_mjd))
        self._check_label(day, whole, fraction)
        if first >= spans.plain_from:
            row = spans.row_of_day(day, first)
            return np.asarray((day - MJD_J2000) * _DAY + (whole + (spans.plain_shift[row] - _HALF))), fraction.copy()
        return spans.count(spans.row_of_day(day, first), day, whole, fraction)

    def label_from_count(self, utc: Pair) -> Label:
        """Labels of UTC counts, as (MJD day int64, whole seconds of the day int64, fraction float64 in [0, 1)).

        The inverse of `count_from_label`: exact from 1972 on, within 0.2 fs before.

        Raises
        ------
        OutOfSpan
            Before the table, with the mask.
        """
        whole, fraction = pair(utc)
        spans = self._spans
        if whole.size == 0:
            return whole.copy(), whole.copy(), fraction.copy()
        row = self._row_of_count(whole, fraction)
        plain = int(np.min(row)) >= spans.plain_row
        if plain:
            elapsed, part = whole - spans.count_whole[row], fraction.copy()
        else:
            elapsed, part = spans.label_elapsed(row, whole, fraction)
        # A positive step belongs to the day before it, however long it is.
        since = np.minimum(elapsed // _DAY, spans.days[row] - 1)
        seconds = elapsed - since * _DAY
        if not plain:
            seconds, part = spans.before_end(row, since, seconds, part)
        return np.asarray(spans.day[row] + since), np.asarray(seconds), part

    def _check_start(self, early: BoolArray) -> None:
        if np.any(early):
            raise OutOfSpan(
                f"{int(np.count_nonzero(early))} of {early.size} instants are before the UTC table {self.name!r}, "
                f"which starts on {day_words(self.start_mjd)}; date earlier instants in TAI, TT or UT1",
                mask=early,
            )

    def _check_label(self, day: IntArray, whole: IntArray, fraction: FloatArray) -> None:
        if int(whole.min()) >= 0 and int(whole.max()) < self._spans.shortest:
            return
        length, rest = self.day_length(day)
        bad = np.asarray((whole < 0) | (whole > length) | ((whole == length) & (fraction >= rest)))
        if np.any(bad):
            at = first_item(bad)
            second_s, length_s = whole.flat[at] + fraction.flat[at], length.flat[at] + rest.flat[at]
            raise TextError(
                f"{int(np.count_nonzero(bad))} of {bad.size} labels do not exist in the UTC table {self.name!r}: "
                f"first, item {at}: second {second_s:.9f} of {day_words(day.flat[at])}, a day of {length_s:.9f} s",
                mask=bad,
            )

    def _row_of_count(self, whole: IntArray, fraction: FloatArray) -> Any:
        row = self._spans.row_of_count(whole, fraction)
        self._check_start(np.asarray(row < 0))
        return row


@lru_cache(maxsize=1)
def _default() -> LeapSeconds:
    from astropy_iers_data import IERS_LEAP_SECOND_FILE

    return LeapSeconds.load(IERS_LEAP_SECOND_FILE)
