"""Files that appear whole or not at all."""

from __future__ import annotations

import contextlib
import os
import secrets
import stat
from collections.abc import Iterator
from pathlib import Path
from typing import TextIO

from ..errors import InvalidInput

__all__ = ["replaced"]


@contextlib.contextmanager
def replaced(path: str | os.PathLike[str]) -> Iterator[TextIO]:
    """Open a text file (UTF-8, line ends as written) that takes its name only when the block ends well.

    The text goes to a temporary file in the same folder, which is renamed at the end; after an error it is removed
    and whatever stood at `path` is as before. A link is followed. What is no regular file (a pipe, `/dev/null`) is
    written directly.

    Raises
    ------
    InvalidInput
        If the folder does not exist, or `path` is a folder.
    OSError
        From the file system.
    """
    target = Path(os.path.realpath(path))
    if target.is_dir():
        raise InvalidInput(f"{path} is a folder; give the name of a file in it")
    if not target.parent.is_dir():
        raise InvalidInput(f"{path} cannot be written: there is no folder {target.parent}; make it first")
    if target.exists() and not target.is_file():
        with open(target, "w", encoding="utf-8", newline="") as file:
            yield file
        return
    temporary = target.with_name(f".{target.name}.{os.getpid()}.{secrets.token_hex(4)}.part")
    handle = os.open(temporary, os.O_WRONLY | os.O_CREAT | os.O_EXCL, 0o666)
    try:
        with os.fdopen(handle, "w", encoding="utf-8", newline="") as file:
            if target.exists():
                # A file that is replaced keeps who may read it. Some file systems have no such rights.
                with contextlib.suppress(OSError):
                    temporary.chmod(stat.S_IMODE(target.stat().st_mode))
            yield file
            file.flush()
            os.fsync(file.fileno())
        os.replace(temporary, target)
    except BaseException:
        temporary.unlink(missing_ok=True)
        raise
