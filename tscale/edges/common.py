"""What edges of both kinds share."""

from __future__ import annotations

import numpy as np

from .. import exact
from ..exact import Pair
from ..instants import Instants
from ..tables.reference import ReferenceData

__all__ = ["count_difference", "orientation_notes"]


def count_difference(before: Instants, after: Instants) -> Pair:
    """Count after a step minus the count before."""
    return exact.subtract(after.pair, before.pair)


def orientation_notes(tai: Pair, reference: ReferenceData) -> tuple[str, ...]:
    """What a reader should know of the Earth orientation used: how much is predicted or held."""
    status = reference.earth_orientation.status(tai)
    names = {1: "use predicted Earth orientation", 2: "are past the end of the Earth orientation, which is held"}
    counts = {code: int(np.count_nonzero(status == code)) for code in names}
    return tuple(f"{n} of {status.size} instants {names[code]}" for code, n in counts.items() if n)
