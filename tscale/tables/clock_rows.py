"""Comparisons of a clock as columns: names checked, order checked, laid out as a curve."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Any, Final, Literal, NamedTuple, TypeAlias, get_args

import numpy as np
import numpy.typing as npt

from .. import exact
from ..errors import DataFileError, InvalidInput
from ..exact import BoolArray, FloatArray, IntArray, Pair
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from ..scales import Scale
from .clock_curve import ClockCurve
from .clock_nominal import Nominal, check_nominal, nominal_count, reference_scale, without_nominal
from .common import rows_hash, since

__all__ = [
    "ClockRows",
    "Interpolation",
    "LogMark",
    "LogRemark",
    "check_forwards",
    "check_options",
    "checked_curve",
    "clock_scale",
    "given_rows",
]

Interpolation: TypeAlias = Literal["linear", "step", "cubic"]


_LARGEST_BEND_S: Final = 0.5
"""Of the ends of a cubic; beyond a few times this it would not close to 1 fs. Its swing is at most a quarter."""


class LogMark(NamedTuple):
    """Something that a log says of one of its rows."""

    kind: str
    """`not used`, `reset` or `rate step`."""
    epoch: str
    """As the file writes it."""
    row: int | None
    """Line of the file, from 1; place among the rows given, from 0; None where it is not known."""
    size_s: float | None
    """Of a reset, where it is known."""


class LogRemark(NamedTuple):
    """What the source of a log says of a time in it, beside the rows: a step between two of them, a correction."""

    text: str
    first: int
    """From when, a count of the reference, whole seconds."""
    last: int

    def holds(self, at: Pair) -> BoolArray:
        """Which counts of the reference it is about."""
        return np.asarray((at[0] >= self.first) & (at[0] <= self.last))


class ClockRows(NamedTuple):
    """Comparisons of one clock, in the order of the file, without those that are not to be used."""

    scale: str
    reference: str
    epoch: Instants
    offset: Pair
    """Clock minus reference, with nominal differences removed; zero where missing."""
    missing: BoolArray
    uncertainty_s: FloatArray
    """In all."""
    common_s: FloatArray
    """The part of it that all rows share."""
    row: list[int]
    """Line of each row in the file, from 1."""
    sha256: str
    reset: Pair
    """By how much the clock was set forward at this epoch."""
    broken: BoolArray
    """Where it was set by an unknown amount."""
    corner: BoolArray
    """Where its rate was changed."""
    marks: tuple[LogMark, ...]
    interpolation: Interpolation | None = None
    """What the file itself asks for."""
    max_gap_s: float | None = None
    """The same."""


def clock_scale(name: str) -> Scale:
    """Scale of a clock: `maser` is CLOCK(maser); `UTC(KST)` and `CLOCK(maser)` are themselves."""
    text = name.strip()
    if _is_scale(text):
        raise InvalidInput(
            f"{name!r} is a scale, which no clock is: name the clock otherwise, as CLOCK(name) or UTC(laboratory)"
        )
    try:
        scale = Scale.parse(text if text.endswith(")") else f"CLOCK({text})")
    except InvalidInput as error:
        raise InvalidInput(
            f"{name!r} cannot name a clock: it becomes CLOCK(name), which holds no space, bracket or @; give name='...'"
        ) from error
    if scale.family not in ("UTC", "CLOCK") or scale.realisation is None:
        raise InvalidInput(f"{name!r} is no clock; name it plainly, as CLOCK(name) or as UTC(laboratory)")
    return scale


def _is_scale(text: str) -> bool:
    bare = text.removeprefix("CLOCK(").removesuffix(")")
    try:
        return "(" not in bare and Scale.parse(bare).realisation is None
    except InvalidInput:
        return False


def check_options(interpolation: Interpolation, max_gap_s: float | None) -> None:
    """Raise `InvalidInput` for a kind of interpolation or a gap that cannot be."""
    kinds = get_args(Interpolation)
    if interpolation not in kinds:
        *most, last = (repr(kind) for kind in kinds)
        raise InvalidInput(f"interpolation is {', '.join(most)} or {last}, got {interpolation!r}")
    if max_gap_s is not None and not max_gap_s > 0.0:
        raise InvalidInput(f"max_gap_s is a length of time above zero, got {max_gap_s!r}")


def checked_curve(
    rows: ClockRows, name: str, path: Path | None, interpolation: Interpolation | None, max_gap_s: float | None
) -> ClockCurve:
    """Lay the rows out, or say which of them does not fit; what is None is as the rows say."""
    interpolation = interpolation or rows.interpolation or "linear"
    max_gap_s = rows.max_gap_s if max_gap_s is None else max_gap_s
    check_options(interpolation, max_gap_s)
    if rows.scale == rows.reference:
        raise InvalidInput(f"{rows.scale} is compared with itself; name the clock and its reference apart", path=path)
    epoch = rows.epoch.pair
    unsorted = np.zeros(len(rows.missing), dtype=np.bool_)
    unsorted[1:] = since((epoch[0][:-1], epoch[1][:-1]), (epoch[0][1:], epoch[1][1:])) <= 0.0
    if unsorted.any():
        raise _complaint(
            "this epoch is not after the one before; sort the rows and drop doubles", unsorted, rows.row, path
        )
    kept = np.flatnonzero(~rows.missing)
    if len(kept) < 2:
        raise (InvalidInput if path is None else DataFileError)(
            f"the clock log {name!r} holds {len(kept)} comparisons with an offset; two or more are needed", path=path
        )
    reference = (epoch[0][kept], epoch[1][kept])
    gap = np.append(np.diff(kept) > 1, True)
    if max_gap_s is not None:
        gap[:-1] |= since((reference[0][:-1], reference[1][:-1]), (reference[0][1:], reference[1][1:])) > max_gap_s
    # What happened at failed comparisons falls to the next that did not fail.
    before = np.append(0, kept[:-1] + 1)
    broken = np.append(np.logical_or.reduceat(rows.broken, before)[1:], True)
    reset = _summed(rows.reset, before, kept)
    if interpolation != "step":  # a step log jumps there as at every comparison
        gap |= broken
    offset = (rows.offset[0][kept], rows.offset[1][kept])
    corner = np.logical_or.reduceat(rows.corner, before)
    # Before a reset at the very first comparison the clock was another one.
    corner[0] |= bool(rows.broken[: kept[0] + 1].any()) or bool(reset[0][0] != 0) or bool(reset[1][0] != 0.0)
    total_s, common_s = rows.uncertainty_s[kept], rows.common_s[kept]
    own_s = np.sqrt(np.maximum((total_s - common_s) * (total_s + common_s), 0.0))
    curve = ClockCurve.of(
        reference,
        exact.add(offset, nominal_count(rows.reference)),
        np.where(common_s > 0.0, own_s, total_s),
        gap,
        interpolation,
        common_s=common_s,
        reset=reset,
        broken=broken,
        corner=corner,
    )
    check_forwards(curve, rows.scale, [rows.row[place] for place in kept] if rows.row else [], path)
    return curve


def given_rows(
    clock: str,
    epoch: Instants,
    offset_s: npt.ArrayLike | Pair,
    uncertainty_s: npt.ArrayLike,
    missing: npt.ArrayLike,
    used: npt.ArrayLike,
    reset_s: npt.ArrayLike,
    rate_step: npt.ArrayLike,
    nominal: Nominal | None,
    leap_seconds: LeapSeconds | None,
    common_s: npt.ArrayLike = 0.0,
) -> ClockRows:
    """Check comparisons that come as arrays; the arguments are those of `ClockLog.from_rows`."""
    count = epoch.shape
    if len(count) != 1:
        raise InvalidInput(f"comparisons are a one-dimensional list of instants, got shape {count}")
    scale, reference = clock_scale(clock).name, reference_scale(epoch.scale).name
    check_nominal(reference, nominal)
    try:
        given: tuple[Any, ...] = (0, offset_s)
        if isinstance(offset_s, tuple) and len(offset_s) == 2 and np.asarray(offset_s[0]).dtype.kind in "iu":
            given = offset_s
        parts = [
            np.broadcast_to(np.asarray(part, np.float64), count) for part in (*given, uncertainty_s, reset_s, common_s)
        ]
        flags = [np.array(np.broadcast_to(np.asarray(part, np.bool_), count)) for part in (missing, used, rate_step)]
    except (TypeError, ValueError) as error:
        raise InvalidInput(f"offsets, uncertainties and gaps must be numbers, as many as epochs: {error}") from error
    failed, kept, corner = flags
    bad = kept & ~failed & (~np.isfinite(parts[:3]).all(axis=0) | (parts[2] < 0.0))
    if bad.any():
        raise InvalidInput(
            "offsets must be finite and uncertainties zero or more; flag failures with missing=", mask=bad
        )
    bad = kept & ~failed & ~((parts[4] >= 0.0) & (parts[4] <= parts[2]))
    if bad.any():
        raise InvalidInput(
            "common_s is the part of uncertainty_s that all comparisons share: from zero to uncertainty_s", mask=bad
        )
    lost = ~kept & ((parts[3] != 0.0) | corner)
    if lost.any() or np.isinf(parts[3]).any():
        raise InvalidInput(
            "resets and rate steps are finite (or NaN, for a reset of unknown size) and stand on rows that are used",
            mask=lost | np.isinf(parts[3]),
        )
    broken = np.isnan(parts[3])
    reset_s = np.where(broken, 0.0, parts[3])
    whole, fraction, sigma, common = (np.where(failed | ~kept, 0.0, part) for part in (*parts[:3], parts[4]))
    offset = exact.normalise(whole.astype(np.int64), fraction)
    extras = [kept, parts[3], corner] if not kept.all() or parts[3].any() or corner.any() else []
    extras += [common] if common.any() else []
    sha256 = rows_hash(*epoch.pair, *offset, failed, sigma, *extras)
    if nominal == "included":
        offset, large = without_nominal(offset, epoch.pair, reference, leap_seconds or LeapSeconds.default())
        large &= ~failed & kept
        if large.any():
            raise InvalidInput(f"these offsets from {reference} do not hold the nominal difference", mask=large)
    marks = [
        LogMark(kind, text, place, size)
        for place, text in _dates(epoch, ~kept | (parts[3] != 0.0) | corner, leap_seconds)
        for kind, there, size in (
            ("not used", not kept[place], None),
            ("reset", parts[3][place] != 0.0, None if broken[place] else float(parts[3][place])),
            ("rate step", corner[place], None),
        )
        if there
    ]
    picked = np.flatnonzero(kept)
    return ClockRows(
        scale,
        reference,
        epoch[picked],
        (offset[0][picked], offset[1][picked]),
        failed[picked],
        sigma[picked],
        common[picked],
        [],
        sha256,
        exact.from_seconds(reset_s[picked]),
        broken[picked],
        corner[picked],
        tuple(marks),
    )


def _dates(epoch: Instants, wanted: BoolArray, leap_seconds: LeapSeconds | None) -> list[tuple[int, str]]:
    places = np.flatnonzero(wanted)
    texts = epoch[places].to_iso(0, leap_seconds=leap_seconds)
    return [(int(place), str(text)) for place, text in zip(places, texts, strict=True)]


def _summed(pair: Pair, first: IntArray, last: IntArray) -> Pair:
    """Sums over runs of rows that end with `last`; nearly always one row each."""
    total = (pair[0][last], pair[1][last])
    for extra in range(1, int(np.max(last - first, initial=0)) + 1):
        more = last - extra >= first
        place = np.maximum(last - extra, 0)
        total = exact.add(total, (np.where(more, pair[0][place], 0), np.where(more, pair[1][place], 0.0)))
    return total


def _complaint(text: str, bad: BoolArray, lines: Sequence[int], path: Path | None) -> DataFileError | InvalidInput:
    if path is None:
        return InvalidInput(f"clock log: {text} (see .mask)", mask=bad)
    row = lines[int(np.flatnonzero(bad)[0])]
    return DataFileError(f"{path}, line {row}: {text}", row=row, path=path)


def check_forwards(curve: ClockCurve, scale: str, lines: Sequence[int], path: Path | None) -> None:
    """Raise unless every comparison is read later on the clock than the one before, and cubics stay near the line."""
    if curve.bend is not None:
        wild = ~curve.gap & (np.maximum(np.abs(curve.bend.start_s), np.abs(curve.bend.end_s)) > _LARGEST_BEND_S)
        if wild.any():
            raise _complaint(
                "the cubic from this comparison to the next swings out by more than 0.1 s: the rates on either side "
                "are too far apart; interpolate linearly, or mark a rate step or a gap",
                wild,
                lines,
                path,
            )
    bad = curve.backwards()
    if bad.any():
        raise _complaint(
            f"{scale} would run backwards from this comparison to the next; correct it, or start a new log there",
            bad,
            lines,
            path,
        )
