"""Earth orientation: published rows, astropy's reader, exact polynomials, and damaged files."""

from __future__ import annotations

import pickle
from pathlib import Path
from typing import Any

import astropy.units as u
import numpy as np
import pytest
from astropy.time import Time
from astropy.utils import iers
from astropy_iers_data import IERS_A_FILE, IERS_B_FILE
from hypothesis import given
from hypothesis import strategies as st

from tscale import exact
from tscale.errors import DataFileError, ExtrapolationWarning, InvalidInput, OutOfSpan
from tscale.exact import Pair
from tscale.formats.leap_seconds import LeapSeconds
from tscale.instants import Instants
from tscale.tables import EarthOrientation
from tscale.tables.iers_files import parse_c04, parse_earth_orientation, parse_finals
from tscale.transforms.terrestrial import tai_to_ut1, ut1_to_tai

ARCSEC = np.pi / 648000
LEAP = LeapSeconds.default()


@pytest.fixture(scope="module")
def table() -> EarthOrientation:
    return EarthOrientation.default()


@pytest.fixture(scope="module")
def finals() -> Any:
    return parse_finals(Path(IERS_A_FILE).read_bytes(), Path(IERS_A_FILE))


@pytest.fixture(scope="module")
def c04() -> Any:
    return parse_c04(Path(IERS_B_FILE).read_bytes(), Path(IERS_B_FILE))


def tai_of(mjd: Any, second: Any = 0, fraction: Any = 0.0) -> Pair:
    whole, rest = LEAP.count_from_label(mjd, second, fraction)
    return whole + 32, rest


# ---- the files -------------------------------------------------------------------------------------


# Rows printed in finals2000A.all, Bulletin A columns, and in eopc04.1962-now (IERS), as text: read exactly.
@pytest.mark.parametrize(
    ("mjd", "x", "y", "ut1"),
    [
        (41684, 0.120733, 0.136966, 0.8084178),
        (53750, 0.049144, 0.380196, 0.3340894),
        (54195, 0.033178, 0.483095, -0.0714227),
    ],
)
def test_finals_rows_are_the_published_ones(finals: Any, mjd: int, x: float, y: float, ut1: float) -> None:
    row = int(np.flatnonzero(finals.mjd == mjd)[0])
    assert finals.values[row, :3].tolist() == [ut1, x, y]
    assert not finals.predicted[row]


@pytest.mark.parametrize(
    ("mjd", "ut1"),
    [
        (37665, 0.0326338),
        (53750, 0.3341036),
        (53751, 0.3341111),
        (54195, -0.0714242),
        (57753, -0.4077697),
        (57754, 0.5912870),
    ],
)
def test_c04_rows_are_the_published_ones(c04: Any, mjd: int, ut1: float) -> None:
    assert c04.values[c04.mjd == mjd, 0].tolist() == [ut1]


def test_first_c04_row_is_read_whole(c04: Any) -> None:
    assert c04.values[0].tolist() == [0.0326338, -0.012700, 0.213000, 0.0, 0.0]
    # dX Er 0.004774 and dY Er 0.002000 arcsec are kept in mas.
    assert c04.sigmas[0].tolist() == [0.0020000, 0.030000, 0.030000, 4.774, 2.0]


