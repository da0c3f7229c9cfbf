"""Closed forms of the star-planet system: pure functions of plain numbers, SI units unless a name says otherwise.

Orbits are circular. Gravity and scale height are those of the atmosphere, `planner.atmosphere.layers`.
"""

from __future__ import annotations

import math

from planner.atmosphere.layers import GRAVITATION_SI

__all__ = [
    "equilibrium_temperature_k",
    "full_transit_duration_s",
    "orbital_distance_m",
    "scale_height_ppm",
    "transit_duration_s",
]


def orbital_distance_m(*, period_s: float, star_mass_kg: float) -> float:
    """Semi-major axis by Kepler's third law, the planet's mass neglected."""
    return float((GRAVITATION_SI * star_mass_kg * (period_s / (2 * math.pi)) ** 2) ** (1 / 3))


def equilibrium_temperature_k(
    *, star_temperature_k: float, star_radius_m: float, distance_m: float, albedo: float = 0.0
) -> float:
    """Temperature in balance with the starlight, heat spread over the whole sphere.

    ``T = T_star sqrt(R_star / 2a) (1 - A)^(1/4)``; see e.g. Seager, Exoplanet Atmospheres (2010), eq. 3.9 with f = 1/4
    (equation number from memory).
    """
    return star_temperature_k * math.sqrt(star_radius_m / (2 * distance_m)) * (1 - albedo) ** 0.25


def transit_duration_s(
    *, period_s: float, star_radius_m: float, distance_m: float, radius_ratio: float, impact_parameter: float
) -> float:
    """Time from first to fourth contact, T14, of a circular orbit.

    ``T14 = P/pi asin( R_star/a sqrt((1 + k)^2 - b^2) / sin i )``, Winn 2010 (Exoplanets, ed. Seager), eq. 14. Zero
    where the planet misses the star.
    """
    return _chord_time_s(period_s, star_radius_m / distance_m, 1 + radius_ratio, impact_parameter)


def full_transit_duration_s(
    *, period_s: float, star_radius_m: float, distance_m: float, radius_ratio: float, impact_parameter: float
) -> float:
    """Time from second to third contact, T23, of a circular orbit; Winn 2010, eq. 15. Zero for a grazing transit."""
    return _chord_time_s(period_s, star_radius_m / distance_m, 1 - radius_ratio, impact_parameter)


def _chord_time_s(period_s: float, star_over_distance: float, reach: float, impact_parameter: float) -> float:
    """Time on the chord that lies within ``reach`` stellar radii of the centre of the disc."""
    if impact_parameter >= reach:
        return 0.0
    sin_inclination = math.sqrt(1 - (impact_parameter * star_over_distance) ** 2)
    sine = star_over_distance * math.sqrt(reach**2 - impact_parameter**2) / sin_inclination
    return period_s / math.pi * math.asin(min(1.0, sine))


def scale_height_ppm(*, scale_height_km: float, radius_m: float, star_radius_m: float) -> float:
    """Transit depth of a thin ring one scale height wide, ``2 R H / R_star^2``, in ppm."""
    return 2e9 * radius_m * scale_height_km / star_radius_m**2
