"""What a fit finds out: every number that the scenario does not hold for exact, and its prior."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from math import hypot, log10

import numpy as np
from numpy.typing import NDArray
from scipy import special

from planner.scenario.records import Scenario
from planner.star.heterogeneity import Region
from planner.studies.contamination import region_names
from planner.studies.domain import Domain, domain_of
from planner.studies.fitting.observed import fitted_gases
from planner.studies.spread import Prior, priors_of

__all__ = ["Unknown", "domain_of_fit", "unknowns_of"]

Array = NDArray[np.float64]

_WIDTHS = 3.0
"""Priors end at so many widths."""


@dataclass(frozen=True, kw_only=True)
class Unknown:
    """One parameter of a fit.

    Attributes
    ----------
    name : str
        For the output; gases by their formula.
    unit : str
    words : str
        The prior in words.
    value : callable
        From a number of prior widths to a value in the unit; for a gas, from a place in the unit interval.
    low, high : float
        Ends of the prior, in widths: a normal distribution is cut there.
    gas : bool
        Its prior is even in the logarithm.
    region : bool
        Whether it is a number of spots or faculae.
    logarithmic : bool
        Whether it is best summed up in its decadic logarithm.
    """

    name: str
    unit: str = ""
    words: str
    value: Callable[[float], float]
    low: float = -_WIDTHS
    high: float = _WIDTHS
    gas: bool = False
    region: bool = False
    logarithmic: bool = False

    def widths(self, place: float) -> float:
        """Number of prior widths at a place in the unit interval; evenly spread places follow the prior."""
        if self.gas:
            return place
        first, last = special.ndtr(self.low), special.ndtr(self.high)
        return float(special.ndtri(first + place * (last - first)))

    def at(self, place: float) -> float:
        """Value at a place in the unit interval."""
        return self.value(self.widths(place))

    def shown(self, places: Array) -> Array:
        """Values, or their decadic logarithms, at some places."""
        values = [self.at(place) for place in places.tolist()]
        return np.array([log10(value) for value in values] if self.logarithmic else values)


def unknowns_of(scenario: Scenario, *, without: str | None = None) -> tuple[Unknown, ...]:
    """All parameters of a fit but the offsets of detectors, which are worked out exactly.

    Parameters
    ----------
    scenario : Scenario
    without : str, optional
        A gas that the air does not hold.
    """
    low, high = scenario.fit.mixing_ratio_range
    words = f"mixing ratio from {low:.3g} to {high:.3g}, evenly in the logarithm"
    gases = [
        Unknown(name=gas, words=words, value=lambda u: float(low * (high / low) ** u), gas=True, logarithmic=True)
        for gas in fitted_gases(scenario)
        if gas != without
    ]
    return (*gases, *_air(scenario), *(_region(scenario, name) for name in region_names(scenario.star)))


def domain_of_fit(scenario: Scenario, unknowns: Sequence[Unknown]) -> Domain:
    """All that the priors reach, for the choice of samples.

    Parameters
    ----------
    scenario : Scenario
        That of `planner.studies.fitting.observed.fitted_scenario`.
    unknowns : sequence of Unknown
    """
    ends = {unknown.name: sorted((unknown.at(0.0), unknown.at(1.0))) for unknown in unknowns}
    low, high = scenario.fit.mixing_ratio_range
    wider = dict.fromkeys(scenario.atmosphere.absorbers, (low, high))
    for name, key in (("temperature", "temperature"), ("cloud top", "cloud_top"), ("haze", "haze")):
        if name in ends:
            wider[key] = (ends[name][0] or ends[name][1], ends[name][1])
    return domain_of(
        scenario,
        temperature="temperature" in ends,
        wider=wider,
        mixing_ratios={case.gases: (low, high) for case in scenario.cases},
    )


def _air(scenario: Scenario) -> list[Unknown]:
    """Radius, temperature, gravity, cloud and haze, as far as they are not held for exact."""
    priors = {prior.name: prior for prior in priors_of(scenario, scenario.cases[0])}
    found = []
    for name, unit, own in (
        ("radius", "R_earth", scenario.planet.radius_rearth),
        ("temperature", "K", scenario.atmosphere.temperature_k),
    ):
        if name in priors:
            found.append(_factor(name, unit, own, priors[name]))
    width = hypot(scenario.gravity_fraction, scenario.nuisances.molar_mass_fraction)
    if width > 0:
        words = f"{100 * width:.3g} %: gravity times molar mass over the scenario's, for only their product counts"
        found.append(Unknown(name="gravity", words=words, value=lambda z: float(np.exp(width * z))))
    for name, unit in (("cloud top", "bar"), ("haze", "")):
        if name in priors:
            prior = priors[name]
            one_sided_haze = name == "haze" and prior.one_sided  # begins at none, which has no logarithm
            found.append(
                Unknown(
                    name=name,
                    unit=unit,
                    words=prior.words,
                    value=prior.value,
                    low=0.0 if prior.one_sided else -_WIDTHS,
                    logarithmic=not one_sided_haze,
                )
            )
    return found


def _factor(name: str, unit: str, own: float, prior: Prior) -> Unknown:
    return Unknown(
        name=name, unit=unit, words=f"{prior.words} about {own:.4g} {unit}", value=lambda z: own * prior.value(z)
    )


def _region(scenario: Scenario, name: str) -> Unknown:
    """One number of spots or faculae; shares stay shares."""
    region = scenario.star.spots if name.startswith("spot") else scenario.star.faculae
    assert isinstance(region, Region)
    if name.endswith("temperature"):
        kelvin, error_k = region.temperature_k, region.temperature_error_k
        return Unknown(
            name=name, unit="K", words=f"{kelvin:.0f} +/- {error_k:.0f} K", value=lambda z: kelvin + z * error_k,
            region=True,
        )  # fmt: skip
    share, error = region.fraction, region.fraction_error
    return Unknown(
        name=name,
        unit="% of the disc",
        words=f"{100 * share:.3g} +/- {100 * error:.3g} % of the disc",
        value=lambda z: 100 * (share + z * error),
        low=max(-_WIDTHS, -share / error),
        high=min(_WIDTHS, (1 - share) / error),
        region=True,
    )
