"""Worked examples on TRAPPIST-1 and the Earth: gravity, scale height, heights in the air.

Masses and radii: Agol et al. 2021, PSJ 2, 1 (from memory). Scale heights and heights were computed from the closed
formulas with CODATA and IAU constants. Gravities of 2018: Turbet et al. 2018, A&A 612, A86, table 1 (read there).
"""

from __future__ import annotations

import numpy as np
import pytest

from planner.atmosphere.absorbers import GasOpacity, PairOpacity
from planner.atmosphere.chords import chords_through, height_rule
from planner.atmosphere.layers import Air, gravity_m_per_s2, scale_height_km
from planner.atmosphere.transmission import transit_depth

EARTH_KG, EARTH_KM, SUN_KM = 5.9722e24, 6378.1, 6.957e5
STAR_KM = 0.1192 * SUN_KM
AMAGAT_PER_CM3 = 2.6867811e19

# planet: R/R_E, M/M_E, Teq K, g m/s2, scale heights in km of N2, CO2 and H2/He (28.0134, 43.99, 2.3 g/mol)
PLANETS = {
    "b": (1.116, 1.374, 397.7, 10.81, 10.92, 6.95, 133.0),
    "c": (1.097, 1.308, 339.9, 10.65, 9.47, 6.03, 115.4),
    "d": (0.788, 0.388, 286.3, 6.12, 13.88, 8.84, 169.0),
    "e": (0.920, 0.692, 249.8, 8.01, 9.25, 5.89, 112.7),
    "f": (1.045, 1.039, 217.7, 9.32, 6.93, 4.41, 84.4),
    "g": (1.129, 1.321, 197.4, 10.15, 5.77, 3.67, 70.3),
    "h": (0.755, 0.326, 171.7, 5.60, 9.10, 5.79, 110.8),
}


@pytest.mark.parametrize("planet", PLANETS)
def test_trappist_gravity_and_scale_heights(planet):
    """To the digits shown."""
    radius, mass, temperature, gravity, nitrogen, carbon_dioxide, hydrogen = PLANETS[planet]
    g = gravity_m_per_s2(mass * EARTH_KG, radius * EARTH_KM)
    assert g == pytest.approx(gravity, abs=0.006)
    for molar_mass, expected, digit in (
        (28.0134, nitrogen, 0.01),
        (43.99, carbon_dioxide, 0.01),
        (2.3, hydrogen, 0.1),
    ):
        assert scale_height_km(temperature, molar_mass, g) == pytest.approx(expected, abs=0.6 * digit)


def test_gravities_of_2018():
    """Turbet et al. 2018, table 1, with the unrounded radii of Gillon et al. 2017 (Nature 542, 456)."""
    radii = (1.086, 1.056, 0.772, 0.918, 1.045, 1.127)
    masses = (0.85, 1.38, 0.41, 0.62, 0.68, 1.34)
    published = (7.07, 12.14, 6.75, 7.22, 6.11, 10.34)
    found = [gravity_m_per_s2(m * EARTH_KG, r * EARTH_KM) for m, r in zip(masses, radii, strict=True)]
    np.testing.assert_allclose(found, published, atol=0.015)  # their G or Earth differ in the fourth digit


def test_scale_height_of_the_earth():
    """7.460 km at 255 K; 8.4345 km in the US Standard Atmosphere 1976 (from memory); 0.2108 ppm of the Sun per 8 km."""
    assert scale_height_km(255.0, 28.97, 9.81) == pytest.approx(7.460, abs=6e-4)
    assert scale_height_km(288.15, 28.9644, 9.80665) == pytest.approx(8.4345, abs=6e-4)
    fraction = 2 * EARTH_KM * 8 / SUN_KM**2
    assert fraction == pytest.approx(0.2108e-6, abs=5e-11)


@pytest.fixture(scope="module")
def air() -> Air:
    """TRAPPIST-1 e under 1.000 bar of N2 at 250 K."""
    return Air(
        temperature_k=250.0,
        base_pressure_bar=1.0,
        base_radius_km=0.920 * EARTH_KM,
        base_gravity_m_per_s2=gravity_m_per_s2(0.692 * EARTH_KG, 0.920 * EARTH_KM),
        mixing_ratios={"N2": 1.0},
        molar_mass_g=28.0134,
        surface=True,
    )


