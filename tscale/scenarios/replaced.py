"""The pieces of a chain with some of them replaced, and the names that this changes."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any, Final

from ..chains import Chain
from ..errors import InvalidInput
from ..formats import labels
from ..formats.leap_seconds import LeapSeconds, day_words
from ..routes import Supplies
from ..scales import Node, Scale
from ..tables.clock_arguments import checked_clocks
from ..tables.clock_log import ClockLog
from ..tables.reference import ReferenceData

if TYPE_CHECKING:
    from ..earth.observer import Observer
    from ..source import Source

__all__ = ["Replaced", "replaced_supplies"]

_TABLES: Final = ("leap_seconds", "earth_orientation", "tt_bipm", "ephemeris", "time_ephemeris")


@dataclass(frozen=True)
class Replaced:
    """What another chain is made of."""

    supplies: Supplies
    renamed: Mapping[str, str]
    """Realisations of TT that another one takes the place of: old name to new."""

    def node(self, node: Node) -> Node:
        """A node of the old chain in the new one."""
        name = self.renamed.get(node.scale.name)
        return node if name is None else Node(Scale.parse(name), node.place)

    def old(self, text: str) -> str:
        """Words of the new chain as the old one would say them."""
        for before, after in self.renamed.items():
            text = text.replace(after, before)
        return text


def replaced_supplies(
    chain: Chain,
    reference: ReferenceData | None,
    clocks: Sequence[ClockLog],
    site: Observer | None,
    source: Source | None,
    tables: Mapping[str, Any],
) -> Replaced:
    """Put the new pieces in place of the old ones; see `what_if` for the rules and errors."""
    unknown = sorted(set(tables) - set(_TABLES))
    if unknown:
        raise InvalidInput(
            f"{', '.join(unknown)} cannot be replaced; there are reference, clocks, site, source, {', '.join(_TABLES)}"
        )
    given = {name: table for name, table in tables.items() if table is not None}
    if "ephemeris" in given:
        given.setdefault("time_ephemeris", None)
    old = chain._supplies
    base = old.reference if reference is None else reference
    bundle = base.replace(**given) if given else base
    fresh = checked_clocks(clocks)
    kept = [log for log in old.clocks if log.scale not in {new.scale for new in fresh}]
    _check_leap_seconds(chain, bundle, kept, reference is not None, set(given))
    supplies = replace(
        old,
        reference=bundle,
        clocks=(*kept, *fresh),
        site=old.site if site is None else site,
        source=old.source if source is None else source,
    )
    return Replaced(supplies, _renamed(chain, bundle))


def _renamed(chain: Chain, bundle: ReferenceData) -> dict[str, str]:
    """A realisation TT(BIPMyy) that the chain names and the new bundle lacks gives way to the only one that it has."""
    have = {table.scale for table in bundle.tt_bipm}
    used = {table.scale for table in chain.reference.tt_bipm}
    named = {node.scale.name for node in (chain.start, *(step.end for step in chain.steps))}
    lost = sorted((named & used) - have)
    return {lost[0]: have.pop()} if len(lost) == 1 and len(have) == 1 else {}


def _check_leap_seconds(
    chain: Chain, bundle: ReferenceData, kept: Sequence[ClockLog], whole: bool, given: set[str]
) -> None:
    """Refuse logs and tables that were read with leap seconds that do not hold any more."""
    old, new = chain.reference.leap_seconds, bundle.leap_seconds
    changed = _first_change(old, new)
    if changed is None:
        return
    for log in kept:
        end = log.span[-1]
        day, _, _ = labels.label(Scale.parse(end.scale), end.pair, old)
        if int(day) >= changed:
            raise InvalidInput(
                f"the log {log.name!r} of {log.scale} was read with the leap seconds {old.name!r} and reaches past "
                f"{day_words(changed)}, where {new.name!r} differs: read it again with the new ones "
                f"(ClockLog.load(path, leap_seconds=...)) and give it in clocks="
            )
    if whole:
        return
    orientation = chain.reference._given["earth_orientation"]
    stale = [("earth_orientation", orientation)] if orientation is not None else []
    stale += [("tt_bipm", table) for table in chain.reference.tt_bipm]
    for part, table in stale:
        if part not in given and table.span[1] > changed:
            raise InvalidInput(
                f"the table {table.name!r} was read with the leap seconds {old.name!r} and reaches past "
                f"{day_words(changed)}, where {new.name!r} differs: give {part}= as well, read with the new ones"
            )


def _first_change(old: LeapSeconds, new: LeapSeconds) -> int | None:
    """First day on which two tables differ, or None."""
    rows = set(old.rows) ^ set(new.rows)
    return min(row.mjd for row in rows) if rows else None
