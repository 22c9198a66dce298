"""ClockLog: comparisons of a clock with its reference, as a map between their readings that closes exactly."""

from __future__ import annotations

import hashlib
from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise
from pathlib import Path
from typing import Any

import numpy as np
import numpy.typing as npt

from .. import exact
from ..errors import InvalidInput, OutOfSpan
from ..exact import FloatArray, IntArray, Pair
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from .clock_curve import ClockCurve, Found
from .clock_files import parse_clock_file
from .clock_rows import ClockRows, Interpolation, check_forwards, checked_curve, clock_scale, reference_scale
from .common import FrozenArrays, as_pair, rows_hash, utc_text

__all__ = ["ClockLog"]


@dataclass(frozen=True, eq=False, repr=False)
class ClockLog(FrozenArrays):
    """Offsets of a clock from a reference scale, known at comparisons and interpolated between them.

    Make one with `load`, `from_rows` or `joined`. Both scales are labelled like UTC: UTC, UTC(laboratory), CLOCK(name).

    Attributes
    ----------
    scale : str
        The clock's scale: `CLOCK(maser)`, or `UTC(KST)` for the clock of a laboratory.
    reference : str
        The scale it was compared with.
    name : str
        Shown in messages and provenance.
    interpolation : {"linear", "step"}
        Linear: the offset runs straight from one comparison to the next. Step: it holds until the next, then jumps.
    sha256 : str
        Of the file's bytes, or of the rows.
    path : pathlib.Path or None
        The file.

    Notes
    -----
    Nothing is extrapolated, and nothing is interpolated across a gap: an empty offset in the file, or comparisons
    further apart than `max_gap_s`. The comparisons at either side of a gap can themselves be used.

    With steps a clock set forward skips readings, and one set back shows some twice. Neither kind belongs to one
    instant of the reference, so `to_reference` refuses both, with the mask.
    """

    scale: str
    reference: str
    name: str
    interpolation: Interpolation
    sha256: str
    path: Path | None
    _curve: ClockCurve

    @classmethod
    def load(
        cls,
        path: str | Path,
        *,
        name: str | None = None,
        interpolation: Interpolation = "linear",
        max_gap_s: float | None = None,
        leap_seconds: LeapSeconds | None = None,
    ) -> ClockLog:
        """Read a CSV file with columns `epoch`, `offset_s`, `uncertainty_s` and, if wanted, `reference` and `clock`.

        Parameters
        ----------
        path : str or Path
            The file; `clock_files` tells its layout.
        name : str, optional
            The clock, before any `clock` column: `maser`, `CLOCK(maser)` or `UTC(KST)`. Default: the file's name.
        interpolation : {"linear", "step"}
            See the class.
        max_gap_s : float, optional
            Comparisons further apart than this leave a gap.
        leap_seconds : LeapSeconds, optional
            For reading the epochs.

        Raises
        ------
        DataFileError
            With path and row: missing, empty or damaged file, missing columns, bad numbers or dates, rows out of order
            or doubled, references that differ, a clock that would run backwards.
        """
        path = Path(path)
        rows = parse_clock_file(path, name, leap_seconds)
        curve = checked_curve(rows, path.name, path, interpolation, max_gap_s)
        return cls(rows.scale, rows.reference, path.name, interpolation, rows.sha256, path, curve)

    @classmethod
    def from_rows(
        cls,
        clock: str,
        epoch: Instants,
        offset_s: npt.ArrayLike | Pair,
        uncertainty_s: npt.ArrayLike = 0.0,
        *,
        missing: npt.ArrayLike = False,
        interpolation: Interpolation = "linear",
        max_gap_s: float | None = None,
    ) -> ClockLog:
        """Make a log from comparisons at hand.

        Parameters
        ----------
        clock : str
            `maser`, `CLOCK(maser)` or `UTC(KST)`.
        epoch : Instants
            Comparisons, increasing; their scale is the reference.
        offset_s : float array or (int64, float64) pair
            Clock minus reference.
        uncertainty_s : float array
            Standard uncertainties.
        missing : bool array
            True where a comparison failed: a gap.
        """
        count = epoch.shape
        if len(count) != 1:
            raise InvalidInput(f"comparisons are a one-dimensional list of instants, got shape {count}")
        try:
            given: tuple[Any, ...] = (0, offset_s)
            if isinstance(offset_s, tuple) and len(offset_s) == 2 and np.asarray(offset_s[0]).dtype.kind in "iu":
                given = offset_s
            parts = [np.broadcast_to(np.asarray(part, dtype=np.float64), count) for part in (*given, uncertainty_s)]
            failed = np.array(np.broadcast_to(np.asarray(missing, dtype=np.bool_), count))
        except (TypeError, ValueError) as error:
            raise InvalidInput(
                f"offsets, uncertainties and gaps must be numbers, as many as epochs: {error}"
            ) from error
        bad = ~failed & (~np.isfinite(parts).all(axis=0) | (parts[2] < 0.0))
        if bad.any():
            raise InvalidInput(
                "offsets must be finite and uncertainties zero or more; flag failures with missing=", mask=bad
            )
        whole, fraction, sigma = (np.where(failed, 0.0, part) for part in parts)
        offset = exact.normalise(whole.astype(np.int64), fraction)
        sha256 = rows_hash(*epoch.pair, *offset, failed, sigma)
        scale, reference = clock_scale(clock).name, reference_scale(epoch.scale).name
        rows = ClockRows(scale, reference, epoch, offset, failed, sigma, [], sha256)
        curve = checked_curve(rows, scale, None, interpolation, max_gap_s)
        return cls(scale, reference, scale, interpolation, sha256, None, curve)

    @classmethod
    def joined(cls, logs: Sequence[ClockLog]) -> ClockLog:
        """Join logs of one clock against one reference; from the end of one to the start of the next is a gap.

        Raises
        ------
        InvalidInput
            For logs of different clocks, references or interpolations, or that overlap.
        """
        if not logs:
            raise InvalidInput("nothing to join: give at least one ClockLog")
        first = logs[0]
        for log in logs[1:]:
            for part in ("scale", "reference", "interpolation"):
                if getattr(log, part) != getattr(first, part):
                    raise InvalidInput(
                        f"cannot join {first.name!r} and {log.name!r}: {part} is {getattr(first, part)!r} and "
                        f"{getattr(log, part)!r}; logs that are joined have the same"
                    )
        ordered = sorted(logs, key=lambda log: (log.span.whole[0], log.span.fraction[0]))
        for before, after in pairwise(ordered):
            if not before.span[1] < after.span[0]:
                raise InvalidInput(
                    f"{before.name!r} (to {before._ends()[1]}) and {after.name!r} (from {after._ends()[0]}) overlap; "
                    f"cut one, so that each comparison of {first.scale} is in one log"
                )
        curves = [log._curve for log in ordered]
        reference, offset = (
            _joined_pairs([getattr(curve, part) for curve in curves]) for part in ("reference", "offset")
        )
        sigma, gap = (np.concatenate([getattr(curve, part) for curve in curves]) for part in ("sigma_s", "gap"))
        curve = ClockCurve.of(reference, offset, sigma, gap, first.interpolation == "step")
        check_forwards(curve, first.scale, [], None)
        sha256 = hashlib.sha256(" ".join(log.sha256 for log in ordered).encode()).hexdigest()
        name = " + ".join(log.name for log in ordered)
        return cls(first.scale, first.reference, name, first.interpolation, sha256, None, curve)

    # ---- facts -----------------------------------------------------------------------------------

    @property
    def span(self) -> Instants:
        """First and last comparison, on the reference scale."""
        whole, fraction = self._curve.reference
        return Instants._of((whole[[0, -1]], fraction[[0, -1]]), self.reference)

    @property
    def issued(self) -> str:
        """Date of the last comparison."""
        return self._ends()[1][:10]

    def __len__(self) -> int:
        return len(self._curve.gap)

    def __repr__(self) -> str:
        start, end = self._ends()
        return f"<ClockLog {self.name!r} {self.scale} by {self.reference}, {len(self)} comparisons, {start} to {end}>"

    # ---- the map ---------------------------------------------------------------------------------

    def to_clock(self, reference: Pair) -> Pair:
        """What the clock reads at counts of the reference scale.

        Raises
        ------
        OutOfSpan
            Outside the comparisons or in a gap, with the mask.
        """
        at, index = self._at_reference(reference)
        return self._curve.to_clock(at, index)

    def to_reference(self, reading: Pair) -> Pair:
        """Counts of the reference scale at readings of the clock: inverse of `to_clock` within 0.2 fs.

        Raises
        ------
        OutOfSpan
            Outside the comparisons, in a gap, or for a reading that a step skipped or showed twice; with the mask.
        """
        at = as_pair(reading)
        found = self._curve.find_clock(at)
        self._check(found, "readings")
        return self._curve.to_reference(at, found.interval)

    def offset(self, reference: Pair) -> Pair:
        """Clock minus reference at counts of the reference scale, as (whole s, fraction); errors as `to_clock`."""
        return self._curve.offset_at(*self._at_reference(reference))

    def uncertainty_s(self, reference: Pair) -> FloatArray:
        """Give the standard uncertainty of the offset at counts of the reference scale, s; errors as `to_clock`.

        Linear logs: straight between those of the two comparisons, taking their errors to go together. Step logs: that
        of the last comparison. What the clock itself wanders between comparisons is not in it.
        """
        return self._curve.sigma_at(*self._at_reference(reference))

    def rate(self, reference: Pair) -> FloatArray:
        """d(reference)/d(clock) - 1 at counts of the reference scale: zero in a step log; errors as `to_clock`."""
        slope = self._curve.slope(self._at_reference(reference)[1])
        return np.asarray(-slope / (1.0 + slope))

    # ---- inside ----------------------------------------------------------------------------------

    def _at_reference(self, reference: Pair) -> tuple[Pair, IntArray]:
        at = as_pair(reference)
        found = self._curve.find_reference(at)
        self._check(found, "instants")
        return at, found.interval

    def _ends(self) -> tuple[str, str]:
        whole, fraction = self.span.pair
        return utc_text((whole[0], fraction[0])), utc_text((whole[1], fraction[1]))

    def _check(self, found: Found, what: str) -> None:
        bad = found.bad
        if not bad.any():
            return
        start, end = self._ends()
        reasons = {
            f"outside the comparisons ({start} to {end} {self.reference})": found.outside,
            "in a gap between comparisons": found.gap,
            "skipped or shown twice where the clock was stepped": found.jump,
        }
        listed = ", ".join(f"{np.count_nonzero(mask)} {reason}" for reason, mask in reasons.items() if mask.any())
        raise OutOfSpan(
            f"{np.count_nonzero(bad)} of {bad.size} {what} cannot be dated with the log {self.name!r} of "
            f"{self.scale}: {listed}; add comparisons, or leave them out (see .mask)",
            mask=bad,
        )


def _joined_pairs(pairs: Sequence[Pair]) -> Pair:
    return np.concatenate([pair[0] for pair in pairs]), np.concatenate([pair[1] for pair in pairs])
