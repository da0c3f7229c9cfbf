"""The plan in the terminal: its layout, and what must be in it at any width."""

from __future__ import annotations

from dataclasses import dataclass, replace
from pathlib import Path

import pytest
from rich.console import Console

from planner.report.table import plan_text, records_view

GOLDEN = Path(__file__).parent / "golden"


@pytest.mark.parametrize("width", [80, 120])
def test_layout(fake_plan, width):
    """The layout is that of the golden file; look at the difference before replacing it."""
    assert plan_text(fake_plan, width) == (GOLDEN / f"plan-{width}.txt").read_text(encoding="utf-8")


@pytest.mark.parametrize("width", [80, 100, 120, 200])
def test_nothing_is_cut(fake_plan, width):
    """No line is longer than the terminal and no cell is cut short."""
    text = plan_text(fake_plan, width)
    assert max(map(len, text.splitlines())) <= width
    assert "…" not in text
    for word in ("CFC-12", "432", "1 693", "transits available", "temperature (3.43)", "invented"):
        assert word in text


def test_headline_is_marginalised(fake_plan):
    """The first numbers are the marginalised ones; those with all else known come after, under their heading."""
    line = next(line for line in plan_text(fake_plan, 120).splitlines() if line.startswith("CH4"))
    assert [line.index(word) for word in ("18", "70.6", "1.21", "38.0", "31.4")] == sorted(
        line.index(word) for word in ("18", "70.6", "1.21", "38.0", "31.4")
    )
    assert "known:" in plan_text(fake_plan, 120)


def test_what_the_answer_rests_on_is_there(fake_plan):
    """Goal, priors, assumptions, line data, cautions and version are all stated."""
    text = " ".join(plan_text(fake_plan, 80).split())
    for sentence in (
        "5 sigma, one-sided, with a chance of 50 %",
        "reference radius 5 %",
        *fake_plan.assumptions,
        *fake_plan.line_data,
        *fake_plan.cautions,
        "saturated at 1.02-1.20 um",
        "no data of O3 at 0.6-1.9, 3.03-3.04 um",
        "limbcast 0.1.0",
    ):
        assert sentence in text


def test_a_real_target_is_not_called_invented(fake_plan):
    """The remark stands only where it is true."""
    real = replace(fake_plan, invented=False, title="A planet", transits_available=None)
    assert "invented" not in plan_text(real)
    assert "transits available." not in plan_text(real)


def test_names_with_brackets_are_not_markup(fake_plan):
    """Text from files is shown as it is."""
    assert "[bold]a[/bold]" in plan_text(replace(fake_plan, title="[bold]a[/bold]"))


def test_records_view():
    """Any records become a table: a column per field, pairs as stretches, missing values as a dash."""

    @dataclass(frozen=True)
    class Row:
        formula: str
        names: tuple[str, ...]
        covers_per_cm: tuple[tuple[float, float], ...]
        lines: int | None

    console = Console(width=100, record=True, file=None, force_terminal=False)
    with console.capture() as shown:
        console.print(records_view([Row("CO2", ("carbon dioxide", "x"), ((400.0, 12800.0),), None)]))
    assert shown.get().split("\n")[0].split() == ["formula", "names", "covers", "per", "cm", "lines"]
    assert "carbon dioxide, x" in shown.get()
    assert "400-12800" in shown.get()
    assert shown.get().rstrip().endswith("-")
