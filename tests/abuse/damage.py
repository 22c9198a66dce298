"""Files that are kept, damaged at random: each reading refuses the file, or gives what the whole file gave.

python tests/abuse/damage.py --trials 20000
"""

from __future__ import annotations

import argparse
import os
import random
import sys
import tempfile
import warnings
from collections import Counter
from collections.abc import Callable
from pathlib import Path
from typing import Any

if __name__ == "__main__":
    sys.path.insert(0, str(Path(__file__).parent.parent.parent))

import numpy as np

import tscale
from tests.abuse.mutate import damaged
from tests.abuse.support import SITE, SOURCE, chain_over, dates, digest, excerpt
from tscale.ephemeris import body_time_file
from tscale.ephemeris.body_time import BodyTimeEphemeris
from tscale.ephemeris.daf import check_sha256, file_sha256
from tscale.ephemeris.time_ephemeris import TimeEphemeris
from tscale.errors import TscaleError
from tscale.serial import from_json, to_json

__all__ = ["TRIALS", "trial"]

TRIALS: dict[str, Callable[[Path], tuple[Path, Callable[[], str]]]] = {}
"""By name: makes a file in a folder; returns its path, and how it is read (as a digest)."""


def trial(name: str, count: int, folder: Path, seed: int = 1) -> Counter[str]:
    """Damage a file so often: `refused`, `rebuilt` (and said), `same` results, or `other` results, which is a fault."""
    path, read = TRIALS[name](folder)
    whole, rng, found = path.read_bytes(), random.Random(f"{seed} {name}"), Counter[str]()
    with warnings.catch_warnings():
        warnings.simplefilter("error", RuntimeWarning)
        warnings.simplefilter("ignore", UserWarning)
        expected = read()
    for _ in range(count):
        content = damaged(whole, rng)
        if content == whole:
            continue
        # Readers may hold a map of the old one: never written over, as no good writer does.
        part = path.with_name("part")
        part.write_bytes(content)
        os.replace(part, path)
        with warnings.catch_warnings(record=True) as said:
            warnings.simplefilter("always")
            try:
                got = read()
            except TscaleError:
                found["refused"] += 1
                continue
        assert all(issubclass(w.category, UserWarning) for w in said), [str(w.message) for w in said]
        found[("rebuilt" if said else "same") if got == expected else "other"] += 1
    path.write_bytes(whole)
    return found


def named(function: Any) -> Any:
    TRIALS[function.__name__] = function
    return function


@named
def time_ephemeris(folder: Path) -> tuple[Path, Callable[[], str]]:
    """The cache of the time ephemeris, found through a kernel."""
    os.environ["TSCALE_CACHE"] = str(folder / "cache")
    kernel = tscale.Ephemeris.open(excerpt(folder / "kernel.bsp"))
    TimeEphemeris.of(kernel)
    (path,) = (folder / "cache").glob("time_ephemeris*.bsp")
    tdb = dates(1).pair

    def read() -> str:
        return np.asarray(TimeEphemeris.of(kernel).tt_minus_tdb_s(tdb)).tobytes().hex()

    return path, read


@named
def body_time(folder: Path) -> tuple[Path, Callable[[], str]]:
    """The cache of a body's coordinate time, which keeps what took long."""
    os.environ["TSCALE_CACHE"] = str(folder / "cache")
    kernel = tscale.Ephemeris.open(excerpt(folder / "kernel.bsp"))
    made = BodyTimeEphemeris.of(kernel, "moon")._parts

    def kept() -> Any:
        return body_time_file.kept(kernel, 301, "", lambda: made)

    kept()
    (path,) = (folder / "cache").glob("coordinate_time*.bsp")

    def read() -> str:
        found = kept()
        return f"{found.gain} {found.anchor} {np.asarray(found.table.value(dates(1).pair)).tobytes().hex()}"

    return path, read


@named
def compiled(folder: Path) -> tuple[Path, Callable[[], str]]:
    """A compiled chain, sealed by its hash."""
    path = folder / "chain.compiled"
    tscale.chain("UTC", "TDB@GEOCENTER").compile("1977-07-01", "1977-07-02", tolerance_s=1e-11).save(path)
    t = tscale.Instants.from_iso("1977-07-01T00:00:00", "UTC").shifted(np.linspace(0.0, 86_000.0, 50))
    return path, lambda: digest(tscale.load_compiled(path)(t))


@named
def document(folder: Path) -> tuple[Path, Callable[[], str]]:
    """A JSON document of a chain, with its hash."""
    path = folder / "chain.json"
    path.write_text(to_json(tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=SOURCE)))
    return path, lambda: to_json(from_json(path.read_bytes()))


@named
def kernel(folder: Path) -> tuple[Path, Callable[[], str]]:
    """A kernel whose hash is known, as that of one in use is."""
    path = excerpt(folder / "kernel.bsp", 64.0)
    sha256 = file_sha256(path)

    def read() -> str:
        check_sha256(path, sha256)
        return sha256

    return path, read


@named
def kernel_in_use(folder: Path) -> tuple[Path, Callable[[], str]]:
    """A kernel that a chain goes through, whose cached time ephemeris belongs to the hash of the whole one.

    A kernel has no checksum of its own: what is damaged in its numbers is read as what it says, but never mixed with
    the cache of another.
    """
    os.environ["TSCALE_CACHE"] = str(folder / "cache")
    path = excerpt(folder / "kernel.bsp", 200.0)
    t = tscale.Instants.from_iso("1977-02-01T00:00:00", "UTC").shifted(np.linspace(0.0, 1e6, 20))
    return path, lambda: digest(chain_over(path)(t))


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--trials", type=int, default=2000)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--folder", help="where to work; in memory (/dev/shm) it goes faster")
    args = parser.parse_args()
    bad = 0
    for name in TRIALS:
        with tempfile.TemporaryDirectory(dir=args.folder) as folder:
            found = trial(name, args.trials if name != "kernel_in_use" else args.trials // 40, Path(folder), args.seed)
        bad += found["other"] * (name != "kernel_in_use")
        print(
            f"{name:16}",
            ", ".join(f"{found[key]} {key}" for key in ("refused", "rebuilt", "same", "other")),
            flush=True,
        )
    return 1 if bad else 0


if __name__ == "__main__":
    sys.exit(main())