def test_every_number_is_the_float_nearest_to_its_text(finals: Any, c04: Any) -> None:
    lines = Path(IERS_A_FILE).read_bytes().splitlines()[: len(finals.mjd)]
    known = sum(bool(line[97:106].strip()) for line in lines)  # rows with celestial pole offsets
    # ReadMe.finals2000A: UT1-UTC, PM-x, PM-y (s and arcsec), dX, dY (mas), each followed by its error.
    for column, first, middle, last in [(0, 58, 68, 78), (1, 18, 27, 36), (2, 37, 46, 55)]:
        assert finals.values[:, column].tolist() == [float(line[first:middle]) for line in lines]
        assert finals.sigmas[:, column].tolist() == [float(line[middle:last]) for line in lines]
    for column, first, middle, last in [(3, 97, 106, 115), (4, 116, 125, 134)]:
        assert finals.values[:known, column].tolist() == [float(line[first:middle]) for line in lines[:known]]
        assert finals.sigmas[:known, column].tolist() == [float(line[middle:last]) for line in lines[:known]]
    # The head of the C04 file: UT1-UTC, x, y, dX, dY are the cells 7, 5, 6, 8, 9 of a row, their errors 15, 13, 14, 16,
    # 17; the offsets are in arcseconds there.
    text = [line.split() for line in Path(IERS_B_FILE).read_text().splitlines() if not line.startswith("#")]
    for column, value, sigma, unit in [(0, 7, 15, 1), (1, 5, 13, 1), (2, 6, 14, 1), (3, 8, 16, 1000), (4, 9, 17, 1000)]:
        assert c04.values[:, column].tolist() == [float(cells[value]) * unit for cells in text]
        assert c04.sigmas[:, column].tolist() == [float(cells[sigma]) * unit for cells in text]
        assert len(set(c04.sigmas[:, column].tolist())) > 20  # none of them a constant


def test_no_day_is_lost_between_the_two_files(table: EarthOrientation, c04: Any, finals: Any) -> None:
    assert (np.diff(table.mjd) == 1).all()
    assert (table.mjd[0], table.mjd[-1]) == (c04.mjd[0], finals.mjd[-1])
    # The first day after C04 is the finals file's own row.
    first = c04.mjd[-1] + 1
    value = table.at(tai_of(first))
    row = finals.values[finals.mjd == first][0]
    assert float(value.x_rad) == pytest.approx(row[1] * ARCSEC, rel=1e-14, abs=0)
    assert float(value.y_rad) == pytest.approx(row[2] * ARCSEC, rel=1e-14, abs=0)


def test_flags_and_blanks_of_the_finals_file(finals: Any) -> None:
    lines = Path(IERS_A_FILE).read_bytes().splitlines()
    assert finals.predicted.sum() == sum(b"P" in (line[16:17] + line[57:58]) for line in lines)
    assert len(finals.mjd) == sum(bool(line[58:68].strip()) for line in lines)
    # Celestial pole offsets end before UT1: zero from there, with their rms as uncertainty.
    last = sum(bool(line[97:106].strip()) for line in lines)
    assert 0 < last < len(finals.mjd)
    assert not finals.values[last:, 3:].any()
    assert (finals.sigmas[last:, 3:] == 0.25).all()


def cut(path: str, rows: slice) -> list[bytes]:
    return [line for line in Path(path).read_bytes().splitlines() if not line.startswith(b"#")][rows]


def head(path: str) -> list[bytes]:
    return [line for line in Path(path).read_bytes().splitlines() if line.startswith(b"#")]


@pytest.mark.parametrize("source", [IERS_A_FILE, IERS_B_FILE])
def test_line_ends_and_trailing_blanks_do_not_matter(tmp_path: Path, source: str) -> None:
    lines = cut(source, slice(1000, 1020))
    plain, windows = tmp_path / "plain", tmp_path / "windows"
    plain.write_bytes(b"\n".join([*head(source), *lines]) + b"\n")
    windows.write_bytes(b"\r\n".join(line.rstrip() for line in [b"# note", *head(source), *lines]))
    a, b = EarthOrientation.load(plain), EarthOrientation.load(windows)
    where = (a._nodes.tai[0][3:9] + 1234, np.full(6, 0.5))
    assert [x.tolist() for x in a.at(where)] == [x.tolist() for x in b.at(where)]
    assert a.sha256 != b.sha256


