"""Transit radius of an isothermal air in closed form.

For a constant cross-section, R = R0 + H (gamma + ln tau0 + E1(tau0)), tau0 the chord optical depth at an opaque
surface: de Wit & Seager 2013, Science 342, 1473; Heng & Kitzmann 2017, MNRAS 470, 2972; Jordan & Espinoza 2018,
RNAAS 2, 149 (formula from memory, numbers computed from it). For opacity that grows with density, H/2 in place of H:
Betremieux & Swain 2017, MNRAS 467, 2834; Gkouvelis 2025, arXiv:2511.07656 (n = 1).

The formulas hold for constant gravity and a planet large against its air; the planet here has 1e8 km, so that what
they neglect, of order (height/H)^2 H/R0, is below 2e-5 scale heights.
"""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad
from scipy.special import exp1

from planner.atmosphere.absorbers import GasOpacity, PairOpacity
from planner.atmosphere.layers import Air
from planner.atmosphere.transmission import transit_depth

STAR_KM = 1e9

# tau0 at the surface, height in H with E1
TABLE = [
    (0.01, 0.009975),
    (0.1, 0.097555),
    (0.5, 0.443842),
    (1.0, 0.796600),
    (5.0, 2.187802),
    (10.0, 2.879805),
    (100.0, 5.182386),
    (1e3, 7.484971),
    (1e4, 9.787556),
    (1e6, 14.392726),
]
TAU0 = np.array([row[0] for row in TABLE])
HEIGHT = np.array([row[1] for row in TABLE])


@pytest.fixture(scope="module")
def air() -> Air:
    return Air(
        temperature_k=250.0,
        base_pressure_bar=1.0,
        base_radius_km=1e8,
        base_gravity_m_per_s2=8.0,
        mixing_ratios={"N2": 0.9, "X": 0.1},
        molar_mass_g=28.0,
        surface=True,
    )


def model(air, gases, pairs, size):
    wavenumber = np.linspace(1000, 2000, size)
    return transit_depth(air, gases, pairs, wavenumber_per_cm=wavenumber, star_radius_km=STAR_KM, shares_of=["X"])


def height(air, depth):
    return (np.sqrt(depth) * STAR_KM - air.base_radius_km) / air.scale_height_km


def cross_section(air, tau0):
    path_cm = 1e5 * np.sqrt(2 * np.pi * air.base_radius_km * air.scale_height_km)
    return tau0 / (air.mixing_ratios["X"] * air.base_density_per_cm3 * path_cm)


def flat(sigma):
    return GasOpacity(formula="X", pressures_bar=[], log10_cross_section=None, flat_cross_section_cm2=sigma)


def table(sigma):
    rows = np.array([1e-6, 1e-3, 0.3, 1.0])
    log10 = np.log10(sigma) + np.zeros((rows.size, 1))
    return GasOpacity(formula="X", pressures_bar=rows, log10_cross_section=log10, flat_cross_section_cm2=None)


@pytest.mark.parametrize("kind", [flat, table])
def test_constant_cross_section(air, kind):
    """To 1e-4 H from a nearly transparent to a wholly opaque air, given as a flat absorber or as a table."""
    depth = model(air, [kind(cross_section(air, TAU0))], [], TAU0.size).depth
    np.testing.assert_allclose(height(air, depth), HEIGHT, atol=1e-4)


def test_many_optical_depths(air):
    """The same between the rows of the table, where the bottom cuts the rule anywhere."""
    tau0 = np.geomspace(0.01, 1e6, 300)
    depth = model(air, [flat(cross_section(air, tau0))], [], tau0.size).depth
    np.testing.assert_allclose(height(air, depth), np.euler_gamma + np.log(tau0) + exp1(tau0), atol=1e-4)


