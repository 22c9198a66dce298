"""Coefficient files of the ICGEM layout: what is read, what is refused and in which row, and tide systems."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pyshtools
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tscale.earth.gravity import HarmonicField
from tscale.errors import DataFileError, InvalidInput

INVENTED = Path(__file__).parent / "data" / "invented_field.gfc"
TEXT = INVENTED.read_text(encoding="ascii")
LINES = TEXT.splitlines()


def row_of(start: str) -> int:
    """Row of the first line that begins so, counted from 1."""
    return next(i for i, line in enumerate(LINES, start=1) if line.startswith(start))


def with_row(start: str, new: str) -> str:
    """Text of the file with one line replaced."""
    changed = list(LINES)
    changed[row_of(start) - 1] = new
    return "\n".join(changed) + "\n"


def without(start: str) -> str:
    return "\n".join(line for line in LINES if not line.startswith(start)) + "\n"


def cut_after(start: str) -> str:
    return "\n".join(LINES[: row_of(start)]) + "\n"


def test_the_file_is_read() -> None:
    field = HarmonicField.load(INVENTED)
    assert (field.name, field.max_degree, field.tide_system) == ("INVENTED-6", 6, "tide_free")
    assert (field.gm_m3_s2, field.radius_m) == (3.986004415e14, 6378136.3)
    assert field.c[0, 0] == 1.0
    assert not field.c[1].any()  # rows of degree 1 are not given
    assert field.c[2, 0] == -4.7e-4
    # Row by row with a reading of its own.
    for line in LINES[row_of("end_of_head") :]:
        _, n, m, c, s, *_ = line.replace("D", "e").split()
        assert (field.c[int(n), int(m)], field.s[int(n), int(m)]) == (float(c), float(s))
    assert np.count_nonzero(field.c[2:]) == 25


def test_the_file_as_a_library_reads_it() -> None:
    # pyshtools' own reader of the layout.
    field = HarmonicField.load(INVENTED)
    (c, s), gm, radius = pyshtools.shio.read_icgem_gfc(str(INVENTED), encoding="ascii")
    np.testing.assert_array_equal(field.c, c)
    np.testing.assert_array_equal(field.s, s)
    assert (field.gm_m3_s2, field.radius_m) == (gm, radius)


def test_a_file_that_a_library_wrote(tmp_path: Path) -> None:
    rng = np.random.default_rng(8)
    c, s = np.tril(rng.normal(size=(2, 12, 12))) * 1e-6
    c[0, 0], s[:, 0] = 1.0, 0.0
    path = tmp_path / "written.gfc"
    pyshtools.shio.write_icgem_gfc(
        str(path), np.array([c, s]), modelname="W", gm=4.9e12, r0=1.738e6, errors=np.full((2, 12, 12), 1e-12)
    )
    field = HarmonicField.load(path)
    assert (field.name, field.gm_m3_s2, field.radius_m, field.tide_system) == ("W", 4.9e12, 1.738e6, "unknown")
    np.testing.assert_array_equal(field.c, c)
    np.testing.assert_array_equal(field.s, s)


def test_a_lower_degree() -> None:
    whole, part = HarmonicField.load(INVENTED), HarmonicField.load(str(INVENTED), max_degree=4)
    assert part.max_degree == 4
    np.testing.assert_array_equal(part.c, whole.c[:5, :5])
    np.testing.assert_array_equal(part.s, whole.s[:5, :5])
    for degree in (1, 7, 2.0, True):
        with pytest.raises(InvalidInput, match="integer of 2 to 6"):
            HarmonicField.load(INVENTED, max_degree=degree)  # type: ignore[arg-type]


@given(
    degree=st.integers(2, 9),
    size=st.floats(1e-30, 1e-3),
    seed=st.integers(0, 1000),
    tide=st.sampled_from(["tide_free", "zero_tide", "mean_tide", "unknown"]),
)
def test_round_trip(tmp_path_factory: pytest.TempPathFactory, degree: int, size: float, seed: int, tide: str) -> None:
    rng = np.random.default_rng(seed)
    c, s = np.tril(rng.normal(size=(2, degree + 1, degree + 1))) * size
    c[0, 0], s[:, 0] = 1.0, 0.0
    field = HarmonicField("Any body", 42828.375816e9, 3396.2e3, c, s, tide)
    path = tmp_path_factory.mktemp("gfc") / "field.gfc"
    field.save(path)
    back = HarmonicField.load(path)
    assert (back.name, back.gm_m3_s2, back.radius_m, back.tide_system) == ("Any_body", 42828.375816e9, 3396.2e3, tide)
    np.testing.assert_array_equal(back.c, c)
    np.testing.assert_array_equal(back.s, s)
    assert [p.name for p in path.parent.iterdir()] == ["field.gfc"]


GOOD = "gfc 3 1 1e-6 1e-6 1e-11 1e-11"
ROW = row_of("gfc    3    1")
DAMAGES = {
    "an empty file": ("", 0, "ends before end_of_head"),
    "a head without end": (without("end_of_head"), row_of("gfc") - 1, "before end_of_head"),
    "a file cut off in its head": (cut_after("radius  "), row_of("radius  "), "ends before end_of_head"),
    "a file cut off between rows": (cut_after("gfc    5    2"), row_of("gfc    5    2"), "first degree 5, order 3"),
    "a file cut off in a row": (TEXT[:-20], len(LINES), "cut off"),
    "a row left out": (without("gfc    4    2"), len(LINES) - 1, "first degree 4, order 2"),
    "a row of one word": (with_row("gfc    3    1", "gfc"), ROW, "got one word"),
    "a row too long": (with_row("gfc    3    1", GOOD + " 7"), ROW, "7 columns"),
    "a row twice": (with_row("gfc    3    1", GOOD.replace("3 1", "3 2")), ROW + 1, f"row {ROW} already"),
    "a row of time without an epoch": (with_row("gfc    3    1", "trnd" + GOOD[3:]), ROW, "give epoch_jyear"),
    "an unknown keyword": (with_row("gfc    3    1", GOOD.replace("gfc", "gfx")), ROW, "unknown keyword 'gfx'"),
    "a keyword of a later layout": (with_row("gfc    3    1", "gfcs" + GOOD[3:]), ROW, "unknown keyword"),
    "text for C": (with_row("gfc    3    1", GOOD.replace("1e-6", "1e-6x")), ROW, "C must be a finite number"),
    "nan for C": (with_row("gfc    3    1", GOOD.replace("1e-6", "nan")), ROW, "C must be a finite number"),
    "an overflow": (with_row("gfc    3    1", GOOD.replace("1e-6", "1e999")), ROW, "C must be a finite number"),
    "an underscore": (with_row("gfc    3    1", GOOD.replace("1e-6", "1_0e-6")), ROW, "C must be a finite number"),
    "a negative sigma": (with_row("gfc    3    1", GOOD.replace("1e-11", "-1e-11")), ROW, "not be negative"),
    "an order above its degree": (with_row("gfc    3    1", GOOD.replace("3 1", "3 4")), ROW, "order M"),
    "a degree above the highest": (with_row("gfc    3    1", GOOD.replace("3 1", "7 1")), ROW, "degree L"),
    "a degree that is no integer": (with_row("gfc    3    1", GOOD.replace("3 1", "3.0 1")), ROW, "degree L"),
    "S of order zero": (with_row("gfc    3    0", GOOD.replace("3 1", "3 0")), ROW - 1, "S of order 0 must be 0"),
    "another degree 0": (with_row("gfc    0    0", "gfc 0 0 0.0 0.0 0 0"), row_of("gfc    0    0"), "must be 1"),
    "another product": (
        with_row("product_type", "product_type topography"),
        row_of("product_type"),
        "allowed is gravity_field",
    ),
    "another normalisation": (with_row("norm ", "norm unnormalized"), row_of("norm "), "allowed is fully_normalized"),
    "a later format": (with_row("comment", "format icgem3.0"), row_of("comment"), "icgem1.0, icgem2.0"),
    "an unknown tide system": (with_row("tide_system", "tide_system ebb"), row_of("tide_system"), "tide_free"),
    "unknown errors": (with_row("errors", "errors some"), row_of("errors"), "calibrated"),
    "no radius": (without("radius  "), row_of("end_of_head") - 1, "lacks radius"),
    "no GM": (without("earth_gravity"), row_of("end_of_head") - 1, "lacks earth_gravity_constant"),
    "two GM": (with_row("comment", "gravity_constant 4e14"), row_of("end_of_head"), "gives both"),
    "a radius of 0": (with_row("radius  ", "radius 0.0"), row_of("radius  "), "radius must lie within"),
    "a radius of text": (with_row("radius  ", "radius big"), row_of("radius  "), "radius must be a finite number"),
    "a keyword without value": (with_row("modelname", "modelname"), row_of("modelname"), "has no value"),
    "a keyword twice": (with_row("comment", "max_degree 6"), row_of("comment"), "already"),
    "a degree in words": (with_row("max_degree", "max_degree six"), row_of("max_degree"), "max_degree must be"),
}


@pytest.mark.parametrize("damage", DAMAGES)
def test_damage_is_told_with_its_row(tmp_path: Path, damage: str) -> None:
    text, row, words = DAMAGES[damage]
    path = tmp_path / "damaged.gfc"
    path.write_text(text, encoding="ascii")
    with pytest.raises(DataFileError, match=words) as caught:
        HarmonicField.load(path)
    assert caught.value.row == row
    assert caught.value.path == path
    assert f"row {row}" in str(caught.value)


V1 = {
    "format": "format icgem1.0",
    "gfct": "gfct 3 1 -1.0e-6 2.0e-6 1e-11 1e-11 20050101",
    "rest": [
        "trnd 3 1 4.0e-9 -3.0e-9 1e-12 1e-12",
        "acos 3 1 5.0e-9 6.0e-9 1e-12 1e-12 1.0",
        "asin 3 1 7.0e-9 8.0e-9 1e-12 1e-12 1.0",
        "acos 3 1 1.0e-9 9.0e-9 1e-12 1e-12 0.5",
    ],
}
V2 = {
    "format": "format icgem2.0",
    "gfct": "gfct 3 1 -1.0e-6 2.0e-6 1e-11 1e-11 20050101.0000 20150101.1200",
    "rest": [
        "trnd 3 1 4.0e-9 -3.0e-9 1e-12 1e-12 20050101.0000 20150101.1200",
        "acos 3 1 5.0e-9 6.0e-9 1e-12 1e-12 20050101.0000 20150101.1200 1.0",
        "asin 3 1 7.0e-9 8.0e-9 1e-12 1e-12 20050101.0000 20150101.1200 1.0",
        "acos 3 1 1.0e-9 9.0e-9 1e-12 1e-12 20050101.0000 20150101.1200 0.5",
    ],
}


def varying(tmp_path: Path, rows: dict[str, object], more: list[str] | None = None) -> Path:
    """The file with a coefficient that varies with time in either version of the layout."""
    assert isinstance(rows["rest"], list)
    text = with_row("gfc    3    1", "\n".join([str(rows["gfct"]), *rows["rest"], *(more or [])]))
    path = tmp_path / "varying.gfc"
    path.write_text(text.replace(LINES[row_of("comment") - 1], str(rows["format"])), encoding="ascii")
    return path


@pytest.mark.parametrize("rows", [V1, V2], ids=["icgem1.0", "icgem2.0"])
def test_a_model_that_varies_with_time(tmp_path: Path, rows: dict[str, object]) -> None:
    path = varying(tmp_path, rows)
    start = 2000.0 + (1826.5 / 365.25)  # 2005-01-01 is 1826.5 d after 2000-01-01 12h
    for epoch in (2005.01, 2009.37, 2014.999):
        field = HarmonicField.load(path, epoch_jyear=epoch)
        t, turn = epoch - start, 2 * np.pi * (epoch - start)
        c = -1e-6 + 4e-9 * t + 5e-9 * np.cos(turn) + 7e-9 * np.sin(turn) + 1e-9 * np.cos(2 * turn)
        s = 2e-6 - 3e-9 * t + 6e-9 * np.cos(turn) + 8e-9 * np.sin(turn) + 9e-9 * np.cos(2 * turn)
        assert field.c[3, 1] == pytest.approx(c, abs=1e-20, rel=0)
        assert field.s[3, 1] == pytest.approx(s, abs=1e-20, rel=0)
    # pyshtools counts calendar years: up to a day from Julian ones, 0.003 yr of 8e-8 per year (9e-9 twice a year).
    (c_all, s_all), *_ = pyshtools.shio.read_icgem_gfc(str(path), epoch="20090516", encoding="ascii")
    field = HarmonicField.load(path, epoch_jyear=2009.0 + 135.0 / 365.25)
    np.testing.assert_allclose(field.c, c_all, rtol=0, atol=4e-10)
    np.testing.assert_allclose(field.s, s_all, rtol=0, atol=4e-10)
    assert np.max(np.abs(field.s - s_all)) > 0.0
    # Rows of a degree that is not asked for are not in the way.
    assert HarmonicField.load(path, max_degree=2, epoch_jyear=2010.0).max_degree == 2


def test_time_needs_an_epoch(tmp_path: Path) -> None:
    with pytest.raises(DataFileError, match="give epoch_jyear") as caught:
        HarmonicField.load(varying(tmp_path, V1))
    assert caught.value.row == ROW
    for epoch in (2000.0, 2015.1):
        with pytest.raises(DataFileError, match="outside the intervals") as caught:
            HarmonicField.load(varying(tmp_path, V2), epoch_jyear=epoch)
        assert caught.value.row == ROW + 4
    with pytest.raises(InvalidInput, match="1800 to 2200"):
        HarmonicField.load(INVENTED, epoch_jyear=20260101.0)
    static = HarmonicField.load(INVENTED, epoch_jyear=2026.0)
    np.testing.assert_array_equal(static.c, HarmonicField.load(INVENTED).c)


@pytest.mark.parametrize(
    ("rows", "words"),
    [
        ("trnd 4 1 1e-9 1e-9 0 0", "no row gfct"),
        ("trnd 3 1 1e-9 1e-9 0 0 20050101", "7 columns"),
        ("acos 3 1 1e-9 1e-9 0 0", "8 columns"),
        ("acos 3 1 1e-9 1e-9 0 0 -1.0", "period must be"),
        ("gfct 4 9 1e-9 1e-9 0 0 20050101", "order M"),
        ("gfct 3 1 1e-9 1e-9 0 0 20050101", "already"),
        ("gfct 3 1 1e-9 1e-9 0 0 20051301", "yyyymmdd"),
        ("gfct 3 1 1e-9 1e-9 0 0 2005", "yyyymmdd"),
    ],
)
def test_damage_in_rows_of_time(tmp_path: Path, rows: str, words: str) -> None:
    path = varying(tmp_path, V1, [rows])
    with pytest.raises(DataFileError, match=words) as caught:
        HarmonicField.load(path, epoch_jyear=2010.0)
    assert caught.value.row == ROW + 5


def test_an_interval_that_ends_before_it_begins(tmp_path: Path) -> None:
    path = varying(tmp_path, V2, ["trnd 3 1 0 0 0 0 20150101 20050101"])
    with pytest.raises(DataFileError, match="ends before it begins"):
        HarmonicField.load(path, epoch_jyear=2010.0)


def test_other_files(tmp_path: Path) -> None:
    with pytest.raises(DataFileError, match="cannot read"):
        HarmonicField.load(tmp_path / "nowhere.gfc")
    with pytest.raises(DataFileError, match="cannot read"):
        HarmonicField.load(tmp_path)
    noise = tmp_path / "noise.gfc"
    noise.write_bytes(np.random.default_rng(3).bytes(5000))
    with pytest.raises(DataFileError, match="end_of_head"):
        HarmonicField.load(noise)
    with pytest.raises(InvalidInput, match="takes the path"):
        HarmonicField.load(7)  # type: ignore[arg-type]
    with pytest.raises(InvalidInput, match="takes the path"):
        HarmonicField.load(INVENTED).save(None)  # type: ignore[arg-type]
    low = HarmonicField("low", 4e14, 6.4e6, np.eye(1), np.zeros((1, 1)))
    with pytest.raises(InvalidInput, match="degree 2 at least"):
        low.save(tmp_path / "low.gfc")


def test_a_degree_beyond_what_is_evaluated(tmp_path: Path) -> None:
    path = tmp_path / "large.gfc"
    path.write_text(with_row("max_degree", "max_degree 5540"), encoding="ascii")
    with pytest.raises(InvalidInput, match="at most 2700"):
        HarmonicField.load(path)
    assert HarmonicField.load(path, max_degree=6).max_degree == 6


def test_tide_systems() -> None:
    # EGM2008 gives C20 in both systems, made with k20 = 0.3: tide-free -0.484165143790815e-3, zero-tide
    # -0.484169317366974e-3 (Pavlis et al. 2012; both from memory): the last digits tell A0 H0 to 4 digits.
    c = np.zeros((3, 3))
    c[0, 0], c[2, 0] = 1.0, -0.484165143790815e-3
    free = HarmonicField("two", 3.986004415e14, 6378136.3, c, np.zeros((3, 3)), "tide_free")
    zero = free.in_tide_system("zero_tide", k20=0.3)
    assert zero.tide_system == "zero_tide"
    assert zero.c[2, 0] == pytest.approx(-0.484169317366974e-3, abs=1e-12, rel=0)
    # TN36 section 6.1 with its k20 = 0.30190: -0.48416948e-3 in zero-tide.
    assert free.in_tide_system("zero_tide").c[2, 0] == pytest.approx(-0.48416948e-3, abs=2e-10, rel=0)
    # Permanent tide in the mean-tide system: A0 H0 = -1.3914e-8 (TN36 eq. 6.14).
    mean = zero.in_tide_system("mean_tide")
    assert mean.c[2, 0] - zero.c[2, 0] == pytest.approx(-1.3914e-8, abs=1e-12, rel=0)
    back = mean.in_tide_system("tide_free", k20=0.3)
    assert back.c[2, 0] == pytest.approx(free.c[2, 0], abs=1e-18, rel=0)


def test_tide_systems_that_are_refused() -> None:
    c = np.diag([1.0, 0.0, 0.0])
    nothing = HarmonicField("two", 4e14, 6378136.3, c, np.zeros((3, 3)))
    with pytest.raises(InvalidInput, match="does not say its tide system"):
        nothing.in_tide_system("zero_tide")
    moon = HarmonicField("Moon", 4.9e12, 1.738e6, c, np.zeros((3, 3)), "zero_tide")
    with pytest.raises(InvalidInput, match="not one of the Earth"):
        moon.in_tide_system("tide_free")
    for system, k20 in (("unknown", 0.3), ("tide_free", 30.0)):
        with pytest.raises(InvalidInput, match=r"tide_free|k20"):
            HarmonicField("two", 4e14, 6378136.3, c, np.zeros((3, 3)), "zero_tide").in_tide_system(system, k20=k20)
