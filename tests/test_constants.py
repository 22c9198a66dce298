"""Constants against those of ERFA and the resolutions that define them."""

from __future__ import annotations

import erfa

from tscale import constants


def test_constants_are_those_of_erfa() -> None:
    # erfam.h: IAU 2012 B2, SI, IAU 2000 B1.9, IAU 2006 B3.
    assert constants.AU_M == erfa.DAU
    assert constants.C_M_S == erfa.CMPS
    assert float(constants.L_G) == erfa.ELG
    assert float(constants.L_B) == erfa.ELB
    assert constants.TDB0_S == erfa.TDB0
    assert constants.DAY_S == erfa.DAYSEC
    assert constants.JULIAN_YEAR_S == erfa.DJY * erfa.DAYSEC
    # T0 is MJD 43144.0003725 of TT (IAU 2006 B3); erfam.h splits it into ERFA_DJM77 and ERFA_TTMTAI.
    whole, fraction = constants.T0_COUNT
    assert whole + fraction == (erfa.DJM77 - constants.MJD_J2000) * 86400 - 43200 + erfa.TTMTAI
    assert sum(constants.TT_MINUS_TAI) == erfa.TTMTAI


def test_nominal_radius_of_the_sun() -> None:
    assert constants.SUN_RADIUS_M == 6.957e8  # IAU 2015 Resolution B3, table 1
