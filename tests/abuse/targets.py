"""What is fuzzed: for every reader of text, bytes or files one function of the bytes that hands them to it.

A target returns where its reader took the input, raises `TscaleError` where the reader refused it, and any other
outcome is a fault: another exception, a warning of numpy, an input that takes seconds or a gigabyte.
"""

from __future__ import annotations

import contextlib
import hashlib
import io
import os
import tempfile
from collections.abc import Callable, Iterable
from pathlib import Path
from typing import Any

import numpy as np

import tscale
from tscale import timecodes
from tscale.earth.gravity import HarmonicField
from tscale.ephemeris.time_ephemeris import TimeEphemeris
from tscale.errors import TscaleError
from tscale.exact import Pair
from tscale.files import DelimitedReader, read_dates, write_dates
from tscale.formats.leap_seconds import LeapSeconds
from tscale.scales import Node
from tscale.surface import SurfaceSite
from tscale.tables.circular_t import circular_notes, laboratories, read_circular
from tscale.tables.earth_orientation import EarthOrientation
from tscale.tables.tt_bipm import TTBIPM

__all__ = ["CORPUS", "TARGETS", "Target", "seeds_of"]

CORPUS = Path(__file__).parent / "corpus"
Target = Callable[[bytes], object]
SCALES = ("UTC", "TT", "TDB", "UTC(KRL)", "GPS", "GLONASS", "TCL", "CLOCK(maser)")
TARGETS: dict[str, Target] = {}
_SMALL_MEMORY = Path("/dev/shm") if os.access("/dev/shm", os.W_OK) else None
_FOLDER = tempfile.TemporaryDirectory(prefix="tscale-fuzz-", dir=_SMALL_MEMORY)


def seeds_of(name: str) -> list[bytes]:
    """The corpus of a target: inputs that it takes, and some that it once did not stand."""
    return [path.read_bytes() for path in sorted((CORPUS / name).iterdir())]


def target(function: Target) -> Target:
    TARGETS[function.__name__.rstrip("_")] = function
    return function


def on_file(name: str, file: str, read: Callable[[Path], object]) -> None:
    """A target whose reader wants a path."""

    def run(data: bytes) -> None:
        path = Path(_FOLDER.name) / file
        path.write_bytes(data)
        read(path)

    TARGETS[name] = run


def text_of(data: bytes) -> str:
    return data.decode("utf-8", "surrogateescape")


def first_of(data: bytes, choices: Iterable[Any]) -> tuple[Any, bytes]:
    """Let the first byte choose."""
    listed = list(choices)
    return listed[(data[0] if data else 0) % len(listed)], data[1:]


def checked(t: tscale.Instants) -> tscale.Instants:
    """What every array of dates keeps to."""
    assert t.whole.dtype == np.int64
    assert ((t.fraction >= 0.0) & (t.fraction < 1.0)).all(), t.fraction
    return t


# ---- texts -----------------------------------------------------------------------------------------


@target
def iso_dates(data: bytes) -> None:
    scale, rest = first_of(data, SCALES)
    texts = text_of(rest).split("\n")
    t = checked(tscale.Instants.from_iso(texts, scale))
    # Resolution is 1e-16 s: with 15 decimals the text comes back to the same 1e-15 s.
    again = tscale.Instants.from_iso(t.to_iso(15), scale)
    assert np.abs(again.minus(t)).max() < 1.1e-15


@target
def date_text(data: bytes) -> None:
    (layout, scale), rest = first_of(data, [(la, sc) for la in ("mjd", "jd", "seconds") for sc in ("UTC", "TT", "GPS")])
    t = checked(read_dates(text_of(rest).split("\n"), layout, scale))
    again = read_dates(write_dates(t, layout), layout, scale)
    assert np.abs(again.minus(t)).max() < 1e-12


@target
def nodes(data: bytes) -> None:
    start, _, end = text_of(data).partition("\n")
    chain = tscale.chain(start, end)
    assert chain.start.scale == Node.parse(start).scale
    str(chain)


