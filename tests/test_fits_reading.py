"""Times read out of FITS tables: exact, in blocks, of every number type; damaged files."""

from __future__ import annotations

from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from astropy.io import fits
from astropy.table import Table
from astropy.time import Time

import tscale
from tscale.errors import DataFileError, InvalidInput
from tscale.fits import instant_blocks, read_good_time, read_instants
from tscale.fits.layout import read_layout

from .fits_support import event_file, events, good_time, header, save, times, with_place


def test_events_are_read_exactly(tmp_path: Path) -> None:
    t = times()
    got = read_instants(event_file(tmp_path / "e.fits", t))
    assert str(got.node) == "TT@TOPOCENTER"
    origin = (51910 + Fraction("0.00074287037037037") - Fraction("51544.5")) * 86400
    for whole, fraction, value in zip(got.whole.tolist(), got.fraction.tolist(), t.tolist(), strict=True):
        # The only rounding is that of the fraction of a count, and of the reference: half of 0.11 fs each.
        assert abs(whole + Fraction(fraction) - (origin + Fraction(value))) < Fraction(2, 10**16)


def test_blocks_are_the_same_and_small(tmp_path: Path) -> None:
    path = event_file(tmp_path / "e.fits")
    blocks = list(instant_blocks(path, rows=77))
    assert {block.size for block in blocks[:-1]} == {77}
    assert np.all(tscale.Instants.concatenate(blocks) == read_instants(path))
    with pytest.raises(InvalidInput, match="rows must be"):
        next(instant_blocks(path, rows=0))
    empty = save(tmp_path / "none.fits", events(header(), times(0)))
    assert read_instants(empty).shape == (0,)


def test_good_time(tmp_path: Path) -> None:
    t = times()
    path = event_file(tmp_path / "e.fits", t)
    good = read_good_time(path)
    assert str(good.start.node) == "TT@TOPOCENTER"
    assert np.array_equal(good.stop.minus(good.start), [1000.0, t[-1] - (t[0] + 2000)])
    inside = (read_instants(path) >= good.start[0]) & (read_instants(path) <= good.stop[0])
    assert np.array_equal(inside, t <= t[0] + 1000)
    two = save(tmp_path / "two.fits", good_time(header(), [1.0], [2.0]), good_time(header(), [5.0], [4.0], "GTI_B"))
    with pytest.raises(InvalidInput, match=r"name the extension.*HDU 1 \(GTI\), HDU 2 \(GTI_B\)"):
        read_good_time(two)
    assert read_good_time(two, "GTI").start.shape == (1,)
    with pytest.raises(DataFileError, match="interval 1 ends before it begins"):
        read_good_time(two, "GTI_B")


@pytest.mark.parametrize("kind", ["1D", "1E", "1I", "1J", "1K"])
def test_numbers_of_every_type(tmp_path: Path, kind: str) -> None:
    t = np.array([0, 7, 3000])
    found = read_instants(save(tmp_path / "e.fits", events(header(), t, time_format=kind)))
    assert np.array_equal(found.minus(found[:1]), t)


def test_undefined_times_carry_their_mask(tmp_path: Path) -> None:
    t = times(9)
    t[[2, 5]] = np.nan
    path = save(tmp_path / "e.fits", events(header(), t))
    with pytest.raises(InvalidInput, match=r"EVENTS.*column TIME, the first in row 3: 2 of 9 times") as caught:
        read_instants(path)
    assert caught.value.mask is not None
    assert np.flatnonzero(caught.value.mask).tolist() == [2, 5]


def test_bins_are_dated_at_their_centre(tmp_path: Path) -> None:
    path = save(tmp_path / "e.fits", events(header(TIMEDEL=0.5, TIMEPIXR=0.0), times(5)))
    moved = read_instants(path, bin_centre=True).minus(read_instants(path))
    assert np.max(np.abs(moved - 0.25)) < 3e-16  # counts resolve 0.1 fs
    # The default of the standard is the centre itself.
    path = save(tmp_path / "e.fits", events(header(TIMEDEL=0.5), times(5)))
    assert np.all(read_instants(path, bin_centre=True).minus(read_instants(path)) == 0.0)


def test_extensions_are_named_or_asked_for(tmp_path: Path) -> None:
    one, two = events(header(), times(3)), events(header(), times(4))
    two.ver = 2
    path = save(tmp_path / "e.fits", one, two)
    with pytest.raises(InvalidInput, match=r"2 extensions are 'EVENTS'.*EXTVER 2"):
        read_instants(path)
    assert read_instants(path, ("EVENTS", 2)).shape == (4,)
    assert read_instants(path, 1).shape == (3,)
    with pytest.raises(InvalidInput, match="no extension is 'LIST'"):
        read_instants(path, "LIST")
    with pytest.raises(InvalidInput, match="no column 'WHEN'; it has PI, TIME, XYZ, FLAGS, WAVE"):
        read_instants(path, 1, "WHEN")
    with pytest.raises(InvalidInput, match="column XYZ is 3E"):
        read_instants(path, 1, "XYZ")
    with pytest.raises(InvalidInput, match="no binary table"):
        read_instants(path, 0)


