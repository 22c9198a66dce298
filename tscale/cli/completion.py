"""`tscale completion`: a script that teaches a shell to complete the command."""

from __future__ import annotations

import argparse
from typing import Any, Final

from .streams import standard_output

__all__ = ["add_parser", "run"]

_SHELLS: Final = ("bash", "zsh", "tcsh")
_FILES: Final = ("FILE", "INPUT", "OUTPUT", "LOG", "CLOCK", "CLOCK2", "END")
# Names that stand for no file of the user's: UTC(LAB) and CLOCK(NAME) depend on logs, which a shell does not read.
_SCALES: Final = ("UTC", "UT1", "TAI", "TT", "GPS", "GST", "BDT", "GLONASS", "TCG", "TCB", "TDB", "TCL")
_PLACES: Final = ("TCG@GEOCENTER", "TCB@GEOCENTER", "TDB@GEOCENTER", "TCB@BARYCENTER", "TDB@BARYCENTER")

_EPILOG: Final = """\
examples:
  tscale completion bash > ~/.local/share/bash-completion/completions/tscale
  tscale completion zsh > ~/.zfunc/_tscale                # a folder of $fpath
"""


def add_parser(subparsers: argparse._SubParsersAction[Any]) -> None:
    """Add the subcommand."""
    parser = subparsers.add_parser(
        "completion",
        help="a script that teaches a shell to complete this command",
        description="Print a script with which a shell completes commands, options, scales and names of files. Needs "
        "shtab (the extra `completion`).",
        epilog=_EPILOG,
        formatter_class=argparse.RawDescriptionHelpFormatter,
        allow_abbrev=False,
    )
    parser.add_argument("shell", metavar="SHELL", choices=_SHELLS, help=", ".join(_SHELLS))
    parser.set_defaults(run=run)


def run(args: argparse.Namespace) -> int:
    """Print the script."""
    from ..errors import MissingPiece

    try:
        import shtab
    except ImportError as error:
        raise MissingPiece("completion needs shtab; install it with: pip install 'tscale[completion]'") from error
    _mark(args.whole, shtab.FILE)
    print(shtab.complete(args.whole, shell=args.shell), file=standard_output())
    return 0


def _mark(parser: argparse.ArgumentParser, files: Any) -> None:
    """Say of every argument what it takes, by its metavar."""
    from ..ephemeris import BODY_IDS

    bodies = tuple(BODY_IDS)
    for action in parser._actions:
        if isinstance(action, argparse._SubParsersAction):
            for inner in action.choices.values():
                _mark(inner, files)
        elif action.metavar in _FILES:
            action.complete = files  # type: ignore[attr-defined]
        elif action.metavar == "NODE":
            action.choices = (*_SCALES, *_PLACES)
        elif action.metavar == "SCALE":
            action.choices = _SCALES
        elif action.metavar == "BODY":
            action.choices = bodies
