"""The report: one well-formed page that stands alone, escapes what files say, and is the same in every run."""

from __future__ import annotations

import base64
import hashlib
import os
import re
import subprocess
import sys
from dataclasses import replace
from html.parser import HTMLParser
from pathlib import Path

import numpy as np
import pytest

import tscale
from tests.plots_support import EXAMPLES, SITE, STAR, chain, logs, readings
from tscale.cli.main import main
from tscale.errors import InvalidInput, MissingPiece, OutOfSpan
from tscale.report import report_html, save_report
from tscale.report.markup import Markup, shown, table, tag

VOID = {"meta", "img", "br"}


class Page(HTMLParser):
    """Elements, texts and attributes of a page; complains of elements that do not close in order."""

    def __init__(self, text: str) -> None:
        super().__init__(convert_charrefs=True)
        self.open: list[str] = []
        self.attributes: list[tuple[str, str, str]] = []
        self.texts: list[str] = []
        self.rows: list[list[str]] = []
        self.feed(text)
        self.close()
        assert self.open == []

    def handle_starttag(self, name: str, attributes: list[tuple[str, str | None]]) -> None:
        self.attributes += [(name, key, value or "") for key, value in attributes]
        if name == "tr":
            self.rows.append([])
        if name in ("td", "th"):
            self.rows[-1].append("")
        if name not in VOID:
            self.open.append(name)

    def handle_endtag(self, name: str) -> None:
        assert self.open.pop() == name

    def handle_data(self, data: str) -> None:
        self.texts.append(data)
        if {"td", "th"} & set(self.open):
            self.rows[-1][-1] += data

    @property
    def text(self) -> str:
        return "\n".join(self.texts)


@pytest.fixture(scope="module")
def page() -> str:
    return report_html(chain(), readings(40), name="readings.csv", rows=5, stated={"reading_sigma_s": 1e-9})


def test_the_page_is_whole(page: str) -> None:
    found = Page(page)
    assert page.startswith("<!DOCTYPE html>\n<html lang=")
    for words in ("Path", "Notes", "Results", "Ledger", "Uncertainty budget", "Not included", "Clock comparisons",
                  "Provenance"):  # fmt: skip
        assert words in found.texts
    assert "40 readings of readings.csv." in found.text


def test_the_page_stands_alone(page: str) -> None:
    found = Page(page)
    sources = [value for _, key, value in found.attributes if key in ("src", "href", "srcset", "data", "action")]
    assert len(sources) == 4  # ledger, budget, two logs
    assert all(value.startswith("data:image/svg+xml;base64,") for value in sources)
    assert not re.search(r"https?:|//[a-z]|@import|url\(", re.sub(r"base64,[^\"]*", "", page))
    names = {name for name, _, _ in found.attributes}
    assert not names & {"script", "link", "iframe", "object", "embed", "base", "form"}
    assert not [key for _, key, _ in found.attributes if key.startswith("on")]
    assert ("meta", "charset", "utf-8") in found.attributes
    for value in sources:
        svg = base64.b64decode(value.partition(",")[2]).decode()
        # Namespaces are names; nothing is asked for by its address.
        assert not re.search(r'(?:href|src)="(?!#)', svg)
        assert "<script" not in svg
    assert [value for name, key, value in found.attributes if (name, key) == ("img", "alt") and value]


def test_numbers_of_the_page(page: str) -> None:
    found, c, t = Page(page), chain(), readings(40)
    out, ledger = c(t), c.ledger(t)
    budget = c.budget(t, reading_sigma_s=1e-9)
    results = [row for row in found.rows if len(row) == 5 and row[1].startswith("2025-")]
    assert [row[0] for row in results] == ["1", "2", "3", "4", "5", "40"]
    for row, i in zip(results, (0, 1, 2, 3, 4, 39), strict=True):
        assert row[1:3] == [t.to_iso(12)[i], out.to_iso(12)[i]]
        # As written, to 1 ps and two decimals.
        assert float(row[3]) == pytest.approx(float(ledger.total[i]), rel=0, abs=1e-12)
        assert row[4] == f"{budget.combined_s[i]:.2e}"
    terms = {row[1]: row[2] for row in found.rows if len(row) == 3 and row[2][:1] in "+-"}
    assert set(ledger) <= set(terms)
    assert sum(round(float(terms[name]) * 1e6) for name in ledger) == pytest.approx(
        float(ledger.total[0]) * 1e6, abs=len(ledger)
    )
    shares = [row for row in found.rows if len(row) == 10 and row[-1].endswith("%")]
    assert len(shares) == len(budget.lines)
    for table_fact in c.provenance(t).tables:
        assert table_fact.sha256 in found.text
    assert c.provenance(t).digest in found.text
    assert all(item.source in found.text for item in budget.not_included)


def test_same_inputs_same_bytes(page: str, tmp_path: Path) -> None:
    path = tmp_path / "r.html"
    save_report(chain(), readings(40), path, name="readings.csv", rows=5, stated={"reading_sigma_s": 1e-9})
    assert path.read_bytes() == page.encode()
    assert str(EXAMPLES) not in page
    with pytest.raises(InvalidInput, match="no folder"):
        save_report(chain(), readings(2), tmp_path / "none" / "r.html")


def test_another_process_writes_the_same_bytes(page: str) -> None:
    code = (
        "import hashlib; from tests.plots_support import chain, readings; from tscale.report import report_html; "
        "page = report_html(chain(), readings(40), name='readings.csv', rows=5, stated={'reading_sigma_s': 1e-9}); "
        "print(hashlib.sha256(page.encode()).hexdigest())"
    )
    for seed in ("1", "2"):
        done = subprocess.run(
            [sys.executable, "-c", code],
            cwd=Path(__file__).parents[1],
            env={**os.environ, "PYTHONHASHSEED": seed},
            capture_output=True,
            text=True,
            check=True,
        )
        assert done.stdout.strip() == hashlib.sha256(page.encode()).hexdigest()


