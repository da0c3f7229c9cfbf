"""Spectra of planets of spotted stars: the bias in the table and in the figure."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from planner.report.ecsv import spectra_table
from planner.report.figure import plan_figure


@pytest.fixture
def spotted(fake_plan):
    """The made-up plan around a star whose spots add a slope."""
    spectra = [replace(s, contamination_ppm=40.0 / s.from_um) for s in fake_plan.spectra]
    return replace(fake_plan, spectra=tuple(spectra))


def test_bias_is_a_column(fake_plan, spotted):
    """There where it was stated, in the unit of depths, and nowhere else."""
    table = spectra_table(spotted.spectra)
    assert np.array_equal(table["contamination_ppm"][:3], 40.0 / spotted.spectra[0].from_um[:3])
    assert table["contamination_ppm"].unit == table["depth_ppm"].unit
    assert "contamination_ppm" not in spectra_table(fake_plan.spectra).colnames


def test_bias_is_a_line_of_the_figure(fake_plan, spotted):
    """One line more in each panel, and a word in the legend."""
    plain, more = plan_figure(fake_plan), plan_figure(spotted)
    for before, after in zip(plain.axes, more.axes, strict=True):
        assert len(after.lines) == len(before.lines) + 1
    texts = [[text.get_text() for text in figure.legends[0].get_texts()] for figure in (plain, more)]
    assert set(texts[1]) - set(texts[0]) == {"added by spots, faculae"}
