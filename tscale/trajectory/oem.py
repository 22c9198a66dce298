"""The CCSDS Orbit Ephemeris Message (CCSDS 502.0-B, chapters 5 and 8), in key-value (KVN) and XML form.

Understood: versions 1.0 to 3.0; several segments; TIME_SYSTEM UTC, TAI, TT, TDB, TCB, TCG and GPS; REF_FRAME ICRF,
GCRF, EME2000 and ITRF (any year); CENTER_NAME of any body of a planetary ephemeris; USEABLE_START_TIME and
USEABLE_STOP_TIME; INTERPOLATION HERMITE and LAGRANGE with their degree. Accelerations and covariances are skipped.
Anything else is an error with its line.

A segment about the Earth that is not dated in TDB or TCB is taken as geocentric, with TT-compatible lengths. Every
other one is an offset on ICRF axes with TDB-compatible lengths, and its TT is that of the geocentre.
"""

from __future__ import annotations

import re
from itertools import pairwise
from pathlib import Path
from typing import Any, Final

import numpy as np

from ..ephemeris.arguments import file_path
from ..errors import DataFileError, InvalidInput, TscaleError
from ..exact import FloatArray, Pair
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from .dates import Counts, NativeScale, counts_of, since
from .knots import Knots, Method, check_degree
from .makers import EARTH
from .oem_text import OEMSegment, read_segments
from .pieces import Axes, Piece

__all__ = ["read_oem"]

_TIME_SYSTEMS: Final = ("UTC", "TAI", "TT", "TDB", "TCB", "TCG", "GPS")
_MOST_DIGITS: Final = 4
_ITRF: Final = re.compile(r"ITRF(-?\d{2}|-?\d{4})?\Z")
_CENTERS: Final = {
    "SOLAR SYSTEM BARYCENTER": 0,
    "SSB": 0,
    "SUN": 10,
    "EARTH": EARTH,
    "MOON": 301,
    "EARTH BARYCENTER": 3,
    "EARTH-MOON BARYCENTER": 3,
    "MERCURY": 1,
    "VENUS": 2,
    # The planet itself stays within 0.2 m of its system's centre of mass, which planetary kernels hold.
    "MARS": 4,
    "MARS BARYCENTER": 4,
    "JUPITER": 599,
    "JUPITER BARYCENTER": 5,
    "SATURN": 699,
    "SATURN BARYCENTER": 6,
    "URANUS": 799,
    "URANUS BARYCENTER": 7,
    "NEPTUNE": 899,
    "NEPTUNE BARYCENTER": 8,
    "PLUTO": 999,
    "PLUTO BARYCENTER": 9,
}
# Offsets dalpha0, xi0, eta0 of the mean equinox and pole of J2000.0 from the GCRS, mas: TN36 chapter 5, frame bias.
_BIAS_MAS: Final = (-14.6, -16.6170, -6.8192)


def read_oem(
    path: Any, degree: int | None, eme2000: str, leap_seconds: LeapSeconds | None
) -> tuple[str, NativeScale, bool, tuple[Piece, ...], Path]:
    """Name, scale, kind, pieces and path; see `Trajectory.from_oem`."""
    if eme2000 not in ("icrf", "mean_equator"):
        raise InvalidInput(f"eme2000 is 'icrf' or 'mean_equator', got {eme2000!r}")
    if leap_seconds is not None and not isinstance(leap_seconds, LeapSeconds):
        raise InvalidInput(f"leap_seconds must be LeapSeconds, got {leap_seconds!r}: use LeapSeconds.load for a path")
    if degree is not None:
        check_degree(degree)
    path = file_path(path, "an orbit ephemeris message")
    segments = read_segments(path)
    names = {segment.need("OBJECT_NAME") for segment in segments}
    if len(names) > 1:
        raise DataFileError(
            f"{path} holds several objects ({', '.join(sorted(names))}): an orbit ephemeris message is of one",
            path=path,
        )
    readers = [_Reader(segment, degree, eme2000, leap_seconds) for segment in segments]
    first = readers[0]
    pieces = []
    for reader in readers:
        if (reader.scale, reader.geocentric) != (first.scale, first.geocentric):
            raise reader.error(
                "TIME_SYSTEM",
                "the segments mix orbits about the Earth with others, or TDB with other scales: write one file each",
            )
        pieces.append(reader.piece())
    for reader, (earlier, later) in zip(readers[1:], pairwise(pieces), strict=True):
        if earlier.last is not None and later.first is not None and since(later.first, earlier.last) < 0:
            raise reader.error(
                "START_TIME",
                "its usable span starts before that of the segment above ends: set USEABLE_START_TIME and "
                "USEABLE_STOP_TIME so that they do not overlap, in the order of time",
            )
    return names.pop(), first.scale, first.geocentric, tuple(pieces), path


