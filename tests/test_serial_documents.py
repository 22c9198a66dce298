"""Documents in JSON: every kind of object there and back to the last bit, and what is said of damaged ones."""

from __future__ import annotations

import json
import shutil
import subprocess
import sys
import warnings
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st

import tscale
from tscale.earth.gravity.field import EARTH_ZONAL
from tscale.earth.gravity.harmonic import HarmonicField
from tscale.errors import DataFileError, InvalidInput, MissingPiece
from tscale.provenance import content_sha256
from tscale.serial import OtherTables, from_json, to_json

from . import serial_objects as made
from .strategies import dates

EXAMPLES = Path(__file__).parents[1] / "examples"


@pytest.mark.parametrize("name", sorted(made.VALUES))
def test_values_there_and_back(name: str) -> None:
    value = made.VALUES[name]()
    text = to_json(value)
    back = from_json(text)
    assert type(back) is type(value)
    assert to_json(back) == text
    assert content_sha256(back) == content_sha256(value)
    assert from_json(to_json(value, indent=2)).__class__ is value.__class__
    assert text.isascii()
    document = json.loads(text)
    assert (document["kind"], document["version"]) == (type(value).__name__, 1)


@given(st.lists(dates("UTC"), max_size=4), st.sampled_from([None, "GEOCENTER"]))
def test_instants(parts: list[tscale.Instants], place: str | None) -> None:
    t = tscale.Instants.from_seconds([], [], scale="UTC")
    t = tscale.Instants.concatenate([t, *(part.ravel() for part in parts)]).at(place)
    for value in (t, t.reshape(1, len(t)), *t[:1]):
        back = from_json(to_json(value))
        assert np.array_equal(back.whole, value.whole)
        assert np.array_equal(back.fraction.view(np.int64), value.fraction.view(np.int64))
        assert (back.scale, back.place, back.shape) == (value.scale, value.place, value.shape)
        assert not back.whole.flags.writeable


@given(st.floats(allow_nan=False, allow_infinity=False), st.floats(-90.0, 90.0))
def test_any_float_of_a_source(motion: float, dec: float) -> None:
    star = tscale.Source(0.0, dec, pm_dec_mas_yr=max(min(motion, 1e5), -1e5))
    back = from_json(to_json(star))
    assert back == star
    assert np.copysign(1.0, back.dec_deg) == np.copysign(1.0, dec)


def test_a_reader_needs_no_more_than_json() -> None:
    # Two columns, as another language would read them.
    document = json.loads(to_json(tscale.Instants.from_seconds([[1, 2**61]], [[0.1, 0.5]], scale="TT")))
    assert document["whole"] == [1, 2**61]
    assert document["fraction"] == [0.1, 0.5]
    assert document["shape"] == [1, 2]


@pytest.mark.parametrize("name", sorted(made.LOGS))
def test_logs_map_as_before(name: str) -> None:
    log = made.LOGS[name]()
    back = from_json(to_json(log))
    at = tscale.Instants.concatenate([log.span[:1], log.span[:1].shifted(1800.678), log.span[-1:]])
    for ours, theirs in zip(log._curve, back._curve, strict=True):
        # What is derived from the rows comes out the same, too.
        assert content_sha256(ours) == content_sha256(theirs)
    assert (back.is_predicted, back.marks, back.noise) == (log.is_predicted, log.marks, log.noise)
    with warnings.catch_warnings():
        warnings.simplefilter("ignore", tscale.ExtrapolationWarning)
        for one, two in zip(log.to_clock(at.pair), back.to_clock(at.pair), strict=True):
            assert np.array_equal(one, two)


@pytest.mark.parametrize("name", sorted(made.ORBITS))
def test_trajectories_fly_as_before(name: str, reference: tscale.ReferenceData) -> None:
    orbit = made.ORBITS[name]()
    back = from_json(to_json(orbit))
    tt = tscale.Instants.from_iso(["2025-03-01T10:00:01.25", "2025-03-01T11:30:00"], scale="TT").pair
    for ours, theirs in zip(orbit.gcrs(tt, reference), back.gcrs(tt, reference), strict=True):
        assert np.array_equal(ours, theirs)
    assert (back.name, back.span) == (orbit.name, orbit.span)


def test_where_a_file_lay_is_not_written(tmp_path: Path) -> None:
    texts = []
    for home in (tmp_path / "here", tmp_path / "there"):
        home.mkdir()
        log = tscale.ClockLog.load(shutil.copy(EXAMPLES / "maser.csv", home))
        flight = tscale.Trajectory.from_flight(shutil.copy(EXAMPLES / "flight_east.csv", home))
        assert (log.path, flight.path) == (home / "maser.csv", home / "flight_east.csv")
        texts.append((to_json(log), to_json(flight)))
    # The same bytes wherever the files are, and no folder in them.
    assert texts[0] == texts[1]
    assert str(tmp_path) not in "".join(texts[0])
    back = from_json(texts[0][0])
    assert (back.path, back.name, back.sha256, back.files) == (None, log.name, log.sha256, log.files)
    assert to_json(back) == texts[0][0]
    assert from_json(texts[0][1]).path is None
    # Documents that say a path can be read still; it is not taken over.
    for text in texts[0]:
        assert from_json(changed(text, path={"path": "/elsewhere/file.csv"})).path is None


