"""Links that cannot be solved: masks that name all of them, whatever the size of the batch, and arguments refused."""

from __future__ import annotations

import warnings
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import tscale
from tests.link_support import StraightLine
from tscale import Instants, errors
from tscale.link import SurfaceSite, one_way, two_way

SITE = tscale.Site.from_geodetic("Heron Flat", 133.0, -23.0, 500.0)
EPOCH = Instants.from_iso("2024-06-01T00:00:00", scale="UTC")
LOW = tscale.Trajectory.from_kepler(EPOCH, 6.78e6, 0.001, 51.6, 20.0, 0.0, 0.0, name="low orbiter")


def test_hidden_links_of_every_chunk_are_named_at_once(reference: tscale.ReferenceData) -> None:
    # 20000 dates, three chunks: a low orbiter is above the horizon of a site for a few minutes a day.
    t = EPOCH.shifted(np.arange(20000.0).reshape(100, 200) * 60.0)
    given: dict[str, Any] = {"transmitter": LOW, "receiver": SITE, "reference": reference}
    marked = one_way(transmit=t, occultation="ignore", **given)
    with pytest.raises(errors.GeometryError) as caught:
        one_way(transmit=t, **given)
    mask = caught.value.mask
    assert mask is not None
    assert mask.shape == t.shape
    assert np.array_equal(mask, marked.occulted)
    assert f"{mask.sum()} of 20000 links from low orbiter to Heron Flat have no clear path" in str(caught.value)
    assert f"low orbiter is below the horizon of Heron Flat ({mask.sum()})" in str(caught.value)
    clear = one_way(transmit=t[~mask], **given)
    assert clear.range_m.size == 20000 - mask.sum() > 100
    assert not clear.occulted.any()


def test_hidden_legs_of_a_round_trip_are_named_at_once(reference: tscale.ReferenceData) -> None:
    # A minute spent at the orbiter: at the start of a pass only the way up is hidden, at its end only that down.
    t = EPOCH.shifted(np.arange(12000.0) * 20.0)
    given: dict[str, Any] = {"station": SITE, "target": LOW, "turnaround_s": 60.0, "reference": reference}
    for kind in ("transmit", "receive"):
        marked = two_way(occultation="ignore", **{kind: t}, **given)
        up, down = marked.up.occulted, marked.down.occulted
        assert (up & ~down).any()
        assert (down & ~up).any()
        with pytest.raises(errors.GeometryError, match="round trips between Heron Flat and low orbiter") as caught:
            two_way(**{kind: t}, **given)
        assert caught.value.mask is not None
        assert np.array_equal(caught.value.mask, up | down)
        assert f"{(up | down).sum()} of 12000" in str(caught.value)
        assert not two_way(**{kind: t[~caught.value.mask]}, **given).occulted.any()


def test_dates_out_of_span_in_every_chunk(reference: tscale.ReferenceData) -> None:
    first, last = (int(end) for end in reference.ephemeris.span)
    count = np.linspace(first - 3_000_000, last + 3_000_000, 20000).astype(np.int64).reshape(100, 200)
    t = Instants.from_seconds(count, 0.0, scale="TDB")
    for call, ends in ((one_way, ("transmitter", "receiver")), (two_way, ("station", "target"))):
        given: dict[str, Any] = dict(zip(ends, ("venus", "earth"), strict=True), reference=reference, bodies=())
        with pytest.raises(errors.OutOfSpan) as caught:
            call(receive=t, occultation="ignore", **given)
        mask = caught.value.mask
        assert mask is not None
        assert mask.shape == t.shape
        # Light that is met within the span may have left before it: up to 900 s one way, less than one step here.
        assert np.array_equal(mask, (count < first + 1800) | (count > last))
        assert f"{mask.sum()} of 20000 links cannot be solved" in str(caught.value)
        call(receive=t[~mask], occultation="ignore", **given)


