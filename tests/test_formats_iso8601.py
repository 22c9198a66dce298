"""ISO 8601 texts: against numpy's calendar, exact decimals and ERFA's leap-second vectors; texts to refuse."""

from __future__ import annotations

from decimal import Decimal
from fractions import Fraction
from typing import Any

import erfa
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tscale.errors import InvalidInput, TextError
from tscale.formats import gregorian, iso8601, labels
from tscale.scales import Scale

UTC = labels.day_length(Scale.parse("UTC"), None)
GLONASS = labels.day_length(Scale.parse("GLONASS"), None)


def parse_utc(text: Any) -> Any:
    return iso8601.parse(text, allow_z=True, allow_second_60=True)


def parse_glonass(text: Any) -> Any:
    return iso8601.parse(text, allow_second_60=True, label_offset_s=10800)


def test_calendar_is_that_of_numpy() -> None:
    # numpy datetime64: the proleptic Gregorian calendar, independently implemented; exact.
    mjd = np.arange(-1_400_000, 4_000_000, 7)
    dates = np.datetime64("1858-11-17", "D") + mjd
    year, month, day = gregorian.date_from_mjd(mjd)
    assert (year == dates.astype("M8[Y]").astype(np.int64) + 1970).all()
    assert (month == dates.astype("M8[M]").astype(np.int64) % 12 + 1).all()
    assert (day == (dates - dates.astype("M8[M]").astype("M8[D]")).astype(np.int64) + 1).all()
    assert (gregorian.mjd_from_date(year, month, day) == mjd).all()


def test_published_days() -> None:
    # SOFA/ERFA t_erfa_c: cal2jd(2003, 6, 1) = 2400000.5 + 52791; jd2cal(2400000.5 + 50123) = 1996-02-10.
    assert gregorian.mjd_from_date(2003, 6, 1) == 52791
    assert [int(part) for part in gregorian.date_from_mjd(50123)] == [1996, 2, 10]
    # ERFA cal2jd holds back to -4799 of the same calendar.
    assert gregorian.mjd_from_date(-4712, 11, 24) == erfa.cal2jd(-4712, 11, 24)[1]


@pytest.mark.parametrize(
    ("text", "mjd", "second", "fraction"),
    [
        ("2000-01-01", 51544, 0, 0.0),
        ("2000-01-01T12:34", 51544, 45240, 0.0),
        ("2000-01-01 12:34:56", 51544, 45296, 0.0),
        ("2000-01-01T12:34:56.5Z", 51544, 45296, 0.5),
        ("2000-01-01T12:34:56,25", 51544, 45296, 0.25),
        ("2000-366T00:00:00.000000000000000001", 51909, 0, 1e-18),
        ("2001-060", 51969, 0, 0.0),
        ("0000-03-01", -678881, 0, 0.0),
        ("-00001-12-31T23:59:59", -678942, 86399, 0.0),
        ("+12345-01-01", 3829978, 0, 0.0),
        ("1972-06-30T23:59:60.999", 41498, 86400, 0.999),
        ("2016-12-31T23:59:60", 57753, 86400, 0.0),
        ("2016-12-31T23:59:119", 57753, 86459, 0.0),
    ],
)
def test_accepted_texts(text: str, mjd: int, second: int, fraction: float) -> None:
    assert tuple(float(part) for part in parse_utc(text)) == (mjd, second, fraction)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("", "empty"),
        ("   ", "empty"),
        (" 2000-01-01", "blanks"),
        ("2000-01-01T00:00:00\n", "blanks"),
        ("2000-01-01T00:00:00+01:00", "zone offset"),
        ("2000-01-01T00:00-0530", "zone offset"),
        ("2000-01-01T00:00:00.1234567890123456789", "more than 18 decimals"),
        ("2000-01-01T24:00:00", "next day"),
        ("2001-02-29", "no such day"),
        ("1900-02-29", "no such day"),
        ("2001-366", "no such day"),
        ("2001-000", "no such day"),
        ("2000-00-01", "no such day"),
        ("2000-13-01", "no such day"),
        ("2000-01-01T25:00", "hours run"),
        ("2000-01-01T00:60", "minutes"),
        ("2000-01-01T00:00:60", "only at 23:59"),
        ("2000-01-01T02:59:60", "only at 23:59"),
        ("2000-01-01T23:59:099", "write YYYY"),
        ("12345-01-01", "a sign and 5"),
        ("+2000-01-01", "a sign and 5"),
        ("-00000-01-01", "year -0"),
        ("20000101", "write YYYY"),
        ("2000-1-1", "write YYYY"),
        ("2000-01-01T", "write YYYY"),
        ("2000-01-01T00", "write YYYY"),
        ("2000-01-01T00:00:00.", "write YYYY"),
        ("2000-01-01T00:00.5", "write YYYY"),
        ("2000-01-01t00:00", "write YYYY"),
        ("2000-01-01Z", "write YYYY"),
        ("\uff12\uff10\uff10\uff10-01-01", "write YYYY"),
        ("2000\u212a01-01", "write YYYY"),
    ],
)
def test_refused_texts(text: str, message: str) -> None:
    texts = np.array([["2000-01-01", text], ["2000-01-01T00:00:00", "2000-01-01"]])
    with pytest.raises(TextError, match=message) as caught:
        parse_utc(texts)
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [[False, True], [False, False]]
    assert "(item 1)" in str(caught.value)


