"""The matched filter, nuisances and stacking with a floor."""

from __future__ import annotations

from dataclasses import replace
from itertools import pairwise

import numpy as np
import pytest
from hypothesis import example, given, settings
from hypothesis import strategies as st

from planner.detection.significance import Measurement, one_sided_probability, one_sided_sigma, target_snr


def measurement(bins=40, floor=0.0, nuisances=0, seed=1, amplitude=30.0, white=40.0):
    rng = np.random.default_rng(seed)
    x = np.linspace(-1, 1, bins)
    return Measurement(
        template_ppm=amplitude * np.exp(-((x / 0.3) ** 2)),
        white_ppm=white * rng.uniform(0.8, 1.2, bins),
        floor_ppm2=np.eye(bins) * floor**2,
        nuisances=tuple(f"n{i}" for i in range(nuisances)),
        directions_ppm=np.array([200.0 * x**i for i in range(nuisances)]).reshape(nuisances, bins),
    )


def correlated(m, length=0.1, floor=8.0):
    x = np.linspace(-1, 1, m.template_ppm.size)
    return replace(m, floor_ppm2=floor**2 * np.exp(-np.abs(x[:, None] - x) / length))


@pytest.mark.parametrize("transits", [1, 30, 1e4])
def test_correlated_floor_equals_a_joint_fit(transits):
    """A floor that is correlated between bins is treated exactly, at every number of transits."""
    m = correlated(measurement(nuisances=3))
    assert m.snr(transits) == pytest.approx(slow_snr(m, transits), rel=1e-9)
    assert m.snr(1e12) == pytest.approx(m.snr_limit(), rel=1e-4)


def slow_snr(m, transits):
    """Generalised least squares: the amplitude fitted together with every nuisance held by its prior."""
    covariance = np.diag(m.white_ppm**2) / transits + m.floor_ppm2
    design = np.vstack([m.template_ppm, m.directions_ppm])
    prior = np.diag([0.0, *np.ones(len(m.nuisances))])
    information = design @ np.linalg.inv(covariance) @ design.T + prior
    return 1.0 / np.sqrt(np.linalg.inv(information)[0, 0])


@pytest.mark.parametrize("floor", [0.0, 12.0])
@pytest.mark.parametrize("nuisances", [0, 1, 4])
@pytest.mark.parametrize("transits", [1, 7.5, 300])
def test_snr_equals_a_joint_fit_with_priors(floor, nuisances, transits):
    """Marginalising by covariance gives the error of the amplitude in a joint fit."""
    m = measurement(floor=floor, nuisances=nuisances)
    assert m.snr(transits) == pytest.approx(slow_snr(m, transits), rel=1e-9)


def test_snr_grows_as_root_n_without_floor_and_nuisances():
    """White noise averages down."""
    m = measurement()
    assert m.snr(16) == pytest.approx(4 * m.snr(1), rel=1e-12)


def test_nuisances_only_lower_the_significance():
    """Each unknown costs something; knowing it again gives it back."""
    m = measurement(nuisances=4, floor=5)
    values = [m.known(*m.nuisances[i:]).snr(10) if i < 4 else m.snr(10) for i in range(5)]
    assert all(a >= b for a, b in pairwise(values))
    assert m.known().snr(10) == values[0]
    assert m.only("n1").nuisances == ("n1",)


def test_template_inside_the_nuisances_never_arrives():
    """A template that a wide nuisance imitates exactly cannot be told apart."""
    m = measurement(floor=1.0)
    m = replace(m, nuisances=("twin",), directions_ppm=m.template_ppm[None, :] * 10.0)
    assert m.snr_limit() < 0.1
    assert m.transits_for(5.0) is None


def test_limit_is_reached_from_below():
    """The curve of significance against transits rises towards its limit and not beyond."""
    m = measurement(floor=10.0, nuisances=3)
    values = [m.snr(n) for n in (1, 10, 100, 1e4, 1e6)]
    assert np.all(np.diff(values) > 0)
    assert values[-1] == pytest.approx(m.snr_limit(), rel=1e-3)
    assert values[-1] < m.snr_limit()


def test_no_floor_has_no_limit():
    """Without a floor nothing bounds the significance."""
    assert measurement(nuisances=2).snr_limit() == np.inf


def test_floor_common_to_all_bins_has_no_limit():
    """A floor that only shifts the whole spectrum leaves differences between bins free of it."""
    m = replace(measurement(), floor_ppm2=np.full((40, 40), 15.0**2))
    assert m.snr_limit() == np.inf
    assert m.snr(1e4) == pytest.approx(slow_snr(m, 1e4), rel=1e-6)


def test_floor_beyond_all_transits_is_none():
    """A floor that is a rounding error of nothing sets no limit, and breaks nothing."""
    assert measurement(floor=1.5e-157, nuisances=2).snr_limit() == np.inf


@given(st.floats(0.5, 20), st.floats(0, 6))
@example(1.0, 1.5271448138856036e-157)
@settings(derandomize=True, max_examples=40, deadline=None)
def test_transits_for_inverts_snr(snr, floor):
    """At the number of transits returned the significance is the one asked for."""
    m = measurement(floor=floor, nuisances=2)
    n = m.transits_for(snr)
    if n is None:
        assert m.snr_limit() <= snr * (1 + 1e-6)
    else:
        assert m.snr(n) == pytest.approx(snr, rel=1e-4)


def test_joined_modes_add_in_quadrature_when_nothing_is_shared():
    """Independent modes with everything known add their squared significances."""
    a, b = measurement(seed=1), measurement(seed=2, amplitude=20)
    assert Measurement.join([a, b]).snr(3) == pytest.approx(np.hypot(a.snr(3), b.snr(3)), rel=1e-9)


def test_a_shared_nuisance_is_held_by_the_other_mode():
    """A mode that sees the nuisance but not the gas helps through the shared nuisance."""
    a = measurement(nuisances=1)
    b = replace(measurement(nuisances=1, seed=3, white=1.0), template_ppm=np.zeros(40))
    assert Measurement.join([a, b]).snr(1) > a.snr(1)


def test_information_sums_to_one():
    """Shares of the bins add up."""
    assert measurement().information().sum() == pytest.approx(1.0)


def test_empty_template_is_no_signal():
    """A gas with no band in range has no significance."""
    m = replace(measurement(floor=3), template_ppm=np.zeros(40))
    assert m.snr(10) == 0 == m.snr_limit()
    assert m.transits_for(3) is None


@pytest.mark.parametrize("field", ["template_ppm", "white_ppm"])
def test_measurement_refuses_what_is_not_finite(field):
    """A NaN is found where the record is made."""
    m = measurement()
    with pytest.raises(ValueError, match=field):
        replace(m, **{field: np.full(40, np.nan)})


def test_power_moves_the_target():
    """Expecting the threshold itself is a coin toss."""
    assert target_snr(5, 0.5) == pytest.approx(5)
    assert target_snr(5, 0.8413) == pytest.approx(6, abs=1e-3)


def test_probability_and_sigma_are_inverse():
    """3 sigma one-sided is 0.00135 (from memory, any table of the normal distribution)."""
    assert one_sided_probability(3) == pytest.approx(0.0013499, rel=1e-4)
    assert one_sided_sigma(one_sided_probability(4.2)) == pytest.approx(4.2)
