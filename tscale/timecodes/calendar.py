"""Calendar fields: a date in its parts, with nothing lost, second 60 included."""

from __future__ import annotations

from typing import NamedTuple

import numpy as np
import numpy.typing as npt

from ..constants import DAY_S
from ..errors import TextError
from ..exact import FloatArray, IntArray
from ..formats import gregorian, labels
from ..formats.checks import integers, together
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from ..scales import Scale, check_place

__all__ = ["Calendar", "from_calendar", "to_calendar"]


class Calendar(NamedTuple):
    """Labels in their parts, arrays of one shape."""

    year: IntArray
    month: IntArray
    day: IntArray
    hour: IntArray
    minute: IntArray
    second: IntArray
    """60 and more in a leap second."""
    fraction: FloatArray
    """Fraction of the second in [0, 1)."""


def from_calendar(
    year: npt.ArrayLike,
    month: npt.ArrayLike,
    day: npt.ArrayLike,
    hour: npt.ArrayLike = 0,
    minute: npt.ArrayLike = 0,
    second: npt.ArrayLike = 0,
    fraction: npt.ArrayLike = 0.0,
    *,
    scale: str,
    place: str | None = None,
    leap_seconds: LeapSeconds | None = None,
) -> Instants:
    """Instants of calendar fields (proleptic Gregorian), which broadcast.

    Raises
    ------
    InvalidInput
        Values that are not whole, or a fraction that is not in [0, 1).
    TextError
        Dates that do not exist, with the mask.
    """
    kind = Scale.parse(scale)
    fields = [
        integers(value, f"a {name}", "give the fraction of the second apart")
        for name, value in zip(Calendar._fields, (year, month, day, hour, minute, second), strict=False)
    ]
    y, mo, d, h, mi, s, part = together(*fields, np.asarray(fraction, dtype=np.float64))
    ordinary = (mo >= 1) & (mo <= 12) & (h >= 0) & (h < 24) & (mi >= 0) & (mi < 60) & (s >= 0) & (np.abs(y) < 10**11)
    safe = np.where(ordinary, mo, 1)
    good = ordinary & (d >= 1) & (d <= gregorian.month_length(y, safe))
    last = kind.utc_labels & (((h * 60 + mi) * 60 + 60 - kind.label_offset_s) % DAY_S == 0)
    good = good & ((s < 60) | last)
    if not np.all(good):
        bad = np.asarray(~good)
        at = int(np.flatnonzero(bad)[0])
        shown = "-".join(str(v.flat[at]) for v in (y, mo, d)) + " " + ":".join(str(v.flat[at]) for v in (h, mi, s))
        raise TextError(
            f"{int(np.count_nonzero(bad))} of {bad.size} are no dates; the first (item {at}) is {shown}. Second 60 is "
            "in the last minute of a UTC day alone",
            mask=bad,
        )
    mjd, whole = gregorian.mjd_from_date(y, mo, d), (h * 60 + mi) * 60 + s
    if kind.label_offset_s:  # the leap second of GLONASS stands on the UTC day before
        inside = s >= 60
        mjd, whole = np.where(inside, mjd - 1, mjd), np.where(inside, whole + DAY_S, whole)
    pair = labels.count(kind, (np.asarray(mjd), np.asarray(whole), part), leap_seconds)
    labels.warn_if_expired(kind, pair, leap_seconds)
    return Instants._of(pair, kind, check_place(place))


def to_calendar(t: Instants, *, leap_seconds: LeapSeconds | None = None) -> Calendar:
    """Calendar fields of instants, in their shape; the inverse of `from_calendar`, bit for bit since 1972."""
    kind = Scale.parse(t.scale)
    labels.warn_if_expired(kind, t.pair, leap_seconds)
    mjd, whole, part = labels.label(kind, t.pair, leap_seconds)
    if kind.label_offset_s:
        inside = whole >= DAY_S
        mjd, whole = np.asarray(mjd + inside), np.asarray(whole - DAY_S * inside)
        before = inside & (whole >= kind.label_offset_s)
        minute = np.where(before, kind.label_offset_s // 60 - 1, whole // 60)
    else:
        minute = np.minimum(whole // 60, DAY_S // 60 - 1)
    year, month, day = gregorian.date_from_mjd(mjd)
    return Calendar(
        year, month, day, np.asarray(minute // 60), np.asarray(minute % 60), np.asarray(whole - 60 * minute), part
    )
