"""TT(BIPM): rows printed in the BIPM's own files, their irregular layout, and damage."""

from __future__ import annotations

import pickle
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import tscale
from tscale import exact
from tscale.errors import DataFileError, InvalidInput, OutOfSpan
from tscale.exact import Pair
from tscale.formats.leap_seconds import LeapSeconds
from tscale.tables.tt_bipm import TTBIPM, Extension

# Rows as they stand in the BIPM's TTBIPM.08 (first ones, a pair without the point after the MJD and at the parting of
# EAL and TAI in 1977, four decimals in the last years); the head is prose of our own with the traps of such heads.
HEAD = """ Realisation of terrestrial time, computed for a test.
 Rows: MJD at 0h UTC, TT-EAL-32.184 s and TT-TAI-32.184 s, in microseconds.
 After MJD 54829: TT = TAI + 32.184 s + 27148.9 ns + 0.02x(MJD-54829) ns
 57114 (27 December 2017) is a day that this line gets wrong.

    MJD     TT-EAL     TT-TAI
"""
FIRST = "42589.    46.258    46.258\n42599.    45.439    45.439\n"
PARTING = "43139      0.420      0.420\n43149.    -0.420      0.012\n"
LATE = "54289. -712.1643   26.9755\n54299. -712.5000   26.9783\n"


def write(folder: Path, rows: str, name: str = "TTBIPM.08") -> Path:
    path = folder / name
    path.write_text(HEAD + rows)
    return path


def tai_of(mjd: Any, second: Any = 0) -> Pair:
    whole, fraction = LeapSeconds.default().count_from_label(mjd, second, 0.0)
    return whole + 32, fraction


@pytest.mark.parametrize(
    ("rows", "published_us"),
    [
        (FIRST, {42589: 46.258, 42599: 45.439}),
        (PARTING, {43139: 0.420, 43149: 0.012}),
        (LATE, {54289: 26.9755, 54299: 26.9783}),
    ],
)
def test_published_rows(tmp_path: Path, rows: str, published_us: dict[int, float]) -> None:
    """1e-20 s: the float64 rounding of microseconds turned to seconds."""
    table = TTBIPM.load(write(tmp_path, rows))
    assert table.scale == "TT(BIPM08)"
    for mjd, offset_us in published_us.items():
        assert float(table.offset_s(tai_of(mjd))) == pytest.approx(offset_us * 1e-6, abs=1e-20)


# Col. 3 of the BIPM's TTBIPM.08 through a chain: 1980-01-01, 1990-01-01, 2007-07-08 and the last row, 2008-12-29.
@pytest.mark.parametrize(("mjd", "offset_us"), [(44239, 10.854), (47889, 18.664), (54289, 26.9755), (54829, 27.1489)])
def test_a_chain_shows_the_published_offset(mjd: int, offset_us: float) -> None:
    """TT(BIPM08) - TAI less 32.184 s, to the 2e-16 s that a fraction of a second is kept to."""
    table = TTBIPM.from_rows("BIPM08", [mjd - 10, mjd, mjd + 10], np.full(3, offset_us * 1e-6))
    chain = tscale.chain("UTC", "TT(BIPM08)", reference=tscale.ReferenceData(tt_bipm=[table]))
    t = tscale.Instants.from_mjd(mjd, 0.0, scale="UTC")
    ledger = chain.ledger(t)
    beyond = exact.subtract(ledger.exact("TT(BIPM08) - TAI"), exact.normalise(32, 0.184))
    assert float(exact.seconds(beyond)) == pytest.approx(offset_us * 1e-6, rel=0, abs=3e-16)


def test_halfway_is_the_mean(tmp_path: Path) -> None:
    """MJD 54294, halfway between 26.9755 and 26.9783 us: 26.9769 us."""
    table = TTBIPM.load(write(tmp_path, LATE))
    assert float(table.offset_s(tai_of(54294))) == pytest.approx(26.9769e-6, abs=1e-17)
    assert float(table.rate(tai_of(54294))) == pytest.approx(0.0028e-6 / 864000, rel=1e-9, abs=0)


