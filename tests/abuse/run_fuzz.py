"""Fuzz the readers: damaged inputs by the million, none of which may have another outcome than `TscaleError`.

    python tests/abuse/run_fuzz.py --inputs 1000000            # refused inputs wanted, of all targets together
    python tests/abuse/run_fuzz.py --seconds 600 --targets oem,fits

With `atheris` (coverage-guided; `pip install atheris`) what reaches new code is fuzzed on; without it, or with
`--engine plain`, the corpus alone is mutated. Targets run in processes of their own, `--jobs` at a time, and the
inputs that failed are written to `--failures`, one for each place in the code. Exit code 1 if there are any.
"""

from __future__ import annotations

import argparse
import concurrent.futures
import faulthandler
import hashlib
import json
import os
import random
import resource
import signal
import subprocess
import sys
import tempfile
import time
import traceback
import warnings
from pathlib import Path
from typing import Any

HERE = Path(__file__).parent
sys.path[:0] = [str(HERE), str(HERE.parent.parent)]

MEMORY_BYTES = 6 << 30
LIMIT_S = 10


class TooSlow(BaseException):
    """An input that takes longer than it may."""


class Count:
    """Calls a target, counts what comes of it and keeps what fails."""

    def __init__(self, name: str, run: Any, failures: Path, report: Path, seconds: float, refusals: int) -> None:
        from tscale.errors import TscaleError

        self.name, self.run, self.failures, self.report = name, run, failures, report
        self.refusal = TscaleError
        self.end = time.monotonic() + seconds
        self.wanted = refusals
        self.found = {"inputs": 0, "refused": 0, "taken": 0, "failed": 0}
        self.places: set[str] = set()
        signal.signal(signal.SIGALRM, self._late)

    def _late(self, *_: Any) -> None:
        raise TooSlow(f"more than {LIMIT_S} s")

    def __call__(self, data: bytes) -> None:
        self.found["inputs"] += 1
        signal.alarm(LIMIT_S)
        try:
            self.run(data)
        except self.refusal:
            self.found["refused"] += 1
        except (KeyboardInterrupt, SystemExit):
            raise
        except BaseException as error:
            self._keep(data, error)
        else:
            self.found["taken"] += 1
        finally:
            signal.alarm(0)
        if self.found["inputs"] % 200 == 0:
            self.tell()

    @property
    def done(self) -> bool:
        return self.found["refused"] >= self.wanted or time.monotonic() > self.end

    def tell(self) -> None:
        self.report.write_text(json.dumps(self.found))

    def _keep(self, data: bytes, error: BaseException) -> None:
        self.found["failed"] += 1
        frames = traceback.extract_tb(error.__traceback__)
        ours = [frame for frame in frames if "tscale" in frame.filename] or frames
        place = f"{type(error).__name__} {ours[-1].filename}:{ours[-1].lineno}"
        if place in self.places:
            return
        self.places.add(place)
        stem = f"{self.name}-{hashlib.sha256(data).hexdigest()[:12]}"
        (self.failures / stem).write_bytes(data)
        text = "".join(traceback.format_exception(error))
        (self.failures / f"{stem}.txt").write_text(text, encoding="utf-8", errors="backslashreplace")


def work(args: argparse.Namespace) -> None:
    """One target, in this process."""
    faulthandler.enable()
    resource.setrlimit(resource.RLIMIT_AS, (MEMORY_BYTES, MEMORY_BYTES))
    if args.engine == "atheris":
        import atheris

        with atheris.instrument_imports(include=["tscale"]):
            import targets
    else:
        import targets
    from mutate import mutated

    import tscale

    warnings.simplefilter("error")
    for category in (tscale.errors.ExtrapolationWarning, UserWarning, ResourceWarning, DeprecationWarning):
        warnings.simplefilter("ignore", category)
    name = args.worker
    count = Count(name, targets.TARGETS[name], args.failures, args.report, args.seconds, args.inputs)
    seeds = targets.seeds_of(name)
    for seed in seeds:
        count(seed)
    if args.engine == "plain":
        rng = random.Random(f"{args.seed} {name}")
        while not count.done:
            count(mutated(rng.choice(seeds), rng, seeds))
        count.tell()
        return

    def change(data: bytes, size: int, seed: int) -> bytes:
        rng = random.Random(seed)
        if rng.random() < 0.4:
            return atheris.Mutate(data, size)
        return mutated(data, rng, seeds, size)

    def one(data: bytes) -> None:
        count(data)
        if count.done:
            count.tell()
            os._exit(0)

    found = args.grown / name
    found.mkdir(parents=True, exist_ok=True)
    flags = [
        "-max_len=65536",
        "-timeout=60",
        f"-rss_limit_mb={MEMORY_BYTES >> 20}",
        f"-seed={args.seed}",
        "-verbosity=0",
    ]
    atheris.Setup([sys.argv[0], str(found), str(targets.CORPUS / name), *flags], one, custom_mutator=change)
    atheris.Fuzz()


