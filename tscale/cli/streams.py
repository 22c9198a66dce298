"""The files and standard streams of a command: opened, named for messages, and let go of."""

from __future__ import annotations

import contextlib
import io
import os
import re
import stat
import sys
from collections.abc import Callable, Iterable, Iterator
from typing import Any, Final, NamedTuple, TextIO

__all__ = ["Input", "is_standard_output", "note", "opened", "standard_output", "written"]

_STANDARD_OUTPUT: Final = ("-", "/dev/stdout", "/dev/fd/1", "/proc/self/fd/1")


class Input(NamedTuple):
    """Lines of an input."""

    lines: Iterable[str]
    name: str
    """For messages."""
    size: int | None
    """Bytes, where that is known."""
    ready: Callable[[], bool] | None
    """For an input that may still be written: whether the next line is at hand."""


@contextlib.contextmanager
def opened(path: str) -> Iterator[Input]:
    """Open a text file, or the standard input for `-`."""
    from ..errors import InvalidInput
    from ..files.lines import ERRORS, LiveLines

    if path == "-":
        if sys.stdin is None:
            raise InvalidInput("the standard input is closed; give the name of a file, or a stream to read")
        buffer: Any = getattr(sys.stdin, "buffer", None)
        if buffer is None:  # a stream of text alone, as a caller may have put in its place
            yield Input(sys.stdin, "<stdin>", None, None)
            return
        live = LiveLines(buffer)
        yield Input(live, "<stdin>", None, live.ready)
        return
    with open(path, "rb") as stream:
        facts = os.fstat(stream.fileno())
        if not stat.S_ISREG(facts.st_mode):
            live = LiveLines(stream)
            yield Input(live, path, None, live.ready)
            return
        with io.TextIOWrapper(stream, encoding="utf-8", errors=ERRORS, newline="") as text:
            yield Input(text, path, facts.st_size or None, None)


def is_standard_output(path: str) -> bool:
    """Whether a name means the standard output."""
    return path in _STANDARD_OUTPUT


def standard_output() -> TextIO:
    """The standard output, or `InvalidInput` where it is closed."""
    from ..errors import InvalidInput

    if sys.stdout is None:
        raise InvalidInput("the standard output is closed; leave it open, or name a file and say --quiet")
    return sys.stdout


@contextlib.contextmanager
def written(path: str) -> Iterator[TextIO]:
    """Open an output as UTF-8 whatever the locale: the standard output, or a file that appears whole or not at all."""
    if not is_standard_output(path):
        from ..files.atomic import replaced

        with replaced(path) as file:
            yield file
        return
    stream = standard_output()
    buffer: Any = getattr(stream, "buffer", None)
    if buffer is None:  # a stream of text alone, as a caller may have put in its place
        yield stream
        return
    stream.flush()
    text = io.TextIOWrapper(buffer, encoding="utf-8", newline="")
    try:
        yield text
        text.flush()
    finally:
        # What could not be written is dropped with the wrapper; the stream itself stays open.
        with contextlib.suppress(OSError):
            text.detach()


def note(text: str, kind: str = "note") -> None:
    """Say something on the error stream, if there is one: one line, with long words shortened."""
    if sys.stderr is not None:
        print(f"tscale: {kind}: {_plain(text)}", file=sys.stderr)


def _plain(text: str) -> str:
    """Text of one line: control characters escaped, words out of somebody's file cut to 40 of their characters."""
    text = "".join(c if c.isprintable() else c.encode("unicode_escape").decode() for c in text)
    return re.sub(r"[^\s/\\:,;]{81,}", lambda word: f"{word[0][:40]}... ({len(word[0])} characters)", text)
