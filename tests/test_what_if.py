"""What other tables move: terms add up to what the result moves, labels held, pulls against the uncertainties."""

from __future__ import annotations

import json
import re
from pathlib import Path

import numpy as np
import pytest

import tscale
from tscale.cli.main import main
from tscale.errors import InvalidInput, OutOfSpan, TextError
from tscale.formats import labels
from tscale.scales import Scale
from tscale.scenarios import WhatIf
from tscale.tables.tt_bipm import TTBIPM

EXAMPLES = Path(__file__).parents[1] / "examples"
DATA = Path(__file__).parent / "data"
PREDICTED = DATA / "eop_predictions" / "finals2000A_2025-05-23.txt"
SITE = tscale.Site.load(EXAMPLES / "site.toml")
STAR = tscale.Source.load(EXAMPLES / "source.toml")
LOGS = [tscale.ClockLog.load(EXAMPLES / name) for name in ("maser.csv", "utc_krl.csv")]
LEAP = tscale.LeapSeconds.default().with_expiry(None)
NEGATIVE = LEAP.with_step(62502, 36)  # 2030-01-01
T = tscale.Instants.from_iso([f"2026-{month:02d}-03T12:21:00.639426798458" for month in (1, 3, 5)], scale="UTC")


def label_moved_s(w: WhatIf, before: tscale.Instants, after: tscale.Instants, old: object, new: object) -> None:
    """The total is the difference of the labels, written out by both tables."""
    faces = [
        labels.label(Scale.parse(t.scale), t.pair, table)  # type: ignore[arg-type]
        for t, table in ((before, old), (after, new))
    ]
    seconds = [(day - 51544) * 86400 + whole + fraction for day, whole, fraction in faces]
    # float64 seconds of some 30 years: 1e-7 s.
    np.testing.assert_allclose(w.total_s, seconds[1] - seconds[0], rtol=0, atol=3e-7)


def test_the_same_tables_move_nothing() -> None:
    chain = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=STAR)
    w = tscale.what_if(chain, T, reference=tscale.ReferenceData.load())
    assert not w.total_s.any()
    assert not w.count_s.any()
    assert w.changes == ()
    assert all(not moved.moved_s.any() for moved in w.terms)
    assert w.before.to_json() == w.after.to_json()


def test_predicted_earth_orientation_then_measured() -> None:
    """Terms add up to what the result moves, to the 0.1 fs of a date and the roundings of 20 terms."""
    later = tscale.ReferenceData.load()
    chain = tscale.chain(
        "UTC", "TDB@BARYCENTER", site=SITE, source=STAR, reference=later.replace(earth_orientation=PREDICTED)
    )
    w = tscale.what_if(chain, T, earth_orientation=later.earth_orientation)
    sums = sum((moved.moved_s for moved in w.terms), np.zeros(3))
    np.testing.assert_allclose(sums, w.total_s, rtol=0, atol=2e-15)
    np.testing.assert_allclose(w.count_s, w.total_s, rtol=0, atol=2e-15)
    moved = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=STAR)(T).minus(chain(T))
    np.testing.assert_array_equal(w.count_s, moved)
    # UT1 off by some ms: 0.3 km/s of a site along the line of sight in c, a ns for every ms.
    assert 1e-10 < np.abs(w["Roemer delay"]).max() < 2e-7
    assert not w["TAI - UTC"].any()
    (change,) = w.changes
    assert change.what == "Earth orientation"
    assert change.before.startswith(PREDICTED.name)
    # The uncertainty in use of a prediction half a year ahead fits its error: a pull of a few at the most.
    step = w.steps[-1]
    assert step.sigma_s is not None
    np.testing.assert_array_equal(step.pulls, step.moved_s / step.sigma_s)
    stated = [
        np.sqrt(
            sum(
                part.signed_s**2 for part in one.steps[-1].contributed(tdb) if part.handle[:1] == ("earth_orientation",)
            )
        )
        for one, tdb in (
            (one, tscale.chain("UTC", "TDB", site=SITE, reference=one.reference)(T))
            for one in (chain, tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=STAR, reference=later))
        )
    ]
    np.testing.assert_allclose(step.sigma_s, np.hypot(*stated), rtol=1e-12)
    assert 0.01 < w.total.pull_rms < 4.0  # type: ignore[operator]
    assert "3 of 3 instants use predicted Earth orientation" in w.before.notes
    assert w.after.notes == ()


