"""Injection and recovery: the stated power and false-alarm rates against simulated observations."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from planner.detection.significance import Measurement, one_sided_probability, target_snr
from planner.detection.simulate import Rate, matched_filter, rate_above, simulated_significances

FALSE_ALARM_SIGMAS = (1.5, 2.0, 2.5)


def bump(bins, centre, width, amplitude):
    x = np.linspace(-1, 1, bins)
    return amplitude * np.exp(-0.5 * ((x - centre) / width) ** 2)


def one_photometer():
    """One bin, white noise alone, nothing unknown."""
    return Measurement(
        template_ppm=np.array([30.0]),
        white_ppm=np.array([50.0]),
        floor_ppm2=np.zeros((1, 1)),
        directions_ppm=np.zeros((0, 1)),
    )


def white_spectrum():
    """Many bins of very unequal white noise, an offset and a slope unknown."""
    x = np.linspace(-1, 1, 200)
    return Measurement(
        template_ppm=bump(200, 0.2, 0.1, 25.0),
        white_ppm=40.0 * np.exp(x),
        floor_ppm2=np.zeros((200, 200)),
        nuisances=("offset", "slope"),
        directions_ppm=np.array([np.full(200, 1000.0), 300.0 * x]),
    )


def independent_floor():
    """A floor that is independent from bin to bin and dominates, with a rival of nearly the same shape."""
    return Measurement(
        template_ppm=bump(60, 0.0, 0.2, 60.0),
        white_ppm=np.full(60, 60.0),
        floor_ppm2=np.eye(60) * 12.0**2,
        nuisances=("offset", "rival"),
        directions_ppm=np.array([np.full(60, 1000.0), bump(60, 0.15, 0.2, 120.0)]),
    )


def correlated_floor():
    """A floor that is correlated over a third of the spectrum, with five wide polynomial nuisances."""
    x = np.linspace(-1, 1, 90)
    return Measurement(
        template_ppm=bump(90, -0.4, 0.07, 50.0) + bump(90, 0.5, 0.12, 20.0),
        white_ppm=np.full(90, 70.0),
        floor_ppm2=15.0**2 * np.exp(-np.abs(x[:, None] - x) / 0.3),
        nuisances=tuple(f"power {i}" for i in range(5)),
        directions_ppm=np.array([500.0 * x**i for i in range(5)]),
    )


def joined_modes():
    """Two modes with a nuisance in common and floors of their own kinds."""
    a = independent_floor()
    b = correlated_floor()
    b = replace(b, nuisances=("rival", *b.nuisances[1:]))
    return Measurement.join([a, b])


def singular_floor():
    """A floor common to all bins, as a correlation length beyond the spectrum gives: rank one."""
    return replace(white_spectrum(), floor_ppm2=np.full((200, 200), 20.0**2))


SCENARIOS = (one_photometer, white_spectrum, independent_floor, correlated_floor, joined_modes, singular_floor)


@pytest.mark.parametrize("make", SCENARIOS)
@pytest.mark.parametrize(("threshold", "power"), [(3.0, 0.9), (4.0, 0.5), (5.0, 0.2)])
def test_detection_rates_are_as_stated(make, threshold, power):
    """At the transits that are said to give a power, it is found, within three standard errors of 10,000 draws."""
    m = make()
    transits = m.transits_for(target_snr(threshold, power))
    found = simulated_significances(m, transits, 10_000, np.random.default_rng(4))
    assert abs(rate_above(found, threshold).errors_from(power)) < 3


@pytest.mark.parametrize("make", SCENARIOS)
def test_false_alarm_rates_are_as_stated(make):
    """Air without the gas, every nuisance drawn from its prior: 1e5 draws pass 1.5, 2 and 2.5 sigma as stated."""
    found = simulated_significances(make(), 30, 100_000, np.random.default_rng(5), amplitude=0.0)
    for sigma in FALSE_ALARM_SIGMAS:
        assert abs(rate_above(found, sigma).errors_from(one_sided_probability(sigma))) < 3


@pytest.mark.parametrize("make", SCENARIOS)
def test_filter_states_the_same_significance(make):
    """The filter's response to the template is the analytic S/N, and its width is one: two numerical routes agree."""
    m = make()
    weights = matched_filter(m, 12.5)
    covariance = m.floor_ppm2 + np.diag(m.white_ppm**2) / 12.5 + m.directions_ppm.T @ m.directions_ppm
    assert weights @ m.template_ppm == pytest.approx(m.snr(12.5), rel=1e-6)
    assert weights @ covariance @ weights == pytest.approx(1.0, rel=1e-6)