def test_column_of_the_worked_planet(air):
    """g = 8.01102 m/s2, H = 9.26234 km, n0 = 2.897188e19 /cm3; tangential column 1.693037e27 /cm2 to order H/R0."""
    assert air.base_gravity_m_per_s2 == pytest.approx(8.01102, abs=1e-5)
    assert air.scale_height_km == pytest.approx(9.26234, abs=1e-4)
    assert air.base_density_per_cm3 == pytest.approx(2.897188e19, rel=1e-6)
    column = chords_through(air, bottom=0.0, top=5.0).columns_per_cm2()[0]
    assert column == pytest.approx(1.693037e27, rel=2 * air.scale_height_km / air.base_radius_km)


# cross-section cm2, mixing ratio, tau0, height by quadrature of 2 r dr in km, exact depth change in ppm
WORKED = [
    (1e-18, 4e-4, 6.77215e5, 129.7119, 223.80),
    (1e-20, 4e-4, 6772.15, 87.0573, 149.67),
    (1e-18, 1e-6, 1693.04, 74.2170, 127.45),
    (1e-24, 1e-2, 16.9304, 31.5625, 54.01),
]


@pytest.mark.parametrize(("sigma", "ratio", "tau0", "height_km", "ppm"), WORKED)
def test_height_by_quadrature(air, sigma, ratio, tau0, height_km, ppm):
    """With gravity held constant, as the worked figures were made, the rule across the chords gives them all."""
    r0, h = air.base_radius_km, air.scale_height_km
    assert ratio * sigma * air.base_density_per_cm3 * np.sqrt(2 * np.pi * r0 * h) * 1e5 == pytest.approx(tau0, rel=1e-5)
    u, weight = height_rule(0.0, 30.0)
    area = (2 * (r0 + h * u) * h * weight) @ -np.expm1(-tau0 * np.exp(-u))
    assert np.sqrt(r0**2 + area) - r0 == pytest.approx(height_km, abs=2e-4)
    assert area / STAR_KM**2 * 1e6 == pytest.approx(ppm, abs=0.006)


@pytest.mark.parametrize(("sigma", "ratio", "tau0", "height_km", "ppm"), WORKED)
def test_falling_gravity_lifts_the_air(air, sigma, ratio, tau0, height_km, ppm):
    """The full model lies higher by about z^2 / R0: 2 to 3 km at 130 km, with the longer chords."""
    flat = GasOpacity(
        formula="N2",
        pressures_bar=[],
        log10_cross_section=None,
        flat_cross_section_cm2=np.array([sigma * ratio]),
    )
    depth = transit_depth(air, [flat], [], wavenumber_per_cm=np.array([2000.0]), star_radius_km=STAR_KM).depth[0]
    lift = np.sqrt(depth) * STAR_KM - air.base_radius_km - height_km
    # z^2/R0; the chord at that height is longer by 3/2 z/R0; the rings spread by pi^2/6 H^2 about z; and a chord
    # through air whose gravity falls is longer than the thin limit by 9/8 H/R0. Next come terms like z^3/R0^2.
    z, h, r0 = height_km, air.scale_height_km, air.base_radius_km
    expected = (z**2 + 1.5 * z * h + (np.pi**2 / 6 + 9 / 8) * h**2) / r0
    assert lift == pytest.approx(expected, rel=0.04)
    if height_km > 120:
        assert 2.0 < lift < 3.5


def test_nitrogen_pairs(air):
    """8.6e-7 /cm/amagat^2 (Lafferty et al. 1996, Appl. Opt. 35, 5911, from memory) gives tau0 = 41.32 and 19.91 km."""
    coefficient = 8.6e-7 / AMAGAT_PER_CM3**2
    squared = chords_through(air, bottom=0.0, top=5.0).squared_columns_per_cm5()[0]
    assert squared * coefficient == pytest.approx(41.32, rel=2 * air.scale_height_km / air.base_radius_km)
    pair = PairOpacity(first="N2", second="N2", coefficient_cm5=np.array([coefficient]))
    depth = transit_depth(air, [], [pair], wavenumber_per_cm=np.array([2331.0]), star_radius_km=STAR_KM).depth[0]
    # falling gravity and the longer chord lift it by z^2/R0 + 3/4 (z/R0) H = 0.09 km
    assert np.sqrt(depth) * STAR_KM - air.base_radius_km == pytest.approx(19.91 + 0.09, abs=0.03)
