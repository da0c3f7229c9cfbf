"""From the unit interval to the priors that a scenario states."""

from __future__ import annotations

import re

import numpy as np
import pytest
from scipy import stats

from planner.errors import ScenarioError
from planner.scenario import parse_scenario, starting_scenario
from planner.studies.fitting.observed import fitted_gases, fitted_scenario, lacking
from planner.studies.fitting.unknowns import domain_of_fit, unknowns_of

START = starting_scenario()


def of(more=""):
    scenario = parse_scenario(START + more)
    return scenario, {unknown.name: unknown for unknown in unknowns_of(scenario)}


def test_every_gas_but_the_background():
    """Candidates, absorbers and rivals, each evenly in the logarithm between the stated ends."""
    scenario, unknowns = of('\n[fit]\nmixing_ratio_range = [1e-8, 0.01]\n[nuisances]\nrivals = { SO2 = "1 ppm" }\n')
    gases = [unknown for unknown in unknowns.values() if unknown.gas]
    expected = [c.gas for c in scenario.candidates] + [*scenario.atmosphere.absorbers, "SO2"]
    assert [unknown.name for unknown in gases] == list(dict.fromkeys(expected))
    assert gases[0].at(0.0) == pytest.approx(1e-8)
    assert gases[0].at(0.5) == pytest.approx(1e-5)
    assert gases[0].shown(np.array([1.0])) == pytest.approx([-2])


def test_without_a_gas():
    """It alone is missing."""
    scenario = parse_scenario(START)
    gas = scenario.candidates[0].gas
    all_names, fewer = ([u.name for u in unknowns_of(scenario, without=g)] for g in (None, gas))
    assert [name for name in all_names if name != gas] == fewer


def test_normal_priors_end_at_three_widths():
    """Places spread evenly follow a normal distribution cut at its ends (scipy's)."""
    scenario, unknowns = of()
    temperature = unknowns["temperature"]
    width, own = scenario.nuisances.temperature_fraction, scenario.atmosphere.temperature_k
    for place in (0.0, 0.1, 0.5, 0.99, 1.0):
        expected = own * np.exp(width * stats.truncnorm(-3, 3).ppf(place))
        assert temperature.at(place) == pytest.approx(expected, rel=1e-6)


def test_one_sided_priors_begin_at_the_scenario():
    """Under a clear sky the cloud begins at the base, haze at none."""
    scenario, unknowns = of()
    assert unknowns["cloud top"].at(0.0) == pytest.approx(scenario.atmosphere.pressure_bar)
    assert unknowns["cloud top"].at(0.9) < unknowns["cloud top"].at(0.1)
    assert unknowns["haze"].at(0.0) == 0
    assert not unknowns["haze"].logarithmic


def test_what_is_known_is_no_parameter():
    """Widths of zero leave nothing to find."""
    _, unknowns = of(
        '\n[nuisances]\nradius = "0 %"\ntemperature = "0 %"\ngravity = "0 %"\nmolar_mass = "0 %"\n'
        'cloud_top = "0 dex"\nhaze = "0 dex"\n'
    )
    assert all(unknown.gas for unknown in unknowns.values())


def test_spots_stay_on_the_disc():
    """Shares from none to at most three widths, temperatures about the stated one."""
    text = START.replace(
        "[planet]", "[star.spots]\ncovered_fraction = 0.08\ncovered_fraction_error = 0.125\n[planet]", 1
    )
    unknowns = {unknown.name: unknown for unknown in unknowns_of(parse_scenario(text))}
    assert unknowns["spots"].at(0.0) == pytest.approx(0, abs=1e-9)
    assert unknowns["spots"].at(1.0) == pytest.approx(8 + 37.5)
    assert unknowns["spot temperature"].region


def test_domain_holds_the_priors():
    """Samples are chosen for all that a fit can visit."""
    scenario, unknowns = of()
    gas = scenario.candidates[0].gas
    fitted = fitted_scenario(scenario)
    domain = domain_of_fit(fitted, unknowns_of(scenario))
    for name, key in (("temperature", "temperature"), ("cloud top", "cloud_top"), ("haze", "haze")):
        low, high = sorted((unknowns[name].at(0.0), unknowns[name].at(1.0)))
        assert domain.ranges[key][0] <= low or low == 0
        assert domain.ranges[key][1] >= high
    assert domain.mixing_ratios[(gas,)][0] <= 1e-10
    assert all(domain.ranges[g][1] >= 0.05 for g in fitted.atmosphere.absorbers)


def test_all_gases_in_the_air_at_once():
    """One candidate, the others absorbers, nothing twice, and the sum of all is one."""
    scenario = parse_scenario(START)
    gas = scenario.candidates[0].gas
    fitted = fitted_scenario(scenario)
    assert [c.gas for c in fitted.candidates] == [gas]
    air = fitted.air(fitted.cases[0])
    assert set(air) == set(fitted_gases(scenario)) | set(fitted.atmosphere.background)
    assert sum(air.values()) == pytest.approx(1)


def test_lacking_a_gas():
    """An absorber goes, the rest stays, and the background fills its place."""
    fitted = fitted_scenario(parse_scenario(START))
    gas = next(iter(fitted.atmosphere.absorbers))
    air = lacking(fitted, gas).air(fitted.cases[0])
    assert gas not in air
    assert sum(air.values()) == pytest.approx(1)


def test_ratio_outside_the_range():
    """A scenario that its own prior excludes is refused, with file and line."""
    with pytest.raises(ScenarioError, match=r"^scenario:\d+: fit.mixing_ratio_range: expected a range that holds"):
        fitted_gases(parse_scenario(re.sub(r"\Z", "\n[fit]\nmixing_ratio_range = [1e-12, 1e-11]\n", START)))
