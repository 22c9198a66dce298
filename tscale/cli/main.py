"""Entry of the command `tscale`. It imports nothing before it can be interrupted without a traceback."""

from __future__ import annotations

import sys

__all__ = ["main"]

_INTERRUPTED = 128 + 2


def main(arguments: list[str] | None = None) -> int:
    """Run the command; returns the exit status."""
    try:
        from .command import run

        return run(arguments)
    except KeyboardInterrupt:
        if sys.stderr is not None:
            print("tscale: interrupted; no output file was left", file=sys.stderr)
        return _INTERRUPTED


if __name__ == "__main__":
    sys.exit(main())
