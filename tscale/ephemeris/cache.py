"""The user's cache folder, and locks between processes."""

from __future__ import annotations

import contextlib
import os
from collections.abc import Iterator
from pathlib import Path

__all__ = ["cache_folder", "locked"]


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
