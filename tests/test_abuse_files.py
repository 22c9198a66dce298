"""Files that are damaged, processes that are killed, crowds, full disks, folders that are not there, and no network.

Short versions; the long ones are the scripts in `tests/abuse`.
"""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

import tscale
from tscale.cli.main import main
from tscale.earth.gravity import HarmonicField
from tscale.ephemeris.daf import read_container
from tscale.ephemeris.time_ephemeris import TimeEphemeris
from tscale.errors import DataFileError, TscaleError
from tscale.formats.leap_seconds import LeapSeconds
from tscale.storage import read_bytes, write_atomically

from .abuse.crowd import crowd
from .abuse.damage import TRIALS, trial
from .abuse.kills import CASES
from .abuse.support import ROOT, chain_over, dates, digest, environment, excerpt, python


@pytest.mark.parametrize("name", sorted(TRIALS))
def test_damage_is_detected_or_does_no_harm(name: str, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("TSCALE_CACHE", str(tmp_path / "cache"))
    found = trial(name, 4 if name == "kernel_in_use" else 40, tmp_path)
    assert found["refused"] + found["rebuilt"] + found["same"] + found["other"] > 0
    if name != "kernel_in_use":  # no checksum says what its numbers were
        assert not found["other"]


@pytest.mark.parametrize("name", sorted(CASES))
def test_kill_9_leaves_what_was_or_what_is_whole(name: str, tmp_path: Path) -> None:
    # In a process of one thread, for it forks.
    words = python(ROOT / "tests" / "abuse" / "kills.py", "--kills", "3", "--cases", name)
    done = subprocess.run(words, env=environment(tmp_path), capture_output=True, text=True, timeout=120)
    assert done.returncode == 0, done.stderr[-3000:]
    assert "killed while at work" in done.stdout


def test_a_crowd_gets_the_same_bytes_from_a_cold_cache(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    found, count, _ = crowd(tmp_path, processes=3, threads=5, wait_s=1.0)
    assert count == 15
    monkeypatch.setenv("TSCALE_CACHE", str(tmp_path / "cache"))
    chain = chain_over(tmp_path / "kernel.bsp")
    t = chain(dates(7))
    assert found == {digest(t, chain.inverse(t))}


def test_what_the_dead_left_in_the_cache_goes(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("TSCALE_CACHE", str(tmp_path))
    old, new, other = (tmp_path / f"{name}.part" for name in (".0123456789abcdef", ".fedcba9876543210", "mine"))
    for path in (old, new, other):
        path.write_bytes(b"half")
    os.utime(old, (0, 0))
    os.utime(other, (0, 0))
    TimeEphemeris.of(tscale.Ephemeris.open(excerpt(tmp_path / "kernel.bsp", 100.0)))
    assert not old.exists()
    assert new.exists()
    assert other.exists()


@pytest.mark.parametrize("value", [np.nan, np.inf, 1e308])
def test_a_kernel_whose_numbers_give_no_position_says_so(tmp_path: Path, value: float) -> None:
    path = excerpt(tmp_path / "kernel.bsp", 64.0)
    kernel = tscale.Ephemeris.open(path)
    tdb = (np.array([-725_000_000]), np.array([0.5]))
    assert np.isfinite(kernel.state("mars", tdb)).all()
    whole = path.read_bytes()
    first = next(a for a in read_container(path).arrays if a.target == 4)
    at = whole.index(first.words[:8].astype("<f8").tobytes())
    words = np.frombuffer(whole[at:], "<f8").copy()
    words[2 : first.words.size - 4] = value
    other = tmp_path / "damaged.bsp"
    other.write_bytes(whole[:at] + words.tobytes())
    kernel = tscale.Ephemeris.open(other)
    with pytest.raises(DataFileError, match=r"mars \(4\) .* no finite position") as caught:
        kernel.state("mars", tdb)
    assert caught.value.path == other
    assert np.isfinite(kernel.state("earth", tdb)).all()


# ---- disks and folders -----------------------------------------------------------------------------


FULL = """
import resource, sys, warnings
from pathlib import Path
import tscale
from tests.abuse.support import chain_over, dates, digest
from tscale.cli.main import main
from tscale.errors import TscaleError
folder = Path(sys.argv[1])
# As on a full disk, no file can grow past this.
resource.setrlimit(resource.RLIMIT_FSIZE, (8192, 8192))
with warnings.catch_warnings(record=True) as said:
    warnings.simplefilter("always")
    print(digest(chain_over(folder / "kernel.bsp")(dates(7))))
print(sum("it is built in memory each time" in str(w.message) for w in said), len(said))
print(main(["convert", str(folder / "in.csv"), str(folder / "out.csv"), "--to", "TT", "--from", "UTC", "--quiet"]))
try:
    tscale.chain("UTC", "TDB@GEOCENTER").compile("2020-01-01", "2020-03-09").save(folder / "chain")
except (OSError, TscaleError) as error:
    print("no chain:", error)
"""


def test_a_full_disk_costs_nothing_but_what_was_to_be_stored(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tmp_path / "in.csv").write_text("t\n" + "2025-01-01\n" * 2000)
    (tmp_path / "out.csv").write_text("before")
    excerpt(tmp_path / "kernel.bsp")
    words = [sys.executable, "-c", FULL, tmp_path]
    done = subprocess.run(words, env=environment(tmp_path / "cache"), capture_output=True, text=True, timeout=60)
    assert done.returncode == 0, done.stderr
    monkeypatch.setenv("TSCALE_CACHE", str(tmp_path / "other"))
    expected = digest(chain_over(tmp_path / "kernel.bsp")(dates(7)))
    found = done.stdout.split("\n")
    assert found[:3] == [expected, "1 1", "2"]
    assert found[3].startswith("no chain: ")
    assert found[3].endswith("File too large")
    assert "out.csv: File too large" in done.stderr
    assert (tmp_path / "out.csv").read_text() == "before"
    assert sorted(p.name for p in tmp_path.iterdir()) == ["cache", "in.csv", "kernel.bsp", "other", "out.csv"]
    assert [p.name for p in (tmp_path / "cache").iterdir() if not p.name.endswith(".lock")] == []


PLAIN = """
import sys, warnings
from pathlib import Path
from tests.abuse.support import chain_over, dates, digest
with warnings.catch_warnings(record=True) as said:
    warnings.simplefilter("always")
    print(digest(chain_over(Path(sys.argv[1]))(dates(7))), len(said), *(w.message for w in said))
"""


KEPT_OUT = """
import os, warnings
import tscale
from tscale.ephemeris.time_ephemeris import TimeEphemeris
kernel = tscale.Ephemeris.open("KERNEL")
kernel.sha256
TimeEphemeris.of(tscale.Ephemeris.default())
os.setgroups([]); os.setgid(54321); os.setuid(54321)
with warnings.catch_warnings(record=True) as said:
    warnings.simplefilter("always")
    TimeEphemeris.of(kernel)
print(len(said), *("Permission denied" for w in said if "Permission denied" in str(w.message)))
"""


@pytest.mark.parametrize(
    ("change", "warnings"),
    [
        ({"TSCALE_CACHE": "/proc/none"}, 1),  # no folder can be made there
        ({"TSCALE_CACHE": "/dev/null/x"}, 1),
        ({"TSCALE_CACHE": "", "HOME": "/proc/home"}, 1),
        ({"TSCALE_CACHE": "~nobody-of-this-name/x"}, 1),
        ({"TSCALE_CACHE": "a\nb/\u2028\udcff"}, 0),
        ({"TSCALE_CACHE": "x" * 300}, 1),
        ({"TSCALE_CACHE": "loop"}, 1),
    ],
)
def test_caches_that_cannot_be_and_no_home(tmp_path: Path, change: dict[str, str | None], warnings: int | None) -> None:
    kernel = excerpt(tmp_path / "kernel.bsp")
    (tmp_path / "loop").symlink_to("loop")
    given = environment(tmp_path) | {k: v for k, v in change.items() if v is not None}
    given = {key: value for key, value in given.items() if change.get(key, "") is not None}
    words = [sys.executable, "-c", PLAIN, kernel]
    done = subprocess.run(words, env=given, cwd=tmp_path, capture_output=True, text=True, timeout=60)
    assert done.returncode == 0, done.stderr[-2000:]
    result, said, *words = done.stdout.split()
    assert len(result) == 64
    assert int(said) == warnings
    assert not warnings or "built in memory each time" in " ".join(words)
    assert not any(name.startswith("~") for name in os.listdir(tmp_path))


def test_a_home_that_nobody_knows_makes_no_folder_called_so(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    kernel = tscale.Ephemeris.open(excerpt(tmp_path / "kernel.bsp", 100.0))
    monkeypatch.chdir(tmp_path)
    monkeypatch.delenv("TSCALE_CACHE", raising=False)
    # What the platform says for a user without an entry, where $HOME is not set.
    monkeypatch.setattr("platformdirs.user_cache_path", lambda *_, **__: Path("~/.cache/tscale"))
    monkeypatch.setattr("os.path.expanduser", lambda path: path)
    with pytest.warns(UserWarning, match="no such home folder"):
        TimeEphemeris.of(kernel)
    assert os.listdir(tmp_path) == ["kernel.bsp"]


@pytest.mark.skipif(os.geteuid() != 0, reason="only root can become another user")
def test_a_cache_that_may_be_read_by_its_owner_alone(tmp_path: Path) -> None:
    code = KEPT_OUT.replace("KERNEL", str(excerpt(tmp_path / "kernel.bsp", 100.0)))
    (tmp_path / "cache").mkdir(mode=0o700)
    done = subprocess.run(
        [sys.executable, "-c", code], env=environment(tmp_path / "cache"), capture_output=True, text=True, timeout=60
    )
    assert done.stdout.strip() == "1 Permission denied", done.stderr[-2000:]


READERS = (
    tscale.Site.load,
    tscale.Source.load,
    tscale.ClockLog.load,
    tscale.ClockLog.inspect,
    tscale.Ephemeris.open,
    tscale.Trajectory.from_oem,
    tscale.Trajectory.from_flight,
    tscale.load_compiled,
    LeapSeconds.load,
    HarmonicField.load,
    TimeEphemeris.open,
)


@pytest.mark.parametrize("read", READERS, ids=lambda read: read.__qualname__)
def test_hostile_paths(read: object, tmp_path: Path) -> None:
    """Names of nothing, of folders, of loops, too long, no text, with NUL: an error of ours, or of the system's."""
    (tmp_path / "loop").symlink_to(tmp_path / "loop")
    (tmp_path / "dangling").symlink_to(tmp_path / "nowhere")
    names = (
        "loop",
        "dangling",
        "",
        ".",
        "new\nline",
        "\udcff",
        "\u202egnp.exe",
        "x" * 300,
        "a/" * 3000 + "b",
        "nul\0nul",
    )
    for name in names:
        if "\0" in name and read == tscale.load_compiled:
            continue
        with pytest.raises(TscaleError):
            read(f"{tmp_path}/{name}")  # type: ignore[operator]


def test_files_of_odd_names_are_written_and_read(tmp_path: Path) -> None:
    for name in ("new\nline.csv", "\u202egnp.csv", "\udcff.csv", "-o.csv", " .csv", "x" * 250, "%s{}.csv", "*?[.csv"):
        source, out = tmp_path / name, tmp_path / f"{name[:240]}.out"
        source.write_text("t\n2025-01-01\n")
        assert main(["convert", str(source), str(out), "--from", "UTC", "--to", "TAI", "--digits", "0", "--quiet"]) == 0
        assert out.read_text() == "t,TAI\n2025-01-01,2025-01-01T00:00:37\n"
    assert not list(tmp_path.glob(".*.part"))


def test_more_than_is_read_of_such_a_file_is_refused(tmp_path: Path) -> None:
    path = tmp_path / "f"
    write_atomically(path, bytes(3 << 20))
    assert len(read_bytes(path, 3 << 20)) == 3 << 20
    with pytest.raises(DataFileError, match="more than 2 MiB") as caught:
        read_bytes(path, 2 << 20)
    assert caught.value.path == path


# ---- the network -----------------------------------------------------------------------------------


WATCHED = """
import sys
calls = []
watched = ("socket.", "urllib.", "http.", "ftplib.", "ssl.")
sys.addaudithook(lambda name, args: calls.append((name, args)) if name.startswith(watched) else None)
from pathlib import Path
from tests.abuse.support import chain_over, dates
import tscale
from tscale.cli.main import main
folder = Path(sys.argv[1])
chain = chain_over(folder / "kernel.bsp")
chain.inverse(chain(dates(1)))
chain.ledger(dates(1)).table()
chain.budget(dates(1)[:2]).table()
today = tscale.chain("UTC", "TDB@BARYCENTER", site=chain._supplies.site, source=chain._supplies.source)
today.compile("2025-01-01", "2025-01-01T06:00:00", tolerance_s=1e-11).save(folder / "chain")
tscale.load_compiled(folder / "chain")
convert = ["convert", str(folder / "in.csv"), str(folder / "out.csv"), "--from", "UTC", "--to"]
for words in ([*convert, "UT1", "--quiet"], [*convert, "TDB@GEOCENTER"], ["data"]):
    assert main(words) == 0
print("calls", len(calls), calls[:3])
"""


def test_no_socket_is_opened_from_end_to_end(tmp_path: Path) -> None:
    """Not one event of a socket in the interpreter, from the import to the last file written."""
    excerpt(tmp_path / "kernel.bsp")
    (tmp_path / "in.csv").write_text("t\n2025-01-01\n")
    words = [sys.executable, "-c", WATCHED, tmp_path]
    done = subprocess.run(words, env=environment(tmp_path / "cache"), capture_output=True, text=True, timeout=60)
    assert done.returncode == 0, done.stderr[-2000:]
    assert done.stdout.rstrip().endswith("calls 0 []")
