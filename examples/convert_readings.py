"""Convert the example readings from Python: the same path as the command in the README, and back.

Run from anywhere::

    python examples/convert_readings.py
"""

from __future__ import annotations

import csv
from pathlib import Path

import numpy as np

import tscale

FOLDER = Path(__file__).parent


def main() -> None:
    """Carry every reading of the maser to TCB and TDB at the site, and to TDB at the barycentre."""
    with (FOLDER / "readings.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(line for line in file if not line.startswith("#")))
    readings = tscale.Instants.from_iso([row["reading"] for row in rows], scale="CLOCK(maser)")

    site = tscale.Site.load(FOLDER / "site.toml")
    star = tscale.Source.load(FOLDER / "source.toml")
    logs = [tscale.ClockLog.load(FOLDER / "maser.csv"), tscale.ClockLog.load(FOLDER / "utc_krl.csv")]

    for end in ("TCB", "TDB", "TDB@BARYCENTER"):
        chain = tscale.chain("CLOCK(maser)", end, site=site, clocks=logs, source=star)
        dates = chain(readings)
        back = chain.inverse(dates)
        print(chain)
        print(f"  first {dates[0].to_iso(12)}, last {dates[-1].to_iso(12)}")
        print(f"  standard uncertainty {chain.sigma_s(readings).max():.1e} s at most")
        print(f"  there and back {np.abs(back.minus(readings.at(back.place))).max():.1e} s at most")
    print(chain.ledger(readings).table(0))


if __name__ == "__main__":
    main()
