"""Columns that a conversion adds to a table: dates, terms, uncertainties and rates."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np

from ..errors import InvalidInput
from ..exact import Pair
from ..instants import Instants
from ..provenance.status import row_status
from ..scales import Node
from .arrow_columns import arrow, fields
from .stream import Mapping, evaluator

if TYPE_CHECKING:
    import pyarrow as pa

__all__ = ["Added", "added_columns"]


class Added(NamedTuple):
    """New columns: what they are called, and what makes them of counts."""

    start: Node
    fields: tuple[pa.Field, ...]
    make: Callable[[Pair], list[Any]]


def added_columns(
    mappings: Sequence[Mapping], names: Sequence[str] | None, *, ledger: bool, sigma: bool, rate: bool
) -> Added:
    """Columns of one or more mappings from one start.

    Raises
    ------
    InvalidInput
        Mappings from several starts, names that are not as many, and terms or uncertainties of a compiled chain.
    """
    if not mappings:
        raise InvalidInput("nothing to convert to: give a Chain or a compiled one")
    work = [evaluator(mapping) for mapping in mappings]
    start = mappings[0].start
    if any(mapping.start != start for mapping in mappings):
        raise InvalidInput(f"all chains start at one node, got {', '.join(str(m.start) for m in mappings)}")
    titles = [str(mapping.end) for mapping in mappings] if names is None else list(names)
    if len(titles) != len(mappings) or len(set(titles)) != len(titles):
        raise InvalidInput(f"result= names each of {len(mappings)} columns of dates once, got {', '.join(titles)}")
    if (ledger or sigma) and not all(hasattr(mapping, "ledger") for mapping in mappings):
        raise InvalidInput("a compiled chain has no terms and no uncertainties: convert with the chain itself")
    pa = arrow()
    found = [field for title, mapping in zip(titles, mappings, strict=True) for field in fields(title, mapping.end)]
    chains: list[Any] = list(mappings)
    kinds: list[tuple[bool, str, Callable[[Any, Instants], Any]]] = [
        (sigma, "sigma_s", lambda chain, t: chain.sigma_s(t)),
        (rate, "rate", lambda chain, t: chain.rate(t)),
    ]
    extra = [
        (f"{title}_{ending}", chain, make)
        for wanted, ending, make in kinds
        if wanted
        for title, chain in zip(titles, chains, strict=True)
    ]
    terms = [_terms(title, chain) for title, chain in zip(titles, chains, strict=True)] if ledger else []
    states = [(f"{title}_status", chain) for title, chain in zip(titles, chains, strict=True)] if sigma else []
    found += [pa.field(name, pa.float64()) for name, _, _ in extra]
    found += [pa.field(name, pa.string()) for name, _ in states]
    found += [pa.field(name, pa.float64()) for group in terms for name in group.values()]

    def make(pair: Pair) -> list[Any]:
        columns: list[Any] = [part for evaluate in work for part in evaluate(pair)]
        if extra or terms:
            t = Instants._of(pair, start.scale, start.place)
            columns += [np.asarray(of(chain, t), dtype=np.float64) for _, chain, of in extra]
            columns += [row_status(chain, t) for _, chain in states]
            for chain, group in zip(chains, terms, strict=False):
                lines = chain.ledger(t)
                columns += [lines[term] for term in group]
        return columns

    return Added(start, tuple(found), make)


def _terms(title: str, chain: Any) -> dict[str, str]:
    """Terms of a chain, each with the name of its column; no instant is needed to know them."""
    none = Instants._of((np.zeros(0, np.int64), np.zeros(0)), chain.start.scale, chain.start.place)
    return {term: f"{title}: {term} (s)" for term in chain.ledger(none)}
