"""Make `time_ephemeris_de440_1960_2060.bsp`: TT - TDB at the geocentre along the shipped excerpt of DE440.

Run from the top of a checkout, after make_excerpt.py::

    python ephemeris_cache/make_time_ephemeris.py
"""

from __future__ import annotations

from pathlib import Path

from tscale.ephemeris import Ephemeris, TimeEphemeris

FOLDER = Path(__file__).parent
KERNEL = FOLDER / "de440_1960_2060.bsp"
TARGET = FOLDER / "time_ephemeris_de440_1960_2060.bsp"


def main() -> None:
    """Integrate and write."""
    built = TimeEphemeris.of(Ephemeris.open(KERNEL), cache=False, progress=True)
    built.write_spk(TARGET)
    print(f"wrote {TimeEphemeris.open(TARGET)}, {TARGET.stat().st_size} bytes; next: make_manifest.py")


if __name__ == "__main__":
    main()