@pytest.mark.parametrize(
    ("row", "offset_us"),
    [
        ("54309. -712.1643  26.9811", 26.9811),
        ("54309.-712.1643  26.9811", 26.9811),
        ("54309.-712.1643-26.9811", -26.9811),
        ("54309.-712.164326.9811", 26.9811),
        ("54309.-712.16426.981", 26.981),
        ("54309 -.164 .981", 0.981),
        ("54309.\t-712.1643\t26.9811", 26.9811),
    ],
)
def test_columns_may_touch(tmp_path: Path, row: str, offset_us: float) -> None:
    before = f"54289. -712.1643 {offset_us:.4f}\n54299. -712.5000 {offset_us:.4f}\n"
    table = TTBIPM.load(write(tmp_path, before + row + "\n"))
    assert float(table.offset_s(tai_of(54309))) == pytest.approx(offset_us * 1e-6, abs=1e-20)


def test_across_a_leap_second(tmp_path: Path) -> None:
    """The day that ends 2008 is longer by a second; a straight line in TAI does not notice."""
    table = TTBIPM.load(write(tmp_path, "54829. -743.5591   27.0000\n54839. -743.5591   28.0000\n"))
    slope = 1e-6 / 864001
    assert float(table.offset_s(tai_of(54831, 86400))) == pytest.approx(27e-6 + slope * (3 * 86400), abs=1e-17)
    assert float(table.offset_s(tai_of(54832))) == pytest.approx(27e-6 + slope * (3 * 86400 + 1), abs=1e-17)


@pytest.mark.parametrize(
    ("file", "name", "scale"),
    [
        ("TTBIPM.2025", None, "TT(BIPM2025)"),
        ("ttbipm.23.txt", None, "TT(BIPM23)"),
        ("TTBIPM08", None, "TT(BIPM08)"),
        ("other.txt", "BIPM21", "TT(BIPM21)"),
        ("TTBIPM.08", "TT(TEST)", "TT(TEST)"),
    ],
)
def test_names(tmp_path: Path, file: str, name: str | None, scale: str) -> None:
    assert TTBIPM.load(write(tmp_path, FIRST, file), name=name).scale == scale


def test_a_name_is_needed(tmp_path: Path) -> None:
    with pytest.raises(InvalidInput, match="give name="):
        TTBIPM.load(write(tmp_path, FIRST, "table.txt"))
    with pytest.raises(InvalidInput, match="does not name"):
        TTBIPM.load(write(tmp_path, FIRST), name="BIPM 23")


def test_past_the_last_row(tmp_path: Path) -> None:
    """The line in the head of the BIPM's 2024 file: 27671.3 ns + 0.02 (MJD - 60669) ns, 27677.92 ns on MJD 61000."""
    path = write(tmp_path, "60659. 1.0000 27.6710\n60669. 1.0000 27.6713\n", "TTBIPM.2024")
    table = TTBIPM.load(path)
    with pytest.raises(OutOfSpan, match=r"TT\(BIPM2024\).*extension") as caught:
        table.offset_s(tai_of([60660, 61000]))
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True]
    longer = TTBIPM.load(path, extension=Extension(60669, 27671.3e-9, 0.02e-9, 61034))
    assert float(longer.offset_s(tai_of(61000))) == pytest.approx(27677.92e-9, abs=1e-17)
    assert longer.span == (60659, 61034)
    assert longer.sha256 != table.sha256
    with pytest.raises(OutOfSpan):
        longer.offset_s(tai_of(61035))
    with pytest.raises(InvalidInput, match="after the last row"):
        TTBIPM.load(path, extension=Extension(60669, 27671.3e-9, 0.02e-9, 60669))


def test_before_the_first_row(tmp_path: Path) -> None:
    with pytest.raises(OutOfSpan, match="1975-06-26 to 1975-07-06"):
        TTBIPM.load(write(tmp_path, FIRST)).offset_s(tai_of(42588))


