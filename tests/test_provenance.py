"""Provenance: what a result was made of, the same bytes for the same inputs, another digest for other ones."""

from __future__ import annotations

import dataclasses
import hashlib
import json
import pickle
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import tscale
from tscale.chains import Chain
from tscale.cli.main import main
from tscale.errors import DataFileError, InvalidInput
from tscale.provenance import content_sha256, provenance_of, tables_read

EXAMPLES = Path(__file__).parents[1] / "examples"
SITE = tscale.Site.load(EXAMPLES / "site.toml")
STAR = tscale.Source.load(EXAMPLES / "source.toml")
LOGS = [tscale.ClockLog.load(EXAMPLES / name) for name in ("maser.csv", "utc_krl.csv")]
READING = tscale.Instants.from_iso(["2025-03-03T12:21:00.639426798458"], scale="CLOCK(maser)")
ORBIT = tscale.Trajectory.from_kepler(
    tscale.Instants.from_iso("2025-03-01T00:00:00", scale="UTC"), 7.0e6, 0.001, 51.6, 20.0, 0.0, 0.0
)


def whole_chain(**other: Any) -> Chain:
    pieces: dict[str, Any] = {"site": SITE, "clocks": LOGS, "source": STAR, **other}
    return tscale.chain("CLOCK(maser)", "TDB@BARYCENTER", **pieces)


@pytest.mark.parametrize(
    ("start", "end", "pieces", "read"),
    [
        ("TAI", "TT", {}, []),
        ("TT", "TCG", {}, []),
        ("GPS", "BDT", {}, []),
        ("UTC", "GPS", {}, ["leap seconds"]),
        ("TAI", "UT1", {}, ["Earth orientation"]),
        ("UTC", "UT1", {}, ["leap seconds", "Earth orientation"]),
        ("TCB@BARYCENTER", "TDB@BARYCENTER", {}, []),
        ("TT", "TDB@GEOCENTER", {}, ["ephemeris", "time ephemeris"]),
        ("TT", "TDB", {"site": SITE}, ["Earth orientation", "celestial pole", "ephemeris", "time ephemeris"]),
        ("TT", "TDB", {"site": ORBIT}, ["ephemeris", "time ephemeris"]),
        ("TDB@GEOCENTER", "TDB@BARYCENTER", {"source": STAR}, ["ephemeris", "time ephemeris"]),
    ],
)
def test_the_tables_that_are_read(start: str, end: str, pieces: dict[str, Any], read: list[str]) -> None:
    assert list(tables_read(tscale.chain(start, end, **pieces))) == read


def test_what_is_recorded(reference: tscale.ReferenceData) -> None:
    made = whole_chain().provenance(READING)
    facts = {fact.table: fact for fact in reference.describe()}
    assert [table.table for table in made.tables] == [
        "leap seconds",
        "Earth orientation",
        "celestial pole",
        "ephemeris",
        "time ephemeris",
    ]
    for table in made.tables:
        if table.table != "celestial pole":
            fact = facts[table.table]
            assert dataclasses.astuple(table) == (
                fact.table, fact.name, fact.start, fact.end, fact.issued, fact.expires, fact.sha256,
            )  # fmt: skip
    for log, record in zip(LOGS, made.clocks, strict=True):
        assert (record.scale, record.reference, record.name) == (log.scale, log.reference, log.name)
        assert log.path is not None
        assert record.sha256 == hashlib.sha256(log.path.read_bytes()).hexdigest()
        assert record.comparisons == len(log)
    assert made.observer is not None
    assert made.observer["position_m"] == SITE.position_m
    assert made.source is not None
    assert made.source["parallax_mas"] == STAR.parallax_mas
    assert made.dates is not None
    assert (made.dates["count"], made.dates["first"]) == (1, "2025-03-03T12:21:00.639426798458000")
    assert made.path == str(whole_chain())
    assert [step.title for step in made.steps] == [step.title for step in whole_chain().steps]
    assert made.software["numpy"] == np.__version__
    assert made.software["tscale"] == tscale.__version__


def test_what_is_not_read_is_not_recorded() -> None:
    made = tscale.chain("UTC", "TAI", site=SITE, clocks=LOGS, source=STAR).provenance()
    assert (made.clocks, made.observer, made.source, made.dates, made.notes) == ((), None, None, None, ())


