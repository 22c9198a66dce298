"""The uncertainty of a chain: its sensitivities against chains whose inputs were moved, and what two steps share."""

from __future__ import annotations

import math
from dataclasses import replace
from typing import Any

import numpy as np
import pytest

import tscale
from tscale.budget import Contribution
from tscale.budget.perturbed import ShiftedTimeEphemeris
from tscale.instants import Instants
from tscale.scales import Node, Scale
from tscale.step import Step

C_M_S = 299792458.0
EARTH_RATE_RAD_S = 7.292115146706979e-5  # IAU 2000 B1.8, IERS Conventions 2010
MAS = math.pi / (180 * 3600e3)
DAYS = [60428, 60429, 60430, 60431, 60432, 60433, 60434]
COLUMNS = ("ut1_minus_utc_s", "x_arcsec", "y_arcsec", "dx_mas", "dy_mas")
UNITS = (1.0, 1000 * MAS, 1000 * MAS, MAS, MAS)
LEFT_OUT = {
    "tide of the solid Earth, left out",
    "loads on the ground and pole tide, left out",
    "tides in Earth rotation, left out",
    "second-order delay of the Sun, left out",
    "gravitational delay of the Earth, left out",
}

SITE = tscale.Site.from_itrf("test site", 4_051_700.0, 417_300.0, 4_890_200.0)
SOURCE = tscale.Source(83.6, 22.0, 150.0, -220.0, 40.0, name="test source")
T = tscale.Instants.from_iso("2024-05-01T07:30:00", scale="UTC")
ORIENTATION = {"Earth orientation, UT1", "Earth orientation, pole"}


def table(**moved: float) -> tscale.ReferenceData:
    """Constant Earth orientation, known to 0.1 ms in UT1, 2, 3, 0.5 and 0.7 mas in the pole; some value moved."""
    values = dict(zip(COLUMNS, (-0.01, 0.03, 0.4, 0.2, -0.1), strict=True))
    values = {name: value + moved.get(name, 0.0) for name, value in values.items()}
    rows = tscale.EarthOrientation.from_rows(
        DAYS,
        *values.values(),
        ut1_sigma_s=1e-4,
        x_sigma_arcsec=0.002,
        y_sigma_arcsec=0.003,
        dx_sigma_mas=0.5,
        dy_sigma_mas=0.7,
    )
    return tscale.ReferenceData(earth_orientation=rows)


@pytest.fixture(scope="module")
def uncertain() -> tscale.ReferenceData:
    return table()


def chain_to(end: str, reference: tscale.ReferenceData, **pieces: Any) -> tscale.Chain:
    return tscale.chain("UTC", end, **{"site": SITE, "source": SOURCE, "reference": reference, **pieces})


def sensitivities(end: str, reference: tscale.ReferenceData, **stated: Any) -> dict[str, float]:
    lines = chain_to(end, reference).budget(T, **stated).lines
    return {line.quantity: float(line.sensitivity) for line in lines}


@pytest.mark.parametrize("end", ["TDB", "TDB@BARYCENTER"])
def test_sensitivities_to_earth_orientation(end: str, uncertain: tscale.ReferenceData) -> None:
    found = sensitivities(end, uncertain)
    names = ("UT1 - TAI", "polar motion x", "polar motion y", "celestial pole dX", "celestial pole dY")
    # Moves of 50 ms and 0.75 arcsec, by which the sensitivities themselves change by 4e-6; those of dX and dY are good
    # to 0.3 % of the largest.
    moves = (0.05, 0.75, 0.75, 750.0, 750.0)
    largest = 6.4e6 / C_M_S * (1e-4 if end == "TDB" else 1.0)
    nominal = chain_to(end, uncertain)(T)
    for name, column, move, unit in zip(names, COLUMNS, moves, UNITS, strict=True):
        moved = float(chain_to(end, table(**{column: move}))(T).minus(nominal)) / (move * unit)
        tolerance = (3e-3 if "pole d" in name else 2e-4) * largest * (EARTH_RATE_RAD_S if name == "UT1 - TAI" else 1.0)
        assert abs(moved) > 10 * tolerance or name in ("celestial pole dX", "polar motion x")
        assert found[name] == pytest.approx(moved, rel=0, abs=tolerance), name


