"""Tables of dates in Parquet and Arrow files: bit-exact columns, bounded streams, parts that go on after a break."""

from __future__ import annotations

import csv
import os
import signal
import subprocess
import sys
import textwrap
import time
from pathlib import Path
from typing import Any

import numpy as np
import pyarrow as pa
import pyarrow.parquet as pq
import pytest
from astropy.table import Table
from astropy.time import Time
from hypothesis import given
from hypothesis import strategies as st

import tscale
from tscale.errors import DataFileError, InvalidInput, TextError
from tscale.files.arrow_columns import date_columns, fields, find_dates, instants_of
from tscale.files.stream import in_order, map_blocks
from tscale.files.tables import convert_table
from tscale.scales import Node

CHAIN = tscale.chain("UTC", "TDB@GEOCENTER")


def events(n: int = 5000) -> tscale.Instants:
    rng = np.random.default_rng(4)
    return tscale.Instants.from_seconds(790_000_000 + rng.integers(0, 30_000_000, n), rng.random(n), scale="UTC")


def table(t: tscale.Instants) -> pa.Table:
    channel = pa.array([None if i % 7 == 0 else f"ch{i % 5}" for i in range(t.size)])
    return date_columns("time", t).append_column("channel", channel)


def save(content: pa.Table, path: Path) -> Path:
    if path.suffix == ".parquet":
        pq.write_table(content, path, row_group_size=700)
    else:
        with pa.ipc.new_file(str(path), content.schema) as writer:
            writer.write_table(content, max_chunksize=700)
    return path


def load(path: Path) -> pa.Table:
    return pq.read_table(path) if path.suffix != ".arrow" else pa.ipc.open_file(str(path)).read_all()


def same(a: tscale.Instants, b: tscale.Instants) -> bool:
    return (a.scale, a.place) == (b.scale, b.place) and all(map(np.array_equal, a.pair, b.pair))


@given(
    st.lists(st.tuples(st.integers(-(2**61), 2**61), st.floats(0.0, 1.0, exclude_max=True)), min_size=0, max_size=20),
    st.sampled_from([("TDB", "BARYCENTER"), ("UTC(KST)", None), ("CLOCK(maser)", "TOPOCENTER"), ("TT(BIPM23)", None)]),
)
def test_columns_bring_back_every_bit_with_scale_and_place(
    dates: list[tuple[int, float]], node: tuple[str, str | None]
) -> None:
    whole, fraction = np.array([d[0] for d in dates], np.int64), np.array([d[1] for d in dates])
    t = tscale.Instants.from_seconds(whole, fraction, *node)
    content = date_columns("event", t)
    sink = pa.BufferOutputStream()
    pq.write_table(content, sink)
    assert same(instants_of(pq.read_table(pa.BufferReader(sink.getvalue()))), t)


@pytest.mark.parametrize("ending", [".parquet", ".arrow"])
@pytest.mark.parametrize("threads", [1, 3])
def test_a_file_keeps_its_columns_and_gains_the_dates_of_the_chain(tmp_path: Path, ending: str, threads: int) -> None:
    t = events()
    before = table(t)
    source = save(before, tmp_path / f"events{ending}")
    seen: list[tuple[int, int]] = []
    done = convert_table(
        CHAIN, source, tmp_path / f"out{ending}", threads=threads, rows=600, progress=lambda a, b: seen.append((a, b))
    )
    after = load(tmp_path / f"out{ending}")
    assert done == (t.size, 0, ("TDB@GEOCENTER_whole_s", "TDB@GEOCENTER_fraction_s"))
    assert seen[-1] == (t.size, t.size)
    assert len(seen) > 5
    assert after.select(before.column_names).equals(before)
    assert same(instants_of(after, "TDB@GEOCENTER"), CHAIN(t))
    assert sorted(p.name for p in tmp_path.iterdir()) == sorted([source.name, f"out{ending}"])