@pytest.mark.parametrize(
    ("rows", "line"),
    [
        (FIRST + "42609.    44.7x9    44.719\n", 9),
        (FIRST + "42609.    44.719\n", 9),
        (FIRST + "42609.    44.719    nan\n", 9),
        (FIRST + "42619.    44.719    44.719\n", 9),
        (FIRST + "42599.    44.719    44.719\n", 9),
        (FIRST + "42589.    44.719    44.719\n", 9),
        (FIRST + "42609.    44.719    44.719    1.0\n", 9),
        (FIRST + "42609.    44.719    44.71", 9),  # cut short
        (FIRST + "42609.    44.719    4", 9),
        (FIRST + "42609.    44.719", 9),
        (FIRST + "42609.", 9),
        (FIRST + "42609.    44.719    94.719\n", 9),
        (FIRST + "42609.    44.719   -44.719\n", 9),
        (FIRST + "42609.    44,719    44,719\n", 9),
        (FIRST + "42609.    44.719    44.719*\n", 9),
        (FIRST + "42609.    44.7190    44.719\n", 9),
        (FIRST + "42609.5   44.719    44.719\n", 9),
        (FIRST.replace("46.258\n", "46.2x8 46.258\n"), 7),
        (FIRST.replace("46.258    46.258", "46.258    46.258    46.258"), 7),
        (FIRST.replace("42589.", "42579."), 8),
        ("42589.    46.2    46.2\n42599.    45.4    45.4\n", 7),  # another layout altogether
    ],
)
def test_damaged_rows_are_named(tmp_path: Path, rows: str, line: int) -> None:
    path = write(tmp_path, rows)
    with pytest.raises(DataFileError, match=f"line {line}") as caught:
        TTBIPM.load(path)
    assert (caught.value.row, caught.value.path) == (line, path)


@pytest.mark.parametrize("rows", ["", "42589. 46.258 46.258\n"])
def test_too_few_rows(tmp_path: Path, rows: str) -> None:
    with pytest.raises(DataFileError, match="two or more"):
        TTBIPM.load(write(tmp_path, rows))


def test_missing_and_empty_files(tmp_path: Path) -> None:
    with pytest.raises(DataFileError, match="cannot read"):
        TTBIPM.load(tmp_path / "TTBIPM.99")
    (tmp_path / "TTBIPM.99").write_text("\n")
    with pytest.raises(DataFileError, match="empty"):
        TTBIPM.load(tmp_path / "TTBIPM.99")


def test_uncertainty() -> None:
    rows = ([54289, 54299], [26.9755e-6, 26.9783e-6])
    assert TTBIPM.from_rows("X", *rows).uncertainty_s(tai_of([54290, 54291])).tolist() == [1e-9 / np.sqrt(12)] * 2
    assert float(TTBIPM.from_rows("X", *rows, uncertainty_s=2e-9).uncertainty_s(tai_of(54290))) == 2e-9
    with pytest.raises(InvalidInput, match="uncertainty_s"):
        TTBIPM.from_rows("X", *rows, uncertainty_s=np.nan)


@pytest.mark.parametrize(
    ("mjd", "offset"),
    [([1, 2], [0, np.nan]), ([1], [0]), ([2, 1], [0, 0]), ([1, 2.5], [0, 0]), ([1, 2], [0, 0, 0])],
)
def test_bad_rows_are_refused(mjd: Any, offset: Any) -> None:
    with pytest.raises(InvalidInput):
        TTBIPM.from_rows("X", mjd, offset)


def test_shapes_and_immutability() -> None:
    table = TTBIPM.from_rows("X", [54289, 54299], [26.9755e-6, 26.9783e-6])
    for shape in [(), (3,), (2, 2), (0,)]:
        whole = np.full(shape, int(tai_of(54290)[0]))
        assert table.offset_s((whole, np.zeros(shape))).shape == shape
    for one in (table, pickle.loads(pickle.dumps(table))):
        with pytest.raises(ValueError, match="read-only"):
            one.mjd[0] = 1
