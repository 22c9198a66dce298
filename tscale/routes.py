"""Route finding: which edges are at hand, which would be with one more piece, and the best path along them."""

from __future__ import annotations

import heapq
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from functools import partial
from itertools import pairwise
from typing import Any, Final

from . import edges
from .clocks.proper_clock import ProperClock
from .earth.observer import Observer
from .errors import MissingPiece
from .scales import Node, Scale
from .source import Source
from .step import Step
from .surface import BodyCentre
from .tables.clock_log import ClockLog
from .tables.reference import ReferenceData

__all__ = ["Supplies", "route", "shortened"]

_DATED_IN_TT: Final = (None, "TOPOCENTER", "GEOCENTER", "SELENOCENTER")
_MOON: Final = BodyCentre(301)


@dataclass(frozen=True)
class Supplies:
    """What the caller gave: the pieces that steps are made of."""

    reference: ReferenceData
    site: Observer | None = None
    clocks: tuple[ClockLog, ...] = ()
    source: Source | None = None
    second_order: bool = False
    free: tuple[ProperClock, ...] = ()

    def __post_init__(self) -> None:
        # Clocks of both kinds come in one list.
        given: tuple[Any, ...] = (*self.clocks, *self.free)
        object.__setattr__(self, "clocks", tuple(clock for clock in given if isinstance(clock, ClockLog)))
        object.__setattr__(self, "free", tuple(clock for clock in given if not isinstance(clock, ClockLog)))


def shortened(steps: Sequence[Step], supplies: Supplies) -> list[Step]:
    """The same path for mapping alone: TT, TCG, TCB (and TDB) at one place become one step, which says the same
    with fewer roundings.
    """
    found = list(steps)
    for onward in (("TT", "TCG", "TCB", "TDB"), ("TT", "TCG", "TCB")):
        for scales in (onward, onward[::-1]):
            width = len(scales) - 1
            for i in range(len(found) - width + 1):
                window = found[i : i + width]
                nodes = (window[0].start, *(step.end for step in window))
                place = nodes[0].place
                if place is None or tuple(node.scale.name for node in nodes) != scales:
                    continue
                observer = _observer_at(place, supplies)
                step = edges.tt_barycentric_step(onward[-1], place, observer, supplies.reference)
                found[i : i + width] = [step if scales == onward else step.reversed()]
                break
    return _with_wavefront(found, supplies)


def _with_wavefront(steps: list[Step], supplies: Supplies) -> list[Step]:
    """The same path with TT at an observer near the Earth to TDB at the barycentre as one step."""
    observer, source = supplies.site, supplies.source
    if observer is None or source is None or not getattr(observer, "geocentric", True):
        return steps
    near, far = Node(Scale.parse("TT"), "TOPOCENTER"), Node(Scale.parse("TDB"), "BARYCENTER")
    for i, (one, two) in enumerate(pairwise(steps)):
        for start, end in ((near, far), (far, near)):
            if (one.start, two.end) == (start, end) and one.end == Node(Scale.parse("TDB"), "TOPOCENTER"):
                step = edges.tt_wavefront_step(observer, source, supplies.reference, supplies.second_order)
                return [*steps[:i], step if start == near else step.reversed(), *steps[i + 2 :]]
    return steps


@dataclass(frozen=True)
class _Edge:
    """An edge that may be taken, or the reason why it may not."""

    start: Node
    end: Node
    step: Callable[[], Step] | None
    missing: str = ""


def route(first: Node, last: Node, supplies: Supplies) -> list[Step]:
    """Steps from one node to another.

    Raises
    ------
    MissingPiece
        When no path exists; names the pieces with which there would be one.
    """
    path = _cheapest(first, last, _edges(first, last, supplies))
    if path is None:
        raise MissingPiece(_no_way(first, last))
    missing = list(dict.fromkeys(edge.missing for edge, _ in path if edge.missing))
    if missing:
        raise MissingPiece(f"no chain from {first} to {last}: " + "; ".join(missing))
    steps: list[Step] = []
    for edge, onward in path:
        assert edge.step is not None
        step = edge.step()
        steps.append(step if onward else step.reversed())
    return steps


