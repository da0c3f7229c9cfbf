"""p-values as evidence against published figures.

Gordon & Trotta 2007, MNRAS 382, 1859 (read): p = 0.05 (1.96 sigma) gives odds of at most 5:2, p = 0.0003 (3.6 sigma)
of at most 150:1. Trotta 2008, Contemp. Phys. 49, 71 (table, from memory). The rest is the closed form
1 / (-e p ln p) of Sellke, Bayarri & Berger 2001 (formula from memory) worked apart from this project.
"""

from __future__ import annotations

from math import exp

import pytest

from planner.detection.evidence import even_prior, ln_bayes_bound, sigma_of_bayes_bound, strength_of


@pytest.mark.parametrize(("sigma", "odds", "tolerance"), [(1.96, 2.5, 0.05), (3.6, 150, 0.05)])
def test_published_anchors(sigma, odds, tolerance):
    """The two figures are quoted as rounded odds."""
    assert exp(ln_bayes_bound(sigma)) == pytest.approx(odds, rel=tolerance)


@pytest.mark.parametrize(
    ("sigma", "factor", "ln_factor"),
    [
        (1.96, 2.456, 0.899),
        (2.0, 2.617, 0.962),
        (2.1, 3.090, 1.128),
        (2.576, 7.991, 2.078),
        (2.7, 10.67, 2.368),
        (3.0, 23.04, 3.137),
        (3.6, 143.6, 4.967),
        (4.0, 600.8, 6.398),
        (5.0, 4.465e4, 10.707),
        (6.0, 9.302e6, 16.046),
    ],
)
def test_largest_bayes_factor(sigma, factor, ln_factor):
    """To the digits of the worked table, two-sided."""
    assert exp(ln_bayes_bound(sigma)) == pytest.approx(factor, rel=5e-4)
    assert ln_bayes_bound(sigma) == pytest.approx(ln_factor, abs=6e-4)


@pytest.mark.parametrize(
    ("ln_factor", "sigma"),
    [(1, 2.024), (1.21, 2.147), (2.5, 2.754), (3, 2.949), (5, 3.610), (7, 4.156), (10, 4.851), (11, 5.060)],
)
def test_significance_of_a_bayes_factor(ln_factor, sigma):
    """To the digits of the worked table; 1.21 is the "about 2 sigma" of Taylor 2025, arXiv:2504.15916."""
    assert sigma_of_bayes_bound(ln_factor) == pytest.approx(sigma, abs=6e-4)


@pytest.mark.parametrize(
    ("sigma", "ln_factor"), [(2.0, 0.9), (2.1, 1.0), (2.6, 2.1), (2.7, 2.5), (3.0, 3.0), (3.6, 5.0)]
)
def test_published_table(sigma, ln_factor):
    """Trotta 2008, table of p, B, ln B and sigma (from memory), each rounded to a digit or two."""
    assert ln_bayes_bound(sigma) == pytest.approx(ln_factor, abs=0.15)


@pytest.mark.parametrize(
    ("ln_factor", "word", "probability"), [(1.0, "weak", 0.750), (2.5, "moderate", 0.923), (5.0, "strong", 0.993)]
)
def test_scale_of_words(ln_factor, word, probability):
    """Jeffreys' scale as in Trotta 2008 (from memory): names, and the probability from even odds."""
    assert strength_of(ln_factor) == word
    assert strength_of(ln_factor - 0.01) != word
    assert 1 - even_prior(ln_factor) == pytest.approx(probability, abs=0.02)
