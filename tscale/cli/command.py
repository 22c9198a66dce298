"""The command `tscale`: arguments, errors and warnings as one line each, signals, exit status."""

from __future__ import annotations

import argparse
import contextlib
import io
import os
import re
import signal
import sys
import threading
import warnings
from collections.abc import Iterator, Sequence
from pathlib import Path
from types import FrameType
from typing import Any, Final

from .. import __version__
from . import (
    budgeting,
    clock,
    compiling,
    completion,
    convert,
    crosscheck,
    data,
    events,
    inspection,
    link,
    plot,
    report,
    what_if,
)
from .streams import note

__all__ = ["COMMANDS", "parser", "run"]

COMMANDS: Final = (
    convert,
    events,
    link,
    clock,
    compiling,
    what_if,
    budgeting,
    plot,
    report,
    crosscheck,
    inspection,
    data,
    completion,
)

_DONE: Final = 0
_WRONG: Final = 2  # as argparse does for arguments it refuses
_BY_SIGNAL: Final = 128  # what a shell adds to the number of the signal that ended a program
_SIGPIPE: Final = 13

_EPILOG: Final = """\
`tscale COMMAND --help` tells the rest, with examples. --project FILE names site, clocks, source and tables once for all
commands; --json gives what is said to programs.

Exit status: 0 done; 1 done, and what was looked at is not in order; 2 not done (one line on the error stream says why,
and no output file is left); 130 and the like by a signal.
"""


def parser() -> argparse.ArgumentParser:
    """Build the parser of the command and all subcommands."""
    top = argparse.ArgumentParser(
        prog="tscale",
        description="Carry clock readings through topocentric, geocentric and barycentric coordinate times, and back.",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    top.add_argument("--version", action="version", version=f"tscale {__version__}")
    subparsers = top.add_subparsers(dest="command", metavar="COMMAND", required=True)
    for command in COMMANDS:
        command.add_parser(subparsers)
    top.set_defaults(whole=top)  # for the completion of shells
    return top


def run(arguments: Sequence[str] | None) -> int:
    """Run the command; returns the exit status."""
    args = parser().parse_args(arguments)
    if isinstance(sys.stdout, io.TextIOWrapper):
        # Names in a summary may hold what the locale cannot write.
        sys.stdout.reconfigure(errors="backslashreplace")
    with _ended_by_signals(), _warnings_as_lines():
        return _run(args)


def _run(args: argparse.Namespace) -> int:
    # numpy comes with the errors, and `--help` does without it.
    from ..errors import TscaleError
    from .project import with_project

    try:
        args = with_project(args)
        status = args.run(args)
        if sys.stdout is not None:
            sys.stdout.flush()
    except TscaleError as error:
        # There is no mask to be seen here.
        message = re.sub(r" \((?:see (?:\.|the )mask|the mask marks (?:it|them))\)", "", str(error))
        note(_located(message, error.path, error.row), "error")
        return _WRONG
    except BrokenPipeError:
        # Nobody reads any more.
        _drop_output()
        return _BY_SIGNAL + _SIGPIPE
    except OSError as error:
        where = f"{error.filename}: " if error.filename else ""
        note(f"{where}{error.strerror or error}", "error")
        _drop_output()
        return _WRONG
    return _DONE if status is None else int(status)


def _drop_output() -> None:
    """Let go of what the standard output does not take, or the interpreter would complain again when it closes it."""
    with contextlib.suppress(ValueError, AttributeError):
        try:
            sys.stdout.flush()
        except OSError:
            os.dup2(os.open(os.devnull, os.O_WRONLY), 1)


@contextlib.contextmanager
def _ended_by_signals() -> Iterator[None]:
    """Let the signals that end a program pass through as an exception, so that temporary files are removed."""

    def leave(number: int, frame: FrameType | None) -> None:
        signal.signal(number, signal.SIG_IGN)  # once is enough: a second one would stop the tidying up
        if number == signal.SIGINT:
            raise KeyboardInterrupt
        raise SystemExit(_BY_SIGNAL + number)

    numbers = [getattr(signal, name) for name in ("SIGINT", "SIGTERM", "SIGHUP") if hasattr(signal, name)]
    if threading.current_thread() is not threading.main_thread():
        numbers = []
    # One that is ignored (nohup) stays so.
    before = {number: signal.getsignal(number) for number in numbers}
    before = {number: handler for number, handler in before.items() if handler is not signal.SIG_IGN}
    for number in before:
        signal.signal(number, leave)
    try:
        yield
    finally:
        for number, handler in before.items():
            signal.signal(number, handler)


@contextlib.contextmanager
def _warnings_as_lines() -> Iterator[None]:
    """Show warnings as lines of this command, each once."""
    from ..errors import ExtrapolationWarning

    said: set[str] = set()

    def show(message: Warning | str, category: type[Warning], *place: Any, **more: Any) -> None:
        text = str(message)
        if text not in said:
            said.add(text)
            note(text, "note" if issubclass(category, ExtrapolationWarning) else "warning")

    with warnings.catch_warnings():
        warnings.simplefilter("always", ExtrapolationWarning)
        warnings.showwarning = show
        yield


def _located(message: str, path: Path | None, row: int | None) -> str:
    """`FILE:LINE: message`, without saying the file twice."""
    if path is None:
        return message
    message = re.sub(r"\[Errno \d+\] ([^:]+): '.*'", r"\1", message)  # a system's text says the file again
    place = f"{path}{'' if row is None else f':{row}'}"
    for name in dict.fromkeys((str(path), str(path.resolve()), path.name)):
        said = re.match(rf"{re.escape(name)}(?:, (?:line|row) \d+)?: ", message)
        if said:
            return _located(message[said.end() :], path, row)
        # A name such as "a" would be found in any text.
        within = re.search(rf"(?<![\w./-]){re.escape(name)}(?![\w/-])(?:, (?:line|row) {row}\b)?", message)
        if within and ("." in name or os.sep in name):
            return f"{message[: within.start()]}{place}{message[within.end() :]}"
    return f"{place}: {message}"