def test_leap_seconds_move_the_count_of_a_utc_reading() -> None:
    """A negative leap second at the end of 2029: the same label is an instant one second earlier from then on."""
    reference = tscale.ReferenceData(leap_seconds=LEAP)
    chain = tscale.chain("UTC", "TDB@GEOCENTER", reference=reference)
    t = tscale.Instants.from_iso(
        ["2029-12-31T23:59:58.5", "2030-01-01T00:00:00", "2031-05-06T07:08:09"], scale="UTC", leap_seconds=LEAP
    )
    w = tscale.what_if(chain, t, leap_seconds=NEGATIVE)
    np.testing.assert_array_equal(w["TAI - UTC"], [0.0, -1.0, -1.0])
    np.testing.assert_allclose(w.total_s, [0.0, -1.0, -1.0], rtol=0, atol=1e-7)  # TDB - TT moves 2e-8 s in a second
    np.testing.assert_allclose(w.count_s, w.total_s, rtol=0, atol=2e-15)
    label_moved_s(w, chain(t), tscale.chain("UTC", "TDB@GEOCENTER", reference=reference.replace(leap_seconds=NEGATIVE))(
        tscale.Instants.from_iso(
            ["2029-12-31T23:59:58.5", "2030-01-01T00:00:00", "2031-05-06T07:08:09"], scale="UTC", leap_seconds=NEGATIVE
        )
    ), LEAP, NEGATIVE)  # fmt: skip


def test_leap_seconds_move_the_label_of_a_utc_result() -> None:
    """From TT, held, the instant stays; what its UTC label says moves by a second. So does that of GLONASS time."""
    reference = tscale.ReferenceData(leap_seconds=LEAP)
    for end in ("UTC", "GLONASS"):
        chain = tscale.chain("TT", end, reference=reference)
        t = tscale.Instants.from_iso(["2029-06-01T00:00:00", "2031-05-06T07:08:09"], scale="TT")
        w = tscale.what_if(chain, t, leap_seconds=NEGATIVE)
        np.testing.assert_array_equal(w.total_s, [0.0, 1.0])
        np.testing.assert_array_equal(w.count_s, [0.0, 0.0])
        label_moved_s(w, chain(t), chain(t), LEAP, NEGATIVE)
        assert "in seconds elapsed: least +0.000e+00, most +0.000e+00 s" in w.table()


def test_a_label_that_is_no_more() -> None:
    chain = tscale.chain("UTC", "TAI", reference=tscale.ReferenceData(leap_seconds=LEAP))
    t = tscale.Instants.from_iso(["2029-12-31T23:59:58", "2029-12-31T23:59:59"], scale="UTC", leap_seconds=LEAP)
    with pytest.raises(TextError) as caught:
        tscale.what_if(chain, t, leap_seconds=NEGATIVE)
    assert caught.value.mask is not None
    assert caught.value.mask.tolist() == [False, True]


def test_logs_and_tables_read_with_the_old_leap_seconds_are_refused() -> None:
    reference = tscale.ReferenceData(leap_seconds=LEAP)
    epoch = tscale.Instants.from_iso(["2029-06-01T00:00:00", "2030-06-01T00:00:00"], scale="UTC", leap_seconds=LEAP)
    log = tscale.ClockLog.from_rows("UTC(KRL)", epoch, [1e-9, 2e-9])
    t = tscale.Instants.from_iso("2029-08-01T00:00:00", scale="UTC(KRL)", leap_seconds=LEAP)
    chain = tscale.chain("UTC(KRL)", "UTC", clocks=[log], reference=reference)
    with pytest.raises(InvalidInput, match=r"clocks="):
        tscale.what_if(chain, t, leap_seconds=NEGATIVE)
    again = tscale.ClockLog.from_rows(
        "UTC(KRL)",
        tscale.Instants.from_iso(["2029-06-01T00:00:00", "2030-06-01T00:00:00"], scale="UTC", leap_seconds=NEGATIVE),
        [1e-9, 2e-9],
    )
    w = tscale.what_if(chain, t, leap_seconds=NEGATIVE, clocks=[again])
    assert np.abs(w.total_s) < 1e-16  # a second less in a year: 1 ns * 2e-9
    held = tscale.EarthOrientation.constant(leap_seconds=LEAP)
    chain = tscale.chain("UTC", "UT1", reference=reference.replace(earth_orientation=held))
    with pytest.raises(InvalidInput, match="earth_orientation="):
        tscale.what_if(chain, T, leap_seconds=NEGATIVE)


