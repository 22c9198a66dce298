"""ERFA's published validation vectors, met by our functions and by the ERFA functions that we stand on."""

from __future__ import annotations

import csv
from pathlib import Path

import erfa
import numpy as np
import pytest

import tscale

DATA = Path(__file__).parent / "data"


def rows() -> list[dict[str, str]]:
    with (DATA / "erfa_time_vectors.csv").open(encoding="utf-8") as stream:
        return list(csv.DictReader(line for line in stream if not line.startswith("#")))


@pytest.mark.parametrize("row", rows(), ids=lambda row: row["function"])
def test_time_scale_vectors(row: dict[str, str]) -> None:
    # taiut1 and ttut1 give UT1-TAI = -32.6659 s and TT-UT1 = 64.8499 s: the same UT1-UTC, 33 s being TAI-UTC.
    orientation = tscale.EarthOrientation.constant(ut1_minus_utc_s=float(row["ut1_minus_utc_s"] or 0.0))
    reference = tscale.ReferenceData.load(earth_orientation=orientation)
    t = tscale.Instants.from_jd(2453750, 0.5 + float(row["fraction_in_d"]), scale=row["start"])
    day, fraction = tscale.chain(row["start"], row["end"], reference=reference)(t).to_jd()
    found = (int(day) - 2453750) + (float(fraction) - 0.5)
    assert found == pytest.approx(float(row["fraction_out_d"]), abs=float(row["tolerance_d"]))


@pytest.mark.parametrize(("year", "month", "seconds"), [(2003, 6, 32.0), (2008, 1, 33.0), (2017, 9, 37.0)])
def test_dat(year: int, month: int, seconds: float) -> None:
    # t_erfa_c.c, t_dat: 2003-06-01, 2008-01-17, 2017-09-01.
    day = 17 if month == 1 else 1
    t = tscale.Instants.from_iso(f"{year}-{month:02d}-{day:02d}", scale="UTC")
    assert float(tscale.LeapSeconds.default().tai_minus_utc(t.pair)) == seconds


def test_the_functions_we_stand_on_give_their_published_values() -> None:
    # t_erfa_c.c: t_xys06a (behind the table of the celestial pole), t_dtdb, t_epv00 and t_era00 (checked against).
    x, y, s = erfa.xys06a(2400000.5, 53736.0)
    assert x == pytest.approx(0.5791308482835292617e-3, abs=1e-14)
    assert y == pytest.approx(0.4020580099454020310e-4, abs=1e-15)
    assert s == pytest.approx(-0.1220032294164579896e-7, abs=1e-18)
    assert erfa.dtdb(2448939.5, 0.123, 0.76543, 5.0123, 5525.242, 3190.0) == pytest.approx(
        -0.1280368005936998991e-2, abs=1e-15
    )
    assert erfa.era00(2400000.5, 54388.0) == pytest.approx(0.4022837240028158102, abs=1e-12)
    heliocentric, barycentric = erfa.epv00(2400000.5, 53411.52501161)
    expected = [-0.7714104440491111971, 0.5598412061824171323, 0.2425996277722452400]
    assert np.asarray(barycentric["p"]) == pytest.approx(expected, abs=1e-14)
    assert float(heliocentric["p"][0]) == pytest.approx(-0.7757238809297706813, abs=1e-14)
