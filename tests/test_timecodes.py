"""Time codes of other systems, against the documents that define them and against general libraries."""

from __future__ import annotations

import datetime

import numpy as np
import pandas as pd
import pytest
from astropy.time import Time
from hypothesis import given
from hypothesis import strategies as st

import tscale
from tscale import timecodes as tc
from tscale.errors import InvalidInput, OutOfSpan, TextError

UTC_COUNTS = st.integers(-883_612_800, 3_000_000_000)  # 1972 to 2095
FRACTIONS = st.floats(0.0, 1.0, exclude_max=True)
# Whole seconds around every leap second: hazards for codes that leave them out.
LEAPS = [-883612800 + s for s in (15724800, 31622400)] + [536500831, 489024031, 394372830]

pytestmark = pytest.mark.filterwarnings("ignore::tscale.errors.ExtrapolationWarning")


def utc(text: str) -> tscale.Instants:
    return tscale.Instants.from_iso(text, "UTC")


def same(a: tscale.Instants, b: tscale.Instants) -> bool:
    return a.scale == b.scale and bool(np.all(a.whole == b.whole) and np.all(a.fraction == b.fraction))


# ---- GNSS weeks ------------------------------------------------------------------------------------


def test_weeks_of_three_systems_at_one_instant() -> None:
    # 2024-05-15T12:34:56.789 UTC, by the definitions of the interface documents; GPS also by astropy below.
    t = utc("2024-05-15T12:34:56.789")
    for scale, week, second in (("GPS", 2314, 304514), ("GST", 1290, 304514), ("BDT", 958, 304500)):
        mapped = tscale.chain("UTC", scale)(t)
        found = tc.to_gnss_week(mapped)
        assert (int(found.week), int(found.second)) == (week, second)
        assert float(found.fraction) == pytest.approx(0.789, abs=1e-15)
        assert same(tc.from_gnss_week(week, second, found.fraction, scale=scale), mapped)


def test_gps_seconds_agree_with_astropy() -> None:
    for text in ("1980-01-06T00:00:00", "1999-08-22T00:00:00", "2019-04-07T00:00:00", "2024-05-15T12:34:56.789"):
        week = tc.to_gnss_week(tscale.chain("UTC", "GPS")(utc(text)))
        seconds = float(week.week * 604800 + week.second + week.fraction)
        assert seconds == pytest.approx(Time(text, scale="utc").gps, abs=1e-5)  # s; a float of 1e9 s


def test_origins_and_rollovers_are_those_of_the_documents() -> None:
    # IS-GPS-200, 3.3.4: week 0 starts at midnight 5/6 January 1980 UTC, so GPS rolled over on 1999-08-22, 2019-04-07.
    for scale, start in (
        ("GPS", "1980-01-06T00:00:00"),
        ("GST", "1999-08-21T23:59:47"),  # Galileo OS-SIS-ICD, 5.1.2: 13 s before midnight UTC
        ("BDT", "2006-01-01T00:00:00"),  # BDS-SIS-ICD, 3.3
    ):
        assert tc.to_gnss_week(tscale.chain("UTC", scale)(utc(start)))[:2] == (0, 0)
    for day in ("1999-08-22", "2019-04-07"):
        t = tscale.Instants.from_iso(day, "GPS")
        assert tc.to_gnss_week(t, modulo=1024)[:2] == (0, 0)
        assert same(tc.from_gnss_week(0, 0, modulo=1024, pivot=t.shifted(2e8)), t)
        assert same(tc.from_gnss_week(0, 0, modulo=1024, pivot=t.shifted(-2e8)), t)


@given(st.integers(0, 2**33), FRACTIONS, st.sampled_from(["GPS", "GST", "BDT"]), st.sampled_from([1024, 4096, 8192]))
def test_weeks_close_with_and_without_a_rollover(since: int, fraction: float, scale: str, modulo: int) -> None:
    start = tc.from_gnss_week(0, 0, scale=scale)
    t = start.shifted((since, fraction))
    assert same(tc.from_gnss_week(*tc.to_gnss_week(t), scale=scale), t)
    short = tc.to_gnss_week(t, modulo=modulo)
    for pivot in (t.shifted(modulo * 302400 - 1), t.shifted(-modulo * 302400 + 1), t):
        assert same(tc.from_gnss_week(*short, scale=scale, modulo=modulo, pivot=pivot), t)


