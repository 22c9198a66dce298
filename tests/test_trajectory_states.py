"""Tabulated states, frames, and what a trajectory has in common with a site."""

import pickle

import numpy as np
import pytest
from astropy import units
from hypothesis import given
from hypothesis import strategies as st
from jplephem.daf import DAF

import tscale
from tscale import Instants, Site, Trajectory
from tscale.earth import Observer
from tscale.earth.moving import bcrs_state, gcrs_state, tdb_from_tt_at_geocentre, tt_from_tdb_at_geocentre
from tscale.ephemeris.spk_writer import spk_bytes
from tscale.errors import InvalidInput, MissingPiece, OutOfSpan
from tscale.trajectory.knots import Knots
from tscale.trajectory.pieces import Piece, piece_numbers

START = Instants.from_iso("2021-05-04T03:02:01.5", "TT")
C_M_S = 299792458.0


def orbit(**change):
    elements = {
        "a_m": 6.9e6,
        "e": 0.01,
        "i_deg": 97.0,
        "node_deg": 20.0,
        "periapsis_deg": 30.0,
        "mean_anomaly_deg": 40.0,
    } | change
    return Trajectory.from_kepler(START, **elements)


def every(step_s, n):
    return START.reshape(1).shifted(np.arange(n) * step_s)


def sampled(method, degree, n=40, step_s=60.0):
    t = every(step_s, n)
    return Trajectory.from_states(t, *orbit().gcrs(t.pair, None), method=method, degree=degree)


def polynomial_of(degree, seed):
    """Random polynomials of time in units of 100 s, 1e7 m in size, with their derivative per second."""
    coefficients = np.random.default_rng(seed).uniform(-1e7, 1e7, (3, degree + 1))
    rows = [np.polynomial.Polynomial(row, domain=(0, 2000), window=(0, 1)) for row in coefficients]
    return lambda t: np.stack([p(t) for p in rows], axis=-1), lambda t: np.stack([p.deriv()(t) for p in rows], axis=-1)


@given(
    method=st.sampled_from(["hermite", "lagrange"]),
    degree=st.sampled_from([3, 5, 7, 9, 11]),
    seed=st.integers(0, 1000),
)
def test_polynomials_are_reproduced(method, degree, seed):
    position, velocity = polynomial_of(degree, seed)
    random = np.random.default_rng(seed)
    knots_s = np.sort(random.choice(np.arange(1, 2000), 16, replace=False)) + random.uniform(0, 0.9, 16)
    whole, fraction = np.floor(knots_s).astype(np.int64), knots_s - np.floor(knots_s)
    table = Knots((whole + 10**9, fraction), position(knots_s), velocity(knots_s), method, degree, "test")
    at = random.uniform(knots_s[0], knots_s[-1], 50)
    r, v = table.state((np.floor(at).astype(np.int64) + 10**9, at - np.floor(at)))
    # Knots this uneven (1 s to 600 s) amplify rounding in differences of high degree: 1e-6 of 1e7 m at most.
    np.testing.assert_allclose(r, position(at), rtol=0, atol=10.0 if degree > 7 else 1e-2)
    np.testing.assert_allclose(v, velocity(at), rtol=0, atol=1.0 if degree > 7 else 1e-3)


@pytest.mark.parametrize(("method", "degree"), [("hermite", 3), ("hermite", 7), ("lagrange", 9)])
def test_knots_are_passed_exactly(method, degree):
    t = every(60.0, 40)
    r, v = sampled(method, degree).gcrs(t.pair, None)
    expected_r, expected_v = orbit().gcrs(t.pair, None)
    # The last knot is the end of a polynomial that starts 60 s before: a few ulp.
    np.testing.assert_allclose(r, expected_r, rtol=0, atol=1e-8)
    np.testing.assert_allclose(v, expected_v, rtol=0, atol=1e-10)


