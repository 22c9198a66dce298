"""Why results differ: every mistake made, alone and in pairs, with noise, and named."""

from __future__ import annotations

import json

import numpy as np
import pytest

import tscale
from tests.crosscheck_support import COUNT, PAIRS, SINGLE, SITE, SMALLEST_S, SOURCE, dates, noise, right
from tscale import Instants
from tscale.crosscheck import explain
from tscale.crosscheck.catalogue import catalogue
from tscale.crosscheck.path import Path

LEVELS_S = (1e-9, 1e-7, 1e-6)


EITHER = ", on the way or in the result"


def names(found: object) -> set[str]:
    return {name for name, _, _ in found.causes}  # type: ignore[attr-defined]


@pytest.mark.parametrize("name", SINGLE)
def test_one_mistake_is_named(name: str) -> None:
    theirs = SINGLE[name]()
    for number, level in enumerate((LEVELS_S[0], LEVELS_S[2] if SMALLEST_S.get(name, 1.0) > 2e-6 else LEVELS_S[1])):
        # An amplitude of 1 must stand out from the noise: by 8 standard deviations of its fit, of which 4.7 are asked.
        if SMALLEST_S.get(name, 1.0) * np.sqrt(COUNT) < 8.0 * level:
            continue
        found = explain(dates(), theirs.shifted(noise(level, 40 + number)), chain=right())
        # Constants of microseconds are the same put in last, but for nanoseconds: then it is said that they are.
        small = SMALLEST_S.get(name, 1.0) < 1e-4 and level > 1e-9
        assert names(found) in ({name}, {name + EITHER} if small else {name}), found.table()
        ((_, amplitude, sigma),) = found.causes
        assert abs(amplitude - (-1.0 if name == "whole leap seconds" else 1.0)) < max(5.0 * sigma, 1e-6)
        # Rounded results: where the noise moves a date over a step, the pattern is not seen exactly.
        assert 0.85 * level < found.unexplained_rms_s < 1.2 * level
        assert found.verdict == "explained"


@pytest.mark.parametrize("pair", PAIRS)
def test_two_mistakes_are_named(pair: tuple[str, str]) -> None:
    level = 1e-9
    found = explain(dates(), PAIRS[pair]().shifted(noise(level, 77)), chain=right())
    assert names(found) == set(pair), found.table()
    assert 0.85 * level < found.unexplained_rms_s < 1.2 * level
    for _, amplitude, sigma in found.causes:
        assert abs(amplitude - 1.0) < max(5.0 * sigma, 1e-6)


def test_pairs_out_of_the_whole_catalogue() -> None:
    # Eight pairs drawn with a fixed seed, put into the chain where they are made. Left out: what does nothing at
    # these dates or is below the noise of 1 ns, and what is one with the other (a displacement, and a site elsewhere).
    path = Path(right(), dates())
    known = [
        s
        for s in catalogue(path)
        if s.named and not s.last_of and "second-order" not in s.name and "leap-second days" not in s.name
    ]
    random = np.random.default_rng(8)
    wrong = []
    for number in range(8):
        one, two = (known[i] for i in random.choice(len(known), 2, replace=False))
        made = [(s, 200.0 if s.allowed is None else s.allowed[-1]) for s in (one, two)]
        found = explain(dates(), path.run(made).shifted(noise(1e-9, 500 + number)), chain=right())
        if names(found) != {one.name, two.name}:
            wrong.append((made, found.causes))
    assert len(wrong) <= 1, wrong


