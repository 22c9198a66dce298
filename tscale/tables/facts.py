"""Facts of the tables in use, for a listing."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from datetime import date
from pathlib import Path
from typing import TYPE_CHECKING, Any, NamedTuple

import numpy as np

from ..errors import TscaleError
from ..instants import Instants
from .common import mjd_date

if TYPE_CHECKING:
    from ..formats.leap_seconds import LeapSeconds
    from .earth_orientation import EarthOrientation
    from .tt_bipm import TTBIPM

__all__ = ["TableFacts", "facts_of"]


class TableFacts(NamedTuple):
    """What there is to know of one table in use."""

    table: str
    name: str
    start: str
    end: str | None
    issued: str | None
    expires: str | None
    age_days: int | None
    """Days from `issued` to the day asked about; None where no day of issue is known."""
    sha256: str
    path: Path | None
    error: str | None = None
    """Why the table cannot be used; everything else but `table` is then empty."""


def facts_of(tables: Sequence[tuple[str, Callable[[], Any]]], today: date) -> list[TableFacts]:
    """Facts of tables given by title and by what returns them; one that fails is listed with its error."""
    return [_facts(title, table, today) for title, table in tables]


def _facts(title: str, make: Callable[[], Any], today: date) -> TableFacts:
    try:
        table = make()
        start, end, expires = _span(title, table)
        sha256 = table.sha256
    except (TscaleError, OSError) as error:
        return TableFacts(title, "", "", None, None, None, None, "", getattr(error, "path", None), str(error))
    issued = getattr(table, "issued", None)
    try:
        age = (today - date.fromisoformat(issued)).days if issued else None
    except ValueError:  # some issuers write a number of a bulletin here, not a day
        age = None
    return TableFacts(title, table.name, start, end, issued, expires, age, sha256, getattr(table, "path", None))


def _span(title: str, table: Any) -> tuple[str, str | None, str | None]:
    """First day, last day, and day of expiry."""
    if title == "leap seconds":
        leap: LeapSeconds = table
        expires = None if leap.expires_mjd is None else mjd_date(leap.expires_mjd)
        return mjd_date(leap.start_mjd), expires, expires
    if title in ("ephemeris", "time ephemeris"):
        start, end = (str(Instants.from_seconds(int(np.ceil(s)), scale="TDB").to_iso(0))[:10] for s in table.span)
        return start, end, None
    days: EarthOrientation | TTBIPM = table
    return mjd_date(days.span[0]), mjd_date(days.span[1]), None
