"""The table [beliefs] of a scenario: what it reads and what it refuses, with the place."""

from __future__ import annotations

import re

import pytest

from planner.errors import ScenarioError
from planner.resources import data_folder
from planner.scenario import parse_scenario

DEMO = (data_folder("configs") / "scenarios" / "demo.toml").read_text()


def test_beliefs_are_read_with_units_and_names():
    """Common names come out as formulas, mixing ratios as numbers."""
    text = (
        '[beliefs.gases.CFC-11.industry.if_true]\nprobability_range = [0.1, 0.2]\nmixing_ratio_range = ["1 ppt", 1e-9]'
    )
    side = parse_scenario(f"{DEMO}\n{text}").beliefs.gases["CCl3F"].industry.if_true
    assert side.probability_range == (0.1, 0.2)
    assert side.mixing_ratio_range == (1e-12, 1e-9)
    assert side.probability is None


@pytest.mark.parametrize(
    ("text", "message"),
    [
        (
            "[beliefs.life]\nprobability = 1.5",
            "beliefs.life.probability: expected a probability above 0 below 1, got 1.5",
        ),
        ("[beliefs.life]\nprobability_range = [0.5, 0.1]", "expected two probabilities [lower, higher]"),
        ("[beliefs.life]\nprobability_range = 0.5", "expected two probabilities [lower, higher]"),
        ("[beliefs.life]\nprobability = 0.5\nprobability_range = [0.1, 0.2]", "inside probability_range, 0.1 to 0.2"),
        ("[beliefs.lif]\nprobability = 0.5", 'did you mean "life"'),
        ("[beliefs.gases.Xq.life]", "Xq"),
        ("[beliefs.gases.CH4.life.if_true]\nmixing_ratio_range = ['1 ppm', '2 K']", "mixing_ratio_range"),
        ("[beliefs.gases.CH4]\n[beliefs.gases.methane]", "CH4 is given twice"),
        ("[beliefs]\ngases = 3", "expected a table for each gas"),
    ],
)
def test_mistakes_are_told_with_their_place(text, message):
    """File, line and key stand in the message."""
    with pytest.raises(ScenarioError, match=re.escape(message)) as caught:
        parse_scenario(f"{DEMO}\n{text}", "my.toml")
    assert re.match(r"my\.toml:\d+: beliefs", str(caught.value))
