"""Julian Dates: against ERFA's quasi-JD, exact rationals, and there-and-back on the hard spots."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import erfa
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tscale.errors import InvalidInput, TextError
from tscale.formats import julian, labels
from tscale.formats.leap_seconds import LeapSeconds
from tscale.scales import Scale

TABLE = LeapSeconds.default()
UTC = labels.day_length(Scale.parse("UTC"), None)
GLONASS = labels.day_length(Scale.parse("GLONASS"), None)
UNIFORM = labels.day_length(Scale.parse("TT"), None)
LEAP_DAYS = [row.mjd - 1 for row in TABLE.rows[1:]]

# Fractions below 2**-16 d are finer than a label resolves (0.1 fs).
fractions = st.one_of(
    st.just(0.0),
    st.floats(2.0**-16, 1, exclude_max=True),
    st.sampled_from([0.5, np.nextafter(0.5, 0), np.nextafter(0.5, 1), 1 - 2.0**-53, 86399 / 86400, 86400 / 86401]),
)
days = st.one_of(st.integers(37301, 80000), st.sampled_from(LEAP_DAYS).flatmap(lambda d: st.integers(d - 1, d + 1)))
lengths = st.sampled_from([UTC, GLONASS, UNIFORM, None])


def test_published_quasi_jd() -> None:
    # t_erfa_c: dtf2d("UTC", 1994, 6, 30, 23, 59, 60.13599) sums to 2449534.49999; tolerance 1e-6 d there.
    # The day has 86401 s, so the fraction is (86400 + 0.13599) / 86401 to 1 ulp: 1.1e-16 d.
    day, fraction = julian.mjd_from_label(49533, 86400, 0.13599, UTC)
    assert int(day) == 49533
    assert abs(float(fraction) - float((86400 + Fraction("0.13599")) / 86401)) <= 1.2e-16
    assert abs(2400000.5 + float(day) + float(fraction) - 2449534.49999) < 1e-6


def test_quasi_jd_is_that_of_erfa() -> None:
    rng = np.random.default_rng(3)
    mjd = np.concatenate([rng.integers(41317, 61000, 300), np.array(LEAP_DAYS)[13:]])
    whole = rng.integers(0, UTC(mjd)[0])
    part = rng.random(mjd.size)
    year, month, day, _ = erfa.jd2cal(2400000.5, mjd)
    hour, minute = np.minimum(whole // 3600, 23), np.minimum(whole // 60, 1439) % 60
    first, second = erfa.dtf2d("UTC", year, month, day, hour, minute, whole - 3600 * hour - 60 * minute + part)
    got_day, got = julian.mjd_from_label(mjd, whole, part, UTC)
    # ERFA adds seconds and minutes in float64 and then divides: a few ulp of a day, 3e-16 d = 26 ps.
    assert np.abs((got_day - (first - 2400000.5)) + (got - second)).max() < 3e-16
    jd, got = julian.jd_from_label(mjd, whole, part, UTC)
    assert np.abs((jd - first) + (got - second)).max() < 3e-16


@pytest.mark.parametrize(
    ("day", "jd"), [(37300, 2437300.5), (41317, 2441317.5), (51544, 2451544.5), (57754, 2457754.5)]
)
def test_published_julian_days(day: int, jd: float) -> None:
    # USNO tai-utc.dat lists the JD of each step; J2000.0 is JD 2451545.0 TT at noon of 2000-01-01.
    whole, fraction = julian.jd_from_label(day, 0, 0.0)
    assert float(whole) + float(fraction) == jd
    assert tuple(float(part) for part in julian.label_from_jd(np.floor(jd), jd % 1)) == (day, 0.0, 0.0)


def test_epoch() -> None:
    assert tuple(float(part) for part in julian.jd_from_label(51544, 43200, 0.0)) == (2451545.0, 0.0)
    assert tuple(float(part) for part in julian.label_from_jd(2451545, -0.5)) == (51544.0, 0.0, 0.0)


@given(days, fractions, lengths)
def test_mjd_comes_back(day: int, fraction: float, length: labels.DayLength | None) -> None:
    label = julian.label_from_mjd(day, fraction, length)
    back = julian.mjd_from_label(*label, length)
    assert (int(back[0]), float(back[1])) == (day, fraction)


@given(days, fractions, lengths)
def test_jd_comes_back(day: int, fraction: float, length: labels.DayLength | None) -> None:
    label = julian.label_from_jd(day + 2400001, fraction, length)
    back = julian.jd_from_label(*label, length)
    # At noon the fraction starts again and is finer than a label; to 0.1 fs, it comes back.
    assert abs((int(back[0]) - day - 2400001) + (Fraction(float(back[1])) - Fraction(fraction))) <= Fraction(2, 10**21)
    assert float(back[1]) == fraction or fraction == 0.0


@given(days, st.floats(0, 1, exclude_max=True), st.sampled_from([UTC, UNIFORM]))
def test_reading_against_rationals(day: int, fraction: float, length: labels.DayLength) -> None:
    got_day, whole, part = julian.label_from_mjd(day, fraction, length)
    size = length(np.asarray(day))
    expected = Fraction(fraction) * (int(size[0]) + Fraction(float(size[1])))
    got = (int(got_day) - day) * 86400 + int(whole) + Fraction(float(part))
    # One rounding of the fraction of a second (0.06 fs); in the drift years the day length itself is rounded (0.06 fs).
    assert abs(got - expected) <= Fraction(12, 10**17)


@given(st.integers(-(10**8), 10**8), st.floats(-1e6, 1e6))
def test_any_fraction_on_uniform_scales(day: int, fraction: float) -> None:
    got_day, whole, part = julian.label_from_mjd(day, fraction)
    got = (int(got_day) - day) * 86400 + int(whole) + Fraction(float(part))
    assert 0 <= int(whole) < 86400
    assert abs(got - Fraction(fraction) * 86400) <= Fraction(12, 10**17)


@given(days, st.integers(0, 86398), st.floats(0, 1, exclude_max=True), st.sampled_from([UTC, GLONASS]))
def test_writing_against_rationals(day: int, second: int, part: float, length: labels.DayLength) -> None:
    got_day, got = julian.mjd_from_label(day, second, part, length)
    elapsed_day, whole, rest = (
        np.asarray(v) for v in length.to_elapsed((np.asarray(day), np.asarray(second), np.asarray(part)))
    )
    size = length(elapsed_day)
    expected = (int(whole) + Fraction(float(rest))) / (int(size[0]) + Fraction(float(size[1])))
    # Half an ulp of 1: 5.6e-17 d, 4.8 ps.
    assert abs(int(got_day) - int(elapsed_day) + Fraction(float(got)) - expected) <= Fraction(56, 10**18)


def test_leap_second_in_days_of_86400_s() -> None:
    with pytest.raises(InvalidInput, match="leap second") as caught:
        julian.mjd_from_label([57753, 57753], [86399, 86400], 0.5)
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True]
    day, whole, part = julian.label_from_mjd(57753, 0.75)
    assert (int(day), int(whole), float(part)) == (57753, 64800, 0.0)
    day, whole, part = julian.label_from_mjd(57753, 0.75, UTC)
    assert (int(day), int(whole), float(part)) == (57753, 64800, 0.75)


def test_negative_leap_second() -> None:
    table = TABLE.with_step(63000, 36)
    day, fraction = julian.mjd_from_label(62999, 86398, 0.5, labels.DayLength(table))
    assert float(fraction) == 86398.5 / 86399
    with pytest.raises(InvalidInput, match="end of their day"):
        julian.mjd_from_label(62999, 86399, 0.0, labels.DayLength(table))
    label = julian.label_from_mjd(day, 0.99999)
    with pytest.raises(TextError, match="do not exist"):
        table.count_from_label(*label)


def test_glonass_day_with_a_leap_second() -> None:
    # The GLONASS day of 2017-01-01 has 86401 s; its leap second is the 10801st.
    day, fraction = julian.mjd_from_label([57753, 57754, 57754], [97200, 10799, 10800], [0.5, 0.5, 0.5], GLONASS)
    assert day.tolist() == [57754] * 3
    assert fraction.tolist() == [10800.5 / 86401, 10799.5 / 86401, 10801.5 / 86401]
    label = julian.label_from_mjd(day, fraction, GLONASS)
    assert label[0].tolist() == [57753, 57754, 57754]
    assert label[1].tolist() == [97200, 10799, 10800]


@pytest.mark.parametrize("read", [julian.label_from_mjd, julian.label_from_jd])
def test_loose_input(read: Any) -> None:
    with pytest.raises(InvalidInput, match="split") as caught:
        read([57000.0, 57000.5], 0.0)
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True]
    for bad in (np.nan, np.inf):
        with pytest.raises(InvalidInput, match="finite"):
            read(57000, [0.0, bad])
    with pytest.raises(InvalidInput, match="2\\*\\*46"):
        read(57000, 1e15)
    with pytest.raises(InvalidInput, match="1e14"):
        read(10**15, 0.0)


@pytest.mark.parametrize("length", [UTC, GLONASS, UNIFORM])
def test_shapes(length: labels.DayLength) -> None:
    fraction = np.linspace(0, 0.9, 24).reshape(2, 3, 4)[::-1, :, ::2]
    kept = fraction.copy()
    label = julian.label_from_mjd(57753, fraction, length)
    assert all(part.shape == (2, 3, 2) for part in label)
    day, back = julian.mjd_from_label(*label, length)
    assert (back == fraction).all()
    assert (fraction == kept).all()
    assert all(part.shape == () for part in julian.label_from_jd(2457753, 0.1, length))
    assert all(part.shape == (0,) for part in julian.label_from_jd([], [], length))
    assert day.dtype == np.int64
