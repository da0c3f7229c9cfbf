"""Statistical lines: sums, law of the strengths, lower energies, reproducibility."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.special import exp1, gamma, gammaincc

from planner.errors import LineDataError
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.statistical import (
    lower_energies,
    relative_strengths,
    statistical_lines,
    with_satellites,
)

METHANE = 6


def part(**changes):
    """Two bins, the second with many lines."""
    return {
        "isotopologue": 1,
        "seed": 5,
        "weakest": 1e-3,
        "self_width_ratio": 1.3,
        "bins": [
            [2000.0, 2010.0, 3e-21, 20.0, 400.0, 600.0, 250.0, 0.06, 0.7],
            [2010.0, 2050.0, 1e-20, 4000.0, 300.0, 450.0, 200.0, 0.05, 0.8],
        ],
    } | changes


def in_bin(lines: Lines, low: float, high: float) -> Lines:
    """The lines between two wavenumbers."""
    return lines.where((lines.wavenumber_per_cm >= low) & (lines.wavenumber_per_cm < high))


def test_bins_keep_their_sum_and_count():
    """Each bin holds its S exactly, in density times exp1(weakest) lines."""
    lines = statistical_lines(part(), METHANE)
    for low, high, total, density, *_ in part()["bins"]:
        here = in_bin(lines, low, high)
        assert here.intensity_cm.sum() == pytest.approx(total, rel=1e-12)
        assert len(here) == round(density * exp1(1e-3))


def test_lines_are_spread_evenly():
    """As many equal cells as lines, one line in each."""
    here = in_bin(statistical_lines(part(), METHANE), 2010.0, 2050.0)
    cells = np.floor((here.wavenumber_per_cm - 2010.0) / 40.0 * len(here)).astype(int)
    assert np.array_equal(cells, np.arange(len(here)))


def test_density_returns_from_the_lines():
    """(sum of roots)^2 / (pi S), which fixes the curve of growth, is the stated density."""
    here = in_bin(statistical_lines(part(), METHANE), 2010.0, 2050.0)
    density = np.sqrt(here.intensity_cm).sum() ** 2 / (np.pi * here.intensity_cm.sum())
    # lines below the cut carry gamma(1/2, 0..weakest) of the roots: 2 sqrt(1e-3)/sqrt(pi) = 3.6 %, twice that squared
    assert density == pytest.approx(4000.0, rel=0.08)


@pytest.mark.parametrize("weakest", [1e-3, 1e-2])
def test_moments_of_the_strengths(weakest):
    """Means of x and of its root against the integrals of exp(-x)/x and exp(-x)/sqrt(x)."""
    x = relative_strengths(200_000, weakest)
    assert np.all(np.diff(x) > 0)
    assert x.mean() == pytest.approx(np.exp(-weakest) / exp1(weakest), rel=1e-4)
    root = gamma(0.5) * gammaincc(0.5, weakest) / exp1(weakest)
    assert np.sqrt(x).mean() == pytest.approx(root, rel=1e-4)


def test_strengths_are_at_equal_steps():
    """The share of lines beyond the n-th is (count - n - 1/2)/count."""
    x = relative_strengths(50, 1e-2)
    assert exp1(x) / exp1(1e-2) == pytest.approx(1.0 - (np.arange(50) + 0.5) / 50, rel=1e-5)


def test_lower_energies_have_both_means():
    """Weighted with S and with its root the lower energies average to the stated numbers."""
    # the spread is no wider than the dependence on strength makes it, so that nothing is drawn
    rows = [[2010.0, 2050.0, 1e-20, 4000.0, 3000.0, 3200.0, 150.0, 0.05, 0.8]]
    lines = statistical_lines(part(bins=rows, weakest=1e-5), METHANE)
    strong = np.average(lines.lower_energy_per_cm, weights=lines.intensity_cm)
    weak = np.average(lines.lower_energy_per_cm, weights=np.sqrt(lines.intensity_cm))
    assert strong == pytest.approx(3000.0, rel=1e-3)
    assert weak == pytest.approx(3200.0, rel=2e-3)


@pytest.mark.parametrize(("count", "within"), [(20_000, 0.01), (100, 0.08), (20, 0.12)])
@pytest.mark.parametrize(
    ("mean", "mean_sqrt", "spread"), [(300.0, 450.0, 200.0), (800.0, 820.0, 120.0), (250.0, 250.0, 400.0)]
)
def test_lower_energies_have_their_spread(mean, mean_sqrt, spread, count, within):
    """The weighted standard deviation is the stated one, in a bin of few lines within a few per cent."""
    x = relative_strengths(count, 1e-3)
    energy = lower_energies(x, mean, mean_sqrt, spread)
    average = np.average(energy, weights=x)
    assert average == pytest.approx(mean, rel=1e-12)
    assert np.sqrt(np.average((energy - average) ** 2, weights=x)) == pytest.approx(spread, rel=within)


@pytest.mark.parametrize("temperature_k", [200.0, 400.0])
def test_bin_of_a_classical_gas_follows_a_power_law(temperature_k):
    """A mean of (n/2) kT with variance (n/2) (kT)^2 is a gas of n degrees of freedom: its sum goes as T^(n/2).

    The law behind rotational partition functions (Herzberg 1945, Infrared and Raman Spectra, p. 505), here n = 3.
    """
    thermal = 296.0 / 1.438776877
    energy = lower_energies(relative_strengths(20_000, 1e-3), 1.5 * thermal, 1.5 * thermal, np.sqrt(1.5) * thermal)
    warmer = np.exp(-1.438776877 * energy * (1.0 / temperature_k - 1.0 / 296.0))
    found = np.average(warmer, weights=relative_strengths(20_000, 1e-3))
    assert found == pytest.approx((temperature_k / 296.0) ** 1.5, rel=5e-3)


def test_without_spread_lower_energies_follow_the_strengths():
    """No spread beyond what the two means ask for: equal strengths, equal energies."""
    energy = lower_energies(relative_strengths(500, 1e-3), 3000.0, 3200.0, 0.0)
    assert np.all(np.diff(energy) < 0)


def test_lower_energies_are_never_negative():
    """A steep law is cut at zero."""
    rows = [[2010.0, 2050.0, 1e-20, 400.0, 100.0, 600.0, 150.0, 0.05, 0.8]]
    assert statistical_lines(part(bins=rows), METHANE).lower_energy_per_cm.min() == 0.0


def test_seed_decides():
    """The same seed gives the same lines, another seed others."""
    first, again = statistical_lines(part(), METHANE), statistical_lines(part(), METHANE)
    other = statistical_lines(part(seed=6), METHANE)
    assert np.array_equal(first.wavenumber_per_cm, again.wavenumber_per_cm)
    assert np.array_equal(first.intensity_cm, again.intensity_cm)
    assert not np.array_equal(first.wavenumber_per_cm, other.wavenumber_per_cm)


def test_widths_and_labels():
    """Widths and exponents are those of the bin; the self width is a multiple."""
    lines = in_bin(statistical_lines(part(), METHANE), 2000.0, 2010.0)
    assert set(lines.air_width_per_cm_atm) == {0.06}
    assert lines.self_width_per_cm_atm == pytest.approx(0.078)
    assert set(lines.temperature_exponent) == {0.7}
    assert set(lines.molecule) == {METHANE}


@pytest.mark.parametrize(
    "row",
    [
        [2000.0, 1990.0, 1e-21, 20.0, 400.0, 600.0, 250.0, 0.06, 0.7],
        [2000.0, 2010.0, -1e-21, 20.0, 400.0, 600.0, 250.0, 0.06, 0.7],
        [2000.0, 2010.0, 1e-21, 0.0, 400.0, 600.0, 250.0, 0.06, 0.7],
        [2000.0, 2010.0, 1e-21, 20.0, float("nan"), 600.0, 250.0, 0.06, 0.7],
        [2000.0, 2010.0, 1e-21, 20.0, 400.0, 600.0, -250.0, 0.06, 0.7],
        [2000.0, 2010.0, 1e-21],
    ],
)
def test_bad_bins(row):
    """A row that makes no sense is named."""
    with pytest.raises(LineDataError, match="bin 2: expected 9 finite numbers"):
        statistical_lines(part(bins=[part()["bins"][0], row]), METHANE)


def test_satellites_keep_the_sum():
    """Companions share a fraction of each line; nothing is lost."""
    lines = statistical_lines(part(), METHANE)
    more = with_satellites(lines, fraction=0.1, count=3, spread_per_cm=2.0, seed=1)
    assert len(more) == 4 * len(lines)
    assert more.intensity_cm.sum() == pytest.approx(lines.intensity_cm.sum(), rel=1e-12)
    assert np.all(more.wavenumber_per_cm > 0)
    again = with_satellites(lines, fraction=0.1, count=3, spread_per_cm=2.0, seed=1)
    assert np.array_equal(more.intensity_cm, again.intensity_cm)


def test_satellites_spread_and_rise():
    """Displacement and rise of the lower energy have the stated scale; the parent keeps its place."""
    parent = Lines.make(
        molecule=METHANE,
        isotopologue=1,
        wavenumber_per_cm=[1000.0],
        intensity_cm=1.0,
        lower_energy_per_cm=100.0,
        air_width_per_cm_atm=0.05,
        temperature_exponent=0.7,
    )
    more = with_satellites(parent, fraction=0.5, count=20_000, spread_per_cm=3.0, seed=2, raised_per_cm=200.0)
    weak = more.where(more.intensity_cm < 0.4)
    assert more.intensity_cm.max() == pytest.approx(0.5)
    assert weak.wavenumber_per_cm.std() == pytest.approx(3.0, rel=0.03)
    assert weak.lower_energy_per_cm.mean() == pytest.approx(300.0, rel=0.03)


def test_no_satellites():
    """A zero fraction returns the lines untouched."""
    lines = statistical_lines(part(), METHANE)
    assert with_satellites(lines, fraction=0.0, count=2, spread_per_cm=5.0, seed=1) is lines
