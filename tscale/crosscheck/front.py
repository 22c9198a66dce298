"""A wavefront as the signatures see it: what it is made of, and its terms at some instants, each worked out once."""

from __future__ import annotations

import math
from collections.abc import Callable, Sequence
from dataclasses import replace
from typing import Any, NamedTuple

import numpy as np

from .. import exact
from ..constants import JULIAN_YEAR_S
from ..exact import FloatArray
from ..instants import Instants
from ..source import Source
from ..transforms.barycentric import topocentric_terms
from ..transforms.wavefront import WavefrontTerms, observer_state, wavefront_terms
from .path import Path

__all__ = ["Front", "Pieces", "total_of", "wavefront_step_number"]


def wavefront_step_number(path: Path) -> int | None:
    """Number of the first step that carries the signal to or from the barycentre."""
    for number, step in enumerate(path.steps, start=1):
        if step.start.place != step.end.place:
            return number
    return None


class Pieces(NamedTuple):
    """What a wavefront is made of."""

    source: Source
    site: Any
    """None: the geocentre."""

    def with_source(self, **fields: Any) -> Pieces:
        """The same with another source."""
        return self._replace(source=replace(self.source, **fields))

    def turned(self, mas: float, *, north: bool) -> Pieces:
        """The source so much further in declination, or in right ascension (along the sky)."""
        source, step = self.source, mas / 3.6e6
        if north:
            return self.with_source(dec_deg=min(max(source.dec_deg + step, -90.0), 90.0))
        return self.with_source(ra_deg=source.ra_deg + step / max(math.cos(math.radians(source.dec_deg)), 1e-9))

    def later(self, years: float) -> Pieces:
        """The source where its direction holds so many years later."""
        return self.with_source(epoch=str(self.source._epoch.shifted(years * JULIAN_YEAR_S).to_iso(9)))


class Front:
    """A wavefront at some instants, evaluated once for all the signatures that look at it."""

    def __init__(self, path: Path, number: int) -> None:
        step = path.steps[number - 1]
        supplies = path.chain._supplies
        near = step.start.place if step.end.place == "BARYCENTER" else step.end.place
        self.reference = path.chain.reference
        source = supplies.source
        assert source is not None, "a wavefront step is made of a source"
        self.source: Source = source
        self.site: Any = supplies.site if near == "TOPOCENTER" else None
        self.second_order: bool = supplies.second_order
        self._held: dict[str, tuple[Instants, Any]] = {}

    def _once(self, name: str, t: Instants, make: Any) -> Any:
        held = self._held.get(name)
        if held is None or held[0] is not t:
            held = self._held[name] = (t, make())
        return held[1]

    def terms(self, t: Instants) -> WavefrontTerms:
        """Every term, with the second order where the chain has it."""
        found: WavefrontTerms = self._once("terms", t, lambda: self.other(t))
        return found

    def other(self, t: Instants, source: Source | None = None, site: Any = True, second: bool | None = None) -> Any:
        """Terms for another source or observer (None: the geocentre)."""
        return wavefront_terms(
            t.pair,
            self.reference,
            self.source if source is None else source,
            self.site if site is True else site,
            second_order=self.second_order if second is None else second,
            with_rate=False,
        )

    def joined_s(self, t: Instants, changes: Sequence[tuple[Callable[[Any, float], Any], float]]) -> FloatArray:
        """What several changes of source and site add together, s."""
        pieces = Pieces(self.source, self.site)
        for change, amplitude in changes:
            pieces = change(pieces, amplitude)
        late = np.zeros(t.shape)
        if pieces.site is not None and pieces.site is not self.site:
            tt = exact.add_seconds(t.pair, self.reference.time_ephemeris.tt_minus_tdb_s(t.pair))
            moved = pieces.site.gcrs(tt, self.reference)[0] - self.site.gcrs(tt, self.reference)[0]
            late = topocentric_terms(self.reference.ephemeris, t.pair, moved).total_s
        shifted = Instants._of(exact.add_seconds(t.pair, late), t.scale, t.place)
        return np.asarray(late + total_of(self.other(shifted, pieces.source, pieces.site)) - self.total_s(t))

    def total_s(self, t: Instants) -> FloatArray:
        """All terms together, s."""
        return total_of(self.terms(t))

    def state(self, t: Instants) -> tuple[FloatArray, ...]:
        """Place and velocity of the observer, and the Sun's."""
        found: tuple[FloatArray, ...] = self._once(
            "state", t, lambda: observer_state(t.pair, self.reference, self.site, with_velocity=False)
        )
        return found

    def toward(self, t: Instants) -> FloatArray:
        """Direction of the source."""
        return self.source.direction(t.pair)

    def shapiro_s(self, t: Instants, *, sun: bool) -> FloatArray:
        """Sum of the gravitational delays, of the Sun or of all others, to first order."""
        total = np.zeros(t.shape)
        for name, value in self.terms(t).terms_s.items():
            if "Shapiro" in name and "order" not in name and name.endswith(", sun") is sun:
                total = total + value
        return total


def total_of(terms: WavefrontTerms) -> FloatArray:
    """All terms of a wavefront together, s."""
    total = np.asarray(terms.beyond_s, dtype=np.float64)
    for value in terms.terms_s.values():
        total = total + value
    return total