def started(name: str, args: argparse.Namespace, seconds: float, refusals: int, folder: Path) -> dict[str, Any]:
    """Run a worker to its end; a worker that dies is a failure."""
    report = folder / f"{name}.json"
    report.unlink(missing_ok=True)
    words = [sys.executable, __file__, "--worker", name, "--engine", args.engine, "--seconds", str(seconds)]
    words += ["--inputs", str(refusals), "--seed", str(args.seed), "--failures", str(args.failures)]
    words += ["--report", str(report), "--grown", str(args.grown)]
    start = time.monotonic()
    with (folder / f"{name}.log").open("wb") as log:
        code = subprocess.run(words, stdout=log, stderr=log, stdin=subprocess.DEVNULL, check=False).returncode
    found = (
        json.loads(report.read_text())
        if report.exists()
        else dict.fromkeys(("inputs", "refused", "taken", "failed"), 0)
    )
    if code:
        found["failed"] += 1
        (args.failures / f"{name}-died.txt").write_bytes((folder / f"{name}.log").read_bytes()[-5000:])
    return {"target": name, **found, "seconds": round(time.monotonic() - start, 1), "died": code}


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--engine", choices=("auto", "atheris", "plain"), default="auto")
    parser.add_argument("--inputs", type=int, default=None, help="refused inputs wanted, of all targets together")
    parser.add_argument("--seconds", type=float, default=None, help="for each target, at the most; default 60")
    parser.add_argument("--targets", default="", help="comma between names; default all")
    parser.add_argument("--jobs", type=int, default=1)
    parser.add_argument("--seed", type=int, default=1)
    parser.add_argument("--failures", type=Path, default=Path("fuzz-failures"))
    parser.add_argument("--grown", type=Path, default=None, help="where atheris keeps inputs that reached new code")
    parser.add_argument("--worker", help=argparse.SUPPRESS)
    parser.add_argument("--report", type=Path, help=argparse.SUPPRESS)
    args = parser.parse_args()
    if args.worker:
        work(args)
        return 0
    if args.engine == "auto":
        from importlib.util import find_spec

        args.engine = "plain" if find_spec("atheris") is None else "atheris"
    from targets import CORPUS

    names = args.targets.split(",") if args.targets else sorted(p.name for p in CORPUS.iterdir() if p.is_dir())
    args.failures = args.failures.absolute()
    args.failures.mkdir(parents=True, exist_ok=True)
    seconds = args.seconds or 60.0
    keys = ("inputs", "refused", "taken", "failed")
    total = dict.fromkeys(keys, 0)
    print(f"{'target':18}{'inputs':>10}{'refused':>10}{'taken':>10}{'failed':>8}{'s':>8}   engine: {args.engine}")
    with tempfile.TemporaryDirectory() as folder, concurrent.futures.ThreadPoolExecutor(args.jobs) as pool:
        args.grown = args.grown or Path(folder) / "grown"
        while names:
            # Slow targets, and those that refuse little, leave to the others what they do not reach in their time.
            quota = -(-(args.inputs - total["refused"]) // len(names)) if args.inputs else sys.maxsize
            jobs = [pool.submit(started, name, args, seconds, quota, Path(folder)) for name in names]
            names = []
            for job in jobs:
                row = job.result()
                for key in keys:
                    total[key] += row[key]
                if row["refused"] >= quota:
                    names.append(row["target"])
                figures = f"{row['inputs']:10}{row['refused']:10}{row['taken']:10}{row['failed']:8}{row['seconds']:8}"
                print(f"{row['target']:18}{figures}", flush=True)
            args.seed += 1
            if not args.inputs or total["refused"] >= args.inputs:
                break
    print(f"{'all':18}{total['inputs']:10}{total['refused']:10}{total['taken']:10}{total['failed']:8}")
    return 1 if total["failed"] else 0


if __name__ == "__main__":
    sys.exit(main())
