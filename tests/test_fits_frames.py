"""Time frames of FITS headers: words, reference times by all their digits, defaults, contradictions.

Rots et al. 2015, A&A 574, A36; FITS Standard 4.0, section 9. Rules of precedence and the table of scales and positions
are as remembered from there.
"""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import erfa
import numpy as np
import pytest
from astropy.io import fits
from astropy.time import Time
from hypothesis import given
from hypothesis import strategies as st

import tscale
from tscale.errors import DataFileError, InvalidInput, MissingPiece
from tscale.fits import read_time_frame, site_of, source_of
from tscale.fits.cards import Cards

from .fits_support import SITE, header, with_place


def test_the_frame_of_a_mission() -> None:
    frame = read_time_frame(with_place(header(TIMSYER=1e-6, TIMRDER=2e-7, TIMEPIXR=0.0)))
    assert str(frame.node) == "TT@TOPOCENTER"
    assert frame.mjd == 51910 + Fraction("0.00074287037037037")
    assert frame.observer_m == SITE.position_m
    assert (frame.systematic_s, frame.random_s) == (1e-6, 2e-7)
    assert frame.bin_centre_s == 1e-6  # half of TIMEDEL, for TIMEPIXR says that stamps are at the beginning
    assert frame.notes == ()


def test_a_reference_of_64_184_s_is_a_new_year_of_utc() -> None:
    # TT - UTC was 32.184 s + 32 s in 2001 (IERS Bulletin C): the fraction 64.184 s/86400 is used by several missions.
    frame = read_time_frame(header(MJDREFF="0.00074287037037037037037"))
    t = frame.instants(0.0)
    assert t.place == "TOPOCENTER"
    utc = tscale.chain("TT@TOPOCENTER", "UTC")(t)
    # The fraction is written to 1e-23 of a day; what is left is the rounding of counts, 0.1 fs.
    assert abs(float(utc - tscale.Instants.from_iso("2001-01-01", "UTC", "TOPOCENTER"))) <= 2.3e-16


@pytest.mark.parametrize(
    ("digits", "exact"),
    [("0.00080074074074074", "0.00080074074074074"), ("7.428703703703703D-4", "0.0007428703703703703"), (".5", "0.5")],
)
def test_numbers_are_read_by_their_digits(digits: str, exact: str) -> None:
    text = "".join(
        f"{key:<8}= {value:>20}".ljust(80)
        for key, value in (("TIMESYS", "'TT      '"), ("MJDREFI", "50814"), ("MJDREFF", digits))
    )
    frame = read_time_frame(text)
    assert frame.mjd == 50814 + Fraction(exact)
    # What a sum as one float64 would lose, up to 0.3 us, is there.
    whole, fraction = frame.instants(0.0).pair
    want = (50814 + Fraction(exact) - Fraction("51544.5")) * 86400
    assert abs(int(whole) + Fraction(float(fraction)) - want) < Fraction(2, 10**16)
    assert abs(Fraction(50814 + float(exact)) * 86400 - frame.mjd * 86400) > Fraction(1, 10**9) or digits == ".5"


@pytest.mark.parametrize(
    ("word", "scale"),
    [
        ("TAI", "TAI"), ("IAT", "TAI"), ("TT", "TT"), ("TDT", "TT"), ("ET", "TT"), ("TT(TAI)", "TT"),
        ("TT(BIPM23)", "TT(BIPM23)"), ("UTC", "UTC"), ("GMT", "UTC"), ("UT", "UTC"), ("UTC(KRL)", "UTC(KRL)"),
        ("UT1", "UT1"), ("UT(UT1)", "UT1"), ("GPS", "GPS"), ("TCG", "TCG"), ("tt", "TT"),
    ],
)  # fmt: skip
def test_words_of_timesys(word: str, scale: str) -> None:
    frame = read_time_frame(header(TIMESYS=word))
    assert frame.scale.name == scale
    assert any(word in note for note in frame.notes) == (word in ("IAT", "TDT", "ET", "GMT", "UT", "UT(UT1)"))


