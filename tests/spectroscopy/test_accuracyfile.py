"""The stored accuracy table."""

from __future__ import annotations

from dataclasses import replace
from pathlib import Path

import pytest

from planner.errors import LineDataError
from planner.resources import data_folder
from planner.spectroscopy.accuracyfile import (
    AccuracyTable,
    JudgedWindow,
    Judgement,
    UnseenWindow,
    format_accuracy,
    parse_accuracy,
    stored_accuracy,
)
from planner.spectroscopy.lists.build import embedded_formulas

JUDGED = JudgedWindow(
    gas="CO",
    from_per_cm=2000.0,
    to_per_cm=2300.5,
    verdict=Judgement.MISSES,
    missed='90 % 0.40 at 1e-04, mark 0.25 ("quoted")',
    compared_with="HITRAN2012, CO.par",
    in_sample=True,
    temperatures_k=(250.0,),
    mixing_ratios=(1e-6, 1e-4, 1e-2),
    bins=(0, 9, 12),
    percentile_90=(None, 0.4, 0.1),
    median=(None, 0.1, 0.05),
    mean=(None, -0.1, 0.0),
    percentile_90_at_1000=(0.3, 0.5, 0.2),
    real_sum_cm=1.02e-17,
    sum_ratio=0.98,
    strength_factor=1.63,
    embedded_lines=400,
    real_lines=410,
)
UNSEEN = UnseenWindow(
    gas="CO",
    from_per_cm=4000.0,
    to_per_cm=4400.0,
    sum_cm=7.5e-20,
    strength_factor=2.0,
    rests_on="from memory",
    published="",
)
TABLE = AccuracyTable(judged=(JUDGED,), unseen=(UNSEEN,))


def test_table_survives_its_text():
    """What is written is read back, absent figures and quotation marks included."""
    assert parse_accuracy(format_accuracy(TABLE), Path("a.toml")) == TABLE


def test_share_of_windows_that_meet():
    """Windows too narrow to judge count on neither side."""
    windows = [replace(JUDGED, verdict=verdict) for verdict in (Judgement.MEETS, Judgement.MISSES, Judgement.NARROW)]
    assert AccuracyTable(judged=tuple(windows)).meeting == (1, 2)


@pytest.mark.parametrize(
    "text",
    ["[[judged]]\ngas = 1", '[[unseen]]\ngas = "CO"', "judged = 3", format_accuracy(TABLE).replace("misses", "?")],
)
def test_broken_tables_are_refused(text: str):
    """With the name of the file and what to do."""
    with pytest.raises(LineDataError, match=r"a\.toml: not an accuracy table .*lines check --write"):
        parse_accuracy(text, Path("a.toml"))


def test_shipped_table_speaks_of_shipped_lists():
    """Every gas of the table has a list, and every window lies where it says."""
    table = stored_accuracy()
    assert {row.gas for row in (*table.judged, *table.unseen)} <= set(embedded_formulas())
    assert all(row.from_per_cm < row.to_per_cm for row in (*table.judged, *table.unseen))
    assert all(row.strength_factor >= 1.0 for row in (*table.judged, *table.unseen))


def test_shipped_table_is_in_its_own_form():
    """Nobody has edited it by hand."""
    text = (data_folder("linelists") / "accuracy.toml").read_text(encoding="utf-8")
    assert format_accuracy(stored_accuracy()) == text
