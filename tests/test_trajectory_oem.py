"""CCSDS orbit ephemeris messages, both forms."""

from pathlib import Path

import erfa
import numpy as np
import pytest

from tscale import Instants, Trajectory
from tscale.ephemeris.shipped import shipped_path
from tscale.errors import DataFileError, InvalidInput, OutOfSpan

EPOCH = Instants.from_iso("2021-05-04T00:00:00", "UTC")
ORBIT = Trajectory.from_kepler(EPOCH, 6.9e6, 0.01, 97.0, 20.0, 30.0, 40.0)
# TT count of UTC 2021-05-04T00:00:00: 37 + 32.184 s ahead of the label.
TT = (EPOCH.whole + 64, EPOCH.fraction + 0.184)


def states(first, n, step_s=60):
    seconds = first + step_s * np.arange(n)
    r, v = ORBIT.gcrs((TT[0] + seconds, np.broadcast_to(TT[1], n)), None)
    return seconds, r / 1e3, v / 1e3


def label(seconds, offset_s=0.0):
    moment = np.datetime64("2021-05-04T00:00:00", "us") + np.timedelta64(round((seconds + offset_s) * 1e6), "us")
    return str(moment)


def metadata(first, last, offset_s=0.0, **change):
    facts = {
        "OBJECT_NAME": "TERN-2",
        "OBJECT_ID": "2031-042A",
        "CENTER_NAME": "EARTH",
        "REF_FRAME": "ICRF",
        "TIME_SYSTEM": "UTC",
        "START_TIME": label(first, offset_s),
        "STOP_TIME": label(last, offset_s),
    } | change
    return {key: value for key, value in facts.items() if value is not None}


def kvn(*segments, version="2.0"):
    lines = [
        f"CCSDS_OEM_VERS = {version}",
        "COMMENT a made-up satellite",
        "CREATION_DATE = 2021-05-05T00:00:00",
        "ORIGINATOR = TERN",
        "",
    ]
    for facts, (seconds, r, v), offset_s in segments:
        lines.append("META_START")
        lines += [f"{key} = {value}" for key, value in facts.items()]
        lines += ["META_STOP", "COMMENT states follow"]
        for s, p, q in zip(seconds, r, v, strict=True):
            lines.append(" ".join([label(s, offset_s), *(repr(float(x)) for x in (*p, *q))]))
    return "\n".join(lines) + "\n"


def one(n=10, first=0, offset_s=0.0, **change):
    last = first + 60 * (n - 1)
    return metadata(first, last, offset_s, **change), states(first, n), offset_s


def written(tmp_path, text, name="tern.oem"):
    path = tmp_path / name
    path.write_text(text, encoding="utf-8")
    return path


def query(*seconds):
    return TT[0] + np.array(seconds), np.broadcast_to(TT[1], len(seconds)).copy()


def assert_is_the_orbit(trajectory, at, reference):
    r, v = trajectory.gcrs(at, reference)
    expected_r, expected_v = ORBIT.gcrs(at, reference)
    # Texts hold 17 digits; degree 7 on 60 s leaves 1e-6 m in a low orbit.
    np.testing.assert_allclose(r, expected_r, rtol=0, atol=1e-6)
    np.testing.assert_allclose(v, expected_v, rtol=0, atol=1e-7)


def test_kvn(tmp_path, reference):
    path = written(tmp_path, kvn(one()))
    trajectory = Trajectory.from_oem(path)
    assert trajectory.name == "TERN-2"
    assert trajectory.geocentric
    assert trajectory.path == path
    assert_is_the_orbit(trajectory, query(0, 31, 307, 540), reference)


@pytest.mark.parametrize(("system", "offset_s"), [("UTC", 0.0), ("TAI", 37.0), ("TT", 69.184), ("GPS", 18.0)])
def test_time_systems(tmp_path, reference, system, offset_s):
    # 2021: TAI - UTC = 37 s, TT - TAI = 32.184 s, TAI - GPS = 19 s.
    path = written(tmp_path, kvn(one(offset_s=offset_s, TIME_SYSTEM=system)))
    assert_is_the_orbit(Trajectory.from_oem(path), query(0, 31, 307, 540), reference)