@pytest.mark.parametrize("position", ["TOPOCENTER", "GEOCENTER", "BARYCENTER", "MARS", "HELIOCENTER", "CUSTOM"])
@pytest.mark.parametrize("scale", ["TAI", "TT", "UTC", "GPS", "UT1", "TCG", "TCB", "TDB"])
def test_scales_and_positions_that_go_together(scale: str, position: str) -> None:
    # Table 31 of the standard: at the barycentre TDB or TCB, and elsewhere the scales of the Earth.
    found = header(TIMESYS=scale, TREFPOS=position)
    if position == "BARYCENTER" and scale not in ("TCB", "TDB"):
        with pytest.raises(DataFileError, match=f"TREFPOS is BARYCENTER and TIMESYS {scale}"):
            read_time_frame(found)
        return
    frame = read_time_frame(found)
    assert frame.position == position
    assert any("no path length taken off" in note for note in frame.notes) == (
        scale in ("TCB", "TDB") and position != "BARYCENTER"
    )
    if position in ("HELIOCENTER", "CUSTOM"):
        with pytest.raises(InvalidInput, match="known places are TOPOCENTER"):
            _ = frame.node


def test_positions_are_told_by_eight_characters() -> None:
    assert read_time_frame(header(TREFPOS="TOPOCENT")).position == "TOPOCENTER"
    with pytest.raises(DataFileError, match="TREFPOS: 'TOPO' is no reference position"):
        read_time_frame(header(TREFPOS="TOPO"))


def test_defaults_are_said() -> None:
    frame = read_time_frame({})
    assert (frame.scale.name, frame.position, frame.unit, frame.mjd) == ("UTC", "TOPOCENTER", "s", 0)
    said = " ".join(frame.notes)
    for words in ("TIMESYS is not given: UTC", "TREFPOS is not given: TOPOCENTER", "TIMEUNIT is not given: s",
                  "MJDREF = 0"):  # fmt: skip
        assert words in said
    ephemeris = read_time_frame({"TIMESYS": "TDB", "TREFPOS": "BARYCENTER"})
    assert ephemeris.ephemeris == "DE405"
    assert any("DE405 by the standard" in note for note in ephemeris.notes)


def test_tdb_with_a_position_left_out_is_refused_and_can_be_said() -> None:
    # Barycentric dates stored without saying so: 500 s between the two readings.
    found = header(TIMESYS="TDB", TREFPOS=None)
    with pytest.raises(DataFileError, match="its default TOPOCENTER does not go with TDB"):
        read_time_frame(found)
    assert str(read_time_frame(found, cards={"TREFPOS": "BARYCENTER"}).node) == "TDB@BARYCENTER"


@pytest.mark.parametrize(
    ("cards", "mjd"),
    [
        ({"MJDREF": 50000.25}, Fraction(200001, 4)),
        ({"MJDREFI": 50000, "MJDREFF": 0.25}, Fraction(200001, 4)),
        ({"MJDREF": 50000.25, "JDREF": 2450000.75}, Fraction(200001, 4)),
        ({"JDREFI": 2450000, "JDREFF": 0.75}, Fraction(200001, 4)),
        ({"JDREF": 2450000.75, "DATEREF": "1995-10-10T06:00:00"}, Fraction(200001, 4)),
        ({"DATEREF": "1995-10-10T06:00:00.000"}, Fraction(200001, 4)),
        ({"DATEREF": "1995-10-10"}, Fraction(50000)),
        # Two parts before the single value, which agrees to the digits that it has.
        ({"MJDREF": 51910.0007, "MJDREFI": 51910, "MJDREFF": 0.00074287}, 51910 + Fraction("0.00074287")),
        # The single value before one part alone.
        ({"MJDREF": 50000.25, "MJDREFI": 50000}, None),
        ({"MJDREFI": 50000}, Fraction(50000)),
        ({}, Fraction(0)),
    ],
)
def test_precedence_of_reference_times(cards: dict[str, Any], mjd: Fraction | None) -> None:
    found = read_time_frame({"TIMESYS": "TT", "TREFPOS": "GEOCENTER", "TIMEUNIT": "s", **cards})
    assert found.mjd == (Fraction(200001, 4) if mjd is None else mjd)
    assert any("stands alone" in note for note in found.notes) == (cards == {"MJDREFI": 50000})


