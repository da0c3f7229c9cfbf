"""The forward model of a scenario: from its air, changed or not, to transit depth in the bins of its modes."""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from planner.atmosphere.layers import Air
from planner.atmosphere.refraction import refraction_boundary
from planner.atmosphere.transmission import TransitDepth, transit_depth
from planner.pool import Progress
from planner.scenario.records import Case, Scenario
from planner.spectroscopy.grid import LogGrid
from planner.spectroscopy.opacity import Opacities
from planner.spectroscopy.sources import LineLibrary
from planner.spectroscopy.store import Store

__all__ = ["NO_CHANGE", "BinnedDepth", "Change", "ForwardModel", "opacities_of"]

Array = NDArray[np.float64]

_PPM = 1e6


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


@dataclass(frozen=True, kw_only=True, eq=False)
class BinnedDepth:
    """Transit depth in the bins of one mode, in ppm; all arrays ``(bin,)``.

    Shares (depth with a gas less depth without its absorption) and slopes (change of depth per unit of ln(mixing
    ratio)) are zero where the gas's data do not cover.
    """

    depth_ppm: Array
    shares_ppm: Mapping[str, Array]
    slopes_ppm: Mapping[str, Array]


def opacities_of(
    scenario: Scenario, library: LineLibrary, store: Store, grid: LogGrid, progress: Progress | None = None
) -> Opacities:
    """The opacities that a scenario asks for, on a grid."""
    atmosphere = scenario.atmosphere
    return Opacities(
        library,
        store,
        grid,
        air=scenario.air(),
        highest_bar=atmosphere.pressure_bar,
        wing_per_cm=atmosphere.line_wing_per_cm,
        water_continuum=atmosphere.water_continuum,
        progress=progress,
    )


class ForwardModel:
    """Transit depths of a scenario's planet in the bins of its modes, from one set of samples.

    Parameters
    ----------
    scenario : Scenario
    opacities : Opacities
        On the samples.
    means : sequence of callables
        One per mode: from samples ``(..., wavenumber)`` to bins ``(..., bin)``.
    """

    def __init__(self, scenario: Scenario, opacities: Opacities, means: Sequence[Callable[[Array], Array]]) -> None:
        self.scenario = scenario
        self.opacities = opacities
        self._means = means

    def of(self, scenario: Scenario) -> ForwardModel:
        """The model of a variation of the scenario, on the same samples and in the same bins."""
        return ForwardModel(scenario, self.opacities, self._means)

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
        self, case: Case, change: Change = NO_CHANGE, *, shares_of: Sequence[str] = (), transparent: Sequence[str] = ()
    ) -> TransitDepth:
        """Transit depth of one case on the samples, some gases made transparent."""
        air = self.air(case, change)
        gases = [self.opacities.gas(gas, air.temperature_k, ratio) for gas, ratio in air.mixing_ratios.items()]
        pairs = self.opacities.pairs(list(air.mixing_ratios), air.temperature_k)
        return transit_depth(
            air,
            [gas for gas in gases if gas.formula not in transparent],
            [pair for pair in pairs if pair.first not in transparent and pair.second not in transparent],
            wavenumber_per_cm=self.opacities.wavenumber_per_cm,
            star_radius_km=self.scenario.star.radius_m * 1e-3,
            shares_of=shares_of,
        )

    def binned(
        self, case: Case, change: Change = NO_CHANGE, *, shares_of: Sequence[str] = (), transparent: Sequence[str] = ()
    ) -> tuple[BinnedDepth, ...]:
        """Transit depth of one case in the bins of every mode."""
        spectrum = self.depth(case, change, shares_of=shares_of, transparent=transparent)
        shares = {gas: self.where_covered(gas, spectrum.depth - spectrum.depth_without[gas]) for gas in shares_of}
        slopes = {gas: self.where_covered(gas, spectrum.derivative[gas]) for gas in shares_of}
        return tuple(
            BinnedDepth(
                depth_ppm=mean(spectrum.depth) * _PPM,
                shares_ppm={gas: mean(share) * _PPM for gas, share in shares.items()},
                slopes_ppm={gas: mean(slope) * _PPM for gas, slope in slopes.items()},
            )
            for mean in self._means
        )

    def where_covered(self, gas: str, samples: Array) -> Array:
        """The samples ``(..., wavenumber)``, zero where the gas's data do not cover."""
        return np.where(self.opacities.covered(gas), samples, 0.0) if self.opacities.has_data(gas) else samples