def test_files_of_a_folder_are_one_table_in_the_order_of_their_names(tmp_path: Path) -> None:
    t = events(3000)
    folder = tmp_path / "in"
    folder.mkdir()
    save(table(t[:1000]), folder / "a.parquet")
    save(table(t[1000:]), folder / "b.arrow")
    convert_table(CHAIN, folder, tmp_path / "out.parquet", result="tdb", rows=333)
    assert same(instants_of(load(tmp_path / "out.parquet"), "tdb"), CHAIN(t))
    save(table(t[:5]).drop_columns("channel"), folder / "c.parquet")
    with pytest.raises(DataFileError, match=r"c.parquet has other columns.*channel \(string\)"):
        convert_table(CHAIN, folder, tmp_path / "out.parquet", result="tdb")


class _Broken:
    """A chain that fails after some blocks."""

    start, end = CHAIN.start, CHAIN.end

    def __init__(self, blocks: int) -> None:
        self.left = blocks

    def to_bytes(self) -> bytes:
        return b"the same chain"

    def __call__(self, t: tscale.Instants) -> tscale.Instants:
        if self.left == 0:
            raise InvalidInput("broken off here")
        self.left -= 1
        return CHAIN(t)


def test_a_broken_run_leaves_no_file_but_the_parts_of_a_folder(tmp_path: Path) -> None:
    t = events()
    source = save(table(t), tmp_path / "events.parquet")
    with pytest.raises(InvalidInput, match="broken off"):
        convert_table(_Broken(20), source, tmp_path / "out.parquet", rows=100)
    assert [p.name for p in tmp_path.iterdir()] == ["events.parquet"]
    out = tmp_path / "out"
    with pytest.raises(InvalidInput, match="broken off"):
        convert_table(_Broken(33), source, out, rows=100)
    parts = sorted(p.name for p in out.glob("*.parquet"))
    assert parts == ["part-00000.parquet", "part-00001.parquet"]
    stamps = {name: (out / name).stat().st_mtime_ns for name in parts}
    (out / ".0123456789abcdef.part").write_bytes(b"of a run that was killed")
    done = convert_table(_Broken(-1), source, out, rows=100, threads=2)
    assert (done.rows, done.found) == (5000, 3200)
    assert {name: (out / name).stat().st_mtime_ns for name in parts} == stamps
    assert not list(out.glob(".*.part"))
    assert same(instants_of(pq.read_table(sorted(out.glob("*.parquet"))), "TDB@GEOCENTER"), CHAIN(t))
    with pytest.raises(DataFileError, match=r"parts of another job \(other part_rows"):
        convert_table(_Broken(-1), source, out, rows=200)
    save(table(events(4000)), source)
    with pytest.raises(DataFileError, match=r"parts of another job \(other input, rows"):
        convert_table(_Broken(-1), source, out, rows=100)
    (out / "_job.json").write_text("{")
    with pytest.raises(DataFileError, match="damaged"):
        convert_table(_Broken(-1), source, out, rows=100)


def test_folders_of_others_are_not_filled(tmp_path: Path) -> None:
    source = save(table(events(10)), tmp_path / "events.parquet")
    with pytest.raises(InvalidInput, match="holds other files"):
        convert_table(CHAIN, source, tmp_path)
    with pytest.raises(InvalidInput, match="there is no folder"):
        convert_table(CHAIN, source, tmp_path / "nowhere" / "out.parquet")
    (tmp_path / "plain").write_text("")
    with pytest.raises(InvalidInput, match="is a file"):
        convert_table(CHAIN, source, tmp_path / "plain")


KILLED = """
import sys, tscale
from tscale.files.tables import convert_table
chain = tscale.chain("UTC", "TDB@GEOCENTER")
convert_table(chain, sys.argv[1], sys.argv[2], rows=2000, progress=lambda done, rows: print(done, flush=True))
"""


