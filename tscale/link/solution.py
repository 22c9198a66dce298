"""What a link gives back."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, field
from typing import TYPE_CHECKING

import numpy as np

from .. import exact
from ..counts import tai_from_tt
from ..errors import InvalidInput
from ..exact import BoolArray, FloatArray, Pair
from ..instants import Instants
from ..scales import Scale
from ..tables.common import FrozenArrays
from ..tables.notes import leap_second_flags, orientation_flags, worded
from ..transforms.barycentric import tt_from_tdb
from .dating import dates_on
from .ends import End

if TYPE_CHECKING:
    from ..tables.clock_log import ClockLog
    from ..tables.reference import ReferenceData

__all__ = ["LinkSolution", "Terms", "TwoWaySolution"]


class Terms(Mapping[str, FloatArray]):
    """Parts of a light time by name, s: read-only, in order, and fit to be sent to another process."""

    def __init__(self, parts: Mapping[str, FloatArray]) -> None:
        self._parts = dict(parts)
        for value in self._parts.values():
            value.flags.writeable = False

    def __setstate__(self, state: Mapping[str, Mapping[str, FloatArray]]) -> None:
        Terms.__init__(self, state["_parts"])

    def __getitem__(self, name: str) -> FloatArray:
        return self._parts[name]

    def __iter__(self) -> Iterator[str]:
        return iter(self._parts)

    def __len__(self) -> int:
        return len(self._parts)

    def __repr__(self) -> str:
        return f"<Terms: {'; '.join(self._parts)}>"


@dataclass(frozen=True, eq=False)
class LinkSolution(FrozenArrays):
    """One-way links: light sent by the transmitter and met by the receiver. Arrays have the shape of the dates given.

    Attributes
    ----------
    transmit, receive : Instants
        TDB of both events; `transmit_on` and `receive_on` give other scales.
    ledger : mapping of str to float array
        Each part of the light time by name, s: the geometric range over c, then the gravitational delays.
    range_m : float array
        Length of the straight line from the transmitter at `transmit` to the receiver at `receive`, m (TDB-compatible).
    range_rate_m_s : float array
        Derivative of `range_m` by the TDB of reception, m/s.
    light_time_rate : float array
        Derivative of the light time by the TDB of reception, gravitation included.
    transmit_elevation_deg, receive_elevation_deg : float array or None
        Elevation of the other end above the horizon of an end on the ground (geometric with aberration, no
        refraction), degrees; None for an end that does not stand on a body.
    occulted : bool array
        Where the line passes through a body, or an end on the ground has the other below its horizon. All False
        unless `occultation="ignore"` was asked for, since it is an error otherwise.
    iterations : int
        Newton steps taken.
    """

    transmit: Instants
    receive: Instants
    ledger: Mapping[str, FloatArray]
    range_m: FloatArray
    range_rate_m_s: FloatArray
    light_time_rate: FloatArray
    transmit_elevation_deg: FloatArray | None
    receive_elevation_deg: FloatArray | None
    occulted: BoolArray
    iterations: int
    _ends: tuple[End, End] = field(repr=False)
    _reference: ReferenceData = field(repr=False)
    _clocks: tuple[ClockLog, ...] = field(repr=False)
    _given: Instants | None = field(repr=False)
    """The dates as they were given, if those of this leg were."""

    @property
    def ends(self) -> tuple[str, str]:
        """Names of the transmitter and the receiver."""
        return self._ends[0].name, self._ends[1].name

    @property
    def light_time_exact(self) -> Pair:
        """Light time, s of TDB, as (int64 seconds, float64 fraction in [0, 1)): the exact sum of the ledger."""
        total: Pair = (np.zeros(self.range_m.shape, dtype=np.int64), np.zeros(self.range_m.shape))
        for value in self.ledger.values():
            total = exact.add_seconds(total, value)
        return total

    @property
    def light_time_s(self) -> FloatArray:
        """Light time, s of TDB, rounded once."""
        return exact.seconds(self.light_time_exact)

    @property
    def frequency_ratio(self) -> FloatArray:
        """Frequency received over frequency sent, both counted in TDB: dt_transmit / dt_receive."""
        return 1.0 - self.light_time_rate

    def transmit_on(self, scale: str) -> Instants:
        """Dates of transmission on another scale, at the transmitter.

        Raises
        ------
        ScaleMismatch
            TT, UTC and their kin for an end far from the Earth; scales that do not date a link.
        MissingPiece
            A clock, laboratory or TT(BIPM) scale whose table was not given.
        """
        return dates_on(self.transmit.pair, scale, self._ends[0], self._reference, self._clocks)

    def receive_on(self, scale: str) -> Instants:
        """Dates of reception on another scale, at the receiver; see `transmit_on`."""
        return dates_on(self.receive.pair, scale, self._ends[1], self._reference, self._clocks)

    @property
    def notes(self) -> tuple[str, ...]:
        """What a reader should know: Earth orientation predicted or held, dates past the leap-second table's expiry."""
        return worded(self._flags())

    def _flags(self) -> dict[str, BoolArray]:
        """What each note says, and of which links of the flattened batch."""
        found: dict[str, BoolArray] = {}
        if self._given is not None:
            kind = Scale.parse(self._given.scale)
            if kind.utc_labels:
                whole, fraction = self._given.ravel().pair
                found |= leap_second_flags((whole - kind.label_offset_s, fraction), self._reference)
        for end, event in zip(self._ends, (self.transmit, self.receive), strict=True):
            if end.uses_earth_orientation:
                # TT of the geocentre is 2 us from that of the event: nothing to rows of a day.
                tt = tt_from_tdb(event.ravel().pair, self._reference)
                found = _either(found, orientation_flags(tai_from_tt(tt), self._reference))
        return found

    def table(self, row: int = 0) -> str:
        """A readable account of one link (`row` counts along the flattened array), with its notes.

        Raises
        ------
        InvalidInput
            No whole number, or no such row.
        """
        size = self.range_m.size
        if isinstance(row, bool) or not hasattr(row, "__index__"):
            raise InvalidInput(f"row is a whole number, got {row!r:.60}")
        row = row.__index__()
        if not -size <= row < size:
            raise InvalidInput(f"row {row} is not among the {size} links of this solution")
        lines = [(name, decimal_text(exact.from_seconds(value.ravel()[row]))) for name, value in self.ledger.items()]
        whole, fraction = self.light_time_exact
        total = decimal_text((whole.ravel()[row], fraction.ravel()[row]))
        width, digits = max(len(name) for name, _ in lines), max(len(total), max(len(text) for _, text in lines))
        head = [f"transmit  {self.transmit.ravel()[row].to_iso(12)}  TDB  {self._ends[0].name}"]
        head += [f"receive   {self.receive.ravel()[row].to_iso(12)}  TDB  {self._ends[1].name}"]
        head += ["", f"{'term':<{width}}  {'seconds':>{digits}}", f"{'-' * width}  {'-' * digits}"]
        body = [f"{name:<{width}}  {text:>{digits}}" for name, text in lines]
        foot = [f"{'-' * width}  {'-' * digits}", f"{'light time':<{width}}  {total:>{digits}}"]
        notes = [f"note: this link's instants {words}" for words, mask in self._flags().items() if mask[row]]
        return "\n".join([*head, *body, *foot, *([""] if notes else []), *notes])


