"""The shipped constants of methane, ammonia, phosphine, methyl halides, ethane and methanol."""

from __future__ import annotations

from functools import cache

import numpy as np
import pytest

from planner.spectroscopy.claims import band_rows, plain_label
from planner.spectroscopy.lists.build import part_lines, read_constants

# most lines that a list may have: beyond that, tables take too long to make
COUNTS = {
    "CH4": 190_000,
    "NH3": 50_000,
    "PH3": 40_000,
    "CH3Cl": 85_000,
    "CH3Br": 115_000,
    "C2H6": 50_000,
    "CH3OH": 80_000,
}


LONG = {"CH3Br", "CH3Cl", "CH3OH"}
FORMULAS = [pytest.param(name, marks=pytest.mark.slow) if name in LONG else name for name in COUNTS]


@cache
def parts_of(formula):
    """Constants, and the lines of each part that makes lines."""
    constants = read_constants(formula)
    return constants, [(part, part_lines(constants, part)) for part in constants.line_parts]


@pytest.mark.parametrize("formula", FORMULAS)
def test_band_sums(formula):
    """The lines of each band, cut and satellites included, add up to its stated sum within 1 %."""
    for part, lines in parts_of(formula)[1]:
        upper, lower = (
            np.array([plain_label(name) for name in names]) for names in (lines.upper_global, lines.lower_global)
        )
        stated = {}
        for row in band_rows(part):
            # of a coupled pair the lines carry the name of the E state, which comes last
            key = row.uppers[-1][:15], row.lower[:15]
            stated[key] = stated.get(key, 0.0) + row.sum_cm
        first = lines.isotopologue == lines.isotopologue.min() if len(lines) else None
        for (above, below), total in stated.items():
            found = lines.intensity_cm[first & (upper == above) & (lower == below)].sum()
            assert found == pytest.approx(total, rel=0.01), (formula, above, below)


@pytest.mark.parametrize("formula", FORMULAS)
def test_bins(formula):
    """Statistical lines lie in their bins and add up."""
    for part, lines in parts_of(formula)[1]:
        if part["kind"] == "statistical":
            for low, high, total, *_ in part["bins"]:
                here = (lines.wavenumber_per_cm >= low) & (lines.wavenumber_per_cm < high)
                assert lines.intensity_cm[here].sum() == pytest.approx(total, rel=1e-9)


@pytest.mark.parametrize("formula", FORMULAS)
def test_sources_and_counts(formula):
    """Every source named in a row, a table or a part is explained, and no list is too long."""
    constants, parts = parts_of(formula)
    named = {str(part["source"]) for part in constants.line_parts + constants.smooth_parts}
    named |= {row.source for part in constants.line_parts for row in band_rows(part)}
    named |= {str(row[-1]) for part in constants.line_parts for row in part.get("levels", [])}
    assert named <= set(constants.sources)
    assert sum(len(lines) for _, lines in parts) <= COUNTS[formula]


def test_lists_are_reproducible():
    """Two builds give the same lines."""
    constants, parts = parts_of("NH3")
    for part, lines in parts:
        again = part_lines(constants, part)
        assert np.array_equal(again.wavenumber_per_cm, lines.wavenumber_per_cm)
        assert np.array_equal(again.intensity_cm, lines.intensity_cm)
