"""Over which dates the rate of a clock can be known, and where it has seams."""

from __future__ import annotations

from typing import Any, Final, NamedTuple

import numpy as np

from .. import exact
from ..counts import fixed_count
from ..earth.moving import tt_from_tdb_at_geocentre
from ..earth.observer import Observer, nearest_inside
from ..exact import FloatArray, Pair
from ..instants import Instants
from ..scales import Scale
from ..tables.reference import ReferenceData

__all__ = ["Reach", "reach"]

_FAR_S: Final = 2.0**40
_TOUCH_S: Final = 1e-6
_MARGIN_S: Final = 1.0


class Reach(NamedTuple):
    """Where a rate can be known, as offsets from a TT count."""

    first_s: float
    last_s: float
    seams_s: FloatArray
    """Offsets, increasing, at which the path goes from one polynomial to another."""


def reach(
    observer: Observer, anchor: Pair, reference: ReferenceData, *, needs_orientation: bool, needs_ephemeris: bool
) -> Reach:
    """How far on either side of a date the rate of a clock can be known without a break.

    Parameters
    ----------
    observer : Observer
    anchor : Pair
        TT count, scalar.
    reference : ReferenceData
    needs_orientation, needs_ephemeris : bool
        Whether the rate rests on Earth orientation, and on the ephemeris (tides).
    """
    geocentric = bool(getattr(observer, "geocentric", True))
    first, last = _cover(observer, anchor, reference)
    if needs_orientation:
        table = reference.earth_orientation
        first = max(first, _since(_tt_of_day(table.span[0], reference), anchor))
        if table.after_end != "hold":
            last = min(last, _since(_tt_of_day(table.span[1], reference), anchor))
    if needs_ephemeris or not geocentric:
        begin, end = (exact.from_seconds(count) for count in reference.ephemeris.span)
        first = max(first, _since(begin, anchor) + _MARGIN_S)
        last = min(last, _since(end, anchor) - _MARGIN_S)
    seams = _seams(observer, anchor, reference)
    return Reach(first, last, seams[(seams > first) & (seams < last)])


def _tt_of_day(mjd: int, reference: ReferenceData) -> Pair:
    utc = Instants.from_mjd(mjd, 0.0, "UTC", leap_seconds=reference.leap_seconds).pair
    return fixed_count(utc, Scale.parse("UTC"), Scale.parse("TT"))


def _since(count: Pair, anchor: Pair) -> float:
    return float(exact.seconds(exact.subtract(count, anchor)))


def _cover(observer: Any, anchor: Pair, reference: ReferenceData) -> tuple[float, float]:
    """The stretch without gaps around the anchor; a point if the anchor lies in none."""
    far = [exact.add_seconds(anchor, sign * _FAR_S) for sign in (-1.0, 1.0)]
    ends = [_since(nearest_inside(observer, end), anchor) for end in far]
    first, last = (-np.inf if ends[0] <= -_FAR_S else ends[0]), (np.inf if ends[1] >= _FAR_S else ends[1])
    spans = sorted(_piece_spans(observer, anchor, reference))
    if len(spans) < 2:
        return first, last
    stretch: tuple[float, float] | None = None
    for begin, end in spans:
        if stretch is not None and begin <= stretch[1] + _TOUCH_S:
            stretch = (stretch[0], max(stretch[1], end))
        elif stretch is not None and stretch[1] >= -_TOUCH_S:
            break
        else:
            stretch = (begin, end)
    assert stretch is not None
    return max(first, stretch[0]), min(last, stretch[1])


def _own(observer: Any, count: Pair, reference: ReferenceData) -> Pair:
    """A count on the trajectory's own scale as TT, to some us."""
    return count if observer.scale == "TT" else tt_from_tdb_at_geocentre(count, reference)


def _piece_spans(observer: Any, anchor: Pair, reference: ReferenceData) -> list[tuple[float, float]]:
    found = []
    for piece in getattr(observer, "pieces", ()):
        first = -np.inf if piece.first is None else _since(_own(observer, piece.first, reference), anchor)
        last = np.inf if piece.last is None else _since(_own(observer, piece.last, reference), anchor)
        found.append((first, last))
    return found


def _seams(observer: Any, anchor: Pair, reference: ReferenceData) -> FloatArray:
    found: list[FloatArray] = [np.zeros(0)]
    for piece in getattr(observer, "pieces", ()):
        if hasattr(piece.motion, "_whole"):  # tabulated states, way points
            knots = _own(observer, (piece.motion._whole, piece.motion._fraction), reference)
            found.append(exact.seconds(exact.subtract(knots, anchor)))
    spans = [end for span in _piece_spans(observer, anchor, reference) for end in span]
    found.append(np.array([end for end in spans if np.isfinite(end)]))
    return np.unique(np.concatenate(found))
