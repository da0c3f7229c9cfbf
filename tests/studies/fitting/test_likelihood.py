"""Levels integrated out in closed form against one dense covariance."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from planner.studies.fitting.likelihood import LevelledData

RNG = np.random.default_rng(4)
BINS = 30
DETECTOR = np.repeat([0, 1, 2], [12, 5, 13])
ERROR = RNG.uniform(10, 40, BINS)
MODEL = 5000 + RNG.normal(size=BINS) * 50


def data(offset_ppm):
    rng = np.random.default_rng(7)
    depth = MODEL + ERROR * rng.normal(size=BINS) + 120 * rng.normal(size=3)[DETECTOR]
    return LevelledData(depth_ppm=depth, error_ppm=ERROR, detector=DETECTOR, offset_ppm=offset_ppm)


def dense(offset_ppm):
    """The covariance of noise and levels together."""
    return np.diag(ERROR**2) + offset_ppm**2 * (DETECTOR[:, None] == DETECTOR[None, :])


@pytest.mark.parametrize("offset_ppm", [0.0, 3.0, 100.0, 5000.0])
def test_ln_likelihood(offset_ppm):
    """scipy's density of a normal vector, for levels from none to wide."""
    found = data(offset_ppm)
    expected = stats.multivariate_normal(MODEL, dense(offset_ppm)).logpdf(found.depth_ppm)
    assert found.ln_likelihood(MODEL) == pytest.approx(expected, abs=1e-6)


def test_levels():
    """Mean and width given a model: the conditional of a joint normal vector, by dense algebra."""
    offset_ppm = 100.0
    found = data(offset_ppm)
    design = np.eye(3)[DETECTOR]
    gain = offset_ppm**2 * design.T @ np.linalg.inv(dense(offset_ppm))
    mean, width = found.level(MODEL)
    assert mean == pytest.approx(gain @ (found.depth_ppm - MODEL))
    assert width**2 == pytest.approx(np.diag(offset_ppm**2 * (np.eye(3) - gain @ design)))


def test_no_levels():
    """A width of zero holds them at zero."""
    mean, width = data(0.0).level(MODEL)
    assert np.all(mean == 0)
    assert np.all(width == 0)


def test_densities_bin_by_bin():
    """With no levels they add up to the likelihood; the shape of stacked spectra is kept."""
    found = data(0.0)
    densities = found.ln_densities(np.stack([MODEL, MODEL + 1]))
    assert densities.shape == (2, BINS)
    assert densities[0].sum() == pytest.approx(found.ln_likelihood(MODEL))
    assert densities[1] == pytest.approx(stats.norm(MODEL + 1, ERROR).logpdf(found.depth_ppm))
