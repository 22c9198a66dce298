"""The two open layouts of leap-second files, whole and damaged."""

from __future__ import annotations

import hashlib
import re
from pathlib import Path

import pytest
from astropy_iers_data import IERS_LEAP_SECOND_FILE

from tscale.errors import DataFileError
from tscale.formats.leap_seconds import LeapSeconds

TABLE = LeapSeconds.default()


def write_list(
    path: Path, rows: list[tuple[int, int]], *, updated: int = 3945196800, expires: int = 3991593600
) -> None:
    """Write the open layout leap-seconds.list: NTP seconds and TAI-UTC, with its SHA-1."""
    digits = f"{updated}{expires}" + "".join(f"{ntp}{value}" for ntp, value in rows)
    digest = hashlib.sha1(digits.encode()).hexdigest()
    words = " ".join(digest[i : i + 8].lstrip("0") or "0" for i in range(0, 40, 8))
    lines = ["# made for a test", f"#$\t{updated}", f"#@\t{expires}"]
    lines += [f"{ntp}\t{value}\t# a comment" for ntp, value in rows] + [f"#h\t{words}"]
    path.write_text("\n".join(lines) + "\n")


def test_both_layouts_say_the_same(tmp_path: Path) -> None:
    path = tmp_path / "leap-seconds.list"
    ntp = [((row.mjd - 15020) * 86400, row.tai_minus_utc_ns // 10**9) for row in TABLE.rows if row.mjd >= 41317]
    assert ntp[0] == (2272060800, 10)  # 1972-01-01 in NTP seconds (RFC 5905, figure 4)
    write_list(path, ntp)
    table = LeapSeconds.load(path)
    assert table.rows == TABLE.rows
    assert table.expires_mjd == 15020 + 3991593600 // 86400
    path.write_text(path.read_text().replace("3692217600\t37", "3692217600\t38"))
    with pytest.raises(DataFileError, match="checksum") as caught:
        LeapSeconds.load(path)
    assert caught.value.path == path


DAT = Path(IERS_LEAP_SECOND_FILE).read_text()  # as the IERS issues it


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("    41317.0    1  1 1972       10\n", "", "begin on 1972-01-01"),
        ("41499.0", "41498.0", "disagree"),
        ("1  7 1972       11", "1  7 1972", "not a row"),
        ("41499.0    1  7 1972", "41499.0    1  8 1972", "disagree"),
        ("41499.0    1  7 1972", "41499.0    1  7 1973", "disagree"),
        ("41499.0    1  7 1972", "41499.0    1 13 1972", "not a row"),
        ("41499.0    1  7 1972", "4l499.0    1  7 1972", "not a row"),
        ("41499.0    1  7 1972       11", "41499.0    1  7 1972       11  0", "not a row"),
        ("41499.0    1  7 1972       11", "41509.0   11  7 1972       11", "first day of a month"),
        ("1  7 1972       11", "1  7 1972       71", "goes from 10 to 71 s"),
        ("1  7 1972       11", "1  7 1972       nan", "not a row"),
        ("    41499.0    1  7 1972       11\n", "", "goes from 10 to 12 s"),
        ("    41499.0    1  7 1972       11\n", "    41499.0    1  7 1972       11\n" * 2, "does not follow"),
        ("    41683.0    1  1 1973       12\n", "    41317.0    1  1 1972       10\n", "does not follow"),
    ],
)
def test_damaged_rows(tmp_path: Path, old: str, new: str, message: str) -> None:
    path = tmp_path / "Leap_Second.dat"
    assert old in DAT
    damaged = DAT.replace(old, new, 1)
    path.write_text(damaged)
    with pytest.raises(DataFileError, match=message) as caught:
        LeapSeconds.load(path)
    assert caught.value.path == path
    assert caught.value.row is not None
    # The line that is named is the first that differs, or where one is missing the next.
    first = next(i for i, (a, b) in enumerate(zip(DAT.split("\n"), damaged.split("\n"), strict=False), 1) if a != b)
    assert first <= caught.value.row <= first + 1


