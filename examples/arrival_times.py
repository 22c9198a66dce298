"""Date the pulses of invented pulsars at three invented observatories, and show that what is left is flat.

1. Simulate: pulses that pass the solar-system barycentre at whole turns of each pulsar are followed back to the
   observatories and written down as readings of their clocks, with 80 ns of noise.
2. Convert: the texts are read again and carried forward, clock reading to TDB at the barycentre.
3. Show: the turns counted at the barycentre are whole but for the noise; leave a term out and they are not.

    python examples/arrival_times.py [--plot residuals.png]
"""

from __future__ import annotations

import argparse
from dataclasses import dataclass, replace
from fractions import Fraction

import numpy as np

import tscale
from tscale import exact

NOISE_S = 80e-9
SITES = [
    tscale.Site.from_geodetic("Kestrel Ridge", lon_deg=127.3518, lat_deg=-26.1473, height_m=612.4),
    tscale.Site.from_geodetic("Saltmarsh", lon_deg=8.9021, lat_deg=54.3316, height_m=3.1),
    tscale.Site.from_geodetic("Alto Verde", lon_deg=-66.4107, lat_deg=-24.8820, height_m=4180.0),
]


@dataclass(frozen=True)
class Pulsar:
    """A direction and a rotation: turns = f0 t + f1 t^2 / 2, t in TDB seconds since the epoch."""

    source: tscale.Source
    f0_hz: Fraction
    f1_hz_s: float
    epoch: tscale.Instants

    def turns(self, t: tscale.Instants) -> exact.Pair:
        """Turns since the epoch as whole turns and a fraction: 10^11 turns are counted to 10^-15."""
        since = t.minus_exact(self.epoch)
        seconds = exact.seconds(since)
        return exact.add_seconds(exact.multiply(since, exact.Factor.of(self.f0_hz)), 0.5 * self.f1_hz_s * seconds**2)

    def residual_s(self, t: tscale.Instants) -> np.ndarray:
        """Seconds from the nearest whole turn."""
        _, fraction = self.turns(t)
        return (fraction - np.round(fraction)) / float(self.f0_hz)


EPOCH = tscale.Instants.from_iso("2021-01-01T00:00:00", scale="TDB", place="BARYCENTER")
PULSARS = [
    Pulsar(
        tscale.Source(201.3180, 17.4420, 8.1, -3.6, 0.9, name="Plover"), Fraction("211.3046172905318"), -2.3e-15, EPOCH
    ),
    Pulsar(
        tscale.Source(74.9050, -33.6170, 57.3, -40.2, 6.1, name="Dunlin"),
        Fraction("142.8193056611274"),
        -1.1e-15,
        EPOCH,
    ),
    Pulsar(
        tscale.Source(318.2260, 4.8710, -11.4, 6.7, 1.5, name="Sandpiper"),
        Fraction("71.9064412850933"),
        -4.4e-16,
        EPOCH,
    ),
]


def clock_of(site: tscale.Site, rng: np.random.Generator) -> tscale.ClockLog:
    """A daily comparison log of the site's clock: a drifting maser with a wandering phase."""
    name = site.name.replace(" ", "")
    days = np.arange(0, 366 * 4)
    epoch = tscale.Instants.from_mjd(59200 + days, 0.0, scale="UTC")
    offset_s = 3e-6 + 2e-14 * 86400 * days + np.cumsum(rng.normal(0.0, 2e-10, days.size))
    return tscale.ClockLog.from_rows(name, epoch, offset_s, np.full(days.size, 5e-10))


def simulate(pulsar: Pulsar, chain: tscale.Chain, rng: np.random.Generator) -> list[str]:
    """Readings of pulses near 120 random moments of three years, as texts."""
    guess = EPOCH.shifted(np.sort(rng.uniform(0.0, 3 * 365.25 * 86400, 120)))
    for _ in range(2):  # to the nearest whole turn, then once more for the rounding
        guess = guess.shifted(-pulsar.residual_s(guess))
    readings = chain.inverse(guess)
    return readings.shifted(rng.normal(0.0, NOISE_S, 120)).to_iso(12).tolist()


def main() -> None:
    parser = argparse.ArgumentParser(description=__doc__.splitlines()[0])
    parser.add_argument("--plot", metavar="FILE", help="also draw the residuals (needs matplotlib)")
    plot = parser.parse_args().plot
    rng = np.random.default_rng(20210101)
    logs = {site.name: clock_of(site, rng) for site in SITES}
    shown = []
    print(f"{'pulsar':<10} {'observatory':<14} {'pulses':>6} {'rms ns':>8} {'yearly ns':>9} {'no parallax ns':>14}")
    for pulsar in PULSARS:
        for site in SITES:
            log = logs[site.name]

            def chain_with(source: tscale.Source, site: tscale.Site = site, log: tscale.ClockLog = log) -> tscale.Chain:
                return tscale.chain(log.scale, "TDB@BARYCENTER", site=site, clocks=[log], source=source)

            texts = simulate(pulsar, chain_with(pulsar.source), rng)
            readings = tscale.Instants.from_iso(texts, scale=log.scale)
            dates = chain_with(pulsar.source)(readings)
            residual_s = pulsar.residual_s(dates)
            poor_s = pulsar.residual_s(chain_with(replace(pulsar.source, parallax_mas=0.0))(readings))
            year = 2 * np.pi * dates.minus(EPOCH) / 31557600.0
            yearly = np.hypot(2 * np.mean(residual_s * np.sin(year)), 2 * np.mean(residual_s * np.cos(year)))
            row = [np.std(residual_s), yearly, np.std(poor_s)]
            print(
                f"{pulsar.source.name:<10} {site.name:<14} {len(texts):>6} "
                + "{:>8.1f} {:>9.1f} {:>14.1f}".format(*(1e9 * v for v in row))
            )
            # Flat: the scatter is the noise put in, and no yearly wave stands out of it.
            assert 0.8 * NOISE_S < row[0] < 1.2 * NOISE_S
            assert row[1] < 4 * NOISE_S * np.sqrt(2 / len(texts))
            shown.append((pulsar.source.name, site.name, dates, residual_s))
    print(f"noise put in: {1e9 * NOISE_S:.0f} ns; residuals are flat")
    if plot:
        draw(shown, plot)


def draw(shown: list[tuple[str, str, tscale.Instants, np.ndarray]], path: str) -> None:
    import matplotlib

    matplotlib.use("Agg")
    from matplotlib import pyplot as plt

    names = list(dict.fromkeys(name for name, *_ in shown))
    figure, axes = plt.subplots(len(names), 1, figsize=(8, 7), sharex=True, sharey=True, layout="constrained")
    for axis, name in zip(axes, names, strict=True):
        for pulsar, site, dates, residual_s in shown:
            if pulsar == name:
                axis.plot(2021 + dates.minus(EPOCH) / 31557600.0, 1e9 * residual_s, ".", ms=4, label=site)
        axis.axhline(0.0, color="0.6", lw=0.8, zorder=0)
        axis.set_title(name, loc="left", fontsize=10)
        axis.set_ylabel("residual / ns")
    axes[0].legend(ncols=3, fontsize=8, loc="upper right", frameon=False)
    axes[-1].set_xlabel("year (TDB at the barycentre)")
    axes[-1].ticklabel_format(useOffset=False)
    figure.savefig(path, dpi=120)
    print(f"drawn in {path}")


if __name__ == "__main__":
    main()