def test_dates_by_day_of_year_and_with_z(tmp_path, reference):
    text = kvn(one()).replace("2021-05-04T", "2021-124T").replace(":00.000000", ":00Z")
    assert_is_the_orbit(Trajectory.from_oem(written(tmp_path, text)), query(0, 31, 540), reference)
    text = kvn(one(offset_s=37.0, TIME_SYSTEM="TAI")).replace(".000000", "Z")
    assert_is_the_orbit(Trajectory.from_oem(written(tmp_path, text)), query(0, 31, 540), reference)


def test_xml_is_the_same(tmp_path, reference):
    facts, (seconds, r, v), _ = one(INTERPOLATION="HERMITE", INTERPOLATION_DEGREE="7")
    vectors = ""
    for s, p, q in zip(seconds, r, v, strict=True):
        parts = "".join(
            f'<{key} units="{unit}">{float(x)!r}</{key}>'
            for key, unit, x in zip(
                ("X", "Y", "Z", "X_DOT", "Y_DOT", "Z_DOT"), ["km"] * 3 + ["km/s"] * 3, (*p, *q), strict=True
            )
        )
        vectors += f"<stateVector><EPOCH>{label(s)}</EPOCH>{parts}</stateVector>\n"
    inside = "".join(f"<{key}>{value}</{key}>\n" for key, value in facts.items())
    text = (
        '<?xml version="1.0" encoding="UTF-8"?>\n<oem id="CCSDS_OEM_VERS" version="2.0">\n'
        "<header><CREATION_DATE>2021-05-05T00:00:00</CREATION_DATE><ORIGINATOR>TERN</ORIGINATOR></header>\n"
        f"<body><segment>\n<metadata><COMMENT>made up</COMMENT>\n{inside}</metadata>\n<data>\n{vectors}"
        "<covarianceMatrix><EPOCH>2021-05-04T00:00:00</EPOCH><CX_X>1</CX_X></covarianceMatrix>\n"
        "</data></segment></body></oem>\n"
    )
    trajectory = Trajectory.from_oem(written(tmp_path, text, "tern.xml"))
    at = query(0, 31, 307, 540)
    assert_is_the_orbit(trajectory, at, reference)
    same = Trajectory.from_oem(written(tmp_path, kvn(one())))
    np.testing.assert_array_equal(trajectory.gcrs(at, reference)[0], same.gcrs(at, reference)[0])
    for old, new, words in (
        ('units="km">', 'units="m">', "allowed is 'km'"),
        ("<Z_DOT", "<W_DOT", "not well-formed"),
        ("</body></oem>", "", "not well-formed"),
        ("<oem ", "<opm ", "not well-formed"),
        ('version="2.0"', "", "version"),
        ("<REF_FRAME>ICRF</REF_FRAME>", "", "no REF_FRAME"),
        ("<segment>", "<segment><segment>", "not well-formed"),
    ):
        with pytest.raises(DataFileError, match=words):
            Trajectory.from_oem(written(tmp_path, text.replace(old, new, 1), "bad.xml"))
    no_oem = text.replace("<oem ", "<other ").replace("</oem>", "</other>")
    with pytest.raises(DataFileError, match="no <oem>"):
        Trajectory.from_oem(written(tmp_path, no_oem, "bad.xml"))
    # Known to Python as no encoding at all, as one of several bytes, as none of texts.
    for name in ("KLINGON-8", "utf-7", "base64", "shift_jis"):
        with pytest.raises(DataFileError, match="XML"):
            Trajectory.from_oem(written(tmp_path, text.replace("UTF-8", name, 1), "bad.xml"))
    twice = text.replace("<X units", '<X units="km">1.0</X><X units', 1)
    with pytest.raises(DataFileError, match="X is given twice in one state vector") as caught:
        Trajectory.from_oem(written(tmp_path, twice, "bad.xml"))
    assert caught.value.row == text[: text.index("<stateVector>")].count("\n") + 1
    dropped = text.replace("<Y units", "<W units", 1).replace("</Y>", "</W>", 1)
    with pytest.raises(DataFileError, match="without Y") as caught:
        Trajectory.from_oem(written(tmp_path, dropped, "bad.xml"))
    assert caught.value.row == text[: text.index("<stateVector>")].count("\n") + 1


