"""Gases that the air is not said to hold: what not knowing them would cost a search.

The gas catalogue says which gases absorb where the searched one does. The most alike are tried, each with the share it
would have at a stated mixing ratio as a nuisance of one sigma.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from planner.catalogue.read import find_gas
from planner.catalogue.sharing import sharing_bands
from planner.detection.significance import Measurement
from planner.scenario.records import Case
from planner.studies.forward import Change, ForwardModel
from planner.studies.results import Rival
from planner.studies.workshop import Workshop

__all__ = ["absent_rivals", "rival_directions", "rival_ratio", "try_rivals"]

Array = NDArray[np.float64]

MOST_TRIED = 6
"""Each costs a table of cross-sections and a forward model; the list is in the order of likeness."""
LEAST_RATIO = 1e-6
"""A gas that industry alone makes is tried at today's amount; others at this at least: elsewhere is not Earth."""


def absent_rivals(workshop: Workshop, case: Case) -> tuple[str, ...]:
    """Formulas of the catalogue's gases most like the searched ones that are not in the air; those with data."""
    scenario = workshop.scenario
    there = {*scenario.air(case), *scenario.nuisances.rivals}
    alike = dict.fromkeys(rival for gas in case.gases for rival in sharing_bands(gas))
    return tuple(gas for gas in alike if gas not in there and workshop.opacities.has_data(gas))[:MOST_TRIED]


def rival_ratio(gas: str) -> float:
    """Width of the prior on a rival, in every study: the mixing ratio of Earth's air today, or 1 ppm if that is more.

    Industrial gases are tried at today's amount.
    """
    record = find_gas(gas)
    today = record.abundance("present")
    ratio = max(today.mixing_ratio) if today is not None else 0.0
    return ratio if record.gas_class == "industrial" and ratio > 0 else max(ratio, LEAST_RATIO)


def rival_directions(model: ForwardModel, case: Case, gases: Sequence[str]) -> dict[str, tuple[Array, ...]]:
    """Depth change in ppm that each gas would make in the air without the searched one, per mode ``(bin,)``."""
    base = model.binned(case, transparent=case.gases)
    found = {}
    for gas in gases:
        moved = model.binned(case, Change(added=((gas, rival_ratio(gas)),)), transparent=case.gases)
        found[gas] = tuple(new.depth_ppm - old.depth_ppm for new, old in zip(moved, base, strict=True))
    return found


def try_rivals(measurement: Measurement, directions_ppm: Mapping[str, Array], transits: float) -> tuple[Rival, ...]:
    """What each rival by itself leaves of a significance, dearest first.

    Parameters
    ----------
    measurement : Measurement
    directions_ppm : mapping of formula to (bin,)
        Depth change for one prior width of each.
    transits : float
    """
    full = measurement.snr(transits)
    rivals = [
        Rival(
            gas=gas,
            mixing_ratio=rival_ratio(gas),
            snr_left=_with(measurement, gas, direction).snr(transits),
            snr=full,
            transits=round(transits),
        )
        for gas, direction in directions_ppm.items()
    ]
    return tuple(sorted(rivals, key=lambda rival: rival.snr_left))


def _with(measurement: Measurement, name: str, direction_ppm: Array) -> Measurement:
    return replace(
        measurement,
        nuisances=(*measurement.nuisances, name),
        directions_ppm=np.vstack([measurement.directions_ppm, direction_ppm]),
    )
