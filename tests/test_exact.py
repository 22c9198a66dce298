"""Two-part arithmetic against exact rationals."""

from __future__ import annotations

import math
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from tscale import exact
from tscale.constants import L_B, L_G
from tscale.ephemeris import ChebyshevTable
from tscale.ephemeris.integrator import _running_sum
from tscale.exact import Factor, Pair

TINY, ALMOST_ONE = 2.0**-60, 1.0 - 2.0**-53
FRACTIONS = st.one_of(
    st.sampled_from(
        [0.0, TINY, 2.0**-53 + TINY, 2.0**-54, 0.5, 0.5 + TINY, 0.5 - 2.0**-54, 1.0 - 2.0**-52, ALMOST_ONE]
    ),
    st.floats(0.0, 1.0, exclude_max=True),
)


def pair(whole: int, fraction: float) -> Pair:
    return np.array(whole, dtype=np.int64), np.array(fraction)


def rational(value: Pair) -> Fraction:
    return Fraction(int(value[0])) + Fraction(float(value[1]))


def nearest(value: Fraction) -> tuple[int, float]:
    """The pair nearest to a rational: its fraction rounded once."""
    whole = math.floor(value)
    fraction = float(value - whole)
    return (whole + 1, 0.0) if fraction == 1.0 else (whole, fraction)


@given(a=st.integers(-(2**60), 2**60), b=st.integers(-(2**60), 2**60), fractions=st.tuples(FRACTIONS, FRACTIONS))
def test_a_sum_is_rounded_once(a: int, b: int, fractions: tuple[float, float]) -> None:
    one, two = pair(a, fractions[0]), pair(b, fractions[1])
    whole, fraction = exact.add(one, two)
    assert (int(whole), float(fraction)) == nearest(rational(one) + rational(two))


@pytest.mark.parametrize(
    ("a", "b"),
    [(TINY, ALMOST_ONE), (2.0**-53 + TINY, ALMOST_ONE), (0.5 + 2.0**-53, 0.5 - 2.0**-54), (ALMOST_ONE, ALMOST_ONE)],
)
def test_sums_at_the_edge_of_a_second(a: float, b: float) -> None:
    whole, fraction = exact.add(pair(7, a), pair(-3, b))
    assert (int(whole), float(fraction)) == nearest(4 + Fraction(a) + Fraction(b))


@example(a=5, b=2, fractions=(TINY, ALMOST_ONE))
@given(a=st.integers(-(2**60), 2**60), b=st.integers(-(2**60), 2**60), fractions=st.tuples(FRACTIONS, FRACTIONS))
def test_a_difference_is_rounded_once(a: int, b: int, fractions: tuple[float, float]) -> None:
    one, two = pair(a, fractions[0]), pair(b, fractions[1])
    difference = exact.subtract(one, two)
    # Half an ulp of a fraction; a borrow of a whole second rounds in between, by half an ulp as well.
    assert abs(rational(difference) - (rational(one) - rational(two))) <= Fraction(2.0**-53)
    # Without a borrow, or with one that is exact because the difference is then below half a second: rounded once.
    if fractions[0] >= fractions[1] or fractions[1] - fractions[0] >= 0.5:
        assert (int(difference[0]), float(difference[1])) == nearest(rational(one) - rational(two))


@given(
    whole=st.one_of(st.integers(-(2**36), 2**36), st.integers(2**40, 2**62), st.integers(-(2**62), -(2**40))),
    fraction=FRACTIONS,
    constant=st.sampled_from([L_B, -L_B, L_G, L_G / (1 - L_G), L_B / (1 - L_B)]),
)
def test_products_with_the_defining_rates(whole: int, fraction: float, constant: Fraction) -> None:
    product = exact.multiply(pair(whole, fraction), Factor.of(constant))
    assert abs(rational(product) - (Fraction(whole) + Fraction(fraction)) * constant) < Fraction(5, 10**16)


def test_running_sum_against_exact_summation() -> None:
    # Panels of the size of a time ephemeris (1e-4 s) with some far larger: a plain cumulative sum wanders by 1e-11.
    random = np.random.default_rng(7)
    values = random.normal(size=4000) * 1e-4
    values[::97] *= 1e9
    values[5::97] = -values[::97][: values[5::97].size]
    sums = _running_sum(values)
    for number in range(0, 4000, 7):
        expected = math.fsum(values[: number + 1])
        assert abs(sums[number] - expected) <= np.spacing(abs(expected))
    assert np.abs(np.cumsum(values) - sums).max() > 1e-12


@pytest.mark.parametrize("step_s", [86400.1, 1e5 / 3, 86400.0])
def test_place_within_records_of_an_odd_length(step_s: float) -> None:
    # Decades of records: their starts round to 2e-7 s in one float64. The argument, which runs from -1 to 1, is to
    # keep 1e-15, four of its units in the last place.
    table = ChebyshevTable(-1.25e9 + 0.3, step_s, np.ones((40_000, 1, 1)))
    random = np.random.default_rng(8)
    whole, fraction = random.integers(-1_249_999_999, int(table.span[1]), 2000), random.random(2000)
    record, argument = table.locate(whole, fraction)
    start, step = Fraction(table.start_s), Fraction(step_s)
    for w, f, n, x in zip(whole.tolist(), fraction.tolist(), record.tolist(), argument.tolist(), strict=True):
        assert abs((Fraction(w) + Fraction(f) - start - n * step) * 2 / step - 1 - Fraction(x)) < Fraction(1, 10**15)
