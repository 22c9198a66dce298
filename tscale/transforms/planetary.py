"""Time on other bodies: their coordinate times, clocks on their surfaces, and what these do against the Earth's.

`coordinate_time` is the time of any body of the ephemeris; `surface_rate_terms` the rate of a clock on one, part by
part; `coordinate_time_terms` and `surface_clock_summary` say what both come to over years: secular rate, periodic
terms, yearly variation.
"""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any, Final, Literal, NamedTuple, TypeAlias

import numpy as np

from .. import exact
from ..constants import C_M_S, DAY_S, L_B
from ..counts import fixed_count, tdb_from_tcb
from ..earth.moving import TT_PER_TCG
from ..ephemeris.bodies import body_name
from ..ephemeris.body_time import BodyTimeEphemeris
from ..errors import InvalidInput
from ..exact import FloatArray, Pair
from ..instants import Instants
from ..scales import Scale
from ..surface import SurfaceSite
from ..tables.reference import ReferenceData
from .body_events import (
    PositionTerms,
    body_time_from_tdb,
    body_time_rate,
    coordinate_time,
    position_rate,
    position_terms,
    tdb_from_body_time,
)
from .periodic import LUNAR_PERIODS_D, MARTIAN_PERIODS_D, PeriodicFit, PeriodicTerm, fit_periodic
from .surface_clock import (
    Simultaneity,
    SurfaceRateTerms,
    default_simultaneity,
    simultaneity_rate,
    surface_proper_rate,
    surface_rate_terms,
    surface_tide_m2_s2,
)

__all__ = [
    "PeriodicFit",
    "PeriodicTerm",
    "PositionTerms",
    "SurfaceClockSummary",
    "SurfaceRateTerms",
    "body_time_from_tdb",
    "body_time_rate",
    "coordinate_time",
    "coordinate_time_terms",
    "fit_periodic",
    "position_rate",
    "position_terms",
    "simultaneity_rate",
    "surface_clock_summary",
    "surface_proper_rate",
    "surface_rate_terms",
    "surface_tide_m2_s2",
    "tdb_from_body_time",
]

Compared: TypeAlias = Literal["TT", "TDB", "TCB"]

_US_PER_DAY: Final = DAY_S * 1e6
_PERIODS_D: Final[Mapping[int, Mapping[str, float]]] = {301: LUNAR_PERIODS_D, 4: MARTIAN_PERIODS_D}
_YEAR_D: Final[Mapping[int, float]] = {1: 87.969, 2: 224.701, 4: 686.980, 301: 365.256}
"""Sidereal year of a body in days, by which its yearly variation is told; the Moon's is the Earth's."""


def coordinate_time_terms(
    body: str | int,
    reference: ReferenceData,
    start: str | Instants,
    stop: str | Instants,
    *,
    against: Compared = "TT",
    simultaneity: Simultaneity | None = None,
    periods_d: Mapping[str, float] | None = None,
    step_d: float = 1.0,
    potential_m2_s2: float = 0.0,
) -> PeriodicFit:
    """Secular rate and periodic terms of a body's coordinate time, at its centre, against TT, TDB or TCB.

    Parameters
    ----------
    body : str or int
        "moon" for TCL.
    reference : ReferenceData
    start, stop : str or Instants
        Dates as ISO 8601 in TDB, or one instant each on TDB, TCB, TT, TAI, UTC ...
    against : {"TT", "TDB", "TCB"}
    simultaneity : {"TT", "TDB"}, optional
        Which TT goes with an event at the body's centre: its own (default for the Moon), or that of the geocentre at
        the same TDB (default elsewhere), which at the Moon shows the position term, 128 us with the synodic month.
    periods_d : mapping, optional
        Period in days by name; default: those known for the Moon and Mars that come round in the span.
    step_d : float
        Distance of the dates used, days.
    potential_m2_s2 : float
        Of a clock at rest in the body's own potential: 2821713.3 (`REFERENCE_POTENTIAL_M2_S2`) makes proper time on the
        selenoid (TL) of TCL.

    Raises
    ------
    InvalidInput
        Dates that are none or not in order, periods that the span cannot tell apart, a body without a list of periods.
    ScaleMismatch
        `simultaneity="TT"` farther than 1e10 m from the Earth.
    OutOfSpan
        Where the ephemeris does not reach.
    """
    time = coordinate_time(body, reference)
    tdb, elapsed_s = _grid(start, stop, step_d)
    if periods_d is None:
        periods_d = _periods_for(time.body, float(elapsed_s[-1]) / DAY_S)
    difference = _difference_s(time, tdb, elapsed_s, reference, against, simultaneity, potential_m2_s2)
    return fit_periodic(elapsed_s, difference, periods_d)


