"""Where dates go wrong in practice: what we answer, beside what the installed general libraries answer.

Each test asserts what is right, by a published rule or by rational arithmetic, and that we give it. What a library
gives is printed (`pytest -rP`) and written into the test's properties (`--junit-xml`), as "trap" while it is off and as
"right" where it is not or no longer: nothing fails when it is put right, and the record says so.
"""

from __future__ import annotations

import io
import json
import pickle
import warnings
from collections.abc import Callable, Iterator
from decimal import Decimal
from fractions import Fraction
from importlib.metadata import version
from typing import Any

import erfa
import numpy as np
import pandas as pd
import pytest
from astropy import units as u
from astropy.coordinates import EarthLocation, SkyCoord
from astropy.table import Table
from astropy.time import Time
from astropy.utils import iers

import tscale
from tscale.errors import InvalidInput, MissingPiece, OutOfSpan, ScaleMismatch, TextError
from tscale.files.arrow_columns import date_columns, instants_of
from tscale.timecodes import (
    ccsds,
    from_calendar,
    from_datetime64,
    from_gnss_week,
    from_posix,
    to_calendar,
    to_datetime,
    to_datetime64,
    to_gnss_week,
    to_posix,
)

Beside = Callable[..., None]
SITE = tscale.Site.from_geodetic("Kestrel Ridge", lon_deg=127.3518, lat_deg=-26.1473, height_m=612.4)
TEXT = "2031-03-01T04:05:06.123456789012"


@pytest.fixture(autouse=True)
def _installed_tables_only() -> Iterator[None]:
    with iers.conf.set_temp("auto_download", False):
        yield


@pytest.fixture
def beside(request: pytest.FixtureRequest) -> Beside:
    """Write down what a library does: the trap as long as it is there, and that it is right when it is."""

    def note(library: str, what: str, *, right: bool, seen: object) -> None:
        words = f"{'right' if right else 'trap'}: {seen}"
        request.node.user_properties.append((f"{library} {version(library)}: {what}", words))
        print(f"{library} {version(library)}: {what}: {words}")

    return note


def _iso(text: str, scale: str = "UTC", **options: Any) -> tscale.Instants:
    return tscale.Instants.from_iso(text, scale=scale, **options)


def _rational(t: tscale.Instants) -> Fraction:
    return Fraction(int(t.whole)) + Fraction(float(t.fraction))


def test_the_record_tells_a_trap_from_what_is_right(request: pytest.FixtureRequest, beside: Beside) -> None:
    beside("numpy", "example", right=False, seen="off by 1 s")
    beside("numpy", "example", right=True, seen="exact")
    values = [str(value) for _, value in request.node.user_properties]
    assert values == ["trap: off by 1 s", "right: exact"]


# ---- no precision lost at the door ---------------------------------------------------------------


def test_a_date_survives_the_door(beside: Beside) -> None:
    t = _iso(TEXT, "TAI")
    # By rational arithmetic from the digits of the text; 0.1 fs is what a fraction of a second resolves.
    days = np.datetime64("2031-03-01") - np.datetime64("2000-01-01")
    exact = (int(days.astype(int)) * 86400 - 43200 + 4 * 3600 + 5 * 60) + Fraction(Decimal("6.123456789012"))
    assert abs(_rational(t) - exact) < Fraction(12, 10**17)
    assert t.to_iso(12) == TEXT
    # JD and MJD in two parts come back within 10 ps, the resolution of a float64 fraction of a day.
    for write, read in ((t.to_jd, tscale.Instants.from_jd), (t.to_mjd, tscale.Instants.from_mjd)):
        assert abs(read(*write(), "TAI").minus(t)) < 1e-11
    with warnings.catch_warnings():  # 2031 is past the expiry of the leap-second table
        warnings.simplefilter("ignore", tscale.ExtrapolationWarning)
        utc = _iso(TEXT)
        again = from_posix(*to_posix(utc))
    assert _rational(again) == _rational(utc)
    theirs = Time(TEXT, scale="tai")
    for form in ("jd", "mjd"):
        lost = float((Time(float(getattr(theirs, form)), format=form, scale="tai") - theirs).sec)
        beside("astropy", f"a date by way of one float {form}", right=abs(lost) < 1e-11, seen=f"{lost:.2g} s")
    lost = float((Time(float(theirs.unix_tai), format="unix_tai") - theirs).sec)
    beside("astropy", "a date by way of one float of unix seconds", right=abs(lost) < 1e-11, seen=f"{lost:.2g} s")


