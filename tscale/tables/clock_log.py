"""ClockLog: comparisons of a clock with its reference, as a map between their readings that closes exactly."""

from __future__ import annotations

import hashlib
from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from pathlib import Path
from typing import TYPE_CHECKING, Literal

import numpy.typing as npt

from ..errors import InvalidInput
from ..exact import Pair
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from .clock_files import parse_clock_file
from .clock_joining import joinable, joined_curve
from .clock_map import ClockMap
from .clock_noise import ClockNoise
from .clock_nominal import Nominal
from .clock_prediction import Prediction
from .clock_rows import Interpolation, checked_curve, given_rows

if TYPE_CHECKING:
    from .clock_report import ClockReport

__all__ = ["ClockLog"]


@dataclass(frozen=True, eq=False, repr=False)
class ClockLog(ClockMap):
    """Offsets of a clock from a reference scale, known at comparisons and interpolated between them.

    Make one with `load`, `from_rows` or `joined`. The clock is labelled like UTC; the reference is UTC,
    UTC(laboratory), CLOCK(name), or TAI, TT, TT(realisation) or a satellite-navigation time, with the nominal
    difference of the labels taken out (see `clock_nominal`).

    Attributes
    ----------
    scale : str
        The clock's scale: `CLOCK(maser)`, or `UTC(KST)` for the clock of a laboratory.
    reference : str
        The scale it was compared with.
    name : str
        Shown in messages and provenance.
    interpolation : {"linear", "step", "cubic"}
        Linear: the offset runs straight from one comparison to the next. Step: it holds until the next, then jumps.
        Cubic: it runs with a continuous rate, by piecewise cubic Bessel interpolation (see `clock_bends`).
    sha256 : str
        Of the file's bytes, or of the rows.
    path : pathlib.Path or None
        The CSV file, which `inspect` reads; None for a log that was made of anything else.
    marks : tuple of LogMark
        Rows that are not used, resets and rate steps, as the rows say.
    noise : ClockNoise or None
        What the clock wanders between comparisons, if it is known.
    prediction : Prediction or None
        How it goes on past its comparisons, if it does.
    remarks : tuple of LogRemark
        What its source says of times in it, such as the notes of a circular; `notes` tells them.
    files : tuple of (name, SHA-256)
        The files it was read from.

    Notes
    -----
    Nothing is extrapolated (but see `predicted`), and nothing is interpolated across a gap: an empty offset in the
    file, comparisons further apart than `max_gap_s`, or a reset of unknown size. The comparisons at either side of a
    gap can themselves be used.

    With steps, and at resets, a clock set forward skips readings, and one set back shows some twice. Neither kind
    belongs to one instant of the reference, so `to_reference` refuses both, with the mask. A reset leaves the rate
    alone: cubics run on through it. They turn a corner at a rate step.
    """

    @classmethod
    def load(
        cls,
        path: str | Path,
        *,
        name: str | None = None,
        interpolation: Interpolation | None = None,
        max_gap_s: float | None = None,
        nominal: Nominal | None = None,
        leap_seconds: LeapSeconds | None = None,
    ) -> ClockLog:
        """Read a CSV file with columns `epoch`, `offset_s`, `uncertainty_s` and, if wanted, `reference`, `clock`,
        `nominal`, `interpolation`, `max_gap_s`, `use`, `reset_s`, `rate_step` and `common_s`.

        Parameters
        ----------
        path : str or Path
            The file; `clock_files` tells its layout.
        name : str, optional
            The clock, before any `clock` column: `maser`, `CLOCK(maser)` or `UTC(KST)`. Default: the file's name.
        interpolation : {"linear", "step", "cubic"}
            See the class. Default: what the file says, else linear.
        max_gap_s : float, optional
            Comparisons further apart than this leave a gap. Default: what the file says, else any.
        nominal : {"removed", "included"}, optional
            Where the reference is not labelled like UTC and the file has no such column: see `clock_nominal`.
        leap_seconds : LeapSeconds, optional
            For reading the epochs.

        Raises
        ------
        DataFileError
            With path and row: missing, empty or damaged file, missing columns, bad numbers or dates, rows out of order
            or doubled, references that differ, a clock that would run backwards.
        """
        path = Path(path)
        rows = parse_clock_file(path, name, leap_seconds, nominal)
        curve = checked_curve(rows, path.name, path, interpolation, max_gap_s)
        kind = interpolation or rows.interpolation or "linear"
        files = ((path.name, rows.sha256),)
        return cls(rows.scale, rows.reference, path.name, kind, rows.sha256, path, curve, rows.marks, files=files)

    @classmethod
    def from_rows(
        cls,
        clock: str,
        epoch: Instants,
        offset_s: npt.ArrayLike | Pair,
        uncertainty_s: npt.ArrayLike = 0.0,
        *,
        missing: npt.ArrayLike = False,
        use: npt.ArrayLike = True,
        reset_s: npt.ArrayLike = 0.0,
        rate_step: npt.ArrayLike = False,
        common_s: npt.ArrayLike = 0.0,
        nominal: Nominal | None = None,
        interpolation: Interpolation = "linear",
        max_gap_s: float | None = None,
        leap_seconds: LeapSeconds | None = None,
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
        use : bool array
            False for a comparison that is to be left out, an outlier: no gap.
        reset_s : float array
            By how much the clock was set forward at the epoch, where the offset is that after; NaN for a reset of
            unknown size, zero for none.
        rate_step : bool array
            True where the clock's rate was changed at the epoch.
        common_s : float array
            The part of each uncertainty that all comparisons share, such as that of the calibration of the link: the
            same error each time, of this size, is not averaged away. The rest is own to each comparison.
        nominal : {"removed", "included"}, optional
            Needed where the reference is not labelled like UTC: see `clock_nominal`.
        """
        rows = given_rows(
            clock, epoch, offset_s, uncertainty_s, missing, use, reset_s, rate_step, nominal, leap_seconds, common_s
        )
        curve = checked_curve(rows, rows.scale, None, interpolation, max_gap_s)
        return cls(rows.scale, rows.reference, rows.scale, interpolation, rows.sha256, None, curve, rows.marks)

    @classmethod
    def joined(
        cls, logs: Sequence[ClockLog], *, within_s: float = 0.0, overlap: Literal["error", "last"] = "error"
    ) -> ClockLog:
        """Join logs of one clock against one reference.

        Parameters
        ----------
        logs : sequence of ClockLog
            Any order, unless they overlap.
        within_s : float
            From the end of one to the start of the next is a gap, unless they are no more than this apart, s: then they
            go on into each other as if they were one file.
        overlap : {"error", "last"}
            Logs that overlap are an error, or the last given holds where they do, as a later issue.

        Raises
        ------
        InvalidInput
            For logs of different clocks, references, interpolations or noise, that overlap, or that are predicted.
        """
        first = joinable(logs)[0]
        curve = joined_curve(logs, within_s, overlap)
        by_time = sorted(logs, key=lambda log: (log.span.whole[0], log.span.fraction[0]))
        # With overlaps the order given matters, else it does not.
        ordered = by_time if overlap == "error" else list(logs)
        sha256 = hashlib.sha256(" ".join(log.sha256 for log in ordered).encode()).hexdigest()
        name = " + ".join(log.name for log in ordered)
        marks = tuple(mark for log in ordered for mark in log.marks)
        return cls(
            first.scale,
            first.reference,
            name,
            first.interpolation,
            sha256,
            None,
            curve,
            marks,
            first.noise,
            remarks=tuple(dict.fromkeys(remark for log in ordered for remark in log.remarks)),
            files=tuple(file for log in ordered for file in log.files),
        )

    @staticmethod
    def inspect(
        source: str | Path | Sequence[Mapping[str, str]],
        *,
        nominal: Nominal | None = None,
        max_gap_s: float | None = None,
        threshold: float = 6.0,
        leap_seconds: LeapSeconds | None = None,
    ) -> ClockReport:
        """Look a log over and report all that is odd in it, at once; see `clock_inspection.inspect_log`."""
        from .clock_inspection import inspect_log

        return inspect_log(source, nominal=nominal, max_gap_s=max_gap_s, threshold=threshold, leap_seconds=leap_seconds)

    # ---- past the comparisons --------------------------------------------------------------------

    def with_noise(self, noise: ClockNoise) -> ClockLog:
        """The same log, whose uncertainty between comparisons holds what a clock of this noise wanders there."""
        if self.interpolation == "step":
            raise InvalidInput(
                f"{self.name!r} is a step log, which says that the clock holds between comparisons; load it as linear "
                "or cubic to give it noise"
            )
        return replace(self, noise=noise)

    def predicted(
        self,
        noise: ClockNoise,
        *,
        fit_s: float,
        until: str | Instants | None = None,
        start: str | Instants | None = None,
        drift: bool = False,
    ) -> ClockLog:
        """Give the same log going on past its last comparison, or back before its first, with growing uncertainty.

        The offset goes on from the last comparison along the straight line through it and the first comparison of the
        last `fit_s` seconds (the best there is for white frequency noise), with `drift` along the parabola through
        these two and the one nearest half way. Its uncertainty is that of the comparisons, what is own to each and what
        they share, and of what the clock wanders from the line by its noise; a drift that is left out is not in it.

        Parameters
        ----------
        noise : ClockNoise
            Levels of the clock.
        fit_s : float
            Length of the stretch at the end (and the start) of the log that the rate is taken from, s.
        until, start : str or Instants
            Where the log is to end, and to start: an instant of the reference scale, or its ISO 8601 label.
        drift : bool
            Take the clock's drift from the stretch too.

        Raises
        ------
        InvalidInput
            For a stretch with too few comparisons, a rate step, a reset of unknown size or the seam of two logs.

        Warns
        -----
        ExtrapolationWarning
            By the log that is returned, when it maps instants past the comparisons.
        """
        if until is None and start is None:
            raise InvalidInput("say until when to predict: until=, or start= for before the first comparison")
        if self.is_predicted:
            raise InvalidInput(f"{self.name!r} is predicted already; start from the log of the comparisons")
        if not 0.0 < fit_s < float("inf"):
            raise InvalidInput(f"fit_s is a length of time above zero, got {fit_s!r}")
        noisy = self.with_noise(noise)
        ends = (None if end is None else self._instant(end) for end in (until, start))
        prediction = Prediction(float(fit_s), bool(drift), *ends)
        curve, forecasts = prediction.of(self._curve, self.name)
        if curve.backwards().any():
            raise InvalidInput(f"{self.scale} would run backwards within the prediction; take the rate from elsewhere")
        digest = f"{self.sha256} {noise} {fit_s} {drift} {[curve.reference[0][[0, -1]], curve.reference[1][[0, -1]]]}"
        sha256 = hashlib.sha256(digest.encode()).hexdigest()
        return replace(noisy, sha256=sha256, _curve=curve, _forecasts=forecasts, prediction=prediction)

    def _instant(self, end: str | Instants) -> Pair:
        """One instant of the reference, as a text or as itself."""
        at = Instants.from_iso(end, self.reference) if isinstance(end, str) else end
        if not isinstance(at, Instants) or at.scale != self.reference or at.shape not in ((), (1,)):
            raise InvalidInput(
                f"the end of a prediction is one instant of {self.reference}, or its ISO 8601 label, got {end!r:.80}"
            )
        return at.pair[0].reshape(()), at.pair[1].reshape(())
