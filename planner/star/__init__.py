"""The star's light: photons at Earth, scaling to catalogue magnitudes, unocculted spots and faculae."""

from __future__ import annotations

from planner.star.flux import magnitude_scales, photon_flux, star_cautions
from planner.star.heterogeneity import (
    Region,
    contamination_factor,
    disc_factor,
    region_contrast,
    usual_faculae,
    usual_spot_temperature_k,
    usual_spots,
)
from planner.star.record import Star
from planner.star.spectrumfile import StarSpectrum, parse_spectrum, read_spectrum

__all__ = [
    "Region",
    "Star",
    "StarSpectrum",
    "contamination_factor",
    "disc_factor",
    "magnitude_scales",
    "parse_spectrum",
    "photon_flux",
    "read_spectrum",
    "region_contrast",
    "star_cautions",
    "usual_faculae",
    "usual_spot_temperature_k",
    "usual_spots",
]
