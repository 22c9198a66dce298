"""Labels of scales that take leap seconds at odd places or of odd sizes, from text to count and back."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest

from tscale.errors import ExtrapolationWarning, InvalidInput, TextError
from tscale.formats import iso8601, labels
from tscale.formats.leap_seconds import LeapSeconds
from tscale.scales import Scale

UTC = labels.day_length(Scale.parse("UTC"), None)
GLONASS = labels.day_length(Scale.parse("GLONASS"), None)


def parse_utc(text: Any) -> Any:
    return iso8601.parse(text, allow_second_60=True)


def parse_glonass(text: Any) -> Any:
    return iso8601.parse(text, allow_second_60=True, label_offset_s=10800)


def test_drift_era_noon_survives_counting() -> None:
    # Label seconds of 1965 are not SI seconds: a count that forgot it would print 12:00:00.0007 or so.
    kind = Scale.parse("UTC")
    count = labels.count(kind, parse_utc("1965-06-30T12:00:00"))
    assert str(iso8601.format(*labels.label(kind, count), 15, day_length=UTC)) == "1965-06-30T12:00:00.000000000000000"


def test_negative_leap_second() -> None:
    table = LeapSeconds.default().with_step(63000, 36)
    length = labels.DayLength(table)
    label = parse_utc(["2031-05-13T23:59:58.25", "2031-05-13T23:59:58.75"])
    texts = iso8601.format(*label, 0, day_length=length)
    assert texts.tolist() == ["2031-05-13T23:59:58", "2031-05-14T00:00:00"]


def test_glonass_leap_second() -> None:
    # GLONASS ICD 5.1 (2008), 3.3.3 (from memory): GLONASS time is UTC(SU) + 3 h and takes leap seconds with UTC.
    kind = Scale.parse("GLONASS")
    texts = ["2017-01-01T02:59:59.6", "2017-01-01T02:59:60.6", "2017-01-01T03:00:00.6", "2016-12-31T23:59:59.6"]
    count = labels.count(kind, parse_glonass(texts))
    utc = labels.count(
        Scale.parse("UTC"), parse_utc([t.replace("2017-01-01T02:59", "2016-12-31T23:59") for t in texts[:2]])
    )
    assert (count[0][:2] - utc[0]).tolist() == [10800, 10800]
    assert (count[0] - count[0][0]).tolist() == [0, 1, 2, -10800]
    label = labels.label(kind, count)
    assert iso8601.format(*label, 1, day_length=GLONASS).tolist() == texts
    assert iso8601.format(*label, 0, day_length=GLONASS).tolist() == [
        "2017-01-01T02:59:60",
        "2017-01-01T03:00:00",
        "2017-01-01T03:00:01",
        "2017-01-01T00:00:00",
    ]
    with pytest.raises(TextError, match="do not exist"):
        labels.count(kind, parse_glonass("2016-01-01T02:59:60"))


def test_leap_minute_label() -> None:
    table = LeapSeconds.default().with_step(63000, 137)
    length = labels.DayLength(table)
    label = parse_utc(["2031-05-13T23:59:60", "2031-05-13T23:59:159.9", "2031-05-13T12:00:00"])
    assert table.count_from_label(*label)[0].tolist()[1] - table.count_from_label(*label)[0].tolist()[0] == 99
    assert iso8601.format(*label, 1, day_length=length).tolist() == [
        "2031-05-13T23:59:60.0",
        "2031-05-13T23:59:159.9",
        "2031-05-13T12:00:00.0",
    ]
    assert str(iso8601.format(62999, 86499, 0.99, 1, day_length=length)) == "2031-05-14T00:00:00.0"


@pytest.mark.parametrize("scale", ["UTC", "TT"])
def test_far_counts(scale: str) -> None:
    kind = Scale.parse(scale)
    far = 8 * 10**18  # s: 253 Gyr
    label = labels.label(kind, (np.array(far), np.array(0.25)))
    text = str(iso8601.format(*label, 2, day_length=labels.day_length(kind, None)))
    assert text.startswith("+25350")
    assert int(labels.count(kind, iso8601.parse(text))[0]) == far
    with pytest.raises(InvalidInput, match="270 Gyr") as caught:
        labels.label(kind, (np.array([0, 2**63 - 1]), np.zeros(2)))
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True]


def test_days_in_messages_have_their_calendar_date() -> None:
    table = LeapSeconds.default().with_expiry(61584)
    utc = Scale.parse("UTC")
    with pytest.warns(ExtrapolationWarning, match=r"past the expiry of the leap-second table .* on 2027-06-28 \(MJD 6"):
        labels.warn_if_expired(utc, table.count_from_label(61584, 0, 0.0), table)
    with pytest.raises(TextError, match=r"second 86400 of 2016-12-31 \(MJD 57753\)"):
        labels.count(Scale.parse("TAI"), (np.array(57753), np.array(86400), np.array(0.0)))
