"""POSIX time: the count in which every UTC day has 86400 seconds.

IEEE Std 1003.1 (POSIX), Base Definitions 4.16: seconds = 86400 (days since 1970-01-01) + seconds of the day, where the
second of the day goes on to 86400 in a leap second. So the count of 23:59:60.x is that of the next day's 00:00:00.x:
it is written without loss only together with which of the two it was. After a negative leap second one count belongs
to no instant.

A smeared clock spreads the step instead: here evenly from the noon before to the noon after it, as is common practice
of network time servers (no standard).
"""

from __future__ import annotations

from fractions import Fraction
from typing import Final, Literal, TypeAlias

import numpy as np
import numpy.typing as npt

from ..constants import DAY_S
from ..errors import InvalidInput
from ..exact import BoolArray, Factor, IntArray, Pair, affine, checked_parts, normalise, subtract
from ..formats import labels
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from ..scales import Scale

__all__ = ["from_posix", "to_posix"]

Inside: TypeAlias = Literal["after", "inside", "raise"]
Smear: TypeAlias = Literal["noon to noon"]
_MJD_1970: Final = 40587
_NOON: Final = DAY_S // 2


def from_posix(
    seconds: npt.ArrayLike,
    fraction: npt.ArrayLike = 0.0,
    *,
    repeated: Inside = "after",
    smear: Smear | None = None,
    leap_seconds: LeapSeconds | None = None,
) -> Instants:
    """Date POSIX counts in UTC.

    Parameters
    ----------
    seconds : int array
        Whole seconds since 1970-01-01T00:00:00 UTC, leap seconds not counted.
    fraction : float array
        Added to them; any size.
    repeated : {"after", "inside", "raise"}
        A count that a leap second shares with the second after it: take the one after it, the one inside it, or
        raise.
    smear : {"noon to noon"}, optional
        The counts are those of a smeared clock.
    leap_seconds : LeapSeconds, optional
        Default `LeapSeconds.default()`.

    Returns
    -------
    Instants
        UTC.

    Raises
    ------
    InvalidInput
        Values that are not finite; repeated counts with "raise", with the mask; unknown choices.
    TextError
        A count that a negative leap second skipped, with the mask.
    OutOfSpan
        Before UTC, 1961.
    """
    _check(repeated, ("after", "inside", "raise"), "repeated")
    table = leap_seconds or LeapSeconds.default()
    whole, part = normalise(*checked_parts(seconds, fraction))
    day, second = np.divmod(whole, DAY_S)
    day = day + _MJD_1970
    if smear is not None:
        _check(smear, ("noon to noon",), "smear")
        return _utc(_unsmeared(day, second, part, table), table)
    doubled = _doubled(day, second, part, table)
    if repeated == "raise" and np.any(doubled):
        raise InvalidInput(
            f"{int(np.count_nonzero(doubled))} of {doubled.size} counts are in or just after a leap second, which "
            "share their counts: say repeated='inside' or 'after' (see .mask)",
            mask=doubled,
        )
    if repeated == "inside":
        day, second = np.where(doubled, day - 1, day), np.where(doubled, second + DAY_S, second)
    utc = Scale.parse("UTC")
    pair = labels.count(utc, (np.asarray(day), np.asarray(second), part), table)
    return _utc(pair, table)


def to_posix(
    t: Instants,
    *,
    inside: Literal["repeat", "raise"] = "repeat",
    smear: Smear | None = None,
    leap_seconds: LeapSeconds | None = None,
) -> Pair:
    """POSIX counts of UTC instants, as (whole int64, fraction float64 in [0, 1)).

    Parameters
    ----------
    t : Instants
        UTC.
    inside : {"repeat", "raise"}
        In a leap second the count of the second after it is given, as the standard says; or raise.
    smear : {"noon to noon"}, optional
        Give the counts of a smeared clock, of which each belongs to one instant.

    Raises
    ------
    InvalidInput
        Another scale than UTC; instants in a leap second with "raise", with the mask.
    OutOfSpan
        Before UTC, 1961.
    """
    _check(inside, ("repeat", "raise"), "inside")
    if t.scale != "UTC":
        raise InvalidInput(f"POSIX time is a count of UTC, got {t.scale}; convert with tscale.chain first")
    table = leap_seconds or LeapSeconds.default()
    labels.warn_if_expired(Scale.parse("UTC"), t.pair, table)
    day, second, part = table.label_from_count(t.pair)
    if smear is not None:
        _check(smear, ("noon to noon",), "smear")
        return _smeared(t.pair, day, second, table)
    late = np.asarray(second >= DAY_S)
    if inside == "raise" and np.any(late):
        raise InvalidInput(
            f"{int(np.count_nonzero(late))} of {late.size} instants are inside a leap second, which has no count of "
            "its own: say inside='repeat', or smear= (see .mask)",
            mask=late,
        )
    return np.asarray((day - _MJD_1970) * DAY_S + second), part


