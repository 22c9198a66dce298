"""The terms of TCB - TCG that depend on the observer's place, down to the order c^-4 and the metre they are in."""

from __future__ import annotations

from fractions import Fraction

import erfa
import numpy as np

import tscale
from tscale import exact
from tscale.transforms.barycentric import tdb_from_tt

SITE = tscale.Site.from_itrf("equator", 6_378_000.0, 12_000.0, -40_000.0)
C = Fraction(299792458)
L_G, L_B = Fraction(6969290134, 10**19), Fraction(1550519768, 10**17)
GM_SUN_M3_S2 = 1.3271244004127942e20  # DE440, TDB-compatible
AU_M, DAY_S = 149597870700.0, 86400.0


def test_second_term_against_states_of_erfa() -> None:
    # 2 GM/r/c^2 of the first term, IAU 2000 B1.5 and B1.3, with the Earth's r by erfa.epv00 (VSOP2000, good to 1e-7):
    # 4e-14 s times 1e-6 for the potentials of Moon and Jupiter, which are left out on both sides.
    t = tscale.Instants.from_seconds(np.arange(4000) * 20_011 + 700_000_000, 0.25, scale="TT")
    ledger = tscale.chain("TT", "TCB", site=SITE).ledger(t)
    heliocentric, _ = erfa.epv00(2451545.0, t.whole / DAY_S)
    r_m = np.linalg.norm(heliocentric["p"], axis=-1) * AU_M
    expected = ledger["topocentric v.r/c^2"] * (2 * GM_SUN_M3_S2 / r_m) / float(C) ** 2
    found = ledger["topocentric, order c^-4"]
    assert np.max(np.abs(found - expected)) < 1e-15
    assert np.max(np.abs(found)) > 3e-14


def test_both_terms_against_the_resolution_in_barycentric_vectors(reference: tscale.ReferenceData) -> None:
    # IAU 2000 B1.5 as it is written, with r = x - x_E of the BCRS: (1 + (3 w + v^2/2)/c^2) v.r/c^2. The vector r comes
    # from X by the Lorentz contraction and the Sun's potential (Soffel et al. 2003, AJ 126, 2687, eq. 58), in numbers.
    t = tscale.Instants.from_seconds(np.arange(500) * 123_457 + 700_000_000, 0.25, scale="TT")
    tdb = tdb_from_tt(t.pair, reference, SITE)
    x, _ = SITE.gcrs(t.pair, reference)
    x = x / (1.0 - 6.969290134e-10)  # TCG metres
    earth, v = reference.ephemeris.state("earth", tdb)
    w = GM_SUN_M3_S2 / np.linalg.norm(reference.ephemeris.position("sun", tdb) - earth, axis=-1)
    v_x, v2, c2 = np.sum(v * x, axis=-1), np.sum(v * v, axis=-1), float(C) ** 2
    r = x - (0.5 * v * v_x[:, None] + w[:, None] * x) / c2
    whole = np.sum(v * x, axis=-1) / c2  # in floats the change of r is lost in r: take it apart
    change = (np.sum(v * (r - x), axis=-1) / c2) + whole * (3.0 * w + 0.5 * v2) / c2
    ledger = tscale.chain("TT", "TCB", site=SITE).ledger(t)
    # r - x carries the rounding of r, 1e-9 m of 6e6: 3e-22 s.
    assert np.max(np.abs(ledger["topocentric, order c^-4"] - change)) < 1e-16


def test_units_of_the_topocentric_term(reference: tscale.ReferenceData) -> None:
    # Two events of one TT, at the site and at the geocentre, have TCB - TCG that differ by q and by the integral's own
    # growth meanwhile: (TCB - TCB0)(dTCG/dTCB) = q. With q = (v.X/c^2)(1 + 2 w/c^2), X = r_TT/(1 - L_G) in
    # TCG metres, TDB - TDB0 = (1 - L_B)(TCB - TCB0). Each factor is worth 1.4e-15 s of 2 us; the two dates round to
    # 0.6e-16 s each.
    worst = 0.0
    for number in range(60):
        tt = (np.array(650_000_000 + number * 1_234_567), np.array(0.4))
        here, geocentre = tdb_from_tt(tt, reference, SITE), tdb_from_tt(tt, reference)
        r, _ = SITE.gcrs(tt, reference)
        earth, v = reference.ephemeris.state("earth", here)
        sun_m = np.linalg.norm(reference.ephemeris.position("sun", here) - earth)
        first = sum(Fraction(float(a)) * Fraction(float(b)) for a, b in zip(r, v, strict=True)) / (1 - L_G) / C**2
        second = 2 * Fraction(GM_SUN_M3_S2 / float(sun_m)) / C**2
        slow = Fraction(float(tscale.ephemeris.coordinate_rate(reference.ephemeris, "earth", here)))
        expected = first * (1 + second) / (1 - slow) * (1 - L_B)
        whole, fraction = exact.subtract(here, geocentre)
        found = Fraction(int(whole)) + Fraction(float(fraction))
        # The difference itself loses a bit where it is negative, as 1 - 2e-6.
        assert abs(found - expected) < Fraction(2, 10**16)
        worst = max(worst, abs(float(expected)))
    assert worst > 1.9e-6
