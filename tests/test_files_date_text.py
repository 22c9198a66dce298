"""Dates as decimal text, against rational arithmetic and ERFA."""

from __future__ import annotations

from decimal import Decimal
from fractions import Fraction

import erfa
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

import tscale
from tscale.errors import InvalidInput, OutOfSpan, TextError
from tscale.files import LAYOUTS, read_dates, write_dates
from tscale.files.date_text import default_digits, fixed_decimals, parse_decimals

FRACTION_STEP = Fraction(2, 10**16)
"""What a float64 fraction of a second below 1 resolves (1.1e-16 s), and one rounding more."""

digits18 = st.integers(min_value=0, max_value=10**18 - 1)


def seconds_of(t: tscale.Instants) -> Fraction:
    return int(t.whole[0]) + Fraction(float(t.fraction[0]))


@given(whole=st.integers(-(10**15) + 1, 10**15 - 1), part=digits18, minus=st.booleans(), digits=st.integers(0, 18))
def test_decimals_are_exact(whole: int, part: int, minus: bool, digits: int) -> None:
    text = f"{'-' if minus else ''}{abs(whole)}.{f'{part:018d}'[:digits]}"
    floor, numerator = parse_decimals([f" {text} "])
    assert int(floor[0]) + Fraction(int(numerator[0]), 10**18) == Fraction(text)
    assert 0 <= numerator[0] < 10**18


@pytest.mark.parametrize(
    "text", ["", "x", "1e5", "nan", "inf", "1.0000000000000000001", ".5", "1_0", "\u0661", "1 0", "--1"]
)
def test_what_is_no_decimal_number(text: str) -> None:
    with pytest.raises(TextError, match="1 of 2 texts") as caught:
        parse_decimals(["1.", text])
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True]


@given(day=st.integers(-100000, 200000), part=digits18, layout=st.sampled_from(["mjd", "jd"]))
def test_reading_days_is_exact(day: int, part: int, layout: str) -> None:
    text = f"{'-' if day < 0 else ''}{abs(day)}.{part:018d}"
    t = read_dates([text], layout, "TT")
    # Epoch of the counts: JD 2451545.0, MJD 51544.5.
    epoch = Fraction(51544.5) if layout == "mjd" else Fraction(2451545)
    assert abs(seconds_of(t) - (Fraction(text) - epoch) * 86400) <= FRACTION_STEP
    assert write_dates(t, layout, 18) == [text if Fraction(text) else text.removeprefix("-")]


@given(
    whole=st.integers(-(10**9), 3 * 10**9),
    fraction=st.floats(0.0, 1.0, exclude_max=True),
    layout=st.sampled_from(["mjd", "jd", "seconds"]),
    digits=st.integers(0, 18),
)
def test_writing_rounds_to_nearest(whole: int, fraction: float, layout: str, digits: int) -> None:
    t = tscale.Instants.from_seconds([whole], [fraction], scale="TDB")
    days = seconds_of(t) / 86400 + {"mjd": Fraction(51544.5), "jd": Fraction(2451545), "seconds": 0}[layout]
    true = seconds_of(t) if layout == "seconds" else days
    (text,) = write_dates(t, layout, digits)
    assert len(text.partition(".")[2]) == digits
    # A fraction of a second is first taken to 1e-18 s.
    assert abs(Fraction(text) - true) <= Fraction(1, 2 * 10**digits) + Fraction(1, 10**18)


@given(
    day=st.integers(41317, 62000),
    second=st.integers(0, 86399),
    part=digits18,
    scale=st.sampled_from(["UTC", "GLONASS", "UTC(KRL)", "GPS"]),
)
def test_round_trip_through_days(day: int, second: int, part: int, scale: str) -> None:
    t = read_dates([f"{day}.{part:018d}"], "mjd", scale)
    for layout in LAYOUTS:
        back = read_dates(write_dates(t, layout, 18), layout, scale)
        # 18 decimals of a day are 86 fs, of a second 1 as.
        assert abs(back.minus(t)[0]) <= (0.5e-13 if layout in ("mjd", "jd") else 2e-16)


