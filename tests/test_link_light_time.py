"""Light time: closed forms, an independent library, and what must hold of any link."""

from __future__ import annotations

import math
import warnings
from collections.abc import Iterator
from fractions import Fraction
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

import tscale
from tests.link_support import Circle, StraightLine
from tscale import Instants, exact
from tscale.constants import C_M_S
from tscale.link import one_way, two_way

EPOCH = Instants.from_iso("2027-03-01T00:00:00", scale="TDB")
SITE = tscale.Site.from_geodetic("Heron Flat", 133.0, -23.0, 500.0)
LOW = tscale.Trajectory.from_kepler(
    Instants.from_iso("2024-06-01T00:00:00", scale="TT"), 6.78e6, 0.001, 51.6, 20.0, 0.0, 0.0, name="low orbiter"
)


@pytest.fixture(autouse=True)
def _predictions_are_fine() -> Iterator[None]:
    """Dates after the end of the Earth orientation table are used on purpose."""
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", tscale.ExtrapolationWarning)
        yield


def test_uniform_motion_has_a_closed_form(reference: tscale.ReferenceData) -> None:
    # c tau = |d - v tau| with d the place of the transmitter relative to the receiver at reception: a quadratic, solved
    # here in rational arithmetic with a square root to 40 digits.
    rest = StraightLine("anchor", (0.0, 0.0, 0.0), (0.0, 0.0, 0.0))
    moving = StraightLine("drifter", (3.0e11, -1.0e11, 0.5e11), (21000.0, 33000.0, -9000.0))
    t = Instants.from_seconds(0, 0.0, scale="TDB")
    found = one_way(receive=t, transmitter=moving, receiver=rest, reference=reference, bodies=())
    d, v = [Fraction(x) for x in moving.at_m], [Fraction(x) for x in moving.velocity_m_s]
    c = Fraction(C_M_S)
    a, b, e = c * c - sum(x * x for x in v), sum(x * y for x, y in zip(d, v, strict=True)), sum(x * x for x in d)
    radicand = b * b + a * e
    scale = 10**40
    root = Fraction(math.isqrt(radicand.numerator * scale**2 // radicand.denominator), scale)
    tau = (-b + root) / a
    # 0.3 ps: the doubles of 3e11 m that the positions are.
    assert abs(float(found.light_time_s) - float(tau)) < 3e-13
    assert found.iterations <= 4


def test_round_trip_between_bodies_in_common_motion(reference: tscale.ReferenceData) -> None:
    # Two mirrors at distance L drift together across their line with speed v: one way takes L / sqrt(c^2 - v^2)
    # (the light clock of every textbook on relativity).
    speed, length = 3.0e4, 6.0e9
    near = StraightLine("near", (0.0, 0.0, 0.0), (0.0, speed, 0.0))
    far = StraightLine("far", (length, 0.0, 0.0), (0.0, speed, 0.0))
    t = Instants.from_seconds(0, [0.0, 0.5], scale="TDB")
    trip = two_way(transmit=t, station=near, target=far, reference=reference, bodies=())
    expected = 2 * length / np.sqrt(C_M_S**2 - speed**2)
    assert np.max(np.abs(trip.round_trip_s - expected)) < 1e-14  # 2 roundings of 40 s
    assert np.max(np.abs(trip.up.light_time_s - trip.down.light_time_s)) < 1e-14


def test_circular_orbit_seen_from_its_axis(reference: tscale.ReferenceData) -> None:
    # From a point on the axis of a circle the light time is sqrt(r^2 + h^2) / c at every instant.
    centre = StraightLine("centre", (0.0, 0.0, 0.0), (0.0, 0.0, 0.0))
    ring = Circle("ring", centre, 7.0e6, 1.08e-3)
    above = StraightLine("above", (0.0, 0.0, 4.0e7), (0.0, 0.0, 0.0))
    t = Instants.from_seconds(np.arange(200) * 37, 0.25, scale="TDB")
    found = one_way(receive=t, transmitter=ring, receiver=above, reference=reference, bodies=())
    assert np.max(np.abs(found.light_time_s - np.hypot(7.0e6, 4.0e7) / C_M_S)) < 1e-16
    assert np.max(np.abs(found.range_rate_m_s)) < 1e-9


@pytest.mark.parametrize("target", ["mercury", "venus", "mars", "jupiter", "saturn", "neptune", "moon"])
def test_planets_against_skyfield(target: str, reference: tscale.ReferenceData) -> None:
    # Skyfield iterates the geometric light time from the same kernel until it moves by less than 1e-12 day, 86 ns; what
    # is left then is v/c of that, 1e-11 s. Rounding of positions of 4.5e12 m adds 5e-12 s on both sides.
    from skyfield import api as skyfield

    timescale = skyfield.load.timescale(builtin=True)
    names = {"mars": "MARS BARYCENTER", "jupiter": "JUPITER BARYCENTER", "saturn": "SATURN BARYCENTER"}
    names |= {"neptune": "NEPTUNE BARYCENTER", "mercury": "MERCURY BARYCENTER", "venus": "VENUS BARYCENTER"}
    days = np.array([2441000.5, 2451545.0, 2459000.5, 2465000.25])
    kernel = skyfield.load_file(str(reference.ephemeris.path))
    try:
        when = timescale.tdb_jd(days)
        theirs = kernel["EARTH"].at(when).observe(kernel[names.get(target, target.upper())])
        light_days = np.asarray(theirs.light_time)
    finally:
        kernel.close()
    whole = np.floor(days - 2451545.0)
    t = Instants.from_seconds((whole * 86400).astype(np.int64), (days - 2451545.0 - whole) * 86400.0, scale="TDB")
    ours = one_way(
        receive=t, transmitter=target, receiver="earth", reference=reference, bodies=(), occultation="ignore"
    )
    assert np.max(np.abs(ours.light_time_s - light_days * 86400.0)) < 2e-11


def test_gauss_path_agrees_with_plain_difference(reference: tscale.ReferenceData) -> None:
    # The Moon is close enough for the short-vector form. Formed from plain barycentric positions its light time
    # has their rounding, 3e-5 m or 0.1 ps on each of three axes; nothing more may lie between the two.
    t = Instants.from_seconds(np.arange(50) * 86400 * 31, 0.125, scale="TDB")
    found = one_way(receive=t, transmitter="moon", receiver="earth", reference=reference, bodies=("sun",))
    ephemeris = reference.ephemeris
    line = ephemeris.position("earth", found.receive.pair) - ephemeris.position("moon", found.transmit.pair)
    plain = np.sqrt(np.sum(line**2, axis=-1)) / C_M_S
    assert np.max(np.abs(found.ledger["geometric range"] - plain)) < 4e-13


def test_low_orbit_is_smooth_to_femtoseconds(reference: tscale.ReferenceData) -> None:
    # Over steps of 1 ms the light time of a low orbiter is a parabola to 1e-19 s; what differs from it is rounding.
    # The difference of barycentric positions would show 1e-13 s here.
    t = Instants.from_seconds(770500000, 0.3 + 1e-3 * np.arange(40), scale="TDB")
    found = one_way(receive=t, transmitter=LOW, receiver=SITE, reference=reference, occultation="ignore")
    x = np.arange(40) - 19.5
    value = found.light_time_s
    residual = value - np.polyval(np.polyfit(x, value - value[0], 3), x) - value[0]
    assert np.max(np.abs(residual)) < 5e-15


def test_few_iterations_for_a_low_orbiter(reference: tscale.ReferenceData) -> None:
    t = Instants.from_seconds(770500000 + np.arange(300) * 20, 0.0, scale="TDB")
    for kind in ("receive", "transmit"):
        found = one_way(
            **{kind: t}, transmitter=LOW, receiver=SITE, reference=reference, occultation="ignore", tolerance_s=1e-15
        )
        assert found.iterations <= 5


@pytest.mark.parametrize("ends", [("earth", "mars"), ("mars", SITE), (SITE, "moon"), (LOW, SITE), ("sun", "neptune")])
def test_light_time_equation_holds(ends: tuple[Any, Any], reference: tscale.ReferenceData) -> None:
    # The dates of both events, put back into positions found in another way, give the ledger's own range.
    t = EPOCH.shifted(np.array([0.0, 1.0e6, 5.5e7]))
    found = one_way(transmit=t, transmitter=ends[0], receiver=ends[1], reference=reference, occultation="ignore")
    places = [_position(end, when, reference) for end, when in zip(ends, (found.transmit, found.receive), strict=True)]
    line = places[1] - places[0]
    rho = np.sqrt(np.sum(line**2, axis=-1))
    # Rounding of positions of up to 4.5e12 m.
    tolerance_s = 4 * np.spacing(np.max(np.abs(places))) / C_M_S
    assert np.max(np.abs(rho / C_M_S - found.ledger["geometric range"])) < tolerance_s
    assert np.array_equal(found.receive.at(None).minus(found.transmit.at(None)), found.light_time_s)
    assert np.array_equal(found.range_m / C_M_S, found.ledger["geometric range"])


def _position(end: Any, when: Instants, reference: tscale.ReferenceData) -> Any:
    from tscale.earth.moving import bcrs_state

    if isinstance(end, str):
        return reference.ephemeris.position(end, when.pair)
    return bcrs_state(end, when.pair, reference)[0]


@given(st.integers(-(10**9), 10**9), st.floats(0.0, 0.999), st.sampled_from(["venus", "moon", "jupiter", "sun"]))
def test_transmit_and_receive_are_inverse(whole: int, fraction: float, target: str) -> None:
    t = Instants.from_seconds(whole, fraction, scale="TDB")
    there = one_way(transmit=t, transmitter="earth", receiver=target, occultation="ignore")
    back = one_way(receive=there.receive, transmitter="earth", receiver=target, occultation="ignore")
    # 1 ps: the rounding of positions of 7e11 m, met on both ways.
    assert abs(float(exact.seconds(exact.subtract(back.transmit.pair, t.pair)))) < 1e-12


def test_uplink_and_downlink_meet(reference: tscale.ReferenceData) -> None:
    t = EPOCH.shifted(np.array([0.0, 3.0e5]))
    forward = two_way(
        transmit=t, station=SITE, target="mars", turnaround_s=[2.5, 0.0], reference=reference, occultation="ignore"
    )
    backward = two_way(
        receive=forward.receive,
        station=SITE,
        target="mars",
        turnaround_s=[2.5, 0.0],
        reference=reference,
        occultation="ignore",
    )
    assert np.max(np.abs(backward.transmit.minus(t.at("TOPOCENTER")))) < 1e-12
    assert np.max(np.abs(backward.bounce.minus(forward.bounce))) < 1e-12
    assert np.allclose(sum(forward.ledger.values()), forward.round_trip_s, rtol=0, atol=1e-12)
    # The station's clock runs on TT: 1e-8 at most from TDB, and the difference of both ends' TT - TDB.
    difference = forward.round_trip_tt_s - forward.round_trip_s
    assert np.all(np.abs(difference) < 1e-5)
    assert np.all(difference != 0.0)
    assert np.array_equal(forward.round_trip_on("UTC"), forward.round_trip_on("TAI"))


@pytest.mark.parametrize("ends", [("mars", SITE), (SITE, "mars"), ("moon", SITE), (LOW, SITE), ("earth", "jupiter")])
def test_rates_against_differences(ends: tuple[Any, Any], reference: tscale.ReferenceData) -> None:
    step = 0.5 if ends[0] is LOW else 16.0

    def at(shift: float) -> Any:
        t = EPOCH.shifted(np.array([0.0, 4.0e6]) + shift)
        return one_way(receive=t, transmitter=ends[0], receiver=ends[1], reference=reference, occultation="ignore")

    middle, parts = at(0.0), {k: at(k * step) for k in (-2, -1, 1, 2)}

    def slope(pick: Any) -> Any:
        # Richardson's five points, of which the next error is step^4 f'''''/30.
        return (8 * (pick(parts[1]) - pick(parts[-1])) - (pick(parts[2]) - pick(parts[-2]))) / (12 * step)

    # 3e-5 m of rounding over 16 s for planets; a fraction of that, and the fourth-order term, for the low orbiter.
    assert np.max(np.abs(slope(lambda s: s.range_m) - middle.range_rate_m_s)) < 2e-5
    assert np.max(np.abs(slope(lambda s: s.light_time_s) - middle.light_time_rate)) < 6e-14
    assert np.allclose(middle.frequency_ratio, 1.0 - middle.light_time_rate, rtol=0, atol=1e-16)


def test_rate_of_a_grazing_ray_holds_its_gravity(reference: tscale.ReferenceData) -> None:
    # Near the Sun the delay changes by 1e-9 per second: 1e4 times more than the difference quotient leaves.
    t = Instants.from_iso("2023-11-16T12:00:00", scale="TDB")
    step = 64.0

    def delay(shift: float) -> Any:
        found = one_way(receive=t.shifted(shift), transmitter="mars", receiver="earth", reference=reference)
        return found.light_time_s - found.ledger["geometric range"]

    slope = (8 * (delay(step) - delay(-step)) - (delay(2 * step) - delay(-2 * step))) / (12 * step)
    found = one_way(receive=t, transmitter="mars", receiver="earth", reference=reference)
    gravity_rate = found.light_time_rate - found.range_rate_m_s / C_M_S
    assert abs(float(slope)) > 1e-10
    # 2e-13 s of rounding in light times of 1000 s, over 64 s.
    assert abs(float(slope - gravity_rate)) < 1e-14


def test_shapes_and_chunks(reference: tscale.ReferenceData) -> None:
    grid = EPOCH.shifted(np.arange(12.0).reshape(3, 4) * 1e5)
    many = one_way(receive=grid, transmitter="mars", receiver="earth", reference=reference)
    assert many.light_time_s.shape == many.transmit.shape == many.occulted.shape == (3, 4)
    alone = one_way(receive=grid[1, 2], transmitter="mars", receiver="earth", reference=reference)
    assert alone.light_time_s.shape == ()
    assert float(alone.light_time_s) == pytest.approx(float(many.light_time_s[1, 2]), abs=1e-13)
    strided = one_way(receive=grid[:, ::2], transmitter="mars", receiver="earth", reference=reference)
    assert np.allclose(strided.light_time_s, many.light_time_s[:, ::2], rtol=0, atol=1e-13)
    none = one_way(receive=grid[:0], transmitter="mars", receiver="earth", reference=reference)
    assert none.light_time_s.shape == (0, 4)
    big = EPOCH.shifted(np.arange(9000.0) * 3600.0)
    chunked = one_way(receive=big, transmitter="venus", receiver="earth", reference=reference, occultation="ignore")
    last = one_way(receive=big[-1], transmitter="venus", receiver="earth", reference=reference, occultation="ignore")
    assert float(chunked.light_time_s[-1]) == pytest.approx(float(last.light_time_s), abs=1e-13)


def test_trajectory_that_ends_before_the_reception(reference: tscale.ReferenceData) -> None:
    # A light time of many minutes after its last state a spacecraft is still seen; one after its first it is not yet.
    t = EPOCH.shifted(np.arange(0.0, 3600.0, 60.0))
    mars, speed = reference.ephemeris.state("mars", t.pair)
    probe = tscale.Trajectory.from_states(t, mars + np.array([4e7, 0, 0]), speed, frame="BCRS", name="probe")
    late = EPOCH.shifted(3600.0 + 200.0)
    found = one_way(receive=late, transmitter=probe, receiver="earth", reference=reference)
    assert float(found.light_time_s) > 300.0
    with pytest.raises(tscale.errors.OutOfSpan) as caught:
        one_way(receive=late.shifted([0.0, 86400.0]), transmitter=probe, receiver="earth", reference=reference)
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True]


def test_orbiter_about_mars_keeps_its_small_numbers(reference: tscale.ReferenceData) -> None:
    # An orbiter and a site on Mars are 1e7 m apart and 2e11 m from the barycentre; their light time must not see
    # the latter (3e-5 m, 1e-13 s).
    orbiter = tscale.Trajectory.from_kepler(EPOCH, 7.2e6, 0.1, 63.0, 40.0, 120.0, 10.0, center="mars", name="Lantern")
    ground = tscale.link.SurfaceSite("Ochre Camp", "mars", 137.4, -4.6, -4500.0)
    t = EPOCH.shifted(1e-3 * np.arange(40))
    found = one_way(receive=t, transmitter=orbiter, receiver=ground, reference=reference, occultation="ignore")
    x = np.arange(40) - 19.5
    value = found.light_time_s
    residual = value - np.polyval(np.polyfit(x, value - value[0], 3), x) - value[0]
    assert np.max(np.abs(residual)) < 5e-15
