"""Instants: exactness, immutability, shapes, and the errors that teach."""

from __future__ import annotations

import copy
import pickle
from fractions import Fraction

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

import tscale
from tscale import exact
from tscale.constants import L_B, L_G
from tscale.exact import Factor

from .strategies import dates, fractions

big = st.integers(-(2**61), 2**61)
shifts = st.one_of(st.floats(-1e12, 1e12), st.sampled_from([0.0, -5e-324, 2.0**-60, -(2.0**-60), 1 - 2.0**-53]))


def rational(pair: exact.Pair) -> Fraction:
    return Fraction(int(pair[0])) + Fraction(float(pair[1]))


@given(big, fractions, shifts)
def test_a_shift_is_exact_to_half_an_ulp_of_a_second(whole: int, fraction: float, shift: float) -> None:
    t = tscale.Instants.from_seconds(whole, fraction, scale="TT")
    moved = t.shifted(shift)
    assert 0.0 <= float(moved.fraction) < 1.0
    assert abs(rational(moved.pair) - rational(t.pair) - Fraction(shift)) <= Fraction(2) ** -53


@given(big, fractions, big, fractions)
def test_differences_are_exact(a: int, f: float, b: int, g: float) -> None:
    t, u = tscale.Instants.from_seconds(a, f, scale="TT"), tscale.Instants.from_seconds(b, g, scale="TT")
    assert abs(rational(t.minus_exact(u)) - (rational(t.pair) - rational(u.pair))) <= Fraction(2) ** -53
    assert float(t.minus(u)) == pytest.approx(float(rational(t.pair) - rational(u.pair)), rel=3e-16, abs=1.2e-16)


@given(big, fractions, st.sampled_from([L_G, L_B, L_G / (1 - L_G), -L_B]))
def test_products_with_a_defining_rate_against_rationals(whole: int, fraction: float, rate: Fraction) -> None:
    # 0.5 fs for any count an int64 holds: what float64 would lose is 4 fs after 60 s of L_B alone.
    pair = exact.multiply((np.asarray(whole), np.asarray(fraction)), Factor.of(rate))
    assert abs(rational(pair) - (Fraction(whole) + Fraction(fraction)) * rate) < Fraction(5, 10**16)


@given(dates("UTC", end=870_000_000), st.integers(0, 18))
def test_text_there_and_back(t: tscale.Instants, digits: int) -> None:
    text = t.to_iso(digits)
    back = tscale.Instants.from_iso(text, scale="UTC")
    assert abs(back.minus(t)) <= 0.5000001 * 10.0**-digits + 3e-16
    assert back.to_iso(digits) == text


@given(dates("UTC", end=870_000_000))
def test_julian_dates_there_and_back(t: tscale.Instants) -> None:
    # A float64 fraction of a day resolves 1.1e-16 d = 10 ps.
    for out, back in (("to_mjd", "from_mjd"), ("to_jd", "from_jd")):
        day, fraction = getattr(t, out)()
        assert 0.0 <= float(fraction) < 1.0
        assert abs(getattr(tscale.Instants, back)(day, fraction, scale="UTC").minus(t)) < 11e-12


def test_eighteen_decimals() -> None:
    t = tscale.Instants.from_iso("2031-03-01T04:05:06.000000000000000123", scale="TDB")
    assert float(t.fraction) == 1.23e-16
    assert t.to_iso(18) == "2031-03-01T04:05:06.000000000000000123"


@pytest.mark.filterwarnings("ignore::tscale.errors.ExtrapolationWarning")
def test_the_pinned_ways_in_and_out() -> None:
    with pytest.warns(tscale.ExtrapolationWarning, match="leap second"):
        t = tscale.Instants.from_iso(["2031-03-01T04:05:06.123456789012"], scale="UTC")
    assert (t.scale, t.place, len(t), t.shape) == ("UTC", None, 1, (1,))
    assert t.at("GEOCENTER").place == "GEOCENTER"
    u = tscale.Instants.from_mjd([51544], [0.5], scale="UTC")
    assert (u.whole.tolist(), u.fraction.tolist()) == ([0], [0.0])
    assert u.to_jd()[0].tolist() == [2451545]
    assert (
        tscale.Instants.from_seconds(1, 0.25, scale="TT")
        .shifted((2, 0.5))
        .minus(tscale.Instants.from_seconds(0, 0.0, scale="TT"))
        == 3.75
    )
    assert t[0:1].to_iso(12).tolist() == ["2031-03-01T04:05:06.123456789012"]