def test_marks_of_other_scales() -> None:
    with pytest.raises(TextError, match="Z says UTC"):
        iso8601.parse("2000-01-01T00:00:00Z")
    with pytest.raises(TextError, match="no leap seconds"):
        iso8601.parse("2016-12-31T23:59:60")
    with pytest.raises(TextError, match="only at 02:59"):
        parse_glonass("2016-12-31T23:59:60")
    with pytest.raises(InvalidInput, match="from_mjd"):
        iso8601.parse([57000.0])
    with pytest.raises(InvalidInput, match="one shape"):
        iso8601.parse([["2000-01-01"], ["2000-01-01", "2000-01-02"]])


clock = st.tuples(
    st.integers(-4_000_000, 34_000_000), st.integers(0, 86399), st.integers(0, 18), st.integers(0, 10**18 - 1)
)


@given(clock)
def test_parse_rounds_decimals_correctly(value: tuple[int, int, int, int]) -> None:
    mjd, second, digits, numerator = value
    numerator //= 10 ** (18 - digits)
    date = str(iso8601.format(mjd, second, 0.0, 0))
    text = f"{date}.{numerator:0{digits}d}" if digits else date
    label = iso8601.parse(text)
    assert int(label[0]) == mjd
    assert int(label[1]) == second
    # Python's Fraction -> float is correctly rounded; the largest float below 1 stands for values that round to 1.
    assert float(label[2]) == min(float(Fraction(numerator, 10**digits)), 1 - 2**-53)


@given(clock, st.floats(0, 1, exclude_max=True))
def test_format_rounds_half_even(value: tuple[int, int, int, int], fraction: float) -> None:
    mjd, second, digits, _ = value
    text = str(iso8601.format(mjd, second, fraction, digits))
    exact = Fraction(fraction) + second + 86400 * mjd
    expected = Fraction(round(exact * 10**digits), 10**digits)  # Python's round is half-even and exact on rationals
    shown = iso8601.parse(text.split(".")[0])
    decimals = Fraction(Decimal("0." + text.split(".")[1])) if digits else Fraction(0)
    assert int(shown[0]) * 86400 + int(shown[1]) + decimals == expected


@given(clock, st.floats(0, 1, exclude_max=True))
def test_eighteen_decimals_come_back(value: tuple[int, int, int, int], fraction: float) -> None:
    text = iso8601.format(value[0], value[1], fraction, 18)
    label = iso8601.parse(text)
    if float(label[2]) == 0.0 and fraction > 0.5:
        return
    assert (int(label[0]), int(label[1])) == value[:2]
    # The text resolves 1e-18 s.
    assert abs(Fraction(float(label[2])) - Fraction(fraction)) <= Fraction(6, 10**19)


