"""Several chains from one start, looked at step by step together: what they share is done once."""

from __future__ import annotations

import functools
import re
from collections.abc import Sequence
from typing import Final, NamedTuple

import numpy as np

from ..budget.contribution import by_source
from ..chains import Chain
from ..earth.observer import Observer
from ..exact import FloatArray, Pair
from ..instants import Instants
from ..provenance.status import Status, status_of
from ..step import Step
from ..tables.clock_log import ClockLog
from ..tables.reference import ReferenceData

__all__ = ["Passed", "Walk", "add_notes", "note_texts"]

_COUNTED: Final = re.compile(r"(\d+) of (\d+) (.*)", re.DOTALL)


class Passed(NamedTuple):
    """A step with the instants before and after it."""

    step: Step
    before: Instants
    after: Instants


class Walk:
    """Instants taken along every chain.

    Parameters
    ----------
    chains : sequence of Chain
        With one start scale.
    t : Instants

    Attributes
    ----------
    passed : dict
        Path from the start (names of the nodes) to the step that ends it, in order, each once.
    """

    def __init__(self, chains: Sequence[Chain], t: Instants) -> None:
        self.passed: dict[tuple[str, ...], Passed] = {}
        self._paths: list[list[tuple[str, ...]]] = []
        self._start = t
        for chain in chains:
            at = t if chain.start.place is None else t.at(chain.start.place)
            path: tuple[str, ...] = (str(chain.start),)
            taken = []
            for step in chain.steps:
                path = (*path, str(step.end))
                if path not in self.passed:
                    self.passed[path] = Passed(step, at, step.forward(at))
                at = self.passed[path].after
                taken.append(path)
            self._paths.append(taken)

    def terms(self) -> dict[str, Pair]:
        """Terms of all steps by name, seconds; names met in two steps carry the step."""
        found: list[tuple[str, str, Pair]] = []
        for step, before, after in self.passed.values():
            where = f"{step.start} -> {step.end}"
            for name, (whole, fraction) in step.terms(before, after).items():
                value = np.broadcast_to(whole, before.shape), np.broadcast_to(fraction, before.shape)
                found.append((name, where, value))
        names = [name for name, _, _ in found]
        return {name if names.count(name) == 1 else f"{name} [{where}]": value for name, where, value in found}

    def sigma_s(self) -> list[FloatArray]:
        """Combined standard uncertainty of each chain, seconds."""
        found = {path: step.contributed(before) for path, (step, before, _) in self.passed.items()}
        sources = [by_source(part for path in taken for part in found[path]) for taken in self._paths]
        none = np.zeros(self._start.shape)
        return [np.sqrt(sum((np.square(value) for value in each.values()), none)) for each in sources]

    def statuses(
        self, reference: ReferenceData, site: Observer | None, clocks: Sequence[ClockLog] = ()
    ) -> list[list[str]]:
        """For each chain what the result of each row rests on, in the words of `status`."""
        found = {path: status_of(*passed, reference, site, clocks) for path, passed in self.passed.items()}
        no = np.zeros(self._start.shape, dtype=np.bool_)
        nothing = Status(np.zeros(self._start.shape, dtype=np.int8), no, no)
        return [
            functools.reduce(Status.worst, (found[path] for path in taken), nothing).words() for taken in self._paths
        ]

    def notes(self) -> list[str]:
        """Notes of all steps, each once."""
        return list(dict.fromkeys(note for step, before, _ in self.passed.values() for note in step.notes(before)))


def add_notes(known: dict[str, list[int]], block: Sequence[str]) -> None:
    """Add the notes of a block of rows to those known: counts, as in "3 of 50 instants ...", are summed."""
    for note in block:
        found = _COUNTED.fullmatch(note)
        counts = known.setdefault(found.group(3) if found else note, [0])
        if found:
            counts[0] += int(found.group(1))


def note_texts(known: dict[str, list[int]], rows: int) -> list[str]:
    """Notes of a file of so many rows, from what `add_notes` has gathered."""
    return [f"{count} of {rows} {note}" if count else note for note, (count,) in known.items()]
