"""The column of air."""

from __future__ import annotations

import numpy as np
import pytest

from planner.atmosphere.layers import N2_RAYLEIGH_AT_1_UM_CM2, scale_height_km


def test_radius_follows_the_hydrostatic_equation(make_air):
    """dr/du is the scale height with gravity falling as 1/r^2."""
    air = make_air(molar_mass_g=2.3)
    u = np.linspace(0, 20, 2001)
    r = air.radius_km(u)
    slope = np.gradient(r, u, edge_order=2)
    gravity = air.base_gravity_m_per_s2 * (air.base_radius_km / r) ** 2
    expected = [scale_height_km(air.temperature_k, air.molar_mass_g, g) for g in gravity]
    np.testing.assert_allclose(slope[1:-1], expected[1:-1], rtol=1e-5)


def test_heights_turn_back(make_air):
    """E-folds to radius and back; pressure to e-folds."""
    air = make_air()
    u = np.array([-2.0, 0.0, 5.0, 20.0])
    back = [air.e_folds_at_radius(r) for r in air.radius_km(u)]
    np.testing.assert_allclose(back, u, atol=1e-9)
    assert air.e_folds_at_pressure(np.exp(-3.0)) == pytest.approx(3.0)
    assert air.radius_km(np.array(0.0)) == pytest.approx(air.base_radius_km)


def test_haze_goes_by_its_slope(make_air):
    """At 1 um the haze is its factor times N2; it follows the stated power."""
    air = make_air(haze_factor=100.0, haze_slope=2.0)
    haze = air.haze_cross_section_cm2(np.array([1e4, 2e4]))
    np.testing.assert_allclose(haze, np.array([100.0, 400.0]) * N2_RAYLEIGH_AT_1_UM_CM2)
    assert np.all(make_air().haze_cross_section_cm2(np.array([1e4])) == 0)


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"temperature_k": 0.0}, "temperature_k: expected a positive"),
        ({"base_radius_km": float("nan")}, "base_radius_km"),
        ({"cloud_top_bar": -1.0}, "cloud_top_bar"),
        ({"cloud_fraction": 1.1}, "cloud_fraction: expected a number from 0 to 1"),
        ({"haze_factor": -1.0}, "haze_factor"),
        ({"haze_slope": float("inf")}, "haze_slope"),
        ({"mixing_ratios": {"N2": 0.9, "X": 0.2}}, "sum of 1"),
        ({"mixing_ratios": {"N2": 1.1, "X": -0.1}}, "numbers >= 0"),
        ({"mixing_ratios": {"N2": float("nan")}}, "numbers >= 0"),
    ],
)
def test_air_refuses(make_air, changes, message):
    """Fields out of their range are refused where the record is made."""
    with pytest.raises(ValueError, match=message):
        make_air(**changes)


def test_mixing_ratios_cannot_be_changed(make_air):
    """The record keeps its own copy."""
    ratios = {"N2": 1.0}
    air = make_air(mixing_ratios=ratios)
    ratios["N2"] = 0.5
    assert air.mixing_ratios["N2"] == 1.0
    with pytest.raises(TypeError):
        air.mixing_ratios["N2"] = 0.5
