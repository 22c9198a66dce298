"""References of a comparison that are not labelled like UTC: what is nominal between them and a clock, and what is not.

A clock carries labels of UTC. Against UTC, a UTC(k) or another clock the offset is simply clock minus reference.
Against TAI, TT, a realisation TT(BIPMxx) or a satellite-navigation time the labels differ by whole leap seconds (and TT
by 32.184 s) that no clock made: the *nominal* difference. What laboratories and the BIPM publish is nearly always the
rest, for example C0 in UTC - GPS time = -18 s + C0 (BIPM Circular T, section on GNSS times), but receivers also give
the whole difference. A log has to say which of the two it holds: nominal difference `removed` or `included`.
"""

from __future__ import annotations

from typing import Final, Literal, TypeAlias

import numpy as np

from .. import exact
from ..errors import InvalidInput
from ..exact import BoolArray, Pair
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from ..scales import Scale
from .common import as_pair, utc_text

__all__ = [
    "Nominal",
    "check_nominal",
    "count_text",
    "label_difference",
    "nominal_count",
    "reference_scale",
    "without_nominal",
]

Nominal: TypeAlias = Literal["removed", "included"]

_UTC: Final = Scale.parse("UTC")
_ALLOWED: Final = "UTC, UTC(laboratory), CLOCK(name), TAI, TT, TT(realisation), GPS, GST, BDT or GLONASS"
_LARGEST_REST_S: Final = 0.5


def reference_scale(name: str) -> Scale:
    """Look a reference up, else `InvalidInput` that says why."""
    scale = Scale.parse(name)
    if scale.family not in ("UTC", "CLOCK", "TT") and scale.count_minus_tai is None:
        raise InvalidInput(f"a clock is compared with {_ALLOWED}, got {name!r}; turn the comparisons into one of them")
    return scale


def check_nominal(reference: str, nominal: str | None) -> None:
    """Raise `InvalidInput` unless it is clear what the offsets from a reference hold."""
    if nominal not in (None, "removed", "included"):
        raise InvalidInput(f"nominal is 'removed' or 'included', got {nominal!r}")
    if nominal is None and not _like_utc(Scale.parse(reference)):
        raise InvalidInput(
            f"the labels of a clock and of {reference} differ by leap seconds and constants: say whether offset_s is "
            "without them (nominal: removed, as in UTC(k) - GPS time modulo 1 s) or the whole difference of the labels "
            "(nominal: included)"
        )


def nominal_count(reference: str) -> Pair:
    """Count of a perfect clock minus count of the reference: a constant, zero for all that is labelled like UTC."""
    return exact.subtract(_count_minus_tai(_UTC), _count_minus_tai(Scale.parse(reference)))


def without_nominal(offset: Pair, epoch: Pair, reference: str, leap_seconds: LeapSeconds) -> tuple[Pair, BoolArray]:
    """Take the nominal difference of the labels out; and where what is left is so large that it cannot have been in.

    Parameters
    ----------
    offset : pair
        Label of the clock minus label of the reference.
    epoch : pair
        Counts of the reference.
    """
    scale = Scale.parse(reference)
    utc = exact.add(epoch, nominal_count(reference))
    if scale.utc_labels:
        difference = exact.normalise(-scale.label_offset_s, 0.0)
    else:
        leaps = exact.from_seconds(leap_seconds.tai_minus_utc(utc))
        difference = exact.negate(exact.add(leaps, _count_minus_tai(scale)))
    rest = exact.subtract(offset, difference)
    large = np.abs(exact.seconds(rest)) > _LARGEST_REST_S
    return rest, large if not _like_utc(scale) else np.zeros_like(large)


def label_difference(clock: Instants, reference: Instants, leap_seconds: LeapSeconds) -> Pair:
    """Label of the reference minus label of the clock, s, for instants of both that date the same events."""
    shift = exact.subtract(reference.pair, clock.pair)
    for instants, sign in ((reference, 1.0), (clock, -1.0)):
        scale = Scale.parse(instants.scale)
        if scale.utc_labels and not _like_utc(Scale.parse(reference.scale)):
            # A count of UTC holds no leap seconds, its label those from 2000 on.
            utc = (instants.whole - scale.label_offset_s, instants.fraction)
            shift = exact.add_seconds(shift, sign * (32.0 - leap_seconds.tai_minus_utc(utc)))
    return shift


def count_text(count: Pair, reference: str) -> str:
    """Label of one count of a reference, to the second, for messages; without a warning."""
    scale = Scale.parse(reference)
    if scale.utc_labels and not scale.label_offset_s:
        return utc_text(count)
    return str(Instants._of(as_pair(count), scale).to_iso(0))


def _like_utc(scale: Scale) -> bool:
    return scale.family in ("UTC", "CLOCK")


def _count_minus_tai(scale: Scale) -> Pair:
    kept = {"CLOCK": "UTC", "UTC": "UTC", "TT": "TT"}.get(scale.family, scale.name)
    offset = Scale.parse(kept).count_minus_tai
    assert offset is not None
    return np.asarray(offset[0], dtype=np.int64), np.asarray(offset[1], dtype=np.float64)
