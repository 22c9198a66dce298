"""Files of compiled chains: small, the same bytes for the same chain, read with numpy alone, refused when damaged."""

from __future__ import annotations

import hashlib
import io
import json
import subprocess
import sys
import zipfile
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

import tscale
from tscale.compiled.container import FORMAT, VERSION, from_bytes
from tscale.errors import DataFileError

SITE = tscale.Site.from_itrf("north", 1_200_000.0, -4_600_000.0, 4_230_000.0)
SOURCE = tscale.Source(83.6, 22.0, parallax_mas=0.5, name="a pulsar")


def compile_it() -> tscale.CompiledChain:
    epoch = tscale.Instants.from_iso("2020-01-01", scale="UTC").reshape(1).shifted(np.arange(6) * 43_200.5)
    log = tscale.ClockLog.from_rows("maser", epoch, 1e-6 * np.arange(6), missing=np.arange(6) == 3)
    chain = tscale.chain("CLOCK(maser)", "TDB@BARYCENTER", site=SITE, source=SOURCE, clocks=[log])
    return chain.compile("2020-01-01T01:00:00", "2020-01-03T06:00:00", tolerance_s=1e-11)


@pytest.fixture(scope="module")
def compiled() -> tscale.CompiledChain:
    return compile_it()


def reseal(content: bytes) -> bytes:
    """Give a changed file the seal of its bytes."""
    body = content[:-64]
    return body + hashlib.sha256(body).hexdigest().encode()


def with_header(content: bytes, **changes: object) -> bytes:
    """A file whose header says something else."""
    buffer = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(content)) as old, zipfile.ZipFile(buffer, "w") as new:
        for info in old.infolist():
            data = old.read(info)
            if info.filename == "header.json":
                data = json.dumps(json.loads(data) | changes).encode()
            new.writestr(info, data)
        new.comment = old.comment
    return reseal(buffer.getvalue())


def test_saved_and_loaded(tmp_path: Path, compiled: tscale.CompiledChain) -> None:
    path = tmp_path / "maser.compiled"
    compiled.save(path)
    loaded = tscale.load_compiled(str(path))
    good = compiled.span[:1].shifted(np.linspace(0.0, 30_000.0, 1000))
    assert (loaded(good) == compiled(good)).all()
    assert (loaded.inverse(compiled(good)) == compiled.inverse(compiled(good))).all()
    assert np.array_equal(loaded.rate(good), compiled.rate(good))
    assert loaded.certificate == compiled.certificate
    assert (loaded.span == compiled.span).all()
    assert (loaded.inverse_span == compiled.inverse_span).all()
    assert loaded.to_bytes() == path.read_bytes()
    assert [item.name for item in tmp_path.iterdir()] == ["maser.compiled"]


def test_the_same_chain_gives_the_same_bytes(compiled: tscale.CompiledChain) -> None:
    assert compile_it().to_bytes() == compiled.to_bytes()


def test_numpy_and_zip_open_it(tmp_path: Path, compiled: tscale.CompiledChain) -> None:
    path = tmp_path / "chain.npz"
    compiled.save(path)
    with np.load(path, allow_pickle=False) as arrays:
        assert arrays["forward_powers"].shape == (7, arrays["forward_center"].size)
    with zipfile.ZipFile(path) as archive:
        assert archive.testzip() is None
        header = json.loads(archive.read("header.json"))
    assert (header["format"], header["version"]) == (FORMAT, VERSION)
    assert header["certificate"]["tables"][0]["table"] == "clock log CLOCK(maser)"
    assert path.stat().st_size < 40_000


def test_a_loaded_one_needs_numpy_alone(tmp_path: Path, compiled: tscale.CompiledChain) -> None:
    path = tmp_path / "chain.npz"
    compiled.save(path)
    t = compiled.span[0].shifted(5000.25)
    want = compiled(t)
    script = f"""
import sys
class Refuse:
    def find_spec(self, name, path=None, target=None):
        if name.partition(".")[0] in ({{"erfa", "jplephem", "astropy", "astropy_iers_data", "filelock", "platformdirs",
                                       "tqdm", "scipy", "pyarrow", "pandas"}}):
            raise AssertionError("imported " + name)
sys.meta_path.insert(0, Refuse())
import tscale
compiled = tscale.load_compiled({str(path)!r})
t = tscale.Instants.from_seconds({int(t.whole)}, {float(t.fraction)!r}, scale="CLOCK(maser)")
out = compiled(t)
assert (int(out.whole), float(out.fraction)) == ({int(want.whole)}, {float(want.fraction)!r})
compiled.inverse(out), compiled.rate(t), repr(compiled), str(compiled.certificate)
try:
    compiled(t.shifted(1e9))
except tscale.errors.OutOfSpan as error:
    assert "2020-01-01T01:00:00" in str(error)
else:
    raise AssertionError("not refused")
assert not [name for name in sys.modules if name.startswith(("tscale.chains", "tscale.ephemeris", "tscale.earth"))]
"""
    subprocess.run([sys.executable, "-W", "error", "-c", script], check=True)


