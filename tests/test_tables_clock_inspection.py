"""Inspection of clock logs: every kind of damage planted in an even log is found, in its row and with its size."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pytest

from tscale import ClockLog, Instants
from tscale.errors import DataFileError, InvalidInput
from tscale.tables.clock_anomalies import anomalies, longest_increasing

START = Instants.from_iso("2025-03-01T00:00:00", scale="UTC")
DAY_S = 86400
SCATTER_S = 1e-10
HEADER = ("epoch", "offset_s", "uncertainty_s", "reference")


def even_log(count: int = 60, seed: int = 1) -> tuple[list[list[str]], np.ndarray]:
    """A maser at 3 ns a day, read daily with 0.1 ns of scatter: rows of text, and the offsets."""
    random = np.random.default_rng(seed)
    offset = 4.2e-6 + 3e-9 * np.arange(count) + SCATTER_S * random.standard_normal(count)
    dates = Instants.from_seconds(START.whole + DAY_S * np.arange(count), scale="UTC").to_iso(0)
    return [[date, f"{x:.13f}", "1e-10", "UTC"] for date, x in zip(dates, offset, strict=True)], offset


def write(folder: Path, rows: list[list[str]]) -> Path:
    path = folder / "maser.csv"
    path.write_text("\n".join(",".join(row) for row in [list(HEADER), *rows]) + "\n")
    return path


def add(rows: list[list[str]], places: slice, size: np.ndarray | float) -> None:
    for row, extra in zip(rows[places], np.broadcast_to(size, len(rows[places])), strict=True):
        row[1] = f"{float(row[1]) + extra:.13f}"


def test_an_even_log_is_clean(tmp_path: Path) -> None:
    for seed in range(20):
        report = ClockLog.inspect(write(tmp_path, even_log(seed=seed)[0]))
        assert report.clean, report.table()
        assert report.loads
        assert (report.rows, report.used, report.findings) == (60, 60, ())
        assert "nothing odd" in str(report)


def test_a_log_with_sixteen_kinds_of_damage(tmp_path: Path) -> None:
    """One file, every kind of damage once: each is reported with the row that it stands in, counted as in an editor."""
    rows, _ = even_log(120)
    add(rows, slice(20, 21), 5e-9)  # outlier
    add(rows, slice(35, None), -8e-9)  # phase jump
    add(rows, slice(50, None), 6e-9 * np.arange(70))  # rate step: 6 ns a day
    rows[60][1] = f"{float(rows[60][1]) * 1e9:.4f}"  # nanoseconds
    rows[65][0] = "2025-02-30T00:00:00"  # no such day
    rows[68][1] = "nan"
    rows[71][1] = ""  # the comparison failed
    rows[74][2] = "0"
    rows[77][2] = ""
    rows[80] = rows[80][:3]  # a cell is missing
    rows[83][0] = rows[82][0]  # the epoch of the row before
    rows[86][0] = "2025-03-02T12:00:00"  # back to the second day
    rows[89][3] = "UTC(KRL)"
    rows[92][2] = "-1e-10"
    for row in rows[100:]:  # from here every six hours, starting a day after the row before
        number = rows.index(row) - 100
        row[0] = str(Instants.from_seconds(START.whole + 100 * DAY_S + 21600 * number, scale="UTC").to_iso(0))
        row[1] = f"{4.2e-6 - 8e-9 + 3e-9 * (100 + number / 4) + 6e-9 * (50 + number / 4):.13f}"
    del rows[95:98]  # a gap of three days: rows from here stand three lines further up
    report = ClockLog.inspect(write(tmp_path, rows))
    found = {(finding.kind, finding.rows) for finding in report.findings}
    line = 2  # the first row stands in line 2
    want = {
        ("outlier", (20 + line,)),
        ("phase jump", (35 + line,)),
        ("rate step", (50 + line,)),
        ("unit", (60 + line,)),
        ("bad date", (65 + line,)),
        ("bad number", (68 + line,)),
        ("failed comparison", (71 + line,)),
        ("zero uncertainty", (74 + line,)),
        ("no uncertainty", (77 + line,)),
        ("wrong cells", (80 + line,)),
        ("duplicate epoch", (83 + line,)),
        ("reversed epoch", (86 + line,)),
        ("other reference", (89 + line,)),
        ("bad number", (92 + line,)),
        ("gap", (95 + line,)),
        ("spacing", (98 + line,)),
    }
    # Rows that fell out leave gaps of two days, which are reported at the row after each.
    left_out = {("gap", (place + 1 + line,)) for place in (65, 68, 71, 80, 83, 86, 89)}
    assert found == want | left_out, report.table()
    assert not report.loads
    with pytest.raises(DataFileError):
        ClockLog.load(tmp_path / "maser.csv")
    # Sizes to five times the scatter, of which a jump or an outlier of one row takes about one.
    for kind, size, tolerance in (
        ("outlier", 5e-9, 5 * SCATTER_S),
        ("phase jump", -8e-9, 5 * SCATTER_S),
        ("rate step", 6e-9 / DAY_S, 10 * SCATTER_S / DAY_S),
        ("gap", 4 * DAY_S, 0.0),
        ("spacing", 21600.0, 0.0),
    ):
        sizes = [finding.size for finding in report.of(kind) if finding.size is not None]
        assert min(abs(value - size) for value in sizes) <= tolerance
    read = json.loads(report.to_json())
    assert read["findings"][0]["rows"] == list(report.findings[0].rows)
    assert read["rows"] == 117
    assert f"line {20 + line}: outlier" in report.table()
    assert report.counts()["bad number"] == 2


DAMAGE: list[tuple[str, Callable[[list[list[str]]], None], int | None]] = [
    ("bad date", lambda rows: rows[30].__setitem__(0, "yesterday"), 32),
    ("bad number", lambda rows: rows[30].__setitem__(1, "inf"), 32),
    ("bad number", lambda rows: rows[30].__setitem__(1, "4.2e10"), 32),
    ("no uncertainty", lambda rows: rows[30].__setitem__(2, ""), 32),
    ("not text", lambda rows: rows[30].__setitem__(2, "\0"), 32),
    ("wrong cells", lambda rows: rows[30].append("x"), 32),
    ("reversed epoch", lambda rows: rows[30].__setitem__(0, "2026-11-01T00:00:00"), 32),
    ("duplicate epoch", lambda rows: rows[40].__setitem__(0, rows[30][0]), 42),
    ("other reference", lambda rows: [row.__setitem__(3, "UTC(KRL)") for row in rows[30:]] and None, 32),
    ("columns", lambda rows: rows.insert(0, ["# "]) or rows.insert(0, list(HEADER)[:1] + list(HEADER)[:1]), None),
    ("refused", lambda rows: rows[30].__setitem__(1, "-90000"), 32),
]


@pytest.mark.parametrize(("kind", "damage", "row"), DAMAGE)
def test_errors_are_what_load_refuses(
    tmp_path: Path, kind: str, damage: Callable[[list[list[str]]], None], row: int | None
) -> None:
    rows, _ = even_log()
    if kind == "columns":
        path = tmp_path / "maser.csv"
        path.write_text("epoch,offset_s\n" + "\n".join(",".join(r[:2]) for r in rows))
        row = 1
    else:
        damage(rows)
        path = write(tmp_path, rows)
    report = ClockLog.inspect(path)
    with pytest.raises(DataFileError):
        ClockLog.load(path)
    errors = [finding for finding in report.findings if finding.severity == "error"]
    assert [finding.kind for finding in errors] == [kind], report.table()
    assert errors[0].rows[0] == row or kind == "refused"
    assert not report.loads


def test_one_date_far_ahead_spoils_one_row(tmp_path: Path) -> None:
    """Not the thirty rows after it, which all come before it."""
    rows, _ = even_log()
    rows[30][0] = "2026-11-01T00:00:00"
    assert [f.rows for f in ClockLog.inspect(write(tmp_path, rows)).of("reversed epoch")] == [(32,)]


def test_longest_increasing_part() -> None:
    whole = np.array([1, 2, 9, 3, 3, 4, 0, 5])
    assert longest_increasing(whole, np.zeros(8)).tolist() == [True, True, False, True, False, True, False, True]
    assert longest_increasing(np.array([5, 5]), np.array([0.5, 0.25])).sum() == 1
    assert longest_increasing(np.array([], dtype=np.int64), np.array([])).tolist() == []


@pytest.mark.parametrize("seed", range(5))
def test_sizes_and_places_of_disturbances(seed: int) -> None:
    """One of each in uneven series; twenty times the scatter leaves no doubt which is which."""
    random = np.random.default_rng(seed)
    t = np.cumsum(random.uniform(0.7, 1.3, 200)) * DAY_S
    clean = 1e-6 - 4e-14 * t + SCATTER_S * random.standard_normal(200)
    x = clean.copy()
    x[40] += 3e-9
    x[90:] -= 4e-9
    x[150:] += 5e-14 * (t[150:] - t[150])
    found = anomalies(t, x, 0.0, 6.0)
    assert [(a.kind, a.place) for a in found] == [("outlier", 40), ("phase jump", 90), ("rate step", 150)]
    # One distance holds about 1.2 times the scatter; a rate is one over half a spacing.
    assert found[0].size == pytest.approx(3e-9, abs=5 * SCATTER_S)
    assert found[1].size == pytest.approx(-4e-9, abs=5 * SCATTER_S)
    assert found[2].size == pytest.approx(5e-14, abs=15 * SCATTER_S / DAY_S)
    assert anomalies(t, clean, 0.0, 6.0) == []
    # An offset and a rate of the clock change nothing.
    assert [(a.kind, a.place) for a in anomalies(t, x + 1e-3 + 1e-10 * t, 0.0, 6.0)] == [
        (a.kind, a.place) for a in found
    ]


def test_the_ends_of_a_series() -> None:
    random = np.random.default_rng(3)
    t = np.arange(50.0) * DAY_S
    for place in (0, 49):
        x = SCATTER_S * random.standard_normal(50)
        x[place] += 4e-9
        assert [(a.kind, a.place) for a in anomalies(t, x, 0.0, 6.0)] == [("outlier", place)]


def test_random_walks_are_no_disturbances() -> None:
    """White frequency noise: 100 series of 500 without a finding at six sigma (2e-9 each, 1e-4 in all)."""
    random = np.random.default_rng(9)
    t = np.arange(500.0)
    assert not any(anomalies(t, np.cumsum(random.standard_normal(500)), 0.0, 6.0) for _ in range(100))


def test_what_a_log_says_of_itself_is_a_note(tmp_path: Path) -> None:
    rows, _ = even_log()
    add(rows, slice(30, None), 1e-6)
    lines = [[*HEADER, "use", "reset_s", "rate_step"], *([*row, "", "", ""] for row in rows)]
    lines[11][4] = "no"
    lines[11][1] = "broken"
    lines[31][5] = "1e-6"
    lines[41][6] = "yes"
    path = tmp_path / "maser.csv"
    path.write_text("\n".join(",".join(line) for line in lines))
    report = ClockLog.inspect(path)
    assert [(f.kind, f.rows) for f in report.findings if f.severity == "note"] == [
        ("not used", (12,)),
        ("reset", (32,)),
        ("known rate step", (42,)),
    ]
    # A reset that is told is no jump; one of unknown size starts the series anew.
    assert not report.of("phase jump")
    assert report.loads
    lines[31][5] = "unknown"
    path.write_text("\n".join(",".join(line) for line in lines))
    assert not ClockLog.inspect(path).of("phase jump")
    lines[31][5] = ""
    path.write_text("\n".join(",".join(line) for line in lines))
    assert [f.rows for f in ClockLog.inspect(path).of("phase jump")] == [(32,)]


def test_a_whole_log_in_nanoseconds(tmp_path: Path) -> None:
    rows, offset = even_log()
    for row, x in zip(rows, offset, strict=True):
        row[1], row[2] = f"{1e9 * x:.4f}", "0.1"
    report = ClockLog.inspect(write(tmp_path, rows))
    assert [f.rows for f in report.of("unit")] == [()]
    assert "nanoseconds" in report.table()


def test_rows_at_hand_count_from_one(tmp_path: Path) -> None:
    rows, _ = even_log()
    add(rows, slice(20, 21), 5e-9)
    rows[40][0] = "?"
    path = write(tmp_path, rows)
    texts = list(csv.DictReader(io.StringIO(path.read_text())))
    report = ClockLog.inspect(texts)
    assert [(f.kind, f.rows) for f in report.findings if f.kind != "gap"] == [("outlier", (21,)), ("bad date", (41,))]
    assert report.name == "rows"


def test_references_with_nominal_differences(tmp_path: Path) -> None:
    rows, offset = even_log()
    for row, x in zip(rows, offset, strict=True):
        row[1], row[3] = f"{x - 18.0:.13f}", "GPS"
    rows[20][1] = f"{offset[20]:.13f}"
    path = write(tmp_path, rows)
    assert not ClockLog.inspect(path).loads
    report = ClockLog.inspect(path, nominal="included")
    assert [f.rows for f in report.of("nominal")] == [(22,)]
    with pytest.raises(DataFileError, match="line 22"):
        ClockLog.load(path, nominal="included")


def test_options(tmp_path: Path) -> None:
    rows, _ = even_log()
    with pytest.raises(InvalidInput, match="threshold"):
        ClockLog.inspect(write(tmp_path, rows), threshold=0.0)
    with pytest.raises(DataFileError, match="cannot read"):
        ClockLog.inspect(tmp_path / "none.csv")
    del rows[30]
    assert [f.rows for f in ClockLog.inspect(write(tmp_path, rows)).of("gap")] == [(32,)]
    assert not ClockLog.inspect(write(tmp_path, rows), max_gap_s=3 * DAY_S).of("gap")


def test_a_change_of_rate_that_no_single_offset_shows() -> None:
    """3e-14 among offsets of 0.1 ns every 10 minutes: 18 ps from one to the next. The lines before and after part by
    18 ps an offset, so that the corner shows within some offsets; over 40 either side the slopes, of
    sqrt(12) 0.1 ns / (24000 s sqrt(40)) = 2.3e-15 each, differ by 3e-14 to five times 3e-15 and some for the corner.
    """
    random = np.random.default_rng(17)
    t = 600.0 * np.arange(4000)
    for place in random.integers(500, 3500, 10):
        x = 3e-13 * t + SCATTER_S * random.standard_normal(4000)
        assert anomalies(t, x, 0.0, 6.0) == []
        x[place:] += 3e-14 * (t[place:] - t[place])
        found = anomalies(t, x, 0.0, 6.0)
        assert [a.kind for a in found] == ["rate step"]
        assert found[0].place == pytest.approx(place, abs=10)
        assert found[0].size == pytest.approx(3e-14, abs=1.6e-14)


@pytest.mark.parametrize("length", [8, 12, 30])
def test_short_logs_are_not_cried_over(length: int) -> None:
    """Of 400 undisturbed series at most 1 in 200 is complained of, though eight offsets say little of their scatter."""
    random = np.random.default_rng(length)
    t = np.arange(float(length))
    series = random.standard_normal((400, length))
    assert sum(bool(anomalies(t, x, 0.0, 6.0)) for x in series) <= 2
    assert sum(bool(anomalies(t, np.cumsum(x), 0.0, 6.0)) for x in series) <= 2


@pytest.mark.filterwarnings("ignore::tscale.errors.ExtrapolationWarning")  # a digit more can make it the year 2925
@pytest.mark.parametrize("seed", range(60))
def test_the_report_and_load_agree_on_damaged_files(tmp_path: Path, seed: int) -> None:
    """Bytes changed, lost, doubled or cut at random: the inspection ends, and says whether the file can be loaded."""
    random = np.random.default_rng(seed)
    rows, _ = even_log(20)
    content = bytearray(write(tmp_path, rows).read_bytes())
    for _ in range(random.integers(1, 4)):
        place = int(random.integers(0, len(content) or 1))
        match int(random.integers(0, 4)) if content else 4:
            case 0:
                content[place] = int(random.choice(list(b'0123456789-+.,:TZe" \n\r\t#\0\xff\xe9')))
            case 1:
                del content[place : place + int(random.integers(1, 30))]
            case 2:
                content[place:place] = content[place : place + int(random.integers(1, 60))]
            case _:
                if random.random() < 0.3:
                    del content[place:]
    path = tmp_path / "maser.csv"
    path.write_bytes(bytes(content) or b"\n")
    try:
        ClockLog.load(path)
        loads = True
    except DataFileError:
        loads = False
    if not content.strip():
        return
    report = ClockLog.inspect(path)
    assert report.loads == loads, report.table()
    assert json.loads(report.to_json())["rows"] == report.rows


def test_logs_with_nothing_in_them(tmp_path: Path) -> None:
    path = tmp_path / "maser.csv"
    path.write_text(",".join(HEADER) + "\n")
    assert [f.kind for f in ClockLog.inspect(path).findings] == ["refused"]
    assert [f.kind for f in ClockLog.inspect([]).findings] == ["refused"]
    path.write_text(",".join(HEADER) + "\n2025-03-01T00:00:00,1e-7,1e-9,UT1\n")
    assert [f.kind for f in ClockLog.inspect(path).findings] == ["other reference"]


@pytest.mark.parametrize("place", [0, 1, 30, 58, 59])
@pytest.mark.parametrize("power", [3, 6, 9, -3])
def test_an_offset_in_another_unit(tmp_path: Path, place: int, power: int) -> None:
    """Milli-, micro- and nanoseconds among seconds, and a factor of 1000 the other way."""
    rows, offset = even_log()
    rows[place][1] = f"{offset[place] * 10.0**power:.16f}"
    report = ClockLog.inspect(write(tmp_path, rows))
    assert [(f.kind, f.rows) for f in report.findings if f.severity == "warning"] == [("unit", (place + 2,))]