def test_another_realisation_of_tt() -> None:
    """Rows of the BIPM's TTBIPM.08 (54289: 26.9755 us) and an invented year after it, 0.5 ns more."""
    old = TTBIPM.from_rows("BIPM08", [54289, 54299], [26.9755e-6, 26.9783e-6])
    new = TTBIPM.from_rows("BIPM09", [54289, 54299], [26.9760e-6, 26.9788e-6])
    chain = tscale.chain("UTC", "TT(BIPM08)", reference=tscale.ReferenceData(tt_bipm=[old]))
    t = tscale.Instants.from_mjd([54289, 54294], [0.0, 0.25], scale="UTC")
    w = tscale.what_if(chain, t, tt_bipm=new)
    # 0.5 ns, to two roundings of a fraction (1.1e-16 s each).
    np.testing.assert_allclose(w["TT(BIPM08) - TAI"], 0.5e-9, rtol=0, atol=3e-16)
    np.testing.assert_allclose(w.total_s, 0.5e-9, rtol=0, atol=3e-16)
    assert [moved.only for moved in w.terms] == ["", ""]
    # On a row both state the rounding of the table, 1 ns / sqrt(12).
    assert w.total.pulls is not None
    assert w.total.pulls[0] == pytest.approx(0.5 / (np.sqrt(2) / np.sqrt(12)), rel=1e-5)
    assert [change.what for change in w.changes] == ["TT(BIPM)"]
    assert "TT(BIPM09)" in w.after.path


def test_another_log_and_a_term_in_one_alone() -> None:
    t = tscale.Instants.from_iso("2025-03-03T12:00:00", scale="CLOCK(maser)")
    chain = tscale.chain("CLOCK(maser)", "UTC", clocks=LOGS)
    other = tscale.ClockLog.from_rows("maser", LOGS[0].span.at(None), [4.3e-6, 4.3e-6], 1e-9)
    w = tscale.what_if(chain, t, clocks=[other])
    assert w.total_s == pytest.approx(4.201196e-6 - 4.3e-6, rel=0, abs=3e-16)
    assert [change.what for change in w.changes] == ["CLOCK(maser) by UTC(KRL)"]
    direct = tscale.ClockLog.from_rows(
        "maser", tscale.Instants.from_iso(["2025-03-03T00:00:00", "2025-03-04T00:00:00"], scale="UTC"), [4.2e-6, 4.2e-6]
    )
    w = tscale.what_if(chain, t, clocks=[direct])
    assert [(moved.term, moved.only) for moved in w.terms] == [
        ("UTC(KRL) - CLOCK(maser)", "before"),
        ("UTC - UTC(KRL)", "before"),
        ("UTC - CLOCK(maser)", "after"),
    ]
    np.testing.assert_array_equal(w.total_s, w.count_s)


def test_site_and_source() -> None:
    chain = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=STAR)
    up = tscale.Site.from_geodetic("up", 127.3518, -26.1473, 622.4, velocity_m_yr=SITE.velocity_m_yr, epoch_jyear=2020)
    w = tscale.what_if(chain, T, site=up)
    assert np.abs(w["Roemer delay"]).max() <= 10.0 / 299792458.0  # ten metres
    assert np.abs(w["Roemer delay"]).max() > 1e-9
    assert [change.what for change in w.changes] == ["observer"]


