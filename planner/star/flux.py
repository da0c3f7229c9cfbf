"""Photons of a star at Earth."""

from __future__ import annotations

from collections.abc import Mapping

import numpy as np
from numpy.typing import NDArray

from planner.errors import RangeError, ScenarioError
from planner.star.model import blackbody_photons, late_type_ratio, solid_angle_factor
from planner.star.photometry import band_edges_um, band_grid_um, band_mean, catalogue_flux, join_scales
from planner.star.record import Star
from planner.star.spectrumfile import StarSpectrum

__all__ = ["magnitude_scales", "photon_flux", "star_cautions"]

Array = NDArray[np.float64]

# ends of the data behind the built-in spectrum, see late_types.toml
_MODEL_UM = (0.60, 12.3)
_COOLEST_K = 2500.0
# Blackbodies of 5800 and 6600 K scaled at Ks are 1.21 and 1.15 times as bright at 4.6 um as a star whose colour
# Ks - W2 is zero, as that of Sun-like and hotter stars is within 0.05 mag (colour from memory).
_SUNLIKE_K = 4500.0


def photon_flux(star: Star, wavelength_um: Array) -> Array:
    """Photons s-1 m-2 um-1 that arrive at Earth.

    The spectrum is the star's own one if it has any, else a blackbody times the ratios of late-type models
    (`planner.star.model.late_type_ratio`). It is scaled to the magnitudes (`magnitude_scales`,
    `planner.star.photometry.join_scales`); without any, it is multiplied by (R/d)^2. A spectrum marked ``at_earth``
    is taken as it stands. Interstellar extinction is left out.

    Parameters
    ----------
    star : Star
    wavelength_um : array, any shape
        Wavelengths > 0, any order.

    Returns
    -------
    array of the shape of ``wavelength_um``

    Raises
    ------
    ScenarioError
        If neither a magnitude nor a distance, nor a spectrum at Earth, sets the scale.
    RangeError
        If the star's own spectrum does not cover the wavelengths or a band used for scaling.
    """
    wavelength_um = np.asarray(wavelength_um, dtype=np.float64)
    shape = _shape(star, wavelength_um)
    if star.spectrum is not None and star.spectrum.at_earth:
        return shape
    if star.magnitudes:
        return shape * join_scales(magnitude_scales(star), wavelength_um)
    if star.distance_pc is None:
        raise ScenarioError("star: expected a magnitude such as J or Ks, or a distance, got neither")
    return shape * solid_angle_factor(star.radius_rsun, star.distance_pc)


def magnitude_scales(star: Star) -> Mapping[str, float]:
    """Per band, the flux of the star's magnitude over the mean of the spectrum at the stellar surface.

    The unscaled spectrum is that at the stellar surface, so that the scale is (R/d)^2 times the misfit of the
    spectrum in this band.
    """
    return {band: _scale(star, band, magnitude) for band, magnitude in star.magnitudes.items()}


def star_cautions(star: Star, from_um: float, to_um: float) -> tuple[str, ...]:
    """What a reader should know about the star's flux over this range, in sentences."""
    found = _anchor_cautions(star)
    if star.spectrum is not None:
        return tuple(found)
    if star.temperature_k < _COOLEST_K:
        found.append(f"The built-in stellar spectrum ends at {_COOLEST_K:.0f} K; its band ratios are held below.")
    if star.temperature_k < 4000.0 and from_um < 0.8:
        found.append("Below 0.8 um the built-in spectrum of a late-type star is 20 to 40 % uncertain.")
    if from_um < _MODEL_UM[0] or to_um > _MODEL_UM[1]:
        found.append("The built-in spectrum is a guess below 0.6 um and above 12.3 um: end values are held there.")
    if star.temperature_k > _SUNLIKE_K and to_um > 2.6 and not {"W1", "W2"} & set(star.magnitudes):
        found.append(
            "Beyond 2.6 um the built-in spectrum of a Sun-like or hotter star is 10 to 20 % too bright when it is "
            "scaled at Ks or shorter: give a W1 or W2 magnitude."
        )
    gravity = star.surface_log_g
    if gravity is not None and gravity < 4.0:
        found.append(f"The built-in spectrum is that of dwarfs; this star's log g is {gravity:.2f}.")
    return tuple(found)


def _anchor_cautions(star: Star) -> list[str]:
    """Bands that pull the spectrum apart by more than models of late-type stars err (a wrong entry, or extinction)."""
    scales = magnitude_scales(star) if star.magnitudes else {}
    if len(scales) < 2 or max(scales.values()) < 1.4 * min(scales.values()):
        return []
    high, low = max(scales, key=lambda band: scales[band]), min(scales, key=lambda band: scales[band])
    ratio = scales[high] / scales[low]
    return [
        f"The magnitudes {high} and {low} disagree with the stellar spectrum by a factor {ratio:.2f} between them: "
        "check them, the temperature and extinction."
    ]


def _shape(star: Star, wavelength_um: Array) -> Array:
    """The spectrum before scaling: at the stellar surface, or as the file has it."""
    if star.spectrum is None:
        ratio = late_type_ratio(wavelength_um, star.temperature_k)
        return blackbody_photons(wavelength_um, star.temperature_k) * ratio
    _check_covered(star.spectrum, float(wavelength_um.min()), float(wavelength_um.max()), "star.spectrum")
    return np.interp(wavelength_um, star.spectrum.wavelength_um, star.spectrum.photons_per_s_m2_um)


def _scale(star: Star, band: str, magnitude: float) -> float:
    grid_um = band_grid_um(band)
    if star.spectrum is not None:
        low, high = band_edges_um(band)
        _check_covered(star.spectrum, low, high, f"star.magnitudes.{band}")
        own_um = star.spectrum.wavelength_um
        grid_um = np.union1d(grid_um, own_um[(own_um > low) & (own_um < high)])
    mean = band_mean(grid_um, _shape(star, grid_um))
    if mean <= 0.0:
        raise ScenarioError(f"star.magnitudes.{band}: expected light in this band to scale, the spectrum has none")
    return catalogue_flux(band, magnitude) / mean


def _check_covered(spectrum: StarSpectrum, low_um: float, high_um: float, field: str) -> None:
    first, last = float(spectrum.wavelength_um[0]), float(spectrum.wavelength_um[-1])
    if low_um < first or high_um > last:
        raise RangeError(
            f"{field}: expected the star's spectrum to cover {low_um:.4g} to {high_um:.4g} um, got {first:.4g} to "
            f"{last:.4g} um; extend the spectrum or leave it out"
        )
