"""Instants and astropy's `Time`: both sides keep a date in two parts, and neither adds them up."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any, Final

import numpy as np

from ..errors import InvalidInput, ScaleMismatch
from ..exact import two_sum
from ..formats import julian, labels
from ..instants import Instants
from .optional import needed

if TYPE_CHECKING:
    from ..formats.leap_seconds import LeapSeconds

__all__ = ["instants_of", "time_of"]

_SCALES: Final = {
    "utc": "UTC",
    "tai": "TAI",
    "tt": "TT",
    "tcg": "TCG",
    "tcb": "TCB",
    "tdb": "TDB",
    "ut1": "UT1",
}
_NAMES: Final = {ours: theirs for theirs, ours in _SCALES.items()}


def instants_of(time: Any, place: str | None, leap_seconds: LeapSeconds | None) -> Instants:
    """See `from_astropy`."""
    if time.scale not in _SCALES:
        raise InvalidInput(f"astropy's scale {time.scale!r} names no time scale; allowed are {', '.join(_SCALES)}")
    masked = np.broadcast_to(np.asarray(time.mask, dtype=np.bool_), time.shape)
    if masked.any():
        raise InvalidInput(
            f"{int(np.count_nonzero(masked))} of {masked.size} dates are masked; leave them out (see .mask)",
            mask=masked.copy(),
        )
    first, second = np.array(time.jd1, dtype=np.float64), np.array(time.jd2, dtype=np.float64)
    whole = np.floor(first)
    if np.any(first != whole):
        raise InvalidInput("jd1 of this Time holds parts of a day; make it anew with Time(t.jd1, t.jd2, format='jd')")
    return Instants.from_jd(whole, second, _SCALES[time.scale], place, leap_seconds=leap_seconds)


def time_of(t: Instants, leap_seconds: LeapSeconds | None) -> Any:
    """See `to_astropy`."""
    kind = needed("astropy.time").Time
    if t.scale not in _NAMES:
        raise ScaleMismatch(
            f"astropy has no scale {t.scale}; it has {', '.join(_NAMES)}. "
            f"Convert first, as in tscale.chain({t.scale!r}, 'TAI')"
        )
    length = labels.day_length(t.node.scale, leap_seconds)
    day, high, low = julian._day_fraction(*t._label(leap_seconds), length)
    # JD = MJD + 2400000.5: whole days in the one part, and what is left, from -0.5 to 0.5, in the other.
    rest, error = two_sum(high, -0.5)
    return kind(day + 2400001.0, rest + (error + low), format="jd", scale=_NAMES[t.scale])
