"""A walk through a cross-check: how far another program's dates are from ours, and why.

Each part that begins with `# %%` is a cell: editors and notebooks that know this layout run them one by one. As a
script it runs from anywhere and writes nothing; it needs astropy::

    python examples/walk_crosscheck.py
"""

# %% Against general libraries
# Before anything of another program is questioned: do the conversions here agree with those of the libraries that all
# use? Each line has its tolerance, and the reason for it.
from __future__ import annotations

from pathlib import Path

import numpy as np

import tscale

HERE = Path(__file__).parent if "__file__" in globals() else Path("examples")
report = tscale.crosscheck.libraries(["UTC - TAI", "UT1", "topocentric", "Roemer"], count=200)
print(report.table())
assert report.passed

# %% A table of another program
# It was given dates of UTC at the Kestrel Ridge, and gave TDB at the barycentre for the star. Here the table is made
# up, with two mistakes in it: its leap seconds end before 2017, and it leaves the parallax out.
site = tscale.Site.load(HERE / "site.toml")
star = tscale.Source.load(HERE / "source.toml")
chain = tscale.chain("UTC", "TDB@BARYCENTER", site=site, source=star)
rng = np.random.default_rng(7)
first = tscale.Instants.from_iso("2016-01-01T00:00:00", scale="UTC")
given = first.shifted(np.sort(rng.uniform(0.0, 3 * 365.25 * 86400.0, 500)))

far = tscale.Source(star.ra_deg, star.dec_deg, star.pm_ra_cosdec_mas_yr, star.pm_dec_mas_yr, 0.0, star.epoch)
late = given.minus(tscale.Instants.from_iso("2017-01-01T00:00:00", scale="UTC")) >= 0.0
taken = given.shifted(np.where(late, -1.0, 0.0))  # without the last leap second a label means an instant 1 s earlier
theirs = tscale.chain("UTC", "TDB@BARYCENTER", site=site, source=far)(taken)
theirs = theirs.shifted(rng.normal(0.0, 3e-9, given.size))  # and it writes its dates with few digits

# %% How far are they?
found = tscale.crosscheck.against(given, theirs, chain=chain)
print(found.table())

# %% And why?
# Mistakes of a catalogue are tried alone and together. Those that bring the difference down to noise are named, with
# their size; what is left is told too.
explanation = tscale.crosscheck.explain(given, theirs, chain=chain)
print(explanation.table())
assert [name for name, *_ in explanation.causes] == [
    "leap second of 2017-01-01 (MJD 57754) left out",
    "parallax left out",
]
assert explanation.unexplained_rms_s < 4e-9
