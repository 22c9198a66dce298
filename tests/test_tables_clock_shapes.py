"""Cubic logs, resets, rate steps, rows left out, and references that are not labelled like UTC."""

from __future__ import annotations

from fractions import Fraction
from pathlib import Path

import numpy as np
import pytest
from hypothesis import assume, given
from hypothesis import strategies as st
from scipy.interpolate import CubicHermiteSpline

import tscale
from tscale import ClockLog, Instants, exact
from tscale.errors import DataFileError, InvalidInput, OutOfSpan
from tscale.exact import Pair

HEADER = "epoch,offset_s,uncertainty_s\n"
START = int(Instants.from_iso("2026-03-01T00:00:00", scale="UTC").whole)
DAY_S = 86400


def rational(pair: Pair) -> Fraction:
    return int(pair[0]) + Fraction(float(pair[1]))


def write(folder: Path, text: str, name: str = "maser.csv") -> Path:
    path = folder / name
    path.write_text(text)
    return path


def epochs(*seconds: float, scale: str = "UTC") -> Instants:
    return Instants.from_seconds(START, np.array(seconds, dtype=np.float64), scale=scale)


# ---- cubic -----------------------------------------------------------------------------------------


@given(data=st.data())
def test_cubic_closes_both_ways(data: st.DataObject) -> None:
    """One rounding of 0.055 fs each way, and half a unit in what the bend adds: 0.4 fs is promised."""
    count = data.draw(st.integers(2, 9))
    size = data.draw(st.sampled_from([1e-9, 1e-3, 0.1]))
    apart = np.array(
        [data.draw(st.integers(2, 10**6)) + data.draw(st.sampled_from([0.0, 0.25, 0.1])) for _ in range(count)]
    )
    offset = np.array([data.draw(st.floats(-size, size)) for _ in range(count)])
    try:
        log = ClockLog.from_rows("maser", epochs(*np.cumsum(apart)), offset, interpolation="cubic")
    except InvalidInput:  # too uneven for a cubic
        assume(False)
    span = log.span
    part = data.draw(st.floats(0, 1))
    at = span[0].shifted(part * float(span[1].minus(span[0]))).pair
    at = at if not span[1] < Instants._of(at, "UTC") else span[1].pair
    reading = log.to_clock(at)
    back = log.to_reference(reading)
    assert abs(rational(back) - rational(at)) <= Fraction(4, 10**16)
    assert abs(rational(log.to_clock(back)) - rational(reading)) <= Fraction(4, 10**16)


def test_cubic_against_scipy_and_rationals() -> None:
    """Slopes by the three-point formula in rationals, the cubic itself by scipy's Hermite spline.

    Offsets of 1 us in float64 have steps of 1e-22 s; the spline loses some tens of them.
    """
    random = np.random.default_rng(7)
    t = np.cumsum(random.integers(3600, 2 * DAY_S, 12)).astype(np.float64)
    x = 1e-6 * random.standard_normal(12)
    slopes = []
    for i in range(12):
        a = min(max(i - 1, 0), 9)
        own = [Fraction(float(value)) for value in t[a : a + 3]]
        y = [Fraction(float(value)) for value in x[a : a + 3]]
        here = own[i - a]
        slopes.append(
            sum(
                y[j] * ((here - own[k]) + (here - own[m])) / ((own[j] - own[k]) * (own[j] - own[m]))
                for j, k, m in ((0, 1, 2), (1, 0, 2), (2, 0, 1))
            )
        )
    spline = CubicHermiteSpline(t, x, np.array([float(value) for value in slopes]))
    log = ClockLog.from_rows("maser", epochs(*t), x, interpolation="cubic")
    at = np.linspace(t[0], t[-1], 999)
    pair = Instants.from_seconds(START, at, scale="UTC").pair
    np.testing.assert_allclose(exact.seconds(log.offset(pair)), spline(at), rtol=0, atol=2e-16)
    slope = spline(at, 1)
    np.testing.assert_allclose(log.rate(pair), -slope / (1 + slope), rtol=0, atol=2e-19)  # 1e-16 s in an hour


