"""Ledger: every term of every step of a chain, for every instant, adding up exactly."""

from __future__ import annotations

import operator
from collections.abc import Iterator, Mapping, Sequence
from typing import NamedTuple

import numpy as np

from . import exact
from .errors import InvalidInput
from .exact import FloatArray, Pair

__all__ = ["Ledger", "LedgerLine"]


class LedgerLine(NamedTuple):
    """One term: the step it belongs to, its name and its value."""

    step: str
    term: str
    value: Pair


class Ledger(Mapping[str, FloatArray]):
    """Terms by name, in seconds, in the order of the chain.

    `ledger[name]` is a float64 array in the shape of the instants; `exact(name)` the same as
    (whole, fraction). The terms are differences of labels: UTC to TAI is 37 s, GPS to TAI 19 s.
    """

    def __init__(self, lines: Sequence[LedgerLine], shape: tuple[int, ...], notes: Sequence[str] = ()) -> None:
        # The same term met twice (a wavefront carried on from one place to another) is told apart by its step.
        names = [line.term for line in lines]
        unique = [f"{n} [{line.step}]" if names.count(n) > 1 else n for n, line in zip(names, lines, strict=True)]
        self._lines = {n: line for n, line in zip(unique, lines, strict=True)}  # noqa: C416
        self._shape = shape
        self.notes = tuple(dict.fromkeys(notes))

    def __getitem__(self, name: str) -> FloatArray:
        return exact.seconds(self.exact(name))

    def __iter__(self) -> Iterator[str]:
        return iter(self._lines)

    def __len__(self) -> int:
        return len(self._lines)

    @property
    def shape(self) -> tuple[int, ...]:
        """Shape of every term."""
        return self._shape

    def exact(self, name: str) -> Pair:
        """One term as (int64 seconds, float64 fraction in [0, 1))."""
        if name not in self._lines:
            raise InvalidInput(f"no term {name!r} in this ledger; it has {', '.join(self._lines) or 'none'}")
        whole, fraction = self._lines[name].value
        return np.broadcast_to(whole, self._shape), np.broadcast_to(fraction, self._shape)

    @property
    def total_exact(self) -> Pair:
        """Sum of all terms as (int64 seconds, float64 fraction in [0, 1))."""
        total: Pair = (np.zeros(self._shape, dtype=np.int64), np.zeros(self._shape))
        for name in self._lines:
            total = exact.add(total, self.exact(name))
        return total

    @property
    def total(self) -> FloatArray:
        """Sum of all terms, seconds, rounded once."""
        return exact.seconds(self.total_exact)

    def table(self, row: int = 0) -> str:
        """A readable table of the terms of one instant (`row` counts along the flattened array)."""
        try:
            row = operator.index(row)
        except TypeError as error:
            raise InvalidInput(f"row is the number of an instant, a whole number from 0; got {row!r}") from error
        size = int(np.prod(self._shape, dtype=np.int64))
        if not -size <= row < size:
            raise InvalidInput(f"row {row} is not among the {size} instants of this ledger")
        rows = [(line.step, name, self._text(self.exact(name), row)) for name, line in self._lines.items()]
        rows.append(("total", "", self._text(self.total_exact, row)))
        widths = [max(len(r[i]) for r in [*rows, ("step", "term", "seconds")]) for i in range(3)]
        lines = [f"{'step':<{widths[0]}}  {'term':<{widths[1]}}  {'seconds':>{widths[2]}}"]
        rule = "  ".join("-" * w for w in widths)
        lines.append(rule)
        shown = None
        for step, term, value in rows:
            if step == "total":
                lines.append(rule)
            lines.append(f"{step if step != shown else '':<{widths[0]}}  {term:<{widths[1]}}  {value:>{widths[2]}}")
            shown = step
        lines.extend(f"note: {note}" for note in self.notes)
        return "\n".join(lines)

    def _text(self, value: Pair, row: int) -> str:
        """Signed decimal seconds to 1 fs from the exact pair."""
        whole, fraction = int(value[0].ravel()[row]), float(value[1].ravel()[row])
        femto = whole * 10**15 + round(fraction * 1e15)
        return f"{'-' if femto < 0 else '+'}{abs(femto) // 10**15}.{abs(femto) % 10**15:015d}"

    def __repr__(self) -> str:
        return f"<Ledger of {len(self)} terms, shape={self._shape}>"
