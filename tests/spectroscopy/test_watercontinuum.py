"""The water continuum: its law, its limits and its smoothness."""

from __future__ import annotations

import math

import numpy as np
import pytest

from planner.spectroscopy.watercontinuum import water_continuum

PER_CM3_AT_1_ATM_296_K = 1.01325e6 / (1.380649e-16 * 296.0)


@pytest.mark.parametrize("wavenumber", [350.0, 700.0, 1000.0, 1250.0])
def test_ten_micron_law(wavenumber):
    """At 296 K the self part is the law of the 10 um window divided by the density at 1 atm."""
    expected = (1.25e-22 + 1.67e-19 * math.exp(-7.87e-3 * wavenumber)) / PER_CM3_AT_1_ATM_296_K
    assert water_continuum(wavenumber, 296.0)[0][0] == pytest.approx(expected, rel=1e-9)


@pytest.mark.parametrize(("wavenumber", "per_gram"), [(2400.0, 0.187), (2600.0, 0.087), (2800.0, 0.174)])
def test_four_micron_knots(wavenumber, per_gram):
    """At 296 K the self part goes through the knots of the 4 um window."""
    expected = per_gram * 18.0153 / 6.02214076e23 / PER_CM3_AT_1_ATM_296_K
    assert water_continuum(wavenumber, 296.0)[0][0] == pytest.approx(expected, rel=1e-9)


def test_temperature_law():
    """The self part per atmosphere follows exp(1800 K / T); the coefficient per density gains another T."""
    warm, cold = (water_continuum(1000.0, t)[0][0] / t for t in (330.0, 260.0))
    assert math.log(cold / warm) == pytest.approx(1800.0 * (1.0 / 260.0 - 1.0 / 330.0), rel=1e-9)


def test_foreign_part():
    """The foreign part is 0.002 of the self part at 296 K and does not change with temperature."""
    wavenumber = np.linspace(400.0, 2800.0, 49)
    own, foreign = water_continuum(wavenumber, 296.0)
    np.testing.assert_allclose(foreign, 0.002 * own, rtol=1e-12)
    assert np.array_equal(water_continuum(wavenumber, 350.0)[1], foreign)


@pytest.mark.parametrize(("outside", "end"), [(150.0, 250.0), (600.0, 400.0)])
def test_held_outside_its_temperatures(outside, end):
    """Beyond 250 and 400 K the coefficients are held."""
    wavenumber = np.linspace(400.0, 2800.0, 49)
    for ours, held in zip(water_continuum(wavenumber, outside), water_continuum(wavenumber, end), strict=True):
        assert np.array_equal(ours, held)


def test_no_step():
    """Neighbouring points 1 1/cm apart never differ by more than 3 %."""
    own, _ = water_continuum(np.arange(100.0, 4000.0, 1.0), 296.0)
    assert own.min() >= 0.0
    assert np.abs(np.diff(np.log(own))).max() < 0.03


def test_fades_outside_the_windows():
    """50 1/cm beyond 350 and 2800 1/cm the coefficient has fallen by e; in the near infrared it is nothing."""
    own, _ = water_continuum([300.0, 350.0, 2800.0, 2850.0, 6000.0], 296.0)
    assert own[1] / own[0] == pytest.approx(math.e)
    assert own[2] / own[3] == pytest.approx(math.e)
    assert own[4] < 1e-24 * own[2]
