"""An event list of 2 GB carried to the barycentre: time, and memory that stays bounded."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path

import numpy as np

import tscale
from tscale.fits import instant_blocks
from tscale.fits.cards import Cards

SITE = tscale.Site.from_geodetic("Kestrel Ridge", lon_deg=127.35, lat_deg=-26.15, height_m=612.0)
STAR = tscale.Source(ra_deg=187.25, dec_deg=-12.64, parallax_mas=6.2)
ROW_BYTES = 32
ROWS = 2_000_000_000 // ROW_BYTES
SPAN_S = 20 * 86400

# In a process of its own, for the most memory that one has held: `getrusage` would tell that of its parent.
_RUN = """
import json, sys, time
from pathlib import Path
import tscale
from tscale.fits import convert_events
chain = tscale.load_compiled(sys.argv[3])
begun = time.perf_counter()
done = convert_events(sys.argv[1], sys.argv[2], chain, rebase=True, threads=int(sys.argv[4]))
took_s = time.perf_counter() - begun
status = Path("/proc/self/status").read_text()
peak_kib = int(next(line for line in status.splitlines() if line.startswith("VmHWM:")).split()[1])
print(json.dumps({"rows": done.rows, "took_s": took_s, "peak_gib": peak_kib / 2**20}))
"""


def write_events(path: Path, rows: int) -> None:
    """Rows in the order of time, written without their being held."""
    cards = {
        "XTENSION": "BINTABLE", "BITPIX": 8, "NAXIS": 2, "NAXIS1": ROW_BYTES, "NAXIS2": rows, "PCOUNT": 0, "GCOUNT": 1,
        "TFIELDS": 3, "TTYPE1": "TIME", "TFORM1": "1D", "TUNIT1": "s", "TTYPE2": "PI", "TFORM2": "1J",
        "TTYPE3": "PIXELS", "TFORM3": "20B", "EXTNAME": "EVENTS", "TIMESYS": "TT", "TREFPOS": "TOPOCENTER",
        "MJDREF": 60740.0, "CHECKSUM": "0" * 16, "DATASUM": "0",
    }  # fmt: skip
    block = np.random.default_rng(5).integers(0, 256, (1 << 18, ROW_BYTES), dtype=np.uint8)
    with path.open("wb") as file:
        file.write(Cards.of({"SIMPLE": True, "BITPIX": 8, "NAXIS": 0}).to_bytes())
        file.write(Cards.of(cards).to_bytes())
        for first in range(0, rows, len(block)):
            part = block[: min(len(block), rows - first)]
            t = (first + np.arange(len(part))) * (SPAN_S / rows)
            part[:, :8] = t.astype(">f8").view(np.uint8).reshape(-1, 8)
            file.write(part.data)
        file.write(b"\0" * (-rows * ROW_BYTES % 2880))


def test_two_gigabytes_in_bounded_memory(tmp_path: Path) -> None:
    source, target, compiled = (tmp_path / name for name in ("in.fits", "out.fits", "chain"))
    chain = tscale.chain("TT@TOPOCENTER", "TDB@BARYCENTER", site=SITE, source=STAR)
    chain.compile("2025-03-05", "2025-03-28").save(compiled)
    try:
        write_events(source, ROWS)
        print()
        for threads in (1, 2):
            command = [sys.executable, "-c", _RUN, str(source), str(target), str(compiled), str(threads)]
            run = json.loads(subprocess.run(command, capture_output=True, text=True, check=True).stdout)
            print(
                f"{run['rows']} rows, {source.stat().st_size / 1e9:.2f} GB, {threads} threads: {run['took_s']:.1f} s, "
                f"{run['took_s'] / run['rows'] * 1e9:.0f} ns a row, peak {run['peak_gib']:.2f} GiB"
            )
            assert run["rows"] == ROWS
            assert run["peak_gib"] < 1.0
        rows = 0
        for before, after in zip(instant_blocks(source), instant_blocks(target), strict=True):
            sample = slice(None, None, 100_003)
            # What the chain was compiled to (1e-13 s), and half the spacing of numbers within 20 days, 0.12 ns.
            assert np.max(np.abs(after[sample].minus(chain(before[sample])))) < 1.3e-10
            rows += before.size
        assert rows == ROWS
    finally:
        source.unlink(missing_ok=True)
        target.unlink(missing_ok=True)
