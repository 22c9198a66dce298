"""Many processes of many threads at once, each through the same chain, with nothing in the cache: the same bytes.

python tests/abuse/crowd.py --processes 64 --threads 16
"""

from __future__ import annotations

import argparse
import subprocess
import sys
import tempfile
import threading
import time
from pathlib import Path

if __name__ == "__main__":
    sys.path.insert(0, str(Path(__file__).parent.parent.parent))

from tests.abuse.support import chain_over, dates, digest, environment, excerpt, python

__all__ = ["crowd"]


def member(kernel: Path, threads: int, start_at: float) -> list[str]:
    """Digests from every thread of this process, all let go at one moment; chains are made by each, and shared."""
    barrier = threading.Barrier(threads)
    found: list[str] = [""] * threads
    shared = chain_over(kernel)

    def work(i: int) -> None:
        try:
            barrier.wait()
            time.sleep(max(0.0, start_at - time.time()))
            chain = shared if i % 2 else chain_over(kernel)
            t = chain(dates(7))
            found[i] = digest(t, chain.inverse(t))
        except BaseException as error:
            found[i] = repr(error)

    group = [threading.Thread(target=work, args=(i,)) for i in range(threads)]
    for thread in group:
        thread.start()
    for thread in group:
        thread.join()
    return found


def crowd(folder: Path, processes: int, threads: int, wait_s: float) -> tuple[set[str], int, float]:
    """What they all gave, how many did, and the seconds it took; the cache holds one file at the end."""
    kernel, cache = excerpt(folder / "kernel.bsp"), folder / "cache"
    start = time.time()
    words = python(__file__, "--member", str(kernel), "--threads", str(threads), "--start-at", str(start + wait_s))
    group = [
        subprocess.Popen(words, env=environment(cache), stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True)
        for _ in range(processes)
    ]
    outs = [process.communicate() for process in group]
    assert all(process.returncode == 0 for process in group), [err[-500:] for _, err in outs if err][:3]
    assert not any(err for _, err in outs), {err[-500:] for _, err in outs}
    lines = [line for out, _ in outs for line in out.split("\n") if line]
    names = sorted(path.name for path in cache.iterdir() if not path.name.endswith(".lock"))
    assert len(names) == 1, names
    return set(lines), len(lines), time.time() - start


def main() -> int:
    parser = argparse.ArgumentParser(description=__doc__, formatter_class=argparse.RawDescriptionHelpFormatter)
    parser.add_argument("--processes", type=int, default=64)
    parser.add_argument("--threads", type=int, default=16)
    parser.add_argument("--wait", type=float, default=0.0, help="s from the start until all begin")
    parser.add_argument("--member", type=Path, help=argparse.SUPPRESS)
    parser.add_argument("--start-at", type=float, default=0.0, help=argparse.SUPPRESS)
    args = parser.parse_args()
    if args.member:
        print("\n".join(member(args.member, args.threads, args.start_at)))
        return 0
    with tempfile.TemporaryDirectory() as folder:
        found, count, took = crowd(Path(folder), args.processes, args.threads, args.wait)
    print(f"{args.processes} processes of {args.threads} threads: {count} results, {len(found)} distinct, {took:.0f} s")
    return 0 if len(found) == 1 else 1


if __name__ == "__main__":
    sys.exit(main())