def test_a_leap_day_of_mjd_is_86401_s_long_unless_asked_otherwise() -> None:
    t = tscale.Instants.from_iso("2016-12-31T23:59:60.5", scale="UTC")
    assert float(t.to_mjd()[1]) == pytest.approx(86400.5 / 86401, abs=1e-15)
    noon = tscale.Instants.from_iso("2016-12-31T12:00:00", scale="UTC")
    assert float(noon.to_mjd(utc_day="86400")[1]) == 0.5
    assert float(noon.to_mjd()[1]) == pytest.approx(43200 / 86401, abs=1e-15)
    assert tscale.Instants.from_mjd(57753, 0.5, scale="UTC", utc_day="86400") == noon
    with pytest.raises(tscale.errors.InvalidInput):
        t.to_mjd(utc_day="86400")


def test_a_made_up_table_with_a_negative_leap_second() -> None:
    table = tscale.LeapSeconds.default().with_step(64693, 36.0).with_expiry(70000)  # 2036-01-01
    t = tscale.Instants.from_iso(["2035-12-31T23:59:58", "2036-01-01T00:00:00"], scale="UTC", leap_seconds=table)
    assert t[1].minus(t[0]) == 1.0
    with pytest.raises(tscale.errors.TextError):
        tscale.Instants.from_iso("2035-12-31T23:59:59", scale="UTC", leap_seconds=table)
    assert t.to_iso(0, leap_seconds=table).tolist() == ["2035-12-31T23:59:58", "2036-01-01T00:00:00"]
    reference = tscale.ReferenceData.load(leap_seconds=table)
    assert tscale.chain("UTC", "TAI", reference=reference).ledger(t)["TAI - UTC"].tolist() == [37.0, 36.0]


@pytest.mark.parametrize("make", [np.array, lambda v: v, np.asfortranarray])
def test_inputs_of_any_shape_are_left_alone(make: object) -> None:
    whole = np.arange(24).reshape(2, 3, 4)[:, ::2, ::-1]
    fraction = np.full(whole.shape, 1.75)
    before = whole.copy(), fraction.copy()
    t = tscale.Instants.from_seconds(whole, fraction, scale="TT")
    assert t.shape == (2, 2, 4)
    assert (whole == before[0]).all()
    assert (fraction == before[1]).all()
    assert (t.whole == before[0] + 1).all()
    assert tscale.Instants.from_seconds(5, [0.1, 0.2], scale="TT").shape == (2,)
    assert tscale.Instants.from_seconds(5, 0.5, scale="TT").shape == ()
    assert tscale.Instants.from_seconds([], [], scale="TT").size == 0


def test_immutable_hashless_and_copied_exactly() -> None:
    t = tscale.Instants.from_seconds([1, 2], [0.5, 0.25], scale="TDB", place="BARYCENTER")
    with pytest.raises(ValueError, match="read-only"):
        t.whole[0] = 3
    with pytest.raises(AttributeError):
        t.scale = "TT"  # type: ignore[misc]
    for twin in (pickle.loads(pickle.dumps(t)), copy.deepcopy(t)):
        assert (twin == t).all()
        assert twin.place == "BARYCENTER"
    with pytest.raises(TypeError):
        hash(t)


def test_comparison_is_elementwise_and_never_across_scales_or_places() -> None:
    t = tscale.Instants.from_seconds([1, 2], 0.5, scale="TT")
    u = t.shifted(1e-16)
    assert (u > t).all()
    assert (t < u).all()
    assert (t <= t).all()
    assert (t >= t).all()
    assert (t != u).all()
    for other in (tscale.Instants.from_seconds([1, 2], 0.5, scale="TAI"), t.at("GEOCENTER")):
        for act in (t.minus, t.__eq__, t.__lt__, t.__sub__):
            with pytest.raises(tscale.errors.ScaleMismatch):
                act(other)
    assert (t == None) is False  # noqa: E711
    assert None not in [t]
    with pytest.raises(tscale.errors.ScaleMismatch):
        _ = t < 5  # type: ignore[operator]


def test_plus_and_minus_are_shifted_and_minus() -> None:
    t = tscale.Instants.from_seconds([1, 2], 0.5, scale="TT")
    assert (t - t[0]).tolist() == [0.0, 1.0]
    assert ((t + 0.25) == t.shifted(0.25)).all()
    assert ((t - 0.25) == t.shifted(-0.25)).all()
    assert (t.__add__((3, 0.25)) == t.shifted((3, 0.25))).all()


def test_repr_never_raises() -> None:
    assert "146138514313" in repr(tscale.Instants.from_seconds(4611686018427387000, 0.0, scale="UTC"))
    assert "1950" not in repr(tscale.Instants.from_seconds(-1_600_000_000, 0.0, scale="UTC"))


