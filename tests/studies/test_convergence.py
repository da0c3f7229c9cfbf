"""Answers that must not depend on how finely a spectrum is sampled or binned."""

from __future__ import annotations

import pytest

from planner.resources import data_folder
from planner.scenario import parse_scenario, read_scenario
from planner.scenario.records import Bins
from planner.spectroscopy.grid import SAMPLES_PER_UNIT_LN
from planner.studies.workshop import Workshop, see

SCENARIO = """
title = "Small"
invented = true
modes = ["{mode}"]
[star]
name = "s"
temperature = "2650 K"
radius = "0.12 R_sun"
mass = "0.092 M_sun"
distance = "12.8 pc"
magnitudes = {{ J = "11.28 mag", Ks = "10.28 mag" }}
[planet]
name = "p"
mass = "0.85 M_earth"
radius = "1 R_earth"
period = "5.49 d"
impact_parameter = 0.25
[atmosphere]
temperature = "250 K"
pressure = "1 bar"
surface = true
background = {{ N2 = 1.0 }}
absorbers = {{ CO = "10 ppm" }}
[[candidates]]
gas = "N2O"
mixing_ratio = "100 ppm"
[goal]
threshold = 3
"""


def small(mode="grism-4-to-5-um"):
    return parse_scenario(SCENARIO.format(mode=mode))


def measurements(scenario, samples_per_unit_ln=None):
    """Every search of a scenario with every mode, by name."""
    workshop = Workshop(scenario, samples_per_unit_ln=samples_per_unit_ln)
    found = {}
    for case in scenario.cases:
        sight = see(workshop, case)
        for view, measurement in zip(workshop.views, sight.measurements, strict=True):
            found[case.label, case.mixing_ratios, view.mode.name] = measurement
    return found


def transits_of(measurement, goal):
    """Real-valued number for the goal, or for half of what is attainable where the goal is near or beyond that.

    Close to its limit a significance hardly grows, and the number of transits says more about the distance to the
    limit than about anything else.
    """
    return measurement.transits_for(min(goal, 0.5 * measurement.snr_limit()))


def compare_samplings(scenario):
    goal = scenario.goal.threshold_sigma
    usual, doubled = measurements(scenario), measurements(scenario, 2 * SAMPLES_PER_UNIT_LN)
    seen = [name for name, m in usual.items() if m.snr_limit() > 0.1]
    for name in seen:
        ratio = transits_of(doubled[name], goal) / transits_of(usual[name], goal)
        assert ratio == pytest.approx(1.0, abs=0.02), name
    return seen


def test_doubling_the_samples_of_one_mode():
    """Twice the samples move the unrounded number of transits by no more than 2 %."""
    assert len(compare_samplings(small())) == 1


@pytest.mark.slow
def test_doubling_the_samples_of_the_demonstration():
    """The same for every search of the demonstration, methane to ozone, 0.6 to 12 um, that has a band in range."""
    assert len(compare_samplings(read_scenario(data_folder("configs") / "scenarios" / "demo.toml"))) >= 6


@pytest.mark.slow
@pytest.mark.parametrize("known", [False, True])
def test_width_of_the_bins_changes_no_limit(known):
    """Bins of R = 100 and of R = 400 have the same best attainable S/N to 3 %, on a mode that resolves both.

    The floor is quoted at one resolving power and is a density in ln(wavelength); were it a number per bin, four
    times the bins would double the S/N.
    """
    limits = []
    for resolving_power in (100.0, 400.0):
        scenario = small("medium-grating-3-to-5-um").model_copy(
            update={"bins": Bins.model_construct(resolving_power=resolving_power)}
        )
        measurement = next(iter(measurements(scenario).values()))
        limits.append((measurement.known() if known else measurement).snr_limit())
    assert limits[1] == pytest.approx(limits[0], rel=0.03)