def test_three_seconds_are_three_seconds(beside: Beside) -> None:
    labels = ["2020-01-01T00:00:01", "2020-01-01T00:00:04"]
    first, last = tscale.Instants.from_iso(labels, "TAI")
    assert float(last.minus(first)) == 3.0
    a, b = Time(labels, scale="tai")
    beside("astropy", "a difference of 3 s", right=float((b - a).sec) == 3.0, seen=repr(float((b - a).sec)))


# ---- days with a leap second ---------------------------------------------------------------------


@pytest.mark.parametrize(
    ("label", "count"),
    # IEEE Std 1003.1, 4.16: 86400 times the days since 1970, and the second of the day; 2016-12-31 is day 17166.
    [
        ("2016-12-31T00:00:00", 17166 * 86400),
        ("2016-12-31T12:00:00", 17166 * 86400 + 43200),
        ("2016-12-31T23:59:59", 17166 * 86400 + 86399),
        ("2017-01-01T00:00:00", 17167 * 86400),
    ],
)
def test_unix_time_on_a_leap_second_day(label: str, count: int, beside: Beside) -> None:
    whole, fraction = to_posix(_iso(label))
    assert (int(whole), float(fraction)) == (count, 0.0)
    assert from_posix(count).to_iso(0) == label
    off = float(Time(label, scale="utc").unix) - count
    beside("astropy", f"unix time at {label}", right=off == 0.0, seen=f"{off:+.6f} s")


def test_the_leap_second_itself_has_a_stated_policy() -> None:
    inside = _iso("2016-12-31T23:59:60.5")
    whole, fraction = to_posix(inside)
    assert (int(whole), float(fraction)) == (17167 * 86400, 0.5)  # as the standard counts it: that of the second after
    assert from_posix(whole, fraction, repeated="inside") == inside
    assert from_posix(whole, fraction) == _iso("2017-01-01T00:00:00.5")
    with pytest.raises(InvalidInput, match="repeated="):
        from_posix(whole, fraction, repeated="raise")
    with pytest.raises(InvalidInput, match="inside a leap second"):
        to_posix(inside, inside="raise")
    # A smeared clock is a clock of its own, by choice alone; at noon to noon each of its counts is one instant.
    smeared = to_posix(inside, smear="noon to noon")
    assert from_posix(*smeared, smear="noon to noon").to_iso(9) == "2016-12-31T23:59:60.500000000"


# ---- where is the observer -----------------------------------------------------------------------


def test_nobody_stands_on_the_equator_by_default(beside: Beside) -> None:
    t = _iso("2025-03-03T06:00:00")
    with pytest.raises(MissingPiece, match="give site="):
        tscale.chain("UTC", "TDB")
    ground = tscale.chain("UTC", "TDB", site=SITE)(t)
    centre = tscale.chain("UTC", "TDB@GEOCENTER")(t)
    apart = abs(float(ground.at("GEOCENTER").minus(centre)))
    assert 1e-8 < apart < 2.2e-6  # v r / c^2 of the Earth's orbit: 2.1 us at the most
    time = Time("2025-03-03T06:00:00", scale="utc")
    there = EarthLocation.from_geocentric(0.0, 0.0, 0.0, unit=u.m)
    bare, said = (Time(time, location=where).tdb for where in (None, there))
    off = float((bare - Time(said.jd1, said.jd2, format="jd", scale="tdb")).sec)
    # Once this was a point on the equator, 2 us away.
    beside("astropy", "TDB without a location", right=abs(off) < 1e-9, seen=f"{off:.2g} s from the geocentre's")


def test_kilometres_are_not_taken_for_metres(beside: Beside) -> None:
    with pytest.raises(InvalidInput, match="kilometres, give metres"):
        tscale.Site.from_itrf("mixed up", -3949.312107, 3402.411622, -3664.70319)
    try:
        theirs = EarthLocation.from_geocentric(-3949.312107, 3402.411622, -3664.70319, unit=u.m)
        seen = f"a height of {float(theirs.geodetic.height.to_value(u.km)):.0f} km, without a word"
    except ValueError as error:
        seen = f"refused: {error}"
    beside("astropy", "kilometres given as metres", right=seen.startswith("refused"), seen=seen)


