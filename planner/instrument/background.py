"""Electrons of sky and telescope in each pixel."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from scipy.constants import h

from planner.instrument.modes import AnyDetector, Spectrometer, interpolate

__all__ = ["background_e_per_s", "sky_photons"]

Array = NDArray[np.float64]

_W_PER_M2_HZ_PER_MJY = 1e-20
_SR_PER_ARCSEC2 = (np.pi / 180 / 3600) ** 2


def sky_photons(mjy_per_sr: Array, wavelength_um: Array) -> Array:
    """Surface brightness in photons s-1 m-2 sr-1 um-1: ``B_nu / (h lambda)``."""
    return np.asarray(mjy_per_sr) * _W_PER_M2_HZ_PER_MJY / (h * np.asarray(wavelength_um))


def background_e_per_s(detector: AnyDetector, collecting_area_m2: float, wavelength_um: Array) -> Array:
    """Background in one pixel at the place of each wavelength, electrons s-1, dark current not included.

    A fixed figure, or from the surface brightness: without a slit a pixel sees the sky of the whole throughput
    table; behind a slit of w pixels it sees that of w columns around its own wavelength. A photometer sees the
    whole table too.

    Parameters
    ----------
    detector : Spectrometer or Photometer
    collecting_area_m2 : float
    wavelength_um : array, any shape

    Returns
    -------
    array of the shape of ``wavelength_um``
    """
    if detector.background_e_per_s is not None:
        return np.full(np.shape(wavelength_um), detector.background_e_per_s)
    assert detector.pixel_scale_arcsec is not None  # checked where the record is made
    pixel_m2_sr = collecting_area_m2 * detector.pixel_scale_arcsec**2 * _SR_PER_ARCSEC2
    if isinstance(detector, Spectrometer) and detector.slit_width_arcsec is not None:
        columns = detector.slit_width_arcsec / detector.pixel_scale_arcsec
        seen_um = columns * interpolate(detector.nm_per_pixel, wavelength_um) * 1e-3
        return pixel_m2_sr * seen_um * _sky_electrons(detector, wavelength_um)
    grid_um = np.linspace(detector.throughput[0][0], detector.throughput[-1][0], 2001)
    whole = pixel_m2_sr * np.trapezoid(_sky_electrons(detector, grid_um), grid_um)
    return np.full(np.shape(wavelength_um), whole)


def _sky_electrons(detector: AnyDetector, wavelength_um: Array) -> Array:
    """Electrons s-1 m-2 sr-1 um-1."""
    assert detector.background_mjy_per_sr is not None
    brightness = interpolate(detector.background_mjy_per_sr, wavelength_um)
    return sky_photons(brightness, wavelength_um) * interpolate(detector.throughput, wavelength_um)
