"""How deep rays can look before refraction bends them past the star."""

from __future__ import annotations

import math
from collections.abc import Mapping

from planner.atmosphere.layers import Air

__all__ = ["REFRACTIVITY_AT_STP", "refraction_boundary", "refractivity"]

LOSCHMIDT_PER_CM3 = 2.686780111e19
"""Molecules per cm3 at 273.15 K and 1 atm (CODATA 2018, to the digits shown)."""

REFRACTIVITY_AT_STP: Mapping[str, float] = {
    # n - 1 at 273.15 K, 1 atm and 589.3 nm. First group: dispersion formulas, recalled from memory:
    "N2": 2.984e-4,  # Sneep & Ubachs 2005, JQSRT 92, 293, as the next six
    "O2": 2.710e-4,
    "Ar": 2.818e-4,
    "CO2": 4.493e-4,
    "CO": 3.410e-4,
    "N2O": 5.072e-4,
    "SF6": 7.696e-4,
    "He": 3.485e-5,  # Cuthbertson & Cuthbertson 1932
    "H2O": 2.52e-4,  # Ciddor 1996, Appl. Opt. 35, 1566, scaled as an ideal gas
    # Second group: handbook values (Kaye & Laby, Tables of Physical and Chemical Constants), from memory:
    "H2": 1.32e-4,
    "CH4": 4.44e-4,
    "NH3": 3.76e-4,
    "SO2": 6.86e-4,
    "H2S": 6.34e-4,
    "Ne": 6.7e-5,
}

_UNLISTED = 7e-4
"""For gases not listed: between ozone (5.2e-4) and the chlorofluorocarbons (1.1e-3), from memory; a factor 1.6."""


def refractivity(mixing_ratios: Mapping[str, float]) -> float:
    """``n - 1`` of a mixture at 273.15 K and 1 atm: the mean over its gases by mixing ratio.

    Visible light stands for the infrared: for N2 the difference is 1.4 %, that is 0.014 scale heights of boundary.
    Gases that are not in `REFRACTIVITY_AT_STP` count as 7e-4.
    """
    total = math.fsum(mixing_ratios.values())
    return math.fsum(x * REFRACTIVITY_AT_STP.get(gas, _UNLISTED) for gas, x in mixing_ratios.items()) / total


def refraction_boundary(
    air: Air, *, star_radius_km: float, orbital_distance_km: float, refractivity_at_stp: float | None = None
) -> float | None:
    """Radius in km below which no ray reaches the observer at mid-transit, or None if the surface comes first.

    A ray that touches the radius r is bent by ``(n(r) - 1) sqrt(2 pi r / H(r))`` (thin isothermal air). One from the
    far limb of the star, the least favourable that must still be met, is bent by ``(R_star + r) / a``. Air deeper
    than where the two are equal is not probed (Betremieux & Kaltenegger 2013, ApJ 772, L31, and 2014, ApJ 791, 7;
    the formula from memory); the boundary acts as an opaque bottom.

    Parameters
    ----------
    air : Air
    star_radius_km, orbital_distance_km : float
    refractivity_at_stp : float or None
        ``n - 1`` of the air at 273.15 K and 1 atm; by default `refractivity` of its mixing ratios.
    """
    if refractivity_at_stp is None:
        refractivity_at_stp = refractivity(air.mixing_ratios)
    at_base = refractivity_at_stp * air.base_density_per_cm3 / LOSCHMIDT_PER_CM3
    r = air.base_radius_km
    for _ in range(100):
        # r / H(r) = R0^2 / (H0 r)
        bending_at_base_density = at_base * math.sqrt(2 * math.pi * air.e_folds_to_infinity * air.base_radius_km / r)
        e_folds = math.log(bending_at_base_density * orbital_distance_km / (star_radius_km + r))
        if air.surface and e_folds <= 0:
            return None
        r = float(air.radius_km(min(e_folds, 0.5 * air.e_folds_to_infinity)))
    return r
