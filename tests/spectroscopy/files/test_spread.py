"""Negative values where an opacity is needed."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.spectroscopy.files.spread import spread_negatives

NUMBERS = st.lists(st.floats(-1.0, 1.0, allow_subnormal=False), min_size=1, max_size=40)


def slowly(values, widths):
    """The same, by the definition: a block that holds a negative value becomes its mean, block size by block size."""
    values = list(values)
    size = 1
    while size < len(values) and min(values) < 0:
        size *= 2
        for start in range(0, len(values), size):
            block, shares = values[start : start + size], widths[start : start + size]
            if min(block) < 0:
                mean = sum(v * w for v, w in zip(block, shares, strict=True)) / sum(shares)
                values[start : start + size] = [mean] * len(block)
    return np.maximum(values, 0.0)


@settings(derandomize=True, max_examples=200, deadline=None)
@given(NUMBERS, st.randoms(use_true_random=False))
def test_as_the_slow_way(numbers, random):
    """The array version does what the definition says."""
    widths = np.array([random.uniform(0.1, 2.0) for _ in numbers])
    np.testing.assert_allclose(
        spread_negatives(np.array(numbers), widths), slowly(numbers, widths), rtol=1e-12, atol=1e-15
    )


@settings(derandomize=True, max_examples=200, deadline=None)
@given(NUMBERS)
def test_keeps_the_integral_and_leaves_nothing_negative(numbers):
    """What is left is nowhere negative and has the same sum, unless that was negative."""
    values = np.array(numbers)
    result = spread_negatives(values, np.ones(values.size))
    assert result.min() >= 0
    assert result.sum() == pytest.approx(max(values.sum(), 0.0), abs=1e-12)


def test_what_is_not_negative_is_not_touched():
    """Strong features away from the noise keep every value."""
    values = np.array([5.0, 7.0, 9.0, 1.0, 0.0, 2.0, 3.0, 0.5])
    np.testing.assert_array_equal(spread_negatives(values, np.ones(8)), values)
    values[7] = -0.5
    np.testing.assert_array_equal(spread_negatives(values, np.ones(8))[:6], values[:6])


def test_noise_leaves_no_absorption():
    """Pure noise ends near zero, where setting negatives to zero would leave 0.4 of its spread."""
    noise = np.random.default_rng(1).normal(0.0, 1.0, 10_000)
    assert np.mean(np.maximum(noise, 0.0)) > 0.35
    assert np.mean(spread_negatives(noise, np.ones(noise.size))) < 0.02
