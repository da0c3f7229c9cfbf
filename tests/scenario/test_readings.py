"""Single values of a scenario: units, ratios, gases, and what is said of bad ones."""

from __future__ import annotations

import astropy.units as u
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.scenario.readings import Gas, GasAmounts, Measure, MixingRatio, MixingRatios, Number, Sets, nearest, shown

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
    ("value", "ratio"),
    [("350 ppm", 3.5e-4), ("5 ppb", 5e-9), ("2 ppt", 2e-12), ("1 %", 0.01), (1e-6, 1e-6), (1, 1.0)],
)
def test_mixing_ratio(value, ratio):
    """ppt is parts per trillion; decimal values stay decimal."""
    assert MixingRatio()(value) == ratio


@pytest.mark.parametrize("value", ["1e-6", "3 bar", 0, -1e-6, 1.5, "200 %", float("nan"), True, "", [1e-6]])
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
