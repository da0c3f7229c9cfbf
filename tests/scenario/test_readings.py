"""Single values of a scenario: units, ratios, gases, and what is said of bad ones."""

from __future__ import annotations

import re
from contextlib import suppress

import astropy.units as u
import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.scenario.quantities import quantity
from planner.scenario.readings import (
    Gas,
    GasAmounts,
    Measure,
    MixingRatio,
    MixingRatios,
    Number,
    Sets,
    nearest,
    shown,
)

MASS = Measure(kind="a mass", unit=u.M_earth, example="0.7 M_earth")
HOURS = Measure(kind="a duration", unit=u.h, example="1.5 h")
BAR = Measure(kind="a pressure", unit=u.bar, example="1 bar")


@pytest.mark.parametrize(
    ("reading", "text", "number"),
    [
        (MASS, "0.7 M_earth", 0.7),
        (MASS, "0.7M_earth", 0.7),
        (MASS, "1 M_jup", 317.828),
        (HOURS, "90 min", 1.5),
        (HOURS, "90 minutes", 1.5),
        (HOURS, "2 days", 48.0),
        (BAR, "1013.25 hPa", 1.01325),
        (BAR, "1 atm", 1.01325),
        (BAR, "1e-3 bar", 1e-3),
        (BAR, ".5 bar", 0.5),
    ],
)
def test_measure(reading, text, number):
    """Any unit of the right kind comes out in the one unit of the field."""
    assert reading(text) == pytest.approx(number, rel=1e-5)


def test_measure_takes_quantities():
    """From Python an astropy quantity does as well."""
    assert MASS(1 * u.M_jup) == pytest.approx(317.828, rel=1e-5)


@given(value=st.floats(1e-6, 1e6), unit=st.sampled_from(["bar", "mbar", "Pa", "hPa", "atm", "Torr"]))
@settings(derandomize=True, deadline=None)
def test_measure_does_not_depend_on_the_unit(value, unit):
    """The same pressure written in another unit is the same float."""
    in_pascal = {"bar": 1e5, "mbar": 100.0, "Pa": 1.0, "hPa": 100.0, "atm": 101325.0, "Torr": 101325 / 760}[unit]
    assert BAR(f"{value!r} {unit}") == pytest.approx(value * in_pascal / 1e5, rel=1e-12)


@pytest.mark.parametrize(
    ("value", "message"),
    [
        ("0.7", r'expected a mass such as "0.7 M_earth", got "0.7" \(the unit is missing\)'),
        (0.7, r'expected a mass such as "0.7 M_earth", got 0.7 \(the unit is missing\)'),
        ("0.7 K", 'expected a mass such as "0.7 M_earth", got "0.7 K"'),
        ("0.7 M_erth", r"\(\"M_erth\" is not a unit\)"),
        ("heavy", 'got "heavy"'),
        ("1 h1000", r"\(\"h1000\" is not a unit\)"),
        ("nan M_earth", "expected a finite value"),
        ("inf M_earth", "expected a finite value"),
        ("1e999 M_earth", "expected a finite value"),
        ("-1 M_earth", "greater than zero"),
        ("0 M_earth", "greater than zero"),
        (True, "got true"),
        ([1, 2], r"got \[1, 2\]"),
        ([1, 2] * u.M_earth, "expected one value"),
        ("1,5 M_earth", 'got "1,5 M_earth"'),
    ],
)
def test_measure_invalid(value, message):
    """Each way of being wrong has its own words."""
    with pytest.raises(ValueError, match=message):
        MASS(value)


@pytest.mark.parametrize(
    ("text", "rest"),
    [
        ("2 600 K", "600 K"),
        ("2\u202f600 K", "600 K"),
        ("2,600 K", ",600 K"),
        ("2'600 K", "'600 K"),
        ("2_600 K", "_600 K"),
        ("2. 6 K", "6 K"),
        ("2 .6 K", ".6 K"),
        ("5,0 h", ",0 h"),
        ("2 10**2 K", "10**2 K"),
    ],
)
def test_numbers_are_written_in_one_piece(text, rest):
    """The unit library would multiply what stands side by side; here a number that goes on is refused."""
    with pytest.raises(ValueError, match=f'"{re.escape(rest)}" is not a unit; write the number without spaces'):
        quantity(text)


@pytest.mark.parametrize("text", ["0.04 % ppm", "3 ppm ppm", "50 % %", "5 % K", "5 sqrt(4) K"])
def test_one_unit(text):
    """Names of plain numbers beside other names are factors, and refused."""
    with pytest.raises(ValueError, match="multiplies numbers; write one number and one unit"):
        quantity(text)