def damaged(lines: list[bytes], how: str, finals: bool) -> list[bytes]:
    ut1 = slice(58, 68) if finals else slice(50, 62)
    mjd = slice(7, 15) if finals else slice(16, 26)

    def put(row: int, where: slice, text: bytes) -> None:
        lines[row] = lines[row][: where.start] + text.rjust(where.stop - where.start) + lines[row][where.stop :]

    match how:
        case "letters":
            put(7, ut1, b"0.12x4567")
        case "space inside":
            put(7, ut1, b"0.12 4567")
        case "point moved":
            put(7, ut1, b"01.234567")
        case "blank inside":
            put(7, ut1, b"")
        case "nan":
            put(7, ut1, b"nan")
        case "sign inside":
            put(7, ut1, b"0-.1234567")
        case "not 0h":
            put(7, mjd, lines[7][mjd].strip()[:5] + b".50")
        case "row missing":
            del lines[7]
        case "row doubled":
            lines.insert(7, lines[6])
        case "cut short":
            lines[7] = lines[7][:40]
        case "digit wrong":
            put(7, ut1, b"4" + lines[7][ut1].strip()[-9:].split(b".")[-1].rjust(9, b"."))
        case "pole wrong":
            put(7, slice(18, 27) if finals else slice(26, 38), b"0.923456")
        case "offset wrong":
            put(7, slice(97, 106) if finals else slice(62, 74), b"63.190" if finals else b"0.063190")
        case "one offset lost":
            put(7, slice(97, 106) if finals else slice(62, 74), b"")
        case "last row cut":
            del lines[8:]
            lines[7] = lines[7][: 64 if finals else 150]
        case "last row cut between columns":
            del lines[8:]
            lines[7] = lines[7][: 106 if finals else 146]
    return lines


HOW = ["letters", "space inside", "point moved", "blank inside", "nan", "sign inside", "not 0h", "row missing"]
HOW += ["row doubled", "cut short", "digit wrong", "pole wrong", "offset wrong", "one offset lost", "last row cut"]
HOW += ["last row cut between columns"]


@pytest.mark.parametrize("source", [IERS_A_FILE, IERS_B_FILE])
@pytest.mark.parametrize("how", HOW)
def test_damaged_rows_are_named(tmp_path: Path, source: str, how: str) -> None:
    path = tmp_path / "eop.txt"
    rows = damaged(cut(source, slice(1000, 1020)), how, source == IERS_A_FILE)
    path.write_bytes(b"\n".join([*head(source), *rows]))
    number = 8 + len(head(source))
    with pytest.raises(DataFileError, match=f"line {number}") as caught:
        EarthOrientation.load(path)
    assert caught.value.row == number
    assert caught.value.path == path


def test_a_flag_that_is_neither_is_named(tmp_path: Path) -> None:
    lines = cut(IERS_A_FILE, slice(1000, 1010))
    lines[3] = lines[3][:57] + b"Q" + lines[3][58:]
    path = tmp_path / "eop.txt"
    path.write_bytes(b"\n".join(lines))
    with pytest.raises(DataFileError, match="UT1 flag"):
        EarthOrientation.load(path)


@pytest.mark.parametrize("content", [b"", b"  \n \n", b"# only a note\n", b"one,two\n1,2\n", b"\x00" * 500])
def test_files_of_another_kind_are_refused(tmp_path: Path, content: bytes) -> None:
    path = tmp_path / "eop.txt"
    path.write_bytes(content)
    with pytest.raises(DataFileError) as caught:
        EarthOrientation.load(path)
    assert caught.value.path == path


def test_a_missing_file_is_refused(tmp_path: Path) -> None:
    with pytest.raises(DataFileError, match=r"nothing\.txt"):
        EarthOrientation.load(tmp_path / "nothing.txt")


# ---- values ----------------------------------------------------------------------------------------


def test_nodes_against_astropy(table: EarthOrientation, c04: Any) -> None:
    """C04 at 0h UTC as astropy reads it: the same numbers, to the rounding of UT1-TAI (7e-15 s) and of radians."""
    reader = iers.IERS_B.open(IERS_B_FILE)
    mjd = c04.mjd[::7]
    tai = tai_of(mjd)
    got = table.at(tai)
    dut1 = got.ut1_minus_tai_s + LEAP.tai_minus_utc((tai[0] - 32, tai[1]))
    np.testing.assert_allclose(dut1, reader.ut1_utc(mjd + 2400000.5).to_value(u.s), rtol=0, atol=1.5e-14)
    x, y = reader.pm_xy(mjd + 2400000.5)
    dx, dy = reader.dcip_xy(mjd + 2400000.5)
    for mine, theirs in [(got.x_rad, x), (got.y_rad, y), (got.dx_rad, dx), (got.dy_rad, dy)]:
        np.testing.assert_allclose(mine, theirs.to_value(u.rad), rtol=1e-14, atol=1e-22)
    assert not got.status.any()


