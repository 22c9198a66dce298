"""Packets from an invented observatory to an invented Mars orbiter: when they arrive, and when the answer is back.

They are sent at readings of the maser of Kestrel Ridge, carried to UTC by the comparison logs beside this file. Run
from anywhere; `--output` writes the table of all packets::

    python examples/link_pass.py [--output link_pass.csv] [--plot link_pass.png]

The command line gives the same on UTC (all in one line)::

    tscale link --from site.toml --to link_pass.toml --two-way --turnaround 0.25
        --transmit 2025-03-03T03:00:00 --until 2025-03-03T18:00:00 --step 300
"""

from __future__ import annotations

import argparse
import csv
import os
import tomllib
from pathlib import Path

import numpy as np

import tscale

FOLDER = Path(__file__).parent
TURNAROUND_S = 0.25
EVERY_S = 300


def orbiter() -> tscale.Trajectory:
    elements = tomllib.loads((FOLDER / "link_pass.toml").read_text(encoding="utf-8"))["orbit"]
    epoch = tscale.Instants.from_iso(elements.pop("epoch"), scale=elements.pop("scale"))
    return tscale.Trajectory.from_kepler(epoch, **elements)


def windows(clear: np.ndarray) -> list[tuple[int, int]]:
    """First and last index of each run of packets that get through."""
    edges = np.flatnonzero(np.diff(np.concatenate([[False], clear, [False]]).astype(int)))
    return [(int(a), int(b) - 1) for a, b in zip(edges[::2], edges[1::2], strict=True)]


def main() -> None:
    parser = argparse.ArgumentParser(description="Packets to an invented Mars orbiter and back.")
    parser.add_argument("--output", type=Path, help="CSV file of all packets")
    parser.add_argument("--plot", type=Path, help="picture, PNG, PDF or SVG")
    args = parser.parse_args()

    site = tscale.Site.load(FOLDER / "site.toml")
    logs = [tscale.ClockLog.load(FOLDER / name) for name in ("maser.csv", "utc_krl.csv")]
    first = tscale.Instants.from_iso("2025-03-03T03:00:00", scale="CLOCK(maser)")
    readings = first.shifted(np.arange(0, 15 * 3600 + 1, EVERY_S))
    trip = tscale.link.two_way(
        transmit=readings,
        station=site,
        target=orbiter(),
        turnaround_s=TURNAROUND_S,
        clocks=logs,
        occultation="ignore",  # the ground or Mars may be in the way of some packets
    )
    columns = {
        "sent, CLOCK(maser)": readings.to_iso(9),
        "at the orbiter, TDB": trip.bounce.to_iso(9),
        "answer, CLOCK(maser)": trip.receive_on("CLOCK(maser)").to_iso(9),
        "round trip, s of the maser": [f"{x:.9f}" for x in trip.round_trip_on("CLOCK(maser)")],
        "range up, km": [f"{x / 1e3:.6f}" for x in trip.up.range_m],
        "range rate up, m/s": [f"{x:.6f}" for x in trip.up.range_rate_m_s],
        "path": ["blocked" if x else "clear" for x in trip.occulted],
    }
    if args.output:
        temporary = args.output.with_name(args.output.name + ".part")
        with temporary.open("w", encoding="utf-8", newline="") as file:
            writer = csv.writer(file, lineterminator="\n")
            writer.writerow(columns)
            writer.writerows(zip(*columns.values(), strict=True))
        os.replace(temporary, args.output)

    print(f"{len(readings)} packets, one every {EVERY_S} s; {int((~trip.occulted).sum())} have a clear path both ways")
    print(f"\n{'from':<21}{'to':<21}{'round trip, s':>24}{'range rate, km/s':>22}{'elevation, deg':>18}")
    elevation = trip.up.transmit_elevation_deg
    for a, b in windows(~trip.occulted):
        rate = trip.up.range_rate_m_s[a : b + 1] / 1e3
        print(
            f"{readings[a].to_iso(0)!s:<21}{readings[b].to_iso(0)!s:<21}"
            f"{f'{trip.round_trip_s[a]:.3f} to {trip.round_trip_s[b]:.3f}':>24}"
            f"{f'{rate.min():+.2f} to {rate.max():+.2f}':>22}"
            f"{f'{elevation[a]:.1f} to {elevation[b]:.1f}':>18}"
        )
    start = windows(~trip.occulted)[0][0]
    print(f"\nThe first packet with a clear path, on its way up:\n\n{trip.up.table(start)}")
    if args.output:
        print(f"\nwritten: {args.output}")
    if args.plot:
        from tscale.plots import save_link_picture

        save_link_picture(trip, args.plot)
        print(f"written: {args.plot}")


if __name__ == "__main__":
    main()
