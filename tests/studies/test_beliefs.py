"""Opinions drawn from judgement, and the scenario's word in place of the catalogue's."""

from __future__ import annotations

import numpy as np
import pytest

from planner.catalogue.read import find_gas, read_hypotheses
from planner.errors import ScenarioError
from planner.scenario.beliefs import Beliefs
from planner.studies.beliefs import MOST_RATIO, SHIFT_DEX, believed_gas, believed_prior, occurrence, opinions, span

PRIOR = read_hypotheses().life
METHANE = find_gas("CH4").life


@pytest.fixture
def drawn():
    return opinions(PRIOR, {"CH4": METHANE, "CO2": find_gas("CO2").life}, np.random.default_rng(3), 4000)


def test_opinions_stay_inside_the_ranges_and_centre_on_the_judgement(drawn):
    """Half of the draws lie below the central value; none outside the range."""
    low, high = PRIOR.probability_range
    assert low <= drawn.prior.min() < drawn.prior.max() <= high
    assert np.mean(drawn.prior < PRIOR.probability) == pytest.approx(0.5, abs=0.03)
    presence = METHANE.presence(True)
    inside = drawn.if_true["CH4"].probability
    assert presence.probability_range[0] <= inside.min() < inside.max() <= presence.probability_range[1]


def test_ranges_of_mixing_ratios_move_by_half_a_decade_at_most(drawn):
    """And never turn round."""
    kind = drawn.if_false["CH4"]
    low, high = METHANE.presence(False).mixing_ratio_range
    assert np.abs(np.log10(kind.lowest / low)).max() <= SHIFT_DEX + 1e-9
    assert np.abs(np.log10(kind.highest / high)).max() <= SHIFT_DEX + 1e-9
    assert np.all(kind.lowest < kind.highest)


def test_every_opinion_lies_within_the_span(drawn):
    """What a channel must reach over."""
    for gas in ("CH4", "CO2"):
        low, high = span(find_gas(gas).life)
        for kind in (drawn.if_true[gas], drawn.if_false[gas]):
            assert kind.lowest.min() >= low * (1 - 1e-9)
            assert kind.highest.max() <= high * (1 + 1e-9)


def test_gas_that_is_alike_either_way_gets_one_opinion_for_both(drawn):
    """Draws must not invent a difference."""
    assert drawn.if_true["CO2"] is drawn.if_false["CO2"]


def test_most_of_the_air_is_left_out():
    """CO2 up to 95 % is cut where it stops to be a trace."""
    assert occurrence(find_gas("CO2").life.presence(True)).highest == MOST_RATIO


def test_words_of_the_user_take_the_place_of_the_catalogue():
    """What is given replaces, what is left out stays; a gas that told nothing may tell something."""
    given = Beliefs.model_validate(
        {
            "life": {"probability": 0.4},
            "gases": {"carbon dioxide": {"life": {"if_false": {"probability": 0.75, "says": "dry worlds"}}}},
        }
    )
    assert believed_prior(given, "life").probability == 0.4
    assert believed_prior(given, "life").probability_range == PRIOR.probability_range
    ours = believed_gas(given, "CO2", "life")
    assert ours.tells
    assert ours.presence(False).probability == 0.75
    assert ours.presence(False).says == "dry worlds"
    assert ours.presence(True) == find_gas("CO2").life.presence(True)
    assert believed_gas(given, "CO2", "industry") == find_gas("CO2").industry
    assert believed_gas(given, "CH4", "life") == METHANE


def test_probability_outside_its_range_is_refused():
    """The message names the key, the range and the value."""
    given = Beliefs.model_validate({"life": {"probability": 0.9}})
    with pytest.raises(ScenarioError, match=r"beliefs\.life: .* 0\.0001 to 0\.5, got 0\.9"):
        believed_prior(given, "life")