def test_predictions_against_astropy(table: EarthOrientation, finals: Any) -> None:
    """Past the end of C04 the Bulletin A columns count."""
    reader = iers.IERS_A.open(IERS_A_FILE)
    mjd = finals.mjd[-300:]
    tai = tai_of(mjd)
    got = table.at(tai)
    dut1 = got.ut1_minus_tai_s + LEAP.tai_minus_utc((tai[0] - 32, tai[1]))
    np.testing.assert_allclose(dut1, reader["UT1_UTC_A"][np.isin(reader["MJD"].value, mjd)].value, rtol=0, atol=1.5e-14)
    assert (got.status == 1).all()
    assert table.predicted_from_mjd == finals.mjd[finals.predicted][0]


def test_between_the_nodes_against_straight_lines(table: EarthOrientation) -> None:
    """astropy interpolates UT1-UTC straight; the curvature of the fortnightly tide leaves up to 0.1 ms to our cubic."""
    rng = np.random.default_rng(20)
    mjd = rng.uniform(51545, 61300, 4000)
    time = Time(np.floor(mjd), mjd - np.floor(mjd), format="mjd", scale="utc")
    tai = time.tai
    count = exact.normalise(
        (np.floor(tai.jd1) - 2451545).astype(np.int64) * 86400, (tai.jd1 - np.floor(tai.jd1)) * 86400 + tai.jd2 * 86400
    )
    dut1 = table.ut1_minus_tai_s(count) + LEAP.tai_minus_utc((count[0] - 32, count[1]))
    straight = iers.IERS_B.open(IERS_B_FILE).ut1_utc(time.jd1, time.jd2).to_value(u.s)
    off = np.abs(dut1 - straight)
    assert off.max() < 1e-4
    assert 5e-6 < off.mean() < 3e-5  # a cubic, not the same straight line


def test_leap_second_is_no_jump(table: EarthOrientation) -> None:
    """UT1-TAI through the leap second at the end of 2016: C04 gives 1.0 ms/d of change, and no second of jump."""
    seconds = np.arange(0, 86401, 50)
    tai = tai_of(57753, seconds)
    values = table.ut1_minus_tai_s(tai)
    assert np.abs(np.diff(values)).max() < 1e-6  # 50 s at 1 ms/d is 0.6 us
    assert values[0] == pytest.approx(-0.4077697 - 36, abs=1e-14)
    assert table.ut1_minus_tai_s(tai_of(57754)) == pytest.approx(0.5912870 - 37, abs=1e-14)
    assert abs(values[-1] - (0.5912870 - 37)) < 2e-8  # 23:59:60 is one second before


def test_a_cubic_of_tai_is_reproduced_across_leap_seconds() -> None:
    """Four-point Lagrange is exact on cubics, in TAI, also for unequal days; 1e-12 s covers the rounding of rows."""
    mjd = np.arange(57745, 57765)
    origin = tai_of(57750)[0]

    def curve(tai: Pair) -> Any:
        t = ((tai[0] - origin) + tai[1]) / 86400
        return -36.4 + 1e-3 * t - 2e-5 * t**2 + 3e-6 * t**3

    nodes = tai_of(mjd)
    dut1 = curve(nodes) + LEAP.tai_minus_utc((nodes[0] - 32, nodes[1]))
    table = EarthOrientation.from_rows(mjd, dut1, 0.1, 0.2)
    whole = np.linspace(nodes[0][0], nodes[0][-1] - 1, 500).astype(np.int64)
    at = (whole, np.full(500, 0.375))
    np.testing.assert_allclose(table.ut1_minus_tai_s(at), curve(at), rtol=0, atol=1e-12)
    step = 10
    slope = (curve((whole + step, at[1])) - curve((whole - step, at[1]))) / (2 * step)
    np.testing.assert_allclose(table.ut1_rate(at), slope, rtol=0, atol=2e-14)  # 1e-13 s of rounding over 20 s
    np.testing.assert_allclose(table.at(at).x_rad, 0.1 * ARCSEC, rtol=1e-14)


