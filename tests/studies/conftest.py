"""A search in one narrow band, quick to compute, and what the studies set up for it."""

from __future__ import annotations

import pytest

from planner.scenario import parse_scenario
from planner.studies.domain import domain_of
from planner.studies.reduced import reduce_opacity
from planner.studies.workshop import Workshop

NARROW = """
title = "Narrow band"
invented = true
modes = ["grism-4-to-5-um"]
[star]
name = "star"
temperature = "2650 K"
radius = "0.12 R_sun"
mass = "0.092 M_sun"
distance = "12.8 pc"
magnitudes = { J = "11.28 mag", Ks = "10.28 mag" }
[planet]
name = "planet"
mass = "0.85 M_earth"
radius = "1 R_earth"
period = "5.49 d"
impact_parameter = 0.25
[atmosphere]
temperature = "250 K"
pressure = "1 bar"
surface = true
background = { N2 = 1.0 }
absorbers = { CO = "10 ppm" }
[[candidates]]
gas = "N2O"
mixing_ratio = "10 ppm"
[goal]
threshold = 5
transits_available = 200
[noise]
floor = "3 ppm"
"""


@pytest.fixture(scope="session")
def narrow():
    """The scenario: N2O beside CO, at 3.9 to 5 um."""
    return parse_scenario(NARROW)


@pytest.fixture(scope="session")
def narrow_workshop(narrow):
    return Workshop(narrow)


@pytest.fixture(scope="session")
def narrow_reduced(narrow_workshop):
    """Few samples for all that its priors reach."""
    return reduce_opacity(narrow_workshop, domain_of(narrow_workshop.scenario, temperature=True))
