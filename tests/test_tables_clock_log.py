"""Clock logs: exact rationals as the judge of interpolation and closure; gaps, steps, and every kind of bad file."""

from __future__ import annotations

import pickle
from fractions import Fraction
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

from tscale import Instants, exact
from tscale.errors import DataFileError, InvalidInput, OutOfSpan
from tscale.exact import Pair
from tscale.formats.leap_seconds import LeapSeconds
from tscale.tables import ClockLog

HEADER = "epoch,offset_s,uncertainty_s\n"
ROWS = (
    "2026-03-01T00:00:00,1.25e-7,2e-9\n"
    "2026-03-02T00:00:00,1.45e-7,4e-9\n"
    "2026-03-03T00:00:00,1.15e-7,4e-9\n"
    "2026-03-04T00:00:00,1.35e-7,4e-9\n"
)
START = int(Instants.from_iso("2026-03-01T00:00:00", scale="UTC").whole)
# A fraction in [0.5, 1) is rounded by at most 2**-54 s = 0.055 fs; there and back is two of those; 0.2 fs is promised.
ONE_ROUNDING = Fraction(1, 2**54)
CLOSURE = Fraction(2, 10**16)


def write(folder: Path, text: str, name: str = "maser.csv") -> Path:
    path = folder / name
    path.write_text(text)
    return path


def rational(pair: Pair) -> Fraction:
    return int(pair[0]) + Fraction(float(pair[1]))


def pair_of(value: Fraction) -> Pair:
    whole = value.numerator // value.denominator
    carry, fraction = exact.from_seconds(float(value - whole))
    return np.asarray(whole + carry), np.asarray(fraction)


# ---- the map ---------------------------------------------------------------------------------------


@st.composite
def logs(draw: st.DrawFn, interpolation: str) -> tuple[ClockLog, list[Fraction], list[Fraction]]:
    count = draw(st.integers(2, 8))
    origin = draw(st.integers(-(10**9), 2 * 10**9))
    # Offsets from nanoseconds to beyond a TAI-like one, with changes that keep the clock running forwards.
    size = draw(st.sampled_from([1e-9, 1e-3, 0.4]))
    base = draw(st.sampled_from([0, 37, -19]))
    epochs, offsets = [], []
    at = Fraction(origin)
    for _ in range(count):
        at += draw(st.integers(1, 10**6)) + draw(st.sampled_from([Fraction(0), Fraction(1, 4), Fraction(0.1)]))
        epochs.append(rational(pair_of(at)))
        offsets.append(rational(pair_of(base + Fraction(draw(st.floats(-size, size))))))
    epoch = [pair_of(value) for value in epochs]
    offset = [pair_of(value) for value in offsets]
    log = ClockLog.from_rows(
        "maser",
        Instants([int(p[0]) for p in epoch], [float(p[1]) for p in epoch], "UTC"),
        (np.array([int(p[0]) for p in offset]), np.array([float(p[1]) for p in offset])),
        interpolation=interpolation,  # type: ignore[arg-type]
    )
    return log, epochs, offsets


@given(data=st.data())
def test_linear_against_rationals_and_closure(data: st.DataObject) -> None:
    log, epochs, offsets = data.draw(logs("linear"))
    place = data.draw(st.integers(0, len(epochs) - 2))
    part = Fraction(data.draw(st.floats(0, 1)))
    at = pair_of(epochs[place] + part * (epochs[place + 1] - epochs[place]))
    exact_at = min(max(rational(at), epochs[0]), epochs[-1])
    at = pair_of(exact_at)
    place = max(index for index, epoch in enumerate(epochs[:-1]) if epoch <= exact_at)
    slope = (offsets[place + 1] - offsets[place]) / (epochs[place + 1] - epochs[place])
    want = exact_at + offsets[place] + slope * (exact_at - epochs[place])
    reading = log.to_clock(at)
    # The change of offset over an interval is held as one float64: below 1 s, so 2**-54 s of its own.
    assert abs(rational(reading) - want) <= 2 * ONE_ROUNDING
    assert abs(rational(log.to_reference(reading)) - exact_at) <= CLOSURE
    assert abs(rational(log.to_clock(log.to_reference(reading))) - rational(reading)) <= CLOSURE
    assert abs(rational(log.offset(at)) - (want - exact_at)) <= 2 * ONE_ROUNDING


