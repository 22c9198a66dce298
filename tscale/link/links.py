"""The two calls: `one_way` and `two_way`."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Literal

import numpy as np
import numpy.typing as npt

from .. import exact
from ..ephemeris import PLANETARY_BODIES
from ..errors import InvalidInput
from ..exact import BoolArray, FloatArray, IntArray, Pair
from ..instants import Instants
from ..tables.clock_arguments import checked_logs
from ..tables.reference import ReferenceData
from .arguments import checked_instants, checked_options, checked_reference, with_turnaround
from .batch import Batch, Failure, raise_failures, solve_batch
from .dating import tdb_of
from .ends import End, Participant, as_end
from .obstacles import no_clear_path
from .solution import LinkSolution, Terms, TwoWaySolution
from .solve import Options

if TYPE_CHECKING:
    from ..tables.clock_log import ClockLog

__all__ = ["one_way", "two_way"]


def one_way(
    *,
    transmitter: Participant,
    receiver: Participant,
    transmit: Instants | None = None,
    receive: Instants | None = None,
    reference: ReferenceData | None = None,
    clocks: Sequence[ClockLog] = (),
    bodies: Sequence[str | int] = PLANETARY_BODIES,
    second_order: bool = True,
    occultation: Literal["error", "ignore"] = "error",
    tolerance_s: float = 1e-12,
    max_iterations: int = 8,
) -> LinkSolution:
    """Light time from a transmitter to a receiver.

    Parameters
    ----------
    transmitter, receiver : Site, SurfaceSite, Trajectory, str or int
        The ends; a body is a name or NAIF number of the reference's ephemeris.
    transmit, receive : Instants
        Exactly one of them: dates of the events at that end, any shape, on TDB or TCB anywhere, and on UTC, TAI, TT,
        TCG, UT1, a GNSS scale, TT(BIPM), UTC(k) or CLOCK(x) within `GEOCENTRIC_REGION_M` of the geocentre.
    reference : ReferenceData, optional
        Tables in use; default `ReferenceData.default()`.
    clocks : sequence of ClockLog
        Logs that lead from UTC(k) or CLOCK(x) to UTC.
    bodies : sequence of str or int
        Bodies whose gravity delays the light and that may stand in its way. One whose centre is an end is left out.
        The Earth and the Moon are two: their barycentre (3) is refused.
    second_order : bool
        Add the Sun's delay of second and third order (10 ns for a line that grazes the Sun).
    occultation : {"error", "ignore"}
        What to do where the line passes through a body (mean radius; the Sun's nominal one) or an end on the ground has
        the other below its horizon (that of the ellipsoid under it, so that from a height h one sees the dip of about
        sqrt(2 h/R) below the horizontal; no terrain, no refraction): raise, or go on as if the way were clear;
        `occulted` of the solution tells which.
    tolerance_s : float
        The light time is found when Newton's step falls below this, or below the rounding of the positions (0.5 ps at
        Jupiter, 4 ps at Neptune).
    max_iterations : int
        Most Newton steps.

    Returns
    -------
    LinkSolution

    Raises
    ------
    InvalidInput
        Not exactly one of `transmit` and `receive`, or an end or option that is not understood.
    ScaleMismatch
        Dates on a scale, or at a place, that the end does not have.
    OutOfSpan
        Dates beyond the ephemeris, a trajectory or a table (with the mask).
    GeometryError
        No clear path, both ends at one point, or an end deep inside a body (with the mask).
    NotConverged
        Still moving after `max_iterations` (with the mask).

    A mask names every link of the batch that fails in the way of the error raised.

    Notes
    -----
    Source: IERS Conventions (2010), section 11.2, with the additions in `delay`. All in TDB and TDB-compatible lengths.
    """
    given = receive if receive is not None else transmit
    if given is None or (transmit is not None and receive is not None):
        raise InvalidInput("a link needs exactly one of transmit= and receive=, the dates of one of its events")
    ends = as_end(transmitter, "transmitter"), as_end(receiver, "receiver")
    given, logs, tables = checked_instants(given), checked_logs(clocks), checked_reference(reference)
    options = checked_options(bodies, second_order, occultation, tolerance_s, max_iterations)
    met = receive is not None
    known = tdb_of(given, ends[met], tables, logs)
    batch = solve_batch(_flat(known), met, ends, tables, options)
    what = f"links from {ends[0].name} to {ends[1].name}"
    raise_failures([*batch.failures, *_refused([(batch, batch.rows)], given.shape, what, options)], given.shape)
    return _solution(known, met, batch, ends, tables, logs, given)


def two_way(
    *,
    station: Participant,
    target: Participant,
    transmit: Instants | None = None,
    receive: Instants | None = None,
    turnaround_s: npt.ArrayLike = 0.0,
    reference: ReferenceData | None = None,
    clocks: Sequence[ClockLog] = (),
    bodies: Sequence[str | int] = PLANETARY_BODIES,
    second_order: bool = True,
    occultation: Literal["error", "ignore"] = "error",
    tolerance_s: float = 1e-12,
    max_iterations: int = 8,
) -> TwoWaySolution:
    """Light from a station to a target and back.

    Parameters
    ----------
    station, target : Site, SurfaceSite, Trajectory, str or int
        The ends, as for `one_way`.
    transmit, receive : Instants
        Exactly one of them: dates of the events at the station.
    turnaround_s : float array
        TDB seconds from reception to transmission at the target, 0 or more; broadcasts with the dates.
    reference, clocks, bodies, second_order, occultation, tolerance_s, max_iterations
        As for `one_way`; a clear path is asked for on both legs.

    Raises
    ------
    As `one_way`.
    """
    given = receive if receive is not None else transmit
    if given is None or (transmit is not None and receive is not None):
        raise InvalidInput("a round trip needs exactly one of transmit= and receive=, dates of the station's events")
    near, far = as_end(station, "station"), as_end(target, "target")
    logs, tables = checked_logs(clocks), checked_reference(reference)
    options = checked_options(bodies, second_order, occultation, tolerance_s, max_iterations)
    given, turnaround = with_turnaround(checked_instants(given), turnaround_s)
    # From the leg that meets the date given to the other: backwards in time from a reception.
    back = receive is not None
    first_ends, second_ends = ((far, near), (near, far)) if back else ((near, far), (far, near))
    known = tdb_of(given, near, tables, logs)
    first = solve_batch(_flat(known), back, first_ends, tables, options)
    if first.solved is None:
        raise_failures(first.failures, given.shape)
    wait = turnaround.reshape(-1)[first.rows]
    turned = exact.add_seconds(first.other, -wait if back else wait)
    second = solve_batch(turned, back, second_ends, tables, options)
    failures = [*first.failures, *(Failure(error, first.rows[links]) for error, links in second.failures)]
    what = f"round trips between {near.name} and {far.name}"
    legs = [(first, first.rows), (second, first.rows[second.rows])]
    raise_failures([*failures, *_refused(legs, given.shape, what, options)], given.shape)
    turned = turned[0].reshape(given.shape), turned[1].reshape(given.shape)
    one = _solution(known, back, first, first_ends, tables, logs, given)
    two = _solution(turned, back, second, second_ends, tables, logs, None)
    return TwoWaySolution(two, one, turnaround) if back else TwoWaySolution(one, two, turnaround)


def _refused(
    legs: Sequence[tuple[Batch, IntArray]], shape: tuple[int, ...], what: str, options: Options
) -> list[Failure]:
    """Links without a clear path, where that is an error; each leg with the links that its rows are."""
    size = int(np.prod(shape, dtype=np.int64))
    ways: dict[str, BoolArray] = {}
    for batch, links in legs:
        for words, mask in () if batch.solved is None else batch.solved.ways.items():
            whole = ways.setdefault(words, np.zeros(size, dtype=np.bool_))
            whole[links] |= mask
    if options.ignore_occultation or not any(mask.any() for mask in ways.values()):
        return []
    error = no_clear_path(ways, what)
    assert error.mask is not None
    return [Failure(error, np.flatnonzero(error.mask))]


def _solution(
    known: Pair,
    known_is_receive: bool,
    batch: Batch,
    ends: tuple[End, End],
    reference: ReferenceData,
    clocks: tuple[ClockLog, ...],
    given: Instants | None,
) -> LinkSolution:
    """A batch of which nothing failed, in the shape of the dates."""
    shape = known[0].shape
    solved, (whole, fraction) = batch.solved, batch.other
    assert solved is not None
    other = whole.reshape(shape), fraction.reshape(shape)
    sent, met = (other, known) if known_is_receive else (known, other)
    return LinkSolution(
        transmit=Instants._of(sent, "TDB", ends[0].place),
        receive=Instants._of(met, "TDB", ends[1].place),
        ledger=Terms({name: value.reshape(shape) for name, value in solved.terms_s.items()}),
        range_m=solved.range_m.reshape(shape),
        range_rate_m_s=solved.range_rate_m_s.reshape(shape),
        light_time_rate=solved.light_time_rate.reshape(shape),
        transmit_elevation_deg=_perhaps(solved.transmit_elevation_deg, shape),
        receive_elevation_deg=_perhaps(solved.receive_elevation_deg, shape),
        occulted=solved.occulted.reshape(shape),
        iterations=solved.iterations,
        _ends=ends,
        _reference=reference,
        _clocks=clocks,
        _given=given,
    )


def _perhaps(value: FloatArray | None, shape: tuple[int, ...]) -> FloatArray | None:
    return None if value is None else value.reshape(shape)


def _flat(pair: Pair) -> Pair:
    return pair[0].reshape(-1), pair[1].reshape(-1)
