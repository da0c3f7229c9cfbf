"""The transit depth once more, slow and plain: what `planner.atmosphere.transmission` is checked against.

Fine even layers, trapezoids, double precision, one model after another for every share and slope; between tabulated
pressures the logarithm of the cross-section goes straight. Only `Air` and the records are shared with the version
that ships.
"""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from planner.atmosphere.absorbers import GasOpacity, PairOpacity
from planner.atmosphere.layers import Air
from planner.atmosphere.transmission import TransitDepth

__all__ = ["reference_transit_depth"]

_STEP = 0.02
_LAYERS = 32.0
_SMALL = 1e-3


def reference_transit_depth(
    air: Air,
    gases: Sequence[GasOpacity],
    pairs: Sequence[PairOpacity],
    *,
    wavenumber_per_cm: NDArray[np.float64],
    star_radius_km: float,
    shares_of: Sequence[str] = (),
) -> TransitDepth:
    """As `planner.atmosphere.transmission.transit_depth`, for air with a surface; minutes for thousands of points.

    The derivative is the central difference over a change of 0.1 % in the mixing ratio, everything else held.
    """
    if not air.surface:
        raise NotImplementedError("the reference wants air that ends at its base")
    bottom = 0.0 if air.critical_radius_km is None else max(0.0, air.e_folds_at_radius(air.critical_radius_km))
    parts = [(1.0, bottom)]
    if air.cloud_top_bar is not None:
        deck = max(bottom, air.e_folds_at_pressure(air.cloud_top_bar))
        parts = [(1 - air.cloud_fraction, bottom), (air.cloud_fraction, deck)]
    discs = [(share, _Disc(air, e_folds)) for share, e_folds in parts if share > 0]

    def depth(amounts: dict[str, float]) -> NDArray[np.float64]:
        areas = [s * disc.area_km2(amounts, gases, pairs, wavenumber_per_cm) for s, disc in discs]
        return np.sum(areas, axis=0) / star_radius_km**2

    ratios = dict(air.mixing_ratios)
    slope = {}
    for formula in shares_of:
        more, less = (depth(ratios | {formula: ratios[formula] * (1 + d)}) for d in (_SMALL, -_SMALL))
        slope[formula] = (more - less) / (2 * _SMALL)
    lowest = discs[0][1].slant_depth(ratios, gases, pairs, wavenumber_per_cm)[0]
    return TransitDepth(
        depth=depth(ratios),
        depth_without={formula: depth(ratios | {formula: 0.0}) for formula in shares_of},
        derivative=slope,
        bottom_transmission=np.exp(-lowest),
    )


class _Disc:
    """Layers above a height (in e-folds above the base) below which all is opaque."""

    def __init__(self, air: Air, bottom: float) -> None:
        self.air = air
        self.u = np.arange(bottom, bottom + _LAYERS, _STEP)
        self.r = air.radius_km(self.u)
        # trapezoids along the path from each tangent layer (row) outwards
        x_cm = 1e5 * np.sqrt(np.maximum(self.r**2 - self.r[:, None] ** 2, 0.0))
        pieces = np.diff(x_cm, axis=1)
        self.path_cm = np.zeros_like(x_cm)
        self.path_cm[:, :-1] += pieces
        self.path_cm[:, 1:] += pieces

    def slant_depth(
        self,
        amounts: dict[str, float],
        gases: Sequence[GasOpacity],
        pairs: Sequence[PairOpacity],
        wavenumber_per_cm: NDArray[np.float64],
    ) -> NDArray[np.float64]:
        """Optical depth of the chord through each layer, ``(layer, wavenumber)``."""
        return self.path_cm @ _absorption_per_cm(self.air, amounts, gases, pairs, wavenumber_per_cm, self.u)

    def area_km2(
        self,
        amounts: dict[str, float],
        gases: Sequence[GasOpacity],
        pairs: Sequence[PairOpacity],
        wavenumber_per_cm: NDArray[np.float64],
    ) -> NDArray[np.float64]:
        """Effective area over pi, ``(wavenumber,)``."""
        absorbed = -np.expm1(-self.slant_depth(amounts, gases, pairs, wavenumber_per_cm))
        return self.r[0] ** 2 + np.trapezoid(2 * self.r[:, None] * absorbed, self.r, axis=0)


def _absorption_per_cm(
    air: Air,
    amounts: dict[str, float],
    gases: Sequence[GasOpacity],
    pairs: Sequence[PairOpacity],
    wavenumber_per_cm: NDArray[np.float64],
    u: NDArray[np.float64],
) -> NDArray[np.float64]:
    """Absorption coefficient of everything, ``(layer, wavenumber)``."""
    n = air.base_density_per_cm3 * np.exp(-u)[:, None]
    total = n * air.haze_cross_section_cm2(wavenumber_per_cm)
    ln_p = np.log(air.base_pressure_bar) - u
    for gas in gases:
        if gas.flat_cross_section_cm2 is not None:
            total = total + n * amounts[gas.formula] * gas.flat_cross_section_cm2
        if gas.log10_cross_section is not None:
            table = gas.log10_cross_section.astype(np.float64)
            rows = np.log(gas.pressures_bar)
            log10 = np.stack([np.interp(ln_p, rows, column) for column in table.T], axis=1)
            total = total + n * amounts[gas.formula] * 10.0**log10
    for pair in pairs:
        for partner in amounts:
            if pair.second == partner or (pair.second == "*" and partner != pair.first):
                total = total + n**2 * amounts.get(pair.first, 0.0) * amounts[partner] * pair.coefficient_cm5
    return total