@given(data=st.data())
def test_step_against_rationals_and_closure(data: st.DataObject) -> None:
    log, epochs, offsets = data.draw(logs("step"))
    place = data.draw(st.integers(0, len(epochs) - 2))
    # Clear of the jumps, which are under 1 s: readings there belong to no instant, or to two.
    apart = epochs[place + 1] - epochs[place]
    exact_at = rational(pair_of(epochs[place] + apart * Fraction(data.draw(st.floats(0, 0.9)))))
    reading = log.to_clock(pair_of(exact_at))
    assert abs(rational(reading) - (exact_at + offsets[place])) <= ONE_ROUNDING
    previous = offsets[place - 1] if place else offsets[place]
    past_the_jump = exact_at + offsets[place] - epochs[place] - previous
    if past_the_jump >= 0:
        assert abs(rational(log.to_reference(reading)) - exact_at) <= CLOSURE
    elif past_the_jump < -2e-12:  # jumps below 1 ps, the slack for roundings, are not looked at
        with pytest.raises(OutOfSpan, match="skipped or shown twice"):
            log.to_reference(reading)


def test_a_clock_across_a_leap_second() -> None:
    """Between comparisons on both sides of the leap second of 2016 lie 86401 s, and the clock runs on."""
    epoch = Instants.from_iso(["2016-12-31T00:00:00", "2017-01-01T00:00:00"], scale="UTC")
    log = ClockLog.from_rows("maser", epoch, [0.0, 86401e-9])
    inside = Instants.from_iso("2016-12-31T23:59:60.5", scale="UTC")
    whole, fraction = log.offset(inside.pair)
    assert (int(whole), float(fraction)) == (0, pytest.approx(86400.5e-9, abs=1e-19))


def test_uncertainty_and_rate(tmp_path: Path) -> None:
    log = ClockLog.load(write(tmp_path, HEADER + ROWS))
    at = (START + np.array([0, 43200, 86400, 3 * 86400]), np.zeros(4))
    # Halfway, half of the error of each: 0.5 hypot(2, 4) ns.
    assert log.uncertainty_s(at).tolist() == pytest.approx([2e-9, 5**0.5 * 1e-9, 4e-9, 4e-9], rel=1e-12, abs=0)
    slope = 0.2e-7 / 86400
    assert float(log.rate((START + 10, 0.0))) == pytest.approx(-slope / (1 + slope), rel=1e-6, abs=0)
    step = ClockLog.load(write(tmp_path, HEADER + ROWS), interpolation="step")
    assert step.uncertainty_s(at).tolist() == [2e-9, 2e-9, 4e-9, 4e-9]
    assert step.rate(at).tolist() == [0.0] * 4
    assert float(exact.seconds(step.offset((START + 86399, 0.9)))) == pytest.approx(1.25e-7, abs=1e-20)


@pytest.mark.parametrize("interpolation", ["linear", "step"])
def test_outside_is_refused(tmp_path: Path, interpolation: Any) -> None:
    log = ClockLog.load(write(tmp_path, HEADER + ROWS), interpolation=interpolation)
    at = (START + np.array([[-1, 0], [3 * 86400, 3 * 86400 + 1]]), np.zeros((2, 2)))
    for call in (log.to_clock, log.offset, log.uncertainty_s, log.rate, log.to_reference):
        with pytest.raises(OutOfSpan, match=r"maser\.csv.*2026-03-01T00:00:00 to 2026-03-04T00:00:00 UTC") as caught:
            call(at)
        assert caught.value.mask is not None
        assert caught.value.mask[:, 0].tolist() == [True, False] or call == log.to_reference
        assert caught.value.mask[1, 1]


@pytest.mark.parametrize("interpolation", ["linear", "step"])
def test_an_empty_offset_is_a_gap(tmp_path: Path, interpolation: Any) -> None:
    text = HEADER + ROWS.replace("2026-03-02T00:00:00,1.45e-7,4e-9", "2026-03-02T00:00:00,,")
    log = ClockLog.load(write(tmp_path, text), interpolation=interpolation)
    assert len(log) == 3
    at = (START + np.array([0, 1, 86400, 2 * 86400 - 1, 2 * 86400]), np.zeros(5))
    with pytest.raises(OutOfSpan, match="3 in a gap") as caught:
        log.to_clock(at)
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True, True, True, False]
    ends = (at[0][[0, 4]], at[1][[0, 4]])
    readings = log.to_clock(ends)
    with pytest.raises(OutOfSpan, match="in a gap"):
        log.to_reference((readings[0][:1] + 5, readings[1][:1]))
    back = log.to_reference(readings)
    np.testing.assert_allclose(exact.seconds(exact.subtract(back, ends)), 0, atol=2e-16)


