"""How errors go together between instants: against the same sums written out, and drawn."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tscale.budget import Budget, Common, Contribution, Correlation, Exponential, Independent, Rows
from tscale.budget.correlation import pair_sum, unit_draws
from tscale.exact import FloatArray

AT_S = np.array([30.0, 0.0, 10.0, 10.0, 55.0])
INDEX = np.array([[0, 1], [0, 1], [1, 2], [2, 3], [3, 3]])
WEIGHT = np.array([[0.25, 0.75], [1.0, 0.0], [0.5, 0.5], [0.9, 0.1], [1.0, 0.0]])
ROW_SIGMA = np.array([1.0, 2.0, 1.5, 0.5])
PHASE = np.array([0.0, 0.7, 1.0, 3.0])
SIGNED = np.array([1.0, -2.0, 0.5, 0.0, 3.0])


def rows(phase: FloatArray | None) -> Rows:
    return Rows(INDEX, WEIGHT, ROW_SIGMA, phase, "rows")


def carried(phase: FloatArray | None) -> FloatArray:
    """W C W^T with whole matrices."""
    whole = np.zeros((5, 4))
    for i, (nodes, weights) in enumerate(zip(INDEX, WEIGHT, strict=True)):
        for k, w in zip(nodes, weights, strict=True):
            whole[i, k] += w
    r = np.eye(4) if phase is None else np.exp(-np.abs(phase[:, None] - phase))
    return np.asarray(whole @ (ROW_SIGMA[:, None] * r * ROW_SIGMA) @ whole.T)


LAWS: list[tuple[Correlation, FloatArray]] = [
    (Common(), np.ones((5, 5))),
    (Independent(), np.eye(5)),
    (Exponential(AT_S, 20.0), np.exp(-np.abs(AT_S[:, None] - AT_S) / 20.0)),
]
for chosen in (None, PHASE, np.zeros(4)):
    full = carried(chosen)
    size = np.sqrt(np.diag(full))
    LAWS.append((rows(chosen), full / np.outer(size, size)))


@pytest.mark.parametrize(("law", "expected"), LAWS)
def test_matrix_and_sum(law: Correlation, expected: FloatArray) -> None:
    np.testing.assert_allclose(law.matrix(5), expected, rtol=0, atol=1e-14)
    assert law.variance_of_sum(SIGNED) == pytest.approx(float(SIGNED @ expected @ SIGNED), rel=1e-12)
    assert np.linalg.eigvalsh(law.matrix(5))[0] > -1e-12


@pytest.mark.parametrize(("law", "expected"), LAWS)
def test_draws(law: Correlation, expected: FloatArray) -> None:
    drawn = law.draw(np.random.default_rng(11), 40_000, 5, "normal")
    # Each coefficient of 40000 draws is good to 1 / sqrt(40000) = 0.005; four of these.
    np.testing.assert_allclose(np.cov(drawn, rowvar=False), expected, rtol=0, atol=0.02 * np.sqrt(2.0))


@pytest.mark.parametrize("phase", [None, PHASE, np.zeros(4)])
def test_many_rows_are_like_few(phase: FloatArray | None) -> None:
    law = rows(phase)
    used, where = np.unique(INDEX, return_inverse=True)
    where = where.reshape(INDEX.shape)
    np.testing.assert_allclose(law._paired(used, where), carried(phase), rtol=0, atol=1e-14)
    # A hundred instants by four of 400 rows each, in no order.
    rng = np.random.default_rng(8)
    index = rng.integers(0, 396, 100)[:, None] + np.arange(4)
    many = Rows(index, rng.normal(size=(100, 4)), rng.uniform(0.5, 2.0, 400), np.cumsum(rng.uniform(0, 1, 400)), "")
    if phase is None:
        many = Rows(many.index, many.weight, many.sigma, None, "")
    used, where = np.unique(index, return_inverse=True)
    where = where.reshape(index.shape)
    np.testing.assert_allclose(many._paired(used, where), many._dense(used, where), rtol=0, atol=1e-12)


def test_sigma_of_rows() -> None:
    for phase in (None, PHASE):
        np.testing.assert_allclose(rows(phase).at(), np.sqrt(np.diag(carried(phase))), rtol=1e-13)


@given(st.lists(st.tuples(st.floats(0.0, 50.0), st.floats(-5.0, 5.0)), max_size=40))
def test_pair_sum(pairs: list[tuple[float, float]]) -> None:
    pairs.sort()
    phase, signed = (np.array(column, dtype=np.float64) for column in zip(*pairs, strict=True)) if pairs else ([], [])
    phase, signed = np.asarray(phase), np.asarray(signed)
    expected = float(signed @ np.exp(-np.abs(phase[:, None] - phase)) @ signed) if pairs else 0.0
    before = phase.copy(), signed.copy()
    assert pair_sum(signed, phase) == pytest.approx(expected, rel=1e-9, abs=1e-9)
    assert (phase == before[0]).all()
    assert (signed == before[1]).all()


@pytest.mark.parametrize("distribution", ["normal", "rectangular", "triangular", "arcsine"])
def test_unit_draws(distribution: str) -> None:
    drawn = unit_draws(np.random.default_rng(2), distribution, (100_000,))
    assert drawn.mean() == pytest.approx(0.0, abs=0.02)
    assert drawn.std() == pytest.approx(1.0, abs=0.02)
    # Half-widths sqrt(3), sqrt(6), sqrt(2) of unit variance (JCGM 100:2008, 4.3.7 to 4.3.9).
    reach = {"rectangular": np.sqrt(3.0), "triangular": np.sqrt(6.0), "arcsine": np.sqrt(2.0)}.get(distribution, 9.0)
    assert np.abs(drawn).max() <= reach


def test_a_common_offset_is_not_averaged_away() -> None:
    n = 10_000
    one = np.ones(n)

    def budget(law: Correlation) -> Budget:
        return Budget([Contribution("x", "x", "s", one, 1e-9 * one, correlation=law)], [], (n,))

    assert budget(Common()).mean_sigma_s() == pytest.approx(1e-9, rel=1e-12, abs=0)
    assert budget(Independent()).mean_sigma_s() == pytest.approx(1e-11, rel=1e-12, abs=0)
    # Errors that fade within 100 of 10000 s: 2 decay / span of the variance is left (their integral), less ends.
    fading = budget(Exponential(np.arange(float(n)), 100.0)).mean_sigma_s()
    assert fading == pytest.approx(1e-9 * np.sqrt(2 * 100 / n * (1 - 100 / n)), rel=1e-3, abs=0)
    # In a difference of two instants it is the other way round.
    weights = np.zeros(n)
    weights[[0, 1]] = -1.0, 1.0
    assert budget(Common()).mean_sigma_s(weights) == 0.0
    assert budget(Independent()).mean_sigma_s(weights) == pytest.approx(np.sqrt(2.0) * 1e-9, rel=1e-12, abs=0)
