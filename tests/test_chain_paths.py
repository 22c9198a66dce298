"""Path finding: what a chain does with places, and how it says which piece is missing."""

from __future__ import annotations

import pickle

import numpy as np
import pytest

import tscale
from tscale.errors import InvalidInput, MissingPiece, OutOfSpan, ScaleMismatch

SITE = tscale.Site.from_itrf("test site", 4_051_700.0, 417_300.0, 4_890_200.0)
SOURCE = tscale.Source(83.6, 22.0, name="test source")
T = tscale.Instants.from_iso(["2024-05-01T00:00:00", "2024-05-02T00:00:00.5"], scale="UTC")


@pytest.fixture(scope="module")
def clocks() -> list[tscale.ClockLog]:
    epoch = tscale.Instants.from_iso(["2024-04-20T00:00:00", "2024-05-10T00:00:00"], scale="UTC(KST)")
    maser = tscale.ClockLog.from_rows("maser", epoch, [1e-6, 2e-6], [1e-9, 1e-9])
    epoch = tscale.Instants.from_iso(["2024-04-20T00:00:00", "2024-05-10T00:00:00"], scale="UTC")
    laboratory = tscale.ClockLog.from_rows("UTC(KST)", epoch, [5e-9, -3e-9], [2e-9, 2e-9])
    return [maser, laboratory]


def test_the_whole_path_from_a_clock(clocks: list[tscale.ClockLog]) -> None:
    chain = tscale.chain("CLOCK(maser)", "TDB@BARYCENTER", site=SITE, clocks=clocks, source=SOURCE)
    scales = [part.split("@")[0] for part in str(chain).split(" -> ")]
    assert scales == ["CLOCK(maser)", "UTC(KST)", "UTC", "TAI", "TT", "TCG", "TCB", "TDB", "TDB"]
    readings = tscale.Instants.from_iso(["2024-05-01T00:00:00"], scale="CLOCK(maser)")
    out = chain(readings)
    assert (out.scale, out.place) == ("TDB", "BARYCENTER")
    back = chain.inverse(out)
    assert (back.scale, back.place) == ("CLOCK(maser)", "TOPOCENTER")
    assert abs(back.minus(readings.at("TOPOCENTER"))) < 1e-13
    ledger = chain.ledger(readings)
    # Half-way between the comparisons of 04-20 and 05-10 the maser is 1.55 us and the laboratory 0.6 ns ahead.
    assert ledger["UTC(KST) - CLOCK(maser)"] == pytest.approx(-1.55e-6, abs=1e-9)
    assert ledger["UTC - UTC(KST)"] == pytest.approx(-0.6e-9, abs=1e-11)
    assert "CLOCK(maser)" in ledger.table()
    sigma = chain.uncertainty_s(readings)
    # Both comparisons are known to 1 ns, by errors of their own, of which 9/20 and 11/20 are taken.
    assert sigma["CLOCK(maser)"] == pytest.approx(np.hypot(9, 11) / 20 * 1e-9, rel=1e-9, abs=0)
    assert chain.sigma_s(readings) == pytest.approx(np.sqrt(sum(v**2 for v in sigma.values())), rel=1e-12, abs=0)


def test_places_are_stamped_and_checked() -> None:
    chain = tscale.chain("UTC", "TDB", site=SITE)
    assert chain(T).place == "TOPOCENTER"
    assert tscale.chain("UTC", "TDB@GEOCENTER")(T).place == "GEOCENTER"
    assert tscale.chain("UTC", "TT")(T).place is None
    assert tscale.chain("UTC", "TT")(T.at("GEOCENTER")).place == "GEOCENTER"
    with pytest.raises(ScaleMismatch, match="GEOCENTER"):
        chain(T.at("GEOCENTER"))
    with pytest.raises(ScaleMismatch, match="TAI"):
        chain(tscale.chain("UTC", "TAI")(T))
    with pytest.raises(ScaleMismatch):
        chain.inverse(T)
    with pytest.raises(InvalidInput):
        chain("2024-05-01")  # type: ignore[arg-type]


@pytest.mark.parametrize(
    ("start", "end", "given", "words"),
    [
        ("UTC", "TDB", {}, "site="),
        ("UTC@TOPOCENTER", "TDB", {}, "site="),
        ("UTC", "TDB@BARYCENTER", {"site": SITE}, "source="),
        ("UTC", "TDB@GEOCENTER", {"site": SITE}, "source="),
        ("UTC@TOPOCENTER", "TDB@BARYCENTER", {"source": SOURCE}, "site="),
        ("CLOCK(maser)", "UTC", {}, "clocks="),
        ("UTC", "UTC(KST)", {}, "UTC(KST)"),
        ("TAI", "TT(BIPM23)", {}, "tt_bipm"),
        ("UTC@BARYCENTER", "TDB@BARYCENTER", {}, "barycentre"),
        ("PROPER(quartz)", "TT", {}, "PROPER(quartz)"),
        ("TCL", "TT", {}, "TCL"),
    ],
)
def test_a_missing_piece_is_named(start: str, end: str, given: dict[str, object], words: str) -> None:
    with pytest.raises(MissingPiece) as caught:
        tscale.chain(start, end, **given)  # type: ignore[arg-type]
    assert words in str(caught.value)


