"""Kernels against the general-purpose reader jplephem, published vectors and hand-made files."""

from __future__ import annotations

import io
import pickle
import struct
import subprocess
import sys
from concurrent.futures import ThreadPoolExecutor
from pathlib import Path

import erfa
import jplephem.daf
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from jplephem.spk import SPK
from numpy.polynomial import chebyshev

from tscale.constants import GM_M3_S2
from tscale.earth import cip_table
from tscale.ephemeris import PLANETARY_BODIES, ChebyshevTable, Ephemeris, body_id
from tscale.ephemeris.shipped import DEFAULT_KERNEL, manifest, shipped_path
from tscale.errors import DataFileError, InvalidInput, MissingPiece, OutOfSpan

DAY_S = 86400
FIRST, LAST = -1262260800, 1893499200  # 1960-01-01 and 2060-01-01, at noon


@pytest.fixture(scope="module")
def eph() -> Ephemeris:
    return Ephemeris.default()


@pytest.fixture(scope="module")
def dates() -> tuple[np.ndarray, np.ndarray]:
    random = np.random.default_rng(440)
    return random.integers(FIRST, LAST, 20_000), random.random(20_000)


def reader_arguments(whole: np.ndarray, fraction: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    return 2451545.0 + whole // DAY_S, (whole % DAY_S + fraction) / DAY_S


def write_kernel(path: Path, segments: list[tuple[tuple[float, ...], np.ndarray]]) -> Path:
    """Write segments ((start, end, target, center, frame, type), words) with jplephem's own writer."""
    file = io.BytesIO()
    header = struct.pack(
        "<8sII60sIII8s603s28s297s", b"DAF/SPK ", 2, 6, b"test", 2, 2, 385, b"LTL-IEEE", b"", jplephem.daf.FTPSTR, b""
    )
    file.write(header + struct.pack("<3d", 0, 0, 0).ljust(1024, b"\0") + b" " * 1024)
    daf = jplephem.daf.DAF(file)
    for values, words in segments:
        daf.add_array(b"TEST", values, words)
    path.write_bytes(file.getvalue())
    return path


def chebyshev_words(start_s: float, step_s: float, coefficients: np.ndarray) -> np.ndarray:
    records = coefficients.shape[0]
    middle = start_s + step_s * (np.arange(records) + 0.5)
    head = np.column_stack([middle, np.full(records, step_s / 2)])
    rows = np.hstack([head, coefficients.reshape(records, -1)])
    return np.concatenate([rows.ravel(), [start_s, step_s, rows.shape[1], records]])


def test_shipped_kernel_is_the_one_in_the_manifest(eph: Ephemeris) -> None:
    entry = manifest(DEFAULT_KERNEL)
    assert eph.sha256 == entry["sha256"]
    assert eph.path.stat().st_size == entry["bytes"]
    assert "DE440" in eph.comment
    # Light that reaches the Earth on 1960-01-01 has left Neptune 4.2 h before; half a year is there.
    assert eph.span == (-1280836800.0, 1909137600.0)


@pytest.mark.parametrize("body", [1, 2, 3, 4, 5, 6, 7, 8, 9, 10])
def test_states_agree_with_general_reader(eph: Ephemeris, dates: tuple[np.ndarray, np.ndarray], body: int) -> None:
    # jplephem keeps day and fraction apart as well; both round positions to about 1e-16 of up to 7e12 m (1 mm for
    # Pluto) and the argument to 1e-16 of a record (16 days at 59 km/s: 1e-5 m).
    with SPK.open(eph.path) as kernel:
        position, velocity = kernel[0, body].compute_and_differentiate(*reader_arguments(*dates))
        ours, speed = eph.state(body, dates)
        tolerance_m = 1e-4 + 4e-16 * np.abs(position).max() * 1e3
        np.testing.assert_allclose(ours, position.T * 1e3, rtol=0, atol=tolerance_m)
        np.testing.assert_allclose(speed, velocity.T * 1e3 / DAY_S, rtol=0, atol=1e-9)


def test_path_through_the_earth_moon_barycentre(eph: Ephemeris, dates: tuple[np.ndarray, np.ndarray]) -> None:
    with SPK.open(eph.path) as kernel:
        time = reader_arguments(*dates)
        moon, earth, both = (kernel[pair].compute(*time).T * 1e3 for pair in ((3, 301), (3, 399), (0, 3)))
    # The shared leg is left out, so the lunar distance keeps its own rounding: 4e8 m x 1e-16 = 4e-8 m, and
    # 1e-16 of a 4-day record at 1 km/s, 4e-8 m.
    np.testing.assert_allclose(eph.position("moon", dates, "earth"), moon - earth, rtol=0, atol=4e-7)
    np.testing.assert_allclose(eph.position("earth", dates), both + earth, rtol=0, atol=1e-4)
    np.testing.assert_array_equal(eph.position("earth", dates, "moon"), -eph.position("moon", dates, "earth"))
    np.testing.assert_array_equal(eph.position(0, dates, "earth"), -eph.position("earth", dates))
    assert not eph.position("sun", dates, "sun").any()


def test_many_bodies_at_once_are_the_same(eph: Ephemeris, dates: tuple[np.ndarray, np.ndarray]) -> None:
    positions, velocities = eph.states(PLANETARY_BODIES, dates)
    for k, body in enumerate(PLANETARY_BODIES):
        position, velocity = eph.state(body, dates)
        np.testing.assert_array_equal(positions[k], position)
        np.testing.assert_array_equal(velocities[k], velocity)
    np.testing.assert_array_equal(eph.positions(PLANETARY_BODIES, dates), positions)


def test_earth_against_erfa_series(eph: Ephemeris) -> None:
    # erfa.epv00 (VSOP2000, fitted to DE405) states for 1900-2100: heliocentric position errors up to 11.2 km (max)
    # and 5.2 mm/s (max), epv00.c note 3; 2 km and 1 mm/s more for DE440 against DE405 and the Sun.
    day = np.arange(-14000.0, 21000.0, 37.3)
    whole = np.floor(day * DAY_S).astype(np.int64)
    fraction = day * DAY_S - whole
    heliocentric = erfa.epv00(2451545.0, day)[0]
    position, velocity = eph.state("earth", (whole, fraction), "sun")
    au_m = 149597870700.0
    assert np.abs(position - heliocentric["p"] * au_m).max() < 14e3
    assert np.abs(velocity - heliocentric["v"] * au_m / DAY_S).max() < 7e-3


def test_velocity_is_the_derivative_of_position(eph: Ephemeris) -> None:
    whole = np.arange(FIRST, LAST, 86400 * 1001)
    for body in ("mercury", "earth", "moon", "jupiter"):
        ahead, behind = (eph.position(body, (whole + h, np.zeros(whole.size)), "sun") for h in (20, -20))
        # Central difference: rounding of 2e-4 m / 40 s, and h^2/6 x third derivative (Mercury: 8e-8 m/s3).
        velocity = eph.state(body, (whole, np.zeros(whole.size)), "sun")[1]
        np.testing.assert_allclose((ahead - behind) / 40.0, velocity, rtol=0, atol=2e-5)


@pytest.mark.parametrize("shape", [(), (1,), (3, 4), (2, 0)])
def test_shapes_broadcast_and_stay_unchanged(eph: Ephemeris, shape: tuple[int, ...]) -> None:
    whole, fraction = np.full(shape, 1234567), np.full(shape, 0.25)
    position, velocity = eph.state("mars", (whole, fraction))
    assert position.shape == velocity.shape == (*shape, 3)
    assert (whole == 1234567).all()
    assert (fraction == 0.25).all()
    np.testing.assert_array_equal(eph.position("mars", (whole, 0.25)), position)


def test_strided_and_reversed_input(eph: Ephemeris, dates: tuple[np.ndarray, np.ndarray]) -> None:
    plain = eph.position("moon", dates)
    strided = eph.position("moon", (dates[0][::-3], dates[1][::-3]))
    np.testing.assert_array_equal(strided, plain[::-3])


def test_femtoseconds_move_the_earth(eph: Ephemeris) -> None:
    # In 2059 a float64 count resolves 0.24 us; the two parts move Mercury (48 km/s) by the right amount for 1 ns,
    # within the resolution of its position, 1e-5 m.
    step_s = np.arange(0.0, 1e-6, 1e-9)
    x, v = eph.state("mercury", (np.full(step_s.size, 1890000000), 0.5 + step_s), "sun")
    expected = v[0] * step_s[:, None]
    assert np.abs(expected).max() > 0.02
    np.testing.assert_allclose(x - x[0], expected, rtol=0, atol=5e-5)


def test_out_of_span_names_dates_and_marks_them(eph: Ephemeris) -> None:
    whole = np.array([[0, 1909137600], [1909137601, -1280836801]])
    with pytest.raises(OutOfSpan, match=r"2 of 4 dates .* 1959-06-01T00:00:00 to 2060-07-01T00:00:00") as caught:
        eph.position("earth", (whole, np.zeros((2, 2))))
    np.testing.assert_array_equal(caught.value.mask, [[False, False], [True, True]])
    with pytest.raises(OutOfSpan):
        eph.position("earth", (np.array(0), np.array(np.nan)))
    with pytest.raises(OutOfSpan):
        eph.position("earth", (np.array(1909137600), np.array(0.5)))


def test_bad_arguments_are_explained(eph: Ephemeris, tmp_path: Path) -> None:
    origin = (np.array(0), np.array(0.0))
    with pytest.raises(MissingPiece, match=r"does not hold body 499; it holds .*jupiter \(5\).*open a kernel"):
        eph.position(499, origin)
    with pytest.raises(InvalidInput, match=r"unknown body 'vulcan': known names are .*moon"):
        eph.position("vulcan", origin)
    with pytest.raises(InvalidInput, match="a body is a name or a NAIF number"):
        body_id(3.5)  # type: ignore[arg-type]
    with pytest.raises(InvalidInput, match="whole seconds must be integers"):
        eph.position("sun", (np.array(0.5), np.array(0.0)))  # type: ignore[arg-type]
    with pytest.raises(DataFileError, match=r"cannot read .*No such file"):
        Ephemeris.open(tmp_path / "none.bsp")
    assert body_id(" Sun ") == body_id(np.int64(10)) == 10


def test_mass_parameters(eph: Ephemeris) -> None:
    # Comment area of de440.bsp: AU**3/DAY**2 to 16 digits there, km3/s2 to 1e-6 in the constants (5e-10 of Pluto).
    for body, value in GM_M3_S2.items():
        assert eph.gm_m3_s2(body) == pytest.approx(value, rel=1e-9)
    assert eph.gm_m3_s2(3) == pytest.approx(403503.235625e9, rel=1e-11)  # GMB there
    assert eph.gm_m3_s2(199) == eph.gm_m3_s2("mercury")
    with pytest.raises(InvalidInput, match="no mass parameter known for body 499"):
        eph.gm_m3_s2(499)
    heavier = Ephemeris.open(eph.path, gm_m3_s2={399: 4e14})
    assert heavier.gm_m3_s2("earth") == 4e14
    assert pickle.loads(pickle.dumps(heavier)).gm_m3_s2("earth") == 4e14
    with pytest.raises(InvalidInput, match="mass parameter of earth"):
        Ephemeris.open(eph.path, gm_m3_s2={399: float("nan")})


def test_pickle_and_threads(eph: Ephemeris, dates: tuple[np.ndarray, np.ndarray], tmp_path: Path) -> None:
    fresh = Ephemeris.open(eph.path)
    with ThreadPoolExecutor(8) as pool:
        results = list(pool.map(lambda _: fresh.position("moon", dates), range(8)))
    for result in results:
        np.testing.assert_array_equal(result, results[0])
    copy = tmp_path / "copy.bsp"
    copy.write_bytes(eph.path.read_bytes())
    packed = pickle.dumps(Ephemeris.open(copy))
    np.testing.assert_array_equal(pickle.loads(packed).position("moon", dates), results[0])
    changed = bytearray(copy.read_bytes())
    changed[-100] ^= 1
    copy.write_bytes(changed)
    code = f"import pickle; pickle.loads({packed!r})"
    run = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=False)
    assert "is not the file that was in use" in run.stderr


