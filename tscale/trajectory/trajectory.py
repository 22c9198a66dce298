"""Where a moving clock is: a spacecraft, an orbiting observatory, a planned orbit."""

from __future__ import annotations

import os
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import TYPE_CHECKING, Literal

import numpy as np
import numpy.typing as npt

from .. import exact
from ..earth.moving import bcrs_state, gcrs_state, tt_from_tdb_at_geocentre
from ..earth.rotation import gcrs_state_from_itrs
from ..ephemeris.chebyshev import broadcast_pair
from ..errors import OutOfSpan
from ..exact import FloatArray, IntArray, Pair
from ..instants import Instants
from .arguments import check_name
from .dates import NativeScale
from .knots import Method
from .makers import kepler_parts, spk_parts, states_parts
from .pieces import Piece, cover_words, piece_numbers

if TYPE_CHECKING:
    from ..formats.leap_seconds import LeapSeconds
    from ..tables.reference import ReferenceData

__all__ = ["Trajectory"]

_State = tuple[FloatArray, FloatArray]


@dataclass(frozen=True, eq=False)
class Trajectory:
    """Positions and velocities of something that moves, at any date of a span.

    Make one with `from_states`, `from_kepler`, `from_oem`, `from_spk` or `from_flight`.

    A trajectory is *geocentric* (about the Earth, dated in TT, lengths TT-compatible, GCRS or ITRS axes) or else
    *barycentric* in kind (about any centre, ICRF axes, lengths TDB-compatible). Both kinds answer `gcrs` and
    `state_bcrs`.

    Attributes
    ----------
    name : str
        For messages and ledgers.
    scale : {"TT", "TDB"}
        Scale of the dates inside, and of `span`. A barycentric kind dated in TT (an orbit about Mars tagged in UTC)
        is read at TT of the geocentre, the habit of those who make such files.
    geocentric : bool
    path : pathlib.Path or None
        File it came from.
    """

    name: str
    scale: NativeScale
    geocentric: bool
    pieces: tuple[Piece, ...]
    path: Path | None = None

    # ---- ways in ---------------------------------------------------------------------------------

    @classmethod
    def from_states(
        cls,
        t: Instants,
        position_m: npt.ArrayLike,
        velocity_m_s: npt.ArrayLike,
        frame: Literal["GCRS", "ITRS", "BCRS"] = "GCRS",
        *,
        center: str | int | None = None,
        method: Method = "hermite",
        degree: int = 7,
        name: str = "states",
    ) -> Trajectory:
        """Interpolate tabulated states.

        Parameters
        ----------
        t : Instants (n,)
            Dates, increasing. GCRS and ITRS: TT, TCG, TAI, UTC or a GNSS scale; BCRS: TDB or TCB. Lengths are
            compatible with the scale (those of TCG and TCB are rescaled). Their place, if stated, is TOPOCENTER or the
            origin of the frame.
        position_m, velocity_m_s : float array (n, 3)
            m and m/s; with ITRS the velocity is relative to the turning Earth.
        frame : {"GCRS", "ITRS", "BCRS"}
            Axes and origin.
        center : str or int, optional
            Origin of BCRS states: the barycentre (default) or any body of the ephemeris, with ICRF axes.
        method, degree : str, int
            `hermite` of odd degree (7 uses four states, 3 uses two), or `lagrange`.
        name : str

        Raises
        ------
        InvalidInput
            Shapes that do not fit, too few states, dates that do not increase, a scale, place or `center` that does
            not go with `frame`; velocities of c or more, or of another motion than the positions (mixed units).
        """
        return cls(check_name(name), *states_parts(t, position_m, velocity_m_s, frame, center, method, degree, name))

    @classmethod
    def from_kepler(
        cls,
        epoch: Instants,
        a_m: float,
        e: float,
        i_deg: float,
        node_deg: float,
        periapsis_deg: float,
        mean_anomaly_deg: float,
        center: str | int = "earth",
        *,
        gm_m3_s2: float | None = None,
        name: str = "orbit",
    ) -> Trajectory:
        """Build a two-body orbit for planning.

        Parameters
        ----------
        epoch : Instants, one instant
            About the Earth: TT, TCG, TAI, UTC or a GNSS scale; about another body: TDB or TCB.
        a_m : float
            Semi-major axis, m; negative for a hyperbola.
        e : float
            Eccentricity, below 1 or above 1.
        i_deg, node_deg, periapsis_deg, mean_anomaly_deg : float
            Inclination and right ascension of the node on the ICRF (GCRS) axes, argument of periapsis, and mean anomaly
            at the epoch, degrees.
        center : str or int
            Body that the orbit is about.
        gm_m3_s2 : float, optional
            Its mass parameter, compatible with TT about the Earth and with TDB elsewhere; default: DE440's (a planet
            named alone is its system).
        name : str

        Raises
        ------
        InvalidInput
            Elements out of range, an epoch on another scale, a body without a known mass.
        """
        elements = {"a_m": a_m, "e": e, "i_deg": i_deg, "node_deg": node_deg}
        elements |= {"periapsis_deg": periapsis_deg, "mean_anomaly_deg": mean_anomaly_deg}
        return cls(check_name(name), *kepler_parts(epoch, elements, center, gm_m3_s2))

    @classmethod
    def from_oem(
        cls,
        path: str | os.PathLike[str],
        *,
        degree: int | None = None,
        eme2000: Literal["icrf", "mean_equator"] = "icrf",
        leap_seconds: LeapSeconds | None = None,
    ) -> Trajectory:
        """Read a CCSDS Orbit Ephemeris Message (CCSDS 502.0-B), KVN or XML; see `oem` for what is understood.

        Parameters
        ----------
        path : path
        degree : int, optional
            Overrides INTERPOLATION_DEGREE of the message.
        eme2000 : {"icrf", "mean_equator"}
            What REF_FRAME = EME2000 stands for: the ICRF axes under their older name, as makers of planetary
            ephemerides write it, or the mean equator and equinox of J2000.0, which differs from them by 23 mas (0.8 m
            in a low orbit).
        leap_seconds : LeapSeconds, optional
            For dates in UTC.

        Raises
        ------
        DataFileError
            Damaged files, and frames, time systems, centres or interpolations that are not understood; with the line.
        """
        from .oem import read_oem

        return cls(*read_oem(path, degree, eme2000, leap_seconds))

    @classmethod
    def from_spk(cls, path: str | os.PathLike[str], target: int) -> Trajectory:
        """Take a body or spacecraft from an SPK kernel by its NAIF number.

        Each segment of the target is a piece about its own centre; where two cover a date the last in the file counts.

        Raises
        ------
        DataFileError
            For files that are no SPK kernel or hold data types that are not understood.
        MissingPiece
            If the kernel does not hold the target; the message lists what it holds.
        """
        return cls(*spk_parts(path, target))

    @classmethod
    def from_flight(
        cls, path: str | os.PathLike[str], *, scale: str = "UTC", leap_seconds: LeapSeconds | None = None
    ) -> Trajectory:
        """Read way points from a CSV file of `instant`, `lon_deg`, `lat_deg` and `height_m`; see `flight` for the way.

        Instants are ISO 8601 on `scale` (with `leap_seconds` for UTC), heights above the WGS84 ellipsoid.

        Raises
        ------
        DataFileError
            Damaged files, values out of range, instants that do not increase; with the line.
        """
        from .flight import read_flight

        return cls(*read_flight(path, scale, leap_seconds))

    # ---- facts -----------------------------------------------------------------------------------

    @property
    def span(self) -> tuple[float, float]:
        """First and last count on `scale`, s (infinite for an orbit from elements); pieces may leave gaps between."""
        spans = [piece.span for piece in self.pieces]
        return min(first for first, _ in spans), max(last for _, last in spans)

    def __repr__(self) -> str:
        kind = "geocentric" if self.geocentric else "barycentric"
        return f"<Trajectory {self.name!r} {kind}, {cover_words(self.pieces)} {self.scale}>"

    # ---- states ----------------------------------------------------------------------------------

    def state_bcrs(self, tdb: Pair, reference: ReferenceData) -> _State:
        """Barycentric position (m) and velocity (m/s), TDB-compatible, at TDB counts of any shape.

        A geocentric trajectory is carried over with the scale and Lorentz terms and the topocentric difference of its
        dates (`earth.moving`).

        Raises
        ------
        OutOfSpan
            Where the trajectory or the ephemeris does not reach (with the mask).
        """
        tdb = broadcast_pair(tdb)
        if self.geocentric:
            return bcrs_state(self, tdb, reference)

        def from_barycentre(piece: Piece, index: IntArray, r: FloatArray, v: FloatArray) -> _State:
            if piece.center == 0:
                return r, v
            at = (tdb[0].reshape(-1)[index], tdb[1].reshape(-1)[index])
            center_r, center_v = reference.ephemeris.state(piece.center, at)
            return center_r + r, center_v + v

        return self._assemble(self._own_count(tdb, reference), from_barycentre)

    def state_from_center(self, tdb: Pair, reference: ReferenceData) -> _State:
        """Position (m) and velocity (m/s) from the centre of each piece, not yet rounded by the centre's own place.

        For trajectories that are not geocentric; axes of the ICRF, TDB-compatible, at TDB counts of any shape.
        """
        return self._assemble(self._own_count(broadcast_pair(tdb), reference), lambda piece, index, r, v: (r, v))

    def _own_count(self, tdb: Pair, reference: ReferenceData) -> Pair:
        return tdb if self.scale == "TDB" else tt_from_tdb_at_geocentre(tdb, reference)

    def gcrs(self, tt: Pair, reference: ReferenceData) -> _State:
        """Geocentric position (m) and velocity (m/s) on the GCRS axes, TT-compatible, at TT counts of any shape.

        A barycentric kind is carried over by the inverse of the same terms; far from the Earth what they leave
        out grows as the square of the distance (1 mm at 10^5 km, 15 cm at 1.5 million km).

        Raises
        ------
        OutOfSpan
            Where the trajectory, the ephemeris or the Earth orientation does not reach (with the mask).
        """
        tt = broadcast_pair(tt)
        if not self.geocentric:
            return gcrs_state(lambda tdb: self.state_bcrs(tdb, reference), tt, reference)

        def from_geocentre(piece: Piece, index: IntArray, r: FloatArray, v: FloatArray) -> _State:
            if piece.axes == "ICRF":
                return r, v
            at = (tt[0].reshape(-1)[index], tt[1].reshape(-1)[index])
            return gcrs_state_from_itrs(r, v, at, reference)

        return self._assemble(tt, from_geocentre)

    def clip(self, tt: Pair) -> Pair:
        """TT counts moved into the span from the first to the last date, for iterations that start outside it.

        Trajectories dated in TDB are clipped 20 ms inside their ends, more than TT and TDB of one event differ by
        near the Earth.
        """
        return self._clipped(broadcast_pair(tt), 0.0 if self.scale == "TT" else 0.02)

    def clip_tdb(self, tdb: Pair, reference: ReferenceData) -> Pair:
        """TDB counts moved into the span, for a trajectory that is not geocentric."""
        own = self._own_count(broadcast_pair(tdb), reference)
        return exact.add(broadcast_pair(tdb), exact.subtract(self._clipped(own, 0.0), own))

    def _clipped(self, count: Pair, margin_s: float) -> Pair:
        whole, fraction = np.array(count[0]), np.array(count[1])
        for end, sign in ((self._end(0), 1), (self._end(1), -1)):
            if end is None:
                continue
            limit = exact.add_seconds(end, sign * margin_s)
            # Part by part: a difference of less than half an ulp of 1 s would round to nothing.
            outside = (sign * (whole - limit[0]) < 0) | ((whole == limit[0]) & (sign * (fraction - limit[1]) < 0.0))
            whole[outside], fraction[outside] = limit
        return whole, fraction

    @property
    def uses_earth_orientation(self) -> bool:
        """Whether any part of it is given in the ITRS."""
        return any(piece.axes == "ITRS" for piece in self.pieces)

    def _end(self, which: int) -> Pair | None:
        """The first (0) or last (1) date of all pieces; None if there is no end."""
        ends = [piece.first if which == 0 else piece.last for piece in self.pieces]
        known = [end for end in ends if end is not None]
        if len(known) < len(ends):
            return None
        return (min if which == 0 else max)(known, key=lambda end: (int(end[0]), float(end[1])))

    def _assemble(self, count: Pair, finish: Callable[[Piece, IntArray, FloatArray, FloatArray], _State]) -> _State:
        """Evaluate each piece at the counts that are its own; `finish` carries them to the frame asked for."""
        flat = (count[0].reshape(-1), count[1].reshape(-1))
        which = piece_numbers(self.pieces, flat)
        outside = which < 0
        if outside.any():
            raise OutOfSpan(
                f"{int(outside.sum())} of {outside.size} dates lie outside the trajectory {self.name!r}, which covers "
                f"{cover_words(self.pieces)} {self.scale}: leave them out (see the mask) or give a trajectory that "
                "reaches them",
                mask=outside.reshape(count[0].shape),
                path=self.path,
            )
        r, v = np.empty((which.size, 3)), np.empty((which.size, 3))
        for number, piece in enumerate(self.pieces):
            index = np.flatnonzero(which == number)
            if index.size:
                r[index], v[index] = finish(piece, index, *piece.motion.state((flat[0][index], flat[1][index])))
        shape = (*count[0].shape, 3)
        return r.reshape(shape), v.reshape(shape)
