"""What if: the same readings through the same chain with other tables, and what that moves, term by term.

The readings are held as they were written: as labels. A leap-second table that is changed therefore dates a UTC label
past the change at another instant, and what moves is the count; a UTC label that is a result moves itself. Ledgers add
up to differences of labels, so that the moved terms add up to what the label of the result moves (`total_s`);
`count_s` is what the result moves in SI seconds elapsed. The two differ only where the result carries leap seconds.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from .. import exact
from ..chains import Chain
from ..errors import InvalidInput, gathered_extrapolations
from ..exact import FloatArray, Pair
from ..formats import labels
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from ..provenance import Provenance, provenance_of
from ..scales import Scale
from .moved import Change, Moved, WhatIf
from .replaced import Replaced, replaced_supplies
from .stated import quadrature, step_sigmas, total_sigma

if TYPE_CHECKING:
    from ..earth.observer import Observer
    from ..source import Source
    from ..tables.clock_log import ClockLog
    from ..tables.reference import ReferenceData

__all__ = ["what_if"]

_ZERO: Final[Pair] = (np.zeros((), dtype=np.int64), np.zeros(()))


def what_if(
    chain: Chain,
    t: Instants,
    *,
    reference: ReferenceData | None = None,
    clocks: Sequence[ClockLog] = (),
    site: Observer | None = None,
    source: Source | None = None,
    **tables: Any,
) -> WhatIf:
    """Run a chain again with other tables, and tell what moved.

    Parameters
    ----------
    chain : Chain
    t : Instants
        Readings at its start. Their labels are held: see the module.
    reference : ReferenceData, optional
        Another bundle in place of the chain's.
    clocks : sequence of ClockLog
        Each in place of the chain's log of the same clock.
    site, source : optional
        In place of the chain's.
    **tables
        `leap_seconds`, `earth_orientation`, `tt_bipm`, `ephemeris`, `time_ephemeris`: tables or paths, as for
        `ReferenceData.replace`. A single table of another realisation TT(BIPMyy) takes the place of the chain's. With
        another ephemeris goes its own time ephemeris.

    Raises
    ------
    InvalidInput
        For no instants, or for a log or a table that was read with the leap seconds that are to be replaced and
        reaches past the change: give it anew, read with the new ones.
    TextError
        For labels that do not exist by the new leap seconds, with the mask.
    OutOfSpan
        For instants that the new tables do not reach, with the mask.
    """
    if not isinstance(t, Instants) or t.size == 0:
        raise InvalidInput("what_if needs Instants at the start of the chain, at least one")
    other = replaced_supplies(chain, reference, clocks, site, source, tables)
    after = Chain(other.node(chain.start), other.node(chain.end), other.supplies)
    old, new = chain.reference.leap_seconds, after.reference.leap_seconds
    with gathered_extrapolations(repeats=True):
        moved_t = _same_labels(t, old, new)
        if after.start.scale.name != moved_t.scale:
            moved_t = Instants(*moved_t.pair, after.start.scale.name, moved_t.place)
        terms = _moved_terms(chain, t, after, moved_t, other)
        total = _full(_ZERO, t.shape)
        for _, _, pair, _ in terms:
            total = exact.add(total, pair)
        count = exact.subtract(after(moved_t).pair, chain(t).pair)
        before_made, after_made = provenance_of(chain, t), provenance_of(after, moved_t)
        changes = _changes(before_made, after_made)
        changed = {change.what for change in changes}
        sigma = quadrature(total_sigma(chain, t, changed), total_sigma(after, moved_t, changed))
        return WhatIf(
            tuple(Moved(step, term, exact.seconds(pair), None, only) for step, term, pair, only in terms),
            _moved_steps(terms, step_sigmas(chain, t, changed), step_sigmas(after, moved_t, changed, other)),
            Moved("total", "", exact.seconds(total), sigma),
            exact.seconds(count),
            changes,
            before_made,
            after_made,
        )


def _same_labels(t: Instants, old: LeapSeconds, new: LeapSeconds) -> Instants:
    """Instants with the same labels by another leap-second table."""
    kind = Scale.parse(t.scale)
    if not kind.utc_labels or old.rows == new.rows:
        return t
    face = labels.label(kind, t.pair, old)
    return Instants(*labels.count(kind, face, new), t.scale, t.place)


def _moved_terms(
    chain: Chain, t: Instants, after: Chain, moved_t: Instants, other: Replaced
) -> list[tuple[str, str, Pair, str]]:
    """Step, term, exact difference, and in which of the two alone it is."""
    first = {(line.step, line.term): line.value for line in _lines(chain, t)}
    second = {(other.old(line.step), other.old(line.term)): line.value for line in _lines(after, moved_t)}
    found = []
    for key in dict.fromkeys([*first, *second]):
        moved = exact.subtract(_full(second.get(key, _ZERO), t.shape), _full(first.get(key, _ZERO), t.shape))
        only = "" if key in first and key in second else "before" if key in first else "after"
        found.append((*key, moved, only))
    return found


def _lines(chain: Chain, t: Instants) -> list[Any]:
    return list(chain.ledger(t)._lines.values())


def _full(pair: Pair, shape: tuple[int, ...]) -> Pair:
    return np.broadcast_to(pair[0], shape), np.broadcast_to(pair[1], shape)


def _moved_steps(
    terms: Sequence[tuple[str, str, Pair, str]], first: Mapping[str, FloatArray], second: Mapping[str, FloatArray]
) -> tuple[Moved, ...]:
    """Sums over the steps, with the uncertainties that both chains state for what changed in them."""
    sums: dict[str, Pair] = {}
    for step, _, pair, _ in terms:
        sums[step] = exact.add(sums[step], pair) if step in sums else pair
    return tuple(
        Moved(step, "", exact.seconds(pair), quadrature(first.get(step), second.get(step)))
        for step, pair in sums.items()
    )


def _changes(before: Provenance, after: Provenance) -> tuple[Change, ...]:
    """What differs between two provenances."""
    sides = []
    for made in (before, after):
        pieces = {table.table: (table.name, table.sha256) for table in made.tables}
        pieces = {("TT(BIPM)" if what.startswith("TT(") else what): held for what, held in pieces.items()}
        pieces |= {f"{log.scale} by {log.reference}": (log.name, log.content_sha256) for log in made.clocks}
        for what, held in (("observer", made.observer), ("source", made.source)):
            if held is not None:
                pieces[what] = (str(held["name"]), str(held["sha256"]))
        sides.append(pieces)
    old, new = sides
    return tuple(
        Change(what, _named(old.get(what)), _named(new.get(what)))
        for what in dict.fromkeys([*old, *new])
        if old.get(what, ("", ""))[1] != new.get(what, ("", ""))[1]
    )


def _named(piece: tuple[str, str] | None) -> str:
    return "" if piece is None else f"{piece[0]} (SHA-256 {piece[1][:12]})"