def test_interpolation_of_the_message_is_honoured(tmp_path, reference):
    at = query(31, 307)
    expected = ORBIT.gcrs(at, None)[0]
    errors = {}
    for method, degree in (("HERMITE", 3), ("HERMITE", 7), ("LAGRANGE", 5), ("LAGRANGE", 9)):
        path = written(tmp_path, kvn(one(INTERPOLATION=method, INTERPOLATION_DEGREE=str(degree))))
        errors[method, degree] = np.abs(Trajectory.from_oem(path).gcrs(at, reference)[0] - expected).max()
    # Cubic: 0.36 m at mid-interval (h^4 f''''/384); Lagrange of degree 5: (h w)^6 a / 6! x 3.5 = 3 cm or less.
    assert 0.1 < errors["HERMITE", 3] < 0.5
    assert errors["HERMITE", 7] < 1e-6
    assert 1e-3 < errors["LAGRANGE", 5] < 0.05
    assert errors["LAGRANGE", 9] < 1e-4
    path = written(tmp_path, kvn(one(INTERPOLATION="HERMITE", INTERPOLATION_DEGREE="3")))
    assert np.abs(Trajectory.from_oem(path, degree=7).gcrs(at, reference)[0] - expected).max() < 1e-6


def test_segments_and_usable_times(tmp_path, reference):
    usable = {"USEABLE_START_TIME": label(60), "USEABLE_STOP_TIME": label(480)}
    text = kvn(one(**usable), one(first=480, USEABLE_STOP_TIME=label(900)), one(first=3600))
    trajectory = Trajectory.from_oem(written(tmp_path, text))
    assert len(trajectory.pieces) == 3
    assert_is_the_orbit(trajectory, query(60, 479, 480, 481, 900, 3600, 4140), reference)
    with pytest.raises(OutOfSpan, match=r"which covers .*, .*") as caught:
        trajectory.gcrs(query(59, 60, 901, 3599, 4141), reference)
    assert caught.value.mask.tolist() == [True, False, True, True, True]


def test_states_shorter_than_the_span_are_not_extrapolated(tmp_path, reference):
    path = written(tmp_path, kvn(one(START_TIME=label(-600), STOP_TIME=label(6000))))
    trajectory = Trajectory.from_oem(path)
    trajectory.gcrs(query(0, 540), reference)
    with pytest.raises(OutOfSpan):
        trajectory.gcrs(query(-1), reference)


def test_covariances_accelerations_and_blank_lines(tmp_path, reference):
    lines = kvn(one()).splitlines()
    lines[-1] += " 1e-3 1e-3 1e-3"
    lines += ["", "COVARIANCE_START", f"EPOCH = {label(0)}", "1.0", "0.1 1.0", "COVARIANCE_STOP"]
    trajectory = Trajectory.from_oem(written(tmp_path, "\r\n".join(lines)))
    assert_is_the_orbit(trajectory, query(0, 540), reference)


def test_itrf_states(tmp_path, reference):
    fixed = np.array([5000.0, 3000.0, 2500.0])
    seconds = 60 * np.arange(10)
    rows = (seconds, np.tile(fixed, (10, 1)), np.zeros((10, 3)))
    path = written(tmp_path, kvn((metadata(0, 540, REF_FRAME="ITRF-97"), rows, 0.0)))
    static = Trajectory.from_states(Instants.from_seconds(*query(*seconds), scale="TT"), rows[1] * 1e3, rows[2], "ITRS")
    at = query(31, 500)
    np.testing.assert_allclose(
        Trajectory.from_oem(path).gcrs(at, reference)[0], static.gcrs(at, reference)[0], rtol=0, atol=1e-8
    )