def test_kill_9_in_the_middle_loses_nothing_that_was_done(tmp_path: Path) -> None:
    t = events(200_000)
    source, out = save(table(t), tmp_path / "events.parquet"), tmp_path / "out"
    with subprocess.Popen([sys.executable, "-c", KILLED, source, out], stdout=subprocess.PIPE, text=True) as process:
        assert process.stdout is not None
        for line in process.stdout:
            if int(line) > 70_000:
                os.kill(process.pid, signal.SIGKILL)
                break
    done = convert_table(CHAIN, source, out, rows=2000)
    assert 64_000 <= done.found < 200_000
    assert same(instants_of(pq.read_table(sorted(out.glob("*.parquet"))), "TDB@GEOCENTER"), CHAIN(t))


def test_two_processes_do_not_fill_one_folder(tmp_path: Path) -> None:
    from filelock import FileLock

    source, out = save(table(events(10)), tmp_path / "events.parquet"), tmp_path / "out"
    out.mkdir()
    with FileLock(out / "_job.lock"), pytest.raises(InvalidInput, match="another process"):
        convert_table(CHAIN, source, out)


@pytest.mark.parametrize("ending", [".parquet", ".arrow"])
def test_a_file_that_was_cut_is_found(tmp_path: Path, ending: str) -> None:
    source = save(table(events(300)), tmp_path / f"events{ending}")
    whole = source.read_bytes()
    rng = np.random.default_rng(2)
    for size in rng.integers(0, len(whole) - 1, 40):
        source.write_bytes(whole[:size])
        with pytest.raises(DataFileError):
            convert_table(CHAIN, source, tmp_path / f"out{ending}")
    assert [p.name for p in tmp_path.iterdir()] == [source.name]


def test_dates_that_are_missing_or_no_fractions_are_named_by_row(tmp_path: Path) -> None:
    t = events(900)
    fraction = t.fraction.copy()
    fraction[850] = 1.0
    bad = pa.table({"time_whole_s": t.whole, "time_fraction_s": fraction})
    with pytest.raises(DataFileError, match=r"1 of 50 fractions of 'time' are not in \[0, 1\)") as caught:
        convert_table(CHAIN, save(bad, tmp_path / "a.parquet"), tmp_path / "b.parquet", rows=50)
    assert caught.value.row == 851
    assert caught.value.mask is not None
    assert caught.value.mask.sum() == 1
    holes = pa.table({"time_whole_s": pa.array([1, None, 3]), "time_fraction_s": [0.5, 0.5, 0.5]})
    with pytest.raises(DataFileError, match="1 of 3 rows have no date"):
        instants_of(holes, node=Node.parse("UTC"))


def test_columns_are_chosen_by_name_and_contradictions_refused(tmp_path: Path) -> None:
    t = events(4)
    two = pa.table(
        [*date_columns("a", t).columns, *date_columns("b", t).columns],
        schema=pa.schema([*fields("a", Node.parse("UTC")), *fields("b", Node.parse("TAI"))]),
    )
    with pytest.raises(InvalidInput, match=r"2 columns of dates \(a, b\)"):
        find_dates(two.schema)
    with pytest.raises(InvalidInput, match=r"no column of dates 'c' \(there: a, b\)"):
        find_dates(two.schema, "c")
    assert instants_of(two, "b").scale == "TAI"
    with pytest.raises(InvalidInput, match="are TAI by their metadata"):
        convert_table(CHAIN, save(two, tmp_path / "two.parquet"), tmp_path / "out.parquet", column="b")
    with pytest.raises(InvalidInput, match="are TAI by their metadata, not UTC"):
        instants_of(two, "b", node=Node.parse("UTC"))
    with pytest.raises(InvalidInput, match="already"):
        convert_table(CHAIN, tmp_path / "two.parquet", tmp_path / "out.parquet", column="a", result="b")
    plain = pa.table({"x_whole_s": [1], "x_fraction_s": [0.25]})
    with pytest.raises(InvalidInput, match="nothing says which scale"):
        instants_of(plain)
    assert instants_of(plain, node=Node.parse("TT@GEOCENTER")).place == "GEOCENTER"
    assert instants_of(plain, node=Node.parse("TT@GEOCENTER")).whole.tolist() == [1]
    with pytest.raises(DataFileError, match=r"'x_whole_s' is double, dates need int64"):
        find_dates(pa.table({"x_whole_s": [1.0], "x_fraction_s": [0.25]}).schema)
    mixed = pa.schema([fields("x", Node.parse("UTC"))[0], fields("x", Node.parse("TAI"))[1]])
    with pytest.raises(DataFileError, match="contradict each other: time_scale"):
        find_dates(mixed)
    moved = plain.schema.field(0).with_metadata({"time_scale": "TT", "time_origin": "1970-01-01T00:00:00"})
    with pytest.raises(DataFileError, match="time_origin '1970-01-01T00:00:00'; only"):
        find_dates(pa.schema([moved, plain.schema.field(1)]))
    with pytest.raises(InvalidInput, match=r"must end in \.parquet, \.arrow, \.feather"):
        convert_table(CHAIN, tmp_path / "events.txt", tmp_path / "out.parquet")


