"""What a result rests on, row by row: Earth orientation that was measured, predicted or held, expired leap seconds."""

from __future__ import annotations

from typing import Final

import numpy as np
import numpy.typing as npt

from .. import exact
from ..constants import TT_MINUS_TAI
from ..counts import tdb_from_tcb
from ..earth.observer import Observer
from ..exact import BoolArray, Pair
from ..instants import Instants
from ..provenance.tables_read import reads_ephemeris
from ..scales import Node
from ..step import Step
from ..tables.reference import ReferenceData
from ..transforms import geocentric

__all__ = ["status_codes", "status_words", "uses_orientation"]

_WORDS: Final = ("", "measured", "predicted", "held")
_EXPIRED: Final = "expired"
_NEITHER: Final = "none"


def uses_orientation(step: Step, site: Observer | None) -> bool:
    """Whether a step reads the Earth orientation: UT1, and what depends on the place of a site on the ground."""
    names = {step.start.scale.name, step.end.scale.name}
    if "UT1" in names:
        return True
    at_site = "TOPOCENTER" in (step.start.place, step.end.place) and getattr(site, "uses_earth_orientation", True)
    return at_site and reads_ephemeris(step)


def status_codes(
    step: Step, before: Instants, after: Instants, reference: ReferenceData, site: Observer | None
) -> tuple[npt.NDArray[np.int8], BoolArray]:
    """By row: 0 no Earth orientation, 1 measured, 2 predicted, 3 held; and whether UTC is past the leap seconds."""
    sides = ((step.start, before), (step.end, after))
    code = np.zeros(before.shape, dtype=np.int8)
    if uses_orientation(step, site):
        tai = next(pair for pair in (_tai(node, at) for node, at in sides) if pair is not None)
        code = np.broadcast_to(reference.earth_orientation.status(tai) + np.int8(1), before.shape)
    late = np.zeros(before.shape, dtype=np.bool_)
    for node, at in sides:
        if node.scale.utc_labels:
            utc = exact.add(at.pair, exact.normalise(-node.scale.label_offset_s, 0.0))
            late = late | reference.leap_seconds.is_expired(utc)
    return code, late


def status_words(codes: npt.NDArray[np.int8], expired: BoolArray) -> list[str]:
    """The words of a column of results."""
    table = {
        (code, late): "+".join(part for part in (word, _EXPIRED if late else "") if part) or _NEITHER
        for code, word in enumerate(_WORDS)
        for late in (False, True)
    }
    return [table[pair] for pair in zip(codes.tolist(), expired.tolist(), strict=True)]


def _tai(node: Node, at: Instants) -> Pair | None:
    """TAI of one side of a step, to 2 ms, where it can be told; a row of the table is a day long."""
    name = node.scale.name
    if name == "TAI":
        return at.pair
    if node.place == "BARYCENTER":
        return None
    near = {"TCG": geocentric.tt_from_tcg, "TCB": tdb_from_tcb}
    if name in near or name == "TDB":
        tt = near[name](at.pair) if name in near else at.pair
        return exact.subtract(tt, exact.normalise(*TT_MINUS_TAI))
    return None
