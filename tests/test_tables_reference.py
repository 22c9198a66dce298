"""The bundle of tables: lazy, immutable, replaceable, the same from every thread."""

from __future__ import annotations

import pickle
import subprocess
import sys
import threading
import time
from datetime import date
from pathlib import Path
from typing import Any

import numpy as np
import pytest
from astropy_iers_data import IERS_A_FILE, IERS_LEAP_SECOND_FILE
from jplephem.excerpter import write_excerpt
from jplephem.spk import SPK

import tscale
from tscale.errors import DataFileError, InvalidInput, MissingPiece
from tscale.formats.leap_seconds import LeapSeconds
from tscale.instants import Instants
from tscale.tables import TTBIPM, EarthOrientation, ReferenceData


def bipm(name: str = "BIPM08") -> TTBIPM:
    return TTBIPM.from_rows(name, [54289, 54299], [26.9755e-6, 26.9783e-6])


def test_default_is_one_value_with_the_default_tables() -> None:
    reference = ReferenceData.default()
    assert reference is ReferenceData.default()
    assert reference.leap_seconds is LeapSeconds.default()
    assert reference.earth_orientation is EarthOrientation.default()
    assert reference.tt_bipm == ()
    assert reference.time_ephemeris is reference.time_ephemeris


def test_making_one_opens_nothing() -> None:
    """In a fresh interpreter, so that no other test has read the tables before."""
    code = (
        "import io, sys\n"
        "seen = []\n"
        "sys.addaudithook(lambda event, args: seen.append(str(args[0])) if event == 'open' else None)\n"
        "from tscale.tables import ReferenceData\n"
        "ReferenceData.default().replace(tt_bipm=None)\n"
        "bad = [name for name in seen if name.endswith(('.bsp', '.all', '-now', 'Leap_Second.dat'))]\n"
        "assert not bad, bad\n"
    )
    subprocess.run([sys.executable, "-c", code], check=True, timeout=60)


def test_load_takes_paths_and_objects(tmp_path: Path) -> None:
    path = tmp_path / "TTBIPM.23"
    path.write_text("54289. 1.0000 26.9755\n54299. 1.0000 26.9783\n")
    reference = ReferenceData.load(
        leap_seconds=IERS_LEAP_SECOND_FILE,
        earth_orientation=Path(IERS_A_FILE),
        tt_bipm=[path, bipm()],
        ephemeris=ReferenceData.default().ephemeris.path,
    )
    assert [table.scale for table in reference.tt_bipm] == ["TT(BIPM23)", "TT(BIPM08)"]
    assert reference.realisation("TT(BIPM23)").path == path
    assert reference.earth_orientation.name == "finals2000A.all"
    assert reference.ephemeris.sha256 == ReferenceData.default().ephemeris.sha256
    assert ReferenceData.load(tt_bipm=path).tt_bipm[0].scale == "TT(BIPM23)"
    with pytest.raises(DataFileError):
        ReferenceData.load(earth_orientation=tmp_path / "none")


def test_earth_orientation_follows_the_leap_seconds() -> None:
    """A made-up second at the start of 2020: rows from that day on stand one second later in TAI, UT1-TAI one lower."""
    plain = LeapSeconds.default()
    made_up = plain.with_step(58849, 38)
    changed = ReferenceData(leap_seconds=made_up).earth_orientation
    default = EarthOrientation.default()
    assert changed is not default
    tai = (np.array([600_000_000, 700_000_000]), np.zeros(2))
    shift = changed.ut1_minus_tai_s((tai[0] + [0, 1], tai[1])) - default.ut1_minus_tai_s(tai)
    np.testing.assert_allclose(shift, [0.0, -1.0], rtol=0, atol=1e-13)