@pytest.mark.parametrize("bad", [float("nan"), float("inf"), -float("inf")])
def test_nan_and_infinity_carry_the_mask(bad: float) -> None:
    with pytest.raises(tscale.TscaleError) as caught:
        tscale.Instants.from_seconds([1, 2, 3], [0.5, bad, 0.1], scale="TT")
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True, False]
    for act in (
        lambda: tscale.Instants.from_seconds(1, 0.5, scale="TT").shifted(bad),
        lambda: tscale.Instants.from_mjd(50000, bad, scale="TT"),
        lambda: tscale.Instants.from_jd(2450000, bad, scale="UTC"),
        lambda: tscale.Instants.from_seconds(bad, 0.0, scale="TT"),
    ):
        with pytest.raises(tscale.TscaleError):
            act()


@pytest.mark.parametrize(
    "act",
    [
        lambda: tscale.Instants.from_seconds(1.5, 0.0, scale="TT"),
        lambda: tscale.Instants.from_seconds("1", 0.0, scale="TT"),
        lambda: tscale.Instants.from_seconds([1, 2], [0.1, 0.2, 0.3], scale="TT"),
        lambda: tscale.Instants.from_seconds(1, 0.0, scale="utc"),
        lambda: tscale.Instants.from_seconds(1, 0.0, scale="TT", place="HERE"),
        lambda: tscale.Instants.from_seconds(1, 0.0, scale=None),
        lambda: tscale.Instants.from_iso("2016-11-30T23:59:60", scale="UTC"),
        lambda: tscale.Instants.from_iso("2016-12-31T23:59:60", scale="TAI"),
        lambda: tscale.Instants.from_iso("2021-02-29", scale="TT"),
        lambda: tscale.Instants.from_iso("", scale="TT"),
        lambda: tscale.Instants.from_iso("1960-12-31T00:00:00", scale="UTC"),
        lambda: tscale.Instants.from_mjd(50000.5, 0.0, scale="TT"),
        lambda: tscale.Instants.from_seconds(2**63 - 1, 1.5, scale="TT"),
        lambda: tscale.Instants.from_seconds(-(2**63), 0.5, scale="TT"),
        lambda: tscale.Instants.from_seconds(2**62 - 2, 0.5, scale="TT").shifted((2**62 - 2, 0.0)),
        lambda: tscale.Instants.from_seconds(2**62 - 2, 0.5, scale="TT").shifted(4e18),
        lambda: tscale.Instants.concatenate([]),
        lambda: tscale.Instants.from_mjd([1, 2], [0.1, 0.2, 0.3], scale="TT"),
        lambda: tscale.Instants.from_seconds([1, 2], 0.0, scale="TT").shifted([1.0, 2.0, 3.0]),
        lambda: tscale.Instants.from_seconds([1, 2], 0.0, scale="TT").shifted("1"),
        lambda: (
            tscale.Instants.from_seconds([1, 2], 0.0, scale="TT")
            < tscale.Instants.from_seconds([1, 2, 3], 0.0, scale="TT")
        ),
    ],
)
def test_bad_input_is_a_clear_error(act: object) -> None:
    with pytest.raises(tscale.TscaleError) as caught:
        act()  # type: ignore[operator]
    assert len(str(caught.value)) > 20


def test_errors_travel_between_processes_with_their_mask() -> None:
    with pytest.raises(tscale.TscaleError) as caught:
        tscale.Instants.from_seconds([1, 2], [0.5, float("nan")], scale="TT")
    twin = pickle.loads(pickle.dumps(caught.value))
    assert twin.mask.tolist() == [False, True]
    assert str(twin) == str(caught.value)


def test_neither_part_can_be_written() -> None:
    for t in (
        tscale.Instants.from_seconds([1, 2], [0.25, 0.5], scale="TT"),
        tscale.Instants.from_seconds([1, 2], [0.25, 0.5], scale="TT")[::-1],
        tscale.Instants.from_seconds([1, 2], [0.25, 0.5], scale="TT").shifted(1.0).at("GEOCENTER"),
    ):
        for part in (t.whole, t.fraction, *t.pair):
            with pytest.raises(ValueError, match="read-only"):
                part[0] = 0
    given = np.array([0.25, 0.5])
    kept = tscale.Instants.from_seconds([1, 2], given, scale="TT")
    given[:] = 0.0
    assert kept.fraction.tolist() == [0.25, 0.5]


def test_joining() -> None:
    t = tscale.Instants.from_seconds(np.arange(7), 0.25, scale="TDB", place="BARYCENTER")
    joined = tscale.Instants.concatenate([t[:4], t[4:], t[:0]])
    assert (joined == t).all()
    assert joined.place == "BARYCENTER"
    with pytest.raises(tscale.errors.ScaleMismatch):
        tscale.Instants.concatenate([t, t.at("GEOCENTER")])
    with pytest.raises(tscale.errors.InvalidInput, match="ravel"):
        tscale.Instants.concatenate([t, t[0]])