def test_mean_equator_of_j2000(tmp_path, reference):
    path = written(tmp_path, kvn(one(REF_FRAME="EME2000")))
    at = query(0, 540)
    as_icrf = Trajectory.from_oem(path).gcrs(at, reference)[0]
    rotated = Trajectory.from_oem(path, eme2000="mean_equator").gcrs(at, reference)[0]
    # ERFA bp00: its first matrix takes GCRS to the mean equator and equinox of J2000.0.
    bias = erfa.bp00(2451545.0, 0.0)[0]
    # 1e-5 m: its constants are rounded to 0.1 uas in another form (3e-6 m).
    np.testing.assert_allclose(as_icrf, rotated @ bias.T, rtol=0, atol=1e-5)
    assert 0.1 < np.abs(as_icrf - rotated).max() < 1.0
    with pytest.raises(InvalidInput, match="mean_equator"):
        Trajectory.from_oem(path, eme2000="fk5")


def test_another_centre(tmp_path, reference):
    seconds, r, v = states(0, 10)
    for system, offset_s in (("TDB", 69.184), ("UTC", 0.0)):
        facts = metadata(0, 540, offset_s, CENTER_NAME="MARS", REF_FRAME="EME2000", TIME_SYSTEM=system)
        trajectory = Trajectory.from_oem(written(tmp_path, kvn((facts, (seconds, r, v), offset_s))))
        assert not trajectory.geocentric
        tdb = (TT[0] + seconds[2:4], np.broadcast_to(TT[1], 2).copy())
        x, rate = trajectory.state_bcrs(tdb, reference)
        mars, mars_rate = reference.ephemeris.state("mars", tdb)
        # TDB - TT is below 1.7 ms: 13 m at 7.6 km/s when the dates are UTC, nothing when they are TDB.
        atol = 1e-3 if system == "TDB" else 15.0
        np.testing.assert_allclose(x - mars, r[2:4] * 1e3, rtol=0, atol=atol)
        if system == "UTC":
            late = reference.time_ephemeris.tt_minus_tdb_s(tdb)[:, None]
            np.testing.assert_allclose(x - mars, r[2:4] * 1e3 + late * (rate - mars_rate), rtol=0, atol=1e-3)


@pytest.mark.parametrize(
    ("old", "new", "words", "row"),
    [
        ("CCSDS_OEM_VERS = 2.0", "CCSDS_OEM_VERS = 9.0", "1.0, 2.0, 3.0", 1),
        ("CCSDS_OEM_VERS = 2.0", "CCSDS_OPM_VERS = 2.0", "starts with CCSDS_OEM_VERS", 1),
        ("ORIGINATOR = TERN", "WEATHER = FINE", "does not belong", 4),
        ("OBJECT_NAME = TERN-2", "OBJECT_NAME =", "has no value", 7),
        ("OBJECT_NAME = TERN-2", "OBJECT_NAME = A\nOBJECT_NAME = B", "given twice", 8),
        ("OBJECT_ID", "OBJECT_COLOUR", "unknown keyword OBJECT_COLOUR", 8),
        ("CENTER_NAME = EARTH", "CENTER_NAME = VULCAN", "VULCAN", 9),
        ("REF_FRAME = ICRF", "REF_FRAME = TEME", "ICRF, GCRF, EME2000 and ITRF", 10),
        ("REF_FRAME = ICRF\n", "", "no REF_FRAME", 6),
        ("TIME_SYSTEM = UTC", "TIME_SYSTEM = MET", "UTC, TAI, TT", 11),
        ("TIME_SYSTEM = UTC", "TIME_SYSTEM = UT1", "UTC, TAI, TT", 11),
        ("CENTER_NAME = EARTH\nREF_FRAME = ICRF", "CENTER_NAME = MARS\nREF_FRAME = GCRF", "EARTH only", 10),
        ("REF_FRAME = ICRF\nTIME_SYSTEM = UTC", "REF_FRAME = ITRF2000\nTIME_SYSTEM = TDB", "got TDB", 11),
        ("START_TIME = 2021-05-04", "START_TIME = 2021-05-34", "2021-05-34", 12),
        ("STOP_TIME = 2021-05-04", "STOP_TIME = 2021-05-03", "no state lies within", 12),
        ("META_STOP", "INTERPOLATION = PROPAGATE\nMETA_STOP", "HERMITE, LAGRANGE", 14),
        ("META_STOP", "INTERPOLATION_DEGREE = seven\nMETA_STOP", "whole number", 14),
        ("META_STOP", f"INTERPOLATION_DEGREE = {'7' * 5000}\nMETA_STOP", "has 5000 digits", 14),
        ("META_STOP", "INTERPOLATION_DEGREE = 25\nMETA_STOP", "needs 13 states, got 10", 17),
        ("2021-05-04T00:02:00.000000 ", "2021-05-04T00:02:00.000000 1.0 ", "7 numbers|got 7", 18),
        ("2021-05-04T00:02:00.000000 ", "2021-05-04T00:02:00.000000 x", "not a number", 18),
        ("2021-05-04T00:02:00.000000", "2021-05-04T00:01:00.000000", "must increase", 18),
        ("2021-05-04T00:02:00.000000", "2021-05-04T24:02:00.000000", "line 18", 18),
        ("META_START", "META_BEGIN", "does not belong", 6),
        ("META_STOP", "", "unknown keyword|does not belong", None),
    ],
)
def test_bad_files_name_the_line(tmp_path, old, new, words, row):
    text = kvn(one())
    assert old in text
    path = written(tmp_path, text.replace(old, new, 1))
    with pytest.raises(DataFileError, match=words) as caught:
        Trajectory.from_oem(path)
    assert caught.value.path == path
    if row is not None:
        assert caught.value.row == row