def test_replace() -> None:
    first = ReferenceData.default()
    second = first.replace(tt_bipm=bipm())
    assert first.tt_bipm == ()
    assert second.tt_bipm[0].scale == "TT(BIPM08)"
    assert second.replace(tt_bipm=None).tt_bipm == ()
    assert second.replace(leap_seconds=LeapSeconds.default().with_expiry(None)).tt_bipm == second.tt_bipm
    with pytest.raises(InvalidInput, match="no table is called leapseconds"):
        first.replace(leapseconds=None)


def test_fingerprint_tells_bundles_apart(tmp_path: Path) -> None:
    default = ReferenceData.default()
    (tmp_path / "other.bsp").write_bytes(default.ephemeris.path.read_bytes() + bytes(1024))
    prints = {
        default.fingerprint,
        default.replace(tt_bipm=bipm()).fingerprint,
        default.replace(tt_bipm=bipm("BIPM09")).fingerprint,
        default.replace(leap_seconds=LeapSeconds.default().with_step(63000, 36)).fingerprint,
        default.replace(earth_orientation=EarthOrientation.constant()).fingerprint,
        default.replace(ephemeris=tmp_path / "other.bsp").fingerprint,
    }
    assert len(prints) == 6
    assert ReferenceData().fingerprint == default.fingerprint


def test_describe() -> None:
    rows = ReferenceData.default().replace(tt_bipm=bipm()).describe(date(2027, 1, 1))
    assert [row.table for row in rows] == [
        "leap seconds",
        "Earth orientation",
        "TT(BIPM08)",
        "ephemeris",
        "time ephemeris",
    ]
    for row in rows:
        date.fromisoformat(row.start)
        assert row.end is None or row.start < date.fromisoformat(row.end).isoformat()
        assert len(row.sha256) == 64
    assert rows[1].start == "1962-01-01"
    assert rows[1].issued is not None
    assert rows[1].age_days == (date(2027, 1, 1) - date.fromisoformat(rows[1].issued)).days
    assert rows[2][2:4] == ("2007-07-08", "2007-07-18")
    assert ReferenceData.default().describe()[1].age_days is not None


@pytest.mark.parametrize(
    "members",
    [
        {"leap_seconds": "Leap_Second.dat"},
        {"earth_orientation": 3},
        {"tt_bipm": ["TTBIPM.08"]},
        {"ephemeris": "de440.bsp"},
        {"time_ephemeris": "tt_tdb.bsp"},
        {"tt_bipm": 5},
    ],
)
def test_members_of_another_type(members: Any) -> None:
    with pytest.raises(InvalidInput, match=r"ReferenceData\.load"):
        ReferenceData(**members)


@pytest.mark.parametrize(
    ("make", "words"),
    [
        (lambda reference: reference.load(tt_bipm=5), "tt_bipm must be TTBIPM tables.*got 5"),
        (lambda reference: reference.load(foo=1), "no table is called foo; there are leap_seconds"),
        (lambda reference: reference.load(time_ephemeris=3), "must be a TimeEphemeris, got int"),
        (lambda reference: reference.describe(on="2025"), r"on must be a datetime\.date.*got '2025'"),
    ],
)
def test_bad_arguments(make: Any, words: str) -> None:
    with pytest.raises(InvalidInput, match=words):
        make(ReferenceData.default())


# ---- kernels that do not reach 1977 --------------------------------------------------------------


