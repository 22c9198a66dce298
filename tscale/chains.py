"""Chain: a path of steps from one node to another, and what can be asked of it."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING, Any, Final

import numpy as np

from .budget.assumptions import DEFAULT, Assumptions
from .budget.contribution import Contribution, Omission, by_source, gathered
from .earth.observer import Observer
from .errors import InvalidInput, ScaleMismatch, TscaleError, gathered_extrapolations
from .exact import FloatArray
from .instants import Instants
from .ledger import Ledger, LedgerLine
from .routes import Supplies, route, shortened
from .scales import Node
from .source import Source
from .step import Step
from .tables.clock_arguments import FreeClock, checked_clocks, kind_words
from .tables.clock_log import ClockLog
from .tables.reference import ReferenceData

if TYPE_CHECKING:
    from .budget import Budget
    from .compiled import CompiledChain
    from .provenance import Provenance

__all__ = ["Chain", "chain"]

_BLOCK: Final = 16384


class Chain:
    """A path of steps; call it to map instants, `inverse` to map them back.

    Made by `tscale.chain`. `str(chain)` prints the path.

    Attributes
    ----------
    start, end : Node
        Scale and place at both ends.
    steps : tuple of Step
    reference : ReferenceData
        The tables in use.
    """

    def __init__(self, start: Node, end: Node, supplies: Supplies) -> None:
        self.start = start
        self.end = end
        self.steps = tuple(route(start, end, supplies))
        self.reference = supplies.reference
        self._supplies = supplies
        self._quick = tuple(shortened(self.steps, supplies))

    def __call__(self, t: Instants) -> Instants:
        """Map instants of the start node to the end node; shape is kept, the place is stamped."""
        return _in_blocks(lambda part: self._walk(part, self._quick)[-1], t)

    def inverse(self, t: Instants) -> Instants:
        """Map instants of the end node back to the start node."""

        def back(part: Instants) -> Instants:
            part = _accept(part, self.end, "inverse of this chain")
            for step in reversed(self._quick):
                part = step.backward(part)
            return part.at(self.start.place or part.place)

        return _in_blocks(back, t)

    def ledger(self, t: Instants) -> Ledger:
        """Every term of every step for every instant; they add up to the difference of the labels."""
        stations = self._walk(t, self.steps)
        lines: list[LedgerLine] = []
        notes: list[str] = []
        for step, before, after in zip(self.steps, stations, stations[1:], strict=False):
            name = f"{step.start} -> {step.end}"
            lines.extend(LedgerLine(name, term, value) for term, value in step.terms(before, after).items())
            notes.extend(step.notes(before))
        return Ledger(lines, t.shape, notes)

    def rate(self, t: Instants) -> FloatArray:
        """d(out)/d(in) - 1 of the counts at instants of the start node, by the derivative of every step.

        For a wavefront this is the Doppler factor less one: a frequency f at the start is f / (1 + rate)
        at the end. Good to about 1e-17 for scales at one place, 1e-15 with a wavefront.
        """
        stations = self._walk(t, self._quick)
        total = np.zeros(t.shape)
        for step, before, after in zip(self._quick, stations, stations[1:], strict=False):
            # (1 + a)(1 + b) - 1 without forming 1 + a.
            rate = step.rate(before, after)
            total = total + rate + total * rate
        return np.asarray(total)

    def replaced(self, **pieces: Any) -> Chain:
        """The same ends, joined with other pieces: `reference`, `site`, `clocks`, `source`, `second_order`."""
        if "clocks" in pieces:
            pieces = {**pieces, "clocks": checked_clocks(pieces["clocks"]), "free": ()}
        return Chain(self.start, self.end, replace(self._supplies, **pieces))

    def contributions(self, t: Instants, assumptions: Assumptions = DEFAULT) -> list[Contribution]:
        """Every input quantity of every step with its uncertainty and its sensitivity; see `tscale.budget`.

        A quantity that two steps share stands once: its sensitivities add with their signs. The rates of the steps that
        follow, 1e-4 at most in a wavefront, are left out of the sensitivities.
        """
        with gathered_extrapolations(repeats=True):
            stations = self._walk(t, self.steps)
            found = [step.contributed(at, assumptions) for step, at in zip(self.steps, stations, strict=False)]
        return gathered(part for parts in found for part in parts)

    def omissions(self, assumptions: Assumptions = DEFAULT) -> tuple[Omission, ...]:
        """What the contributions leave out, and why."""
        return tuple(dict.fromkeys(item for step in self.steps for item in step.omissions(assumptions)))

    def uncertainty_s(self, t: Instants) -> dict[str, FloatArray]:
        """Standard uncertainties by source, seconds, in the order of the chain: those of `budget` by default.

        Sources: the comparison logs, UT1 and pole of the Earth orientation, TT(BIPM), the time ephemeris, and the
        effects that the models leave out. What the caller alone can state - the place, the source's direction, the
        ephemeris - is not in it; give it to `budget`, which lists what is not included.
        """
        return dict(by_source(self.contributions(t)))

    def sigma_s(self, t: Instants) -> FloatArray:
        """Combined standard uncertainty, seconds: the root of the summed squares of `uncertainty_s`."""
        squares = np.zeros(t.shape)
        for value in self.uncertainty_s(t).values():
            squares = squares + value**2
        return np.asarray(np.sqrt(squares))

    def notes(self, t: Instants) -> tuple[str, ...]:
        """What a reader should know of the result: values predicted, held, or past a table's expiry."""
        found: list[str] = []
        for step, before in zip(self.steps, self._walk(t, self.steps), strict=False):
            found.extend(step.notes(before))
        return tuple(dict.fromkeys(found))

    def budget(self, t: Instants, **options: Any) -> Budget:
        """The uncertainty budget (GUM) of the result at instants of the start node; see `tscale.budget.budget_of`."""
        from .budget import budget_of

        return budget_of(self, t, **options)

    def provenance(self, t: Instants | None = None) -> Provenance:
        """Which tables, logs, models and versions the results are made of; see `tscale.provenance.provenance_of`."""
        from .provenance import provenance_of

        return provenance_of(self, t)

    def compile(self, start: str | Instants, stop: str | Instants, *, tolerance_s: float = 1e-13) -> CompiledChain:
        """The whole chain as certified polynomials between two dates; see `tscale.compiled.compile_chain`."""
        from .compiled import compile_chain

        return compile_chain(self, start, stop, tolerance_s=tolerance_s)

    def _walk(self, t: Instants, steps: Sequence[Step]) -> list[Instants]:
        """The instants at every node of the path."""
        stations = [_accept(t, self.start, "this chain")]
        for step in steps:
            stations.append(step.forward(stations[-1]))
        stations[-1] = stations[-1].at(self.end.place or stations[-1].place)
        return stations

    def __reduce__(self) -> tuple[Any, ...]:
        # Steps are closures; what they were made of travels, and they are made again.
        return (Chain, (self.start, self.end, self._supplies))

    def __str__(self) -> str:
        return " -> ".join(str(node) for node in (self.start, *(step.end for step in self.steps)))

    def __repr__(self) -> str:
        return f"<Chain {self}>"