def test_json_is_canonical_and_the_same_in_another_process() -> None:
    made = whole_chain().provenance(READING)
    text = made.to_json()
    assert text == whole_chain().provenance(READING).to_json() == pickle.loads(pickle.dumps(made)).to_json()
    held = json.loads(text)
    assert list(held) == sorted(held)
    assert held["digest"] == made.digest
    assert json.loads(made.to_json(indent=2)) == held
    assert str(Path.cwd().anchor + "work") not in text
    assert str(EXAMPLES.resolve()) not in text
    code = (
        "import sys; sys.path.insert(0, '.'); import tests.test_provenance as t; "
        "print(t.whole_chain().provenance(t.READING).to_json())"
    )
    other = subprocess.run(
        [sys.executable, "-c", code],
        cwd=EXAMPLES.parent,
        env={"PYTHONHASHSEED": "77", "PATH": "", "HOME": str(Path.home())},
        capture_output=True,
        text=True,
        check=True,
    )
    assert other.stdout.rstrip("\n") == text


OTHERS: dict[str, Callable[[], Chain]] = {
    "second order": lambda: whole_chain(second_order=True),
    "site": lambda: whole_chain(site=dataclasses.replace(SITE, epoch_jyear=2021.0)),
    "orbit": lambda: whole_chain(site=ORBIT),
    "source": lambda: whole_chain(source=dataclasses.replace(STAR, parallax_mas=6.3)),
    "interpolation": lambda: whole_chain(
        clocks=[tscale.ClockLog.load(EXAMPLES / "maser.csv", interpolation="step"), LOGS[1]]
    ),
    "gaps": lambda: whole_chain(clocks=[tscale.ClockLog.load(EXAMPLES / "maser.csv", max_gap_s=3600), LOGS[1]]),
    "leap seconds": lambda: whole_chain(
        reference=tscale.ReferenceData(leap_seconds=tscale.LeapSeconds.default().with_step(62502, 36))
    ),
    "Earth orientation": lambda: whole_chain(
        reference=tscale.ReferenceData(earth_orientation=tscale.EarthOrientation.constant(ut1_minus_utc_s=0.1))
    ),
    "masses": lambda: whole_chain(
        reference=tscale.ReferenceData(
            ephemeris=tscale.Ephemeris.open(tscale.Ephemeris.default().path, gm_m3_s2={"sun": 1.3e20}),
            time_ephemeris=tscale.ReferenceData.default().time_ephemeris,
        )
    ),
}


@pytest.mark.parametrize("what", OTHERS)
def test_other_inputs_have_another_digest(what: str) -> None:
    assert OTHERS[what]().provenance().digest != whole_chain().provenance().digest


def test_other_dates_have_another_digest() -> None:
    chain = whole_chain()
    digests = {made.digest for made in (chain.provenance(), chain.provenance(READING))}
    digests.add(chain.provenance(READING.shifted(1e-15)).digest)
    assert len(digests) == 3


def test_a_free_clock_is_told() -> None:
    site = dataclasses.replace(SITE, height_above_geoid_m=600.0)
    set_at = tscale.Instants.from_iso("2026-01-01T00:00:00", scale="TT")
    made = [
        tscale.chain(
            "PROPER(free)", "TT", clocks=[tscale.ProperClock("free", site, set_at, rate_offset=rate)]
        ).provenance()
        for rate in (0.0, 0.0, 1e-13)
    ]
    assert made[0].digest == made[1].digest != made[2].digest
    assert json.loads(made[2].to_json())["options"]["free"][0]["rate_offset"] == 1e-13


def test_names_of_files_do_not_count(tmp_path: Path) -> None:
    copy = tmp_path / "other_name.csv"
    copy.write_bytes((EXAMPLES / "maser.csv").read_bytes())
    made = whole_chain(clocks=[tscale.ClockLog.load(copy), LOGS[1]]).provenance()
    assert made.digest == whole_chain().provenance().digest
    assert made.clocks[0].name == "other_name.csv"


def test_notes_are_told() -> None:
    late = tscale.Instants.from_iso("2027-03-03T00:00:00", scale="UTC")
    made = tscale.chain("UTC", "TDB", site=SITE).provenance(late)
    assert made.notes == ("1 of 1 instants use predicted Earth orientation",)
    assert "# note: 1 of 1 instants use predicted Earth orientation" in made.header()