@pytest.mark.parametrize(
    ("method", "degree", "atol_m"),
    [
        # Hermite error f^(n) h^n / (n! 2^n) with n = degree + 1, h = 60 s and f^(n) = a w^n, w = 1.1e-3 rad/s: 0.36 m
        # for n = 4. Higher degrees with equal knots gain (h w)^2 a step. 1e-6 m is 3 fs of light.
        ("hermite", 3, 0.5),
        ("hermite", 5, 3e-4),
        ("hermite", 7, 1e-6),
        ("lagrange", 9, 1e-5),
    ],
)
def test_low_orbit_between_knots(method, degree, atol_m):
    at = every(60.0, 39).shifted(29.7)
    r, v = sampled(method, degree).gcrs(at.pair, None)
    expected_r, expected_v = orbit().gcrs(at.pair, None)
    np.testing.assert_allclose(r, expected_r, rtol=0, atol=atol_m)
    np.testing.assert_allclose(v, expected_v, rtol=0, atol=atol_m / 10 + 1e-9)


def test_hermite_velocity_is_the_derivative():
    table = sampled("hermite", 3)
    at = every(60.0, 38).shifted(31.0)
    _, v = table.gcrs(at.pair, None)
    plus, minus = (table.gcrs(at.shifted(step).pair, None)[0] for step in (1.0, -1.0))
    # A cubic's central difference over h is off by h^2 f'''/6 = 1e-3 m/s x (1 s)^2 / 6 of 9e-3 m/s3.
    np.testing.assert_allclose(v, (plus - minus) / 2, rtol=0, atol=2e-3)
    five = {k: table.gcrs(at.shifted(float(k)).pair, None)[0] for k in (-2, -1, 1, 2)}
    slope = (8 * (five[1] - five[-1]) - (five[2] - five[-2])) / 12
    np.testing.assert_allclose(v, slope, rtol=0, atol=1e-8)  # exact for a cubic; rounding of 7e6 m


def test_scales_of_the_dates_agree(reference):
    t = every(60.0, 20)
    r, v = orbit().gcrs(t.pair, None)
    at = every(60.0, 19).shifted(17.0).pair
    base = Trajectory.from_states(t, r, v).gcrs(at, reference)
    # 2021: TT = TAI + 32.184 s = GPS + 51.184 s; counts of UTC are 32 s behind TAI's.
    for scale, offset in (("TAI", (32, 0.184)), ("GPS", (51, 0.184)), ("UTC", (64, 0.184))):
        other = t.shifted((-offset[0] - 1, 1 - offset[1]))
        named = Trajectory.from_states(Instants.from_seconds(other.whole, other.fraction, scale), r, v)
        np.testing.assert_allclose(named.gcrs(at, reference)[0], base[0], rtol=0, atol=1e-8)
    # TCG = TT + L_G/(1 - L_G) (TT - T0), TN36 eq. 10.1, and lengths x_TT = x_TCG (1 - L_G): 5 mm in 7e6 m.
    shift = 6.969290134e-10 / (1 - 6.969290134e-10) * ((t.whole + 725803168) + (t.fraction - 0.184))
    tcg = t.shifted(shift)
    named = Trajectory.from_states(Instants.from_seconds(tcg.whole, tcg.fraction, "TCG"), r / (1 - 6.969290134e-10), v)
    np.testing.assert_allclose(named.gcrs(at, reference)[0], base[0], rtol=0, atol=1e-8)


def test_itrs_states_of_a_site_are_the_site(reference):
    site = Site.from_geodetic("ground", 20.0, -30.0, 500.0)
    t = every(3600.0, 30)
    fixed = np.tile(site.position_m, (30, 1))
    moving = Trajectory.from_states(t, fixed, np.zeros((30, 3)), "ITRS")
    at = every(3600.0, 29).shifted(1234.5).pair
    r, v = moving.gcrs(at, reference)
    expected_r, expected_v = site.gcrs(at, reference)
    np.testing.assert_allclose(r, expected_r, rtol=0, atol=1e-8)
    np.testing.assert_allclose(v, expected_v, rtol=0, atol=1e-11)
    assert isinstance(moving, Observer)


