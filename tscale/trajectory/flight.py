"""A flight: way points of longitude, latitude and height, and the way between them.

The file is CSV with a header of `instant`, `lon_deg`, `lat_deg` and `height_m` in any order (other columns are let be);
lines that start with `#` are comments. Instants are ISO 8601, in UTC unless another scale is said; longitudes east,
latitudes those of the ellipsoid's normal, heights above the WGS84 ellipsoid in metres: above 26 km, where no aircraft
flies, they are refused, above 16 km a warning asks whether they are feet.

Between two way points the normal of the ellipsoid turns in one plane at a constant rate (a great circle of directions,
1e-5 longer than the geodesic and up to 40 km beside it on the longest legs; past the date line and over the poles
alike), and the height changes at a constant rate. Position is continuous, velocity jumps at the way points; nothing
overshoots them. A leg of half a turn has no way of its own and is refused.
"""

from __future__ import annotations

import csv
import math
import warnings
from pathlib import Path
from typing import Any, Final, NamedTuple

import numpy as np

from ..constants import WGS84_A_M, WGS84_INVERSE_FLATTENING
from ..ephemeris.arguments import file_path
from ..errors import DataFileError, InvalidInput, TscaleError
from ..exact import BoolArray, FloatArray, Pair
from ..formats.leap_seconds import LeapSeconds
from ..instants import Instants
from ..storage import read_bytes
from .dates import NativeScale, counts_of, since
from .makers import EARTH
from .pieces import Piece

__all__ = ["FlightLegs", "read_flight"]

_COLUMNS: Final = ("instant", "lon_deg", "lat_deg", "height_m")
_RANGES: Final = {"lon_deg": (-360.0, 360.0), "lat_deg": (-90.0, 90.0), "height_m": (-1000.0, 26e3)}
_HIGH_M: Final = 16e3
"""Above all but a few aircraft; no aeroplane stays above 26 km, and airliners cruise above 26 000 ft."""
_FASTEST_M_S: Final = 1e4
"""What nothing in the air reaches: swapped columns, wrong units or a wrong date show by it."""
_LONGEST_ARC_RAD: Final = math.radians(179.0)
_POLAR_M: Final = WGS84_A_M * (1.0 - 1.0 / WGS84_INVERSE_FLATTENING)


class FlightLegs:
    """The motion between way points, in the ITRS; see the head of this module.

    Parameters
    ----------
    dates : Pair
        TT counts, shape (n,), increasing.
    lon_deg, lat_deg, height_m : float array (n,)
        Way points.
    """

    def __init__(self, dates: Pair, lon_deg: FloatArray, lat_deg: FloatArray, height_m: FloatArray) -> None:
        self._whole, self._fraction = np.array(dates[0], dtype=np.int64), np.array(dates[1], dtype=np.float64)
        lon, lat = np.radians(lon_deg), np.radians(lat_deg)
        normal = np.stack((np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat)), axis=-1)
        start, end = normal[:-1], normal[1:]
        cosine, cross = np.einsum("nk,nk->n", start, end), np.cross(start, end)
        sine = np.linalg.norm(cross, axis=-1)
        self.arc_rad = np.arctan2(sine, cosine)
        self.length_s = since((self._whole[1:], self._fraction[1:]), (self._whole[:-1], self._fraction[:-1]))
        turning = sine > 0.0
        ahead = np.cross(cross, start) / np.where(turning, sine, 1.0)[:, np.newaxis]
        with np.errstate(divide="ignore", invalid="ignore"):
            self._turn_rad_s = np.where(turning, self.arc_rad, 0.0) / self.length_s
            self._climb_m_s = np.diff(height_m) / self.length_s
        self._start, self._ahead, self._height_m = start, ahead, np.array(height_m, dtype=np.float64)

    @property
    def speed_m_s(self) -> FloatArray:
        """About the speed over ground with the climb, by leg."""
        return np.asarray(np.abs(self._turn_rad_s) * WGS84_A_M + np.abs(self._climb_m_s))

    @property
    def first(self) -> Pair:
        """Date of the first way point."""
        return self._whole[0], self._fraction[0]

    @property
    def last(self) -> Pair:
        """Date of the last way point."""
        return self._whole[-1], self._fraction[-1]

    def state(self, count: Pair) -> tuple[FloatArray, FloatArray]:
        """ITRS position (m) and velocity over the turning Earth (m/s), (n, 3) each, at 1-d TT counts in the span."""
        # Which side of a way point a date falls on does not matter to 1e-7 s: both legs meet in it.
        inner = since((self._whole, self._fraction), self.first)[1:-1]
        leg = np.searchsorted(inner, since(count, self.first), side="right")
        local_s = since(count, (self._whole[leg], self._fraction[leg]))
        turn = self._turn_rad_s[leg]
        cosine, sine = np.cos(turn * local_s)[:, np.newaxis], np.sin(turn * local_s)[:, np.newaxis]
        n = self._start[leg] * cosine + self._ahead[leg] * sine
        n_rate = (self._ahead[leg] * cosine - self._start[leg] * sine) * turn[:, np.newaxis]
        climb = self._climb_m_s[leg][:, np.newaxis]
        height = self._height_m[leg][:, np.newaxis] + climb * local_s[:, np.newaxis]
        # The point of the ellipsoid with normal n is (a^2 n_x, a^2 n_y, b^2 n_z)/s with s^2 = sum of n_i times these.
        squares = np.array([WGS84_A_M**2, WGS84_A_M**2, _POLAR_M**2])
        s = np.sqrt(np.sum(squares * n * n, axis=-1, keepdims=True))
        s_rate = np.sum(squares * n * n_rate, axis=-1, keepdims=True) / s
        ground = squares * n / s
        position = ground + height * n
        return position, squares * n_rate / s - ground * (s_rate / s) + climb * n + height * n_rate


