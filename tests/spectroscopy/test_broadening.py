"""Widths of lines in mixtures."""

from __future__ import annotations

import numpy as np
import pytest

from planner.spectroscopy.broadening import ForeignWidths, broadened, joined_widths, width_factor
from planner.spectroscopy.lines import Lines


def lines(count=3, low=1000.0):
    return Lines.make(
        molecule=2, isotopologue=1, wavenumber_per_cm=low + np.arange(count), intensity_cm=1e-20,
        lower_energy_per_cm=0.0, air_width_per_cm_atm=np.linspace(0.06, 0.08, count), temperature_exponent=0.7,
    )  # fmt: skip


def foreign(**by_gas):
    return ForeignWidths(by_gas={gas: np.array(values, dtype=float) for gas, values in by_gas.items()}, digest="x")


def test_air_and_nitrogen_leave_widths_alone():
    """In nitrogen the air widths are taken."""
    for air in ({}, {"N2": 1.0}, {"N2": 0.99, "CH4": 0.01}):
        result = broadened("CO2", lines(), None, air)
        np.testing.assert_allclose(result.lines.air_width_per_cm_atm, lines().air_width_per_cm_atm)
        np.testing.assert_allclose(result.lines.temperature_exponent, 0.7)
        assert result.sentence.startswith("CO2 lines: as wide as in air")


def test_widths_add_in_proportion_to_pressure():
    """Half of one gas and half of another: the mean of their widths."""
    result = broadened("CO", lines(), None, {"H2": 0.5, "He": 0.5})
    expected = 0.5 * (width_factor("CO", "H2")[0] + width_factor("CO", "He")[0])
    np.testing.assert_allclose(result.lines.air_width_per_cm_atm, expected * lines().air_width_per_cm_atm)


def test_the_absorber_is_left_to_its_self_width():
    """In an atmosphere of the gas itself the mixture is what else there is, its shares scaled to one."""
    one = broadened("CO2", lines(), None, {"CO2": 0.95, "H2": 0.05})
    other = broadened("CO2", lines(), None, {"H2": 1.0})
    np.testing.assert_allclose(one.lines.air_width_per_cm_atm, other.lines.air_width_per_cm_atm)
    assert "CO2:" not in one.sentence


def test_a_factor_of_the_absorber_goes_before_the_general_one():
    """Hydrogen narrows water and widens carbon dioxide; where nothing is known of the absorber the mean serves."""
    assert width_factor("H2O", "H2")[0] < 0.9 < 1.2 < width_factor("CO2", "H2")[0]
    assert width_factor("SF6", "H2") == width_factor("CF4", "H2")
    assert width_factor("CO2", "Xe") is None


def test_widths_of_the_file_go_before_factors():
    """Where a file gives a width it is taken with its exponent; where not, the factor and the exponent of air."""
    widths = foreign(H2=[[0.1, np.nan, 0.12], [0.5, np.nan, np.nan]])
    result = broadened("CO2", lines(), widths, {"H2": 1.0})
    factor, _ = width_factor("CO2", "H2")
    np.testing.assert_allclose(result.lines.air_width_per_cm_atm, [0.1, factor * 0.07, 0.12])
    np.testing.assert_allclose(result.lines.temperature_exponent, [0.5, 0.7, 0.7])
    assert "widths of the file for 67% of the lines, else 1.45 times the air width" in result.sentence


def test_the_exponent_of_a_mixture_has_the_right_slope():
    """Width and its temperature slope at 296 K are those of the sum; 20 % away the error is below 1 %."""
    widths = foreign(H2=[[0.1], [0.4]], He=[[0.04], [0.9]])
    result = broadened("CO2", lines(1), widths, {"H2": 0.6, "He": 0.4})
    for temperature in (240.0, 296.0, 355.0):
        t = 296.0 / temperature
        exact = 0.6 * 0.1 * t**0.4 + 0.4 * 0.04 * t**0.9
        mixed = result.lines.air_width_per_cm_atm[0] * t ** result.lines.temperature_exponent[0]
        assert mixed == pytest.approx(exact, rel=1e-12 if temperature == 296.0 else 0.01)


def test_joined_widths_follow_the_lines():
    """Rows go where Lines.join puts their lines; parts without widths are unknown."""
    first, second = lines(2, 1000.0), lines(2, 1000.5)
    joined = joined_widths(
        [(first, foreign(H2=[[1.0, 2.0], [0.5, 0.5]])), (second, foreign(He=[[3.0, 4.0], [0.6, 0.6]]))]
    )
    together = Lines.join([first, second])
    np.testing.assert_array_equal(together.wavenumber_per_cm, [1000.0, 1000.5, 1001.0, 1001.5])
    np.testing.assert_array_equal(joined.by_gas["H2"][0], [1.0, np.nan, 2.0, np.nan])
    np.testing.assert_array_equal(joined.by_gas["He"][0], [np.nan, 3.0, np.nan, 4.0])
    assert joined_widths([(first, None), (second, None)]) is None


def test_the_key_tells_mixtures_apart():
    """Tables are stored by what was done; shares are taken to whole per cents."""
    keys = [broadened("CO2", lines(), None, air).key for air in ({"N2": 1.0}, {"H2": 1.0}, {"H2": 0.999, "CH4": 1e-3})]
    assert keys[0] != keys[1] == keys[2]


def test_lines_without_a_width_stay_without():
    """A width of zero does not become one."""
    bare = Lines.make(
        molecule=2, isotopologue=1, wavenumber_per_cm=1000.0, intensity_cm=1e-20, lower_energy_per_cm=0.0,
        air_width_per_cm_atm=0.0, temperature_exponent=0.7,
    )  # fmt: skip
    result = broadened("CO2", bare, None, {"H2": 1.0})
    assert result.lines.air_width_per_cm_atm[0] == 0.0
    assert result.lines.temperature_exponent[0] == 0.7
