"""The rate of TCG and TCL against TCB, from the metric itself, in forty digits."""

from __future__ import annotations

from decimal import Decimal, localcontext

import numpy as np
import pytest
from jplephem.spk import SPK

from tscale.ephemeris import Ephemeris, coordinate_rate
from tscale.ephemeris.shipped import DEFAULT_KERNEL, shipped_path

Vector = list[Decimal]

C_M_S = Decimal(299792458)
# Mass parameters in the comment area of de440.bsp, km3/s2, and the path of each body from the barycentre.
GM_KM3_S2 = {
    10: "132712440041.279419",
    1: "22031.868551",
    2: "324858.592000",
    399: "398600.435507",
    301: "4902.800118",
    4: "42828.375816",
    5: "126712764.100000",
    6: "37940584.841800",
    7: "5794556.400000",
    8: "6836527.100580",
    9: "975.500000",
}


def dot(a: Vector, b: Vector) -> Decimal:
    return sum((p * q for p, q in zip(a, b, strict=True)), Decimal(0))


def less(a: Vector, b: Vector) -> Vector:
    return [p - q for p, q in zip(a, b, strict=True)]


def states(kernel: SPK, jd: float) -> dict[int, tuple[Vector, Vector]]:
    """Barycentric places (m) and velocities (m/s) by jplephem, the sums of legs in decimals."""

    def leg(center: int, target: int) -> tuple[Vector, Vector]:
        position, velocity = kernel[center, target].compute_and_differentiate(jd)
        km_m = Decimal(1000)
        return [Decimal(float(p)) * km_m for p in position], [Decimal(float(v)) * km_m / 86400 for v in velocity]

    found = {}
    for body in GM_KM3_S2:
        legs = [leg(0, 3), leg(3, body)] if body in (399, 301) else [leg(0, body)]
        parts = [[sum(axis, Decimal(0)) for axis in zip(*(one[k] for one in legs), strict=True)] for k in (0, 1)]
        found[body] = (parts[0], parts[1])
    return found


def slowness(body: int, at: dict[int, tuple[Vector, Vector]]) -> Decimal:
    """1 - dT/dt on the world line of a body, in the field of all others.

    The metric of IAU 2000 Resolution B1.3 (Soffel et al. 2003, AJ 126, 2687, eqs. 8-10), with the potentials of B1.4
    (eqs. 40-44 there, spins left out) less the body's own terms, as eq. 58 has it. The interval is taken as it stands,
    with its square root: nothing is expanded, so that terms of order c^-6 (3e-24) are in it.
    """
    gm = {b: Decimal(text) * Decimal(10) ** 9 for b, text in GM_KM3_S2.items()}
    x, v = at[body]

    def gap(a: int, b: int) -> Decimal:
        away = less(at[a][0], at[b][0])
        return dot(away, away).sqrt()

    w0 = w1 = Decimal(0)
    w = [Decimal(0)] * 3
    for a in gm:
        if a == body:
            continue
        x_a, v_a = at[a]
        others = [b for b in gm if b != a]
        pull = [sum((gm[b] * (at[b][0][k] - x_a[k]) / gap(a, b) ** 3 for b in others), Decimal(0)) for k in range(3)]
        r_a = less(x, x_a)
        r = dot(r_a, r_a).sqrt()
        u = gm[a] / r
        w0 += u
        w1 -= u * (
            -2 * dot(v_a, v_a)
            + sum((gm[b] / gap(a, b) for b in others), Decimal(0))
            + ((dot(r_a, v_a) / r) ** 2 + dot(r_a, pull)) / 2
        )
        w = [p + u * q for p, q in zip(w, v_a, strict=True)]
    potential = w0 + w1 / C_M_S**2
    g00 = -1 + 2 * potential / C_M_S**2 - 2 * potential**2 / C_M_S**4
    g0i = [-4 * p / C_M_S**3 for p in w]
    gij = 1 + 2 * potential / C_M_S**2
    return 1 - (-(g00 + 2 * dot(g0i, v) / C_M_S + gij * dot(v, v) / C_M_S**2)).sqrt()


@pytest.mark.parametrize("body", [399, 301])
def test_against_the_metric_in_forty_digits(body: int) -> None:
    # 1e-22: the rounding of both readers' velocities (1e-15) leaves 2e-23 of the 1.5e-8, the terms of order c^-6 are
    # 3e-24; the least term of order c^-4, that of the bodies' accelerations, is 2e-21.
    jd = 2459945.5
    whole = np.array(round((jd - 2451545.0) * 86400))
    with localcontext() as context, SPK.open(shipped_path(DEFAULT_KERNEL)) as kernel:
        context.prec = 40
        expected = slowness(body, states(kernel, jd))
    found = coordinate_rate(Ephemeris.default(), body, (whole, np.array(0.0)))
    assert abs(Decimal(float(found)) - expected) < Decimal("1e-22")
    assert 1.4e-8 < expected < 1.6e-8
