"""Pictures of ledgers, budgets, changes and compared clocks: the right data on the axes, files alike in every run."""

from __future__ import annotations

import sys
from pathlib import Path
from typing import Any

import numpy as np
import pytest

import tscale
from tests.plots_support import SITE, STAR, chain, factor, lines, readings, texts
from tscale import plots
from tscale.budget import Budget, Contribution, Omission
from tscale.errors import InvalidInput, MissingPiece
from tscale.ledger import Ledger, LedgerLine
from tscale.plots.common import broken_at, dates_of, plain, quantity, unit_of
from tscale.plots.ledgers import grouped

DATA = Path(__file__).parent / "data"
PREDICTED = DATA / "eop_predictions" / "finals2000A_2025-05-23.txt"


# ---- shared pieces -------------------------------------------------------------------------------


@pytest.mark.parametrize(
    ("value", "words"),
    [(1.74e-9, "1.74 ns"), (-37.0, "\u221237 s"), (0.0, "0 s"), (999.9e-9, "1 \u00b5s"), (2.5e-16, "0.25 fs")],
)
def test_quantities_have_the_unit_that_suits_them(value: float, words: str) -> None:
    assert quantity(value) == words


def test_units_hold_values_from_1_to_1000() -> None:
    for largest in (1e-12, 5e-11, 9.99e-10, 1e-9, 2e-6, 0.3, 400.0):
        size, _ = unit_of(largest)
        assert 0.999 <= largest / size < 1000.0


def test_texts_of_files_are_drawn_as_they_are() -> None:
    assert plain("_a $x^2$ b") == " _a \\$x^2\\$ b"
    assert plain("a\x1b[31m\u202eb") == "a\\x1b[31m\\u202eb"
    assert len(plain("x" * 500)) == 90


def test_dates_are_labels() -> None:
    """23:59:59 of the day of a leap second and 0h of the next are 2 s apart; the labels a picture shows are 1 s."""
    t = tscale.Instants.from_iso(["2016-12-31T23:59:59", "2017-01-01T00:00:00"], scale="UTC")
    assert (t[1:] - t[:1]).tolist() == [2.0]
    # A day with a leap second is 86401 s long: its last second is drawn 1/86401 of the day before its end.
    apart = np.diff(dates_of(t)).astype(int)[0]
    assert apart == pytest.approx(2e6 * 86400 / 86401, abs=1.0)


def test_lines_break_where_dates_are_missing() -> None:
    even = np.datetime64("2025-01-01T00:00:00", "us") + np.array([0, 1, 2, 4, 5, 6]) * np.timedelta64(1, "h")
    assert broken_at(even).tolist() == [False, False, False, True, False, False]
    many = np.datetime64("2025-01-01", "us") + np.delete(np.arange(40), [20]) * np.timedelta64(1, "h")
    assert np.flatnonzero(broken_at(many)).tolist() == [20]
    uneven = np.datetime64("2025-01-01", "us") + np.cumsum([0, 1, 3, 1, 2, 90, 1, 4]) * np.timedelta64(1, "h")
    assert np.flatnonzero(broken_at(uneven)).tolist() == [5]


# ---- ledgers -------------------------------------------------------------------------------------


def test_every_term_of_a_ledger_is_drawn_or_stated() -> None:
    c, t = chain(), readings()
    ledger = c.ledger(t)
    figure = plots.ledger_figure(ledger, t, lines=[str(c)])
    drawn, words = lines(figure), texts(figure)
    for name in ledger:
        assert name in drawn or name in words
    assert "TAI - UTC +37 s" in words
    assert "TT - TAI +32.184 s" in words
    assert "CLOCK(maser)" in figure.axes[-1].get_xlabel()
    assert "2025-03-03" in figure.axes[-1].get_xlabel()
    for name in ("Roemer delay", "topocentric v.r/c^2", "minus Shapiro delay, sun"):
        line = drawn[name]
        value = np.asarray(line.get_ydata()) * factor(line.axes)
        moved = ledger[name] - (ledger[name][0] if "from" in str(line.get_label()) else 0.0)
        # Scaled and back: a rounding or two of the largest value.
        np.testing.assert_allclose(value[np.isfinite(value)], moved, rtol=1e-12, atol=1e-13 * np.abs(moved).max())


