"""Flights: the way between way points, files that are wrong, and the clocks of the flights round the world of 1971."""

from __future__ import annotations

import pickle
from pathlib import Path

import erfa
import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

import tscale
from tscale.earth.geodesy import geocentric_from_geodetic, geodetic_from_geocentric
from tscale.errors import DataFileError, InvalidInput, OutOfSpan

EXAMPLES = Path(__file__).parent.parent / "examples"
C2 = 299792458.0**2
SPIN_RAD_S = 7.292115e-5
HEADER = "instant,lon_deg,lat_deg,height_m"


def written(folder: Path, *rows: str, header: str = HEADER) -> Path:
    path = folder / "flight.csv"
    path.write_text("\n".join([header, *rows]) + "\n", encoding="utf-8")
    return path


def fixed(flight: tscale.Trajectory, tt_s: np.ndarray) -> tuple[np.ndarray, np.ndarray]:
    """ITRS position and velocity at TT counts in float seconds."""
    whole = np.floor(tt_s).astype(np.int64)
    return flight.pieces[0].motion.state((whole, tt_s - whole))


def test_way_points_are_met(tmp_path: Path) -> None:
    rows = (
        "2024-05-01T10:00:00Z,10.5,50.25,300",
        "2024-05-01T10:30:00Z,13,51.5,10000",
        "2024-05-01T12:00:00Z,30,60,9000",
    )
    flight = tscale.Trajectory.from_flight(written(tmp_path, *rows))
    assert flight.name == "flight"
    assert flight.scale == "TT"
    start = tscale.Instants.from_iso("2024-05-01T10:00:00", scale="UTC")
    tt = tscale.chain("UTC@GEOCENTER", "TT@GEOCENTER")(start)
    assert flight.span[0] == float(tt.whole + tt.fraction)
    r, _ = fixed(flight, flight.span[0] + np.array([0.0, 1800.0, 7200.0]))
    # The rounding of a position, 1e-9 m, and what a float64 second in these years moves, 1e-5 m.
    expected = geocentric_from_geodetic([10.5, 13.0, 30.0], [50.25, 51.5, 60.0], [300.0, 1e4, 9e3])
    assert np.abs(r - expected).max() < 1e-4
    _, _, height = geodetic_from_geocentric(fixed(flight, np.linspace(*flight.span, 500))[0])
    assert height.max() == pytest.approx(1e4, rel=0, abs=15.0)  # linear, so never above
    assert height.min() == pytest.approx(300.0, rel=0, abs=1e-3)


def test_velocity_is_the_derivative(tmp_path: Path) -> None:
    rows = ("2024-05-01T10:00:00,170,-60,100", "2024-05-01T16:00:00,-150,-75,12000", "2024-05-01T20:00:00,20,-80,9000")
    flight = tscale.Trajectory.from_flight(written(tmp_path, *rows))
    t = flight.span[0] + np.linspace(100.0, 35_900.0, 400)
    t = t[np.abs(t - flight.span[0] - 21_600.0) > 10.0]
    (later, _), (before, _), (_, v) = fixed(flight, t + 1.0), fixed(flight, t - 1.0), fixed(flight, t)
    # Rounding of dates (1e-7 s) at 300 m/s over 2 s; the third derivative, v^3/R^2, is 1e-6 m/s3.
    assert np.abs((later - before) / 2.0 - v).max() < 5e-5


def test_date_line_and_pole(tmp_path: Path) -> None:
    across = tscale.Trajectory.from_flight(
        written(tmp_path, "2024-05-01T00:00:00,179,10,0", "2024-05-01T01:00:00,-179,10,0")
    )
    r, v = fixed(across, np.linspace(*across.span, 100))
    lon, lat, _ = geodetic_from_geocentric(r)
    assert np.all(np.abs(lon) >= 179.0 - 1e-9)
    assert np.all((lat >= 10.0 - 1e-9) & (lat < 10.01))
    assert np.linalg.norm(v, axis=-1).max() < 65.0  # 2 degrees in an hour, not 358
    polar = tscale.Trajectory.from_flight(
        written(tmp_path, "2024-05-01T00:00:00,30,85,1e4", "2024-05-01T01:20:00,-150,85,1e4")
    )
    r, _ = fixed(polar, np.array([np.mean(polar.span)]))
    assert np.linalg.norm(r[0, :2]) < 1e-2
    assert r[0, 2] == pytest.approx(6356752.3142 + 1e4, rel=0, abs=1e-3)  # b of WGS84


