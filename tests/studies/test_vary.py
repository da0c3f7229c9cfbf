"""Scenarios with some numbers changed."""

from __future__ import annotations

import numpy as np
import pytest

from planner.scenario.surface import SurfaceRegion
from planner.studies.vary import PARAMETERS, parameter_of, shifted_ratio, vary


def test_nothing_changed(narrow):
    """Without values the scenario's physics stays: same air, planet, star."""
    case = narrow.cases[0]
    changed, same = vary(narrow, case, {})
    assert same.mixing_ratios == pytest.approx(case.mixing_ratios, rel=1e-12)
    assert changed.air(same) == pytest.approx(narrow.air(case), rel=1e-12)
    assert (changed.planet, changed.star) == (narrow.planet, narrow.star)
    assert changed.scale_height_km(same) == pytest.approx(narrow.scale_height_km(case), rel=1e-12)


def test_every_parameter_arrives(narrow):
    """Each value is found where the forward model looks for it."""
    changed, case = vary(
        narrow,
        narrow.cases[0],
        {"mixing_ratio": 1e-4, "CO": 3e-5, "temperature": 300.0, "mass": 1.0, "radius": 1.1, "star_radius": 0.13}
        | {"cloud_top": 0.01, "haze": 7.0},
    )
    assert case.mixing_ratios == pytest.approx((1e-4,))
    assert changed.air(case)["CO"] == pytest.approx(3e-5)
    assert changed.atmosphere.temperature_k == 300.0
    assert (changed.planet.mass_mearth, changed.planet.radius_rearth, changed.star.radius_rsun) == (1.0, 1.1, 0.13)
    assert (changed.atmosphere.cloud.top_bar, changed.atmosphere.cloud.covered_fraction) == (0.01, 1.0)
    assert (changed.atmosphere.haze.factor, changed.atmosphere.haze.wavelength_slope) == (7.0, -4.0)


def test_spots_and_faculae(narrow):
    """Shares and temperatures arrive with their errors kept; both never cover more than the disc, spots stay cooler."""
    star = narrow.star.model_copy(update={"given_spots": SurfaceRegion(), "given_faculae": SurfaceRegion()})
    spotted = narrow.model_copy(update={"star": star})
    values = {"spots": 0.2, "spot_temperature": 2400.0, "faculae": 0.3, "facula_temperature": 2700.0}
    changed, _ = vary(spotted, narrow.cases[0], values)
    assert (changed.star.spots.fraction, changed.star.faculae.fraction) == (0.2, 0.3)
    assert (changed.star.spots.temperature_k, changed.star.faculae.temperature_k) == (2400.0, 2700.0)
    assert changed.star.spots.fraction_error == star.spots.fraction_error
    assert changed.star.faculae.temperature_error_k == star.faculae.temperature_error_k
    full, _ = vary(spotted, narrow.cases[0], values | {"spots": 0.9, "faculae": 0.9, "spot_temperature": 9000.0})
    assert full.star.spots.fraction + full.star.faculae.fraction == pytest.approx(1)
    assert full.star.spots.temperature_k == star.temperature_k
    assert vary(spotted, narrow.cases[0], {})[0].star.spots == star.spots
    assert vary(narrow, narrow.cases[0], values)[0].star == narrow.star


def test_molar_mass_acts_on_the_scale_height_alone(narrow):
    """Twice the molar mass halves the scale height; the mixing ratios stay."""
    case = narrow.cases[0]
    heavy = 2 * narrow.molar_mass_g(case)
    changed, same = vary(narrow, case, {"molar_mass": heavy})
    assert changed.scale_height_km(same) == pytest.approx(narrow.scale_height_km(case) / 2)
    assert changed.air(same) == pytest.approx(narrow.air(case))


def test_prior_on_gravity_stays(narrow):
    """A lighter planet does not become one whose gravity is less well known."""
    known = narrow.model_copy(update={"planet": narrow.planet.model_copy(update={"mass_error_mearth": 0.05})})
    changed, _ = vary(known, known.cases[0], {"mass": 0.4})
    assert changed.gravity_fraction == known.gravity_fraction


@pytest.mark.parametrize("top", [np.inf, 1.0, 3.0])
def test_no_cloud_below_the_surface(narrow, top):
    """A deck at or under an opaque surface is none, and so nothing that could be known badly."""
    changed, _ = vary(narrow, narrow.cases[0], {"cloud_top": top, "haze": 0.0})
    assert changed.atmosphere.cloud is None
    assert changed.atmosphere.haze is None


def test_room_for_the_background(narrow):
    """Gases that would fill more than the air are scaled down together."""
    changed, case = vary(narrow, narrow.cases[0], {"mixing_ratio": 0.9, "CO": 0.6})
    air = changed.air(case)
    assert sum(air.values()) == pytest.approx(1)
    assert air["N2"] == pytest.approx(1e-3)
    assert air["N2O"] / air["CO"] == pytest.approx(1.5)


def test_shifted_ratio():
    """A factor for traces, symmetric about one half, and never more than all of the air."""
    assert shifted_ratio(1e-6, 1.0) == pytest.approx(1e-5, rel=1e-4)
    assert shifted_ratio(0.5, 1.0) == pytest.approx(1 - shifted_ratio(0.5, -1.0))
    assert 0.95 < shifted_ratio(0.95, 2.0) < 1


def test_parameters_by_name(narrow):
    """Those of the table and the absorbers; nothing else."""
    assert parameter_of(narrow, "cloud_top") is PARAMETERS["cloud_top"]
    assert parameter_of(narrow, "CO").logarithmic
    assert parameter_of(narrow, "CO2") is None
    assert parameter_of(narrow, "spots") is None
