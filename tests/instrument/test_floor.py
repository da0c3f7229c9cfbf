"""The floor as a covariance."""

from __future__ import annotations

from typing import Any

import numpy as np
import pytest
from scipy.integrate import dblquad

from planner.instrument import Bins, floor_covariance, list_modes, make_bins, read_mode
from planner.instrument.floor import _mean_kernel


def best_snr(mode: Any, resolving_power: float) -> float:
    """S/N of a bump of Gaussian shape in ln(wavelength), 100 ppm high, with nothing but the floor."""
    bins = make_bins(mode, resolving_power)
    template = 100.0 * np.exp(-((np.log(bins.centre_um / 1.4) / 0.06) ** 2) / 2)
    return float(np.sqrt(template @ np.linalg.solve(floor_covariance(mode, bins), template)))


def test_reference_bin_has_the_quoted_floor(make_mode: Any) -> None:
    """With and without a correlation length, at the resolving power the floor is quoted for."""
    for length in (None, 0.001, 0.03, 5.0):
        floor = {"depth": "12 ppm", "resolving_power": 50}
        mode = make_mode(floor=floor if length is None else {**floor, "correlation_length": length})
        bins = Bins(detector=[0, 0], from_um=np.exp([0.10, 0.30]), to_um=np.exp([0.12, 0.32]))
        assert np.diag(floor_covariance(mode, bins)) == pytest.approx([144.0, 144.0])


def test_white_floor_scales_with_width(make_mode: Any) -> None:
    """A quarter of the width has twice the floor, and neighbours are independent."""
    bins = Bins(detector=[0, 0], from_um=np.exp([0.10, 0.11]), to_um=np.exp([0.11, 0.1125]))
    covariance = floor_covariance(make_mode(), bins)
    assert covariance == pytest.approx(np.diag([100.0, 400.0]))


@pytest.mark.parametrize("length", [None, 0.003, 0.02, 0.2])
def test_best_snr_does_not_depend_on_the_binning(make_mode: Any, length: float | None) -> None:
    """R = 50, 100 and 400 agree to 1 %, as long as the bins resolve the bump."""
    mode = make_mode(floor={} if length is None else {"correlation_length": length})
    reference = best_snr(mode, 100.0)
    assert best_snr(mode, 400.0) == pytest.approx(reference, rel=0.01)
    assert best_snr(mode, 50.0) == pytest.approx(reference, rel=0.03)


def test_merging_two_bins_merges_their_covariance(make_mode: Any) -> None:
    """The mean over both halves, weighted by width, has the variance of the whole, for both kinds of floor."""
    halves = Bins(detector=[0, 0], from_um=np.exp([0.1, 0.103]), to_um=np.exp([0.103, 0.11]))
    whole = Bins(detector=[0], from_um=np.exp([0.1]), to_um=np.exp([0.11]))
    weights = halves.width_ln / whole.width_ln
    for floor in ({}, {"correlation_length": 0.005}):
        mode = make_mode(floor=floor)
        merged = weights @ floor_covariance(mode, halves) @ weights
        assert merged == pytest.approx(floor_covariance(mode, whole)[0, 0])


def test_kernel_against_numerical_integration() -> None:
    """The closed form of the averaged exponential, bins alike, adjacent and apart, in both orders."""
    start, width, length = np.array([0.0, 0.02, 0.1]), np.array([0.02, 0.01, 0.03]), 0.025
    found = _mean_kernel(start, width, length)
    for i in range(3):
        for j in range(3):
            ends = (start[i], start[i] + width[i], start[j], start[j] + width[j])
            # split along the diagonal, where the kernel has its kink
            total = dblquad(lambda v, u: np.exp(-abs(u - v) / length), *ends[:2], *ends[2:], epsabs=1e-12)[0]
            assert found[i, j] == pytest.approx(total / (width[i] * width[j]), rel=1e-5)


def test_limits_of_the_correlation_length(make_mode: Any) -> None:
    """Very short is white; very long is one common offset."""
    bins = make_bins(make_mode(), 100.0)
    white = floor_covariance(make_mode(), bins)
    short = floor_covariance(make_mode(floor={"correlation_length": 1e-6}), bins)
    assert short == pytest.approx(white, rel=1e-3, abs=0.02)
    common = floor_covariance(make_mode(floor={"correlation_length": 1e5}), bins)
    assert common == pytest.approx(np.full_like(common, 100.0), rel=1e-4)


def test_detectors_are_independent(make_mode: Any) -> None:
    """Also where their ranges overlap."""
    mode = make_mode({}, {"ranges_um": [[1.5, 2.5]]}, floor={"correlation_length": 0.1})
    bins = make_bins(mode)
    covariance = floor_covariance(mode, bins)
    apart = bins.detector[:, None] != bins.detector[None, :]
    assert np.all(covariance[apart] == 0.0)
    assert np.all(covariance[~apart] > 0.0)


def test_photometer_has_the_quoted_floor() -> None:
    """However wide the channel is."""
    mode = read_mode("survey-telescope-1m")
    covariance = floor_covariance(mode, make_bins(mode))
    assert np.diag(covariance)[:3] == pytest.approx(mode.floor.depth_ppm**2)


@pytest.mark.parametrize("name", list_modes())
def test_covariance_can_be_inverted(name: str) -> None:
    """Symmetric and positive definite for each shipped mode."""
    mode = read_mode(name)
    covariance = floor_covariance(mode, make_bins(mode))
    assert np.array_equal(covariance, covariance.T)
    assert np.linalg.eigvalsh(covariance).min() > 0
