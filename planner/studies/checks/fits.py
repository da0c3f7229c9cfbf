"""Fits of shapes to a spectrum, with everything else that is unknown marginalised."""

from __future__ import annotations

from collections.abc import Sequence
from math import sqrt

import numpy as np
from numpy.typing import NDArray
from scipy import linalg, optimize

__all__ = ["Fits"]

Array = NDArray[np.float64]


class Fits:
    """Least squares against ``C + B B'``, the noise with all nuisances marginalised.

    Parameters
    ----------
    depth_ppm : (bin,)
        What is fitted, less the model without the shapes.
    error_ppm : (bin,)
    directions_ppm : (nuisance, bin)
        Depth change for one prior width of each.
    """

    def __init__(self, depth_ppm: Array, error_ppm: Array, directions_ppm: Array) -> None:
        # (1 + S S')^-1/2 = 1 + U (1 / sqrt(1 + d^2) - 1) U' with S = U d V': accurate for nuisances of any width
        self._vectors, sizes, _ = linalg.svd((directions_ppm / error_ppm).T, full_matrices=False)
        self._shrink = 1 / np.sqrt(1 + sizes**2) - 1
        self._error = error_ppm
        self._depth = self._white(depth_ppm)

    @property
    def empty_chi2(self) -> float:
        """Of no shape at all."""
        return float(self._depth @ self._depth)

    def chi2(self, shapes_ppm: Sequence[Array]) -> float:
        """Least chi-squared of shapes in amounts of zero or more."""
        return float(self._solve(shapes_ppm)[1] ** 2)

    def amounts(self, shapes_ppm: Sequence[Array]) -> Array:
        """Amounts, zero or more, at the least chi-squared."""
        return np.asarray(self._solve(shapes_ppm)[0])

    def sigma(self, shapes_ppm: Sequence[Array]) -> float:
        """Root of what shapes improve chi-squared by: their significance, as one, over their absence."""
        return sqrt(max(0.0, self.empty_chi2 - self.chi2(shapes_ppm)))

    def beyond(self, shape_ppm: Array, others_ppm: Sequence[Array]) -> float:
        """Root of how much better a shape fits than others do; 0 where they do as well or better."""
        return sqrt(max(0.0, self.chi2(others_ppm) - self.chi2([shape_ppm])))

    def amplitude(self, shape_ppm: Array) -> tuple[float, float]:
        """Amount of one shape, of either sign, and its error."""
        white = self._white(shape_ppm)
        norm = float(white @ white)
        return (float(white @ self._depth) / norm, 1 / sqrt(norm)) if norm > 0 else (0.0, np.inf)

    def _white(self, values_ppm: Array) -> Array:
        scaled = values_ppm / self._error
        return np.asarray(scaled + self._vectors @ (self._shrink * (self._vectors.T @ scaled)))

    def _solve(self, shapes_ppm: Sequence[Array]) -> tuple[Array, float]:
        columns = np.array([self._white(shape) for shape in shapes_ppm]).T
        amounts, rest = optimize.nnls(columns, self._depth)
        return amounts, float(rest)
