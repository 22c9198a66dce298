"""Several chains from one start, looked at step by step together: what they share is done once."""

from __future__ import annotations

import re
from collections.abc import Sequence
from typing import Final, NamedTuple

import numpy as np

from ..chains import Chain
from ..exact import FloatArray, Pair
from ..instants import Instants
from ..step import Step

__all__ = ["Passed", "Walk", "add_notes"]

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
        squares = {
            path: sum((np.square(value) for value in step.uncertainty_s(before).values()), np.zeros(before.shape))
            for path, (step, before, _) in self.passed.items()
        }
        none = np.zeros(self._start.shape)
        return [np.sqrt(sum((squares[path] for path in taken), none)) for taken in self._paths]

    def statuses(self, reference: ReferenceData) -> list[list[str]]:
        """For each chain and row: the Earth orientation it rests on, and whether the leap seconds have expired."""
        orientation = {path: _orientation(passed, reference) for path, passed in self.passed.items()}
        expired = {path: _expired(passed, reference) for path, passed in self.passed.items()}
        none = np.zeros(self._start.shape, dtype=np.int8)
        found = []
        for taken in self._paths:
            worst = functools.reduce(np.maximum, (orientation[path] for path in taken), none)
            late = functools.reduce(np.maximum, (expired[path] for path in taken), none)
            found.append([_STATUS[code, over] for code, over in zip(worst.tolist(), late.tolist(), strict=True)])
        return found

    def notes(self) -> list[str]:
        """Notes of all steps, each once."""
        return list(dict.fromkeys(note for step, before, _ in self.passed.values() for note in step.notes(before)))


def _orientation(passed: Passed, reference: ReferenceData) -> IntArray:
    """By row: 0 where the step uses no Earth orientation, 1 measured, 2 predicted, 3 held."""
    step, before, after = passed
    sides = {step.start: before, step.end: after}
    steps_of = {node.scale.name: at.pair for node, at in sides.items() if node.place != "BARYCENTER"}
    if step.uses_orientation:
        pass
    return np.zeros(before.shape, dtype=np.int8)


def add_notes(known: dict[str, list[int]], block: Sequence[str]) -> None:
    """Add the notes of a block of rows to those known: counts, as in "3 of 50 instants ...", are summed."""
    for note in block:
        found = _COUNTED.fullmatch(note)
        counts = known.setdefault(found.group(3) if found else note, [0])
        if found:
            counts[0] += int(found.group(1))