def test_dates_in_any_order_give_the_same_picture() -> None:
    c, t = chain("TDB"), readings(30)
    mixed = np.random.default_rng(5).permutation(30)
    one = plots.svg_text(plots.ledger_figure(c.ledger(t), t))
    two = plots.svg_text(plots.ledger_figure(c.ledger(t[mixed]), t[mixed]))
    assert one == two


def test_terms_that_swing_alike_share_a_panel() -> None:
    x = np.linspace(0.0, 1.0, 9)
    panels = grouped({"a": 3.0 * x, "b": 0.2 * x, "c": 50.0 + 0.001 * x, "d": 1e-9 * x})
    assert [[term.name for term in panel] for panel in panels] == [["a", "b"], ["c"], ["d"]]
    assert panels[1][0].off_s == 50.0
    np.testing.assert_allclose(panels[1][0].value_s, 0.001 * x, atol=1e-14)


def test_a_ledger_without_motion_is_stated() -> None:
    c = tscale.chain("UTC", "TT")
    t = tscale.Instants.from_iso(["2025-01-01", "2025-06-01"], scale="UTC")
    words = texts(plots.ledger_figure(c.ledger(t), t))
    assert "total +69.184 s" in words


def test_ledgers_that_cannot_be_drawn() -> None:
    c, t = chain("TDB"), readings(3)
    with pytest.raises(InvalidInput, match="two dates or more"):
        plots.ledger_figure(c.ledger(t[:1]), t[:1])
    with pytest.raises(InvalidInput, match="those of the ledger"):
        plots.ledger_figure(c.ledger(t), t[:2])


def test_hostile_names_of_terms() -> None:
    name = "_$\\frac{$ <b>\x00\n\u202e"
    whole = np.zeros(3, dtype=np.int64)
    terms = [LedgerLine("a", name, (whole, np.array([0.1, 0.2, 0.3]))), LedgerLine("b", "c", (whole, np.zeros(3)))]
    ledger = Ledger(terms, (3,))
    svg = plots.svg_text(plots.ledger_figure(ledger, readings(3), title=name, lines=[name]))
    assert svg.startswith("<?xml")


# ---- budgets -------------------------------------------------------------------------------------


def test_bars_of_a_budget() -> None:
    c, t = chain(), readings(40)
    budget = c.budget(t, reading_sigma_s=1e-9)
    figure = plots.budget_figure(budget, t, instant=7)
    bars = figure.axes[0]
    widths = sorted((patch.get_width() for patch in bars.patches), reverse=True)
    size = {"(ns)": 1e-9}[bars.get_xlabel().rpartition(" ")[2]]
    expected = sorted((float(line.contribution_s[7]) for line in budget.lines), reverse=True)
    np.testing.assert_allclose(np.array(widths[:13]) * size, expected[: len(widths)][:13], rtol=1e-12)
    marks = {str(line.get_label()).split(",")[0]: line.get_xdata()[0] * size for line in bars.get_lines()}
    assert marks["combined"] == pytest.approx(float(budget.combined_s[7]), rel=1e-12, abs=0)
    assert marks["expanded (k = 2)"] == pytest.approx(float(budget.expanded_s[7]), rel=1e-12, abs=0)
    names = [label.get_text() for label in bars.get_yticklabels()]
    assert names[0] == "UTC(KRL) - UTC, comparisons"
    words = texts(figure)
    for item in budget.not_included:
        assert item.source.split()[0] in words
    course = lines(figure)["combined"]
    np.testing.assert_allclose(
        np.asarray(course.get_ydata()) * factor(course.axes), budget.combined_s, rtol=1e-12, atol=0
    )


def _contribution(name: str, sigma_s: float, kind: Any = "B") -> Contribution:
    return Contribution(name, name, "s", np.ones(1), np.array([sigma_s]), kind=kind, dof=9.0 if kind == "A" else np.inf)


