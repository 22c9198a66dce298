"""What is to be done with each HDU of a file, found out before anything is written."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

from ..errors import InvalidInput
from ..files.stream import Mapping as Chained
from ..instants import Instants
from ..source import Source
from . import words
from .cards import Cards
from .frame import TimeFrame, read_time_frame
from .header_times import RELATIVE
from .layout import Hdu, Layout
from .reading import TimeColumn, hdu_cards, is_good_time, time_column
from .reckoning import UtcRelative
from .reference_time import REFERENCE_KEYWORDS
from .rewrite import Target, ephemeris_name

__all__ = ["Part", "first_times", "made_of", "planned", "target_of"]

_STATING = ("TIMESYS", "TREFPOS", *REFERENCE_KEYWORDS, *RELATIVE)


@dataclass(frozen=True)
class Part:
    """An HDU: `frame` is None where it is copied as it is."""

    hdu: Hdu
    cards: Cards
    frame: TimeFrame | None
    columns: tuple[TimeColumn, ...] = ()
    notes: tuple[str, ...] = ()


def target_of(chain: Chained, direction: Source | None, utc: UtcRelative | None) -> Target:
    """Where a chain, direct or compiled, takes times, in the words of FITS.

    Raises
    ------
    InvalidInput
        For an end that the FITS standard has no words for.
    """
    start, end = chain.start, chain.end
    words.fits_scale(end.scale)
    if end.place is not None:
        words.fits_place(end.place)
        if end.place == "BARYCENTER" and end.scale.name not in words.BARYCENTRIC:
            raise InvalidInput(f"FITS has no {end}: at the barycentre times are TDB or TCB")
    supplies: Any = getattr(chain, "_supplies", None)
    if direction is None and supplies is not None:
        direction = supplies.source
    used = {str(table.table): str(table.name) for table in _tables(chain)}
    ephemeris = ephemeris_name(used["ephemeris"]) if "ephemeris" in used else None
    reference: Any = getattr(chain, "reference", None)
    leap_seconds = None if reference is None else reference.leap_seconds

    def carried(t: Instants) -> Instants:
        return chain(t)

    return Target(start, end, carried, direction, ephemeris, None, utc, leap_seconds)


def _tables(chain: Any) -> Sequence[Any]:
    certificate = getattr(chain, "certificate", None)
    if certificate is not None:
        return tuple(certificate.tables)
    from ..provenance import provenance_of

    return provenance_of(chain).tables


def made_of(chain: Any) -> list[str]:
    """Lines for HISTORY: what was done, with which tables."""
    certificate = getattr(chain, "certificate", None)
    if certificate is not None:
        lines = certificate.table().splitlines()
    else:
        from ..provenance import provenance_of

        lines = [line.removeprefix("# ") for line in provenance_of(chain).header()]
        lines = [line for line in lines if not line.startswith("step: ")]
    return [f"times carried from {chain.start} to {chain.end}", *lines]


def planned(
    layout: Layout, target: Target, columns: Sequence[str], keep: Sequence[str | int], utc: UtcRelative | None
) -> list[Part]:
    """What is to be done with each HDU.

    Raises
    ------
    DataFileError, InvalidInput
        Where a header contradicts itself or does not match the chain, or nothing is there to be carried.
    """
    kept = _kept(layout, keep)
    found = [
        Part(hdu, hdu.cards, None) if hdu.number in kept else _part(layout, hdu, target, columns, utc) for hdu in layout
    ]
    if not any(part.columns for part in found):
        raise _nothing(layout, columns)
    return found


def first_times(
    layout: Layout,
    columns: Sequence[str] = ("TIME",),
    keep: Sequence[str | int] = (),
    utc: UtcRelative | None = None,
    leap_seconds: Any = None,
) -> TimeColumn:
    """The first column of times that would be carried: it tells where a chain has to begin.

    Raises
    ------
    InvalidInput
        Where there is none.
    """
    kept = _kept(layout, keep)
    for hdu in layout:
        if hdu.is_table and hdu.number not in kept:
            for name in columns:
                if hdu.column(name) is not None:
                    return time_column(layout, hdu, name, utc, leap_seconds)
    raise _nothing(layout, columns)


def _nothing(layout: Layout, columns: Sequence[str]) -> InvalidInput:
    there = ", ".join(hdu.title for hdu in layout)
    return InvalidInput(
        f"{layout.path}: no table to be carried has a column {' or '.join(columns)}; there is {there}", path=layout.path
    )


def _kept(layout: Layout, keep: Sequence[str | int]) -> set[int]:
    numbers = set()
    for wanted in keep:
        name = wanted.upper() if isinstance(wanted, str) else None
        matching = [hdu.number for hdu in layout if hdu.number == wanted or hdu.name == name]
        if not matching:
            raise InvalidInput(f"{layout.path}: keep names {wanted!r}, which is not there", path=layout.path)
        numbers |= set(matching)
    return numbers


def _part(layout: Layout, hdu: Hdu, target: Target, columns: Sequence[str], utc: UtcRelative | None) -> Part:
    cards = hdu_cards(layout, hdu)
    if cards.true("ZIMAGE") or _has_time_axis(cards):
        timed = hdu.cards.order(_STATING)
        return Part(hdu, cards, None, (), (f"{hdu.title} is an image, and was left as it is",) if timed else ())
    times = _columns(layout, hdu, target, columns, utc)
    if not times and not hdu.cards.order(_STATING):  # what was said apart is for those that have times
        return Part(hdu, cards, None)
    # With INHERIT what the primary HDU states of relative times is in `cards`, and holds here too.
    frame = read_time_frame(cards, utc=utc, leap_seconds=target.leap_seconds)
    for what, stated in ((hdu.title, frame), *((f"{hdu.title}, column {t.column.name}", t.frame) for t in times)):
        _check_start(cards, what, stated, target)
    notes = dict.fromkeys(note for stated in (frame, *(t.frame for t in times)) for note in stated.notes)
    return Part(hdu, cards, frame, tuple(times), tuple(f"{hdu.title}: {note}" for note in notes))


def _columns(
    layout: Layout, hdu: Hdu, target: Target, names: Sequence[str], utc: UtcRelative | None
) -> list[TimeColumn]:
    if not hdu.is_table:
        return []
    wanted = [*names, *(("START", "STOP") if is_good_time(hdu) else ())]
    found = []
    for name in dict.fromkeys(word.upper() for word in wanted):
        column = hdu.column(name)
        if column is None:
            continue
        if column.code != "D" or column.repeat != 1:
            digits = " A float32 holds 7 digits, minutes in a year." if column.code == "E" else ""
            raise InvalidInput(
                f"{layout.path}, {hdu.title}: column {column.name} is {column.repeat}{column.code}, and times are "
                f"carried in columns 1D only.{digits} Write it as 1D first, or leave the extension as it is with keep=",
                path=layout.path,
            )
        found.append(time_column(layout, hdu, name, utc, target.leap_seconds))
    return found


def _has_time_axis(cards: Cards) -> bool:
    axes = range(1, cards.integer("NAXIS", 0, 999) + 1)
    kinds = [(cards.text(f"CTYPE{n}") or "").upper().partition("(")[0] for n in axes if f"CTYPE{n}" in cards]
    return any(kind == "TIME" or kind in words.time_words() for kind in kinds)


def _check_start(cards: Cards, what: str, frame: TimeFrame, target: Target) -> None:
    node = frame.node
    start = target.start
    if node.scale != start.scale or start.place not in (None, node.place):
        raise InvalidInput(
            f"{cards.path}: the times of {what} are {node} by its header, and the chain begins at {start}: make the "
            f"chain from {node}, or leave the extension as it is with keep=",
            path=cards.path,
        )
