"""The user's cache folder, and locks between processes."""

from __future__ import annotations

import contextlib
import errno
import os
import time
from collections.abc import Iterator
from pathlib import Path

from ..constants import DAY_S

__all__ = ["cache_folder", "locked"]


def cache_folder() -> Path:
    """Folder for computed data: the environment variable `TSCALE_CACHE`, else the platform's user cache.

    Raises
    ------
    FileNotFoundError
        Where there is no home folder for it to be in.
    """
    given = os.environ.get("TSCALE_CACHE")
    if not given:
        from platformdirs import user_cache_path

        given = str(user_cache_path("tscale", appauthor=False))
    folder = os.path.expanduser(given)
    if folder.startswith("~"):  # else a folder of that name would be made here
        raise FileNotFoundError(errno.ENOENT, "there is no such home folder", folder)
    return Path(folder)


@contextlib.contextmanager
def locked(path: Path) -> Iterator[None]:
    """Hold the lock that belongs to `path` (a file beside it), making its folder first.

    The operating system frees the lock of a process that dies. What such a process had begun to write is removed after
    a day, when nobody can still be writing it.

    Raises
    ------
    OSError
        Where the folder cannot be made or written.
    """
    from filelock import FileLock

    path.parent.mkdir(parents=True, exist_ok=True)
    with FileLock(path.with_name(path.name + ".lock")):
        with contextlib.suppress(OSError):
            for part in path.parent.glob(".????????????????.part"):
                if time.time() - part.stat().st_mtime > DAY_S:
                    part.unlink()
        yield
