"""A day at an invented clock laboratory: how fast its clocks run, and what follows from comparing them.

Two optical clocks, on the Kestrel Ridge and at the Tern Bay below, are compared for a week, and the difference of
frequency becomes one of height. Then a clock flies round the world, one goes to orbit, and one to the Moon. Run from
anywhere; `--plot` draws the flight::

    python examples/walk_clocks.py [--plot flight.png]

The command line gives the same with a budget of uncertainty; see `tscale clock --help`.
"""

from __future__ import annotations

import argparse
from pathlib import Path

import numpy as np

import tscale
from tscale.clocks import orbit_rate, proper_ledger
from tscale.transforms.planetary import surface_clock_summary

FOLDER = Path(__file__).parent
DAY_S = 86400.0
START = tscale.Instants.from_iso("2025-03-03T00:00:00", scale="UTC")
WEEK = START.shifted(7 * DAY_S)

# One levelled from the coast, one with a geopotential number of its own. Both refer to the geoid of TT.
RIDGE = tscale.Site.from_geodetic("Kestrel Ridge", 127.3518, -26.1473, 612.4, height_above_geoid_m=600.2)
BAY = tscale.Site.from_geodetic("Tern Bay", 127.9021, -26.4118, 31.9, geopotential_number_m2_s2=197.31)


def against_tt() -> None:
    """The rate of one clock, term by term, and how the Moon and the Sun move it."""
    hours = START.shifted(np.arange(0, 7 * 24) * 3600.0)
    ledger = proper_ledger(RIDGE, hours)
    print(f"At {START.to_iso(0)} UTC the rate of the clock on the ridge against TT is\n\n{ledger.table(0)}\n")
    tide = ledger["tidal"]
    print(f"In the week the tide moves it from {tide.min():+.2e} to {tide.max():+.2e}.\n")


def levelling() -> None:
    """From a week of readings to the height of the ridge above the bay."""
    found = tscale.compare_clocks(RIDGE, BAY, START, WEEK)
    print(f"The ridge against the bay for a week, predicted from levelling:\n\n{found.table()}\n")
    # Invented readings: hourly means of the frequency ratio, with noise of the link and of both clocks.
    noise = np.random.default_rng(20250303).normal(0.0, 4e-17, 7 * 24)
    readings = found.rate + 1.6e-17 + noise  # as if the levelling were 15 cm off; the clocks will tell
    mean, u = float(readings.mean()), float(np.hypot(readings.std(ddof=1) / np.sqrt(readings.size), 5e-18))
    height = tscale.height_from_frequency(mean, u, lat_deg=RIDGE.lat_deg, height_above_geoid_m=20.2)
    print(f"{readings.size} readings: {mean:.5e}, u = {u:.1e} with 5e-18 of the clocks' own")
    print(
        f"so W(bay) - W(ridge) = {height.geopotential_number_m2_s2:.2f} m2/s2, and the ridge is {height.height_m:.2f} "
        f"m above the bay, u = {height.height_sigma_m:.2f} m"
    )
    print(f"measured minus levelled: {(mean - found.rate) / u:+.1f} standard uncertainties\n")


def in_the_air(plot: Path | None) -> None:
    """A clock flown round the world against the one left at home."""
    flight = tscale.Trajectory.from_flight(FOLDER / "flight_east.csv")
    start, stop = (tscale.Instants.from_seconds(round(count), 0.0, scale="TT") for count in flight.span)
    # Whole seconds of TT just inside the flight.
    start, stop = start.shifted(1.0), stop.shifted(-1.0)
    home = tscale.Site.from_geodetic("home", -77.0, 38.0, 0.0, height_above_geoid_m=0.0)
    found = tscale.compare_clocks(flight, home, start, stop)
    hours = found.duration_s / 3600.0
    print(f"Flown eastward round the world in {hours:.1f} h, a clock is off by {found.accumulated_s * 1e9:+.0f} ns:")
    for name, value in found.ledger.items():
        print(f"  {name:<14}{value * 1e9:+12.3f} ns")
    print()
    if plot is not None:
        from tscale.plots import save_clock_picture

        dates = start.shifted(np.linspace(0.0, found.duration_s - 1e-3, 600))
        save_clock_picture(found, dates, plot)
        print(f"written: {plot}\n")


def in_orbit() -> None:
    """What to set a clock to before it is launched, and how well that works."""
    a_m, i_deg = 26_561_750.0, 55.0
    rate = orbit_rate(a_m, i_deg)
    offset = float(rate.factory_offset)
    orbit = tscale.Trajectory.from_kepler(START, a_m, 0.0, i_deg, 10.0, 0.0, 0.0, name="Lantern")
    geoid = tscale.Site.from_geodetic("geoid", 0.0, 0.0, 0.0, geopotential_number_m2_s2=0.0)
    clock = tscale.ProperClock("lantern", orbit, START, rate_offset=offset)
    left = tscale.compare_clocks(clock, geoid, START, WEEK)
    print(f"In orbit a clock gains {float(rate.total) * DAY_S * 1e6:.4f} us a day: set it to {offset:.4e} of its")
    print(f"frequency, and {left.rate * DAY_S * 1e12:+.1f} ps a day are left.\n")


def on_the_moon() -> None:
    """A clock on the Moon over 18 years, in which its months come round together."""
    base = tscale.SurfaceSite("Ochre Camp", "moon", 10.0, -5.0)
    summary = surface_clock_summary(base, tscale.ReferenceData.default(), "2016-06-26", "2034-07-08")
    assert summary.fit is not None
    largest = summary.fit.terms[0]
    print(f"On the Moon a clock gains {summary.mean_rate * DAY_S * 1e6:.4f} us a day on TT on average, and swings")
    print(f"by {largest.amplitude_s * 1e6:.4f} us with the month of {largest.period_d:.2f} days.")


def main() -> None:
    """The whole walk."""
    parser = argparse.ArgumentParser(description="Clocks on a ridge, at a bay, in the air, in orbit and on the Moon.")
    parser.add_argument("--plot", type=Path, help="picture of the flight, PNG, PDF or SVG")
    args = parser.parse_args()
    against_tt()
    levelling()
    in_the_air(args.plot)
    in_orbit()
    on_the_moon()


if __name__ == "__main__":
    main()
