"""Dates of a link's events on every scale, and the arguments that are refused."""

from __future__ import annotations

import pickle
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import tscale
from tests.link_support import StraightLine
from tscale import Instants, errors
from tscale.link import one_way, two_way

SITE = tscale.Site.from_geodetic("Heron Flat", 133.0, -23.0, 500.0)
DATE = "2024-05-05T06:00:00.25"


def unhindered(**given: Any) -> tscale.link.LinkSolution:
    return one_way(occultation="ignore", **given)


@pytest.mark.parametrize("scale", ["UTC", "TAI", "TT", "GPS", "GST", "BDT", "GLONASS", "UT1", "TCG", "TCB", "TDB"])
def test_every_scale_at_a_site(scale: str, reference: tscale.ReferenceData) -> None:
    t = Instants.from_iso([DATE, "2016-12-31T23:59:59.5"], scale=scale)
    found = unhindered(receive=t, transmitter="mars", receiver=SITE, reference=reference)
    assert np.max(np.abs(found.receive_on(scale).minus(t.at("TOPOCENTER")))) < 2e-15
    # The chain says the same of TDB at the site; it goes the same way, so rounding is all.
    expected = tscale.chain(scale, "TDB@TOPOCENTER", site=SITE, reference=reference)(t)
    assert np.max(np.abs(found.receive.minus(expected))) < 2e-15


def test_clock_and_laboratory(reference: tscale.ReferenceData, tmp_path: Path) -> None:
    path = tmp_path / "maser.csv"
    path.write_text(
        "epoch,offset_s,uncertainty_s,reference,clock\n"
        "2024-05-01T00:00:00,0.000001,1e-9,UTC,CLOCK(maser)\n"
        "2024-05-09T00:00:00,0.000003,1e-9,UTC,CLOCK(maser)\n"
    )
    log = tscale.ClockLog.load(path)
    t = Instants.from_iso(DATE, scale="CLOCK(maser)")
    found = one_way(
        transmit=t, transmitter=SITE, receiver="moon", reference=reference, clocks=[log], occultation="ignore"
    )
    assert abs(float(found.transmit_on("CLOCK(maser)").minus(t.at("TOPOCENTER")))) < 2e-15
    utc = tscale.transforms.terrestrial.clock_to_reference(t, log)
    plain = unhindered(transmit=utc, transmitter=SITE, receiver="moon", reference=reference)
    assert abs(float(plain.transmit.minus(found.transmit))) < 2e-15
    with pytest.raises(errors.MissingPiece, match=r"CLOCK\(maser\)"):
        unhindered(transmit=t, transmitter=SITE, receiver="moon", reference=reference)
    with pytest.raises(errors.MissingPiece, match=r"UTC\(KRL\)"):
        plain.transmit_on("UTC(KRL)")
    with pytest.raises(errors.MissingPiece, match="BIPM23"):
        plain.transmit_on("TT(BIPM23)")


def test_geocentre_and_moon_on_tt(reference: tscale.ReferenceData) -> None:
    t = Instants.from_iso(DATE, scale="TT")
    found = one_way(transmit=t, transmitter="earth", receiver="moon", reference=reference)
    assert np.array_equal(found.transmit.pair, tscale.transforms.barycentric.tdb_from_tt(t.pair, reference))
    # At the Moon TT of an event differs from the geocentre's by V.r/c^2, up to 128 us (own calculation).
    late = found.receive_on("TT").minus(
        Instants(*tscale.transforms.barycentric.tt_from_tdb(found.receive.pair, reference), "TT", "SELENOCENTER")
    )
    line = reference.ephemeris.position("moon", found.receive.pair, center="earth")
    velocity = reference.ephemeris.state("earth", found.receive.pair)[1]
    # c^-4 terms and the scale of lengths: 1e-8 of it, twice.
    assert float(late) == pytest.approx(-float(np.sum(velocity * line)) / 299792458.0**2, rel=1e-7)


def test_terrestrial_scales_stay_near_the_earth(reference: tscale.ReferenceData) -> None:
    t = Instants.from_iso([DATE, DATE], scale="UTC")
    with pytest.raises(errors.ScaleMismatch, match="TDB or TCB") as caught:
        one_way(transmit=t, transmitter="mars", receiver=SITE, reference=reference)
    assert caught.value.mask is not None
    assert caught.value.mask.all()
    found = unhindered(receive=t, transmitter="mars", receiver=SITE, reference=reference)
    with pytest.raises(errors.ScaleMismatch, match="mars"):
        found.transmit_on("UTC")
    with pytest.raises(errors.ScaleMismatch, match="TCL"):
        found.receive_on("TCL")
    tcb = found.transmit_on("TCB")
    assert np.array_equal(tcb.pair, tscale.transforms.barycentric.tcb_from_tdb(found.transmit.pair))


def test_places_are_stamped_and_checked(reference: tscale.ReferenceData) -> None:
    t = Instants.from_iso(DATE, scale="TDB")
    found = unhindered(receive=t.at("TOPOCENTER"), transmitter="moon", receiver=SITE, reference=reference)
    assert (found.transmit.place, found.receive.place) == ("SELENOCENTER", "TOPOCENTER")
    with pytest.raises(errors.ScaleMismatch, match="GEOCENTER"):
        unhindered(receive=t.at("GEOCENTER"), transmitter="moon", receiver=SITE, reference=reference)