def test_trajectory_too_short_for_either_leg(reference: tscale.ReferenceData) -> None:
    t = Instants.from_iso("2027-03-01T00:00:00", scale="TDB").shifted(np.arange(61) * 60.0)
    mars, speed = reference.ephemeris.state("mars", t.pair)
    probe = tscale.Trajectory.from_states(t, mars + np.array([4e7, 0, 0]), speed, frame="BCRS", name="probe")
    sent = t[0].shifted(np.arange(-3000.0, 4000.0, 250.0))
    # 1000 s of turnaround, 350 s of light each way: some dates are too early, some too late, some only for the way
    # back of a signal that was met in time.
    given: dict[str, Any] = {"station": "earth", "target": probe, "turnaround_s": 1000.0, "reference": reference}
    with pytest.raises(errors.OutOfSpan) as caught:
        two_way(transmit=sent, **given)
    mask = caught.value.mask
    assert mask is not None
    good = two_way(transmit=sent[~mask], **given)
    bounce = good.bounce.minus(t[0])
    assert np.all((bounce >= 0.0) & (bounce + 1000.0 <= 3600.0))
    light_s = float(good.up.light_time_s[0])
    # The light time changes by 1e-4 of the time that goes by: 0.5 s in all.
    expected = (np.arange(-3000.0, 4000.0, 250.0) + light_s < 0.0) | (
        np.arange(-3000.0, 4000.0, 250.0) + light_s + 1000.0 > 3600.0
    )
    assert np.array_equal(mask, expected)


def test_errors_of_two_kinds_are_told_apart(reference: tscale.ReferenceData) -> None:
    class Lost:
        name = "lost"

        def state_bcrs(self, tdb: Any, reference: Any) -> Any:
            count = np.asarray(tdb[0], dtype=float)
            if np.any(count < 10):
                raise errors.OutOfSpan("too early", mask=count < 10)
            zero = np.zeros_like(count)
            # From count 20 on it is where the other end is.
            return np.stack([np.where(count < 20, 1e9, 0.0), zero, zero], axis=-1), np.zeros((*count.shape, 3))

    t = Instants.from_seconds(np.arange(30), 0.0, scale="TDB")
    rest = StraightLine("rest", (0.0, 0.0, 0.0), (0.0, 0.0, 0.0))
    with pytest.raises(errors.OutOfSpan, match="10 more links cannot be solved for another reason") as caught:
        one_way(transmit=t, transmitter=Lost(), receiver=rest, reference=reference, bodies=())
    assert caught.value.mask is not None
    assert np.array_equal(caught.value.mask, t.whole < 10)


# ---- the ground ------------------------------------------------------------------------------------


def test_masts_see_each_other_over_the_dip(reference: tscale.ReferenceData) -> None:
    # 1.1 km apart, each is 0.005 degrees below the other's horizontal, and the line passes 100 m above the ground.
    # Masts of h reach 2 sqrt(2 R h) = 71 km for 100 m (R = 6.371e6 m): they see each other at 60 km, but not at 80 km.
    near = tscale.Site.from_geodetic("Near Mast", 12.0, 48.0, 100.0)
    for degrees, clear in ((0.01, True), (0.54, True), (0.72, False)):
        far = tscale.Site.from_geodetic("Far Mast", 12.0, 48.0 + degrees, 100.0)
        found = two_way(transmit=EPOCH, station=near, target=far, reference=reference, occultation="ignore")
        for leg in (found.up, found.down):
            assert leg.transmit_elevation_deg is not None
            assert float(leg.transmit_elevation_deg) == pytest.approx(-0.5 * degrees, abs=0.002)
            assert bool(leg.occulted) is not clear
    low = [tscale.Site.from_geodetic("Low", 12.0, lat, 0.0) for lat in (48.0, 48.01)]
    assert one_way(
        transmit=EPOCH, transmitter=low[0], receiver=low[1], reference=reference, occultation="ignore"
    ).occulted


@pytest.mark.parametrize(("height_m", "dip_deg"), [(4180.0, 2.07), (0.0, 0.0), (-400.0, 0.0)])
@pytest.mark.parametrize("target", ["venus", "low"])
def test_dip_of_the_horizon(height_m: float, dip_deg: float, target: str, reference: tscale.ReferenceData) -> None:
    # acos(R / (R + h)) = 2.07 degrees for 4180 m, R = 6.371e6 m; the radius of curvature there differs from R by 0.3 %.
    site = tscale.Site.from_geodetic("Cinder Top", -155.5, 19.8, height_m)
    t = EPOCH.shifted(np.arange(2880.0) * 30.0)
    end = LOW if target == "low" else target
    found = one_way(receive=t, transmitter=end, receiver=site, reference=reference, occultation="ignore")
    height = found.receive_elevation_deg
    assert height is not None
    assert height.min() < -30.0 < 30.0 < height.max()
    assert not found.occulted[height > -dip_deg + 0.005].any()
    assert found.occulted[height < -dip_deg - 0.005].all()
    if height_m > 0.0:
        assert (height[~found.occulted] < -0.3).any()


