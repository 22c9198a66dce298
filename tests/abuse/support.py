"""What the trials share: a small kernel, a chain over it, and results as a hash."""

from __future__ import annotations

import hashlib
import os
import sys
from pathlib import Path

import numpy as np
from jplephem.excerpter import write_excerpt
from jplephem.spk import SPK

import tscale
from tscale.ephemeris.shipped import DEFAULT_KERNEL, shipped_path

ROOT = Path(__file__).parent.parent.parent
SITE = tscale.Site.from_itrf("north", 1_200_000.0, -4_600_000.0, 4_230_000.0)
SOURCE = tscale.Source(83.6, 22.0, parallax_mas=0.5, name="a star")


def environment(cache: Path) -> dict[str, str]:
    """For child processes: this checkout, one cache folder."""
    return {**os.environ, "PYTHONPATH": str(ROOT), "TSCALE_CACHE": str(cache)}


def excerpt(path: Path, days: float = 600.0) -> Path:
    """A kernel of its own time ephemeris: DE440 from late 1976 on, some hundred kB."""
    with SPK.open(str(shipped_path(DEFAULT_KERNEL))) as kernel, path.open("w+b") as file:
        write_excerpt(kernel, file, 2443100.5, 2443100.5 + days, kernel.daf.summaries())
    return path


def dates(seed: int, n: int = 300) -> tscale.Instants:
    """UTC dates within the excerpt."""
    rng = np.random.default_rng(seed)
    return tscale.Instants.from_seconds(-710_000_000 + rng.integers(0, 30_000_000, n), rng.random(n), scale="UTC")


def chain_over(kernel: Path) -> tscale.Chain:
    """From a site to the barycentre by way of the time ephemeris of a kernel."""
    reference = tscale.ReferenceData.load(ephemeris=kernel)
    return tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE, reference=reference)


def digest(*parts: tscale.Instants) -> str:
    found = hashlib.sha256()
    for t in parts:
        found.update(t.whole.tobytes())
        found.update(t.fraction.tobytes())
    return found.hexdigest()


def python(*words: str | Path) -> list[str]:
    return [sys.executable, "-W", "error::RuntimeWarning", *map(str, words)]