def test_ut1_closes_at_the_rows(table: EarthOrientation) -> None:
    """UTC -> UT1 -> UTC on every row and a ns around it: two roundings of a fraction below 1 (0.1 fs each)."""
    mjd = np.arange(table.span[0] + 1, table.span[1])
    for shift_s in (0.0, 1e-9, -1e-9):
        tai = Instants.from_seconds(*tai_of(mjd), scale="TAI").shifted(shift_s)
        back = ut1_to_tai(tai_to_ut1(tai, table), table)
        assert np.abs(exact.seconds(exact.subtract(back.pair, tai.pair))).max() < 2.5e-16


def test_cubics_meet_at_the_rows(table: EarthOrientation) -> None:
    """The end of each cubic is the next row, to 2e-16 s of UT1-TAI less its whole seconds and 1e-21 rad of the pole."""
    nodes = table._nodes
    end = nodes.powers.sum(axis=1)[:-1]
    step = np.diff(nodes.ut1_base)[:-1]
    off = np.abs(end - step[:, None] * np.array([1, 0, 0, 0, 0]) - nodes.powers[1:, 0])
    assert off[:, 0].max() < 5e-16
    assert off[:, 1:].max() < 2e-21


def test_motion_is_the_values_and_their_derivatives(table: EarthOrientation) -> None:
    rng = np.random.default_rng(8)
    tai = tai_of(rng.integers(37665, 61700, 2000), rng.integers(600, 85000, 2000), rng.random(2000))
    motion, at = table.motion(tai), table.at(tai)
    for mine, theirs in zip(motion[:5], at[:5], strict=True):
        np.testing.assert_array_equal(mine, theirs)
    np.testing.assert_allclose(motion.ut1_minus_tai_rate, table.ut1_rate(tai), rtol=0, atol=1e-22)
    later, earlier = (table.at((tai[0] + k, tai[1])) for k in (300, -300))
    # Over 600 s: 1.4e-14 s of rounding in UT1-TAI, ulps of 4e-22 rad in the pole; the cubics' third derivative leaves
    # h^2/6 of less than 1e-2 s (4e-7 rad) per day^3: 2e-13 s/s and 1e-17 rad/s.
    for column, limit in zip(range(5), (1e-12, *[1e-16] * 4), strict=True):
        slope = (later[column] - earlier[column]) / 600
        np.testing.assert_allclose(motion[5 + column], slope, rtol=0, atol=limit)
        assert np.abs(motion[5 + column]).max() > 100 * limit


def test_motion_where_values_are_held(table: EarthOrientation) -> None:
    end = tai_of(table.span[1])
    tai = (end[0] + np.array([-43200, 31557600]), np.zeros(2))
    with pytest.warns(ExtrapolationWarning, match="1 of 2 instants are past the end") as caught:
        motion = table.motion(tai)
    assert caught[0].filename == __file__
    for column in motion[5:8]:
        assert column[0] != 0.0 == column[1]
    with pytest.raises(OutOfSpan):
        table.motion((-(10**10), 0.0))
    one = table.motion((0, 0.5))
    assert all(column.shape == () for column in one)


@given(day=st.integers(37665, 61706), second=st.integers(0, 86399), fraction=st.floats(0, 1, exclude_max=True))
def test_ut1_is_found_back(day: int, second: int, fraction: float) -> None:
    """The start for the inverse lies within 1e-12 s: UT1 runs at most 1e-7 off TAI, so one more pass is exact."""
    table = EarthOrientation.default()
    tai = tai_of(day, second, fraction)
    offset = table.ut1_minus_tai(tai)
    near = table.ut1_minus_tai_near(exact.add(tai, offset))
    assert abs(float(exact.seconds(exact.subtract(near, offset)))) < 1e-12


