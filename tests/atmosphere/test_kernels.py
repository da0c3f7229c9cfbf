"""The compiled loops by themselves."""

from __future__ import annotations

import numpy as np

from planner.atmosphere.kernels import exp2_single


def test_exp2_against_double_precision():
    """Relative error under 3e-7 over the whole range."""
    x = np.random.default_rng(1).uniform(-125.9, 125.9, 5000).astype(np.float32)
    got = np.array([exp2_single(value) for value in x], dtype=np.float64)
    np.testing.assert_allclose(got, np.exp2(x.astype(np.float64)), rtol=3e-7)


def test_exp2_of_whole_numbers_and_beyond_the_range():
    """Whole powers are exact; what lies outside -126..126 is held there, minus infinity too."""
    for whole in (-126, -1, 0, 1, 10, 126):
        assert exp2_single(np.float32(whole)) == 2.0**whole
    assert exp2_single(np.float32(-np.inf)) == 2.0**-126
    assert exp2_single(np.float32(1e9)) == 2.0**126
