"""Which time ephemeris goes with a kernel when none is given."""

from __future__ import annotations

from ..errors import OutOfSpan
from .chebyshev import span_text
from .kernel import Ephemeris
from .time_ephemeris import TimeEphemeris
from .time_integral import reaches_t0

__all__ = ["anchored_time_ephemeris"]


def anchored_time_ephemeris(ephemeris: Ephemeris) -> TimeEphemeris:
    """Find or build the time ephemeris of a kernel, pinned at T0 or else to the shipped one where they overlap.

    Which of both it was is told by `anchor` and `name` of what is returned. Two planetary ephemerides differ in
    TT - TDB by nanoseconds at most, and at the pin not at all.

    Raises
    ------
    OutOfSpan
        For a kernel that neither reaches T0 nor overlaps the shipped time ephemeris; see also `TimeEphemeris.of`.
    """
    if not isinstance(ephemeris, Ephemeris) or reaches_t0(ephemeris):
        return TimeEphemeris.of(ephemeris)
    shipped = TimeEphemeris.of(Ephemeris.default())
    return TimeEphemeris.of(ephemeris, anchor=_overlapping(ephemeris, shipped))


def _overlapping(ephemeris: Ephemeris, shipped: TimeEphemeris) -> TimeEphemeris:
    first, last = ephemeris.span
    if max(first, shipped.span[0]) < min(last, shipped.span[1]):
        return shipped
    path = str(ephemeris.path)
    raise OutOfSpan(
        f"{ephemeris.name} covers {span_text(ephemeris.span)} TDB: it reaches neither T0, 1977-01-01T00:00:32, where "
        f"TT - TDB is defined, nor the shipped time ephemeris, {span_text(shipped.span)}. Use a kernel that does, or a "
        f"file OTHER with TT - TDB that overlaps it: in Python te = TimeEphemeris.of(Ephemeris.open({path!r}), "
        f"anchor=TimeEphemeris.open('OTHER')), then ReferenceData.load(ephemeris={path!r}, time_ephemeris=te); on the "
        f"command line, after te.write_spk('FILE'), --ephemeris {path} --time-ephemeris FILE",
        path=ephemeris.path,
    )
