"""Published and closed-form figures for matched filters and stacking."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from planner.detection.significance import Measurement, one_sided_probability, target_snr


def flat(amplitude, white, floor, bins=1):
    return Measurement(
        template_ppm=np.full(bins, float(amplitude)),
        white_ppm=np.full(bins, float(white)),
        floor_ppm2=np.eye(bins) * float(floor) ** 2,
        directions_ppm=np.zeros((0, bins)),
    )


def test_flat_template_over_fifty_bins():
    """30 ppm over 50 bins at 40 ppm: S/N = 30 sqrt(50)/40 = 5.303301 (closed form of the matched filter)."""
    assert flat(30, 40, 0, 50).snr(1) == pytest.approx(5.303301, abs=1e-6)


@pytest.mark.parametrize(
    ("white", "amplitude", "snr", "floor", "transits"),
    [
        (50, 30, 5, 0, 69.44),
        (50, 30, 5, 5, 227.27),
        (50, 60, 5, 10, 56.82),
        (50, 50, 5, 10, None),
        (20, 30, 3, 10, None),
    ],
)
def test_stacking_with_a_floor(white, amplitude, snr, floor, transits):
    """N = sigma1^2/[(A/SNR)^2 - floor^2], never if A <= SNR floor (closed form)."""
    result = flat(amplitude, white, floor).transits_for(snr)
    assert result is None if transits is None else result == pytest.approx(transits, abs=0.006)


@pytest.mark.parametrize(("true", "threshold", "power"), [(5, 5, 0.5), (6, 5, 0.8413), (5, 3, 0.9772), (4, 5, 0.1587)])
def test_power_of_a_threshold(true, threshold, power):
    """P(detect at t | true S/N s) = Phi(s - t) (normal tables)."""
    assert target_snr(threshold, power) == pytest.approx(true, abs=1e-3)


@pytest.mark.parametrize("sigma", [1.5, 2.0, 2.5, 3.0, 5.0])
def test_one_sided_tails_against_scipy(sigma):
    """scipy.stats.norm.sf is the independent table."""
    assert one_sided_probability(sigma) == pytest.approx(stats.norm.sf(sigma), rel=1e-12)


def test_projecting_out_the_level_halves_a_half_box():
    """A box over 50 of 100 bins with a free level loses a factor sqrt(0.5) (closed form)."""
    box = np.repeat([1.0, 0.0], 50) * 30
    m = Measurement(
        template_ppm=box, white_ppm=np.full(100, 40.0), floor_ppm2=np.zeros((100, 100)),
        nuisances=("level",), directions_ppm=np.full((1, 100), 1e5),
    )  # fmt: skip
    assert m.snr(1) / m.known().snr(1) == pytest.approx(np.sqrt(0.5), rel=1e-4)