def test_timestamps_and_texts_are_dates_too(tmp_path: Path) -> None:
    t = tscale.Instants.from_iso(["2016-12-31T23:59:59.250", "2017-01-01T00:00:00.125"], "UTC")
    stamps = pa.array(t.to_iso(3).astype("datetime64[ms]"))
    plain = pa.table({"stamp": stamps, "text": t.to_iso(9).tolist(), "other": [1.0, 2.0]})
    for column in ("stamp", "text"):
        convert_table(CHAIN, save(plain, tmp_path / "in.parquet"), tmp_path / "out.parquet", column=column)
        assert same(instants_of(load(tmp_path / "out.parquet"), "TDB@GEOCENTER"), CHAIN(t))
    assert find_dates(plain.schema).name == "stamp"
    viewed = pa.table({"text": plain["text"].cast(pa.string_view())})  # as polars writes it
    assert same(instants_of(viewed, "text", node=Node.parse("UTC")), t)
    zoned = pa.table({"stamp": stamps.cast(pa.timestamp("us", tz="Etc/GMT-12"))})
    assert same(instants_of(zoned), t)  # Arrow keeps UTC, whatever the zone
    with pytest.raises(InvalidInput, match="are UTC by their metadata, not TAI"):
        instants_of(zoned, node=Node.parse("TAI"))
    with pytest.raises(InvalidInput, match="nothing says which scale"):
        instants_of(plain)
    with pytest.raises(DataFileError, match="column 'other' is double"):
        find_dates(plain.schema, "other")
    wrong = pa.table({"text": ["2017-01-01"] * 70 + ["2017-02-30"]})
    with pytest.raises(TextError, match="2017-02-30") as caught:
        convert_table(CHAIN, save(wrong, tmp_path / "in.parquet"), tmp_path / "o.parquet", column="text", rows=50)
    assert caught.value.row == 71


