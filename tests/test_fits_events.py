"""Event lists carried to the barycentre: times, intervals and headers agree, and all else stays byte for byte."""

from __future__ import annotations

import contextlib
from pathlib import Path

import numpy as np
import pytest
from astropy.coordinates import EarthLocation, SkyCoord
from astropy.io import fits
from astropy.table import Table
from astropy.time import Time, TimeDelta
from hypothesis import given, settings
from hypothesis import strategies as st

import tscale
from tscale.errors import DataFileError, InvalidInput, OutOfSpan
from tscale.fits import convert_events, read_good_time, read_instants, read_time_frame
from tscale.fits.layout import read_layout

from .fits_support import SITE, STAR, event_file, events, good_time, header, save, times, to_barycentre, with_place

# Half the spacing of float64 numbers of 7e8 s is 60 ns, within a day (86400 s) 7 ps.
COARSE_S, FINE_S = 6.1e-8, 7.5e-12


def other_bytes(path: Path) -> list[bytes]:
    """The data of every HDU, with the bytes of times blanked."""
    found = []
    content = path.read_bytes()
    for hdu in read_layout(path):
        data = bytearray(content[hdu.data : hdu.end])
        names = ("TIME", "START", "STOP") if hdu.is_table else ()
        for column in filter(None, (hdu.column(name) for name in names)):
            for row in range(hdu.rows):
                at = row * hdu.row_bytes + column.offset
                data[at : at + 8] = b"\0" * 8
        found.append(bytes(data))
    return found


@pytest.mark.parametrize("rebase", [False, True])
def test_times_intervals_and_headers_agree(tmp_path: Path, rebase: bool) -> None:
    source, target = event_file(tmp_path / "in.fits"), tmp_path / "out.fits"
    chain = to_barycentre()
    done = convert_events(source, target, chain, rebase=rebase)
    limit_s = FINE_S if rebase else COARSE_S
    before, after = read_instants(source), read_instants(target)
    assert str(after.node) == "TDB@BARYCENTER"
    want = chain(before)
    assert np.max(np.abs(after.minus(want))) < limit_s
    for was, now in zip(read_good_time(source), read_good_time(target), strict=True):
        assert np.max(np.abs(now.minus(chain(was)))) < limit_s
    for number in (0, 1, 2):
        frame = read_time_frame(fits.getheader(target, number))
        for key, value in (("TSTART", want[0]), ("TSTOP", want[-1])):
            # The input wrote TSTART with 16 characters: 1e-7 s.
            assert abs(float(frame.times[key].instants.at("BARYCENTER").minus(value))) < 1e-7 + limit_s
    assert done.spacing_s < 2.1 * limit_s
    assert done.rows == 500 + 2 + 2
    assert done.headers == ("HDU 0 (PRIMARY)", "HDU 1 (EVENTS)", "HDU 2 (GTI)")
    assert any("counted from the day" in note for note in done.notes) == (not rebase)


def test_keywords_say_what_was_done(tmp_path: Path) -> None:
    source, target = event_file(tmp_path / "in.fits"), tmp_path / "out.fits"
    chain = to_barycentre()
    convert_events(source, target, chain, rebase=True)
    was, now = fits.getheader(source, 1), fits.getheader(target, 1)
    assert [now[key] for key in ("TIMESYS", "TREFPOS", "TREFDIR", "PLEPHEM")] == [
        "TDB", "BARYCENTER", "RA_NOM,DEC_NOM", "DE440",
    ]  # fmt: skip
    assert (now["MJDREF"], now["MJDREFI"], now["MJDREFF"]) == (60011.0, 60011, 0.0)
    assert now["TELAPSE"] == pytest.approx(now["TSTOP"] - now["TSTART"], abs=2e-11)
    history = "".join(str(line).strip() for line in now["HISTORY"])
    for table in chain.provenance().tables:
        assert table.sha256 in history
    assert chain.provenance().digest in history
    assert "times carried from TT@TOPOCENTER to TDB@BARYCENTER" in str(now["HISTORY"])
    assert "column TIME: numbers up to 1.46e-11 s apart" in str(now["HISTORY"])
    changed = {"TIMESYS", "TREFPOS", "TREFDIR", "PLEPHEM", "MJDREF", "MJDREFI", "MJDREFF", "TSTART", "TSTOP", "TELAPSE",
               "CHECKSUM", "DATASUM", "HISTORY"}  # fmt: skip
    assert {key for key in (*was, *now) if was.get(key) != now.get(key)} - {""} == changed