def test_gravity_fields_and_free_clocks() -> None:
    field = HarmonicField("small", 3.986e14, 6.378e6, np.tril(np.arange(9.0).reshape(3, 3) + 1.0), np.zeros((3, 3)))
    for gravity in (EARTH_ZONAL, field):
        assert content_sha256(from_json(to_json(gravity))) == content_sha256(gravity)
    clock = tscale.ProperClock(
        "flyer", made.kepler(), made.UTC[0], gravity=EARTH_ZONAL, rate_offset=-4.4647e-10, geopotential_sigma_m2_s2=0.1
    )
    assert content_sha256(from_json(to_json(clock))) == content_sha256(clock)


# ---- kernels -------------------------------------------------------------------------------------


def test_a_kernel_is_named_by_its_hash(tmp_path: Path) -> None:
    kernel = shutil.copy(next((EXAMPLES.parent / "ephemeris_cache").glob("*.bsp")), tmp_path / "moved.bsp")
    text = to_json(tscale.Trajectory.from_spk(kernel, 301))
    assert len(text) < 1000
    home = tmp_path / "home"
    home.mkdir()
    shutil.move(kernel, home / "moved.bsp")
    with pytest.raises(DataFileError, match=r"is not there: .* folder=") as caught:
        from_json(text)
    assert caught.value.path == Path(kernel)
    assert from_json(text, folder=home).path == home / "moved.bsp"
    with (home / "moved.bsp").open("ab") as file:
        file.write(b"more")
    with pytest.raises(DataFileError, match="is not the kernel"):
        from_json(text, folder=home)


# ---- chains --------------------------------------------------------------------------------------


@pytest.mark.parametrize("name", sorted(made.CHAINS))
def test_chains_map_as_before(name: str) -> None:
    chain, t = made.CHAINS[name]()
    text = to_json(chain)
    back = from_json(text)
    assert to_json(back) == text
    assert str(back) == str(chain)
    assert (back(t) == chain(t)).all()
    assert back.provenance(t).digest == chain.provenance(t).digest


def test_a_chain_from_a_kernel(reference: tscale.ReferenceData) -> None:
    chain = tscale.chain("UTC", "TDB", site=made.spk(), reference=reference)
    text = to_json(chain)
    back = from_json(text, reference=reference)
    assert to_json(back) == text
    assert (back(made.UTC) == chain(made.UTC)).all()


def test_other_tables_are_refused_and_listed(reference: tscale.ReferenceData) -> None:
    chain, t = made.CHAINS["to the barycentre"]()
    text = to_json(chain)
    leap = reference.leap_seconds.with_step(62502, 36)
    other = reference.replace(leap_seconds=leap)
    with pytest.raises(DataFileError, match=r"leap seconds: then .*, now .*reference="):
        from_json(text, reference=other)
    with pytest.warns(OtherTables, match="leap seconds: then"):
        back = from_json(text, reference=other, tables="any")
    assert back.reference is other
    assert (back(t) == chain(t)).all()  # a step in 2030 does not matter to 2025
    # With the same tables by another way in there is nothing to say.
    assert from_json(text, reference=tscale.ReferenceData.load(leap_seconds=reference.leap_seconds)) is not None
    held = reference.replace(earth_orientation=reference.earth_orientation.with_sub_daily())
    with pytest.raises(DataFileError, match="Earth orientation: then"):
        from_json(text, reference=held)
    with pytest.raises(InvalidInput, match="takes a ReferenceData"):
        from_json(text, reference="default")  # type: ignore[arg-type]
    with pytest.raises(InvalidInput, match="'same' or 'any'"):
        from_json(text, tables="some")  # type: ignore[arg-type]


def test_a_table_that_nobody_has() -> None:
    table = tscale.TTBIPM.from_rows("BIPM08", [53000, 53010, 53020], np.full(3, 27.6e-6))
    have = tscale.ReferenceData(tt_bipm=[table])
    text = to_json(tscale.chain("TAI", "TT(BIPM08)", reference=have))
    with pytest.raises(MissingPiece, match="no table for TT"):
        from_json(text)
    assert str(from_json(text, reference=have).end) == "TT(BIPM08)"
    other = tscale.TTBIPM.from_rows("BIPM08", [53000, 53010, 53020], np.full(3, 27.7e-6))
    with pytest.raises(DataFileError, match=r"TT\(BIPM08\): then"):
        from_json(text, reference=tscale.ReferenceData(tt_bipm=[other]))


