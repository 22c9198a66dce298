"""The tables that the steps of a chain read, and what there is to record of each."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from datetime import date
from functools import partial
from typing import TYPE_CHECKING, Any, Final

from ..earth.cip_table import TABLE_NAME
from ..errors import DataFileError
from ..step import Step
from ..tables.facts import facts_of
from ..tables.reference import ReferenceData

if TYPE_CHECKING:
    from ..chains import Chain

__all__ = ["TableRecord", "reads_ephemeris", "table_options", "tables_of", "tables_read"]

# Families of scales that are kept on Earth: a step between two of them reads no ephemeris.
_EARTHLY: Final = frozenset(("UTC", "TAI", "TT", "GPS", "GST", "BDT", "GLONASS", "TCG", "CLOCK"))


@dataclass(frozen=True)
class TableRecord:
    """A table that the chain reads; spans are whole days."""

    table: str
    name: str
    start: str
    end: str | None
    issued: str | None
    expires: str | None
    sha256: str


def tables_read(chain: Chain) -> tuple[str, ...]:
    """Titles of the tables that a chain's steps read: those of `ReferenceData.describe`, and the CIP table."""
    scales = {node.scale for node in (chain.start, *(step.end for step in chain.steps))}
    found = ["leap seconds"] if any(scale.utc_labels for scale in scales) else []
    observer = chain._supplies.site
    on_ground = observer is not None and bool(getattr(observer, "uses_earth_orientation", True))
    far = [step for step in chain.steps if reads_ephemeris(step)]
    at_site = any("TOPOCENTER" in (step.start.place, step.end.place) for step in far)
    turned = on_ground and at_site
    if turned or any(scale.name == "UT1" for scale in scales):
        found.append("Earth orientation")
    if turned:
        found.append("celestial pole")
    names = {scale.name for scale in scales}
    found += [table.scale for table in chain.reference.tt_bipm if table.scale in names]
    if far:
        found += ["ephemeris", "time ephemeris"]
    return tuple(found)


def reads_ephemeris(step: Step) -> bool:
    """Whether a step reads the ephemeris; one of a kind unknown here is taken to."""
    ends = (step.start.scale, step.end.scale)
    if step.start.place != step.end.place:
        return True
    if {scale.name for scale in ends} == {"TCB", "TDB"}:
        return False
    return any(scale.family not in _EARTHLY and scale.name != "UT1" for scale in ends)


def tables_of(chain: Chain) -> tuple[TableRecord, ...]:
    """Records of those tables.

    Raises
    ------
    TscaleError
        What the table itself raises, where it cannot be read.
    """
    reference = chain.reference
    makers: dict[str, Callable[[], Any]] = {
        "leap seconds": lambda: reference.leap_seconds,
        "Earth orientation": lambda: reference.earth_orientation,
        "ephemeris": lambda: reference.ephemeris,
        "time ephemeris": lambda: reference.time_ephemeris,
    }
    makers |= {table.scale: partial(reference.realisation, table.scale) for table in reference.tt_bipm}
    records = []
    for title in tables_read(chain):
        if title == "celestial pole":
            records.append(_pole_record())
            continue
        (fact,) = facts_of([(title, makers[title])], date.min)  # the age is not told
        if fact.error is not None:
            makers[title]()  # raises what was wrong
            raise DataFileError(f"{title}: {fact.error}", path=fact.path)
        records.append(TableRecord(title, fact.name, fact.start, fact.end, fact.issued, fact.expires, fact.sha256))
    return tuple(records)


def _pole_record() -> TableRecord:
    from ..ephemeris.shipped import manifest

    entry = manifest(TABLE_NAME)
    start, _, end = str(entry["span"]).removesuffix(" TT").partition(" to ")
    return TableRecord("celestial pole", TABLE_NAME, start, end, None, None, str(entry["sha256"]))


def table_options(reference: ReferenceData, tables: tuple[TableRecord, ...]) -> dict[str, Any]:
    """What was chosen along with the tables and is not in their files."""
    read = {table.table for table in tables}
    found: dict[str, Any] = {}
    if "Earth orientation" in read:
        found["after_end"] = reference.earth_orientation.after_end
    if "ephemeris" in read:
        found["gm_m3_s2"] = dict(reference.ephemeris.given_gm_m3_s2)
    return found
