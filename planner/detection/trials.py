"""Looking in many places: what a local significance is worth when the place was not chosen in advance.

Significances are one-sided throughout; where a published formula is for the square of a significance, that is said.
"""

from __future__ import annotations

from dataclasses import replace
from math import exp, expm1, log, log1p, pi

import numpy as np
from numpy.typing import NDArray
from scipy import linalg, optimize

from planner.detection.significance import Measurement, one_sided_probability
from planner.detection.simulate import matched_filter

__all__ = [
    "any_of_independent",
    "local_sigma_needed",
    "scan_probability",
    "upcrossing_bound",
    "upcrossings_of_zero",
]

Array = NDArray[np.float64]


def any_of_independent(probability: float, trials: float) -> float:
    """Chance that at least one of some independent trials passes, ``1 - (1 - p)^n``, for ``p`` below 1."""
    return -expm1(trials * log1p(-probability))


def upcrossing_bound(
    statistic: float, *, local_probability: float, upcrossings: float, reference: float, degrees_of_freedom: int = 1
) -> float:
    """Bound on the chance that a chi-squared statistic exceeds a value anywhere along a continuous search.

    ``P(local) + <N(c0)> (c/c0)^((s-1)/2) exp(-(c - c0)/2)``: Gross & Vitells 2010, Eur. Phys. J. C 70, 525
    (equation 3, number from memory). At most 1.

    Parameters
    ----------
    statistic : float
        ``c``, such as the square of a significance.
    local_probability : float
        Of exceeding it in one place.
    upcrossings : float
        Mean number of upcrossings of ``reference`` by noise alone, over the whole search.
    reference : float
        ``c0``, > 0 (or 0 with one degree of freedom).
    degrees_of_freedom : int
        ``s``.
    """
    growth = (statistic / reference) ** ((degrees_of_freedom - 1) / 2) if degrees_of_freedom != 1 else 1.0
    return min(1.0, local_probability + upcrossings * growth * exp(-(statistic - reference) / 2))


def scan_probability(sigma: float, upcrossings_of_zero: float) -> float:
    """Bound on the chance that noise reaches a significance anywhere along a scan.

    As `upcrossing_bound` with one degree of freedom and only upward excursions counted, the reference being zero,
    which noise crosses most often.
    """
    return upcrossing_bound(
        sigma**2, local_probability=one_sided_probability(sigma), upcrossings=upcrossings_of_zero, reference=0.0
    )


def local_sigma_needed(sigma: float, upcrossings_of_zero: float) -> float:
    """The local significance along a scan that counts as ``sigma`` for the scan as a whole."""
    wanted = log(one_sided_probability(sigma))

    def excess(local: float) -> float:
        return log(scan_probability(local, upcrossings_of_zero)) - wanted

    return float(optimize.brentq(excess, sigma, sigma + 10.0))


def upcrossings_of_zero(measurement: Measurement, transits: float, templates_ppm: Array) -> float:
    """Mean number of times that noise lifts the significance through zero along a row of templates.

    Two neighbours whose significances correlate by rho differ in sign that way with the chance ``arccos(rho) / 2 pi``
    (Sheppard 1899, from memory). The nuisances of the measurement are marginalised in every place.

    Parameters
    ----------
    measurement : Measurement
        Its own template plays no part.
    templates_ppm : (place, bin)
        In the order of the scan, dense enough for neighbours to be alike.
    """
    filters = np.array([_filter(measurement, transits, template) for template in templates_ppm])
    root = _covariance_root(measurement, transits)
    found = filters @ root  # unit vectors: what noise makes of each significance
    correlation = np.clip(np.sum(found[1:] * found[:-1], axis=1), -1.0, 1.0)
    return float(np.arccos(correlation).sum() / (2 * pi))


def _filter(measurement: Measurement, transits: float, template_ppm: Array) -> Array:
    return matched_filter(replace(measurement, template_ppm=template_ppm), transits)


def _covariance_root(measurement: Measurement, transits: float) -> Array:
    """Noise and nuisances as independent unit sources, ``(bin, source)``."""
    covariance = measurement.floor_ppm2 + np.diag(measurement.white_ppm**2) / transits
    return np.hstack([linalg.cholesky(covariance, lower=True), measurement.directions_ppm.T])
