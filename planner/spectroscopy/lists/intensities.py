"""What the generators share about intensities: their temperature, and the Einstein coefficients behind them."""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.spectroscopy.molecules import isotopologue_abundance, partition_sum

__all__ = [
    "C2_CM_K",
    "REFERENCE_TEMPERATURE_K",
    "einstein_a_per_s",
    "relative_intensity",
    "whole_band_cut_cm",
    "worth_keeping",
]

Floats = NDArray[np.float64]

C2_CM_K = 1.438776877
"""Second radiation constant, CODATA 2018."""

LIGHT_CM_PER_S = 2.99792458e10
REFERENCE_TEMPERATURE_K = 296.0
_HOTTEST_K = 600.0
_WHOLE = 0.993
"""Of a band's sum this much is kept where half of it lies above the cut."""


def relative_intensity(
    wavenumber_per_cm: Any, lower_energy_per_cm: Any, temperature_k: float = REFERENCE_TEMPERATURE_K
) -> Floats:
    """``nu exp(-c2 E"/T) (1 - exp(-c2 nu/T))``, to which intensities of one isotopologue are proportional."""
    scale = C2_CM_K / temperature_k
    net = -np.expm1(-scale * np.asarray(wavenumber_per_cm))
    population = np.exp(-scale * np.asarray(lower_energy_per_cm))
    return np.asarray(wavenumber_per_cm * population * net, dtype=np.float64)


def worth_keeping(
    hitran_number: int,
    isotopologue: int,
    wavenumber_per_cm: Any,
    intensity_cm: Any,
    lower_energy_per_cm: Any,
    weakest_cm: float,
) -> NDArray[np.bool_]:
    """Lines whose intensity reaches ``weakest_cm`` at 296 K or at 600 K, shape ``(line,)``.

    A cut at 296 K alone would thin out the hot bands that matter in warm atmospheres.
    """
    cold, hot = (
        relative_intensity(wavenumber_per_cm, lower_energy_per_cm, temperature_k)
        / partition_sum(hitran_number, isotopologue, temperature_k)
        for temperature_k in (REFERENCE_TEMPERATURE_K, _HOTTEST_K)
    )
    return np.asarray((intensity_cm > 0.0) & (intensity_cm * np.maximum(1.0, hot / cold) >= weakest_cm))


def whole_band_cut_cm(intensity_cm: NDArray[np.float64], kept: NDArray[np.bool_]) -> float:
    """The weakest line that a band needs, so that a list's cut does not maim it; infinite if it needs no more.

    Given all lines of the band and which of them the cut keeps. A band that is kept for the most part keeps its sum
    within a per cent; one that lies below the cut for the most part is left with its few strong lines.
    """
    whole, remaining = float(intensity_cm.sum()), float(intensity_cm[kept].sum())
    if remaining >= _WHOLE * whole or remaining < 0.5 * whole:
        return float("inf")
    ranked = np.sort(intensity_cm, axis=None)[::-1]
    return float(ranked[np.searchsorted(np.cumsum(ranked), _WHOLE * whole)])


def einstein_a_per_s(
    hitran_number: int,
    isotopologue: int,
    wavenumber_per_cm: Any,
    intensity_cm: Any,
    lower_energy_per_cm: Any,
    upper_weight: Any,
) -> Floats:
    """Einstein A coefficients of lines of one isotopologue, shape ``(line,)``.

    ``A = 8 pi c nu**2 Q S / (I g' exp(-c2 E"/T) (1 - exp(-c2 nu/T)))`` at 296 K with the isotopic abundance I, the
    partition sum Q and the statistical weight g' of the upper level (Simeckova et al. 2006, JQSRT 98, 130, eq. 20).
    """
    abundance = isotopologue_abundance(hitran_number, isotopologue)
    partition = partition_sum(hitran_number, isotopologue, REFERENCE_TEMPERATURE_K)
    absorbed = relative_intensity(wavenumber_per_cm, lower_energy_per_cm)
    rate = 8.0 * np.pi * LIGHT_CM_PER_S * np.asarray(wavenumber_per_cm) ** 3 * np.asarray(intensity_cm) * partition
    return np.asarray(rate / (abundance * absorbed * np.asarray(upper_weight)), dtype=np.float64)