@pytest.mark.parametrize(
    ("cards", "keywords"),
    [
        ({"MJDREF": 51910.5}, ("MJDREFI + MJDREFF", "MJDREF")),
        ({"JDREF": 2451911.5}, ("MJDREFI + MJDREFF", "JDREF")),
        ({"DATEREF": "2001-01-01T00:00:00"}, ("MJDREFI + MJDREFF", "DATEREF")),
        ({"TSTART": 10.0, "DATE__BEG": "2001-01-01T00:01:16"}, ("TSTART", "DATE-BEG")),
        ({"TSTART": 10.0, "MJD__BEG": 51910.0015}, ("TSTART", "MJD-BEG")),
        ({"TSTOP": 10.0, "DATE__END": "2001-01-01T00:01:12.0"}, ("TSTOP", "DATE-END")),
        ({"DATE__OBS": "2019-05-05T12:00:00", "MJD__OBS": 58608.4321}, ("DATE-OBS", "MJD-OBS")),
        ({"TSTART": 10.0, "TSTOP": 9.0}, ("TSTOP is before TSTART",)),
        ({"TIMEOFFS": 1.0, "TIMEZERO": 2.0}, ("TIMEOFFS", "TIMEZERO")),
        ({"TIMEUNIT": "ms"}, ("TIMEUNIT", "'ms'", "s, min, h, d, a, yr, cy, ta, Ba")),
        ({"TIMESYS": "EST"}, ("TIMESYS", "'EST'")),
        ({"TIMESYS": "LOCAL"}, ("TIMESYS", "LOCAL")),
        ({"TIMESYS": "UT(XYZ)"}, ("TIMESYS", "UT(XYZ)")),
        ({"TIMESYS": 5}, ("TIMESYS must be a string",)),
        ({"MJDREFF": "a"}, ("MJDREFF must be a number",)),
        ({"OBSGEO__X": 1.0}, ("OBSGEO-Y, OBSGEO-Z is missing",)),
        ({"OBSGEO__B": 99.0, "OBSGEO__L": 0.0, "OBSGEO__H": 0.0}, ("OBSGEO-B is a latitude",)),
        ({"TREFDIR": "RA_PNT,DEC_PNT"}, ("TREFDIR",)),
        ({"TIMEPIXR": 1.5}, ("TIMEPIXR",)),
        ({"TIMRDER": -1.0}, ("TIMRDER cannot be negative",)),
        ({"DATE__OBS": "2019-05-05T12:00:00Z"}, ("DATE-OBS", "without a letter for the zone")),
        ({"DATE__OBS": "2019-05-05 12:00:00"}, ("DATE-OBS",)),
        ({"DATE__OBS": "2019-02-29T12:00:00"}, ("DATE-OBS",)),
    ],
)
def test_contradictions_are_errors_that_name_the_keywords(cards: dict[str, Any], keywords: tuple[str, ...]) -> None:
    with pytest.raises(DataFileError) as caught:
        read_time_frame(header(**cards))
    for keyword in keywords:
        assert keyword in str(caught.value)


@pytest.mark.parametrize(
    ("wrong", "right"),
    [
        ({"MJDREF": 51910.5}, {"MJDREF": 51910}),
        ({"DATEREF": "2001-01-01T00:00:00"}, {"DATEREF": "2001-01-01T00:01:04.184"}),
        ({"TSTOP": 10.0, "DATE__END": "2001-01-01T00:01:12.0"}, {"DATE-END": "2001-01-01T00:01:14.184"}),
        ({"TSTART": 10.0, "TSTOP": 9.0}, {"TSTOP": 11.0}),
        ({"TIMEOFFS": 1.0, "TIMEZERO": 2.0}, {"TIMEOFFS": 3.0, "TIMEZERO": 0}),
        ({"TREFPOS": "BARYCENTER"}, {"TIMESYS": "TDB"}),
    ],
)
def test_contradictions_name_a_remedy_that_is_one(wrong: dict[str, Any], right: dict[str, Any]) -> None:
    if "MJDREF" in wrong:
        wrong = {**wrong, "MJDREFI": 51910, "MJDREFF": 0.0}
    with pytest.raises(DataFileError) as caught:
        read_time_frame(header(**wrong))
    said = str(caught.value).partition("cards={")[2]
    assert all(f"'{key}': " in said for key in right)
    read_time_frame(header(**wrong), cards=right)


def test_a_keyword_twice_with_two_values_is_an_error() -> None:
    found = header()
    found.append(("TIMESYS", "UTC"), end=True)
    assert read_time_frame(found, cards={"TIMESYS": "UTC"}).scale.name == "UTC"
    with pytest.raises(DataFileError, match="TIMESYS stands there several times, with the values TT, UTC"):
        read_time_frame(found)