def test_comparisons_too_far_apart_are_a_gap(tmp_path: Path) -> None:
    path = write(tmp_path, HEADER + ROWS.replace("2026-03-02T00:00:00,1.45e-7,4e-9\n", ""))
    ClockLog.load(path, max_gap_s=2 * 86400).to_clock((START + 86400, 0.0))
    with pytest.raises(OutOfSpan, match="in a gap"):
        ClockLog.load(path, max_gap_s=2 * 86400 - 1).to_clock((START + 86400, 0.0))


def test_readings_that_a_step_skips_or_repeats() -> None:
    epoch = Instants.from_seconds([0, 100, 200], scale="UTC")
    log = ClockLog.from_rows("maser", epoch, [0.0, 0.5, 0.25], interpolation="step")
    # Set forward by 0.5 s at 100: readings 100.0 to 100.5 never were. Set back at 200: 200.25 to 200.5 were shown
    # twice, the second time after the last comparison but for 200.25 itself.
    reading = (np.array([99, 100, 100, 200, 200, 200]), np.array([0.9, 0.2, 0.6, 0.2, 0.3, 0.25]))
    with pytest.raises(OutOfSpan, match=r"1 outside .* 2 skipped or shown twice") as caught:
        log.to_reference(reading)
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True, False, False, True, True]
    good = ~caught.value.mask
    back = log.to_reference((reading[0][good], reading[1][good]))
    np.testing.assert_allclose(exact.seconds(back), [99.9, 100.1, 199.7], rtol=0, atol=1e-13)


# ---- joining ---------------------------------------------------------------------------------------


def test_joined_logs_leave_a_gap(tmp_path: Path) -> None:
    lines = ROWS.splitlines(keepends=True)
    early = ClockLog.load(write(tmp_path, HEADER + "".join(lines[:2]), "early.csv"), name="maser")
    late = ClockLog.load(write(tmp_path, HEADER + "".join(lines[2:]), "late.csv"), name="maser")
    both = ClockLog.joined([late, early])
    assert len(both) == 4
    assert both.span.whole.tolist() == [START, START + 3 * 86400]
    with pytest.raises(OutOfSpan, match="in a gap"):
        both.to_clock((START + 86401, 0.0))
    for part, offset in [(early, 1000), (late, 2 * 86400 + 1000)]:
        at = (START + offset, 0.5)
        assert [x.tolist() for x in both.to_clock(at)] == [x.tolist() for x in part.to_clock(at)]


def test_logs_that_cannot_be_joined(tmp_path: Path) -> None:
    log = ClockLog.load(write(tmp_path, HEADER + ROWS))
    with pytest.raises(InvalidInput, match="overlap"):
        ClockLog.joined([log, log])
    other = ClockLog.load(write(tmp_path, HEADER + ROWS), name="quartz")
    with pytest.raises(InvalidInput, match="scale is"):
        ClockLog.joined([log, other])
    step = ClockLog.load(write(tmp_path, HEADER + ROWS), interpolation="step")
    with pytest.raises(InvalidInput, match="interpolation is"):
        ClockLog.joined([log, step])
    with pytest.raises(InvalidInput, match="nothing to join"):
        ClockLog.joined([])


# ---- the file --------------------------------------------------------------------------------------


def test_offsets_are_read_exactly(tmp_path: Path) -> None:
    rows = "2026-03-01T00:00:00,37.000000123456789,0\n2026-03-02T00:00:00,-19.000000000000000250,0\n"
    rows += "2026-03-03T00:00:00,-1e-20,0\n"  # nearer to 0 than to the float64 below 1
    log = ClockLog.load(write(tmp_path, HEADER + rows))
    at = (START + np.array([0, 86400, 172800]), np.zeros(3))
    whole, fraction = log.offset(at)
    assert whole.tolist() == [37, -20, 0]
    assert fraction.tolist() == [0.000000123456789, 1 - 2.5e-16, 0.0]