def _edges(first: Node, last: Node, supplies: Supplies) -> list[_Edge]:
    """Every edge at the places in play, those with a missing piece included."""
    reference, site = supplies.reference, supplies.site
    places: list[str | None] = list(dict.fromkeys([first.place, last.place]))
    if len(places) > 1 and "BARYCENTER" not in places:
        places.append("BARYCENTER")
    if "BARYCENTER" in places and first.place == last.place:
        places = ["BARYCENTER"]
    found: list[_Edge] = []

    def offer(a: str, b: str, place: str | None, step: Callable[[], Step] | None, missing: str = "") -> None:
        found.append(_Edge(_node(a, place), _node(b, place), step, missing))

    for place in places:
        offer("TCB", "TDB", place, partial(edges.tcb_tdb_step, place))
        found.extend(_lunar(place, supplies))
        if place not in _DATED_IN_TT:
            continue
        for name in ("UTC", "TT", "GPS", "GST", "BDT"):
            offer("TAI", name, place, partial(edges.fixed_step, "TAI", name, place, reference))
        offer("UTC", "GLONASS", place, partial(edges.fixed_step, "UTC", "GLONASS", place, reference))
        offer("TAI", "UT1", place, partial(edges.ut1_step, place, reference))
        offer("TT", "TCG", place, partial(edges.tt_tcg_step, place))
        for table in reference.tt_bipm:
            offer("TAI", table.scale, place, partial(edges.tt_bipm_step, place, table))
        for log in supplies.clocks:
            offer(log.scale, log.reference, place, partial(edges.clock_step, place, log, reference))
        found.extend(_proper(place, clock, supplies) for clock in supplies.free)
        found.extend(_unsupplied(first, last, place, supplies))
        if place == "TOPOCENTER" and site is None:
            offer(
                "TCG",
                "TCB",
                place,
                None,
                "TCB and TDB at TOPOCENTER depend on where the observer is (2 us): give site=",
            )
        elif place is None:
            offer(
                "TCG",
                "TCB",
                place,
                None,
                "TCB and TDB depend on where the event is: give site=, or write the place, as in TDB@GEOCENTER",
            )
        else:
            observer = _observer_at(place, supplies)
            offer("TCG", "TCB", place, partial(edges.tcg_tcb_step, place, observer, reference))
        if "BARYCENTER" in places and place not in (None, "SELENOCENTER"):
            found.append(_wavefront(place, supplies))
    return found


def _observer_at(place: str | None, supplies: Supplies) -> Observer | None:
    """Who is at a place; None at the geocentre."""
    return supplies.site if place == "TOPOCENTER" else _MOON if place == "SELENOCENTER" else None


def _node(scale: str, place: str | None) -> Node:
    return Node(Scale.parse(scale), place)


def _lunar(place: str | None, supplies: Supplies) -> list[_Edge]:
    """TCL, at the places where the events near the Moon and the Earth are."""
    start, end = _node("TCL", place), _node("TCB", place)
    if place is None:
        missing = "TCL depends on where the event is (128 us): give site=, or write the place, as in TCL@SELENOCENTER"
    elif place == "TOPOCENTER" and supplies.site is None:
        missing = "TCL at TOPOCENTER depends on where the observer is (128 us): give site="
    elif place in ("SELENOCENTER", "GEOCENTER", "TOPOCENTER"):
        return [_Edge(start, end, partial(edges.tcl_tcb_step, place, supplies.site, supplies.reference))]
    else:
        return []
    return [_Edge(start, end, None, missing)]


def _proper(place: str | None, clock: ProperClock, supplies: Supplies) -> _Edge:
    """The proper time of a free clock, at the clock."""
    start, end = _node(clock.scale, place), _node("TCG" if clock.dates_own_event else "TDB", place)
    if place != "TOPOCENTER":
        return _Edge(start, end, None, f"{clock.scale} dates events at the clock: write {clock.scale}@TOPOCENTER")
    if supplies.site != clock.observer:
        here = getattr(supplies.site, "name", "none")
        missing = (
            f"{clock.scale} is the time of a clock at {clock.observer.name}, and the chain is at {here}: give "
            "site= the clock's observer, or leave it out"
        )
        return _Edge(start, end, None, missing)
    return _Edge(start, end, partial(edges.proper_step, place, clock, supplies.reference))


