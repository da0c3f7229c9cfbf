"""What the telescope might see: bins gathered into fewer points, with noise."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from planner.studies.results import BinnedSpectrum

__all__ = ["Points", "simulated_points"]

Array = NDArray[np.float64]


@dataclass(frozen=True, kw_only=True, eq=False)
class Points:
    """Simulated observations, gathered from bins; arrays of shape ``(point,)``."""

    from_um: Array
    to_um: Array
    depth_ppm: Array
    error_ppm: Array


def simulated_points(spectrum: BinnedSpectrum, transits: int, groups: int, rng: np.random.Generator) -> Points:
    """Noisy depths after some transits, bins gathered into about ``groups`` points even in ln(wavelength).

    Bins are weighted by their inverse white variance. The white part falls with the number of transits and of bins;
    the floor falls only with the number of elements of R = 100 that a point spans, for it is common to all bins
    within one. Bins that are not usable are left out, and no point spans two detectors.
    """
    ln_um = np.log(np.sqrt(spectrum.from_um * spectrum.to_um))
    label = np.floor((ln_um - ln_um.min()) / (np.ptp(ln_um) / groups + 1e-12)).astype(int)
    points = []
    for detector in np.unique(spectrum.detector):
        mine = spectrum.usable & (spectrum.detector == detector)
        points += [_one_point(spectrum, mine & (label == g), transits, rng) for g in np.unique(label[mine])]
    columns = np.array(points).reshape(-1, 4).T
    return Points(from_um=columns[0], to_um=columns[1], depth_ppm=columns[2], error_ppm=columns[3])


def _one_point(
    spectrum: BinnedSpectrum, chosen: NDArray[np.bool_], transits: int, rng: np.random.Generator
) -> tuple[float, float, float, float]:
    low, high = spectrum.from_um[chosen], spectrum.to_um[chosen]
    weight = spectrum.noise_one_transit_ppm[chosen] ** -2.0
    white2 = 1 / weight.sum() / transits
    width = np.log(high / low)
    elements = max(1.0, width.sum() / max(0.01, float(width.mean())))
    floor2 = float(np.average(spectrum.floor_ppm[chosen], weights=weight)) ** 2 / elements
    error = float(np.sqrt(white2 + floor2))
    depth = float(np.average(spectrum.depth_ppm[chosen], weights=weight)) + error * rng.standard_normal()
    return float(low.min()), float(high.max()), depth, error