def _in_blocks(work: Callable[[Instants], Instants], t: Instants) -> Instants:
    """Map long arrays part by part, so that memory stays bounded and the parts stay in the processor's cache."""
    if not isinstance(t, Instants) or t.size <= 2 * _BLOCK:
        with gathered_extrapolations(repeats=True):
            return work(t)
    flat = t.ravel()
    try:
        with gathered_extrapolations(size=t.size):
            parts = [_in_blocks(work, flat[i : i + _BLOCK]) for i in range(0, flat.size, _BLOCK)]
    except TscaleError:
        return work(t)  # which raises it again, with the mask of all
    return Instants.concatenate(parts).reshape(*t.shape)


def _accept(t: Instants, node: Node, what: str) -> Instants:
    if not isinstance(t, Instants):
        raise InvalidInput(
            f"a chain maps Instants, got {type(t).__name__}; "
            + _remedy(t, "t", "make them with Instants.from_iso or another from_...")
        )
    if t.scale != node.scale.name:
        raise ScaleMismatch(f"{what} takes {node}, got instants of scale {t.scale}")
    if node.place is not None and t.place not in (None, node.place):
        raise ScaleMismatch(f"{what} takes {node}, got instants at {t.place}; a signal moves only with a source")
    return t.at(node.place) if node.place is not None else t


def chain(
    start: str,
    end: str,
    *,
    site: Observer | None = None,
    clocks: Sequence[ClockLog | FreeClock] = (),
    source: Source | None = None,
    reference: ReferenceData | None = None,
    second_order: bool = False,
) -> Chain:
    """Find the chain of steps from one node to another.

    Parameters
    ----------
    start, end : str
        Nodes `SCALE` or `SCALE@PLACE`. A start without place is at TOPOCENTER if a site is given, else at
        the end's place; an end without place is where the start is.
    site : Site, SurfaceSite or Trajectory, optional
        The observer; needed for steps that depend on where the event is. Without it a PROPER(name) at either end
        brings that of its clock.
    clocks : sequence of ClockLog and ProperClock
        Comparison logs that tie CLOCK(...) and UTC(...) scales together, and clocks that keep PROPER(name).
    source : Source, optional
        Needed to carry a wavefront to another place.
    reference : ReferenceData, optional
        The tables; `ReferenceData.default()` if not given.
    second_order : bool
        Add the Sun's second-order gravitational delay to wavefronts.

    Raises
    ------
    MissingPiece
        When no path exists; names what is missing.
    InvalidInput
        Unknown scales or places.
    """
    logs = checked_clocks(clocks)
    _check_pieces(site, source, reference)
    first, last = Node.parse(start), Node.parse(end)
    if site is None:  # a clock that keeps its own proper time says where it is
        ends = (first.scale.name, last.scale.name)
        site = next((clock.observer for clock in logs if isinstance(clock, FreeClock) and clock.scale in ends), None)
    if first.place is None:
        first = Node(first.scale, "TOPOCENTER" if site is not None else last.place)
    if last.place is None:
        last = Node(last.scale, first.place)
    tables = ReferenceData.default() if reference is None else reference
    return Chain(first, last, Supplies(tables, site, logs, source, second_order))


def _check_pieces(site: Any, source: Any, reference: Any) -> None:
    if site is not None and not isinstance(site, Observer):
        raise InvalidInput(
            f"site= takes a Site, a SurfaceSite or a Trajectory, got {kind_words(site)}; "
            + _remedy(site, "site", "read a file with Site.load(path)")
        )
    if source is not None and not isinstance(source, Source):
        remedy = _remedy(source, "source", "make one with Source(ra_deg, dec_deg)")
        raise InvalidInput(f"source= takes a Source, got {kind_words(source)}; {remedy}")
    if reference is not None and not isinstance(reference, ReferenceData):
        raise InvalidInput(
            f"reference= takes a ReferenceData, got {kind_words(reference)}; make one with ReferenceData.load()"
        )


def _remedy(value: Any, name: str, ours: str) -> str:
    """What to do about a wrong object: those of a library that is read elsewhere, by its own reader."""
    package = type(value).__module__.partition(".")[0]
    theirs = package == "astropy" and type(value).__name__ in ("Time", "EarthLocation", "SkyCoord")
    return f"read it with tscale.interop.from_astropy({name})" if theirs else ours
