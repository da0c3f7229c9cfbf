"""Windows per band region."""

from __future__ import annotations

import numpy as np

from planner.spectroscopy.windows import band_windows, runs


def test_bands_far_apart_are_windows_of_their_own():
    """A gap over 100 per cm parts windows; HF-like spacings of 40 do not; a lone point is no window."""
    position = np.array([500.0, 540.0, 580.0, 700.0, 710.0, 900.0])
    assert runs(position) == [(500.0, 580.0), (700.0, 710.0)]
    assert band_windows(position, np.ones(6), (0.0, 1000.0)) == [(500.0, 580.0), (700.0, 710.0)]


def test_windows_stay_inside_their_reach():
    """Points outside the interval do not count."""
    position = np.arange(500.0, 800.0, 10.0)
    assert band_windows(position, np.ones(position.size), (600.0, 700.0)) == [(600.0, 700.0)]
    assert band_windows(position, np.ones(position.size), (900.0, 950.0)) == []
    assert band_windows(position, np.ones(position.size), (700.0, 600.0)) == []


def test_wide_runs_are_cut_where_least_is_absorbed():
    """Two bands of 700 per cm with a valley between them part in the valley, and the pieces tile the run."""
    position = np.arange(1000.0, 2400.0, 1.0)
    weight = np.exp(-(((position - 1350.0) / 200.0) ** 2)) + np.exp(-(((position - 2050.0) / 200.0) ** 2))
    first, second = band_windows(position, weight, (0.0, 5000.0))
    assert (first[0], second[1]) == (1000.0, 2399.0)
    assert first[1] == second[0]
    assert abs(first[1] - 1700.0) < 50.0


def test_no_window_is_wider_than_a_thousand():
    """However long the run."""
    position = np.arange(1000.0, 9000.0, 1.0)
    windows = band_windows(position, np.ones(position.size), (0.0, 10000.0))
    assert max(high - low for low, high in windows) <= 1000.0
    assert sum(high - low for low, high in windows) == position[-1] - position[0]
