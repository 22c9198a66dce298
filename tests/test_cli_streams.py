"""The command and what it is connected to: standard streams, pipes, signals, warnings. Each as a process of its own."""

from __future__ import annotations

import contextlib
import os
import select
import signal
import subprocess
import sys
import time
from pathlib import Path
from typing import IO

import pytest

import tscale
from tscale.cli.main import main

ROOT = Path(tscale.__file__).parents[1]
EXAMPLES = ROOT / "examples"
COMMAND = [sys.executable, "-m", "tscale"]
ENVIRONMENT = {**os.environ, "PYTHONPATH": str(ROOT)}
GIVEN = "t,é\n2025-01-01T00:00:00,ü\n"
TAKEN = "t,é,TAI\n2025-01-01T00:00:00,ü,2025-01-01T00:00:37\n"
TO_TAI = ["--to", "TAI", "--digits", "0", "--quiet"]

pytestmark = pytest.mark.skipif(os.name != "posix", reason="streams and signals as on POSIX systems")


@pytest.fixture
def folder(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.chdir(tmp_path)
    (tmp_path / "in.csv").write_text(GIVEN, encoding="utf-8")
    return tmp_path


def shell(line: str, **more: str) -> subprocess.CompletedProcess[bytes]:
    """Run a line of bash in which `tscale` is the command."""
    words = f'tscale() {{ "{sys.executable}" -m tscale "$@"; }}; {line}'
    return subprocess.run(["bash", "-c", words], capture_output=True, check=False, env={**ENVIRONMENT, **more})


def convert(*words: str) -> str:
    return " ".join(["tscale convert", *TO_TAI, *words])


@pytest.mark.parametrize("encoding", ["ascii", "latin-1", "utf-16"])
def test_standard_output_is_utf8_whatever_the_locale(folder: Path, encoding: str) -> None:
    done = shell(convert("in.csv", "-"), PYTHONIOENCODING=encoding)
    assert done.returncode == 0, done.stderr
    assert done.stdout.decode() == TAKEN
    assert done.stderr == b""


def test_names_that_the_locale_cannot_write(folder: Path) -> None:
    (folder / "in.csv").rename("é.csv")
    done = shell("tscale convert é.csv out.csv --to TAI", PYTHONIOENCODING="ascii")
    assert done.returncode == 0, done.stderr
    assert b"\\xe9.csv" in done.stdout


def test_line_ends_reach_the_standard_output_as_they_are(folder: Path) -> None:
    (folder / "in.csv").write_bytes(b"t\r\n2025-01-01\r\n")
    assert shell(convert("in.csv", "-")).stdout == b"t,TAI\r\n2025-01-01,2025-01-01T00:00:37\r\n"


@pytest.mark.parametrize(
    ("line", "words"),
    [
        (convert("- -", "<&-"), "the standard input is closed"),
        (convert("in.csv -", ">&-"), "the standard output is closed"),
        ("tscale convert in.csv out.csv --to TAI >&-", "the standard output is closed"),
        ("tscale data >&-", "the standard output is closed"),
        ("tscale link --from earth --to moon --scale TDB --transmit 2025-01-01 >&-", "the standard output is closed"),
        (convert("in.csv /dev/full"), "/dev/full: No space left on device"),
        (convert("in.csv - >/dev/full"), "No space left on device"),
        ("tscale data >/dev/full", "No space left on device"),
        (convert("in.csv /dev/fd/77"), "/dev/fd/77: Bad file descriptor"),
        (convert("'' out.csv"), "INPUT and OUTPUT are names"),
        (convert("in.csv ''"), "INPUT and OUTPUT are names"),
    ],
)
def test_streams_that_are_not_there(folder: Path, line: str, words: str) -> None:
    done = shell(line)
    assert done.returncode == 2
    assert done.stderr.decode().startswith("tscale: error: ")
    assert done.stderr.count(b"\n") == 1
    assert words in done.stderr.decode()
    assert os.listdir(folder) == ["in.csv"]


def test_nothing_is_said_where_nobody_can_hear(folder: Path) -> None:
    assert shell(convert("in.csv", "out.csv", ">&-", "2>&-")).returncode == 0
    assert (folder / "out.csv").read_text(encoding="utf-8") == TAKEN
    assert shell(convert("none.csv", "out2.csv", "2>&-")).returncode == 2


@pytest.mark.parametrize(
    "line",
    [
        convert("in.csv", "/dev/stdout"),
        convert("in.csv", "/dev/fd/5", "5>&1"),
        convert("in.csv", "/dev/stdout", "| cat"),
        convert("in.csv", "/dev/fd/5", "5>out.csv; cat out.csv"),
        convert("in.csv", ">(cat >out.csv)", "; sleep 1; cat out.csv"),
        convert("<(cat in.csv)", "-"),
        convert("/dev/stdin", "- <in.csv"),
        f"mkfifo pipe; cat pipe & {convert('in.csv', 'pipe')}; wait",
    ],
)
def test_other_names_of_streams(folder: Path, line: str) -> None:
    done = shell(line)
    assert done.stderr == b""
    assert done.stdout.decode() == TAKEN
    assert not list(folder.glob(".*"))


def test_an_open_stream_keeps_its_place(folder: Path) -> None:
    shell(f"{{ echo before; {convert('in.csv', '/dev/fd/5')}; echo after >&5; }} >out.csv 5>&1")
    assert (folder / "out.csv").read_text(encoding="utf-8") == f"before\n{TAKEN}after\n"


def test_summary_of_the_other_name_of_the_standard_output(folder: Path) -> None:
    done = shell("tscale convert in.csv /dev/stdout --to TAI --digits 0")
    assert done.stdout.decode() == TAKEN
    assert b"1 rows: in.csv -> <stdout>" in done.stderr


def test_long_names(folder: Path, capsys: pytest.CaptureFixture[str]) -> None:
    name = "x" * 250
    assert main(["convert", "in.csv", name, *TO_TAI]) == 0
    assert (folder / name).read_text(encoding="utf-8") == TAKEN
    assert main(["convert", "in.csv", "x" * 300, *TO_TAI]) == 2
    assert "x... (300 characters): File name too long" in capsys.readouterr().err


def line_within(stream: IO[bytes], seconds: float) -> bytes:
    assert select.select([stream], [], [], seconds)[0], f"nothing came within {seconds} s"
    return stream.readline()


@contextlib.contextmanager
def running(*words: str) -> object:
    pipe = subprocess.PIPE

    def hear() -> None:
        # Tests that were started in the background hand on an interrupt that is ignored.
        signal.signal(signal.SIGINT, signal.SIG_DFL)

    with subprocess.Popen(
        [*COMMAND, *words], stdin=pipe, stdout=pipe, stderr=pipe, env=ENVIRONMENT, bufsize=0, preexec_fn=hear
    ) as done:
        try:
            yield done
        finally:
            done.kill()


def test_rows_of_a_live_stream_come_out_at_once(folder: Path) -> None:
    with running("convert", "-", "-", *TO_TAI) as process:  # type: ignore[attr-defined]
        process.stdin.write(b"t\n2025-01-01\n")
        # Nothing ends the input; a minute allows for a busy machine that has yet to load numpy.
        assert line_within(process.stdout, 60) == b"t,TAI\n"
        assert process.stdout.readline() == b"2025-01-01,2025-01-01T00:00:37\n"
        for day in (2, 3):
            process.stdin.write(b"2025-01-0%d\n" % day)
            assert line_within(process.stdout, 60) == b"2025-01-0%d,2025-01-0%dT00:00:37\n" % (day, day)
        process.stdin.close()
        assert process.wait(60) == 0


def started(process: subprocess.Popen[bytes], folder: Path) -> None:
    """Wait until the temporary file is there."""
    assert process.stdin is not None
    process.stdin.write(b"t\n2025-01-01\n")
    end = time.monotonic() + 60
    while not list(folder.glob(".*.part")):
        assert time.monotonic() < end
        assert process.poll() is None
        time.sleep(0.02)


@pytest.mark.parametrize("name", ["SIGTERM", "SIGHUP", "SIGINT"])
def test_signals_leave_no_file(folder: Path, name: str) -> None:
    with running("convert", "-", "out.csv", *TO_TAI) as process:  # type: ignore[attr-defined]
        started(process, folder)
        number = getattr(signal, name)
        process.send_signal(number)
        # CPython ends itself by the signal where an interrupt passed through code that was compiled on the way, as in
        # the import of a named tuple; a shell shows both as 128 + number.
        assert process.wait(60) in (128 + number, -number)
        assert b"Traceback" not in process.stderr.read()
    assert os.listdir(folder) == ["in.csv"]


def test_a_hangup_that_is_ignored_stays_so(folder: Path) -> None:
    before = signal.signal(signal.SIGHUP, signal.SIG_IGN)  # handed on to the process, as nohup does
    try:
        with running("convert", "-", "out.csv", *TO_TAI) as process:  # type: ignore[attr-defined]
            started(process, folder)
            process.send_signal(signal.SIGHUP)
            process.stdin.close()
            assert process.wait(60) == 0
    finally:
        signal.signal(signal.SIGHUP, before)
    assert (folder / "out.csv").is_file()


def test_an_interrupt_while_modules_are_loaded() -> None:
    # The first module that the command loads is replaced by one that is interrupted.
    script = (
        "import sys\n"
        "class Interrupted:\n"
        "    def find_spec(self, name, path=None, target=None):\n"
        "        if name == 'argparse':\n"
        "            raise KeyboardInterrupt\n"
        "sys.meta_path.insert(0, Interrupted())\n"
        "from tscale.cli.main import main\n"
        "sys.exit(main(['data']))\n"
    )
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, check=False, env=ENVIRONMENT)
    assert done.returncode == 130
    assert done.stderr == b"tscale: interrupted; no output file was left\n"