# ---- results -------------------------------------------------------------------------------------


def test_a_ledger_is_read_back_whole() -> None:
    chain, t = made.CHAINS["to the barycentre"]()
    ledger = chain.ledger(t)
    back = from_json(to_json(ledger))
    assert isinstance(back, tscale.Ledger)
    assert list(back) == list(ledger)
    for term in ledger:
        for ours, theirs in zip(ledger.exact(term), back.exact(term), strict=True):
            assert np.array_equal(ours, theirs)
    assert back.table() == ledger.table()
    assert back.notes == ledger.notes


def test_a_budget_is_read_back_whole() -> None:
    chain, t = made.CHAINS["to the barycentre"]()
    for options in ({}, {"probability": 0.95, "dof": {"comparison log": 7.0}}):
        budget = chain.budget(t, source_position_sigma_mas=1.0, resolution_s=1e-9, **options)
        text = to_json(budget)
        back = from_json(text)
        assert back.table(1) == budget.table(1)
        assert np.array_equal(back.combined_s, budget.combined_s)
        assert np.array_equal(back.covariance(), budget.covariance())
        assert back.to_dict() == budget.to_dict()
        assert to_json(back) == text
        assert len(text) < 100_000  # the rows of a table that are not used are left out


def test_what_if_and_provenance(reference: tscale.ReferenceData) -> None:
    chain, t = made.CHAINS["to the barycentre"]()
    moved = tscale.what_if(chain, t, earth_orientation=reference.earth_orientation.with_sub_daily())
    back = from_json(to_json(moved))
    assert back.table() == moved.table()
    assert back.after.to_json() == moved.after.to_json()
    assert to_json(back) == to_json(moved)


def test_links_come_back_as_numbers() -> None:
    link = made.link()
    back = from_json(to_json(link))
    assert back["kind"] == "LinkSolution"
    assert (back["transmit"] == link.transmit).all()
    assert np.array_equal(back["range_m"], link.range_m)
    assert list(back["ledger"]) == list(link.ledger)
    assert back["ends"] == link.ends
    both = from_json(to_json(made.two_way()))
    assert both["up"]["kind"] == "LinkSolution"
    assert np.array_equal(both["round_trip_s"], made.two_way().round_trip_s)


def test_a_clock_comparison_comes_back_as_numbers() -> None:
    found = tscale.compare_clocks(
        made.VALUES["free clock"](),
        made.kepler(),
        *(tscale.Instants.from_iso(f"2025-03-0{day}", "TT") for day in (1, 2)),
    )
    back = from_json(to_json(found))
    assert back["accumulated_s"] == found.accumulated_s
    assert back["ledger"] == dict(found.ledger)


# ---- bytes ---------------------------------------------------------------------------------------


def test_the_same_object_gives_the_same_bytes_in_another_process() -> None:
    chain, _ = made.CHAINS["to the barycentre"]()
    script = (
        "from tests import serial_objects as made\nfrom tscale.serial import to_json\n"
        "import sys; sys.stdout.write(to_json(made.CHAINS['to the barycentre']()[0]))"
    )
    done = subprocess.run(
        [sys.executable, "-W", "error", "-c", script],
        capture_output=True,
        text=True,
        check=True,
        cwd=EXAMPLES.parent,
        env={"PYTHONHASHSEED": "7", "PATH": ""},
    )
    assert done.stdout == to_json(chain)


def test_arrays_by_strides_and_specials() -> None:
    base = tscale.Instants.from_seconds(np.arange(12).reshape(3, 4), np.linspace(0.0, 0.9, 12).reshape(3, 4), "TT")
    assert to_json(base[::2, ::-1]) == to_json(tscale.Instants(*(np.array(p) for p in base[::2, ::-1].pair), "TT"))
    infinite = chain_budget_line()
    assert from_json(to_json(infinite)).dof == np.inf


def chain_budget_line() -> Any:
    chain, t = made.CHAINS["to the barycentre"]()
    return next(part for part in chain.budget(t).contributions if part.dof == np.inf)


# ---- damage --------------------------------------------------------------------------------------


OUT: Any = object()


def changed(text: str, **fields: Any) -> str:
    """A document with fields changed by hand, or taken out, and without its hash."""
    document = {**json.loads(text), **fields, "document_sha256": OUT}
    return json.dumps({key: value for key, value in document.items() if value is not OUT})


T = to_json(tscale.Instants.from_seconds([1, 2], [0.5, 0.25], scale="TT"))
SITE = to_json(made.SITE)