@pytest.mark.parametrize(
    ("start", "end", "pieces"),
    [
        ("UTC", "TCG", {}),
        ("GPS", "TT", {}),
        ("UTC", "TDB", {"site": SITE}),
        ("TDB", "UTC", {"site": SITE}),
        ("UTC", "TCB@GEOCENTER", {}),
        ("TDB@BARYCENTER", "TT@TOPOCENTER", {"site": SITE, "source": SOURCE}),
    ],
)
def test_every_signature_of_other_chains_is_its_own(start: str, end: str, pieces: dict[str, object]) -> None:
    chain = tscale.chain(start, end, **pieces)  # type: ignore[arg-type]
    t = Instants(dates().whole[::4], dates().fraction[::4], start.split("@")[0])
    path = Path(chain, t)
    known = [s for s in catalogue(path) if s.named and not s.last_of]
    for number, signature in enumerate(known[:: 1 if t.scale != "TDB" else 20]):
        size = np.sqrt(np.mean(path.column(signature) ** 2))
        if size < 1e-9:
            continue
        found = explain(t, path.run([(signature, 1.0)]).shifted(noise(0.02 * size, number, 0.0, t.size)), chain=chain)
        # Constants of one size may be one another; then the others are named with it.
        told = {name for cause in found.found for name in (cause.name, *cause.alternatives)}
        assert signature.name in told, f"{signature.name}: {found.table()}"


FORMS = {
    -32.184: ("32.184 s (TT - TAI) left out", "32.184 s (TT - TAI) left out in the result"),
    -19.0: ("19 s (TAI - GPS time)", "19 s (TAI - GPS time) in the result"),
    -37.0: ("whole leap seconds", "whole seconds in the result"),
    1.0: ("whole leap seconds", "whole seconds in the result"),
}


@pytest.mark.parametrize(
    ("end", "constant_s"),
    [
        *(("TDB@TOPOCENTER", constant_s) for constant_s in FORMS),
        ("TDB@GEOCENTER", -32.184),
        ("TDB@GEOCENTER", -37.0),
        ("TDB@BARYCENTER", -32.184),
        ("TDB@BARYCENTER", 1.0),
    ],
)
def test_constants_on_the_way_and_in_the_result(end: str, constant_s: float) -> None:
    # Periodic terms and the Roemer delay of dates 32 s early are 10 ns and 3 ms (rates 3e-10 and 1e-4) off; those of
    # a constant added last are not. Noise of 1 ns tells them apart, and noise of 100 ns only behind the wavefront.
    on_the_way, last = FORMS[constant_s]
    pieces = {} if end == "TDB@GEOCENTER" else {"site": SITE, "source": SOURCE}
    chain = tscale.chain("UTC", end, **pieces)  # type: ignore[arg-type]
    rest = tscale.chain("TAI", end, **pieces)  # type: ignore[arg-type]
    tai = tscale.chain("UTC", "TAI")(dates())
    for theirs, name in ((rest(tai.shifted(constant_s)), on_the_way), (chain(dates()).shifted(constant_s), last)):
        found = explain(dates(), theirs.shifted(noise(1e-9, 21)), chain=chain)
        assert found.verdict == "explained"
        told = {n for cause in found.found for n in (cause.name, *cause.alternatives)}
        assert len(found.found) == 1, found.table()
        assert name in told, found.table()
        # 1 s is 0.3 ns without the wavefront: the noise may leave both.
        assert told == {name} or (constant_s == 1.0 and end != "TDB@BARYCENTER" and told == {on_the_way, last})
        assert abs(found.unexplained_rms_s - 1e-9) < 0.15e-9
    if end == "TDB@TOPOCENTER":
        theirs = chain(dates()).shifted(constant_s + noise(1e-7, 22))
        (cause,) = explain(dates(), theirs, chain=chain).found
        assert cause.name == on_the_way
        assert last in cause.alternatives
        assert cause.label in (on_the_way + EITHER, f"{on_the_way} or {last}")


