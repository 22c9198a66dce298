"""What trajectories are made from: tables of states, orbital elements, SPK kernels."""

from __future__ import annotations

from pathlib import Path
from typing import Any, Final, TypeAlias

import numpy as np

from ..constants import GM_M3_S2, L_B, L_G
from ..ephemeris import Ephemeris, body_id, body_name
from ..ephemeris.daf import read_container
from ..ephemeris.segments import read_segments
from ..errors import InvalidInput, MissingPiece
from ..instants import Instants
from .arguments import check_dates, number, numbers
from .dates import NativeScale, counts_of
from .kepler import KeplerOrbit
from .knots import Knots, Method
from .pieces import Piece, segment_pieces

__all__ = ["EARTH", "Parts", "kepler_parts", "spk_parts", "states_parts"]

EARTH: Final = 399
_GM_TT_PER_TDB: Final = float((1 - L_G) / (1 - L_B))  # GM/x keeps its value between the scales

Parts: TypeAlias = tuple[NativeScale, bool, tuple[Piece, ...]]
"""Scale of the dates, whether geocentric in kind, the pieces."""


def states_parts(
    t: Instants,
    position_m: Any,
    velocity_m_s: Any,
    frame: str,
    center: str | int | None,
    method: Method,
    degree: int,
    name: str,
) -> Parts:
    """See `Trajectory.from_states`."""
    if frame not in ("GCRS", "ITRS", "BCRS"):
        raise InvalidInput(f"unknown frame {frame!r}; known are GCRS, ITRS and BCRS")
    geocentric = frame != "BCRS"
    if geocentric and center is not None:
        raise InvalidInput(
            f"center={center!r} goes with frame='BCRS' only: {frame} states are from the centre of the Earth. Leave it "
            "out, or give ICRF axes about that centre as frame='BCRS' dated in TDB or TCB"
        )
    check_dates(t, "the dates of states", geocentric=geocentric)
    counts = counts_of(t)
    if geocentric != (counts.scale == "TT"):
        allowed = "TT, TCG, TAI, UTC, GPS ..." if geocentric else "TDB or TCB"
        raise InvalidInput(
            f"the dates of {frame} states are {t.scale}; allowed are {allowed}: convert them with tscale.chain first"
        )
    position = numbers(position_m, "position_m") * counts.length
    knots = Knots(counts.pair, position, numbers(velocity_m_s, "velocity_m_s"), method, degree, name)
    origin = EARTH if geocentric else body_id(0 if center is None else center)
    piece = Piece(knots, origin, "ITRS" if frame == "ITRS" else "ICRF", knots.first, knots.last)
    return counts.scale, geocentric, (piece,)


def kepler_parts(epoch: Instants, elements: dict[str, float], center: str | int, gm_m3_s2: float | None) -> Parts:
    """See `Trajectory.from_kepler`; `elements` are a (m), e and four angles in degrees."""
    body = body_id(center)
    geocentric = body == EARTH
    check_dates(epoch, "the epoch of an orbit", geocentric=geocentric)
    if epoch.size != 1:
        raise InvalidInput(f"an orbit has one epoch, got {epoch.size} instants")
    counts = counts_of(epoch)
    if geocentric != (counts.scale == "TT"):
        allowed = "TT, TCG, TAI, UTC, GPS ..." if geocentric else "TDB or TCB"
        raise InvalidInput(
            f"the epoch of an orbit about {body_name(body)} is {epoch.scale}; allowed are {allowed}: convert it with "
            "tscale.chain first"
        )
    if gm_m3_s2 is None:
        known = {3: GM_M3_S2[399] + GM_M3_S2[301], **GM_M3_S2}
        if body not in known:
            raise InvalidInput(f"no mass parameter known for {body_name(body)}; give gm_m3_s2")
        gm_m3_s2 = known[body] * (_GM_TT_PER_TDB if geocentric else 1.0)
    a_m, e, *angles = (number(value, name) for name, value in elements.items())
    at = (counts.pair[0].reshape(()), counts.pair[1].reshape(()))
    gm_m3_s2 = number(gm_m3_s2, "gm_m3_s2")
    orbit = KeplerOrbit(at, gm_m3_s2, a_m * counts.length, e, *(float(x) for x in np.radians(angles)))
    return counts.scale, geocentric, (Piece(orbit, body, "ICRF", None, None),)


def spk_parts(path: Any, target: int) -> tuple[str, NativeScale, bool, tuple[Piece, ...], Path]:
    """See `Trajectory.from_spk`; the name comes first and the path last."""
    kernel = Ephemeris.open(path)
    number = body_id(target)
    pieces = segment_pieces(kernel, read_segments(read_container(kernel.path)), number)
    if not pieces:
        raise MissingPiece(
            f"{kernel.name} has no segment of {body_name(number)}; it holds "
            f"{', '.join(body_name(b) for b in kernel.bodies)}",
            path=kernel.path,
        )
    return f"{body_name(number)} of {kernel.name}", "TDB", False, pieces, kernel.path