@pytest.mark.parametrize(
    ("text", "words"),
    [
        ("", "no JSON document"),
        ("[1, 2]", "a JSON object"),
        (T[:-5], "no JSON document"),
        (b"\xff\xfe{", "no JSON document"),
        (T.replace("0.25", "0.26"), "SHA-256"),
        (SITE.replace("Kestrel", "Costrel"), "SHA-256"),
        (changed(T, version=2), "later version"),
        (changed(T, version=OUT), "its version"),
        (changed(T, version=True), "its version"),
        (changed(T, kind="Epoch"), "no document holds a Epoch"),
        (changed(T, kind=["Instants"]), "says its kind"),
        (changed(T, whole=OUT), "lacks whole"),
        (changed(T, colour="red"), "holds colour"),
        (changed(T, whole=[1]), "1 whole seconds and 2 fractions"),
        (changed(T, whole=[1, 2.5]), "values of an array of int64"),
        (changed(T, whole=[1, 2**63]), "no int64"),
        (changed(T, whole="12"), "list of numbers"),
        (changed(T, fraction=[0.5, 1.0]), r"not in \[0, 1\)"),
        (changed(T, fraction=[0.5, "nan"]), r"not in \[0, 1\)"),
        (changed(T, fraction=[0.5, "half"]), "no float64"),
        (changed(T, fraction=[0.5, True]), "values of an array"),
        (changed(T, scale="XYZ"), "unknown scale"),
        (changed(T, shape=[-1, -2]), "a shape"),
        (changed(T).replace("0.25", "NaN"), "no JSON number"),
        (changed(T).replace("0.25", "1e999"), "beyond the range"),
        (changed(T).replace('"scale"', '"place": null, "scale"'), "stands in it twice"),
        (changed(SITE, position_m=[1.0, 2.0, 3.0]), "from the geocentre"),
        (changed(SITE, position_m="far"), "Site cannot be made"),
        (changed(SITE, position_m={"array": "complex", "shape": [], "values": []}), "arrays are of"),
        (changed(SITE, position_m={"mapping": 3}), "nothing is written as"),
        (changed(SITE, position_m={"kind": "Sight"}), "kind 'Sight'"),
        ("[" * 100_000, "nested"),
        ('{"kind": "Site", "version": 1, "name": ' + "[" * 900 + "]" * 900 + "}", "Site|nested"),
    ],
)
def test_damaged_documents(text: str, words: str) -> None:
    with pytest.raises(DataFileError, match=words):
        from_json(text)


@pytest.mark.parametrize("name", ["predicted log", "states", "flight", "kepler", "chain"])
def test_no_damage_is_anything_but_a_data_file_error(name: str) -> None:
    value = made.CHAINS["to the barycentre"]()[0] if name == "chain" else {**made.LOGS, **made.ORBITS}[name]()
    document = json.loads(to_json(value))
    del document["document_sha256"]
    bad = 0
    for path in list(_paths(document)):
        for other in (None, "x", -3, [], {"mapping": {}}, {"float": "nan"}):
            try:
                from_json(json.dumps(_with(document, path, other)))
            except DataFileError:
                bad += 1
            except MissingPiece:  # a chain whose pieces do not reach any more
                bad += 1
    assert bad > 20


def _paths(value: Any, trail: tuple[Any, ...] = ()) -> Any:
    items = value.items() if isinstance(value, dict) else enumerate(value[:2]) if isinstance(value, list) else ()
    for key, held in items:
        if len(trail) < 5:
            yield (*trail, key)
            yield from _paths(held, (*trail, key))


def _with(value: Any, path: tuple[Any, ...], other: Any) -> Any:
    if not path:
        return other
    copy = dict(value) if isinstance(value, dict) else list(value)
    copy[path[0]] = _with(value[path[0]], path[1:], other)
    return copy


def test_documents_changed_by_hand_are_read_without_their_hash() -> None:
    assert from_json(changed(SITE, name="Kestrel Hill")).name == "Kestrel Hill"
    # A field that a later release added with a default may be missing.
    assert from_json(changed(SITE, solid_tide=OUT)) == made.SITE


def test_what_has_no_layout(reference: tscale.ReferenceData) -> None:
    for value in (reference, reference.leap_seconds, 3.5, "text", object(), [made.SITE]):
        with pytest.raises(InvalidInput, match="no layout"):
            to_json(value)
    with pytest.raises(InvalidInput, match="reads a text"):
        from_json(Path("x"))  # type: ignore[arg-type]


def test_what_is_kept_otherwise_says_how(reference: tscale.ReferenceData) -> None:
    compiled = tscale.chain("UTC", "TAI").compile("2020-01-01", "2020-01-03")
    with pytest.raises(InvalidInput, match=r"a CompiledChain; keep it with its own save\(path\) .*load_compiled"):
        to_json(compiled)
    with pytest.raises(InvalidInput, match=r"a ReferenceData; its tables are files: keep those, .*reference="):
        to_json(reference)
