"""Spots and faculae in spectra: bias, unknowns, and what they feign."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from small_system import SYSTEM

from planner.detection.significance import Measurement
from planner.detection.simulate import matched_filter
from planner.scenario import parse_scenario
from planner.star import disc_factor
from planner.studies.contamination import mimic_cautions, mimicry, region_directions, usual_caution
from planner.studies.nuisances import prior_widths
from planner.studies.plan import plan
from planner.studies.workshop import Workshop, see

SCENARIO = """
title = "Spotted"
invented = true
modes = ["grism-4-to-5-um"]
{regions}
[atmosphere]
temperature = "250 K"
pressure = "1 bar"
surface = true
background = {{ N2 = 1.0 }}
absorbers = {{ CO = "10 ppm" }}
[[candidates]]
gas = "N2O"
mixing_ratio = "100 ppm"
[goal]
threshold = 3
"""
BOTH = "[star.spots]\n[star.faculae]"
KNOWN = """
[star.spots]
temperature_error = "0 K"
covered_fraction_error = 0
"""


def scenario(regions=""):
    return parse_scenario(SCENARIO.format(regions=regions) + SYSTEM)


def sight(regions=""):
    workshop = Workshop(scenario(regions))
    return workshop, see(workshop, workshop.scenario.cases[0])


@pytest.fixture(scope="module")
def quiet():
    """The search without spots."""
    return sight()


@pytest.fixture(scope="module")
def spotted():
    """The search with the usual spots and faculae."""
    return sight(BOTH)


def test_depth_is_multiplied(quiet, spotted):
    """Depth, shares and template are those of a quiet star times the factor of each bin."""
    star, view = spotted[0].scenario.star, spotted[0].views[0]
    factor = disc_factor(star.temperature_k, star.spots, star.faculae, view.bins.centre_um)
    assert np.ptp(factor) > 1e-3
    for get in (
        lambda s: s.spectrum[0].depth_ppm,
        lambda s: s.spectrum[0].shares_ppm["CO"],
        lambda s: s.templates_ppm[0],
    ):
        assert get(spotted[1]) == pytest.approx(get(quiet[1]) * factor, rel=1e-12)


def test_quiet_star_is_untouched(quiet):
    """Without regions there is neither bias nor unknown of them."""
    assert not any("spot" in name or "facula" in name for name in quiet[1].measurements[0].nuisances)
    assert not {"spots", "faculae"} & dict(prior_widths(quiet[0].scenario)).keys()


def test_spots_cost_significance(quiet, spotted):
    """Four more unknowns, less significance; knowing them gives back what only the factor then changes."""
    plain, more = quiet[1].measurements[0], spotted[1].measurements[0]
    names = ("spots", "spot temperature", "faculae", "facula temperature")
    assert set(more.nuisances) - set(plain.nuisances) == set(names)
    assert more.snr(50) < plain.snr(50)
    assert more.known(*names).snr(50) == pytest.approx(plain.snr(50), rel=0.05)


def test_widths_are_told(spotted):
    """Studies that list the unknowns list spots and faculae with them, share and temperature with their errors."""
    star, told = spotted[0].scenario.star, dict(prior_widths(spotted[0].scenario))
    assert told["spots"] == (
        f"{100 * star.spots.fraction:.3g} +/- {100 * star.spots.fraction_error:.3g} % of the disc at "
        f"{star.spots.temperature_k:.0f} +/- {star.spots.temperature_error_k:.0f} K"
    )
    assert f"{star.faculae.temperature_k:.0f}" in told["faculae"]


def test_known_spots_cost_nothing():
    """A region known exactly is a bias that can be taken off, not an unknown."""
    workshop, seen = sight(KNOWN)
    assert not any("spot" in name for name in seen.measurements[0].nuisances)
    assert plan(workshop.scenario).spectra[0].contamination_ppm is not None


def test_directions_against_the_factor(spotted):
    """A direction is the difference of depths with the region a little larger, for one prior width."""
    workshop, seen = spotted
    star, view = workshop.scenario.star, workshop.views[0]
    found = {d.name: d.per_mode_ppm[0] for d in region_directions(star, seen.spectrum, workshop.views)}
    larger = replace(star.spots, fraction=star.spots.fraction + 1e-4)
    ratio = disc_factor(2650.0, larger, star.faculae, view.bins.centre_um) / disc_factor(
        2650.0, star.spots, star.faculae, view.bins.centre_um
    )
    slope = seen.spectrum[0].depth_ppm * (ratio - 1) / 1e-4 * star.spots.fraction_error
    assert found["spots"] == pytest.approx(slope, rel=0.01)
    warmer = replace(star.faculae, temperature_k=star.faculae.temperature_k + 0.5)
    ratio = disc_factor(2650.0, star.spots, warmer, view.bins.centre_um) / disc_factor(
        2650.0, star.spots, star.faculae, view.bins.centre_um
    )
    slope = seen.spectrum[0].depth_ppm * (ratio - 1) / 0.5 * star.faculae.temperature_error_k
    assert found["facula temperature"] == pytest.approx(slope, rel=0.02)


def test_spots_that_may_not_be_there():
    """A share of zero with an error is an unknown without a bias; the derivative is taken from above."""
    workshop, seen = sight("[star.spots]\ncovered_fraction = 0\ncovered_fraction_error = 0.1")
    assert "spots" in seen.measurements[0].nuisances
    assert "spot temperature" not in seen.measurements[0].nuisances
    star, view = workshop.scenario.star, workshop.views[0]
    found = {d.name: d.per_mode_ppm[0] for d in region_directions(star, seen.spectrum, workshop.views)}
    few = replace(star.spots, fraction=1e-4)
    slope = seen.spectrum[0].depth_ppm * (disc_factor(2650.0, few, None, view.bins.centre_um) - 1) / 1e-4 * 0.1
    assert found["spots"] == pytest.approx(slope, rel=0.01)
    full = sight("[star.spots]\ncovered_fraction = 1\ncovered_fraction_error = 0.1")[1]
    assert np.all(np.isfinite(full.measurements[0].directions_ppm))


def test_bias_leaves_with_the_spectrum():
    """The part of the depth that the star makes stands beside the spectrum, and only where regions are stated."""
    spectrum = plan(scenario(BOTH)).spectra[0]
    true = spectrum.depth_ppm - spectrum.contamination_ppm
    assert true == pytest.approx(plan(scenario()).spectra[0].depth_ppm, rel=1e-12)
    assert plan(scenario()).spectra[0].contamination_ppm is None


# -- mimicry --------------------------------------------------------------------------------------------------------


def measured(template, bins=60):
    return Measurement(
        template_ppm=template,
        white_ppm=np.full(bins, 30.0),
        floor_ppm2=np.zeros((bins, bins)),
        nuisances=("offset",),
        directions_ppm=np.full((1, bins), 1000.0),
    )


WAVELENGTH_UM = np.linspace(0.8, 1.8, 60)


def usual_bias(star, depth_ppm):
    from planner.star import usual_faculae, usual_spots

    kelvin = star.temperature_k
    return depth_ppm * (disc_factor(kelvin, usual_spots(kelvin), usual_faculae(kelvin), WAVELENGTH_UM) - 1)


def test_gas_of_the_same_shape_is_feigned():
    """Where the template is the contamination itself, the feigned significance is the gas's own and shapes agree."""
    star = scenario().star
    depth = np.full(60, 5000.0)
    mimic = mimicry(measured(usual_bias(star, depth)), depth, star, WAVELENGTH_UM, 4)
    assert (mimic.of_the_gas, mimic.alike) == (pytest.approx(1.0), pytest.approx(1.0))
    assert mimic.sigma == pytest.approx(measured(usual_bias(star, depth)).snr(4))
    assert mimic.serious
    assert not mimic.stated


