"""Fits of shapes against a dense covariance and against the stated significance of a matched filter."""

from __future__ import annotations

import numpy as np
import pytest

from planner.detection.significance import Measurement
from planner.studies.checks.fits import Fits

RNG = np.random.default_rng(3)
BINS = 40
PLACE = np.linspace(-1, 1, BINS)
BAND = 50 * np.exp(-0.5 * (PLACE / 0.15) ** 2)
BESIDE = 50 * np.exp(-0.5 * ((PLACE - 0.1) / 0.15) ** 2)
ERROR = 10 + 5 * RNG.random(BINS)
UNKNOWN = np.array([np.full(BINS, 1e4), 300 * PLACE])


def dense_chi2(depth, shape, error=ERROR, unknown=UNKNOWN):
    """The slow way: the whole covariance inverted, amounts zero or more."""
    inverse = np.linalg.inv(np.diag(error**2) + unknown.T @ unknown)
    if shape is None:
        return depth @ inverse @ depth
    best = max(0.0, shape @ inverse @ depth / (shape @ inverse @ shape))
    left = depth - best * shape
    return left @ inverse @ left


def test_chi2_against_a_dense_covariance():
    """To the accuracy that inverting the covariance has."""
    depth = BAND + ERROR * RNG.standard_normal(BINS) + 200
    fits = Fits(depth, ERROR, UNKNOWN)
    assert fits.empty_chi2 == pytest.approx(dense_chi2(depth, None), rel=1e-3)
    assert fits.chi2([BESIDE]) == pytest.approx(dense_chi2(depth, BESIDE), rel=1e-3)


def test_expected_spectrum_has_the_stated_significance():
    """Without noise the fit's sigma is the S/N of the matched filter with the same nuisances."""
    stated = Measurement(
        template_ppm=BAND,
        white_ppm=ERROR,
        floor_ppm2=np.zeros((BINS, BINS)),
        nuisances=("level", "slope"),
        directions_ppm=UNKNOWN,
    ).snr(1.0)
    fits = Fits(BAND, ERROR, UNKNOWN)
    assert fits.sigma([BAND]) == pytest.approx(stated, rel=1e-9)
    assert fits.amplitude(BAND) == pytest.approx((1.0, 1 / stated), rel=1e-9)


def test_level_plays_no_part():
    """A constant added to a spectrum changes nothing that is fitted."""
    one, other = Fits(BAND, ERROR, UNKNOWN), Fits(BAND + 50, ERROR, UNKNOWN)
    assert other.sigma([BAND]) == pytest.approx(one.sigma([BAND]), rel=1e-3)


def test_beyond():
    """A shape beats a neighbour by root of 1 - cosine^2 of its sigma, itself and its multiples by nothing."""
    fits = Fits(BAND, ERROR, np.zeros((0, BINS)))
    a, b = BAND / ERROR, BESIDE / ERROR
    cosine = a @ b / np.sqrt((a @ a) * (b @ b))
    assert fits.beyond(BAND, [BESIDE]) == pytest.approx(fits.sigma([BAND]) * np.sqrt(1 - cosine**2), rel=1e-9)
    assert fits.beyond(BAND, [3 * BAND]) == pytest.approx(0, abs=1e-6)
    assert fits.beyond(BAND, [BESIDE, BAND - 0.5 * BESIDE]) == pytest.approx(0, abs=1e-6)


def test_no_absorption_upside_down():
    """Amounts are never negative: a dip is no band, and a single amplitude says so by its sign."""
    fits = Fits(-BAND, ERROR, UNKNOWN)
    assert fits.amounts([BAND]).tolist() == [0.0]
    assert fits.sigma([BAND]) == 0.0
    assert fits.amplitude(BAND)[0] == pytest.approx(-1.0, rel=1e-9)


def test_scatter_of_amplitudes():
    """Over 2000 noisy spectra the amplitude scatters by its stated error (to 4 of its own standard errors)."""
    found = [Fits(BAND + ERROR * RNG.standard_normal(BINS), ERROR, UNKNOWN).amplitude(BAND)[0] for _ in range(2000)]
    error = Fits(BAND, ERROR, UNKNOWN).amplitude(BAND)[1]
    assert np.std(found) == pytest.approx(error, rel=4 / np.sqrt(2 * 2000))
    assert np.mean(found) == pytest.approx(1.0, abs=4 * error / np.sqrt(2000))
