"""What edges of both kinds share."""

from __future__ import annotations

from .. import exact
from ..exact import Pair
from ..instants import Instants

__all__ = ["count_difference"]


def count_difference(before: Instants, after: Instants) -> Pair:
    """Count after a step minus the count before."""
    return exact.subtract(after.pair, before.pair)
