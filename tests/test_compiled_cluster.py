"""Compiled chains on worker processes: a worker that is lost, and the example page's command as it is told."""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import pytest

pytest.importorskip("distributed")

HERE = Path(__file__).parent
ROOT = HERE.parent


def run(script: Path, *words: str) -> subprocess.CompletedProcess[str]:
    environment = {**os.environ, "PYTHONPATH": str(ROOT)}
    command = [sys.executable, str(script), *words]
    return subprocess.run(command, env=environment, capture_output=True, text=True, check=False, timeout=120)


def test_a_worker_that_is_killed_takes_nothing_of_a_compiled_chain_with_it() -> None:
    done = run(HERE / "cluster_run.py", "compiled")
    said = done.stdout.strip()
    assert said == "CompiledChain: worker lost: True; same bytes: True; dates: 160000", said + done.stderr[-3000:]


def test_of_many_readings_a_hash_of_each_block_comes_back() -> None:
    script = ROOT / "examples" / "on_a_cluster.py"
    done = run(script, "--readings", "3e5", "--fetch-up-to", "1e5")
    want = "300000 readings, of 10 of their 10 blocks the SHA-256; the same bytes as in this process alone: True"
    assert want in done.stdout, done.stdout + done.stderr[-3000:]


@pytest.mark.parametrize("words", ["1.5", "0", "many", "nan"])
def test_numbers_of_readings_that_are_none(words: str) -> None:
    done = run(ROOT / "examples" / "on_a_cluster.py", "--readings", words)
    assert done.returncode == 2
    assert f"argument --readings: invalid number value: '{words}'" in done.stderr


def test_the_page_tells_the_command_that_the_script_takes() -> None:
    page = (ROOT / "examples" / "on_a_cluster.md").read_text(encoding="utf-8")
    assert "python examples/on_a_cluster.py --scheduler tcp://HOST:8786 --readings 1e9" in page
    text = run(ROOT / "examples" / "on_a_cluster.py", "--help").stdout
    assert "--scheduler ADDRESS" in text
    assert "--readings N" in text
