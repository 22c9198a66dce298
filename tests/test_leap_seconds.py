"""UTC labels and elapsed seconds: against ERFA, published day lengths, exact rationals and made-up tables."""

from __future__ import annotations

import hashlib
import pickle
from fractions import Fraction
from pathlib import Path
from typing import Any

import erfa
import numpy as np
import pytest
from astropy_iers_data import IERS_LEAP_SECOND_FILE
from hypothesis import given
from hypothesis import strategies as st

from tscale.errors import InvalidInput, OutOfSpan, TextError
from tscale.formats.leap_seconds import LeapSeconds

TABLE = LeapSeconds.default()
NEGATIVE = TABLE.with_step(63000, 36)
MINUTE = TABLE.with_step(63000, 97)
TENTH = TABLE.with_step(63000, "37.1")

LEAP_DAYS = [row.mjd - 1 for row in TABLE.rows[1:]]


def exact_count(day: int, second: Fraction) -> Fraction:
    """UTC count of a label from the definition, TAI count - 32 s, in rationals."""
    row = [row for row in TABLE.rows if row.mjd <= day][-1]
    label_s = (day - row.reference_mjd) * 86400 + second
    tai_minus_utc = Fraction(row.tai_minus_utc_ns, 10**9) + label_s * Fraction(row.rate_ns_s, 10**9)
    return (day - 51544) * 86400 + second - 43200 + tai_minus_utc - 32


def exact(pair: Any) -> Fraction:
    return int(pair[0]) + Fraction(float(pair[1]))


def test_default_table_is_the_installed_file() -> None:
    content = Path(IERS_LEAP_SECOND_FILE).read_bytes()
    assert TABLE.sha256 == hashlib.sha256(content).hexdigest()
    assert TABLE.name == "Leap_Second.dat"
    assert TABLE.path == Path(IERS_LEAP_SECOND_FILE)
    assert TABLE.span == (37300, TABLE.expires_mjd)
    assert TABLE.expires_mjd is not None
    assert f"expires on {int(erfa.jd2cal(2400000.5, TABLE.expires_mjd)[2])} ".encode() in content
    assert TABLE.issued is not None
    assert TABLE.issued.startswith("Bulletin C")
    assert LeapSeconds.default() is TABLE
    assert pickle.loads(pickle.dumps(TABLE)) == TABLE


def test_tai_minus_utc_is_that_of_erfa_on_every_day() -> None:
    # ERFA dat.c, whose rates and steps are those of the USNO file tai-utc.dat. Both round to
    # a few ulp of 10 s: 4e-15 s.
    day = np.arange(37300, 61500)
    for fraction in (0.0, 0.5):
        year, month, month_day, _ = erfa.jd2cal(2400000.5, day)
        count = TABLE.count_from_label(day, int(fraction * 86400), 0.0)
        difference = TABLE.tai_minus_utc(count) - erfa.dat(year, month, month_day, fraction)
        assert np.abs(difference).max() < 4e-15


@pytest.mark.parametrize(
    ("day", "length_si_s"),
    [  # TAI seconds of UTC days, from the steps and rates of USNO tai-utc.dat
        (37511, "86399.951296"),  # 1961-07-31
        (37816, "86400.0011232"),  # 1962-06-01
        (38912, "86400.001296"),  # 1965-06-01
        (39277, "86400.002592"),  # 1966-06-01
        (39886, "86399.902592"),  # 1968-01-31
        (41316, "86400.11035"),  # 1971-12-31
        (41498, "86401"),  # 1972-06-30
        (57753, "86401"),  # 2016-12-31
    ],
)
def test_day_lengths_in_si_seconds(day: int, length_si_s: str) -> None:
    start, end = TABLE.count_from_label(day, 0, 0.0), TABLE.count_from_label(day + 1, 0, 0.0)
    # Each count is rounded once, to 0.06 fs.
    assert abs(exact(end) - exact(start) - Fraction(length_si_s)) < Fraction(2, 10**16)
    # The length in label seconds is the same divided by 1 + rate; it lies beside the day's end by at most one ulp.
    whole, fraction = TABLE.day_length(day)
    row = [row for row in TABLE.rows if row.mjd <= day][-1]
    expected = Fraction(length_si_s) / (1 + Fraction(row.rate_ns_s, 10**9))
    assert abs(int(whole) + Fraction(float(fraction)) - expected) <= Fraction(1, 2**53)