def test_text_and_tables_cross(tmp_path: Path) -> None:
    t = events(3000)
    text = tmp_path / "in.csv"
    rows = "".join(f"{date},{i},x{i % 3}\n" for i, date in enumerate(t.to_iso(12)))
    text.write_text("# of an invented instrument\nseen,count,kind\n" + rows)
    read = tscale.Instants.from_iso(t.to_iso(12), "UTC")
    convert_table(CHAIN, text, tmp_path / "out.parquet", rows=700)
    after = load(tmp_path / "out.parquet")
    assert same(instants_of(after, "TDB@GEOCENTER"), CHAIN(read))
    assert after["count"].to_pylist() == list(range(3000))
    convert_table(CHAIN, tmp_path / "out.parquet", tmp_path / "out.csv", column="seen", result="again", rows=900)
    lines = list(csv.reader((tmp_path / "out.csv").read_text().splitlines()))
    assert lines[0] == ["seen", "count", "kind", "TDB@GEOCENTER", "again"]
    assert [line[3:] for line in lines[1:]] == [[str(date)] * 2 for date in CHAIN(read).to_iso(12)]
    with pytest.raises(InvalidInput, match=r"out\.txt is no table by its name"):
        convert_table(CHAIN, text, tmp_path / "out.txt")
    text.write_text("# only this\n")
    with pytest.raises(DataFileError, match="has no header"):
        convert_table(CHAIN, text, tmp_path / "out.parquet")
    text.write_text("seen,n\n2020-01-01,1\n2020-01-02,1,3\n")
    with pytest.raises(DataFileError, match="Expected 2 columns, got 3"):
        convert_table(CHAIN, text, tmp_path / "out.parquet")


def test_dictionaries_of_blocks_may_differ(tmp_path: Path) -> None:
    t = events(60)
    kinds = pa.chunked_array(
        [pa.array(["a", "b"] * 15).dictionary_encode(), pa.array(["c", "a"] * 15).dictionary_encode()]
    )
    for name in ("in.parquet", "in.arrow"):
        content = date_columns("time", t).append_column("kind", kinds)
        if name.endswith("arrow"):
            content = content.unify_dictionaries()
        source = save(content, tmp_path / name)
        for target in ("out.arrow", "out.parquet"):
            convert_table(CHAIN, source, tmp_path / target, rows=30)
            assert load(tmp_path / target)["kind"].to_pylist() == ["a", "b"] * 15 + ["c", "a"] * 15


def test_leap_seconds_belong_to_the_job_where_dates_are_labels(tmp_path: Path) -> None:
    stamps = pa.table({"stamp": pa.array(np.datetime64("2031-01-01", "s") + np.arange(40))})
    source, out = save(stamps, tmp_path / "in.parquet"), tmp_path / "out"
    usual = tscale.LeapSeconds.default()
    with pytest.warns(tscale.ExtrapolationWarning):
        convert_table(CHAIN, source, out, rows=1)
    (out / "part-00001.parquet").unlink()
    with pytest.raises(DataFileError, match=r"parts of another job \(other leap_seconds"):
        convert_table(CHAIN, source, out, rows=1, leap_seconds=usual.with_step(62502, 38))
    with pytest.raises(DataFileError, match="holds 24 of 40 rows: a conversion was broken off"):
        convert_table(CHAIN, out, tmp_path / "next.parquet", column="TDB@GEOCENTER")


def test_a_name_that_stands_twice_is_refused() -> None:
    twice = pa.table([[1], [2], [0.5], [3]], names=["time_whole_s", "time_whole_s", "time_fraction_s", "n"])
    with pytest.raises(InvalidInput, match="'time_whole_s' more than once"):
        find_dates(twice.schema, "time")


def test_terms_sigmas_and_rates_are_columns_on_request(tmp_path: Path) -> None:
    t = events(300)
    chains = [CHAIN, tscale.chain("UTC", "TT@GEOCENTER")]
    source = save(table(t), tmp_path / "in.parquet")
    convert_table(chains, source, tmp_path / "out.parquet", result=["tdb", "tt"], ledger=True, sigma=True, rate=True)
    after = load(tmp_path / "out.parquet")
    assert same(instants_of(after, "tt"), chains[1](t))
    assert np.array_equal(after["tdb_sigma_s"], CHAIN.sigma_s(t))
    assert np.array_equal(after["tdb_rate"], CHAIN.rate(t))
    ledger = CHAIN.ledger(t)
    for term, value in ledger.items():
        assert np.array_equal(after[f"tdb: {term} (s)"], value)
    assert after["tt: TT - TAI (s)"].unique().to_pylist() == [32.184]
    with pytest.raises(InvalidInput, match="each of 2 columns"):
        convert_table(chains, source, tmp_path / "out.parquet", result="tdb")
    with pytest.raises(InvalidInput, match="start at one node"):
        convert_table([CHAIN, tscale.chain("TAI", "TT@GEOCENTER")], source, tmp_path / "out.parquet")
    with pytest.raises(InvalidInput, match="no terms and no uncertainties"):
        convert_table(_Broken(-1), source, tmp_path / "out.parquet", ledger=True)