class SurfaceClockSummary(NamedTuple):
    """What a clock on another body does against a scale over years; rates dimensionless, `us_per_day` of them.

    Attributes
    ----------
    mean_rate : float
        Gained in the whole span over its length: the average over time.
    lowest_rate, highest_rate : float
        Of the rate once a day, the turning of the body left out: as of a clock at the body's centre with the potential
        of the surface.
    yearly_variation : float array
        Highest minus lowest rate in each whole year of the body.
    fit : PeriodicFit or None
        Periodic terms of the accumulated difference; None for a body without a list of periods.
    """

    mean_rate: float
    lowest_rate: float
    highest_rate: float
    yearly_variation: FloatArray
    fit: PeriodicFit | None

    def table(self) -> str:
        """All of it as lines of text, in microseconds per day."""
        lines = [
            f"mean rate    {self.mean_rate * _US_PER_DAY:+10.4f} us/day",
            f"lowest       {self.lowest_rate * _US_PER_DAY:+10.4f} us/day",
            f"highest      {self.highest_rate * _US_PER_DAY:+10.4f} us/day",
        ]
        if self.yearly_variation.size:
            yearly = self.yearly_variation * _US_PER_DAY
            lines.append(f"in a year    {yearly.mean():10.4f} us/day ({yearly.min():.4f} to {yearly.max():.4f})")
        return "\n".join(lines if self.fit is None else [*lines, self.fit.table()])


def surface_clock_summary(
    site: SurfaceSite,
    reference: ReferenceData,
    start: str | Instants,
    stop: str | Instants,
    *,
    against: Compared = "TT",
    simultaneity: Simultaneity | None = None,
    periods_d: Mapping[str, float] | None = None,
) -> SurfaceClockSummary:
    """Mean, extremes, yearly variation and periodic terms of the rate of a clock on another body.

    Against TT that is the rate against a clock on the geoid. For a mean that stands for long, span whole years of
    the body and of the Earth.

    Parameters
    ----------
    site : SurfaceSite
    reference : ReferenceData
    start, stop : str or Instants
        As `coordinate_time_terms`.
    against : {"TT", "TDB", "TCB"}
    simultaneity, periods_d
        As `coordinate_time_terms`.

    Raises
    ------
    InvalidInput, MissingPiece, OutOfSpan
        As `surface_rate_terms` and `coordinate_time_terms`.
    """
    tdb, elapsed_s = _grid(start, stop, 1.0)
    time = coordinate_time(site.body, reference)
    # The tide of the others is all but constant on the Moon and nothing elsewhere.
    tide = surface_tide_m2_s2(site, tdb, reference)
    potential = site.gravity_potential_m2_s2() + float(np.mean(tide))
    difference = _difference_s(time, tdb, elapsed_s, reference, against, simultaneity, potential)
    rate = np.diff(difference) / np.diff(elapsed_s)
    length = round(_YEAR_D[time.body])
    years = [rate[i : i + length] for i in range(0, rate.size - length + 1, length)]
    if periods_d is None and time.body in _PERIODS_D:
        periods_d = _periods_for(time.body, float(elapsed_s[-1]) / DAY_S)
    return SurfaceClockSummary(
        float((difference[-1] - difference[0]) / elapsed_s[-1]),
        float(rate.min()),
        float(rate.max()),
        np.array([float(np.ptp(year)) for year in years]),
        None if periods_d is None else fit_periodic(elapsed_s, difference, periods_d),
    )