def test_leap_second_of_2016() -> None:
    # IERS Bulletin C 52: 2016-12-31 23:59:60 UTC; TAI - UTC = 36 s until 2017-01-01 0h, then 37 s.
    whole, fraction = TABLE.count_from_label(57753, [86399, 86400, 86400], [0.5, 0.0, 0.99])
    assert (whole - whole[0]).tolist() == [0, 1, 1]
    assert fraction.tolist() == [0.5, 0.0, 0.99]
    assert TABLE.tai_minus_utc((whole, fraction)).tolist() == [36.0, 36.0, 36.0]
    after = TABLE.count_from_label(57754, 0, 0.0)
    assert int(after[0]) - int(whole[0]) == 2
    assert TABLE.tai_minus_utc(after) == 37.0


@pytest.mark.parametrize(
    ("day", "second", "fraction"),
    [
        (57752, 86400, 0.0),  # no leap second on 2016-12-30
        (57753, 86401, 0.0),
        (57753, -1, 0.0),
        (41316, 86400, 0.107758),  # 1971-12-31 ends 3.2 ns before 60.107758
        (37511, 86399, 0.951),  # 1961-07-31 was 0.05 s short
        (39886, 86399, 0.91),  # 1968-01-31 was 0.1 s short
    ],
)
def test_labels_that_do_not_exist(day: int, second: int, fraction: float) -> None:
    good = (day, 86000, 0.5)
    with pytest.raises(TextError, match=r"do not exist.*first, item 1: second") as caught:
        TABLE.count_from_label([good[0], day], [good[1], second], [good[2], fraction])
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True]


@pytest.mark.parametrize(
    ("day", "second", "fraction"), [(41316, 86400, 0.1077579), (37511, 86399, 0.9499999), (39886, 86399, 0.8999999)]
)
def test_last_labels_of_short_and_long_days(day: int, second: int, fraction: float) -> None:
    count = TABLE.count_from_label(day, second, fraction)
    assert exact(count) < exact(TABLE.count_from_label(day + 1, 0, 0.0))
    assert tuple(int(part) for part in TABLE.label_from_count(count)[:2]) == (day, second)


def test_outside_the_table() -> None:
    with pytest.raises(OutOfSpan, match=r"starts on 1961-01-01 \(MJD 37300\)") as caught:
        TABLE.count_from_label([[37299, 37300]], 0, 0.0)
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [[True, False]]
    start = TABLE.count_from_label(37300, 0, 0.0)
    with pytest.raises(OutOfSpan):
        TABLE.label_from_count((start[0], np.nextafter(start[1], 0)))
    with pytest.raises(OutOfSpan):
        TABLE.day_length(37299)


fractions = st.one_of(
    st.floats(0, 1, exclude_max=True, allow_subnormal=False), st.sampled_from([0.0, 0.5, 1 - 2**-53, 2.0**-53, 0.1])
)
days = st.one_of(st.integers(37300, 80000), st.sampled_from(LEAP_DAYS).flatmap(lambda d: st.integers(d - 1, d + 1)))
seconds = st.one_of(st.integers(0, 86398), st.sampled_from([0, 43199, 43200, 86398]))


@given(days, seconds, fractions)
def test_counts_against_rationals(day: int, second: int, fraction: float) -> None:
    count = TABLE.count_from_label(day, second, fraction)
    error = abs(exact(count) - exact_count(day, second + Fraction(fraction)))
    # The fraction is rounded once (half an ulp of 1, 0.06 fs) in the drift years, and not at all from 1972 on.
    assert error <= (Fraction(6, 10**17) if day < 41317 else 0)
    back = TABLE.label_from_count(count)
    assert int(back[0]) == day or day < 41317
    label_error = (int(back[0]) - day) * 86400 + int(back[1]) - second + Fraction(float(back[2])) - Fraction(fraction)
    assert abs(label_error) <= (Fraction(2, 10**16) if day < 41317 else 0)


@given(st.sampled_from(range(1, len(TABLE.rows))), st.integers(-5, 5))
def test_one_ulp_around_every_step(index: int, ulps: int) -> None:
    start = TABLE.count_from_label(TABLE.rows[index].mjd, 0, 0.0)
    fraction = float(start[1]) + ulps * 2.0**-53
    count = (start[0] + int(np.floor(fraction)), np.asarray(fraction - np.floor(fraction)))
    label = TABLE.label_from_count(count)
    assert int(label[0]) == TABLE.rows[index].mjd - (ulps < 0)
    # Two roundings of 0.06 fs and at most one ulp (0.11 fs) to stay inside the day.
    assert abs(exact(TABLE.count_from_label(*label)) - exact(count)) <= Fraction(25, 10**17)


