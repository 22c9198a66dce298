"""Radii and rotation elements of the bodies, by NAIF number.

Source: Archinal et al. 2018, "Report of the IAU Working Group on Cartographic Coordinates and Rotational
Elements: 2015", Celest. Mech. Dyn. Astr. 130, 22 (WGCCRE 2015), tables 1, 2, 4 and 5; the series are
transcribed from memory and compared in the tests with the elements of the reports of 2006 and 2009.
The Sun's radius is the nominal one of IAU 2015 Resolution B3.
"""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType
from typing import Final, NamedTuple

import numpy as np

from .constants import SUN_RADIUS_M
from .exact import FloatArray, two_product

__all__ = [
    "FIGURES",
    "MEAN_RADIUS_M",
    "REFERENCE_POTENTIAL_M2_S2",
    "ROTATIONS",
    "Angle",
    "Figure",
    "Rotation",
    "own_body",
]

_DAYS_PER_CENTURY: Final = 36525.0

MEAN_RADIUS_M: Final[Mapping[int, float]] = MappingProxyType(
    {
        1: 2439.4e3,
        2: 6051.8e3,
        4: 3389.50e3,
        5: 69911.0e3,
        6: 58232.0e3,
        7: 25362.0e3,
        8: 24622.0e3,
        9: 1188.3e3,
        10: SUN_RADIUS_M,
        301: 1737.4e3,
        399: 6371.0084e3,
    }
)
"""Mean radius, m. The number of a planet's system stands for the planet."""


class Figure(NamedTuple):
    """Reference ellipsoid of a body: equatorial and polar radius, m."""

    equatorial_m: float
    polar_m: float


FIGURES: Final[Mapping[int, Figure]] = MappingProxyType(
    {
        1: Figure(2440.53e3, 2438.26e3),
        2: Figure(6051.8e3, 6051.8e3),
        4: Figure(3396.19e3, 3376.20e3),
        301: Figure(1737.4e3, 1737.4e3),
    }
)
"""Reference ellipsoids of the solid bodies that `SurfaceSite` knows."""


REFERENCE_POTENTIAL_M2_S2: Final[Mapping[int, float]] = MappingProxyType({4: 12654875.0, 301: 2821713.3})
"""Gravity potential (with that of the rotation) on the reference equipotential surface of a body, m2/s2. Measured.
Moon: the selenoid of Ardalan & Karimi 2014, Celest. Mech. Dyn. Astr. 118, 75 (reference from memory); Mars: the areoid,
12654875 +-69, of Ardalan, Karimi & Grafarend 2009, Earth Moon Planets 106, 1 (from memory)."""


class Angle(NamedTuple):
    """An angle in degrees: c0 + c1 x + c2 x^2 + sum of amplitude trig(phase + frequency x)."""

    polynomial_deg: tuple[float, float, float]
    sines_deg: tuple[tuple[float, float, float], ...] = ()
    cosines_deg: tuple[tuple[float, float, float], ...] = ()

    def at(self, whole: FloatArray, part: FloatArray | float = 0.0) -> tuple[FloatArray, FloatArray]:
        """Value (rad) and derivative (rad per unit) at x = whole + part.

        Whole turns are taken out of c1 x before anything is added, so that millions of degrees keep 1e-15 rad.
        """
        c0, c1, c2 = self.polynomial_deg
        x = whole + part
        product, error = two_product(np.asarray(whole, dtype=np.float64), c1)
        value = c0 + np.fmod(product, 360.0) + (error + c1 * part + c2 * x * x)
        rate = c1 + 2.0 * c2 * x
        for amplitude, phase, frequency in self.sines_deg:
            argument = np.radians(phase + frequency * x)
            value = value + amplitude * np.sin(argument)
            rate = rate + amplitude * np.cos(argument) * np.radians(frequency)
        for amplitude, phase, frequency in self.cosines_deg:
            argument = np.radians(phase + frequency * x)
            value = value + amplitude * np.cos(argument)
            rate = rate - amplitude * np.sin(argument) * np.radians(frequency)
        return np.radians(value), np.radians(rate)


class Rotation(NamedTuple):
    """Direction of the pole (ra, dec) and of the prime meridian (w), as functions of `unit_days` of TDB."""

    ra: Angle
    dec: Angle
    w: Angle
    pole_unit_days: float
    """Unit of the argument of ra and dec; that of w is one day."""


def _per_day(terms: tuple[tuple[float, float, float], ...]) -> tuple[tuple[float, float, float], ...]:
    return tuple((amplitude, phase, frequency / _DAYS_PER_CENTURY) for amplitude, phase, frequency in terms)


