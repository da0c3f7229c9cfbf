"""What draws amount to, against posteriors that are known."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import stats

from planner.studies.fitting.likelihood import LevelledData
from planner.studies.fitting.posterior import (
    cut_by_its_prior,
    effective_size,
    found_of,
    goodness_of,
    leave_out_each,
    offset_of,
)
from planner.studies.fitting.unknowns import Unknown

GAS = Unknown(name="CH4", words="flat", value=lambda u: 1e-10 * 1e8**u, gas=True, logarithmic=True)


def test_a_gas_that_is_there():
    """Quantiles of the draws as values, and no limit."""
    draws = np.random.default_rng(1).normal(-4, 0.2, 4000)
    found = found_of(GAS, draws)
    assert found.upper_95 is None
    assert found.prior_ends == pytest.approx((-10, -2))
    assert found.median == pytest.approx(1e-4, rel=0.05)
    assert np.log10(found.high_68 / found.low_68) == pytest.approx(0.4, rel=0.1)
    assert np.log10(found.high_95 / found.low_95) == pytest.approx(2 * 1.96 * 0.2, rel=0.1)


def test_a_gas_that_is_not_told_from_none():
    """Draws that fill the prior up to some ratio give a limit at 95 % of them, and a share above one at the low end."""
    draws = np.random.default_rng(1).uniform(-10, -6, 4000)
    found = found_of(GAS, draws)
    assert found.low_end_share == pytest.approx(2.0, rel=0.1)
    assert np.log10(found.upper_95) == pytest.approx(-6.2, abs=0.05)


def test_a_posterior_that_the_prior_cuts():
    """Only where it runs into the upper end."""
    rng = np.random.default_rng(1)
    assert cut_by_its_prior(found_of(GAS, rng.uniform(-4, -2, 1000)))
    assert not cut_by_its_prior(found_of(GAS, rng.uniform(-10, -4, 1000)))
    assert not cut_by_its_prior(found_of(GAS, rng.normal(-4, 0.3, 1000)))


def test_offset():
    """Levels are summed up in ppm."""
    found = offset_of("blue", np.linspace(-10, 10, 101), 1000.0)
    assert (found.name, found.unit, found.median) == ("offset of blue", "ppm", 0)


def observed(scatter, *, correlated=False, count=400):
    """Data about a flat model with errors of 10 ppm, and the edges of their bins."""
    left = np.random.default_rng(2).normal(size=count)
    if correlated:
        left = (left + np.roll(left, 1) + np.roll(left, 2)) / np.sqrt(3)
    edges = np.geomspace(1, 5, count + 1)
    data = LevelledData(
        depth_ppm=10 * scatter * left,
        error_ppm=np.full(count, 10.0),
        detector=np.zeros(count, dtype=np.int64),
        offset_ppm=0.0,
    )
    return data, (edges[:-1], edges[1:])


@pytest.mark.parametrize(
    ("scatter", "correlated", "verdict"),
    [
        (1.0, False, "the model describes the data"),
        (1.5, False, "does not describe"),
        (0.7, False, "less than the errors say"),
        (1.0, True, "neighbouring residuals go together"),
    ],
)
def test_verdict(scatter, correlated, verdict):
    """Right errors, too small ones, too large ones, and scatter that goes together."""
    data, edges = observed(scatter, correlated=correlated)
    assert verdict in goodness_of(data, np.zeros(400), edges, 8).verdict


def test_chi_squared_and_the_largest_residuals():
    """The sum over bins, its chance by scipy, and the bins in order of their distance."""
    data, edges = observed(1.0)
    found = goodness_of(data, np.zeros(400), edges, 8)
    chi2 = float(np.sum((data.depth_ppm / 10) ** 2))
    assert found.chi2 == pytest.approx(chi2)
    assert found.p_value == pytest.approx(stats.chi2.sf(chi2, 392))
    away = np.abs([r.sigma for r in found.largest])
    assert away[0] == np.abs(data.depth_ppm / 10).max()
    assert np.all(np.diff(away) <= 0)


def test_gaps_have_no_neighbours():
    """Bins that do not touch say nothing about neighbours."""
    data, (low, high) = observed(1.0, correlated=True)
    assert goodness_of(data, np.zeros(400), (low, low + 0.5 * (high - low)), 8).neighbours == 0


def test_leave_out_against_the_exact_posterior():
    """A level with a normal prior measured by some bins: without a bin its posterior is known."""
    rng = np.random.default_rng(3)
    error, width = rng.uniform(0.8, 1.5, 12), 5.0
    depth = 2 + error * rng.normal(size=12)

    def posterior(kept):
        precision = 1 / width**2 + np.sum(kept / error**2)
        return np.sum(kept * depth / error**2) / precision, precision**-0.5

    mean, sigma = posterior(np.ones(12))
    draws = rng.normal(mean, sigma, 100_000)
    found = leave_out_each(stats.norm(draws[:, None], error).logpdf(depth), draws[:, None])
    for number in range(12):
        kept = np.arange(12) != number
        without, its_sigma = posterior(kept)
        assert found.means[0, number] == pytest.approx((without - mean) / sigma, abs=0.03)
        expected = stats.norm(without, np.hypot(its_sigma, error[number])).logpdf(depth[number])
        assert found.ln_density[number] == pytest.approx(expected, abs=0.02)
    assert found.trusted.all()


def test_a_bin_that_rules_alone_is_not_trusted():
    """Where one bin makes the posterior, draws from it cannot tell what would be without."""
    rng = np.random.default_rng(3)
    draws = rng.normal(0, 0.01, 2000)
    densities = np.column_stack([stats.norm(draws, 0.01).logpdf(0.0), stats.norm(draws, 5.0).logpdf(0.0)])
    found = leave_out_each(densities - 0.5 * (densities[:, :1] < -1e9), draws[:, None])
    assert found.trusted[1]
    tight = leave_out_each(stats.norm(rng.standard_t(2, 2000), 0.2).logpdf(0.0)[:, None], draws[:, None])
    assert not tight.trusted[0]


def test_effective_size():
    """All alike count in full, one that outweighs the rest counts alone."""
    assert effective_size(np.zeros(50)) == pytest.approx(50)
    assert effective_size([0.0, 0.0, 800.0]) == pytest.approx(1)
