"""What else could make the same shape: directions of depth for one prior width of everything not known exactly.

The question is whether air without the gas could look like air with it, so directions are derivatives of the forward
model with the gas transparent, times the prior width. (Taken with the gas present they would hold its own template:
a temperature known to 15 % would then cap every significance at 6.7, as if cold air could make the gas vanish.)
Derivatives by other absorbers come with that spectrum itself; the others are differences over a small step, for which
a thinned grid is enough: the sampling noise of the two spectra is the same and cancels. Under a clear sky, where a
cloud has no derivative, one finite step stands for it: a deck at 0.1 bar.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from math import log

import numpy as np
from numpy.typing import NDArray

from planner.scenario.records import Case, Scenario
from planner.spectroscopy.molecules import find_molecule
from planner.spectroscopy.opacity import temperature_nodes
from planner.star.heterogeneity import Region
from planner.studies.forward import NO_CHANGE, BinnedDepth, Change, ForwardModel
from planner.studies.observe import ModeView

__all__ = ["Direction", "directions", "prior_widths", "region_words"]

Array = NDArray[np.float64]

CLEAR_SKY_DECK_BAR = 0.1
_STEP = 0.02


@dataclass(frozen=True, kw_only=True, eq=False)
class Direction:
    """One nuisance: its name and the depth change in ppm for one prior width, per mode ``(bin,)``."""

    name: str
    per_mode_ppm: tuple[Array, ...]


def directions(
    model: ForwardModel, case: Case, null: Sequence[BinnedDepth], views: Sequence[ModeView]
) -> list[Direction]:
    """All nuisance directions of one case.

    Parameters
    ----------
    model : ForwardModel
        For the differences; thinned samples are enough.
    null : sequence of BinnedDepth
        The case with its gases transparent, per mode, with the slopes of all absorbers.
    """
    scenario = model.scenario
    found = [_offset(scenario, views, i, d) for i, view in enumerate(views) for d in range(len(view.mode.detectors))]
    for gas in scenario.atmosphere.absorbers:
        if gas not in case.gases:
            width = scenario.nuisances.absorbers_dex * log(10)
            found.append(Direction(name=gas, per_mode_ppm=tuple(part.slopes_ppm[gas] * width for part in null)))
    base = model.binned(case, transparent=case.gases)
    for name, change, factor in _steps(scenario):
        moved = model.binned(case, change, transparent=case.gases)
        parts = ((new.depth_ppm - old.depth_ppm) * factor for new, old in zip(moved, base, strict=True))
        found.append(Direction(name=name, per_mode_ppm=tuple(parts)))
    return [d for d in found if any(np.any(part) for part in d.per_mode_ppm)]


def prior_widths(scenario: Scenario) -> tuple[tuple[str, str], ...]:
    """Every nuisance with its prior width in words, for the output."""
    priors, atmosphere = scenario.nuisances, scenario.atmosphere
    cloud = f"{priors.cloud_top_dex:g} dex in its top pressure"
    if atmosphere.cloud is None:
        cloud = f"one-sided: a deck at {CLEAR_SKY_DECK_BAR:g} bar counts as one sigma (the sky is clear)"
    haze = f"{priors.haze_dex:g} dex"
    if atmosphere.haze is None:
        haze = f"one-sided: scattering up by {priors.haze_dex:g} dex over that of the air (there is none)"
    rows = [
        ("offset of each detector", f"{priors.offset_ppm:g} ppm"),
        ("radius", f"{100 * priors.radius_fraction:g} %"),
        ("temperature", f"{100 * priors.temperature_fraction:g} %"),
        ("gravity", f"{100 * scenario.gravity_fraction:.3g} %"),
        ("molar mass", f"{100 * priors.molar_mass_fraction:g} %"),
        ("cloud", cloud),
        ("haze", haze),
        *((gas, f"{priors.absorbers_dex:g} dex in mixing ratio") for gas in atmosphere.absorbers),
        *((f"rival {gas}", f"0 to {ratio:.3g}, linear in its share") for gas, ratio in priors.rivals.items()),
        *region_words(scenario.star.spots, scenario.star.faculae),
    ]
    return tuple(rows)


def region_words(spots: Region | None, faculae: Region | None) -> list[tuple[str, str]]:
    """Spots and faculae with their widths in words; a region that is not there has none."""
    return [
        (
            name,
            f"{100 * region.fraction:.3g} +/- {100 * region.fraction_error:.3g} % of the disc at "
            f"{region.temperature_k:.0f} +/- {region.temperature_error_k:.0f} K",
        )
        for name, region in (("spots", spots), ("faculae", faculae))
        if region is not None
    ]


def _offset(scenario: Scenario, views: Sequence[ModeView], mode: int, detector: int) -> Direction:
    parts = [np.zeros(len(view.bins)) for view in views]
    parts[mode][views[mode].bins.detector == detector] = scenario.nuisances.offset_ppm
    return Direction(name=f"offset of {views[mode].detectors[detector]}", per_mode_ppm=tuple(parts))


def _steps(scenario: Scenario) -> list[tuple[str, Change, float]]:
    """Steps of the forward model: name, change, and the factor from its difference to one prior width."""
    priors, atmosphere = scenario.nuisances, scenario.atmosphere
    warm = _temperature_step(atmosphere.temperature_k)
    steps = [
        ("radius", Change(radius=1 + _STEP), priors.radius_fraction / _STEP),
        ("temperature", Change(temperature=1 + warm), priors.temperature_fraction / warm),
        ("gravity", Change(gravity=1 + _STEP), scenario.gravity_fraction / _STEP),
        ("molar mass", Change(molar_mass=1 + _STEP), priors.molar_mass_fraction / _STEP),
        ("cloud", *_cloud_step(scenario)),
        ("haze", *_haze_step(scenario)),
    ]
    for gas, ratio in priors.rivals.items():
        steps.append((f"rival {find_molecule(gas).formula}", replace(NO_CHANGE, added=((gas, ratio),)), 1.0))
    return [step for step in steps if step[2] != 0]


def _temperature_step(temperature_k: float) -> float:
    """A relative step that stays between the temperature nodes already in use."""
    low, high = temperature_nodes(temperature_k)
    up, down = high / temperature_k - 1, low / temperature_k - 1
    if up == down == 0:
        return _STEP
    widest = up if up > -down else down
    return float(np.clip(0.8 * widest, -0.05, 0.05))


def _cloud_step(scenario: Scenario) -> tuple[Change, float]:
    width = scenario.nuisances.cloud_top_dex
    if scenario.atmosphere.cloud is not None:
        step = 0.1
        return Change(cloud_top=10**-step), width / step
    if scenario.atmosphere.surface and scenario.atmosphere.pressure_bar <= CLEAR_SKY_DECK_BAR:
        return NO_CHANGE, 0.0
    return Change(cloud_top_bar=CLEAR_SKY_DECK_BAR), 1.0 if width else 0.0


def _haze_step(scenario: Scenario) -> tuple[Change, float]:
    width, haze = scenario.nuisances.haze_dex, scenario.atmosphere.haze
    if haze is None:
        return Change(haze_factor=10**width - 1), 1.0 if width else 0.0
    step = 0.1
    return Change(haze_factor=haze.factor * 10**step), width / step
