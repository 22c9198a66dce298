"""`tscale events`: a FITS event list carried on the command line; memory that does not grow with the file."""

from __future__ import annotations

import json
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from astropy.io import fits

import tscale
from tscale.cli.main import main
from tscale.fits import convert_events, read_instants
from tscale.fits.cards import Cards

from .fits_support import STAR, event_file, events, header, save, times, to_barycentre, with_place

DIRECTION = ["--ra", str(STAR.ra_deg), "--dec", str(STAR.dec_deg)]


def test_the_command_does_what_the_function_does(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    source, target, wanted = event_file(tmp_path / "in.fits"), tmp_path / "out.fits", tmp_path / "wanted.fits"
    for direction in (DIRECTION, ["--direction", "RA_NOM,DEC_NOM"]):
        assert main(["events", str(source), str(target), "--to", "TDB@BARYCENTER", *direction, "--rebase"]) == 0
        said = capsys.readouterr()
        assert said.out.splitlines()[:2] == [
            "TT@TOPOCENTER -> TDB@BARYCENTER",
            "  HDU 1 (EVENTS), TIME: 500 rows, numbers up to 1.5e-11 s apart",
        ]
        assert said.out.splitlines()[-1] == f"{source} -> {target}"
        assert said.err == ""
    # The observer is where OBSGEO says: the site of the examples, but for what a header does not hold, its motion.
    still = tscale.Site.from_itrf("OBSGEO", *tscale.fits.site_of(fits.getheader(source, 1)).position_m)
    convert_events(
        source, wanted, tscale.chain("TT@TOPOCENTER", "TDB@BARYCENTER", site=still, source=STAR), rebase=True
    )
    assert np.all(read_instants(target) == read_instants(wanted))


def test_the_summary_as_json(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    source, target = event_file(tmp_path / "in.fits"), tmp_path / "out.fits"
    project = tmp_path / "ridge.toml"
    project.write_text("second_order = true\n")
    command = ["events", str(source), str(target), "--to", "TDB@BARYCENTER", "--json", "--project", str(project)]
    assert main([*command, "--direction", "RA_NOM,DEC_NOM"]) == 0
    found = json.loads(capsys.readouterr().out)
    assert found["end"] == "TDB@BARYCENTER"
    assert found["rows"] == 504
    assert found["columns"][0] == {
        "column": "TIME", "extension": "HDU 1 (EVENTS)", "rows": 500, "spacing_s": 2.0**-23, "undefined": 0,
    }  # fmt: skip
    assert "option: second_order = true" in str(fits.getheader(target, 1)["HISTORY"])


def test_quiet_is_quiet_and_notes_go_to_the_error_stream(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    source = save(tmp_path / "in.fits", events(with_place(header(TREFPOS=None)), times(5)))
    assert main(["events", str(source), str(source), "--to", "TAI", "--quiet"]) == 0
    said = capsys.readouterr()
    assert said.out == ""
    assert "tscale: note: HDU 1 (EVENTS): TREFPOS is not given: TOPOCENTER by the standard" in said.err
    assert fits.getheader(source, 1)["TIMESYS"] == "TAI"


def test_cards_keep_column_and_utc_are_options(tmp_path: Path) -> None:
    table = events(with_place(header(TIMESYS=None, MJDREFI=None, MJDREFF=None)), times(5) - 7.0e8 + 80000.0)
    other = events(with_place(header()), times(3), "HK")
    for found in (table, other):
        found.columns.change_name("TIME", "WHEN")
    source, target = save(tmp_path / "in.fits", table, other), tmp_path / "out.fits"
    command = ["events", str(source), str(target), "--to", "TAI", "--column", "WHEN", "--keep", "2", "--card",
               "MJDREFI=57753", "--card", "MJDREFF=0.125", "--card", "TIMESYS=UTC"]  # fmt: skip
    assert main(command) == 2
    assert main([*command, "--utc", "elapsed", "--quiet"]) == 0
    assert fits.getheader(target, 1)["MJDREFF"] == 0.125
    assert fits.getheader(target, 2)["TIMESYS"] == "TT"
    t = read_instants(target, column="WHEN")
    # TAI - UTC was 36 s before the leap second of 2016-12-31.
    want = read_instants(source, column="WHEN", cards={"TIMESYS": "UTC", "MJDREFI": 57753, "MJDREFF": 0.125},
                         utc="elapsed")  # fmt: skip
    assert np.max(np.abs(t.minus(tscale.chain("UTC@TOPOCENTER", "TAI")(want)))) < 1e-11


def test_a_compiled_chain_needs_nothing_else(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    source, target = event_file(tmp_path / "in.fits"), tmp_path / "out.fits"
    compiled = tmp_path / "hours.chain"
    to_barycentre().compile("2023-03-08T20:00:00", "2023-03-08T22:00:00").save(compiled)
    assert main(["events", str(source), str(target), "--compiled", str(compiled), *DIRECTION, "--threads", "2"]) == 0
    assert "TREFDIR" in fits.getheader(target, 1)
    assert np.max(np.abs(read_instants(target).minus(to_barycentre()(read_instants(source))))) < 6.1e-8
    capsys.readouterr()
    assert main(["events", str(source), str(target), "--compiled", str(compiled)]) == 0
    assert "the direction is not known" in capsys.readouterr().out
    assert "TREFDIR" not in fits.getheader(target, 1)


@pytest.mark.parametrize(
    ("options", "words"),
    [
        ([], "either with --to NODE or with --compiled FILE"),
        (["--to", "TDB@BARYCENTER"], "--source FILE (or --ra and --dec)"),
        (["--to", "TDB@BARYCENTER", "--direction", "RA_NOM"], "--direction names two keywords"),
        (["--to", "TDB@BARYCENTER", "--direction", "RA_X,DEC_X"], "does not state RA_X and DEC_X"),
        (["--to", "TDB@BARYCENTER", "--direction", "RA_NOM,DEC_NOM", *DIRECTION], "not by both"),
        (["--to", "TAI", "--card", "TIMESYS"], "--card is KEY=VALUE"),
        (["--to", "TAI", "--card", "TIMESYS=EST"], "'EST' is no time scale of the standard"),
        (["--to", "BDT"], "no word for BDT"),
        (["--to", "TAI", "--threads", "0"], "threads must be a whole number from 1"),
    ],
)
def test_what_is_wrong_is_one_line(
    tmp_path: Path, capsys: pytest.CaptureFixture[str], options: list[str], words: str
) -> None:
    source, target = event_file(tmp_path / "in.fits"), tmp_path / "out.fits"
    assert main(["events", str(source), str(target), *options]) == 2
    said = capsys.readouterr()
    assert words in said.err
    assert said.err.count("\n") == 1
    assert not target.exists()


def test_errors_name_the_options_of_the_command(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    target = tmp_path / "out.fits"

    def said_of(source: Path, *options: str) -> str:
        assert main(["events", str(source), str(target), *options]) == 2
        said = capsys.readouterr().err
        assert said.count("\n") == 1
        return said

    plain = save(tmp_path / "a.fits", events(with_place(header(TIMESYS="UTC")), times(5)))
    for words in ("utc='elapsed'", "(on the command line: --utc elapsed or --utc labels)"):
        assert words in said_of(plain, "--to", "TAI")
    assert main(["events", str(plain), str(target), "--to", "TAI", "--utc", "elapsed", "--quiet"]) == 0
    capsys.readouterr()
    target.unlink()

    other = save(tmp_path / "b.fits", events(with_place(header()), times(5)),
                 events(with_place(header(TIMESYS="TAI")), times(5), "HK"))  # fmt: skip
    assert "keep= (on the command line: --keep EXTENSION)" in said_of(other, "--to", "UTC")
    assert "(on the command line: --keep EXTENSION)" in said_of(other, "--to", "UTC", "--keep", "XX")

    wrong = save(tmp_path / "c.fits", events(with_place(header(DATEREF="2001-01-01T00:00:00")), times(5)))
    said = said_of(wrong, "--to", "UTC")
    assert "cards={'DATEREF': ...} (on the command line: --card KEY=VALUE)" in said
    command = ["events", str(wrong), str(target), "--to", "TAI", "--card", "DATEREF=2001-01-01T00:01:04.184"]
    assert main([*command, "--quiet"]) == 0


def test_a_direction_that_the_header_states_is_suggested(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    target = tmp_path / "out.fits"
    for cards, words in (
        ({}, "--direction RA_NOM,DEC_NOM takes it"),
        ({"RA_NOM": None, "DEC_NOM": None, "RA_OBJ": 187.2519, "DEC_OBJ": -12.6408}, "--direction RA_OBJ,DEC_OBJ"),
        ({"RA_NOM": None}, None),
        ({"RADESYS": "FK5"}, None),
    ):
        source = save(tmp_path / "in.fits", events(with_place(header(**cards)), times(5)))
        assert main(["events", str(source), str(target), "--to", "TDB@BARYCENTER"]) == 2
        said = capsys.readouterr().err
        assert "--source FILE (or --ra and --dec)" in said
        assert ("--direction" in said) == (words is not None)
        if words is not None:
            assert words in said
            names = words.split()[1]
            command = ["events", str(source), str(target), "--to", "TDB@BARYCENTER", "--direction", names]
            assert main([*command, "--quiet"]) == 0
            capsys.readouterr()


def test_streams_are_refused(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    source = event_file(tmp_path / "in.fits")
    assert main(["events", str(source), "-", "--to", "TAI"]) == 2
    assert "names of files" in capsys.readouterr().err


def large(path: Path, rows: int) -> Path:
    """A list of rows of 64 bytes, written without its being held."""
    cards = {
        "XTENSION": "BINTABLE", "BITPIX": 8, "NAXIS": 2, "NAXIS1": 64, "NAXIS2": rows, "PCOUNT": 0, "GCOUNT": 1,
        "TFIELDS": 2, "TTYPE1": "TIME", "TFORM1": "1D", "TUNIT1": "s", "TTYPE2": "PAD", "TFORM2": "56B",
        "EXTNAME": "EVENTS", "TIMESYS": "TT", "TREFPOS": "TOPOCENTER", "MJDREF": 60000.0, "CHECKSUM": "0" * 16,
        "DATASUM": "0",
    }  # fmt: skip
    block = np.zeros((1 << 16, 64), np.uint8)
    with path.open("wb") as file:
        file.write(Cards.of({"SIMPLE": True, "BITPIX": 8, "NAXIS": 0}).to_bytes())
        file.write(Cards.of(cards).to_bytes())
        for first in range(0, rows, len(block)):
            part = block[: min(len(block), rows - first)]
            part[:, :8] = (first + np.arange(len(part))).astype(">f8").view(np.uint8).reshape(-1, 8)
            file.write(part.tobytes())
        file.write(b"\0" * (-rows * 64 % 2880))
    return path


_MEASURE = """
import resource, sys
import tscale
from tscale.fits import convert_events
chain = tscale.chain("TT", "TAI")
convert_events(sys.argv[1], sys.argv[3], chain)
before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss
convert_events(sys.argv[2], sys.argv[3], chain)
print(resource.getrusage(resource.RUSAGE_SELF).ru_maxrss - before)
"""


def test_memory_does_not_grow_with_the_file(tmp_path: Path) -> None:
    pytest.importorskip("resource")
    small, big = large(tmp_path / "small.fits", 400_000), large(tmp_path / "big.fits", 1_200_000)
    done = subprocess.run(
        [sys.executable, "-c", _MEASURE, str(small), str(big), str(tmp_path / "out.fits")],
        capture_output=True, text=True, check=True,
    )  # fmt: skip
    grown_kib = int(done.stdout)
    # The second file is 50 MB larger; blocks hold 8 MiB, and an allocator is not exact.
    assert grown_kib < 16 * 1024
    assert (tmp_path / "out.fits").stat().st_size >= big.stat().st_size
    with fits.open(tmp_path / "out.fits", checksum=True) as found:
        found.verify("exception")
