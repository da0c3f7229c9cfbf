"""Odds of a ledger against published worked examples, bounds and words."""

from __future__ import annotations

import pytest

from planner.catalogue.ledger import parse_ledger
from planner.report.odds import likelihood_words
from planner.studies.odds import bayes_factor_bound, weigh

CATLING = """
title = "worked example"
hypothesis = "life"
[[evidence]]
says = "data and context"
if_true = 0.80
if_false = 0.25
[beliefs.life]
probability = 0.5
probability_range = [0.4999, 0.5001]
"""


def test_worked_example_through_a_whole_ledger():
    """Likelihoods 0.80 and 0.25 at a prior of one half: 76 % (Catling et al. 2018, Astrobiology 18, 709)."""
    result = weigh(parse_ledger(CATLING))
    assert [round(100 * chance) for chance in result.posterior] == [76, 76, 76]


@pytest.mark.parametrize(
    ("probability", "bound"),
    [(0.05, 2.456), (0.01, 7.988), (0.0027, 23.04), (0.001, 53.26), (0.0003, 151.2), (5.733e-7, 4.465e4)],
)
def test_bound_on_the_bayes_factor(probability, bound):
    """-1/(e p ln p) (Sellke, Bayarri & Berger 2001, Am. Stat. 55, 62); anchored by 5:2 and 150:1 at p = 0.05 and
    0.0003 in Gordon & Trotta 2007, MNRAS 382, 1859. Our significances are one-sided, hence the conversion."""
    from planner.detection.significance import one_sided_sigma

    assert bayes_factor_bound(one_sided_sigma(probability)) == pytest.approx(bound, rel=5e-4)


@pytest.mark.parametrize(
    ("chance", "word"),
    [
        (0.95, "very likely"),
        (0.90, "very likely"),
        (0.762, "likely"),
        (0.5, "inconclusive"),
        (0.2, "unlikely"),
        (0.10, "very unlikely"),
        (0.01, "very unlikely"),
    ],
)
def test_words_for_chances(chance, word):
    """Five levels (Catling et al. 2018): 90-100 % and up to 10 % as published, the middle ones from memory."""
    assert likelihood_words(chance) == word
