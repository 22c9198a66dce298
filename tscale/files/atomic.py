"""Files that appear whole or not at all."""

from __future__ import annotations

import contextlib
import io
import os
import re
import secrets
import stat
from collections.abc import Iterator
from pathlib import Path
from typing import Any, Final, TextIO

from ..errors import InvalidInput

__all__ = ["replaced"]

# Names of streams that are open already: opening them anew would lose their place in a file.
_OPEN_STREAM: Final = re.compile(r"/dev/(?:stdin|stdout|stderr)|(?:/dev/fd|/proc/self/fd)/(\d+)")
_STANDARD: Final = {"/dev/stdin": 0, "/dev/stdout": 1, "/dev/stderr": 2}


@contextlib.contextmanager
def replaced(path: str | os.PathLike[str]) -> Iterator[TextIO]:
    """Open a text file (UTF-8, line ends as written) that takes its name only when the block ends well.

    The text goes to a temporary file in the same folder, which is renamed at the end; after an error it is removed
    and whatever stood at `path` is as before. A link is followed. What is no regular file (a pipe, `/dev/null`,
    `/dev/fd/3`) is written directly.

    Raises
    ------
    InvalidInput
        If the folder does not exist, or `path` is a folder.
    OSError
        From the file system, with `path` as its file name.
    """
    shown = os.fspath(path)
    if not shown:
        raise InvalidInput("the name of the output file is empty; give one")
    found = _OPEN_STREAM.fullmatch(shown)
    if found:
        with _naming(shown):
            handle = os.dup(int(found[1]) if found[1] else _STANDARD[shown])
        with _text(handle, shown) as file:
            yield file
        return
    if os.path.isdir(path):
        raise InvalidInput(f"{shown} is a folder; give the name of a file in it")
    if os.path.exists(path) and not os.path.isfile(path):
        with _naming(shown):
            handle = os.open(path, os.O_WRONLY)
        with _text(handle, shown) as file:
            yield file
        return
    target = Path(os.path.realpath(path))
    if not target.parent.is_dir():
        raise InvalidInput(f"{shown} cannot be written: there is no folder {target.parent}; make it first")
    # Short, so that the longest name allowed for the file itself is allowed.
    temporary = target.with_name(f".{secrets.token_hex(8)}.part")
    try:
        # Inside, for a signal may come between the file's making and the next line.
        with _naming(shown):
            handle = os.open(temporary, os.O_WRONLY | os.O_CREAT | os.O_EXCL, 0o666)
        with _text(handle, shown) as file:
            if target.exists():
                # A file that is replaced keeps who may read it. Some file systems have no such rights.
                with contextlib.suppress(OSError):
                    temporary.chmod(stat.S_IMODE(target.stat().st_mode))
            yield file
            file.flush()
            with _naming(shown):
                os.fsync(handle)
        with _naming(shown):
            os.replace(temporary, target)
    except BaseException:
        temporary.unlink(missing_ok=True)
        raise


@contextlib.contextmanager
def _naming(shown: str) -> Iterator[None]:
    """Let an error of the system name the file that the user knows."""
    try:
        yield
    except OSError as error:
        raise OSError(error.errno, error.strerror, shown) from error


class _Named(io.FileIO):
    """A file whose errors name what the user knows it by."""

    def __init__(self, handle: int, shown: str) -> None:
        super().__init__(handle, "w")
        self.shown = shown

    def write(self, data: Any) -> int:
        with _naming(self.shown):
            return super().write(data)


def _text(handle: int, shown: str) -> TextIO:
    return io.TextIOWrapper(io.BufferedWriter(_Named(handle, shown)), encoding="utf-8", newline="")