def test_dip_on_the_moon(reference: tscale.ReferenceData) -> None:
    # From 5 km above the sphere of 1737.4 km: acos(1737.4 / 1742.4) = 4.34 degrees.
    lander = SurfaceSite("Basalt Step", "moon", 93.0, 0.0, 5000.0)
    t = Instants.from_iso("2024-03-01T00:00:00", scale="TDB").shifted(np.arange(30 * 24 * 4) * 900.0)
    found = one_way(transmit=t, transmitter=lander, receiver="earth", reference=reference, occultation="ignore")
    height = found.transmit_elevation_deg
    assert height is not None
    assert found.occulted.any()
    lowest, highest_hidden = height[~found.occulted].min(), height[found.occulted].max()
    # The libration moves the Earth by 1.5 degrees a day at most: 0.016 in a step of a quarter of an hour.
    assert lowest == pytest.approx(-4.34, abs=0.02)
    assert highest_hidden == pytest.approx(-4.34, abs=0.02)


def test_the_body_under_the_feet_is_in_the_way(reference: tscale.ReferenceData) -> None:
    for height_m in (5000.0, 0.0, -400.0):
        site = tscale.Site.from_geodetic("Cinder Top", -155.5, 19.8, height_m)
        assert one_way(
            transmit=EPOCH, transmitter=site, receiver="earth", reference=reference, occultation="ignore"
        ).occulted
    # A line that climbs out of a depression at 5 degrees.
    deep = tscale.Site.from_geodetic("Salt Pan", 35.5, 31.5, -430.0)
    rim = tscale.Site.from_geodetic("Rim", 35.5, 31.54, 0.0)
    for ends in ((deep, rim), (rim, deep)):
        found = one_way(transmit=EPOCH, transmitter=ends[0], receiver=ends[1], reference=reference)
        assert not found.occulted


# ---- notes -----------------------------------------------------------------------------------------


def test_notes_say_what_is_predicted_held_or_expired(reference: tscale.ReferenceData) -> None:
    # The second date is among the predicted rows; the table ends, and leap seconds expire, before the third.
    table = reference.earth_orientation
    predicted = int(table.mjd[-1]) - 10
    t = Instants.from_mjd([58849, predicted, predicted + 3000], 0.0, scale="TAI")
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", tscale.ExtrapolationWarning)
        utc = Instants.from_mjd([58849, predicted, predicted + 3000], 0.0, scale="UTC")
        found = one_way(transmit=t, transmitter=SITE, receiver="moon", reference=reference, occultation="ignore")
        trip = two_way(receive=utc, station=SITE, target="moon", reference=reference, occultation="ignore")
    held = "1 of 3 instants are past the end of the Earth orientation, which is held"
    assert found.notes == ("1 of 3 instants use predicted Earth orientation", held)
    assert "note: " not in found.table(0)
    assert "predicted" in found.table(1)
    assert "held" in found.table(-1)
    assert set(trip.notes) >= set(found.notes)
    expired = int(reference.leap_seconds.is_expired(utc.pair).sum())
    assert expired
    assert f"{expired} of 3 instants are past the expiry of the leap-second table" in trip.notes[0] + trip.notes[-1]


def test_no_notes_without_the_turning_earth(reference: tscale.ReferenceData) -> None:
    t = Instants.from_iso("2045-01-01T00:00:00", scale="TDB")
    orbiter = tscale.Trajectory.from_kepler(t, 7.2e6, 0.1, 63.0, 40.0, 120.0, 10.0, center="mars", name="Lantern")
    for end in ("earth", orbiter, SurfaceSite("Basalt Step", "moon", 5.0, 10.0)):
        found = one_way(transmit=t, transmitter=end, receiver="venus", reference=reference, occultation="ignore")
        assert found.notes == ()