@pytest.mark.parametrize("node", ["utc", "TT@MOONBASE", "TT@", "UTC()", "", 5])
def test_unknown_nodes(node: str) -> None:
    with pytest.raises(InvalidInput):
        tscale.chain(node, "TT")


def test_a_wavefront_on_to_the_geocentre_keeps_its_terms_apart() -> None:
    chain = tscale.chain("UTC", "UTC@GEOCENTER", site=SITE, source=SOURCE)
    ledger = chain.ledger(T)
    assert len([name for name in ledger if name.startswith("Roemer delay [")]) == 2
    assert np.max(np.abs(ledger.total)) < 0.022  # the Earth's radius over c
    assert np.max(np.abs(chain(T).minus(T.at("GEOCENTER")) - ledger.total)) < 1e-12


def test_shapes_and_scalars_pass_through() -> None:
    chain = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE)
    grid = tscale.Instants.from_seconds(np.arange(6).reshape(2, 3) * 10**6, 0.5, scale="UTC")
    out, ledger = chain(grid), chain.ledger(grid)
    assert out.shape == (2, 3)
    assert all(value.shape == (2, 3) for value in ledger.values())
    assert chain.rate(grid).shape == (2, 3)
    one = chain(grid[1, 2])
    assert one.shape == ()
    assert one.minus(out[1, 2]) == 0.0
    assert chain.ledger(grid[1, 2]).table().count("\n") > 10
    assert chain(grid[:, :0]).shape == (2, 0)
    with pytest.raises(InvalidInput):
        ledger.table(6)
    with pytest.raises(InvalidInput):
        ledger.exact("no such term")


def test_out_of_span_names_the_table_and_carries_the_mask(clocks: list[tscale.ClockLog]) -> None:
    late = tscale.Instants.from_seconds([0, 3_000_000_000], 0.0, scale="TT")
    for end in ("UT1", "TDB@GEOCENTER"):
        with pytest.raises(OutOfSpan) as caught:
            tscale.chain("TT", end)(late)
        assert caught.value.mask is not None
        assert caught.value.mask.tolist() == [False, True]
    readings = tscale.Instants.from_iso(["2024-05-01T00:00:00", "2025-05-01T00:00:00"], scale="CLOCK(maser)")
    with pytest.raises(OutOfSpan) as caught:
        tscale.chain("CLOCK(maser)", "UTC", clocks=clocks)(readings)
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True]


def test_past_the_end_of_earth_orientation_is_said() -> None:
    chain = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE)
    t = tscale.Instants.from_seconds([0, 1_000_000_000], 0.5, scale="UTC")
    with pytest.warns(tscale.ExtrapolationWarning, match="held"):
        chain(t)
    with pytest.warns(tscale.ExtrapolationWarning):
        notes = chain.notes(t)
    with pytest.warns(tscale.ExtrapolationWarning):
        sigma = chain.uncertainty_s(t)["Earth orientation, UT1"]
    assert any("past the end of the Earth orientation" in note for note in notes)
    assert any("leap-second table" in note for note in notes)
    assert sigma[0] < 1e-9 < sigma[1]
    with pytest.raises(OutOfSpan):
        tscale.chain("UTC", "UT1")(t)


def test_another_tt_realisation(tmp_path: object) -> None:
    table = tscale.TTBIPM.from_rows("TT(BIPM25)", [58479, 58489], [27.6740e-6, 27.6745e-6])
    reference = tscale.ReferenceData.load(tt_bipm=table)
    t = tscale.Instants.from_mjd(58484, 0.0, scale="UTC")
    chain = tscale.chain("UTC", "TT(BIPM25)", reference=reference)
    out = chain(t)
    assert out.scale == "TT(BIPM25)"
    assert float(chain.ledger(t)["TT(BIPM25) - TAI"]) == pytest.approx(32.184 + 27.67425e-6, abs=1e-11)
    assert chain.inverse(out).minus(t) == pytest.approx(0.0, abs=3e-16)


@pytest.mark.parametrize(
    "given",
    [
        {"site": "site.toml"},
        {"clocks": "maser.csv"},
        {"clocks": ["maser.csv"]},
        {"clocks": 5},
        {"source": (83.6, 22.0)},
        {"reference": "today"},
    ],
)
def test_pieces_of_a_wrong_kind(given: dict[str, object], clocks: list[tscale.ClockLog]) -> None:
    with pytest.raises(InvalidInput, match=next(iter(given))):
        tscale.chain("UTC", "TDB", **given)  # type: ignore[arg-type]
    with pytest.raises(InvalidInput, match=r"clocks=\[log\]"):
        tscale.chain("UTC", "TT", clocks=clocks[0])  # type: ignore[arg-type]


def test_a_chain_travels_to_another_process(clocks: list[tscale.ClockLog]) -> None:
    chain = tscale.chain("CLOCK(maser)", "TDB@BARYCENTER", site=SITE, clocks=clocks, source=SOURCE)
    readings = tscale.Instants.from_iso(["2024-05-01T00:00:00"], scale="CLOCK(maser)")
    twin = pickle.loads(pickle.dumps(chain))
    assert str(twin) == str(chain)
    assert (twin(readings) == chain(readings)).all()


