"""The CCSDS time codes, against the examples of CCSDS 301.0-B-4 and public test vectors."""

from __future__ import annotations

from fractions import Fraction
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

import tscale
from tscale import timecodes as tc
from tscale.errors import InvalidInput, OutOfSpan, TextError
from tscale.timecodes.binary import from_numerator, to_octets

UTC_COUNTS = st.integers(-883_612_800, 3_000_000_000)  # 1972 to 2095
FRACTIONS = st.floats(0.0, 1.0, exclude_max=True)

pytestmark = pytest.mark.filterwarnings("ignore::tscale.errors.ExtrapolationWarning")


def utc(text: str) -> tscale.Instants:
    return tscale.Instants.from_iso(text, "UTC")


def same(a: tscale.Instants, b: tscale.Instants) -> bool:
    return a.scale == b.scale and bool(np.all(a.whole == b.whole) and np.all(a.fraction == b.fraction))


EXAMPLE = "1988-01-18T17:20:43.123456"
VECTORS: list[tuple[str, str, str, str, dict[str, Any]]] = [
    # CCSDS 301.0-B-4: the worked instant of 3.5.1 in its codes; a public copy of the standard, and public test vectors.
    ("cds", "41", "2A DE 03 B8 CE 73 01 C8", EXAMPLE, {}),
    ("ccs", "53", "19 88 01 18 17 20 43 12 34 56", EXAMPLE, {}),
    ("ccs", "5B", "19 88 00 18 17 20 43 12 34 56", EXAMPLE, {}),
    ("cds", "42", "3F 55 02 B3 2C 95 00 BC 61 4E", "2002-05-23T12:34:56.789012345678", {}),
    ("cds", "4A", "03 69 02 B3 2C 95 00 BC 61 4E", "2002-05-23T12:34:56.789012345678", {"epoch_mjd": 51544}),
    ("cds", "49", "03 69 02 B3 2C 95 00 0C", "2002-05-23T12:34:56.789012", {"epoch_mjd": 51544}),
]
WRITE: dict[str, dict[str, Any]] = {
    "41": {"unit": "us"}, "42": {"unit": "ps"}, "4A": {"unit": "ps"}, "49": {"unit": "us"},
    "53": {"decimals": 6}, "5B": {"decimals": 6, "day_of_year": True},
}  # fmt: skip


@pytest.mark.parametrize(("kind", "p_field", "octets", "text", "options"), VECTORS)
def test_ccsds_codes_of_utc(kind: str, p_field: str, octets: str, text: str, options: dict[str, Any]) -> None:
    read, write = getattr(tc.ccsds, f"from_{kind}"), getattr(tc.ccsds, f"to_{kind}")
    code = bytes.fromhex(p_field + octets)
    t = utc(text)
    assert same(read(code, **options), t)
    assert same(read(code[1:], p_field=code[0], **options), t)
    assert write(t, **WRITE[p_field], **options).tobytes() == code
    assert write(t, **WRITE[p_field], **options, p_field=False).tobytes() == code[1:]


def test_the_unsegmented_code() -> None:
    # 1F: the instant of the standard, own arithmetic (948216067 s of TAI since 1958). 1F and 2F: public test vectors.
    to_tai = tscale.chain("UTC", "TAI")
    epoch = tscale.Instants.from_iso("2000-01-01T12:00:00", "TT")
    for code, text, options in (
        ("1F 38 84 A1 03 1F 9A D0", EXAMPLE, {}),
        ("1F 53 7F 40 90 C9 FB E7", "2002-05-23T12:34:56.789", {}),
        ("2F 04 7E F5 F0 F9 16 87", "2002-05-23T12:34:56.789", {"epoch": epoch}),
    ):
        octets = bytes.fromhex(code)
        t = tc.ccsds.from_cuc(octets, **options)
        want = to_tai(utc(text)) if not options else tscale.chain("UTC", "TT")(utc(text))
        assert t.scale == want.scale
        assert abs(float(t - want)) <= 2.0**-25  # s, half of its resolution
        assert tc.ccsds.to_cuc(want, **options).tobytes() == octets


