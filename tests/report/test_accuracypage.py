"""The accuracy table as a page and in the lists' README."""

from __future__ import annotations

import io
from dataclasses import replace
from pathlib import Path

import pytest
from rich.console import Console

from planner.errors import LineDataError, OutputError
from planner.report import accuracypage
from planner.report.accuracypage import BEGIN, END, accuracy_page, parse_remarks, replace_page, write_accuracy
from planner.report.accuracytable import check_view
from planner.resources import data_folder
from planner.spectroscopy.accuracyfile import (
    AccuracyTable,
    JudgedWindow,
    Judgement,
    UnseenWindow,
    parse_accuracy,
    stored_accuracy,
)
from planner.studies.listrecords import CheckedList, CheckReport, GasListing

MISS = JudgedWindow(
    gas="CO", from_per_cm=2000.0, to_per_cm=2300.0, verdict=Judgement.MISSES, missed="mean 0.40 at 1e-04, mark 0.15",
    compared_with="HITRAN2012, CO.par", in_sample=True, temperatures_k=(203.0, 250.0), mixing_ratios=(1e-6, 1e-4, 1e-2),
    bins=(0, 9, 12), percentile_90=(None, 0.4, 0.1), median=(None, 0.1, 0.05), mean=(None, 0.4, 0.0),
    percentile_90_at_1000=(0.3, 0.5, 0.2), real_sum_cm=1.02e-17, sum_ratio=0.98, strength_factor=1.63,
    embedded_lines=400, real_lines=410,
)  # fmt: skip
UNSEEN = UnseenWindow(
    gas="CO", from_per_cm=4000.0, to_per_cm=4400.0, sum_cm=7.5e-20, strength_factor=2.0, rests_on="memory " * 30,
    published="1.01 of the published 7.4e-20",
)  # fmt: skip
TABLE = AccuracyTable(judged=(MISS, replace(MISS, gas="CO2", verdict=Judgement.MEETS, missed="")), unseen=(UNSEEN,))
LISTING = GasListing(
    gas="CO",
    also_called="carbon monoxide",
    made_of="linear",
    covers_per_cm="400-12800",
    covers_um="0.78-25",
    quality="",
)
REMARKS = '[[remark]]\ngas = "CO"\nrange_per_cm = [1900, 2400]\ntext = "The file is odd."\n'


def test_page_holds_every_window():
    """With figures, verdict, reason, and what was never compared."""
    page = accuracy_page(TABLE, [LISTING], parse_remarks(REMARKS, Path("r.toml")))
    assert "**1 of 2 windows meet the marks (50 %).**" in page
    row = next(line for line in page.splitlines() if line.startswith("| CO | 2000-2300"))
    assert "| 0/9/12 | -/0.40/0.10 | -/0.10/0.05 | -/0.40/0.00 | 0.30/0.50/0.20 | 0.98 | **misses** |" in row
    assert "HITRAN2012, CO.par, 2 temperatures | yes | 400 / 410 |" in row
    assert "- CO 2000-2300: mean 0.40 at 1e-04, mark 0.15. The file is odd." in page
    assert "| CO | 400-12800 | 0.78-25 | 0 of 1 | 1 |" in page
    unseen = next(line for line in page.splitlines() if line.startswith("| CO | 4000-4400"))
    assert "| 7.5e-20 | 2.00 | memory" in unseen
    assert unseen.endswith("... | 1.01 of the published 7.4e-20 |")


def test_misses_without_a_remark_say_so():
    """And a table without misses says none."""
    assert "mark 0.15. Reason not known." in accuracy_page(TABLE, [LISTING])
    assert "\n\nNone.\n\n" in accuracy_page(AccuracyTable(), [])


def test_place_of_the_page():
    """Between the markers, replaced as often as one likes; a text without them is refused."""
    text = f"head\n{BEGIN}\nold\n{END}\ntail\n"
    once = replace_page(text, "new", Path("README.md"))
    assert once == f"head\n{BEGIN}\n\nnew\n{END}\ntail\n"
    assert replace_page(once, "new", Path("README.md")) == once
    with pytest.raises(OutputError, match=r"README\.md: expected the lines"):
        replace_page("head\ntail\n", "new", Path("README.md"))


@pytest.mark.parametrize("text", ["[[remark]]\ngas = 1", "remark = 1", "[[remark"])
def test_broken_remarks_are_refused(text):
    """With the name of the file."""
    with pytest.raises(LineDataError, match=r"r\.toml: not a table of remarks"):
        parse_remarks(text, Path("r.toml"))


@pytest.fixture
def checkout(tmp_path, monkeypatch):
    """A checkout with a README of its lists."""
    folder = tmp_path / "linelists"
    folder.mkdir()
    (folder / "README.md").write_text(f"# Lists\n{BEGIN}\n{END}\n")
    (folder / "remarks.toml").write_text(REMARKS)
    (tmp_path / "pyproject.toml").write_text("")
    monkeypatch.setattr(accuracypage, "data_folder", lambda name: tmp_path / name)
    return folder


def test_table_is_written_into_a_checkout(checkout):
    """Both files, in a form that is read back."""
    toml, readme = write_accuracy(TABLE, [LISTING])
    assert (toml.parent, readme.parent) == (checkout, checkout)
    assert parse_accuracy(toml.read_text(), toml) == TABLE
    assert "The file is odd." in readme.read_text()


def test_table_is_not_written_into_an_installed_package(checkout):
    """Nothing is changed."""
    (checkout.parent / "pyproject.toml").unlink()
    with pytest.raises(OutputError, match="not written into an installed"):
        write_accuracy(TABLE, [LISTING])
    assert sorted(path.name for path in checkout.iterdir()) == ["README.md", "remarks.toml"]


@pytest.mark.parametrize("width", [80, 180])
def test_terminal_shows_faults_and_scores(width):
    """Lists first, then the windows, then what was never compared; a narrow console drops the last columns."""
    checked = CheckedList(gas="CO", lines=7, seconds=0.1, faults=("a band is missing",))
    console = Console(width=width, record=True, file=io.StringIO())
    report = CheckReport(lists=(checked,), accuracy=TABLE, against=None, notices=("store: full",))
    console.print(check_view(report, width))
    text = console.export_text()
    assert text.index("a band is missing") < text.index("1 of 2 windows") < text.index("never compared")
    row = next(line for line in text.splitlines() if line.startswith("CO 2000-2300".replace(" ", "  ")))
    assert "-/0.40/0.10 -/0.10/0.05 -/0.40/0.00 misses" in row
    assert ("HITRAN2012, CO.par" in row) == (width == 180)
    assert text.rstrip().endswith("store: full")


def test_shipped_page_is_that_of_the_shipped_table():
    """The README shows what accuracy.toml holds."""
    from planner.studies.linedata import list_gases

    folder = data_folder("linelists")
    remarks = parse_remarks((folder / "remarks.toml").read_text(), folder / "remarks.toml")
    page = accuracy_page(stored_accuracy(), list_gases(), remarks)
    assert page in (folder / "README.md").read_text()


def test_every_miss_has_a_reason_and_every_reason_a_miss():
    """Of the shipped table."""
    folder = data_folder("linelists")
    remarks = parse_remarks((folder / "remarks.toml").read_text(), folder / "remarks.toml")
    misses = [row for row in stored_accuracy().judged if row.verdict is Judgement.MISSES]
    assert [row for row in misses if not any(remark.about(row) for remark in remarks)] == []
    assert [remark for remark in remarks if not any(remark.about(row) for row in misses)] == []