def test_results_come_in_order_and_errors_in_their_turn() -> None:
    def slow(i: int) -> int:
        time.sleep(0.002 * (i % 3))
        if i == 17:
            raise InvalidInput("seventeen")
        return i

    assert list(in_order(slow, range(17), 4)) == list(range(17))
    got: list[Any] = []
    with pytest.raises(InvalidInput, match="seventeen"):
        got.extend(iter(in_order(lambda i: got.append(i) or slow(i), range(40), 1)))
    taken = iter(in_order(slow, range(40), 3))
    assert [next(taken) for _ in range(17)] == list(range(17))
    with pytest.raises(InvalidInput, match="seventeen"):
        next(taken)
    with pytest.raises(InvalidInput, match="threads"):
        in_order(slow, [1], 0)


def test_blocks_give_the_same_bytes_with_any_number_of_threads() -> None:
    t = events(20_000)
    blocks = [tuple(part[i : i + 1500] for part in t.pair) for i in range(0, t.size, 1500)]
    want = CHAIN(t)
    for threads in (1, 2, 5):
        got = list(map_blocks(CHAIN, blocks, threads=threads))  # type: ignore[arg-type]
        assert np.array_equal(np.concatenate([g[0] for g in got]), want.whole)
        assert np.array_equal(np.concatenate([g[1] for g in got]), want.fraction)
    with pytest.raises(InvalidInput, match="a stream needs a Chain"):
        map_blocks("UTC", blocks)  # type: ignore[arg-type]


def test_a_stream_holds_no_more_blocks_than_its_threads_need() -> None:
    taken = 0

    def source() -> Any:
        nonlocal taken
        for _ in range(50):
            taken += 1
            yield np.zeros(4, np.int64), np.zeros(4)

    results = map_blocks(CHAIN, source(), threads=2)
    for n, _ in enumerate(results, start=1):
        assert taken <= n + 3


def test_without_pyarrow_the_message_names_the_extra() -> None:
    code = """
    import sys
    sys.modules["pyarrow"] = None
    from tscale.files.arrow_columns import arrow
    from tscale.errors import MissingPiece
    try:
        arrow()
    except MissingPiece as error:
        print(error)
    """
    done = subprocess.run([sys.executable, "-c", textwrap.dedent(code)], capture_output=True, text=True, check=True)
    assert "pip install 'tscale[tables]'" in done.stdout


def test_astropy_reads_the_same_dates_out_of_a_table(tmp_path: Path) -> None:
    t = events(200)
    convert_table(CHAIN, save(date_columns("time", t), tmp_path / "in.parquet"), tmp_path / "out.parquet", result="tdb")
    found = Table.read(tmp_path / "out.parquet", format="parquet")
    days = found["tdb_whole_s"] // 86400, found["tdb_whole_s"] % 86400 + found["tdb_fraction_s"]
    read = Time(2451545.0 + np.asarray(days[0]), np.asarray(days[1]) / 86400.0, format="jd", scale="tdb")
    theirs = tscale.interop.from_astropy(read, place="GEOCENTER")
    assert np.max(np.abs(theirs - CHAIN(t))) < 1e-11  # s: a day in one float64
    # And by its own way from UTC to TDB at the geocentre, whose analytic series is good to 13 ns.
    own = Time(*(2400000.5 + t.to_mjd()[0], t.to_mjd()[1]), format="jd", scale="utc").tdb
    assert np.max(np.abs((own - read).sec)) < 2e-8
