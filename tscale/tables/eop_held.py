"""Earth orientation past the end of its table, where the last values are held: what that costs, and saying so."""

from __future__ import annotations

from typing import Final

import numpy as np

from ..constants import JULIAN_YEAR_S
from ..errors import warn_extrapolation
from ..exact import FloatArray
from .common import mjd_date

__all__ = ["grow_sigmas", "warn_held"]

_ARCSEC: Final = float(np.pi) / 648000.0

# Hindcast over C04 1962-2026, every day as a start: UT1-TAI held for n years is off by 0.65 s per year rms, the same
# from 0.1 to 10 years (1 year 0.65 s, largest 1.15 s; 5 years 3.3 s; 30 years 18 s); since 2000 alone 0.26 s after
# 1 year and 3.5 s after 10. A pole coordinate held is off by 0.23 arcsec rms at the worst lag, half a year (0.56 at
# most), and by 0.1 to 0.2 arcsec rms at any longer one.
_HELD_UT1_S_PER_YEAR: Final = 0.65
_HELD_POLE_RAD: Final = 0.3 * _ARCSEC
_HELD_OFFSET_RAD: Final = 0.25e-3 * _ARCSEC


def grow_sigmas(sigmas: FloatArray, past_s: FloatArray) -> None:
    """Let uncertainties (5, ...) grow, in place, where values are held `past_s` > 0 seconds past the last row."""
    held = past_s > 0.0
    sigmas[0, held] = np.hypot(sigmas[0, held], _ut1_sigma_s(past_s[held]))
    sigmas[1:3, held] = np.maximum(sigmas[1:3, held], _HELD_POLE_RAD)
    sigmas[3:5, held] = np.maximum(sigmas[3:5, held], _HELD_OFFSET_RAD)


def warn_held(past_s: FloatArray, name: str, end_mjd: int) -> None:
    """Say that values are held, in the name of whoever called the package."""
    warn_extrapolation(
        f"instants are past the end of the Earth orientation {name!r} on {mjd_date(end_mjd)}: the last values are "
        "held, UT1 known to {worst} s at the latest",
        int(np.count_nonzero(past_s)),
        past_s.size,
        float(_ut1_sigma_s(past_s).max()),
    )


def _ut1_sigma_s(past_s: FloatArray) -> FloatArray:
    return np.asarray(_HELD_UT1_S_PER_YEAR / JULIAN_YEAR_S * past_s)