def test_a_table_cut_short(tmp_path: Path) -> None:
    path = tmp_path / "Leap_Second.dat"
    lines = DAT.splitlines(keepends=True)
    (end,) = [i for i, line in enumerate(lines) if "50630.0" in line]  # 1997-07-01
    path.write_text("".join(lines[: end + 1]))
    with pytest.raises(DataFileError, match="cut short") as caught:
        LeapSeconds.load(path)
    assert caught.value.row == end + 1
    path.write_bytes(DAT.encode().replace(b"50630.0", b"50630.\xff"))
    with pytest.raises(DataFileError, match="no plain text") as caught:
        LeapSeconds.load(path)
    assert caught.value.row == end + 1


def test_a_table_without_its_last_rows(tmp_path: Path) -> None:
    """One that is vouched for past a leap second that it lacks; an old one, which could not know of it, is none."""
    path = tmp_path / "Leap_Second.dat"
    lines = DAT.splitlines(keepends=True)
    for step in (57754, 57204, 56109, 54832, 53736):
        (at,) = [i for i, line in enumerate(lines) if f"{step}.0" in line]
        lines = lines[:at]
        path.write_text("".join(lines))
        with pytest.raises(DataFileError, match=f"before that of MJD {step}.*cut short") as caught:
            LeapSeconds.load(path)
        assert caught.value.row == at
    path.write_text(re.sub(r"expires on .*", "expires on 28 December 2005", "".join(lines)))
    assert LeapSeconds.load(path).rows[-1].mjd == 51179


def test_expiry_of_the_dat_layout(tmp_path: Path) -> None:
    path = tmp_path / "Leap_Second.dat"
    path.write_text("\ufeff" + DAT)  # a mark of byte order is no comment
    assert LeapSeconds.load(path).expires_mjd == TABLE.expires_mjd
    for date, words in (("31 June 2027", "no such date"), ("28 Jane 2027", "no such date"), ("28 June 1999", "before")):
        path.write_text(re.sub(r"expires on .*", f"expires on {date}", DAT))
        with pytest.raises(DataFileError, match=words):
            LeapSeconds.load(path)


ROWS = [((row.mjd - 15020) * 86400, row.tai_minus_utc_ns // 10**9) for row in TABLE.rows if row.mjd >= 41317]


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("#$\t3945196800\n", "", r"no line #\$"),
        ("#@\t3991593600\n", "", "no line #@"),
        ("#h\t", "# h\t", "no line #h"),
        ("3945196800", "3945196801", "checksum"),
        ("3991593600", "3991507200", "checksum"),
        ("3991593600", "soon", "NTP seconds"),
        ("2287785600\t11", "2287785600\t12", "checksum"),
        ("2287785600\t11", "2287785600", "checksum"),
        ("2287785600\t11\t# a comment\n", "", "checksum"),
        ("# a comment\n2287785600", "# a comment\n#2287785600", "checksum"),
        ("2287785600", "2287785601", "checksum"),
        ("#h\t", "#h\t0", "checksum"),
    ],
)
def test_damaged_lists(tmp_path: Path, old: str, new: str, message: str) -> None:
    path = tmp_path / "leap-seconds.list"
    write_list(path, ROWS)
    text = path.read_text()
    assert old in text
    path.write_text(text.replace(old, new, 1))
    with pytest.raises(DataFileError, match=message) as caught:
        LeapSeconds.load(path)
    assert caught.value.row is not None


def test_a_list_cut_anywhere(tmp_path: Path) -> None:
    path = tmp_path / "leap-seconds.list"
    write_list(path, ROWS)
    content = path.read_bytes()
    for end in range(30, len(content.rstrip()), 11):
        path.write_bytes(content[:end])
        with pytest.raises(DataFileError):
            LeapSeconds.load(path)


def test_missing_and_empty_files(tmp_path: Path) -> None:
    with pytest.raises(DataFileError, match="cannot read"):
        LeapSeconds.load(tmp_path / "nothing.dat")
    path = tmp_path / "empty.dat"
    path.write_text("# nothing\n")
    with pytest.raises(DataFileError, match="no leap-second rows"):
        LeapSeconds.load(path)
