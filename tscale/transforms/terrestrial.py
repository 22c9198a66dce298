"""Scales kept on Earth: UTC, TAI, TT and the satellite-navigation times, UT1, TT(BIPM), clocks.

Every function takes `Instants`, keeps their place and shape, and has its inverse beside it.
"""

from __future__ import annotations

import numpy as np

from .. import exact
from ..counts import fixed_count
from ..errors import NotConverged, ScaleMismatch
from ..instants import Instants
from ..scales import Scale
from ..tables.clock_log import ClockLog
from ..tables.earth_orientation import EarthOrientation
from ..tables.tt_bipm import TTBIPM

__all__ = [
    "clock_to_reference",
    "reference_to_clock",
    "tai_to_tt_bipm",
    "tai_to_ut1",
    "to_fixed_scale",
    "tt_bipm_to_tai",
    "ut1_to_tai",
]


def require_scale(t: Instants, *scales: str) -> None:
    """Raise `ScaleMismatch` unless the instants are of one of `scales`."""
    if t.scale not in scales:
        raise ScaleMismatch(
            f"instants of scale {' or '.join(scales)} are needed here, got {t.scale}; convert them first"
        )


def to_fixed_scale(t: Instants, scale: str) -> Instants:
    """Re-date between scales at a fixed distance from TAI: UTC, TAI, TT, GPS, GST, BDT, GLONASS.

    The counts differ by a constant, also for UTC, because its count is SI seconds elapsed; the leap
    seconds live in the labels. Exact in whole seconds; TT to one rounding of the fraction (0.1 fs).

    Parameters
    ----------
    t : Instants
        Of one of these scales, any shape.
    scale : str
        The scale wanted.

    Raises
    ------
    ScaleMismatch
        Where either scale is another one.

    Sources: ITU-R TF.460-6; IAU 1991 A4; IS-GPS-200; Galileo OS-SIS-ICD; BDS-SIS-ICD; GLONASS ICD.
    """
    target = Scale.parse(scale)
    return Instants._of(fixed_count(t.pair, Scale.parse(t.scale), target), target, t.place)


def tai_to_ut1(t: Instants, earth_orientation: EarthOrientation) -> Instants:
    """TAI to UT1 by the tabulated UT1-TAI (IERS Conventions 2010, chapter 5).

    Parameters
    ----------
    t : Instants
        TAI, any shape.
    earth_orientation : EarthOrientation

    Raises
    ------
    OutOfSpan
        Outside the table, with the mask: UT1 is never held or guessed.
    ScaleMismatch
        For another scale than TAI.
    """
    require_scale(t, "TAI")
    return Instants._of(exact.add(t.pair, earth_orientation.ut1_minus_tai(t.pair)), "UT1", t.place)


def ut1_to_tai(t: Instants, earth_orientation: EarthOrientation) -> Instants:
    """UT1 to TAI, the inverse of `tai_to_ut1` to 0.2 fs.

    UT1-TAI changes by less than 1e-7 s per second, so each pass gains seven digits.

    Parameters
    ----------
    t : Instants
        UT1, any shape.
    earth_orientation : EarthOrientation

    Raises
    ------
    OutOfSpan
        Outside the table, with the mask.
    NotConverged
        If six passes do not settle it: the table is not smooth.
    ScaleMismatch
        For another scale than UT1.
    """
    require_scale(t, "UT1")
    # Within 0.9 s of UTC by definition, hence the table's own value at a near date is a good start.
    tai = exact.subtract(t.pair, earth_orientation.ut1_minus_tai_near(t.pair))
    for _ in range(6):
        update = exact.subtract(t.pair, earth_orientation.ut1_minus_tai(tai))
        change = np.max(np.abs(exact.seconds(exact.subtract(update, tai))), initial=0.0)
        tai = update
        if change < 1e-9:  # the next pass would change less than 1e-16 s
            return Instants._of(tai, "TAI", t.place)
    raise NotConverged(f"UT1 to TAI still moves by {change:.3g} s after 6 passes: the UT1 table is not smooth there")


def tai_to_tt_bipm(t: Instants, table: TTBIPM) -> Instants:
    """TAI to a realisation TT(BIPMxx) = TAI + 32.184 s + tabulated offset (BIPM TTBIPM files, column 3).

    Raises `OutOfSpan` (with the mask) outside the table, `ScaleMismatch` for another scale than TAI.
    """
    require_scale(t, "TAI")
    tt = to_fixed_scale(t, "TT").pair
    return Instants._of(exact.add_seconds(tt, table.offset_s(t.pair)), table.scale, t.place)


def tt_bipm_to_tai(t: Instants, table: TTBIPM) -> Instants:
    """TT(BIPMxx) to TAI; the offset changes by less than 1e-13 s per second, so two passes are exact.

    Raises `OutOfSpan` (with the mask) outside the table, `ScaleMismatch` for another scale than the table's.
    """
    require_scale(t, table.scale)
    tai = to_fixed_scale(Instants._of(t.pair, "TT"), "TAI").pair
    first = exact.add_seconds(tai, -table.offset_s(tai))
    return Instants._of(exact.add_seconds(tai, -table.offset_s(first)), "TAI", t.place)


def clock_to_reference(t: Instants, log: ClockLog) -> Instants:
    """A clock's reading to the scale it was compared with, by the comparison log; any shape.

    Raises `OutOfSpan` (with the mask) outside the log or in one of its gaps, `ScaleMismatch` for another clock.
    """
    require_scale(t, log.scale)
    return Instants._of(log.to_reference(t.pair), log.reference, t.place)


def reference_to_clock(t: Instants, log: ClockLog) -> Instants:
    """What the clock reads at instants of its reference scale; the inverse of `clock_to_reference` to 0.2 fs.

    Raises `OutOfSpan` (with the mask) outside the log or in one of its gaps, `ScaleMismatch` for another scale.
    """
    require_scale(t, log.reference)
    return Instants._of(log.to_clock(t.pair), log.scale, t.place)