def test_what_agrees_to_its_digits_is_no_contradiction() -> None:
    frame = read_time_frame(
        header(
            TSTART=10.4321, DATE__BEG="2001-01-01T00:01:14", MJD__BEG=51910.00086, TSTOP=99.0, DATE__END="2001-01-01"
        )
    )
    assert frame.times["TSTART"].instants.to_iso(4) == "2001-01-01T00:01:14.6161"
    assert frame.times["DATE-END"].digit_s == 86400.0


def test_two_forms_of_obsgeo() -> None:
    found = with_place(header())
    for key, value in (("B", SITE.lat_deg), ("L", SITE.lon_deg), ("H", SITE.height_m)):
        found[f"OBSGEO-{key}"] = round(value, 6)
    assert read_time_frame(found).observer_m == SITE.position_m
    found["OBSGEO-H"] = SITE.height_m + 50.0
    with pytest.raises(DataFileError, match=r"OBSGEO-X, -Y, -Z and OBSGEO-B, -L, -H are (?:49|50)[.0-9]* m apart"):
        read_time_frame(found)
    for key in "XYZ":
        del found[f"OBSGEO-{key}"]
    # erfa's geodetic coordinates of the place that B, L and H give, WGS84: 1e-9 rad are 6 mm.
    lon, lat, height = erfa.gc2gd(1, np.array(site_of(found).position_m))
    assert abs(np.degrees(lon) - SITE.lon_deg) < 1e-6
    assert abs(np.degrees(lat) - SITE.lat_deg) < 1e-6
    assert abs(height - (SITE.height_m + 50.0)) < 1e-3


def test_site_and_source_of_a_header() -> None:
    assert site_of(with_place(header(TELESCOP="Reed")), None).name == "Reed"
    with pytest.raises(MissingPiece, match="no OBSGEO"):
        site_of(header())
    source = source_of(header())
    assert (source.ra_deg, source.dec_deg) == (187.2519, -12.6408)
    for cards in ({"RADESYS": "FK5"}, {"RADESYS": None, "EQUINOX": 2000.0}):
        with pytest.raises(DataFileError, match="not ICRS"):
            source_of(header(**cards))
    assert source_of(header(RADESYS=None)).ra_deg == 187.2519  # the default of the standard
    with pytest.raises(MissingPiece, match="RA_PNT and DEC_PNT"):
        source_of(header(), ("RA_PNT", "DEC_PNT"))


def test_epochs_have_scales_of_their_own() -> None:
    frame = read_time_frame(header(JEPOCH=2015.5, BEPOCH=1950.0))
    julian, bessel = frame.times["JEPOCH"].instants, frame.times["BEPOCH"].instants
    assert (julian.scale, bessel.scale) == ("TDB", "TT")
    day, part = julian.to_jd()
    assert day + part == sum(erfa.epj2jd(2015.5)) - 0.0
    # B1950.0 is JD 2433282.42345905 (Lieske 1979; erfa), to its digits: 1e-8 d.
    day, part = bessel.to_jd()
    assert abs((int(day) - 2433282) + float(part) - 0.42345905) < 1e-8
    assert abs((int(day) + float(part)) - sum(erfa.epb2jd(1950.0))) < 1e-9


@pytest.mark.parametrize(
    ("unit", "seconds"),
    [
        ("min", 60), ("h", 3600), ("d", 86400), ("a", 31557600), ("yr", 31557600), ("cy", 3155760000),
        ("ta", 31556925.19), ("Ba", 31556925.9747),
    ],
)  # fmt: skip
def test_units(unit: str, seconds: float) -> None:
    frame = read_time_frame(header(TIMEUNIT=unit, TIMEDEL=1.0))
    # The tropical years are published to 0.1 ms and 0.01 s.
    assert abs(frame.instants(1.0).minus(frame.instants(0.0)) - seconds) < (1e-9 if isinstance(seconds, int) else 5e-3)
    assert any("a year" in note for note in frame.notes) == (unit in ("ta", "Ba"))


