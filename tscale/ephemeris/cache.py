"""The user's cache folder, locks between processes, and files that appear whole or not at all."""

from __future__ import annotations

import contextlib
import os
import secrets
from collections.abc import Iterator
from pathlib import Path

__all__ = ["cache_folder", "locked", "write_atomically"]


def cache_folder() -> Path:
    """Folder for computed data: the environment variable `TSCALE_CACHE`, else the platform's user cache."""
    given = os.environ.get("TSCALE_CACHE")
    if given:
        return Path(given).expanduser()
    from platformdirs import user_cache_path

    return user_cache_path("tscale", appauthor=False)


@contextlib.contextmanager
def locked(path: Path) -> Iterator[None]:
    """Hold the lock that belongs to `path` (a file beside it), making its folder first.

    The operating system frees the lock of a process that dies.

    Raises
    ------
    OSError
        Where the folder cannot be made or written.
    """
    from filelock import FileLock

    path.parent.mkdir(parents=True, exist_ok=True)
    with FileLock(path.with_name(path.name + ".lock")):
        yield


def write_atomically(path: Path, content: bytes) -> None:
    """Write a file under a temporary name in the same folder, then rename it.

    Raises
    ------
    OSError
        Where the folder cannot be written; no part of the file is left behind.
    """
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
