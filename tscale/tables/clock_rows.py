"""Comparisons of a clock as columns: names checked, order checked, laid out as a curve."""

from __future__ import annotations

from collections.abc import Sequence
from pathlib import Path
from typing import Literal, NamedTuple, TypeAlias

import numpy as np

from ..errors import DataFileError, InvalidInput
from ..exact import BoolArray, FloatArray, Pair
from ..instants import Instants
from ..scales import Scale
from .clock_curve import ClockCurve
from .common import since

__all__ = ["ClockRows", "Interpolation", "check_forwards", "checked_curve", "clock_scale", "reference_scale"]

Interpolation: TypeAlias = Literal["linear", "step"]
_KINDS = ("linear", "step")


class ClockRows(NamedTuple):
    """Comparisons of one clock, in the order of the file."""

    scale: str
    reference: str
    epoch: Instants
    offset: Pair
    """Clock minus reference; zero where missing."""
    missing: BoolArray
    uncertainty_s: FloatArray
    row: list[int]
    """Line of each row in the file, from 1."""
    sha256: str


def reference_scale(name: str) -> Scale:
    """Look a reference up: UTC, UTC(k) or CLOCK(x), else `InvalidInput` that says why."""
    scale = Scale.parse(name)
    if scale.family not in ("UTC", "CLOCK"):
        raise InvalidInput(
            f"a clock is compared with UTC, UTC(laboratory) or CLOCK(name), got {name!r}: both sides of a comparison "
            f"carry labels with leap seconds; turn the epochs into UTC labels first"
        )
    return scale


def clock_scale(name: str) -> Scale:
    """Scale of a clock: `maser` is CLOCK(maser); `UTC(KST)` and `CLOCK(maser)` are themselves."""
    text = name.strip()
    try:
        scale = Scale.parse(text if text.endswith(")") else f"CLOCK({text})")
    except InvalidInput as error:
        raise InvalidInput(
            f"{name!r} cannot name a clock: it becomes CLOCK(name), which holds no space, bracket or @; give name='...'"
        ) from error
    if scale.family not in ("UTC", "CLOCK") or scale.realisation is None:
        raise InvalidInput(f"{name!r} is no clock; name it plainly, as CLOCK(name) or as UTC(laboratory)")
    return scale


def checked_curve(
    rows: ClockRows, name: str, path: Path | None, interpolation: Interpolation, max_gap_s: float | None
) -> ClockCurve:
    """Lay the rows out, or say which of them does not fit."""
    if interpolation not in _KINDS:
        raise InvalidInput(f"interpolation is 'linear' or 'step', got {interpolation!r}")
    if max_gap_s is not None and not max_gap_s > 0.0:
        raise InvalidInput(f"max_gap_s is a length of time above zero, got {max_gap_s!r}")
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
    offset = (rows.offset[0][kept], rows.offset[1][kept])
    curve = ClockCurve.of(reference, offset, rows.uncertainty_s[kept], gap, interpolation == "step")
    check_forwards(curve, rows.scale, [rows.row[place] for place in kept] if rows.row else [], path)
    return curve


def _complaint(text: str, bad: BoolArray, lines: Sequence[int], path: Path | None) -> DataFileError | InvalidInput:
    if path is None:
        return InvalidInput(f"clock log: {text} (see .mask)", mask=bad)
    row = lines[int(np.flatnonzero(bad)[0])]
    return DataFileError(f"{path}, line {row}: {text}", row=row, path=path)


def check_forwards(curve: ClockCurve, scale: str, lines: Sequence[int], path: Path | None) -> None:
    """Raise unless every comparison is read later on the clock than the one before."""
    bad = curve.backwards()
    if bad.any():
        raise _complaint(
            f"{scale} would run backwards from this comparison to the next; correct it, or start a new log there",
            bad,
            lines,
            path,
        )
