"""The walk along a chain by which mistakes are put in where they would be made, and carried on exactly."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Final

import numpy as np

from .. import exact
from ..chains import Chain
from ..edges import tt_barycentric_step
from ..errors import gathered_extrapolations
from ..exact import FloatArray
from ..instants import Instants
from ..step import Step
from .signature import Signature

__all__ = ["LINEAR_S", "Path", "fused", "is_onward"]

_RANK: Final = (
    "PROPER",
    "CLOCK",
    "UTC(k)",
    "GLONASS",
    "UTC",
    "TAI",
    "UT1",
    "TT",
    "GPS",
    "GST",
    "BDT",
    "TCG",
    "TCL",
    "TCB",
    "TDB",
)
LINEAR_S: Final = 1.5  # a wavefront bends by 1e-10 /s: 0.1 ns in what is carried on in a straight line
_ROUNDS: Final = 8


def fused(chain: Chain) -> tuple[Step, ...]:
    """The steps of a chain, with TT to TDB (or TCB) at one place in one, where the topocentric terms are."""
    found = list(chain.steps)
    for onward in (("TT", "TCG", "TCB", "TDB"), ("TT", "TCG", "TCB")):
        for scales in (onward, onward[::-1]):
            width = len(scales) - 1
            for i in range(len(found) - width + 1):
                nodes = (found[i].start, *(step.end for step in found[i : i + width]))
                place = nodes[0].place
                same = all(node.place == place for node in nodes)
                if not same or tuple(node.scale.name for node in nodes) != scales:
                    continue
                if place not in ("TOPOCENTER", "GEOCENTER"):
                    continue
                observer = chain._supplies.site if place == "TOPOCENTER" else None
                step = tt_barycentric_step(onward[-1], str(place), observer, chain.reference)
                found[i : i + width] = [step if scales == onward else step.reversed()]
                break
    return tuple(found)


def is_onward(step: Step) -> bool:
    """Whether a step goes from the clock towards the barycentre, the direction in which effects are written."""
    if step.start.place != step.end.place:
        return step.end.place == "BARYCENTER"
    return _rank(step.start.scale.family, step.start.scale.realisation) <= _rank(
        step.end.scale.family, step.end.scale.realisation
    )


def _rank(family: str, realisation: str | None) -> int:
    return _RANK.index("UTC(k)" if family == "UTC" and realisation else family)


class Path:
    """A chain with the instants at every node of it.

    Parameters
    ----------
    chain : Chain
    t : Instants
        At its start, one-dimensional.
    """

    def __init__(self, chain: Chain, t: Instants) -> None:
        self.chain = chain
        self.steps = fused(chain)
        self.t = t.at(chain.start.place) if chain.start.place is not None else t
        self.stations = self._walk(())
        rates = [step.rate(a, b) for step, a, b in zip(self.steps, self.stations, self.stations[1:], strict=False)]
        self._gains = [np.ones(t.shape)]
        for rate in reversed(rates):
            self._gains.append(self._gains[-1] * (1.0 + rate))
        self._gains.reverse()

    @property
    def end(self) -> Instants:
        """What the chain gives."""
        return self.stations[-1]

    def gain(self, station: int) -> FloatArray:
        """Seconds of the result for 1 s at a node, by the rates of the steps behind it."""
        return self._gains[station]

    def run(self, mistakes: Sequence[tuple[Signature, float]]) -> Instants:
        """What the chain gives with mistakes in it, each with its amplitude, in every effect on each other."""
        return self._walk(mistakes)[-1]

    def column(self, signature: Signature) -> FloatArray:
        """Seconds that one mistake of amplitude 1 alone adds to the results."""
        at = signature.station
        if signature.last_of:
            added = self._last_s(self.stations, signature, 1.0)
            return np.array(np.broadcast_to(added, self.t.shape))
        before, after = self.stations[max(at - 1, 0)], self.stations[at]
        if at == 0 or signature.at_node or is_onward(self.steps[at - 1]):
            added = np.asarray(signature.effect(before, after), dtype=np.float64)
            if np.max(np.abs(added), initial=0.0) <= LINEAR_S or at == len(self.steps):
                return np.asarray(np.broadcast_to(added, self.t.shape) * self._gains[at])
        return self.run([(signature, 1.0)]).minus(self.end)

    def _last_s(self, stations: Sequence[Instants], signature: Signature, amplitude: float) -> FloatArray:
        """What a mistake that is put in last adds: it is worked out at its own step."""
        at = signature.station
        before, after = stations[max(at - 1, 0)], stations[at]
        if at == 0 or signature.at_node or is_onward(self.steps[at - 1]):
            return signature.added_s(before, after, amplitude)
        return -signature.added_s(after, before, amplitude)

    def _walk(self, mistakes: Sequence[tuple[Signature, float]]) -> list[Instants]:
        last = [(s, a) for s, a in mistakes if s.last_of]
        mistakes = [(s, a) for s, a in mistakes if not s.last_of]
        with gathered_extrapolations(repeats=True):
            now = self.t
            for signature, amplitude in mistakes:
                if signature.station == 0:
                    now = now.shifted(signature.added_s(now, now, amplitude))
            stations = [now]
            for number, step in enumerate(self.steps, start=1):
                here = [(s, a) for s, a in mistakes if s.station == number]
                now = _taken(step, stations[-1], [(s, a) for s, a in here if not s.at_node])
                for signature, amplitude in here:
                    if signature.at_node:
                        now = now.shifted(signature.added_s(stations[-1], now, amplitude))
                stations.append(now)
        if last:
            stations[-1] = stations[-1].shifted(sum(self._last_s(stations, s, a) for s, a in last))
        stations[-1] = stations[-1].at(self.chain.end.place or stations[-1].place)
        return stations


def _taken(step: Step, before: Instants, mistakes: Sequence[tuple[Signature, float]]) -> Instants:
    """One step with mistakes; of one against its own direction, the date from which the mistaken step comes here."""
    after = step.forward(before)
    if not mistakes:
        return after
    if is_onward(step):
        return after.shifted(_sum(mistakes, before, after))
    shift = np.zeros(before.shape)
    aimed = before
    for _ in range(_ROUNDS):
        new = _sum(mistakes, after, aimed)
        moved = np.max(np.abs(new - shift), initial=0.0)
        if moved == 0.0:
            break
        shift = new
        aimed = Instants._of(exact.add_seconds(before.pair, -shift), before.scale, before.place)
        after = step.forward(aimed)
        if moved < 1e-10:  # a mistake changes by 2e-4 of what it moves at most
            break
    return after


def _sum(mistakes: Sequence[tuple[Signature, float]], before: Instants, after: Instants) -> FloatArray:
    total = np.zeros(before.shape)
    changes = [(s.change, a) for s, a in mistakes if s.change is not None]
    joined = next((s.joined for s, _ in mistakes if s.joined is not None), None)
    if joined is not None and len(changes) > 1:
        total = total + joined(before, changes)
        mistakes = [(s, a) for s, a in mistakes if s.change is None]
    for signature, amplitude in mistakes:
        total = total + signature.added_s(before, after, amplitude)
    return total
