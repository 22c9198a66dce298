"""The law of propagation against the worked examples of the GUM and of its supplement on Monte Carlo.

Numbers of JCGM 100:2008 (annexes H.1, H.2 and table G.2) and JCGM 101:2008 (clause 9.2) from memory.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from tscale.budget import coverage_factor, gum
from tscale.budget.law import student_t_probability
from tscale.errors import InvalidInput

# ---- H.1: end-gauge calibration; lengths in nm, temperatures in degC -------------------------------


def gauge(l_s: float, d: float, alpha_s: float, theta: float, d_alpha: float, d_theta: float) -> float:
    """JCGM 100:2008, equation H.3: l = l_S + d - l_S (d_alpha theta + alpha_S d_theta)."""
    return l_s + d - l_s * (d_alpha * theta + alpha_s * d_theta)


def gauge_inputs() -> list[gum.Quantity]:
    comparison = gum.Quantity.combined(
        "d", 215.0, [(13.0 / math.sqrt(5.0), 24), (10.0 / 2.57, 5), (20.0 / 3.0, 8)], unit="nm"
    )
    theta = gum.Quantity.combined("theta", -0.1, [(0.2, math.inf), (0.5 / math.sqrt(2.0), math.inf)], unit="degC")
    return [
        gum.Quantity("l_S", 50_000_623.0, 25.0, "B", "normal", 18, "nm"),
        comparison,
        gum.Quantity.within("alpha_S", 11.5e-6, 2e-6, unit="1/degC"),
        theta,
        gum.Quantity.within("d_alpha", 0.0, 1e-6, dof=50, unit="1/degC"),
        gum.Quantity.within("d_theta", 0.0, 0.05, dof=2, unit="degC"),
    ]


def test_end_gauge() -> None:
    inputs = gauge_inputs()
    found = gum.evaluate(gauge, inputs)
    # Table H.1: standard uncertainties of the inputs, contributions, and the result, as printed.
    sigma = {q.name: q.sigma for q in inputs}
    assert round(sigma["d"], 1) == 9.7
    assert [round(part, 1) for part in (13.0 / math.sqrt(5.0), 10.0 / 2.57, 20.0 / 3.0)] == [5.8, 3.9, 6.7]
    assert round(inputs[1].dof, 1) == 25.6
    assert round(sigma["alpha_S"] * 1e6, 1) == 1.2
    assert round(sigma["theta"], 2) == 0.41
    assert round(sigma["d_alpha"] * 1e6, 2) == 0.58
    assert round(sigma["d_theta"], 3) == 0.029
    parts = np.abs(found.contributions)
    np.testing.assert_allclose(parts[[2, 3]], 0.0, atol=1e-6)
    assert [round(float(part), 1) for part in parts[[0, 1, 4, 5]]] == [25.0, 9.7, 2.9, 16.6]
    assert float(found.value) == 50_000_838.0
    assert round(float(found.sigma)) == 32
    assert math.floor(found.effective_dof) == 16
    assert round(coverage_factor(0.99, 16), 2) == 2.92
    # H.1.6 prints 93 nm, as 2.92 x 32 nm; unrounded it is 92.5.
    assert round(2.92 * 32) == 93
    assert float(found.expanded(probability=0.99)) == pytest.approx(92.5, abs=0.1)
    assert "d_theta" in found.table()


def test_end_gauge_to_second_order() -> None:
    # H.1.7: two terms of the next order, 11.7 nm and 1.7 nm, bring 32 nm to 34 nm.
    inputs = gauge_inputs()
    first = gum.evaluate(gauge, inputs)
    second = gum.evaluate(gauge, inputs, second_order=True)
    added = math.sqrt(float(second.covariance - first.covariance))
    length, sigma = 50_000_623.0, {q.name: q.sigma for q in inputs}
    terms = length * sigma["d_alpha"] * sigma["theta"], length * sigma["alpha_S"] * sigma["d_theta"]
    assert [round(term, 1) for term in terms] == [11.7, 1.7]
    # Unrounded inputs; the terms with u(l_S) are 1e-6 of these.
    assert added == pytest.approx(math.hypot(*terms), rel=1e-4)
    assert round(float(second.sigma)) == 34


# ---- H.2: resistance and reactance measured at the same time ----------------------------------------

VOLTAGE = [5.007, 4.994, 5.005, 4.990, 4.999]
CURRENT_A = [19.663e-3, 19.639e-3, 19.640e-3, 19.685e-3, 19.678e-3]
PHASE = [1.0456, 1.0438, 1.0468, 1.0428, 1.0433]


def impedance(v: float, i: float, phi: float) -> tuple[float, float, float]:
    return v / i * math.cos(phi), v / i * math.sin(phi), v / i


def test_resistance_and_reactance() -> None:
    inputs = [
        gum.Quantity.of_readings(name, column) for name, column in (("V", VOLTAGE), ("I", CURRENT_A), ("phi", PHASE))
    ]
    r = gum.correlation_of_readings(VOLTAGE, CURRENT_A, PHASE)
    # Table H.2.
    assert [round(q.value, digits) for q, digits in zip(inputs, (4, 7, 5), strict=True)] == [4.9990, 0.019661, 1.04446]
    assert [f"{q.sigma:.2g}" for q in inputs] == ["0.0032", "9.5e-06", "0.00075"]
    assert [round(float(value), 2) for value in (r[0, 1], r[0, 2], r[1, 2])] == [-0.36, 0.86, -0.65]
    found = gum.evaluate(impedance, inputs, r)
    # Table H.3.
    assert [round(float(value), 3) for value in found.value] == [127.732, 219.847, 254.260]
    # 0.295 is what the second way of H.2.4, below, gives unrounded; the law itself gives 0.2956.
    np.testing.assert_allclose(found.sigma, [0.071, 0.295, 0.236], rtol=0, atol=0.6e-3)
    c = found.correlation
    assert [round(float(value), 3) for value in (c[0, 1], c[0, 2], c[1, 2])] == [-0.588, -0.485, 0.993]
    # H.2.4, table H.4: each set of readings through the model first, then the mean.
    sets = np.array([impedance(*row) for row in zip(VOLTAGE, CURRENT_A, PHASE, strict=True)]).T
    second = [gum.Quantity.of_readings(name, column) for name, column in zip("RXZ", sets, strict=True)]
    assert [round(q.value, 3) for q in second] == [127.732, 219.847, 254.260]
    assert [round(q.sigma, 3) for q in second] == [0.071, 0.295, 0.236]
    r2 = gum.correlation_of_readings(*sets)
    assert [round(float(value), 3) for value in (r2[0, 1], r2[0, 2], r2[1, 2])] == [-0.588, -0.485, 0.993]
    # Without the correlations the resistance would come out far from that: the check can fail.
    assert float(gum.evaluate(impedance, inputs).sigma[0]) > 0.15
    with pytest.raises(InvalidInput, match="independent inputs"):
        found.expanded(probability=0.95)
    assert found.expanded().shape == (3,)
    by_name = gum.evaluate(impedance, inputs, {("V", "I"): r[0, 1], ("V", "phi"): r[0, 2], ("I", "phi"): r[1, 2]})
    np.testing.assert_allclose(by_name.covariance, found.covariance, rtol=1e-12)


# ---- JCGM 101:2008, 9.2: additive model ---------------------------------------------------------


def total(*x: object) -> object:
    return sum(x)  # type: ignore[call-overload]


@pytest.mark.parametrize(
    ("distribution", "widest", "sigma", "reach"),
    # 9.2.2, 9.2.3 and 9.2.4: u(y) and the 95 % interval; the last of the four inputs has 1, 1 and 10.
    [("normal", 1.0, 2.0, 3.92), ("rectangular", 1.0, 2.0, 3.88), ("rectangular", 10.0, 10.1, 17.0)],
)
def test_additive_model(distribution: gum.Distribution, widest: float, sigma: float, reach: float) -> None:
    inputs = [gum.Quantity(f"x{i}", 0.0, widest if i == 3 else 1.0, distribution=distribution) for i in range(4)]
    assert float(gum.evaluate(total, inputs).sigma) == pytest.approx(sigma, rel=0, abs=0.05)
    draws = gum.sampled(total, inputs, 400_000, seed=3)
    # 400000 draws leave 0.1 % in u and about 0.4 % in the ends of the interval; two decimals are printed, then one.
    assert draws.std(ddof=1) == pytest.approx(math.sqrt(3.0 + widest**2), rel=5e-3)
    low, high = np.quantile(draws, [0.025, 0.975])
    tolerance = 0.02 if widest == 1.0 else 0.06
    assert high == pytest.approx(reach, rel=0, abs=tolerance)
    assert low == pytest.approx(-reach, rel=0, abs=tolerance)


def test_draws_of_correlated_and_of_few_readings() -> None:
    pair = [gum.Quantity("a", 1.0, 2.0), gum.Quantity("b", 3.0, 1.0)]
    draws = gum.sampled(lambda a, b: (a, b), pair, 100_000, seed=5, correlation={("a", "b"): -0.8})
    np.testing.assert_allclose(np.cov(draws), [[4.0, -1.6], [-1.6, 1.0]], atol=0.05)
    few = [gum.Quantity.of_readings("x", [1.0, 2.0, 4.0, 5.0, 3.0])]
    # Student's t with 4 degrees of freedom: standard deviation sqrt(4 / 2) of the scale (JCGM 101:2008, 6.4.9.4).
    assert gum.sampled(lambda x: x, few, 400_000, seed=6).std() == pytest.approx(
        few[0].sigma * math.sqrt(2.0), rel=0.03
    )
    with pytest.raises(InvalidInput, match="normal"):
        gum.sampled(total, [pair[0], gum.Quantity.within("c", 0.0, 1.0)], correlation={("a", "c"): 0.5})


# ---- annex G ----------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("dof", "probability", "printed"),
    # Table G.2.
    [
        (1, 0.6827, 1.84),
        (1, 0.95, 12.71),
        (2, 0.95, 4.30),
        (3, 0.99, 5.84),
        (5, 0.9545, 2.65),
        (10, 0.95, 2.23),
        (16, 0.99, 2.92),
        (20, 0.9973, 3.42),
        (50, 0.95, 2.01),
        (100, 0.99, 2.626),
        (math.inf, 0.95, 1.960),
        (math.inf, 0.99, 2.576),
        (math.inf, 0.9545, 2.000),
    ],
)
def test_coverage_factors(dof: float, probability: float, printed: float) -> None:
    digits = len(f"{printed:.3f}".rstrip("0").split(".")[1])
    assert coverage_factor(probability, dof) == pytest.approx(printed, rel=0, abs=0.51 * 10.0 ** -max(digits, 2))


def test_coverage_factors_join() -> None:
    assert coverage_factor(0.95, 16.9) == coverage_factor(0.95, 16)
    # The series past 1000 degrees of freedom against the sum below; two terms leave less than 1e-8.
    assert coverage_factor(0.99, 1000.5) == pytest.approx(coverage_factor(0.99, 1000), rel=1e-6)
    assert student_t_probability(coverage_factor(0.99, 1001), 1001) == pytest.approx(0.99, rel=1e-8)
    for probability, dof in ((0.0, 5.0), (1.0, 5.0), (0.95, 0.5)):
        with pytest.raises(InvalidInput):
            coverage_factor(probability, dof)


# ---- misuse -----------------------------------------------------------------------------------


def test_what_is_refused() -> None:
    x, y = gum.Quantity("x", 1.0, 0.1), gum.Quantity("y", 2.0, 0.1)
    for bad in ((math.nan, 0.1), (1.0, -0.1), (1.0, math.inf)):
        with pytest.raises(InvalidInput, match="finite"):
            gum.Quantity("x", *bad)
    with pytest.raises(InvalidInput, match="readings"):
        gum.Quantity.of_readings("x", [1.0])
    with pytest.raises(InvalidInput, match="rectangular"):
        gum.Quantity.within("x", 0.0, 1.0, "normal")
    with pytest.raises(InvalidInput, match="different names"):
        gum.evaluate(total, [x, x])
    with pytest.raises(InvalidInput, match="finite number"):
        gum.evaluate(lambda a: math.inf, [x])
    for r in ([[1.0, 2.0], [2.0, 1.0]], [[1.0, 0.1], [0.2, 1.0]], [[1.0]]):
        with pytest.raises(InvalidInput, match="symmetric"):
            gum.evaluate(total, [x, y], r)
    with pytest.raises(InvalidInput, match="no pair"):
        gum.evaluate(total, [x, y], {("x", "z"): 0.5})
    with pytest.raises(InvalidInput, match="independent"):
        gum.evaluate(total, [x, y], {("x", "y"): 0.5}, second_order=True)
    with pytest.raises(InvalidInput, match="not both"):
        gum.evaluate(total, [x, y]).expanded(factor=2.0, probability=0.95)
    with pytest.raises(InvalidInput, match="as many readings"):
        gum.correlation_of_readings([1.0, 2.0], [1.0, 2.0, 3.0])


def test_exact_inputs_and_powers() -> None:
    # y = x^2 z with z exact: u = 2 x z u(x); the second order adds u(x)^4 z^2 * (1/2) (2)^2.
    x, z = gum.Quantity("x", 3.0, 0.2), gum.Quantity("z", 2.0, 0.0)
    first = gum.evaluate(lambda a, b: a * a * b, [x, z])
    assert float(first.sigma) == pytest.approx(2.4, rel=1e-10)
    assert first.sensitivities.tolist() == pytest.approx([12.0, 9.0], rel=1e-8)
    second = gum.evaluate(lambda a, b: a * a * b, [x, z], second_order=True)
    assert float(second.covariance - first.covariance) == pytest.approx(0.5 * 16 * 0.2**4, rel=1e-6)
    assert math.isinf(first.effective_dof)
    assert float(first.expanded(factor=3.0)) == pytest.approx(7.2, rel=1e-10)
