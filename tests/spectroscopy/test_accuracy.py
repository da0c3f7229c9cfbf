"""The figure of merit of embedded lists."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.special import exp1

from planner.spectroscopy.accuracy import STRONG_MARKS, WindowScore, alike, compare, compare_cross_sections
from planner.spectroscopy.heights import effective_heights, grey_heights
from planner.spectroscopy.lines import Lines

EULER = 0.5772156649015329
SURFACE_DENSITY_PER_CM3 = 1.0e6 / (1.380649e-16 * 250.0)
VERTICAL_TO_CHORD_CM = np.sqrt(2.0 * np.pi * 5.870e8 * 9.0e5)


def _line(wavenumber: float = 2500.0, intensity: float = 1e-19, isotopologue: int = 1) -> Lines:
    return Lines.make(
        molecule=5,
        isotopologue=isotopologue,
        wavenumber_per_cm=wavenumber,
        intensity_cm=intensity,
        lower_energy_per_cm=100.0,
        air_width_per_cm_atm=0.07,
        temperature_exponent=0.7,
    )


@pytest.mark.parametrize("ratio", [1e-6, 1e-4, 1e-2])
def test_grey_gas_reaches_the_closed_form(ratio: float) -> None:
    """h = H (gamma + ln tau0 + E1(tau0)) for a cross-section that does not depend on height."""
    sigma = 1e-20
    depth = ratio * sigma * SURFACE_DENSITY_PER_CM3 * VERTICAL_TO_CHORD_CM
    height = effective_heights(None, 2000.0, 2002.0, 100.0, [ratio], smooth=lambda grid, _: np.full(grid.size, sigma))
    # the planet's radius grows along the way by up to 2 %, and the levels are a quarter scale height apart
    assert height[0, 0] == pytest.approx(EULER + np.log(depth) + exp1(depth), abs=0.02)


def test_far_wing_climbs_half_as_fast() -> None:
    """A Lorentz wing grows with pressure: a hundred times the gas lifts it by ln(100)/2 scale heights."""
    strong = _line(intensity=1e-18)
    low, high = effective_heights(strong, 2503.0, 2503.5, 100.0, [1e-3, 1e-1])[:, 0]
    assert high - low == pytest.approx(np.log(100.0) / 2.0, abs=0.02)


def test_bins_tile_the_window() -> None:
    """The number of bins is that of the resolving power, and their means add up to the mean of the window."""
    smooth = lambda grid, _: 1e-20 * (grid / 2000.0) ** 3  # noqa: E731
    fine = effective_heights(None, 2000.0, 2100.0, 1000.0, [1e-4], smooth=smooth)
    whole = effective_heights(None, 2000.0, 2100.0, 1.0, [1e-4], smooth=smooth)
    assert fine.shape == (1, 49)
    assert fine.mean() == pytest.approx(whole[0, 0], abs=2e-3)


def test_list_compared_with_itself_is_perfect() -> None:
    """No difference at all, and every mark is met."""
    score = compare(_line(), _line(), (2499.0, 2501.0))
    assert score.bins[1, 2] == 1
    assert np.nanmax(np.abs([score.percentile_90, score.median, score.mean])) == 0.0
    assert score.passes()


def test_weak_lines_differ_by_the_logarithm_of_their_ratio() -> None:
    """In the far wing the height goes with half the logarithm of the intensity, so a factor e**2 is one H."""
    score = compare(_line(intensity=1e-19 * np.e**2), _line(), (2503.0, 2503.5), mixing_ratios=(1e-6, 1e-4, 1e-1))
    assert score.mean[0, 2] == pytest.approx(1.0, abs=0.05)
    assert np.isnan(score.mean[0, 0])
    assert score.bins[0, 0] == 0


def test_a_bias_fails_the_marks() -> None:
    """Lines ten times too strong cannot pass."""
    score = compare(_line(intensity=1e-18), _line(), (2499.0, 2501.0))
    assert not score.passes()
    assert "R=1000" in score.describe()


def test_like_with_like_drops_what_the_real_list_cannot_hold() -> None:
    """Other isotopologues, other stretches and, when asked, lines below the cut-off are left out."""
    real = Lines.join([_line(2500.0), _line(2510.0, 1e-22)])
    ours = Lines.join([_line(2505.0), _line(2505.0, isotopologue=2), _line(2520.0), _line(2506.0, 1e-24)])
    assert alike(ours, real).wavenumber_per_cm.tolist() == [2505.0, 2506.0]
    assert alike(ours, real, same_cut=True).wavenumber_per_cm.tolist() == [2505.0]


def test_verdict_needs_every_mixing_ratio() -> None:
    """One mixing ratio beyond its mark spoils the verdict."""
    fields = {
        "window_per_cm": (2000.0, 2100.0),
        "resolving_powers": (100.0,),
        "mixing_ratios": (1e-6, 1e-4, 1e-2),
        "bins": np.array([[5, 5, 5]]),
        "median": np.array([[0.0, 0.0, 0.0]]),
        "mean": np.array([[0.0, 0.0, 0.0]]),
    }
    assert WindowScore(**fields, percentile_90=np.array([[0.19, 0.24, 0.34]])).passes()
    assert not WindowScore(**fields, percentile_90=np.array([[0.19, 0.24, 0.36]])).passes()


def test_heights_of_a_constant_cross_section() -> None:
    """The quick way for cross-sections that know no pressure agrees with the general one."""
    sigma = np.geomspace(1e-24, 1e-16, 9)
    quick = grey_heights(sigma, [1e-6, 1e-4])
    for value, heights in zip(sigma, quick.T, strict=True):
        general = effective_heights(None, 2000.0, 2000.1, 1.0, [1e-6, 1e-4], smooth=lambda nu, _, v=value: nu * 0 + v)
        assert general[:, 0] == pytest.approx(heights, abs=1e-3)


def test_measured_cross_sections_are_compared_where_they_exceed_their_noise() -> None:
    """A factor e is one scale height; bins within five times the noise do not count."""
    grid = np.linspace(1000.0, 1100.0, 2001)
    real = np.where(grid < 1048.8, 1e-19, 1e-22)  # an edge of a bin
    score = compare_cross_sections(np.e * real, real, (1000.0, 1100.0), noise_cm2=1e-22)
    assert score.bins[0].tolist() == [0, 5, 5]
    assert score.mean[0, 1:] == pytest.approx([1.0, 1.0], abs=0.05)
    assert not score.passes(STRONG_MARKS)
    assert compare_cross_sections(real, real, (1000.0, 1100.0)).passes(STRONG_MARKS)
