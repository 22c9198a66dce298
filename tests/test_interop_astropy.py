"""Exchange with astropy's Time, against astropy's own arithmetic."""

from __future__ import annotations

import sys
from fractions import Fraction

import numpy as np
import pytest
from astropy.time import Time, TimeDelta
from hypothesis import given
from hypothesis import strategies as st

import tscale
from tscale.errors import InvalidInput, MissingPiece, OutOfSpan, ScaleMismatch
from tscale.interop import from_astropy, to_astropy

SCALES = ["utc", "tai", "tt", "tcg", "tcb", "tdb", "ut1"]
ROUNDING_S = 2.4e-12
"""A float64 fraction of a day of up to half a day in size is rounded by half an ulp at the most: 2.8e-17 d, 2.4 ps."""


@pytest.mark.parametrize("scale", SCALES)
def test_labels_agree(scale: str) -> None:
    # The text that astropy prints for a date is the text that we print: to its 9 decimals, where neither rounds.
    texts = ["1999-12-31T23:59:59.125000000", "2016-12-31T23:59:59.250000000", "2025-07-01T00:00:00.000000000"]
    read = from_astropy(Time(texts, scale=scale))
    assert read.scale == scale.upper()
    assert read.place is None
    # Astropy's own reading is a fraction of a day: 24 ps.
    assert np.max(np.abs(read.minus(tscale.Instants.from_iso(texts, scale=scale.upper())))) < 24e-12
    assert to_astropy(tscale.Instants.from_iso(texts, scale=scale.upper())).isot.tolist() == [t[:-6] for t in texts]


def test_inside_a_leap_second() -> None:
    theirs = Time("2016-12-31T23:59:60.5", scale="utc")
    ours = from_astropy(theirs)
    assert ours.to_iso(9) == "2016-12-31T23:59:60.500000000"
    back = to_astropy(ours)
    assert back.isot == "2016-12-31T23:59:60.500"
    # Through astropy's own leap-second table to TAI, on both sides of the step.
    tai = from_astropy(theirs.tai)
    assert tai.to_iso(9) == "2017-01-01T00:00:36.500000000"


@pytest.mark.parametrize(
    ("text", "tolerance_s"),
    [
        # Astropy reads a label as a fraction of a day: 24 ps, and so much again for the text of the reading.
        ("1965-06-29T12:00:00", 5e-11),
        ("1969-07-20T20:17:40", 5e-11),
        # Days that end with a step: ERFA takes the step of 0.1 s of TAI for as much UTC, at a rate 3e-8 off: 3.2 ns.
        ("1965-06-30T12:00:00", 4e-9),
        ("1968-01-31T23:59:59", 4e-9),
        ("1971-12-31T23:59:59.9", 4e-9),
    ],
)
def test_drift_years_against_astropys_tai(text: str, tolerance_s: float) -> None:
    # ERFA's rates of 1961-1971, by way of astropy.
    theirs = Time(text, scale="utc")
    utc = from_astropy(theirs)
    assert abs(tscale.chain("UTC", "TAI")(utc).minus(from_astropy(theirs.tai))) < tolerance_s


def _exact_jd(time: Time) -> Fraction:
    return Fraction(float(time.jd1)) + Fraction(float(time.jd2))


@given(
    day=st.integers(min_value=2436935, max_value=2488069),
    part=st.floats(min_value=-0.5, max_value=0.5, allow_nan=False),
    scale=st.sampled_from([s for s in SCALES if s != "utc"]),
)
def test_reading_is_exact(day: int, part: float, scale: str) -> None:
    time = Time(float(day), part, format="jd", scale=scale)
    ours = from_astropy(time)
    seconds = Fraction(int(ours.whole)) + Fraction(float(ours.fraction))
    assert abs(seconds - (_exact_jd(time) - 2451545) * 86400) <= Fraction(2, 10**16)  # the fraction's own resolution


