"""The rate of a clock at given dates, in all and term by term."""

from __future__ import annotations

import numpy as np

from ..earth.gravity.field import GravityField
from ..earth.observer import Observer
from ..exact import FloatArray
from ..instants import Instants
from ..tables.reference import ReferenceData
from ..transforms.proper_integral import SET_RATE
from ..transforms.proper_models import model_of, total_of
from ..transforms.proper_scales import checked_against, rate_against
from ..transforms.proper_tides import Tides
from .arguments import as_ticking, checked_dates, checked_tables
from .dates import tt_at
from .proper_clock import ProperClock
from .rate_ledger import RateLedger

__all__ = ["proper_ledger", "proper_rate"]


def proper_ledger(
    clock: Observer | ProperClock,
    t: Instants,
    against: str = "TT",
    *,
    gravity: GravityField | None = None,
    tides: Tides = True,
    reference: ReferenceData | None = None,
) -> RateLedger:
    """Terms of the rate of a clock against a coordinate time.

    Parameters
    ----------
    clock : Site, Trajectory, SurfaceSite or ProperClock
        The clock. A `ProperClock` brings its own gravity, tides and set rate.
    t : Instants
        Dates of events at the clock, any shape, on any coordinate time.
    against : str
        TT (or TAI, UTC and the satellite-navigation times, which run alike), TCG, TCB, TDB; near the Moon TCL.
    gravity : GravityField, optional
        See `transforms.proper_time.rate_terms`.
    tides : bool or str
        See there.
    reference : ReferenceData, optional
        `ReferenceData.default()` if not given.

    Returns
    -------
    RateLedger
        Near the Earth kinematic, gravitational, tidal, second order: parts of d(tau)/d(TCG) - 1. On other bodies and
        elsewhere the parts that `transforms.proper_models` names, and TT and TCG as it says. Then what the coordinate
        time adds, and the set rate of a `ProperClock`.

    Raises
    ------
    InvalidInput, MissingPiece, OutOfSpan, ScaleMismatch
        As `rate_terms`; for a date or an `against` that is no coordinate time.
    """
    ticking, tables, against = (
        as_ticking(clock, gravity, tides, "a clock"),
        checked_tables(reference),
        checked_against(against),
    )
    model = model_of(ticking.observer, ticking.gravity, ticking.tides)
    own = ticking.observer if model.dates_own_event else None
    tt = tt_at(checked_dates(t, "t"), own, tables)
    terms = model.terms(tt, tables)
    whole = total = total_of(terms)
    if against != "TCG":
        whole = rate_against(total, against, own, tt, tables, place=ticking.observer)
        terms[f"TCG against {against}"] = np.asarray(whole - total)
    if ticking.rate_offset:
        terms[SET_RATE] = np.asarray((1.0 + whole) * ticking.rate_offset)
    return RateLedger(ticking.name, against, terms)


def proper_rate(
    clock: Observer | ProperClock,
    t: Instants,
    against: str = "TT",
    *,
    gravity: GravityField | None = None,
    tides: Tides = True,
    reference: ReferenceData | None = None,
) -> FloatArray:
    """d(tau)/d(X) - 1 of a clock against a coordinate time X, to 1e-18 where its potential is known to 0.1 m2/s2.

    Parameters and errors are those of `proper_ledger`.

    Returns
    -------
    float array
        In the shape of `t`, dimensionless.
    """
    ticking, tables, against = (
        as_ticking(clock, gravity, tides, "a clock"),
        checked_tables(reference),
        checked_against(against),
    )
    model = model_of(ticking.observer, ticking.gravity, ticking.tides)
    own = ticking.observer if model.dates_own_event else None
    tt = tt_at(checked_dates(t, "t"), own, tables)
    whole = rate_against(total_of(model.terms(tt, tables)), against, own, tt, tables, place=ticking.observer)
    return np.asarray(whole + ticking.rate_offset + whole * ticking.rate_offset)