def test_barycentric_state_is_the_sum_but_for_known_terms(reference):
    t = every(600.0, 50)
    r, v = orbit().gcrs(t.pair, reference)
    tdb = tdb_from_tt_at_geocentre(t.pair, reference)
    x, x_rate = orbit().state_bcrs(tdb, reference)
    earth, earth_rate = reference.ephemeris.state("earth", tdb)
    # Scale U/c^2 + L_C = 2.5e-8 (0.17 m), Lorentz 0.5e-8 (0.03 m), and 2.3e-6 s x 7.6e3 m/s = 17 mm of dates.
    difference = np.linalg.norm(x - earth - r, axis=1)
    assert 0.1 < difference.max() < 0.25
    # Rates: the same 2.5e-8 of 7.6e3 m/s, (V.v) V/2c^2 and v (V.v)/c^2, and 2.3e-6 s of 8 m/s2.
    assert np.abs(x_rate - earth_rate - v).max() < 4e-4


def test_barycentric_state_term_by_term(reference):
    # Worked out apart with TN36 eq. 11.19, U and V from the ephemeris: r (1 - U/c^2 - L_C) - (V.r) V/2c^2 at the TT of
    # the event, which is (V.r)/c^2 behind that of the geocentre.
    t = every(600.0, 30)
    tdb = tdb_from_tt_at_geocentre(t.pair, reference)
    earth, rate = reference.ephemeris.state("earth", tdb)
    sun = reference.ephemeris.position("sun", tdb)
    potential = 132712440041.279419e9 / np.linalg.norm(earth - sun, axis=1, keepdims=True)
    r, v = orbit().gcrs(t.pair, reference)
    late = np.sum(rate * r, axis=1, keepdims=True) / C_M_S**2
    r = r - late * v
    expected = r * (1 - potential / C_M_S**2 - 1.48082686741e-8)
    expected = expected - np.sum(rate * r, axis=1, keepdims=True) * rate / (2 * C_M_S**2)
    x, _ = orbit().state_bcrs(tdb, reference)
    # 1e-4 m: two ulp of 1.5e11 m (0.03 mm each).
    np.testing.assert_allclose(x - earth, expected, rtol=0, atol=1e-4)


def test_barycentric_velocity_is_the_derivative(reference):
    tdb = tdb_from_tt_at_geocentre(every(977.0, 60).pair, reference)
    for moving in (orbit(), Site.from_geodetic("ground", 20.0, -30.0, 500.0)):
        _, v = bcrs_state(moving, tdb, reference)
        step = 50
        at = {k: bcrs_state(moving, (tdb[0] + k * step, tdb[1]), reference)[0] for k in (-4, -3, -2, -1, 1, 2, 3, 4)}
        slope = (
            sum(weight * (at[k] - at[-k]) for k, weight in ((1, 4 / 5), (2, -1 / 5), (3, 4 / 105), (4, -1 / 280)))
            / step
        )
        # Rounding of 1.5e11 m (3e-5 m) over 50 s, and h^8 f^(9)/630 = 1e-7 m/s. The relativistic parts of the velocity
        # are 2e-4 m/s.
        np.testing.assert_allclose(v, slope, rtol=0, atol=3e-6)


def test_there_and_back_between_the_frames(reference):
    tt = every(600.0, 50).pair
    for a_m in (6.9e6, 42.164e6, 3.8e8):
        path = orbit(a_m=a_m)
        r, v = path.gcrs(tt, reference)
        back_r, back_v = gcrs_state(lambda tdb, path=path: path.state_bcrs(tdb, reference), tt, reference)
        # 1e-4 m: ulps of 1.5e11 m. 1e-8 m/s: ulps of 3e4 m/s and 1e-4 m over the period.
        np.testing.assert_allclose(back_r, r, rtol=0, atol=1e-4)
        np.testing.assert_allclose(back_v, v, rtol=0, atol=1e-7)