def test_another_ephemeris_brings_its_own_time_ephemeris(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Jupiter no heavier than Saturn: GM/(r c^2) at 5.2 au is 1.3e-12 less, 2 ms from 1977 on."""
    monkeypatch.setenv("TSCALE_CACHE", str(tmp_path))
    given = tscale.ReferenceData.default()
    reference = tscale.ReferenceData(ephemeris=given.ephemeris, time_ephemeris=given.time_ephemeris)
    lighter = tscale.Ephemeris.open(given.ephemeris.path, gm_m3_s2={"jupiter": 3.79e16})
    w = tscale.what_if(tscale.chain("TT", "TDB@GEOCENTER", reference=reference), _tt(T), ephemeris=lighter)
    assert "time ephemeris" in [change.what for change in w.changes]
    np.testing.assert_allclose(np.abs(w.total_s), 2.0e-3, rtol=0.1)


def _tt(t: tscale.Instants) -> tscale.Instants:
    return tscale.chain("UTC", "TT")(t)


def test_what_cannot_be_asked() -> None:
    chain = tscale.chain("UTC", "TAI")
    with pytest.raises(InvalidInput, match="at least one"):
        tscale.what_if(chain, T[:0])
    with pytest.raises(InvalidInput, match="Instants"):
        tscale.what_if(chain, 3.0)  # type: ignore[arg-type]
    with pytest.raises(InvalidInput, match="weather cannot be replaced"):
        tscale.what_if(chain, T, weather=None)
    with pytest.raises(OutOfSpan):
        tscale.what_if(tscale.chain("UTC", "UT1"), T.shifted(-1e9), earth_orientation=PREDICTED)
    w = tscale.what_if(chain, T)
    with pytest.raises(InvalidInput, match="no term 'UT1'"):
        w["UT1"]


def test_shapes_and_json() -> None:
    chain = tscale.chain("UTC", "TDB", site=SITE)
    w = tscale.what_if(chain, T.reshape(3, 1), earth_orientation=PREDICTED)
    assert w.total_s.shape == w.count_s.shape == (3, 1)
    assert all(moved.moved_s.shape == (3, 1) for moved in (*w.terms, *w.steps))
    held = json.loads(w.to_json())
    assert held["total"]["rms_s"] == pytest.approx(np.sqrt(np.mean(w.total_s**2)), abs=1e-20)
    assert [term["term"] for term in held["terms"]] == list(chain.ledger(T))
    assert held["before"]["digest"] != held["after"]["digest"]
    assert w.to_json() == tscale.what_if(chain, T.reshape(3, 1), earth_orientation=PREDICTED).to_json()
    scalar = tscale.what_if(chain, T[0], earth_orientation=PREDICTED)
    assert scalar.total_s.shape == ()
    assert scalar.total_s == w.total_s[0, 0]


def test_table_tells_least_and_most() -> None:
    chain = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=STAR)
    w = tscale.what_if(chain, T, earth_orientation=PREDICTED)
    lines = w.table().splitlines()
    (roemer,) = [line for line in lines if "Roemer delay" in line]
    assert f"{w['Roemer delay'].min():+.3e}" in roemer
    assert f"{w['Roemer delay'].max():+.3e}" in roemer
    assert "TT - TAI" not in w.table()
    assert "TT - TAI" in w.table(smallest_s=0.0)
    assert any(line.startswith("note after the change: 3 of 3 instants use predicted") for line in lines)
    assert any("terms did not move" in line for line in lines)


# ---- the command -----------------------------------------------------------------------------------

USUAL = ["--site", str(EXAMPLES / "site.toml"), "--source", str(EXAMPLES / "source.toml")]
CLOCKS = ["--clock", str(EXAMPLES / "maser.csv"), "--clock", str(EXAMPLES / "utc_krl.csv")]


def test_the_command(capsys: pytest.CaptureFixture[str]) -> None:
    issue = DATA / "eop_predictions" / "finals2000A_2024-11-22.txt"
    given = ["what-if", str(EXAMPLES / "readings.csv"), *USUAL, *CLOCKS, "--to", "TDB@BARYCENTER"]
    given += ["--with-earth-orientation", str(issue)]
    assert main(given) == 0
    text = capsys.readouterr().out
    assert "672 dates of CLOCK(maser)@TOPOCENTER" in text
    readings = [line.split(",")[0] for line in (EXAMPLES / "readings.csv").read_text().splitlines()[2:]]
    t = tscale.Instants.from_iso(readings, scale="CLOCK(maser)")
    chain = tscale.chain("CLOCK(maser)", "TDB@BARYCENTER", site=SITE, source=STAR, clocks=LOGS)
    w = tscale.what_if(chain, t, earth_orientation=issue)
    assert w.table() in text
    assert main([*given, "--json"]) == 0
    assert json.loads(capsys.readouterr().out) == json.loads(w.to_json())


def test_the_command_reads_logs_again_with_other_leap_seconds(
    tmp_path: Path, capsys: pytest.CaptureFixture[str]
) -> None:
    """A table without the leap second of 2016: labels of 2025 are an instant one second earlier, logs and readings."""
    lines = Path(tscale.LeapSeconds.default().path or "").read_text().splitlines(keepends=True)
    table = tmp_path / "Leap_Second.dat"
    text = "".join(line for line in lines if "57754.0" not in line)
    # Vouched for to 2016-12-28: a later date would tell that a row is missing.
    table.write_text(re.sub(r"expires on .*", "expires on 28 December 2016", text))
    given = ["what-if", str(EXAMPLES / "readings.csv"), *CLOCKS, "--to", "TT"]
    assert main([*given, "--with-leap-seconds", str(table)]) == 0
    text = capsys.readouterr().out
    (line,) = [line for line in text.splitlines() if "TAI - UTC" in line]
    assert line.count("-1.000e+00") == 2
    assert text.count("CLOCK(maser)@TOPOCENTER -> UTC(KRL)") <= 1


@pytest.mark.parametrize(
    ("options", "words"),
    [
        ([], "nothing is replaced"),
        (["--with-clock", "none.csv"], "none.csv"),
        (["--with-tt-bipm", str(EXAMPLES / "maser.csv")], "maser.csv"),
    ],
)
def test_the_command_says_what_is_wrong(options: list[str], words: str, capsys: pytest.CaptureFixture[str]) -> None:
    assert main(["what-if", str(EXAMPLES / "readings.csv"), *CLOCKS, "--to", "UTC", *options]) == 2
    assert words in capsys.readouterr().err


def test_the_command_names_the_line(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    path = tmp_path / "dates.csv"
    path.write_text("# note\ndate\n2025-01-01T00:00:00\n2025-13-01T00:00:00\n")
    assert main(["what-if", str(path), "--to", "UT1", "--with-earth-orientation", str(PREDICTED)]) == 2
    assert f"{path}:4" in capsys.readouterr().err
    path.write_text("date\n")
    assert main(["what-if", str(path), "--to", "UT1", "--with-earth-orientation", str(PREDICTED)]) == 2
    assert "no rows" in capsys.readouterr().err


def test_what_both_share_has_no_part_in_a_pull() -> None:
    """A poor log (0.1 s) before UT1 that is predicted and then measured: the pull is that without the log."""
    epoch = tscale.Instants.from_iso(["2025-06-01T00:00:00", "2025-12-01T00:00:00"], scale="UTC")
    poor = tscale.ClockLog.from_rows("maser", epoch, [0.0, 1e-6], 0.1, common_s=0.05)
    reference = tscale.ReferenceData.load().replace(earth_orientation=PREDICTED)
    later = tscale.ReferenceData.load().earth_orientation
    t = tscale.Instants.from_iso(["2025-07-10T00:00:00", "2025-09-10T00:00:00"], scale="UTC")
    readings = tscale.chain("UTC", "CLOCK(maser)", clocks=[poor])(t)
    alone = tscale.what_if(tscale.chain("UTC", "UT1", reference=reference), t, earth_orientation=later)
    w = tscale.what_if(
        tscale.chain("CLOCK(maser)", "UT1", clocks=[poor], reference=reference), readings, earth_orientation=later
    )
    assert w.total.sigma_s is not None and alone.total.sigma_s is not None  # noqa: PT018
    np.testing.assert_allclose(w.total.sigma_s, alone.total.sigma_s, rtol=1e-6)
    assert w.total.sigma_s.max() < 0.03
    assert [step.sigma_s is None for step in w.steps] == [True, True, False]
    # Another log: its own and the shared part of both, and nothing of the table.
    other = tscale.ClockLog.from_rows("maser", epoch, [0.0, 2e-6], 0.1, common_s=0.05)
    chain = tscale.chain("CLOCK(maser)", "UT1", clocks=[poor], reference=reference)
    w = tscale.what_if(chain, readings, clocks=[other])
    want = [np.sqrt(2.0) * poor.uncertainty_s(t.pair)]
    np.testing.assert_allclose([w.steps[0].sigma_s], want, rtol=1e-6)
    np.testing.assert_allclose([w.total.sigma_s], want, rtol=1e-6)
    # Leap seconds state no uncertainty: there is nothing to pull against.
    site = tscale.chain("UTC", "TAI", reference=tscale.ReferenceData(leap_seconds=LEAP))
    day = tscale.Instants.from_iso(["2031-05-06T07:08:09"], scale="UTC", leap_seconds=LEAP)
    still = tscale.what_if(site, day, leap_seconds=NEGATIVE)
    assert (still.total.sigma_s, still.total.pull_rms) == (None, None)
