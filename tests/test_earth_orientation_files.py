"""Earth orientation files that are cut short within a line, or of a version that is not read: errors, never numbers."""

from __future__ import annotations

from pathlib import Path

import pytest
from astropy_iers_data import IERS_A_FILE, IERS_B_FILE

from tscale.errors import DataFileError
from tscale.tables import EarthOrientation

from .test_tables_earth_orientation import cut, head


@pytest.mark.parametrize("source", [IERS_A_FILE, IERS_B_FILE])
def test_a_last_line_cut_anywhere(tmp_path: Path, source: str) -> None:
    """Wherever a download stops within a line: also behind UT1, or between its columns and those that are not read."""
    path = tmp_path / "eop.txt"
    rows = cut(source, slice(1000, 1010))
    for length in range(len(rows[-1].rstrip()) - 1, 0, -7):
        path.write_bytes(b"\n".join([*head(source), *rows[:-1], rows[-1][:length]]))
        with pytest.raises(DataFileError) as caught:
            EarthOrientation.load(path)
        assert caught.value.row == 10 + len(head(source))


def test_offsets_that_end_where_they_cannot(tmp_path: Path) -> None:
    """Celestial pole offsets missing in the last row alone, or where UT1 is measured: blanks put over a cut."""
    path = tmp_path / "eop.txt"
    whole = cut(IERS_A_FILE, slice(None))
    predicted = next(i for i, row in enumerate(whole) if row[57:58] == b"P")
    for first, start in ((9, predicted), (7, 1000)):
        rows = whole[start : start + 10]
        rows[first:] = [row[:97].ljust(187) for row in rows[first:]]
        path.write_bytes(b"\n".join(rows))
        with pytest.raises(DataFileError, match="cut short") as caught:
            EarthOrientation.load(path)
        assert caught.value.row == first + 1


@pytest.mark.parametrize(
    ("old", "new", "words"),
    [
        (b"20 C04", b"26 C04", "the series"),
        (b"IAU 2000", b"IAU 2035", "model"),
        (b"f10.2", b"f11.2", "the format"),
        (b"x Er        y Er", b"y Er        x Er", "the columns"),
        (b"#", b"", "neither of the two"),
    ],
)
def test_another_c04(tmp_path: Path, old: bytes, new: bytes, words: str) -> None:
    """A later version, columns in another order, or no head at all: nothing tells what the numbers are."""
    path = tmp_path / "eop.txt"
    above = b"\n".join(head(IERS_B_FILE))
    assert old in above
    rows = b"\n".join(cut(IERS_B_FILE, slice(1000, 1010)))
    path.write_bytes(above.replace(old, new) + b"\n" + rows)
    with pytest.raises(DataFileError, match=words):
        EarthOrientation.load(path)
    path.write_bytes(rows)
    with pytest.raises(DataFileError, match="head is cut off"):
        EarthOrientation.load(path)