def test_barycentric_states_serve_as_an_observer(reference):
    t = every(60.0, 40)
    tdb = tdb_from_tt_at_geocentre(t.pair, reference)
    x, v = orbit().state_bcrs(tdb, reference)
    far = Trajectory.from_states(Instants.from_seconds(*tdb, scale="TDB"), x, v, "BCRS")
    at = every(60.0, 36).shifted(75.0)
    r, rate = far.gcrs(at.pair, reference)
    expected_r, expected_rate = orbit().gcrs(at.pair, reference)
    # Rounded positions of 1.5e11 m, interpolated: 0.2 mm (0.7 ps).
    np.testing.assert_allclose(r, expected_r, rtol=0, atol=2e-4)
    np.testing.assert_allclose(rate, expected_rate, rtol=0, atol=1e-5)


def test_states_about_another_centre(reference):
    t = every(60.0, 10)
    tdb = Instants.from_seconds(t.whole, t.fraction, "TDB")
    near = Trajectory.from_kepler(tdb[0], 3.6e6, 0.1, 90, 1, 2, 3, center="mars")
    mars, mars_rate = reference.ephemeris.state("mars", tdb.pair)
    x, v = near.state_bcrs(tdb.pair, reference)
    table = Trajectory.from_states(tdb, x - mars, v - mars_rate, "BCRS", center="mars")
    again_x, again_v = table.state_bcrs(tdb.pair, reference)
    np.testing.assert_allclose(again_x, x, rtol=0, atol=1e-4)  # ulps of 2e11 m
    np.testing.assert_allclose(again_v, v, rtol=0, atol=1e-10)
    assert np.all(np.linalg.norm(x - mars, axis=1) < 4e6)


def test_shapes_and_order_do_not_matter(reference):
    table = sampled("hermite", 7)
    random = np.random.default_rng(3)
    seconds = random.uniform(0, 39 * 60, (3, 4))
    at = START.shifted(seconds)
    r, v = table.gcrs(at.pair, reference)
    assert r.shape == v.shape == (3, 4, 3)
    one_r, one_v = table.gcrs(at[1, 2].pair, reference)
    assert one_r.shape == (3,)
    np.testing.assert_array_equal(one_r, r[1, 2])
    np.testing.assert_array_equal(one_v, v[1, 2])
    x, _ = table.state_bcrs(tdb_from_tt_at_geocentre(at.pair, reference), reference)
    assert x.shape == (3, 4, 3)
    tt = tt_from_tdb_at_geocentre((at.whole, at.fraction), reference)
    assert tt[0].shape == (3, 4)
    np.testing.assert_array_equal(table.gcrs((at.whole[::-1, ::2], at.fraction[::-1, ::2]), reference)[0], r[::-1, ::2])


def test_inputs_are_left_alone_and_later_changes_do_not_reach_in():
    t = every(60.0, 8)
    r, v = (x.copy() for x in orbit().gcrs(t.pair, None))
    keep = r.copy()
    table = Trajectory.from_states(t, r, v)
    np.testing.assert_array_equal(r, keep)
    before = table.gcrs(t[3].pair, None)[0]
    r[:] = 0.0
    np.testing.assert_array_equal(table.gcrs(t[3].pair, None)[0], before)


def test_pickle():
    table = sampled("hermite", 7)
    at = every(60.0, 10).shifted(5.0).pair
    np.testing.assert_array_equal(pickle.loads(pickle.dumps(table)).gcrs(at, None)[0], table.gcrs(at, None)[0])


def test_nothing_is_extrapolated(reference):
    table = sampled("hermite", 7)
    ends = START.shifted(np.array([0.0, 39 * 60.0]))
    table.gcrs(ends.pair, reference)
    outside = START.shifted(np.array([[-2e-9, 5.0], [39 * 60.0 + 2e-9, 60.0]]))
    with pytest.raises(
        OutOfSpan, match="2 of 4 dates lie outside the trajectory 'states', which covers 2021-05-04"
    ) as e:
        table.gcrs(outside.pair, reference)
    assert e.value.mask.tolist() == [[True, False], [True, False]]
    with pytest.raises(OutOfSpan):
        table.state_bcrs(outside.pair, reference)
    assert table.span[0] == pytest.approx(START.whole + START.fraction)
    assert orbit().span == (-np.inf, np.inf)
    assert "any date" in repr(orbit())


