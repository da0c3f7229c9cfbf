"""Refractive mixtures and the boundary below which no ray gets through."""

from __future__ import annotations

import numpy as np
import pytest

from planner.atmosphere.refraction import LOSCHMIDT_PER_CM3, refraction_boundary, refractivity

SUN_KM, AU_KM = 6.957e5, 1.495978707e8


def test_boundary_solves_its_equation(make_air):
    """At the boundary the bending equals the angle to the far limb."""
    air = make_air(mixing_ratios={"CO2": 1.0}, molar_mass_g=44.0, base_pressure_bar=20.0)
    r = refraction_boundary(air, star_radius_km=SUN_KM, orbital_distance_km=AU_KM)
    density = air.base_density_per_cm3 * np.exp(-air.e_folds_at_radius(r))
    scale_height = air.scale_height_km * (r / air.base_radius_km) ** 2
    bending = refractivity({"CO2": 1.0}) * density / LOSCHMIDT_PER_CM3 * np.sqrt(2 * np.pi * r / scale_height)
    assert bending == pytest.approx((SUN_KM + r) / AU_KM, rel=1e-9)
    assert r > air.base_radius_km


def test_surface_above_the_boundary(make_air):
    """Thin air, or a star that fills the sky, is probed to the ground; without a ground the boundary lies deeper."""
    thin = make_air(base_pressure_bar=0.01, mixing_ratios={"N2": 1.0})
    assert refraction_boundary(thin, star_radius_km=SUN_KM, orbital_distance_km=AU_KM) is None
    close = make_air(mixing_ratios={"N2": 1.0})
    assert refraction_boundary(close, star_radius_km=SUN_KM, orbital_distance_km=0.02 * AU_KM) is None
    bottomless = make_air(mixing_ratios={"N2": 1.0}, base_pressure_bar=0.01, surface=False)
    r = refraction_boundary(bottomless, star_radius_km=SUN_KM, orbital_distance_km=AU_KM)
    assert r < bottomless.base_radius_km


def test_denser_air_and_farther_stars_raise_the_boundary(make_air):
    """The boundary keeps its density: ten times the pressure raises it by H ln 10."""
    one, ten = (make_air(base_pressure_bar=p, base_radius_km=1e6, mixing_ratios={"N2": 1.0}) for p in (10.0, 100.0))
    low, high = (refraction_boundary(a, star_radius_km=SUN_KM, orbital_distance_km=10 * AU_KM) for a in (one, ten))
    assert high - low == pytest.approx(one.scale_height_km * np.log(10), rel=1e-3)
    far = refraction_boundary(one, star_radius_km=SUN_KM, orbital_distance_km=20 * AU_KM)
    assert far > low


def test_mixture_is_the_mean():
    """By mixing ratio."""
    half = refractivity({"N2": 0.5, "CO2": 0.5})
    assert half == pytest.approx((refractivity({"N2": 1.0}) + refractivity({"CO2": 1.0})) / 2)


def test_unlisted_gases_count_as_heavy_ones():
    """A gas without a listed index bends more than nitrogen, and in proportion to its share."""
    share = refractivity({"N2": 0.95, "CCl3F": 0.05})
    assert share == pytest.approx(0.95 * 2.984e-4 + 0.05 * 7e-4)
    assert share > refractivity({"N2": 1.0})
