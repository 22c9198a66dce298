"""Shared hypothesis strategies, aimed at the hazards: leap seconds, half days, one ulp."""

from __future__ import annotations

import numpy as np
from hypothesis import strategies as st

import tscale

DAY_S = 86400
START_1962 = -1199188800 + 86400  # 1962-01-02T00:00, in seconds from 2000-01-01T12:00
END_2059 = 1861876800 + 43200  # 2059-01-01T00:00


def _leap_seconds_tai() -> list[int]:
    """Counts of UTC at the ends of the days with a leap second or a step since 1962."""
    table = tscale.LeapSeconds.default()
    days = [row.mjd for row in table.rows if row.mjd > 37665]
    found = []
    for day in days:
        whole, _ = table.count_from_label(day, 0, 0.0)
        found.append(int(whole))
    return found


LEAPS = _leap_seconds_tai()

fractions = st.one_of(
    st.floats(0.0, 1.0, exclude_max=True),
    st.sampled_from([0.0, 0.5, 5e-324, 2.0**-53, float(np.nextafter(1.0, 0.0)), 0.184, 0.816]),
)


def wholes(start: int = START_1962, end: int = END_2059) -> st.SearchStrategy[int]:
    """Whole counts over a span, often near a leap second, a half day or a record edge."""
    leaps = [x for x in LEAPS if start < x < end]
    near_leap = st.builds(lambda at, by: at + by, st.sampled_from(leaps), st.integers(-3, 3))
    half_day = st.builds(
        lambda n, by: n * (DAY_S // 2) + by,
        st.integers(start // (DAY_S // 2) + 1, end // (DAY_S // 2) - 1),
        st.integers(-1, 1),
    )
    return st.one_of(st.integers(start + 3600, end - 3600), near_leap, half_day)


def dates(scale: str, start: int = START_1962, end: int = END_2059) -> st.SearchStrategy[tscale.Instants]:
    """Instants of a scale, one at a time."""
    return st.builds(lambda w, f: tscale.Instants.from_seconds(w, f, scale=scale), wholes(start, end), fractions)
