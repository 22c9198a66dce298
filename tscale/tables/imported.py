"""Tables and kernels that the user has imported into the cache: checked, kept by SHA-256, used by name alone.

An imported file takes the place of no default. It is used where it is asked for, as `imported:NAME` in place of a path.
"""

from __future__ import annotations

import hashlib
import json
import os
import re
import secrets
import shutil
from datetime import UTC, datetime
from pathlib import Path
from typing import Any, Final, NamedTuple, TypeVar

from ..errors import DataFileError, InvalidInput, TscaleError
from ..storage import write_atomically
from .file_kind import kind_of_file

__all__ = ["PREFIX", "ImportedFile", "import_file", "imported_files", "remove_imported", "resolved", "verify_imported"]

PREFIX: Final = "imported:"
_NAME: Final = re.compile(r"\w[\w.+-]{0,99}")
_LAYOUT: Final = 1
_CHUNK: Final = 1 << 20
_SMALL: Final = 1 << 26
"""Bytes of a file that is hashed whenever it is used; a larger one when that is asked for (`verify_imported`)."""

T = TypeVar("T")


class ImportedFile(NamedTuple):
    """An entry of the manifest."""

    name: str
    kind: str
    """`leap seconds`, `Earth orientation`, `TT(BIPM)`, `ephemeris`, `time ephemeris` or `trajectory`."""
    sha256: str
    size: int
    """Bytes."""
    origin: str
    """Where it was."""
    imported: str
    """When, UTC."""
    path: Path
    """Where it is kept."""


def import_file(path: str | Path, *, name: str | None = None) -> ImportedFile:
    """Copy a table or a kernel into the cache, once it has been read without complaint.

    Parameters
    ----------
    path : str or Path
        A list of leap seconds, a file of Earth orientation (finals2000A or C04), of TT(BIPM), or an SPK kernel; its
        content tells which.
    name : str, optional
        What it is to be called; default the name of the file.

    Raises
    ------
    DataFileError
        For a file that cannot be read, is damaged, or is none of these.
    InvalidInput
        For a name that is no plain word, or that other content has already.
    """
    path = Path(path)
    name = path.name if name is None else name
    if not _NAME.fullmatch(name):
        raise InvalidInput(f"{name!r} cannot be the name of an imported file: letters, digits, and . _ + - within")
    sha256 = _sha256(path)
    kind = kind_of_file(path)
    folder = _folder()
    with _locked_folder():
        known = _entries()
        old = known.get(name)
        if old is not None and old["sha256"] != sha256:
            raise InvalidInput(
                f"{PREFIX}{name} is there with other content (SHA-256 {old['sha256'][:12]}, of {old['imported']}); "
                "give another name, or remove it first"
            )
        kept = folder / sha256 / name
        if not (kept.is_file() and _sha256(kept) == sha256):
            _copy(path, kept, sha256)
            if name != path.name:
                _check_name(kept, kind)
        if old is None:
            known[name] = {
                "kind": kind,
                "sha256": sha256,
                "size": kept.stat().st_size,
                "origin": str(path.resolve()),
                "imported": datetime.now(UTC).strftime("%Y-%m-%dT%H:%M:%SZ"),
            }
            _write(known)
        return _file(name, known[name])


def imported_files() -> list[ImportedFile]:
    """What is there, by name."""
    return [_file(name, entry) for name, entry in sorted(_entries().items())]


def remove_imported(name: str) -> ImportedFile:
    """Take a file out of the cache again.

    Raises
    ------
    InvalidInput
        For a name that is not there.
    """
    with _locked_folder():
        known = _entries()
        gone = _found(name, known)
        del known[gone.name]
        _write(known)  # first, so that the manifest never names what is not there
        gone.path.unlink(missing_ok=True)
        if not any(gone.path.parent.iterdir()):
            gone.path.parent.rmdir()
    return gone


def verify_imported() -> list[ImportedFile]:
    """Compare every imported file with its SHA-256; returns them.

    Raises
    ------
    DataFileError
        For the first that is missing or damaged.
    """
    files = imported_files()
    for file in files:
        _check(file, whole=True)
    return files


def resolved(given: T) -> T | Path:
    """The path of `imported:NAME`; anything else as it is.

    Raises
    ------
    InvalidInput
        For a name that is not there.
    DataFileError
        For a file that was changed since.
    """
    if not (isinstance(given, str) and given.startswith(PREFIX)):
        return given
    file = _found(given, _entries())
    _check(file, whole=file.size <= _SMALL)
    return file.path


