"""Where a study will go: the ranges of a scenario's parameters, and atmospheres drawn from them for training."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np
from scipy.stats import qmc

from planner.scenario.records import Case, Scenario
from planner.spectroscopy.opacity import LEAST_SELF_FRACTION, temperature_nodes
from planner.studies.vary import parameter_of, shifted_ratio, vary

__all__ = ["Domain", "distinct_cases", "domain_of", "drawn"]

Range = tuple[float, float]

_WIDTHS = 2.0
"""Half width of a domain in prior widths; beyond it a reduced model extrapolates, which it does well."""
_LEAST_DECADES = 2.0
"""Half width in mixing ratio, however well it is known."""
_HIGHEST_CLOUD_BAR = 1e-4
_CLEAR_SHARE = 1 / 3
"""Share of the training atmospheres without clouds, and without haze, where the scenario has none."""
_BELOW_SELF_BROADENING = 0.98 * LEAST_SELF_FRACTION


@dataclass(frozen=True, kw_only=True)
class Domain:
    """Ranges of parameters.

    Attributes
    ----------
    ranges : mapping of parameter to (low, high)
        In the units of `planner.studies.vary.PARAMETERS`; ``mixing_ratio`` is not among them.
    mixing_ratios : mapping of searched gases to (low, high)
        Of the first gas of each set.
    """

    ranges: Mapping[str, Range]
    mixing_ratios: Mapping[tuple[str, ...], Range]


def distinct_cases(scenario: Scenario) -> list[Case]:
    """The first case of each searched gas or set of gases."""
    found: dict[tuple[str, ...], Case] = {}
    for case in scenario.cases:
        found.setdefault(case.gases, case)
    return list(found.values())


def domain_of(
    scenario: Scenario,
    *,
    temperature: bool = False,
    wider: Mapping[str, Range] | None = None,
    mixing_ratios: Mapping[tuple[str, ...], Range] | None = None,
) -> Domain:
    """The ranges that the priors of a scenario reach, two widths either way.

    Parameters
    ----------
    temperature : bool
        Whether temperature ranges too, which needs tables for more temperatures; else it stays as it is.
    wider : mapping of parameter to (low, high), optional
        What a study visits besides; ranges are stretched to hold it.
    mixing_ratios : mapping of searched gases to (low, high), optional
        The same for the mixing ratios of the searched gases.
    """
    priors, planet, atmosphere = scenario.nuisances, scenario.planet, scenario.atmosphere
    clouds = _WIDTHS * priors.cloud_top_dex
    top_bar = atmosphere.cloud.top_bar if atmosphere.cloud is not None else atmosphere.pressure_bar
    haze = max(atmosphere.haze.factor if atmosphere.haze is not None else 1.0, 1e-3)
    decades = max(_LEAST_DECADES, _WIDTHS * priors.absorbers_dex)
    ranges = {
        "mass": _around(planet.mass_mearth, scenario.gravity_fraction + priors.molar_mass_fraction),
        "cloud_top": (min(_HIGHEST_CLOUD_BAR, top_bar / 10**clouds), top_bar * 10**clouds),
        "haze": (haze / 10, haze * 10 ** (_WIDTHS * priors.haze_dex)),
        **{gas: _decades(ratio, decades) for gas, ratio in atmosphere.absorbers.items()},
    }
    if temperature:
        ranges["temperature"] = _around(atmosphere.temperature_k, priors.temperature_fraction)
    wider, ratios = wider or {}, dict(mixing_ratios or {})
    for case in scenario.cases:
        ratios[case.gases] = _union(_decades(case.mixing_ratios[0], decades), ratios.get(case.gases))
    return Domain(ranges=ranges | {n: _union(r, ranges.get(n)) for n, r in wider.items()}, mixing_ratios=ratios)


def drawn(
    scenario: Scenario, domain: Domain, count: int, seed: int, *, to_the_ends: bool = False
) -> list[tuple[Scenario, Case]]:
    """Atmospheres spread over a domain (scrambled Halton sequence), the searched gases taking turns.

    Tables of the whole grid are dear, so temperatures are those of nodes (the scenario's and those that hold the
    domain), and mixing ratios at which a gas broadens itself are the scenario's own.

    Parameters
    ----------
    to_the_ends : bool
        Whether points are denser towards the ends of each range, as those of Chebyshev are: what is fitted there
        holds better in between than the other way round. Else they are even.
    """
    cases, temperatures = distinct_cases(scenario), _temperatures(scenario, domain)
    names = [name for name in domain.ranges if name != "temperature"]
    temperature_at, clear_at, *places = qmc.Halton(len(names) + 3, seed=seed).random(count).T
    points = np.array(places).T
    if to_the_ends:
        points = (1 - np.cos(np.pi * points)) / 2
    result = []
    for number, (ratio_at, *at) in enumerate(points):
        case = cases[number % len(cases)]
        values = {n: _between(scenario, n, domain.ranges[n], u) for n, u in zip(names, at, strict=True)}
        ratio = _between(scenario, "mixing_ratio", domain.mixing_ratios[case.gases], ratio_at)
        values["mixing_ratio"] = _without_new_tables(ratio, case.mixing_ratios[0])
        for gas, own in scenario.atmosphere.absorbers.items():
            values[gas] = _without_new_tables(values[gas], own)
        values["temperature"] = temperatures[int(temperature_at[number] * len(temperatures))]
        result.append(vary(scenario, case, values | _none_of(scenario, clear_at[number])))
    return result


def _none_of(scenario: Scenario, at: float) -> dict[str, float]:
    """No cloud in the first third of the draws and no haze in the last, where the scenario has none."""
    if at < _CLEAR_SHARE and scenario.atmosphere.cloud is None:
        return {"cloud_top": np.inf}
    if at > 1 - _CLEAR_SHARE and scenario.atmosphere.haze is None:
        return {"haze": 0.0}
    return {}


def _temperatures(scenario: Scenario, domain: Domain) -> list[float]:
    own = scenario.atmosphere.temperature_k
    low, high = domain.ranges.get("temperature", (own, own))
    return sorted({*temperature_nodes(own), temperature_nodes(low)[0], temperature_nodes(high)[1]})


def _without_new_tables(ratio: float, own: float) -> float:
    if ratio < _BELOW_SELF_BROADENING:
        return ratio
    return own if own >= LEAST_SELF_FRACTION else _BELOW_SELF_BROADENING


def _between(scenario: Scenario, name: str, ends: Range, share: float) -> float:
    low, high = ends
    parameter = parameter_of(scenario, name)
    assert parameter is not None
    return float(low * (high / low) ** share if parameter.logarithmic else low + (high - low) * share)


def _around(value: float, fraction: float) -> Range:
    return value * max(0.2, 1 - _WIDTHS * fraction), value * (1 + _WIDTHS * fraction)


def _decades(ratio: float, decades: float) -> Range:
    return shifted_ratio(ratio, -decades), shifted_ratio(ratio, decades)


def _union(one: Range, other: Range | None) -> Range:
    return one if other is None else (min(one[0], other[0]), max(one[1], other[1]))
