"""Labels of each scale: what its clock face and calendar show, to counts and back.

A label is (MJD day, whole seconds of the day, fraction). Inside a positive leap second the seconds of the day go on
past 86400. GLONASS shows UTC + 3 h, and so the leap second of UTC day d as 02:59:60 of day d + 1 (GLONASS ICD 5.1,
section 3.3.3): its label is written as (d, 97200 + ...), which tells it from 03:00:00 of d + 1.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np
import numpy.typing as npt

from ..constants import DAY_S, MJD_J2000
from ..errors import InvalidInput, TextError, warn_extrapolation
from ..exact import IntArray, Pair, add, subtract
from ..scales import Scale
from . import decimals
from .checks import Label, first_item, pair
from .checks import label as checked
from .leap_seconds import LeapSeconds, day_words

__all__ = ["DayLength", "count", "day_length", "label", "round_label", "warn_if_expired"]


@dataclass(frozen=True)
class DayLength:
    """How long days are, in seconds of their labels.

    Attributes
    ----------
    leap_seconds : LeapSeconds or None
        Table for a scale with leap seconds; None where every day has 86400 s.
    offset_s : int
        Label minus UTC label, s (10800 for GLONASS).
    """

    leap_seconds: LeapSeconds | None = None
    offset_s: int = 0

    @property
    def shortest_s(self) -> int:
        """No day is shorter than this."""
        return DAY_S if self.leap_seconds is None else self.leap_seconds.shortest_day_s

    def __call__(self, day: IntArray) -> Pair:
        """Length of days, as (whole, fraction) seconds."""
        if self.leap_seconds is None:
            return np.full(np.shape(day), DAY_S, dtype=np.int64), np.zeros(np.shape(day))
        return self.leap_seconds.day_length(np.asarray(day) - (self.offset_s > 0))

    def to_elapsed(self, face: Label) -> Label:
        """Turn labels into (day, seconds elapsed in it); they differ where a leap second is not at the end."""
        if self.leap_seconds is None or not self.offset_s:
            return face
        day, whole, fraction = utc_from_face(face, self.offset_s)
        late = whole >= DAY_S - self.offset_s
        # The part of the GLONASS day that lies on the UTC day before, leap second included.
        before = subtract(self.leap_seconds.day_length(day - ~late), _constant(day, DAY_S - self.offset_s))
        early = add((whole, fraction), before)
        elapsed = np.where(late, whole - (DAY_S - self.offset_s), early[0])
        return np.asarray(day + late), elapsed, np.where(late, fraction, early[1])

    def from_elapsed(self, elapsed: Label) -> Label:
        """Undo `to_elapsed`."""
        if self.leap_seconds is None or not self.offset_s:
            return elapsed
        day, whole, fraction = elapsed
        before = subtract(self.leap_seconds.day_length(day - 1), _constant(day, DAY_S - self.offset_s))
        rest = subtract((whole, fraction), before)
        late = rest[0] < 0
        seconds = np.where(late, whole + (DAY_S - self.offset_s), rest[0])
        utc = (np.asarray(day - late), seconds, np.where(late, fraction, rest[1]))
        return face_from_utc(utc, self.offset_s)


def day_length(kind: Scale, leap_seconds: LeapSeconds | None, utc_day: Literal["true", "86400"] = "true") -> DayLength:
    """Length of the days of a scale.

    Parameters
    ----------
    kind : Scale
    leap_seconds : LeapSeconds or None
        None takes `LeapSeconds.default()`; scales without leap seconds need none.
    utc_day : {"true", "86400"}
        "true": a day with a leap second is 86401 s long. "86400": fractions of a day are in units of 86400 s always.
    """
    if utc_day not in ("true", "86400"):
        raise InvalidInput(f"utc_day must be 'true' (a leap-second day is 86401 s long) or '86400', got {utc_day!r}")
    if utc_day == "86400" or not kind.utc_labels:
        return DayLength()
    return DayLength(leap_seconds or LeapSeconds.default(), kind.label_offset_s)


def count(kind: Scale, face: Label, leap_seconds: LeapSeconds | None = None) -> Pair:
    """Count of labels since 2000-01-01T12:00:00 of the scale, exact (in the drift years of UTC rounded once).

    Raises
    ------
    TextError
        For labels that do not exist, with the mask.
    OutOfSpan
        For UTC before its table, with the mask.
    """
    if kind.utc_labels:
        table = leap_seconds or LeapSeconds.default()
        whole, fraction = table.count_from_label(*utc_from_face(face, kind.label_offset_s))
        return np.asarray(whole + kind.label_offset_s), fraction
    day, second, fraction = checked(*face)
    bad = np.asarray((second < 0) | (second >= DAY_S))
    if np.any(bad):
        at = first_item(bad)
        raise TextError(
            f"{int(np.count_nonzero(bad))} of {bad.size} labels do not exist: {kind} has no leap seconds, "
            f"its days have 86400 s; the first (item {at}) is second {second.flat[at]} of "
            f"{day_words(day.flat[at])}",
            mask=bad,
        )
    return np.asarray((day - MJD_J2000) * DAY_S + (second - DAY_S // 2)), np.array(fraction)


def label(kind: Scale, seconds: Pair, leap_seconds: LeapSeconds | None = None) -> Label:
    """Labels of counts; undoes `count`."""
    whole, fraction = pair(seconds)
    if kind.utc_labels:
        table = leap_seconds or LeapSeconds.default()
        return face_from_utc(table.label_from_count((whole - kind.label_offset_s, fraction)), kind.label_offset_s)
    day, second = np.divmod(whole + DAY_S // 2, DAY_S)
    return np.asarray(day + MJD_J2000), np.asarray(second), np.array(fraction)


def round_label(
    day: npt.ArrayLike,
    second_whole: npt.ArrayLike,
    second_fraction: npt.ArrayLike,
    digits: int,
    day_length: DayLength | None = None,
) -> tuple[IntArray, IntArray, IntArray]:
    """Round labels to a number of decimals, ties to even, and carry into the minute, the leap second or the next day.

    Returns
    -------
    (day, whole seconds, numerator over 10**digits), int64 arrays
    """
    length = day_length or DayLength()
    day, second, fraction = utc_from_face(checked(day, second_whole, second_fraction), length.offset_s)
    whole, numerator = decimals.to_digits(second, fraction, decimals.check_digits(digits))
    late = np.asarray(whole >= length.shortest_s)
    if np.any(late):
        end_whole, end_fraction = DayLength(length.leap_seconds)(day)
        bad = np.asarray((second > end_whole) | ((second == end_whole) & (fraction >= end_fraction)))
        if np.any(bad):
            raise InvalidInput(
                "these seconds lie beyond the end of their day; give the day_length of the scale", mask=bad
            )
        # The label may be inside a leap second, or have been rounded past the end of the day.
        over = (whole > end_whole) | ((whole == end_whole) & (numerator / 10.0**digits >= end_fraction))
        day, whole, numerator = np.asarray(day + over), np.where(over, 0, whole), np.where(over, 0, numerator)
    face = face_from_utc((day, whole, np.zeros(whole.shape)), length.offset_s)
    return face[0], face[1], numerator


def warn_if_expired(kind: Scale, seconds: Pair, leap_seconds: LeapSeconds | None = None) -> None:
    """Issue an `ExtrapolationWarning` where labels with leap seconds are past the expiry of their table."""
    if not kind.utc_labels:
        return
    table = leap_seconds or LeapSeconds.default()
    expired = int(np.count_nonzero(table.is_expired((seconds[0] - kind.label_offset_s, seconds[1]))))
    if expired:
        warn_extrapolation(
            f"{kind} labels are past the expiry of the leap-second table {table.name!r} on "
            f"{day_words(table.expires_mjd or 0)}: they hold if no further leap second is announced",
            expired,
            int(np.size(seconds[0])),
        )


def utc_from_face(face: Label, offset_s: int) -> Label:
    """UTC label of a label that runs `offset_s` ahead."""
    if not offset_s:
        return face
    day, whole, fraction = checked(*face)
    whole = whole - offset_s
    before = whole < 0
    return np.asarray(day - before), np.where(before, whole + DAY_S, whole), fraction


def face_from_utc(utc: Label, offset_s: int) -> Label:
    """Undo `utc_from_face`."""
    if not offset_s:
        return utc
    day, whole, fraction = utc
    late = (whole >= DAY_S - offset_s) & (whole < DAY_S)
    return np.asarray(day + late), np.where(late, whole + (offset_s - DAY_S), whole + offset_s), fraction


def _constant(like: IntArray, seconds: int) -> Pair:
    return np.full(np.shape(like), seconds, dtype=np.int64), np.zeros(np.shape(like))
