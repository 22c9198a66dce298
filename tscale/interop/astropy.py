"""Instants from and to `astropy.time.Time`: both sides keep a date in two parts, and neither adds them up."""

from __future__ import annotations

import importlib
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from ..errors import InvalidInput, MissingPiece, ScaleMismatch
from ..instants import Instants

if TYPE_CHECKING:
    from ..formats.leap_seconds import LeapSeconds

__all__ = ["from_astropy", "to_astropy"]

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


def from_astropy(time: Any, place: str | None = None, *, leap_seconds: LeapSeconds | None = None) -> Instants:
    """Read an astropy `Time` of any shape and of scale utc, tai, tt, tcg, tcb, tdb or ut1.

    Its two parts `jd1` and `jd2` are read exactly; UTC days that end with a leap second are 86401 s long on both
    sides. `Time.location` is where astropy puts the observer when it converts, no part of the date, and is let be.

    Parameters
    ----------
    time : astropy.time.Time
    place : str or None
        Place to state: `TOPOCENTER`, `GEOCENTER`, `BARYCENTER` ...
    leap_seconds : LeapSeconds, optional
        For UTC.

    Returns
    -------
    Instants
        Of the same shape.

    Raises
    ------
    MissingPiece
        Without astropy.
    InvalidInput
        For anything but a `Time`, for the scale `local`, and for masked or non-finite dates (with the mask).
    OutOfSpan
        For UTC before the leap-second table.

    Notes
    -----
    On the few days of 1961 to 1971 that end with a step of some 0.1 s, ERFA (and astropy with it) takes the length of
    the day to 3 ns only: there the same two parts mean labels up to 3 ns apart.
    """
    kind = _time_class()
    if not isinstance(time, kind):
        raise InvalidInput(f"from_astropy reads an astropy Time, got {type(time).__name__}")
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


def to_astropy(t: Instants, *, leap_seconds: LeapSeconds | None = None) -> Any:
    """Write an astropy `Time` of the same shape.

    Two float64 of days hold less than `Instants`: the date is rounded to 5 ps. The place is no part of an astropy
    `Time`; keep it beside a barycentric date.

    Parameters
    ----------
    t : Instants
        Of scale UTC, TAI, TT, TCG, TCB, TDB or UT1.
    leap_seconds : LeapSeconds, optional
        For UTC; the default table is the one that astropy knows.

    Raises
    ------
    MissingPiece
        Without astropy.
    ScaleMismatch
        For a scale that astropy does not have; convert with `tscale.chain` first.
    """
    kind = _time_class()
    if t.scale not in _NAMES:
        raise ScaleMismatch(
            f"astropy has no scale {t.scale}; it has {', '.join(_NAMES)}. "
            f"Convert first, as in tscale.chain({t.scale!r}, 'TAI')"
        )
    day, fraction = t.to_mjd(leap_seconds=leap_seconds)
    # JD = MJD + 2400000.5: whole days in the one part, and what is left, from -0.5 to 0.5, in the other.
    return kind(day + 2400001.0, fraction - 0.5, format="jd", scale=_NAMES[t.scale])


def _time_class() -> Any:
    try:
        return importlib.import_module("astropy.time").Time
    except ImportError as error:
        raise MissingPiece("this needs the package astropy: pip install 'tscale[astropy]'") from error