def test_all_else_stays_byte_for_byte(tmp_path: Path) -> None:
    source, target = event_file(tmp_path / "in.fits"), tmp_path / "out.fits"
    convert_events(source, target, to_barycentre(), rebase=True)
    assert other_bytes(source) == other_bytes(target)
    before, after = source.read_bytes(), target.read_bytes()
    (picture_before,), (picture_after,) = (
        [hdu for hdu in read_layout(path) if hdu.name == "PICTURE"] for path in (source, target)
    )
    # A compressed image is a table by its form, and is left with its header.
    assert before[picture_before.start : picture_before.end] == after[picture_after.start : picture_after.end]
    kept = {image for hdu in read_layout(source) for image in hdu.cards.images if image.startswith(("TFORM", "TTYPE"))}
    assert kept <= {image for hdu in read_layout(target) for image in hdu.cards.images}


def test_sums_are_made_anew_where_they_are(tmp_path: Path) -> None:
    source, target = event_file(tmp_path / "in.fits"), tmp_path / "out.fits"
    convert_events(source, target, to_barycentre())
    # astropy warns, which is an error here, where a sum is wrong.
    with fits.open(target, checksum=True) as found:
        found.verify("exception")
        assert all("CHECKSUM" in hdu.header for hdu in found[:3])
        assert len(found["EVENTS"].data) == 500
    plain = save(tmp_path / "plain.fits", events(with_place(header()), times(7)), checksum=False)
    convert_events(plain, target, to_barycentre())
    assert "CHECKSUM" not in fits.getheader(target, 1)


def test_astropy_reads_the_result(tmp_path: Path) -> None:
    source, target = event_file(tmp_path / "in.fits"), tmp_path / "out.fits"
    chain = to_barycentre()
    convert_events(source, target, chain, rebase=True)
    theirs = Table.read(target, hdu="EVENTS", astropy_native=True)["TIME"]
    assert theirs.scale == "tdb"
    assert theirs.location is None  # what astropy has for the barycentre
    want = chain(read_instants(source))
    # Two float64 of days hold 5 ps, and the file 7 ps.
    assert np.max(np.abs(tscale.interop.from_astropy(Time(theirs), "BARYCENTER").minus(want))) < 2e-11


def test_direction_of_the_signal(tmp_path: Path) -> None:
    target = tmp_path / "out.fits"
    for cards in ({"RA_NOM": 10.0}, {"RADESYS": "FK5"}, {"RA_NOM": None}):
        source = event_file(tmp_path / "in.fits", **cards)
        convert_events(source, target, to_barycentre())
        now = fits.getheader(target, 1)
        assert now["TREFDIR"] == "RA_TREF,DEC_TREF"
        assert (now["RA_TREF"], now["DEC_TREF"]) == (STAR.ra_deg, STAR.dec_deg)
        assert now.get("RA_NOM") == fits.getheader(source, 1).get("RA_NOM")


def test_there_and_back(tmp_path: Path) -> None:
    source, there, back = event_file(tmp_path / "in.fits"), tmp_path / "there.fits", tmp_path / "back.fits"
    convert_events(source, there, to_barycentre(), rebase=True)
    home = tscale.chain("TDB@BARYCENTER", "TT@TOPOCENTER", site=SITE, source=STAR)
    convert_events(there, back, home)
    assert np.max(np.abs(read_instants(back).minus(read_instants(source)))) < 2 * FINE_S
    now = fits.getheader(back, 1)
    assert (now["TIMESYS"], now["TREFPOS"]) == ("TT", "TOPOCENTER")
    assert "TREFDIR" not in now


def test_dates_of_the_header_follow_the_events(tmp_path: Path) -> None:
    t = times()
    first = read_time_frame(header()).instants(t[[0, -1]])
    texts = [str(text) for text in first.to_iso(3)]
    dates = {
        "DATE__OBS": texts[0][:10],
        "TIME__OBS": texts[0][11:19],
        "DATE__BEG": texts[0],
        "MJD__OBS": round(float(sum(first[0].to_mjd())), 4),
        "DATE__END": texts[1][:10],
        "DATE__AVG": "2023-03-09",
    }
    source, target = event_file(tmp_path / "in.fits", t, **dates), tmp_path / "out.fits"
    done = convert_events(source, target, to_barycentre())
    want = to_barycentre()(first)
    now = fits.getheader(target, 1)
    # TSTART is the most exact statement of the beginning: the others are written from it, to its 1.2e-7 s.
    assert now["DATE-BEG"] == str(want[0].to_iso(7))
    assert now["DATE-OBS"] + "T" + now["TIME-OBS"] == str(want[0].to_iso(7))
    assert abs(now["MJD-OBS"] - sum(map(float, want[0].to_mjd()))) < 1e-9
    assert now["DATE-END"] == str(want[1].to_iso(0))[:10]
    assert now["DATE-AVG"] == "2023-03-09"
    assert any("DATE-AVG states a whole day and was left" in note for note in done.notes)
    read_time_frame(now)  # which compares them