def test_names_out_of_files_are_escaped() -> None:
    printable = "<script>alert(1)</script>\" onload='x' & $_"
    name = f"{printable}\u202e\x07"
    hostile = tscale.chain(
        "CLOCK(maser)",
        "TDB@BARYCENTER",
        site=replace(SITE, name=printable),
        clocks=[replace(log, name=name) for log in logs()],
        source=replace(STAR, name=printable),
    )
    text = report_html(hostile, readings(3), name=name, title=name)
    found = Page(text)
    assert not {"script"} & {element for element, _, _ in found.attributes}
    assert "<script" not in text
    assert "\u202e" not in text
    assert "\x07" not in text
    assert not [key for _, key, _ in found.attributes if key.startswith("on")]
    assert "<script>alert(1)</script>" in found.text  # as words


@pytest.mark.filterwarnings("ignore::tscale.errors.ExtrapolationWarning")
def test_notes_and_what_is_held() -> None:
    c = tscale.chain("UTC", "TDB@BARYCENTER", site=SITE, source=STAR)
    t = tscale.Instants.from_iso(["2035-01-01", "2035-02-01"], scale="UTC")
    found = Page(report_html(c, t, pictures=False))
    assert all(note in found.text for note in c.notes(t))
    assert len(c.notes(t)) == 2


def test_chains_without_uncertainty_and_single_readings() -> None:
    t = tscale.Instants.from_iso("2025-01-01", scale="UTC")
    found = Page(report_html(tscale.chain("UTC", "TT"), t))
    assert "No uncertainty is stated in this chain." in found.text
    assert "1 reading." in found.text
    assert "img" not in {name for name, _, _ in found.attributes}
    same = Page(report_html(tscale.chain("UTC", "UTC"), t))
    assert "Nothing to do: both ends are alike." in same.text


def test_more_readings_than_are_drawn() -> None:
    t = tscale.Instants.from_iso("2025-01-01", scale="UTC").shifted(np.arange(2500) * 60.0)
    assert "One of 3 readings is drawn." in report_html(tscale.chain("UTC", "TDB", site=SITE), t)


def test_reports_that_cannot_be(monkeypatch: pytest.MonkeyPatch) -> None:
    c = chain()
    with pytest.raises(InvalidInput, match="one or more"):
        report_html(c, readings(3)[:0])
    with pytest.raises(InvalidInput, match="rows is how many"):
        report_html(c, readings(3), rows=0)
    with pytest.raises(OutOfSpan) as caught:
        report_html(c, readings(200))
    assert caught.value.mask is not None
    monkeypatch.setitem(sys.modules, "matplotlib", None)
    with pytest.raises(MissingPiece, match=r"tscale\[plot\]"):
        report_html(c, readings(3))
    assert "data:" not in report_html(c, readings(3), pictures=False).partition("<body>")[2]


def test_markup() -> None:
    assert tag("p", 'a < b & "c"', class_='x"y') == '<p class="x&quot;y">a &lt; b &amp; &quot;c&quot;</p>'
    assert tag("p", Markup("<b>x</b>"), "<b>") == "<p><b>x</b>&lt;b&gt;</p>"
    assert tag("img", alt="a") == '<img alt="a">'
    assert shown("a\x00\u2066b") == "a\\x00\\u2066b"
    text = table(("a", "b"), [("1", "<2>")], numbers=(1,), caption="c", foot=[("x", "y"), ("z",)])
    assert Page(text).rows == [["a", "b"], ["1", "<2>"], ["x", "y"], ["z"]]
    assert '<td colspan="2">z</td>' in text


# ---- the command ---------------------------------------------------------------------------------


def test_report_command(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    from tests.plots_support import OPTIONS

    given = ["report", str(EXAMPLES / "readings.csv"), *OPTIONS, "--to", "TDB@BARYCENTER", "--rows", "3"]
    assert main([*given, "--output", str(tmp_path / "r.html"), "--site-sigma-m", "0.02"]) == 0
    found = Page((tmp_path / "r.html").read_text(encoding="utf-8"))
    assert "672 readings of readings.csv." in found.text
    assert [row[0] for row in found.rows if len(row) == 5 and row[1].startswith("2025-")] == ["3", "4", "5", "674"]
    assert "ITRF x of Kestrel Ridge" in found.text
    assert capsys.readouterr().err == ""
    assert main([*given, "--no-pictures", "--output", "-"]) == 0
    assert Page(capsys.readouterr().out).text.count("Provenance") == 1


def test_report_command_says_what_is_wrong(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    from tests.plots_support import OPTIONS

    path = tmp_path / "in.csv"
    path.write_text("# invented\nt\n2025-03-04T00:00:00\n2025-03-08T00:00:00\n")
    given = ["report", str(path), *OPTIONS, "--to", "TDB"]
    assert main([*given, "--output", str(tmp_path / "r.html")]) == 2
    assert f"{path}:4: " in capsys.readouterr().err
    assert main([*given, "--output", str(tmp_path / "r.txt")]) == 2
    assert "must end in .html or .htm" in capsys.readouterr().err
    path.write_text("t\n2025-03-04T00:00:00\nyesterday\n")
    assert main([*given, "--output", str(tmp_path / "r.html")]) == 2
    assert f"{path}:3: " in capsys.readouterr().err
    assert main(["report", str(path), "--to", "TDB", "--output", str(tmp_path / "r.html")]) == 2
    assert "--site FILE" in capsys.readouterr().err
    assert [found.name for found in tmp_path.iterdir()] == ["in.csv"]
