"""What moved: terms, steps and totals, as arrays and as a table."""

from __future__ import annotations

import json
from dataclasses import dataclass
from typing import Any, Final, NamedTuple

import numpy as np

from ..errors import InvalidInput
from ..exact import FloatArray
from ..provenance import Provenance

__all__ = ["Change", "Moved", "WhatIf"]

_HEADS: Final = ("step", "term", "least (s)", "most (s)", "rms (s)", "pull")
_SAME_S: Final = 1e-12  # what labels and counts may differ by roundings


class Change(NamedTuple):
    """A table, a log or another piece that is not the same; names are empty where it is missing."""

    what: str
    before: str
    after: str


@dataclass(frozen=True, eq=False)
class Moved:
    """What moved, by instant: after less before.

    Attributes
    ----------
    step, term : str
        `term` is empty for the sum over a step.
    moved_s : float array
        Seconds, in the shape of the instants; differences of exact pairs, rounded once.
    sigma_s : float array or None
        Standard uncertainties, before and after in quadrature, of what changed - tables, logs, site, source - and of
        nothing that both share; None where what changed states none. Where old and new rest on one calibration, that is
        more than the difference should be.
    only : str
        `before` or `after` where the term is in one of the two alone, else empty.
    """

    step: str
    term: str
    moved_s: FloatArray
    sigma_s: FloatArray | None = None
    only: str = ""

    @property
    def least_s(self) -> float:
        """Smallest value, s."""
        return float(self.moved_s.min())

    @property
    def most_s(self) -> float:
        """Largest value, s."""
        return float(self.moved_s.max())

    @property
    def largest_s(self) -> float:
        """Largest size, s."""
        return max(abs(self.least_s), abs(self.most_s))

    @property
    def rms_s(self) -> float:
        """Root of the mean square, s."""
        return float(np.sqrt(np.mean(np.square(self.moved_s))))

    @property
    def pulls(self) -> FloatArray | None:
        """`moved_s` over `sigma_s`; infinite where something moved that was stated to be exact."""
        if self.sigma_s is None:
            return None
        still = (self.moved_s == 0.0) & (self.sigma_s == 0.0)
        with np.errstate(divide="ignore", invalid="ignore"):
            return np.where(still, 0.0, self.moved_s / self.sigma_s)

    @property
    def pull_rms(self) -> float | None:
        """Root of the mean square of `pulls`."""
        pulls = self.pulls
        return None if pulls is None else float(np.sqrt(np.mean(np.square(pulls))))

    def to_dict(self) -> dict[str, Any]:
        """Plain values."""
        pull = self.pull_rms
        return {
            "step": self.step,
            "term": self.term,
            "only": self.only,
            "least_s": self.least_s,
            "most_s": self.most_s,
            "rms_s": self.rms_s,
            "pull_rms": pull if pull is None or np.isfinite(pull) else None,
        }


@dataclass(frozen=True, eq=False)
class WhatIf:
    """What another set of tables moves.

    Attributes
    ----------
    terms : tuple of Moved
        Every term of both ledgers, in the order of the chain.
    steps : tuple of Moved
        The sums over the steps, with their stated uncertainties.
    total : Moved
        What the labels of the results move: the sum of all terms.
    count_s : float array
        What the results move in seconds elapsed.
    changes : tuple of Change
        What is not the same.
    before, after : Provenance
    """

    terms: tuple[Moved, ...]
    steps: tuple[Moved, ...]
    total: Moved
    count_s: FloatArray
    changes: tuple[Change, ...]
    before: Provenance
    after: Provenance

    @property
    def total_s(self) -> FloatArray:
        """What the labels of the results move, s."""
        return self.total.moved_s

    def __getitem__(self, term: str) -> FloatArray:
        """What a term moved, s."""
        found = [moved.moved_s for moved in self.terms if moved.term == term]
        if not found:
            raise InvalidInput(f"no term {term!r}; there are {', '.join(moved.term for moved in self.terms) or 'none'}")
        return np.asarray(sum(found[1:], found[0]))

    def table(self, *, smallest_s: float = 1e-15) -> str:
        """A readable table: least, most and rms of what moved, and the rms pull against the stated uncertainty.

        Terms that nowhere moved by `smallest_s` (by default ten times the resolution of dates) are counted, not listed.
        """
        rows: list[tuple[str, ...]] = [_HEADS]
        shown = [moved for moved in self.terms if moved.largest_s >= smallest_s]
        for step in self.steps:
            terms = [moved for moved in shown if moved.step == step.step]
            rows += [_row(moved, moved.step if i == 0 else "") for i, moved in enumerate(terms)]
            if len(terms) > 1:
                rows.append(_row(step, "", "(sum)"))
            elif terms:
                rows[-1] = (*rows[-1][:5], _row(step, "")[5])
        rows.append(_row(self.total, "total", ""))
        widths = [max(len(row[i]) for row in rows) for i in range(len(_HEADS))]
        lines = [
            "  ".join(f"{c:<{w}}" if i < 2 else f"{c:>{w}}" for i, (c, w) in enumerate(zip(row, widths, strict=True)))
            for row in rows
        ]
        rule = "  ".join("-" * width for width in widths)
        lines = [lines[0], rule, *lines[1:-1], rule, lines[-1]]
        if len(shown) < len(self.terms):
            lines.append(f"{len(self.terms) - len(shown)} terms did not move by {smallest_s:g} s")
        if np.abs(self.count_s - self.total.moved_s).max() > _SAME_S:
            count = Moved("", "", self.count_s)
            lines.append(f"in seconds elapsed: least {count.least_s:+.3e}, most {count.most_s:+.3e} s")
        known = set(self.before.notes)
        lines += [f"changed: {change.what}: {change.before or '-'} -> {change.after or '-'}" for change in self.changes]
        lines += [f"note: {note}" for note in self.before.notes]
        lines += [f"note after the change: {note}" for note in self.after.notes if note not in known]
        return "\n".join(line.rstrip() for line in lines)

    def to_dict(self) -> dict[str, Any]:
        """Plain values: summaries of what moved, what changed, and both provenances."""
        count = Moved("", "", self.count_s)
        return {
            "terms": [moved.to_dict() for moved in self.terms],
            "steps": [moved.to_dict() for moved in self.steps],
            "total": self.total.to_dict(),
            "count": {"least_s": count.least_s, "most_s": count.most_s, "rms_s": count.rms_s},
            "changes": [change._asdict() for change in self.changes],
            "before": self.before.to_dict(),
            "after": self.after.to_dict(),
        }

    def to_json(self, indent: int | None = None) -> str:
        """The same as JSON with sorted keys."""
        return json.dumps(self.to_dict(), sort_keys=True, indent=indent, allow_nan=False)


def _row(moved: Moved, step: str, term: str | None = None) -> tuple[str, ...]:
    pull = moved.pull_rms
    shown = moved.term if term is None else term
    if moved.only:
        shown += f" (only {moved.only})"
    values = (f"{value:+.3e}" for value in (moved.least_s, moved.most_s))
    return (step, shown, *values, f"{moved.rms_s:.3e}", "" if pull is None else f"{pull:.2f}")
