"""Small files: TOML that teaches, and files that appear whole or not at all."""

from __future__ import annotations

import os
from pathlib import Path

import pytest

import tscale
from tscale.errors import DataFileError
from tscale.storage import read_toml, toml_table, write_atomically


@pytest.mark.parametrize(
    ("text", "words", "row"),
    [
        ("[source\n", "is not TOML", 1),
        ("a = 1\nb =\n", "is not TOML", 2),
        (f"a = 1{'0' * 400}\n", "beyond 1e300", None),
        (f"[x]\na = [1, -1{'0' * 400}]\n", "beyond 1e300", None),
        (f"a = 1{'0' * 5000}\n", "too long", None),
    ],
)
def test_damaged_toml(tmp_path: Path, text: str, words: str, row: int | None) -> None:
    path = tmp_path / "x.toml"
    path.write_text(text)
    with pytest.raises(DataFileError, match=words) as caught:
        read_toml(path)
    assert caught.value.path == path
    assert caught.value.row == row


def test_tables_need_their_keys(tmp_path: Path) -> None:
    path = tmp_path / "x.toml"
    for text, words in (("", r"no \[t\] table"), ("[t]\na = 1", "lacks b"), ("[t]\na = 1\nb = 2\nz = 3", "key z")):
        path.write_text(text)
        with pytest.raises(DataFileError, match=words):
            toml_table(path, "t", ("a", "b"), ("a", "b", "c"))
    path.write_bytes(b"a = '\xff'")
    with pytest.raises(DataFileError, match="UTF-8"):
        read_toml(path)
    with pytest.raises(DataFileError, match="cannot read"):
        read_toml(tmp_path / "none.toml")


def test_numbers_too_large_for_a_float() -> None:
    for act in (
        lambda: tscale.Source(10**400, 0.0),
        lambda: tscale.Source(0.0, 0.0, parallax_mas=10**400),
        lambda: tscale.Site.from_itrf("x", 10**400, 0.0, 0.0),
    ):
        with pytest.raises(tscale.errors.InvalidInput):
            act()


def test_a_file_appears_whole_or_not_at_all(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    path = tmp_path / "x.bin"
    write_atomically(path, b"first")

    def fail(*args: object) -> None:
        raise OSError("no")

    monkeypatch.setattr(os, "replace", fail)
    with pytest.raises(OSError, match="no"):
        write_atomically(path, b"second")
    assert path.read_bytes() == b"first"
    assert os.listdir(tmp_path) == ["x.bin"]