# ---- arguments -------------------------------------------------------------------------------------

LOG = tscale.ClockLog.from_rows("maser", EPOCH.shifted([0.0, 86400.0]), [0.0, 0.0])


@pytest.mark.parametrize(
    ("wrong", "words"),
    [
        ({"clocks": 5}, "list of ClockLog, got 5"),
        ({"clocks": "maser.csv"}, r"ClockLog\.load"),
        ({"clocks": ["maser.csv"]}, "one is 'maser.csv'"),
        ({"clocks": LOG}, r"clocks=\[log\]"),
        ({"bodies": None}, r"\(\) for none"),
        ({"bodies": 10}, "sequence"),
        ({"bodies": [3.5]}, "NAIF number"),
        ({"bodies": [3]}, "give earth and moon"),
        ({"bodies": [3, 399]}, "give earth and moon"),
        ({"bodies": ["earth-moon barycenter", "moon"]}, "give earth and moon"),
        ({"tolerance_s": "x"}, "tolerance_s"),
        ({"tolerance_s": np.array([1e-9, 1e-9])}, "tolerance_s must be one number"),
        ({"tolerance_s": float("nan")}, "tolerance_s"),
        ({"max_iterations": "8"}, "max_iterations"),
        ({"max_iterations": 3.5}, "max_iterations"),
        ({"second_order": "no"}, "second_order must be True or False"),
        ({"occultation": np.array(["error", "ignore"])}, "occultation"),
    ],
)
def test_wrong_options_are_refused(wrong: dict[str, Any], words: str) -> None:
    with pytest.raises(errors.InvalidInput, match=words):
        one_way(transmit=EPOCH, transmitter="earth", receiver="mars", **wrong)
    with pytest.raises(errors.InvalidInput, match=words):
        two_way(transmit=EPOCH, station="earth", target="mars", **wrong)


def test_options_of_other_libraries_types(reference: tscale.ReferenceData) -> None:
    t = Instants.from_iso("2024-06-01T12:00:00", scale="TDB")
    plain = one_way(transmit=t, transmitter="earth", receiver="mars", reference=reference)
    given: Any = {
        "max_iterations": np.int32(8),
        "tolerance_s": np.float64(1e-12),
        "second_order": np.bool_(True),
        "clocks": (log for log in (LOG,)),
        "bodies": iter((10, 1, 2, 399, 301, 4, 5, 6, 7, 8, 9)),
    }
    again = one_way(transmit=t, transmitter="earth", receiver="mars", reference=reference, **given)
    assert float(again.light_time_s) == float(plain.light_time_s)
    assert again.transmit_on("CLOCK(maser)").scale == "CLOCK(maser)"


@pytest.mark.parametrize("turnaround", ["a", "1.5", None, [1.0, [2.0]], 1j, True])
def test_wrong_turnarounds_are_refused(turnaround: Any) -> None:
    with pytest.raises(errors.InvalidInput, match="turnaround_s"):
        two_way(transmit=EPOCH, station="earth", target="moon", turnaround_s=turnaround)


@pytest.mark.parametrize("row", ["x", 1.5, None, True])
def test_wrong_rows_are_refused(row: Any, reference: tscale.ReferenceData) -> None:
    found = one_way(transmit=EPOCH, transmitter="earth", receiver="moon", reference=reference)
    with pytest.raises(errors.InvalidInput, match="row is a whole number"):
        found.table(row)


@pytest.mark.parametrize("count", ["x", 5, None, (1,), (0.5, 0.5), ("a", "b"), (np.zeros(2, dtype=int), np.zeros(3))])
def test_wrong_counts_for_a_surface_site(count: Any, reference: tscale.ReferenceData) -> None:
    site = SurfaceSite("Basalt Step", "moon", 5.0, 10.0)
    for call in (site.offset, site.up, site.pole, lambda tdb: site.state_bcrs(tdb, reference)):
        with pytest.raises(errors.InvalidInput, match="pair"):
            call(count)


