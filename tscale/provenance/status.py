"""What a result rests on, row by row: Earth orientation measured, predicted or held, logs predicted, expired tables."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Final, NamedTuple

import numpy as np
import numpy.typing as npt

from .. import exact
from ..constants import TT_MINUS_TAI
from ..counts import tdb_from_tcb
from ..earth.observer import Observer
from ..exact import BoolArray, Pair
from ..instants import Instants
from ..scales import Node
from ..step import Step
from ..tables.clock_log import ClockLog
from ..tables.reference import ReferenceData
from ..transforms import geocentric
from .tables_read import reads_ephemeris

if TYPE_CHECKING:
    from ..chains import Chain

__all__ = ["Status", "row_status", "status_of", "uses_orientation"]

_WORDS: Final = ("", "measured", "predicted", "held")
_AHEAD: Final = "clock predicted"
_EXPIRED: Final = "expired"
_NEITHER: Final = "none"


def uses_orientation(step: Step, site: Observer | None) -> bool:
    """Whether a step reads the Earth orientation: UT1, and what depends on the place of a site on the ground."""
    names = {step.start.scale.name, step.end.scale.name}
    if "UT1" in names:
        return True
    at_site = "TOPOCENTER" in (step.start.place, step.end.place) and getattr(site, "uses_earth_orientation", True)
    return at_site and reads_ephemeris(step)


class Status(NamedTuple):
    """What the rows of one step, or of a whole chain, rest on."""

    code: npt.NDArray[np.int8]
    """0 no Earth orientation, 1 measured, 2 predicted, 3 held."""
    ahead: BoolArray
    """Past the comparisons of a clock log."""
    late: BoolArray
    """UTC past the expiry of the leap seconds."""

    def worst(self, other: Status) -> Status:
        """Of two, the worse by row."""
        return Status(np.maximum(self.code, other.code), self.ahead | other.ahead, self.late | other.late)

    def words(self) -> list[str]:
        """The words of a column of results."""
        table = {
            (code, ahead, late): "+".join(filter(None, (word, _AHEAD * ahead, _EXPIRED * late))) or _NEITHER
            for code, word in enumerate(_WORDS)
            for ahead in (False, True)
            for late in (False, True)
        }
        return [table[row] for row in zip(self.code.tolist(), self.ahead.tolist(), self.late.tolist(), strict=True)]


def status_of(
    step: Step,
    before: Instants,
    after: Instants,
    reference: ReferenceData,
    site: Observer | None,
    clocks: Sequence[ClockLog],
) -> Status:
    """What one step rests on."""
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
    ahead = np.zeros(before.shape, dtype=np.bool_)
    by_scale = {node.scale.name: at for node, at in sides}
    for log in clocks:
        if log.is_predicted and by_scale.keys() == {log.scale, log.reference}:
            for flag in log.flags(by_scale[log.reference].pair).values():
                ahead = ahead | flag
    return Status(code, ahead, late)


def row_status(chain: Chain, t: Instants) -> list[str]:
    """What the result of each of some one-dimensional instants rests on: the worst of all steps, in words.

    `measured`, `predicted` or `held` for Earth orientation, then `+clock predicted` and `+expired` where they apply;
    `none` where nothing of these matters.
    """
    no = np.zeros(t.shape, dtype=np.bool_)
    worst, before = Status(np.zeros(t.shape, dtype=np.int8), no, no), t.at(chain.start.place or t.place)
    supplies = chain._supplies
    for step in chain.steps:
        after = step.forward(before)
        worst = worst.worst(status_of(step, before, after, chain.reference, supplies.site, supplies.clocks))
        before = after
    return worst.words()


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
