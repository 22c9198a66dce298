"""What an inspection of a clock log found: to be read, and to be worked on by programs."""

from __future__ import annotations

import json
from collections import Counter
from dataclasses import asdict, dataclass
from typing import Any, Final

__all__ = ["SEVERITIES", "ClockReport", "Finding"]

SEVERITIES: Final = ("error", "warning", "note")
"""From the worst on."""


@dataclass(frozen=True)
class Finding:
    """One thing that is odd in a log.

    Attributes
    ----------
    kind : str
        One word or two; `clock_inspection` lists them.
    severity : {"error", "warning", "note"}
        An error is why `ClockLog.load` refuses the file; a warning should be looked at; a note is what the log says of
        itself, or how it is laid out.
    rows : tuple of int
        Lines of the file, from 1 (rows given as such: also from 1); empty where the whole log is meant.
    epoch : str or None
        As the first of the rows writes it.
    text : str
        What is odd, in a sentence.
    size : float or None
        How large: seconds, or for a rate step seconds per second.
    """

    kind: str
    severity: str
    rows: tuple[int, ...]
    epoch: str | None
    text: str
    size: float | None = None

    def __str__(self) -> str:
        rows = ", ".join(map(str, self.rows[:6])) + (" ..." if len(self.rows) > 6 else "")
        where = f"line {rows}: " if len(self.rows) == 1 else f"lines {rows}: " if self.rows else ""
        return f"{self.severity}: {where}{self.kind}: {self.text}"


@dataclass(frozen=True)
class ClockReport:
    """All findings of one inspection, in the order of the rows.

    Attributes
    ----------
    name : str
        The file's name, or `rows`.
    rows : int
        Rows under the header.
    used : int
        Rows whose offset went into the search for jumps, outliers and rate steps.
    findings : tuple of Finding
    """

    name: str
    rows: int
    used: int
    findings: tuple[Finding, ...]

    @property
    def loads(self) -> bool:
        """Whether `ClockLog.load` takes the file."""
        return not any(finding.severity == "error" for finding in self.findings)

    @property
    def clean(self) -> bool:
        """Whether there is neither error nor warning."""
        return all(finding.severity == "note" for finding in self.findings)

    def of(self, kind: str) -> tuple[Finding, ...]:
        """Findings of one kind."""
        return tuple(finding for finding in self.findings if finding.kind == kind)

    def counts(self) -> dict[str, int]:
        """How many findings there are of each kind."""
        return dict(Counter(finding.kind for finding in self.findings))

    def to_dict(self) -> dict[str, Any]:
        """The report as plain lists, texts and numbers."""
        return {
            "name": self.name,
            "rows": self.rows,
            "used": self.used,
            "loads": self.loads,
            "findings": [asdict(finding) | {"rows": list(finding.rows)} for finding in self.findings],
        }

    def to_json(self) -> str:
        """The report as JSON."""
        return json.dumps(self.to_dict(), indent=2, ensure_ascii=False, allow_nan=False) + "\n"

    def table(self) -> str:
        """The report as text, one finding a line."""
        head = f"{self.name}: {self.rows} rows, {self.used} of them with a usable offset"
        return "\n".join([head, *map(str, self.findings)] if self.findings else [head, "nothing odd was found"])

    def __str__(self) -> str:
        return self.table()
