"""Trials factors against worked figures.

Independent trials: closed form ``1 - (1 - p)^n`` worked apart from this project with tables of the normal distribution.
Upcrossings: Gross & Vitells 2010, Eur. Phys. J. C 70, 525, the formula worked apart from this project with the mean
number of upcrossings 4.34 at 0.5 (the paper's example, from memory).
"""

from __future__ import annotations

import pytest
from scipy import stats

from planner.detection.significance import one_sided_probability, one_sided_sigma
from planner.detection.trials import any_of_independent, upcrossing_bound


@pytest.mark.parametrize(
    ("sigma", "trials", "probability", "left"),
    [
        (3, 10, 0.01342, 2.21),
        (3, 20, 0.02665, 1.93),
        (3, 100, 0.1264, 1.14),
        (3, 661, 0.5905, None),
        (4, 100, 3.162e-3, 2.73),
        (4, 661, 0.02072, 2.04),
        (5, 100, 2.866e-5, 4.02),
        (5, 661, 1.895e-4, 3.55),
    ],
)
def test_independent_trials(sigma, trials, probability, left):
    """One-sided; to the digits given."""
    found = any_of_independent(one_sided_probability(sigma), trials)
    assert found == pytest.approx(probability, rel=5e-4)
    if left is not None:
        assert one_sided_sigma(found) == pytest.approx(left, abs=0.006)


@pytest.mark.parametrize(
    ("sigma", "upcrossings", "reference", "probability", "factor"),
    [
        (3, 4.34, 0.5, 0.06461, 23.9),
        (4, 4.34, 0.5, 1.933e-3, 30.5),
        (5, 4.34, 0.5, 2.134e-5, 37.2),
        (5, 10.0, 1.0, 6.202e-5, 108.2),
    ],
)
def test_upcrossings(sigma, upcrossings, reference, probability, factor):
    """One degree of freedom, two-sided local probability, as in the worked figures; trials factor to 0.05."""
    local = float(stats.chi2.sf(sigma**2, 1))
    found = upcrossing_bound(sigma**2, local_probability=local, upcrossings=upcrossings, reference=reference)
    assert found == pytest.approx(probability, rel=5e-4)
    assert found / local == pytest.approx(factor, abs=0.05)


def test_factor_grows_linearly_with_the_significance():
    """Trials factor about 1 + sqrt(pi/2) N Z, N upcrossings carried to zero (the paper's result, from memory)."""
    local = float(stats.chi2.sf(36.0, 1))
    found = upcrossing_bound(36.0, local_probability=local, upcrossings=10.0, reference=1e-9) / local
    assert found == pytest.approx(1 + (3.14159265 / 2) ** 0.5 * 10.0 * 6.0, rel=0.03)
