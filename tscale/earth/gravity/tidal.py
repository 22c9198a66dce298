"""The tide-raising potential of the Moon, the Sun and other bodies, and what of it a clock on the ground sees.

In the frame that falls with a body's centre, another body pulls only by what is left of its potential once the value
and the linear part at that centre are taken away (IAU 2000 Resolution B1.3; Soffel et al. 2003, AJ 126, 2687, sec. 4):

    V(r) = sum GM/d [1/sqrt(1 - 2 rho s + rho^2) - 1 - rho s],  rho = r/d, s the cosine of the angle between r and d,

which holds degrees 2, 3 and on. On the ground degree 2 of the Moon is up to 4.4 m2/s2 and of the Sun 1.7 m2/s2; degree
3 of the Moon is 0.08 m2/s2. A clock in the potential V runs slow by V/c^2, 7e-17 at most.

The ground yields: it rises by h2 V/g, which takes h2 V away, and the mass that moves with it adds k2 V. A clock fixed
to it sees (1 + k2 - h2) V, about 0.69 V (degree 3: 0.80, left out: 9e-20; ocean loading, 5e-18 at some coasts, is too).

The permanent tide. V has a mean, 0.97 (1 - 3 sin^2 phi) m2/s2. A clock sees it whole, and the Earth's response to it as
it truly is. Coefficients, heights and coordinates tell what they hold of that response:

* *zero-tide*: the true mean figure and its own potential (levelling, J2 of `EARTH_ZONAL`). Only the response to what
  varies is still to be added: (1 + k2 - h2) V + (h2 - k2) mean of V;
* *tide-free* (conventional): the response to the mean is taken out too, as in ITRF positions and the harmonic models
  that go with them: (1 + k2 - h2) V in all;
* *mean-tide*: the mean of V itself is in there as well (mean sea level): (1 + k2 - h2) (V - mean of V).
"""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING, Final, Literal

import numpy as np
import numpy.typing as npt

from ...constants import EARTH_FIELD_RADIUS_M, EARTH_GM_TT_M3_S2, LOVE_H2, LOVE_K2
from ...ephemeris.bodies import body_id, body_name
from ...errors import InvalidInput
from ...exact import FloatArray, Pair
from ..frames import dot
from .arguments import positions

if TYPE_CHECKING:
    from ...tables.reference import ReferenceData

__all__ = [
    "PERMANENT_C20",
    "ground_tidal_potential_m2_s2",
    "ground_tide_factor",
    "permanent_tide_m2_s2",
    "tidal_potential_m2_s2",
]

TideSystem = Literal["zero_tide", "tide_free", "mean_tide"]

PERMANENT_C20: Final = 4.4228e-8 * -0.31460
"""Normalised C20 of the mean tide-raising potential at the reference radius, A0 H0 (TN36 eqs. 6.13 and 6.14)."""


def tidal_potential_m2_s2(
    r_gcrs_m: npt.ArrayLike,
    tt: Pair,
    reference: ReferenceData,
    bodies: Sequence[str | int] = ("moon", "sun"),
    *,
    center: str | int = "earth",
    max_degree: int | None = None,
) -> FloatArray:
    """Direct tide-raising potential at a point, without any yielding of the ground.

    Parameters
    ----------
    r_gcrs_m : float array (..., 3)
        Position from the centre on the GCRS axes, m; broadcasts with `tt`.
    tt : Pair
        TT counts. They are taken for TDB: 2 ms move the Moon by 2 m, 2e-8 m2/s2 on the ground.
    reference : ReferenceData
        Its ephemeris gives positions and GM. That these are barycentric costs 1e-8 of the potential.
    bodies : sequence of str or int
        Bodies that pull, by name or NAIF number. Venus, the largest left out by default, adds 1e-4 m2/s2.
    center : str or int
        Body at whose centre `r_gcrs_m` starts.
    max_degree : int, optional
        2 or 3 to keep the expansion in Legendre polynomials to that degree; the exact difference by default, which is
        as well conditioned and holds at any distance.

    Returns
    -------
    float array
        m2/s2, of either sign; its mean over a sphere is 0.

    Raises
    ------
    InvalidInput
        Positions that are not finite, a body that pulls at its own centre or twice, or another degree.
    OutOfSpan, MissingPiece
        As `Ephemeris.positions`.
    """
    origin, numbers = body_id(center), _pulling(bodies, center)
    if max_degree is not None and (isinstance(max_degree, bool) or max_degree not in (2, 3)):
        raise InvalidInput(f"max_degree is 2, 3 or None for the exact difference, got {max_degree!r}")
    r = positions(r_gcrs_m, "tidal potential")
    distant = reference.ephemeris.positions(numbers, tt, origin)
    shape = np.broadcast_shapes(r.shape[:-1], distant.shape[1:-1])
    total = np.zeros(shape)
    r2 = dot(r, r)
    for number, x in zip(numbers, distant, strict=True):
        d2 = dot(x, x)
        rho2, along = r2 / d2, dot(r, x) / d2
        scale = reference.ephemeris.gm_m3_s2(number) / np.sqrt(d2)
        total += scale * (_difference(rho2, along) if max_degree is None else _series(rho2, along, max_degree))
    return np.asarray(total)


