"""`tscale clock`: the rate of a clock, or of two compared."""

from __future__ import annotations

from .command import add_parser, run

__all__ = ["add_parser", "run"]
