"""Few samples with weights in place of many."""

from __future__ import annotations

import numpy as np
import pytest

from planner.spectroscopy.quadrature import fit_quadrature, fit_until


@pytest.fixture
def curves():
    """Light through columns of 400 samples: strengths over six decades, two absorbers in many proportions."""
    rng = np.random.default_rng(5)
    strengths = 10.0 ** rng.uniform(-3, 3, (2, 400))
    columns = 10.0 ** rng.uniform(-3, 3, (120, 2))
    return np.exp(-columns @ strengths), np.full(400, 1 / 400)


def test_exact_for_functions_of_low_rank():
    """Functions that combine r others are reproduced to rounding with r + 1 samples at most."""
    rng = np.random.default_rng(1)
    values = rng.normal(size=(50, 4)) @ rng.normal(size=(4, 200))
    share = rng.uniform(0.5, 1.5, 200)
    share /= share.sum()
    index, weights = fit_quadrature(values, share, values @ share, 1e-5)
    assert index.size <= 5
    np.testing.assert_allclose(values[:, index] @ weights, values @ share, atol=1e-5)


def test_weights_are_a_mean(curves):
    """Weights are positive and add up to one, so a constant is kept and no mean leaves the range of the samples."""
    values, share = curves
    index, weights = fit_quadrature(values, share, values @ share, 0.01)
    assert np.all(np.diff(index) > 0)
    assert np.all(weights > 0)
    assert weights.sum() == pytest.approx(1, abs=1e-12)


def test_tighter_tolerance_errs_less_with_more_samples(curves):
    """On functions that were not fitted; a tenth of the tolerance is well over twice as good."""
    values, share = curves
    fitted, others = values[:80], values[80:]
    found = [fit_quadrature(fitted, share, fitted @ share, tolerance) for tolerance in (1.0, 0.1, 0.01)]
    errors = [np.abs(others[:, i] @ w - others @ share).max() for i, w in found]
    sizes = [i.size for i, _ in found]
    assert errors[2] < errors[1] / 2 < errors[0] / 4
    assert sizes[0] < sizes[1] < sizes[2] < 60


def test_far_better_than_as_many_samples_by_plain_choice(curves):
    """As many samples evenly spaced err at least ten times as much."""
    values, share = curves
    index, weights = fit_quadrature(values[:80], share, values[:80] @ share, 0.01)
    plain = np.linspace(0, 399, index.size).astype(int)
    others, means = values[80:], values[80:] @ share
    fitted_error = np.abs(others[:, index] @ weights - means).max()
    assert np.abs(others[:, plain].mean(axis=1) - means).max() > 10 * fitted_error


def test_until_good_enough_on_what_was_held_out(curves):
    """The tolerance goes down until the second set is met, no further than needed."""
    values, share = curves
    fitted, others = values[:80], values[80:]
    sizes = []
    for allowed in (0.03, 0.003):
        index, weights = fit_until(fitted, share, fitted @ share, others, others @ share, allowed)
        assert np.abs(others[:, index] @ weights - others @ share).max() <= allowed
        sizes.append(index.size)
    assert sizes[0] < sizes[1]


def test_the_best_of_all_where_none_is_good_enough(curves):
    """A second set that nothing can meet still gets weights, and better ones than the first try gives."""
    values, share = curves
    fitted, others = values[:10], values[10:]
    first = fit_quadrature(fitted, share, fitted @ share, 2e-5)
    best = fit_until(fitted, share, fitted @ share, others, others @ share, 1e-5)
    errors = [np.abs(others[:, i] @ w - others @ share).max() for i, w in (first, best)]
    assert 1e-5 < errors[1] <= errors[0]


def test_one_sample_where_nothing_varies():
    """A bin in which all samples do the same needs no more."""
    values = np.repeat([[1.0], [5.0]], 30, axis=1)
    index, weights = fit_quadrature(values, np.full(30, 1 / 30), values[:, 0], 0.1)
    assert index.size == 1
    assert weights.tolist() == [1.0]


def test_samples_without_photons_are_allowed():
    """They are not chosen, and the others do."""
    rng = np.random.default_rng(2)
    values = rng.normal(size=(20, 3)) @ rng.normal(size=(3, 60))
    share = np.r_[np.zeros(20), np.full(40, 1 / 40)]
    index, weights = fit_quadrature(values, share, values @ share, 1e-4)
    assert index.min() >= 20
    np.testing.assert_allclose(values[:, index] @ weights, values @ share, atol=1e-4)
