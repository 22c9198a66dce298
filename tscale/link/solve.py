"""Light time between two moving ends, by Newton's method in the barycentric frame (TDB).

t_r - t_t = |x_r(t_r) - x_t(t_t)| / c + (gravitational delays)
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import TYPE_CHECKING, Final, NamedTuple

import numpy as np

from .. import exact
from ..body_shape import own_body
from ..constants import C_M_S
from ..earth.frames import dot
from ..ephemeris import body_name
from ..errors import GeometryError, NotConverged
from ..exact import BoolArray, FloatArray, Pair
from .delay import Gravity, Ray, gravity
from .ends import End, absolute
from .obstacles import apparent, below_horizon, elevation_rad

if TYPE_CHECKING:
    from ..tables.reference import ReferenceData

__all__ = ["Options", "Solved", "solve"]

_SHORT_S: Final = 600.0
_GAUSS: Final = 0.5 / np.sqrt(3.0)


@dataclass(frozen=True)
class Options:
    """What a link takes into account, and when it is content."""

    bodies: tuple[int, ...]
    second_order: bool
    ignore_occultation: bool
    tolerance_s: float
    max_iterations: int


class Solved(NamedTuple):
    """Solution of a flat batch."""

    terms_s: dict[str, FloatArray]
    range_m: FloatArray
    range_rate_m_s: FloatArray
    light_time_rate: FloatArray
    transmit_elevation_deg: FloatArray | None
    receive_elevation_deg: FloatArray | None
    ways: dict[str, BoolArray]
    """What may stand in the way, in words, and where it does."""
    iterations: int

    @property
    def occulted(self) -> BoolArray:
        """Where anything stands in the way."""
        found = np.zeros(self.range_m.shape, dtype=np.bool_)
        for mask in self.ways.values():
            found = found | mask
        return found


class _State(NamedTuple):
    """An end at its event: its anchor's place and speed, and the offset from it and its rate."""

    place: FloatArray
    speed: FloatArray
    offset: FloatArray
    rate: FloatArray

    @property
    def x(self) -> FloatArray:
        return self.place + self.offset

    @property
    def v(self) -> FloatArray:
        return self.speed + self.rate


class _Leg(NamedTuple):
    """The straight line between both events."""

    transmit: _State
    receive: _State
    line: FloatArray
    rho: FloatArray

    @property
    def along(self) -> FloatArray:
        return self.line / self.rho[..., np.newaxis]


def solve(
    known: Pair, known_is_receive: bool, transmitter: End, receiver: End, reference: ReferenceData, options: Options
) -> Solved:
    """Solve a flat batch of links for the light time.

    Parameters
    ----------
    known : Pair (n,)
        TDB counts of the event that is given.
    known_is_receive : bool
        Whether that is the reception.

    Notes
    -----
    The step is f / f' with f = tau - rho/c - delay and f' = 1 - n.v/c, v the velocity of the end whose date is
    sought. From tau = 0 it leaves 1e-5 s of a light time of 1000 s, then rounding. Delays change by less
    than 1e-9 of a change of tau, so they are formed again only when tau has moved by 1 us.
    """
    ours, other = (receiver, transmitter) if known_is_receive else (transmitter, receiver)
    fixed = _State(*absolute(ours, known, reference))
    tau = np.zeros(known[0].shape)
    pull: Gravity | None = None
    pulled_at = tau
    step = tau
    for iteration in range(1, options.max_iterations + 1):
        when = _sought(known, tau, known_is_receive, other if iteration <= 2 else None)
        leg = _leg(fixed, when, known, known_is_receive, transmitter, receiver, reference)
        if iteration > 1 and (pull is None or np.max(np.abs(tau - pulled_at), initial=0.0) > 1e-6):
            pull = _pull(leg, when if known_is_receive else known, transmitter, receiver, reference, options)
            pulled_at = tau
        delay = pull.total_s if pull is not None else 0.0
        slope = 1.0 - dot(leg.along, leg.transmit.v if known_is_receive else leg.receive.v) / C_M_S
        # `when` may have been held inside a span, so the light time it stands for is formed anew.
        held = exact.seconds(exact.subtract(known, when) if known_is_receive else exact.subtract(when, known))
        target = held - (held - leg.rho / C_M_S - delay) / slope
        step, tau = target - tau, target
        if iteration > 2 and pull is not None and np.all(np.abs(step) <= _content(leg, options)):
            return _finish(
                leg, pull, known, when, known_is_receive, transmitter, receiver, reference, options, iteration
            )
    late = np.abs(step) > _content(leg, options)
    raise NotConverged(
        f"{int(late.sum())} of {late.size} light times still move by up to {np.max(np.abs(step)):.3g} s after "
        f"{options.max_iterations} Newton steps; allowed is {options.tolerance_s:g} s: "
        "raise tolerance_s or max_iterations",
        mask=np.asarray(late),
    )


def _content(leg: _Leg, options: Options) -> FloatArray:
    """Step below which the next one is not taken: the tolerance, or the rounding of the positions themselves."""
    farthest = np.maximum(_largest(leg.transmit.x), _largest(leg.receive.x))
    return np.asarray(options.tolerance_s + 8.0 * np.spacing(farthest) / C_M_S)


def _sought(known: Pair, tau: FloatArray, known_is_receive: bool, held: End | None) -> Pair:
    """Date of the event sought; the first two, which may overshoot, are held within the span of a trajectory."""
    when = exact.add_seconds(known, -tau if known_is_receive else tau)
    if held is None or held.span is None:
        return when
    first, last = held.span
    margin = min(0.1, 0.25 * (last - first))  # the span may be one of TT, 2 ms off
    count = exact.seconds(when)
    over = np.where(count > last - margin, count - (last - margin), 0.0)
    under = np.where(count < first + margin, count - (first + margin), 0.0)
    return exact.add_seconds(when, -(over + under))


