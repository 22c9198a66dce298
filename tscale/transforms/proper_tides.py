"""What a clock near the Earth sees of the tides: Moon and Sun themselves, and the yielding Earth.

With V the tide-raising potential and V0 its mean (the permanent tide), a clock sees

* fixed to the ground beside a levelled geopotential number: (1 + k2 - h2) V, and of V0 what the number does not hold:
  (h2 - k2) V0 more with a zero-tide number (IAG 1983 Resolution 16; the default), -(1 + k2 - h2) V0 with one of the
  mean tide, nothing with a tide-free one;
* fixed to the ground beside a gravity field evaluated at its (tide-free) ITRF position: (1 + k2 - h2) V, less k2 V0 if
  the field is zero-tide and (1 + k2) V0 if it is of the mean tide;
* in the air or in orbit: V, and k2 (R/r)^5 of V less V0 from the tidal bulges of the Earth, which a zero-tide field
  holds on average (a fifth of V in a low orbit).

A clock in the air or in orbit has the planets too from 3e7 m of the Earth on, where they reach 2e-20 (6e-17 at 1.5e9
m), at the barycentric place and TDB of its event. By the barycentric metric as a check, all is then right to 3e-19 as
far as 1e8 m, to 1e-18 at the Moon's distance, to 4e-18 at 1.5e9 m, and in proportion to the distance beyond: what the
topocentric terms leave out.

IERS Conventions (2010), chapters 1, 6.2 and 7.1, with the nominal Love numbers. Left out: what Love numbers of single
tides differ (4e-19), the ocean's tides (up to 5e-18 at some coasts), its load and the air's, the tide of the pole
(2e-18).
"""

from __future__ import annotations

from typing import Final, Literal, TypeAlias, get_args

import numpy as np

from .. import exact
from ..constants import EARTH_FIELD_RADIUS_M, LOVE_H2, LOVE_K2
from ..earth.frames import bcrs_offset, dot
from ..earth.gravity.field import GravityField
from ..earth.gravity.tidal import ground_tide_factor, permanent_tide_m2_s2, tidal_potential_m2_s2
from ..earth.moving import EarthAndSun, tdb_from_tt_at_geocentre
from ..ephemeris.bodies import PLANETARY_BODIES
from ..errors import InvalidInput
from ..exact import FloatArray, Pair
from ..tables.reference import ReferenceData

__all__ = ["UNKNOWN_TIDE_SYSTEM", "Kind", "TideSystem", "Tides", "bulge_m2_s2", "checked_tides", "tide_m2_s2"]

TideSystem: TypeAlias = Literal["zero_tide", "mean_tide", "tide_free"]
Tides: TypeAlias = bool | TideSystem
"""Whether there are tides; or what a levelled geopotential number holds of the permanent one (True: zero_tide)."""
Kind: TypeAlias = Literal["levelled", "ground", "free"]

UNKNOWN_TIDE_SYSTEM: Final = "tide system of the gravity field: not stated, taken for tide-free (6e-18 to zero-tide)"
"""What notes and budgets say of a field that does not say what it holds of the permanent tide."""

# Shares of V0 that are added.
_LEVELLED: Final = {"zero_tide": LOVE_H2 - LOVE_K2, "mean_tide": LOVE_H2 - LOVE_K2 - 1.0, "tide_free": 0.0}
_GROUND: Final = {"zero_tide": -LOVE_K2, "mean_tide": -1.0 - LOVE_K2, "tide_free": 0.0}

_OTHERS: Final = tuple(body for body in PLANETARY_BODIES if body != 399)
_FAR_M: Final = 3e7
"""From here on the planets are counted, m: the step of 2e-20 is less than what a quadrature would halve panels for."""