@given(st.integers(-(10**9), 2**40), FRACTIONS, st.integers(1, 7), st.integers(0, 10))
def test_unsegmented_codes_close_in_every_size(whole: int, fraction: float, basic: int, octets: int) -> None:
    t = tscale.Instants.from_seconds(whole, fraction, scale="TAI")
    since = whole + 1325419200
    if since + 1 >= 2 ** (8 * basic):
        with pytest.raises(OutOfSpan):
            tc.ccsds.to_cuc(t.shifted(1), basic=basic, fraction=octets)
        return
    code = tc.ccsds.to_cuc(t, basic=basic, fraction=octets)
    assert code.shape == ((2 if basic > 4 or octets > 3 else 1) + basic + octets,)
    back = tc.ccsds.from_cuc(code)
    assert abs(float(back - t)) <= 2.0 ** (-8 * octets - 1) + (2.0**-54 if octets > 6 else 0.0)


@given(st.binary(min_size=0, max_size=10))
def test_binary_fractions_are_rounded_once(octets: bytes) -> None:
    got = float(from_numerator(np.frombuffer(octets, np.uint8)))
    exact = Fraction(int.from_bytes(octets, "big"), 256 ** len(octets))
    assert got == min(float(exact), 1.0 - 2.0**-53)


@given(FRACTIONS, st.integers(0, 10))
def test_fractions_are_written_to_the_nearest(fraction: float, count: int) -> None:
    whole, octets = to_octets(np.array(0), np.array(fraction), count)
    got = int(whole) * 256**count + int.from_bytes(octets.tobytes(), "big")
    assert got == round(Fraction(fraction) * 256**count)


@given(UTC_COUNTS, FRACTIONS, st.sampled_from(["ms", "us", "ps"]), st.sampled_from([2, 3]))
def test_day_codes_close_to_their_resolution(whole: int, fraction: float, unit: Any, octets: Any) -> None:
    t = tscale.Instants.from_seconds(whole, fraction, scale="UTC")
    back = tc.ccsds.from_cds(tc.ccsds.to_cds(t, unit=unit, day_octets=octets))
    assert abs(float(back - t)) <= {"ms": 5e-4, "us": 5e-7, "ps": 5e-13}[unit] * (1 + 1e-3)


@given(UTC_COUNTS, FRACTIONS, st.integers(0, 6), st.booleans())
def test_calendar_codes_close_to_their_resolution(whole: int, fraction: float, pairs: int, ordinal: bool) -> None:
    t = tscale.Instants.from_seconds(whole, fraction, scale="UTC")
    back = tc.ccsds.from_ccs(tc.ccsds.to_ccs(t, decimals=2 * pairs, day_of_year=ordinal))
    assert abs(float(back - t)) <= 0.5 * 10.0 ** (-2 * pairs) + 2e-16


def test_leap_seconds_in_ccsds_codes() -> None:
    t = utc("2016-12-31T23:59:60.123456")
    day = tc.ccsds.to_cds(t)
    assert int.from_bytes(day[3:7].tobytes(), "big") == 86_400_123  # CCSDS 301.0-B-4, 3.3: on past 86 399 999
    assert same(tc.ccsds.from_cds(day), t)
    calendar = tc.ccsds.to_ccs(t)
    assert calendar[7] == 0x60
    assert same(tc.ccsds.from_ccs(calendar), t)
    assert tc.ccsds.to_ascii(t) == "2016-12-31T23:59:60.123456Z"
    wrong = bytes.fromhex("53 2016 1230 235960 000000".replace(" ", ""))
    with pytest.raises(TextError):
        tc.ccsds.from_ccs(wrong)


