"""A small fit: N2O beside CO in a dozen bins, temperature and the level of the detector unknown, all else known."""

from __future__ import annotations

import numpy as np
import pytest

from planner.claims.spectrum import ObservedSpectrum
from planner.scenario import parse_scenario
from planner.studies.fitting.observed import fitted_scenario, view_observed
from planner.studies.workshop import Workshop

SMALL = """
title = "Small fit"
invented = true
modes = ["grism-4-to-5-um"]
[star]
name = "star"
temperature = "2650 K"
radius = "0.12 R_sun"
mass = "0.092 M_sun"
distance = "12.8 pc"
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
[nuisances]
offset = "50 ppm"
radius = "0 %"
gravity = "0 %"
molar_mass = "0 %"
cloud_top = "0 dex"
haze = "0 dex"
[fit]
mixing_ratio_range = [1e-9, 1e-2]
"""
EDGES_UM = 4.35 * np.exp(np.arange(13) / 85)
ERROR_PPM = 5.0


@pytest.fixture(scope="session")
def small_text():
    return SMALL


@pytest.fixture(scope="session")
def small(small_text):
    return parse_scenario(small_text)


def observed_with(depth_ppm):
    """A spectrum of these depths."""
    count = EDGES_UM.size - 1
    return ObservedSpectrum(
        from_um=EDGES_UM[:-1],
        to_um=EDGES_UM[1:],
        depth_ppm=depth_ppm,
        error_ppm=np.full(count, ERROR_PPM),
        detector=np.zeros(count, dtype=np.int64),
        detectors=("the spectrum",),
    )


@pytest.fixture(scope="session")
def small_observed(small):
    """What the scenario's air looks like on the full grid, with noise and 30 ppm too deep."""
    blank = observed_with(np.full(EDGES_UM.size - 1, 5000.0))
    fitted = fitted_scenario(small)
    workshop = Workshop(fitted, view=view_observed(fitted, blank))
    depth = workshop.model.binned(fitted.cases[0])[0].depth_ppm
    noise = ERROR_PPM * np.random.default_rng(11).normal(size=depth.size)
    return observed_with(depth + noise + 30.0)