def test_a_constant_in_the_result_beside_another_mistake() -> None:
    theirs = SINGLE["parallax left out"]().shifted(-32.184 + noise(1e-9, 23))
    found = explain(dates(), theirs, chain=right())
    assert names(found) == {"parallax left out", "32.184 s (TT - TAI) left out in the result"}
    # Against the direction of the steps the sign is the other one.
    chain, t = tscale.chain("TCB@GEOCENTER", "TAI"), Instants(dates().whole, dates().fraction, "TCB")
    known = {s.name: s for s in catalogue(Path(chain, t))}
    path = Path(chain, t)
    early, late = (known["J2000 in place of T0 (1977)" + end] for end in ("", " in the result"))
    assert np.allclose(path.column(late), path.run([(early, 1.0)]).minus(path.end), rtol=1e-7, atol=0)
    assert np.array_equal(path.run([(late, 1.0)]).minus(path.end), path.column(late))


def test_free_amplitudes() -> None:
    # The source 40 mas off in right ascension and its epoch 15.5 years late.
    from dataclasses import replace

    moved = replace(SOURCE, ra_deg=SOURCE.ra_deg + 40 / 3.6e6 / np.cos(np.radians(SOURCE.dec_deg)))
    theirs = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=moved)(dates())
    found = explain(dates(), theirs.shifted(noise(1e-8, 3)), chain=right())
    ((name, amplitude, sigma),) = found.causes
    assert name.startswith("direction of the source in right ascension")
    assert amplitude == pytest.approx(40.0, abs=5 * sigma)
    # One mas is 2.4 us at most and 1.5 us rms; with 400 dates of 10 ns: 1e-8/1.5e-6/sqrt(400) = 3e-4 mas.
    assert sigma == pytest.approx(3e-4, rel=0.3, abs=0)
    late = replace(SOURCE, epoch="2015-07-02T00:00:00")
    theirs = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=late)(dates())
    found = explain(dates(), theirs.shifted(noise(1e-8, 4)), chain=right())
    ((name, amplitude, sigma),) = found.causes
    assert name == "epoch of the source"
    assert amplitude == pytest.approx(5660.5 / 365.25, abs=max(5 * sigma, 1e-4))
    assert found.found[0].unit == "yr"


def test_agreement_and_rounding_need_no_name() -> None:
    ours = right()(dates())
    found = explain(dates(), ours, chain=right())
    assert found.causes == []
    assert found.verdict == "agrees"
    # Through another path of the same package: what a barycentric position rounds to, 0.1 ps.
    found = explain(dates(), right().replaced(second_order=False)(dates()).shifted(1e-14), chain=right())
    assert found.causes == []


@pytest.mark.parametrize(
    ("left_s", "words"),
    [
        (lambda x: 3e-3 + 0.0 * x, "a mean of +3.00e-03 s"),
        (lambda x: 1e-6 * x, "a drift of +1.00e-06 s/yr"),
        (lambda x: 1e-6 * np.sin(2 * np.pi * x / 0.27379), "days with an amplitude of 1.0e-06 s"),
    ],
)
def test_what_nothing_makes_is_unexplained(left_s: object, words: str) -> None:
    x = (dates().whole - 490_000_000) / 31557600.0
    theirs = right()(dates()).shifted(left_s(x) + noise(1e-8, 5))  # type: ignore[operator]
    found = explain(dates(), theirs, chain=right())
    assert found.verdict == "unexplained"
    assert found.causes == []
    assert words in found.table()
    assert "no mistakes of the catalogue, alone or together, bring this down to noise; left is a" in found.told
    assert found.unexplained_rms_s == pytest.approx(found.residuals.rms_s, rel=1e-9, abs=0)


def test_a_mistake_that_is_not_whole_is_not_named() -> None:
    # 0.7 of the topocentric terms is no mistake of the catalogue.
    theirs = right()(dates()).shifted(-0.7 * right().ledger(dates())["topocentric v.r/c^2"])
    found = explain(dates(), theirs.shifted(noise(1e-9, 6)), chain=right())
    assert found.causes == []
    assert found.verdict == "unexplained"
    assert "a period of a day" in found.table()