@pytest.mark.parametrize(
    ("rebase", "decimals"),
    # Float64 numbers of 7e8 s are 1.2e-7 s apart, those of a day 1.5e-11 s.
    [(False, 7), (True, 11)],
)
def test_a_date_in_whole_seconds_becomes_as_fine_as_what_else_says_it(
    tmp_path: Path, rebase: bool, decimals: int
) -> None:
    t = times(20)
    begin, stop = read_time_frame(header()).instants(t[[0, -1]])
    same = {"DATE__OBS": str(begin.to_iso(0)), "DATE__END": str(stop.to_iso(0)), "DATE__BEG": str(begin.to_iso(3))}
    source, target = event_file(tmp_path / "in.fits", t, **same), tmp_path / "out.fits"
    convert_events(source, target, to_barycentre(), rebase=rebase)
    now = fits.getheader(target, 1)
    for key, start in (("DATE-OBS", "TSTART"), ("DATE-BEG", "TSTART"), ("DATE-END", "TSTOP")):
        assert len(now[key].partition(".")[2]) == decimals
        # astropy reads both from the header alone: FITS Standard 4.0, section 9.2.
        theirs = Time(now["MJDREFI"], now["MJDREFF"], format="mjd", scale="tdb") + TimeDelta(now[start], format="sec")
        apart_s = abs((Time(now[key], format="fits", scale="tdb") - theirs).sec)
        # Half the last digit of either; two float64 of days hold 1e-11 s.
        assert apart_s <= 0.5 * 10.0**-decimals + 0.5 * float(np.spacing(now[start])) + 2e-11


def test_a_date_in_whole_seconds_alone_goes_there_and_back(tmp_path: Path) -> None:
    source, there, back = (tmp_path / name for name in ("in.fits", "there.fits", "back.fits"))
    save(source, events(with_place(header(DATE__OBS="2023-03-08T20:33:21")), times(5)))
    convert_events(source, there, to_barycentre(), rebase=True)
    assert len(fits.getheader(there, 1)["DATE-OBS"]) == len("2023-03-08T20:25:11.654321")
    convert_events(there, back, tscale.chain("TDB@BARYCENTER", "TT@TOPOCENTER", site=SITE, source=STAR), rebase=True)
    text = fits.getheader(back, 1)["DATE-OBS"]
    # Two roundings to a microsecond, each half of one off at the most.
    assert abs((Time(text, scale="tt") - Time("2023-03-08T20:33:21", scale="tt")).sec) < 1.1e-6


def test_offsets_scaling_and_limits_become_part_of_the_times(tmp_path: Path) -> None:
    t = times(20)
    table = events(with_place(header(TIMEZERO=0.25)), t)
    table.header["TDMIN2"], table.header["TLMAX2"] = t[0], 1e10
    source = save(tmp_path / "in.fits", table)
    with fits.open(source, mode="update") as found:
        found[1].header["TSCAL2"], found[1].header["TZERO2"] = 1.0, -0.125
    target = tmp_path / "out.fits"
    done = convert_events(source, target, to_barycentre())
    before, after = read_instants(source), read_instants(target)
    base = read_time_frame(header()).instants(t)
    assert np.max(np.abs(before.minus(base) - 0.125)) < 1e-15
    assert np.max(np.abs(after.minus(to_barycentre()(before)))) < COARSE_S
    now = fits.getheader(target, 1)
    assert (now["TIMEZERO"], now["TSCAL2"], now["TZERO2"]) == (0.0, 1.0, 0.0)
    assert "TDMIN2" not in now
    assert "TLMAX2" not in now
    assert any("TDMIN2 was taken out" in note for note in done.notes)