@dataclass(frozen=True, eq=False)
class TwoWaySolution(FrozenArrays):
    """Light from a station to a target and back.

    Attributes
    ----------
    up, down : LinkSolution
        Both legs.
    turnaround_s : float array
        TDB seconds between reception and transmission at the target.
    """

    up: LinkSolution
    down: LinkSolution
    turnaround_s: FloatArray

    @property
    def transmit(self) -> Instants:
        """TDB of transmission at the station."""
        return self.up.transmit

    @property
    def bounce(self) -> Instants:
        """TDB of reception at the target."""
        return self.up.receive

    @property
    def receive(self) -> Instants:
        """TDB of reception at the station."""
        return self.down.receive

    def transmit_on(self, scale: str) -> Instants:
        """Dates of transmission on another scale; see `LinkSolution.transmit_on`."""
        return self.up.transmit_on(scale)

    def bounce_on(self, scale: str) -> Instants:
        """Dates of reception at the target on another scale."""
        return self.up.receive_on(scale)

    def receive_on(self, scale: str) -> Instants:
        """Dates of reception at the station on another scale."""
        return self.down.receive_on(scale)

    @property
    def round_trip_s(self) -> FloatArray:
        """TDB seconds from transmission to reception at the station, turnaround included."""
        return self.receive.minus(self.transmit)

    def round_trip_on(self, scale: str) -> FloatArray:
        """Seconds of another scale from transmission to reception: what a clock that keeps it at the station counts.

        Raises
        ------
        ScaleMismatch, MissingPiece
            As `LinkSolution.transmit_on`.
        """
        return self.receive_on(scale).minus(self.transmit_on(scale))

    @property
    def round_trip_tt_s(self) -> FloatArray:
        """TT seconds from transmission to reception at the station."""
        return self.round_trip_on("TT")

    @property
    def ledger(self) -> Mapping[str, FloatArray]:
        """Every part of the round trip by name, s of TDB."""
        parts = {f"up: {name}": value for name, value in self.up.ledger.items()}
        parts["turnaround"] = self.turnaround_s
        parts.update({f"down: {name}": value for name, value in self.down.ledger.items()})
        return Terms(parts)

    @property
    def notes(self) -> tuple[str, ...]:
        """Notes of both legs; see `LinkSolution.notes`."""
        return worded(_either(self.up._flags(), self.down._flags()))

    @property
    def occulted(self) -> BoolArray:
        """Where either leg passes through a body or the ground."""
        return self.up.occulted | self.down.occulted


def _either(one: dict[str, BoolArray], other: dict[str, BoolArray]) -> dict[str, BoolArray]:
    """Flags set in either."""
    return {**one, **{words: np.asarray(mask | one.get(words, False)) for words, mask in other.items()}}


def decimal_text(value: Pair) -> str:
    """Signed decimal seconds to 1 fs from one exact pair."""
    femto = int(value[0]) * 10**15 + round(float(value[1]) * 1e15)
    return f"{'-' if femto < 0 else ''}{abs(femto) // 10**15}.{abs(femto) % 10**15:015d}"
