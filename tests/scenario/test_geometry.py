"""Closed forms of the system against limits, symmetries and an integration."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.scenario import geometry

ORBIT = {"period_s": 86400.0 * 6, "star_radius_m": 8.3e7, "distance_m": 4.4e9}


def _time_in_contact(*, period_s, star_radius_m, distance_m, reach, impact_parameter):
    """Reference: sample the orbit and count where the centres are closer than ``reach`` stellar radii."""
    cos_i = impact_parameter * star_radius_m / distance_m
    phase = np.linspace(-0.25, 0.25, 2_000_001)
    x = distance_m * np.sin(2 * math.pi * phase)
    y = distance_m * np.cos(2 * math.pi * phase) * cos_i
    return period_s * 0.5 * np.mean(np.hypot(x, y) < reach * star_radius_m)


@pytest.mark.parametrize(("ratio", "impact"), [(0.07, 0.0), (0.07, 0.4), (0.15, 0.8)])
def test_transit_durations_against_sampled_orbit(ratio, impact):
    """T14 and T23 are the times the discs touch and overlap wholly along the orbit itself."""
    full = geometry.full_transit_duration_s(**ORBIT, radius_ratio=ratio, impact_parameter=impact)
    whole = geometry.transit_duration_s(**ORBIT, radius_ratio=ratio, impact_parameter=impact)
    assert whole == pytest.approx(_time_in_contact(**ORBIT, reach=1 + ratio, impact_parameter=impact), rel=1e-4)
    assert full == pytest.approx(_time_in_contact(**ORBIT, reach=1 - ratio, impact_parameter=impact), rel=1e-4)


def test_transit_durations_of_no_transit():
    """Grazing transits have no second contact; a miss has none at all."""
    assert geometry.full_transit_duration_s(**ORBIT, radius_ratio=0.1, impact_parameter=0.95) == 0.0
    assert geometry.transit_duration_s(**ORBIT, radius_ratio=0.1, impact_parameter=0.95) > 0.0
    assert geometry.transit_duration_s(**ORBIT, radius_ratio=0.1, impact_parameter=1.2) == 0.0


@given(impact=st.floats(0, 0.85), ratio=st.floats(0.01, 0.12))
@settings(derandomize=True, deadline=None)
def test_durations_are_ordered(impact, ratio):
    """T23 < T14, and both shrink as the chord moves outwards."""
    given_orbit = {**ORBIT, "radius_ratio": ratio}
    inner = geometry.transit_duration_s(**given_orbit, impact_parameter=impact)
    outer = geometry.transit_duration_s(**given_orbit, impact_parameter=impact + 0.02)
    assert geometry.full_transit_duration_s(**given_orbit, impact_parameter=impact) < inner
    assert outer < inner


def test_orbital_distance_of_the_earth():
    """One sidereal year and one solar mass give 1 au, to the mass of the Earth that is neglected."""
    year_s, sun_kg = 365.25636 * 86400, 1.98841e30
    assert geometry.orbital_distance_m(period_s=year_s, star_mass_kg=sun_kg) == pytest.approx(1.495978707e11, rel=2e-5)


def test_energy_balance():
    """The equilibrium temperature emits over the sphere what the cross-section takes in."""
    star = {"star_temperature_k": 3000.0, "star_radius_m": 2e8, "distance_m": 5e9}
    temperature = geometry.equilibrium_temperature_k(**star, albedo=0.3)
    absorbed = 0.7 * 3000.0**4 * (2e8 / 5e9) ** 2  # per sigma pi R^2
    assert 4 * temperature**4 == pytest.approx(absorbed, rel=1e-12)


def test_scale_height_ppm_is_the_thin_limit():
    """2 R H / R*^2 is the first order of the area of the ring."""
    exact = ((6.4e6 + 10.0) ** 2 - 6.4e6**2) / 8e7**2 * 1e6
    thin = geometry.scale_height_ppm(scale_height_km=0.01, radius_m=6.4e6, star_radius_m=8e7)
    assert thin == pytest.approx(exact, rel=1e-5)
