"""Readers under damaged inputs: each refuses in the package's own words or takes what it can, within time and memory.

The corpus and long runs, with coverage to guide them, are in `tests/abuse`.
"""

from __future__ import annotations

import contextlib
import random
import subprocess
import sys
import warnings
from collections.abc import Iterator
from pathlib import Path

import pytest

from tscale.errors import TscaleError

from .abuse.mutate import mutated
from .abuse.support import environment
from .abuse.targets import TARGETS, seeds_of

INPUTS = 150
FEWER = {"command": 15, "fits": 60, "arrow": 60, "json": 80, "earth_orientation": 60, "circular": 60}


@contextlib.contextmanager
def quiet() -> Iterator[None]:
    """Warnings that the package gives on purpose pass; those of numpy do not."""
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        warnings.simplefilter("ignore", UserWarning)
        yield


@pytest.mark.parametrize("name", sorted(TARGETS))
def test_the_corpus_and_what_is_near_it(name: str) -> None:
    seeds = seeds_of(name)
    rng = random.Random(name)
    taken = 0
    for data in seeds + [mutated(rng.choice(seeds), rng, seeds) for _ in range(FEWER.get(name, INPUTS))]:
        with quiet(), contextlib.suppress(TscaleError):
            TARGETS[name](data)
            taken += 1
    assert taken, "a target that takes nothing tests nothing"


HUGE = """
import resource, sys, warnings
from pathlib import Path
import tscale
from tscale.errors import TscaleError
from tscale.files import DelimitedReader, LiveLines, read_dates
from tscale.formats.leap_seconds import LeapSeconds
from tscale.earth.gravity import HarmonicField
from tscale.storage import read_toml
from tscale.tables.earth_orientation import EarthOrientation
from tscale.tables.tt_bipm import TTBIPM

resource.setrlimit(resource.RLIMIT_AS, (2 << 30, 2 << 30))

def file(text, name="f"):
    path = Path(sys.argv[1]) / name
    path.write_bytes(text.encode() if isinstance(text, str) else text)
    return path

class Endless:
    "A stream of one line without an end."
    def readline(self, size): return "9" * size
    def read1(self, size): return b"9" * size
    def __iter__(self): raise AssertionError("read without a bound")

def lines(stream, header=""):
    reader = DelimitedReader(stream, "input")
    return list(reader.blocks(10))

lol = "".join(f'<!ENTITY l{i} "{f"&l{i - 1};" * 10}">' for i in range(1, 12))
bomb = f'<?xml version="1.0"?><!DOCTYPE oem [<!ENTITY l0 "lol">{lol}]><oem version="2.0">&l11;</oem>'
log = "epoch,offset_s,uncertainty_s\\n" + "2025-01-01,1,0\\n" * 10_000
field = Path("GFC").read_text()
SECOND = "2025-01-01T00:00:00"
CASES = {
    "one long date among short ones": lambda: tscale.Instants.from_iso(["2025-01-01"] * 99_999 + ["2" * 10**6], "UTC"),
    "one of many decimals": lambda: tscale.Instants.from_iso(["2025-01-01"] * 9 + [SECOND + "." + "1" * 10**6], "UTC"),
    "one of many seconds": lambda: tscale.Instants.from_iso(SECOND + "1" * 5000, "UTC"),
    "a long number": lambda: read_dates(["60000"] * 99_999 + ["2" * 10**7], "mjd", "UTC"),
    "an epoch of a log": lambda: tscale.ClockLog.load(file(log + "2" * 100_000 + ",1,0\\n")),
    "a row of a log": lambda: tscale.ClockLog.load(file(log + "2025-01-02,1," + "9" * 5_000_000)),
    "nested TOML": lambda: read_toml(file("a=" + "[" * 100_000)),
    "a dotted key": lambda: read_toml(file(".".join("a" * 100_000) + "=1")),
    "a dotted table": lambda: read_toml(file("[" + ".".join("a" * 100_000) + "]")),
    "entities of entities": lambda: tscale.Trajectory.from_oem(file(bomb)),
    "nested elements": lambda: tscale.Trajectory.from_oem(file('<oem version="2.0">' + "<a>" * 300_000)),
    "a degree without its rows": lambda: HarmonicField.load(file(field.replace(" 6\\n", " 2600\\n", 1))),
    "a line without an end": lambda: lines(Endless()),
    "a live line without an end": lambda: lines(LiveLines(Endless())),
    "a quote without an end": lambda: lines(iter(['t\\n', '"a\\n'] + ['b","\\n'] * 10**7)),
    "points for a TT(BIPM) row": lambda: TTBIPM.load(file(" 42589." + "2589." * 50_000, "TTBIPM.23")),
    "digits for a TT(BIPM) row": lambda: TTBIPM.load(file(" 42589." + "9" * 10**6, "TTBIPM.23")),
    "an exponent of a leap second": lambda: LeapSeconds.load(file("41317.0 1 1 1972 1e999999999\\n")),
    "an exponent of a day": lambda: LeapSeconds.load(file("4e999999999 1 1 1972 10\\n")),
    "a field of /dev/urandom": lambda: HarmonicField.load("/dev/urandom"),
    **{f"{name} of /dev/zero": (lambda read=read: read("/dev/zero")) for name, read in (
           ("a site", tscale.Site.load), ("a log", tscale.ClockLog.load), ("a kernel", tscale.Ephemeris.open),
           ("a flight", tscale.Trajectory.from_flight), ("a field", HarmonicField.load),
           ("leap seconds", lambda p: LeapSeconds.load(Path(p))), ("orientation", EarthOrientation.load))},
}
for name, run in CASES.items():
    try:
        run()
    except TscaleError as error:
        assert len(str(error)) < 1000, (name, str(error)[:2000])
    else:
        sys.exit(f"{name}: taken")
print(len(CASES), "refused")
"""


def test_huge_inputs_are_refused_within_two_gigabytes(tmp_path: Path) -> None:
    code = HUGE.replace("GFC", str(Path(__file__).parent / "data" / "invented_field.gfc"))
    done = subprocess.run(
        [sys.executable, "-c", code, tmp_path], env=environment(tmp_path), capture_output=True, text=True, timeout=120
    )
    assert done.stdout.strip() == "27 refused", done.stderr[-3000:]