def test_many_bars_are_put_together_and_types_told_apart() -> None:
    sizes = [2.0 ** -(i % 20) * 1e-9 for i in range(30)]
    parts = [_contribution(f"source {i}", size, "A" if i < 2 else "B") for i, size in enumerate(sizes)]
    budget = Budget(parts, [Omission("the weather", "nobody knows")], (1,))
    figure = plots.budget_figure(budget)
    bars = figure.axes[0]
    assert len(bars.patches) == 14
    rest = sorted(sizes, reverse=True)[13:]
    together = next(label.get_text() for label in bars.get_yticklabels() if "quadrature" in label.get_text())
    assert together == f"{len(rest)} smaller ones in quadrature"
    assert quantity(float(np.sqrt(np.sum(np.square(rest))))) in texts(figure)
    assert {"type A", "type B"} <= {text.get_text() for text in bars.get_legend().get_texts()}
    assert "the weather" in texts(figure)


def test_budgets_that_cannot_be_drawn() -> None:
    t = tscale.Instants.from_iso(["2025-01-01"], scale="UTC")
    with pytest.raises(InvalidInput, match="nothing to draw"):
        plots.budget_figure(tscale.chain("UTC", "TT").budget(t))
    budget = chain("TDB").budget(readings(3))
    with pytest.raises(InvalidInput, match="not among the 3"):
        plots.budget_figure(budget, instant=3)
    with pytest.raises(InvalidInput, match="those of the budget"):
        plots.budget_figure(budget, readings(2))


# ---- what if -------------------------------------------------------------------------------------


def test_what_moved_is_drawn_with_the_uncertainty_stated() -> None:
    later = tscale.ReferenceData.default()
    before = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=STAR,
                          reference=later.replace(earth_orientation=PREDICTED))  # fmt: skip
    t = tscale.Instants.from_iso("2025-06-01", scale="UTC").shifted(np.arange(50) * 86400.0 * 1.3)
    found = tscale.what_if(before, t, earth_orientation=later.earth_orientation)
    figure = plots.what_if_figure(found, t)
    drawn, words = lines(figure), texts(figure)
    for name, value in (("Roemer delay", found["Roemer delay"]), ("total", found.total_s)):
        got = np.asarray(drawn[name].get_ydata()) * factor(drawn[name].axes)
        np.testing.assert_allclose(got[np.isfinite(got)], value, rtol=1e-12, atol=1e-24)
    total = drawn["total"].axes
    band = total.collections[0].get_paths()[0].vertices[:, 1].max() * factor(total)
    assert found.total.sigma_s is not None
    assert band == pytest.approx(float(found.total.sigma_s.max()), rel=1e-9, abs=0)
    assert "did not move by 1 fs" in words
    assert PREDICTED.name in words
    # What is not the same is told, and no more: the time ephemeris and the models are those of before.
    assert "u stated:" not in words


def test_a_band_that_would_flatten_the_lines_is_stated() -> None:
    one, two = (
        tscale.EarthOrientation.from_rows(np.arange(60420, 60440), ut1, 0.03, 0.4, ut1_sigma_s=0.05)
        for ut1 in (-0.01, -0.01 + 1e-6)
    )
    c = tscale.chain("UTC", "UT1", reference=tscale.ReferenceData(earth_orientation=one))
    t = tscale.Instants.from_mjd([60425, 60430], 0.0, scale="UTC")
    words = texts(plots.what_if_figure(tscale.what_if(c, t, earth_orientation=two), t))
    assert "u stated: 70.7 ms" in words  # sqrt(2) times 50 ms


def test_nothing_moved_is_a_picture_too() -> None:
    c = tscale.chain("UTC", "TDB", site=SITE)
    t = tscale.Instants.from_iso(["2025-01-01", "2025-06-01"], scale="UTC")
    found = tscale.what_if(c, t, reference=tscale.ReferenceData.load())
    assert np.all(np.asarray(lines(plots.what_if_figure(found, t))["total"].get_ydata()) == 0.0)
    with pytest.raises(InvalidInput, match="two dates"):
        plots.what_if_figure(tscale.what_if(c, t[:1], reference=tscale.ReferenceData.load()), t[:1])


