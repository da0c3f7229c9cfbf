"""From a point of the unit cube to a spectrum: the same as the forward model gives by hand."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from planner.scenario import parse_scenario
from planner.scenario.records import Case
from planner.scenario.target import Star
from planner.studies.contamination import bin_factors, surface_factor
from planner.studies.fitting.likelihood import LevelledData
from planner.studies.fitting.observed import fitted_scenario, lacking, view_observed
from planner.studies.fitting.problem import FitProblem
from planner.studies.fitting.unknowns import unknowns_of
from planner.studies.forward import Change
from planner.studies.workshop import Workshop

SPOTS = '[star.spots]\ncovered_fraction = 0.1\ncovered_fraction_error = 0.05\ntemperature = "2300 K"\n[planet]'


def problem_of(text, observed, *, without=None):
    scenario = parse_scenario(text)
    fitted = fitted_scenario(scenario)
    workshop = Workshop(fitted, view=view_observed(fitted, observed))
    data = LevelledData(
        depth_ppm=observed.depth_ppm, error_ppm=observed.error_ppm, detector=observed.detector, offset_ppm=50.0
    )
    return FitProblem(
        scenario=lacking(fitted, without) if without else fitted,
        unknowns=unknowns_of(scenario, without=without),
        data=data,
        wavelength_um=workshop.views[0].bins.centre_um,
        model=workshop.model,
        without=without,
    ), workshop


def test_spectrum_by_hand(small_text, small_observed):
    """Mixing ratios and temperature of a point, set in the forward model directly."""
    problem, workshop = problem_of(small_text, small_observed)
    point = np.array([0.6, 0.4, 0.5])
    n2o, co = (1e-9 * 1e7**place for place in point[:2])
    scenario = problem.scenario.model_copy(
        update={"atmosphere": problem.scenario.atmosphere.model_copy(update={"absorbers": {"CO": co}})}
    )
    by_hand = workshop.model.of(scenario).binned(Case(gases=("N2O",), mixing_ratios=(n2o,)))[0].depth_ppm
    assert problem.spectrum_ppm(point) == pytest.approx(by_hand, rel=1e-9)
    assert problem.ln_likelihood(point) == pytest.approx(problem.data.ln_likelihood(by_hand), rel=1e-9)
    assert problem.temperature_k(point) == pytest.approx(250)
    assert problem.shown(point[None])[0] == pytest.approx([np.log10(n2o), np.log10(co), 250])


def test_gravity_and_radius(small_text, small_observed):
    """Gravity is drawn and mass follows: the same as a factor on each in the forward model."""
    text = small_text.replace('radius = "0 %"\ngravity = "0 %"', 'radius = "5 %"\ngravity = "10 %"')
    problem, workshop = problem_of(text, small_observed)
    assert [unknown.name for unknown in problem.unknowns] == ["N2O", "CO", "radius", "temperature", "gravity"]
    point = np.array([0.5, 0.5, 0.7, 0.5, 0.2])
    n2o = float(1e-9 * 1e7**0.5)
    by_hand = problem.scenario.model_copy(
        update={"atmosphere": problem.scenario.atmosphere.model_copy(update={"absorbers": {"CO": n2o}})}
    )
    factors = Change(radius=problem.unknowns[2].at(0.7), gravity=problem.unknowns[4].at(0.2))
    depth = workshop.model.of(by_hand).binned(Case(gases=("N2O",), mixing_ratios=(n2o,)), factors)[0].depth_ppm
    assert problem.spectrum_ppm(point) == pytest.approx(depth, rel=1e-9)


@pytest.mark.parametrize("gas", ["N2O", "CO"])
def test_without_a_gas(small_text, small_observed, gas):
    """The depth is that of air in which there is next to none of it."""
    without, _ = problem_of(small_text, small_observed, without=gas)
    all_of_it, _ = problem_of(small_text.replace("[1e-9, 1e-2]", "[1e-19, 1e-2]"), small_observed)
    other = all_of_it.unknowns[1 if gas == "N2O" else 0]
    place = 0.7
    as_much = (np.log10(without.unknowns[0].at(place)) + 19) / 17
    point = np.array([0.0, as_much, 0.5] if gas == "N2O" else [as_much, 0.0, 0.5])
    assert other.at(as_much) == pytest.approx(without.unknowns[0].at(place))
    expected = all_of_it.spectrum_ppm(point)
    assert without.spectrum_ppm(np.array([place, 0.5])) == pytest.approx(expected, abs=0.01)


def test_spots(small_text, small_observed):
    """They multiply the depth, by as much as the scenario says where the point says so."""
    text = small_text.replace("[planet]", SPOTS, 1)
    spotted, workshop = problem_of(text, small_observed)
    plain, _ = problem_of(small_text, small_observed)
    names = [unknown.name for unknown in spotted.unknowns]
    assert names[-2:] == ["spots", "spot temperature"]
    scenario = parse_scenario(text)
    factor = bin_factors(scenario.star, workshop.views)[0]
    point = np.array([0.5, 0.5, 0.5, _place(spotted.unknowns[3], 10.0), 0.5])
    assert spotted.spectrum_ppm(point) == pytest.approx(plain.spectrum_ppm(point[:3]) * factor, rel=1e-6)
    none = np.array([0.5, 0.5, 0.5, 0.0, 0.5])
    assert spotted.spectrum_ppm(none) == pytest.approx(plain.spectrum_ppm(none[:3]), rel=1e-9)


def _place(unknown, value):
    """Where a value lies in its prior, by bisection."""
    low, high = 0.0, 1.0
    for _ in range(60):
        middle = (low + high) / 2
        low, high = (middle, high) if unknown.at(middle) < value else (low, middle)
    return low


def test_shares_of_a_disc():
    """However far they are moved, spots cover none of the disc or all of it at most."""
    star = Star.model_validate(
        {
            "name": "s", "temperature": "2650 K", "radius": "0.12 R_sun", "mass": "0.09 M_sun", "distance": "10 pc",
            "spots": {"covered_fraction": 0.1, "covered_fraction_error": 0.05},
        }
    )  # fmt: skip
    wavelength = np.array([1.0, 4.0])
    assert surface_factor(star, {"spots": -5.0}, wavelength) == pytest.approx(1)
    assert np.all(np.isfinite(surface_factor(star, {"spots": 50.0}, wavelength)))
    assert surface_factor(star, {}, wavelength) == pytest.approx(surface_factor(star, {"spots": 0.0}, wavelength))


def test_air_that_cannot_be(small_text, small_observed):
    """Next to no likelihood, and no two points alike."""
    problem, _ = problem_of(small_text, small_observed)
    light = replace(
        problem, scenario=problem.scenario.model_copy(
            update={"planet": problem.scenario.planet.model_copy(update={"mass_mearth": 1e-3})}
        )
    )  # fmt: skip
    one, other = (light.ln_likelihood(np.array([place, 0.5, 0.5])) for place in (0.2, 0.3))
    assert one != other
    assert max(one, other) < -1e90