def test_cubic_meets_a_drift_exactly_and_keeps_the_rate() -> None:
    t = np.array([0.0, 1.0, 2.5, 3.0, 7.0, 8.0]) * DAY_S
    drift = 3e-20  # s/s/s: 2.6e-15 a day

    def clock(s: np.ndarray) -> np.ndarray:
        return 1e-7 + 2e-13 * s + drift / 2 * s**2

    log = ClockLog.from_rows("maser", epochs(*t), clock(t), interpolation="cubic")
    s = np.linspace(0, 8 * DAY_S, 200)
    at = Instants.from_seconds(START, s, scale="UTC").pair
    # The offsets are near 1e-7 s, in steps of 1.3e-23 s, the last of which come through at ten times that; the offset
    # itself comes back as a pair, rounded to 1e-16 s.
    np.testing.assert_allclose(exact.seconds(log.offset(at)), clock(s), rtol=0, atol=6e-17)
    np.testing.assert_allclose(log.rate(at), -(2e-13 + drift * s), rtol=0, atol=1e-25)
    # The rate goes on through a comparison, which a straight line breaks.
    bent = ClockLog.from_rows("maser", epochs(*t), [0, 3e-9, 1e-9, 5e-9, 5e-9, 0], interpolation="cubic")
    for knot in t[1:-1]:
        before, after = (bent.rate(Instants.from_seconds(START, knot + d, scale="UTC").pair) for d in (-1e-3, 1e-3))
        assert float(before) == pytest.approx(float(after), abs=1e-20)


def test_cubic_is_covariant_and_local() -> None:
    """A constant rate added to the offsets adds just that; a bad comparison spoils four intervals."""
    random = np.random.default_rng(11)
    t = np.arange(10.0) * DAY_S
    x = 1e-9 * random.standard_normal(10)
    s = np.linspace(0, 9 * DAY_S, 500)
    at = Instants.from_seconds(START, s, scale="UTC").pair
    plain, turned, spoilt = (
        exact.seconds(ClockLog.from_rows("maser", epochs(*t), y, interpolation="cubic").offset(at))
        for y in (x, x + 5e-13 * t, x + 1e-6 * (np.arange(10) == 5))
    )
    np.testing.assert_allclose(turned - plain, 5e-13 * s, rtol=0, atol=4e-16)
    moved = np.abs(spoilt - plain) > 1e-12
    assert moved[(s > 3.1 * DAY_S) & (s < 6.9 * DAY_S) & (np.abs(s / DAY_S % 1 - 0.5) < 0.4)].all()
    assert not moved[(s <= 3 * DAY_S) | (s >= 7 * DAY_S)].any()


def test_cubic_stops_at_gaps_and_corners() -> None:
    """Each piece is laid as if it were alone; at a rate step it has a corner."""
    t = np.arange(9.0) * DAY_S
    x = np.array([0, 1, 3, 2, 0, 5, 9, 9, 8]) * 1e-9
    step = np.arange(9) == 4
    log = ClockLog.from_rows("maser", epochs(*t), x, interpolation="cubic", rate_step=step)
    s = np.linspace(0, 8 * DAY_S, 100)
    for own, places in ((s <= 4 * DAY_S, slice(0, 5)), (s >= 4 * DAY_S, slice(4, 9))):
        alone = ClockLog.from_rows("maser", epochs(*t[places]), x[places], interpolation="cubic")
        at = Instants.from_seconds(START, s[own], scale="UTC").pair
        assert [p.tolist() for p in log.to_clock(at)] == [p.tolist() for p in alone.to_clock(at)]
    failed = ClockLog.from_rows("maser", epochs(*t), x, missing=np.arange(9) == 4, interpolation="cubic")
    alone = ClockLog.from_rows("maser", epochs(*t[:4]), x[:4], interpolation="cubic")
    at = Instants.from_seconds(START, s[s <= 3 * DAY_S], scale="UTC").pair
    assert [p.tolist() for p in failed.to_clock(at)] == [p.tolist() for p in alone.to_clock(at)]
    with pytest.raises(OutOfSpan, match="in a gap"):
        failed.to_clock((START + 4 * DAY_S, 0.0))
    two = ClockLog.from_rows("maser", epochs(0, 100), [0.0, 1e-6], interpolation="cubic")
    assert float(exact.seconds(two.offset((START + 25, 0.0)))) == pytest.approx(2.5e-7, abs=1e-22)


def test_a_cubic_that_would_run_backwards() -> None:
    """The comparisons run forwards, the curve between them does not."""
    t, x = epochs(0.0, 0.1, 0.2, 0.3), [0.0, 0.0, -0.09, -0.09]
    with pytest.raises(InvalidInput, match="backwards") as caught:
        ClockLog.from_rows("maser", t, x, interpolation="cubic")
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True, False, False]
    ClockLog.from_rows("maser", t, x)