def read_flight(
    path: Any, scale: str, leap_seconds: LeapSeconds | None
) -> tuple[str, NativeScale, bool, tuple[Piece, ...], Path]:
    """See `Trajectory.from_flight`: name, scale of the dates, that it is geocentric, its one piece, and the path."""
    path = file_path(path, "a flight")
    rows, cells = _cells(path)
    values = {column: _numbers(cells[column], column, rows, path) for column in _COLUMNS[1:]}
    try:
        dates = counts_of(Instants.from_iso(cells["instant"], scale, leap_seconds=leap_seconds))
    except TscaleError as error:
        mask = error.mask
        if mask is None or not np.any(mask):
            raise DataFileError(f"{path}: {error}", path=path) from error
        raise _fault(path, rows[int(np.argmax(mask))], f"instant: {error}") from error
    if dates.scale != "TT":
        raise InvalidInput(f"a flight near the ground is dated in UTC, TAI, TT, TCG or a GNSS scale, got {scale}")
    high = values["height_m"] > _HIGH_M
    if np.any(high):
        warnings.warn(
            f"{path}, line {rows[int(np.argmax(high))]}: {int(np.count_nonzero(high))} of {high.size} way points lie "
            f"above {_HIGH_M / 1e3:g} km, where few aircraft fly: are these feet? height_m is in metres (1 ft = "
            "0.3048 m)",
            stacklevel=3,
        )
    legs = FlightLegs(dates.pair, *values.values())
    _check(
        legs.length_s <= 0.0, path, rows, "this instant does not come after the one before: sort the rows, drop doubles"
    )
    _check(
        legs.arc_rad > _LONGEST_ARC_RAD,
        path,
        rows,
        "half way round the Earth from the way point before, so that the way is not known: give way points between",
    )
    _check(
        legs.speed_m_s > _FASTEST_M_S,
        path,
        rows,
        f"faster than {_FASTEST_M_S / 1e3:g} km/s from the way point before: check the order of the columns, the units "
        "(degrees, m) and the instants",
    )
    return path.stem, "TT", True, (Piece(legs, EARTH, "ITRS", legs.first, legs.last),), path


def _check(bad: BoolArray, path: Path, rows: list[int], message: str) -> None:
    """Complain of the first leg that is bad, at the way point where it ends."""
    if np.any(bad):
        more = int(np.count_nonzero(bad)) - 1
        raise _fault(path, rows[int(np.argmax(bad)) + 1], message + (f" (and {more} more)" if more else ""))


def _fault(path: Path, row: int, message: str) -> DataFileError:
    return DataFileError(f"{path}, line {row}: {message}", path=path, row=row)


class _Table(NamedTuple):
    rows: list[int]
    cells: dict[str, list[str]]


def _cells(path: Path) -> _Table:
    """Cells by column, and the line of each row."""
    try:
        content = read_bytes(path)
    except OSError as error:
        raise DataFileError(f"cannot read the flight {path}: {error.strerror or error}", path=path) from error
    try:
        text = content.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        row = content.count(b"\n", 0, error.start) + 1
        raise _fault(path, row, f"not UTF-8 text ({error.reason}); save the file as UTF-8") from error
    header: list[str] = []
    table = _Table([], {column: [] for column in _COLUMNS})
    for row, line in enumerate(text.splitlines(), 1):
        if not line.strip() or line.lstrip().startswith("#"):
            continue
        try:
            found = [cell.strip() for cell in next(csv.reader([line], skipinitialspace=True, strict=True))]
        except csv.Error as error:
            raise _fault(path, row, f"not a CSV row, {error}") from error
        if not header:
            header = found
            if len(set(header)) != len(header) or any(column not in header for column in _COLUMNS):
                lacking = [column for column in _COLUMNS if column not in header]
                raise _fault(
                    path,
                    row,
                    f"the header is {', '.join(header)}; needed, each once, are {', '.join(_COLUMNS)}, parted by commas"
                    + (f"; missing: {', '.join(lacking)}" if lacking else ""),
                )
            continue
        if len(found) != len(header):
            raise _fault(path, row, f"{len(found)} cells under a header of {len(header)}")
        table.rows.append(row)
        for column, cell in zip(header, found, strict=True):
            if column in table.cells:
                table.cells[column].append(cell)
    if len(table.rows) < 2:
        raise DataFileError(
            f"the flight {path} holds {len(table.rows)} way points; two or more are needed, one a row under the header "
            f"{','.join(_COLUMNS)}",
            path=path,
        )
    return table


def _numbers(texts: list[str], column: str, rows: list[int], path: Path) -> FloatArray:
    """Numbers of one column within its range."""
    low, high = _RANGES[column]
    values = np.empty(len(texts))
    for i, (text, row) in enumerate(zip(texts, rows, strict=True)):
        try:
            values[i] = float(text) if "_" not in text else math.nan
        except ValueError:
            values[i] = math.nan
        if not low <= values[i] <= high:
            hint = "check columns, units"
            if column == "height_m" and values[i] > high:
                hint = "feet? (1 ft = 0.3048 m); a balloon or a rocket comes with Trajectory.from_states(frame='ITRS')"
            raise _fault(path, row, f"{column} is {text!r}; a number from {low:g} to {high:g} is needed: {hint}")
    return values