class _Reader:
    """One segment on the way to a piece."""

    def __init__(self, segment: OEMSegment, degree: int | None, eme2000: str, leap_seconds: LeapSeconds | None) -> None:
        self._segment = segment
        self._degree = degree
        self._leap_seconds = leap_seconds
        self._system = self._one_of("TIME_SYSTEM", _TIME_SYSTEMS)
        center = segment.need("CENTER_NAME").upper().replace("_", " ")
        if center not in _CENTERS:
            raise self.error("CENTER_NAME", f"{center!r} is not a body known here; known are {', '.join(_CENTERS)}")
        self._center = _CENTERS[center]
        self.scale: NativeScale = "TDB" if self._system in ("TDB", "TCB") else "TT"
        self.geocentric = self._center == EARTH and self.scale == "TT"
        frame = segment.need("REF_FRAME").upper()
        self._bias = frame == "EME2000" and eme2000 == "mean_equator"
        self._axes: Axes = "ITRS" if _ITRF.match(frame) else "ICRF"
        if self._axes == "ICRF" and frame not in ("ICRF", "GCRF", "EME2000"):
            raise self.error(
                "REF_FRAME", f"{frame!r} is not understood; allowed are ICRF, GCRF, EME2000 and ITRF: rotate the states"
            )
        if (self._axes == "ITRS" or frame == "GCRF") and self._center != EARTH:
            raise self.error("REF_FRAME", f"{frame} goes with CENTER_NAME = EARTH only, got {center}")
        if self._axes == "ITRS" and not self.geocentric:
            raise self.error("TIME_SYSTEM", f"{frame} states are dated in UTC, TAI, TT, TCG or GPS, got {self._system}")

    def error(self, key: str, message: str) -> DataFileError:
        """Return the error that names file, line and keyword."""
        path, row = self._segment.path, self._segment.row_of(key)
        return DataFileError(f"{path}, line {row}: {key}: {message}", path=path, row=row)

    def _one_of(self, key: str, allowed: tuple[str, ...]) -> str:
        value = self._segment.need(key).upper()
        if value not in allowed:
            raise self.error(key, f"{value!r} is not understood; allowed are {', '.join(allowed)}")
        return value

    def piece(self) -> Piece:
        """Interpolate the states and bound them by the usable span."""
        segment = self._segment
        dates = self._dates(segment.epochs, segment.rows)
        states = segment.states_km * 1e3
        position, velocity = states[:, :3] * dates.length, states[:, 3:]
        if self._bias:
            rotation = _mean_equator_to_icrf()
            position, velocity = position @ rotation.T, velocity @ rotation.T
        method, degree = self._interpolation()
        name = segment.need("OBJECT_NAME")
        try:
            knots = Knots(dates.pair, position, velocity, method, degree, name)
        except InvalidInput as error:
            row = segment.rows[0] if error.mask is None else segment.rows[int(np.argmax(error.mask))]
            raise DataFileError(f"{segment.path}, line {row}: {error}", path=segment.path, row=row) from error
        start = self._bound("USEABLE_START_TIME", "START_TIME")
        stop = self._bound("USEABLE_STOP_TIME", "STOP_TIME")
        # States may begin later or end earlier than the message says: nothing is extrapolated.
        first = start if since(start, knots.first) > 0 else knots.first
        last = stop if since(stop, knots.last) < 0 else knots.last
        if since(last, first) < 0:
            raise self.error("START_TIME", "no state lies within the usable span of this segment")
        return Piece(knots, self._center, self._axes, first, last)

    def _interpolation(self) -> tuple[Method, int]:
        method: Method = "hermite"
        if "INTERPOLATION" in self._segment.facts:
            method = "lagrange" if self._one_of("INTERPOLATION", ("HERMITE", "LAGRANGE")) == "LAGRANGE" else "hermite"
        if self._degree is not None:
            return method, self._degree
        if "INTERPOLATION_DEGREE" not in self._segment.facts:
            return method, 7
        text = self._segment.need("INTERPOLATION_DEGREE")
        if not text.isascii() or not text.isdigit():
            raise self.error("INTERPOLATION_DEGREE", f"{text!r} is not a whole number")
        if len(text) > _MOST_DIGITS:
            raise self.error("INTERPOLATION_DEGREE", f"{text[:20]}... has {len(text)} digits: no such polynomial")
        degree = int(text)
        # A Hermite polynomial through whole states has an odd degree: an even one is raised by one.
        return method, degree + 1 if method == "hermite" and degree % 2 == 0 else degree

    def _bound(self, usable: str, plain: str) -> Pair:
        key = usable if usable in self._segment.facts else plain
        pair = self._dates([self._segment.need(key)], [self._segment.row_of(key)]).pair
        return pair[0][0], pair[1][0]

    def _dates(self, texts: list[str], rows: list[int]) -> Counts:
        if self._system != "UTC":
            texts = [text.removesuffix("Z") for text in texts]
        try:
            return counts_of(Instants.from_iso(texts, self._system, leap_seconds=self._leap_seconds))
        except TscaleError as error:
            row = rows[0] if error.mask is None else rows[int(np.argmax(error.mask))]
            raise DataFileError(
                f"{self._segment.path}, line {row}: {error}", path=self._segment.path, row=row
            ) from error


def _mean_equator_to_icrf() -> FloatArray:
    """Transpose the frame bias matrix B = R1(-eta0) R2(xi0) R3(dalpha0) of TN36 chapter 5."""
    da, xi, eta = (value * np.pi / 648000e3 for value in _BIAS_MAS)

    def turn(axis: int, angle: float) -> FloatArray:
        i, j = (axis + 1) % 3, (axis + 2) % 3
        matrix = np.eye(3)
        matrix[i, i] = matrix[j, j] = np.cos(angle)
        matrix[i, j], matrix[j, i] = np.sin(angle), -np.sin(angle)
        return matrix

    return (turn(0, -eta) @ turn(1, xi) @ turn(2, da)).T