# ---- where is the time valid ---------------------------------------------------------------------


def test_a_date_at_the_barycentre_is_no_date_here(beside: Beside) -> None:
    t = _iso("2025-03-03T06:00:00")
    star = tscale.Source(ra_deg=187.2519, dec_deg=-12.6408)
    here = tscale.chain("UTC", "TDB", site=SITE)(t)
    there = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=star)(t)
    for mix in (
        there.minus,
        there.__eq__,
        there.__lt__,
        lambda other: tscale.Instants.concatenate([there.ravel(), other.ravel()]),
    ):
        with pytest.raises(ScaleMismatch, match="BARYCENTER"):
            mix(here)
    with pytest.raises(ScaleMismatch, match="a signal moves only with a source"):
        tscale.chain("TDB@TOPOCENTER", "TT@TOPOCENTER", site=SITE)(there)
    # The place goes with the date into files.
    assert instants_of(date_columns("t", there.ravel())).place == "BARYCENTER"
    assert tscale.serial.from_json(tscale.serial.to_json(there)).place == "BARYCENTER"
    where = EarthLocation.from_geodetic(127.3518 * u.deg, -26.1473 * u.deg, 612.4 * u.m)
    time = Time("2025-03-03T06:00:00", scale="utc", location=where)
    arrived = time.tdb + time.light_travel_time(SkyCoord(187.2519 * u.deg, -12.6408 * u.deg), ephemeris="builtin")
    try:
        mixed = f"{float((arrived - time.tdb).sec):.1f} s between dates of two places, without a word"
    except Exception as error:
        mixed = f"refused: {error}"
    beside("astropy", "barycentric and local dates subtracted", right=mixed.startswith("refused"), seen=mixed)


# ---- expiry, and steps of any size ---------------------------------------------------------------


def test_a_leap_second_table_past_its_expiry_says_so(beside: Beside) -> None:
    table = tscale.LeapSeconds.default()
    assert table.expires_mjd is not None
    late = tscale.Instants.from_seconds((table.expires_mjd - 51544) * 86400 + 86400 * 365, 0.0, scale="UTC")
    assert bool(table.is_expired(late.pair))
    with pytest.warns(tscale.ExtrapolationWarning, match="past the expiry"):
        label = late.to_iso(0)
    assert tscale.chain("UTC", "TAI").notes(late)
    with warnings.catch_warnings(record=True) as seen:
        warnings.simplefilter("always")
        _ = Time(str(label), scale="utc").tai
    words = [str(item.message) for item in seen]
    beside("astropy", "UTC past the expiry of its table", right=bool(words), seen=words or "converted in silence")


def test_a_negative_leap_second(beside: Beside) -> None:
    table = tscale.LeapSeconds.default().with_step(62502, 36).with_expiry(None)  # 2030-01-01
    with pytest.raises(TextError, match="do not exist"):
        _iso("2029-12-31T23:59:59", leap_seconds=table)
    before, after = (_iso(text, leap_seconds=table) for text in ("2029-12-31T23:59:58", "2030-01-01T00:00:00"))
    assert float(after.minus(before)) == 1.0
    assert before.shifted(0.5).to_iso(1, leap_seconds=table) == "2029-12-31T23:59:58.5"
    # A step of another size, as has been proposed for the years after 2035.
    minute = tscale.LeapSeconds.default().with_step(69807, 97).with_expiry(None)  # 2050-01-01, 60 s at once
    assert _iso("2049-12-31T23:59:75", leap_seconds=minute).to_iso(0, leap_seconds=minute) == "2049-12-31T23:59:75"
    with pytest.raises(TextError, match="do not exist"):
        from_posix(21915 * 86400 - 1, leap_seconds=table)  # the second before 2030-01-01
    rows = erfa.leap_seconds.get()
    for size, year in ((36.0, 2030), (97.0, 2050)):
        try:
            erfa.leap_seconds.validate(np.concatenate([rows, np.array([(year, 1, size)], dtype=rows.dtype)]))
            seen = "accepted"
        except ValueError as error:
            seen = str(error)
        beside("pyerfa", f"a step to TAI - UTC = {size:g} s", right=seen == "accepted", seen=seen)


