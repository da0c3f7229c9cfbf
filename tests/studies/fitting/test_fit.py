"""Whole fits of a small spectrum: what comes out, the same twice, taken up again, and refused."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from planner.errors import RangeError, StoreError
from planner.report.fitstate import FitFolder
from planner.studies.fit import fit

LIVE = 40


def small_fit(small, observed, **more):
    return fit(small, observed, spectrum="small.csv", live=LIVE, **more)


@pytest.fixture(scope="module")
def result(small, small_observed):
    return small_fit(small, small_observed)


def test_what_was_put_in_comes_out(result):
    """Mixing ratios, temperature and level inside the middle 95 % of their posteriors."""
    found = {one.name: one for one in (*result.found, *result.offsets)}
    for name, value in (("N2O", 1e-5), ("CO", 1e-5), ("temperature", 250.0), ("offset of the spectrum", 30.0)):
        assert found[name].low_95 < value < found[name].high_95, name
    assert result.goodness.parameters == 4
    assert result.goodness.verdict == "the model describes the data"


def test_full_grid_agrees(result):
    """Reduced opacity moves no mean by a tenth of its width, and the draws keep their weights."""
    assert result.recheck.draws == 200
    assert result.recheck.effective_size > 150
    assert max(abs(shift) for _, shift in result.recheck.shifts) < 0.1
    assert abs(result.recheck.ln_evidence_shift) < 0.1


def test_bins_tell_what_carries_the_gas(result):
    """Bands of the model enclose its median, and each bin has its say."""
    bins = result.bins
    assert np.all(np.diff(bins.bands_ppm, axis=0) >= 0)
    assert bins.gases == ("N2O", "CO")
    assert bins.left_out_shift.shape == (2, 12)
    assert bins.left_out_gain is None
    assert np.all(bins.left_out_size > 0)


class _Stops:
    """Keeps states in a folder and stops the program after some of them."""

    def __init__(self, folder, after):
        self._folder, self._left = FitFolder(folder), after

    def fetch(self, name, key):
        return self._folder.fetch(name, key)

    def keep(self, name, key, state):
        self._folder.keep(name, key, state)
        self._left -= 1
        if self._left == 0:
            raise KeyboardInterrupt


@pytest.mark.slow
def test_taken_up_after_an_interrupt(small, small_observed, result, tmp_path):
    """The same command goes on and ends as if it had never stopped; another seed's state is refused."""
    with pytest.raises(KeyboardInterrupt):
        small_fit(small, small_observed, keeper=_Stops(tmp_path, after=3))
    with pytest.raises(StoreError, match="saved by another fit"):
        small_fit(small, small_observed, seed=2, keeper=FitFolder(tmp_path))
    again = small_fit(small, small_observed, keeper=FitFolder(tmp_path))
    assert again.evidences == result.evidences
    for one, other in zip(again.found, result.found, strict=True):
        np.testing.assert_array_equal(one.draws, other.draws)


@pytest.mark.slow
def test_state_of_another_spectrum(small, small_observed, tmp_path):
    """A depth that changed in its last digit is another fit."""
    with pytest.raises(KeyboardInterrupt):
        small_fit(small, small_observed, keeper=_Stops(tmp_path, after=1))
    other = replace(small_observed, depth_ppm=small_observed.depth_ppm + 1e-9)
    with pytest.raises(StoreError, match="saved by another fit"):
        small_fit(small, other, keeper=FitFolder(tmp_path))


@pytest.mark.slow
def test_without_a_gas_that_is_there(small, small_observed, result):
    """The evidence speaks for it, as much as the low end of its posterior says (Savage and Dickey's ratio)."""
    both = small_fit(small, small_observed, without="CO")
    ln_bayes, error = both.ln_bayes
    there = next(one for one in result.found if one.name == "CO")
    assert both.evidences[0] == result.evidences[0]  # the question is no part of the first run
    assert both.evidences[1].parameters == 2
    assert both.bins.left_out_gain.shape == (12,)
    if there.low_end_share > 0.05:
        assert ln_bayes == pytest.approx(-np.log(there.low_end_share), abs=3 * error + 0.3)
    else:
        assert ln_bayes > 1.5


def test_gas_that_is_not_in_the_air(small, small_observed):
    """Refused before any work."""
    with pytest.raises(RangeError, match=r"SF6 is not fitted; expected one of N2O, CO"):
        small_fit(small, small_observed, without="SF6")


def test_gas_without_data(small, small_observed):
    """Where the gas has no data in the range of the spectrum, nothing can be said of it."""
    blind = small.model_copy(
        update={"candidates": (small.candidates[0].model_copy(update={"gas": "Ar"}),)},
    )
    with pytest.raises(RangeError, match=r"Ar: no data from 4.35 to 5.01 um; bring some with --lines"):
        small_fit(blind, small_observed, without="Ar")


def test_limits_follow_the_draws(result):
    """What is reported is what the draws say."""
    for found in result.found:
        values = 10**found.draws if found.logarithmic else found.draws
        assert found.median == pytest.approx(np.median(values), rel=1e-6)