def _pulling(bodies: Sequence[str | int], center: str | int) -> tuple[int, ...]:
    if isinstance(bodies, str) or not isinstance(bodies, Sequence) or not bodies:
        raise InvalidInput(f'bodies is a sequence of names or numbers such as ("moon", "sun"), got {bodies!r:.60}')
    numbers = tuple(body_id(body) for body in bodies)
    if body_id(center) in numbers or 0 in numbers:
        raise InvalidInput(
            f"bodies holds {body_name(body_id(center))} or the barycenter: a tide is raised by other bodies than the "
            "one at the centre"
        )
    if len(set(numbers)) != len(numbers):
        raise InvalidInput(f"bodies holds a body twice: {bodies!r:.80}")
    return numbers


def _difference(rho2: FloatArray, along: FloatArray) -> FloatArray:
    """1/sqrt(1 + x) - 1 - rho s with x = rho^2 - 2 rho s.

    Its value is of the order rho^2, and taken as written it loses rho^-2 to rounding. With w = sqrt(1 + x) it equals
    (w - 1)^2 (w + 2)/(2 w) - rho^2/2, in which nothing larger than the result is left.
    """
    x = rho2 - 2.0 * along
    w = np.sqrt(1.0 + x)
    short = x / (1.0 + w)
    return np.asarray(short * short * (w + 2.0) / (2.0 * w) - 0.5 * rho2)


def _series(rho2: FloatArray, along: FloatArray, max_degree: int) -> FloatArray:
    """rho^2 P2(s), and rho^3 P3(s) with degree 3, where `along` is rho s."""
    total = 1.5 * along * along - 0.5 * rho2
    if max_degree == 3:
        total = total + along * (2.5 * along * along - 1.5 * rho2)
    return np.asarray(total)


def ground_tide_factor(k2: float = LOVE_K2, h2: float = LOVE_H2) -> float:
    """1 + k2 - h2: share of the tide-raising potential that a clock fixed to the yielding ground sees.

    Defaults are the nominal Love numbers of the IERS Conventions (2010), 0.694 in all; for single tides it differs by
    less than 0.01, but by 0.04 for the diurnal K1 near its resonance (TN36 Tables 6.5a and 7.2; 6e-19 in frequency).
    """
    for name, value in (("k2", k2), ("h2", h2)):
        if not (math.isfinite(value) and 0.0 <= value <= 3.0):
            raise InvalidInput(f"the Love number {name} must lie within 0 to 3, got {value!r}")
    return 1.0 + k2 - h2


def permanent_tide_m2_s2(r_m: npt.ArrayLike) -> FloatArray:
    """Mean of the tide-raising potential of Moon and Sun, at positions (..., 3) with z along the Earth's axis, m2/s2.

    GM/R (r/R)^2 sqrt(5) A0 H0 P2(z/r) (TN36 eqs. 6.13 and 6.14), 0.97 (1 - 3 sin^2 phi) m2/s2 on the ground. The z of
    the GCRS serves as well: until 2100 that costs 0.03 m2/s2 of it.
    """
    r = positions(r_m, "permanent tide")
    scale = EARTH_GM_TT_M3_S2 / EARTH_FIELD_RADIUS_M**3 * math.sqrt(5.0) * PERMANENT_C20
    return np.asarray(scale * (1.5 * r[..., 2] ** 2 - 0.5 * dot(r, r)))


def ground_tidal_potential_m2_s2(
    r_gcrs_m: npt.ArrayLike,
    tt: Pair,
    reference: ReferenceData,
    bodies: Sequence[str | int] = ("moon", "sun"),
    *,
    tide_system: TideSystem = "zero_tide",
    factor: float | None = None,
) -> FloatArray:
    """Tidal potential seen by a clock fixed to the ground, beside a geopotential number of the stated tide system.

    Parameters
    ----------
    r_gcrs_m, tt, reference, bodies
        As `tidal_potential_m2_s2`.
    tide_system : {"zero_tide", "tide_free", "mean_tide"}
        What the potential without tides, to which this is added, holds of the permanent tide; see the module.
    factor : float, optional
        1 + k2 - h2, by default `ground_tide_factor()`.

    Returns
    -------
    float array
        m2/s2; a clock runs slow by this over c^2.

    Raises
    ------
    InvalidInput, OutOfSpan, MissingPiece
        As `tidal_potential_m2_s2`; an unknown tide system.
    """
    share = ground_tide_factor() if factor is None else factor
    if not math.isfinite(share):
        raise InvalidInput(f"factor must be a finite number, got {factor!r}")
    mean_share = {"zero_tide": 1.0 - share, "tide_free": 0.0, "mean_tide": -share}.get(tide_system)
    if mean_share is None:
        raise InvalidInput(f"tide_system is zero_tide, tide_free or mean_tide, got {tide_system!r}")
    seen = share * tidal_potential_m2_s2(r_gcrs_m, tt, reference, bodies)
    return np.asarray(seen + mean_share * permanent_tide_m2_s2(r_gcrs_m))
