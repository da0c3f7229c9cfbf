"""Simulated points against the spectrum they come from."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from planner.report.points import simulated_points


@pytest.fixture(scope="module")
def spectrum(fake_plan):
    return fake_plan.spectra[0]


def test_points_scatter_as_their_errors_say(spectrum):
    """Over many draws the pull of each point has mean 0 and standard deviation 1."""
    quiet = simulated_points(replace(spectrum, noise_one_transit_ppm=spectrum.noise_one_transit_ppm * 1e-9,
                                     floor_ppm=spectrum.floor_ppm * 0), 10, 30, np.random.default_rng(0))  # fmt: skip
    rng = np.random.default_rng(1)
    draws = [simulated_points(spectrum, 10, 30, rng) for _ in range(400)]
    pulls = np.array([(draw.depth_ppm - quiet.depth_ppm) / draw.error_ppm for draw in draws])
    assert abs(pulls.mean()) < 4 / np.sqrt(pulls.size)
    assert pulls.std() == pytest.approx(1, abs=4 / np.sqrt(2 * pulls.size))


def test_white_noise_averages_down(spectrum):
    """Without a floor a hundred transits are ten times better than one, and a point as good as all its bins."""
    bare = replace(spectrum, floor_ppm=spectrum.floor_ppm * 0)
    one = simulated_points(bare, 1, 30, np.random.default_rng(0))
    hundred = simulated_points(bare, 100, 30, np.random.default_rng(0))
    assert one.error_ppm == pytest.approx(10 * hundred.error_ppm)
    whole = simulated_points(bare, 1, 1, np.random.default_rng(0))
    used = bare.usable
    assert (whole.error_ppm**-2).sum() == pytest.approx((bare.noise_one_transit_ppm[used] ** -2).sum())


def test_floor_does_not_average_down_with_transits(spectrum):
    """After endless transits the error of a single bin is its floor."""
    every_bin = simulated_points(spectrum, 10**15, 10_000, np.random.default_rng(0))
    assert every_bin.error_ppm == pytest.approx(spectrum.floor_ppm[spectrum.usable], rel=1e-6)


def test_floor_of_finer_bins_is_shared(spectrum):
    """Splitting every bin in four within one element of R = 100 leaves the errors of the points nearly alone."""
    fine = {}
    for name in ("detector", "depth_ppm", "floor_ppm", "usable", "noise_one_transit_ppm"):
        fine[name] = np.repeat(getattr(spectrum, name), 4)
    ratio = (spectrum.to_um / spectrum.from_um) ** 0.25
    fine["from_um"] = (spectrum.from_um[:, None] * ratio[:, None] ** np.arange(4)).ravel()
    fine["to_um"] = fine["from_um"] * np.repeat(ratio, 4)
    narrow = np.log(spectrum.to_um / spectrum.from_um) < 0.0101
    split = simulated_points(replace(spectrum, **fine), 10**15, 30, np.random.default_rng(0))
    whole = simulated_points(spectrum, 10**15, 30, np.random.default_rng(0))
    last = narrow.nonzero()[0][0]
    mine, theirs = whole.from_um > spectrum.from_um[last], split.from_um > spectrum.from_um[last]
    assert np.median(split.error_ppm[theirs]) == pytest.approx(np.median(whole.error_ppm[mine]), rel=0.25)


def test_unusable_bins_and_gaps(spectrum):
    """No point rests on bins that are not usable, and none spans two detectors."""
    points = simulated_points(spectrum, 1, 500, np.random.default_rng(0))
    low, high = spectrum.from_um[~spectrum.usable].min(), spectrum.to_um[~spectrum.usable].max()
    assert not np.any((points.from_um < high - 1e-9) & (points.to_um > low + 1e-9))
    detector = (spectrum.from_um > 2.0).astype(np.int64)
    split = simulated_points(replace(spectrum, detector=detector), 1, 5, np.random.default_rng(0))
    edge = spectrum.from_um[detector == 1].min()
    assert not np.any((split.from_um < edge - 1e-9) & (split.to_um > edge + 1e-9))


def test_nothing_usable(spectrum):
    """A wholly saturated spectrum has no points."""
    points = simulated_points(replace(spectrum, usable=spectrum.usable & False), 1, 30, np.random.default_rng(0))
    assert points.depth_ppm.size == 0