@pytest.mark.parametrize("day", [57753, 57754, 41316, 37511, 37664, 39886])
@pytest.mark.parametrize("part", [0.0, 0.25, 0.999999999])
def test_length_of_utc_days_against_erfa(day: int, part: float) -> None:
    # The quasi-JD of ERFA's utctai: 2016-12-31 has 86401 s, 1971-12-31 86400.107758 s, 1961-07-31 86399.95 s.
    # ERFA takes the step at the end of a drifting day as UTC seconds, where it is TAI: 3.2 ns at most.
    t = read_dates([f"{day}.{int(part * 10**9):09d}"], "mjd", "UTC")
    tai1, tai2 = erfa.utctai(2400000.5, day + part)
    tai = tscale.chain("UTC", "TAI")(t)
    count = (Fraction(float(tai1)) + Fraction(float(tai2)) - 2451545) * 86400
    # ERFA adds day and fraction here to one float64: 0.3 us.
    assert abs(float(seconds_of(tai) - count)) < 6.3e-7
    tai1, tai2 = erfa.utctai(2400000.5 + day, part)
    count = (Fraction(float(tai1)) + Fraction(float(tai2)) - 2451545) * 86400
    assert abs(float(seconds_of(tai) - count)) < 4e-9 + 6e-11


def test_leap_second_by_hand() -> None:
    # Half a second before the end of a day of 86401 s.
    text = str((Decimal(57753) + Decimal("86400.5") / Decimal(86401)).quantize(Decimal(10) ** -17))
    t = read_dates([text], "mjd", "UTC")
    assert t.to_iso(10).tolist() == ["2016-12-31T23:59:60.5000000000"]
    assert write_dates(t, "mjd", 17) == [text]
    # Noon of a leap-second day is past its middle; the Julian day goes on counting the same day.
    assert read_dates(["57753.5"], "mjd", "UTC").to_iso(1).tolist() == ["2016-12-31T12:00:00.5"]
    assert read_dates(["2457754.0"], "jd", "UTC").to_iso(1).tolist() == ["2016-12-31T12:00:00.5"]


@pytest.mark.parametrize(
    ("layout", "digits", "text"),
    [
        ("mjd", 0, "57754"),
        ("mjd", 3, "57754.000"),
        ("jd", 3, "2457754.500"),
        ("seconds", 0, "536500799"),
        ("iso", 0, "2016-12-31T23:59:59"),
    ],
)
def test_rounding_carries(layout: str, digits: int, text: str) -> None:
    t = tscale.Instants.from_iso(["2016-12-31T23:59:59.4"], scale="TAI")
    assert write_dates(t, layout, digits) == [text]


def test_negative_numbers() -> None:
    pair = (np.array([-1, -1, 0, -3, -1]), np.array([0.5, 0.0, 0.25, 0.75, 1 - 2**-53]))
    assert fixed_decimals(pair, 2) == ["-0.50", "-1.00", "0.25", "-2.25", "0.00"]
    assert write_dates(tscale.Instants.from_seconds(*pair, scale="TT"), "seconds", 1)[0] == "-0.5"


def test_defaults_and_refusals() -> None:
    assert [default_digits(layout) for layout in LAYOUTS] == [12, 17, 17, 12, 12]
    t = read_dates(["2025-01-01T00:00:00 "], "iso", "TT")
    assert write_dates(t, "mjd") == ["60676.00000000000000000"]
    with pytest.raises(InvalidInput, match="iso, mjd, jd, seconds"):
        read_dates(["1"], "unix", "TT")
    with pytest.raises(InvalidInput, match="0 to 18"):
        write_dates(t, "mjd", 19)
    with pytest.raises(OutOfSpan):
        read_dates(["30000.5"], "mjd", "UTC")
    with pytest.raises(TextError, match="2016-12-30"):
        read_dates(["2016-12-30T23:59:60"], "iso", "UTC")


@pytest.mark.parametrize("layout", ["iso", "mjd", "jd", "seconds"])
def test_nul_characters_are_refused(layout: str) -> None:
    good = {"iso": "2025-01-01", "mjd": "60676", "jd": "2460676.5", "seconds": "1"}[layout]
    for text in (f"{good}\0", f"\0{good}", f"{good}\0\0"):
        with pytest.raises(TextError) as caught:
            read_dates([good, text], layout, "TT")
        assert caught.value.mask is not None
        assert caught.value.mask.tolist() == [False, True]


def test_a_spreadsheet_keeps_what_is_wrapped() -> None:
    t = tscale.Instants.from_iso(["2016-12-31T23:59:60.123456789012", "2025-03-03T12:00:00"], "UTC")
    texts = write_dates(t, "spreadsheet")
    assert texts[0] == '="2016-12-31T23:59:60.123456789012"'
    assert np.all(read_dates(texts, "spreadsheet", "UTC") == t)
    assert np.all(read_dates([" " + text[2:-1] for text in texts], "spreadsheet", "UTC") == t)
    with pytest.raises(TextError):
        read_dates(['="2025-03-03'], "spreadsheet", "UTC")