def checked_tides(tides: object) -> Tides:
    """The choice given, or an error that lists the choices."""
    if isinstance(tides, bool | np.bool_):
        return bool(tides)
    for system in get_args(TideSystem):
        if isinstance(tides, str) and tides == system:
            found: TideSystem = system
            return found
    raise InvalidInput(
        f"tides= is True, False, or the tide system of a levelled geopotential number, one of "
        f"{', '.join(get_args(TideSystem))}; got {tides!r:.60}"
    )


def tide_m2_s2(
    kind: Kind,
    r_gcrs_m: FloatArray,
    tt: Pair,
    reference: ReferenceData,
    tides: Tides,
    gravity: GravityField | None,
) -> FloatArray:
    """Tidal potential that a clock sees, m2/s2, positive where it slows the clock.

    Parameters
    ----------
    kind : {"levelled", "ground", "free"}
        On the ground with a geopotential number, on the ground in a gravity field, in the air or in space.
    r_gcrs_m : float array (..., 3)
        Geocentric position, m.
    tt : Pair
        TT count.
    reference : ReferenceData
        For the ephemeris.
    tides : bool or str
        See `Tides`.
    gravity : GravityField or None
        The field in use, for what it says of its tide system (`tide_system`): zero-tide if it has no such attribute;
        `unknown`, as of a file that does not state it, is taken for tide-free.
    """
    permanent = permanent_tide_m2_s2(r_gcrs_m)
    stated = str(getattr(gravity, "tide_system", "zero_tide"))
    if kind == "free":
        share = _bulge(r_gcrs_m)
        held = {"zero_tide": share, "mean_tide": 1.0 + share}.get(stated, 0.0)
        return np.asarray((1.0 + share) * _direct_at_any_distance(r_gcrs_m, tt, reference) - held * permanent)
    direct = tidal_potential_m2_s2(r_gcrs_m, tt, reference)
    if kind == "levelled":
        system = "zero_tide" if isinstance(tides, bool) else tides
        return np.asarray(ground_tide_factor() * direct + _LEVELLED[system] * permanent)
    # A file that does not say follows the habit of such files.
    return np.asarray(ground_tide_factor() * direct + _GROUND.get(stated, 0.0) * permanent)


def bulge_m2_s2(r_m: FloatArray, tt: Pair, reference: ReferenceData) -> FloatArray:
    """What the tidal bulges alone add to a zero-tide field at positions (..., 3) from the geocentre, m2/s2."""
    return np.asarray(_bulge(r_m) * (tidal_potential_m2_s2(r_m, tt, reference) - permanent_tide_m2_s2(r_m)))


def _bulge(r_m: FloatArray) -> FloatArray:
    """k2 (R/r)^5."""
    return np.asarray(LOVE_K2 * (EARTH_FIELD_RADIUS_M**2 / dot(r_m, r_m)) ** 2.5)


def _direct_at_any_distance(r_gcrs_m: FloatArray, tt: Pair, reference: ReferenceData) -> FloatArray:
    """Direct tide; from `_FAR_M` on that of all bodies, with place and date of the event in the barycentric frame."""
    far = dot(r_gcrs_m, r_gcrs_m) > _FAR_M**2
    if not np.any(far):
        return tidal_potential_m2_s2(r_gcrs_m, tt, reference)
    whole, fraction = np.broadcast_to(tt[0], far.shape), np.broadcast_to(tt[1], far.shape)
    found = np.empty(far.shape)
    found[~far] = tidal_potential_m2_s2(r_gcrs_m[~far], (whole[~far], fraction[~far]), reference)
    r_m, near = r_gcrs_m[far], tdb_from_tt_at_geocentre((whole[far], fraction[far]), reference)
    bodies = EarthAndSun.at(reference.ephemeris, near)
    place = bcrs_offset(r_m, bodies.earth_v_m_s, bodies.acceleration_m_s2, bodies.potential_m2_s2)
    tdb = exact.add_seconds(near, bodies.terms(r_m).total_s)
    found[far] = tidal_potential_m2_s2(place, tdb, reference, _OTHERS)
    return found