@given(
    whole=st.integers(min_value=-1_200_000_000, max_value=1_800_000_000),
    fraction=st.floats(min_value=0.0, max_value=1.0, exclude_max=True),
    scale=st.sampled_from(SCALES),
)
def test_round_trip(whole: int, fraction: float, scale: str) -> None:
    t = tscale.Instants.from_seconds(whole, fraction, scale=scale.upper())
    back = from_astropy(to_astropy(t))
    assert abs(back.minus(t)) <= ROUNDING_S
    again = from_astropy(to_astropy(back))
    assert abs(again.minus(back)) <= 1e-16  # what came from two floats goes back to the same two


@given(
    day=st.integers(min_value=2436935, max_value=2461500),  # before the leap-second table expires
    part=st.floats(min_value=-0.5, max_value=0.5, allow_nan=False).filter(lambda x: abs(x) > 1.2e-5),
    scale=st.sampled_from(SCALES),
)
def test_two_floats_come_back_as_they_were(day: int, part: float, scale: str) -> None:
    # More than 1 s from noon the two floats are coarser than the 0.1 fs of Instants, so that nothing of them is lost.
    # Astropy itself brings a part of 0.5 to the next day.
    time = Time(float(day), part, format="jd", scale=scale)
    back = to_astropy(from_astropy(time))
    assert (float(back.jd1), float(back.jd2)) == (float(time.jd1), float(time.jd2))


@given(
    day=st.integers(min_value=2436935, max_value=2488069),
    whole=st.integers(min_value=0, max_value=86399),
    fraction=st.floats(min_value=0.0, max_value=1.0, exclude_max=True),
)
def test_writing_is_rounded_once(day: int, whole: int, fraction: float) -> None:
    # The nearest pair there is: no neighbour of jd2 is closer to the date, by rational arithmetic.
    t = tscale.Instants.from_seconds((day - 2451545) * 86400 + whole, fraction, scale="TT")
    time = to_astropy(t)
    wanted = Fraction(int(t.whole)) + Fraction(float(t.fraction))

    def miss(part: float) -> Fraction:
        return abs((Fraction(float(time.jd1)) - 2451545 + Fraction(part)) * 86400 - wanted)

    part = float(time.jd2)
    assert miss(part) <= min(miss(float(np.nextafter(part, side))) for side in (-1.0, 1.0)) + Fraction(1, 10**19)


def test_differences_agree() -> None:
    a = tscale.Instants.from_iso("1990-05-06T07:08:09.123456789012", scale="TT")
    b = a.shifted(1e9 + 0.25)
    step = to_astropy(b) - to_astropy(a)
    assert isinstance(step, TimeDelta)
    assert abs(step.sec - b.minus(a)) < 1.2e-7  # one float64 of 1e9 s; the two dates themselves are within 10 ps


def test_shapes_strides_and_place() -> None:
    grid = Time(np.arange(12.0).reshape(3, 4) + 60000.0, format="mjd", scale="tdb")
    ours = from_astropy(grid[:, ::2], place="BARYCENTER")
    assert ours.shape == (3, 2)
    assert ours.place == "BARYCENTER"
    assert to_astropy(ours).shape == (3, 2)
    assert from_astropy(grid[0, 0]).shape == ()


def test_refusals() -> None:
    with pytest.raises(InvalidInput, match="EarthLocation or SkyCoord, got str"):
        from_astropy("2025-01-01")
    with pytest.raises(InvalidInput, match="names no time scale"):
        from_astropy(Time("2025-01-01", scale="local"))
    masked = Time(["2025-01-01", "2025-01-02"], scale="tt")
    masked[1] = np.ma.masked
    with pytest.raises(InvalidInput, match="1 of 2 dates are masked") as caught:
        from_astropy(masked)
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True]
    with pytest.raises(OutOfSpan):
        from_astropy(Time(33282.0, format="mjd", scale="utc"))
    with pytest.raises(ScaleMismatch, match="no scale GPS"):
        to_astropy(tscale.Instants.from_iso("2025-01-01", scale="GPS"))


def test_without_astropy(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setitem(sys.modules, "astropy.time", None)
    with pytest.raises(MissingPiece, match=r"pip install 'tscale\[astropy\]'"):
        to_astropy(tscale.Instants.from_iso("2025-01-01", scale="TT"))
