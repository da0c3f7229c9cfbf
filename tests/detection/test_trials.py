"""Look-elsewhere: independent trials and scans."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from planner.detection.significance import Measurement, one_sided_probability
from planner.detection.simulate import matched_filter
from planner.detection.trials import (
    any_of_independent,
    local_sigma_needed,
    scan_probability,
    upcrossing_bound,
    upcrossings_of_zero,
)


def scanned(width=0.03, bins=300, floor=6.0):
    """A spectrum with a floor and two nuisances, and a row of narrow templates along it."""
    x = np.linspace(-1, 1, bins)
    places = np.arange(-0.95, 0.95, width / 4)
    m = Measurement(
        template_ppm=np.zeros(bins),
        white_ppm=np.linspace(30, 60, bins),
        floor_ppm2=np.eye(bins) * floor**2,
        nuisances=("offset", "slope"),
        directions_ppm=np.array([np.full(bins, 1000.0), 500.0 * x]),
    )
    return m, np.exp(-0.5 * ((x - places[:, None]) / width) ** 2)


def highest_significances(m, transits, templates, draws, rng):
    """The best place of each simulated observation of air without the gas."""
    filters = np.array([matched_filter(replace(m, template_ppm=t), transits) for t in templates])
    bins = m.white_ppm.size
    depth = rng.standard_normal((draws, bins)) * np.sqrt(m.white_ppm**2 / transits + np.diag(m.floor_ppm2))
    depth += rng.standard_normal((draws, 2)) @ m.directions_ppm
    return depth @ filters.T


def test_zero_crossings_against_counted_ones():
    """Upcrossings of zero in simulated scans, within three standard errors."""
    m, templates = scanned()
    found = highest_significances(m, 10, templates, 4000, np.random.default_rng(2))
    counts = np.count_nonzero((found[:, :-1] < 0) & (found[:, 1:] >= 0), axis=1)
    expected = upcrossings_of_zero(m, 10, templates)
    assert abs(counts.mean() - expected) < 3 * counts.std() / np.sqrt(counts.size)


@pytest.mark.parametrize("sigma", [2.5, 3.0, 3.5])
def test_scan_bound_holds_and_is_close(sigma):
    """The chance of a false alarm anywhere stays below the bound, and within a quarter of it where it is small."""
    m, templates = scanned()
    found = highest_significances(m, 10, templates, 20_000, np.random.default_rng(3)).max(axis=1)
    share = np.mean(found >= sigma)
    bound = scan_probability(sigma, upcrossings_of_zero(m, 10, templates))
    assert share < bound + 3 * np.sqrt(share / 20_000)
    assert share > 0.75 * bound - 3 * np.sqrt(share / 20_000)


def test_wider_templates_have_fewer_places():
    """Twice the width, half the places to look at."""
    narrow, wide = (upcrossings_of_zero(*_at_ten(scanned(width))) for width in (0.03, 0.06))
    assert narrow / wide == pytest.approx(2.0, rel=0.1)


def _at_ten(pair):
    return pair[0], 10.0, pair[1]


def test_denser_scan_is_the_same_scan():
    """Zero crossings settle as the places draw together; a quarter of a width is dense enough to 3 %."""
    m, templates = scanned()
    places = np.linspace(0, 1, 4 * (len(templates) - 1) + 1)
    x = np.linspace(-1, 1, 300)
    centres = -0.95 + places * (np.arange(-0.95, 0.95, 0.03 / 4)[-1] + 0.95)
    dense = np.exp(-0.5 * ((x - centres[:, None]) / 0.03) ** 2)
    assert upcrossings_of_zero(m, 10, dense) == pytest.approx(upcrossings_of_zero(m, 10, templates), rel=0.03)


def test_local_sigma_makes_up_for_the_search():
    """The local significance that is asked for has the chance of the one that counts."""
    local = local_sigma_needed(5.0, 20.0)
    assert local > 5.0
    assert scan_probability(local, 20.0) == pytest.approx(one_sided_probability(5.0), rel=1e-6)


def test_one_place_needs_no_more():
    """Without a search nothing is added."""
    assert local_sigma_needed(4.0, 0.0) == pytest.approx(4.0)
    assert any_of_independent(0.01, 1) == pytest.approx(0.01)


def test_bound_is_a_probability():
    """Many places at little significance: certain to pass, not more."""
    assert scan_probability(0.5, 100.0) == 1.0
    assert upcrossing_bound(25.0, local_probability=1e-6, upcrossings=1.0, reference=1.0, degrees_of_freedom=3) < 1
