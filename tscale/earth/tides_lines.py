"""What single lines of the solid Earth tide add to nominal Love numbers: IERS Conventions (2010), 7.1.1.2 (step 2).

The Love numbers of the Earth depend on frequency, most of all near the free nutation of its core: 12 mm at the line K1.
Tables 7.3a (once a day) and 7.3b (long periods) give the corrections, here as the conventions' routine for the
tide of a station lists them, with its arguments. Taken out of the turn of the Earth, they are slow functions of
time, which a site reads from cubics.
"""

from __future__ import annotations

from functools import lru_cache
from typing import Final

import numpy as np
import numpy.typing as npt

from ..exact import FloatArray, Pair
from ..tables.node_cubics import evaluate

__all__ = ["LINES", "line_sums", "line_sums_table"]

ComplexArray = npt.NDArray[np.complex128]

LINES: Final = 6
"""Sums: once-daily radial, real and imaginary; once-daily transverse, the same; long-period radial and northward."""

_DEGREE: Final = float(np.pi) / 180.0
_CENTURY_DAYS: Final = 36525.0
_MM: Final = 1e-3

# Multiples of s, h, p, N', ps beside one of tau; radial in and out of phase, transverse in and out of phase, mm.
_DAILY: Final = np.array(
    [
        (-3, 0, 2, 0, 0, -0.01, 0.0, 0.0, 0.0),
        (-3, 2, 0, 0, 0, -0.01, 0.0, 0.0, 0.0),
        (-2, 0, 1, -1, 0, -0.02, 0.0, 0.0, 0.0),
        (-2, 0, 1, 0, 0, -0.08, 0.0, -0.01, 0.01),  # Q1
        (-2, 2, -1, 0, 0, -0.02, 0.0, 0.0, 0.0),
        (-1, 0, 0, -1, 0, -0.10, 0.0, 0.0, 0.0),
        (-1, 0, 0, 0, 0, -0.51, 0.0, -0.02, 0.03),  # O1
        (-1, 2, 0, 0, 0, 0.01, 0.0, 0.0, 0.0),
        (0, -2, 1, 0, 0, 0.01, 0.0, 0.0, 0.0),
        (0, 0, -1, 0, 0, 0.02, 0.0, 0.0, 0.0),
        (0, 0, 1, 0, 0, 0.06, 0.0, 0.0, 0.0),
        (0, 0, 1, 1, 0, 0.01, 0.0, 0.0, 0.0),
        (0, 2, -1, 0, 0, 0.01, 0.0, 0.0, 0.0),
        (1, -3, 0, 0, 1, -0.06, 0.0, 0.0, 0.0),
        (1, -2, 0, -1, 0, 0.01, 0.0, 0.0, 0.0),
        (1, -2, 0, 0, 0, -1.23, -0.07, 0.06, 0.01),  # P1
        (1, -1, 0, 0, -1, 0.02, 0.0, 0.0, 0.0),
        (1, -1, 0, 0, 1, 0.04, 0.0, 0.0, 0.0),
        (1, 0, 0, -1, 0, -0.22, 0.01, 0.01, 0.0),
        (1, 0, 0, 0, 0, 12.00, -0.80, -0.67, -0.03),  # K1
        (1, 0, 0, 1, 0, 1.73, -0.12, -0.10, 0.0),
        (1, 0, 0, 2, 0, -0.04, 0.0, 0.0, 0.0),
        (1, 1, 0, 0, -1, -0.50, -0.01, 0.03, 0.0),  # psi1
        (1, 1, 0, 0, 1, 0.01, 0.0, 0.0, 0.0),
        (0, 1, 0, 1, -1, -0.01, 0.0, 0.0, 0.0),
        (1, 2, -2, 0, 0, -0.01, 0.0, 0.0, 0.0),
        (1, 2, 0, 0, 0, -0.11, 0.01, 0.01, 0.0),  # phi1
        (2, -2, 1, 0, 0, -0.01, 0.0, 0.0, 0.0),
        (2, 0, -1, 0, 0, -0.02, 0.0, 0.0, 0.0),
    ]
)
# The same without tau; radial and northward in phase, radial and northward out of phase, mm.
_LONG: Final = np.array(
    [
        (0, 0, 0, 1, 0, 0.47, 0.23, 0.16, 0.07),
        (0, 2, 0, 0, 0, -0.20, -0.12, -0.11, -0.05),
        (1, 0, -1, 0, 0, -0.11, -0.08, -0.09, -0.04),
        (2, 0, 0, 0, 0, -0.13, -0.11, -0.15, -0.07),
        (2, 0, 0, 1, 0, -0.05, -0.05, -0.06, -0.03),
    ]
)
_DAILY_AMPLITUDES: Final = np.stack([_DAILY[:, 6] - 1j * _DAILY[:, 5], _DAILY[:, 8] - 1j * _DAILY[:, 7]], axis=-1) * _MM
_LONG_AMPLITUDES: Final = np.stack([_LONG[:, 5] - 1j * _LONG[:, 7], _LONG[:, 6] - 1j * _LONG[:, 8]], axis=-1) * _MM
_MULTIPLES: Final = np.concatenate([_DAILY[:, :5], _LONG[:, :5]])