def test_uncertainty_and_status_between_rows() -> None:
    table = EarthOrientation.from_rows(
        [58000, 58001, 58002], [0.1, 0.1, 0.1], 0, 0, ut1_sigma_s=[1e-5, 3e-5, 9e-5], predicted=[False, False, True]
    )
    got = table.at(tai_of([58000, 58000, 58001, 58001, 58002], [0, 43200, 0, 1, 0]))
    np.testing.assert_allclose(got.ut1_sigma_s[[0, 1, 2, 4]], [1e-5, 2e-5, 3e-5, 9e-5], rtol=1e-12)
    assert got.status.tolist() == [0, 0, 0, 1, 1]
    assert table.status(tai_of([58000, 58001], [0, 1])).tolist() == [0, 1]


def test_constant_holds_ut1_minus_utc() -> None:
    """The SOFA time-scale example holds UT1-UTC = 0.3341 s on 2006-01-15 (TAI-UTC 33 s)."""
    table = EarthOrientation.constant(ut1_minus_utc_s=0.3341, x_arcsec=0.0349282, y_arcsec=0.4833163)
    got = table.at(tai_of(53750, [0, 77077], [0.0, 0.5]))
    assert got.ut1_minus_tai_s.tolist() == pytest.approx([0.3341 - 33] * 2, abs=1e-14)
    assert got.x_rad.tolist() == pytest.approx([0.0349282 * ARCSEC] * 2, rel=1e-14, abs=0)
    # In the drift years UTC itself moves: 0.002592 s a day in 1970 (tai-utc.dat, USNO).
    early = EarthOrientation.constant(start_mjd=40587, end_mjd=40590)
    tai = tai_of(40588, [0, 43200, 86399])
    want = -LEAP.tai_minus_utc((tai[0] - 32, tai[1]))
    assert early.ut1_minus_tai_s(tai).tolist() == pytest.approx(want.tolist(), abs=1e-13)


def test_outside_raises_with_the_mask(table: EarthOrientation) -> None:
    tai = (np.array([[-(10**10), 0], [10**9, 10**8]]), np.zeros((2, 2)))
    with pytest.raises(OutOfSpan, match="1962-01-01 to ") as caught:
        table.ut1_minus_tai(tai)
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [[True, False], [True, False]]
    with pytest.raises(OutOfSpan):
        table.at(tai)  # before the start there is nothing to hold
    strict = EarthOrientation.load(IERS_A_FILE)
    with pytest.raises(OutOfSpan):
        strict.at((10**9, 0.0))
    with pytest.raises(OutOfSpan):
        strict.status((10**9, 0.0))


def test_ends_of_the_span_belong_to_it(table: EarthOrientation) -> None:
    first, last = table.span
    table.ut1_minus_tai(tai_of([first, last]))
    assert table.at(tai_of(last)).status == 1


def test_held_past_the_end(table: EarthOrientation) -> None:
    end = tai_of(table.span[1])
    later = (end[0] + np.array([0, 31557600, 5 * 31557600]), np.zeros(3))
    with pytest.warns(ExtrapolationWarning, match="2 of 3 instants are past the end") as caught:
        got = table.at(later)
    assert len(caught) == 1
    assert got.status.tolist() == [1, 2, 2] == table.status(later).tolist()
    assert len(set(got.ut1_minus_tai_s.tolist())) == 1
    assert len(set(got.x_rad.tolist())) == 1
    assert got.ut1_sigma_s[1:].tolist() == pytest.approx([0.65, 3.25], rel=4e-3)  # 50 ms of the last row in quadrature
    assert got.x_sigma_rad[2] == pytest.approx(0.3 * ARCSEC)