def test_a_table_that_cannot_be_read_raises(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def lost(self: Any) -> Any:
        raise DataFileError("no such table", path=tmp_path / "lost")

    monkeypatch.setattr(tscale.ReferenceData, "ephemeris", property(lost))
    chain = tscale.chain("TT", "TDB@GEOCENTER", reference=tscale.ReferenceData())
    with pytest.raises(DataFileError, match="no such table"):
        provenance_of(chain)


def test_header_is_comment_lines() -> None:
    odd = dataclasses.replace(STAR, name="two\nlines")
    lines = whole_chain(source=odd).provenance().header()
    assert all(line.startswith("# ") and line.isprintable() for line in lines)
    assert any("two\\nlines" in line for line in lines)
    assert lines[-1].startswith("# digest: SHA-256 ")


@pytest.mark.parametrize(
    ("a", "b"),
    [
        (1, 1.0),
        (1, True),
        ("1", 1),
        (("ab", "c"), ("a", "bc")),
        ((1, (2, 3)), ((1, 2), 3)),
        (0.0, -0.0),
        (np.zeros(3), np.zeros((3, 1))),
        (np.zeros(3), np.zeros(3, dtype=np.float32)),
        ({"a": 1}, {"a": 2}),
        (None, ()),
        ({1, 2}, {1, 3}),
    ],
)
def test_contents_that_differ(a: Any, b: Any) -> None:
    assert content_sha256(a) != content_sha256(b)


def test_contents_that_are_the_same() -> None:
    assert content_sha256({"a": 1, "b": 2}) == content_sha256({"b": 2, "a": 1})
    assert content_sha256(np.arange(6.0)[::2]) == content_sha256(np.array([0.0, 2.0, 4.0], dtype=">f8"))
    assert content_sha256(np.float64(0.1)) == content_sha256(0.1)
    assert content_sha256({3, 1}) == content_sha256({1, 3})
    assert content_sha256(SITE) == content_sha256(dataclasses.replace(SITE, name="another name"))
    with pytest.raises(InvalidInput, match="content of a generator"):
        content_sha256(x for x in ())


# ---- the command -----------------------------------------------------------------------------------

OPTIONS = ["--site", str(EXAMPLES / "site.toml"), "--clock", str(EXAMPLES / "maser.csv")]
OPTIONS += ["--clock", str(EXAMPLES / "utc_krl.csv"), "--to", "TCB", "--to", "TDB", "--quiet"]


def test_convert_writes_it_at_the_head_and_beside(tmp_path: Path) -> None:
    plain, out, again, file = (tmp_path / name for name in ("plain.csv", "out.csv", "again.csv", "made.json"))
    given = str(EXAMPLES / "readings.csv")
    assert main(["convert", given, str(plain), *OPTIONS]) == 0
    for path in (out, again):
        assert main(["convert", given, str(path), *OPTIONS, "--provenance", "--provenance-file", str(file)]) == 0
    assert out.read_bytes() == again.read_bytes()
    text = out.read_text()
    assert text.endswith(plain.read_text())
    head = text[: -len(plain.read_text())].splitlines()
    chains = [tscale.chain("CLOCK(maser)", end, site=SITE, clocks=LOGS) for end in ("TCB", "TDB")]
    wanted = [line for chain in chains for line in chain.provenance().header()]
    assert head == list(dict.fromkeys(wanted))
    held = json.loads(file.read_text())
    assert held["rows"] == 672
    assert held["results"]["TDB@TOPOCENTER"] == json.loads(chains[1].provenance().to_json())


def test_convert_keeps_its_files_apart(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    out = str(tmp_path / "out.csv")
    assert main(["convert", str(EXAMPLES / "readings.csv"), out, *OPTIONS, "--provenance-file", out]) == 2
    assert "a name of its own" in capsys.readouterr().err
    assert not Path(out).exists()


def test_an_orbit_of_a_kernel_can_be_told() -> None:
    from tscale.ephemeris.shipped import shipped_path

    source = tscale.Source(10.0, 20.0)
    digests = {
        tscale.chain(
            "TDB",
            "TDB@BARYCENTER",
            site=tscale.Trajectory.from_spk(shipped_path("de440_1960_2060.bsp"), target=target),
            source=source,
        )
        .provenance()
        .digest
        for target in (301, 301, 399)
    }
    assert len(digests) == 2
