"""Files imported into the cache: recognised by content, checked, kept by SHA-256, used by name alone."""

from __future__ import annotations

import hashlib
import json
import os
import subprocess
import sys
from pathlib import Path

import astropy_iers_data
import pytest
from jplephem.excerpter import write_excerpt
from jplephem.spk import SPK

import tscale
from tscale.cli.main import main
from tscale.ephemeris.shipped import DEFAULT_KERNEL, shipped_path
from tscale.tables.imported import import_file, imported_files, remove_imported, resolved, verify_imported

LEAP = Path(astropy_iers_data.IERS_LEAP_SECOND_FILE)
FINALS = Path(__file__).parent / "data" / "eop_predictions" / "finals2000A_2024-11-22.txt"
EXAMPLES = Path(__file__).parents[1] / "examples"
BIPM = "".join(f"{mjd}  {35640 + mjd % 7:.4f}  {27.6 + 1e-4 * (mjd - 58000):.4f}\n" for mjd in range(58000, 58200, 10))


@pytest.fixture
def cache(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.setenv("TSCALE_CACHE", str(tmp_path / "cache"))
    monkeypatch.chdir(tmp_path)
    return tmp_path / "cache"


@pytest.fixture
def kernel(tmp_path: Path) -> Path:
    """A year of the shipped ephemeris, cut by jplephem."""
    path = tmp_path / "year.bsp"
    with SPK.open(shipped_path(DEFAULT_KERNEL)) as whole, path.open("w+b") as file:
        write_excerpt(whole, file, 2460600.5, 2460965.5, whole.daf.summaries())
    return path


def sha256(path: Path) -> str:
    return hashlib.sha256(path.read_bytes()).hexdigest()


def test_what_a_file_is(cache: Path, kernel: Path, tmp_path: Path) -> None:
    (tmp_path / "ttbipm.19").write_text(BIPM)
    time_kernel = shipped_path("time_ephemeris_de440_1960_2060.bsp")
    kinds = {
        LEAP: "leap seconds",
        FINALS: "Earth orientation",
        tmp_path / "ttbipm.19": "TT(BIPM)",
        kernel: "ephemeris",
        time_kernel: "time ephemeris",
    }
    for path, kind in kinds.items():
        file = import_file(path)
        assert (file.kind, file.name, file.sha256) == (kind, path.name, sha256(path))
        assert file.path.read_bytes() == path.read_bytes()
        assert file.path.is_relative_to(cache)
    assert [file.name for file in imported_files()] == sorted(path.name for path in kinds)
    assert verify_imported() == imported_files()
    with pytest.raises(
        tscale.errors.InvalidInput, match=r"under the name table the table of TT\(BIPM\) would not be read"
    ):
        import_file(tmp_path / "ttbipm.19", name="table")
    assert verify_imported() == imported_files()
    (table,) = tscale.ReferenceData.load(tt_bipm="imported:ttbipm.19").tt_bipm
    assert table.scale == "TT(BIPM19)"
    assert not list(cache.rglob("*.part"))


def test_they_are_used_by_name_alone(cache: Path, kernel: Path) -> None:
    before = tscale.ReferenceData.load()
    for path in (FINALS, kernel):
        import_file(path)
    assert tscale.ReferenceData.load().fingerprint == before.fingerprint
    reference = tscale.ReferenceData.load(
        earth_orientation=f"imported:{FINALS.name}", ephemeris=f"imported:{kernel.name}"
    )
    assert reference.earth_orientation.sha256 == sha256(FINALS)
    assert reference.earth_orientation.name == FINALS.name
    assert reference.ephemeris.sha256 == sha256(kernel)
    assert before.replace(leap_seconds=LEAP).leap_seconds.sha256 == sha256(LEAP)
    assert resolved("plain.txt") == "plain.txt"
    with pytest.raises(tscale.errors.InvalidInput, match=r"there is no imported:x.all \(there: imported:finals"):
        tscale.ReferenceData.load(earth_orientation="imported:x.all")


def test_again_and_under_another_name(cache: Path, tmp_path: Path) -> None:
    first = import_file(LEAP)
    assert import_file(LEAP) == first
    other = tmp_path / "other" / LEAP.name
    other.parent.mkdir()
    other.write_text(LEAP.read_text() + "# another issue\n")
    with pytest.raises(tscale.errors.InvalidInput, match="is there with other content"):
        import_file(other)
    assert import_file(other, name="leap-2").sha256 == sha256(other)
    assert import_file(LEAP, name="leap-1").sha256 == first.sha256
    for name in ("../x", "", ".hidden", "a:b", "x/y", "a b"):
        with pytest.raises(tscale.errors.InvalidInput, match="cannot be the name"):
            import_file(LEAP, name=name)
    # Two names of one content are two files; one goes, the other stays.
    remove_imported("leap-1")
    assert first.path.is_file()
    remove_imported(f"imported:{first.name}")
    assert not first.path.parent.exists()
    with pytest.raises(tscale.errors.InvalidInput, match="there is no imported:leap-1"):
        remove_imported("leap-1")


def test_damage_is_found(cache: Path) -> None:
    file = import_file(FINALS)
    content = bytearray(file.path.read_bytes())
    content[1000] ^= 1
    file.path.write_bytes(content)
    for use in (lambda: resolved(f"imported:{file.name}"), verify_imported):
        with pytest.raises(tscale.errors.DataFileError, match="was changed since it was imported") as caught:
            use()
        assert caught.value.path == file.path
    assert import_file(FINALS) == file  # which mends it
    assert verify_imported() == [file]
    file.path.write_bytes(content[:-1])
    with pytest.raises(tscale.errors.DataFileError, match="bytes long"):
        verify_imported()
    file.path.unlink()
    with pytest.raises(tscale.errors.DataFileError, match="it is missing"):
        verify_imported()
    (cache / "imported" / "manifest.json").write_text('{"layout": 1, "files": {"../x": {}}}')
    with pytest.raises(tscale.errors.DataFileError, match="list of imported files is damaged"):
        imported_files()
    (cache / "imported" / "manifest.json").write_text('{"layout": 2}')
    with pytest.raises(tscale.errors.DataFileError, match="has layout 2, and 1 is known"):
        imported_files()


def test_what_is_refused(cache: Path, kernel: Path, tmp_path: Path) -> None:
    (tmp_path / "cut.bsp").write_bytes(kernel.read_bytes()[:-5000])
    (tmp_path / "prose.txt").write_text("What a day it was.\n")
    (tmp_path / "empty").write_bytes(b"")
    for name, words in {
        "cut.bsp": "truncated|shorter|bytes",
        "prose.txt": "no table that is known here.*as leap seconds:.*as Earth orientation:.*as TT",
        "empty": "no table that is known here",
        "none": "cannot read",
        "cache": "cannot read",
    }.items():
        (tmp_path / "cache").mkdir(exist_ok=True)
        with pytest.raises(tscale.errors.DataFileError, match=words):
            import_file(tmp_path / name)
    assert imported_files() == []


def test_the_command(cache: Path, capsys: pytest.CaptureFixture[str], tmp_path: Path) -> None:
    assert main(["data", "--imported"]) == 0
    assert "nothing was imported" in capsys.readouterr().out
    assert main(["data", "--import", str(FINALS), "--name", "late.all"]) == 0
    assert f"there: imported:late.all (Earth orientation, SHA-256 {sha256(FINALS)[:12]})" in capsys.readouterr().out
    assert main(["data", "--imported", "--full"]) == 0
    assert sha256(FINALS) in capsys.readouterr().out
    assert main(["data", "--imported", "--json"]) == 0
    (entry,) = json.loads(capsys.readouterr().out)
    assert (entry["name"], entry["kind"], entry["size"]) == ("late.all", "Earth orientation", FINALS.stat().st_size)
    assert main(["data", "--verify"]) == 0
    assert "verified: imported:late.all" in capsys.readouterr().out
    (tmp_path / "in.csv").write_text("t\n2025-02-01\n")
    words = ["convert", "in.csv", "out.csv", "--to", "UT1"]
    assert main([*words, "--earth-orientation", "imported:late.all"]) == 0
    by_name = Path("out.csv").read_text()
    assert FINALS.name not in capsys.readouterr().out
    assert main([*words, "--earth-orientation", str(FINALS)]) == 0
    assert Path("out.csv").read_text() == by_name
    assert main(["data", "--remove", "late.all"]) == 0
    assert main([*words, "--earth-orientation", "imported:late.all"]) == 2
    assert "there is no imported:late.all (there: none); import the file first" in capsys.readouterr().err
    assert main(["data", "--import", str(FINALS), str(LEAP), "--name", "x"]) == 2
    assert main(["data", "--name", "x"]) == 2


def test_several_at_once(cache: Path) -> None:
    """Four processes import at the same time: the lock keeps the list whole."""
    code = "import sys; from tscale.tables.imported import import_file; import_file(sys.argv[1], name=sys.argv[2])"
    environment = {**os.environ, "PYTHONPATH": str(Path(tscale.__file__).parents[1])}
    running = [
        subprocess.Popen([sys.executable, "-c", code, str(LEAP), f"leap-{n}"], env=environment) for n in range(4)
    ]
    assert [process.wait(60) for process in running] == [0, 0, 0, 0]
    assert [file.name for file in verify_imported()] == [f"leap-{n}" for n in range(4)]
