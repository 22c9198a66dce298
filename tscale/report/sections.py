"""The sections of the page."""

from __future__ import annotations

import math
from collections.abc import Callable, Mapping, Sequence
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from ..budget import Budget
from ..chains import Chain
from ..files.date_text import fixed_decimals
from ..instants import Instants
from ..ledger import Ledger
from ..provenance import ClockRecord, Provenance, TableRecord
from .markup import Markup, join, table, tag

if TYPE_CHECKING:
    from ..tables.clock_log import ClockLog
    from ..tables.clock_report import ClockReport

__all__ = [
    "budget_section",
    "ledger_section",
    "logs_section",
    "notes_section",
    "path_section",
    "provenance_section",
    "results_section",
]

_DIGITS: Final = 15
_FINDINGS: Final = 40


def path_section(chain: Chain) -> Markup:
    """The steps of the chain, each with the document that defines it."""
    rows = [(step.start, step.end, step.title, step.source) for step in chain.steps]
    steps = table(("from", "to", "step", "by"), rows) if rows else tag("p", "Nothing to do: both ends are alike.")
    return join([tag("h2", "Path"), tag("p", chain, class_="path"), steps])


def results_section(
    chain: Chain, t: Instants, out: Instants, rows: int, lines: Sequence[int], stated: Mapping[str, Any]
) -> Markup:
    """The first results, and the last, with their combined standard uncertainties."""
    shown = [*range(min(rows, t.size)), *([t.size - 1] if t.size > rows else [])]
    one, two = t.ravel()[shown], out.ravel()[shown]
    leap = chain.reference.leap_seconds
    total = chain.ledger(one).total_exact
    columns: list[Sequence[Any]] = [
        [str(lines[i]) if lines else str(i + 1) for i in shown],
        one.to_iso(12, leap_seconds=leap).tolist(),
        two.to_iso(12, leap_seconds=leap).tolist(),
        _signed(total, 12),
        [f"{value:.2e}" if value else "0" for value in chain.budget(one, **stated).combined_s.tolist()],
    ]
    head = ("line" if lines else "row", str(chain.start), str(chain.end), "difference of labels (s)", "u (s)")
    cells = [list(row) for row in zip(*columns, strict=True)]
    what = f"The first {min(rows, t.size)} of {t.size} results, and the last." if t.size > rows else "All results."
    return join([tag("h2", "Results"), table(head, cells, numbers=(0, 1, 2, 3, 4), caption=what)])


def ledger_section(ledger: Ledger, first: str, figure: Markup | None) -> Markup:
    """Every term of the first reading, and the picture of all."""
    rows: list[tuple[str, str, str]] = []
    before = None
    for name, line in ledger._lines.items():
        rows.append((line.step if line.step != before else "", name, _signed(_first(ledger.exact(name)), _DIGITS)[0]))
        before = line.step
    foot = [("total", _signed(_first(ledger.total_exact), _DIGITS)[0])]
    caption = f"Terms at the first reading, {first}, in seconds; they add up exactly to the difference of the labels."
    parts = [tag("h2", "Ledger"), table(("step", "term", "seconds"), rows, numbers=(2,), caption=caption, foot=foot)]
    return join([*parts, *([figure] if figure else [])])


def budget_section(budget: Budget, first: str, figure: Markup | None, spoken: Callable[[str], str] = str) -> Markup:
    """The budget of the first reading, and what is not in it."""

    def at(values: Any) -> float:
        return float(np.broadcast_to(np.asarray(values), budget.shape).ravel()[0])

    rows = [
        (
            line.quantity,
            "" if line.value is None else f"{at(line.value):.9g}",
            f"{at(line.sigma):.3g}",
            line.unit,
            line.kind + ("" if math.isinf(line.dof) else f" ({line.dof:.4g})"),
            line.distribution,
            line.correlation,
            f"{at(line.sensitivity):+.3e}",
            f"{at(line.contribution_s):.2e}",
            f"{at(line.share_percent):.1f} %",
        )
        for line in budget.lines
    ]
    head = (
        "quantity",
        "value",
        "u",
        "unit",
        "type",
        "distribution",
        "between readings",
        "s per unit",
        "u(y) (s)",
        "share",
    )
    combined, expanded = at(budget.combined_s), at(budget.expanded_s)
    factor = at(budget.coverage_factor)
    foot = [
        ("combined standard uncertainty", f"{combined:.2e}", ""),
        (f"expanded uncertainty, k = {factor:.3g}", f"{expanded:.2e}", ""),
    ]
    caption = f"Uncertainty of the result at the first reading, {first} (JCGM 100:2008)."
    parts: list[object] = [tag("h2", "Uncertainty budget")]
    if rows:
        parts.append(table(head, rows, numbers=(1, 2, 7, 8, 9), caption=caption, foot=foot))
    else:
        parts.append(tag("p", "No uncertainty is stated in this chain."))
    if budget.not_included:
        items = [tag("li", tag("b", item.source), f": {spoken(item.reason)}") for item in budget.not_included]
        parts += [tag("h3", "Not included"), tag("ul", *items)]
    return join([*parts, *([figure] if figure else [])])


