"""The forward model on few samples against the full one."""

from __future__ import annotations

import numpy as np
import pytest

from planner.detection.significance import target_snr
from planner.studies import reduced as module
from planner.studies.domain import domain_of
from planner.studies.forward import Change, ForwardModel
from planner.studies.reduced import SparseMeans, reduce_opacity
from planner.studies.vary import vary
from planner.studies.workshop import Workshop, see

AIRS = (
    {},
    {"temperature": 223.0, "mixing_ratio": 3e-4},  # between two nodes that the training did not see
    {"temperature": 300.0, "mixing_ratio": 3e-7, "CO": 5e-4},
    {"cloud_top": 0.003, "mass": 0.7, "mixing_ratio": 1e-4},
    {"haze": 30.0, "cloud_top": 0.2, "CO": 1e-6, "star_radius": 0.125},
)


def test_few_samples(narrow_workshop, narrow_reduced):
    """A dozen samples per bin or so in place of 500."""
    error = narrow_reduced.error
    assert error.bins == len(narrow_workshop.views[0].bins)
    assert error.samples == narrow_reduced.model.opacities.wavenumber_per_cm.size
    assert error.bins < error.samples < 30 * error.bins
    assert error.of_samples > 450 * error.bins


def test_error_that_is_printed(narrow_reduced):
    """Under a tenth of the noise at its worst, and the sentence says by how much."""
    error = narrow_reduced.error
    assert error.typical < 0.02
    assert error.typical < error.worst < 0.1
    assert f"{error.worst:.2g}" in error.sentence
    assert f"after {error.transits} transits" in error.sentence


@pytest.mark.parametrize("values", AIRS)
def test_depths_against_the_full_model(narrow, narrow_workshop, narrow_reduced, values):
    """Depth, share and slope in every bin within a tenth of the noise after all transits, far from the training too."""
    scenario, case = vary(narrow, narrow.cases[0], values)
    full = ForwardModel(scenario, narrow_workshop.opacities, [view.means() for view in narrow_workshop.views])
    few = narrow_reduced.of(scenario).model
    view = narrow_workshop.views[0]
    noise = np.sqrt(view.noise.depth_error_ppm**2 / narrow.transits_on_offer + np.diag(view.floor_ppm2))
    for change in (Change(), Change(gravity=1.05)):
        one, other = (model.binned(case, change, shares_of=["N2O", "CO"])[0] for model in (full, few))
        assert np.abs((one.depth_ppm - other.depth_ppm) / noise).max() < 0.1
        for gas in ("N2O", "CO"):
            assert np.abs((one.shares_ppm[gas] - other.shares_ppm[gas]) / noise).max() < 0.1
            assert np.abs((one.slopes_ppm[gas] - other.slopes_ppm[gas]) / noise).max() < 0.1


@pytest.mark.parametrize("values", AIRS)
def test_transits_against_the_full_model(narrow, narrow_workshop, narrow_reduced, values):
    """The unrounded number of transits within 2 %, marginalised and all known, where it is finite."""
    scenario, case = vary(narrow, narrow.cases[0], values)

    class Full:
        views = narrow_workshop.views
        model = ForwardModel(scenario, narrow_workshop.opacities, [view.means() for view in views])
        thin = model

    target = target_snr(narrow.goal.threshold_sigma, narrow.goal.power)
    full, few = (see(setting, case).measurements[0] for setting in (Full(), narrow_reduced.of(scenario)))
    assert few.snr(100) == pytest.approx(full.snr(100), rel=0.01)
    assert few.known().snr(100) == pytest.approx(full.known().snr(100), rel=0.01)
    assert (few.transits_for(target) is None) == (full.transits_for(target) is None)
    if full.transits_for(target) is not None:
        assert few.transits_for(target) == pytest.approx(full.transits_for(target), rel=0.02)


def test_bins_that_few_samples_do_not_serve(narrow, narrow_workshop, monkeypatch):
    """A bin that fails every proof keeps all its samples: what is allowed is kept to, whatever the scenario."""
    hopeless = {"_TRAINING": 4, "_TRAINING_PER_CASE": 1, "_CHECKS": 2, "_PROOFS": 2, "_ROUNDS": 1, "_ALLOWED": 1e-13}
    for name, value in hopeless.items():
        monkeypatch.setattr(module, name, value)
    error, *rows = module._Choice(narrow_workshop, domain_of(narrow), lambda text, share: None).make()
    assert error[0] == 0.0
    view, table = narrow_workshop.views[0], np.array(rows)
    few = SparseMeans([module._bin_of(table, 0, b) for b in range(len(view.bins))])
    samples = np.random.default_rng(0).normal(size=(2, narrow_workshop.opacities.grid.count))
    np.testing.assert_allclose(few(samples), view.means()(samples), rtol=1e-9, atol=1e-12)


def test_combined_modes_share_the_samples_of_their_parts(narrow, narrow_workshop, narrow_reduced):
    """A combination has the bins of its parts one after the other, and takes no samples of its own."""
    both = narrow.model_copy(update={"modes": ("grism-4-to-5-um", "grism-2-to-4-um", "combined")})
    workshop = Workshop(both)
    reduced = reduce_opacity(workshop, domain_of(both))
    one, other, combined = reduced.model.binned(both.cases[0])
    np.testing.assert_array_equal(combined.depth_ppm, np.concatenate([one.depth_ppm, other.depth_ppm]))
    assert reduced.error.bins == one.depth_ppm.size + other.depth_ppm.size
    few = see(reduced.of(both), both.cases[0]).measurements[2]
    assert few.snr(30) == pytest.approx(see(workshop, both.cases[0]).measurements[2].snr(30), rel=0.01)


def test_choice_comes_from_the_store(narrow, narrow_workshop, narrow_reduced, monkeypatch):
    """What was chosen once is not chosen again, and another domain is another choice."""

    def fail(self):
        raise AssertionError("chosen again")

    monkeypatch.setattr(module._Choice, "make", fail)
    again = reduce_opacity(Workshop(narrow), domain_of(narrow, temperature=True))
    np.testing.assert_array_equal(
        again.model.opacities.wavenumber_per_cm, narrow_reduced.model.opacities.wavenumber_per_cm
    )
    assert again.error == narrow_reduced.error
    elsewhere = domain_of(narrow, wider={"cloud_top": (3e-6, 2.0)})
    with pytest.raises(AssertionError, match="chosen again"):
        reduce_opacity(Workshop(narrow), elsewhere)


def test_sparse_means():
    """Weighted sums bin by bin, over the last axis."""
    means = SparseMeans([(np.array([0, 2]), np.array([0.25, 0.75])), (np.array([1]), np.array([1.0]))])
    samples = np.array([[1.0, 2.0, 3.0], [0.0, 1.0, 4.0]])
    np.testing.assert_allclose(means(samples), [[2.5, 2.0], [3.0, 1.0]])


def test_lines_summed_on_the_selection_alone(narrow_workshop):
    """A selection's own tables are those of the whole grid to a part in ten thousand."""
    index = np.arange(100, 12000, 371)
    shared = narrow_workshop.opacities.selection(index)
    own = narrow_workshop.opacities.selection(index, own_tables=True)
    for gas in ("N2O", "CO"):
        one, other = (o.gas(gas, 250.0).log10_cross_section for o in (shared, own))
        there = one > -35
        np.testing.assert_allclose(other[there], one[there], atol=5e-5)
