"""RateLedger: the terms of a rate, dimensionless, by name."""

from __future__ import annotations

import operator
from collections.abc import Iterator, Mapping
from typing import Final

import numpy as np

from ..errors import InvalidInput
from ..exact import FloatArray

__all__ = ["RateLedger"]

_DAY_NS: Final = 86400e9


class RateLedger(Mapping[str, FloatArray]):
    """Terms of d(tau)/d(X) - 1 by name, float64 arrays in the shape of the dates.

    Attributes
    ----------
    clock, against : str
        Whose rate it is, and against which coordinate time.
    """

    def __init__(self, clock: str, against: str, terms: Mapping[str, FloatArray]) -> None:
        self.clock = clock
        self.against = against
        self._terms = dict(terms)

    def __getitem__(self, name: str) -> FloatArray:
        if name not in self._terms:
            raise InvalidInput(f"no term {name!r} in this ledger; it has {', '.join(self._terms)}")
        return self._terms[name]

    def __iter__(self) -> Iterator[str]:
        return iter(self._terms)

    def __len__(self) -> int:
        return len(self._terms)

    @property
    def shape(self) -> tuple[int, ...]:
        """Shape of every term."""
        return next(iter(self._terms.values())).shape

    @property
    def total(self) -> FloatArray:
        """Sum of the terms; added without the rounding of large terms that cancel (7e-10 in all but the last 1e-25)."""
        ordered = sorted(self._terms.values(), key=lambda term: float(np.max(np.abs(term), initial=0.0)))
        total = np.zeros(self.shape)
        for term in ordered[::-1]:
            total = total + term
        return np.asarray(total)

    def table(self, row: int = 0) -> str:
        """A readable table of one date (`row` counts along the flattened array): the fraction, and ns a day."""
        size = int(np.prod(self.shape, dtype=np.int64))
        try:
            row = operator.index(row)
        except TypeError as error:
            raise InvalidInput(f"row is the number of a date, a whole number from 0; got {row!r}") from error
        if not -size <= row < size:
            raise InvalidInput(f"row {row} is not among the {size} dates of this ledger")
        rows = [(name, float(term.reshape(-1)[row])) for name, term in self._terms.items()]
        rows.append((f"{self.clock} against {self.against}", float(self.total.reshape(-1)[row])))
        width = max(len(name) for name, _ in rows)
        lines = [f"{'term':<{width}}  {'rate':>20}  {'ns a day':>18}"]
        rule = "-" * width + "  " + "-" * 20 + "  " + "-" * 18
        lines.append(rule)
        for name, value in rows[:-1]:
            lines.append(f"{name:<{width}}  {value:>+20.12e}  {value * _DAY_NS:>+18.9f}")
        lines.append(rule)
        name, value = rows[-1]
        lines.append(f"{name:<{width}}  {value:>+20.12e}  {value * _DAY_NS:>+18.9f}")
        return "\n".join(lines)

    def __repr__(self) -> str:
        return f"<RateLedger of {self.clock} against {self.against}, {len(self)} terms, shape={self.shape}>"
