"""Signatures of mistakes in labels: leap seconds, constants between scales, day fractions, dates kept in one float."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Final

import numpy as np

from .. import exact
from ..constants import DAY_S, TT_MINUS_TAI
from ..counts import fixed_count
from ..exact import FloatArray
from ..formats import julian, labels
from ..formats.leap_seconds import LeapSeconds, day_words
from ..instants import Instants
from ..scales import Scale
from .path import Path
from .signature import Signature, bound

__all__ = ["face_signatures", "in_one_float"]

_TT_MINUS_TAI_S: Final = TT_MINUS_TAI[0] + TT_MINUS_TAI[1]
_GPS_S: Final = 19.0
_BIPM_S: Final = 27.66e-6
"""TT(BIPM) - TT(TAI) since about 2004 (BIPM, TTBIPM tables): 27.6 to 27.7 us."""
_MOST_LEAPS: Final = 60
_UNIX_EPOCH: Final = 10957 * DAY_S + DAY_S // 2
"""Seconds from 1970-01-01T00:00:00 to 2000-01-01T12:00:00 by labels of 86400 s a day."""


def face_signatures(path: Path) -> Iterator[Signature]:
    """All that can go wrong with labels along a chain."""
    reference = path.chain.reference
    leaps = reference.leap_seconds
    for number, step in enumerate(path.steps, start=1):
        names = {step.start.scale.name, step.end.scale.name}
        if names == {"UTC", "TAI"}:
            yield from _leap_signatures(path, number, leaps)
            yield Signature(
                "19 s (TAI - GPS time)",
                "GPS time taken for TAI, or added where it is in already",
                lambda a, b: np.full(b.shape, -_GPS_S),
                number,
                (1.0, -1.0),
                constant=True,
            )
        elif names == {"TAI", "TT"}:
            yield Signature(
                "32.184 s (TT - TAI) left out",
                "TAI taken for TT; an amplitude of -1 is 32.184 s added twice (IAU 1991 A4)",
                lambda a, b: np.full(b.shape, -_TT_MINUS_TAI_S),
                number,
                (1.0, -1.0),
                constant=True,
            )
            yield Signature(
                "TT(BIPM) in place of TT(TAI)",
                "27.66 us since 2004 (BIPM); earlier it was less",
                lambda a, b: np.full(b.shape, _BIPM_S),
                number,
                (1.0, -1.0),
                spread=0.02,
                constant=True,
            )
        elif "TAI" in names and any(name.startswith("TT(") for name in names):
            yield Signature(
                "TT(TAI) in place of TT(BIPM)",
                "TAI + 32.184 s, without the BIPM's table: 27 us",
                lambda a, b: _TT_MINUS_TAI_S - exact.seconds(exact.subtract(b.pair, a.pair)),
                number,
            )
        elif names == {"TAI", "UT1"}:
            yield Signature(
                "UTC in place of UT1",
                "UT1 - UTC left out: up to 0.9 s",
                lambda a, b: -_ut1_minus_utc_s(a, b, leaps),
                number,
            )
    start, end = Scale.parse(path.t.scale), path.chain.end.scale
    if start.name == "UTC" and "UT1" not in (end.name,):
        yield Signature(
            "UT1 in place of UTC at the start",
            "dates taken for UT1: up to 0.9 s",
            lambda a, b: -_ut1_at(b, path),
            0,
            (1.0, -1.0),
        )
    yield Signature(
        "half a day",
        "Julian dates begin at noon, Modified Julian Dates at midnight",
        lambda a, b: np.full(b.shape, DAY_S / 2),
        0,
        (1.0, -1.0),
        constant=True,
    )
    yield Signature(
        "whole days",
        "dates counted from another day",
        lambda a, b: np.full(b.shape, float(DAY_S)),
        0,
        (1.0, -1.0),
        constant=True,
    )
    leapt = any({s.start.scale.name, s.end.scale.name} == {"UTC", "TAI"} for s in path.steps)
    if not leapt:
        yield Signature(
            "whole seconds",
            "a whole number of seconds at the start",
            lambda a, b: np.ones(b.shape),
            0,
            _whole_numbers(),
        )
    yield Signature(
        "whole seconds in the result",
        "a whole number of seconds put in last",
        lambda a, b: np.ones(b.shape),
        0,
        _whole_numbers(),
        last_of="whole leap seconds" if leapt else "whole seconds",
    )
    for kind, station, words in ((start, 0, "at the start"), (end, len(path.steps), "in the result")):
        if kind.utc_labels:
            yield Signature(
                f"leap-second days of 86400 s {words}",
                "fractions of a day in units of 86400 s on a day that is 86401 s long: up to 1 s on that day alone",
                bound(_stretched, kind, leaps),
                station,
                (1.0, -1.0),
                at_node=True,
            )
    for layout, words in (("jd", "Julian Date"), ("mjd", "Modified Julian Date"), ("unix", "seconds from 1970")):
        size = {"jd": "40 us", "mjd": "0.6 us", "unix": "0.2 us"}[layout]
        yield Signature(
            f"{words} in one float64 at the start", f"rounded to steps of {size}", bound(_kept, layout, leaps), 0
        )


def _whole_numbers() -> tuple[float, ...]:
    return tuple(float(n) for n in range(-_MOST_LEAPS, _MOST_LEAPS + 1) if n)


def _leap_signatures(path: Path, number: int, leaps: LeapSeconds) -> Iterator[Signature]:
    def utc(a: Instants, b: Instants) -> Instants:
        return a if a.scale == "UTC" else b

    def tai_minus_utc(a: Instants, b: Instants) -> FloatArray:
        return leaps.tai_minus_utc(utc(a, b).pair)

    yield Signature(
        "all leap seconds left out",
        "UTC taken for TAI (37 s since 2017)",
        lambda a, b: -tai_minus_utc(a, b),
        number,
        constant=True,
    )
    yield Signature(
        "leap seconds with the wrong sign",
        "TAI - UTC subtracted in place of added",
        lambda a, b: -2.0 * tai_minus_utc(a, b),
        number,
        constant=True,
    )
    yield Signature(
        "whole leap seconds",
        "TAI - UTC off by a whole number of seconds at all dates",
        lambda a, b: np.ones(b.shape),
        number,
        _whole_numbers(),
    )
    before, after = path.stations[number - 1 : number + 1]
    whole = utc(before, after).whole
    inside = [row for row in _steps(leaps) if whole.min() < row[1] <= whole.max()]
    for at, (mjd, _, _) in enumerate(inside):
        yield Signature(
            f"leap second of {day_words(mjd)} left out",
            "in force from that day on",
            bound(_missing, (inside[at],)),
            number,
            (1.0, -1.0),
            constant=True,
        )
        if at < len(inside) - 1:
            yield Signature(
                f"leap seconds from {day_words(mjd)} on left out",
                "a leap-second table that ends too soon",
                bound(_missing, tuple(inside[at:])),
                number,
                constant=True,
            )


def _steps(leaps: LeapSeconds) -> list[tuple[int, int, float]]:
    """Whole steps of TAI - UTC: first day, its UTC count, and size in seconds."""
    found = []
    for row in leaps.rows[1:]:
        count, _ = leaps.count_from_label(row.mjd, 0, 0.0)
        early, late = leaps.tai_minus_utc((count - 2, np.zeros(()))), leaps.tai_minus_utc((count, np.zeros(())))
        size = float(late - early)
        if abs(size - round(size)) < 1e-9 and round(size):
            found.append((row.mjd, int(count), float(round(size))))
    return found


def _missing(before: Instants, after: Instants, rows: tuple[tuple[int, int, float], ...]) -> FloatArray:
    whole = (before if before.scale == "UTC" else after).whole
    total = np.zeros(whole.shape)
    for _, count, size in rows:
        total -= size * (whole >= count)
    return total


def _ut1_minus_utc_s(tai: Instants, ut1: Instants, leaps: LeapSeconds) -> FloatArray:
    utc = fixed_count(tai.pair, Scale.parse("TAI"), Scale.parse("UTC"))
    return np.asarray(exact.seconds(exact.subtract(ut1.pair, tai.pair)) + leaps.tai_minus_utc(utc))


def _ut1_at(utc: Instants, path: Path) -> FloatArray:
    reference = path.chain.reference
    tai = fixed_count(utc.pair, Scale.parse("UTC"), Scale.parse("TAI"))
    shift = exact.seconds(reference.earth_orientation.ut1_minus_tai(tai))
    return np.asarray(shift + reference.leap_seconds.tai_minus_utc(utc.pair))


def _stretched(before: Instants, t: Instants, kind: Scale, leaps: LeapSeconds) -> FloatArray:
    day, whole, fraction = labels.label(kind, t.pair, leaps)
    length = exact.seconds(labels.day_length(kind, leaps)(day))
    return np.asarray((whole + fraction) * (length - DAY_S) / DAY_S)


def _kept(before: Instants, t: Instants, layout: str, leaps: LeapSeconds) -> FloatArray:
    return in_one_float(t, layout, leaps)


def in_one_float(t: Instants, layout: str, leaps: LeapSeconds) -> FloatArray:
    """What a date kept in one float64 is off by, seconds: layouts `jd`, `mjd` (days) and `unix` (labels, s)."""
    kind = Scale.parse(t.scale)
    face = labels.label(kind, t.pair, leaps)
    if layout == "unix":
        whole = (face[0] - 51544) * DAY_S + face[1] - DAY_S // 2 + _UNIX_EPOCH
        return np.asarray(-exact.two_sum(whole.astype(np.float64), face[2])[1])
    day, fraction = julian.mjd_from_label(*face, labels.day_length(kind, leaps))
    offset = 2400000.5 if layout == "jd" else 0.0
    return np.asarray(-DAY_S * exact.two_sum(day + offset, fraction)[1])