@target
def numbers(data: bytes) -> None:
    """Bytes as the integers and floats that the makers of dates take."""
    which, rest = first_of(data, range(12))
    n = len(rest) // 16
    whole = np.frombuffer(rest[: 8 * n], "<i8")
    real = np.frombuffer(rest[8 * n : 16 * n], "<f8")
    t = checked(_made(which, whole, real))
    t.to_iso(9)
    t.to_mjd()
    t.to_jd()
    t.shifted(real)
    t.minus(t[:1])


def _made(which: int, whole: np.ndarray, real: np.ndarray) -> tscale.Instants:
    if which < 6:
        make = (tscale.Instants.from_seconds, tscale.Instants.from_mjd, tscale.Instants.from_jd)[which // 2]
        return make(whole, real, scale=("UTC", "TT")[which % 2])
    if which == 6:
        return timecodes.from_posix(whole, real)
    if which == 7:
        return timecodes.from_posix(whole, real, smear="noon to noon", repeated="raise")
    if which == 8:
        return timecodes.from_ntp(whole, whole[::-1], era=0)
    if which == 9:
        return timecodes.from_ptp(whole, whole[::-1], whole)
    if which == 10:
        return timecodes.from_gnss_week(whole, whole[::-1], real, scale="GST", modulo=4096, pivot=_PIVOT)
    fields = [whole[i::6][: len(whole) // 6] for i in range(6)]
    return timecodes.from_calendar(*fields, scale="UTC")


_PIVOT = tscale.Instants.from_iso("2025-01-01", "GST")


@target
def datetime64(data: bytes) -> None:
    unit, rest = first_of(data, ("Y", "M", "W", "D", "h", "m", "s", "ms", "us", "ns", "ps", "fs", "as"))
    whole = np.frombuffer(rest[: len(rest) // 8 * 8], "<i8")
    t = checked(timecodes.from_datetime64(whole.view(f"<M8[{unit}]"), "UTC"))
    timecodes.to_datetime64(t, "ns")


@target
def space_codes(data: bytes) -> None:
    """The binary codes of CCSDS 301.0-B, with a P-field of their own or agreed on."""
    which, rest = first_of(data, range(8))
    read, write = (
        (timecodes.ccsds.from_cuc, timecodes.ccsds.to_cuc),
        (timecodes.ccsds.from_cds, timecodes.ccsds.to_cds),
        (timecodes.ccsds.from_ccs, timecodes.ccsds.to_ccs),
        (timecodes.ccsds.from_ascii, timecodes.ccsds.to_ascii),
    )[which % 4]
    if which % 4 == 3:
        t = read(text_of(rest).split("\n"))
    elif which < 4:
        t = read(rest)
    else:
        t = read(rest[1:], p_field=rest[:1])
    write(checked(t))


@target
def delimited(data: bytes) -> None:
    (delimiter, rows), rest = first_of(data, [(",", 1), (",", 100), (";", 3), ("\t", 100), ("|", 2)])
    stream = io.TextIOWrapper(io.BytesIO(rest), encoding="utf-8", errors="surrogateescape", newline="")
    reader = DelimitedReader(stream, "input", delimiter=delimiter)
    texts = []
    for block in reader.blocks(rows):
        assert len(block.column) == len(block.texts) == len(block.lines) <= rows
        texts.append(block.merged([""] * len(block), reader.newline))
    text = "".join(line + reader.newline for line in [*reader.preamble, reader.header_text]) + "".join(texts)
    # Nothing is lost but line ends and the mark of byte order.
    assert _bare(text) == _bare(rest.decode("utf-8").removeprefix("\ufeff"))


def _bare(text: str) -> str:
    return text.replace("\r", "").replace("\n", "")


@target
def json_(data: bytes) -> None:
    from tscale.serial import from_json, to_json

    made = from_json(data, tables="any")
    if not isinstance(made, dict):
        to_json(made)


# ---- tables ----------------------------------------------------------------------------------------


def _leap_seconds(path: Path) -> None:
    table = LeapSeconds.load(path)
    tscale.Instants.from_iso("2020-06-01", "UTC", leap_seconds=table).to_iso(leap_seconds=table)


def _earth_orientation(path: Path) -> None:
    table = EarthOrientation.load(path)
    table.at(_middle_of_days(table.span))


def _tt_bipm(path: Path) -> None:
    table = TTBIPM.load(path)
    table.offset_s(_middle_of_days(table.span))


def _middle_of_days(span: tuple[int, int]) -> Pair:
    start, stop = (np.int64(mjd - 51544) * 86400 - 43200 + 32 for mjd in span)
    return np.array([(start + stop) // 2]), np.array([0.25])


def _circular(path: Path) -> None:
    found = laboratories(path)
    name = next(iter(found))
    circular_notes(path, name)
    read_circular(path, name, uncertainty_s=1e-9)


def _clock_log(path: Path) -> None:
    log = tscale.ClockLog.load(path)
    middle = log.span[0].shifted(float(log.span[1].minus(log.span[0])) / 2)
    with contextlib.suppress(TscaleError):  # a gap
        log.to_clock(middle.pair)


def _clock_inspection(path: Path) -> None:
    str(tscale.ClockLog.inspect(path))


def _leap_list(path: Path) -> None:
    """The layout with a checksum, which is made to fit so that what lies behind it is reached."""
    lines = [line for line in path.read_bytes().splitlines() if not line.startswith(b"#h")]
    heads = [line[2:].strip() for mark in (b"#$", b"#@") for line in lines if line.startswith(mark)]
    rows = ["".join(line.decode("utf-8", "replace").partition("#")[0].split()).encode() for line in lines]
    digest = hashlib.sha1(b"".join(heads + rows)).hexdigest()
    words = " ".join(digest[i : i + 8] for i in range(0, 40, 8))
    path.write_bytes(b"\n".join([*lines, b"#h " + words.encode(), b""]))
    _leap_seconds(path)


on_file("leap_list", "leap.list", _leap_list)
on_file("leap_seconds", "leap.txt", _leap_seconds)
on_file("earth_orientation", "finals.txt", _earth_orientation)
on_file("tt_bipm", "TTBIPM.23", _tt_bipm)
on_file("circular", "cirt.txt", _circular)
on_file("clock_log", "maser.csv", _clock_log)
on_file("clock_inspection", "maser.csv", _clock_inspection)


# ---- places and ways -------------------------------------------------------------------------------


_TT = (np.array([638_000_000, 638_000_777]), np.array([0.25, 0.75]))


def _source(path: Path) -> None:
    tscale.Source.load(path).direction(_TT)


def _surface(path: Path) -> None:
    site = SurfaceSite.load(path)
    assert np.isfinite(site.offset(_TT)).all()
    assert np.isfinite(site.gravity_potential_m2_s2())


def _orbit(path: Path) -> None:
    from tscale.cli.link_ends import _from_toml

    _from_toml(path, tscale.ReferenceData.default())


def _project(path: Path) -> None:
    from argparse import Namespace

    from tscale.cli.project import with_project

    with_project(Namespace(project=str(path), site=None, clock=[], orbit=None, source=None, max_gap_s=None))


def _trajectory(make: Callable[[Path], tscale.Trajectory]) -> Callable[[Path], None]:
    def read(path: Path) -> None:
        way = make(path)
        start, stop = way.span
        middle = np.floor(np.clip((start + stop) / 2, -9e17, 9e17)).astype(np.int64).reshape(1)
        for piece in way.pieces:
            with contextlib.suppress(TscaleError):  # between two pieces
                r, v = piece.motion.state((middle, np.array([0.25])))
                assert np.isfinite(r).all()
                assert np.isfinite(v).all()

    return read


def _kernel(path: Path) -> None:
    kernel = tscale.Ephemeris.open(path)
    start, stop = kernel.span
    middle = np.clip((start + stop) / 2, -9e17, 9e17)
    at = np.floor(middle).astype(np.int64).reshape(1), np.array([0.5])
    for body in kernel.bodies:
        with contextlib.suppress(TscaleError):
            kernel.state(body, at)
        with contextlib.suppress(TscaleError):
            kernel.gm_m3_s2(body)


def _time_kernel(path: Path) -> None:
    kernel = TimeEphemeris.open(path)
    start, stop = kernel.span
    kernel.tt_minus_tdb_s((np.array([round((start + stop) / 2)]), np.array([0.5])))


def _gravity(path: Path) -> None:
    field = HarmonicField.load(path)
    field.potential_m2_s2(np.array([7e6, 1e6, -2e6]))


on_file("source_toml", "source.toml", _source)
on_file("surface_toml", "surface.toml", _surface)
on_file("site_toml", "site.toml", lambda path: tscale.Site.load(path))
on_file("end_toml", "end.toml", _orbit)
on_file("project_toml", "project.toml", _project)
on_file("oem", "orbit.oem", _trajectory(tscale.Trajectory.from_oem))
on_file("flight", "flight.csv", _trajectory(tscale.Trajectory.from_flight))
on_file("kernel", "kernel.bsp", _kernel)
on_file("kernel_way", "kernel.bsp", _trajectory(lambda path: tscale.Trajectory.from_spk(path, target=-900)))
on_file("time_kernel", "time.bsp", _time_kernel)
on_file("gravity", "field.gfc", _gravity)


# ---- tables of rows, compiled chains, FITS ---------------------------------------------------------


def _table(path: Path) -> None:
    from tscale.files.arrow_columns import instants_of
    from tscale.files.table_files import TableReader

    reader = TableReader(path)
    for _, batch in reader.batches(1000):
        checked(instants_of(batch, node=None))


def _compiled(path: Path) -> None:
    chain = tscale.load_compiled(path)
    middle = chain.span[0].shifted(float(chain.span[1].minus(chain.span[0])) / 2)
    checked(chain(middle))
    chain.certificate.table()


def _sealed(path: Path) -> None:
    """The same with the seal made to fit, so that what lies behind it is reached."""
    body = path.read_bytes()[:-64]
    path.write_bytes(body + hashlib.sha256(body).hexdigest().encode())
    _compiled(path)


def _fits(path: Path) -> None:
    from tscale import fits

    for read in (fits.read_instants, fits.read_good_time, _fits_frame):
        try:
            read(path)
        except TscaleError as error:
            refused = error
        else:
            refused = None
    if refused is not None:
        raise refused


def _fits_frame(path: Path) -> None:
    from tscale import fits

    header = path.read_bytes()[2880:8640]
    fits.read_time_frame(header)
    fits.site_of(header)
    fits.source_of(header)


def _command(path: Path) -> None:
    """The command on a file: it says what is wrong in one line and returns 2, whatever the file."""
    from tscale.cli.main import main

    out = path.with_name("out.csv")
    out.unlink(missing_ok=True)
    heard = io.StringIO()
    with contextlib.redirect_stderr(heard), contextlib.redirect_stdout(io.StringIO()):
        code = main(["convert", str(path), str(out), "--from", "UTC", "--to", "TT", "--quiet"])
    assert (code == 0) == out.exists()
    if code:
        assert code == 2, heard.getvalue()
        assert heard.getvalue().startswith("tscale: error: "), heard.getvalue()
        raise TscaleError(heard.getvalue())


on_file("parquet", "table.parquet", _table)
on_file("arrow", "table.arrow", _table)
on_file("compiled", "chain.compiled", _compiled)
on_file("compiled_sealed", "chain.compiled", _sealed)
on_file("fits", "events.fits", _fits)
on_file("command", "in.csv", _command)