def _leg(
    fixed: _State,
    when: Pair,
    known: Pair,
    known_is_receive: bool,
    transmitter: End,
    receiver: End,
    reference: ReferenceData,
) -> _Leg:
    other = _State(*absolute(transmitter if known_is_receive else receiver, when, reference))
    sent, met = (other, fixed) if known_is_receive else (fixed, other)
    t_sent, t_met = (when, known) if known_is_receive else (known, when)
    between = met.place - sent.place
    tau = exact.seconds(exact.subtract(t_met, t_sent))
    short = np.abs(tau) < _SHORT_S
    if np.any(short):
        near = _between_anchors(t_sent, t_met, tau, transmitter.anchor, receiver.anchor, reference)
        between = np.where(short[..., np.newaxis], near, between)
    line = between + (met.offset - sent.offset)
    rho = np.sqrt(dot(line, line))
    # Nearer than 1 mm at 1 au the barycentric positions, of which the delays are made, are one point.
    one_point = np.asarray(rho <= 32.0 * np.spacing(np.maximum(_largest(sent.x), _largest(met.x))))
    if np.any(one_point):
        raise GeometryError(
            f"{transmitter.name} and {receiver.name} are at the same point, to the rounding of their barycentric "
            "places: a link needs two different ends",
            mask=one_point,
        )
    return _Leg(sent, met, line, rho)


def _largest(vectors: FloatArray) -> FloatArray:
    return np.asarray(np.max(np.abs(vectors), axis=-1))


def _between_anchors(
    sent: Pair, met: Pair, tau: FloatArray, anchor_sent: int, anchor_met: int, reference: ReferenceData
) -> FloatArray:
    """A_r(t_r) - A_t(t_t) for short light times, without the rounding of barycentric positions.

    The anchors' distance at t_r, in which the ephemeris cancels their common centres, plus the way of the
    transmitter's anchor: the integral of its velocity by Gauss-Legendre on two points, off by
    v'''' tau^5 / 4320 = 1e-11 m in 600 s.
    """
    ephemeris = reference.ephemeris
    between = ephemeris.position(anchor_met, met, center=anchor_sent)
    if anchor_sent == 0:
        return between
    _, early = ephemeris.state(anchor_sent, exact.add_seconds(sent, (0.5 - _GAUSS) * tau))
    _, late = ephemeris.state(anchor_sent, exact.add_seconds(sent, (0.5 + _GAUSS) * tau))
    return np.asarray(between + (early + late) * (0.5 * tau)[..., np.newaxis])


def _pull(
    leg: _Leg, sent: Pair, transmitter: End, receiver: End, reference: ReferenceData, options: Options
) -> Gravity:
    """Delays along the leg as it stands. A body that is itself an end has none: there it would not be finite."""
    at_ends = set()
    for end in (transmitter, receiver):
        if end.centre_of is not None:
            at_ends.add(own_body(end.centre_of))
            if end.centre_of == 3:  # the centre of mass of Earth and Moon lies within the Earth
                at_ends.add(399)
    bodies = [body for body in options.bodies if own_body(body) not in at_ends]
    grounds = frozenset(own_body(end.ground) for end in (transmitter, receiver) if end.ground is not None)
    ray = Ray(sent, leg.rho / C_M_S, leg.transmit.x, leg.transmit.v, leg.receive.x, leg.receive.v)
    return gravity(ray, reference.ephemeris, bodies, second_order=options.second_order, clear=grounds)


def _finish(
    leg: _Leg,
    pull: Gravity,
    known: Pair,
    when: Pair,
    known_is_receive: bool,
    transmitter: End,
    receiver: End,
    reference: ReferenceData,
    options: Options,
    iterations: int,
) -> Solved:
    sent, met = (when, known) if known_is_receive else (known, when)
    along = leg.along
    ways = {f"the line passes through {body_name(body)}": mask for body, mask in pull.blocked.items()}
    heights: list[FloatArray | None] = []
    for end, far, state, when_, seen in (
        (transmitter, receiver, leg.transmit, sent, apparent(along, -leg.transmit.v)),
        (receiver, transmitter, leg.receive, met, apparent(-along, leg.receive.v)),
    ):
        stand = end.stand(when_, reference)
        if stand is None:
            heights.append(None)
            continue
        heights.append(np.degrees(elevation_rad(stand.up, seen)))
        words = f"{far.name} is below the horizon of {end.name}"
        hidden = below_horizon(stand, state.offset, seen, leg.rho, other_on_ground=far.ground == end.ground)
        ways[words] = ways[words] | hidden if words in ways else hidden  # both ends may bear one name
    # dt_t / dt_r from the light-time equation, then the rates that follow from it.
    out, inward = dot(along, leg.transmit.v), dot(along, leg.receive.v)
    ratio = (1.0 - inward / C_M_S - pull.by_receive) / (1.0 - out / C_M_S + pull.by_transmit)
    loss = (inward - out) / C_M_S + pull.by_receive + pull.by_transmit
    light_time_rate = loss / (1.0 - out / C_M_S + pull.by_transmit)
    return Solved(
        {"geometric range": np.asarray(leg.rho / C_M_S), **pull.terms_s},
        leg.rho,
        np.asarray(inward - out * ratio),
        np.asarray(light_time_rate),
        heights[0],
        heights[1],
        ways,
        iterations,
    )
