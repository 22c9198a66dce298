"""The rate of a clock against any coordinate time: from d(tau)/d(TCG) to TT and its kin, TCB and TDB."""

from __future__ import annotations

from typing import Final

import numpy as np

from ..constants import L_B, L_G
from ..earth.moving import topocentric_rate
from ..earth.observer import Observer
from ..errors import InvalidInput
from ..exact import FloatArray, Pair
from ..scales import Scale
from ..tables.reference import ReferenceData
from .barycentric import tdb_from_tt
from .body_events import body_time_rate

__all__ = ["checked_against", "rate_against", "tdb_per_tt"]

_TCG_GAIN: Final = float(L_G / (1 - L_G))
_TDB_PER_TCB: Final = -float(L_B)


def checked_against(against: object, *, own: bool = False) -> str:
    """The coordinate time given, or an error that lists them; with `own` that of the clock's body too."""
    if isinstance(against, str):
        if against in ("TCG", "TCB", "TDB", "TCL") or (own and against == "own"):
            return against
        if Scale.parse(against).count_minus_tai is not None:
            return against
    raise InvalidInput(
        f"a rate is given against TT (or TAI, UTC, GPS, GST, BDT, GLONASS, which run alike), TCG, TCB, TDB or, near "
        f"the Moon, TCL{', or against the own time of the body that both clocks are on' if own else ''}; got "
        f"against={against!r:.60}"
    )


def tdb_per_tt(observer: Observer | None, tt: Pair, reference: ReferenceData) -> FloatArray:
    """d(TDB)/d(TT) - 1 along the path of an observer, to 1e-18 within 1e8 m of the Earth (IAU 2000 B1.5: 5e-18).

    Parameters
    ----------
    observer : Observer or None
        Site or trajectory; None is the geocentre.
    tt : Pair
        TT count, any shape.
    reference : ReferenceData
        Ephemeris, time ephemeris, and what the observer needs.
    """
    tdb = tdb_from_tt(tt, reference, observer)
    gain = reference.time_ephemeris.rate(tdb)
    if observer is None:
        return np.asarray(-gain / (1.0 + gain))
    r_m, v_m_s = observer.gcrs(tt, reference)
    # The terms are wanted by TDB; the velocity is by TT, and the two differ by what is sought: two rounds leave 1e-20.
    tt_rate = gain
    for _ in range(2):
        velocity = v_m_s * (1.0 + tt_rate)[..., np.newaxis]
        tt_rate = gain - topocentric_rate(reference.ephemeris, tdb, r_m, velocity)
    return np.asarray(-tt_rate / (1.0 + tt_rate))


def rate_against(
    y: FloatArray,
    against: str,
    observer: Observer | None,
    tt: Pair,
    reference: ReferenceData,
    *,
    place: Observer | None = None,
) -> FloatArray:
    """d(tau)/d(X) - 1 for a coordinate time X, from y = d(tau)/d(TCG) - 1, without forming 1 + y.

    Parameters
    ----------
    y : float array
        As `rate_terms` gives it.
    against : str
        TCG; TT, TAI, UTC or a satellite-navigation time; TCB or TDB; TCL near the Moon.
    observer, tt, reference
        Where the clock is; used for TCB and TDB.
    place : Observer, optional
        Where the clock is, for TCL, if `observer` is None because TT is the geocentre's.
    """
    against = checked_against(against)
    if against == "TCG":
        return np.asarray(y)
    per_tt = _TCG_GAIN + y + _TCG_GAIN * y
    if against not in ("TCB", "TDB", "TCL"):
        return np.asarray(per_tt)
    slow = tdb_per_tt(observer, tt, reference)
    per_tdb = (per_tt - slow) / (1.0 + slow)
    if against == "TDB":
        return np.asarray(per_tdb)
    if against == "TCL":
        gain = body_time_rate(tdb_from_tt(tt, reference, observer), "moon", reference, place or observer or "earth")
        return np.asarray((per_tdb - gain) / (1.0 + gain))
    return np.asarray(per_tdb + _TDB_PER_TCB + per_tdb * _TDB_PER_TCB)