def _unsupplied(first: Node, last: Node, place: str | None, supplies: Supplies) -> list[_Edge]:
    """Edges to named realisations for which no log or table was given."""
    have = {log.scale for log in supplies.clocks} | {table.scale for table in supplies.reference.tt_bipm}
    have |= {clock.scale for clock in supplies.free}
    # The reference of a log that was given is itself in need of a log, unless it is UTC.
    named = {first.scale.name, last.scale.name} | {log.reference for log in supplies.clocks}
    found = []
    for name in sorted(named - have):
        scale = Scale.parse(name)
        if scale.realisation is None:
            continue
        if scale.family == "PROPER":
            missing = (
                f"no clock for {name}: give one with clocks=[ProperClock({scale.realisation!r}, observer, coincidence)]"
            )
            found.append(_Edge(Node(scale, place), _node("TCG", place), None, missing))
            continue
        if scale.family == "TT":
            missing = f"no table for {name}: give it with ReferenceData.load(tt_bipm=path)"
        else:
            missing = f"no comparison log for {name}: give one with clocks=[ClockLog.load(path)]"
        target = "TAI" if scale.family == "TT" else "UTC"
        found.append(_Edge(Node(scale, place), _node(target, place), None, missing))
    return found


def _wavefront(place: str, supplies: Supplies) -> _Edge:
    start, end = _node("TDB", place), _node("TDB", "BARYCENTER")
    lacking = []
    if supplies.source is None:
        lacking.append(f"carrying a signal between {place} and BARYCENTER needs source=")
    if place == "TOPOCENTER" and supplies.site is None:
        lacking.append("a wavefront at TOPOCENTER needs site=")
    if lacking or supplies.source is None:
        return _Edge(start, end, None, "; ".join(lacking))
    observer = supplies.site if place == "TOPOCENTER" else None
    step = partial(edges.wavefront_step, place, observer, supplies.source, supplies.reference, supplies.second_order)
    return _Edge(start, end, step)


def _cheapest(first: Node, last: Node, found: Sequence[_Edge]) -> list[tuple[_Edge, bool]] | None:
    """The path with the fewest missing pieces, then the fewest steps (Dijkstra)."""
    around: dict[Node, list[tuple[Node, _Edge, bool]]] = {}
    for edge in found:
        around.setdefault(edge.start, []).append((edge.end, edge, True))
        around.setdefault(edge.end, []).append((edge.start, edge, False))
    best: dict[Node, int] = {first: 0}
    back: dict[Node, tuple[Node, _Edge, bool]] = {}
    queue: list[tuple[int, int, Node]] = [(0, 0, first)]
    pushed = 0
    while queue:
        cost, _, node = heapq.heappop(queue)
        if node == last:
            break
        if cost > best[node]:
            continue
        for neighbour, edge, onward in around.get(node, []):
            onward_cost = cost + (1000 if edge.missing else 1)
            if onward_cost < best.get(neighbour, 10**9):
                best[neighbour] = onward_cost
                back[neighbour] = (node, edge, onward)
                pushed += 1
                heapq.heappush(queue, (onward_cost, pushed, neighbour))
    if last not in best:
        return None
    path: list[tuple[_Edge, bool]] = []
    node = last
    while node != first:
        node, edge, onward = back[node]
        path.append((edge, onward))
    return path[::-1]


def _no_way(first: Node, last: Node) -> str:
    for node in (first, last):
        if node.place == "BARYCENTER" and node.scale.name not in ("TCB", "TDB"):
            return (
                f"{node} is not a node: an event at the barycentre is dated in TCB or TDB; write the place of the "
                f"other end, as in {node.scale}@TOPOCENTER, and give site= and source="
            )
    return f"nothing leads from {first} to {last}: no step of this package joins these scales at these places"
