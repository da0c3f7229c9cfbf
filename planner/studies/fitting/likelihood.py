"""The likelihood of a spectrum with independent errors and a level of its own for each detector.

Levels have normal priors about zero and enter the depth linearly, so they are integrated out in closed form: with
``w = sum 1/e^2`` and ``s = sum r/e^2`` over the bins of a detector and the width ``o`` of its level, the residuals lose
``o^2 s^2 / (1 + o^2 w)`` of their chi-squared and the determinant gains a factor ``1 + o^2 w``. (The matrix inversion
lemma for ``diag(e^2) + o^2 1 1'``.)
"""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from math import log, pi

import numpy as np
from numpy.typing import NDArray

__all__ = ["LevelledData"]

Array = NDArray[np.float64]


@dataclass(frozen=True, kw_only=True, eq=False)
class LevelledData:
    """Depths with errors.

    Attributes
    ----------
    depth_ppm, error_ppm : (bin,)
    detector : (bin,) int
        From 0, each with a bin.
    offset_ppm : float
        Prior width of each detector's level; zero where levels are known.
    """

    depth_ppm: Array
    error_ppm: Array
    detector: NDArray[np.int64]
    offset_ppm: float

    def ln_likelihood(self, model_ppm: Array) -> float:
        """ln of the density of the depths for a model ``(bin,)``, levels integrated out."""
        left = (self.depth_ppm - model_ppm) / self.error_ppm
        pulled = self._per_detector(left / self.error_ppm)
        gained = self.offset_ppm**2 * pulled**2 / (1 + self.offset_ppm**2 * self._weight)
        return float(-0.5 * (left @ left - gained.sum()) + self._constant)

    def level(self, model_ppm: Array) -> tuple[Array, Array]:
        """Mean and width of the levels given a model, ``(detector,)``, in ppm."""
        pulled = self._per_detector((self.depth_ppm - model_ppm) / self.error_ppm**2)
        variance = self.offset_ppm**2 / (1 + self.offset_ppm**2 * self._weight)
        return variance * pulled, np.sqrt(variance)

    def ln_densities(self, seen_ppm: Array) -> Array:
        """ln of the density of each depth for spectra with their levels, ``(..., bin)``."""
        left = (self.depth_ppm - seen_ppm) / self.error_ppm
        densities: Array = -0.5 * (left**2 + log(2 * pi)) - np.log(self.error_ppm)
        return densities

    def _per_detector(self, values: Array) -> Array:
        return np.asarray(np.bincount(self.detector, weights=values), dtype=np.float64)

    @cached_property
    def _weight(self) -> Array:
        return self._per_detector(self.error_ppm**-2)

    @cached_property
    def _constant(self) -> float:
        spread = np.log1p(self.offset_ppm**2 * self._weight).sum()
        return float(-np.log(self.error_ppm).sum() - 0.5 * (self.depth_ppm.size * log(2 * pi) + spread))
