"""Compiled chains through clock logs: knots, steps, gaps, and dates that belong to none."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import tscale
from tscale.errors import OutOfSpan

SITE = tscale.Site.from_itrf("north", 1_200_000.0, -4_600_000.0, 4_230_000.0)
START = tscale.Instants.from_iso("2020-01-03T00:00:00", scale="UTC")


def accepted(mapping: object, t: tscale.Instants) -> np.ndarray:
    """Which instants are mapped and which refused."""
    try:
        mapping(t)  # type: ignore[operator]
    except OutOfSpan as error:
        return ~np.asarray(error.mask)
    return np.ones(t.shape, dtype=bool)


def compare(compiled: tscale.CompiledChain, chain: tscale.Chain, tolerance_s: float, extra: tscale.Instants) -> None:
    """Both directions agree on what is refused, and to the tolerance on the rest."""
    rng = np.random.default_rng(1)
    for ours, theirs, span, more in (
        (compiled, chain, compiled.span, extra),
        (compiled.inverse, chain.inverse, compiled.inverse_span, None),
    ):
        t = span[:1].shifted(rng.random(5000) * span[1].minus(span[0]))
        if more is not None:
            t = tscale.Instants.concatenate([t, more])
        good = accepted(ours, t)
        assert np.array_equal(good, accepted(theirs, t))
        if good.any():
            assert np.max(np.abs(ours(t[good]).minus(theirs(t[good])))) <= tolerance_s


@given(
    gaps_s=st.lists(st.floats(50.0, 40_000.0), min_size=3, max_size=25),
    steps_s=st.lists(st.floats(-1e-3, 1e-3), min_size=26, max_size=26),
    scale=st.sampled_from([1.0, 1e-3, 1e-6]),
    missing=st.sets(st.integers(2, 20), max_size=3),
    interpolation=st.sampled_from(["linear", "step"]),
    ends=st.sampled_from([("CLOCK(maser)", "UTC"), ("CLOCK(maser)", "TDB"), ("UTC", "CLOCK(maser)")]),
)
@settings(max_examples=40)
def test_logs_at_random(
    gaps_s: list[float],
    steps_s: list[float],
    scale: float,
    missing: set[int],
    interpolation: str,
    ends: tuple[str, str],
) -> None:
    epoch = START[()].reshape(1).shifted(np.concatenate([[0.0], np.cumsum(gaps_s)]))
    n = len(epoch)
    failed = np.array([k in missing and k < n - 2 for k in range(n)])
    log = tscale.ClockLog.from_rows(
        "maser", epoch, np.array(steps_s[:n]) * scale, missing=failed, interpolation=interpolation
    )
    chain = tscale.chain(*ends, site=SITE, clocks=[log])
    # Ends well inside, so that they are dates whatever the steps are.
    first, last = epoch[0].shifted(10.0), epoch[-1].shifted(-10.0)
    if ends[0] != "UTC":
        first, last = (tscale.Instants.from_seconds(*t.pair, scale=ends[0]) for t in (first, last))
    compiled = chain.compile(first, last, tolerance_s=2e-15)
    # Dates close to every comparison: a nanosecond and 5 ps to either side of it, as the clock or UTC shows it.
    knots = tscale.Instants.from_seconds(*epoch[1:-1].pair, scale=ends[0])
    if ends[0] != "UTC":
        knots = knots.shifted(np.array(steps_s[1 : n - 1]) * scale)
    near = knots.reshape(-1, 1).shifted(np.array([-1e-9, -5e-12, 5e-12, 1e-9])).ravel()
    near = near.at("TOPOCENTER")
    compare(compiled, chain, 2e-15, near[(near >= compiled.span[0]) & (near <= compiled.span[1])])


def test_a_step_is_kept_to_the_last_bit() -> None:
    epoch = START.reshape(1).shifted(np.arange(5) * 86_400.25)
    log = tscale.ClockLog.from_rows("maser", epoch, [0.0, 1e-6, 3e-6, 4e-6, 5e-6], interpolation="step")
    chain = tscale.chain("UTC", "CLOCK(maser)", clocks=[log])
    compiled = chain.compile(epoch[0], epoch[-1], tolerance_s=1e-15)
    for ulps in (-2, -1, 0, 1, 2):
        at = tscale.Instants.from_seconds(epoch[2].whole, epoch[2].fraction + ulps * 2.0**-53, scale="UTC")
        assert (compiled(at) == chain(at)).all()
        assert (compiled(at.reshape(1)) == chain(at.reshape(1))).all()


def test_a_gap_is_refused_with_the_mask_and_noted() -> None:
    epoch = START.reshape(1).shifted(np.arange(8) * 3600.0)
    log = tscale.ClockLog.from_rows("maser", epoch, 1e-6, missing=np.arange(8) == 4)
    chain = tscale.chain("CLOCK(maser)", "UTC", clocks=[log])
    start = tscale.Instants.from_seconds(*epoch[0].pair, scale="CLOCK(maser)").shifted(1.0)
    compiled = chain.compile(start, start.shifted(6.9 * 3600.0), tolerance_s=1e-15)
    assert any("1 gaps inside the span" in note for note in compiled.notes)
    t = start.reshape(1).shifted(np.array([0.0, 2.5, 3.5, 4.5, 5.5, 6.9]) * 3600.0)
    with pytest.raises(OutOfSpan, match=r"2 of 6 instants are outside the span .* or in a gap of it") as caught:
        compiled(t)
    assert caught.value.mask.tolist() == [False, False, True, True, False, False]
    with pytest.raises(OutOfSpan) as caught:
        compiled.rate(t.reshape(2, 3))
    assert caught.value.mask.tolist() == [[False, False, True], [True, False, False]]
    # A comparison at either side of the gap can itself be used, as in the log.
    edges = tscale.Instants.from_seconds(*epoch[[3, 5]].pair, scale="CLOCK(maser)").shifted(1e-6)
    assert (chain(edges).minus(compiled(edges)) == 0.0).all()


def test_ends_in_a_gap_are_refused() -> None:
    epoch = START.reshape(1).shifted(np.arange(8) * 3600.0)
    log = tscale.ClockLog.from_rows("maser", epoch, 1e-6, missing=np.arange(8) == 4)
    chain = tscale.chain("CLOCK(maser)", "UTC", clocks=[log])
    start = tscale.Instants.from_seconds(*epoch[3].pair, scale="CLOCK(maser)")
    with pytest.raises(OutOfSpan, match=r"cannot compile .* in a gap between comparisons"):
        chain.compile(start.shifted(10.0), start.shifted(9000.0))


def test_the_leap_second_of_a_table_held_by_the_day_is_a_jump() -> None:
    # UT1-UTC held at 0.2 s: UT1-TAI jumps by a second where UTC does.
    constant = tscale.EarthOrientation.constant(ut1_minus_utc_s=0.2)
    reference = tscale.ReferenceData.load(earth_orientation=constant)
    chain = tscale.chain("UTC", "UT1", reference=reference)
    compiled = chain.compile("2016-12-31", "2017-01-02", tolerance_s=1e-15)
    t = compiled.span[:1].shifted(np.append(np.arange(0.0, 172_800.0, 7.0), 86_401.0 + np.array([-1e-9, 0.0, 1e-9])))
    assert np.max(np.abs(compiled(t).minus(chain(t)))) <= 1e-15
    assert compiled(t[-3:]).minus(chain(t[-3:])).tolist() == pytest.approx([0.0] * 3, abs=2e-16)
