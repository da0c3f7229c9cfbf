"""The error that does not average down, as a covariance between bins."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from planner.instrument.binning import Bins
from planner.instrument.modes import Floor, Mode, Photometer

__all__ = ["floor_covariance"]

Array = NDArray[np.float64]


def floor_covariance(mode: Mode, bins: Bins) -> Array:
    """Covariance of the floor between bins, ppm^2, shape ``(bin, bin)``.

    "10 ppm" says nothing without the width of the bin it holds for: were it 10 ppm for every bin whatever its
    width, cutting a band into four bins would halve the floor on it. The floor is therefore a random function of
    ln(wavelength), and a bin gets its mean over the bin. The function is scaled so that a bin of width
    ``1 / R_ref`` has exactly ``depth_ppm``.

    Without a correlation length the function is white, so that a bin of width w has the variance
    ``depth^2 / (R_ref w)`` and bins are independent. A narrower bin has more than the quoted floor, a wider one
    less; the sum of information over a band is then the same in any binning that resolves the band.

    With a correlation length L the kernel is ``exp(-|distance| / L)``, averaged exactly over both bins. It tends
    to the white one as L goes to 0, and to one common offset per detector as L grows.

    Detectors are independent of each other, also where their ranges overlap. A photometer is one element, however
    wide: its floor is ``depth_ppm`` itself.

    Both the whiteness beyond one element and the independence of detectors are assumptions of ours; no published
    measurement settles them.
    """
    same_detector = bins.detector[:, None] == bins.detector[None, :]
    covariance = np.where(same_detector, mode.floor.depth_ppm**2 * _normalised(mode.floor, bins), 0.0)
    photometers = [index for index, d in enumerate(mode.detectors) if isinstance(d, Photometer)]
    single = np.isin(bins.detector, photometers)
    covariance[single, single] = mode.floor.depth_ppm**2
    return covariance


def _normalised(floor: Floor, bins: Bins) -> Array:
    """Covariance for a floor of 1, as if all bins were of one detector."""
    if floor.correlation_length is None:
        return np.diag(1.0 / (floor.resolving_power * bins.width_ln))
    start, width = np.log(bins.from_um), bins.width_ln
    reference = _mean_kernel(np.zeros(1), np.array([1.0 / floor.resolving_power]), floor.correlation_length)
    return _mean_kernel(start, width, floor.correlation_length) / reference


def _mean_kernel(start: Array, width: Array, length: float) -> Array:
    """``exp(-|u - v| / length)`` averaged over u in one bin and v in another, shape ``(bin, bin)``.

    For bins apart by a gap g: ``exp(-g/L) a_i a_j`` with ``a = (1 - exp(-w/L)) L / w``; for a bin with itself
    ``2 (L/w) (1 - a)``.
    """
    mean_from_edge = -np.expm1(-width / length) * length / width
    gap = np.abs(start[:, None] - start[None, :]) - np.where(start[:, None] < start[None, :], width[:, None], width)
    kernel = np.exp(-np.maximum(gap, 0.0) / length) * np.outer(mean_from_edge, mean_from_edge)
    np.fill_diagonal(kernel, 2 * length / width * (1 - mean_from_edge))
    return kernel