# ---- UTC before 1972 -----------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("label", "tai_minus_utc_s"),
    # TAI - UTC = a + (MJD - b) c, with a, b, c as in the table of the IERS and the USNO (tai-utc.dat): from January,
    # March and July 1965, from February 1968, and 10 s from 1972.
    [
        ("1965-02-01T00:00:00", Fraction("3.5401300") + (38792 - 38761) * Fraction("0.0012960")),
        ("1965-06-30T12:00:00", Fraction("3.6401300") + (Fraction(77883, 2) - 38761) * Fraction("0.0012960")),
        ("1965-07-15T00:00:00", Fraction("3.7401300") + (38956 - 38761) * Fraction("0.0012960")),
        ("1970-01-01T00:00:00", Fraction("4.2131700") + (40587 - 39126) * Fraction("0.0025920")),
        ("1972-01-01T00:00:00", Fraction(10)),
    ],
)
def test_utc_in_the_years_of_drift(label: str, tai_minus_utc_s: Fraction, beside: Beside) -> None:
    t = _iso(label)
    assert t.to_iso(12) == f"{label}.000000000000"
    tai = tscale.chain("UTC", "TAI")(t)
    assert abs(_rational(tai) - _rational(_iso(label, "TAI")) - tai_minus_utc_s) < Fraction(3, 10**16)
    assert tscale.chain("UTC", "TAI").inverse(tai).to_iso(12) == f"{label}.000000000000"
    shown = str(Time(label, scale="utc").isot)
    beside("astropy", f"{label} UTC printed", right=shown == f"{label}.000", seen=shown)


def test_the_short_steps_of_utc() -> None:
    # UTC was set back by 0.1 s at the end of 1965-06-30 (tai-utc.dat): that day ends at 23:59:60.1, less its drift.
    assert _iso("1965-06-30T23:59:60.05").to_iso(2) == "1965-06-30T23:59:60.05"
    with pytest.raises(TextError):
        _iso("1965-06-30T23:59:60.15")


# ---- UT1 -----------------------------------------------------------------------------------------


def test_ut1_between_rows_is_no_straight_line(beside: Beside) -> None:
    rows = iers.IERS_B.open(iers.IERS_B_FILE)
    mjd = rows["MJD"].value.astype(np.int64)
    known = (mjd >= 58000) & (mjd < 60000)
    mjd, ut1 = mjd[known], rows["UT1_UTC"].to_value(u.s)[known]
    # Every second row taken out, and read back from its neighbours by us and by a straight line.
    kept = slice(0, None, 2)
    table = tscale.EarthOrientation.from_rows(mjd[kept], ut1[kept], 0.0, 0.0)
    at = slice(5, -5, 2)
    t = tscale.Instants.from_mjd(mjd[at], 0.0, "UTC")
    chain = tscale.chain("UTC", "UT1", reference=tscale.ReferenceData(earth_orientation=table))
    ledger = chain.ledger(t)
    ours = ledger.total - ut1[at]
    straight = (ut1[4:-6:2] + ut1[6:-4:2]) / 2.0 - ut1[at]
    assert np.sqrt(np.mean(ours**2)) < 0.25 * np.sqrt(np.mean(straight**2))
    # Between rows of a day the polynomial through four rows (IERS Conventions 2010, 5.5), halfway: (-1, 9, 9, -1)/16.
    daily = tscale.EarthOrientation.from_rows(mjd, ut1, 0.0, 0.0)
    noon = tscale.Instants.from_mjd(mjd[50:-50], 0.5, "UTC")
    total = tscale.chain("UTC", "UT1", reference=tscale.ReferenceData(earth_orientation=daily)).ledger(noon).total
    four = sum(w * ut1[50 + i : len(ut1) - 50 + i] for i, w in zip((-1, 0, 1, 2), (-1, 9, 9, -1), strict=True)) / 16.0
    # One float64 of UT1 - TAI, 37 s, is rounded to 4 fs; the rows to 0.1 us.
    assert np.max(np.abs(total - four)) < 1e-13
    theirs = rows.ut1_utc(mjd[50:-50] + 2400000.5, 0.5).to_value(u.s)
    off = float(np.sqrt(np.mean((theirs - four) ** 2)))
    beside(
        "astropy", "UT1 halfway between rows", right=off < 1e-6, seen=f"{off * 1e6:.1f} us rms from four-point Lagrange"
    )