def test_every_cut_is_found(compiled: tscale.CompiledChain) -> None:
    content = compiled.to_bytes()
    rng = np.random.default_rng(1)
    for length in [*range(200), *rng.integers(200, len(content), 1000), *range(len(content) - 200, len(content))]:
        with pytest.raises(DataFileError):
            from_bytes(content[:length], Path("cut"))
    for more in (b"\0", b"x" * 64, content):
        with pytest.raises(DataFileError):
            from_bytes(content + more, Path("longer"))


def test_every_flipped_bit_is_found(compiled: tscale.CompiledChain) -> None:
    content = compiled.to_bytes()
    rng = np.random.default_rng(2)
    places = [*range(60), *range(len(content) - 200, len(content)), *rng.integers(0, len(content), 1000)]
    for place, bit in zip(places, rng.integers(0, 8, len(places)), strict=True):
        damaged = bytearray(content)
        damaged[place] ^= 1 << int(bit)
        with pytest.raises(DataFileError, match=r"damaged|not a compiled chain"):
            from_bytes(bytes(damaged), Path("damaged"))


def test_newer_and_foreign_files_are_refused(tmp_path: Path, compiled: tscale.CompiledChain) -> None:
    content = compiled.to_bytes()
    path = tmp_path / "file"

    def refused(data: bytes, words: str) -> None:
        path.write_bytes(data)
        with pytest.raises(DataFileError, match=words) as caught:
            tscale.load_compiled(path)
        assert caught.value.path == path

    refused(with_header(content, version=VERSION + 1), "version 2, and this package reads up to 1: upgrade")
    refused(with_header(content, format="another"), "format 'another'")
    refused(with_header(content, ways={}), "sealed but is not a compiled chain that can be read")
    refused(with_header(content, start="MARTIAN"), "unknown scale")
    refused(b"", "not a compiled chain")
    refused(b"PK\x03\x04 something else", "not a compiled chain")
    np.savez(tmp_path / "other.npz", a=np.zeros(3))
    refused((tmp_path / "other.npz").read_bytes(), "not a compiled chain")
    with pytest.raises(DataFileError, match="cannot read"):
        tscale.load_compiled(tmp_path / "nowhere")


def rebuilt(
    content: bytes, change: Callable[[str, bytes], bytes | None], compression: int = zipfile.ZIP_STORED
) -> bytes:
    """A file with other members, under a seal of its own."""
    buffer = io.BytesIO()
    with zipfile.ZipFile(io.BytesIO(content)) as old, zipfile.ZipFile(buffer, "w", compression) as new:
        for info in old.infolist():
            data = change(info.filename, old.read(info))
            if data is not None:
                new.writestr(info.filename, data)
        new.comment = old.comment
    return reseal(buffer.getvalue())


def npy(array: np.ndarray) -> bytes:
    buffer = io.BytesIO()
    np.save(buffer, array)
    return buffer.getvalue()


def refuses(content: bytes, words: str = "sealed") -> None:
    with pytest.raises(DataFileError, match=words) as caught:
        from_bytes(content, Path("hostile"))
    assert "sealed but is not a compiled chain that can be read" in str(caught.value)
    assert caught.value.path == Path("hostile")


@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("cell_s", 0), ("cell_s", -5), ("cell_s", 10**30), ("cell_s", 0.5), ("cell_s", True), ("cell_s", None),
        ("origin", 10**30), ("origin", 1e30), ("origin", -(10**30)), ("origin", "x"), ("origin", float("nan")),
        ("first", [10**30, "0x0p+0"]), ("first", [0, "0x1p+0"]), ("first", [0, "nan"]), ("last", [0, "-0x1p-3"]),
        ("last", []), ("last", [-(10**9), "0x0p+0"]),
    ],
)  # fmt: skip
@pytest.mark.parametrize("way", ["forward", "inverse"])
def test_numbers_of_the_header_that_cannot_be(
    compiled: tscale.CompiledChain, way: str, name: str, value: object
) -> None:
    content = compiled.to_bytes()
    with zipfile.ZipFile(io.BytesIO(content)) as archive:
        ways = json.loads(archive.read("header.json"))["ways"]
    ways[way][name] = value
    refuses(with_header(content, ways=ways))


