"""The map between a clock and its reference that a log of comparisons makes, and the facts of the log."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import NamedTuple

import numpy as np

from .. import exact
from ..errors import OutOfSpan
from ..exact import BoolArray, FloatArray, IntArray, Pair
from ..instants import Instants
from .clock_curve import ClockCurve, Found
from .clock_errors import offset_sigma
from .clock_noise import ClockNoise
from .clock_nominal import count_text, nominal_count
from .clock_prediction import Forecast, Prediction, predicted_by, warn_predicted
from .clock_rows import Interpolation, LogMark, LogRemark
from .common import FrozenArrays, as_pair
from .notes import worded

__all__ = ["ClockMap", "Comparisons"]


class Comparisons(NamedTuple):
    """The comparisons of a log that are used."""

    epoch: Instants
    """On the reference scale."""
    offset: Pair
    """Clock minus reference, (whole s, fraction)."""
    uncertainty_s: FloatArray
    """Standard uncertainty in all."""
    common_s: FloatArray
    """The part of it that all comparisons share."""
    gap: BoolArray
    """True where no interpolation leads on to the next comparison."""
    reset_s: FloatArray
    """By how much the clock was set forward at the epoch."""
    rate_step: BoolArray
    """Where its rate was changed."""


@dataclass(frozen=True, eq=False, repr=False)
class ClockMap(FrozenArrays):
    """What a `ClockLog` can do, however it was made; its attributes are told there."""

    scale: str
    reference: str
    name: str
    interpolation: Interpolation
    sha256: str
    path: Path | None
    _curve: ClockCurve
    marks: tuple[LogMark, ...] = ()
    noise: ClockNoise | None = None
    _forecasts: tuple[Forecast, ...] = ()
    prediction: Prediction | None = None
    remarks: tuple[LogRemark, ...] = ()
    files: tuple[tuple[str, str], ...] = ()

    # ---- facts -----------------------------------------------------------------------------------

    @property
    def span(self) -> Instants:
        """First and last instant that can be dated, on the reference scale: comparisons, or ends of a prediction."""
        whole, fraction = self._curve.reference
        return Instants._of((whole[[0, -1]], fraction[[0, -1]]), self.reference)

    @property
    def is_predicted(self) -> bool:
        """Whether the log goes on past its comparisons."""
        return bool(self._forecasts)

    @property
    def issued(self) -> str:
        """Date of the last comparison."""
        curve, last = self._curve, self._measured.stop - 1
        return count_text((curve.reference[0][last], curve.reference[1][last]), self.reference)[:10]

    @property
    def comparisons(self) -> Comparisons:
        """The comparisons that are used."""
        curve, own = self._curve, self._measured
        offset = exact.subtract((curve.offset[0][own], curve.offset[1][own]), nominal_count(self.reference))
        gap = curve.gap[own].copy()
        gap[-1] = True
        return Comparisons(
            Instants._of((curve.reference[0][own], curve.reference[1][own]), self.reference),
            offset,
            np.hypot(curve.sigma_s, curve.common_s)[own],
            curve.common_s[own],
            gap,
            exact.seconds((curve.reset[0][own], curve.reset[1][own])),
            curve.corner[own],
        )

    def longest_run(self) -> tuple[float, FloatArray]:
        """Spacing, s, and offsets, s from the first, of the longest evenly spaced run without gap or rate step."""
        curve, own = self._curve, self._measured
        length, change = curve.length[0][own], curve.change_s[own]
        joined = ~self.comparisons.gap
        best, start = (0, 0), 0
        for place in range(len(length)):
            if not joined[place]:
                start = place + 1
                continue
            if place > start and (curve.corner[own][place] or abs(length[place] / length[start] - 1.0) > 1e-6):
                start = place
            if place + 1 - start > best[1] - best[0]:
                best = (start, place + 1)
        run = slice(*best)
        return float(length[best[0]]), np.append(0.0, np.cumsum(change[run])) if best[1] else np.zeros(1)

    def __len__(self) -> int:
        return len(range(*self._measured.indices(len(self._curve.gap))))

    def __repr__(self) -> str:
        start, end = self._ends()
        more = ", predicted at the ends" if self.is_predicted else ""
        what = f"{self.scale} by {self.reference}, {len(self)} comparisons"
        return f"<ClockLog {self.name!r} {what}, {start} to {end}{more}>"

    # ---- the map ---------------------------------------------------------------------------------

    def to_clock(self, reference: Pair) -> Pair:
        """What the clock reads at counts of the reference scale.

        Raises
        ------
        OutOfSpan
            Outside the comparisons or in a gap, with the mask.
        """
        at, index = self._at_reference(reference)
        self._warn(at, index)
        return self._curve.to_clock(at, index)

    def to_reference(self, reading: Pair) -> Pair:
        """Counts of the reference scale at readings of the clock: inverse of `to_clock` within 0.2 fs (cubic: 0.4 fs).

        Raises
        ------
        OutOfSpan
            Outside the comparisons, in a gap, or for a reading that a step or a reset skipped or showed twice; with
            the mask.
        """
        at = as_pair(reading)
        found = self._curve.find_clock(at)
        self._check(found, "readings")
        index = self._own(found.interval)
        reference = self._curve.to_reference(at, index)
        self._warn(reference, index)
        return reference

    def offset(self, reference: Pair) -> Pair:
        """Clock minus reference, without nominal differences, at counts of the reference scale, as (whole s, fraction);
        errors as `to_clock`.
        """
        return exact.subtract(self._curve.offset_at(*self._at_reference(reference)), nominal_count(self.reference))

    def uncertainty_s(self, reference: Pair) -> FloatArray:
        """Give the standard uncertainty of the offset at counts of the reference scale, s; errors as `to_clock`.

        That of the comparisons, carried by the weights of the interpolation: what they share goes straight from one to
        the next, and what is own to each adds in quadrature, so that halfway between two comparisons of 1 ns it is
        0.7 ns. Step logs: that of the last comparison. What the clock itself wanders between comparisons is in it if
        its noise is known (`with_noise`), and so is what it may have wandered past them (`predicted`). The same law as
        in budgets.
        """
        at, index = self._at_reference(reference)
        return offset_sigma(self._curve, self.noise, self._forecasts, at, index)

    def rate(self, reference: Pair) -> FloatArray:
        """d(reference)/d(clock) - 1 at counts of the reference scale: zero in a step log; errors as `to_clock`."""
        slope = self._curve.slope(*self._at_reference(reference))
        return np.asarray(-slope / (1.0 + slope))

    def flags(self, reference: Pair) -> dict[str, BoolArray]:
        """Which counts of the reference scale are predicted, past the last comparison or before the first; in words."""
        at, index = self._at_reference(reference)
        predicted = predicted_by(self._curve, self._forecasts, at, index)
        return {f"are predicted past the comparisons of {self.name}, by its rate and noise model": predicted}

    def notes(self, reference: Pair) -> tuple[str, ...]:
        """What a reader should know of values at counts of the reference scale; errors as `to_clock`.

        How many are predicted, and what the source of the log remarks on the time around them.
        """
        at = as_pair(reference)
        said = [remark.text for remark in self.remarks if remark.holds(at).any()]
        return (*worded(self.flags(reference)), *said)

    # ---- inside ----------------------------------------------------------------------------------

    def _at_reference(self, reference: Pair) -> tuple[Pair, IntArray]:
        at = as_pair(reference)
        found = self._curve.find_reference(at)
        self._check(found, "instants")
        return at, self._own(found.interval)

    def _own(self, index: IntArray) -> IntArray:
        """The end of a prediction belongs to it, and is no comparison of its own."""
        last = max((found.interval for found in self._forecasts), default=-1)
        return np.where(index == last + 1, last, index) if last >= 1 else index

    @property
    def _measured(self) -> slice:
        """The comparisons among the points of the curve: all but the ends of predictions."""
        first = [found.interval == 0 and found.nodes[0] == 1 for found in self._forecasts]
        before = int(any(first))
        return slice(before, len(self._curve.gap) - (len(first) - before))

    def _measured_curve(self) -> ClockCurve:
        """The curve of the comparisons alone, as it was before it was predicted."""
        if not self._forecasts:
            return self._curve
        curve, own = self._curve, self._measured

        def pair(both: Pair) -> Pair:
            return both[0][own], both[1][own]

        gap, broken = curve.gap[own].copy(), curve.broken[own].copy()
        gap[-1] = broken[-1] = True
        return ClockCurve.of(
            pair(curve.reference),
            pair(curve.offset),
            curve.sigma_s[own],
            gap,
            self.interpolation,
            common_s=curve.common_s[own],
            reset=pair(curve.reset),
            broken=broken,
            corner=curve.corner[own],
        )

    def _warn(self, at: Pair, index: IntArray) -> None:
        if not self._forecasts or self.noise is None:
            return
        mask = predicted_by(self._curve, self._forecasts, at, index)
        if mask.any():
            own = (at[0][mask], at[1][mask])
            worst = offset_sigma(self._curve, self.noise, self._forecasts, own, index[mask]).max()
            warn_predicted(mask, self.name, float(worst))

    def _ends(self) -> tuple[str, str]:
        whole, fraction = self._curve.reference
        first, last = (count_text((whole[place], fraction[place]), self.reference) for place in (0, -1))
        return first, last

    def _check(self, found: Found, what: str) -> None:
        bad = found.bad
        if not bad.any():
            return
        start, end = self._ends()
        reasons = {
            f"outside the comparisons ({start} to {end} {self.reference})": found.outside,
            "in a gap between comparisons": found.gap,
            "skipped or shown twice where the clock was stepped or reset": found.jump,
        }
        listed = ", ".join(f"{np.count_nonzero(mask)} {reason}" for reason, mask in reasons.items() if mask.any())
        raise OutOfSpan(
            f"{np.count_nonzero(bad)} of {bad.size} {what} cannot be dated with the log {self.name!r} of "
            f"{self.scale}: {listed}; add comparisons, leave them out (see .mask), or go on past the last comparison "
            "with ClockLog.predicted",
            mask=bad,
        )