def test_handlers_are_put_back(folder: Path) -> None:
    before = signal.getsignal(signal.SIGTERM)
    assert main(["convert", "in.csv", "out.csv", *TO_TAI]) == 0
    assert signal.getsignal(signal.SIGTERM) is before


def test_warnings_are_lines_of_the_command(folder: Path) -> None:
    # A kernel of its own, so that a time ephemeris has to be built; and no folder to keep it in.
    kernel = tscale.Ephemeris.default().path
    assert kernel is not None
    content = bytearray(kernel.read_bytes())
    content[16] ^= 1  # of the name that the file gives itself
    (folder / "own.bsp").write_bytes(content)
    (folder / "cache").write_text("a file where the folder should be")
    words = "tscale convert in.csv - --to TDB@GEOCENTER --quiet --ephemeris own.bsp"
    done = shell(words, TSCALE_CACHE="cache")
    assert done.returncode == 0, done.stderr
    text = done.stderr.decode()
    assert text.startswith("tscale: warning: cannot store the time ephemeris in cache (")
    assert text.count("\n") == 1
    done = shell(words, TSCALE_CACHE="kept")
    assert (done.returncode, done.stderr) == (0, b"")
    (kept,) = (folder / "kept").glob("*.bsp")
    kept.write_bytes(kept.read_bytes()[:5000])
    done = shell(words, TSCALE_CACHE="kept")
    assert done.returncode == 0
    text = done.stderr.decode()
    assert text.startswith("tscale: warning: ")
    assert text.endswith("the time ephemeris is built anew\n")
    assert "fetch" not in text
    assert text.count("\n") == 1


def test_as_a_module() -> None:
    done = subprocess.run([*COMMAND, "--version"], capture_output=True, text=True, check=False, env=ENVIRONMENT)
    assert done.stdout == f"tscale {tscale.__version__}\n"
