"""Limits: what transits can detect, and what seeing nothing excludes."""

from __future__ import annotations

from itertools import pairwise

import numpy as np
import pytest
from scipy import special

from planner.scenario.records import Cloud
from planner.studies.limit import first_reach, last_short, limit
from planner.studies.outcomes import Obstacle
from planner.studies.vary import vary
from planner.studies.workshop import Workshop, see

TRANSITS = (1, 3, 10, 30, 100, 1000, 100_000, 10_000_000)


@pytest.fixture(scope="module")
def limits(narrow):
    return limit(narrow, transits=TRANSITS)


def beneath(scenario, **atmosphere):
    return scenario.model_copy(update={"atmosphere": scenario.atmosphere.model_copy(update=atmosphere)})


def test_crossings_of_a_power_law():
    """Exact where the significance is one, at a point, between two, and below the first of a linear one."""
    ratios = np.geomspace(1e-8, 1e-2, 7)
    assert first_reach(ratios, 1e4 * ratios**0.5, 10.0) == pytest.approx(1e-6)
    assert first_reach(ratios, 1e4 * ratios**0.5, 20.0) == pytest.approx(4e-6)
    assert last_short(ratios, 1e4 * ratios**0.5, 20.0) == pytest.approx(4e-6)
    assert first_reach(ratios, 1e9 * ratios, 1.0) == pytest.approx(1e-9)
    assert first_reach(ratios, 1e2 * ratios, 5.0) is None
    assert last_short(ratios, 1e2 * ratios, 5.0) is None


def test_crossings_of_a_curve_that_turns_back():
    """Detectable from the first crossing on; excluded only beyond the last."""
    ratios, snr = np.geomspace(1e-6, 1e-2, 5), np.array([1.0, 10.0, 2.0, 10.0, 20.0])
    assert 1e-6 < first_reach(ratios, snr, 5.0) < 1e-5
    assert 1e-4 < last_short(ratios, snr, 5.0) < 1e-3


def test_limits_fall_with_transits_until_the_floor(limits):
    """More transits always reach lower, ever more slowly, and end at what no number of transits beats."""
    (curve,) = limits.curves
    detectable = [point.detectable_ratio for point in curve.points if point.detectable_ratio is not None]
    assert len(detectable) >= 5
    assert all(later < earlier for earlier, later in pairwise(detectable))
    assert curve.detectable_at_all < detectable[-1] < 1.01 * curve.detectable_at_all
    assert detectable[-2] < 1.2 * detectable[-1]
    assert detectable[0] > 30 * detectable[-1]


def test_hours_follow_from_the_transits(limits, narrow_workshop):
    """As charged for one transit."""
    per_transit = narrow_workshop.views[0].charged_hours
    assert [point.hours for point in limits.curves[0].points] == pytest.approx([n * per_transit for n in TRANSITS])


def test_detectable_ratio_reaches_the_threshold_in_the_full_model(narrow, limits):
    """Put back into the scenario on the full grid, the smallest detectable ratio gives the threshold to 2 %."""
    point = next(p for p in limits.curves[0].points if p.transits == 100)
    scenario, case = vary(narrow, narrow.cases[0], {"mixing_ratio": point.detectable_ratio})
    assert see(Workshop(scenario), case).measurements[0].snr(100) == pytest.approx(5.0, rel=0.02)


def test_null_result_excludes_with_the_stated_confidence(narrow, limits):
    """A gas at the upper limit would have left so weak a trace as nothing in one case of twenty."""
    point = next(p for p in limits.curves[0].points if p.transits == 100)
    scenario, case = vary(narrow, narrow.cases[0], {"mixing_ratio": point.upper_limit_ratio})
    snr = see(Workshop(scenario), case).measurements[0].snr(100)
    assert special.ndtr(-snr) == pytest.approx(0.05, rel=0.1)
    assert point.upper_limit_ratio < point.detectable_ratio


def test_curve_of_growth(limits):
    """The feature grows with the amount, ever more slowly: at first by a line's wings, at last by scale heights."""
    (curve,) = limits.curves
    slopes = np.diff(np.log(curve.feature_ppm)) / np.diff(np.log(curve.ratios))
    assert np.all(slopes > 0)
    assert slopes[0] > 0.5
    assert slopes.min() < 0.15
    assert np.all(np.diff(curve.snr_on_offer) > 0)
    assert np.all(curve.snr_on_offer > curve.snr_one_transit)


@pytest.mark.slow
def test_hotter_lighter_clearer_reach_lower(narrow, limits):
    """A hotter planet, a lighter one, and one with lower clouds each allow a lower limit."""
    there = limits.curves[0].at_best.detectable_ratio

    def reached(scenario):
        return limit(scenario, transits=(1,)).curves[0].at_best.detectable_ratio

    assert reached(beneath(narrow, temperature_k=275.0)) < there
    assert reached(narrow.model_copy(update={"planet": narrow.planet.model_copy(update={"mass_mearth": 0.7})})) < there
    low, high = (reached(beneath(narrow, cloud=Cloud(top=f"{top} bar"))) for top in (0.1, 0.01))
    assert low < high


def test_no_limit_under_clouds_too_high(narrow):
    """Where only the clouds stand in the way, they are named, and what a clear sky would allow."""
    curve = limit(beneath(narrow, cloud=Cloud(top="1e-6 bar")), transits=(10,)).curves[0]
    assert curve.points[0].detectable_ratio is None
    assert curve.obstacle is Obstacle.CLOUDS
    assert "clear sky" in curve.obstacle_words


def test_no_end_where_nothing_bounds(narrow):
    """Without a floor endless transits reach any amount."""
    quiet = narrow.model_copy(update={"noise": narrow.noise.model_copy(update={"floor_ppm": 0.0})})
    assert limit(quiet, transits=(10,)).curves[0].detectable_at_all == 0


def test_no_limit_above_the_floor(narrow):
    """A floor as high as the features leaves no limit under any sky, however many transits."""
    noisy = narrow.model_copy(update={"noise": narrow.noise.model_copy(update={"floor_ppm": 400.0})})
    curve = limit(noisy, transits=(10,)).curves[0]
    assert curve.obstacle is Obstacle.FLOOR
    assert "however many transits" in curve.obstacle_words
