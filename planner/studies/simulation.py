"""The rates that a plan states, tried on simulated observations of its own searches."""

from __future__ import annotations

from math import ceil

import numpy as np
from numpy.typing import NDArray
from scipy import special

from planner.detection.significance import Measurement, one_sided_probability
from planner.detection.simulate import rate_above, simulated_significances
from planner.detection.trials import local_sigma_needed, upcrossings_of_zero
from planner.instrument.binning import Bins
from planner.studies.results import BandShare, Simulation

__all__ = ["FALSE_ALARM_SIGMA", "sigma_anywhere", "simulate_search"]

Array = NDArray[np.float64]

FALSE_ALARM_SIGMA = 2.0
"""False alarms are counted here: at 5 sigma a few thousand draws would meet none."""
_STEP_SIGMA = 0.25
_TAIL_SIGMA = 4.0
"""Bins in which significances are counted: so wide, and so far beyond the means."""
_PLACES_PER_WIDTH = 4
_FULL_WIDTH = 2.355
"""Full width at half maximum of a Gaussian over its standard deviation."""


def simulate_search(
    measurement: Measurement,
    bins: Bins,
    band: BandShare,
    *,
    transits: int,
    threshold_sigma: float,
    draws: int,
    rng: np.random.Generator,
) -> Simulation:
    """Detections of the gas where it is there, and false alarms where it is not, among simulated observations.

    Parameters
    ----------
    measurement : Measurement
    bins : Bins
        Those of the measurement.
    band : BandShare
        The best band of the search.
    transits : int
        Transits of one observation.
    threshold_sigma : float
        Significance that counts as a detection.
    draws : int
        Observations with the gas, and as many without.
    rng : Generator
    """
    significances = simulated_significances(measurement, transits, draws, rng)
    there = rate_above(significances, threshold_sigma)
    absent = simulated_significances(measurement, transits, draws, rng, amplitude=0.0)
    alarms = rate_above(absent, FALSE_ALARM_SIGMA)
    snr = measurement.snr(transits)
    edges = np.arange(-_TAIL_SIGMA, ceil(snr) + _TAIL_SIGMA + _STEP_SIGMA / 2, _STEP_SIGMA)
    return Simulation(
        transits=transits,
        draws=draws,
        snr_stated=snr,
        power_stated=float(special.ndtr(snr - threshold_sigma)),
        power_found=there.share,
        power_error=there.standard_error,
        false_alarm_sigma=FALSE_ALARM_SIGMA,
        false_alarms_stated=one_sided_probability(FALSE_ALARM_SIGMA),
        false_alarms_found=alarms.share,
        false_alarms_error=alarms.standard_error,
        sigma_anywhere=sigma_anywhere(measurement, bins, band, transits, threshold_sigma),
        sigma_edges=tuple(edges.tolist()),
        counts_there=_counted(significances, edges),
        counts_absent=_counted(absent, edges),
    )


def _counted(significances: Array, edges: Array) -> tuple[int, ...]:
    counts, _ = np.histogram(np.clip(significances, edges[0], edges[-1]), edges)
    return tuple(counts.tolist())


def sigma_anywhere(
    measurement: Measurement, bins: Bins, band: BandShare, transits: float, threshold_sigma: float
) -> float:
    """The local significance that a feature needs when its place in the spectrum was not chosen in advance.

    Features as wide as a band (full width at half maximum, Gaussian in ln(wavelength)) are looked for at every place
    of the bins; the answer counts as ``threshold_sigma`` for the search as a whole.
    """
    centre = np.log(bins.centre_um)
    deviation = max(np.log(band.to_um / band.from_um), float(np.median(bins.width_ln))) / _FULL_WIDTH
    places = np.arange(centre.min(), centre.max() + deviation, deviation / _PLACES_PER_WIDTH)
    bumps = [
        np.where(mine, np.exp(-0.5 * ((centre - place) / deviation) ** 2), 0.0)
        for mine in (bins.detector == detector for detector in np.unique(bins.detector))
        for place in places
        if np.abs(centre[mine] - place).min() <= deviation  # on the detector, and not in a gap
    ]
    return local_sigma_needed(threshold_sigma, upcrossings_of_zero(measurement, transits, np.array(bumps)))
