"""Odds from a ledger: closed forms, what theory says, and the words they come in."""

from __future__ import annotations

import json

import numpy as np
import pytest

from planner.catalogue.ledger import parse_ledger, starting_ledger
from planner.report.odds import likelihood_words, odds_json, odds_text
from planner.studies.odds import bayes_factor_bound, weigh

FIXED = """
title = "x"
hypothesis = "life"
[beliefs.life]
probability = {prior}
probability_range = [{prior_low}, {prior_high}]
"""
SURE = """
[beliefs.gases.CH4.life]
if_true = { probability = 0.8, probability_range = [0.7999, 0.8001], mixing_ratio_range = ["1 ppm", "1 %"] }
if_false = { probability = 0.2, probability_range = [0.1999, 0.2001], mixing_ratio_range = ["1 ppm", "1 %"] }
"""


def ledger(entries, prior=0.5, spread=1e-4, beliefs=SURE):
    head = FIXED.format(prior=prior, prior_low=prior * (1 - spread), prior_high=prior * (1 + spread))
    return parse_ledger(head + entries + beliefs)


def methane(text):
    return f'[[gas]]\ngas = "CH4"\n{text}\n'


def test_certain_presence_gives_the_ratio_of_the_presences():
    """With overwhelming evidence for the gas and no amount, odds go as 0.8 to 0.2."""
    result = weigh(ledger(methane('found = "detected"\nbayes_factor = [1e9, 1.1e9]')))
    assert result.together == pytest.approx((4, 4, 4), rel=2e-3)
    assert result.posterior[1] == pytest.approx(0.8, rel=2e-3)


def test_worthless_detection_changes_nothing():
    """A Bayes factor of one is no evidence for the gas, nor for what it would stand for."""
    result = weigh(ledger(methane('found = "detected"\nbayes_factor = 1')))
    assert result.posterior == pytest.approx((0.5, 0.5, 0.5), rel=1e-3)


def test_null_gives_the_ratio_of_the_absences():
    """Nothing above the lowest amount, surely: (1 - 0.8)/(1 - 0.2); the ends of ranges move by half a decade."""
    result = weigh(ledger(methane('found = "not detected"\nlimit = "0.01 ppm"\nconfidence = 0.999999')))
    assert result.together == pytest.approx((0.25, 0.25, 0.25), rel=1e-2)


def test_absence_is_weaker_with_a_higher_limit():
    """The less is excluded, the nearer to no change."""
    middles = [
        weigh(ledger(methane(f'found = "not detected"\nlimit = "{limit} ppm"'))).together[1] for limit in (1, 100, 3000)
    ]
    assert 0.2 < middles[0] < middles[1] < middles[2] < 1


def test_gas_that_is_alike_either_way_leaves_the_odds():
    """CO2 detected or not: the catalogue has it say nothing."""
    for found in ('found = "detected"\nsignificance = "8 sigma"', 'found = "not detected"\nlimit = "20 ppm"'):
        result = weigh(ledger(f'[[gas]]\ngas = "CO2"\n{found}\n', beliefs=""))
        assert result.together == pytest.approx((1, 1, 1), rel=1e-9)


def test_findings_multiply():
    """Two pieces of evidence of 4 and 3 make 12, and leave even whoever held it at 1/13."""
    text = "".join(f'[[evidence]]\nsays = "{n}"\nif_true = {t}\nif_false = 0.2\n' for n, t in (("a", 0.8), ("b", 0.6)))
    result = weigh(ledger(text, beliefs=""))
    assert result.together[1] == pytest.approx(12)
    assert result.even_prior == pytest.approx(1 / 13)
    assert result.evidence_dex == pytest.approx(np.log10(12))
    assert not result.rests_on_prior


def test_wide_prior_is_said_to_carry_the_answer():
    """Findings of a factor 4 against a prior from one in ten thousand to one half."""
    result = weigh(parse_ledger(starting_ledger()))
    assert result.rests_on_prior
    assert result.posterior[0] < result.posterior[1] < result.posterior[2]
    assert "the answer rests on the prior" in odds_text(result)


def test_what_was_not_looked_for_is_sorted_by_what_it_would_do():
    """The companions of the found gases are among them, and finding beats not finding."""
    result = weigh(parse_ledger(starting_ledger()))
    moves = [item.moves_dex for item in result.nexts]
    assert moves == sorted(moves, reverse=True)
    assert {"O3", "O2"} <= {item.gas for item in result.nexts}
    for item in result.nexts:
        assert item.if_not[1] < item.if_found[1]


def test_catalogue_speaks_of_pairs_in_the_ledger():
    """Methane found and CO not: the companion statement of the record, with its source."""
    relations = weigh(parse_ledger(starting_ledger())).relations
    assert any("CO absent favours life" in text and "Krissansen-Totton" in text for text in relations)


def test_levels_count_up_to_the_first_gap():
    """A step that is claimed above a missing one does not count."""
    text = starting_ledger()
    assert weigh(parse_ledger(text)).level == 1
    text = text.replace("second_signal = false", "second_signal = true")
    assert weigh(parse_ledger(text)).level == 1
    text = text.replace("contamination_ruled_out = false", "contamination_ruled_out = true")
    assert weigh(parse_ledger(text)).level == 2
    assert weigh(parse_ledger(text.replace("= false", "= true"))).level == 7


def test_evidence_of_a_weak_significance_is_none():
    """Below a third of a sigma noise alone does as well."""
    assert bayes_factor_bound(0.2) == 1
    assert bayes_factor_bound(3) < bayes_factor_bound(4)


def test_text_and_json():
    """Eighty columns, and valid JSON with the ends of the range."""
    result = weigh(parse_ledger(starting_ledger()))
    assert max(map(len, odds_text(result, 80).splitlines())) <= 80
    tree = json.loads(odds_json(result))
    assert tree["format"] == "limbcast odds 1"
    assert tree["posterior"] == list(result.posterior)
    assert tree["likelihood_words"] == [likelihood_words(result.posterior[0]), likelihood_words(result.posterior[2])]
    assert tree["weighed"][0]["what"] == "CH4 detected, 20 ppm to 500 ppm"
