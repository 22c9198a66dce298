"""Options for the uncertainties that no table states, for budgets."""

from __future__ import annotations

import argparse
import re
from typing import Any, Final

__all__ = ["add_stated", "option_of", "spoken", "stated_of"]

_NUMBERS: Final = {
    "reading_sigma_s": ("S", "noise of the readings"),
    "resolution_s": ("S", "smallest step of the readings"),
    "site_sigma_m": ("M", "place of the observer, along each axis"),
    "source_position_sigma_mas": ("MAS", "direction of the source, along each axis"),
    "proper_motion_sigma_mas_yr": ("MAS", "its proper motion, a year"),
    "parallax_sigma_mas": ("MAS", "its parallax"),
    "ephemeris_sigma_m": ("M", "place of the geocentre by the ephemeris, along each axis"),
}


def add_stated(parser: argparse.ArgumentParser) -> None:
    """Add an option for each; what is not given stands in the budget as not included."""
    group = parser.add_argument_group("standard uncertainties that no table states")
    for name, (unit, words) in _NUMBERS.items():
        group.add_argument(f"--{name.replace('_', '-')}", metavar=unit, type=float, help=words)
    group.add_argument(
        "--budget-ephemeris",
        metavar="FILE",
        help="another SPK kernel: its difference from the one in use is the uncertainty of the ephemeris",
    )
    group.add_argument(
        "--coverage-factor", metavar="K", type=float, default=2.0, help="of the expanded uncertainty (%(default)g)"
    )


def option_of(name: str) -> str | None:
    """The option for an argument of `Chain.budget`, if there is one."""
    return f"--{name.replace('_', '-')}" if name in _NUMBERS else None


def spoken(text: str) -> str:
    """Words of a budget with options of the command where they speak of arguments."""
    text = re.sub(r"\b[a-z_]+_(?:s|m|mas|mas_yr)\b", lambda word: option_of(word[0]) or word[0], text)
    text = text.replace("give ephemeris, ", "give --budget-ephemeris, ")
    text = text.replace("; give uncertainty_s where it is loaded", "")  # no option states it
    return text.replace("give it with with_noise", "give it by [noise.CLOCK] in the file of --project")


def stated_of(args: argparse.Namespace) -> dict[str, Any]:
    """Those given, as `Chain.budget` takes them."""
    found: dict[str, Any] = {name: getattr(args, name) for name in _NUMBERS if getattr(args, name) is not None}
    if args.budget_ephemeris is not None:
        from ..ephemeris.kernel import Ephemeris

        found["ephemeris"] = Ephemeris.open(args.budget_ephemeris)
    return found | {"coverage_factor": args.coverage_factor}
