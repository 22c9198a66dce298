"""What a conversion says of itself: the path, the first reading with its ledger, notes, tables."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Protocol

from ..chains import Chain
from ..earth.observer import Observer
from ..instants import Instants
from ..tables.clock_log import ClockLog
from ..tables.reference import ReferenceData
from .status import uses_orientation

__all__ = ["longest", "summary", "tables_used", "unused"]


class _Table(Protocol):
    @property
    def name(self) -> str: ...

    @property
    def sha256(self) -> str: ...


def longest(chains: Sequence[Chain]) -> list[Chain]:
    """The chains that are no beginning of another one."""
    paths = [[str(chain.start), *(str(step.end) for step in chain.steps)] for chain in chains]
    return [
        chain
        for chain, path in zip(chains, paths, strict=True)
        if not any(len(other) > len(path) and other[: len(path)] == path for other in paths)
    ]


def tables_used(
    chains: Sequence[Chain], clocks: Sequence[ClockLog], reference: ReferenceData, site: Observer | None = None
) -> list[tuple[str, str]]:
    """(table, its name and hash) for the tables that the steps of these chains read."""
    steps = [step for chain in chains for step in chain.steps]
    ends = {frozenset((step.start.scale.name, step.end.scale.name)) for step in steps}
    nodes = {node for chain in chains for node in (chain.start, chain.end)} | {step.end for step in steps}
    names = {node.scale.name for node in nodes}
    moved = any(step.start.place != step.end.place for step in steps)
    integral = moved or frozenset(("TCG", "TCB")) in ends
    found: list[tuple[str, _Table]] = [
        (f"{log.scale} by {log.reference}", log) for log in clocks if frozenset((log.scale, log.reference)) in ends
    ]
    if any(node.scale.utc_labels for node in nodes):
        found.append(("leap seconds", reference.leap_seconds))
    if any(uses_orientation(step, site) for step in steps):
        found.append(("Earth orientation", reference.earth_orientation))
    found += [(table.scale, table) for table in reference.tt_bipm if table.scale in names]
    if integral:
        found += [("ephemeris", reference.ephemeris), ("time ephemeris", reference.time_ephemeris)]
    return [(title, f"{table.name}  (SHA-256 {table.sha256[:12]})") for title, table in found]


def unused(
    chains: Sequence[Chain],
    clocks: Sequence[ClockLog],
    reference: ReferenceData,
    *,
    site: str | None,
    source: str | None,
) -> list[str]:
    """Notes on what was given and is read by no step of these chains; `site` and `source` are names for messages."""
    steps = [step for chain in chains for step in chain.steps]
    ends = {frozenset((step.start.scale.name, step.end.scale.name)) for step in steps}
    scales = {name for pair in ends for name in pair}
    idle = [log.name for log in clocks if frozenset((log.scale, log.reference)) not in ends]
    idle += [table.name for table in reference.tt_bipm if table.scale not in scales]
    moved = [step for step in steps if step.start.place != step.end.place]
    placed = moved + [step for step in steps if {step.start.scale.name, step.end.scale.name} == {"TCG", "TCB"}]
    if site is not None and not any("TOPOCENTER" in (step.start.place, step.end.place) for step in placed):
        idle.append(site)
    if source is not None and not moved:
        idle.append(source)
    return [f"{name} was not used" for name in idle]


def summary(
    chains: Sequence[Chain],
    clocks: Sequence[ClockLog],
    reference: ReferenceData,
    site: Observer | None,
    *,
    rows: int,
    first: Instants,
    first_text: str,
    first_line: int,
    results: Sequence[tuple[str, str]],
    notes: Sequence[str],
    source: str,
    target: str,
) -> str:
    """Text of the summary; `first` holds the first reading, `results` its dates by column."""
    lines = []
    for chain in longest(chains):
        lines += [_path(chain), ""]
    width = max(len(name) for name, _ in [(str(chains[0].start), ""), *results])
    lines.append(f"first reading, line {first_line} of {source}:")
    lines.append(f"  {chains[0].start!s:<{width}}  {first_text}")
    lines += [f"  {name:<{width}}  {text}" for name, text in results]
    for chain in longest(chains):
        if chain.steps:
            ledger = chain.ledger(first)
            table = [line for line in ledger.table(0).splitlines() if not line.startswith("note: ")]
            lines += ["", *("  " + line for line in table)]
    lines.append("")
    lines += [f"note: {note}" for note in notes]
    used = tables_used(chains, clocks, reference, site)
    wide = max((len(title) for title, _ in used), default=0)
    lines += [f"table: {title:<{wide}}  {name}" for title, name in used]
    lines.append(f"{rows} rows: {source} -> {target}")
    return "\n".join(lines)


def _path(chain: Chain) -> str:
    nodes = [chain.start, *(step.end for step in chain.steps)]
    if chain.start.place is None or any(node.place != chain.start.place for node in nodes):
        return f"path: {chain}"
    return f"path at {chain.start.place}: {' -> '.join(str(node.scale) for node in nodes)}"
