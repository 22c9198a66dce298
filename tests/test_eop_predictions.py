"""Predicted Earth orientation against what was measured later: the errors of old issues over the uncertainties in use.

`data/eop_predictions` holds the predicted rows of five issues of finals2000A, half a year apart, as they stood on the
day of issue; the table in use has since measured those days. Every issue is followed for up to a year, but the errors
of one issue go together for months: five issues are some ten independent runs, so that an rms is known to 25 per cent.
"""

from __future__ import annotations

from pathlib import Path
from typing import NamedTuple

import numpy as np
import pytest

from tscale.exact import FloatArray
from tscale.formats.leap_seconds import LeapSeconds
from tscale.tables import EarthOrientation
from tscale.tables.iers_files import parse_finals

ISSUES = sorted((Path(__file__).parent / "data" / "eop_predictions").glob("finals2000A_*.txt"))
LEAP = LeapSeconds.default()


class Pulls(NamedTuple):
    """Errors over uncertainties, (n, 5): UT1, x, y, dX, dY; NaN where no offset was predicted."""

    lead_days: FloatArray
    pulls: FloatArray
    stated: FloatArray
    """The same over the uncertainties as the file states them."""


@pytest.fixture(scope="module")
def found() -> Pulls:
    parts = []
    now = EarthOrientation.default()
    for path in ISSUES:
        old, rows = EarthOrientation.load(path), parse_finals(path.read_bytes(), path)
        assert rows.predicted.all()
        days = rows.mjd[rows.mjd < (now.predicted_from_mjd or 10**6)]
        whole, fraction = LEAP.count_from_label(days, 0, 0.0)
        was, then = (table.at((whole + 32, fraction)) for table in (old, now))
        assert (was.status == 1).all()
        assert not then.status.any()
        error = np.stack([a - b for a, b in zip(was[:5], then[:5], strict=True)], axis=1)
        sigma, known = (np.stack(list(table[5:10]), axis=1) for table in (was, then))
        # Predictions of the celestial pole offsets end after some 70 days.
        dark = rows.sigmas[: len(days), 3] == 0.25
        error[dark, 3:] = np.nan
        unit = np.array([1.0, *[np.pi / 648000] * 2, *[np.pi / 648e6] * 2])
        plain = error / np.hypot(rows.sigmas[: len(days)] * unit, known)
        parts.append(Pulls(days - rows.mjd[0] + 1.0, error / np.hypot(sigma, known), plain))
    return Pulls(*(np.concatenate(column) for column in zip(*parts, strict=True)))


def rms(values: FloatArray) -> float:
    return float(np.sqrt(np.nanmean(values**2)))


def test_there_are_years_of_predictions(found: Pulls) -> None:
    assert len(ISSUES) == 5
    assert len(found.lead_days) > 1700
    assert found.lead_days.max() > 360


@pytest.mark.parametrize("columns", [[0], [1, 2], [3, 4]])
def test_uncertainties_in_use_are_those_of_the_errors(found: Pulls, columns: list[int]) -> None:
    """Pulls of 0.9 (UT1), 1.1 (pole) and 1.0 (celestial pole) rms: 1 within 25 per cent, and as much again for the few
    runs.
    """
    pulls = found.pulls[:, columns]
    assert 0.6 < rms(pulls) < 1.4
    assert np.mean(np.abs(pulls[np.isfinite(pulls)]) < 2.0) > 0.9
    assert np.nanmax(np.abs(pulls)) < 5.0


def test_stated_uncertainties_are_too_small(found: Pulls) -> None:
    """What Bulletin A states: pulls of 1.8 (UT1) and 2.2 (pole) rms, found on 2026-12-01; so that twice is used."""
    assert 1.5 < rms(found.stated[:, 0]) < 2.1
    assert 1.8 < rms(found.stated[:, 1:3]) < 2.6
    # The first days are fine as they stand.
    assert rms(found.stated[found.lead_days <= 10, 0]) < 1.0
    # Celestial pole offsets: 1.5, 0.2 mas, 6 mm at the Earth's surface, 20 ps; so that 1.5 times is used.
    assert 1.2 < rms(found.stated[:, 3:]) < 1.8


def test_the_spread_by_lead(found: Pulls) -> None:
    """UT1 and pole, pulls by days ahead: the uncertainties grow as the errors do, to a factor of 2.5 either way.

    The first ten days are on the safe side. A span of a year holds one or two independent values an issue.
    """
    for first, last in ((11, 30), (31, 90), (91, 180), (181, 372)):
        here = (found.lead_days >= first) & (found.lead_days <= last)
        for columns in ([0], [1, 2]):
            assert 1 / 2.6 < rms(found.pulls[here][:, columns]) < 2.5, (first, columns)