@pytest.mark.parametrize("end", ["TDB", "TDB@BARYCENTER"])
def test_sensitivities_to_the_place(end: str, uncertain: tscale.ReferenceData) -> None:
    found = sensitivities(end, uncertain, site_sigma_m=0.01)
    nominal = chain_to(end, uncertain)(T)
    for number, axis in enumerate("xyz"):
        position = list(SITE.position_m)
        position[number] += 1000.0
        site = replace(SITE, position_m=tuple(position))
        moved = float(chain_to(end, uncertain, site=site)(T).minus(nominal)) / 1000.0
        # The rate of the wavefront and the terms of the next order: 1e-4 of 1 m / c, and 2e-8 of it in a scale.
        assert found[f"ITRF {axis} of test site"] == pytest.approx(moved, rel=0, abs=2e-4 / C_M_S)
        assert abs(moved) > 1e-3 / C_M_S or end == "TDB"


def test_sensitivities_to_the_source(uncertain: tscale.ReferenceData) -> None:
    stated = {"source_position_sigma_mas": 1.0, "proper_motion_sigma_mas_yr": 0.1, "parallax_sigma_mas": 0.1}
    found = sensitivities("TDB@BARYCENTER", uncertain, **stated)
    nominal = chain_to("TDB@BARYCENTER", uncertain)(T)
    step = 1e-3
    moves = {
        "right ascension cos dec": ({"ra_deg": SOURCE.ra_deg + step / math.cos(math.radians(22.0))}, step, 8.7),
        "declination": ({"dec_deg": SOURCE.dec_deg + step}, step, 8.7),
        "proper motion in right ascension cos dec": ({"pm_ra_cosdec_mas_yr": 160.0}, 10.0, 5.9e-5),
        "proper motion in declination": ({"pm_dec_mas_yr": -210.0}, 10.0, 5.9e-5),
        "parallax": ({"parallax_mas": 41.0}, 1.0, 1.2e-6),
    }
    for name, (moved, size, largest) in moves.items():
        source = replace(SOURCE, **moved)
        change = float(chain_to("TDB@BARYCENTER", uncertain, source=source)(T).minus(nominal)) / size
        # 1e-3 deg and 6 arcsec of proper motion since the epoch turn the sensitivity by 3e-5 of the largest there is.
        assert found[name] == pytest.approx(change, rel=0, abs=5e-5 * largest), name


def test_sources_at_a_site(uncertain: tscale.ReferenceData) -> None:
    chain = chain_to("TDB", uncertain)
    found = chain.uncertainty_s(T)
    assert set(found) == {"time ephemeris"} | ORIENTATION | {name for name in LEFT_OUT if "delay" not in name}
    assert float(found["time ephemeris"]) == 2e-10
    # By hand: turning the Earth by UT1 moves the site; the term is v.r/c^2.
    r_m, v_m_s = SITE.gcrs(tscale.chain("UTC", "TT")(T).pair, uncertain)
    _, velocity = uncertain.ephemeris.state("earth", tscale.chain("UTC", "TDB@GEOCENTER")(T).pair)
    # Rows 2 days apart in the decay of their errors: at 7:30 the error is that of four rows, 0.92 of one.
    ut1 = abs(float(velocity @ v_m_s)) / C_M_S**2 * 1e-4
    assert 0.9 * ut1 < float(found["Earth orientation, UT1"]) < ut1
    assert float(found["tide of the solid Earth, left out"]) == pytest.approx(
        0.4 / math.sqrt(3.0) * float(np.linalg.norm(velocity)) / C_M_S**2, rel=1e-6, abs=0
    )
    assert np.linalg.norm(r_m) == pytest.approx(6_365_000, rel=1e-2)
    total = math.sqrt(sum(float(value) ** 2 for value in found.values()))
    assert float(chain.sigma_s(T)) == pytest.approx(total, rel=1e-12, abs=0)


def test_one_input_of_two_steps_is_one(uncertain: tscale.ReferenceData) -> None:
    # UT1 turns the site in the date and in the wavefront: the sensitivities add with their signs.
    date = sensitivities("TDB", uncertain)
    whole = sensitivities("TDB@BARYCENTER", uncertain)
    alone = tscale.chain("TDB@TOPOCENTER", "TDB@BARYCENTER", site=SITE, source=SOURCE, reference=uncertain).budget(
        chain_to("TDB", uncertain)(T)
    )
    wave = {line.quantity: float(line.sensitivity) for line in alone.lines}
    for name in ("UT1 - TAI", "polar motion x", "celestial pole dY"):
        assert whole[name] == pytest.approx(date[name] + wave[name], rel=1e-9, abs=0)
        assert abs(date[name]) > 1e-6 * abs(wave[name])
    found = chain_to("TDB@BARYCENTER", uncertain).uncertainty_s(T)
    assert set(found) == {"time ephemeris"} | ORIENTATION | LEFT_OUT