@given(
    ends=st.tuples(*(st.floats(-180, 180), st.floats(-89, 89)) * 2),
    part=st.floats(0.01, 0.99),
)
def test_length_of_a_leg(ends: tuple[float, ...], part: float) -> None:
    """The way against a sphere: within the flattening, and the speed over ground all but constant."""
    from tscale.trajectory.flight import FlightLegs

    lon, lat = np.array(ends[::2]), np.array(ends[1::2])
    apart = erfa.seps(*np.radians([lon[0], lat[0], lon[1], lat[1]]))
    if apart > 3.0:
        return
    legs = FlightLegs((np.array([0, 36_000]), np.zeros(2)), lon, lat, np.zeros(2))
    t = np.linspace(0.0, 36_000.0, 201)
    whole = np.floor(t).astype(np.int64)
    r, v = legs.state((whole, t - whole))
    length = np.sum(np.linalg.norm(np.diff(r, axis=0), axis=-1))
    assert length == pytest.approx(apart * 6.371e6, rel=0.007, abs=1.0)
    speed = np.linalg.norm(v, axis=-1)
    assert np.ptp(speed) <= 0.011 * speed.max() + 1e-9
    assert legs.state((np.array([round(36_000 * part)]), np.zeros(1)))[0].shape == (1, 3)


def test_other_scales_columns_and_a_stop(tmp_path: Path) -> None:
    path = written(
        tmp_path,
        "# taxi",
        "200,x,GPS day,2024-05-01T10:00:00,48.5,11.5",
        "",
        "200,y,,2024-05-01T11:00:00,48.5,11.5",
        header="height_m,seat,note,instant,lat_deg,lon_deg",
    )
    flight = tscale.Trajectory.from_flight(path, scale="GPS")
    tt = tscale.chain("GPS@GEOCENTER", "TT@GEOCENTER")(tscale.Instants.from_iso("2024-05-01T10:00:00", scale="GPS"))
    assert flight.span[0] == pytest.approx(float(tt.whole + tt.fraction), rel=0, abs=1e-6)
    _, v = fixed(flight, np.linspace(*flight.span, 7))
    assert not v.any()


def test_it_is_an_observer(tmp_path: Path, reference: tscale.ReferenceData) -> None:
    rows = ("2024-05-01T10:00:00,10,50,10000", "2024-05-01T11:00:00,20,50,10000")
    flight = tscale.Trajectory.from_flight(written(tmp_path, *rows))
    t = tscale.Instants.from_iso(["2024-05-01T10:00:00", "2024-05-01T10:30:00", "2024-05-01T11:00:00"], scale="UTC")
    chain = tscale.chain("UTC", "TDB", site=flight)
    assert np.abs(chain.inverse(chain(t)).minus(t.at("TOPOCENTER"))).max() <= 1e-15
    tt = tscale.chain("UTC@GEOCENTER", "TT@GEOCENTER")(t)
    _, v = flight.gcrs(tt.pair, reference)
    # 198 m/s over ground eastward upon 299 m/s of the turning Earth at 50 degrees.
    assert np.linalg.norm(v, axis=-1)[1] == pytest.approx(498.0, rel=0.01, abs=1e-9)
    again = pickle.loads(pickle.dumps(flight))
    assert np.array_equal(again.gcrs(tt.pair, reference)[0], flight.gcrs(tt.pair, reference)[0])
    with pytest.raises(OutOfSpan) as caught:
        flight.gcrs((tt.whole + np.array([0, 0, 1]), tt.fraction), reference)
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, False, True]


A, B = "2024-05-01T10:00:00,10,50,0", "2024-05-01T11:00:00,11,50,0"