@pytest.mark.parametrize("keep", [0, 7, 500, 1024, 40_000, 62_000, 70_001, 1_000_000, 11_000_000])
def test_truncated_kernels(eph: Ephemeris, tmp_path: Path, keep: int) -> None:
    path = tmp_path / "cut.bsp"
    path.write_bytes(eph.path.read_bytes()[:keep])
    with pytest.raises(DataFileError, match=r"cut\.bsp") as caught:
        Ephemeris.open(path)
    assert caught.value.path == path


def test_other_files_are_refused(tmp_path: Path) -> None:
    path = tmp_path / "text.bsp"
    path.write_text("epoch,offset\n" * 300)
    with pytest.raises(DataFileError, match="not an SPK kernel"):
        Ephemeris.open(path)
    path.write_bytes(shipped_path(DEFAULT_KERNEL).read_bytes()[:8].replace(b"SPK", b"CK ") + bytes(4096))
    with pytest.raises(DataFileError, match="not an SPK kernel"):
        Ephemeris.open(path)


def test_foreign_type_axes_and_damage(tmp_path: Path) -> None:
    words = chebyshev_words(0.0, 100.0, np.ones((2, 3, 4)))
    path = write_kernel(tmp_path / "foreign.bsp", [((0.0, 200.0, -900, 10, 1, 21), words)])
    with pytest.raises(DataFileError, match=r"SPK data type 21; understood are types 2, 3, 8, 9, 12, 13: convert"):
        Ephemeris.open(path)
    # Beside readable segments a foreign one is an error only where it is needed.
    mixed = write_kernel(
        tmp_path / "mixed.bsp", [((0.0, 200.0, -900, 10, 1, 21), words), ((0.0, 200.0, 10, 0, 1, 2), words)]
    )
    middle = (np.array(50), np.array(0.0))
    assert Ephemeris.open(mixed).position(10, middle).shape == (3,)
    with pytest.raises(DataFileError, match="data type 21"):
        Ephemeris.open(mixed).position(-900, middle)
    path = write_kernel(tmp_path / "axes.bsp", [((0.0, 200.0, 10, 0, 17, 2), words)])
    with pytest.raises(DataFileError, match="axes number 17; understood is 1"):
        Ephemeris.open(path)
    words[-1] = 3.0
    path = write_kernel(tmp_path / "trailer.bsp", [((0.0, 200.0, 10, 0, 1, 2), words)])
    with pytest.raises(DataFileError, match="is damaged: its trailer"):
        Ephemeris.open(path)


