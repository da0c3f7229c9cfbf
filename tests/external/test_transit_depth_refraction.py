"""Where refraction ends the view: published figures for the Earth and its like.

Betremieux & Kaltenegger 2013, ApJL 772, L31: the Earth in front of the Sun is not sampled below 12.75 km (read there;
a full ray-traced model). Misra, Meadows & Crisp 2014, ApJ 792, 61: only the top 0.3 bar of an Earth around a Sun-like
star (read there). Betremieux & Kaltenegger 2014, ApJ 791, 7: 1 bar is reached around the coolest stars (read there).
The isothermal estimate, 11.4 to 12.2 km for H = 8.0 to 8.8 km and n - 1 = 2.77e-4 at the surface, was computed from
the formula.
"""

from __future__ import annotations

import math

import numpy as np
import pytest

from planner.atmosphere.layers import BOLTZMANN_J_PER_K, Air
from planner.atmosphere.refraction import (
    LOSCHMIDT_PER_CM3,
    REFRACTIVITY_AT_STP,
    refraction_boundary,
    refractivity,
)

SUN_KM, AU_KM, EARTH_KM = 6.957e5, 1.495978707e8, 6371.0
SURFACE_REFRACTIVITY = 2.77e-4


def earth(scale_height_km: float) -> Air:
    """An isothermal Earth of the given scale height."""
    temperature = scale_height_km * 1e3 * 28.97e-3 / 6.02214076e23 * 9.81 / BOLTZMANN_J_PER_K
    return Air(
        temperature_k=temperature,
        base_pressure_bar=1.013,
        base_radius_km=EARTH_KM,
        base_gravity_m_per_s2=9.81,
        mixing_ratios={"N2": 0.78084, "O2": 0.20946, "Ar": 0.0097},
        molar_mass_g=28.97,
        surface=True,
    )


def boundary_km(air: Air, star_km: float, distance_km: float) -> float | None:
    """Height of the boundary, the refractivity at the surface being that of the published figures."""
    at_stp = SURFACE_REFRACTIVITY * LOSCHMIDT_PER_CM3 / air.base_density_per_cm3
    r = refraction_boundary(air, star_radius_km=star_km, orbital_distance_km=distance_km, refractivity_at_stp=at_stp)
    return None if r is None else r - EARTH_KM


@pytest.mark.parametrize(("scale_height", "expected"), [(8.0, 11.4), (8.8, 12.2)])
def test_earth_and_sun_isothermal(scale_height, expected):
    """The isothermal estimate to its digits (falling gravity adds 0.02 km)."""
    assert boundary_km(earth(scale_height), SUN_KM, AU_KM) == pytest.approx(expected, abs=0.1)


def test_earth_and_sun_published():
    """The ray-traced 12.75 km within the 1.5 km that an isothermal air costs; the top 0.3 bar within 0.1 bar."""
    air = earth(8.4)
    height = boundary_km(air, SUN_KM, AU_KM)
    assert height == pytest.approx(12.75, abs=1.5)
    pressure = air.base_pressure_bar * math.exp(-air.e_folds_at_radius(EARTH_KM + height))
    assert pressure == pytest.approx(0.3, abs=0.1)


def test_coolest_stars_show_the_ground():
    """At TRAPPIST-1 e (0.02925 au from 0.1192 solar radii) 1 bar of Earth's air is probed to the surface."""
    assert boundary_km(earth(8.0), 0.1192 * SUN_KM, 0.02925 * AU_KM) is None
    # the star's far limb stands at 2.04e-2 rad, the ground bends by 1.96e-2: four per cent more air and it is lost
    distance = 0.02925 * AU_KM * 1.06
    assert boundary_km(earth(8.0), 0.1192 * SUN_KM, distance) is not None


def test_air_mixture():
    """Dry air at 15 C, 1 atm and 589 nm has n - 1 = 2.77e-4 (Edlen 1966, Metrologia 2, 71, from memory)."""
    at_stp = refractivity(earth(8.0).mixing_ratios)
    assert at_stp * 273.15 / 288.15 == pytest.approx(2.77e-4, rel=3e-3)


@pytest.mark.parametrize(
    ("formula", "constant", "strength", "resonance", "temperature"),
    [
        ("N2", 6498.2, 307.43305e12, 14.4e9, 288.15),
        ("O2", 20564.8, 24.80899e12, 4.09e9, 273.15),
        ("Ar", 6432.135, 286.06021e12, 14.4e9, 288.15),
        ("CO", 22851.0, 0.456e14, 71427.0**2, 288.15),
        ("He", 2283.0, 1.8102e13, 1.5342e10, 273.15),
    ],
)
def test_indices_from_dispersion_formulas(formula, constant, strength, resonance, temperature):
    """Sneep & Ubachs 2005, JQSRT 92, 293, and Cuthbertson & Cuthbertson 1932 (constants from memory), at 589.3 nm."""
    squared = (1e7 / 589.3) ** 2
    refractive = 1e-8 * (constant + strength / (resonance - squared))
    assert REFRACTIVITY_AT_STP[formula] == pytest.approx(refractive * temperature / 273.15, rel=1e-3)


def test_rayleigh_of_nitrogen_at_one_micron():
    """sigma = 24 pi^3 nu^4 / N^2 ((n^2-1)/(n^2+2))^2 F (Naus & Ubachs 2000, Opt. Lett. 25, 347), index as above."""
    from planner.atmosphere.layers import N2_RAYLEIGH_AT_1_UM_CM2

    nu, density = 1e4, 2.5469174e19
    n = 1 + 1e-8 * (6498.2 + 307.43305e12 / (14.4e9 - nu**2))
    king = 1.034 + 3.17e-12 * nu**2
    sigma = 24 * np.pi**3 * nu**4 / density**2 * ((n**2 - 1) / (n**2 + 2)) ** 2 * king
    assert pytest.approx(sigma, rel=2e-4) == N2_RAYLEIGH_AT_1_UM_CM2