def test_undefined_times_stay_and_are_counted(tmp_path: Path) -> None:
    t = times(30)
    t[[4, 29]] = np.nan
    source, target = save(tmp_path / "in.fits", events(with_place(header()), t)), tmp_path / "out.fits"
    done = convert_events(source, target, to_barycentre())
    assert done.columns[0].undefined == 2
    assert np.flatnonzero(np.isnan(fits.getdata(target, 1)["TIME"])).tolist() == [4, 29]
    assert "column TIME: rows without a time: 2" in str(fits.getheader(target, 1)["HISTORY"])
    t[7] = np.inf
    save(source, events(with_place(header()), t))
    with pytest.raises(InvalidInput, match=r"HDU 1 \(EVENTS\), column TIME, row 8, a time is infinite"):
        convert_events(source, target, to_barycentre())


def test_several_lists_and_what_is_left_alone(tmp_path: Path) -> None:
    one, two, other = (
        events(with_place(header()), times(n), name) for n, name in ((9, "EVENTS"), (8, "EVENTS"), (7, "HK"))
    )
    two.ver = 2
    for key, value in (("TIMESYS", "UTC"), ("MJDREFI", 59000)):
        other.header[key] = value
    source, target = save(tmp_path / "in.fits", one, two, other), tmp_path / "out.fits"
    with pytest.raises(InvalidInput, match=r"times of HDU 3 \(HK\) are UTC@TOPOCENTER.*begins at TT@TOPOCENTER.*keep="):
        convert_events(source, target, to_barycentre())
    done = convert_events(source, target, to_barycentre(), keep=["hk"])
    assert [(column.extension, column.rows) for column in done.columns] == [
        ("HDU 1 (EVENTS)", 9),
        ("HDU 2 (EVENTS)", 8),
    ]
    assert fits.getheader(target, 3)["TIMESYS"] == "UTC"
    assert str(read_instants(target, ("EVENTS", 2)).node) == "TDB@BARYCENTER"
    with pytest.raises(InvalidInput, match="keep names 'XX'"):
        convert_events(source, target, to_barycentre(), keep=["XX"])
    with pytest.raises(InvalidInput, match="has a column WHEN"):
        convert_events(source, target, to_barycentre(), columns=["WHEN"], keep=["hk"])


def test_what_cannot_be_done_is_refused_before_anything_is_written(tmp_path: Path) -> None:
    target = tmp_path / "out.fits"
    target.write_bytes(b"as it was")
    single = save(tmp_path / "e.fits", events(header(), np.arange(5.0), time_format="1E"))
    good = event_file(tmp_path / "in.fits")
    for source, chain, error, words in (
        (single, to_barycentre(), InvalidInput, "column TIME is 1E.*holds 7 digits.*1D first"),
        (good, to_barycentre("UTC"), InvalidInput, "are TT@TOPOCENTER by its header, and the chain begins at UTC"),
        (good, tscale.chain("TT", "GST"), InvalidInput, "no word for GST"),
        (event_file(tmp_path / "b.fits", DATE__BEG="2020-01-01"), to_barycentre(), DataFileError, "and DATE-BEG"),
        (event_file(tmp_path / "c.fits", np.array([1.0, 2.0]), MJDREFI=10000), to_barycentre(), OutOfSpan, "TSTART"),
        (save(tmp_path / "d.fits", events(header(), np.array([1.0, 9e9]))), to_barycentre(), OutOfSpan, "row 2"),
    ):  # fmt: skip
        with pytest.raises(error, match=words) as caught:
            convert_events(source, target, chain)
        assert caught.value.path == source or "GST" in words
        assert target.read_bytes() == b"as it was"
    assert not list(tmp_path.glob(".*"))


def test_a_file_may_be_replaced_by_itself_and_threads_change_nothing(tmp_path: Path) -> None:
    t = times(70000)
    source, one = save(tmp_path / "in.fits", events(with_place(header()), t[:5])), tmp_path / "one.fits"
    table = fits.BinTableHDU.from_columns(
        [
            fits.Column("TIME", "1D", unit="s", array=t),
            fits.Column("PAD", "151B", array=np.zeros((70000, 151), np.uint8)),
        ],
        header=with_place(header()),
        name="EVENTS",
    )
    save(source, table)
    told: list[tuple[int, int]] = []
    chain = to_barycentre().compile("2023-03-08T20:00:00", "2023-03-08T22:30:00")
    convert_events(source, one, chain, direction=STAR, progress=lambda done, total: told.append((done, total)))
    assert told[-1] == (70000, 70000)
    assert len(told) > 1
    with fits.open(one, checksum=True) as found:  # rows of 159 bytes: blocks that are no whole words but for a rule
        found.verify("exception")
    convert_events(source, source, chain, direction=STAR, threads=2)
    assert source.read_bytes() == one.read_bytes()
    history = "".join(str(line).strip() for line in fits.getheader(one, 1)["HISTORY"])
    assert all(used.sha256 in history for used in chain.certificate.tables)
    assert fits.getheader(one, 1)["PLEPHEM"] == "DE440"


