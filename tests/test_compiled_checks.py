"""The comparison that a certificate rests on: it rejects what is off, also where no fit and no piece has a date."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

import tscale
from tscale import exact
from tscale.compiled import build
from tscale.compiled.checks import check_pieces
from tscale.compiled.direct import Direct
from tscale.compiled.hints import hints_inside
from tscale.compiled.piece_table import PieceTable
from tscale.errors import NotConverged, TscaleError
from tscale.trajectory.pieces import Piece, SegmentMotion

START = tscale.Instants.from_iso("2020-01-03T00:00:00", scale="TT")
SOURCE = tscale.Source(0.0, 0.0)
HOUR_S, DAY_S = 3600.0, 86400.0
TOLERANCE_S = 1e-13


def shifted(table: PieceTable, piece: int, power: int, by: float) -> PieceTable:
    """A table with one coefficient changed."""
    powers = table.powers.copy()
    powers[power, piece] += by
    parts = (table.start_whole, table.start_fraction, table.center, table.shift_s, powers)
    return PieceTable(*parts, table.origin, table.cell_s)


@pytest.fixture(scope="module")
def made() -> tuple[Direct, PieceTable, list[tuple[int, float]]]:
    """One direction of a chain, its polynomials, and the ends of its span."""
    chain = tscale.chain("TT", "TDB", site=tscale.Site.from_itrf("north", 1_200_000.0, -4_600_000.0, 4_230_000.0))
    compiled = chain.compile("2020-01-01", "2020-01-09", tolerance_s=TOLERANCE_S)
    ends = [(int(end.whole), float(end.fraction)) for end in compiled.span]
    return Direct(chain, onward=True), compiled._tables[0], ends


@pytest.mark.parametrize("power", [0, 1, 3])
def test_one_coefficient_that_is_off_is_found(made: tuple, power: int) -> None:
    direct, table, ends = made
    good, none = check_pieces(direct, table, 1e-16, TOLERANCE_S, ends)
    assert none.size == 0
    assert good.max_error_s <= TOLERANCE_S
    for piece in (1, 5, len(table.center) - 2):
        start, stop = table.start_whole[piece : piece + 2]
        # By two tolerances at the ends of the piece.
        by = 2.0 * TOLERANCE_S / (0.5 * float(stop - start)) ** power
        check, bad = check_pieces(direct, shifted(table, piece, power, by), 1e-16, TOLERANCE_S, ends)
        assert bad.tolist() == [piece]
        assert check.max_error_s == pytest.approx(2.0 * TOLERANCE_S, rel=0.1, abs=0.0)
        assert start <= check.at[0] <= stop


def test_half_a_tolerance_is_let_pass(made: tuple) -> None:
    direct, table, ends = made
    check, bad = check_pieces(direct, shifted(table, 3, 0, 0.5 * TOLERANCE_S), 1e-16, TOLERANCE_S, ends)
    assert bad.size == 0
    assert 0.45 * TOLERANCE_S < check.max_error_s < 0.6 * TOLERANCE_S


class Bumped:
    """A direction that maps counts to themselves, but for a bump between two dates."""

    def __init__(self, start_s: float, length_s: float, size_s: float) -> None:
        self.start_s, self.length_s, self.size_s = start_s, length_s, size_s

    def __call__(self, at: tuple[np.ndarray, np.ndarray]) -> tuple[np.ndarray, np.ndarray]:
        part = (at[0] + at[1] - self.start_s) / self.length_s
        bump = self.size_s * np.sin(np.pi * np.clip(part, 0.0, 1.0)) ** 2
        return exact.add_seconds(at, bump)


@pytest.mark.parametrize(("size", "found"), [(0.9, False), (1.1, True), (2.0, True), (1e6, True)])
def test_a_bump_between_any_two_bends_is_found(size: float, found: bool) -> None:
    # One polynomial over a day, and bends a quarter of an hour apart: its own two dates see at most one of 96 bumps.
    whole, zeros = np.array([-(2**62), 0, 86_400]), np.zeros(3, dtype=np.int64)
    table = PieceTable(whole, np.zeros(3), zeros, zeros, np.array([[np.nan, 0.0, np.nan]]), 0, 86_400)
    marks = [(900 * k, 0.0) for k in range(97)]
    for k in range(96):
        direct: Any = Bumped(900.0 * k, 900.0, size * TOLERANCE_S)
        check, bad = check_pieces(direct, table, 1e-16, TOLERANCE_S, marks)
        assert bad.tolist() == ([1] if found else [])
        assert check.sites >= 2 + 2 * 96
        assert 0.85 * size * TOLERANCE_S < check.max_error_s < 1.01 * size * TOLERANCE_S + 3e-16


def test_what_is_off_is_fitted_again_or_refused(made: tuple, monkeypatch: pytest.MonkeyPatch) -> None:
    chain = made[0].chain
    cut = build.pieces_of_fits
    spoiled: list[int] = []

    def spoil(fits: object, origin: int, tolerance_s: float) -> tuple[PieceTable, np.ndarray]:
        table, parents = cut(fits, origin, tolerance_s)  # type: ignore[arg-type]
        spoiled.append(len(spoiled))
        if len(spoiled) % 2 or always:
            table = shifted(table, 1, 0, 2.0 * tolerance_s)
        return table, parents

    monkeypatch.setattr(build, "pieces_of_fits", spoil)
    always = False
    compiled = chain.compile("2020-01-01", "2020-01-09", tolerance_s=TOLERANCE_S)
    assert len(spoiled) == 4  # each direction twice
    t = compiled.span[:1].shifted(np.linspace(0.0, HOUR_S, 500))
    assert np.max(np.abs(compiled(t).minus(chain(t)))) <= TOLERANCE_S
    always = True
    with pytest.raises(NotConverged, match=r"cannot be certified to 1e-13 s: it is off by 2\.?[0-9]*e-13 s at"):
        chain.compile("2020-01-01", "2020-01-09", tolerance_s=TOLERANCE_S)


# ---- motion that is shorter than the distance between the dates of a fit ---------------------------


def excursion(
    at_s: float, length_s: float, size_m: float, *, shape: str = "bump", count: int = 25, step_s: float = HOUR_S,
    degree: int = 3, frame: str = "GCRS", days: float = 2.0,
) -> tscale.Trajectory:  # fmt: skip
    """A body at rest, with a state every hour, that goes off and comes back within `count` more states."""
    dense = np.linspace(at_s, at_s + length_s, count)
    knot_s = np.unique(np.concatenate([np.arange(-20 * step_s, days * DAY_S + 20 * step_s, step_s), dense]))
    knot_s = knot_s[np.append(True, np.diff(knot_s) > 1e-2)]
    inside = (knot_s > at_s) & (knot_s < at_s + length_s)
    phase = np.pi * (knot_s[inside] - at_s) / length_s
    x, v = np.zeros(len(knot_s)), np.zeros(len(knot_s))
    if shape == "bump":
        x[inside], v[inside] = size_m * np.sin(phase) ** 2, size_m * np.pi / length_s * np.sin(2.0 * phase)
    elif shape == "zigzag":
        x[inside] = size_m * (-1.0) ** np.arange(np.count_nonzero(inside))
    else:
        v[inside] = size_m / length_s
    nothing = np.zeros(len(knot_s))
    r = np.stack([6.5e6 + x, nothing, nothing], axis=-1)
    rate = np.stack([v, nothing, nothing], axis=-1)
    return tscale.Trajectory.from_states(START.shifted(knot_s), r, rate, frame=frame, degree=degree, name="probe")


def worst_s(chain: tscale.Chain, compiled: tscale.CompiledChain, at_s: float, length_s: float, days: float) -> float:
    """Largest error in both directions, with most of the dates where the body goes off."""
    x = np.concatenate([np.linspace(0.0, days * DAY_S, 2000), at_s + length_s * np.linspace(-0.5, 1.5, 3000)])
    x = np.clip(x, 1e-6, days * DAY_S - 1e-6)
    t = compiled.span[:1].shifted(x)
    u = compiled.inverse_span[:1].shifted(x)
    u = u[u <= compiled.inverse_span[1]]
    onward = np.max(np.abs(compiled(t).minus(chain(t))))
    return float(max(onward, np.max(np.abs(compiled.inverse(u).minus(chain.inverse(u))))))


@pytest.mark.parametrize(
    ("end", "at_h", "tolerance_s"),
    [("TDB@BARYCENTER", 11.01, 1e-13), ("TDB@BARYCENTER", 30.2, 1e-9), ("TDB", 20.2, 1e-14), ("TDB", 9.9, 1e-13)],
)
def test_an_excursion_of_half_a_minute_is_seen(end: str, at_h: float, tolerance_s: float) -> None:
    # 10 km are 33 us of light time, and 1e-9 s or so of TDB at the body: all between two dates of any fit over days.
    orbit = excursion(at_h * HOUR_S, 30.0, 1e4)
    source = SOURCE if "BARY" in end else None
    chain = tscale.chain("TT", end, site=orbit, source=source)
    compiled = chain.compile(START, START.shifted(2.0 * DAY_S), tolerance_s=tolerance_s)
    assert compiled.certificate.max_error_s <= tolerance_s
    assert worst_s(chain, compiled, at_h * HOUR_S, 30.0, 2.0) <= tolerance_s


@pytest.mark.parametrize(
    ("at_s", "length_s", "size_m"), [(1e-3, 20.0, 1e4), (2.0, 0.2, 30.0), (4.0, 0.3, 30.0), (200.0, 20.0, 1e4)]
)
def test_an_excursion_beside_the_end_of_the_span_is_fitted(at_s: float, length_s: float, size_m: float) -> None:
    chain = tscale.chain("TT", "TDB@BARYCENTER", site=excursion(at_s, length_s, size_m, count=9), source=SOURCE)
    compiled = chain.compile(START, START.shifted(2.0 * DAY_S), tolerance_s=1e-12)
    assert worst_s(chain, compiled, at_s, length_s, 2.0) <= 1e-12


@given(
    days=st.floats(0.3, 4.0),
    at=st.floats(0.0, 1.0),
    length_s=st.floats(0.5, 2000.0),
    size=st.floats(-2.0, 4.0),
    shape=st.sampled_from(["bump", "zigzag", "rate"]),
    count=st.integers(3, 25),
    step_s=st.sampled_from([600.0, 3600.0, 10_800.0]),
    degree=st.sampled_from([3, 5]),
    frame=st.sampled_from(["GCRS", "ITRS"]),
    end=st.sampled_from(["TDB", "TDB@BARYCENTER"]),
    exponent=st.floats(0.0, 6.0),
)
@settings(max_examples=12)
def test_trajectories_through_states_at_random(
    days: float, at: float, length_s: float, size: float, shape: str, count: int, step_s: float, degree: int,
    frame: str, end: str, exponent: float,
) -> None:  # fmt: skip
    at_s = at * max(0.0, days * DAY_S - length_s)
    size_m = 10.0**size * min(1.0, length_s / 10.0)
    orbit = excursion(
        at_s, length_s, size_m, shape=shape, count=count, step_s=step_s, degree=degree, frame=frame, days=days
    )
    tolerance_s = (1e-15 if end == "TDB" else 1e-13) * 10.0**exponent
    chain = tscale.chain("TT", end, site=orbit, source=SOURCE if end != "TDB" else None)
    try:
        chain(START.shifted(np.linspace(0.0, days * DAY_S, 5000)))
        compiled = chain.compile(START, START.shifted(days * DAY_S), tolerance_s=tolerance_s)
    except TscaleError as error:
        # Polynomials of degree 5 through states so unequal may lead into the Earth, where no time scale reaches.
        if "do not reach" not in str(error):
            raise
        return
    # Single values of the chain scatter by its own rounding.
    assert worst_s(chain, compiled, at_s, length_s, days) <= tolerance_s + 4.0 * compiled.certificate.noise_s


# ---- dates that segments of a kernel tell ----------------------------------------------------------


class Segment:
    """What is known of a segment of a spacecraft kernel, and nothing else."""

    def __init__(self, target: int, center: int, epochs: np.ndarray | None, window: int = 4) -> None:
        self.target, self.center = target, center
        self.start_s, self.end_s = 0.0, 1000.0
        self.grid = (0.0, 250.0) if epochs is None else None
        if epochs is not None:
            self._epochs, self._window = epochs, window

    def evaluate(self, whole: np.ndarray, fraction: np.ndarray, rate: bool, located: object) -> tuple:
        nothing = np.zeros((3, whole.size))
        return nothing + 7e3, nothing


@pytest.mark.parametrize(
    ("epochs", "window", "want"),
    [
        (np.array([0.0, 100.5, 300.0, 700.0, 1000.0]), 4, [100.5, 300.0, 700.0]),
        (np.array([0.0, 100.0, 300.0, 700.0, 1000.0]), 5, [50.0, 100.0, 200.0, 300.0, 500.0, 700.0, 850.0]),
        (None, 0, [250.0, 500.0, 750.0]),
    ],
)
def test_segments_tell_where_their_polynomials_meet(epochs: np.ndarray | None, window: int, want: list[float]) -> None:
    class Kernel:
        sha256, name = "0" * 64, "made up"

        class _paths:  # noqa: N801
            _by_target: dict[int, list[Segment]] = {}  # noqa: RUF012

    motion = SegmentMotion(Segment(-900, 399, epochs, window), Kernel(), 399)  # type: ignore[arg-type]
    ends = (np.asarray(0), np.asarray(0.0)), (np.asarray(1000), np.asarray(0.0))
    orbit = tscale.Trajectory("made up", "TDB", False, (Piece(motion, 399, "ICRF", *ends),))  # type: ignore[arg-type]
    chain = tscale.chain("TDB", "TT", site=orbit)
    found = hints_inside(Direct(chain, onward=True), (0, 0.0), (1000, 0.0), 1e-10)
    assert (found.at[0] + found.at[1]).tolist() == want
