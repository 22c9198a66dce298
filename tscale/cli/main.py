"""Entry of the command `tscale`: arguments, errors as one line, exit status."""

from __future__ import annotations

import argparse
import os
import sys
from collections.abc import Sequence
from pathlib import Path
from typing import Final

from .. import __version__
from . import convert, data, link

__all__ = ["main"]

COMMANDS: Final = (convert, data, link)

_DONE: Final = 0
_WRONG: Final = 2  # as argparse does for arguments it refuses
_BROKEN_PIPE: Final = 128 + 13  # what a shell reports for a program that SIGPIPE ended
_INTERRUPTED: Final = 128 + 2


def parser() -> argparse.ArgumentParser:
    """Build the parser of the command and all subcommands."""
    top = argparse.ArgumentParser(
        prog="tscale",
        description="Carry clock readings through topocentric, geocentric and barycentric coordinate times, and back.",
        epilog="Exit status: 0 done, 2 not done (one line on the error stream says why; no output file is left).",
        allow_abbrev=False,
    )
    top.add_argument("--version", action="version", version=f"tscale {__version__}")
    subparsers = top.add_subparsers(dest="command", metavar="COMMAND", required=True)
    for command in COMMANDS:
        command.add_parser(subparsers)
    return top


def main(arguments: Sequence[str] | None = None) -> int:
    """Run the command; returns the exit status."""
    args = parser().parse_args(arguments)
    # numpy comes with the errors, and `--help` does without it.
    from ..errors import TscaleError

    try:
        status = args.run(args)
        sys.stdout.flush()
    except TscaleError as error:
        print(f"tscale: error: {_located(str(error), error.path, error.row)}", file=sys.stderr)
        return _WRONG
    except BrokenPipeError:
        # Nobody reads any more. Without this the interpreter would complain again when it closes the stream.
        os.dup2(os.open(os.devnull, os.O_WRONLY), 1)
        return _BROKEN_PIPE
    except OSError as error:
        where = f"{error.filename}: " if error.filename else ""
        print(f"tscale: error: {where}{error.strerror or error}", file=sys.stderr)
        return _WRONG
    except KeyboardInterrupt:
        print("tscale: interrupted; no output file was left", file=sys.stderr)
        return _INTERRUPTED
    return _DONE if status is None else int(status)


def _located(message: str, path: Path | None, row: int | None) -> str:
    """`FILE:LINE: message`, without saying the file twice."""
    if path is None:
        return message
    for start in (f"{path}, line {row}: ", f"{path}: "):
        message = message.removeprefix(start)
    return f"{path}{'' if row is None else f':{row}'}: {message}"


if __name__ == "__main__":
    sys.exit(main())