def test_uncertainty_of_earth_orientation_at_a_site() -> None:
    # Turning the site by one standard uncertainty of UT1 must move the result by what the budget says, for a place and
    # for a wavefront: 2050, UT1 held, 14 s.
    t = tscale.Instants.from_iso("2050-01-01T05:00:00", scale="TT")
    reference = tscale.ReferenceData.default()
    for end in ("TDB", "TDB@BARYCENTER"):
        chain = tscale.chain("TT", end, site=SITE, source=SOURCE)
        with pytest.warns(tscale.ExtrapolationWarning):
            sigma = chain.uncertainty_s(t)
        with pytest.warns(tscale.ExtrapolationWarning):
            ut1_sigma_s = float(reference.earth_orientation.at(tscale.chain("TT", "TAI")(t).pair).ut1_sigma_s)
        assert 10 < ut1_sigma_s < 20
        turn = 2 * np.pi * 1.00273781191135448 / 86400 * ut1_sigma_s
        x, y, z = SITE.position_m
        c, s = np.cos(turn), np.sin(turn)
        turned = tscale.Site.from_itrf("turned", c * x - s * y, s * x + c * y, z)
        with pytest.warns(tscale.ExtrapolationWarning):
            moved = tscale.chain("TT", end, site=turned, source=SOURCE)(t).minus(chain(t))
        assert sigma["Earth orientation, UT1"] == pytest.approx(abs(float(moved)), rel=0.01)


def test_an_orbit_owes_nothing_to_earth_orientation() -> None:
    # Before the table (1962) and past its end (2027): a geocentric orbit on celestial axes needs neither.
    orbit = tscale.Trajectory.from_kepler(
        tscale.Instants.from_iso("2000-01-01T12:00:00", scale="TT"), 7.0e6, 0.01, 51.0, 10.0, 20.0, 30.0, name="orbit"
    )
    t = tscale.Instants.from_iso(["1961-06-01T00:00:00", "2040-01-01T00:00:00"], scale="TT")
    chain = tscale.chain("TT", "TDB@BARYCENTER", site=orbit, source=SOURCE)
    assert "time ephemeris" in chain.uncertainty_s(t)
    assert not any("orientation" in name for name in chain.uncertainty_s(t))
    assert not any("orientation" in note for note in chain.notes(t))
    assert np.max(np.abs(chain.ledger(t).total)) < 520.0


def test_the_table_of_a_ledger_is_that_of_its_row() -> None:
    ledger = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE).ledger(T)
    for row in (0, 1, -1):
        lines = [line.split() for line in ledger.table(row).splitlines()]
        total = next(words[-1] for words in lines if words[0] == "total")
        roemer = next(words[-1] for words in lines if "Roemer" in words)
        # Printed to 1 fs; as float64 500 s and 70 s are good to 6e-14 s.
        assert float(total) == pytest.approx(ledger.total[row], abs=1e-13)
        assert float(roemer) == pytest.approx(ledger["Roemer delay"][row], abs=1e-13)
    assert abs(ledger["Roemer delay"][0] - ledger["Roemer delay"][1]) > 1.0


def test_long_arrays_are_mapped_in_parts_with_the_same_result() -> None:
    chain = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE)
    n = 150_001  # not a multiple of a part
    t = tscale.Instants.from_seconds(np.linspace(0, 8e8, n).astype(np.int64), 0.5, scale="UTC")
    out = chain(t)
    for at in (0, 16_383, 16_384, n - 1):
        assert out[at].minus(chain(t[at])) == 0.0
    back = chain.inverse(out.reshape(n, 1))
    assert back.shape == (n, 1)
    assert np.max(np.abs(back.ravel().minus(t.at("TOPOCENTER")))) <= 1e-15
    late = tscale.Instants.from_seconds(np.where(np.arange(n) % 70_000 == 69_999, 3_000_000_000, 0), 0.5, scale="TT")
    with pytest.raises(OutOfSpan) as caught:
        tscale.chain("TT", "TDB@GEOCENTER")(late)
    assert caught.value.mask is not None
    assert np.flatnonzero(caught.value.mask).tolist() == [69_999, 139_999]


def test_one_warning_for_a_long_array_with_the_counts_of_all() -> None:
    chain = tscale.chain("UTC", "TDB", site=SITE)
    t = tscale.Instants.from_seconds(np.linspace(0, 1e9, 40_000).astype(np.int64), 0.5, scale="UTC")
    with pytest.warns(tscale.ExtrapolationWarning) as caught:
        chain(t)
    held = int(np.count_nonzero(tscale.EarthOrientation.default().status(tscale.chain("UTC", "TAI")(t).pair) == 2))
    assert [str(w.message).split(" instants")[0] for w in caught] == [f"{held} of 40000"]
    assert caught[0].filename == __file__
    with pytest.warns(tscale.ExtrapolationWarning) as caught:
        tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE)(t[-1:])
    assert len(caught) == 1
