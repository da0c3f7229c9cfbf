"""Stated rates beside those of simulated observations."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from planner.detection.significance import Measurement, one_sided_sigma
from planner.instrument.binning import Bins
from planner.studies.results import BandShare
from planner.studies.simulation import sigma_anywhere, simulate_search

EDGES_UM = np.geomspace(3.0, 5.0, 52)
BINS = Bins(detector=np.zeros(51, dtype=np.int64), from_um=EDGES_UM[:-1], to_um=EDGES_UM[1:])
BAND = BandShare(from_um=3.9, to_um=4.1, share=0.8)


def measured(amplitude=60.0):
    shape = np.exp(-0.5 * (np.log(BINS.centre_um / 4.0) / 0.02) ** 2)
    return Measurement(
        template_ppm=amplitude * shape,
        white_ppm=np.full(51, 90.0),
        floor_ppm2=np.eye(51) * 8.0**2,
        nuisances=("offset",),
        directions_ppm=np.full((1, 51), 1000.0),
    )


def simulated(seed=3, draws=4000, amplitude=60.0):
    return simulate_search(
        measured(amplitude),
        BINS,
        BAND,
        transits=20,
        threshold_sigma=5.0,
        draws=draws,
        rng=np.random.default_rng(seed),
    )


def test_found_agrees_with_stated():
    """Power and false alarms within three standard errors."""
    result = simulated()
    assert 0.1 < result.power_stated < 0.9
    assert abs(result.power_found - result.power_stated) < 3 * result.power_error
    assert abs(result.false_alarms_found - result.false_alarms_stated) < 3 * result.false_alarms_error
    assert one_sided_sigma(result.false_alarms_stated) == pytest.approx(result.false_alarm_sigma)


def test_counts_follow_the_normal_curve():
    """Every draw is counted; means with and without the gas are what is stated, and the width is one sigma."""
    result = simulated()
    middles = np.convolve(result.sigma_edges, [0.5, 0.5], "valid")
    for counts, mean in ((result.counts_there, result.snr_stated), (result.counts_absent, 0.0)):
        assert sum(counts) == result.draws
        assert np.average(middles, weights=counts) == pytest.approx(mean, abs=4 / np.sqrt(result.draws))
        assert np.average((middles - mean) ** 2, weights=counts) == pytest.approx(1.0, abs=0.1)


def test_same_seed_same_rates():
    """A plan can be made again."""
    assert simulated() == simulated()
    assert simulated(seed=4).power_found != simulated().power_found


def test_searching_everywhere_asks_for_more():
    """More than one place needs more than the threshold, and narrow features have more places than wide ones."""
    wide = BandShare(from_um=3.4, to_um=4.6, share=0.8)
    needed = [sigma_anywhere(measured(), BINS, band, 20, 5.0) for band in (BAND, wide)]
    assert 6.0 > needed[0] > needed[1] > 5.0


def test_gap_adds_no_places():
    """Bins left out in the middle do not count as places to look."""
    kept = (BINS.centre_um < 3.4) | (BINS.centre_um > 4.4)
    m = measured()
    part = replace(
        m,
        template_ppm=m.template_ppm[kept],
        white_ppm=m.white_ppm[kept],
        floor_ppm2=m.floor_ppm2[np.ix_(kept, kept)],
        directions_ppm=m.directions_ppm[:, kept],
    )
    bins = Bins(detector=BINS.detector[kept], from_um=BINS.from_um[kept], to_um=BINS.to_um[kept])
    assert sigma_anywhere(part, bins, BAND, 20, 5.0) < sigma_anywhere(m, BINS, BAND, 20, 5.0)


def test_single_bin_has_one_place():
    """A photometer cannot look elsewhere; its one feature needs no more than the threshold."""
    bins = Bins(detector=np.array([0]), from_um=np.array([3.0]), to_um=np.array([5.0]))
    one = Measurement(
        template_ppm=np.array([30.0]), white_ppm=np.array([50.0]), floor_ppm2=np.zeros((1, 1)),
        directions_ppm=np.zeros((0, 1)),
    )  # fmt: skip
    band = BandShare(from_um=3.0, to_um=5.0, share=1.0)
    assert sigma_anywhere(one, bins, band, 20, 5.0) == pytest.approx(5.0)
