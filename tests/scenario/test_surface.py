"""Spots and faculae in a scenario."""

from __future__ import annotations

import pytest

from planner.errors import ScenarioError
from planner.scenario import parse_scenario, starting_scenario
from planner.star import usual_faculae, usual_spots

START = starting_scenario()


def star(text):
    return parse_scenario(f"{START}\n{text}", "a.toml").star


def test_silence_is_a_quiet_star():
    """Without a table there is nothing on the disc."""
    assert star("").spots is None
    assert star("").faculae is None


def test_empty_tables_are_the_usual_ones():
    """Nothing but the table asks for what such a star usually has."""
    found = star("[star.spots]\n[star.faculae]")
    assert found.spots == usual_spots(2650.0)
    assert found.faculae == usual_faculae(2650.0)


def test_given_values_stand():
    """What is given is taken, the rest is usual."""
    spots = star('[star.spots]\ntemperature = "2500 K"\ncovered_fraction = 0.02\ncovered_fraction_error = 0').spots
    assert (spots.temperature_k, spots.fraction, spots.fraction_error) == (2500.0, 0.02, 0.0)
    assert spots.temperature_error_k == usual_spots(2650.0).temperature_error_k


@pytest.mark.parametrize(
    ("text", "message"),
    [
        (
            '[star.spots]\ntemperature = "2650 K"',
            "star.spots.temperature: expected cooler than the photosphere, 2650 K",
        ),
        ('[star.faculae]\ntemperature = "2700 s"', "star.faculae.temperature: expected a temperature"),
        ('[star.faculae]\ntemperature = "2600 K"', "star.faculae.temperature: expected warmer than the photosphere"),
        (
            "[star.spots]\ncovered_fraction = 1.2",
            "covered_fraction: expected a share of the disc from 0 up to 1, got 1.2",
        ),
        ("[star.spots]\ncovered_fraction = 0.6\n[star.faculae]", "at most 1 of the disc together, got 1.15"),
        ("[star.spots]\ncovered_fracton = 0.1", 'did you mean "covered_fraction"'),
    ],
)
def test_refused(text, message):
    """Spots warmer than the star, more than a disc, and what is not known."""
    with pytest.raises(ScenarioError) as refused:
        star(text)
    assert message in str(refused.value)