def test_offsets_and_scaled_columns_are_exact() -> None:
    found = header(TIMEOFFS=-0.125, TFIELDS=2, TTYPE1="A", TTYPE2="time", TSCAL2=0.001, TZERO2=5.0, TUNIT2="s")
    t = read_time_frame(found, "TIME").instants([0.0, 3.0])
    start = read_time_frame(header()).instants(0.0)
    for got, want in zip(t, (4.875, 4.878), strict=True):
        assert abs(float(got.minus(start)) - want) < 1e-15
    with pytest.raises(DataFileError, match="TSCAL2 is 0"):
        read_time_frame(header(TFIELDS=2, TTYPE1="A", TTYPE2="TIME", TSCAL2=0.0), 2)
    with pytest.raises(DataFileError, match="TCRPX2, TCRVL2 and TCDLT2"):
        read_time_frame(header(TCDLT2=0.5), 2)


def test_a_column_may_have_a_frame_of_its_own() -> None:
    found = header(TCTYP2="TDB", TRPOS2="BARYCENTER", TRDIR2="RA_NOM,DEC_NOM", TCUNI2="d")
    frame = read_time_frame(found, 2)
    assert str(frame.node) == "TDB@BARYCENTER"
    assert (frame.column_unit, frame.unit) == ("d", "s")
    assert frame.direction == ("RA_NOM", "DEC_NOM")
    assert str(read_time_frame(found, 1).node) == "TT@TOPOCENTER"
    with pytest.raises(DataFileError, match="the column holds no times"):
        read_time_frame(header(TCTYP2="RA---TAN"), 2)


def test_seconds_of_utc_over_a_leap_second_must_be_said() -> None:
    found = header(TIMESYS="UTC", MJDREFI=57753, MJDREFF=0.0)  # 2016-12-31, which ended with 23:59:60
    frame = read_time_frame(found)
    assert frame.instants(86399.5).to_iso(1) == "2016-12-31T23:59:59.5"
    with pytest.raises(InvalidInput, match="read in two ways, 1 s apart"):
        frame.instants([10.0, 86402.0])
    elapsed, labels = (read_time_frame(found, utc=way) for way in ("elapsed", "labels"))
    assert elapsed.instants([86400.5, 86401.5]).to_iso(1).tolist() == ["2016-12-31T23:59:60.5", "2017-01-01T00:00:00.5"]
    assert labels.instants([86400.5]).to_iso(1).tolist() == ["2017-01-01T00:00:00.5"]
    with pytest.raises(InvalidInput, match="inside a leap second"):
        labels.numbers(elapsed.instants([86400.5]))


def test_days_of_utc_are_julian_dates_of_true_length() -> None:
    frame = read_time_frame({"TIMESYS": "UTC", "TIMEUNIT": "d", "TREFPOS": "GEOCENTER"})
    days = np.array([57753.0, 57753.25, 57753.9999999, 57754.5, 40000.25, 58849.125])
    t = frame.instants(days)
    theirs = Time(days, format="mjd", scale="utc")
    # astropy, as SOFA, fills the day of the leap second with 86401 s; a float64 MJD resolves 0.6 us.
    assert np.max(np.abs(t.at(None) - tscale.interop.from_astropy(theirs))) < 1e-9
    assert np.array_equal(frame.numbers(t), days)


def test_gps_is_a_scale_of_its_own() -> None:
    # GPS is 19 s behind TAI (IS-GPS-200): astropy says "ahead of" and reads the column as TAI.
    frame = read_time_frame(header(TIMESYS="GPS", MJDREFI=44244, MJDREFF=0.0))
    t = frame.instants(0.0)
    tai = tscale.chain("GPS@TOPOCENTER", "TAI")(t)
    assert str(tai.to_iso(0)) == "1980-01-06T00:00:19"


def test_tai_was_31_s_ahead_of_utc() -> None:
    # Example of the year-2000 appendix to the FITS date agreement: on 1997-07-01 TAI was 31 s ahead of UTC.
    tai = read_time_frame(header(TIMESYS="TAI", DATE__OBS="1997-07-01T00:00:31")).times["DATE-OBS"].instants
    utc = read_time_frame(header(TIMESYS="UTC", DATE__OBS="1997-07-01T00:00:00")).times["DATE-OBS"].instants
    assert tscale.chain("TAI", "UTC")(tai) == utc
    leap = read_time_frame(header(TIMESYS="UTC", DATE__OBS="1997-06-30T23:59:60.5")).times["DATE-OBS"].instants
    assert float(utc.minus(leap)) == 0.5


