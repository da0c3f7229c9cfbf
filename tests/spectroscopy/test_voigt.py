"""The compiled Voigt function."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st
from scipy.special import erfcx, wofz

from planner.spectroscopy.voigt import voigt


def test_against_the_faddeeva_function():
    """K equals the real part of scipy's wofz to 1e-4 wherever it exceeds 1e-11, over 30 decades of y."""
    x = np.concatenate([np.linspace(-20.0, 20.0, 1601), 10.0 ** np.linspace(1.3, 5, 60)])
    y = np.concatenate([[0.0], 10.0 ** np.linspace(-25, 5, 241)])[:, np.newaxis]
    exact = wofz(x + 1j * y).real
    counts = exact > 1e-11
    assert np.max(np.abs(voigt(x, y) / np.where(counts, exact, 1.0) - 1.0)[counts]) < 1e-4


@pytest.mark.parametrize("radius", [6.0, 15.0])
def test_borders(radius):
    """K is continuous to 1e-4 across the borders of its approximations."""
    angle = np.linspace(0.0, np.pi, 181)
    x, y = radius * np.cos(angle), np.maximum(radius * np.sin(angle), 1e-3)
    inside, outside = voigt(0.999999 * x, 0.999999 * y), voigt(1.000001 * x, 1.000001 * y)
    np.testing.assert_allclose(inside, outside, rtol=1e-4)


def test_pure_doppler():
    """Without Lorentz width K is the Gaussian: to 1e-4 at the centre, exact from one half width outwards."""
    x = np.linspace(-4.0, 4.0, 81)
    np.testing.assert_allclose(voigt(x, 0.0), np.exp(-(x**2)), rtol=1e-4)
    np.testing.assert_allclose(voigt(x[abs(x) >= 1], 0.0), np.exp(-(x[abs(x) >= 1] ** 2)), rtol=1e-14)


def test_centre():
    """At the centre K is the scaled complementary error function."""
    y = 10.0 ** np.linspace(-6, 4, 101)
    np.testing.assert_allclose(voigt(0.0, y), erfcx(y), rtol=1e-4)


def test_pure_lorentz():
    """Far out K is the Lorentz profile, with the Doppler correction 3/(2 x**2)."""
    x = np.array([30.0, 100.0, 1000.0])
    y = 1e-3
    lorentz = y / (np.sqrt(np.pi) * (x**2 + y**2))
    np.testing.assert_allclose(voigt(x, y), lorentz * (1.0 + 1.5 / x**2), rtol=1e-5)


@settings(derandomize=True, deadline=None, max_examples=300)
@given(x=st.floats(-1e3, 1e3), y=st.floats(1e-6, 1e3))
def test_even_positive_and_falling(x, y):
    """K is even, positive, at most 1, and falls with distance but for the 1e-4 of the approximations."""
    value = voigt(x, y)
    assert value == voigt(-x, y)
    assert 0.0 < value <= 1.0 + 1e-4
    assert voigt(1.01 * x + 0.01, y) <= value * (1.0 + 2e-4) or x < 0
