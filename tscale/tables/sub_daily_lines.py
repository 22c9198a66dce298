"""Lines of the tidal variations of Earth orientation within a day: IERS Conventions (2010), chapters 5 and 8.

Two effects are in them: the ocean tides in x, y and UT1 (section 8.2; 71 lines of the tidal potential with the
orthoweights of the conventions' routine ORTHO_EOP), and the libration in UT1 (section 5.5.3, Table 5.1b: what the Sun
and the Moon do to an Earth whose equator is no circle). The numbers are in the files of `data/`, whose
headers name their source.

The conventions' routine samples the potential at a date and two days to either side and combines the samples by
weights. Each line being a sinusoid, that comes to one complex factor for each line, which is worked out here once.
"""

from __future__ import annotations

import csv
from collections.abc import Callable
from functools import lru_cache
from pathlib import Path
from typing import Final, NamedTuple

import numpy as np
import numpy.typing as npt

from ..errors import DataFileError
from ..exact import FloatArray, two_product
from .common import rows_hash

__all__ = ["EpochLines", "lines_hash", "ocean_lines", "sub_daily_series", "ut1_libration_lines"]

ComplexArray = npt.NDArray[np.complex128]

_FOLDER: Final = Path(__file__).with_name("data")
_UAS_RAD: Final = float(np.pi) / 648000.0e6
_US_S: Final = 1e-6
_TWO_PI: Final = 2.0 * np.pi
_EPOCH_DAY: Final = 37076.5 - 51544.5
"""Date to which the phases of the ocean lines belong (MJD 37076.5), in days from 2000-01-01T12:00:00."""
_SAMPLE_DAYS: Final = 2.0
_CENTURY_DAYS: Final = 36525.0


class EpochLines(NamedTuple):
    """Sums of sinusoids: component k is the real part of sum_j amplitude[j, k] exp(i angle_j)."""

    amplitude: ComplexArray
    """(lines, 3): x rad, y rad, UT1 s."""
    rate_of: Callable[[float], FloatArray]
    """How fast the angles grow at a day: rad per day, (lines,)."""
    angle_of: Callable[[FloatArray], FloatArray]
    """Angles at days (n,): rad, (n, lines). Days are counted from 2000-01-01T12:00:00 of UT1."""


@lru_cache(maxsize=1)
def ocean_lines() -> EpochLines:
    """Ocean tides in x, y and UT1.

    Raises
    ------
    DataFileError
        If a file of the package is missing or damaged.
    """
    weights = {row[0]: np.array([float(v) for v in row[1:] if v]) for row in _rows("iers2010_orthoweights.csv")}
    columns = np.array([[float(v) for v in row] for row in _rows("iers2010_tidal_lines.csv")])
    degree, order, height, phase, rate = columns[:, :5].T
    turn = np.mod(degree + order, 2.0) * (np.pi / 2.0)
    shift = rate * _SAMPLE_DAYS
    amplitude = np.empty((len(columns), 3), dtype=np.complex128)
    for own in (1, 2):
        mine = order == own
        s1, s2, s3, s4, s5, s6 = weights[f"sp_order{own}"]
        both, across = 2.0 * np.cos(shift[mine]), 2.0 * np.sin(shift[mine])
        factors = (s1 + 0.0 * both, s2 - s3 * both, s4 - s5 * both + s6 * across)
        for k, (which, unit) in enumerate((("x", _UAS_RAD), ("y", _UAS_RAD), ("ut1", _US_S))):
            pairs = weights[which][6 * (own - 1) : 6 * own].reshape(3, 2)
            response = sum(f * complex(p, q) for f, (p, q) in zip(factors, pairs, strict=True))
            amplitude[mine, k] = height[mine] * response * unit

    turns_day = rate / _TWO_PI
    start = phase - turn

    def angle_of(day: FloatArray) -> FloatArray:
        # Whole turns are taken out without rounding, so that a date far from the epoch keeps its last digits.
        high, low = two_product(turns_day, (day - _EPOCH_DAY)[:, np.newaxis])
        return np.asarray(_TWO_PI * ((high - np.rint(high)) + low) + start)

    return EpochLines(amplitude, lambda day: rate, angle_of)


