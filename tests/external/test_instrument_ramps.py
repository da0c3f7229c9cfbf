"""Up-the-ramp slope noise: Rauscher et al. 2007, PASP 119, 768, with the erratum of 2010, PASP 122, 1254."""

from __future__ import annotations

import numpy as np
import pytest

from planner.instrument.ramps import slope_variance_e2, slope_variance_terms

READ_NOISE_E, FRAME_TIME_S, RATE_E_PER_S = 15.0, 10.7, 0.5


def variance_by_covariance(groups: int, frames: int, frame_s: float, rate: float, read_noise: float) -> float:
    """The variance of the fitted slope from the covariance of every single frame, times the span squared.

    Charge after t has variance ``rate t``; two frames share that of the earlier one; each has its own read noise.
    """
    time_s = frame_s * np.arange(1, groups * frames + 1)
    covariance = rate * np.minimum(time_s[:, None], time_s[None, :]) + read_noise**2 * np.eye(time_s.size)
    averaging = np.kron(np.eye(groups), np.full(frames, 1 / frames))
    group_time_s = averaging @ time_s
    centred = group_time_s - group_time_s.mean()
    weights = (centred / (centred @ centred)) @ averaging
    span_s = (groups - 1) * frames * frame_s
    return float(weights @ covariance @ weights * span_s**2)


@pytest.mark.parametrize(
    ("groups", "frames", "exact_e2", "printed_2007_e2"),
    [
        (2, 1, 455.350000, 455.350000),
        (10, 1, 273.961636, 273.961636),
        (5, 3, 182.963556, 182.012444),
        (22, 4, 543.247381, 542.581275),
        (22, 8, 1044.307485, 1041.976112),
    ],
)
def test_worked_values(groups: int, frames: int, exact_e2: float, printed_2007_e2: float) -> None:
    """Exact values worked by covariance; the third term as first printed is off from three frames per group on."""
    found = slope_variance_e2(
        groups=groups,
        frames_per_group=frames,
        frame_time_s=FRAME_TIME_S,
        rate_e_per_s=RATE_E_PER_S,
        read_noise_e=READ_NOISE_E,
    )
    assert found == pytest.approx(exact_e2, abs=1e-6)
    if frames > 2:
        assert abs(found - printed_2007_e2) > 0.5


@pytest.mark.parametrize("groups", [2, 3, 5, 17])
@pytest.mark.parametrize("frames", [1, 2, 3, 8])
def test_against_covariance(groups: int, frames: int) -> None:
    """The closed form equals the covariance of all frames."""
    read_factor, rate_factor_s = slope_variance_terms(groups, frames, 2.5)
    expected = variance_by_covariance(groups, frames, 2.5, 40.0, 12.0)
    assert read_factor * 12.0**2 + rate_factor_s * 40.0 == pytest.approx(expected, rel=1e-10)


@pytest.mark.parametrize(
    ("groups", "read_factor"), [(2, 2.0), (3, 2.0), (5, 1.6), (10, 0.98182), (50, 0.23059), (100, 0.11762)]
)
def test_read_factor(groups: int, read_factor: float) -> None:
    """12 (n-1) / (n (n+1)); two groups are a correlated double sample."""
    assert slope_variance_terms(groups, 1, 1.0)[0] == pytest.approx(read_factor, abs=5e-6)


@pytest.mark.parametrize(
    ("groups", "excess"), [(2, 1.0), (3, 1.0), (5, 1.04), (10, 1.10182), (50, 1.17694), (100, 1.18824)]
)
def test_photon_factor(groups: int, excess: float) -> None:
    """Over plain counting during the span; unweighted fits cost up to 1.2."""
    assert slope_variance_terms(groups, 1, 3.0)[1] / (3.0 * (groups - 1)) == pytest.approx(excess, abs=5e-6)


def test_published_requirement() -> None:
    """22 groups of 4 frames of 10.73676 s, 15 e-, 0.005 e-/s: 5.7605 e-, against a requirement of 6 (from memory)."""
    variance = slope_variance_e2(
        groups=22, frames_per_group=4, frame_time_s=10.73676, rate_e_per_s=0.005, read_noise_e=15.0
    )
    assert np.sqrt(variance) == pytest.approx(5.7605, abs=5e-5)
    assert np.sqrt(variance) < 6.0