def test_a_rolled_over_week_needs_a_pivot_and_a_pivot_a_rollover() -> None:
    t = tscale.Instants.from_iso(["2020-01-01", "1979-01-01"], "GPS")
    with pytest.raises(InvalidInput, match="go together"):
        tc.from_gnss_week(3, 0, modulo=1024)
    with pytest.raises(InvalidInput, match="go together"):
        tc.from_gnss_week(3, 0, pivot=t[0])
    with pytest.raises(InvalidInput, match="one instant"):
        tc.from_gnss_week(3, 0, modulo=1024, pivot=t)
    with pytest.raises(InvalidInput, match="weeks 0 to 1023") as caught:
        tc.from_gnss_week([3, 1024, 5], [604800, 0, 0], modulo=1024, pivot=t[0])
    assert caught.value.mask.tolist() == [True, True, False]  # type: ignore[union-attr]
    with pytest.raises(OutOfSpan) as early:
        tc.to_gnss_week(t)
    assert early.value.mask.tolist() == [False, True]  # type: ignore[union-attr]
    with pytest.raises(InvalidInput, match="counted on GPS, GST, BDT, got 'UTC'"):
        tc.to_gnss_week(utc("2020-01-01"))
    with pytest.raises(InvalidInput, match="modulo must be"):
        tc.to_gnss_week(t[0], modulo=0)
    with pytest.raises(InvalidInput, match="must be whole"):
        tc.from_gnss_week(3.5, 0)
    with pytest.raises(OutOfSpan, match="before week 0 of GPS"):
        tc.from_gnss_week(1000, 0, modulo=1024, pivot=tscale.Instants.from_iso("1980-03-01", "GPS"))


# ---- POSIX -----------------------------------------------------------------------------------------