# ---- scales --------------------------------------------------------------------------------------


def test_a_scale_is_never_guessed(beside: Beside) -> None:
    with pytest.raises(TypeError, match="scale"):
        tscale.Instants.from_iso("2025-01-01")  # type: ignore[call-arg]
    for a, b in (("GPS", "UTC"), ("TAI", "TT"), ("GPS", "GST"), ("UTC", "UTC(KRL)"), ("TT", "TT(BIPM08)")):
        with pytest.raises(ScaleMismatch, match="convert one with"):
            _iso("2025-01-01", a).minus(_iso("2025-01-01", b))
    try:
        seen = f"taken for {Time('2025-01-01').scale} in silence"
    except (TypeError, ValueError) as error:
        seen = f"refused: {error}"
    beside("astropy", "a date without a scale", right=seen.startswith("refused"), seen=seen)


@pytest.mark.parametrize(
    ("scale", "tai_minus_s"),
    # BIPM Annual Report, time scales; IS-GPS-200 3.3.4; BDS-SIS-ICD 3.3; Galileo OS-SIS-ICD 5.1.2; IAU 1991 A4 (TT).
    [("UTC", 37.0), ("GPS", 19.0), ("GST", 19.0), ("BDT", 33.0), ("GLONASS", 37.0 - 10800.0), ("TT", -32.184)],
)
def test_each_scale_is_its_own(scale: str, tai_minus_s: float, beside: Beside) -> None:
    t = _iso("2025-01-01T00:00:00", scale)
    tai = tscale.chain(scale, "TAI")(t)
    # One float64 of 10763 s is 1.8e-12 s coarse.
    assert abs(tai.minus(_iso("2025-01-01T00:00:00", "TAI")) - tai_minus_s) < 2e-12
    assert abs(tscale.chain(scale, "TAI").inverse(tai).minus(t)) < 3e-16
    beside("astropy", f"a scale {scale}", right=scale.lower() in Time.SCALES, seen=sorted(Time.SCALES))


# ---- second 60 -----------------------------------------------------------------------------------


def test_second_60_is_kept_or_given_up_by_choice(beside: Beside) -> None:
    t = _iso("2016-12-31T23:59:60.250")
    fields = to_calendar(t)
    assert (int(fields.second), float(fields.fraction)) == (60, 0.25)
    assert from_calendar(*fields[:7], scale="UTC") == t
    for write in (to_datetime, to_datetime64):
        with pytest.raises(InvalidInput, match="inside='clamp'"):
            write(t)
    assert to_datetime(t, inside="clamp").item().isoformat() == "2016-12-31T23:59:59.999999+00:00"
    assert str(to_datetime64(t, "ms", inside="clamp")) == "2016-12-31T23:59:59.999"
    tries: dict[str, Callable[[], object]] = {
        "numpy": lambda: np.datetime64("2016-12-31T23:59:60"),
        "pandas": lambda: pd.Timestamp("2016-12-31T23:59:60"),
        "astropy": lambda: Time("2016-12-31T23:59:60", scale="utc").to_datetime(),
    }
    for library, attempt in tries.items():
        try:
            seen, right = str(attempt()), True
        except ValueError as error:
            seen, right = str(error), False
        beside(library, "second 60", right=right, seen=seen)


# ---- limits of types -----------------------------------------------------------------------------


def test_columns_carry_scale_and_every_digit(beside: Beside) -> None:
    t = tscale.Instants.from_iso(["1500-01-01T00:00:00.000000000000000001", "2300-01-01T00:00:00.1"], "TT").at(
        "GEOCENTER"
    )
    back = instants_of(date_columns("t", t))
    assert (back.scale, back.place) == ("TT", "GEOCENTER")
    assert np.array_equal(back.fraction.view(np.int64), t.fraction.view(np.int64))
    assert (back == t).all()
    # Nanoseconds reach from 1678 to 2262: beyond that we say so.
    with pytest.raises(OutOfSpan, match="longer unit") as caught:
        to_datetime64(t, "ns")
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [True, True]
    assert (from_datetime64(to_datetime64(t[1], "ms"), "TT") == t[1].at(None)).all()
    wrapped = np.datetime64("2300-01-01", "s").astype("datetime64[ns]")
    beside("numpy", "2300-01-01 in nanoseconds", right=str(wrapped)[:4] == "2300", seen=str(wrapped))
    stamp = pd.Timestamp("2025-01-01T00:00:00.123456789012")
    beside("pandas", "picoseconds of a date", right="789012" in str(stamp), seen=str(stamp))


