"""All modes together as one more mode."""

from __future__ import annotations

import numpy as np
import pytest
from small_system import SYSTEM

from planner.detection.significance import Measurement
from planner.errors import ScenarioError
from planner.scenario import parse_scenario
from planner.studies.plan import plan
from planner.studies.results import Verdict
from planner.studies.workshop import Workshop, see

SCENARIO = """
title = "Two grisms"
invented = true
modes = {modes}
[atmosphere]
temperature = "250 K"
pressure = "1 bar"
surface = true
background = {{ N2 = 1.0 }}
absorbers = {{ CO = "10 ppm" }}
[[candidates]]
gas = "N2O"
mixing_ratio = "300 ppm"
[goal]
threshold = 3
transits_available = {transits}
"""
BOTH = ["grism-2-to-4-um", "grism-4-to-5-um", "combined"]


def scenario(modes=BOTH, transits=200):
    return parse_scenario(SCENARIO.format(modes=modes, transits=transits) + SYSTEM)


@pytest.fixture(scope="module")
def workshop():
    """Both grisms and their combination."""
    return Workshop(scenario())


def test_combination_is_the_joint_measurement(workshop):
    """The combined mode measures what the others measure together, unknowns shared and offsets apart."""
    *single, combined = see(workshop, workshop.scenario.cases[0]).measurements
    joined = Measurement.join(single)
    assert set(combined.nuisances) == set(joined.nuisances)
    assert len([name for name in combined.nuisances if name.startswith("offset")]) == 2
    for transits in (1, 30, 1e5):
        assert combined.snr(transits) == pytest.approx(joined.snr(transits), rel=1e-9)
    assert combined.snr_limit() == pytest.approx(joined.snr_limit(), rel=1e-9)


def test_combination_beats_each_mode(workshop):
    """More data and shared unknowns: more than in quadrature is possible, less than the better one is not."""
    *single, combined = see(workshop, workshop.scenario.cases[0]).measurements
    assert combined.snr(30) > max(m.snr(30) for m in single)


def test_hours_are_those_of_all_modes():
    """A transit with each is charged for each, and takes two of the planet's transits."""
    result = plan(scenario())
    first, second, both = result.rows
    assert [row.mode for row in result.rows] == BOTH
    needed = both.marginalised.transits_required
    each = [row.marginalised.hours_required / row.marginalised.transits_required for row in (first, second)]
    assert both.marginalised.hours_required == pytest.approx(needed * sum(each))
    assert both.marginalised.in_transit_hours_required == pytest.approx(2 * needed * result.transit_duration_h)
    assert result.charged_hours_per_transit == pytest.approx(max(each))
    assert any(sentence.startswith("combined: as many transits with each of") for sentence in result.assumptions)
    assert result.spectra[2].from_um.size == sum(s.from_um.size for s in result.spectra[:2])


def test_availability_counts_every_transit():
    """With room for N transits with each but not for 2 N, the combination is out of reach."""
    needed = plan(scenario()).rows[2].marginalised.transits_required
    verdicts = [plan(scenario(transits=n)).rows[2].verdict for n in (2 * needed, 2 * needed - 1)]
    assert verdicts == [Verdict.WITHIN_REACH, Verdict.TOO_MANY]


def test_order_of_the_list_is_free(workshop):
    """The combination comes last wherever it stands."""
    other = Workshop(scenario(modes=["combined", *BOTH[:2]]))
    assert [view.mode.name for view in other.views] == BOTH
    assert np.array_equal(other.views[2].bins.from_um, workshop.views[2].bins.from_um)


@pytest.mark.parametrize("modes", [["combined"], ["grism-4-to-5-um", "combined"]])
def test_combination_needs_two_modes(modes):
    """There is nothing to combine in one mode."""
    with pytest.raises(ScenarioError, match='at least two modes beside "combined"'):
        scenario(modes=modes)
