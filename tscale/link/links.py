"""The two calls: `one_way` and `two_way`."""

from __future__ import annotations

from collections.abc import Sequence
from typing import TYPE_CHECKING, Any, Final, Literal

import numpy as np
import numpy.typing as npt

from .. import exact
from ..body_shape import own_body
from ..ephemeris import PLANETARY_BODIES, body_id
from ..errors import InvalidInput, TscaleError
from ..exact import FloatArray, Pair
from ..instants import Instants
from ..tables.reference import ReferenceData
from .dating import tdb_of
from .ends import End, Participant, as_end
from .solution import LinkSolution, Terms, TwoWaySolution
from .solve import Options, Solved, moved_mask, solve

if TYPE_CHECKING:
    from ..tables.clock_log import ClockLog

__all__ = ["one_way", "two_way"]

_CHUNK: Final = 8192


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
    second_order : bool
        Add the Sun's delay of second and third order (10 ns for a line that grazes the Sun).
    occultation : {"error", "ignore"}
        What to do where the line passes through a body (mean radius; the Sun's nominal one) or an end on the ground has
        the other below its horizon: raise, or go on as if the way were clear; `occulted` of the solution tells which.
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

    Notes
    -----
    Source: IERS Conventions (2010), section 11.2, with the additions in `delay`. All in TDB and TDB-compatible lengths.
    """
    given = receive if receive is not None else transmit
    if given is None or (transmit is not None and receive is not None):
        raise InvalidInput("a link needs exactly one of transmit= and receive=, the dates of one of its events")
    ends = as_end(transmitter, "transmitter"), as_end(receiver, "receiver")
    reference = _reference(reference)
    known = tdb_of(_instants(given), ends[receive is not None], reference, clocks)
    options = _options(bodies, second_order, occultation, tolerance_s, max_iterations)
    return _solution(known, receive is not None, ends, reference, tuple(clocks), options)


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
    reference = _reference(reference)
    options = _options(bodies, second_order, occultation, tolerance_s, max_iterations)
    clocks = tuple(clocks)
    known, turnaround = _broadcast(tdb_of(_instants(given), near, reference, clocks), turnaround_s)
    if receive is None:
        up = _solution(known, False, (near, far), reference, clocks, options)
        leaves = exact.add_seconds(up.receive.pair, turnaround)
        down = _solution(leaves, False, (far, near), reference, clocks, options)
    else:
        down = _solution(known, True, (far, near), reference, clocks, options)
        arrives = exact.add_seconds(down.transmit.pair, -turnaround)
        up = _solution(arrives, True, (near, far), reference, clocks, options)
    return TwoWaySolution(up, down, turnaround)


def _reference(reference: ReferenceData | None) -> ReferenceData:
    if reference is None:
        return ReferenceData.default()
    if not isinstance(reference, ReferenceData):
        raise InvalidInput(f"reference must be a ReferenceData, got {type(reference).__name__}")
    return reference


def _instants(t: Any) -> Instants:
    if not isinstance(t, Instants):
        raise InvalidInput(
            f"the dates of a link are Instants, got {type(t).__name__}; make them with Instants.from_iso"
        )
    return t


def _broadcast(known: Pair, turnaround_s: npt.ArrayLike) -> tuple[Pair, FloatArray]:
    turnaround = np.asarray(turnaround_s, dtype=np.float64)
    bad = ~(np.isfinite(turnaround) & (turnaround >= 0.0))
    if np.any(bad):
        raise InvalidInput(f"turnaround_s must be finite and 0 or more, got {turnaround_s!r}", mask=np.asarray(bad))
    try:
        whole, fraction, turnaround = np.broadcast_arrays(known[0], known[1], turnaround)
    except ValueError as error:
        raise InvalidInput(
            f"turnaround_s of shape {turnaround.shape} does not go with dates of {known[0].shape}"
        ) from error
    return (whole, fraction), turnaround


def _options(
    bodies: Sequence[str | int], second_order: bool, occultation: str, tolerance_s: float, max_iterations: int
) -> Options:
    if occultation not in ("error", "ignore"):
        raise InvalidInput(f'occultation must be "error" or "ignore", got {occultation!r}')
    if isinstance(bodies, str):
        raise InvalidInput(f"bodies is a sequence such as ('sun', 'jupiter'), got the text {bodies!r}")
    numbers = [own_body(body_id(body)) for body in bodies]
    if len(set(numbers)) < len(numbers):
        raise InvalidInput(f"bodies names one body twice: {', '.join(map(str, bodies))}")
    if not (np.isfinite(tolerance_s) and tolerance_s > 0.0):
        raise InvalidInput(f"tolerance_s must be a positive number of seconds, got {tolerance_s!r}")
    if max_iterations < 3:
        raise InvalidInput(f"max_iterations must be 3 or more, got {max_iterations!r}")
    return Options(tuple(bodies), bool(second_order), occultation == "ignore", float(tolerance_s), int(max_iterations))


def _solution(
    known: Pair,
    known_is_receive: bool,
    ends: tuple[End, End],
    reference: ReferenceData,
    clocks: tuple[ClockLog, ...],
    options: Options,
) -> LinkSolution:
    """Solve in chunks, so that memory does not grow with the batch, and put the chunks together."""
    shape = known[0].shape
    whole, fraction = known[0].reshape(-1), known[1].reshape(-1)
    parts: list[Solved] = []
    for start in range(0, max(whole.size, 1), _CHUNK):
        chunk = (whole[start : start + _CHUNK], fraction[start : start + _CHUNK])
        try:
            parts.append(solve(chunk, known_is_receive, *ends, reference, options))
        except TscaleError as error:
            if error.mask is not None and error.mask.shape == chunk[0].shape:
                error.mask = moved_mask(error.mask, start, whole.size, shape)
            raise
    terms = {name: _joined([p.terms_s[name] for p in parts], shape) for name in parts[0].terms_s}
    light = exact.from_seconds(np.zeros(shape))
    for value in terms.values():
        light = exact.add_seconds(light, value)
    other = exact.subtract(known, light) if known_is_receive else exact.add(known, light)
    sent, met = (other, known) if known_is_receive else (known, other)
    return LinkSolution(
        transmit=Instants._of(sent, "TDB", ends[0].place),
        receive=Instants._of(met, "TDB", ends[1].place),
        ledger=Terms(terms),
        range_m=_joined([p.range_m for p in parts], shape),
        range_rate_m_s=_joined([p.range_rate_m_s for p in parts], shape),
        light_time_rate=_joined([p.light_time_rate for p in parts], shape),
        transmit_elevation_deg=_perhaps([p.transmit_elevation_deg for p in parts], shape),
        receive_elevation_deg=_perhaps([p.receive_elevation_deg for p in parts], shape),
        occulted=np.concatenate([p.occulted for p in parts]).reshape(shape),
        iterations=max(p.iterations for p in parts),
        _ends=ends,
        _reference=reference,
        _clocks=clocks,
    )


def _joined(parts: Sequence[FloatArray], shape: tuple[int, ...]) -> FloatArray:
    return np.concatenate(parts).reshape(shape)


def _perhaps(parts: Sequence[FloatArray | None], shape: tuple[int, ...]) -> FloatArray | None:
    present = [part for part in parts if part is not None]
    return _joined(present, shape) if present else None