# ---- serialisation -------------------------------------------------------------------------------


def test_every_way_out_comes_back_to_the_bit(beside: Beside) -> None:
    t = tscale.Instants.from_seconds([983203506, -1], [0.123456789012, np.nextafter(1.0, 0.0)], "TDB", "BARYCENTER")
    ways: list[Callable[[tscale.Instants], tscale.Instants]] = [
        lambda x: tscale.serial.from_json(tscale.serial.to_json(x)),
        lambda x: pickle.loads(pickle.dumps(x)),
        lambda x: instants_of(date_columns("t", x)),
    ]
    for way in ways:
        back = way(t)
        assert np.array_equal(back.whole, t.whole)
        assert np.array_equal(back.fraction.view(np.int64), t.fraction.view(np.int64))
        assert (back.scale, back.place) == ("TDB", "BARYCENTER")
    time = Time(TEXT, scale="tai")
    lost = float((Time(time.isot, scale="tai") - time).sec)
    beside("astropy", "a Time through its own text", right=abs(lost) < 1e-11, seen=f"{lost:.2g} s lost")
    text = io.StringIO()
    Table([Time([TEXT], scale="tai", format="isot")], names=["t"]).write(text, format="ascii.ecsv")
    lost = float((Time(Table.read(text.getvalue(), format="ascii.ecsv")["t"][0]) - time).sec)
    beside("astropy", "a Time through an ECSV table", right=abs(lost) < 1e-11, seen=f"{lost:.2g} s lost")
    stamp = pd.Timestamp("2025-01-01T00:00:00.123456789")
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        read = json.loads(pd.DataFrame({"t": [stamp]}).to_json())["t"]["0"]
    kept = pd.Timestamp(read, unit="ms") if isinstance(read, int) else pd.Timestamp(read)
    beside("pandas", "nanoseconds through to_json", right=kept == stamp, seen=str(kept))


# ---- weeks and codes -----------------------------------------------------------------------------


def test_weeks_roll_over_by_a_pivot(beside: Beside) -> None:
    # Week 0 anew: 1999-08-22 (1024) and 2019-04-07 (2048), by count from 1980-01-06 (IS-GPS-200).
    for pivot, date in (("1999-10-01", "1999-08-22"), ("2019-06-01", "2019-04-07")):
        t = from_gnss_week(0, 0, modulo=1024, pivot=_iso(pivot, "GPS"))
        assert t.to_iso(0) == f"{date}T00:00:00"
        assert t.scale == "GPS"
    assert int(to_gnss_week(_iso("2019-04-07T00:00:00", "GPS")).week) == 2048
    with pytest.raises(InvalidInput, match="pivot"):
        from_gnss_week(0, 0, modulo=1024)
    beside("astropy", "weeks of GPS", right=any("week" in name for name in Time.FORMATS), seen=sorted(Time.FORMATS))
    scale = Time(1e9, format="gps").scale
    beside("astropy", "the scale of seconds of GPS", right=scale == "gps", seen=scale)


def test_codes_of_spacecraft(beside: Beside) -> None:
    t = _iso("2016-12-31T23:59:60.123456", "UTC")
    # CCSDS 301.0-B-4, 3.3: days since 1958-01-01 and milliseconds of the day, which go on past 86 399 999.
    code = ccsds.to_cds(t, unit="us", p_field=False)
    day = int.from_bytes(code[:2].tobytes(), "big")
    assert day == int((np.datetime64("2016-12-31") - np.datetime64("1958-01-01")).astype(int))
    assert int.from_bytes(code[2:6].tobytes(), "big") == 86400123
    assert abs(ccsds.from_cds(ccsds.to_cds(t, unit="ps")).minus(t)) <= 1e-12
    # 3.2: seconds of TAI since 1958-01-01, 2^-24 s in three octets more.
    tai = _iso("2016-12-31T23:59:30.5", "TAI")
    assert ccsds.from_cuc(ccsds.to_cuc(tai)) == tai
    beside("astropy", "CCSDS codes", right=any("ccsds" in name for name in Time.FORMATS), seen=sorted(Time.FORMATS))
