"""Chains and results as fields of a document.

A chain is stored by its ends and its supplies; the tables it reads by their names and hashes. Budgets, what-if runs and
provenance come back as they were. Links, clock comparisons and cross-checks hold on to tables, motions and chains: of
these the numbers come back, as a mapping of names to values.
"""

from __future__ import annotations

import warnings
from collections.abc import Callable
from typing import Any, Final

import numpy as np

from ..budget.budget import Budget
from ..budget.contribution import Contribution, Omission
from ..budget.correlation import Common, Exponential, Independent, Rows
from ..chains import Chain
from ..clocks.comparison import ClockComparison
from ..clocks.proper_clock import ProperClock
from ..crosscheck.explanation import Explanation
from ..crosscheck.residuals import Residuals
from ..earth.observer import Observer
from ..errors import DataFileError
from ..link.solution import LinkSolution, TwoWaySolution
from ..provenance import ClockRecord, Provenance, StepRecord, TableRecord
from ..provenance.tables_read import table_options, tables_of
from ..routes import Supplies
from ..scales import Node
from ..scenarios.moved import Change, Moved, WhatIf
from ..source import Source
from ..tables.clock_log import ClockLog
from ..tables.reference import ReferenceData
from .kind import Context, Fields, Kind, of_class
from .values import damaged, shape_of

__all__ = ["RESULTS", "OtherTables"]

_CHAIN: Final = ("start", "end", "site", "clocks", "free", "source", "second_order", "tables", "options")
_BUDGET: Final = (
    "title",
    "shape",
    "contributions",
    "not_included",
    "correlations",
    "coverage_factor",
    "probability",
)


class OtherTables(UserWarning):
    """A chain was read back with other tables than those it was written with, as `tables="any"` allows."""


# ---- chains --------------------------------------------------------------------------------------


def _take_chain(chain: Chain) -> Fields:
    held, tables = chain._supplies, tables_of(chain)
    return {
        "start": str(chain.start),
        "end": str(chain.end),
        "site": held.site,
        "clocks": held.clocks,
        "free": held.free,
        "source": held.source,
        "second_order": bool(held.second_order),
        "tables": tuple({"table": t.table, "name": t.name, "sha256": t.sha256} for t in tables),
        "options": table_options(chain.reference, tables),
    }


def _make_chain(fields: Fields, context: Context) -> Chain:
    _check_supplies(fields)
    reference = ReferenceData.default() if context.reference is None else context.reference
    supplies = Supplies(
        reference, fields["site"], fields["clocks"], fields["source"], fields["second_order"], fields["free"]
    )
    chain = Chain(Node.parse(fields["start"]), Node.parse(fields["end"]), supplies)
    differing = _differing(fields, chain)
    if differing and not context.any_tables:
        raise DataFileError(
            f"this chain ({chain}) was written with other tables: {'; '.join(differing)}. Give those tables with "
            "reference=, or say tables='any' to take the ones at hand"
        )
    if differing:
        warnings.warn(f"{chain}: read back with other tables: {'; '.join(differing)}", OtherTables, stacklevel=2)
    return chain


def _check_supplies(fields: Fields) -> None:
    kinds: tuple[tuple[str, Callable[[Any], bool], str], ...] = (
        ("site", lambda v: v is None or isinstance(v, Observer), "an observer"),
        ("clocks", lambda v: _all(v, ClockLog), "comparison logs"),
        ("free", lambda v: _all(v, ProperClock), "free clocks"),
        ("source", lambda v: v is None or isinstance(v, Source), "a Source"),
        ("second_order", lambda v: isinstance(v, bool), "true or false"),
        ("tables", lambda v: _all(v, dict) and all({"table", "name", "sha256"} <= set(t) for t in v), "tables"),
        ("options", lambda v: isinstance(v, dict), "a mapping"),
    )
    for name, fits, what in kinds:
        if not fits(fields[name]):
            raise damaged(f"{name} of a chain is {what}")


def _all(values: Any, cls: type) -> bool:
    return isinstance(values, tuple) and all(isinstance(value, cls) for value in values)


def _differing(fields: Fields, chain: Chain) -> list[str]:
    """What tables are not those of the document, in words."""
    tables = tables_of(chain)
    now = {table.table: (table.name, table.sha256) for table in tables}
    then = {table["table"]: (table["name"], table["sha256"]) for table in fields["tables"]}
    found = [
        f"{what}: then {_words(then.get(what))}, now {_words(now.get(what))}"
        for what in dict.fromkeys([*then, *now])
        if then.get(what, ("", ""))[1] != now.get(what, ("", ""))[1]
    ]
    here, there = table_options(chain.reference, tables), fields["options"]
    found += [
        f"{what}: then {there.get(what)!r}, now {here.get(what)!r}"
        for what in dict.fromkeys([*there, *here])
        if there.get(what) != here.get(what)
    ]
    return found