def logs_section(logs: Sequence[tuple[ClockLog, ClockReport | None, Markup | None]]) -> Markup:
    """The clock logs that the chain reads, with what an inspection says of them."""
    if not logs:
        return Markup("")
    parts: list[object] = [tag("h2", "Clock comparisons")]
    for log, report, figure in logs:
        parts.append(tag("h3", f"{log.scale} minus {log.reference}: {log.name}"))
        if log.remarks:
            parts.append(tag("ul", *(tag("li", remark.text) for remark in log.remarks), class_="notes"))
        if report is not None:
            findings = [tag("li", finding) for finding in report.findings[:_FINDINGS]]
            if len(report.findings) > _FINDINGS:
                findings.append(tag("li", f"and {len(report.findings) - _FINDINGS} more"))
            parts.append(tag("ul", *findings, class_="notes") if findings else tag("p", "Nothing odd in the log."))
        if figure:
            parts.append(figure)
    return join(parts)


def notes_section(notes: Sequence[str]) -> Markup:
    """What a reader of the results should know."""
    body = (
        tag("div", tag("ul", *(tag("li", note) for note in notes), class_="notes"), class_="note")
        if notes
        else tag("p", "Nothing is predicted, held, or past the expiry of a table.", class_="none")
    )
    return join([tag("h2", "Notes"), body])


def provenance_section(made: Provenance) -> Markup:
    """Tables, logs, pieces and versions, with their hashes."""

    def digest(text: str) -> Markup:
        return tag("span", text, class_="hash")

    tables = [
        (item.table, item.name, f"{item.start} to {item.end or 'further notice'}", *_stamps(item), digest(item.sha256))
        for item in made.tables
    ]
    parts: list[object] = [tag("h2", "Provenance")]
    if tables:
        parts.append(table(("table", "name", "span", "issued", "expires", "SHA-256"), tables))
    if made.clocks:
        logs = [
            (f"{log.scale} by {log.reference}", log.name, f"{log.start} to {log.end}", log.comparisons,
             log.interpolation, _ahead(log), _files(log, digest))
            for log in made.clocks
        ]  # fmt: skip
        parts.append(
            table(
                ("clock log", "name", "comparisons from", "number", "between them", "past them", "SHA-256"),
                logs,
                numbers=(3,),
            )
        )
    pieces: list[tuple[object, ...]] = []
    for what in ("observer", "source", "dates"):
        held = getattr(made, what)
        if held is not None:
            words = "; ".join(f"{key} {_words(value)}" for key, value in held.items() if key not in ("sha256", "name"))
            pieces.append((what, held.get("name", ""), words, digest(str(held["sha256"]))))
    if pieces:
        parts.append(table(("piece", "name", "what", "SHA-256 of its content"), pieces))
    options = "; ".join(f"{name} {_words(value)}" for name, value in made.options.items())
    versions = ", ".join(f"{name} {number}" for name, number in made.software.items())
    parts += [
        tag("p", f"Options: {options or 'none'}."),
        tag("p", f"Software: {versions}."),
        tag("p", "Digest over all that determines the numbers: ", digest(made.digest)),
        tag("details", tag("summary", "The same as JSON"), tag("pre", made.to_json(indent=1))),
    ]
    return join(parts)


def _ahead(log: ClockRecord) -> str:
    """How a log is predicted."""
    if log.predicted is None:
        return "nothing"
    return "predicted: " + ", ".join(f"{key} {held}" for key, held in log.predicted.items() if held is not None)


def _files(log: ClockRecord, digest: Callable[[str], Markup]) -> Markup:
    """Hash of a log, and those of its files where they are others."""
    files = [(name, sha256) for name, sha256 in log.files if sha256 != log.sha256]
    return join([digest(log.sha256), *(tag("div", f"{name} ", digest(sha256)) for name, sha256 in files)])


def _stamps(item: TableRecord) -> tuple[str, str]:
    return item.issued or "", item.expires or ""


def _words(value: Any) -> str:
    if isinstance(value, tuple | list):
        return f"({', '.join(_words(item) for item in value)})"
    return str(value)


def _first(pair: Any) -> Any:
    return pair[0].reshape(-1)[:1], pair[1].reshape(-1)[:1]


def _signed(pair: Any, digits: int) -> list[str]:
    return [text if text.startswith("-") else f"+{text}" for text in fixed_decimals(pair, digits)]