def _difference_s(
    time: BodyTimeEphemeris,
    tdb: Pair,
    elapsed_s: FloatArray,
    reference: ReferenceData,
    against: str,
    simultaneity: Simultaneity | None,
    potential_m2_s2: float,
) -> FloatArray:
    """A body's time (slowed by a potential) minus another, s, but for a constant; without products of rates (1e-17)."""
    difference = time.minus_tdb_s(tdb) - elapsed_s * (potential_m2_s2 / C_M_S**2)
    if against == "TT":
        difference = difference - reference.time_ephemeris.tt_minus_tdb_s(tdb)
        if (simultaneity or default_simultaneity(time.body)) == "TT":
            geocentric = body_time_from_tdb(tdb, "earth", reference, time.body)
            centre = body_time_from_tdb(tdb, "earth", reference)
            difference = difference - exact.seconds(exact.subtract(geocentric, centre)) * TT_PER_TCG
        return np.asarray(difference)
    if against == "TCB":
        return np.asarray(difference - elapsed_s * float(L_B / (1 - L_B)))
    if against == "TDB":
        return difference
    raise InvalidInput(f"a body's coordinate time is compared with TT, TDB or TCB, got {against!r:.40}")


def _periods_for(body: int, span_d: float) -> Mapping[str, float]:
    """Known periods of a body that come round in a span; of two that it cannot tell apart the first in the list."""
    if body not in _PERIODS_D:
        raise InvalidInput(
            f"no list of periods for {body_name(body)}; known are the Moon and Mars: give periods_d={{name: days}}"
        )
    kept: dict[str, float] = {}
    for name, period in _PERIODS_D[body].items():
        cycles = span_d / period
        if cycles >= 1.0 and all(abs(cycles - span_d / other) >= 0.5 for other in kept.values()):
            kept[name] = period
    return kept


def _grid(start: str | Instants, stop: str | Instants, step_d: float) -> tuple[Pair, FloatArray]:
    """TDB counts from start to stop in equal steps, and the seconds since the first."""
    first, last = _tdb(start, "start"), _tdb(stop, "stop")
    span_s = last - first
    if not (np.isfinite(step_d) and step_d > 0.0) or not span_s >= 2.0 * step_d * DAY_S:
        raise InvalidInput(
            f"start, stop and step_d must leave two steps or more, got {span_s / DAY_S:g} d in steps of {step_d!r} d"
        )
    number = int(span_s / (step_d * DAY_S))
    elapsed = np.rint(np.arange(number + 1) * (step_d * DAY_S)).astype(np.int64)
    return (first + elapsed, np.zeros(number + 1)), elapsed.astype(np.float64)


def _tdb(date: Any, what: str) -> int:
    """A date as a whole TDB count."""
    if isinstance(date, str):
        date = Instants.from_iso(date, "TDB")
    if not isinstance(date, Instants) or date.size != 1:
        raise InvalidInput(f"{what} is a date as ISO 8601 in TDB or one Instants, got {date!r:.60}")
    pair = (date.whole.reshape(())[()], date.fraction.reshape(())[()])
    if date.scale == "TCB":
        pair = tdb_from_tcb((np.asarray(pair[0]), np.asarray(pair[1])))
    elif date.scale != "TDB":
        scale = Scale.parse(date.scale)
        if scale.count_minus_tai is None:
            raise InvalidInput(f"{what} is on {date.scale}: give it on TDB, TCB, TT, TAI, UTC or a GNSS scale")
        # TT and TDB differ by 2 ms; the grid is of whole seconds.
        pair = fixed_count((np.asarray(pair[0]), np.asarray(pair[1])), scale, Scale.parse("TT"))
    return int(pair[0])