def _words(table: tuple[str, str] | None) -> str:
    return "none" if table is None else f"{table[0]} (SHA-256 {table[1][:12]})"


# ---- budgets -------------------------------------------------------------------------------------


def _take_budget(budget: Budget) -> Fields:
    return {name: getattr(budget, name) for name in _BUDGET}


def _make_budget(fields: Fields, context: Context) -> Budget:
    if not _all(fields["contributions"], Contribution) or not _all(fields["not_included"], Omission):
        raise damaged("a budget is made of contributions and of what is not included")
    factor = fields["coverage_factor"]
    return Budget(
        fields["contributions"],
        fields["not_included"],
        shape_of(list(fields["shape"])),
        title=fields["title"],
        correlations=fields["correlations"],
        factor=2.0 if fields["probability"] is not None else float(factor),
        probability=fields["probability"],
    )


def _take_rows(rows: Rows) -> Fields:
    # Of a table of decades only the rows that an instant hangs on: nothing else enters its covariance.
    used, where = np.unique(rows.index, return_inverse=True)
    return {
        "index": where.reshape(rows.index.shape),
        "weight": rows.weight,
        "sigma": rows.sigma[used],
        "phase": None if rows.phase is None else rows.phase[used],
        "words": rows.words,
    }


def _make_rows(fields: Fields, context: Context) -> Rows:
    index, weight, sigma, phase = (fields[name] for name in ("index", "weight", "sigma", "phase"))
    if (
        index.shape != weight.shape
        or index.ndim != 2
        or sigma.ndim != 1
        or (phase is not None and phase.shape != sigma.shape)
    ):
        raise damaged("rows of a budget and their weights do not fit each other")
    if index.size and not 0 <= index.min() <= index.max() < sigma.size:
        raise damaged("a budget hangs on rows that it does not hold")
    return Rows(**fields)


# ---- results of which the numbers come back ------------------------------------------------------


def _take_link(link: LinkSolution) -> Fields:
    names = (
        "transmit",
        "receive",
        "ends",
        "light_time_exact",
        "range_m",
        "range_rate_m_s",
        "light_time_rate",
        "transmit_elevation_deg",
        "receive_elevation_deg",
        "occulted",
        "iterations",
        "notes",
    )
    return {**{name: getattr(link, name) for name in names}, "ledger": dict(link.ledger)}


def _take_two_way(link: TwoWaySolution) -> Fields:
    names = ("up", "down", "turnaround_s", "round_trip_s", "notes")
    return {name: getattr(link, name) for name in names}


def _take_comparison(found: ClockComparison) -> Fields:
    names = ("a", "b", "against", "duration_s", "accumulated_s", "rate")
    return {**{name: getattr(found, name) for name in names}, "ledger": dict(found.ledger)}


def _take_residuals(found: Residuals) -> Fields:
    names = ("t", "theirs", "ours", "residual_s")
    return {**{name: getattr(found, name) for name in names}, **found.facts()}


def _take_explanation(found: Explanation) -> Fields:
    residuals = found.residuals
    of_both = residuals.facts()
    facts = {name: value for name, value in found.facts().items() if name not in of_both}
    return {"residuals": residuals, "unexplained_s": found.unexplained_s, **facts}


class _Mapped(Kind):
    """A kind that is read back as a mapping of its fields, whatever they are."""

    def build(self, fields: Any, context: Context) -> dict[str, Any]:
        """The fields, and their kind."""
        return {"kind": self.name, **fields}


def _mapped(cls: type, take: Callable[[Any], Fields]) -> Kind:
    return _Mapped(cls.__name__, cls, take, lambda fields, context: fields, ())


RESULTS: Final = (
    Kind("Chain", Chain, _take_chain, _make_chain, _CHAIN),
    Kind("Budget", Budget, _take_budget, _make_budget, _BUDGET),
    Kind("Rows", Rows, _take_rows, _make_rows, ("index", "weight", "sigma", "phase", "words")),
    _mapped(LinkSolution, _take_link),
    _mapped(TwoWaySolution, _take_two_way),
    _mapped(ClockComparison, _take_comparison),
    _mapped(Residuals, _take_residuals),
    _mapped(Explanation, _take_explanation),
    *(of_class(cls) for cls in (Contribution, Omission, Common, Independent, Exponential)),
    *(of_class(cls) for cls in (WhatIf, Moved, Change, Provenance, StepRecord, TableRecord, ClockRecord)),
)
