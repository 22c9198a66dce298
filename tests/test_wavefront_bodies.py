"""The gravitational delay of each body on a wavefront, alone and by hand."""

from __future__ import annotations

import math
from contextlib import closing
from decimal import Decimal, localcontext

import numpy as np
import pytest

import tscale
from tscale.transforms.shapiro import higher_orders
from tscale.transforms.wavefront import observer_state, wavefront_terms

C_M_S = Decimal(299792458)
AU_M = Decimal(149597870700)
# DE440 (comment area of de440.bsp), m3/s2.
GM_M3_S2 = {
    "sun": Decimal("132712440041279419000"),
    "mercury": Decimal("22031868551000"),
    "venus": Decimal("324858592000000"),
    "mars": Decimal("42828375816000"),
    "jupiter": Decimal("126712764100000000"),
    "saturn": Decimal("37940584841800000"),
    "uranus": Decimal("5794556400000000"),
    "neptune": Decimal("6836527100580000"),
    "moon": Decimal("4902800118000"),
}
T = tscale.Instants.from_iso("2027-02-11T06:00:00", scale="TDB", place="GEOCENTER")
SOURCE = tscale.Source(212.5, -31.0, parallax_mas=1000.0)


def decimals(vector: np.ndarray) -> list[Decimal]:
    return [Decimal(float(v)) for v in vector]


def dot(a: list[Decimal], b: list[Decimal]) -> Decimal:
    return sum((p * q for p, q in zip(a, b, strict=True)), Decimal(0))


def length(a: list[Decimal]) -> Decimal:
    return dot(a, a).sqrt()


def test_every_term_has_its_name() -> None:
    chain = tscale.chain("TDB@GEOCENTER", "TDB@BARYCENTER", source=SOURCE, second_order=True)
    bodies = {f"minus Shapiro delay, {body}" for body in GM_M3_S2}
    higher = {f"minus Shapiro delay, sun, {order} order" for order in ("second", "third")}
    assert set(chain.ledger(T)) == {"Roemer delay", "parallax (curvature)"} | bodies | higher
    infinite = tscale.chain("TDB@GEOCENTER", "TDB@BARYCENTER", source=tscale.Source(212.5, -31.0))
    assert set(infinite.ledger(T)) == {"Roemer delay"} | bodies


@pytest.mark.parametrize("body", GM_M3_S2)
def test_each_delay_by_hand(reference: tscale.ReferenceData, body: str) -> None:
    # (2GM/c^3)(1 + n.v/c) ln[(r + n.r)/au] (IERS Conventions 2010, eq. 11.17 for a far source; Kopeikin and Schaefer
    # 1999) along n as the observer sees a source at 1 pc, from the body where the light passed it. 1e-14 of 10 us and a
    # few roundings of r + n.r: 1e-19 s for the Sun, less for the others. The parallax of 1 arcsec is worth 5e-11 s.
    x = decimals(observer_state(T.pair, reference, None)[0])
    place, velocity = (decimals(part) for part in reference.ephemeris.state(body, T.pair))
    # The angles are the float64 that the source holds; sine and cosine to 1e-16.
    ra, dec = math.radians(SOURCE.ra_deg), math.radians(SOURCE.dec_deg)
    k = decimals(np.array([math.cos(dec) * math.cos(ra), math.cos(dec) * math.sin(ra), math.sin(dec)]))
    with localcontext() as context:
        context.prec = 40
        parsec_m = AU_M * 648000 / Decimal("3.14159265358979323846264338327950288")
        toward = [parsec_m * p / length(k) - q for p, q in zip(k, x, strict=True)]
        n = [p / length(toward) for p in toward]
        light_s = length([p - q for p, q in zip(x, place, strict=True)]) / C_M_S
        r = [p - (q - v * light_s) for p, q, v in zip(x, place, velocity, strict=True)]
        factor = 2 * GM_M3_S2[body] / C_M_S**3 * (1 + dot(n, velocity) / C_M_S)
        expected = float(factor * ((length(r) + dot(n, r)) / AU_M).ln())
    found = float(wavefront_terms(T.pair, reference, SOURCE).terms_s[f"minus Shapiro delay, {body}"])
    assert abs(expected) > 1e-14
    assert found == pytest.approx(expected, rel=1e-14, abs=1e-19)


def test_roemer_delay_from_the_coefficients_of_the_kernel(reference: tscale.ReferenceData) -> None:
    # k.x/c with the Chebyshev records of the kernel (type 2: NAIF SPK Required Reading) summed in 40 digits, read by
    # jplephem. In float64 a position at 1 au rounds to 0.1 ps; the parts that are summed apart leave 0.01 ps each.
    from jplephem.spk import SPK

    from tscale.ephemeris.shipped import DEFAULT_KERNEL, shipped_path

    start = int(T.whole)
    worst = 0.0
    with localcontext() as context, closing(SPK.open(shipped_path(DEFAULT_KERNEL))) as kernel:
        context.prec = 40
        ra, dec = math.radians(SOURCE.ra_deg), math.radians(SOURCE.dec_deg)
        k = decimals(np.array([math.cos(dec) * math.cos(ra), math.cos(dec) * math.sin(ra), math.sin(dec)]))
        k = [part / length(k) for part in k]
        for number in range(40):
            count = start + 3_456_789 * number
            x = [Decimal(0)] * 3
            for center, target in ((0, 3), (3, 399)):
                segment = kernel[center, target]
                first_jd, step_days, coefficients = segment.load_array()
                first_s, step_s = round((first_jd - 2451545.0) * 86400), round(step_days * 86400)
                record = int((count - first_s) // step_s)
                s = (Decimal(count) - Decimal(first_s + record * step_s)) / Decimal(step_s) * 2 - 1
                for axis in range(3):
                    before, now = Decimal(0), Decimal(0)
                    for c in coefficients[axis, record, :0:-1]:
                        before, now = now, 2 * s * now - before + Decimal(float(c))
                    x[axis] += (s * now - before + Decimal(float(coefficients[axis, record, 0]))) * 1000
            expected = dot(k, x) / C_M_S
            terms = wavefront_terms((np.array(count), np.array(0.0)), reference, SOURCE)
            found = Decimal(float(terms.terms_s["Roemer delay"])) + Decimal(float(terms.beyond_s))
            worst = max(worst, abs(float(found - expected)))
    assert worst < 2e-14


def test_second_order_at_right_angles() -> None:
    # Where psi = 90 degrees, r = d: the part that is not the bending -4/d is 15/4 (pi/2)/r (Richter and Matzner 1983;
    # Le Poncin-Lafitte et al. 2004), 4.3e-14 s at 1 au.
    gm, r_m, c = 1.32712440041279419e20, 149597870700.0, 299792458.0
    m = gm / c**2
    still = np.zeros(3)
    found = higher_orders(np.array([0.0, r_m, 0.0]), np.array([1.0, 0.0, 0.0]), still, gm)
    bending = 4 * m**2 / (c * r_m)
    assert float(found.second_s) - bending == pytest.approx(-15 * math.pi / 8 * m**2 / (c * r_m), rel=1e-12, abs=0)
    assert float(found.third_s) == pytest.approx(-8 * m**3 / (c * r_m**2), rel=1e-12, abs=0)
    # In front of the source (psi = 0) psi/sin(psi) is 1 and d = 2 r; far behind the limb it nears pi r/b.
    front = higher_orders(np.array([r_m, 0.0, 0.0]), np.array([1.0, 0.0, 0.0]), still, gm)
    assert float(front.second_s) == pytest.approx(-(15 / 4 - 2) * m**2 / (c * r_m), rel=1e-12, abs=0)