def test_what_is_said_in_place_of_the_header_stands_in_the_result(tmp_path: Path) -> None:
    source = save(tmp_path / "in.fits", events(header(TIMESYS=None, MJDREFI=None, MJDREFF=None), times(9)))
    target = tmp_path / "out.fits"
    cards = {"TIMESYS": "TT", "MJDREFI": 51910, "MJDREFF": 0.25}
    convert_events(source, target, to_barycentre(), cards=cards)
    now = fits.getheader(target, 1)
    assert (now["TIMESYS"], now["MJDREFI"], now["MJDREFF"]) == ("TDB", 51910, 0.25)
    want = to_barycentre()(read_instants(source, cards=cards))
    assert np.max(np.abs(read_instants(target).minus(want))) < COARSE_S


def test_utc_goes_in_and_columns_have_frames(tmp_path: Path) -> None:
    t = np.sort(times(9) - 7.0e8 + 86000.0)
    found = with_place(header(TIMESYS="UTC", MJDREFI=57753, MJDREFF=0.0))  # across the leap second of 2016
    table = events(found, t)
    table.header["TCTYP2"], table.header["TRPOS2"], table.header["TRDIR2"] = "UTC", "TOPOCENTER", "RA_NOM,DEC_NOM"
    source, target = save(tmp_path / "in.fits", table), tmp_path / "out.fits"
    chain = to_barycentre("UTC")
    with pytest.raises(InvalidInput, match="read in two ways"):
        convert_events(source, target, chain)
    convert_events(source, target, chain, utc="elapsed")
    now = fits.getheader(target, 1)
    assert [now[key] for key in ("TCTYP2", "TRPOS2", "TRDIR2")] == ["TDB", "BARYCENTER", "RA_NOM,DEC_NOM"]
    want = chain(read_instants(source, utc="elapsed"))
    # Within a day of the reference: 1.5e-11 s.
    assert np.max(np.abs(read_instants(target).minus(want))) < FINE_S


@settings(max_examples=20)
@given(st.lists(st.floats(0, 8e8), min_size=1, max_size=6), st.sampled_from(["TAI", "TT", "TCG", "GPS"]))
def test_scales_of_the_earth_round_trip(
    tmp_path_factory: pytest.TempPathFactory, values: list[float], scale: str
) -> None:
    folder = tmp_path_factory.getbasetemp()
    source, there, back = (folder / name for name in ("s.fits", "t.fits", "b.fits"))
    save(source, events(header(), np.array(values)), checksum=False)
    convert_events(source, there, tscale.chain("TT", scale))
    convert_events(there, back, tscale.chain(scale, "TT"))
    # Each way rounds once to a float64 of up to 8e8 s.
    apart = np.abs(read_instants(back).minus(read_instants(source)))
    assert np.max(apart) <= 2 * np.spacing(8e8) / 2


def test_an_image_with_an_axis_of_time_is_left(tmp_path: Path) -> None:
    image = fits.ImageHDU(np.zeros((4, 4)), header=header(CTYPE1="TIME", TSTART=1.0), name="LIGHT")
    source, target = save(tmp_path / "in.fits", events(header(), times(3)), image), tmp_path / "out.fits"
    done = convert_events(source, target, to_barycentre())
    assert "HDU 2 (LIGHT)" not in done.headers
    assert fits.getheader(target, 2)["TIMESYS"] == "TT"
    assert any("HDU 2 (LIGHT)" in note for note in done.notes)


def test_good_time_alone_follows(tmp_path: Path) -> None:
    source = save(tmp_path / "in.fits", events(header(), times(3)), good_time(header(), [7.0e8], [7.1e8], "STDGTI01"))
    done = convert_events(source, tmp_path / "out.fits", to_barycentre())
    assert [column.column for column in done.columns] == ["TIME", "START", "STOP"]