def test_what_two_legs_share_cancels() -> None:
    # To the barycentre and on to the geocentre: the time ephemeris is taken off at one end and put on at the other.
    chain = tscale.chain("UTC", "UTC@GEOCENTER", site=SITE, source=SOURCE)
    assert float(chain.uncertainty_s(T)["time ephemeris"]) < 1e-15
    tables = chain.reference
    shifted: Any = ShiftedTimeEphemeris(tables.time_ephemeris, np.array([0.0]), np.array([1e-6]))
    moved = chain.replaced(reference=tables.replace(time_ephemeris=shifted))
    # 1 us of TDB moves the Earth by 3 cm and the site by less: 1e-10 s.
    assert abs(float(moved(T).minus(chain(T)))) < 2e-10


def test_ut1_itself(uncertain: tscale.ReferenceData) -> None:
    midnight = tscale.Instants.from_iso("2024-05-01T00:00:00", scale="UTC")
    # The tides within a day, up to 0.09 ms, are in the table or in the budget.
    name = "tides in UT1 within a day, left out"
    plain = tscale.chain("UTC", "UT1", reference=uncertain)
    assert float(plain.uncertainty_s(T)[name]) == pytest.approx(9e-5 / math.sqrt(3.0), rel=1e-12, abs=0)
    tidal = uncertain.replace(earth_orientation=uncertain.earth_orientation.with_sub_daily())
    chain = tscale.chain("UTC", "UT1", reference=tidal)
    assert abs(float(chain(T).minus(plain(T)))) < 9e-5
    assert set(chain.uncertainty_s(T)) == {"Earth orientation, UT1"}
    assert float(chain.sigma_s(midnight)) == pytest.approx(1e-4, rel=1e-12, abs=0)
    # Half-way between rows 3 and 4 of 6, weights -1/16, 9/16, 9/16, -1/16, correlations exp(-days / 2).
    noon = tscale.Instants.from_iso("2024-05-01T12:00:00", scale="UTC")
    weights = np.array([-1, 9, 9, -1]) / 16
    rows = np.exp(-np.abs(np.subtract.outer(np.arange(4), np.arange(4))) / 2)
    assert float(chain.sigma_s(noon)) == pytest.approx(1e-4 * math.sqrt(weights @ rows @ weights), rel=1e-9, abs=0)
    back = tscale.chain("UT1", "UTC", reference=tidal)
    assert float(back.sigma_s(chain(noon))) == pytest.approx(float(chain.sigma_s(noon)), rel=1e-9, abs=0)
    assert float(back.budget(chain(noon)).lines[0].sensitivity) == -1.0


def test_tides_leave_the_budget_where_they_are_in_the_chain(uncertain: tscale.ReferenceData) -> None:
    still = chain_to("TDB@BARYCENTER", uncertain)
    tidal = uncertain.replace(earth_orientation=uncertain.earth_orientation.with_sub_daily())
    moving = chain_to("TDB@BARYCENTER", tidal, site=replace(SITE, solid_tide=True))
    bound = {
        line.quantity: line.sigma * line.sensitivity for line in still.budget(T).lines if "left out" in line.quantity
    }
    left = {line.quantity for line in moving.budget(T).lines}
    gone = set(bound) - left
    assert {name.partition(":")[0] for name in gone} == {
        "tide of the solid Earth, left out",
        "tides in Earth rotation, left out",
    }
    # What the tides do to the result lies within the bounds that stood for them.
    moved = abs(float(moving(T).minus(still(T))))
    assert 1e-11 < moved < math.sqrt(3.0) * sum(float(bound[name]) for name in gone)


def test_a_step_that_states_sigmas_alone() -> None:
    def forward(t: Instants) -> Instants:
        return t

    node = Node(Scale.parse("TT"), "GEOCENTER")
    step = Step(
        node,
        node,
        "plain",
        "test",
        forward,
        forward,
        terms=lambda before, after: {},
        rate=lambda before, after: np.zeros(before.shape),
        uncertainty_s=lambda before: {"cable": np.full(before.shape, 3e-10)},
    )
    t = tscale.Instants.from_seconds([0, 1], 0.0, scale="TT")
    (part,) = step.contributed(t)
    assert isinstance(part, Contribution)
    assert part.signed_s.tolist() == [3e-10, 3e-10]
    assert part.correlation.matrix(2).tolist() == [[1.0, 1.0], [1.0, 1.0]]
    (back,) = step.reversed().contributed(t)
    assert back.signed_s.tolist() == [-3e-10, -3e-10]
    assert step.reversed().uncertainty_s(t)["cable"].tolist() == [3e-10, 3e-10]