@pytest.mark.parametrize("scale", ["TCG", "TAI", "GPS"])
def test_own_end_dates_are_inside_in_any_scale_of_the_earth(scale, reference):
    # States dated in TCG: the TT that those dates were made from lies 0.1 fs to either side of the ends.
    r, v = orbit().gcrs(every(60.0, 8).pair, None)
    there, back = tscale.chain("TT", scale, reference=reference), tscale.chain(scale, "TT", reference=reference)
    length = 1 - 6.969290134e-10 if scale == "TCG" else 1.0  # x_TT = x_TCG (1 - L_G), TN36 eq. 1.1: 5 mm
    for shift_s in np.random.default_rng(5).uniform(0, 3e8, 40):
        tt = every(60.0, 8).shifted(shift_s)
        t = there(tt)
        table = Trajectory.from_states(t, r, v)
        for at in (tt, back(t)):
            got_r, got_v = table.gcrs(at.pair, reference)
            np.testing.assert_allclose(got_r, r * length, rtol=0, atol=1e-5)  # 7.5 km/s for 1 ns
            np.testing.assert_allclose(got_v, v, rtol=0, atol=1e-8)  # 9 m/s2 for 1 ns


def test_own_end_dates_are_inside_in_tcb(reference):
    start = Instants.from_seconds(START.whole + 60 * np.arange(8), 0.25, "TDB")
    r, v = np.tile([1e11, 2e11, 0.0], (8, 1)), np.zeros((8, 3))
    for shift_s in np.random.default_rng(6).uniform(0, 3e8, 40):
        tdb = start.shifted(shift_s)
        table = Trajectory.from_states(tscale.chain("TDB", "TCB", reference=reference)(tdb), r, v, "BCRS")
        # x_TDB = x_TCB (1 - L_B), TN36 eq. 1.2: 3.5 km; two ulp of 2e11 m.
        got_r, _ = table.state_bcrs(tdb.pair, reference)
        np.testing.assert_allclose(got_r, r * (1 - 1.550519768e-8), rtol=0, atol=6e-5)


@pytest.mark.parametrize(("method", "degree"), [("hermite", 7), ("lagrange", 5)])
def test_a_rounding_past_an_end_goes_on_with_the_polynomial_there(method, degree):
    table = sampled(method, degree)
    for end_s, sign in ((0.0, -1), (39 * 60.0, 1)):
        end = START.shifted(end_s)
        r, v = table.gcrs(end.pair, None)
        for by_s in (1e-16, 1e-12, 0.9e-9):
            past_r, past_v = table.gcrs(end.shifted(sign * by_s).pair, None)
            np.testing.assert_allclose(past_r, r + sign * by_s * v, rtol=0, atol=1e-8)  # a few ulp of 7e6 m
            np.testing.assert_allclose(past_v, v, rtol=0, atol=2e-8)  # 9 m/s2 for 1 ns
        with pytest.raises(OutOfSpan):
            table.gcrs(end.shifted(sign * 1.1e-9).pair, None)


