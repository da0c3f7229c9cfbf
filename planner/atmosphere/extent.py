"""Where the column that the rays are sent through begins and ends, in e-folds of pressure above the base."""

from __future__ import annotations

import math
from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from planner.atmosphere.absorbers import GasOpacity
from planner.atmosphere.layers import HIGHEST_TOP, Air
from planner.errors import RangeError

__all__ = ["bottom_e_folds", "top_e_folds"]

_BOTTOM_WITHOUT_TABLES_BAR = 10.0
_THIN = 1e-3
_MOST_E_FOLDS = 100.0


def bottom_e_folds(air: Air, gases: Sequence[GasOpacity]) -> float:
    """Lower end: the surface, the refraction boundary, a closed cloud deck, or where the tables end.

    Raises
    ------
    RangeError
        If a table ends above that.
    """
    reach_bar = {gas.formula: float(gas.pressures_bar[-1]) for gas in gases if gas.log10_cross_section is not None}
    bottom = 0.0
    if not air.surface:
        deepest = min(reach_bar.values(), default=_BOTTOM_WITHOUT_TABLES_BAR)
        bottom = min(0.0, air.e_folds_at_pressure(deepest))
    if air.critical_radius_km is not None:
        bottom = max(bottom, air.e_folds_at_radius(air.critical_radius_km))
    if air.cloud_top_bar is not None and air.cloud_fraction == 1:
        bottom = max(bottom, air.e_folds_at_pressure(air.cloud_top_bar))
    needed_bar = air.base_pressure_bar * math.exp(-bottom)
    for formula, highest_bar in reach_bar.items():
        if highest_bar < needed_bar * (1 - 1e-6):
            raise RangeError(
                f"cross-sections of {formula}: expected pressures up to {needed_bar:.4g} bar, where the column ends, "
                f"got a table up to {highest_bar:.4g} bar; compute the table to that pressure"
            )
    return bottom


def top_e_folds(
    air: Air,
    gases: Sequence[GasOpacity],
    *,
    bottom: float,
    flat_cross_section_cm2: float,
    pair_coefficient_cm5: float,
) -> float:
    """Upper end: above it the chord optical depth stays below 1e-3 at every wavenumber.

    An upper bound, and cheap: the largest cross-section that each table holds at that pressure or a lower one, added
    up, plus the largest pressure-independent cross-section and pair coefficient (of the mixture, per molecule of
    air), along a chord of ``sqrt(2 pi r H)``.

    Raises
    ------
    RangeError
        If that happens nowhere below four times the base radius.
    """
    air.check_held(bottom)
    ceiling = max(min(HIGHEST_TOP * air.e_folds_to_infinity, _MOST_E_FOLDS), bottom)
    u = np.linspace(bottom, ceiling, 2 + math.ceil(4 * (ceiling - bottom)))
    density = air.base_density_per_cm3 * np.exp(-u)
    opacity = flat_cross_section_cm2 + density * pair_coefficient_cm5
    for gas in gases:
        if gas.log10_cross_section is not None and air.mixing_ratios[gas.formula] > 0:
            opacity += air.mixing_ratios[gas.formula] * _largest(gas, air.base_pressure_bar * np.exp(-u))
    path_cm = np.sqrt(2 * np.pi * air.scale_height_km * air.radius_km(u) ** 3) / air.base_radius_km * 1e5
    thick = np.flatnonzero(density * path_cm * opacity > _THIN)
    if thick.size and thick[-1] == u.size - 1:
        air.check_held(math.inf)
    return float(u[thick[-1] + 1]) if thick.size else bottom


def _largest(gas: GasOpacity, pressure_bar: NDArray[np.float64]) -> NDArray[np.float64]:
    """Bound on a table's cross-section over all wavenumbers, at each pressure and below it."""
    assert gas.log10_cross_section is not None
    peaks = 10.0 ** np.maximum.accumulate(gas.log10_cross_section.max(axis=1).astype(np.float64))
    if not np.all(np.isfinite(peaks)):
        raise ValueError(f"GasOpacity {gas.formula}: expected numbers in the table, got values that are none")
    row_above = np.searchsorted(gas.pressures_bar, pressure_bar).clip(max=peaks.size - 1)
    return peaks[row_above]
