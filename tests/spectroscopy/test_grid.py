"""The wavenumber samples of the forward model."""

from __future__ import annotations

import numpy as np
import pytest

from planner.errors import RangeError
from planner.spectroscopy.grid import BLOCK, LogGrid


def test_covers_the_range_with_500_samples_per_bin():
    """A bin of R = 100 holds 500 samples and the ends are inside."""
    grid = LogGrid.covering(0.6, 5.3)
    nu = grid.wavenumber_per_cm
    assert nu[0] <= 1e4 / 5.3 < nu[1]
    assert nu[-2] < 1e4 / 0.6 <= nu[-1]
    np.testing.assert_allclose(np.diff(np.log(nu)), 1 / 50_000, rtol=1e-6)


def test_grids_share_their_points():
    """Two scenarios use the same samples where they overlap, so tables serve both."""
    a, b = LogGrid.covering(1, 5), LogGrid.covering(2, 12)
    common = np.intersect1d(a.wavenumber_per_cm, b.wavenumber_per_cm)
    assert common.size == a.first + a.count - max(a.first, b.first) - (
        0 if a.first + a.count <= b.first + b.count else a.first + a.count - b.first - b.count
    )


def test_blocks_tile_the_grid():
    """Every sample lies in exactly one block, at the same wavenumber."""
    grid = LogGrid.covering(0.9, 2.7)
    rebuilt = np.full(grid.count, np.nan)
    for block in grid.blocks():
        assert block.first % BLOCK == 0
        mine, theirs = grid.part_of(block)
        assert np.isnan(rebuilt[mine]).all()
        rebuilt[mine] = block.wavenumber_per_cm[theirs]
    np.testing.assert_array_equal(rebuilt, grid.wavenumber_per_cm)


@pytest.mark.parametrize(("low", "high", "per"), [(2, 1, 50_000), (0, 1, 50_000), (1, 2, 20_000)])
def test_refuses_empty_ranges_and_coarse_sampling(low, high, per):
    """Empty ranges and sampling that would add noise are refused."""
    with pytest.raises(RangeError, match="expected"):
        LogGrid.covering(low, high, per)