@pytest.mark.parametrize("path", [None, 5, {"name": "a"}])
def test_wrong_paths_of_a_surface_site(path: Any) -> None:
    with pytest.raises(errors.InvalidInput, match="path of a TOML file"):
        SurfaceSite.load(path)


@pytest.mark.parametrize(
    ("state", "words"),
    [
        ((None, None), "no finite position"),
        (None, "two float arrays"),
        (("x", "y"), "two float arrays"),
        ((np.zeros(3),), "two float arrays"),
        ((np.zeros(2), np.zeros(2)), "two float arrays"),
        ((np.full(3, np.nan), np.zeros(3)), "no finite position"),
    ],
)
def test_ends_that_know_no_place(state: Any, words: str, reference: tscale.ReferenceData) -> None:
    class Vague:
        name = "vague"

        def state_bcrs(self, tdb: Any, tables: Any) -> Any:
            return state

    t = Instants.from_iso(["2024-06-01T00:00:00"] * 2, scale="TDB")
    with pytest.raises(errors.InvalidInput, match=f"state_bcrs of vague .*{words}"):
        one_way(transmit=t, transmitter=Vague(), receiver="earth", reference=reference)


def test_arrays_of_a_solution_are_read_only(reference: tscale.ReferenceData, tmp_path: Path) -> None:
    import pickle

    t = EPOCH.shifted(np.arange(3.0) * 60.0)
    wait = np.array([1.0, 2.0, 3.0])
    trip = two_way(
        transmit=t, station=SITE, target="moon", turnaround_s=wait, reference=reference, occultation="ignore"
    )
    for found in (trip, pickle.loads(pickle.dumps(trip))):
        leg = found.up
        arrays = [leg.range_m, leg.range_rate_m_s, leg.light_time_rate, leg.transmit_elevation_deg, leg.occulted]
        for array in [*arrays, *leg.ledger.values(), found.turnaround_s]:
            with pytest.raises(ValueError, match="read-only"):
                array[0] = 0
    wait[:] = 9.0
    assert trip.turnaround_s.tolist() == [1.0, 2.0, 3.0]


def test_two_ends_of_one_name_keep_both_horizons() -> None:
    ground = tscale.Site.from_geodetic("base", lon_deg=12.3, lat_deg=-33.0, height_m=900.0)
    t = tscale.Instants.from_seconds(600_000_000 + 3600 * np.arange(48), 0.0, scale="TDB")
    hidden = [
        tscale.link.one_way(
            transmitter=ground,
            receiver=tscale.SurfaceSite(name, "moon", 10.0, 20.0, 100.0),
            transmit=t,
            occultation="ignore",
        ).occulted
        for name in ("base", "other")
    ]
    assert hidden[0].sum() > 10
    assert (hidden[0] == hidden[1]).all()


def test_ends_nearer_than_the_rounding_of_their_places_are_one_point() -> None:
    t = tscale.Instants.from_iso("2024-03-01T00:00:00", scale="TDB")
    near = tscale.Site.from_itrf("near", 4e6, 1e6, 4.8e6)
    for distance_m in (0.0, 1e-9, 1e-5, 1e-4):
        other = tscale.Site.from_itrf("other", 4e6 + distance_m, 1e6, 4.8e6)
        with pytest.raises(tscale.errors.GeometryError, match="same point"):
            tscale.link.one_way(transmitter=near, receiver=other, transmit=t, occultation="ignore")
    other = tscale.Site.from_itrf("other", 4e6 + 1.0, 1e6, 4.8e6)
    found = tscale.link.one_way(transmitter=near, receiver=other, transmit=t, occultation="ignore")
    assert np.isfinite(found.light_time_rate)


def test_a_long_batch_warns_once() -> None:
    ground = tscale.Site.from_geodetic("ground", lon_deg=12.3, lat_deg=-33.0, height_m=900.0)
    t = tscale.Instants.from_seconds(np.linspace(890_000_000, 900_000_000, 20_000).astype(np.int64), 0.0, scale="TDB")
    with pytest.warns(tscale.ExtrapolationWarning) as caught:
        tscale.link.one_way(transmitter=ground, receiver="mars", transmit=t, occultation="ignore")
    assert [str(w.message).split(" instants")[0] for w in caught] == ["20000 of 20000"]