# ---- the folder --------------------------------------------------------------------------------------


def _folder() -> Path:
    from ..ephemeris.cache import cache_folder

    return cache_folder() / "imported"


def _manifest() -> Path:
    return _folder() / "manifest.json"


def _locked_folder() -> Any:
    from ..ephemeris.cache import locked

    return locked(_manifest())


def _entries() -> dict[str, dict[str, Any]]:
    path = _manifest()
    try:
        document = json.loads(path.read_text(encoding="utf-8"))
        if document["layout"] != _LAYOUT:
            raise DataFileError(
                f"this list of imported files has layout {document['layout']}, and {_LAYOUT} is known here: use the "
                "version of tscale that wrote it, or another TSCALE_CACHE",
                path=path,
            )
        files: dict[str, dict[str, Any]] = document["files"]
        for name, entry in files.items():
            _file(name, entry)
    except FileNotFoundError:
        return {}
    except TscaleError:
        raise
    except (ValueError, TypeError, KeyError, AttributeError) as error:
        raise DataFileError(
            "this list of imported files is damaged: remove its folder and import them again", path=path
        ) from error
    return files


def _write(known: dict[str, dict[str, Any]]) -> None:
    text = json.dumps({"layout": _LAYOUT, "files": known}, indent=2, sort_keys=True, ensure_ascii=False)
    write_atomically(_manifest(), text.encode() + b"\n")


def _file(name: str, entry: dict[str, Any]) -> ImportedFile:
    if not (_NAME.fullmatch(name) and re.fullmatch(r"[0-9a-f]{64}", entry["sha256"])):
        raise ValueError(name)
    path = _folder() / entry["sha256"] / name
    return ImportedFile(
        name, entry["kind"], entry["sha256"], int(entry["size"]), entry["origin"], entry["imported"], path
    )


def _found(name: str, known: dict[str, dict[str, Any]]) -> ImportedFile:
    name = name.removeprefix(PREFIX)
    if name not in known:
        there = ", ".join(f"{PREFIX}{other}" for other in sorted(known)) or "none"
        raise InvalidInput(
            f"there is no {PREFIX}{name} (there: {there}); import the file first: tscale data --import FILE"
        )
    return _file(name, known[name])


def _check(file: ImportedFile, *, whole: bool) -> None:
    found = "missing"
    if file.path.is_file():
        found = f"{file.path.stat().st_size} bytes long, not {file.size}"
        if file.path.stat().st_size == file.size:
            sha256 = _sha256(file.path) if whole else file.sha256
            if sha256 == file.sha256:
                return
            found = f"of SHA-256 {sha256}, not {file.sha256}"
    raise DataFileError(
        f"{PREFIX}{file.name} was changed since it was imported: it is {found}; say `tscale data --remove {file.name}` "
        f"and import it again from {file.origin}",
        path=file.path,
    )


def _sha256(path: Path) -> str:
    try:
        with path.open("rb") as file:
            return hashlib.file_digest(file, "sha256").hexdigest()
    except OSError as error:
        raise DataFileError(f"cannot read {path}: {error.strerror or error}", path=path) from error


def _copy(path: Path, kept: Path, sha256: str) -> None:
    """Copy under another name, compare, rename."""
    kept.parent.mkdir(parents=True, exist_ok=True)
    temporary = kept.with_name(f".{secrets.token_hex(8)}.part")
    try:
        with path.open("rb") as source, temporary.open("xb") as target:
            shutil.copyfileobj(source, target, _CHUNK)
            target.flush()
            os.fsync(target.fileno())
        if _sha256(temporary) != sha256:
            raise DataFileError("this file changed while it was read; import it when it is complete", path=path)
        os.replace(temporary, kept)
    except BaseException:
        temporary.unlink(missing_ok=True)
        raise


def _check_name(kept: Path, kind: str) -> None:
    """A table of TT(BIPM) has its year in its name alone."""
    try:
        kind_of_file(kept)
    except TscaleError as error:
        kept.unlink()
        raise InvalidInput(
            f"under the name {kept.name} the table of {kind} would not be read: keep its own name, or call it as the "
            "BIPM does, TTBIPM.23 for TT(BIPM23)"
        ) from error