def test_ascii_codes() -> None:
    t = utc(EXAMPLE)
    # CCSDS 301.0-B-4, 3.5.1.
    assert tc.ccsds.to_ascii(t) == "1988-01-18T17:20:43.123456Z"
    assert tc.ccsds.to_ascii(t, code="B") == "1988-018T17:20:43.123456Z"
    for text in ("1988-01-18T17:20:43.123456Z", "1988-018T17:20:43.123456Z", "1988-018T17:20:43.123456"):
        assert same(tc.ccsds.from_ascii(text), t)
    assert tc.ccsds.to_ascii(utc("1999-12-31T23:59:59.7"), code="B", digits=0, terminator=False) == "2000-001T00:00:00"
    with pytest.raises(TextError, match="no CCSDS ASCII codes") as caught:
        tc.ccsds.from_ascii(["1988-01-18T17:20:43Z", "1988-01-18 17:20:43", "1988-01-18"])
    assert caught.value.mask.tolist() == [False, True, True]  # type: ignore[union-attr]
    with pytest.raises(InvalidInput, match="'A' and 'B'"):
        tc.ccsds.to_ascii(t, code="C")  # type: ignore[arg-type]


def test_codes_come_in_arrays_and_lists() -> None:
    t = utc(["1988-01-18T17:20:43.5", "1988-01-18T17:20:44.5"])  # type: ignore[arg-type]
    codes = tc.ccsds.to_cds(t.reshape(2, 1))
    assert codes.shape == (2, 1, 9)
    assert same(tc.ccsds.from_cds(codes).ravel(), t)
    assert same(tc.ccsds.from_cds([row.tobytes() for row in codes[:, 0]]), t)
    mixed = codes.copy()
    mixed[1, 0, 0] = 0x40
    with pytest.raises(InvalidInput, match="have the same P-field"):
        tc.ccsds.from_cds(mixed)


@pytest.mark.parametrize(
    ("read", "code", "options", "message"),
    [
        ("cuc", "41 00", {}, "identification 100; that of CUC is 001 or 010"),
        ("cuc", "1F 00 00", {}, "has 7 octets of time, got 2"),
        ("cuc", "1F 00 00 00 00 00 00 00", {"epoch": utc("2000-01-01")}, "epoch= goes with"),
        ("cuc", "2F 00 00 00 00 00 00 00", {}, "epoch= goes with"),
        ("cuc", "9F 80 00 00 00 00 00 00 00", {}, "third octet or reserved bits"),
        ("cuc", "", {}, "no octets"),
        ("cds", "43 00 00 00 00 00 00", {}, "reserved resolution 11"),
        ("cds", "41 2A DE 03 B8 CE 73 03 E8", {}, "1000 or more parts of a millisecond"),
        ("cds", "41 2A DE 05 26 5C 00 00 00", {}, "do not exist"),
        ("cds", "41 2A DE 03 B8 CE 73 01 C8", {"epoch_mjd": 0}, "epoch_mjd= goes with"),
        ("ccs", "53 19 88 01 18 17 20 4A 12 34 56", {}, "two decimal digits"),
        ("ccs", "53 19 88 02 30 17 20 40 12 34 56", {}, "no dates"),
        ("ccs", "5B 19 89 03 66 17 20 40 12 34 56", {}, "no such day of the year"),
        ("ccs", "57 19 88 02 28 17 20 40 12 34 56", {}, "7 octets of decimals"),
        ("ccs", "1F 38 84 A1 03 1F 9A D0", {}, "identification 001; that of CCS is 101"),
    ],
)
def test_octets_that_are_no_code_are_refused(read: str, code: str, options: dict[str, Any], message: str) -> None:
    with pytest.raises(InvalidInput, match=message.replace("(", r"\(")):
        getattr(tc.ccsds, f"from_{read}")(bytes.fromhex(code), **options)


@given(st.binary(min_size=0, max_size=14), st.sampled_from(["cuc", "cds", "ccs"]))
def test_any_octets_are_a_date_or_an_error_of_ours(code: bytes, kind: str) -> None:
    try:
        t = getattr(tc.ccsds, f"from_{kind}")(code)
    except tscale.TscaleError:
        return
    assert np.all((t.fraction >= 0.0) & (t.fraction < 1.0))