def slow_significance(m, transits, depth):
    """Amplitude over its error in a joint fit of the template and every nuisance, each held by its prior."""
    inverse = np.linalg.inv(m.floor_ppm2 + np.diag(m.white_ppm**2) / transits)
    design = np.vstack([m.template_ppm, m.directions_ppm])
    normal = design @ inverse @ design.T + np.diag([0.0, *np.ones(len(m.nuisances))])
    amplitude = np.linalg.solve(normal, design @ inverse @ depth)[0]
    return amplitude / np.sqrt(np.linalg.inv(normal)[0, 0])


@pytest.mark.parametrize("make", SCENARIOS[:5])
def test_filter_equals_a_joint_fit(make):
    """Applying the filter is fitting the gas together with everything that is not known."""
    m = make()
    depth = np.random.default_rng(6).normal(0, 100, m.template_ppm.size)
    assert matched_filter(m, 9) @ depth == pytest.approx(slow_significance(m, 9, depth), rel=1e-6)


def test_wrong_statement_is_found_out():
    """The comparison has teeth: leaving a nuisance out of the filter fails it by far."""
    m = independent_floor()
    blind = simulated_significances(
        m.known(), 60, 20_000, np.random.default_rng(7), amplitude=0.0,
        imitations_ppm=np.random.default_rng(8).normal(size=(5000, 2)) @ m.directions_ppm,
    )  # fmt: skip
    assert rate_above(blind, 2.0).errors_from(one_sided_probability(2.0)) > 30


def test_imitations_stand_in_for_the_linear_directions():
    """Nuisances drawn outside give the same rates as those drawn inside."""
    m = correlated_floor()
    drawn = np.random.default_rng(9).normal(size=(20_000, 5)) @ m.directions_ppm
    found = simulated_significances(m, 60, 20_000, np.random.default_rng(10), imitations_ppm=drawn)
    # the imitations are picked with repeats, so the rate scatters by up to twice the variance of free draws
    assert abs(rate_above(found, 5.0).errors_from(one_sided_probability(5.0 - m.snr(60)))) < 3 * np.sqrt(2)


def test_empty_template_never_passes():
    """A gas without a band is found at zero sigma."""
    m = replace(white_spectrum(), template_ppm=np.zeros(200))
    assert rate_above(simulated_significances(m, 5, 100, np.random.default_rng(1)), 0.5).passed == 0


def test_draws_do_not_depend_on_how_they_are_batched(monkeypatch):
    """The same number of draws comes out when it is not a multiple of the batch."""
    monkeypatch.setattr("planner.detection.simulate._AT_ONCE", 7)
    assert simulated_significances(one_photometer(), 1, 23, np.random.default_rng(1)).size == 23


def test_rate_and_its_error():
    """A share with its binomial error; none of a thousand is not known to be never."""
    assert Rate(passed=25, draws=100).share == 0.25
    assert Rate(passed=25, draws=100).standard_error == pytest.approx(0.0433, abs=1e-4)
    assert Rate(passed=0, draws=1000).standard_error == pytest.approx(0.001, rel=1e-2)
    assert Rate(passed=60, draws=100).errors_from(0.5) == pytest.approx(2.0)