def test_gas_of_the_opposite_shape_is_hidden():
    """The sign tells feigning from hiding."""
    star, depth = scenario().star, np.full(60, 5000.0)
    mimic = mimicry(measured(-2 * usual_bias(star, depth)), depth, star, WAVELENGTH_UM, 4)
    assert (mimic.of_the_gas, mimic.alike) == (pytest.approx(-0.5), pytest.approx(-1.0))
    assert "would hide" in mimic_cautions(mimic)[0]
    assert "0.5 of the gas's own (shapes alike to 1.00)" in mimic_cautions(mimic)[0]


def test_feigned_significance_is_the_filter_on_the_bias(spotted):
    """What a filter that does not think of spots makes of the bias of the stated ones."""
    workshop, seen = spotted
    m, view, star = seen.measurements[0], workshop.views[0], workshop.scenario.star
    factor = disc_factor(2650.0, star.spots, star.faculae, view.bins.centre_um)
    mimic = mimicry(m, seen.spectrum[0].depth_ppm, star, view.bins.centre_um, 50)
    blind = m.known("spots", "spot temperature", "faculae", "facula temperature")
    bias = seen.spectrum[0].depth_ppm * (1 - 1 / factor)
    assert mimic.stated
    assert mimic.sigma == pytest.approx(matched_filter(blind, 50) @ bias, rel=1e-9)


def test_little_harm_is_not_told(spotted):
    """No caution where less than a sigma, or a small part of the gas, is feigned."""
    row = plan(scenario()).rows[0]
    assert mimic_cautions(replace(row.star, serious=False)) == ()
    assert row.cautions == mimic_cautions(row.star)
    assert "2279" in usual_caution(scenario().star)
