"""Constants: each once, with its unit, its source and whether it is defining or measured.

Defining rates are held as exact rationals, because a float64 `L_B` times a century of seconds
is already wrong by femtoseconds; `exact.Factor` carries them into array arithmetic.

Sources
-------
TN36
    IERS Conventions (2010), IERS Technical Note 36, Table 1.1 and Table 1.2.
DE440
    Park et al. 2021, AJ 161, 105; the mass parameters are those in the comment area of de440.bsp.
"""

from __future__ import annotations

from collections.abc import Mapping
from fractions import Fraction
from types import MappingProxyType
from typing import Final

C_M_S: Final = 299792458.0
"""Speed of light, m/s. Defining (SI)."""

AU_M: Final = 149597870700.0
"""Astronomical unit, m. Defining (IAU 2012 Resolution B2)."""

DAY_S: Final = 86400
"""Seconds in a day of a uniform scale. Defining."""

JULIAN_YEAR_S: Final = 31557600.0
"""Julian year, s. Defining (365.25 d)."""

MJD_J2000: Final = 51544
"""Modified Julian Date of 2000-01-01, the day that holds the origin of all counts (at 12h)."""

L_G: Final = Fraction(6969290134, 10**19)
"""1 - dTT/dTCG. Defining (IAU 2000 Resolution B1.9; TN36 Table 1.1)."""

L_B: Final = Fraction(1550519768, 10**17)
"""1 - dTDB/dTCB. Defining (IAU 2006 Resolution B3; TN36 Table 1.1)."""

L_C: Final = 1.48082686741e-8
"""Average of 1 - dTCG/dTCB. Measured, +-2e-17 (TN36 Table 1.1)."""

TDB0_S: Final = -6.55e-5
"""TDB - TCB at T0, s. Defining (IAU 2006 Resolution B3)."""

T0_COUNT: Final = (-725803168, 0.184)
"""T0 = 1977-01-01T00:00:32.184 of TT, TCG and TCB as a count (whole s, fraction) from
2000-01-01T12:00:00 of the same scale. Defining (IAU 1991 Resolution A4)."""

TT_MINUS_TAI: Final = (32, 0.184)
"""TT - TAI (whole s, fraction). Defining (IAU 1991 Resolution A4)."""

WGS84_A_M: Final = 6378137.0
"""Equatorial radius of the WGS84 and GRS80 ellipsoids, m. Defining."""

WGS84_INVERSE_FLATTENING: Final = 298.257223563
"""1/f of WGS84. Defining (NIMA TR8350.2)."""

WGS84_GM_M3_S2: Final = 3.986004418e14
"""GM of the Earth with its atmosphere in WGS84, m3/s2. Defining (NIMA TR8350.2)."""

GRS80_A_M: Final = 6378137.0
"""Equatorial radius of GRS80, m. Defining (Moritz 2000, J. Geodesy 74, 128)."""

GRS80_GM_M3_S2: Final = 3.986005e14
"""GM of the Earth with its atmosphere in GRS80, m3/s2. Defining (Moritz 2000)."""

GRS80_J2: Final = 108263e-8
"""J2 of GRS80, which defines its flattening. Defining (Moritz 2000)."""

GRS80_INVERSE_FLATTENING: Final = 298.257222101
"""1/f of GRS80. Derived from `GRS80_J2` and published (Moritz 2000; TN36 Table 1.2)."""

NORMAL_OMEGA_RAD_S: Final = 7.292115e-5
"""Angular velocity of the normal Earth in GRS80 and WGS84, rad/s. Defining (Moritz 2000; NIMA TR8350.2)."""

W0_M2_S2: Final = 62636856.0
"""Potential of gravity on the geoid, m2/s2. Measured, +-0.5 (TN36 Table 1.1); L_G = W0/c^2 is fixed to it."""

EARTH_GM_TT_M3_S2: Final = 3.986004415e14
"""GM of the Earth with its atmosphere in TT-compatible units, which are those of ITRF and GCRS positions here, m3/s2.
Measured, +-8e5 (TN36 Table 1.1 gives 3.986004418e14 in SI; section 6.1 this one)."""

EARTH_FIELD_RADIUS_M: Final = 6378136.3
"""Radius to which the Earth's harmonic coefficients refer, m. Defining (EGM2008; TN36 section 6.1)."""

EARTH_ZONAL_J: Final = (1.0826359e-3, -2.5324105e-6, -1.6198977e-6, -2.2775359e-7, 5.4066658e-7)
"""J2 to J6 of the Earth. Measured: J2 zero-tide, +-1e-10 (TN36 Table 1.1); J3 and J4 from C30 = 0.9571612e-6 and
C40 = 0.5399659e-6 (TN36 Table 6.2, epoch J2000.0), J5 and J6 from C50 = 0.68670291e-7, C60 = -0.14995393e-6 (EGM2008,
Pavlis et al. 2012, J. Geophys. Res. 117, B04406), by J_n = -sqrt(2 n + 1) C_n0."""

LOVE_K2: Final = 0.30190
"""Nominal degree-2 Love number k of the anelastic Earth, order 0 (real part; TN36 Table 6.3)."""

LOVE_H2: Final = 0.6078
"""Nominal degree-2 Love number h (TN36 section 7.1.1)."""

LOVE_L2: Final = 0.0847
"""Nominal degree-2 Shida number l (TN36 section 7.1.1)."""

EARTH_ANGULAR_VELOCITY_RAD_S: Final = 2 * 3.141592653589793 * 1.00273781191135448 / 86400.0
"""Rate of the Earth rotation angle per UT1 second, rad/s. Defining (IAU 2000 B1.8)."""

SUN_RADIUS_M: Final = 6.957e8
"""Nominal solar radius, m. Defining (IAU 2015 Resolution B3)."""

GM_M3_S2: Final[Mapping[int, float]] = MappingProxyType(
    {
        1: 22031.868551e9,
        2: 324858.592000e9,
        4: 42828.375816e9,
        5: 126712764.100000e9,
        6: 37940584.841800e9,
        7: 5794556.400000e9,
        8: 6836527.100580e9,
        9: 975.500000e9,
        10: 132712440041.279419e9,
        301: 4902.800118e9,
        399: 398600.435507e9,
    }
)
"""TDB-compatible mass parameters by NAIF body number, m3/s2. Measured (DE440). 1 to 9 are planetary systems
(3, the Earth-Moon system, is the sum of 399 and 301), 10 is the Sun."""
