"""The page put together."""

from __future__ import annotations

import os
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, Final

from .. import __version__
from ..chains import Chain
from ..errors import InvalidInput, gathered_extrapolations
from ..instants import Instants
from ..provenance import provenance_of
from ..storage import write_atomically
from ..tables.clock_log import ClockLog
from .markup import Markup, tag
from .pictures import picture
from .sections import (
    budget_section,
    ledger_section,
    logs_section,
    notes_section,
    path_section,
    provenance_section,
    results_section,
)
from .style import STYLE

if TYPE_CHECKING:
    from ..budget import Budget
    from ..tables.clock_report import ClockReport

__all__ = ["report_html", "save_report"]

_DRAWN: Final = 1000
_POLICY: Final = "default-src 'none'; img-src data:; style-src 'unsafe-inline'"


def report_html(
    chain: Chain,
    t: Instants,
    *,
    title: str = "",
    name: str = "",
    rows: int = 20,
    lines: Sequence[int] = (),
    pictures: bool = True,
    stated: dict[str, Any] | None = None,
    spoken: Callable[[str], str] = str,
) -> str:
    """A conversion as one HTML page that stands alone.

    All instants are converted; the tables of terms and of the budget are those of the first. Pictures show up to 1000
    dates, evenly taken.

    Parameters
    ----------
    chain : Chain
    t : Instants
        Readings at its start, one or more.
    title : str
        Default: both ends of the chain.
    name : str
        Where the readings come from.
    rows : int
        Results to list.
    lines : sequence of int
        Lines of the readings in their file, for the list.
    pictures : bool
        Draw them; needs matplotlib.
    stated : dict, optional
        Members of `budget.Assumptions`, and `coverage_factor`, for the budget.
    spoken : callable
        Turns what the budget says of arguments into the words of those who read the page, such as options of a command.

    Returns
    -------
    str
        The same for the same inputs: it holds no clock time and no paths.

    Raises
    ------
    InvalidInput
        For no instants, or a number of rows below one.
    MissingPiece
        Pictures without matplotlib.
    TscaleError
        What the chain raises for instants that it cannot carry.
    """
    if not isinstance(t, Instants) or t.size == 0:
        raise InvalidInput("a report needs Instants at the start of the chain, one or more")
    if isinstance(rows, bool) or not isinstance(rows, int) or rows < 1:
        raise InvalidInput(f"rows is how many results to list, 1 or more; got {rows!r}")
    if pictures:
        from ..plots import check_picture

        check_picture("report.svg")
    t = t.ravel()
    with gathered_extrapolations(repeats=True):
        out = chain(t)
        every = -(-t.size // _DRAWN)
        drawn = t[::every]
        ledger, budget = chain.ledger(drawn), chain.budget(drawn, **(stated or {}))
        made = provenance_of(chain, t)
        logs = _logs(chain, pictures)
        first = str(t.to_iso(12, leap_seconds=chain.reference.leap_seconds)[0])
        taken = "" if every == 1 else f" One of {every} readings is drawn."
        figures = _figures(chain, drawn, ledger, budget, taken) if pictures else (None, None)
        sections = [
            path_section(chain),
            notes_section(made.notes),
            results_section(chain, t, out, rows, lines, stated or {}),
            ledger_section(ledger, f"{first} {t.scale}", figures[0]),
            budget_section(budget, f"{first} {t.scale}", figures[1], spoken),
            logs_section(logs),
            provenance_section(made),
        ]
    words = title or f"{chain.start} to {chain.end}"
    lead = f"{t.size} reading{'s' if t.size > 1 else ''}{f' of {name}' if name else ''}."
    facts = _facts(t, out, chain, budget)
    body = [tag("h1", words), tag("p", lead, class_="lead"), facts, *sections]
    foot = tag("footer", f"Made by tscale {__version__}. The results are not certified.")
    return f"<!DOCTYPE html>\n{tag('html', _head(words), tag('body', *body, foot), lang='en')}\n"


def save_report(chain: Chain, t: Instants, path: str | os.PathLike[str], **options: Any) -> None:
    """Write `report_html` (and take its options) to a file that takes its name only when it is whole."""
    target = Path(path)
    if not target.parent.is_dir():
        raise InvalidInput(f"{path} cannot be written: there is no folder {target.parent}; make it first")
    write_atomically(target, report_html(chain, t, **options).encode("utf-8"))


def _head(title: str) -> Markup:
    return tag(
        "head",
        tag("meta", charset="utf-8"),
        tag("meta", http_equiv="Content-Security-Policy", content=_POLICY),
        tag("meta", name="viewport", content="width=device-width, initial-scale=1"),
        tag("title", title),
        tag("style", Markup(STYLE)),
    )


def _facts(t: Instants, out: Instants, chain: Chain, budget: Budget) -> Markup:
    """The first reading at a glance."""
    leap = chain.reference.leap_seconds
    combined, expanded = (float(value.reshape(-1)[0]) for value in (budget.combined_s, budget.expanded_s))
    factor = float(budget.coverage_factor.reshape(-1)[0])
    cells = [
        (t.to_iso(12, leap_seconds=leap)[0], f"first reading, {chain.start}"),
        (out.to_iso(12, leap_seconds=leap)[0], f"its result, {chain.end}"),
        (f"{combined:.2e} s" if combined else "0 s", "its combined standard uncertainty"),
        (f"{expanded:.2e} s" if expanded else "0 s", f"its expanded uncertainty, k = {factor:.3g}"),
    ]
    return tag("div", *(tag("div", tag("b", value), tag("span", words)) for value, words in cells), class_="facts")


def _figures(chain: Chain, t: Instants, ledger: Any, budget: Budget, taken: str) -> tuple[Markup | None, Markup | None]:
    """Pictures of the ledger and of the budget."""
    from ..plots import budget_figure, ledger_figure

    terms = uncertainties = None
    if t.size > 1:
        words = f"Every term from {chain.start} to {chain.end} over time, terms of like size in one panel."
        terms = picture(ledger_figure(ledger, t), words, words + taken)
    if budget.combined_s.any():
        words = "Standard uncertainties by source: bars for the first reading, lines over time."
        uncertainties = picture(budget_figure(budget, t), words, words + (taken if t.size > 1 else ""))
    return terms, uncertainties


def _logs(chain: Chain, pictures: bool) -> list[tuple[ClockLog, ClockReport | None, Markup | None]]:
    """The logs that the steps read, inspected where their files are at hand."""
    pairs = {frozenset((step.start.scale.name, step.end.scale.name)) for step in chain.steps}
    found = []
    for log in chain._supplies.clocks:
        if frozenset((log.scale, log.reference)) not in pairs:
            continue
        report = None
        if log.path is not None and log.path.is_file():
            report = ClockLog.inspect(log.path, leap_seconds=chain.reference.leap_seconds)
        figure = None
        if pictures:
            from ..plots import clock_log_figure

            words = f"{log.scale} minus {log.reference}: comparisons, and residuals from a straight line."
            figure = picture(clock_log_figure(log, report), words, words)
        found.append((log, report, figure))
    return found
