"""Catalogue magnitudes as photon fluxes, and the rule by which several of them scale one spectrum."""

from __future__ import annotations

import itertools
from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy.constants import c, h

__all__ = [
    "BANDS",
    "Band",
    "band_edges_um",
    "band_grid_um",
    "band_mean",
    "catalogue_flux",
    "join_scales",
]

Array = NDArray[np.float64]


@dataclass(frozen=True, kw_only=True)
class Band:
    """One photometric band, taken as a box.

    Attributes
    ----------
    centre_um, width_um : float
        Isophotal wavelength and width of the box.
    zero_w_per_m2_um : float
        Flux density of magnitude zero at the isophotal wavelength.
    anchors_um : tuple of float
        The stretch over which this band alone sets the scale of the spectrum (see `join_scales`).
    """

    centre_um: float
    width_um: float
    zero_w_per_m2_um: float
    anchors_um: tuple[float, float]


# J, H, Ks: Cohen, Wheaton & Megeath 2003, AJ 126, 1090, table 2 (values and widths from memory; zero points +/- 2 %).
# W1, W2: Jarrett et al. 2011, ApJ 735, 112, table 1 (from memory; +/- 1.5 %).
# U to I: Bessell, Castelli & Plez 1998, A&A 333, 231, table A2 (from memory); centres and widths from memory.
# Anchors: J below 1.5 um, Ks above 1.8 um, since late-type models err oppositely at the two; the stretches of the
# other bands are a choice of ours: about the band itself.
BANDS: Mapping[str, Band] = {
    "U": Band(centre_um=0.366, width_um=0.065, zero_w_per_m2_um=4.175e-8, anchors_um=(0.34, 0.39)),
    "B": Band(centre_um=0.438, width_um=0.098, zero_w_per_m2_um=6.320e-8, anchors_um=(0.41, 0.46)),
    "V": Band(centre_um=0.545, width_um=0.085, zero_w_per_m2_um=3.631e-8, anchors_um=(0.50, 0.58)),
    "R": Band(centre_um=0.641, width_um=0.158, zero_w_per_m2_um=2.177e-8, anchors_um=(0.61, 0.68)),
    "I": Band(centre_um=0.798, width_um=0.154, zero_w_per_m2_um=1.126e-8, anchors_um=(0.75, 0.88)),
    "J": Band(centre_um=1.235, width_um=0.162, zero_w_per_m2_um=3.129e-9, anchors_um=(1.10, 1.50)),
    "H": Band(centre_um=1.662, width_um=0.251, zero_w_per_m2_um=1.133e-9, anchors_um=(1.60, 1.70)),
    "Ks": Band(centre_um=2.159, width_um=0.262, zero_w_per_m2_um=4.283e-10, anchors_um=(1.80, 2.60)),
    "W1": Band(centre_um=3.353, width_um=0.663, zero_w_per_m2_um=8.179e-11, anchors_um=(3.00, 3.70)),
    "W2": Band(centre_um=4.603, width_um=1.042, zero_w_per_m2_um=2.415e-11, anchors_um=(4.20, 5.20)),
}

_SAMPLES = 201  # over a band; the built-in spectra have no structure finer than a twentieth of one


def catalogue_flux(band: str, magnitude: float) -> float:
    """Photons s-1 m-2 um-1 of a star of this Vega magnitude, at the band's isophotal wavelength."""
    record = BANDS[band]
    photon_energy_j = h * c / (record.centre_um * 1e-6)
    return float(record.zero_w_per_m2_um / photon_energy_j * 10 ** (-0.4 * magnitude))


def band_edges_um(band: str) -> tuple[float, float]:
    """Ends of the box that stands for the band."""
    record = BANDS[band]
    return record.centre_um - record.width_um / 2, record.centre_um + record.width_um / 2


def band_grid_um(band: str) -> Array:
    """Wavelengths over the band at which a smooth spectrum is to be known for `band_mean`, shape ``(sample,)``."""
    return np.linspace(*band_edges_um(band), _SAMPLES)


def band_mean(wavelength_um: Array, photons: Array) -> float:
    """Mean of a spectrum over the whole wavelength array, by the trapezoidal rule; any unit."""
    return float(np.trapezoid(photons, wavelength_um) / (wavelength_um[-1] - wavelength_um[0]))


def join_scales(scales: Mapping[str, float], wavelength_um: Array) -> Array:
    """One scale factor per wavelength out of one per band.

    Each band rules over its own ``anchors_um``, the outermost ones to the end on their side. Between two stretches
    the logarithm of the factor goes from one value to the other as a cubic smooth step in ln(wavelength).

    Parameters
    ----------
    scales : mapping of str to float
        Factor per band, at least one, each > 0.
    wavelength_um : array, any shape
        Wavelengths.

    Returns
    -------
    array of the shape of ``wavelength_um``
    """
    ordered = [(band, scales[band]) for band in BANDS if band in scales]
    factor = np.full(np.shape(wavelength_um), ordered[0][1])
    for (left, left_scale), (right, right_scale) in itertools.pairwise(ordered):
        start, end = BANDS[left].anchors_um[1], BANDS[right].anchors_um[0]
        step = np.clip(np.log(wavelength_um / start) / np.log(end / start), 0.0, 1.0)
        factor = factor * (right_scale / left_scale) ** (step**2 * (3.0 - 2.0 * step))
    return factor