def test_extras_of_the_layout(tmp_path: Path) -> None:
    text = (
        "\ufeff# comparisons of the long-wave receiver\n\nclock, remark , epoch ,uncertainty_s,offset_s,reference\n"
        '"UTC(KST)", "cold, windy" ,2026-03-01T00:00:00Z, 1e-9, +5e-9 ,UTC\n# a note\n'
        "UTC(KST),,2026-03-02T00:00:00,1e-9,6E-9,UTC\n"
    )
    log = ClockLog.load(write(tmp_path, text))
    assert (log.scale, log.reference, log.name) == ("UTC(KST)", "UTC", "maser.csv")
    chained = text.replace("UTC\n", "UTC(KST)\n").replace('"UTC(KST)"', "maser").replace("\nUTC(KST),,", "\nmaser,,")
    log = ClockLog.load(write(tmp_path, chained))
    assert (log.scale, log.reference) == ("CLOCK(maser)", "UTC(KST)")
    assert log.issued == "2026-03-02"


def test_leap_second_labels_need_their_table(tmp_path: Path) -> None:
    text = HEADER + "2030-12-31T23:59:60,0,0\n2031-01-02T00:00:00,0,0\n"
    with pytest.raises(DataFileError, match="line 2"):
        ClockLog.load(write(tmp_path, text))
    leap = LeapSeconds.default().with_step(62867, 38).with_expiry(None)  # 2031-01-01
    log = ClockLog.load(write(tmp_path, text), leap_seconds=leap)
    assert float(log.span[1].minus(log.span[0])) == 86401.0


BAD_FILES = [
    ("", "empty", None),
    (HEADER, "no comparison", None),
    ("epoch,offset_s\n2026-03-01T00:00:00,0\n", "missing: uncertainty_s", 1),
    ("epoch,offset_s,uncertainty_s,offset_s\n", "each once", 1),
    (HEADER + "2026-03-01T00:00:00,0\n", "2 cells under a header of 3", 2),
    (HEADER + "x" * 200000 + ",0,0\n", "not a CSV row", 2),
    (HEADER + "2026-03-01T00:00:00,zero,0\n", "offset_s is 'zero'", 2),
    (HEADER + "2026-03-01T00:00:00,nan,0\n", "finite", 2),
    (HEADER + "2026-03-01T00:00:00,inf,0\n", "finite", 2),
    (HEADER + "2026-03-01T00:00:00,1_0,0\n", "offset_s", 2),
    (HEADER + "2026-03-01T00:00:00,1e300,0\n", "offset_s", 2),
    (HEADER + "2026-03-01T00:00:00,0,\n", "uncertainty_s is ''", 2),
    (HEADER + "2026-03-01T00:00:00,0,-1e-9\n", "zero or more", 2),
    (HEADER + ROWS + "2026-03-05T24:61:00,0,0\n", "2026-03-05", 6),
    (HEADER + ROWS + "2026-03-05T23:59:60,0,0\n", "line 6", 6),
    (HEADER + ROWS + "tomorrow,0,0\n", "tomorrow", 6),
    (HEADER + ROWS + "2026-03-03T12:00:00,0,0\n", "not after the one before", 6),
    (HEADER + ROWS + "2026-03-04T00:00:00,0,0\n", "not after the one before", 6),
    (HEADER + "# note\n2026-03-01T00:00:00,0,0\n2026-03-01T00:00:01,-1.5,0\n", "backwards", 3),
    (HEADER + "2026-03-01T00:00:00,0,0\n", "two or more", None),
    (HEADER + "2026-03-01T00:00:00,0,0\n2026-03-02T00:00:00,,\n", "two or more", None),
    ("epoch,offset_s,uncertainty_s,reference\n2026-03-01T00:00:00,0,0,TT\n", "leap seconds", None),
    (
        "epoch,offset_s,uncertainty_s,reference\n2026-03-01T00:00:00,0,0,UTC\n2026-03-02T00:00:00,0,0,UTC(KST)\n",
        "one clock and one reference",
        3,
    ),
    ("epoch,offset_s,uncertainty_s,clock\n2026-03-01T00:00:00,0,0,TT(BIPM23)\n", "is no clock", None),
]