def test_negative_leap_second() -> None:
    # ITU-R TF.460-6, annex 1, 2.2: 23:59:58 is followed by 0:00:00 of the next day.
    assert NEGATIVE.day_length(62999)[0] == 86399
    before, after = NEGATIVE.count_from_label(62999, 86398, 0.25), NEGATIVE.count_from_label(63000, 0, 0.25)
    assert int(after[0] - before[0]) == 1
    with pytest.raises(TextError):
        NEGATIVE.count_from_label(62999, 86399, 0.0)
    day, second, fraction = NEGATIVE.label_from_count((np.array([before[0], before[0] + 1]), np.array([0.9, 0.0])))
    assert day.tolist() == [62999, 63000]
    assert second.tolist() == [86398, 0]
    assert fraction.tolist() == [0.9, 0.0]


@pytest.mark.parametrize(("table", "length_s"), [(MINUTE, 86460.0), (TENTH, 86400.1)])
def test_other_steps(table: LeapSeconds, length_s: float) -> None:
    whole, fraction = table.day_length(62999)
    assert float(whole) + float(fraction) == length_s
    last = (62999, int(whole) - 1 + (fraction > 0), 0.05)
    count = table.count_from_label(*last)
    assert tuple(float(part) for part in table.label_from_count(count)) == last
    assert float(table.tai_minus_utc(count)) == 37.0
    with pytest.raises(TextError):
        table.count_from_label(62999, int(whole), float(fraction))
    assert table.expires_mjd == TABLE.expires_mjd
    assert table.sha256 != TABLE.sha256


def test_expiry() -> None:
    table = TABLE.with_expiry(62000)
    count = table.count_from_label([61999, 62000], [86399, 0], [0.9, 0.0])
    assert table.is_expired(count).tolist() == [False, True]
    assert table.with_expiry(None).is_expired(count).tolist() == [False, False]
    with pytest.raises(InvalidInput, match=r"starts on 1961-01-01 \(MJD 37300\) cannot expire on 1961-01-01"):
        TABLE.with_expiry(37300)


@pytest.mark.parametrize("n", [(), (0,), (3,), (2, 3)])
def test_shapes(n: tuple[int, ...]) -> None:
    for start in (41316, 50000, 60000):
        day = np.full(n, start)
        count = TABLE.count_from_label(day, 7, 0.25)
        label = TABLE.label_from_count(count)
        assert count[0].shape == count[1].shape == label[0].shape == label[2].shape == n
        assert (label[0] == start).all()
        assert TABLE.tai_minus_utc(count).shape == TABLE.day_length(day)[0].shape == n


def test_strided_and_broadcast_input_is_left_alone() -> None:
    day = np.arange(41300, 41340)[::-3]
    fraction = np.broadcast_to(0.5, day.shape)
    kept = day.copy()
    count = TABLE.count_from_label(day, 5, fraction)
    label = TABLE.label_from_count(count)
    assert (day == kept).all()
    assert (label[0] == day).all()
    assert label[2].flags.writeable
    assert count[1].flags.writeable


@pytest.mark.parametrize(
    ("label", "message"),
    [
        ((57000.5, 0, 0.0), "split"),
        ((57000, 0.5, 0.0), "whole"),
        ((57000, 0, 1.0), r"\[0, 1\)"),
        ((57000, 0, np.nan), "fraction"),
    ],
)
def test_loose_labels(label: tuple[Any, ...], message: str) -> None:
    with pytest.raises(InvalidInput, match=message):
        TABLE.count_from_label(*label)


@pytest.mark.parametrize(
    ("rows", "message"),
    [
        ([], "at least one"),
        ([(51544, 31)], "32 s"),
        ([(40000, 32), (39000, 33)], "increase"),
        ([(40000, 32), (60000, float("nan"))], "finite"),
        ([(40000, 32), (60000, "32.0000000001")], "nanoseconds"),
        ([(40000, 32), (60000, 50000)], "half a day"),
        ([(40000, 32), (60000.5, 33)], "whole days"),
        ([(40000, 32), (60000, 33, 60000, 0.001)], "drift"),
        ([(40000,)], "row is"),
    ],
)
def test_rows_are_checked(rows: list[tuple[Any, ...]], message: str) -> None:
    with pytest.raises(InvalidInput, match=message):
        LeapSeconds.from_rows(rows)


def test_from_rows_with_drift_matches_the_published_rows() -> None:
    rows = [
        (row.mjd, Fraction(row.tai_minus_utc_ns, 10**9), row.reference_mjd, row.rate_ns_s * 86400 / 1e9)
        for row in TABLE.rows
    ]
    assert LeapSeconds.from_rows(rows).rows == TABLE.rows
