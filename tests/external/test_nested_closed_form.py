"""Nested sampling against the closed form of a linear model with normal noise and normal priors.

With ``y = A x + n``, ``n ~ N(0, 1)`` and ``x ~ N(0, 1)`` the data are normal with covariance ``1 + A A'``, and the
posterior of x is normal with covariance ``(1 + A' A)^-1``: Bishop 2006, Pattern Recognition and Machine Learning,
equations 2.113 to 2.117 (numbers from memory). The density is scipy's.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats
from scipy.special import ndtri

from planner.detection.nested import advance, begin, outcome, remaining

BINS, PARAMETERS, SEEDS = 40, 5, 8


def problem(seed):
    """A design, data drawn from it, and the likelihood over the unit cube."""
    rng = np.random.default_rng(seed)
    design = rng.normal(size=(BINS, PARAMETERS)) * np.geomspace(0.03, 3, PARAMETERS)
    data = design @ rng.normal(size=PARAMETERS) + rng.normal(size=BINS)

    def ln_likelihood(point):
        left = data - design @ ndtri(point)
        return float(-0.5 * left @ left - 0.5 * BINS * np.log(2 * np.pi))

    return design, data, ln_likelihood


@pytest.fixture(scope="module")
def runs():
    """A run per seed, with its problem."""
    found = []
    for seed in range(SEEDS):
        design, data, ln_likelihood = problem(seed)
        state = begin(ln_likelihood, PARAMETERS, live=150, seed=seed)
        while remaining(state) > 0.01:
            state = advance(state, ln_likelihood, seed=seed)
        found.append((design, data, outcome(state)))
    return found


def test_evidence(runs):
    """ln Z lies within its own error as often as that says: none beyond three, their mean square near one."""
    away = []
    for design, data, run in runs:
        exact = stats.multivariate_normal(np.zeros(BINS), np.eye(BINS) + design @ design.T).logpdf(data)
        away.append((run.ln_evidence - exact) / run.error)
    assert np.abs(away).max() < 3
    # chi-squared of eight: beyond these ends lies one in a thousand
    assert 0.86 < np.sum(np.square(away)) < 26.1


def test_posterior(runs):
    """Means and widths of parameters are right on average over all runs, within three errors of their scatter."""
    away, wider = [], []
    for design, data, run in runs:
        covariance = np.linalg.inv(np.eye(PARAMETERS) + design.T @ design)
        mean, width = covariance @ design.T @ data, np.sqrt(np.diag(covariance))
        x = ndtri(run.points)
        away.append((run.weights @ x - mean) / width)
        wider.append(np.sqrt(run.weights @ (x - run.weights @ x) ** 2) / width - 1)
    for errors, most in ((np.array(away), 0.3), (np.array(wider), 0.2)):
        assert abs(errors.mean()) < 3 * errors.std() / np.sqrt(errors.size)
        assert np.abs(errors).max() < most