@lru_cache(maxsize=1)
def ut1_libration_lines() -> EpochLines:
    """Libration in UT1, Table 5.1b.

    Raises
    ------
    DataFileError
        If a file of the package is missing or damaged.
    """
    columns = np.array([[float(v) for v in row] for row in _rows("iers2010_ut1_libration.csv")])
    multipliers, sine, cosine = columns[:, :6], columns[:, 6], columns[:, 7]
    amplitude = np.zeros((len(columns), 3), dtype=np.complex128)
    amplitude[:, 2] = (cosine - 1j * sine) * _US_S

    def angle_of(day: FloatArray) -> FloatArray:
        return np.asarray(_arguments(day) @ multipliers.T)

    def rate_of(day: float) -> FloatArray:
        before, after = _arguments(np.array([day - 0.5, day + 0.5]))
        rate = np.mod(after - before + np.pi, _TWO_PI) - np.pi
        rate[0] += _TWO_PI  # GMST: one turn and a little in a day
        return np.asarray(multipliers @ rate)

    return EpochLines(amplitude, rate_of, angle_of)


def _arguments(day: FloatArray) -> FloatArray:
    """GMST + pi, l, l', F, D and Omega, rad: (n, 6)."""
    import erfa

    t = day / _CENTURY_DAYS
    # GMST of UT1 as the routine of Table 5.1b has it (IAU 1982), in seconds of a day; its 876600 h are whole turns.
    second = 67310.54841 + (8640184.812866 + (0.093104 - 6.2e-6 * t) * t) * t
    gmst = _TWO_PI * (second / 86400.0 + (day - np.floor(day)))
    return np.stack(
        [gmst + np.pi, erfa.fal03(t), erfa.falp03(t), erfa.faf03(t), erfa.fad03(t), erfa.faom03(t)], axis=-1
    )


def sub_daily_series(day: npt.ArrayLike) -> FloatArray:
    """Tidal variations within a day, term by term.

    Parameters
    ----------
    day : float array
        Days since 2000-01-01T12:00:00 of UT1 (MJD - 51544.5), any shape.

    Returns
    -------
    float array (..., 3)
        x rad, y rad (ocean tides), UT1 s (ocean tides and libration). `sub_daily.sub_daily_terms` gives the same from
        a table, faster and with rates.
    """
    days = np.asarray(day, dtype=np.float64)
    total = np.zeros((days.size, 3))
    for lines in (ocean_lines(), ut1_libration_lines()):
        angle = lines.angle_of(days.reshape(-1))
        total += np.cos(angle) @ lines.amplitude.real - np.sin(angle) @ lines.amplitude.imag
    return total.reshape(*days.shape, 3)


@lru_cache(maxsize=1)
def lines_hash() -> str:
    """SHA-256 of the amplitudes of all lines, and of their angles and rates at one date."""
    noon = np.zeros(1)
    both = ocean_lines(), ut1_libration_lines()
    return rows_hash(*(part for lines in both for part in (lines.amplitude, lines.angle_of(noon), lines.rate_of(0.0))))


def _rows(name: str) -> list[list[str]]:
    """Rows of a data file below its header, without comments."""
    path = _FOLDER / name
    try:
        text = [line for line in path.read_text(encoding="utf-8").splitlines() if line and not line.startswith("#")]
    except OSError as error:
        raise DataFileError(
            f"the tidal lines {path} cannot be read ({error.strerror or error}); install the package again", path=path
        ) from error
    rows = list(csv.reader(text))[1:]
    if not rows:
        raise DataFileError(f"the tidal lines {path} are empty; install the package again", path=path)
    return rows
