"""Make the example files: readings of an invented observatory's maser, and its comparisons.

Nothing here was measured. Kestrel Ridge, its laboratory and its clocks do not exist; the numbers are of the size that
such clocks have. Run from anywhere; the files are written beside this script and are the same every time::

    python examples/make_data.py
"""

from __future__ import annotations

import os
import random
from pathlib import Path

import numpy as np

import tscale

FOLDER = Path(__file__).parent
START = "2025-03-03T00:00:00"
DAYS = 8
DAY_S = 86400

MASER_OFFSET_S = 4.2e-6
"""CLOCK(maser) - UTC(KRL) at the start, s."""

MASER_RATE = 3.1e-14
"""Its rate, s/s: 2.7 ns a day."""

SITE = """\
# The mast of the invented observatory Kestrel Ridge: reference point of its clock room.
[site]
name = "Kestrel Ridge"
geodetic = { lon_deg = 127.3518, lat_deg = -26.1473, height_m = 612.4 }
velocity_m_yr = [-0.046, -0.012, 0.051]
epoch_jyear = 2020.0
frame = "ITRF2020"
"""

SOURCE = """\
# An invented star: direction at the epoch (TDB at the barycentre), proper motion, parallax.
[source]
name = "Lantern"
ra_deg = 187.2519
dec_deg = -12.6408
pm_ra_cosdec_mas_yr = -41.7
pm_dec_mas_yr = 18.3
parallax_mas = 6.2
epoch = "2016-01-01T00:00:00"
"""


def write(name: str, text: str) -> None:
    """Write one file whole."""
    target = FOLDER / name
    temporary = target.with_suffix(".part")
    temporary.write_text(text, encoding="utf-8", newline="\n")
    os.replace(temporary, target)
    print(f"wrote {target.name}: {len(text.splitlines())} lines")


def maser_log(random_numbers: random.Random) -> str:
    """CLOCK(maser) against UTC(KRL), every six hours; one comparison failed."""
    start = tscale.Instants.from_iso([START], scale="UTC(KRL)")
    elapsed_s = np.arange(0, DAYS * DAY_S + 1, DAY_S // 4)
    epochs = tscale.Instants.from_seconds(start.whole + elapsed_s, 0.0, scale="UTC(KRL)").to_iso(0)
    lines = [
        "# CLOCK(maser) minus UTC(KRL), time-interval counter in the clock room of Kestrel Ridge (invented data).",
        "epoch,offset_s,uncertainty_s,reference,clock",
    ]
    wander_s = 0.0
    for number, (epoch, since_s) in enumerate(zip(epochs, elapsed_s.tolist(), strict=True)):
        wander_s += random_numbers.gauss(0.0, 4e-11)
        offset_s = MASER_OFFSET_S + MASER_RATE * since_s + wander_s
        # The counter was switched off once; the gap from 18h to 6h holds no reading.
        offset = "" if number == 20 else f"{offset_s:.12f}"
        lines.append(f"{epoch},{offset},0.00000000015,UTC(KRL),CLOCK(maser)")
    return "\n".join(lines) + "\n"


def laboratory_log(random_numbers: random.Random) -> str:
    """UTC(KRL) against UTC, every five days at 0h, with the size and spacing of published comparisons."""
    start = tscale.Instants.from_iso(["2025-02-23T00:00:00"], scale="UTC")
    epochs = tscale.Instants.from_seconds(start.whole + np.arange(5) * 5 * DAY_S, 0.0, scale="UTC").to_iso(0)
    lines = [
        "# UTC(KRL) minus UTC, every five days (invented data).",
        "epoch,offset_s,uncertainty_s,reference,clock",
    ]
    offset_s = 6.4e-9
    for epoch in epochs:
        offset_s += random_numbers.gauss(0.0, 7e-10)
        lines.append(f"{epoch},{offset_s:.11f},0.0000000024,UTC,UTC(KRL)")
    return "\n".join(lines) + "\n"


def readings(random_numbers: random.Random) -> str:
    """Flashes of a star, dated by the maser: seven nights of 96 readings each."""
    zero = tscale.Instants.from_iso([START], scale="CLOCK(maser)")
    lines = [
        "# Flashes of the invented star Lantern at Kestrel Ridge, dated by the site's maser (invented data).",
        "reading,night,flash,photons",
    ]
    for night in range(1, 8):
        begin_s = (night - 1) * DAY_S + 12 * 3600 + 1260
        for flash in range(1, 97):
            since_s = begin_s + (flash - 1) * 150
            at = zero.shifted((np.array([since_s]), np.array([random_numbers.random()])))
            lines.append(f"{at.to_iso(12)[0]},{night},{flash},{random_numbers.randint(410, 980)}")
    return "\n".join(lines) + "\n"


def main() -> None:
    """Write all example files."""
    write("site.toml", SITE)
    write("source.toml", SOURCE)
    write("maser.csv", maser_log(random.Random(20250303)))
    write("utc_krl.csv", laboratory_log(random.Random(20250223)))
    write("readings.csv", readings(random.Random(42)))


if __name__ == "__main__":
    main()
