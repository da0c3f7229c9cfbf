"""A user's spectrum in the place of a mode, and the scenario with all its gases in the air at once."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from planner.claims.spectrum import ObservedSpectrum
from planner.errors import ScenarioError
from planner.instrument.binning import Bins
from planner.instrument.modefiles import read_mode
from planner.instrument.noise import Noise
from planner.scenario.records import Candidate, Scenario
from planner.spectroscopy.grid import SAMPLES_PER_UNIT_LN, LogGrid
from planner.star.flux import photon_flux
from planner.studies.observe import ModeView, source_of_light

__all__ = ["fitted_gases", "fitted_scenario", "lacking", "view_observed"]

Array = NDArray[np.float64]

_SAMPLES_PER_BIN = 500


def view_observed(scenario: Scenario, observed: ObservedSpectrum) -> ModeView:
    """The spectrum as a mode that has been used once: its bins, its errors as noise, no floor.

    Inside a bin the star's photons are the weights. Of the scenario's mode it borrows what a mode must have; none of it
    plays a part.
    """
    bins = Bins(detector=observed.detector, from_um=observed.from_um, to_um=observed.to_um)
    density = int(np.ceil(_SAMPLES_PER_BIN * np.median(bins.resolving_power)))
    grid = LogGrid.covering(observed.from_um.min(), observed.to_um.max(), max(SAMPLES_PER_UNIT_LN, density))
    photons = photon_flux(source_of_light(scenario), grid.wavelength_um) * grid.wavelength_um
    nothing = np.zeros(len(bins))
    return ModeView(
        mode=read_mode(scenario.single_modes[0]).model_copy(update={"name": "the spectrum"}),
        bins=bins,
        noise=Noise(
            electrons_per_s=nothing,
            depth_error_ppm=observed.error_ppm,
            saturated=np.zeros(len(bins), dtype=bool),
            star_share=nothing,
            background_share=nothing,
            read_share=nothing,
            groups=np.zeros(0, dtype=np.int64),
            duty=np.zeros(0),
            saturated_um=(),
        ),
        floor_ppm2=np.zeros((len(bins), len(bins))),
        charged_hours=0.0,
        grid=grid,
        weights=np.tile(photons, (int(observed.detector.max()) + 1, 1)),
    )


def fitted_gases(scenario: Scenario) -> dict[str, float]:
    """Every gas whose mixing ratio is fitted, with the scenario's: candidates, absorbers, rivals.

    Raises
    ------
    ScenarioError
        If one of them lies outside the range of the prior.
    """
    gases = {candidate.gas: candidate.mixing_ratios[0] for candidate in scenario.candidates}
    for gas, ratio in [*scenario.atmosphere.absorbers.items(), *scenario.nuisances.rivals.items()]:
        gases.setdefault(gas, ratio)
    low, high = scenario.fit.mixing_ratio_range
    for gas, ratio in gases.items():
        if not low <= ratio <= high:
            raise ScenarioError(
                f"{scenario.place('fit', 'mixing_ratio_range')}: expected a range that holds the mixing ratio of "
                f"{gas}, {ratio:g}, got {low:g} to {high:g}; give a wider one, or make {gas} a background gas"
            )
    return gases


def fitted_scenario(scenario: Scenario) -> Scenario:
    """The scenario with the first of its gases as the only candidate and all others as absorbers, seen once."""
    gases = fitted_gases(scenario)
    first, *others = gases
    atmosphere = scenario.atmosphere
    return scenario.model_copy(
        update={
            "candidates": (Candidate.model_construct(gas=first, mixing_ratios=(gases[first],)),),
            "together": (),
            "goal": scenario.goal.model_copy(update={"transits_available": 1}),
            "nuisances": scenario.nuisances.model_copy(update={"rivals": {}}),
            "atmosphere": atmosphere.model_copy(
                update={
                    "absorbers": {gas: gases[gas] for gas in others},
                    "background": {g: share for g, share in atmosphere.background.items() if g not in gases},
                }
            ),
        }
    )


def lacking(scenario: Scenario, gas: str) -> Scenario:
    """A fitted scenario whose air lacks one of the absorbers; the candidate is left out where air is made."""
    atmosphere = scenario.atmosphere
    left = {other: ratio for other, ratio in atmosphere.absorbers.items() if other != gas}
    return scenario.model_copy(update={"atmosphere": atmosphere.model_copy(update={"absorbers": left})})
