"""The forward model of a scenario: from its air, changed or not, to transit depth on the grid."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from planner.atmosphere.layers import Air
from planner.atmosphere.refraction import refraction_boundary
from planner.atmosphere.transmission import GasOpacity, PairOpacity, TransitDepth, transit_depth
from planner.scenario.records import Case, Scenario
from planner.spectroscopy.opacity import Opacities

__all__ = ["NO_CHANGE", "Change", "ForwardModel"]

Array = NDArray[np.float64]


@dataclass(frozen=True, kw_only=True)
class Change:
    """What differs from the scenario: factors on its numbers, and gases added."""

    temperature: float = 1.0
    radius: float = 1.0
    gravity: float = 1.0
    molar_mass: float = 1.0
    cloud_top_bar: float | None = None
    """A deck over the whole limb, in place of the scenario's sky."""
    cloud_top: float = 1.0
    haze_factor: float | None = None
    added: tuple[tuple[str, float], ...] = ()
    """Trace gases (formula, mixing ratio) on top of the air; pressure and molar mass stay."""


NO_CHANGE = Change()


class ForwardModel:
    """Transit depths of a scenario's planet.

    Parameters
    ----------
    scenario : Scenario
    opacities : Opacities
        On the grid of the modes.
    """

    def __init__(self, scenario: Scenario, opacities: Opacities) -> None:
        self.scenario = scenario
        self.opacities = opacities

    def air(self, case: Case, change: Change = NO_CHANGE) -> Air:
        """The column of air of one case."""
        scenario, atmosphere = self.scenario, self.scenario.atmosphere
        ratios = scenario.air(case)
        total = 1.0 + sum(ratio for _, ratio in change.added)
        ratios = {gas: ratio / total for gas, ratio in [*ratios.items(), *change.added]}
        cloud, haze = atmosphere.cloud, atmosphere.haze
        top_bar = change.cloud_top_bar
        if top_bar is None and cloud is not None:
            top_bar = cloud.top_bar * change.cloud_top
        own_haze = haze.factor if haze is not None else 0.0
        air = Air(
            temperature_k=atmosphere.temperature_k * change.temperature,
            base_pressure_bar=atmosphere.pressure_bar,
            base_radius_km=scenario.planet.radius_m * 1e-3 * change.radius,
            base_gravity_m_per_s2=scenario.planet.gravity_m_per_s2 * change.gravity,
            mixing_ratios=ratios,
            molar_mass_g=scenario.molar_mass_g(case) * change.molar_mass,
            surface=atmosphere.surface,
            cloud_top_bar=top_bar,
            cloud_fraction=cloud.covered_fraction if cloud is not None and change.cloud_top_bar is None else 1.0,
            haze_factor=own_haze if change.haze_factor is None else change.haze_factor,
            haze_slope=-haze.wavelength_slope if haze is not None else 4.0,
        )
        if not atmosphere.refraction:
            return air
        boundary = refraction_boundary(
            air, star_radius_km=scenario.star.radius_m * 1e-3, orbital_distance_km=scenario.orbital_distance_m * 1e-3
        )
        return replace(air, critical_radius_km=boundary)

    def depth(
        self,
        case: Case,
        change: Change = NO_CHANGE,
        *,
        shares_of: Sequence[str] = (),
        transparent: Sequence[str] = (),
        stride: int = 1,
    ) -> TransitDepth:
        """Transit depth of one case on every ``stride``-th sample of the grid, some gases made transparent."""
        air = self.air(case, change)
        gases, pairs = self._opacities(air, stride)
        gases = [gas for gas in gases if gas.formula not in transparent]
        pairs = [pair for pair in pairs if pair.first not in transparent and pair.second not in transparent]
        return transit_depth(
            air,
            gases,
            pairs,
            wavenumber_per_cm=self.opacities.grid.wavenumber_per_cm[::stride],
            star_radius_km=self.scenario.star.radius_m * 1e-3,
            shares_of=shares_of,
        )

    def _opacities(self, air: Air, stride: int) -> tuple[list[GasOpacity], list[PairOpacity]]:
        ratios: Mapping[str, float] = air.mixing_ratios
        gases = [self.opacities.gas(gas, air.temperature_k, ratio) for gas, ratio in ratios.items()]
        pairs = self.opacities.pairs(list(ratios), air.temperature_k)
        if stride == 1:
            return gases, pairs
        thin = [
            replace(
                gas,
                log10_cross_section=None if gas.log10_cross_section is None else gas.log10_cross_section[:, ::stride],
                flat_cross_section_cm2=(
                    None if gas.flat_cross_section_cm2 is None else gas.flat_cross_section_cm2[::stride]
                ),
            )
            for gas in gases
        ]
        return thin, [replace(pair, coefficient_cm5=pair.coefficient_cm5[::stride]) for pair in pairs]