def test_a_cubic_that_swings_out() -> None:
    """Comparisons 2 s apart beside some a day apart: 1 ms in 2 s would be 43 s in a day."""
    t = epochs(0, 2, DAY_S, 2 * DAY_S)
    with pytest.raises(InvalidInput, match="swings out") as caught:
        ClockLog.from_rows("maser", t, [0.0, 1e-3, 1e-3, 1e-3], interpolation="cubic")
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True, False, False]
    marked = ClockLog.from_rows("maser", t, [0.0, 1e-3, 1e-3, 1e-3], interpolation="cubic", rate_step=np.arange(4) == 1)
    assert float(exact.seconds(marked.offset((START + DAY_S // 2, 0.0)))) == pytest.approx(1e-3, abs=1e-18)


# ---- resets ----------------------------------------------------------------------------------------


@pytest.mark.parametrize("interpolation", ["linear", "cubic"])
@pytest.mark.parametrize("size", [0.5, -0.25])
def test_a_reset_of_known_size(interpolation: str, size: float) -> None:
    """Before it and after it the clock runs as if it had not been; at it, readings are skipped or shown twice."""
    t = np.arange(6.0) * 100.0
    x = np.array([0.0, 2e-6, 3e-6, 7e-6, 8e-6, 8e-6])
    free = ClockLog.from_rows("maser", epochs(*t), x, interpolation=interpolation)  # type: ignore[arg-type]
    after = t >= 300.0
    log = ClockLog.from_rows(
        "maser",
        epochs(*t),
        x + size * after,
        interpolation=interpolation,
        reset_s=size * (t == 300.0),  # type: ignore[arg-type]
    )
    s = np.arange(0.0, 500.0, 7.0)
    at = Instants.from_seconds(START, s, scale="UTC").pair
    want = exact.seconds(free.offset(at)) + size * (s >= 300.0)
    np.testing.assert_allclose(exact.seconds(log.offset(at)), want, rtol=0, atol=2e-16)
    # Offsets of the size of the reset are rounded to 1.1e-16 s, and 100 s apart.
    np.testing.assert_allclose(log.rate(at), free.rate(at), rtol=0, atol=4e-18)
    reading = log.to_clock(at)
    twice = (size < 0) & (s > 300.0 + size - 1e-5) & (s < 300.0 - size)
    good = (reading[0][~twice], reading[1][~twice])
    back = exact.subtract(log.to_reference(good), (at[0][~twice], at[1][~twice]))
    assert np.max(np.abs(exact.seconds(back))) <= 4e-16
    lost = exact.add_seconds(exact.add(log.to_clock((START + 299, 0.999)), (0, 0.0)), np.abs(size) / 2 + 0.001)
    with pytest.raises(OutOfSpan, match="1 skipped or shown twice"):
        log.to_reference(lost if size > 0 else exact.add_seconds(log.to_clock((START + 300, 0.0)), -size / 2))
    assert [(mark.kind, mark.row, mark.size_s) for mark in log.marks] == [("reset", 3, size)]


def test_a_reset_of_unknown_size_is_a_gap(tmp_path: Path) -> None:
    rows = "".join(
        f"2026-03-0{day}T00:00:00,{day + (day > 3)}e-7,1e-9,{'unknown' * (day == 4)}\n" for day in range(1, 7)
    )
    log = ClockLog.load(write(tmp_path, "epoch,offset_s,uncertainty_s,reset_s\n" + rows))
    log.to_clock((START + np.array([2, 3]) * DAY_S, np.zeros(2)))
    with pytest.raises(OutOfSpan, match="in a gap"):
        log.to_clock((START + 2 * DAY_S + 1, 0.0))
    step = ClockLog.load(tmp_path / "maser.csv", interpolation="step")
    assert float(exact.seconds(step.offset((START + 3 * DAY_S - 1, 0.0)))) == pytest.approx(3e-7, abs=1e-22)


def test_a_reset_while_comparisons_fail(tmp_path: Path) -> None:
    """It stays known to the next comparison that did not fail, and so does a row that is not used stay out of it."""
    text = (
        "epoch,offset_s,uncertainty_s,reset_s,use,rate_step\n"
        "2026-03-01T00:00:00,1e-7,1e-9,,,\n"
        "2026-03-02T00:00:00,,,1e-6,yes,\n"
        "2026-03-03T00:00:00,13e-7,1e-9,,,\n"
        "someday,oh,no,,no,no\n"
        "2026-03-04T00:00:00,14e-7,1e-9,,,yes\n"
    )
    log = ClockLog.load(write(tmp_path, text))
    assert log.comparisons.reset_s.tolist() == [0.0, 1e-6, 0.0]
    assert log.comparisons.rate_step.tolist() == [False, False, True]
    assert log.comparisons.gap.tolist() == [True, False, True]
    assert [(m.kind, m.epoch, m.row) for m in log.marks] == [
        ("reset", "2026-03-02T00:00:00", 3),
        ("not used", "someday", 5),
        ("rate step", "2026-03-04T00:00:00", 6),
    ]
    assert exact.seconds(log.comparisons.offset).tolist() == pytest.approx([1e-7, 13e-7, 14e-7], abs=1e-22)
    both = ClockLog.joined([log])
    assert both.comparisons.reset_s.tolist() == [0.0, 1e-6, 0.0]
    assert both.marks == log.marks


def test_rows_that_are_not_used_leave_no_gap() -> None:
    t = np.arange(5.0) * 100
    log = ClockLog.from_rows("maser", epochs(*t), [0, 1e-6, 9.0, 3e-6, 4e-6], use=np.arange(5) != 2)
    assert len(log) == 4
    assert float(exact.seconds(log.offset((START + 200, 0.0)))) == pytest.approx(2e-6, abs=1e-21)
    assert [(mark.kind, mark.row) for mark in log.marks] == [("not used", 2)]
    plain = ClockLog.from_rows("maser", epochs(*t), [0, 1e-6, 2e-6, 3e-6, 4e-6])
    assert plain.sha256 != log.sha256


@pytest.mark.parametrize(
    ("columns", "row", "complaint"),
    [
        ("use", "maybe", "use is 'maybe'; yes, no"),
        ("rate_step", "1", "rate_step is '1'"),
        ("reset_s", "big", "reset_s is 'big'"),
        ("use,reset_s", "no,1e-6", "not used cannot say"),
        ("use,rate_step", "no,yes", "not used cannot say"),
    ],
)
def test_bad_marks(tmp_path: Path, columns: str, row: str, complaint: str) -> None:
    empty = "," * columns.count(",")
    text = f"epoch,offset_s,uncertainty_s,{columns}\n2026-03-01T00:00:00,0,0,{empty}\n2026-03-02T00:00:00,0,0,{row}\n"
    with pytest.raises(DataFileError, match=complaint) as caught:
        ClockLog.load(write(tmp_path, text))
    assert caught.value.row == 3


def test_bad_marks_of_arrays() -> None:
    t = epochs(0, 100, 200)
    with pytest.raises(InvalidInput, match="stand on rows that are used") as caught:
        ClockLog.from_rows("maser", t, 0.0, use=[True, False, True], reset_s=[0, 1e-6, 0])
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True, False]
    with pytest.raises(InvalidInput, match="finite"):
        ClockLog.from_rows("maser", t, 0.0, reset_s=[0, np.inf, 0])
    with pytest.raises(InvalidInput, match="backwards"):
        ClockLog.from_rows("maser", t, [0, -100.0, -100.0], reset_s=[0, -100.0, 0])


# ---- references ------------------------------------------------------------------------------------


@pytest.mark.parametrize("reference", ["GPS", "GST", "BDT", "TAI", "TT", "GLONASS"])
def test_references_that_are_not_labelled_like_utc(reference: str) -> None:
    """Offset 5 us: the clock reads as UTC + 5 us, whichever scale it was compared with; and it closes."""
    utc = Instants.from_iso(["2016-12-30T00:00:00", "2017-01-03T00:00:00"], scale="UTC")
    epoch = tscale.transforms.to_fixed_scale(utc, reference)
    log = ClockLog.from_rows("UTC(KST)", epoch, 5e-6, 1e-9, nominal="removed")
    middle = Instants.from_iso("2016-12-31T23:59:60.25", scale="UTC")
    there = tscale.transforms.to_fixed_scale(middle, reference).pair
    reading = Instants._of(log.to_clock(there), "UTC(KST)")
    assert reading.to_iso(9) == "2016-12-31T23:59:60.250005000"
    assert abs(rational(log.to_reference(reading.pair)) - rational(there)) <= Fraction(2, 10**16)
    assert float(exact.seconds(log.offset(there))) == pytest.approx(5e-6, abs=2e-16)


def test_nominal_differences_included() -> None:
    """UTC - GPS time was -17 s before and -18 s after the leap second of 2016-12-31 (IS-GPS-200, IERS Bulletin C 52);
    UTC - TAI -36 s and -37 s; both give the same clock as the rest alone.
    """
    utc = Instants.from_iso(["2016-12-31T00:00:00", "2017-01-02T00:00:00"], scale="UTC")
    for reference, whole in (("GPS", [-17, -18]), ("TAI", [-36, -37]), ("TT", [-68.184, -69.184])):
        epoch = tscale.transforms.to_fixed_scale(utc, reference)
        rest = ClockLog.from_rows("UTC(KST)", epoch, [5e-6, 6e-6], nominal="removed")
        label = ClockLog.from_rows("UTC(KST)", epoch, np.add(whole, [5e-6, 6e-6]), nominal="included")
        # Sums near 69 s in float64 have steps of 1.4e-14 s.
        np.testing.assert_allclose(
            exact.seconds(exact.subtract(rest.to_clock(epoch.pair), label.to_clock(epoch.pair))), 0, atol=2e-14
        )
        with pytest.raises(InvalidInput, match="do not hold the nominal"):
            ClockLog.from_rows("UTC(KST)", epoch, [5e-6, 6e-6], nominal="included")


def test_what_is_nominal_must_be_said(tmp_path: Path) -> None:
    text = "epoch,offset_s,uncertainty_s,reference\n2026-03-01T00:00:00,1e-9,0,GPS\n2026-03-02T00:00:00,2e-9,0,GPS\n"
    with pytest.raises(DataFileError, match=r"nominal: removed.*nominal: included"):
        ClockLog.load(write(tmp_path, text))
    log = ClockLog.load(write(tmp_path, text), nominal="removed")
    assert (log.reference, log.issued) == ("GPS", "2026-03-02")
    said = text.replace("reference\n", "reference,nominal\n").replace("GPS\n", "GPS,removed\n")
    assert ClockLog.load(write(tmp_path, said)).span.scale == "GPS"
    with pytest.raises(DataFileError, match="the file says nominal: removed"):
        ClockLog.load(write(tmp_path, said), nominal="included")
    with pytest.raises(InvalidInput, match="'removed' or 'included'"):
        ClockLog.from_rows("maser", epochs(0, 100), 0.0, nominal="some")  # type: ignore[arg-type]
    for scale in ("UT1", "TCG", "TDB", "PROPER(x)"):
        with pytest.raises(InvalidInput, match="compared with"):
            ClockLog.from_rows("maser", Instants.from_seconds([0, 100], scale=scale), 0.0, nominal="removed")


def test_a_row_of_logs_down_to_tt_bipm() -> None:
    """Maser by UTC(k), UTC(k) by GPS time: on to TT(BIPM) by way of TAI, with terms that are label differences."""
    reference = tscale.ReferenceData.load(tt_bipm=tscale.TTBIPM.from_rows("TT(BIPM99)", [57070, 57100], [27e-6, 28e-6]))
    table = reference.tt_bipm[0].scale
    t = Instants.from_iso(["2015-03-01T00:00:00", "2015-03-03T00:00:00"], scale="UTC")
    lab = Instants._of(t.pair, "UTC(KRL)")
    gps = tscale.transforms.to_fixed_scale(t, "GPS")
    maser = ClockLog.from_rows("maser", lab, [4e-6, 5e-6], 1e-10)
    krl = ClockLog.from_rows("UTC(KRL)", gps, [2e-8, 2e-8], 2e-9, nominal="removed")
    path = tscale.chain("CLOCK(maser)", table, clocks=[maser, krl], reference=reference)
    assert str(path).startswith("CLOCK(maser) -> UTC(KRL) -> GPS -> TAI -> TT(BIPM99)")
    reading = Instants.from_iso("2015-03-02T00:00:00.0000045", scale="CLOCK(maser)")
    out = path(reading)
    assert abs(float(path.inverse(out).minus(reading))) <= 1e-15
    ledger = path.ledger(reading)
    assert float(ledger["UTC(KRL) - CLOCK(maser)"]) == pytest.approx(-4.5e-6, abs=1e-15)
    assert float(ledger["GPS - UTC(KRL)"]) == pytest.approx(16.0 - 2e-8, abs=1e-13)
    assert float(ledger["TAI - GPS"]) == pytest.approx(19.0, abs=1e-12)
    assert float(ledger.total) == pytest.approx(16 + 19 + 32.184 + 27.4e-6 - 4.52e-6, abs=1e-7)
    assert float(path.sigma_s(reading)) > 1e-9
    late = Instants.from_iso(["2015-03-02T00:00:00", "2015-03-04T00:00:00"], scale="CLOCK(maser)")
    with pytest.raises(OutOfSpan, match=r"log 'CLOCK\(maser\)' of CLOCK\(maser\)"):
        path(late)
    short = ClockLog.from_rows("UTC(KRL)", gps[:1].shifted(np.array([0.0, 100.0])), 2e-8, nominal="removed")
    with pytest.raises(OutOfSpan, match=r"log 'UTC\(KRL\)' of UTC\(KRL\).*GPS"):
        tscale.chain("CLOCK(maser)", table, clocks=[maser, short], reference=reference)(reading)


# ---- joining ---------------------------------------------------------------------------------------


@pytest.mark.parametrize("interpolation", ["linear", "step", "cubic"])
def test_monthly_files_go_on_into_each_other(interpolation: str) -> None:
    t = np.arange(12.0) * DAY_S
    x = 1e-9 * np.random.default_rng(2).standard_normal(12)
    whole, first, second = (
        ClockLog.from_rows("maser", epochs(*t[own]), x[own], 1e-10, interpolation=interpolation)  # type: ignore[arg-type]
        for own in (slice(None), slice(0, 5), slice(5, None))
    )
    both = ClockLog.joined([first, second], within_s=DAY_S)
    at = Instants.from_seconds(START, np.linspace(0, 11 * DAY_S, 300), scale="UTC").pair
    assert [p.tolist() for p in both.to_clock(at)] == [p.tolist() for p in whole.to_clock(at)]
    with pytest.raises(OutOfSpan, match="in a gap"):
        ClockLog.joined([first, second], within_s=DAY_S - 1).to_clock((START + 4 * DAY_S + 1, 0.0))


def test_a_later_issue_holds_where_logs_overlap() -> None:
    t = np.arange(12.0) * DAY_S
    early = ClockLog.from_rows("maser", epochs(*t[:8]), 1e-9 * t[:8] / DAY_S, 1e-10)
    late = ClockLog.from_rows("maser", epochs(*t[5:]), 1e-9 * t[5:] / DAY_S + 5e-10, 2e-10)
    with pytest.raises(InvalidInput, match="overlap='last'"):
        ClockLog.joined([early, late])
    both = ClockLog.joined([early, late], within_s=DAY_S, overlap="last")
    assert len(both) == 12
    np.testing.assert_allclose(
        exact.seconds(both.comparisons.offset), 1e-9 * np.arange(12) + 5e-10 * (np.arange(12) >= 5), rtol=0, atol=1e-22
    )
    assert both.comparisons.uncertainty_s.tolist() == [1e-10] * 5 + [2e-10] * 7
    other = ClockLog.joined([late, early], within_s=DAY_S, overlap="last")
    assert other.comparisons.uncertainty_s.tolist() == [1e-10] * 8 + [2e-10] * 4
    assert other.sha256 != both.sha256
    # One in the midst of the other leaves a seam at either side.
    patch = ClockLog.from_rows("maser", epochs(*t[3:5]), 0.0, 3e-10)
    patched = ClockLog.joined([early, patch], overlap="last")
    assert patched.comparisons.gap.tolist() == [False, False, True, False, True, False, False, True]
    with pytest.raises(InvalidInput, match="'error' or 'last'"):
        ClockLog.joined([early, late], overlap="first")  # type: ignore[arg-type]


def test_each_file_with_its_own_interpolation(tmp_path: Path) -> None:
    rows = "".join(f"2026-03-0{day}T00:00:00,{day % 2}e-7,1e-9,cubic,90000\n" for day in (1, 2, 3, 5, 6))
    text = "epoch,offset_s,uncertainty_s,interpolation,max_gap_s\n" + rows
    log = ClockLog.load(write(tmp_path, text))
    assert log.interpolation == "cubic"
    assert log.comparisons.gap.tolist() == [False, False, True, False, True]
    told = ClockLog.load(tmp_path / "maser.csv", interpolation="step", max_gap_s=2 * DAY_S)
    assert (told.interpolation, told.comparisons.gap.tolist()) == ("step", [False] * 4 + [True])
    for old, new, complaint in (("cubic", "wavy", "'wavy'"), ("90000", "0", "max_gap_s"), ("90000", "long", "'long'")):
        with pytest.raises(DataFileError, match=complaint):
            ClockLog.load(write(tmp_path, text.replace(old, new)))
    with pytest.raises(DataFileError, match="line 3: interpolation"):
        ClockLog.load(write(tmp_path, text.replace("cubic", "linear", 1)))