def test_posix_by_the_formula_of_the_standard() -> None:
    # IEEE Std 1003.1, 4.16: sec + 60 min + 3600 h + 86400 yday + 31536000 (y - 70) + leap days, here for 2016-12-31.
    formula = 59 + 59 * 60 + 23 * 3600 + 365 * 86400 + (116 - 70) * 31536000 + ((116 - 69) // 4) * 86400
    formula += -((116 - 1) // 100) * 86400 + ((116 + 299) // 400) * 86400
    texts = ["2016-12-31T12:00:00", "2016-12-31T23:59:59.75", "2016-12-31T23:59:60.25", "2017-01-01T00:00:00.25"]
    whole, fraction = tc.to_posix(utc(texts))  # type: ignore[arg-type]
    assert whole.tolist() == [formula - 43199, formula, formula + 1, formula + 1]
    assert fraction.tolist() == [0.0, 0.75, 0.25, 0.25]
    # Python's own calendar, which has no leap seconds either.
    for text in ("1972-01-01T00:00:00", "2038-01-19T03:14:07", "2016-12-31T12:00:00"):
        want = datetime.datetime.fromisoformat(text).replace(tzinfo=datetime.UTC).timestamp()
        assert int(tc.to_posix(utc(text))[0]) == want


def test_a_count_shared_with_a_leap_second_is_read_by_choice() -> None:
    count = [1483228799, 1483228800, 1483228801]
    after = tc.from_posix(count, 0.5)
    inside = tc.from_posix(count, 0.5, repeated="inside")
    assert after.to_iso(1).tolist() == ["2016-12-31T23:59:59.5", "2017-01-01T00:00:00.5", "2017-01-01T00:00:01.5"]
    assert inside.to_iso(1).tolist() == ["2016-12-31T23:59:59.5", "2016-12-31T23:59:60.5", "2017-01-01T00:00:01.5"]
    assert tc.to_posix(inside)[0].tolist() == count
    with pytest.raises(InvalidInput, match="1 of 3 counts") as caught:
        tc.from_posix(count, repeated="raise")
    assert caught.value.mask.tolist() == [False, True, False]  # type: ignore[union-attr]
    with pytest.raises(InvalidInput, match="inside a leap second") as caught:
        tc.to_posix(inside, inside="raise")
    assert caught.value.mask.tolist() == [False, True, False]  # type: ignore[union-attr]


def test_a_count_that_a_negative_leap_second_skips_is_refused() -> None:
    table = tscale.LeapSeconds.default().with_step(62502, 36)  # 2030-01-01
    last = (62502 - 40587) * 86400 - 1
    with pytest.raises(TextError) as caught:
        tc.from_posix([last - 1, last, last + 1], leap_seconds=table)
    assert caught.value.mask.tolist() == [False, True, False]  # type: ignore[union-attr]
    apart = tc.from_posix([last - 1, last + 1], leap_seconds=table)
    assert (apart[1] - apart[0]) == 1.0
    smeared = tc.from_posix(last, 0.5, smear="noon to noon", leap_seconds=table)
    back = tc.to_posix(smeared, smear="noon to noon", leap_seconds=table)
    assert (int(back[0]), float(back[1])) == (last, pytest.approx(0.5, abs=1e-11))


def test_a_smeared_clock_is_half_a_step_off_at_midnight() -> None:
    # Common practice of time servers, no standard: 24 h from noon to noon, so 0.5 s at the start of the new day.
    t = utc(["2016-12-31T12:00:00", "2016-12-31T23:59:60.5", "2017-01-01T12:00:00", "2017-06-01T00:00:00"])  # type: ignore[arg-type]
    whole, fraction = tc.to_posix(t, smear="noon to noon")
    assert whole.tolist() == [1483185600, 1483228800, 1483272000, 1496275200]
    assert fraction == pytest.approx(np.zeros(4), abs=1e-11)  # exact but for one rounding of 43200 s


@given(st.one_of(UTC_COUNTS, st.sampled_from(LEAPS)), FRACTIONS, st.integers(-90_000, 90_000))
def test_posix_closes(whole: int, fraction: float, off: int) -> None:
    t = tscale.Instants.from_seconds(max(whole + off, -883_612_800), fraction, scale="UTC")
    late = int(t.to_iso(0)[()][-2:]) >= 60 if float(fraction) < 0.5 else False
    pair = tc.to_posix(t)
    readings = [tc.from_posix(*pair, repeated=choice) for choice in ("after", "inside")]
    assert any(same(reading, t) for reading in readings)
    assert same(readings[late], t) or not same(readings[0], readings[1])
    smeared = tc.from_posix(*tc.to_posix(t, smear="noon to noon"), smear="noon to noon")
    assert abs(float(smeared - t)) < 3e-16 * 4  # four roundings of a fraction


def test_unknown_choices_and_scales_are_refused() -> None:
    with pytest.raises(InvalidInput, match="repeated must be"):
        tc.from_posix(0, repeated="first")  # type: ignore[arg-type]
    with pytest.raises(InvalidInput, match="smear must be 'noon to noon'"):
        tc.from_posix(10**9, smear="linear")  # type: ignore[arg-type]
    with pytest.raises(InvalidInput, match="count of UTC, got TAI"):
        tc.to_posix(tscale.Instants.from_iso("2020-01-01", "TAI"))
    with pytest.raises(OutOfSpan):
        tc.from_posix(-(10**9))


# ---- NTP -------------------------------------------------------------------------------------------


def test_ntp_dates_of_rfc_5905() -> None:
    # RFC 5905, figure 4: first days of UTC and of NTP era 1, last day of the 20th century.
    for text, era, second in (
        ("1972-01-01", 0, 2272060800),
        ("1999-12-31", 0, 3155587200),
        ("2036-02-08", 1, 63104),
    ):
        stamp = tc.to_ntp(utc(text))
        assert (int(stamp.era), int(stamp.second), int(stamp.fraction)) == (era, second, 0)
        assert same(tc.from_ntp(second, era=era), utc(text))
        assert same(tc.from_ntp(second, pivot=utc("2010-01-01")), utc(text))
        for years in (-67, 67):  # an era is 136 years
            pivot = utc(text).shifted(years * 31557600.0)
            if pivot.whole > -883_612_800:
                assert same(tc.from_ntp(second, pivot=pivot), utc(text))


@given(UTC_COUNTS, FRACTIONS)
def test_ntp_closes_to_its_resolution(whole: int, fraction: float) -> None:
    t = tscale.Instants.from_seconds(whole, fraction, scale="UTC")
    stamp = tc.to_ntp(t)
    bits = stamp.stamp
    for repeated in ("after", "inside"):
        back = tc.from_ntp(bits >> np.uint64(32), bits & np.uint64(0xFFFFFFFF), era=stamp.era, repeated=repeated)  # type: ignore[arg-type]
        if abs(float(back - t)) <= 2.0**-33:
            return
    raise AssertionError(f"{t} came back as {back}")


def test_an_ntp_stamp_needs_its_era() -> None:
    with pytest.raises(InvalidInput, match="does not tell its era"):
        tc.from_ntp(1)
    with pytest.raises(InvalidInput, match="does not tell its era"):
        tc.from_ntp(1, era=0, pivot=utc("2020-01-01"))
    with pytest.raises(InvalidInput, match="0 to 2\\*\\*32 - 1"):
        tc.from_ntp([1, 2**32], era=1)
    with pytest.raises(InvalidInput, match="an era is a small whole number"):
        tc.from_ntp(1, era=0.5)
    with pytest.raises(InvalidInput, match="one instant"):
        tc.from_ntp(1, pivot=utc(["2020-01-01", "2021-01-01"]))  # type: ignore[arg-type]


# ---- IEEE 1588 -------------------------------------------------------------------------------------


def test_ptp_counts_of_the_standard() -> None:
    # IEEE 1588-2008, Table B.1 (from memory): PTP seconds = GPS seconds + 315 964 819, and NTP seconds - 2 208 988 800
    # + currentUtcOffset, which is 37 s now.
    t = utc("2024-05-15T12:34:56.789")
    stamp = tc.to_ptp(tscale.chain("UTC", "TAI")(t))
    gps = tc.to_gnss_week(tscale.chain("UTC", "GPS")(t))
    assert int(stamp.seconds) == int(gps.week) * 604800 + int(gps.second) + 315_964_819
    assert int(stamp.seconds) == int(tc.to_ntp(t).second) - 2_208_988_800 + 37
    assert int(stamp.nanoseconds) == 789_000_000
    # 7.2.2: the epoch is 1970-01-01 00:00:00 TAI.
    assert same(tc.from_ptp(0, 0), tscale.Instants.from_iso("1970-01-01", "TAI"))


@given(st.integers(-946_727_000, 2**47), FRACTIONS)
def test_ptp_closes_to_8_fs(whole: int, fraction: float) -> None:
    t = tscale.Instants.from_seconds(whole, fraction, scale="TAI")
    stamp = tc.to_ptp(t)
    assert 0 <= int(stamp.nanoseconds) < 10**9
    assert abs(int(stamp.correction)) <= 2**15
    assert abs(float(tc.from_ptp(*stamp) - t)) <= 2.0**-17 * 1e-9 + 3e-16


def test_ptp_fields_out_of_range_are_refused() -> None:
    with pytest.raises(InvalidInput, match="nanosecondsField must be below 1e9"):
        tc.from_ptp(0, 10**9)
    with pytest.raises(InvalidInput, match="secondsField must be 0"):
        tc.from_ptp(-1, 0)
    with pytest.raises(OutOfSpan, match="before 1970"):
        tc.to_ptp(tscale.Instants.from_iso("1969-12-31", "TAI"))
    with pytest.raises(InvalidInput, match="PTP counts TAI"):
        tc.to_ptp(utc("2000-01-01"))
    assert tc.from_ptp(10, 5, -(2**16)).to_iso(9) == "1970-01-01T00:00:10.000000004"


# ---- calendar fields -------------------------------------------------------------------------------


@given(
    st.one_of(UTC_COUNTS, st.sampled_from(LEAPS)),
    st.integers(-2, 12_000),
    FRACTIONS,
    st.sampled_from(["UTC", "TAI", "TDB", "GLONASS", "UTC(KST)"]),
)
def test_calendar_fields_lose_nothing(whole: int, off: int, fraction: float, scale: str) -> None:
    t = tscale.Instants.from_seconds(max(whole + off, -883_612_700), fraction, scale=scale)
    fields = tc.to_calendar(t)
    assert same(tc.from_calendar(*fields, scale=scale), t)
    text = "{:04d}-{:02d}-{:02d}T{:02d}:{:02d}:{:02d}".format(*(int(part) for part in fields[:6]))
    floor = tscale.Instants.from_seconds(t.whole, 0.0, scale=scale)
    assert str(floor.to_iso(0)) == text


def test_a_leap_second_is_second_60_and_nowhere_else() -> None:
    fields = tc.to_calendar(utc("2016-12-31T23:59:60.75"))
    assert [float(part) for part in fields] == [2016, 12, 31, 23, 59, 60, 0.75]
    glonass = tc.to_calendar(tscale.Instants.from_iso("2017-01-01T02:59:60.75", "GLONASS"))
    assert [float(part) for part in glonass] == [2017, 1, 1, 2, 59, 60, 0.75]
    for fields in ((2016, 12, 30, 23, 59, 60), (2016, 2, 30), (2015, 2, 29), (2016, 13, 1), (2016, 12, 31, 12, 0, 60)):
        with pytest.raises(TextError):
            tc.from_calendar(*fields, scale="UTC")
    with pytest.raises(TextError, match="2016-2-30") as caught:
        tc.from_calendar(2016, 2, [29, 30], scale="TT")
    assert caught.value.mask.tolist() == [False, True]  # type: ignore[union-attr]


# ---- datetime and datetime64 -----------------------------------------------------------------------


@given(st.integers(-(2**62), 2**62), st.sampled_from(["ns", "us", "ps"]))
def test_datetime64_ticks_come_back(ticks: int, unit: str) -> None:
    if unit == "us":
        ticks //= 10**6  # within the calendar
    value = np.array(ticks, dtype=f"datetime64[{unit}]")
    t = tc.from_datetime64(value, "TAI")
    assert tc.to_datetime64(t, unit) == value  # type: ignore[arg-type]
    assert str(t.to_iso(6))[:19] == str(value.astype("datetime64[us]"))[:19] or t.fraction > 0.9999


def test_datetime64_is_read_in_any_unit_shape_and_stride() -> None:
    days = np.arange("2016-12-28", "2017-01-05", dtype="datetime64[D]")
    t = tc.from_datetime64(days[::2].reshape(2, 2), "UTC")
    assert t.to_iso(0).tolist() == [
        ["2016-12-28T00:00:00", "2016-12-30T00:00:00"],
        ["2017-01-01T00:00:00", "2017-01-03T00:00:00"],
    ]
    assert (t[1, 0] - t[0, 1]) == 2 * 86400 + 1
    assert tc.from_datetime64(np.datetime64("2020-01-01T12", "h"), "TT").to_iso(0) == "2020-01-01T12:00:00"
    coarse = np.array([5, 6], dtype="datetime64[10ms]")
    assert tc.from_datetime64(coarse, "TT").to_iso(2).tolist() == ["1970-01-01T00:00:00.05", "1970-01-01T00:00:00.06"]
    with pytest.raises(InvalidInput, match="NaT") as caught:
        tc.from_datetime64(np.array(["2020-01-01", "NaT"], dtype="datetime64[s]"), "UTC")
    assert caught.value.mask.tolist() == [False, True]  # type: ignore[union-attr]
    with pytest.raises(InvalidInput, match="must be datetime64"):
        tc.from_datetime64(np.array(["2020"], dtype="datetime64[Y]"), "UTC")
    with pytest.raises(InvalidInput, match="must be datetime64"):
        tc.from_datetime64([1.5], "UTC")
    assert tc.from_datetime64(np.array(["2020-01-01"], ">M8[ns]"), "TT").to_iso(0).tolist() == ["2020-01-01T00:00:00"]
    for unit, ticks in (("D", 10**15), ("W", 2**58), ("10s", 2**62), ("h", -(2**60))):
        with pytest.raises(InvalidInput, match="beyond what an int64 of seconds holds") as caught:
            tc.from_datetime64(np.array([0, ticks], "i8").view(f"M8[{unit}]"), "TT")
        assert caught.value.mask.tolist() == [False, True]  # type: ignore[union-attr]
    with pytest.raises(OutOfSpan, match="beyond the reach of datetime64"):
        tc.to_datetime64(tscale.Instants.from_iso(["2020-01-01", "2300-01-01"], "TT"), "ns")


def test_second_60_is_refused_or_clamped_by_choice() -> None:
    t = utc(["2016-12-31T23:59:60.5", "2017-01-01T00:00:00.5"])  # type: ignore[arg-type]
    for write in (tc.to_datetime64, tc.to_datetime):
        with pytest.raises(InvalidInput, match="inside a leap second") as caught:
            write(t)
        assert caught.value.mask.tolist() == [True, False]  # type: ignore[union-attr]
        with pytest.raises(InvalidInput, match="inside must be"):
            write(t, inside="smear")  # type: ignore[arg-type]
    clamped = tc.to_datetime64(t, "ms", inside="clamp")
    assert clamped.astype(str).tolist() == ["2016-12-31T23:59:59.999", "2017-01-01T00:00:00.500"]
    assert tc.to_datetime(t, inside="clamp")[0] == datetime.datetime(2016, 12, 31, 23, 59, 59, 999999, datetime.UTC)
    glonass = tscale.Instants.from_iso("2017-01-01T02:59:60.5", "GLONASS")
    assert str(tc.to_datetime64(glonass, "s", inside="clamp")) == "2017-01-01T02:59:59"
    # Rounded up into a leap second is inside it as well, whatever was asked for.
    assert str(tc.to_datetime64(utc("2016-12-31T23:59:59.9999999999"), "ns")) == "2016-12-31T23:59:59.999999999"


@given(st.datetimes(datetime.datetime(1972, 1, 1), datetime.datetime(2090, 1, 1)))
def test_datetimes_come_back_and_zones_say_utc(value: datetime.datetime) -> None:
    assert tc.to_datetime(tc.from_datetime(value, "TT"))[()] == value
    zone = datetime.timezone(datetime.timedelta(hours=-9, minutes=-30))
    aware = value.replace(tzinfo=zone)
    back = tc.to_datetime(tc.from_datetime(aware))[()]
    assert back == aware
    assert back.utcoffset() == datetime.timedelta(0)


def test_what_is_no_datetime_is_refused() -> None:
    with pytest.raises(InvalidInput, match="item 1 is str"):
        tc.from_datetime([datetime.datetime(2020, 1, 1), "2020"])
    with pytest.raises(InvalidInput, match="has a time zone"):
        tc.from_datetime(datetime.datetime(2020, 1, 1, tzinfo=datetime.UTC), "TAI")
    with pytest.raises(InvalidInput, match="has nanoseconds"):
        tc.from_datetime(pd.Timestamp("2020-01-01T00:00:00.123456789"))
    with pytest.raises(InvalidInput, match="no date"):
        tc.from_datetime([pd.NaT])
    first = datetime.datetime(1, 1, 1, tzinfo=datetime.timezone(datetime.timedelta(hours=3)))
    with pytest.raises(InvalidInput, match="outside the years 1 to 9999"):
        tc.from_datetime(first)
    with pytest.raises(OutOfSpan, match="years 1 to 9999"):
        tc.to_datetime(tscale.Instants.from_mjd(-700000, 0.0, "TT"))
    got = tc.from_datetime([[datetime.datetime(2020, 1, 1)], [datetime.datetime(2020, 1, 2)]], "TAI")
    assert got.shape == (2, 1)
