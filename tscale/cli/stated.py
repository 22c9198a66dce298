"""Options for the uncertainties that no table states, for budgets."""

from __future__ import annotations

import argparse
from typing import Any, Final

__all__ = ["add_stated", "option_of", "stated_of"]

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
        "--coverage-factor", metavar="K", type=float, default=2.0, help="of the expanded uncertainty (%(default)g)"
    )


def option_of(name: str) -> str | None:
    """The option for an argument of `Chain.budget`, if there is one."""
    return f"--{name.replace('_', '-')}" if name in _NUMBERS else None


def stated_of(args: argparse.Namespace) -> dict[str, Any]:
    """Those given, as `Chain.budget` takes them."""
    found: dict[str, Any] = {name: getattr(args, name) for name in _NUMBERS if getattr(args, name) is not None}
    return found | {"coverage_factor": args.coverage_factor}
