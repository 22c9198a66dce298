"""The data files that ship with the package, found in a checkout and in an installed wheel alike."""

from __future__ import annotations

import tomllib
from functools import lru_cache
from pathlib import Path
from typing import Any, Final

from ..errors import DataFileError

__all__ = ["DEFAULT_KERNEL", "DEFAULT_TIME_EPHEMERIS", "manifest", "shipped_path"]

DEFAULT_KERNEL: Final = "de440_1960_2060.bsp"
DEFAULT_TIME_EPHEMERIS: Final = "time_ephemeris_de440_1960_2060.bsp"
_MANIFEST: Final = "MANIFEST.toml"


@lru_cache(maxsize=1)
def _folder() -> Path:
    # Installed, the folder is a package beside this one; in a checkout it stands beside the package's folder.
    package = Path(__file__).resolve().parents[1]
    candidates = (package / "ephemeris_cache", package.parent / "ephemeris_cache")
    for folder in candidates:
        if (folder / _MANIFEST).is_file():
            return folder
    raise DataFileError(
        f"the shipped data folder is missing: looked for {_MANIFEST} in {candidates[0]} and {candidates[1]}; "
        "install the package again",
        path=candidates[0],
    )


def shipped_path(name: str) -> Path:
    """Path of a shipped data file.

    Raises
    ------
    DataFileError
        For a file that is not there; the message lists those that are.
    """
    path = _folder() / name
    if not path.is_file():
        there = ", ".join(sorted(p.name for p in _folder().iterdir() if p.is_file()))
        raise DataFileError(f"no shipped data file {name!r}: there are {there}", path=path)
    return path


@lru_cache(maxsize=1)
def _read_manifest() -> dict[str, dict[str, Any]]:
    with shipped_path(_MANIFEST).open("rb") as file:
        return dict(tomllib.load(file)["file"])


def manifest(name: str) -> dict[str, Any]:
    """Manifest entry of a shipped file: `sha256`, `bytes`, `span`, `origin`, `command`."""
    entries = _read_manifest()
    if name not in entries:
        raise DataFileError(f"{name!r} is not in the manifest of shipped files: it lists {', '.join(entries)}")
    return dict(entries[name])