def test_frames_are_inherited_where_the_header_says_so(tmp_path: Path) -> None:
    bare = fits.Header()
    path = save(tmp_path / "e.fits", events(bare, times(3)), primary=header())
    with pytest.raises(DataFileError, match="neither TIMESYS nor a reference time"):
        read_instants(path)
    bare["INHERIT"] = True
    path = save(tmp_path / "e.fits", events(bare, times(3)), primary=header())
    own = save(tmp_path / "own.fits", events(header(), times(3)))
    assert np.all(read_instants(path) == read_instants(own))
    said = read_instants(save(tmp_path / "b.fits", events(fits.Header(), times(3))), cards=header())
    assert np.all(said == read_instants(own))


@pytest.mark.parametrize(
    ("reference", "value"),
    [
        ({"MJDREF": 51910.25}, 51910.25),
        ({"JDREF": 2451910.75}, 51910.25),
        ({"DATEREF": "2001-01-01T06:00:00"}, 51910.25),
    ],
)
def test_astropy_reads_the_same_times(tmp_path: Path, reference: dict[str, Any], value: float) -> None:
    found = with_place(header(MJDREFI=None, MJDREFF=None, **reference))
    path = save(tmp_path / "e.fits", events(found, times(40)))
    theirs = Table.read(path, hdu="EVENTS", astropy_native=True)["TIME"]
    assert theirs.scale == "tt"
    # Times of 7e8 s are read by astropy as days in two float64, to some 10 ps.
    ours = read_instants(path)
    assert np.max(np.abs(ours.at(None) - tscale.interop.from_astropy(Time(theirs)))) < 2e-11
    assert np.allclose(theirs.location.geocentric[0].to_value("m"), found["OBSGEO-X"], rtol=0, atol=1e-6)


def test_astropy_leaves_the_two_part_reference_out(tmp_path: Path) -> None:
    # The standard puts MJDREFI and MJDREFF before MJDREF; astropy (8.0) does not know them, and says nothing.
    path = save(tmp_path / "e.fits", events(with_place(header()), times(3)))
    theirs = Table.read(path, hdu="EVENTS", astropy_native=True)["TIME"]
    assert abs(theirs[0].mjd - 7.0e8 / 86400) < 0.1  # days since 1858
    assert str(read_instants(path)[0].to_iso(0)) == "2023-03-08T21:01:49"


def damaged(path: Path, change: Any) -> Path:
    data = bytearray(event_file(path).read_bytes())
    path.write_bytes(change(data))
    return path


def replaced(before: bytes, after: bytes, nth: int = 0) -> Any:
    def change(data: bytearray) -> bytes:
        parts = bytes(data).split(before)
        assert len(parts) > nth + 1
        return before.join(parts[: nth + 1]) + after + before.join(parts[nth + 1 :])

    return change


@pytest.mark.parametrize(
    ("change", "words"),
    [
        (lambda data: data[:12000], "cut off: HDU 1 needs"),
        (lambda data: data[:4000], "cut off in the header of HDU 1"),
        (lambda data: data[:-1], "cut off: HDU 3"),
        (lambda data: b"", "no FITS file"),
        (lambda data: b"PK" + bytes(data), "no FITS file"),
        (lambda data: b"\x1f\x8b" + bytes(data), "compressed by gzip"),
        (lambda data: bytes(data) + b"x" * 2880, "where the header of HDU 4 should begin"),
        (replaced(b"NAXIS2  =                  500", b"NAXIS2  =                  100"), "wrong size"),
        (replaced(b"NAXIS2  =                  500", b"NAXIS2  =                 9500"), "cut off"),
        (replaced(b"NAXIS2  =                  500", b"NAXIS2  =                  -50"), "NAXIS2 must be"),
        (replaced(b"NAXIS1  =                   32", b"NAXIS1  =                   31"), "take 32 bytes a row"),
        (replaced(b"TFORM1  = '1I      '", b"TFORM1  = '1?      '"), "TFORM1 is '1?'"),
        (replaced(b"BITPIX  =                    8", b"BITPIX  =                    9"), "BITPIX is 9"),
        (replaced(b"TTYPE1  = 'PI      '", b"TTYPE1  = 'TIME    '"), "2 columns are named TIME"),
        (replaced(b"TFIELDS ", b"TFIELD\xff "), "no ASCII"),
    ],
)
def test_damaged_files_are_told(tmp_path: Path, change: Any, words: str) -> None:
    path = damaged(tmp_path / "e.fits", change)
    with pytest.raises(DataFileError) as caught:
        read_instants(path, 1)
    assert words in str(caught.value)
    assert caught.value.path == path


def test_a_missing_file_is_told(tmp_path: Path) -> None:
    with pytest.raises(DataFileError, match="No such file"):
        read_layout(tmp_path / "none.fits")