def test_cells_that_start_after_the_first_piece_are_refused(compiled: tscale.CompiledChain) -> None:
    content = compiled.to_bytes()
    with zipfile.ZipFile(io.BytesIO(content)) as archive:
        ways = json.loads(archive.read("header.json"))["ways"]
    ways["forward"]["origin"] += 86400
    refuses(with_header(content, ways=ways), "origin is a whole number from -[0-9]+ to [0-9]+, got")


@pytest.mark.parametrize("version", [-1, 0, True, "1", 1.0, None, []])
def test_versions_that_are_none(compiled: tscale.CompiledChain, version: object) -> None:
    refuses(with_header(compiled.to_bytes(), version=version), "version is a whole number from 1")


def test_a_header_that_is_nested_too_deeply(compiled: tscale.CompiledChain) -> None:
    deep = rebuilt(compiled.to_bytes(), lambda name, data: b"[" * 200_000 if name == "header.json" else data)
    refuses(deep, "recursion")
    refuses(rebuilt(compiled.to_bytes(), lambda name, data: b"[]" if name == "header.json" else data))


@pytest.mark.parametrize(
    ("name", "value"),
    [
        ("tolerance_s", None), ("tolerance_s", True), ("rate_error", "0"), ("notes", [3]), ("span", ["2020"]),
        ("site", 5), ("chain", None), ("tables", [{}]), ("more", 1), ("forward", {}), ("forward", None),
    ],
)  # fmt: skip
def test_certificates_that_are_none(compiled: tscale.CompiledChain, name: str, value: object) -> None:
    facts = compiled.certificate.to_dict() | {name: value}
    refuses(with_header(compiled.to_bytes(), certificate=facts))


def swapped(array: np.ndarray) -> np.ndarray:
    array[..., [3, 5]] = array[..., [5, 3]]
    return array


def put(place: int, value: object) -> Callable[[np.ndarray], np.ndarray]:
    def change(array: np.ndarray) -> np.ndarray:
        array[..., place] = value
        return array

    return change


@pytest.mark.parametrize(
    ("name", "change", "words"),
    [
        ("start_whole", lambda a: a[::-1].copy(), "out of all range|origin|not in order"),
        ("start_whole", swapped, "forward are not in order of their starts"),
        ("start_whole", put(-1, 2**63 - 1), "out of all range"),
        ("start_fraction", put(2, 1.5), "not in order"),
        ("start_fraction", put(2, np.nan), "not in order"),
        ("center", put(2, 2**60), "out of all range"),
        ("shift_s", put(2, -(2**63)), "out of all range"),
        ("powers", put(0, 0.0), "coefficients that are no numbers"),
        ("powers", put(3, np.inf), "coefficients that are no numbers"),
        ("powers", lambda a: a[:0], "too short"),
        ("powers", lambda a: a.astype(np.float32), "is float32"),
        ("center", lambda a: a.astype(object), "is object"),
        ("center", lambda a: a[:-1], "differ in length"),
        ("center", lambda a: a[None], "of 2 dimensions"),
    ],
)
def test_arrays_that_cannot_be(
    compiled: tscale.CompiledChain, name: str, change: Callable[[np.ndarray], np.ndarray], words: str
) -> None:
    def other(member: str, data: bytes) -> bytes:
        return npy(change(np.load(io.BytesIO(data)))) if member == f"forward_{name}.npy" else data

    refuses(rebuilt(compiled.to_bytes(), other), words)


def test_members_that_are_longer_than_the_file(compiled: tscale.CompiledChain) -> None:
    content = compiled.to_bytes()

    def claimed(name: str, data: bytes) -> bytes:
        return data.replace(b"'shape': (", b"'shape': (9") if name == "forward_center.npy" else data

    refuses(rebuilt(content, claimed), "forward_center is not as long as it says")
    refuses(rebuilt(content, lambda name, data: data, zipfile.ZIP_DEFLATED), "is deflated")
    refuses(rebuilt(content, lambda name, data: None if name.startswith("inverse_p") else data), "no item named")


def test_a_folder_that_is_not_there(tmp_path: Path, compiled: tscale.CompiledChain) -> None:
    with pytest.raises(DataFileError, match="cannot write"):
        compiled.save(tmp_path / "nowhere" / "file")