@pytest.mark.parametrize(("text", "complaint", "row"), BAD_FILES)
def test_bad_files(tmp_path: Path, text: str, complaint: str, row: int | None) -> None:
    path = write(tmp_path, text)
    with pytest.raises(DataFileError, match=complaint) as caught:
        ClockLog.load(path)
    assert caught.value.path == path
    assert caught.value.row == row


def test_files_that_are_no_text(tmp_path: Path) -> None:
    (tmp_path / "maser.csv").write_bytes(b"\xff\xfe\x00\x01")
    with pytest.raises(DataFileError, match="UTF-8"):
        ClockLog.load(tmp_path / "maser.csv")
    with pytest.raises(DataFileError, match="cannot read"):
        ClockLog.load(tmp_path / "none.csv")


def test_names(tmp_path: Path) -> None:
    assert ClockLog.load(write(tmp_path, HEADER + ROWS)).scale == "CLOCK(maser)"
    assert ClockLog.load(write(tmp_path, HEADER + ROWS), name="CLOCK(b)").scale == "CLOCK(b)"
    for name in ("two words", "", "TT(BIPM23)", "a@b"):
        with pytest.raises(DataFileError, match="clock"):
            ClockLog.load(write(tmp_path, HEADER + ROWS), name=name)


def test_options_and_rows_are_checked(tmp_path: Path) -> None:
    epoch = Instants.from_seconds([0, 100], scale="UTC")
    with pytest.raises(InvalidInput, match="'linear', 'step' or 'cubic'"):
        ClockLog.load(write(tmp_path, HEADER + ROWS), interpolation="spline")  # type: ignore[arg-type]
    with pytest.raises(InvalidInput, match="max_gap_s"):
        ClockLog.load(write(tmp_path, HEADER + ROWS), max_gap_s=0.0)
    with pytest.raises(InvalidInput, match="leap seconds"):
        ClockLog.from_rows("maser", Instants.from_seconds([0, 100], scale="TT"), [0.0, 0.0])
    with pytest.raises(InvalidInput, match="itself"):
        ClockLog.from_rows("UTC(KST)", Instants.from_seconds([0, 100], scale="UTC(KST)"), [0.0, 0.0])
    for offset, sigma in [([0.0, np.nan], 0.0), ([0.0, 0.0], -1.0), ([0.0, 0.0, 0.0], 0.0)]:
        with pytest.raises(InvalidInput):
            ClockLog.from_rows("maser", epoch, offset, sigma)
    with pytest.raises(InvalidInput, match="one-dimensional"):
        ClockLog.from_rows("maser", epoch.reshape(2, 1), [0.0, 0.0])
    with pytest.raises(InvalidInput, match="backwards") as caught:
        ClockLog.from_rows("maser", epoch, [0.0, -100.0])
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [True, False]


@pytest.mark.parametrize("shape", [(), (1,), (5,), (2, 3), (0,)])
def test_shapes(tmp_path: Path, shape: tuple[int, ...]) -> None:
    log = ClockLog.load(write(tmp_path, HEADER + ROWS))
    whole = START + np.arange(int(np.prod(shape, dtype=int))).reshape(shape) * 40000
    for pair in (log.to_clock((whole, 0.5)), log.to_reference((whole, 0.5)), log.offset((whole, 0.5))):
        assert pair[0].shape == pair[1].shape == shape
    assert log.uncertainty_s((whole, 0.5)).shape == log.rate((whole, 0.5)).shape == shape


def test_comparisons_within_one_second() -> None:
    """Epochs a tenth of a second apart share their whole second and are still told apart."""
    epoch = Instants([5, 5, 5, 6], [0.1, 0.2, 0.3, 0.0], "UTC")
    log = ClockLog.from_rows("maser", epoch, [0.0, 0.01, 0.0, 0.0])
    whole, fraction = log.to_clock((np.full(3, 5), np.array([0.15, 0.2, 0.25])))
    np.testing.assert_allclose(whole + fraction, [5.155, 5.21, 5.255], rtol=0, atol=1e-15)


def test_immutable_also_after_pickling(tmp_path: Path) -> None:
    log = ClockLog.load(write(tmp_path, HEADER + ROWS))
    for one in (log, pickle.loads(pickle.dumps(log))):
        with pytest.raises(ValueError, match="read-only"):
            one._curve.sigma_s[0] = 1
        with pytest.raises(AttributeError):
            one.name = "x"
        assert one.to_clock((START, 0.0))[0] == START
