"""A search in one narrow band, quick to compute, and what the studies set up for it."""

from __future__ import annotations

import pytest
from small_system import NARROW

from planner.scenario import parse_scenario
from planner.studies.domain import domain_of
from planner.studies.reduced import reduce_opacity
from planner.studies.workshop import Workshop


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