def test_files_that_are_cut_off_or_empty(tmp_path):
    text = kvn(one())
    for cut, words in (
        ("", "starts with|no segment"),
        (text[: text.index("META_START")], "no segment"),
        (text[: text.index("META_STOP")], "cut off"),
        (text[: text.index("COMMENT states")], "no states"),
        ("<", "not well-formed"),
    ):
        with pytest.raises(DataFileError, match=words):
            Trajectory.from_oem(written(tmp_path, cut))
    with pytest.raises(DataFileError, match="cannot read"):
        Trajectory.from_oem(tmp_path / "none.oem")
    (tmp_path / "binary.oem").write_bytes(b"\xff\xfe\x00\x01")
    with pytest.raises(DataFileError, match="cannot read"):
        Trajectory.from_oem(tmp_path / "binary.oem")


@pytest.mark.parametrize("path", [None, 3, b"tern.oem", "", "a\0b"])
def test_no_path(path):
    with pytest.raises(InvalidInput, match="opened by its path"):
        Trajectory.from_oem(path)
    with pytest.raises(InvalidInput, match="opened by its path"):
        Trajectory.from_spk(path, 301)


def test_bad_arguments(tmp_path):
    path = written(tmp_path, kvn(one()))
    with pytest.raises(InvalidInput, match="must be LeapSeconds, got 'x'"):
        Trajectory.from_oem(path, leap_seconds="x")
    with pytest.raises(InvalidInput, match="degree must be an integer of 1 to 27, got 'x'"):
        Trajectory.from_oem(path, degree="x")
    with pytest.raises(InvalidInput, match="unknown body"):
        Trajectory.from_spk(Path(shipped_path("de440_1960_2060.bsp")), "wren")


def test_velocities_in_m_s_are_found(tmp_path):
    facts, (seconds, r, v), _ = one()
    with pytest.raises(DataFileError, match=r"line 16.*not of one motion") as caught:
        Trajectory.from_oem(written(tmp_path, kvn((facts, (seconds, r, v * 1e3), 0.0))))
    assert caught.value.row == 16


def test_segments_that_do_not_go_together(tmp_path):
    with pytest.raises(DataFileError, match="several objects"):
        Trajectory.from_oem(written(tmp_path, kvn(one(), one(first=600, OBJECT_NAME="TERN-3"))))
    with pytest.raises(DataFileError, match="starts before"):
        Trajectory.from_oem(written(tmp_path, kvn(one(), one(first=300))))
    with pytest.raises(DataFileError, match="mix orbits"):
        Trajectory.from_oem(written(tmp_path, kvn(one(), one(first=600, CENTER_NAME="MOON"))))