@pytest.mark.parametrize(
    ("rows", "line", "words"),
    [
        ((A, A), 3, "does not come after"),
        ((B, A), 3, "does not come after"),
        ((A, B, "2024-05-01T10:59:59,12,50,0"), 4, "does not come after"),
        ((A, "2024-05-01T11:00:00,11,91,0"), 3, "lat_deg is '91'; a number from -90 to 90"),
        ((A, "2024-05-01T11:00:00,361,50,0"), 3, "lon_deg is '361'"),
        ((A, "2024-05-01T11:00:00,11,50,200000"), 3, "height_m"),
        ((A, "2024-05-01T11:00:00,11,50,nan"), 3, "height_m is 'nan'"),
        ((A, "2024-05-01T11:00:00,11,50,1_000"), 3, "height_m"),
        ((A, "2024-05-01T11:00:00,11,,0"), 3, "lat_deg is ''"),
        ((A, "2024-05-01T11:00:00,11,50"), 3, "3 cells under a header of 4"),
        ((A, '2024-05-01T11:00:00,"11,50,0'), 3, "not a CSV row"),
        ((A, "2024-05-32T11:00:00,11,50,0"), 3, "instant"),
        ((A, "2024-05-01T10:00:01,-170,-50,0"), 3, "half way round"),
        ((A, "2024-05-01T10:00:01,11,50,0"), 3, "faster than 10 km/s"),
    ],
)
def test_damaged_rows(tmp_path: Path, rows: tuple[str, ...], line: int, words: str) -> None:
    path = written(tmp_path, *rows)
    with pytest.raises(DataFileError, match=words) as caught:
        tscale.Trajectory.from_flight(path)
    assert caught.value.row == line
    assert caught.value.path == path
    assert f"line {line}" in str(caught.value)


def test_heights_in_feet_are_asked_about(tmp_path: Path) -> None:
    rows = "2024-03-01T00:00:00,0,50,{0}", "2024-03-01T02:00:00,10,52,{0}"
    with pytest.raises(tscale.errors.DataFileError, match=r"line 2: height_m is '35000'.*feet\? \(1 ft = 0.3048 m\)"):
        tscale.Trajectory.from_flight(written(tmp_path, *(row.format(35000) for row in rows)))
    with pytest.warns(UserWarning, match=r"2 of 2 way points lie above 16 km.*are these feet\?"):
        tscale.Trajectory.from_flight(written(tmp_path, *(row.format(18000) for row in rows)))
    tscale.Trajectory.from_flight(written(tmp_path, *(row.format(15500) for row in rows)))  # no warning, no error


def test_damaged_files(tmp_path: Path) -> None:
    with pytest.raises(DataFileError, match="cannot read the flight"):
        tscale.Trajectory.from_flight(tmp_path / "none.csv")
    for header, words in (
        ("instant;lon_deg;lat_deg;height_m", "parted by commas"),
        (HEADER + ",lat_deg", "each once, are"),
    ):
        with pytest.raises(DataFileError, match=words) as caught:
            tscale.Trajectory.from_flight(written(tmp_path, A, B, header=header))
        assert caught.value.row == 1
    with pytest.raises(DataFileError, match="holds 1 way points"):
        tscale.Trajectory.from_flight(written(tmp_path, A))
    (tmp_path / "bytes.csv").write_bytes(b"instant,lon_deg\n\xff\xfe,1\n")
    with pytest.raises(DataFileError, match="UTF-8") as caught:
        tscale.Trajectory.from_flight(tmp_path / "bytes.csv")
    assert caught.value.row == 2
    with pytest.raises(InvalidInput, match="path"):
        tscale.Trajectory.from_flight(3)  # type: ignore[arg-type]
    with pytest.raises(InvalidInput, match="near the ground"):
        tscale.Trajectory.from_flight(written(tmp_path, A, B), scale="TDB")


# ---- round the world ------------------------------------------------------------------------------


def gained_ns(name: str) -> tuple[float, float]:
    """Gained on a clock left at sea level by height and by motion, ns, by a plain sum over the flight.

    In the turning frame, to order c^-2: d(tau)/dt = 1 + [g h - v^2/2 - v.(Omega x r)]/c^2 with v over ground (the
    paper's own formula but for its mean latitude), g by the international gravity formula of 1967 with 3.086e-6 /s2 of
    height.
    """
    flight = tscale.Trajectory.from_flight(EXAMPLES / f"flight_{name}.csv")
    step_s = 10.0
    t = np.arange(flight.span[0] + 0.5 * step_s, flight.span[1], step_s)
    r, v = fixed(flight, t)
    _, lat, height = geodetic_from_geocentric(r)
    gravity = 9.780318 * (1.0 + 0.0053024 * np.sin(np.radians(lat)) ** 2) - 0.5 * 3.086e-6 * height
    carried = SPIN_RAD_S * (r[:, 0] * v[:, 1] - r[:, 1] * v[:, 0])
    moving = -(0.5 * np.sum(v * v, axis=-1) + carried)
    return tuple(float(np.sum(part)) * step_s / C2 * 1e9 for part in (gravity * height, moving))  # type: ignore[return-value]