def test_type_3_gives_the_velocity_of_its_own_records(tmp_path: Path) -> None:
    coefficients = np.random.default_rng(3).normal(size=(5, 6, 7))
    words = chebyshev_words(-250.5, 100.25, coefficients)
    path = write_kernel(tmp_path / "type3.bsp", [((-250.5, 250.75, 10, 0, 1, 3), words)])
    whole, fraction = np.array([-200, -1, 0, 17, 249]), np.array([0.5, 0.75, 0.0, 0.125, 0.5])
    position, velocity = Ephemeris.open(path).state(10, (whole, fraction))
    since = whole + fraction + 250.5
    record = (since // 100.25).astype(int)
    argument = 2 * (since - record * 100.25) / 100.25 - 1
    expected = np.array([chebyshev.chebval(s, coefficients[r].T) for r, s in zip(record, argument, strict=True)])
    # Sums of seven terms of order 1 km: 1e-15 km of rounding each.
    np.testing.assert_allclose(position, expected[:, :3] * 1e3, rtol=0, atol=2e-11)
    np.testing.assert_allclose(velocity, expected[:, 3:] * 1e3, rtol=0, atol=2e-11)


def state_words(data_type: int, epochs: np.ndarray, states: np.ndarray, window: int) -> np.ndarray:
    trailer = [window - 1, len(epochs)]
    if data_type in (8, 12):
        return np.concatenate([states.ravel(), [epochs[0], epochs[1] - epochs[0]], trailer])
    return np.concatenate([states.ravel(), epochs, epochs[99:-1:100], trailer])


@pytest.mark.parametrize(("data_type", "window"), [(8, 4), (8, 5), (9, 6), (9, 7), (12, 2), (12, 3), (13, 4), (13, 1)])
def test_tabulated_states_follow_an_orbit(tmp_path: Path, data_type: int, window: int) -> None:
    # A circular orbit of 7000 km and 5800 s sampled every 60 s or nearly so. The error of interpolation is bounded by
    # R (w h)^k / k! x the product of node distances; k = window for Lagrange, twice that for Hermite.
    radius_km, rate_s = 7000.0, 2 * np.pi / 5800.0
    epochs = 1000.0 + 60.0 * np.arange(250)
    if data_type in (9, 13):
        epochs = epochs + np.random.default_rng(9).uniform(-20, 20, epochs.size)

    def orbit(t: np.ndarray) -> np.ndarray:
        angle = rate_s * (t - 8000.0)
        zero = np.zeros_like(t)
        x = radius_km * np.array([np.cos(angle), np.sin(angle), zero])
        v = radius_km * rate_s * np.array([-np.sin(angle), np.cos(angle), zero])
        return np.concatenate([x, v]).T

    span = (float(epochs[0]), float(epochs[-1]))
    words = state_words(data_type, epochs, orbit(epochs), window)
    path = write_kernel(tmp_path / "probe.bsp", [((*span, -900, 399, 1, data_type), words)])
    kernel = Ephemeris.open(path)
    random = np.random.default_rng(4)
    whole, fraction = random.integers(int(span[0]) + 1, int(span[1]) - 1, 2000), random.random(2000)
    position, velocity = kernel.state(-900, (whole, fraction), 399)
    truth = orbit(whole + fraction) * 1e3
    terms = 2 * window if data_type in (12, 13) else window
    # At the ends of the table the window hangs to one side: each distance up to the window's length.
    bound_m = radius_km * 1e3 * (rate_s * 100.0 * window / 2) ** terms + 1e-6
    np.testing.assert_allclose(position, truth[:, :3], rtol=0, atol=bound_m)
    np.testing.assert_allclose(velocity, truth[:, 3:], rtol=0, atol=bound_m * terms / 20.0 + 1e-8)
    assert np.abs(position - truth[:, :3]).max() < 1e6
    # At the epochs the states come back as given.
    on = epochs[:-1].astype(np.int64)
    again, speed = kernel.state(-900, (on, epochs[:-1] - on), 399)
    np.testing.assert_allclose(again, orbit(epochs[:-1])[:, :3] * 1e3, rtol=0, atol=1e-6)
    np.testing.assert_allclose(speed, orbit(epochs[:-1])[:, 3:] * 1e3, rtol=0, atol=1e-8)


def test_linear_states_as_the_general_reader_has_them(tmp_path: Path) -> None:
    random = np.random.default_rng(5)
    epochs = 86400.0 * np.cumsum(random.uniform(0.5, 1.5, 230))
    states = random.normal(size=(230, 6)) * 1e3
    words = state_words(9, epochs, states, 2)
    path = write_kernel(tmp_path / "linear.bsp", [((epochs[0], epochs[-1], -900, 399, 1, 9), words)])
    whole = random.integers(int(epochs[0]) + 1, int(epochs[-1]), 500)
    with SPK.open(path) as kernel:
        theirs = kernel[399, -900].compute_and_differentiate(2451545.0 + whole / DAY_S)
    position, velocity = Ephemeris.open(path).state(-900, (whole, np.zeros(500)), 399)
    # That reader uses Julian dates in one float: 4e-5 s, at 2e3 km per half day 2 mm.
    np.testing.assert_allclose(position, theirs[:3].T * 1e3, rtol=0, atol=0.01)
    np.testing.assert_allclose(velocity, theirs[3:].T * 1e3, rtol=0, atol=0.01)


@pytest.mark.parametrize("change", ["count", "epochs", "nan", "short"])
def test_damaged_states(tmp_path: Path, change: str) -> None:
    words = state_words(13, np.arange(5.0), np.ones((5, 6)), 2)
    if change == "count":
        words[-1] = 6
    elif change == "epochs":
        words[31] = 9.0
    elif change == "nan":
        words[-2] = np.nan
    else:
        words = words[-3:]
    path = write_kernel(tmp_path / "bad.bsp", [((0.0, 4.0, -900, 399, 1, 13), words)])
    with pytest.raises(DataFileError, match="is damaged: its trailer"):
        Ephemeris.open(path)


def test_last_segment_wins_and_a_body_may_change_its_centre(tmp_path: Path) -> None:
    def constant(
        start: float, end: float, target: int, center: int, x_km: float
    ) -> tuple[tuple[float, ...], np.ndarray]:
        coefficients = np.zeros((1, 3, 2))
        coefficients[0, 0, 0] = x_km
        return (start, end, target, center, 1, 2), chebyshev_words(start, end - start, coefficients)

    path = write_kernel(
        tmp_path / "tour.bsp",
        [
            constant(0, 400, 399, 0, 1000.0),
            constant(0, 400, 4, 0, 5000.0),
            constant(0, 300, -900, 399, 7.0),  # near the Earth
            constant(200, 400, -900, 4, 9.0),  # from 200 s on near Mars: last in the file
            constant(50, 100, -900, 399, 8.0),
        ],
    )
    kernel = Ephemeris.open(path)
    whole = np.array([10, 50, 100, 101, 199, 200, 399])
    pair = (whole, np.zeros(whole.size))
    expected = np.array([1007.0, 1008.0, 1008.0, 1007.0, 1007.0, 5009.0, 5009.0])
    np.testing.assert_array_equal(kernel.position(-900, pair)[:, 0], expected * 1e3)
    np.testing.assert_array_equal(kernel.position(399, pair, -900)[:, 0], (1000.0 - expected) * 1e3)
    with pytest.raises(OutOfSpan) as caught:
        kernel.state(-900, (np.array([0, 401]), np.zeros(2)))
    np.testing.assert_array_equal(caught.value.mask, [False, True])


def test_bodies_that_no_segment_joins(tmp_path: Path) -> None:
    words = chebyshev_words(0.0, 100.0, np.ones((1, 3, 4)))
    path = write_kernel(
        tmp_path / "apart.bsp", [((0.0, 100.0, -900, 399, 1, 2), words), ((0.0, 100.0, 4, 0, 1, 2), words)]
    )
    with pytest.raises(MissingPiece, match=r"no chain of segments joins body -900 and barycenter \(0\)"):
        Ephemeris.open(path).position(-900, (np.array(50), np.array(0.0)))


def test_big_endian_kernel(tmp_path: Path) -> None:
    coefficients = np.arange(24.0).reshape(2, 3, 4)
    words = chebyshev_words(0.0, 100.0, coefficients).astype(">f8")
    first = 3 * 128 + 1
    header = struct.pack(
        ">8sII60sIII8s603s28s297s",
        b"DAF/SPK ", 2, 6, b"test", 2, 2, first + words.size, b"BIG-IEEE", b"", jplephem.daf.FTPSTR, b"",
    )  # fmt: skip
    summary = struct.pack(">3d2d6i", 0, 0, 1, 0.0, 200.0, 10, 0, 1, 2, first, first + words.size - 1)
    path = tmp_path / "big.bsp"
    path.write_bytes(header + summary.ljust(1024, b"\0") + b" " * 1024 + words.tobytes())
    # At the middle of a record T0 - T2 are left: c0 - c2.
    np.testing.assert_array_equal(
        Ephemeris.open(path).position(10, (np.array([50, 150]), np.zeros(2))),
        (coefficients[:, :, 0] - coefficients[:, :, 2]) * 1e3,
    )


@given(
    start=st.integers(-(10**11), 10**11),
    step=st.sampled_from([1.0, 0.1, 86400.0, 345600.0, 1e5 / 3]),
    record=st.integers(0, 9),
    place=st.floats(0.0, 1.0),
)
def test_table_places_any_instant(start: int, step: float, record: int, place: float) -> None:
    # A table that is the identity, t - start: wrong records or lost digits would show.
    coefficients = np.zeros((10, 1, 2))
    coefficients[:, 0, 0] = (np.arange(10) + 0.5) * step
    coefficients[:, 0, 1] = step / 2
    table = ChebyshevTable(float(start), step, coefficients)
    since = min((record + place) * step, 10 * step)
    whole = int(np.floor(since))
    value, rate = table.value_and_rate((np.array(start + whole), np.array(min(since - whole, 1 - 2**-53))))
    # The span's end rounds as one float (2e-5 s at 1e11 s), nothing inside it does: 1e-15 of the table's length.
    assert value[0] == pytest.approx(since, abs=1e-15 * 10 * step + 2e-16 * max(1.0, since))
    assert rate[0] == pytest.approx(1.0, abs=1e-15)


def test_table_edges_and_large_tables(monkeypatch: pytest.MonkeyPatch) -> None:
    coefficients = np.random.default_rng(1).normal(size=(40, 3, 9))
    table = ChebyshevTable(-100.0, 10.0, coefficients, "small")
    whole = np.array([-100, -90, -95, 299, 300])
    left = chebyshev.chebval(-1.0, coefficients[0].T)
    np.testing.assert_allclose(table.value((whole, np.zeros(5)))[0], left, rtol=0, atol=1e-14)
    # An inner edge belongs to the record it starts, the very end to the last record.
    np.testing.assert_allclose(
        table.value((whole, np.zeros(5)))[1], chebyshev.chebval(-1.0, coefficients[1].T), rtol=0, atol=1e-14
    )
    np.testing.assert_allclose(
        table.value((whole, np.zeros(5)))[4], chebyshev.chebval(1.0, coefficients[-1].T), rtol=0, atol=1e-14
    )
    random = np.random.default_rng(2)
    pair = (random.integers(-100, 300, 9000), random.random(9000))
    expected = table.value_and_rate(pair)
    monkeypatch.setattr("tscale.ephemeris.chebyshev._COPY_LIMIT_BYTES", 0)
    rows = ChebyshevTable(-100.0, 10.0, coefficients.astype(">f8"), "large").value_and_rate(pair)
    for a, b in zip(expected, rows, strict=True):
        np.testing.assert_array_equal(a, b)
    again = pickle.loads(pickle.dumps(table))
    np.testing.assert_array_equal(again.value(pair), expected[0])


@pytest.mark.parametrize(
    ("start", "step", "shape"),
    [(0.0, 0.0, (1, 1, 1)), (np.nan, 1.0, (1, 1, 1)), (0.0, 1.0, (0, 1, 1)), (0.0, 1.0, (3, 3))],
)
def test_table_refuses_nonsense(start: float, step: float, shape: tuple[int, ...]) -> None:
    with pytest.raises(InvalidInput, match="table: "):
        ChebyshevTable(start, step, np.zeros(shape))


def test_immutable(eph: Ephemeris) -> None:
    fresh = Ephemeris.open(eph.path)
    assert fresh.sha256 == eph.sha256  # found when asked for, all the same
    for name in ("path", "name", "comment", "_gm", "_sha256", "anything"):
        with pytest.raises(AttributeError, match="an Ephemeris is immutable"):
            setattr(fresh, name, None)
    with pytest.raises(TypeError):
        fresh.given_gm_m3_s2[5] = 0.0  # type: ignore[index]


def test_a_table_is_immutable() -> None:
    given = np.ones((4, 1, 3))
    table = ChebyshevTable(0.0, 10.0, given)
    pair = (np.array([5, 15]), np.zeros(2))
    before = table.value(pair)
    given[:] = 7.0
    np.testing.assert_array_equal(table.value(pair), before)
    for name in ("start_s", "step_s", "name", "_rows", "_columns"):
        with pytest.raises(AttributeError, match="a ChebyshevTable is immutable"):
            setattr(table, name, 1.0)
    arrays = [table.coefficients, table._rows, table._columns, pickle.loads(pickle.dumps(table)).coefficients]
    arrays += [cip_table._table().coefficients, cip_table._table()._rows]
    for array in arrays:
        assert array is not None
        with pytest.raises(ValueError, match="read-only"):
            array[0] = 0.0
    # What cannot be written is not copied: the records of a mapped kernel.
    assert ChebyshevTable(0.0, 10.0, table.coefficients).coefficients is table.coefficients


def test_default_is_one_value_for_all_threads() -> None:
    """In a fresh interpreter, with files that take their time."""
    code = (
        "import threading, time\n"
        "from tscale.ephemeris import Ephemeris, TimeEphemeris, kernel, time_ephemeris\n"
        "for module in (kernel, time_ephemeris):\n"
        "    slow = lambda name, whole=module.shipped_path: time.sleep(0.05) or whole(name)\n"
        "    module.shipped_path = slow\n"
        "gate, found = threading.Barrier(16), []\n"
        "def work():\n"
        "    gate.wait()\n"
        "    mine = Ephemeris.default()\n"
        "    found.append((id(mine), id(TimeEphemeris.of(mine))))\n"
        "threads = [threading.Thread(target=work) for _ in range(16)]\n"
        "[t.start() for t in threads], [t.join() for t in threads]\n"
        "assert len(found) == 16 and len(set(found)) == 1, found\n"
    )
    subprocess.run([sys.executable, "-W", "error", "-c", code], check=True, timeout=60)


@pytest.mark.parametrize("words", [(0, 0), (2**29, 6), (-1, 6), (2, 7)])
def test_a_damaged_count_of_descriptor_numbers_is_found_at_once(tmp_path: Path, words: tuple[int, int]) -> None:
    content = bytearray(shipped_path("de440_1960_2060.bsp").read_bytes()[: 1024 * 40])
    content[8:16] = struct.pack("<ii", *words)
    path = tmp_path / "damaged.bsp"
    path.write_bytes(content)
    with pytest.raises(DataFileError, match=r"2 \+ 6"):
        Ephemeris.open(path)
