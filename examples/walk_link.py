"""A walk through planning contacts: when an invented Mars orbiter can be heard, and when its signals arrive, to 1 ps.

Each part that begins with `# %%` is a cell: editors and notebooks that know this layout run them one by one. As a
script it runs from anywhere and writes nothing::

    python examples/walk_link.py
"""

# %% The two ends
# The station is the mast of Kestrel Ridge; the orbiter goes round Mars by its elements on the axes of the ICRF.
from __future__ import annotations

from pathlib import Path

import numpy as np

import tscale

HERE = Path(__file__).parent if "__file__" in globals() else Path("examples")
station = tscale.Site.load(HERE / "site.toml")
epoch = tscale.Instants.from_iso("2025-03-03T00:00:00", scale="TDB")
orbiter = tscale.Trajectory.from_kepler(
    epoch, a_m=7.2e6, e=0.35, i_deg=63, node_deg=40, periapsis_deg=120, mean_anomaly_deg=10, center="mars"
)

# %% A day of signals
# One signal a minute, sent at dates of TDB. Where the ground or Mars is in the way there is no link; here that is
# marked, and not an error.
minutes = epoch.shifted(np.arange(1440) * 60.0)
day = tscale.link.one_way(transmit=minutes, transmitter=orbiter, receiver=station, occultation="ignore")
clear = ~day.occulted & (day.receive_elevation_deg > 10.0)
edges = np.flatnonzero(np.diff(np.concatenate([[False], clear, [False]]).astype(int)))
print(f"{'from (UTC)':<22}{'to (UTC)':<22}{'light time, s':>18}{'range rate, km/s':>20}")
for a, b in zip(edges[::2], edges[1::2] - 1, strict=True):
    first, last = day.receive_on("UTC")[a].to_iso(0), day.receive_on("UTC")[b].to_iso(0)
    rate = day.range_rate_m_s[a : b + 1] / 1e3
    times = f"{day.light_time_s[a]:.3f} to {day.light_time_s[b]:.3f}"
    print(f"{first!s:<22}{last!s:<22}{times:>18}{f'{rate.min():+.2f} to {rate.max():+.2f}':>20}")
assert 0 < clear.sum() < clear.size

# %% One signal
# The first that gets through. Every term of its light time is listed: the geometry, and what each body's gravity adds.
sent = minutes[clear][0]
down = tscale.link.one_way(transmit=sent, transmitter=orbiter, receiver=station)
print(f"sent     {sent.to_iso(12)} TDB")
print(
    f"received {down.receive_on('UTC').to_iso(12)} UTC, {float(down.receive_elevation_deg):.1f} deg above the horizon"
)
print(down.table())

# %% What the receiver has to be tuned to
# The orbiter's oscillator counts its own proper time: faster than TDB, which keeps pace with the Earth, deeper in the
# field of the Sun. The rate of the light time, gravitation included, is the Doppler shift between the two dates in TDB.
own = tscale.proper_rate(orbiter, minutes[clear], against="TDB")
arrives = (1 + own) * (1 - day.light_time_rate[clear]) - 1
print(f"the orbiter's clock runs by {own.min():+.3e} to {own.max():+.3e} against TDB")
print(f"its carrier comes in shifted by {arrives.min():+.3e} to {arrives.max():+.3e}, counted in TDB")

# %% There and back
# A question goes up by the maser of the station, the answer starts 0.25 s after it came, and the round trip is counted
# by the same maser, so that its offset matters little: only its rate does.
logs = [tscale.ClockLog.load(HERE / name) for name in ("maser.csv", "utc_krl.csv")]
asked = tscale.Instants.from_iso("2025-03-04T10:00:00", scale="CLOCK(maser)")
trip = tscale.link.two_way(
    transmit=asked, station=station, target=orbiter, turnaround_s=0.25, clocks=logs, occultation="ignore"
)
print(f"answer at {trip.receive_on('CLOCK(maser)').to_iso(12)} of the maser")
print(f"round trip {float(trip.round_trip_on('CLOCK(maser)')):.12f} s of the maser")
print(f"           {float(trip.round_trip_s):.12f} s of TDB")

# %% Behind the Sun
# In January 2026 Mars stands behind the Sun, and gravity delays the light by more than 100 us. Close to the Sun the
# first-order formula is not enough: the second order is a term of its own.
january = tscale.Instants.from_iso("2026-01-01T00:00:00", scale="TDB").shifted(np.arange(0, 20 * 24) * 3600.0)
link = tscale.link.one_way(transmit=january, transmitter="mars", receiver="earth", occultation="ignore")
sun_s = link.ledger["Shapiro delay, sun"]
most = int(np.argmax(sun_s))
print(f"{1e6 * sun_s[most]:.1f} us at {january[most].to_iso(0)}")
print({name: f"{float(value[most]):.3e}" for name, value in link.ledger.items() if "sun" in name})
assert 80e-6 < sun_s[most] < 130e-6
