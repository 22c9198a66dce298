"""UTC - UTC(k) of Circular T and UTCr: published rows, signs, issues joined, and damage."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st

import tscale
from tscale import exact
from tscale.errors import DataFileError, InvalidInput, MissingPiece, OutOfSpan
from tscale.exact import Pair
from tscale.formats.leap_seconds import LeapSeconds
from tscale.tables.circular_t import circular_notes, laboratories, read_circular

DATA = Path(__file__).parent / "data" / "circular"
T201, T229, T230, RAPID = (
    DATA / name for name in ("circular_t_201.txt", "circular_t_229.txt", "circular_t_230.txt", "utcr_1226.txt")
)
LEAP = LeapSeconds.default()


def utc(mjd: Any) -> Pair:
    return LEAP.count_from_label(mjd, 0, 0.0)


# Rows of the BIPM's Circular T 229 (2007) and 201 (2004), UTC - UTC(k) in ns.
@pytest.mark.parametrize(
    ("path", "laboratory", "first_mjd", "published_ns", "u_ns"),
    [
        (T229, "CH", 54099, [-56.0, -65.1, -75.4, -70.5, -58.0, -50.8, -43.6], 5.1),
        (T229, "UTC(BIM)", 54099, [-4983.2, -4998.7, -4991.6, -5013.5, -5020.3, -5053.0, -5083.0], 20.6),
        (T201, "CH", 53244, [-18.4, -15.9, -15.5, -17.7, -10.9, -0.5, 7.9], None),
    ],
)
def test_published_rows(
    path: Path, laboratory: str, first_mjd: int, published_ns: list[float], u_ns: float | None
) -> None:
    """Clock minus reference is the negative of what is printed: 2e-16 s, the rounding of a fraction below 1 s."""
    log = read_circular(path, laboratory, uncertainty_s=None if u_ns else 4e-9)
    at = utc(first_mjd + 5 * np.arange(7))
    np.testing.assert_allclose(-1e9 * exact.seconds(log.offset(at)), published_ns, rtol=0, atol=2e-7)
    # u is uA and uB in quadrature, which are printed to 0.1 ns.
    np.testing.assert_allclose(log.uncertainty_s(at), 1e-9 * (u_ns or 4.0), rtol=1e-15, atol=0.07e-9 if u_ns else 0)
    assert (log.scale, log.reference) == (f"UTC({laboratory.removeprefix('UTC(').rstrip(')')})", "UTC")


def test_the_sign_is_that_of_the_heading() -> None:
    """Heading of the section: UTC - UTC(k). UTC(CH) reads 65.1 ns more than UTC on MJD 54104."""
    log = read_circular(T229, "CH")
    reading = tscale.Instants.from_iso("2007-01-04T00:00:00", scale="UTC(CH)")
    date = tscale.chain("UTC(CH)", "UTC", clocks=[log])(reading)
    assert float(exact.seconds(exact.subtract(date.pair, reading.pair))) == pytest.approx(
        -65.1e-9, rel=0, abs=2e-15
    )  # read at UTC(CH) 65 ns before the day


def test_issues_are_joined_in_any_order() -> None:
    log = read_circular([T230, T229], "KRL")
    assert log.span.to_iso(0).tolist() == ["2006-12-30T00:00:00", "2007-02-23T00:00:00"]
    # Across the day on which one issue ends and the next begins: straight from 0.6 (24 Jan) over -0.2 to -0.9 (3 Feb).
    between = log.offset(utc([54124, 54129, 54134]))
    np.testing.assert_allclose(1e9 * exact.seconds(between), [-0.6, 0.2, 0.9], rtol=0, atol=2e-7)
    middle = exact.add(utc(54129), exact.from_seconds(2.5 * 86400))
    assert float(exact.seconds(log.offset(middle))) == pytest.approx(0.55e-9, rel=0, abs=2e-16)
    assert log.name == "UTC(KRL) of Circular T 229 to 230"
    assert log.sha256 == read_circular([T229, T230], "KRL").sha256 != read_circular(T229, "KRL").sha256


def test_a_missing_value_and_a_missing_issue_are_gaps(tmp_path: Path) -> None:
    log = read_circular([T229, T230], "KRL")
    with pytest.raises(OutOfSpan, match="gap") as caught:
        log.offset(utc([54104, 54106, 54109, 54112, 54114]))
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True, True, True, False]
    later = tmp_path / "later.txt"
    later.write_text(_shifted(T230.read_text(), 35, "MAR 5    MAR 10   MAR 15   MAR 20   MAR 25   MAR 30"))
    apart = read_circular([T229, later], "KRL")
    with pytest.raises(OutOfSpan, match="gap"):
        apart.offset(utc(54140))
    assert float(exact.seconds(apart.offset(utc(54164)))) == pytest.approx(0.2e-9, abs=2e-16)


def _shifted(text: str, days: int, dates: str) -> str:
    text = text.replace("CIRCULAR T 230", "CIRCULAR T 231")
    for mjd in range(54154, 54124, -5):
        text = text.replace(str(mjd), str(mjd + days))
    start = text.index("JAN 29")
    return text[:start] + dates + text[text.index("   Uncertainty/ns") :]


def test_columns_that_touch() -> None:
    log = read_circular(T230, "TRN")
    assert float(exact.seconds(log.offset(utc(54134)))) == pytest.approx(171874.2e-9, rel=0, abs=2e-16)


def test_rapid_product_across_a_leap_second() -> None:
    log = read_circular(RAPID, "KRL", uncertainty_s=3e-9)
    at = utc([56103, 56108, 56109])
    assert at[0].tolist()[2] - at[0].tolist()[1] == 86401  # 2012-06-30 has a leap second
    np.testing.assert_allclose(1e9 * exact.seconds(log.offset(at)), [-4.1, -3.5, -3.6], rtol=0, atol=2e-7)
    noon = exact.add(utc(56108), exact.from_seconds(43200.5))
    assert float(exact.seconds(log.offset(noon))) == pytest.approx(-3.55e-9, rel=0, abs=2e-16)  # no gap
    with pytest.raises(OutOfSpan, match="gap"):
        log.offset(utc(56107))


@given(
    st.lists(st.integers(-(10**7), 10**7), min_size=7, max_size=7),
    st.lists(st.booleans(), min_size=7, max_size=7),
    st.integers(1, 9999),
)
def test_any_row_is_read_as_it_is_printed(
    tmp_path_factory: Any, tenths: list[int], missing: list[bool], u: int
) -> None:
    """Up to a millisecond with one decimal: read to the 1.1e-16 s that a fraction of a second is kept to."""
    assume(sum(missing) < 6)
    cells = [f"{'-' if gone else f'{value / 10:.1f}':>11}" for value, gone in zip(tenths, missing, strict=True)]
    text = T229.read_text()
    (old,) = [line for line in text.splitlines() if line.startswith("CH ")]
    path = tmp_path_factory.getbasetemp() / "any_row.txt"
    path.write_text(text.replace(old, f"CH   (    )   {''.join(cells)} 0.0 {u / 10:.1f} {u / 10:.1f}"))
    log = read_circular(path, "CH")
    for day, (value, gone) in enumerate(zip(tenths, missing, strict=True)):
        if not gone:
            at = utc(54099 + 5 * day)
            assert float(exact.seconds(log.offset(at))) == pytest.approx(-value * 1e-10, rel=0, abs=1.2e-16)
            assert float(log.uncertainty_s(at)) == pytest.approx(u * 1e-10, rel=1e-12, abs=0)


def test_laboratories_and_notes() -> None:
    assert laboratories([T229, T230]) == {
        "BIM": "",
        "CH": "",
        "DLR": "",
        "KRL": "Kestrel Ridge",
        "TRN": "Tern Island",
    }
    assert circular_notes([T229, T230], "KRL") == (
        "Circular T 229, note 2: KRL : an invented step of UTC(KRL) of -1.0 ns on MJD 54107.3.",
    )
    assert circular_notes(T229, "BIM")[0].endswith("note that goes on over two lines with 12.5 ns in them.")
    assert circular_notes(T229, "CH") == ()


def test_what_is_not_there_is_said() -> None:
    with pytest.raises(MissingPiece, match=r"UTC\(DLR\) has no value in Circular T 229; laboratories there: BIM, CH"):
        read_circular(T229, "DLR")
    with pytest.raises(MissingPiece, match=r"UTC\(QQQ\) is not in"):
        read_circular(T229, "QQQ")
    with pytest.raises(MissingPiece, match="uncertainty_s=") as caught:
        read_circular(T201, "CH")
    assert (caught.value.row, caught.value.path) == (14, T201)
    with pytest.raises(InvalidInput, match="apart"):
        read_circular([T229, RAPID], "KRL", uncertainty_s=1e-9)
    for bad in (-1.0, np.nan):
        with pytest.raises(InvalidInput, match="uncertainty_s"):
            read_circular(T201, "CH", uncertainty_s=bad)
    for name in ("", "K R", "UTC(K", 7):
        with pytest.raises(InvalidInput, match="no laboratory"):
            read_circular(T229, name)  # type: ignore[arg-type]
    with pytest.raises(InvalidInput, match="no file"):
        read_circular([], "CH")


def test_issues_that_contradict_each_other(tmp_path: Path) -> None:
    corrected = tmp_path / "corrected.txt"
    corrected.write_text(T230.read_text().replace("-0.2     -0.9", "-0.4     -0.9"))
    with pytest.raises(DataFileError, match=r"MJD 54129 \(2007-01-29\) is -0.4 ns here and -0.2 ns in circular_t_229"):
        read_circular([T229, corrected], "KRL")


DAMAGE: dict[str, tuple[str, str, str, int | None]] = {
    # what is done: text, put in its place, words of the error, line
    "no title": ("CIRCULAR T 229", "CIRCULAR", "no title line", None),
    "second issue": ("over two lines", "\nCIRCULAR T 230", "second issue", 22),
    "no section": ("1 - Coordinated", "One: Coordinated", "section 1", None),
    "cut in the section": ("2 - International", "", "cut short", 24),
    "letters": ("-65.1", "-6x.1", "damaged row", 15),
    "decimal lost": ("-65.1", "-65.", "no value in ns", 15),
    "two decimals": ("-65.1", "-65.12", "11 numbers", 15),
    "value lost": ("-65.1", "     ", "9 numbers", 15),
    "value too many": ("-65.1", "-65.1 1.0", "11 numbers", 15),
    "uncertainty lost": ("0.7  5.1  5.1", "0.7  5.1", "9 numbers", 15),
    "negative uncertainty": ("5.1  5.1", "5.1 -5.1", "negative", 15),
    "city lost": ("CH   (    )", "CH   ", "damaged row", 15),
    "small letters": ("CH   (    )", "ch   (    )", "damaged row", 15),
    "twice": ("DLR  (", "CH   (", "again, after line 15", 16),
    "day lost": ("54104    ", "         ", "5 d apart", 11),
    "day damaged": ("54104", "54l04", "5 d apart", 11),
    "other days": ("54099    54104    54109", "54098    54103    54108", "5 d apart", 11),
    "MJD out of step": (" 54099    54104    54109    54114    54119    54124    54129",
        " 54098    54103    54108    54113    54118    54123    54128", "end in 4 or 9", 11),
    "date": ("JAN 9 ", "JAN 8 ", "dates are not", 10),
    "month": ("DEC 30", "NOV 30", "dates are not", 10),
    "year": ("2006/7", "2005/6", "year", 10),
    "TAI-UTC": ("TAI-UTC = 33 s", "TAI-UTC = 34 s", "34 s from 2006-01-01 by this text, 33 s", 8),
    "day of TAI-UTC": ("2006 January 1,", "2006 January 41,", "names no day", 8),
    "unit": ("[UTC-UTC(k)]/ns", "[UTC-UTC(k)]/ps", "later layout", 12),
    "no unit": ("[UTC-UTC(k)]/ns", "", "no line with the unit", 7),
    "columns of uncertainty": ("uA   uB   u", "uA   u", "uA, uB and u", 11),
    "note lost": ("(1) An invented", "An invented", "note 1", 14),
}  # fmt: skip


@pytest.mark.parametrize("how", DAMAGE)
def test_damage_is_named(tmp_path: Path, how: str) -> None:
    old, new, words, line = DAMAGE[how]
    text = T229.read_text()
    assert old in text
    path = tmp_path / "damaged.txt"
    path.write_text(text.replace(old, new))
    with pytest.raises(DataFileError, match=words) as caught:
        read_circular(path, "CH")
    assert (caught.value.row, caught.value.path) == (line, path)
    if line is not None:
        assert f"line {line}" in str(caught.value)


@pytest.mark.parametrize("content", [b"", b"\n \n", b"one,two\n1,2\n", b"\x00\xff" * 99])
def test_files_of_another_kind(tmp_path: Path, content: bytes) -> None:
    path = tmp_path / "other.txt"
    path.write_bytes(content)
    with pytest.raises(DataFileError) as caught:
        read_circular(path, "CH")
    assert caught.value.path == path
    with pytest.raises(DataFileError, match="cannot read"):
        read_circular(tmp_path / "none.txt", "CH")


def test_cut_anywhere_is_found_or_harmless(tmp_path: Path) -> None:
    """The text ends after any byte of the section: an error, never a row with other numbers."""
    content = T229.read_bytes()
    whole = read_circular(T229, "CH")
    path = tmp_path / "cut.txt"
    for end in range(20, len(content), 7):
        path.write_bytes(content[:end])
        try:
            log = read_circular(path, "CH")
        except DataFileError:
            continue
        assert end > content.index(b"2 - I")
        assert exact.seconds(log.offset(utc(54104))) == exact.seconds(whole.offset(utc(54104)))


def test_line_ends_and_old_letters_do_not_matter(tmp_path: Path) -> None:
    path = tmp_path / "windows.txt"
    path.write_bytes(T229.read_bytes().replace(b"\n", b"\r\n").replace(b"Kestrel Ridge", b"Kestrel R\xefdge"))
    assert laboratories(path)["KRL"] == "Kestrel R\u00efdge"
    assert exact.seconds(read_circular(path, "BIM").offset(utc(54129))) == pytest.approx(5083.0e-9, rel=0, abs=2e-16)
