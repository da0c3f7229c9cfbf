"""The compiled loops by themselves."""

from __future__ import annotations

import numpy as np

from planner.atmosphere.kernels import exp2_in_place


def test_exp2_against_double_precision():
    """Relative error under 3e-7 over the whole range."""
    x = np.random.default_rng(1).uniform(-125.9, 125.9, 5000).astype(np.float32)
    got = x.copy()
    exp2_in_place(got, 1.0)
    np.testing.assert_allclose(got.astype(np.float64), np.exp2(x.astype(np.float64)), rtol=3e-7)


def test_exp2_of_a_multiple():
    """The scale multiplies first."""
    x = np.linspace(-8.0, 8.0, 65, dtype=np.float32)
    got = x.copy()
    exp2_in_place(got, -2.5)
    np.testing.assert_allclose(got, np.exp2(-2.5 * x), rtol=3e-7)


def test_exp2_of_whole_numbers_and_beyond_the_range():
    """Whole powers are exact; what lies outside -126..126 is held there, minus infinity too."""
    whole = np.array([-126, -1, 0, 1, 10, 126, -np.inf, 1e9], dtype=np.float32)
    exp2_in_place(whole, 1.0)
    np.testing.assert_array_equal(whole, 2.0 ** np.array([-126, -1, 0, 1, 10, 126, -126, 126]))
