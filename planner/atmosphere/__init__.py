"""The air of a transiting planet: hydrostatic column, clouds and haze, refraction, transit depth."""

from planner.atmosphere.absorbers import GasOpacity, PairOpacity
from planner.atmosphere.layers import Air, gravity_m_per_s2, scale_height_km
from planner.atmosphere.refraction import refraction_boundary, refractivity
from planner.atmosphere.transmission import TransitDepth, transit_depth

__all__ = [
    "Air",
    "GasOpacity",
    "PairOpacity",
    "TransitDepth",
    "gravity_m_per_s2",
    "refraction_boundary",
    "refractivity",
    "scale_height_km",
    "transit_depth",
]
