"""Rayleigh scattering: closed forms, limits, shapes and refusals."""

from __future__ import annotations

import math

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.errors import RangeError
from planner.spectroscopy.rayleigh import king_factor, rayleigh_cross_section, rayleigh_gases


def slow_nitrogen(wavenumber_per_cm):
    """Nitrogen below 21360 1/cm, written out for one wavenumber at a time."""
    out = []
    for nu in wavenumber_per_cm:
        n = 1.0 + 1e-8 * (6498.2 + 307.43305e12 / (14.4e9 - nu**2))
        density = 101325.0 / (1.380649e-23 * 288.15) * 1e-6
        king = 1.034 + 3.17e-12 * nu**2
        out.append(24.0 * math.pi**3 * nu**4 / density**2 * ((n**2 - 1.0) / (n**2 + 2.0)) ** 2 * king)
    return np.array(out)


@given(nu=st.floats(500.0, 21000.0))
@settings(max_examples=30, derandomize=True)
def test_nitrogen_equals_the_formula(nu):
    """The table-driven function equals the formula written out."""
    assert rayleigh_cross_section("N2", [nu])[0] == pytest.approx(slow_nitrogen([nu])[0], rel=1e-6)


@pytest.mark.parametrize("formula", rayleigh_gases())
def test_grows_with_wavenumber(formula):
    """Positive and ever steeper than the fourth power of the wavenumber (normal dispersion)."""
    wavenumber = np.linspace(400.0, 50000.0, 5001)
    per_fourth = rayleigh_cross_section(formula, wavenumber) / wavenumber**4
    assert per_fourth.min() > 0.0
    # the two nitrogen fits meet with a step of 3e-4
    assert np.all(np.diff(per_fourth) > -4e-4 * per_fourth[:-1])


@pytest.mark.parametrize("formula", rayleigh_gases())
def test_fourth_power_in_the_infrared(formula):
    """Doubling the wavelength at 5 um divides the cross-section by 16 to 1 %."""
    near, far = rayleigh_cross_section(formula, [2000.0, 1000.0])
    assert near / far == pytest.approx(16.0, rel=0.01)


def test_no_spike_of_carbon_dioxide_in_the_infrared():
    """The index fit's infrared pole at 2418 1/cm is no scattering and must not appear."""
    wavenumber = np.linspace(2417.0, 2419.0, 2001)
    per_fourth = rayleigh_cross_section("CO2", wavenumber) / wavenumber**4
    assert np.ptp(per_fourth) < 1e-5 * per_fourth[0]


def test_infrared_pole_of_carbon_dioxide_hardly_counts():
    """Leaving that pole out changes n - 1 by less than 1e-6 where the fit holds (n - 1 is about 4.2e-4)."""
    wavenumber = 1e4 / 1.7
    assert abs(1.1427e3 * 0.1218145e-4 / (2418.136**2 - wavenumber**2)) < 2e-6 * 4.2e-4


@pytest.mark.parametrize("formula", ["CCl3F", "O3", "unobtainium"])
def test_unknown_gas_scatters_nothing(formula):
    """Gases without an index are traces, whose scattering is zero."""
    assert np.array_equal(rayleigh_cross_section(formula, np.linspace(1000.0, 30000.0, 7)), np.zeros(7))


def test_shape_of_a_single_wavenumber():
    """A scalar becomes an array of one."""
    assert rayleigh_cross_section("N2", 18797.0).shape == (1,)


def test_king_factor_invalid():
    """H2 is given as a cross-section, so its King factor is not known by itself."""
    with pytest.raises(RangeError, match=r"expected one of .*CO2.*got 'H2'"):
        king_factor("H2", [20000.0])


def test_beyond_the_fits_invalid():
    """Beyond 0.18 um the fits end and their poles begin."""
    with pytest.raises(RangeError, match=r"up to 55000 per cm .* got 60000"):
        rayleigh_cross_section("CO2", [20000.0, 60000.0])
