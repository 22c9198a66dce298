"""What a conversion says of itself, as text or for programs: the path, the first reading, its ledger, notes, tables."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from ..chains import Chain
from ..instants import Instants
from ..provenance.tables_read import reads_ephemeris, tables_of
from ..tables.clock_log import ClockLog
from ..tables.tt_bipm import TTBIPM

__all__ = ["longest", "record", "summary", "tables_used", "unused"]


def longest(chains: Sequence[Chain]) -> list[Chain]:
    """The chains that are no beginning of another one."""
    paths = [[str(chain.start), *(str(step.end) for step in chain.steps)] for chain in chains]
    return [
        chain
        for chain, path in zip(chains, paths, strict=True)
        if not any(len(other) > len(path) and other[: len(path)] == path for other in paths)
    ]


def tables_used(chains: Sequence[Chain], clocks: Sequence[ClockLog]) -> list[tuple[str, str, str]]:
    """(table, its name, its SHA-256) for the logs and the tables that the steps of these chains read."""
    ends = {frozenset((step.start.scale.name, step.end.scale.name)) for chain in chains for step in chain.steps}
    found = [
        (f"{log.scale} by {log.reference}", log.name, log.sha256)
        for log in clocks
        if frozenset((log.scale, log.reference)) in ends
    ]
    found += [(table.table, table.name, table.sha256) for chain in chains for table in tables_of(chain)]
    return list(dict.fromkeys(found))


def unused(
    chains: Sequence[Chain],
    clocks: Sequence[ClockLog],
    tt_bipm: Sequence[TTBIPM],
    *,
    site: str | None,
    source: str | None,
) -> list[str]:
    """Notes on what was given and is read by no step of these chains; `site` and `source` are names for messages."""
    steps = [step for chain in chains for step in chain.steps]
    ends = {frozenset((step.start.scale.name, step.end.scale.name)) for step in steps}
    scales = {name for pair in ends for name in pair}
    idle = [log.name for log in clocks if frozenset((log.scale, log.reference)) not in ends]
    idle += [table.name for table in tt_bipm if table.scale not in scales]
    moved = [step for step in steps if step.start.place != step.end.place]
    if site is not None and not any(
        reads_ephemeris(step) and "TOPOCENTER" in (step.start.place, step.end.place) for step in steps
    ):
        idle.append(site)
    if source is not None and not moved:
        idle.append(source)
    return [f"{name} was not used" for name in idle]


def summary(
    chains: Sequence[Chain],
    clocks: Sequence[ClockLog],
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
    used = tables_used(chains, clocks)
    wide = max((len(title) for title, *_ in used), default=0)
    lines += [f"table: {title:<{wide}}  {name}  (SHA-256 {sha256[:12]})" for title, name, sha256 in used]
    lines.append(f"{rows} rows: {source} -> {target}")
    return "\n".join(lines)


def record(
    chains: Sequence[Chain],
    clocks: Sequence[ClockLog],
    *,
    rows: int,
    first: Instants,
    first_text: str,
    first_line: int,
    results: Sequence[tuple[str, str]],
    notes: Sequence[str],
    source: str,
    target: str,
) -> dict[str, Any]:
    """The same for programs: lists, texts and numbers."""
    found = []
    for chain, (end, text) in zip(chains, results, strict=True):
        ledger = chain.ledger(first)
        found.append(
            {
                "to": end,
                "path": [str(chain.start), *(str(step.end) for step in chain.steps)],
                "first": text,
                "terms_s": {name: float(ledger[name][0]) for name in ledger},
                "total_s": float(ledger.total[0]),
                "sigma_s": float(chain.sigma_s(first)[0]),
            }
        )
    return {
        "input": source,
        "output": target,
        "rows": rows,
        "from": str(chains[0].start),
        "first": {"line": first_line, "reading": first_text},
        "results": found,
        "notes": list(notes),
        "tables": [
            {"table": title, "name": name, "sha256": sha256} for title, name, sha256 in tables_used(chains, clocks)
        ],
    }


def _path(chain: Chain) -> str:
    nodes = [chain.start, *(step.end for step in chain.steps)]
    if chain.start.place is None or any(node.place != chain.start.place for node in nodes):
        return f"path: {chain}"
    return f"path at {chain.start.place}: {' -> '.join(str(node.scale) for node in nodes)}"
