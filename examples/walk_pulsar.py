"""A walk through a pulsar pipeline, from the reading of a clock to the phase of an invented pulsar.

Each part that begins with `# %%` is a cell: editors and notebooks that know this layout run them one by one. As a
script it runs from anywhere and writes nothing::

    python examples/walk_pulsar.py
"""

# %% What an observatory has
# A maser that was compared with the laboratory KRL every few hours, the laboratory's comparisons with UTC, and the
# place of the clock room. A log is looked over before it is used: here one comparison failed, which leaves a gap.
from __future__ import annotations

from dataclasses import replace
from fractions import Fraction
from pathlib import Path

import numpy as np

import tscale
from tscale import exact

HERE = Path(__file__).parent if "__file__" in globals() else Path("examples")
site = tscale.Site.load(HERE / "site.toml")
logs = [tscale.ClockLog.load(HERE / name) for name in ("maser.csv", "utc_krl.csv")]
print(tscale.ClockLog.inspect(HERE / "maser.csv").table())

# %% A reading becomes a date
# Readings are text with all their digits. They are on the maser's own scale, and nothing else is assumed of them.
readings = tscale.Instants.from_iso(
    ["2025-03-03T12:21:00.639426798458", "2025-03-05T07:00:00.000000000001"], scale="CLOCK(maser)"
)
to_site = tscale.chain("CLOCK(maser)", "TDB", site=site, clocks=logs)
print(to_site)
print(to_site(readings).to_iso(12))
print(to_site.ledger(readings).table(0))

# %% The same signal at the barycentre
# Another place needs to know where the signal comes from. The Roemer delay is the largest term by far; the ledger adds
# up to the whole to the last digit.
star = tscale.Source.load(HERE / "source.toml")
chain = tscale.chain("CLOCK(maser)", "TDB@BARYCENTER", site=site, clocks=logs, source=star)
ledger = chain.ledger(readings)
print(f"Roemer delay {ledger['Roemer delay'][0]:+.9f} s, parallax {1e9 * ledger['parallax (curvature)'][0]:+.3f} ns")
back = chain.inverse(chain(readings))
assert np.abs(back.minus(readings.at("TOPOCENTER"))).max() < 1e-15

# %% How well is it known?
# The budget has a line for every source of uncertainty. What no table states is asked for, or named as not included.
budget = chain.budget(readings[:1], site_sigma_m=0.05, source_position_sigma_mas=1.0)
print(budget.table())
print(f"{1e9 * budget.combined_s[0]:.2f} ns")

# %% Pulses
# An invented pulsar turns 29.6 times a second. Pulses that pass the barycentre at whole turns are followed back to the
# maser: these are the readings that its receiver would have written down, but for noise.
EPOCH = tscale.Instants.from_iso("2025-03-03T00:00:00", scale="TDB", place="BARYCENTER")
F0_HZ = Fraction("29.613745219873")


def phase(t: tscale.Instants) -> np.ndarray:
    """Turns since the epoch less the nearest whole number; seconds and turns are never rounded on the way."""
    _, part = exact.multiply(t.minus_exact(EPOCH), exact.Factor.of(F0_HZ))
    return part - np.round(part)


rng = np.random.default_rng(2025)
moments = EPOCH.shifted(np.sort(rng.uniform(1.5, 4.0, 400)) * 86400.0)
at_barycentre = moments.shifted(-phase(moments) / float(F0_HZ))
pulses = chain.inverse(at_barycentre).shifted(rng.normal(0.0, 50e-9, 400))  # 50 ns of noise

# %% Phases are flat
residual_s = phase(chain(pulses)) / float(F0_HZ)
print(f"residuals {1e9 * np.std(residual_s):.1f} ns rms")
assert 45e-9 < np.std(residual_s) < 55e-9

# %% ... and leave a term out, and they are not
# A site that is 300 m too far east swings with the day; a clock taken for UTC is off by its offset; with a direction
# that is off by an arcsecond the days drift apart.
x_m, y_m, z_m = site.position_m
east = np.array([-y_m, x_m]) / np.hypot(x_m, y_m)
moved = tscale.Site.from_itrf("300 m east", x_m + 300 * east[0], y_m + 300 * east[1], z_m)
labels = tscale.Instants.from_seconds(pulses.whole, pulses.fraction, scale="UTC")
astray = replace(star, dec_deg=star.dec_deg + 1 / 3600)
wrong = {
    "site 300 m east": (tscale.chain("CLOCK(maser)", "TDB@BARYCENTER", site=moved, clocks=logs, source=star), pulses),
    "clock taken for UTC": (tscale.chain("UTC", "TDB@BARYCENTER", site=site, source=star), labels),
    "direction 1 arcsec off": (
        tscale.chain("CLOCK(maser)", "TDB@BARYCENTER", site=site, clocks=logs, source=astray),
        pulses,
    ),
}
for words, (other, given) in wrong.items():
    off_s = phase(other(given)) / float(F0_HZ)
    print(f"{words:<24} mean {1e9 * off_s.mean():+10.1f} ns, scatter {1e9 * off_s.std():8.1f} ns")
    assert max(abs(off_s.mean()), off_s.std()) > 150e-9

# %% What would a better model move?
# The ground rises and falls with the tide of the solid Earth by 0.4 m, and the Earth's rotation has tides within the
# day. Both are left out unless they are asked for: here is what they would do to these dates, term by term.
orientation = tscale.ReferenceData.default().earth_orientation
found = tscale.what_if(
    chain, pulses, site=replace(site, solid_tide=True), earth_orientation=orientation.with_sub_daily()
)
print(found.table())
assert 1e-11 < np.abs(found.total_s).max() < 2e-9

# %% Very many of them
# A month of photons need not walk the whole path each: the chain becomes polynomials, certified against itself.
fast = chain.compile("2025-03-04T12:00:00", "2025-03-07T00:00:00", tolerance_s=1e-12)
print(fast.certificate.table())
assert np.abs(fast(pulses).minus(chain(pulses))).max() < 1.1e-12