def test_an_orbit_takes_the_place_of_a_site(tmp_path: Path) -> None:
    epoch = tscale.Instants.from_iso("2023-03-08T12:00:00", scale="TT")
    orbit = tscale.Trajectory.from_kepler(
        epoch, a_m=7.0e6, e=0.001, i_deg=51.6, node_deg=20, periapsis_deg=0, mean_anomaly_deg=0, center="earth"
    )
    chain = tscale.chain("TT@TOPOCENTER", "TDB@BARYCENTER", site=orbit, source=STAR)
    source, target = event_file(tmp_path / "in.fits"), tmp_path / "out.fits"
    convert_events(source, target, chain, rebase=True)
    want = chain(read_instants(source))
    assert np.max(np.abs(read_instants(target).minus(want))) < FINE_S
    # Two places some 10^4 km apart: tens of ms.
    assert np.max(np.abs(want.minus(to_barycentre()(read_instants(source))))) > 1e-3


def test_cards_said_apart_are_for_tables_with_times(tmp_path: Path) -> None:
    image = fits.ImageHDU(np.zeros((4, 4)), name="SKY")
    source = save(tmp_path / "in.fits", events(header(TREFPOS=None), times(3)), image)
    target = tmp_path / "out.fits"
    convert_events(source, target, tscale.chain("TT@GEOCENTER", "TAI"), cards={"TREFPOS": "GEOCENTER"})
    assert fits.getheader(target, 1)["TREFPOS"] == "GEOCENTER"
    before, after = ([hdu.cards.images for hdu in read_layout(path)] for path in (source, target))
    assert before[::2] == after[::2]


def test_what_is_past_the_leap_seconds_is_said_once(tmp_path: Path) -> None:
    t = np.linspace(0.0, 80000.0, 300_000)
    found = header(TIMESYS="UTC", MJDREFI=62000, MJDREFF=0.0)
    table = fits.BinTableHDU.from_columns([fits.Column("TIME", "1D", unit="s", array=t)], header=found, name="EVENTS")
    source = save(tmp_path / "in.fits", table)
    for threads in (1, 2):
        # Also the one that names the day is told of.
        with pytest.warns(tscale.ExtrapolationWarning, match="300001 of 300001 UTC labels are past") as caught:
            convert_events(source, tmp_path / "out.fits", tscale.chain("UTC", "TAI"), rebase=True, threads=threads)
        assert len(caught) == 1


def test_times_beyond_all_reach_are_refused(tmp_path: Path) -> None:
    source = save(tmp_path / "in.fits", events(header(), np.array([1.0, 1e300])))
    with pytest.raises(InvalidInput, match=r"row 2, 1 of 2 times are beyond 2\*\*61 s"):
        convert_events(source, tmp_path / "out.fits", tscale.chain("TT", "TAI"))


def test_astropy_finds_the_same_barycentre(tmp_path: Path) -> None:
    source, target = event_file(tmp_path / "in.fits", times(20)), tmp_path / "out.fits"
    convert_events(source, target, to_barycentre(), rebase=True)
    place = EarthLocation.from_geocentric(*SITE.position_m, unit="m")
    arrival = Time(tscale.interop.to_astropy(read_instants(source)), location=place)
    star = SkyCoord(STAR.ra_deg, STAR.dec_deg, unit="deg")
    theirs = arrival.tdb + arrival.light_travel_time(
        star, "barycentric", ephemeris=str(tscale.Ephemeris.default().path)
    )
    ours = read_instants(target).at(None)
    # Left out there: the Shapiro delay of the Sun, 6 us this far from it. The light time is 400 s here.
    assert np.max(np.abs(ours.minus(tscale.interop.from_astropy(theirs)))) < 1e-5


def test_damaged_headers_end_in_words(tmp_path_factory: pytest.TempPathFactory) -> None:
    folder = tmp_path_factory.getbasetemp()
    whole = event_file(folder / "whole.fits", times(12))
    content = whole.read_bytes()
    cards = [at for hdu in read_layout(whole) for at in range(hdu.start, hdu.data) if content[at] != 32]

    @given(st.lists(st.tuples(st.sampled_from(cards), st.sampled_from(b"0179 .-+'=/AETDa\x00\xff")), max_size=3))
    def check(changes: list[tuple[int, int]]) -> None:
        data = bytearray(content)
        for at, byte in changes:
            data[at] = byte
        (folder / "hurt.fits").write_bytes(data)
        # Nothing but the errors of this package, whatever the bytes.
        with contextlib.suppress(tscale.TscaleError):
            convert_events(folder / "hurt.fits", folder / "out.fits", tscale.chain("TT", "TAI"))

    check()