_STEP_S: Final = 43200
"""Length of a cubic: the line O1 turns by 0.23 rad against the Earth meanwhile, and the cubics are off by 10 nm."""
_PAGE: Final = 4096
_TT_MINUS_UT1_DAYS: Final = 60.0 / 86400.0


def _angles(tt_day: FloatArray, ut1_day: FloatArray) -> FloatArray:
    """Angles of all lines (n, lines) in degrees, the once-daily ones less the Earth rotation angle."""
    t = tt_day / _CENTURY_DAYS
    s = 218.31664563 + (481267.88194 + (-0.0014663889 + 0.00000185139 * t) * t) * t
    # tau is 15 degrees an hour of UT1 from midnight and the next line; the Earth rotation angle counts from noon.
    tau = 280.4606184 + (36000.7700536 + (0.00038793 - 0.0000000258 * t) * t) * t - s
    tau -= 360.0 * (0.5 + 0.7790572732640 + 0.00273781191135448 * ut1_day)
    s += (1.396971278 + (0.000308889 + (0.000000021 + 0.000000007 * t) * t) * t) * t
    h = 280.46645 + (36000.7697489 + (0.00030322222 + (0.000000020 - 0.00000000654 * t) * t) * t) * t
    p = 83.35324312 + (4069.01363525 + (-0.01032172222 + (-0.0000124991 + 0.00000005263 * t) * t) * t) * t
    n = 234.95544499 + (1934.13626197 + (-0.00207561111 + (-0.00000213944 + 0.00000001650 * t) * t) * t) * t
    ps = 282.93734098 + (1.71945766667 + (0.00045688889 + (-0.00000001778 - 0.00000000334 * t) * t) * t) * t
    angles = np.stack([s, h, p, n, ps], axis=-1) @ _MULTIPLES.T
    angles[:, : len(_DAILY)] += tau[:, np.newaxis]
    return np.asarray(angles)


def _sums(turned: ComplexArray) -> FloatArray:
    """The six sums (LINES, n) of the lines' exp(i angle), (n, lines)."""
    daily = turned[:, : len(_DAILY)] @ _DAILY_AMPLITUDES
    long = (turned[:, len(_DAILY) :] @ _LONG_AMPLITUDES).real
    return np.stack([daily[:, 0].real, daily[:, 0].imag, daily[:, 1].real, daily[:, 1].imag, long[:, 0], long[:, 1]])


def line_sums(tt_day: FloatArray, ut1_day: FloatArray) -> FloatArray:
    """Sums over the lines, term by term.

    Parameters
    ----------
    tt_day, ut1_day : float array, any shape
        Days since 2000-01-01T12:00:00 of TT and of UT1.

    Returns
    -------
    float array (LINES, ...)
        m. Complex sums R and T of the once-daily lines, to be turned by the Earth rotation angle and the longitude, and
        the radial and northward sum of the long periods.
    """
    tt_day, ut1_day = np.broadcast_arrays(np.asarray(tt_day, dtype=np.float64), np.asarray(ut1_day, dtype=np.float64))
    sums = _sums(np.exp(1j * _DEGREE * _angles(tt_day.reshape(-1), ut1_day.reshape(-1))))
    return sums.reshape(LINES, *tt_day.shape)


def line_sums_table(tt: Pair) -> FloatArray:
    """Sums over the lines from cubics of half a day: within 20 nm of `line_sums`.

    UT1 is put 60 s behind TT, which between 1960 and 2060 is right to 30 s, 0.1 um.

    Parameters
    ----------
    tt : Pair
        TT count, shape (n,).

    Returns
    -------
    float array (LINES, n)
        See `line_sums`.
    """
    record = np.asarray(tt[0] // _STEP_S, dtype=np.int64)
    u = (tt[0] - record * _STEP_S + tt[1]) / _STEP_S
    number = record // _PAGE
    pages = np.unique(number)
    if pages.size == 1:
        return evaluate(_page(int(pages[0])), record - pages[0] * _PAGE, u)
    sums = np.empty((LINES, record.size))
    for page in pages:
        mine = np.flatnonzero(number == page)
        sums[:, mine] = evaluate(_page(int(page)), record[mine] - page * _PAGE, u[mine])
    return sums


@lru_cache(maxsize=64)
def _page(number: int) -> FloatArray:
    """Cubics (records, 4, LINES) through values and slopes at both ends of each record."""
    step_day = _STEP_S / 86400.0
    tt_day = np.arange(number * _PAGE, (number + 1) * _PAGE + 1, dtype=np.float64) * step_day
    angles = _DEGREE * _angles(tt_day, tt_day - _TT_MINUS_UT1_DAYS)
    middle = _PAGE // 2
    turned = np.exp(1j * angles)
    values = _sums(turned).T
    turned *= 0.5j * (angles[middle + 1] - angles[middle - 1])
    slopes = _sums(turned).T
    rise = np.diff(values, axis=0)
    left, right = slopes[:-1], slopes[1:]
    powers = np.stack([values[:-1], left, 3.0 * rise - 2.0 * left - right, left + right - 2.0 * rise], axis=1)
    powers.flags.writeable = False
    return powers
