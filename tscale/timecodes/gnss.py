"""Week and second of week of the satellite-navigation systems.

Weeks are counted from the origin of each system: GPS 1980-01-06 00:00:00 GPS (IS-GPS-200, 3.3.4), Galileo 1999-08-22
00:00:00 GST (Galileo OS-SIS-ICD, 5.1.2), BeiDou 2006-01-01 00:00:00 BDT (BDS-SIS-ICD, 3.3). Signals carry the number
of the week modulo 1024 (GPS legacy messages), 8192 (GPS modern messages, BeiDou) or 4096 (Galileo).
"""

from __future__ import annotations

from typing import Any, Final, NamedTuple

import numpy as np
import numpy.typing as npt

from ..constants import DAY_S, MJD_J2000
from ..counts import fixed_count
from ..errors import InvalidInput, OutOfSpan
from ..exact import FloatArray, IntArray, normalise
from ..formats.checks import integers, together
from ..instants import Instants
from ..scales import Scale

__all__ = ["GnssWeek", "from_gnss_week", "to_gnss_week"]

_WEEK_S: Final = 604800
_ORIGIN_MJD: Final = {"GPS": 44244, "GST": 51412, "BDT": 53736}


class GnssWeek(NamedTuple):
    """Weeks, and seconds in them."""

    week: IntArray
    """Weeks since the origin of the system, or modulo what was asked for."""
    second: IntArray
    """Whole seconds of the week, 0 to 604799."""
    fraction: FloatArray
    """Fraction of the second in [0, 1)."""


def from_gnss_week(
    week: npt.ArrayLike,
    second: npt.ArrayLike,
    fraction: npt.ArrayLike = 0.0,
    *,
    scale: str = "GPS",
    modulo: int | None = None,
    pivot: Instants | None = None,
) -> Instants:
    """Date weeks and seconds of week.

    Parameters
    ----------
    week : int array
        Weeks since the origin, or, with `modulo`, what is left of them.
    second : int array
        Whole seconds of the week, 0 to 604799.
    fraction : float array
        Fraction of the second in [0, 1).
    scale : {"GPS", "GST", "BDT"}
    modulo : int, optional
        The week number rolls over at this; 1024, 4096 or 8192 in the signals.
    pivot : Instants, optional
        One instant within half a rollover of all: it tells which rollover is meant. Needed with `modulo`, on a scale at
        a fixed distance from TAI.

    Returns
    -------
    Instants
        On `scale`.

    Raises
    ------
    InvalidInput
        Numbers out of range, with the mask; a modulus without a pivot, or a pivot without a modulus.
    OutOfSpan
        A pivot so early that the week meant would be before week 0, with the mask.
    """
    kind = _system(scale)
    weeks = integers(week, "a week", "give seconds of week apart")
    seconds = integers(second, "a second of week", "give its fraction apart")
    part = np.asarray(fraction, dtype=np.float64)
    weeks, seconds, part = together(weeks, seconds, part)
    top = 2**40 if modulo is None else _modulus(modulo)
    bad = (weeks < 0) | (weeks >= top) | (seconds < 0) | (seconds >= _WEEK_S) | ~((part >= 0.0) & (part < 1.0))
    if np.any(bad):
        raise InvalidInput(
            f"{int(np.count_nonzero(bad))} of {bad.size} are no weeks and seconds: allowed are weeks 0 to {top - 1}, "
            f"seconds 0 to {_WEEK_S - 1} and a fraction in [0, 1)",
            mask=np.asarray(bad),
        )
    if (modulo is None) != (pivot is None):
        raise InvalidInput(
            "modulo= and pivot= go together: a week number that has rolled over needs one instant within half a "
            "rollover of all, as Instants"
        )
    elapsed = seconds + _WEEK_S * weeks
    if modulo is not None and pivot is not None:
        if pivot.size != 1:
            raise InvalidInput(f"the pivot is one instant, got shape {pivot.shape}")
        middle = fixed_count(pivot.ravel()[0].pair, Scale.parse(pivot.scale), kind)[0] - _origin(kind)
        turn = modulo * _WEEK_S
        elapsed = elapsed + turn * ((middle - elapsed + turn // 2) // turn)
        early = np.asarray(elapsed < 0)
        if np.any(early):
            raise OutOfSpan(
                f"{int(np.count_nonzero(early))} of {early.size} weeks nearest to the pivot are before week 0 of "
                f"{kind}, which starts on MJD {_ORIGIN_MJD[kind.name]}; is the pivot right?",
                mask=early,
            )
    return Instants._of(normalise(elapsed + _origin(kind), part), kind)


def to_gnss_week(t: Instants, *, modulo: int | None = None) -> GnssWeek:
    """Week and second of week of instants on GPS, GST or BDT.

    Parameters
    ----------
    t : Instants
    modulo : int, optional
        Give the week number modulo this.

    Raises
    ------
    InvalidInput
        Another scale: convert with `tscale.chain` first.
    OutOfSpan
        Before the origin of the system, with the mask.
    """
    kind = _system(t.scale)
    since = t.whole - _origin(kind)
    early = np.asarray(since < 0)
    if np.any(early):
        raise OutOfSpan(
            f"{int(np.count_nonzero(early))} of {early.size} instants are before week 0 of {kind}, which starts on "
            f"MJD {_ORIGIN_MJD[kind.name]}",
            mask=early,
        )
    week, second = np.divmod(since, _WEEK_S)
    return GnssWeek(np.asarray(week if modulo is None else week % _modulus(modulo)), np.asarray(second), t.fraction)


def _system(scale: str) -> Scale:
    if scale not in _ORIGIN_MJD:
        raise InvalidInput(f"weeks are counted on {', '.join(_ORIGIN_MJD)}, got {scale!r}; convert with tscale.chain")
    return Scale.parse(scale)


def _origin(kind: Scale) -> int:
    return (_ORIGIN_MJD[kind.name] - MJD_J2000) * DAY_S - DAY_S // 2


def _modulus(modulo: Any) -> int:
    if isinstance(modulo, bool) or not isinstance(modulo, int | np.integer) or not 1 <= modulo <= 2**20:
        raise InvalidInput(f"modulo must be a whole number such as 1024, 4096 or 8192, got {modulo!r}")
    return int(modulo)
