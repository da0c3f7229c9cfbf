"""Ranges of a scenario and the atmospheres drawn from them."""

from __future__ import annotations

import numpy as np
import pytest

from planner.spectroscopy.opacity import temperature_nodes
from planner.studies.domain import distinct_cases, domain_of, drawn


def test_two_prior_widths_either_way(narrow):
    """Temperature by 30 %, mixing ratios by two decades, the sky from clear to high clouds."""
    domain = domain_of(narrow, temperature=True)
    assert domain.ranges["temperature"] == pytest.approx((175, 325))
    assert domain.ranges["CO"] == pytest.approx((1e-7, 1e-3), rel=2e-3)
    assert domain.mixing_ratios[("N2O",)] == pytest.approx((1e-7, 1e-3), rel=2e-3)
    assert domain.ranges["cloud_top"][0] <= 1e-4
    assert domain.ranges["cloud_top"][1] >= narrow.atmosphere.pressure_bar


def test_wider_ranges_are_held(narrow):
    """What a study visits besides stretches the ranges and never narrows them."""
    domain = domain_of(
        narrow,
        wider={"cloud_top": (1e-6, 1e-2), "radius": (0.5, 2.0)},
        mixing_ratios={("N2O",): (1e-9, 1e-6)},
    )
    assert domain.mixing_ratios[("N2O",)] == pytest.approx((1e-9, 1e-3), rel=2e-3)
    assert domain.ranges["cloud_top"] == (1e-6, domain_of(narrow).ranges["cloud_top"][1])
    assert domain.ranges["radius"] == (0.5, 2.0)
    assert "temperature" not in domain.ranges


def test_draws_fill_the_domain_and_can_be_repeated(narrow):
    """Every range is reached to its outer tenths; a seed gives the same draws, another one others."""
    domain = domain_of(narrow, temperature=True)
    draws = drawn(narrow, domain, 60, seed=1)
    assert draws == drawn(narrow, domain, 60, seed=1)
    assert draws != drawn(narrow, domain, 60, seed=2)
    ratios = np.log10([case.mixing_ratios[0] for _, case in draws])
    assert ratios.min() < -6.6
    assert ratios.max() > -3.4
    tops = [s.atmosphere.cloud.top_bar for s, _ in draws if s.atmosphere.cloud]
    assert min(tops) < 1e-3
    assert sum(s.atmosphere.cloud is None for s, _ in draws) >= 20
    assert 15 <= sum(s.atmosphere.haze is None for s, _ in draws) <= 25


def test_draws_to_the_ends_are_denser_there(narrow):
    """More than a third of them lie in the outer fifths of a range, against a fifth of even ones."""
    domain = domain_of(narrow)

    def outer(to_the_ends):
        masses = np.array([s.planet.mass_mearth for s, _ in drawn(narrow, domain, 200, 1, to_the_ends=to_the_ends)])
        low, high = domain.ranges["mass"]
        return np.mean(np.abs((masses - low) / (high - low) - 0.5) > 0.4)

    assert outer(True) > 0.35
    assert 0.17 < outer(False) < 0.23


def test_draws_use_few_tables(narrow):
    """Temperatures are nodes, and gases that would broaden themselves keep a share that is in use already."""
    rich = narrow.model_copy(
        update={"candidates": (narrow.candidates[0].model_copy(update={"mixing_ratios": (0.3,)}),)}
    )
    draws = drawn(rich, domain_of(rich, temperature=True), 40, seed=1)
    temperatures = {s.atmosphere.temperature_k for s, _ in draws}
    assert set(temperature_nodes(250.0)) <= temperatures
    assert len(temperatures) == 4
    assert all(temperature_nodes(t)[0] == pytest.approx(t) for t in temperatures)
    assert {round(case.mixing_ratios[0], 3) for _, case in draws if case.mixing_ratios[0] > 0.05} == {0.3}


def test_one_case_for_each_gas(narrow):
    """Several mixing ratios of one gas are one thing to be trained for, over a range that holds them all."""
    both = narrow.model_copy(
        update={"candidates": (narrow.candidates[0].model_copy(update={"mixing_ratios": (1e-8, 1e-4)}),)}
    )
    assert [case.gases for case in distinct_cases(both)] == [("N2O",)]
    low, high = domain_of(both).mixing_ratios[("N2O",)]
    assert low == pytest.approx(1e-10, rel=1e-2)
    assert high == pytest.approx(1e-2, rel=2e-2)
