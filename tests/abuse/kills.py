"""`kill -9` at random moments: nothing that was done is lost, nothing half-written has a name.

    python tests/abuse/kills.py --kills 100

Children are forked from a process that has loaded the package, so that the moments lie within the work.
"""

from __future__ import annotations

import argparse
import os
import random
import signal
import sys
import tempfile
import time
import warnings
from collections.abc import Callable
from pathlib import Path

if __name__ == "__main__":
    sys.path.insert(0, str(Path(__file__).parent.parent.parent))

import tscale
from tests.abuse.support import dates, digest, excerpt
from tscale.cli.main import main as command
from tscale.ephemeris.time_ephemeris import TimeEphemeris

__all__ = ["CASES", "run"]


def killed(work: Callable[[], object], after_s: float) -> bool:
    """Fork a child that does the work, and kill it; whether it was killed before its end."""
    child = os.fork()
    if not child:
        with open(os.devnull, "wb") as nothing:
            os.dup2(nothing.fileno(), 1)
            os.dup2(nothing.fileno(), 2)
        try:
            work()
        finally:
            os._exit(0)
    time.sleep(after_s)
    os.kill(child, signal.SIGKILL)
    return os.WIFSIGNALED(os.waitpid(child, 0)[1])


def timed(work: Callable[[], object]) -> float:
    start = time.monotonic()
    work()
    return time.monotonic() - start


def cache(folder: Path, kills: int, rng: random.Random) -> str:
    """The time ephemeris of a kernel, while it is integrated and stored."""
    os.environ["TSCALE_CACHE"] = str(folder / "cache")
    kernel = tscale.Ephemeris.open(excerpt(folder / "kernel.bsp", 3000.0))
    length_s = timed(lambda: TimeEphemeris.of(kernel))
    (path,) = (folder / "cache").glob("*.bsp")
    whole = path.read_bytes()
    done = hit = 0
    for _ in range(kills):
        path.unlink(missing_ok=True)
        hit += killed(lambda: TimeEphemeris.of(kernel), rng.uniform(0.0, 1.2 * length_s))
        done += path.exists()
        assert not path.exists() or path.read_bytes() == whole
        assert [p.name for p in (folder / "cache").glob("*.bsp")] in ([], [path.name])
        TimeEphemeris.of(kernel)  # the lock of the dead holds nobody up
        assert path.read_bytes() == whole
    left = len(list((folder / "cache").glob(".*.part")))
    return f"{hit} killed while at work, {done} files whole, the others not there; {left} nameless parts left"


def text(folder: Path, kills: int, rng: random.Random) -> str:
    """A conversion of delimited text over a file that is there."""
    source, out = folder / "in.csv", folder / "out.csv"
    source.write_text("t\n" + "".join(f"{d}\n" for d in dates(3, 20_000).to_iso(6)), encoding="utf-8")
    words = ["convert", str(source), str(out), "--from", "UTC", "--to", "TT", "--quiet"]

    def work() -> int:
        return command(words)

    length_s = timed(work)
    whole, before = out.read_bytes(), b"what was there before\n"
    hit = done = 0
    for _ in range(kills):
        out.write_bytes(before)
        hit += killed(work, rng.uniform(0.0, 1.2 * length_s))
        found = out.read_bytes()
        assert found in (before, whole)
        done += found == whole
    return f"{hit} killed while at work, {done} files whole, in the others' place the one before"


def table(folder: Path, kills: int, rng: random.Random) -> str:
    """A conversion of a table into parts, taken up again after each kill: no part is made twice."""
    from pyarrow import parquet

    from tscale.files.arrow_columns import date_columns, instants_of
    from tscale.files.tables import convert_table

    chain = tscale.chain("UTC", "TDB@GEOCENTER")
    t = dates(5, 400_000).at("GEOCENTER")
    parquet.write_table(date_columns("time", t), folder / "in.parquet")
    length_s = timed(lambda: convert_table(chain, folder / "in.parquet", folder / "whole", rows=4000))
    hit = rounds = kept = 0
    while hit < kills:
        rounds += 1
        out = folder / f"out{rounds}"

        def convert(out: Path = out) -> object:
            return convert_table(chain, folder / "in.parquet", out, rows=4000)

        stamps: dict[str, int] = {}
        at_work = True
        while at_work and hit < kills:
            after_s = rng.uniform(0.0, 0.6 * length_s)
            at_work = killed(convert, after_s)
            hit += at_work
            now = {p.name: p.stat().st_mtime_ns for p in out.glob("part-*.parquet")} if out.exists() else {}
            assert {name: now.get(name) for name in stamps} == stamps
            stamps = now
        done = convert_table(chain, folder / "in.parquet", out, rows=4000)
        assert done.rows == t.size
        kept += done.found // 4000
        got = instants_of(parquet.read_table(sorted(out.glob("*.parquet"))), "TDB@GEOCENTER")
        assert digest(got) == digest(chain(t))
        assert not list(out.glob(".*.part"))
    return f"{hit} killed while at work in {rounds} conversions, {kept} parts kept and not made again, same bytes"


CASES = {"cache": cache, "text": text, "table": table}


def run(name: str, folder: Path, kills: int, seed: int = 1) -> str:
    with warnings.catch_warnings():
        warnings.simplefilter("ignore")
        return CASES[name](folder, kills, random.Random(f"{seed} {name}"))


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--kills", type=int, default=100, help="of each kind")
    parser.add_argument("--cases", default=",".join(CASES))
    parser.add_argument("--seed", type=int, default=1)
    args = parser.parse_args()
    for name in args.cases.split(","):
        with tempfile.TemporaryDirectory() as folder:
            print(f"{name:8}", run(name, Path(folder), args.kills, args.seed), flush=True)
    return 0


if __name__ == "__main__":
    sys.exit(main())
