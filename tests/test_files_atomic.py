"""Files that appear whole or not at all."""

from __future__ import annotations

import os
import stat
from pathlib import Path

import pytest

from tscale.errors import InvalidInput
from tscale.files import replaced


def test_appears_at_the_end(tmp_path: Path) -> None:
    target = tmp_path / "out.csv"
    with replaced(target) as file:
        file.write("a\r\nb\n")
        assert not target.exists()
    assert target.read_bytes() == b"a\r\nb\n"
    assert os.listdir(tmp_path) == ["out.csv"]


@pytest.mark.parametrize("fault", [ValueError, KeyboardInterrupt])
def test_old_file_survives_an_error(tmp_path: Path, fault: type[BaseException]) -> None:
    target = tmp_path / "out.csv"
    target.write_text("old")

    def write_and_fail() -> None:
        with replaced(target) as file:
            file.write("new")
            raise fault

    with pytest.raises(fault):
        write_and_fail()
    assert target.read_text() == "old"
    assert os.listdir(tmp_path) == ["out.csv"]


@pytest.mark.skipif(os.name != "posix", reason="rights and links as on POSIX systems")
def test_keeps_rights_and_follows_links(tmp_path: Path) -> None:
    target, link = tmp_path / "real.csv", tmp_path / "link.csv"
    target.write_text("old")
    target.chmod(0o600)
    link.symlink_to(target)
    with replaced(link) as file:
        file.write("new")
    assert link.is_symlink()
    assert target.read_text() == "new"
    assert stat.S_IMODE(target.stat().st_mode) == 0o600


@pytest.mark.skipif(os.name != "posix", reason="/dev/null")
def test_devices_are_written_directly() -> None:
    with replaced(os.devnull) as file:
        file.write("gone")
    assert not Path(os.devnull).is_file()


def test_folders_are_refused(tmp_path: Path) -> None:
    with pytest.raises(InvalidInput, match="is a folder"), replaced(tmp_path):
        pass
    with pytest.raises(InvalidInput, match="there is no folder"), replaced(tmp_path / "no" / "out.csv"):
        pass


@pytest.mark.skipif(os.name != "posix", reason="descriptors by name")
def test_a_stream_that_is_open_is_written_where_it_stands(tmp_path: Path) -> None:
    target = tmp_path / "out.csv"
    with target.open("w") as file:
        file.write("before\n")
        file.flush()
        with replaced(f"/dev/fd/{file.fileno()}") as text:
            text.write("within\n")
        file.write("after\n")
    assert target.read_text() == "before\nwithin\nafter\n"


def test_the_longest_names(tmp_path: Path) -> None:
    target = tmp_path / ("x" * 255)  # the most that common file systems allow
    with replaced(target) as file:
        file.write("a")
    assert target.read_text() == "a"
    longer = tmp_path / ("x" * 256)
    with pytest.raises(OSError, match="x" * 256) as caught, replaced(longer):
        pass
    assert caught.value.filename == str(longer)
    with pytest.raises(InvalidInput, match="empty"), replaced(""):
        pass
