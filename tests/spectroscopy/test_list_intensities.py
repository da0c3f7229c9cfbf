"""What the cut of a list leaves of a band."""

from __future__ import annotations

import numpy as np
import pytest

from planner.spectroscopy.lists.intensities import whole_band_cut_cm

LINES = 10.0 ** -np.linspace(20.0, 26.0, 601)
"""Even in the logarithm, a hundred to the decade: what lies below 1e-22 carries one per cent, below 1e-20.3 half."""


def test_a_band_that_the_cut_hardly_touches_needs_no_more():
    """Less than 0.7 % lost."""
    assert whole_band_cut_cm(LINES, LINES >= 1e-23) == np.inf


@pytest.mark.parametrize("cut_cm", [1e-21, 4e-21])
def test_a_maimed_band_is_made_whole(cut_cm):
    """Just enough lines, the strongest of those that the cut drops, for 99 %."""
    weakest = whole_band_cut_cm(LINES, cut_cm <= LINES)
    assert weakest < cut_cm
    kept = LINES[weakest <= LINES].sum() / LINES.sum()
    assert 0.99 < kept < 0.995


def test_a_band_below_the_cut_is_left_alone():
    """More than half lost: the list does not hold the band."""
    assert whole_band_cut_cm(LINES, LINES >= 9e-21) == np.inf
