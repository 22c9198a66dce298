"""Small files: TOML tables read with errors that teach, and files that appear whole or not at all."""

from __future__ import annotations

import errno
import os
import re
import secrets
import tomllib
from collections.abc import Sequence
from pathlib import Path
from typing import Any, Final

from .errors import DataFileError

__all__ = ["read_bytes", "read_toml", "toml_table", "write_atomically"]

_PIECE: Final = 1 << 20
_LARGEST_TOML: Final = 1 << 20
# Every part of a dotted key makes the parser remember all parts before it: some thousands fill the memory.
_LONG_KEY: Final = re.compile(r"""(?<![\w-])(?:(?:[\w-]+|"[^"\n]*"|'[^'\n]*')[ \t]*\.[ \t]*){64}""", re.ASCII)


def read_bytes(path: Path, most: int = 256 << 20) -> bytes:
    """Read a file whole, however it comes (a pipe, a device), but no more of it than memory has room for.

    Raises
    ------
    DataFileError
        For a file of more than `most` bytes.
    OSError
        For one that cannot be read.
    """
    parts, size = [], 0
    if "\0" in str(path):
        raise OSError(errno.EINVAL, "a path cannot hold a NUL character", str(path))
    with path.open("rb") as file:
        while part := file.read(_PIECE):
            parts.append(part)
            size += len(part)
            if size > most:
                raise DataFileError(
                    f"{path} has more than {most >> 20} MiB, the most that is read of such a file: it is another one",
                    path=path,
                )
    return b"".join(parts)


def read_toml(path: Path) -> dict[str, Any]:
    """Read a TOML document.

    Raises
    ------
    DataFileError
        For a file that is missing, not UTF-8 or not TOML, with the path and, where it is known, the row.
    """
    try:
        text = read_bytes(path, _LARGEST_TOML).decode("utf-8")
        if _LONG_KEY.search(text):
            raise DataFileError(f"{path} has a key of more than 64 parts: a key here has two or three", path=path)
        document = tomllib.loads(text)
        too_large = _too_large(document)
    except RecursionError as error:
        raise DataFileError(f"{path} is nested too deeply: a table here has two or three levels", path=path) from error
    except OSError as error:
        raise DataFileError(f"cannot read {path}: {error.strerror or error}", path=path) from error
    except UnicodeDecodeError as error:
        raise DataFileError(f"{path} is not UTF-8 text: {error}", path=path) from error
    except tomllib.TOMLDecodeError as error:
        line = re.search(r"line (\d+)", str(error))
        row = int(line.group(1)) if line else None
        raise DataFileError(f"{path} is not TOML: {error}", path=path, row=row) from error
    except DataFileError:
        raise
    except ValueError as error:  # a whole number of thousands of digits
        raise DataFileError(f"{path} holds a number that is too long: {error}", path=path) from error
    if too_large:
        raise DataFileError(f"{path} holds a whole number beyond 1e300: numbers here are read as float64", path=path)
    return document


def _too_large(value: Any) -> bool:
    if isinstance(value, dict):
        return any(map(_too_large, value.values()))
    if isinstance(value, list):
        return any(map(_too_large, value))
    return isinstance(value, int) and abs(value) > 10**300


def toml_table(path: Path, name: str, needed: Sequence[str], allowed: Sequence[str]) -> dict[str, Any]:
    """Read the table `[name]` of a TOML file, which must hold the keys `needed` and may hold those `allowed`.

    Raises
    ------
    DataFileError
        As `read_toml`, and for a table that is missing, lacks a key or has one more.
    """
    table = read_toml(path).get(name)
    if not isinstance(table, dict):
        raise DataFileError(f"{path} has no [{name}] table; such a table holds {', '.join(allowed)}", path=path)
    lacking = [key for key in needed if key not in table]
    if lacking:
        raise DataFileError(f"{path}: [{name}] lacks {', '.join(lacking)}; it needs {', '.join(needed)}", path=path)
    unknown = [key for key in table if key not in allowed]
    if unknown:
        raise DataFileError(
            f"{path}: unknown key {', '.join(unknown)} in [{name}]; allowed are {', '.join(allowed)}", path=path
        )
    return table


def write_atomically(path: Path, content: bytes) -> None:
    """Write a file under a temporary name in the same folder, then rename it.

    Raises
    ------
    OSError
        Where the folder cannot be written; no part of the file is left behind.
    """
    # Short, so that the longest name allowed for the file itself is allowed.
    temporary = path.with_name(f".{secrets.token_hex(8)}.part")
    try:
        with temporary.open("xb") as file:
            file.write(content)
            file.flush()
            os.fsync(file.fileno())
        os.replace(temporary, path)
    except BaseException:
        temporary.unlink(missing_ok=True)
        raise