def test_a_piece_that_covers_a_date_comes_before_one_a_rounding_away():
    def piece(first, last):
        ends = [(np.asarray(int(x // 1)), np.asarray(x % 1)) for x in (first, last)]
        return Piece(orbit().pieces[0].motion, 399, "ICRF", *ends)

    pieces = (piece(0.0, 10.0), piece(10.0, 20.0), piece(30.0, 40.0))
    # Exact inside the first, on the shared end, a rounding past each, in the gap, before all and after all.
    at = [(9, 1 - 1e-10), (10, 0.0), (20, 5e-10), (29, 1 - 5e-10), (25, 0.0), (-1, 1 - 5e-10), (40, 5e-10), (41, 0.0)]
    whole, fraction = np.array([x[0] for x in at]), np.array([x[1] for x in at])
    assert piece_numbers(pieces, (whole, fraction)).tolist() == [0, 1, 1, 2, -1, 0, 2, -1]


@pytest.mark.parametrize(
    ("change", "words"),
    [
        ({"frame": "TEME"}, "GCRS, ITRS and BCRS"),
        ({"frame": "BCRS"}, "TDB or TCB"),
        ({"method": "spline"}, "hermite and lagrange"),
        ({"degree": 4}, "odd degree"),
        ({"degree": 1}, "odd degree"),
        ({"degree": 3.0}, "integer"),
        ({"degree": 99}, "integer of 1 to"),
        ({"degree": 15}, "needs 8 states, got 5: give degree=9"),
        ({"method": "lagrange", "degree": 5}, "needs 6 states, got 5: give degree=4"),
        ({"position_m": np.zeros((4, 3))}, r"shape \(n, 3\)"),
        ({"velocity_m_s": np.zeros((5, 2))}, r"shape \(n, 3\)"),
        ({"velocity_m_s": np.full((5, 3), np.nan)}, "5 of 5 states are not finite"),
        ({"t": Instants.from_seconds([0, 60, 60, 120, 180], 0.0, "TT")}, "1 of 5 do not come after"),
        ({"t": Instants.from_seconds(np.arange(5), 0.0, "UT1")}, "UT1"),
        ({"t": Instants.from_seconds(np.arange(5), 0.0, "TDB")}, "dates of GCRS states are TDB"),
        ({"t": START}, r"shape \(n, 3\)"),
        ({"t": "2025"}, r"must be Instants, got '2025' \(str\).*from_iso"),
        ({"t": None}, "must be Instants"),
        ({"position_m": "abc"}, "position_m must be real numbers, got <U3"),
        ({"velocity_m_s": [[1, 2, 3], [1, 2]]}, "velocity_m_s: rows of different length"),
        ({"position_m": np.ones((5, 3), dtype=np.complex128)}, "real numbers, got complex128"),
        ({"velocity_m_s": [[object()] * 3] * 5}, "no real number"),
        ({"position_m": np.ma.masked_less(np.zeros((5, 3)), 1.0)}, "masked"),
        ({"position_m": np.ones((5, 3)) * units.km}, "in units of km"),
        ({"name": None}, "name must be a text"),
        ({"name": ""}, "name must be a text"),
        ({"degree": "x"}, "integer of 1 to"),
        # What contradicts the frame.
        ({"center": "mars"}, "center='mars' goes with frame='BCRS' only"),
        ({"center": 0, "frame": "ITRS"}, "center=0 goes with frame='BCRS' only"),
        ({"t": every(60.0, 5).at("BARYCENTER")}, "dated at BARYCENTER.*TOPOCENTER.*GEOCENTER"),
        ({"t": every(60.0, 5).at("BARYCENTER"), "frame": "ITRS"}, "dated at BARYCENTER"),
        ({"t": Instants.from_seconds(np.arange(5), 0.0, "TDB", "GEOCENTER"), "frame": "BCRS"}, "dated at GEOCENTER"),
        # What does not move so.
        ({"velocity_m_s": np.full((5, 3), C_M_S / np.sqrt(3) * 1.0001)}, "5 of 5 velocities are not below the speed"),
        ({"velocity_m_s": np.full((5, 3), 7e3)}, "4 of 4 pairs.*changes by 0 m/s.*say 1.212e.04 m/s"),
    ],
)
def test_bad_states(change, words):
    good = {"t": every(60.0, 5), "position_m": np.ones((5, 3)), "velocity_m_s": np.zeros((5, 3))}
    Trajectory.from_states(**good)
    with pytest.raises(InvalidInput, match=words):
        Trajectory.from_states(**(good | change))


@pytest.mark.parametrize(("r_unit", "v_unit"), [(1e-3, 1.0), (1.0, 1e-3)])
@pytest.mark.parametrize("step_s", [1.0, 60.0, 600.0])
def test_mixed_units_are_found(r_unit, v_unit, step_s):
    t = every(step_s, 9)
    r, v = orbit().gcrs(t.pair, None)
    Trajectory.from_states(t, r, v)
    with pytest.raises(InvalidInput, match=r"not of one motion: between 8 of 8 pairs"):
        Trajectory.from_states(t, r * r_unit, v * v_unit)


@pytest.mark.parametrize("e", [0.0, 0.7, 0.95])
def test_orbits_with_sparse_states_are_of_one_motion(e):
    # Six states a revolution, more than an orbit can be interpolated with; the chord is then 3/pi of the arc at e = 0.
    path = Trajectory.from_kepler(START, 6.9e6 / (1 - e), e, 20, 30, 40, 50)
    period_s = 2 * np.pi / path.pieces[0].motion.mean_motion_rad_s
    t = every(period_s / 6, 12)
    Trajectory.from_states(t, *path.gcrs(t.pair, None))


def test_an_antenna_that_creeps_is_not_refused():
    # Plate motion and noise of 0.1 mm in the positions at 1 s; the velocities say 0.
    r = np.array([4e6, 1e6, 4.8e6]) + np.random.default_rng(3).normal(size=(9, 3)) * 1e-4
    Trajectory.from_states(every(1.0, 9), r, np.zeros((9, 3)), "ITRS")


@pytest.mark.parametrize("place", [None, "TOPOCENTER", "GEOCENTER"])
def test_places_that_fit(place):
    t = START if place is None else START.at(place)
    t = t.reshape(1).shifted(np.arange(5) * 60.0)
    Trajectory.from_states(t, np.ones((5, 3)), np.zeros((5, 3)))
    tdb = Instants.from_seconds(np.arange(5), 0.0, "TDB", "BARYCENTER" if place == "GEOCENTER" else place)
    Trajectory.from_states(tdb, np.ones((5, 3)), np.zeros((5, 3)), "BCRS", center="mars")


# ---- SPK kernels ---------------------------------------------------------------------------------


def test_spk_body_is_the_ephemeris(reference):
    kernel = reference.ephemeris.path
    moon = Trajectory.from_spk(kernel, 301)
    tdb = every(86400.0, 20).pair
    x, v = moon.state_bcrs(tdb, reference)
    expected_x, expected_v = reference.ephemeris.state("moon", tdb)
    np.testing.assert_allclose(x, expected_x, rtol=0, atol=1e-4)  # ulps of 1.5e11 m
    np.testing.assert_allclose(v, expected_v, rtol=0, atol=1e-10)
    r, _ = moon.gcrs(tdb, reference)
    assert np.all((np.linalg.norm(r, axis=-1) > 3.5e8) & (np.linalg.norm(r, axis=-1) < 4.1e8))
    with pytest.raises(MissingPiece, match="no segment of body -900"):
        Trajectory.from_spk(kernel, -900)


@pytest.fixture
def probe(tmp_path):
    """Write a kernel of a made-up probe -900: about the Sun, then from day 10 on about -901, which is about Mars."""
    day = 86400.0
    first = spk_bytes(
        title="made up", comment="", target=-900, center=10, start_s=0.0, step_s=day, coefficients=cruise(20)
    )
    path = tmp_path / "probe.bsp"
    path.write_bytes(first)
    with path.open("r+b") as file:
        daf = DAF(file)
        for target, center, records in ((-900, -901, 10), (-901, 4, 20)):
            start = 20 * day - records * day
            rows = np.empty((records, 2 + 3 * 2))
            rows[:, 0] = start + day * (np.arange(records) + 0.5)
            rows[:, 1] = day / 2
            rows[:, 2:] = np.tile([100.0, 1.0, 200.0, 0.0, -300.0 + center, 2.0], (records, 1))
            words = np.concatenate((rows.ravel(), [start, day, 8.0, records]))
            daf.add_array(b"made up", (start, 20 * day, target, center, 1, 2), words)
    return path


def cruise(records):
    """Straight line: (1e8 + 2 t/day, -5e7, 3e6) km."""
    coefficients = np.zeros((records, 3, 2))
    coefficients[:, 0, 0] = 1e8 + 2 * (np.arange(records) + 0.5)
    coefficients[:, 0, 1] = 1.0
    coefficients[:, 1, 0] = -5e7
    coefficients[:, 2, 0] = 3e6
    return coefficients


def test_spk_probe_that_changes_its_centre(reference, probe):
    path = Trajectory.from_spk(probe, target=-900)
    assert [piece.center for piece in path.pieces] == [10, 4]
    tdb = (np.array([86400, 3 * 86400, 15 * 86400 + 43200]), np.zeros(3))
    x, v = path.state_bcrs(tdb, reference)
    sun, sun_rate = reference.ephemeris.state("sun", tdb)
    mars, mars_rate = reference.ephemeris.state("mars", tdb)
    np.testing.assert_allclose(
        x[:2] - sun[:2], [[1e11 + 2e3, -5e10, 3e9], [1e11 + 6e3, -5e10, 3e9]], rtol=0, atol=1e-4
    )  # ulps of 1.5e11 m
    np.testing.assert_allclose(v[:2] - sun_rate[:2], np.tile([2e3 / 86400, 0, 0], (2, 1)), rtol=0, atol=1e-9)
    # The two segments that hang on each other, in the middle of a record: their constant terms add.
    np.testing.assert_allclose(x[2] - mars[2], [200e3, 400e3, (-600 - 901 + 4) * 1e3], rtol=0, atol=1e-4)
    np.testing.assert_allclose(v[2] - mars_rate[2], np.array([2, 0, 4]) * 1e3 / 43200, rtol=0, atol=1e-9)
    with pytest.raises(OutOfSpan, match="2000-01-01T12:00:00 to 2000-01-21T12:00:00"):
        path.state_bcrs((np.array([-1]), np.array([0.0])), reference)


def test_spk_ends_allow_a_rounding_and_stand_still_there(reference, probe):
    path = Trajectory.from_spk(probe, target=-900)
    first, last = (0, 0.0), (20 * 86400, 0.0)
    before, after = (-1, 1 - 5e-10), (20 * 86400, 5e-10)
    for end, past in ((first, before), (last, after)):
        r, v = path.state_from_center(tuple(map(np.asarray, end)), reference)
        past_r, past_v = path.state_from_center(tuple(map(np.asarray, past)), reference)
        np.testing.assert_array_equal(past_r, r)
        np.testing.assert_array_equal(past_v, v)
    with pytest.raises(OutOfSpan):
        path.state_from_center((np.asarray(20 * 86400), np.asarray(2e-9)), reference)


def test_lengths_of_states_dated_in_tcb(reference):
    # TN36 eq. 1.2: x_TDB = x_TCB (1 - L_B), velocities keep their value; at the knots nothing is interpolated.
    tdb = Instants.from_seconds(700_000_000 + 86400 * np.arange(12), 0.5, scale="TDB", place="BARYCENTER")
    tcb = tscale.chain("TDB@BARYCENTER", "TCB@BARYCENTER")(tdb)
    v = np.random.default_rng(6).normal(size=(12, 3)) * 1e4
    r = np.random.default_rng(5).normal(size=3) * 1e11 + 86400.0 * np.cumsum(v, axis=0)
    plain = Trajectory.from_states(tdb, r, v, frame="BCRS", center=0).state_bcrs(tdb.pair, reference)
    scaled = Trajectory.from_states(tcb, r, v, frame="BCRS", center=0).state_bcrs(tdb.pair, reference)
    np.testing.assert_allclose(scaled[0] / plain[0], 1 - 1.550519768e-8, rtol=0, atol=1e-15)
    np.testing.assert_allclose(scaled[1], plain[1], rtol=1e-12, atol=0)