def _utc(pair: Pair, table: LeapSeconds) -> Instants:
    utc = Scale.parse("UTC")
    labels.warn_if_expired(utc, pair, table)
    return Instants._of(pair, utc)


def _doubled(day: IntArray, second: IntArray, part: npt.NDArray[np.float64], table: LeapSeconds) -> BoolArray:
    """Counts just after midnight that belong to a leap second of the day before too."""
    doubled = np.zeros(np.shape(day), dtype=np.bool_)
    near = np.asarray((second < 2) & (day > table.start_mjd))
    if np.any(near):
        length, rest = table.day_length(day[near] - 1)
        over = length - DAY_S
        doubled[near] = (second[near] < over) | ((second[near] == over) & (part[near] < rest))
    return doubled


def _noons(start: IntArray, table: LeapSeconds) -> tuple[Pair, Pair]:
    """UTC counts of noon of days, and of the noon after."""
    utc, zero = Scale.parse("UTC"), np.zeros(np.shape(start))
    noon = np.full(np.shape(start), _NOON)
    first, last = (labels.count(utc, (np.asarray(start + i), noon, zero), table) for i in (0, 1))
    return first, last


def _stretch(pair: Pair, origin: Pair, ratio: Fraction) -> Pair:
    return affine(pair, origin, Factor.of(ratio - 1))


def _unsmeared(day: IntArray, second: IntArray, part: npt.NDArray[np.float64], table: LeapSeconds) -> Pair:
    start = np.asarray(day - (second < _NOON))
    since = (np.asarray((day - start) * DAY_S + second - _NOON), part)
    first, last = _noons(start, table)
    return _by_length(since, first, last, inverse=True)


def _smeared(utc: Pair, day: IntArray, second: IntArray, table: LeapSeconds) -> Pair:
    start = np.asarray(day - (second < _NOON))
    first, last = _noons(start, table)
    zero = (np.zeros_like(first[0]), np.zeros_like(first[1]))
    since = subtract(utc, first)
    whole, part = _by_length(since, zero, subtract(last, first), inverse=False, from_first=True)
    return np.asarray(whole + (start - _MJD_1970) * DAY_S + _NOON), part


def _by_length(since: Pair, first: Pair, last: Pair, *, inverse: bool, from_first: bool = False) -> Pair:
    """Seconds since noon, stretched to the length of the day from noon to noon, or back; counted on from `first`."""
    length = last if from_first else subtract(last, first)
    if np.any(length[1] != 0.0):
        raise InvalidInput("smeared time is for the leap seconds since 1972", mask=np.asarray(length[1] != 0.0))
    whole, part = np.array(since[0]), np.array(since[1])
    origin = (np.zeros((), np.int64), np.zeros(()))
    for size in np.unique(length[0]):
        if size != DAY_S:
            at = np.asarray(length[0] == size)
            ratio = Fraction(int(size), DAY_S) if inverse else Fraction(DAY_S, int(size))
            whole[at], part[at] = _stretch((whole[at], part[at]), origin, ratio)
    return normalise(whole + first[0], part + first[1]) if np.any(first[1]) else (np.asarray(whole + first[0]), part)


def _check(value: object, allowed: tuple[str, ...], name: str) -> None:
    if value not in allowed:
        raise InvalidInput(f"{name} must be {' or '.join(map(repr, allowed))}, got {value!r}")