# ---- clocks --------------------------------------------------------------------------------------


def test_two_clocks_compared() -> None:
    high, low = (
        tscale.Site.from_geodetic(name, 127.0, -26.0, height, height_above_geoid_m=height)
        for name, height in (("upper", 3860.0), ("lower", 610.0))
    )
    start = tscale.Instants.from_iso("2025-05-01", scale="TT")
    found = tscale.compare_clocks(high, low, start, start.shifted(432000.0))
    t = start.shifted(np.linspace(0.0, 432000.0, 50))
    figure = plots.clock_figure(found, t)
    (line,) = figure.axes[0].get_lines()
    np.testing.assert_allclose(
        np.asarray(line.get_ydata()) * factor(figure.axes[0]), found.series_s(t), rtol=1e-12, atol=0
    )
    bars = figure.axes[1]
    ends = {round(float(patch.get_x() + patch.get_width()), 25) for patch in bars.patches}
    for rate in (*found.rates.values(), found.rate):
        if rate:
            assert any(abs(end - abs(rate)) < 1e-9 * abs(rate) + 1e-25 for end in ends)
    assert figure.axes[0].get_xlabel() == "TT, from 2025-05-01"
    assert "upper minus lower" in texts(figure)
    assert " ns a day" in str(texts(figure))
    # The unit is the one that suits: 480 us a day on Mars.
    lander = tscale.SurfaceSite("lander", "mars", 0.0, 0.0)
    far = tscale.compare_clocks(lander, high, start, start.shifted(432000.0))
    assert f"{far.rate * 86400e6:+.6g} \u00b5s a day" in str(texts(plots.clock_figure(far, t)))
    with pytest.raises(InvalidInput, match="two dates"):
        plots.clock_figure(found, t[:1])


def test_rate_of_a_clock_over_time() -> None:
    start = tscale.Instants.from_iso("2025-05-01", scale="TT")
    orbit = tscale.Trajectory.from_kepler(start, 2.656e7, 0.01, 55, 20, 30, 0)
    t = start.shifted(np.linspace(0.0, 86400.0, 60))
    from tscale.clocks import proper_ledger

    ledger = proper_ledger(orbit, t)
    drawn = lines(plots.rate_figure(ledger, t))
    for name in ("gravitational", "tidal"):
        line = drawn[name]
        power = int(line.axes.get_ylabel().partition("^{")[2].partition("}")[0])
        value = ledger[name] - ledger[name].mean()
        np.testing.assert_allclose(np.asarray(line.get_ydata()) * 10.0**power, value, rtol=1e-9, atol=1e-25)


# ---- files ---------------------------------------------------------------------------------------


@pytest.mark.parametrize("kind", ["png", "pdf", "svg"])
def test_the_same_picture_has_the_same_bytes(kind: str, tmp_path: Path) -> None:
    c, t = chain(), readings(12)
    for name in ("one", "two"):
        plots.save_budget_picture(c.budget(t), tmp_path / f"{name}.{kind}", t)
    one, two = ((tmp_path / f"{name}.{kind}").read_bytes() for name in ("one", "two"))
    assert one == two
    assert one.startswith({"png": b"\x89PNG", "pdf": b"%PDF", "svg": b"<?xml"}[kind])
    assert len(list(tmp_path.iterdir())) == 2


def test_without_matplotlib_the_extra_is_named(monkeypatch: pytest.MonkeyPatch) -> None:
    c, t = chain("TDB"), readings(3)
    monkeypatch.setitem(sys.modules, "matplotlib", None)
    with pytest.raises(MissingPiece, match=r"tscale\[plot\]"):
        plots.ledger_figure(c.ledger(t), t)


def test_public_names_of_pictures() -> None:
    for name in plots.__all__:
        assert callable(getattr(plots, name))
    with pytest.raises(AttributeError, match="offers"):
        plots.no_such_figure  # noqa: B018