@pytest.mark.parametrize(
    "text", ["4.3 um", "4.3um", "4.3 \u00b5m", "4.3 \u03bcm", "4.3\u00a0um", " 4.3  micron ", "4300 nm"]
)
def test_ways_to_write_a_wavelength(text):
    """Both characters for micro are read, and so are the spaces that text processors put in."""
    assert quantity(text).to_value(u.um) == pytest.approx(4.3, rel=1e-12)


@pytest.mark.parametrize("text", ["60 1/cm", "60 cm-1", "60 / cm", "60 cm^-1"])
def test_ways_to_write_a_wavenumber(text):
    """An inverse may begin with its 1."""
    assert quantity(text) == 60 / u.cm


@given(number=st.sampled_from(["1", "2.5e-3"]), unit=st.text("hKm %p1/.,*^()-e'_", max_size=8))
@settings(derandomize=True, deadline=None, max_examples=300)
def test_any_text_is_read_or_refused(number, unit):
    """Whatever stands behind a number, no other error comes out."""
    with suppress(ValueError):
        assert np.isfinite(quantity(f"{number} {unit}").value)


@pytest.mark.parametrize("text", ["-1.5 mag", "\u22121.5 mag"])
def test_minus_signs(text):
    """The minus sign of print is one too."""
    assert quantity(text) == -1.5 * u.mag


@pytest.mark.parametrize(
    ("value", "ratio"),
    [
        ("350 ppm", 3.5e-4),
        ("5 ppb", 5e-9),
        ("2 ppt", 2e-12),
        ("1 %", 0.01),
        ("1e-3 %", 1e-5),
        ("400ppm", 4e-4),
        (1e-6, 1e-6),
        (1, 1.0),
    ],
)
def test_mixing_ratio(value, ratio):
    """ppt is parts per trillion; decimal values stay decimal."""
    assert MixingRatio()(value) == ratio


@pytest.mark.parametrize("value", ["1e-6", "3 bar", "4 0 ppm", 0, -1e-6, 1.5, "200 %", float("nan"), True, "", [1e-6]])
def test_mixing_ratio_invalid(value):
    """A bare number in quotes, a wrong unit, and anything out of (0, 1] are refused."""
    with pytest.raises(ValueError, match="expected a mixing ratio above 0 and up to 1"):
        MixingRatio()(value)


def test_mixing_ratios():
    """One ratio is a list of one; repeated ones are refused however they are written."""
    assert MixingRatios()("1 ppm") == (1e-6,)
    assert MixingRatios()(["1 ppm", 1e-5]) == (1e-6, 1e-5)
    with pytest.raises(ValueError, match="expected different mixing ratios"):
        MixingRatios()(["1 ppm", 1e-6])


def test_number_range():
    """Ends belong to the range unless they are open."""
    number = Number(kind="a share", low=0, high=1, open_low=True)
    assert number(1) == 1.0
    for bad in (0, 1.01, "1", False, float("inf")):
        with pytest.raises(ValueError, match="expected a share above 0 up to 1"):
            number(bad)


def test_gas():
    """Formulas and common names in any case come out as the formula."""
    assert [Gas()(name) for name in ("CO2", "co2", "cfc-12", "Methane")] == ["CO2", "CO2", "CCl2F2", "CH4"]
    with pytest.raises(ValueError, match="CFC-112"):
        Gas()("CFC-112")


def test_gas_amounts_name_a_gas_twice():
    """Two names of one gas do not add up silently."""
    reading = GasAmounts(expected="a table", amount=MixingRatio())
    assert reading({"CFC-12": "1 ppb"}) == {"CCl2F2": 1e-9}
    with pytest.raises(ValueError, match="CCl2F2 is given twice"):
        reading({"CFC-12": "1 ppb", "CCl2F2": "2 ppb"})


def test_sets():
    """Sets hold at least two different gases."""
    assert Sets()([["CFC-11", "CFC-12"]]) == (("CCl3F", "CCl2F2"),)
    for bad in ("CFC-11", ["CFC-11"], [["CFC-11"]]):
        with pytest.raises(ValueError, match="expected a list of sets"):
            Sets()(bad)
    with pytest.raises(ValueError, match="different gases"):
        Sets()([["CFC-11", "CCl3F"]])


def test_words_of_messages():
    """Values are shown as the file writes them, cut where long; a near name is offered."""
    assert [shown(v) for v in ("a", True, {"a": 1}, [{"a": 1}])] == ['"a"', "true", "a table", "a list of tables"]
    assert len(shown("x" * 200)) == 60
    assert nearest("mas", ["mass", "radius"]) == '; did you mean "mass"?'
    assert nearest("zzz", ["mass"]) == ""
