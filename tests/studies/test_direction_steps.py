"""Nuisance directions: differences against analytic derivatives, other steps, and what physics makes equal."""

from __future__ import annotations

from math import log

import numpy as np
import pytest
from small_system import SYSTEM

from planner.scenario import parse_scenario
from planner.studies import nuisances
from planner.studies.forward import Change
from planner.studies.nuisances import directions
from planner.studies.workshop import Workshop

SCENARIO = """
title = "Small"
invented = true
modes = ["grism-4-to-5-um"]
[atmosphere]
temperature = "250 K"
pressure = "1 bar"
surface = true
background = { N2 = 1.0 }
absorbers = { CO = "10 ppm" }
cloud = { top = "0.05 bar" }
haze = { factor = 5 }
[[candidates]]
gas = "N2O"
mixing_ratio = "1 ppm"
[goal]
threshold = 5
"""


@pytest.fixture(scope="module")
def workshop():
    """One mode, CO in N2 under clouds and haze, N2O searched."""
    return Workshop(parse_scenario(SCENARIO + SYSTEM))


def by_name(workshop):
    """All directions of the case, those by nature not smooth left in."""
    case = workshop.scenario.cases[0]
    null = workshop.model.binned(case, shares_of=["CO"], transparent=case.gases)
    return {d.name: d.per_mode_ppm[0] for d in directions(workshop.thin, case, null, workshop.views)}


def alike(a, b, tolerance):
    """Largest difference over largest value."""
    return np.abs(a - b).max() <= tolerance * np.abs(b).max()


def test_every_unknown_has_a_direction(workshop):
    """Nothing that the scenario leaves open is forgotten."""
    assert set(by_name(workshop)) == {
        "offset of grism-4-to-5-um: 3.9 to 5 um",
        *("CO", "radius", "temperature", "gravity", "molar mass", "cloud", "haze"),
    }


def test_difference_by_mixing_ratio_is_the_analytic_slope(workshop):
    """A central difference of the forward model in ln(mixing ratio) gives the derivative from the chord integrals."""
    case, model = workshop.scenario.cases[0], workshop.model
    step = 0.05
    atmosphere = workshop.scenario.atmosphere
    up, down = (
        model.of(
            workshop.scenario.model_copy(
                update={"atmosphere": atmosphere.model_copy(update={"absorbers": {"CO": 1e-5 * np.exp(sign * step)}})}
            )
        ).binned(case, transparent=case.gases)[0]
        for sign in (1, -1)
    )
    assert alike((up.depth_ppm - down.depth_ppm) / (2 * step), by_name(workshop)["CO"] / log(10), 1e-3)


@pytest.mark.parametrize("name", ["radius", "gravity", "molar mass", "temperature"])
def test_halving_the_step_changes_little(workshop, monkeypatch, name):
    """Differences over half the step agree to 5 %: the steps are small enough, and large enough for rounding."""
    usual = by_name(workshop)[name]
    step, warm = nuisances._STEP, nuisances._temperature_step(250.0)
    monkeypatch.setattr(nuisances, "_STEP", step / 2)
    monkeypatch.setattr(nuisances, "_temperature_step", lambda temperature_k: warm / 2)
    assert alike(by_name(workshop)[name], usual, 0.05)


@pytest.mark.parametrize(
    ("name", "small", "tolerance"),
    [("cloud", {"cloud_top": 10**-0.02}, 0.05), ("haze", {"haze_factor": 5 * 10**0.02}, 0.15)],
)
def test_smaller_steps_of_cloud_and_haze(workshop, name, small, tolerance):
    """A fifth of the step gives the same derivative; a thin haze grows as 10^x, of which 0.1 dex sees 12 % more."""
    case, model = workshop.scenario.cases[0], workshop.thin
    base, moved = (model.binned(case, change, transparent=case.gases)[0] for change in (Change(), Change(**small)))
    assert alike((moved.depth_ppm - base.depth_ppm) / 0.02, by_name(workshop)[name], tolerance)


def test_gravity_and_molar_mass_act_through_their_product(workshop):
    """An isothermal column knows only mu g / T: per unit of logarithm both directions are one."""
    found = by_name(workshop)
    gravity = found["gravity"] / workshop.scenario.gravity_fraction
    assert alike(found["molar mass"] / workshop.scenario.nuisances.molar_mass_fraction, gravity, 0.03)


def test_thinned_samples_are_enough(workshop):
    """Directions on every fourth sample are those on all samples, to 4 % of the largest value of each."""
    case = workshop.scenario.cases[0]
    null = workshop.model.binned(case, shares_of=["CO"], transparent=case.gases)
    full = {d.name: d.per_mode_ppm[0] for d in directions(workshop.model, case, null, workshop.views)}
    for name, thin in by_name(workshop).items():
        assert alike(thin, full[name], 0.04)


def test_trace_of_a_rival_is_linear(workshop):
    """Gas added on top makes ten times the depth at ten times an amount that leaves even its strongest lines thin."""
    case, model = workshop.scenario.cases[0], workshop.model
    base = model.binned(case)[0].depth_ppm
    little, more = (model.binned(case, Change(added=(("OCS", x),)))[0] for x in (1e-13, 1e-12))
    assert alike((more.depth_ppm - base) / 10, little.depth_ppm - base, 0.02)