def test_absorption_that_grows_with_density(air):
    """Pairs: half the height at the same tau0, the chord being sqrt(pi R H)."""
    tau0 = np.r_[TAU0, np.geomspace(0.01, 1e6, 200)]
    path_cm = 1e5 * np.sqrt(np.pi * air.base_radius_km * air.scale_height_km)
    coefficient = tau0 / ((air.mixing_ratios["X"] * air.base_density_per_cm3) ** 2 * path_cm)
    pair = PairOpacity(first="X", second="X", coefficient_cm5=coefficient)
    found = model(air, [], [pair], tau0.size)
    expected = (np.euler_gamma + np.log(tau0) + exp1(tau0)) / 2
    np.testing.assert_allclose(height(air, found.depth), expected, atol=5e-4)
    assert expected[6] == pytest.approx(2.591193, abs=1e-6)
    # tau grows as the square of the mixing ratio: d height / d ln x = 2 (H/2) (1 - exp(-tau0))
    unit = 2 * air.base_radius_km * air.scale_height_km / STAR_KM**2
    np.testing.assert_allclose(found.derivative["X"] / unit, -np.expm1(-tau0), atol=1e-3)


def test_wing_of_a_table(air):
    """The same law through a table that grows as the pressure."""
    rows = 10.0 ** np.linspace(-6, 0, 19)
    path_cm = 1e5 * np.sqrt(np.pi * air.base_radius_km * air.scale_height_km)
    at_one_bar = TAU0 / (air.mixing_ratios["X"] * air.base_density_per_cm3 * path_cm)
    log10 = np.log10(at_one_bar * rows[:, None])
    gas = GasOpacity(formula="X", pressures_bar=rows, log10_cross_section=log10, flat_cross_section_cm2=None)
    expected = (np.euler_gamma + np.log(TAU0) + exp1(TAU0)) / 2
    np.testing.assert_allclose(height(air, model(air, [gas], [], TAU0.size).depth), expected, atol=5e-4)


def test_slope_and_share(air):
    """d height / d ln x = H (1 - exp(-tau0)), and without its only absorber the planet ends at its surface."""
    found = model(air, [flat(cross_section(air, TAU0))], [], TAU0.size)
    unit = 2 * air.base_radius_km * air.scale_height_km / STAR_KM**2
    np.testing.assert_allclose(found.derivative["X"] / unit, -np.expm1(-TAU0), atol=1e-4)
    np.testing.assert_allclose(height(air, found.depth_without["X"]), 0.0, atol=1e-6)
    np.testing.assert_allclose(found.bottom_transmission, np.exp(-TAU0), atol=2e-6)


@pytest.mark.parametrize("sigma", [1e-25, 1e-23, 1e-20])
def test_falling_gravity_and_true_chords(sigma):
    """A small planet with light air, against adaptive quadrature (scipy.integrate.quad) of both integrals."""
    r0, h0, n0 = 6000.0, 60.0, 2.5e19

    def density(r):
        return n0 * np.exp(-r0 / h0 * (1 - r0 / r))

    def slant(b):
        path = quad(lambda s: density(np.hypot(b, s)), 0, 12 * np.sqrt(b * h0) * (b / r0), epsrel=1e-9, limit=200)[0]
        return 2e5 * path * sigma

    top = r0 / (1 - 34 * h0 / r0)
    area = quad(lambda b: 2 * b * -np.expm1(-slant(b)), r0, top, epsrel=1e-7, limit=200)[0]
    temperature, mass = 300.0, 10.0
    pressure_bar = n0 * 1e6 * 1.380649e-23 * temperature * 1e-5
    gravity = 8.314462618 * temperature / (mass * 1e-3 * h0 * 1e3)
    air = Air(
        temperature_k=temperature,
        base_pressure_bar=pressure_bar,
        base_radius_km=r0,
        base_gravity_m_per_s2=gravity,
        mixing_ratios={"X": 1.0},
        molar_mass_g=mass,
        surface=True,
    )
    depth = model(air, [flat(np.array([sigma]))], [], 1).depth[0]
    expected_km = np.sqrt(r0**2 + area) - r0
    assert np.sqrt(depth) * STAR_KM - r0 == pytest.approx(expected_km, abs=1e-3 * h0)