def test_what_cannot_be_told_apart_is_told_together() -> None:
    # Within a minute the Earth turns by 0.25 degrees: with 10 ns of noise a site 900 m off along Y, along X by another
    # amount, and a plain offset are one. Over 18 years they are not.
    moved = tscale.Site.from_itrf("moved", SITE.position_m[0], SITE.position_m[1] + 900.0, SITE.position_m[2])
    there = tscale.chain("UTC", "TDB@BARYCENTER", site=moved, source=SOURCE)
    t = Instants.from_iso("2012-03-01T00:00:00", scale="UTC").shifted(np.linspace(0.0, 60.0, 200))
    found = explain(t, there(t).shifted(noise(1e-7, 8, 0.0, 200)), chain=right())
    assert found.causes == [] or all(" or an offset" in name for name in names(found)), found.table()
    found = explain(dates(), there(dates()).shifted(noise(1e-7, 8)), chain=right())
    assert names(found) == {"place of the site along Y (ITRF)"}
    assert found.found[0].amplitude == pytest.approx(900.0, abs=5 * found.found[0].sigma)
    # A constant has its size to tell it by.
    late = right()(t).shifted(65.5e-6 + noise(1e-7, 7, 0.0, 200))
    assert names(explain(t, late, chain=right())) == {"TDB0 (65.5 us) left out" + EITHER}


def test_outliers_are_set_aside() -> None:
    wild = np.zeros(COUNT)
    wild[[5, 77, 300]] = [3.0, -1e-3, 40.0]
    theirs = SINGLE["parallax left out"]().shifted(wild + noise(1e-9, 9))
    found = explain(dates(), theirs, chain=right())
    assert names(found) == {"parallax left out"}
    assert found.set_aside == (5, 77, 300)
    assert found.unexplained_rms_s < 1.2e-9
    assert "3 of 400 rows set aside" in found.table()


def test_rows_in_any_order_and_weights() -> None:
    random = np.random.default_rng(10)
    order = random.permutation(COUNT)
    sigma = np.where(np.arange(COUNT) % 2 == 0, 1e-9, 1e-6)
    theirs = SINGLE["polar motion left out"]().shifted(sigma * random.standard_normal(COUNT))
    found = explain(dates()[order], theirs[order], chain=right(), sigma_s=sigma[order])
    assert names(found) == {"polar motion left out"}
    assert found.verdict == "explained"
    # Without the weights 12 ns are lost in the noise of half of the rows: 5 standard deviations are not reached.
    assert explain(dates()[order], theirs[order], chain=right()).causes == []
    # Noise three times what is stated is said.
    more = right()(dates()).shifted(3.0 * sigma * random.standard_normal(COUNT))
    assert "an rms that is 3" in explain(dates(), more, chain=right(), sigma_s=sigma).table()


def test_json_and_table() -> None:
    found = explain(dates(), SINGLE["parallax left out"]().shifted(noise(1e-9, 12)), chain=right())
    facts = json.loads(found.to_json())
    assert facts["causes"][0]["name"] == "parallax left out"
    assert facts["verdict"] == "explained"
    assert len(facts["unexplained_s"]) == COUNT
    assert "Shapiro delay of the Sun left out" in facts["looked_for"]
    assert found.table().splitlines()[2].startswith("parallax left out")


def test_refusals() -> None:
    t = dates()[:3]
    with pytest.raises(tscale.errors.InvalidInput, match="3 rows explain nothing"):
        explain(t, right()(t), chain=right())
    t = dates()[:9]
    with pytest.raises(tscale.errors.InvalidInput, match="1 of 9 values of sigma_s") as caught:
        explain(t, right()(t), chain=right(), sigma_s=[1.0] * 8 + [0.0])
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False] * 8 + [True]
    with pytest.raises(tscale.errors.InvalidInput, match="one number or 9"):
        explain(t, right()(t), chain=right(), sigma_s=[1.0, 2.0])