def test_not_converged(reference: tscale.ReferenceData) -> None:
    # At nine tenths of the speed of light on a bent path three steps are not enough.
    @np.vectorize
    def bend(count: float) -> float:
        return 1e8 * np.sin(2.7 * count)

    class Fast:
        name = "fast"

        def state_bcrs(self, tdb: Any, reference: Any) -> Any:
            count = np.asarray(tdb[0] + tdb[1], dtype=float)
            zero = np.zeros_like(count)
            place = np.stack([1e10 + zero, np.asarray(bend(count)), zero], axis=-1)
            speed = np.stack([zero, 2.7e8 * np.cos(2.7 * count), zero], axis=-1)
            return place, speed

    rest = StraightLine("rest", (0.0, 3.0e9, 0.0), (0.0, 0.0, 0.0))
    t = Instants.from_seconds([0, 1], 0.0, scale="TDB")
    with pytest.raises(errors.NotConverged, match="max_iterations") as caught:
        one_way(receive=t, transmitter=Fast(), receiver=rest, reference=reference, bodies=(), max_iterations=3)
    assert caught.value.mask is not None
    found = one_way(receive=t, transmitter=Fast(), receiver=rest, reference=reference, bodies=(), max_iterations=20)
    assert found.iterations > 3


@pytest.mark.parametrize(
    ("wrong", "words"),
    [
        ({"transmit": None, "receive": None}, "exactly one"),
        ({"receive": Instants.from_iso(DATE, scale="TDB")}, "exactly one"),
        ({"transmit": "2024-05-05"}, "Instants"),
        ({"receiver": 3.5}, "receiver must be"),
        ({"receiver": "vulcan"}, "vulcan"),
        ({"receiver": True}, "receiver must be"),
        ({"occultation": "hide"}, "occultation"),
        ({"bodies": "sun"}, "sequence"),
        ({"bodies": ("mars", 499)}, "twice"),
        ({"tolerance_s": 0.0}, "tolerance_s"),
        ({"max_iterations": 2}, "max_iterations"),
        ({"reference": "de440"}, "ReferenceData"),
    ],
)
def test_wrong_arguments_are_refused(wrong: dict[str, Any], words: str) -> None:
    given: dict[str, Any] = {
        "transmit": Instants.from_iso(DATE, scale="TDB"),
        "transmitter": "earth",
        "receiver": "mars",
        **wrong,
    }
    with pytest.raises(errors.InvalidInput, match=words):
        one_way(**given)


def test_wrong_round_trips_are_refused(reference: tscale.ReferenceData) -> None:
    t = Instants.from_iso([DATE, DATE, DATE], scale="TDB")
    for turnaround in (-1.0, float("nan"), [1.0, 2.0]):
        with pytest.raises(errors.InvalidInput, match="turnaround_s"):
            two_way(transmit=t, station="earth", target="mars", turnaround_s=turnaround, reference=reference)
    with pytest.raises(errors.InvalidInput, match="exactly one"):
        two_way(station="earth", target="mars", reference=reference)
    with pytest.raises(errors.GeometryError, match="same point"):
        one_way(transmit=t, transmitter="earth", receiver="earth", reference=reference)
    with pytest.raises(errors.MissingPiece, match="499"):
        one_way(transmit=t, transmitter="earth", receiver=499, reference=reference)


def test_inputs_are_left_as_they_were(reference: tscale.ReferenceData) -> None:
    t = Instants.from_iso([DATE, DATE], scale="UTC")
    before = t.whole.copy(), t.fraction.copy()
    found = unhindered(transmit=t, transmitter=SITE, receiver="venus", reference=reference)
    assert np.array_equal(t.whole, before[0])
    assert np.array_equal(t.fraction, before[1])
    with pytest.raises(TypeError):
        found.ledger["geometric range"] = np.zeros(2)  # type: ignore[index]
    with pytest.raises(ValueError, match="read-only"):
        found.ledger["geometric range"][0] = 0.0
    assert "light time" in found.table(1)
    with pytest.raises(errors.InvalidInput, match="row"):
        found.table(2)


def test_solutions_travel_between_processes(reference: tscale.ReferenceData) -> None:
    t = Instants.from_iso([DATE, DATE], scale="UTC")
    found = unhindered(transmit=t, transmitter=SITE, receiver="venus", reference=reference)
    again = pickle.loads(pickle.dumps(found))
    assert np.array_equal(again.light_time_s, found.light_time_s)
    assert np.array_equal(again.transmit_on("TT").pair, found.transmit_on("TT").pair)


def test_an_observer_is_enough(reference: tscale.ReferenceData) -> None:
    class Raft:
        """Something that says only where it is in the GCRS."""

        name = "raft"

        def gcrs(self, tt: Any, tables: Any) -> Any:
            return SITE.gcrs(tt, tables)

    t = Instants.from_iso(DATE, scale="UTC")
    raft = unhindered(transmit=t, transmitter=Raft(), receiver="venus", reference=reference)
    site = unhindered(transmit=t, transmitter=SITE, receiver="venus", reference=reference)
    assert float(raft.light_time_s) == float(site.light_time_s)
    # A raft is not known to stand on the ground; a site is.
    assert raft.transmit_elevation_deg is None
    assert site.transmit_elevation_deg is not None
