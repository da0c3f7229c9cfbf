"""Answers that must not depend on how finely a spectrum is sampled or binned."""

from __future__ import annotations

import pytest
from small_system import SYSTEM

from planner.resources import data_folder
from planner.scenario import parse_scenario, read_scenario
from planner.scenario.records import Bins
from planner.spectroscopy.grid import SAMPLES_PER_UNIT_LN
from planner.studies.workshop import Workshop, see

SCENARIO = """
title = "Small"
invented = true
modes = ["{mode}"]
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
    return parse_scenario(SCENARIO.format(mode=mode) + SYSTEM)


HAZY = """
[atmosphere.cloud]
top = "0.05 bar"
covered_fraction = 0.6
[atmosphere.haze]
factor = 20
"""
SUB_NEPTUNE = {
    'mass = "0.85 M_earth"\nradius = "1 R_earth"': 'mass = "8.6 M_earth"\nradius = "2.6 R_earth"',
    'pressure = "1 bar"\nsurface = true\nbackground = { N2 = 1.0 }': (
        'pressure = "10 bar"\nsurface = false\nbackground = { H2 = 0.85, He = 0.15 }'
    ),
    'absorbers = { CO = "10 ppm" }': "absorbers = { CH4 = 0.01, H2O = 0.001 }",
    'gas = "N2O"\nmixing_ratio = "100 ppm"': 'gas = "CO2"\nmixing_ratio = "100 ppm"',
}
DIFFERENT = {
    "a grating, methane under a partial deck and haze": (
        "medium-grating-3-to-5-um",
        {
            'gas = "N2O"': 'gas = "CH4"',
            "[[candidates]]": f"{HAZY}[[candidates]]",
            '{ CO = "10 ppm" }': '{ CO2 = "1 %" }',
        },
    ),
    "the mid infrared, ozone in moist air": (
        "mid-infrared-slitless",
        {
            'gas = "N2O"\nmixing_ratio = "100 ppm"': 'gas = "O3"\nmixing_ratio = "5 ppm"',
            '{ CO = "10 ppm" }': '{ CO2 = "400 ppm", H2O = "10 ppm", CH4 = "2 ppm" }',
            "{ N2 = 1.0 }": "{ N2 = 0.79, O2 = 0.21 }",
        },
    ),
    "a temperate sub-Neptune with the prism": ("near-infrared-prism", SUB_NEPTUNE),
    "a spotted star, thin cold air, two orders": (
        "cross-dispersed-near-infrared",
        {
            "[planet]": "[star.spots]\n[star.faculae]\n[planet]",
            'gas = "N2O"\nmixing_ratio = "100 ppm"': 'gas = "H2O"\nmixing_ratio = "300 ppm"',
            'pressure = "1 bar"': 'pressure = "20 mbar"',
            'temperature = "250 K"': 'temperature = "180 K"',
        },
    ),
}


def different(name):
    mode, changes = DIFFERENT[name]
    text = SCENARIO.format(mode=mode) + SYSTEM
    for old, new in changes.items():
        assert text.count(old) == 1, old
        text = text.replace(old, new)
    return parse_scenario(text)


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


def compare_samplings(scenario, label=""):
    """Assert that twice the samples change little; tell by how much, and which searches have a band to speak of."""
    goal = scenario.goal.threshold_sigma
    usual, doubled = measurements(scenario), measurements(scenario, 2 * SAMPLES_PER_UNIT_LN)
    seen = [name for name, m in usual.items() if m.snr_limit() > 0.1]
    for name in seen:
        ratio = transits_of(doubled[name], goal) / transits_of(usual[name], goal)
        print(f"{label} {name[0]}, {name[2]}: transits times {ratio:.4f}")
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
@pytest.mark.parametrize("name", DIFFERENT)
def test_doubling_the_samples_of_searches_unlike_each_other(name):
    """The same for a grating, the mid infrared, hydrogen, and thin cold air of a spotted star."""
    assert len(compare_samplings(different(name), name)) == 1


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
