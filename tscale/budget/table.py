"""Budgets as text: one row per input quantity, aligned."""

from __future__ import annotations

import math
from collections.abc import Sequence
from typing import TYPE_CHECKING, Any

import numpy as np

if TYPE_CHECKING:
    from .budget import Budget

__all__ = ["aligned", "number", "table_text"]

_HEAD = ("quantity", "value", "unit", "u", "type", "distribution", "between instants", "sensitivity", "u(y)/s", "share")


def number(value: float) -> float | None:
    """A number for JSON, which has no infinity."""
    return float(value) if math.isfinite(value) else None


def aligned(rows: Sequence[Sequence[str]], left: Sequence[int]) -> list[str]:
    """Rows of cells as lines; columns named in `left` are aligned to the left."""
    widths = [max(len(row[i]) for row in rows) for i in range(len(rows[0]))]
    return [
        "  ".join(
            f"{cell:<{width}}" if i in left else f"{cell:>{width}}"
            for i, (cell, width) in enumerate(zip(row, widths, strict=True))
        ).rstrip()
        for row in rows
    ]


def table_text(budget: Budget, row: int) -> str:
    """The budget of one instant."""

    def at(values: Any) -> float:
        return float(np.broadcast_to(np.asarray(values), budget.shape).ravel()[row])

    rows: list[Sequence[str]] = [_HEAD]
    rows.extend(
        (
            line.quantity,
            "" if line.value is None else f"{at(line.value):.9g}",
            line.unit,
            f"{at(line.sigma):.3g}",
            line.kind + ("" if math.isinf(line.dof) else f" ({line.dof:.4g})"),
            line.distribution,
            line.correlation,
            f"{at(line.sensitivity):+.3e}",
            f"{at(line.contribution_s):.2e}",
            f"{at(line.share_percent):.1f} %",
        )
        for line in budget.lines
    )
    lines = aligned(rows, left=(0, 2, 4, 5, 6))
    rule = "-" * max(len(line) for line in lines)
    lines.insert(1, rule)
    if budget.title:
        lines.insert(0, budget.title)
    lines.append(rule)
    for first, second, r in budget.correlations:
        lines.append(f"correlated: {first} with {second}, r = {r:+.3g}")
    lines.append(f"combined standard uncertainty  {at(budget.combined_s):.3e} s")
    dof = at(budget.effective_dof)
    confidence = "" if budget.probability is None else f", level of confidence {100.0 * budget.probability:g} %"
    degrees = "" if math.isinf(dof) else f", {dof:.1f} effective degrees of freedom"
    lines.append(
        f"expanded uncertainty           {at(budget.expanded_s):.3e} s  (k = {at(budget.coverage_factor):.3g}"
        f"{confidence}{degrees})"
    )
    lines.extend(f"not included: {item.source}: {item.reason}" for item in budget.not_included)
    return "\n".join(lines)
