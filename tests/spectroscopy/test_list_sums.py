"""Every band of every embedded list adds up to its stated intensity at 296 K within one per cent.

Lines are told apart by the names of their levels and counted here, apart from `planner.spectroscopy.faults`. Rows of
one pair of levels, and coupled sets that share a state, stand for one band. Bands
that lie below the cut of their list for the most part are not held by it: they may not exceed what is stated.
"""

from __future__ import annotations

from collections import Counter
from dataclasses import replace

import numpy as np
import pytest

from planner.spectroscopy.claims import band_rows, plain_label
from planner.spectroscopy.lists.build import embedded_formulas, part_lines, read_constants, smooth_cross_section

LONG = {"C2H4", "CH3Br", "CH3Cl", "CH4", "H2O", "HNO3", "NH3", "NO2", "O3", "SO2"}
FORMULAS = [pytest.param(name, marks=pytest.mark.slow) if name in LONG else name for name in embedded_formulas()]
WITHOUT_ROWS = {"tetrahedral-band", "statistical"}
"""Kinds whose parts need not state sums of bands: polyads have moments instead, random lines have bins."""
FADE_PER_CM, STEP_PER_CM = 400.0, 0.05


def stated_bands(part):
    """Isotopologue, names of the upper levels, lower level, sum: rows that share levels are put together."""
    bands = []
    for row in band_rows(part):
        key, uppers, total = (row.isotopologue, row.lower), set(row.uppers), row.sum_cm
        for other in [b for b in bands if b[0] == key and b[1] & uppers]:
            bands.remove(other)
            uppers, total = uppers | other[1], total + other[2]
        bands.append((key, uppers, total))
    return bands


@pytest.mark.parametrize("formula", FORMULAS)
def test_every_band_adds_up(formula):
    """Band by band, 1 %; a band of which less than half lies above the cut holds no more than is stated."""
    constants = read_constants(formula)
    held = 0
    for part in constants.line_parts:
        lines = part_lines(constants, part)
        sums = Counter()
        labels = zip(lines.isotopologue.tolist(), lines.lower_global.tolist(), lines.upper_global.tolist(), strict=True)
        for (isotopologue, lower, upper), intensity in zip(labels, lines.intensity_cm.tolist(), strict=True):
            sums[isotopologue, plain_label(lower), plain_label(upper)] += intensity
        bands = stated_bands(part)
        assert bands or part["kind"] in WITHOUT_ROWS
        for key, uppers, stated in bands:
            found = sum(sums[(*key, upper)] for upper in uppers)
            assert found <= 1.01 * stated, (formula, key, uppers)
            if found > 0.5 * stated:
                assert found == pytest.approx(stated, rel=0.01), (formula, key, uppers)
                held += 1
        for low, high, stated, *_ in part.get("bins", ()):
            here = (lines.wavenumber_per_cm >= low) & (lines.wavenumber_per_cm < high) & (lines.upper_global == "")
            assert lines.intensity_cm[here].sum() == pytest.approx(stated, rel=0.01), (formula, low, high)
            held += 1
    for part in constants.smooth_parts:
        if "band_sum_cm" in part:
            low, high = part["span_per_cm"]
            grid = np.arange(max(STEP_PER_CM, low - FADE_PER_CM), high + FADE_PER_CM, STEP_PER_CM)
            values = smooth_cross_section(replace(constants, smooth_parts=(part,)), grid, 296.0)
            assert values.sum() * STEP_PER_CM == pytest.approx(part["band_sum_cm"], rel=0.01), part["name"]
            held += 1
    assert held
