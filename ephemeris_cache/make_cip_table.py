"""Make `cip_iau2006a_1960_2060.npz`: X, Y and s of IAU 2006/2000A as Chebyshev records over TT.

Run from the top of a checkout::

    python ephemeris_cache/make_cip_table.py

The records interpolate the full series (`erfa.xys06a`) at the Chebyshev nodes of 4-day panels, 10 coefficients
each. The script then compares record and series at random dates, refuses to write a table that is worse than
`TOLERANCE_RAD`, and prints the line of origin for the manifest.

Contents of the file: `start_s` and `step_s` (TT count of the first panel and panel length, s) and
`coefficients` [record, component, coefficient], rad.
"""

from __future__ import annotations

import os
from pathlib import Path

import erfa
import numpy as np

START_MJD = 36888  # 1959-11-16; the panels reach 2060-02-19, so that light time and rate differences stay inside
PANEL_DAY = 4
PANELS = 9155
COEFFICIENTS = 10
TOLERANCE_RAD = 2e-14  # 0.13 um at the Earth's surface
TARGET = Path(__file__).parent / "cip_iau2006a_1960_2060.npz"


def xys(day_j2000: np.ndarray) -> np.ndarray:
    """X, Y, s (rad) on the first axis at TT days since J2000.0."""
    return np.array(erfa.xys06a(2451545.0, day_j2000))


def fit() -> tuple[float, np.ndarray]:
    """Day of the first panel since J2000.0 and the coefficients [record, component, coefficient]."""
    start_day = START_MJD - 51544.5
    node = np.cos(np.pi * (np.arange(COEFFICIENTS) + 0.5) / COEFFICIENTS)
    day = start_day + PANEL_DAY * (np.arange(PANELS)[:, None] + (node + 1) / 2)
    basis = np.polynomial.chebyshev.chebvander(node, COEFFICIENTS - 1) * (2 / COEFFICIENTS)
    basis[:, 0] /= 2
    return start_day, np.einsum("cpn,nk->pck", xys(day), basis)


def worst_rad(start_day: float, coefficients: np.ndarray) -> float:
    """Largest difference from the series at 20 000 random dates."""
    random = np.random.default_rng(1)
    panel = random.integers(0, PANELS, 20_000)
    u = random.uniform(-1, 1, panel.size)
    basis = np.polynomial.chebyshev.chebvander(u, COEFFICIENTS - 1)
    table = np.einsum("pck,pk->cp", coefficients[panel], basis)
    return float(np.abs(table - xys(start_day + PANEL_DAY * (panel + (u + 1) / 2))).max())


def main() -> None:
    """Fit, check, write."""
    start_day, coefficients = fit()
    worst = worst_rad(start_day, coefficients)
    if not worst < TOLERANCE_RAD:
        raise SystemExit(f"the records differ from the series by {worst:.1e} rad, more than {TOLERANCE_RAD:.0e}")
    temporary = TARGET.with_suffix(".tmp")
    with open(temporary, "wb") as stream:
        np.savez(stream, start_s=start_day * 86400.0, step_s=PANEL_DAY * 86400.0, coefficients=coefficients)
    os.replace(temporary, TARGET)
    print(
        f"{TARGET.name}: IAU 2006/2000A X, Y, s by erfa.xys06a (pyerfa {erfa.__version__}), "
        f"{PANELS} panels of {PANEL_DAY} d from MJD {START_MJD}, worst difference {worst:.1e} rad"
    )


if __name__ == "__main__":
    main()
