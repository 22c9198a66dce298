"""Checks of what is given where a file is to be opened."""

from __future__ import annotations

import os
from pathlib import Path
from typing import Any

from ..errors import InvalidInput

__all__ = ["file_path"]


def file_path(path: Any, what: str) -> Path:
    """Path of a file, with `~` for the home folder; `what` names the file in the message.

    Raises
    ------
    InvalidInput
        For anything but a text or a path.
    """
    if not isinstance(path, (str, os.PathLike)):
        raise InvalidInput(f"{what} is opened by its path, a str or pathlib.Path; got {path!r} ({type(path).__name__})")
    name = os.fspath(path)
    if not isinstance(name, str) or not name or "\0" in name:
        raise InvalidInput(f"{what} is opened by its path, a text that is not empty and has no NUL; got {name!r}")
    try:
        return Path(name).expanduser()
    except RuntimeError as error:
        raise InvalidInput(f"{what}: {name!r} begins in a home folder that is not there ({error})") from error
