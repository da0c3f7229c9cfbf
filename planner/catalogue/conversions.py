"""From amounts per year to the fluxes that photochemical studies quote."""

from __future__ import annotations

from math import pi

__all__ = ["EARTH_RADIUS_CM", "SECONDS_PER_YEAR", "surface_flux_per_cm2_s"]

EARTH_RADIUS_CM = 6.371e8
"""Mean radius; the sphere has Earth's area to 0.01 %."""
SECONDS_PER_YEAR = 365.25 * 86400.0
_AVOGADRO_PER_MOL = 6.02214076e23
_G_PER_TG = 1e12


def surface_flux_per_cm2_s(amount_tg_per_yr: float, molar_mass_g: float) -> float:
    """Molecules per cm2 and second at the surface of an Earth-sized planet.

    Parameters
    ----------
    amount_tg_per_yr : float
        Teragrams of the gas per year.
    molar_mass_g : float
        Grams per mole.
    """
    molecules_per_yr = amount_tg_per_yr * _G_PER_TG / molar_mass_g * _AVOGADRO_PER_MOL
    return molecules_per_yr / (4 * pi * EARTH_RADIUS_CM**2 * SECONDS_PER_YEAR)
