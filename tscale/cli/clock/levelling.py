"""From a measured frequency difference of two clocks on the ground to potentials and heights."""

from __future__ import annotations

import argparse
import math
from collections.abc import Sequence
from dataclasses import replace
from typing import TYPE_CHECKING, Any, NamedTuple

from .ends import ClockEnd
from .quantities import REAL_GRAVITY_M_S2
from .rates import Found, Model

if TYPE_CHECKING:
    from .budget import RateBudget

__all__ = ["Levelling", "add_measured", "checked_measured", "levelled", "with_potentials"]


class Levelling(NamedTuple):
    """Two places on the ground by the frequencies of their clocks, a minus b."""

    measured: float
    sigma: float
    unlevelled: float
    """Part of the predicted rate that is no difference of level: tides, second order."""
    geopotential_m2_s2: float
    geopotential_sigma_m2_s2: float
    height_m: float
    height_sigma_m: float
    gravity_m_s2: float
    """Mean gravity between the two."""
    height_of_a_m: float | None
    """Height of a above the geoid, that of b taken as stated; None where that is not known."""
    pull: float | None
    """Measured minus predicted rate over the standard uncertainties of both; None without a prediction."""


def add_measured(parser: argparse.ArgumentParser) -> None:
    """Add the options of a measurement."""
    group = parser.add_argument_group("levelling", "two sites on the ground: from a measured rate to their heights")
    group.add_argument("--measured", metavar="Y", type=float, help="fractional frequency of CLOCK less that of CLOCK2")
    group.add_argument("--measured-sigma", metavar="U", type=float, help="its standard uncertainty")


def checked_measured(args: argparse.Namespace, ends: Sequence[ClockEnd]) -> None:
    """Refuse a measurement that does not go with the clocks.

    Raises
    ------
    InvalidInput
        Half of it, values that cannot be, clocks that are not two sites.
    """
    from ...errors import InvalidInput

    if (args.measured is None) != (args.measured_sigma is None):
        raise InvalidInput("--measured and --measured-sigma belong together: give both, as fractions such as 4.1e-17")
    if args.measured is None:
        return
    if not (math.isfinite(args.measured) and math.isfinite(args.measured_sigma) and args.measured_sigma > 0.0):
        raise InvalidInput(
            f"--measured is a fraction and --measured-sigma one above zero; got {args.measured!r} and "
            f"{args.measured_sigma!r}"
        )
    kinds = [end.kind for end in ends]
    if kinds != ["site", "site"]:
        raise InvalidInput(
            "--measured is for two clocks on the ground, CLOCK and CLOCK2 with a [site] each; got "
            f"{' and '.join(kinds)}"
        )
    if args.set_offset:
        raise InvalidInput("--measured compares unperturbed frequencies: leave --set-offset out")


def with_potentials(ends: Sequence[ClockEnd], model: Model) -> tuple[list[ClockEnd], bool]:
    """The sites with a potential for the tide's sake where they state none, and whether all of them do.

    The height above the ellipsoid stands in; off by 100 m it moves tides and second order by 1e-21.
    """
    from ...transforms.proper_time import geopotential_number_of

    known, found = True, []
    for end in ends:
        if model.gravity is None and geopotential_number_of(end.observer) is None:
            known = False
            site: Any = end.observer
            end = end._replace(observer=replace(site, height_above_geoid_m=site.height_m))
        found.append(end)
    return found, known


def levelled(args: argparse.Namespace, given: Sequence[ClockEnd], found: Found, budget: RateBudget | None) -> Levelling:
    """What the measurement says of the two places.

    Parameters
    ----------
    args : argparse.Namespace
        With the measurement.
    given : sequence of ClockEnd
        The sites as their files state them.
    found : Found
        The predicted rate, of which tides and second order are taken off the measured one.
    budget : RateBudget or None
        Of the predicted rate; None if there is none.
    """
    from ...clocks import height_from_frequency
    from ...constants import C_M_S
    from ...earth.gravity.normal import height_above_geoid_m
    from ...transforms.proper_time import geopotential_number_of

    levels = [found.ledger[name] for name in ("kinematic", "gravitational")]
    rest = (found.accumulated_s - sum(levels)) / found.duration_s
    a, b = (end.observer for end in given)
    site_a: Any = a
    site_b: Any = b
    number = geopotential_number_of(b)
    base: float = site_b.height_m
    if number is not None:
        base = float(height_above_geoid_m(number, site_b.lat_deg))
    between = height_from_frequency(
        args.measured - rest, args.measured_sigma, lat_deg=site_a.lat_deg, height_above_geoid_m=base
    )
    height = float(between.height_m)
    of_a = None
    if number is not None:
        # Levels far apart are not parallel: each height goes with the gravity of its own place.
        of_a = float(height_above_geoid_m(number + float(between.geopotential_number_m2_s2), site_a.lat_deg))
        height = of_a - base
    gravity = float(between.gravity_m_s2)
    pull = None
    if budget is not None and budget.sigma is not None:
        pull = (args.measured - found.rate) / math.hypot(args.measured_sigma, budget.sigma)
    return Levelling(
        args.measured,
        args.measured_sigma,
        rest,
        float(between.geopotential_number_m2_s2),
        args.measured_sigma * C_M_S**2,
        height,
        math.hypot(float(between.height_sigma_m), height * REAL_GRAVITY_M_S2 / gravity),
        gravity,
        of_a,
        pull,
    )
