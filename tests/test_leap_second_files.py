"""The two open layouts of leap-second files, whole and damaged."""

from __future__ import annotations

import hashlib
from pathlib import Path

import pytest

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


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("    41317.0    1  1 1972       10\n", "", "begin on 1972-01-01"),
        ("41499.0", "41498.0", "disagree"),
        ("1  7 1972       11", "1  7 1972", "not a row"),
        ("41499.0    1  7 1972", "41499.0    1 17 1972", "not a row"),
        ("28 June 2027", "31 June 2027", "no such date"),
    ],
)
def test_damaged_files(tmp_path: Path, old: str, new: str, message: str) -> None:
    text = "#  File expires on 28 June 2027\n    41317.0    1  1 1972       10\n    41499.0    1  7 1972       11\n"
    text += "    51179.0    1  1 1999       32\n"
    path = tmp_path / "Leap_Second.dat"
    path.write_text(text)
    assert LeapSeconds.load(path).expires_mjd == 61584
    assert old in text
    path.write_text(text.replace(old, new))
    with pytest.raises(DataFileError, match=message) as caught:
        LeapSeconds.load(path)
    assert caught.value.path == path
    assert caught.value.row is not None


def test_missing_and_empty_files(tmp_path: Path) -> None:
    with pytest.raises(DataFileError, match="cannot read"):
        LeapSeconds.load(tmp_path / "nothing.dat")
    path = tmp_path / "empty.dat"
    path.write_text("# nothing\n")
    with pytest.raises(DataFileError, match="no leap-second rows"):
        LeapSeconds.load(path)
