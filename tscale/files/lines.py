"""Lines of a stream that is still being written, handed on as soon as they are whole."""

from __future__ import annotations

import codecs
import contextlib
import io
import select
from collections import deque
from typing import Final, Protocol

from ..errors import DataFileError

__all__ = ["ERRORS", "LiveLines"]

ERRORS: Final = "surrogateescape"
"""How bytes that are not UTF-8 are read: kept apart, so that the line they stand on can be named."""

_CHUNK: Final = 65536
_WAIT_S: Final = 0.02
_LONGEST_LINE: Final = 1 << 24


class _Bytes(Protocol):
    def read1(self, size: int, /) -> bytes: ...

    def fileno(self) -> int: ...


class LiveLines:
    r"""Iterator over lines of UTF-8 with their ends (`\n`, `\r\n` or `\r`).

    Parameters
    ----------
    stream : binary stream
        With `read1`, which returns what there is.

    Raises
    ------
    DataFileError
        While reading, for a line of 2**24 characters.
    """

    def __init__(self, stream: _Bytes) -> None:
        self._stream = stream
        self._decode = codecs.getincrementaldecoder("utf-8")(ERRORS).decode
        self._lines: deque[str] = deque()
        self._parts: list[str] = []  # of the line that has no end yet
        self._size = 0
        self._open = True

    def __iter__(self) -> LiveLines:
        return self

    def __next__(self) -> str:
        while not self._lines:
            if not self._open:
                raise StopIteration
            self._read()
        return self._lines.popleft()

    def ready(self) -> bool:
        """Whether the next line, or the end, can be had without waiting for whoever writes."""
        while not self._lines and self._open:
            # Where this cannot be asked (streams in memory, pipes of some systems) the stream is taken to be at hand.
            with contextlib.suppress(OSError, ValueError):
                if not select.select([self._stream.fileno()], [], [], _WAIT_S)[0]:
                    return False
            self._read()
        return True

    def _read(self) -> None:
        chunk = self._stream.read1(_CHUNK)
        self._open = bool(chunk)
        text = self._decode(chunk, final=not chunk)
        half = bool(self._parts) and self._parts[-1].endswith("\r")
        if self._open and not half and "\n" not in text and "\r" not in text:
            self._parts.append(text)
            self._size += len(text)
            if self._size > _LONGEST_LINE:
                raise DataFileError(f"the input has a line of more than {_LONGEST_LINE} characters: it is no table")
            return
        self._size = 0
        lines = list(io.StringIO("".join([*self._parts, text]), newline=""))
        # A carriage return may be the first half of an end, so it waits for the next character too.
        whole = not self._open or not lines or lines[-1].endswith("\n")
        self._parts = [] if whole else [lines.pop()]
        self._lines.extend(lines)