def test_numbers_beyond_reason_are_refused() -> None:
    # Each of these would otherwise be worked on for hours, or wrap round an int64.
    for cards in ({"TSTART": "1E400"}, {"TSTART": 1e300}, {"JEPOCH": 1e200}, {"MJD__OBS": -1e290}):
        plain = {key.replace("__", "-"): value for key, value in cards.items()}
        key, value = next(iter(plain.items()))
        text = f"{key:<8}= {value!s:>20}".replace("'", "").ljust(80)
        with pytest.raises((DataFileError, InvalidInput), match=r"beyond|within 1e14|float64"):
            read_time_frame("".join(Cards.of({"TIMESYS": "TT", "MJDREFF": 0.0}).images) + text)
    with pytest.raises(DataFileError, match="TFIELDS must be a whole number from 0 to 999"):
        read_time_frame(header(TFIELDS=10**12), "TIME")


scales = st.sampled_from(["TT", "TAI", "TDB", "TCB", "TCG", "GPS"])


@given(
    scale=scales,
    day=st.integers(40000, 70000),
    part=st.decimals(0, 1, places=18).filter(lambda x: x < 1),
    values=st.lists(st.floats(-3e9, 3e9), min_size=1, max_size=5),
)
def test_numbers_come_back(scale: str, day: int, part: Any, values: list[float]) -> None:
    place = "BARYCENTER" if scale in ("TDB", "TCB") else "GEOCENTER"
    cards = {"TIMESYS": scale, "TREFPOS": place, "MJDREFI": day, "MJDREFF": part}
    frame = read_time_frame(cards)
    assert frame.mjd == day + Fraction(part)
    numbers = np.array(values)
    t = frame.instants(numbers)
    back = frame.numbers(t)
    # Counts resolve 0.11 fs, twice; larger numbers are coarser than that and come back to the bit.
    assert np.all(np.abs(back - numbers) <= 3e-16)
    large = np.abs(numbers) > 16.0
    assert np.array_equal(back[large], numbers[large])
    # The oracle is exact: rational arithmetic on the digits of the header and the bits of the numbers.
    for whole, fraction, value in zip(t.whole.tolist(), t.fraction.tolist(), values, strict=True):
        exact = (day + Fraction(part)) * 86400 + Fraction(value) - (51544 * 86400 + 43200)
        assert abs(whole + Fraction(fraction) - exact) < Fraction(3, 10**16)


@given(unit=st.sampled_from(["d", "h", "min", "a", "cy"]), value=st.floats(-3e4, 3e4))
def test_numbers_in_larger_units_come_back_to_the_bit(unit: str, value: float) -> None:
    frame = read_time_frame(header(TIMEUNIT=unit))
    back = float(frame.numbers(frame.instants(value)))
    # What lies below the resolution of counts, 0.2 fs, is lost; all else comes back to the last bit.
    assert back == value or abs(back - value) * 60 < 5e-16


@given(
    st.sampled_from(["TSTART", "AB", "A-B_C1"]),
    st.one_of(st.booleans(), st.integers(-(10**15), 10**15), st.floats(allow_nan=False, allow_infinity=False),
              st.text(st.characters(min_codepoint=32, max_codepoint=126), max_size=60)),
)  # fmt: skip
def test_cards_are_read_as_astropy_reads_them(keyword: str, value: Any) -> None:
    theirs = fits.Header()
    theirs[keyword] = value
    cards = Cards.of(theirs)
    ours = Cards.of({keyword: value}) if not isinstance(value, str) or len(value.replace("'", "''")) < 60 else None
    if isinstance(value, bool):
        assert cards.true(keyword) == value
    elif isinstance(value, str):
        assert (cards.text(keyword) or "") == value.strip()
    else:
        # As written: astropy cuts numbers off after 20 characters.
        assert float(cards.number(keyword)) == fits.Header.fromstring(theirs.tostring())[keyword]
    if ours is not None:
        written = fits.Header.fromstring("".join(ours.images))[keyword]
        assert written == (value.rstrip() if isinstance(value, str) else value)


def test_long_strings_go_on() -> None:
    found = header()
    found["TREFDIR"] = "RA_NOM,DEC_NOM"
    found["OBSORBIT"] = "https://example.org/" + "x" * 90 + "/orbit.oem"
    assert read_time_frame(found).orbit == found["OBSORBIT"]