def _moon(polynomial: tuple[float, float, float], amplitudes: Mapping[int, float], cosine: bool) -> Angle:
    terms = tuple((amplitude, *_MOON_ARGUMENTS[k - 1]) for k, amplitude in amplitudes.items())
    return Angle(polynomial, (), terms) if cosine else Angle(polynomial, terms)


# E1 to E13: phase and frequency per day.
_MOON_ARGUMENTS: Final = (
    (125.045, -0.0529921),
    (250.089, -0.1059842),
    (260.008, 13.0120009),
    (176.625, 13.3407154),
    (357.529, 0.9856003),
    (311.589, 26.4057084),
    (134.963, 13.0649930),
    (276.617, 0.3287146),
    (34.226, 1.7484877),
    (15.134, -0.1589763),
    (119.743, 0.0036096),
    (239.961, 0.1643573),
    (25.053, 12.9590088),
)

ROTATIONS: Final[Mapping[int, Rotation]] = MappingProxyType(
    {
        1: Rotation(
            Angle((281.0103, -0.0328, 0.0)),
            Angle((61.4155, -0.0049, 0.0)),
            Angle(
                (329.5988, 6.1385108, 0.0),
                (
                    (0.01067257, 174.7910857, 4.092335),
                    (-0.00112309, 349.5821714, 8.184670),
                    (-0.00011040, 164.3732571, 12.277005),
                    (-0.00002539, 339.1643429, 16.369340),
                    (-0.00000571, 153.9554286, 20.461675),
                ),
            ),
            _DAYS_PER_CENTURY,
        ),
        2: Rotation(
            Angle((272.76, 0.0, 0.0)), Angle((67.16, 0.0, 0.0)), Angle((160.20, -1.4813688, 0.0)), _DAYS_PER_CENTURY
        ),
        4: Rotation(
            Angle(
                (317.269202, -0.10927547, 0.0),
                (
                    (0.000068, 198.991226, 19139.4819985),
                    (0.000238, 226.292679, 38280.8511281),
                    (0.000052, 249.663391, 57420.7251593),
                    (0.000009, 266.183510, 76560.6367950),
                    (0.419057, 79.398797, 0.5042615),
                ),
            ),
            Angle(
                (54.432516, -0.05827105, 0.0),
                (),
                (
                    (0.000051, 122.433576, 19139.9407476),
                    (0.000141, 43.058401, 38280.8753272),
                    (0.000031, 57.663379, 57420.7517205),
                    (0.000005, 79.476401, 76560.6495004),
                    (1.591274, 166.325722, 0.5042615),
                ),
            ),
            Angle(
                (176.049863, 350.891982443297, 0.0),
                _per_day(
                    (
                        (0.000145, 129.071773, 19140.0328244),
                        (0.000157, 36.352167, 38281.0473591),
                        (0.000040, 56.668646, 57420.9295360),
                        (0.000001, 67.364003, 76560.2552215),
                        (0.000001, 104.792680, 95700.4387578),
                        (0.584542, 95.391654, 0.5042615),
                    )
                ),
            ),
            _DAYS_PER_CENTURY,
        ),
        301: Rotation(
            _moon(
                (269.9949, 0.0031 / _DAYS_PER_CENTURY, 0.0),
                {1: -3.8787, 2: -0.1204, 3: 0.0700, 4: -0.0172, 6: 0.0072, 10: -0.0052, 13: 0.0043},
                cosine=False,
            ),
            _moon(
                (66.5392, 0.0130 / _DAYS_PER_CENTURY, 0.0),
                {1: 1.5419, 2: 0.0239, 3: -0.0278, 4: 0.0068, 6: -0.0029, 7: 0.0009, 10: 0.0008, 13: -0.0009},
                cosine=True,
            ),
            _moon(
                (38.3213, 13.17635815, -1.4e-12),
                {
                    1: 3.5610,
                    2: 0.1208,
                    3: -0.0642,
                    4: 0.0158,
                    5: 0.0252,
                    6: -0.0066,
                    7: -0.0047,
                    8: -0.0046,
                    9: 0.0028,
                    10: 0.0052,
                    11: 0.0040,
                    12: 0.0019,
                    13: -0.0044,
                },
                cosine=False,
            ),
            1.0,
        ),
    }
)
"""Rotation elements of the bodies that `SurfaceSite` knows (Moon: mean Earth/polar axis frame, main terms)."""


def own_body(number: int) -> int:
    """Number under which a planet is tabled here: 499 and 4 are both Mars, as in planetary kernels."""
    if number > 100 and number % 100 == 99 and number != 399:
        return number // 100
    return number