@pytest.mark.parametrize(
    ("text", "digits", "expected"),
    [
        ("2016-12-31T23:59:59.9999999", 6, "2016-12-31T23:59:60.000000"),
        ("2016-12-31T23:59:60.9999999", 6, "2017-01-01T00:00:00.000000"),
        ("2016-12-31T23:59:60.4", 0, "2016-12-31T23:59:60"),
        ("2016-12-30T23:59:59.9999999", 6, "2016-12-31T00:00:00.000000"),
        ("2015-03-01T11:59:59.9999999", 6, "2015-03-01T12:00:00.000000"),
        ("2015-03-01T11:29:59.5", 0, "2015-03-01T11:30:00"),
        ("2015-03-01T11:29:58.5", 0, "2015-03-01T11:29:58"),
        ("1971-12-31T23:59:60.1077579", 4, "1972-01-01T00:00:00.0000"),
        ("1971-12-31T23:59:60.1077579", 7, "1971-12-31T23:59:60.1077579"),
        ("1968-01-31T23:59:59.8999", 0, "1968-02-01T00:00:00"),
        ("1968-01-31T23:59:59.8999", 2, "1968-01-31T23:59:59.90"),
        ("1968-01-31T23:59:59.8999", 4, "1968-01-31T23:59:59.8999"),
        ("1965-06-30T12:00:00", 12, "1965-06-30T12:00:00.000000000000"),
    ],
)
def test_rounding_carries_over_every_edge(text: str, digits: int, expected: str) -> None:
    assert str(iso8601.format(*parse_utc(text), digits, day_length=UTC)) == expected


def test_erfa_prints_the_same() -> None:
    # t_erfa_c: d2dtf("UTC", 5, 2400000.5, 49533.99999) = 1994-06-30 23:59:60.13599, and dtf2d undoes it.
    text = "1994-06-30T23:59:60.13599"
    assert str(iso8601.format(*parse_utc(text), 5, day_length=UTC)) == text
    rng = np.random.default_rng(5)
    mjd = rng.integers(41317, 61000, 500)
    second = rng.integers(0, 86400, 500)
    milliseconds = rng.integers(0, 1000, 500)
    year, month, day, hms = erfa.d2dtf("UTC", 3, 2400000.5 + mjd, (second + milliseconds / 1000) / UTC(mjd)[0])
    texts = iso8601.format(mjd, second, milliseconds / 1000, 3, day_length=UTC)
    expected = [
        f"{y:04d}-{m:02d}-{d:02d}T{t['h']:02d}:{t['m']:02d}:{t['s']:02d}.{t['f']:03d}"
        for y, m, d, t in zip(year, month, day, hms, strict=True)
    ]
    assert texts.tolist() == expected


def test_shapes_and_mixed_layouts() -> None:
    texts = np.array(
        [["2000-01-01", "2000-01-01T00:00:01.5", "2000-001"], ["+10000-01-01", "1999-12-31 23:59", "2000-01-01T00"]]
    )
    assert parse_utc(texts[:, :2])[1].tolist() == [[0, 1], [0, 86340]]
    assert parse_utc(texts[:, ::-2][:1])[0].tolist() == [[51544, 51544]]
    assert parse_utc(texts.T[:2])[0].shape == (2, 2)
    assert parse_utc(texts.tolist()[0])[2].tolist() == [0.0, 0.5, 0.0]
    assert parse_utc(np.array(["2000-01-01"], dtype=object))[0].tolist() == [51544]
    assert parse_utc(np.array([b"2000-01-01"]))[0].tolist() == [51544]
    assert parse_utc(np.array(["2000-01-01"], dtype=">U10"))[0].tolist() == [51544]
    assert parse_utc([])[0].shape == (0,)
    assert iso8601.format([], [], []).shape == (0,)
    assert parse_utc("2000-01-01")[0].shape == ()
    assert iso8601.format(51544, 0, 0.0).shape == ()
    mixed = iso8601.format([[51544], [3829978]], [[0], [1]], np.zeros((2, 2)), 1)
    assert mixed.tolist() == [["2000-01-01T00:00:00.0"] * 2, ["+12345-01-01T00:00:01.0"] * 2]
    long = np.resize(texts.ravel()[:5], 40_000)
    assert (parse_utc(long)[0] == np.resize(parse_utc(texts.ravel()[:5])[0], 40_000)).all()
    assert (parse_utc(iso8601.format(*parse_utc(long), 1))[1] == parse_utc(long)[1]).all()


@pytest.mark.parametrize("digits", [-1, 19, 3.0, True, "3"])
def test_digits_are_checked(digits: Any) -> None:
    with pytest.raises(InvalidInput, match="0 to 18"):
        iso8601.format(51544, 0, 0.0, digits)


def test_labels_beyond_their_day_are_not_written() -> None:
    with pytest.raises(InvalidInput, match="end of their day"):
        iso8601.format(51544, 86400, 0.0, 3)
    with pytest.raises(InvalidInput, match="end of their day"):
        iso8601.format(51544, 86400, 0.0, 3, day_length=UTC)