@pytest.fixture
def recent(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """The shipped kernel from 2024 to 2027."""
    monkeypatch.setenv("TSCALE_CACHE", str(tmp_path / "cache"))
    path = tmp_path / "recent.bsp"
    with SPK.open(ReferenceData.default().ephemeris.path) as kernel, path.open("w+b") as file:
        write_excerpt(kernel, file, 2460310.5, 2461406.5, kernel.daf.summaries())
    return path


def test_recent_kernel_is_anchored_and_says_so(recent: Path) -> None:
    reference = ReferenceData.load(ephemeris=recent)
    shipped = ReferenceData.default().time_ephemeris
    facts = reference.describe()[-1]
    assert facts.name.endswith(f"anchored to {shipped.name}")
    assert facts.error is None
    # The same positions, and TT - TDB continued from a value of the shipped file: only the rounding of the dates,
    # 1.1e-16 s each, is left.
    t = Instants.from_iso(["2024-06-01", "2025-01-01", "2026-09-01"], scale="TT", place="GEOCENTER")
    here, there = (
        tscale.chain("TT@GEOCENTER", "TDB@GEOCENTER", reference=tables)(t)
        for tables in (reference, ReferenceData.default())
    )
    np.testing.assert_allclose(np.asarray(here - there), 0.0, rtol=0, atol=2.3e-16)


def test_time_ephemeris_may_be_given(recent: Path) -> None:
    shipped = ReferenceData.default().time_ephemeris
    assert shipped.path is not None
    own = ReferenceData.load(ephemeris=recent)
    for given in (shipped, shipped.path, str(shipped.path)):
        reference = ReferenceData.load(ephemeris=recent, time_ephemeris=given)
        assert reference.time_ephemeris.sha256 == shipped.sha256
        assert reference.describe()[-1].name == shipped.name
        assert reference.fingerprint != own.fingerprint
        assert reference.fingerprint == own.replace(time_ephemeris=given).fingerprint
        assert reference.replace(time_ephemeris=None).fingerprint == own.fingerprint
        assert pickle.loads(pickle.dumps(reference)).fingerprint == reference.fingerprint
    with pytest.raises(DataFileError):
        ReferenceData.load(time_ephemeris=recent)


def test_describe_lists_what_it_can(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("TSCALE_CACHE", str(tmp_path / "cache"))
    path = tmp_path / "days.bsp"
    with SPK.open(ReferenceData.default().ephemeris.path) as kernel, path.open("w+b") as file:
        write_excerpt(kernel, file, 2460310.5, 2460312.0, kernel.daf.summaries())
    facts = ReferenceData.load(ephemeris=path).describe()
    assert [row.error is None for row in facts] == [True, True, True, False]
    assert facts[2].name == "days.bsp"
    assert "use a longer kernel" in str(facts[3].error)
    assert facts[3][:4] == ("time ephemeris", "", "", None)


def test_two_tables_of_one_realisation() -> None:
    with pytest.raises(InvalidInput, match="each realisation"):
        ReferenceData(tt_bipm=[bipm(), bipm()])
    with pytest.raises(MissingPiece, match=r"TT\(BIPM23\).*TT\(BIPM08\)"):
        ReferenceData(tt_bipm=[bipm()]).realisation("TT(BIPM23)")


def test_immutable_and_picklable() -> None:
    reference = ReferenceData.default()
    with pytest.raises(AttributeError, match=r"use|Use"):
        reference.leap_seconds = LeapSeconds.default()  # type: ignore[misc]
    assert pickle.loads(pickle.dumps(reference)) is reference
    other = pickle.loads(pickle.dumps(reference.replace(tt_bipm=bipm())))
    assert other.fingerprint == reference.replace(tt_bipm=bipm()).fingerprint


def test_threads_share_one_time_ephemeris(monkeypatch: pytest.MonkeyPatch) -> None:
    reference = ReferenceData(leap_seconds=LeapSeconds.default().with_expiry(None))
    made: list[str] = []
    whole = ReferenceData._make

    def counted(self: ReferenceData, part: str) -> Any:
        made.append(part)
        time.sleep(0.05)  # long enough for all threads to ask meanwhile
        return whole(self, part)

    monkeypatch.setattr(ReferenceData, "_make", counted)
    found: list[int] = []
    gate = threading.Barrier(16)

    def work() -> None:
        gate.wait()
        found.append(id(reference.time_ephemeris))

    threads = [threading.Thread(target=work) for _ in range(16)]
    for thread in threads:
        thread.start()
    for thread in threads:
        thread.join()
    assert len(set(found)) == 1
    assert len(found) == 16
    assert sorted(made) == ["ephemeris", "time_ephemeris"]
