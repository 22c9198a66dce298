"""What a clock near the Earth sees of the tides: Moon and Sun themselves, and the yielding Earth.

With V the tide-raising potential and V0 its mean (the permanent tide), a clock sees

* fixed to the ground beside a levelled geopotential number: (1 + k2 - h2) V, and of V0 what the number does not hold:
  (h2 - k2) V0 more with a zero-tide number (IAG 1983 Resolution 16; the default), -(1 + k2 - h2) V0 with one of the
  mean tide, nothing with a tide-free one;
* fixed to the ground beside a gravity field evaluated at its (tide-free) ITRF position: (1 + k2 - h2) V, less k2 V0 if
  the field is zero-tide and (1 + k2) V0 if it is of the mean tide;
* in the air or in orbit: V, and k2 (R/r)^5 of V less V0 from the tidal bulges of the Earth, which a zero-tide field
  holds on average (a fifth of V in a low orbit).

IERS Conventions (2010), chapters 1, 6.2 and 7.1, with the nominal Love numbers. Left out: what Love numbers of single
tides differ (4e-19), the ocean's tides (up to 5e-18 at some coasts), its load and the air's, the tide of the pole
(2e-18).
"""

from __future__ import annotations

from typing import Final, Literal, TypeAlias, get_args

import numpy as np

from ..constants import EARTH_FIELD_RADIUS_M, LOVE_H2, LOVE_K2
from ..earth.frames import dot
from ..earth.gravity.field import GravityField
from ..earth.gravity.tidal import ground_tide_factor, permanent_tide_m2_s2, tidal_potential_m2_s2
from ..errors import InvalidInput
from ..exact import FloatArray, Pair
from ..tables.reference import ReferenceData

__all__ = ["Kind", "TideSystem", "Tides", "checked_tides", "tide_m2_s2"]

TideSystem: TypeAlias = Literal["zero_tide", "mean_tide", "tide_free"]
Tides: TypeAlias = bool | TideSystem
"""Whether there are tides; or what a levelled geopotential number holds of the permanent one (True: zero_tide)."""
Kind: TypeAlias = Literal["levelled", "ground", "free"]

# Shares of V0 that are added.
_LEVELLED: Final = {"zero_tide": LOVE_H2 - LOVE_K2, "mean_tide": LOVE_H2 - LOVE_K2 - 1.0, "tide_free": 0.0}
_GROUND: Final = {"zero_tide": -LOVE_K2, "mean_tide": -1.0 - LOVE_K2, "tide_free": 0.0}


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
        The field in use, for what it says of its tide system (`tide_system`; zero-tide if it says nothing).
    """
    direct = tidal_potential_m2_s2(r_gcrs_m, tt, reference)
    permanent = permanent_tide_m2_s2(r_gcrs_m)
    if kind == "levelled":
        system = "zero_tide" if isinstance(tides, bool) else tides
        return np.asarray(ground_tide_factor() * direct + _LEVELLED[system] * permanent)
    stated = str(getattr(gravity, "tide_system", "zero_tide"))
    if kind == "ground":
        # A file that does not say follows the habit of such files.
        return np.asarray(ground_tide_factor() * direct + _GROUND.get(stated, 0.0) * permanent)
    bulge = LOVE_K2 * (EARTH_FIELD_RADIUS_M**2 / dot(r_gcrs_m, r_gcrs_m)) ** 2.5
    held = {"zero_tide": bulge, "mean_tide": 1.0 + bulge}.get(stated, 0.0)
    return np.asarray((1.0 + bulge) * direct - held * permanent)