@pytest.mark.parametrize(
    ("name", "hours", "elapsed_h", "height_m", "lat_deg", "speed_m_s"),
    [("east", 41.2, 65.4, 8900.0, 34.0, 243.0), ("west", 48.6, 80.3, 9360.0, 31.0, 218.0)],
)
def test_profiles_follow_what_is_published(
    name: str, hours: float, elapsed_h: float, height_m: float, lat_deg: float, speed_m_s: float
) -> None:
    # Science 177, 166 (1972): hours in the air and in all, mean height, latitude and speed (from memory).
    flight = tscale.Trajectory.from_flight(EXAMPLES / f"flight_{name}.csv")
    t = np.arange(flight.span[0], flight.span[1], 20.0)
    r, v = fixed(flight, t)
    lon, lat, height = geodetic_from_geocentric(r)
    air = height > 1.0
    assert np.sum(air) * 20.0 / 3600.0 == pytest.approx(hours, rel=0, abs=0.1)
    assert (flight.span[1] - flight.span[0]) / 3600.0 == pytest.approx(elapsed_h, rel=0, abs=0.01)
    assert height[air].mean() == pytest.approx(height_m, rel=0.005, abs=1.0)
    assert lat[air].mean() == pytest.approx(lat_deg, rel=0, abs=0.2)
    assert np.linalg.norm(v[air], axis=-1).mean() == pytest.approx(speed_m_s, rel=0.01, abs=0.1)
    turned = np.degrees(np.unwrap(np.radians(lon)))
    assert turned[-1] - turned[0] == pytest.approx(360.0 if name == "east" else -360.0, rel=0, abs=0.5)


@pytest.mark.parametrize(
    ("name", "height", "motion", "net", "measured"),
    [
        ("east", (144.0, 14.0), (-184.0, 18.0), (-40.0, 23.0), (-59.0, 10.0)),
        ("west", (179.0, 18.0), (96.0, 10.0), (275.0, 21.0), (273.0, 7.0)),
    ],
)
def test_round_the_world(
    name: str,
    height: tuple[float, float],
    motion: tuple[float, float],
    net: tuple[float, float],
    measured: tuple[float, float],
) -> None:
    # Science 177, 166 (1972), table: predicted parts and net, with their sigmas, most of which is not knowing the
    # path in full, as here; Science 177, 168 (1972): measured. One sigma each, that
    # of the path included where it is compared with what was measured.
    by_height, by_motion = gained_ns(name)
    assert by_height == pytest.approx(height[0], rel=0, abs=height[1])
    assert by_motion == pytest.approx(motion[0], rel=0, abs=motion[1])
    assert by_height + by_motion == pytest.approx(net[0], rel=0, abs=net[1])
    assert by_height + by_motion == pytest.approx(measured[0], rel=0, abs=float(np.hypot(measured[1], net[1])))
    # The same from the whole theory, against a clock left at sea level: the metric of the GCRS, J2 to J6, tides.
    flight = tscale.Trajectory.from_flight(EXAMPLES / f"flight_{name}.csv")
    home = tscale.Site.from_geodetic("home", -77.0, 38.0, 0.0, height_above_geoid_m=0.0)
    ends = (np.ceil(flight.span[0]), np.floor(flight.span[1]))
    start, stop = (tscale.Instants.from_seconds(int(count), 0.0, scale="TT") for count in ends)
    found = tscale.compare_clocks(flight, home, start, stop)
    assert found.accumulated_s * 1e9 == pytest.approx(net[0], rel=0, abs=net[1])
    # 1 ns: height above the ellipsoid for that above the geoid (to 50 m, 0.8 ns), and 0.1 % of gravity (0.2 ns).
    assert found.accumulated_s * 1e9 == pytest.approx(by_height + by_motion, rel=0, abs=1.0)


def test_example_flights_are_what_their_script_makes(tmp_path: Path) -> None:
    import subprocess
    import sys

    script = tmp_path / "make_flights.py"
    script.write_bytes((EXAMPLES / "make_flights.py").read_bytes())
    root = str(EXAMPLES.parent)
    subprocess.run([sys.executable, str(script)], check=True, capture_output=True, env={"PYTHONPATH": root}, timeout=60)
    for name in ("flight_east.csv", "flight_west.csv"):
        assert (tmp_path / name).read_bytes() == (EXAMPLES / name).read_bytes()