def test_held_uncertainty_is_what_a_hindcast_shows(c04: Any) -> None:
    """UT1-TAI of C04 held for n years from every day of 1962-2026: rms within 3 % of 0.65 s per year up to 10 years."""
    utc = LEAP.count_from_label(c04.mjd, 0, 0.0)
    ut1 = c04.values[:, 0] - LEAP.tai_minus_utc(utc)
    for years in (0.25, 1, 3, 10):
        lag = round(years * 365.25)
        rms = np.sqrt(np.mean((ut1[lag:] - ut1[:-lag]) ** 2))
        assert rms == pytest.approx(0.65 * years, rel=0.03)
    for lag in (183, 365, 1100, 3653):
        pole = np.sqrt(np.mean((c04.values[lag:, 1:3] - c04.values[:-lag, 1:3]) ** 2))
        assert 0.05 < pole < 0.3


@pytest.mark.parametrize("shape", [(), (1,), (7,), (2, 3), (0,)])
def test_shapes(table: EarthOrientation, shape: tuple[int, ...]) -> None:
    whole = np.arange(int(np.prod(shape, dtype=int))).reshape(shape) * 100000
    got = table.at((whole, np.zeros(shape)))
    assert all(column.shape == shape for column in got)
    assert table.ut1_minus_tai_s((whole, np.zeros(shape))).shape == shape


def test_strided_broadcast_and_untouched(table: EarthOrientation) -> None:
    whole, fraction = np.arange(40000) * 7919, np.linspace(0, 0.999, 40000)
    copy = whole.copy()
    part = table.at((whole[::-3], fraction[::-3])).ut1_minus_tai_s
    np.testing.assert_array_equal(part, table.at((whole, fraction)).ut1_minus_tai_s[::-3])
    np.testing.assert_array_equal(whole, copy)
    assert table.at((whole[:4, None], fraction[None, :5])).x_rad.shape == (4, 5)


def test_immutable_also_after_pickling(table: EarthOrientation) -> None:
    for one in (table, pickle.loads(pickle.dumps(table))):
        with pytest.raises(ValueError, match="read-only"):
            one.mjd[0] = 0
        with pytest.raises(ValueError, match="read-only"):
            one._nodes.powers[0] = 0
        with pytest.raises(AttributeError):
            one.name = "other"


@pytest.mark.parametrize(
    "rows",
    [
        ([58000], 0, 0, 0),
        ([58000, 58000], 0, 0, 0),
        ([58001, 58000], 0, 0, 0),
        ([58000, 58020], 0, 0, 0),
        ([58000, 58000.5], 0, 0, 0),
        ([58000, 58001], [0, np.nan], 0, 0),
        ([58000, 58001], [0, 1, 2], 0, 0),
        ([58000, 58001], ["a", "b"], 0, 0),
        ([[58000, 58001]], 0, 0, 0),
    ],
)
def test_bad_rows_are_refused(rows: Any) -> None:
    with pytest.raises(InvalidInput):
        EarthOrientation.from_rows(*rows)


def test_bad_options_are_refused() -> None:
    with pytest.raises(InvalidInput, match="uncertainties"):
        EarthOrientation.from_rows([58000, 58001], 0, 0, 0, ut1_sigma_s=-1)
    with pytest.raises(InvalidInput, match="'raise' or 'hold'"):
        EarthOrientation.from_rows([58000, 58001], 0, 0, 0, after_end="guess")  # type: ignore[arg-type]
    with pytest.raises(InvalidInput, match="finite"):
        EarthOrientation.constant(ut1_minus_utc_s=np.inf)
    with pytest.raises(InvalidInput, match=r"from MJD 58000 \(2017-09-04\) to MJD 57999 \(2017-09-03\)"):
        EarthOrientation.constant(start_mjd=58000, end_mjd=57999)


def test_layouts_are_told_apart() -> None:
    for source, first in [(IERS_A_FILE, 41684), (IERS_B_FILE, 37665)]:
        assert parse_earth_orientation(Path(source).read_bytes(), Path(source)).mjd[0] == first
