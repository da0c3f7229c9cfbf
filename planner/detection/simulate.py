"""Injection and recovery: the statement of a matched filter tried on simulated observations.

An observation of N transits is drawn as the template times an amplitude, every nuisance at a random draw from its
prior, white noise over the root of N, and the floor with its covariance. The filter is the one whose significance
`planner.detection.significance` states; here it is worked out by another route (one dense covariance, whitened by its
Cholesky factor), so that agreement tells something.
"""

from __future__ import annotations

from dataclasses import dataclass
from math import sqrt

import numpy as np
from numpy.typing import NDArray
from scipy import linalg

from planner.detection.significance import Measurement

__all__ = ["Rate", "matched_filter", "rate_above", "simulated_significances"]

Array = NDArray[np.float64]

_AT_ONCE = 10_000
"""Draws held in memory at one time."""


@dataclass(frozen=True, kw_only=True)
class Rate:
    """How many of some draws passed."""

    passed: int
    draws: int

    @property
    def share(self) -> float:
        """The passed draws over all, 0 to 1."""
        return self.passed / self.draws

    @property
    def standard_error(self) -> float:
        """Binomial standard error of the share; for none or all passed, that of one more or one less."""
        share = min(max(self.share, 1 / self.draws), 1 - 1 / self.draws)
        return sqrt(share * (1 - share) / self.draws)

    def errors_from(self, probability: float) -> float:
        """Distance from the rate that a probability leads one to expect, in standard errors of that expectation."""
        return (self.share - probability) / sqrt(probability * (1 - probability) / self.draws)


def matched_filter(measurement: Measurement, transits: float) -> Array:
    """Weights ``K^-1 t / sqrt(t' K^-1 t)`` whose sum over observed depths is the significance, ``(bin,)`` per ppm.

    With ``K = C_N + B B'`` of `planner.detection.significance` the sum has unit width when the nuisances follow their
    priors, and the mean ``S/N(N)`` where the template is there. An empty template has weights of zero.

    ``(1 + b b')^-1 t = t - b c`` with the ``c`` that minimises ``|t - b c|^2 + |c|^2`` in whitened bins: accurate also
    when the nuisances are much wider than the noise.
    """
    if not measurement.template_ppm.any():
        return np.zeros_like(measurement.template_ppm)
    covariance = measurement.floor_ppm2 + np.diag(measurement.white_ppm**2) / transits
    factor = linalg.cholesky(covariance, lower=True)
    template = linalg.solve_triangular(factor, measurement.template_ppm, lower=True)
    directions = linalg.solve_triangular(factor, measurement.directions_ppm.T, lower=True)
    count = len(measurement.nuisances)
    design = np.vstack([directions, np.eye(count)])
    target = np.concatenate([template, np.zeros(count)])
    amounts = linalg.lstsq(design, target)[0] if count else np.zeros(0)
    left = target - design @ amounts
    weights = linalg.solve_triangular(factor, left[: template.size], lower=True, trans="T")
    return np.asarray(weights / linalg.norm(left))


def simulated_significances(
    measurement: Measurement,
    transits: float,
    draws: int,
    rng: np.random.Generator,
    *,
    amplitude: float = 1.0,
    imitations_ppm: Array | None = None,
) -> Array:
    """What the filter finds in simulated observations, in sigma, shape ``(draw,)``.

    Parameters
    ----------
    measurement : Measurement
    transits : float
        Transits of one observation.
    draws : int
        Number of observations.
    rng : Generator
    amplitude : float
        Of the template in the observations: 1 as assumed, 0 for air without the gas.
    imitations_ppm : (imitation, bin), optional
        Depth changes made by nuisances, such as a forward model gives far from where it is linear. One is picked for
        each draw in place of the linear directions.
    """
    weights = matched_filter(measurement, transits)
    root = _root(measurement.floor_ppm2)
    found = [
        _observed(measurement, root, transits, count, rng, amplitude, imitations_ppm) @ weights
        for count in np.diff([*range(0, draws, _AT_ONCE), draws]).tolist()
    ]
    return np.concatenate(found)


def rate_above(significances: Array, threshold_sigma: float) -> Rate:
    """The draws that reach a threshold."""
    return Rate(passed=int(np.count_nonzero(significances >= threshold_sigma)), draws=significances.size)


def _observed(
    measurement: Measurement,
    root: Array,
    transits: float,
    draws: int,
    rng: np.random.Generator,
    amplitude: float,
    imitations_ppm: Array | None,
) -> Array:
    """Depths of some observations less the model without the gas, ``(draw, bin)``."""
    bins = measurement.template_ppm.size
    white = rng.standard_normal((draws, bins)) * (measurement.white_ppm / sqrt(transits))
    floor = rng.standard_normal((draws, bins)) @ root.T
    if imitations_ppm is None:
        moved = rng.standard_normal((draws, len(measurement.nuisances))) @ measurement.directions_ppm
    else:
        moved = imitations_ppm[rng.integers(imitations_ppm.shape[0], size=draws)]
    return np.asarray(amplitude * measurement.template_ppm + moved + white + floor)


def _root(covariance: Array) -> Array:
    """A matrix whose product with its transpose is the covariance, also where that is singular."""
    variances, vectors = linalg.eigh(covariance)
    return np.asarray(vectors * np.sqrt(np.maximum(variances, 0.0)))
