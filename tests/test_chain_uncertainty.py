"""The uncertainty of a chain, source by source, against products formed by hand."""

from __future__ import annotations

import math

import numpy as np
import pytest

import tscale

C_M_S = 299792458.0
EARTH_RATE_RAD_S = 7.292115146706979e-5  # IAU 2000 B1.8, IERS Conventions 2010
MAS = math.pi / (180 * 3600e3)

SITE = tscale.Site.from_itrf("test site", 4_051_700.0, 417_300.0, 4_890_200.0)
SOURCE = tscale.Source(83.6, 22.0, name="test source")
T = tscale.Instants.from_iso("2024-05-01T07:30:00", scale="UTC")

UT1_S, POLE_MAS = 1e-4, math.sqrt(2.0**2 + 3.0**2 + 0.5**2 + 0.7**2)


@pytest.fixture(scope="module")
def uncertain() -> tscale.ReferenceData:
    """Earth orientation with one uncertainty for all days: 0.1 ms in UT1, 2 and 3 mas in the pole, 0.5 and 0.7 mas."""
    table = tscale.EarthOrientation.from_rows(
        [60430, 60431, 60432, 60433],
        -0.01,
        0.03,
        0.4,
        ut1_sigma_s=UT1_S,
        x_sigma_arcsec=0.002,
        y_sigma_arcsec=0.003,
        dx_sigma_mas=0.5,
        dy_sigma_mas=0.7,
    )
    return tscale.ReferenceData(earth_orientation=table)


def by_hand(reference: tscale.ReferenceData, weight: np.ndarray) -> tuple[float, float]:
    """Uncertainty of weight.r/c by UT1 and by the pole: turning r by an angle moves it by the angle x |r|."""
    r_m, _ = SITE.gcrs(tscale.chain("UTC", "TT")(T).pair, reference)
    moved_m_s = np.cross([0.0, 0.0, EARTH_RATE_RAD_S], r_m)
    ut1 = abs(float(weight @ moved_m_s)) / C_M_S * UT1_S
    pole = float(np.linalg.norm(r_m) * np.linalg.norm(weight)) / C_M_S * POLE_MAS * MAS
    return ut1, pole


def close(value: float) -> object:
    # The Earth's velocity may be taken 2 ms from the event (1e-5 m/s of 3e4); the site's own turns by 1e-7 meanwhile.
    return pytest.approx(value, rel=1e-6, abs=0)


def test_each_source_at_a_site(uncertain: tscale.ReferenceData) -> None:
    _, velocity = uncertain.ephemeris.state("earth", tscale.chain("UTC", "TDB@GEOCENTER")(T).pair)
    ut1, pole = by_hand(uncertain, velocity / C_M_S)
    chain = tscale.chain("UTC", "TDB", site=SITE, reference=uncertain)
    found = chain.uncertainty_s(T)
    assert set(found) == {"time ephemeris", "Earth orientation, UT1", "Earth orientation, pole"}
    assert float(found["time ephemeris"]) == 2e-10
    assert float(found["Earth orientation, UT1"]) == close(ut1)
    assert float(found["Earth orientation, pole"]) == close(pole)
    assert float(chain.sigma_s(T)) == pytest.approx(math.sqrt(2e-10**2 + ut1**2 + pole**2), rel=1e-6, abs=0)


def test_the_wavefront_adds_its_own(uncertain: tscale.ReferenceData) -> None:
    tdb = tscale.chain("UTC", "TDB@GEOCENTER")(T).pair
    _, velocity = uncertain.ephemeris.state("earth", tdb)
    date = by_hand(uncertain, velocity / C_M_S)
    wavefront = by_hand(uncertain, SOURCE.direction(tdb))
    chain = tscale.chain("TDB@TOPOCENTER", "TDB@BARYCENTER", site=SITE, source=SOURCE, reference=uncertain)
    alone = chain.uncertainty_s(tscale.chain("UTC", "TDB", site=SITE)(T))
    assert set(alone) == {"Earth orientation, UT1", "Earth orientation, pole"}
    whole = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE, reference=uncertain).uncertainty_s(T)
    for name, one, two in zip(alone, date, wavefront, strict=True):
        assert float(alone[name]) == close(two)
        assert float(whole[name]) == close(math.hypot(one, two))
    assert wavefront[1] == pytest.approx(6_365_000 / C_M_S * POLE_MAS * MAS, rel=1e-2, abs=0)  # 0.4 ns


def test_ut1_itself(uncertain: tscale.ReferenceData) -> None:
    found = tscale.chain("UTC", "UT1", reference=uncertain).uncertainty_s(T)
    assert set(found) == {"UT1"}
    assert float(found["UT1"]) == pytest.approx(UT1_S, rel=1e-12, abs=0)


def test_what_two_legs_share_by_name_is_combined() -> None:
    # To the barycentre and on to the geocentre: the time ephemeris is used at both ends.
    chain = tscale.chain("UTC", "UTC@GEOCENTER", site=SITE, source=SOURCE)
    found = chain.uncertainty_s(T)
    assert float(found["time ephemeris"]) == pytest.approx(math.sqrt(2.0) * 2e-10, rel=1e-12, abs=0)
