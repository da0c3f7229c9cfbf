"""Cross-sections in two columns."""

from __future__ import annotations

import re

import numpy as np
import pytest

from planner.errors import LineDataError
from planner.spectroscopy.files.columns import evenly_spaced, parse_columns

TEXT = "# a comment\n1000.0 1e-20\n1001.0, 2e-20\n\n1002.0;-3e-21 # noise\n"
STATE = {"formula": "SO2", "temperature_k": 296.0, "pressure_torr": 760.0, "where": "here:1"}


def parse(text, x_unit="1/cm", y_unit="cm2"):
    return parse_columns(text, "here", x_unit=x_unit, y_unit=y_unit)


def test_rows_comments_and_separators():
    """Blanks, commas and semicolons separate; comments and empty rows are passed over; negative values stay."""
    wavenumber, values = parse(TEXT)
    np.testing.assert_array_equal(wavenumber, [1000.0, 1001.0, 1002.0])
    np.testing.assert_array_equal(values, [1e-20, 2e-20, -3e-21])


@pytest.mark.parametrize(
    ("x", "unit", "expected"),
    [("250 300", "nm", (1e7 / 300, 1e7 / 250)), ("2 5", "um", (2000, 5000)), ("60 90", "THz", (2001.38, 3002.08))],
)
def test_units_of_the_first_column(x, unit, expected):
    """Wavelengths and frequencies become ascending wavenumbers, the values going with them."""
    one, other = x.split()
    wavenumber, values = parse(f"{one} 1e-20\n{other} 2e-20\n", x_unit=unit)
    np.testing.assert_allclose(wavenumber, expected, rtol=1e-5)
    assert (values[0] < values[1]) == (unit == "THz")


@pytest.mark.parametrize(("unit", "factor"), [("cm2", 1.0), ("m2", 1e4), ("1e-20 cm2", 1e-20), ("Mbarn", 1e-18)])
def test_units_of_the_second_column(unit, factor):
    """Any area will do, with a number in front or without."""
    _, values = parse("1 3\n2 4\n", y_unit=unit)
    np.testing.assert_allclose(values, [3 * factor, 4 * factor])


@pytest.mark.parametrize(
    ("x_unit", "y_unit", "message"),
    [("K", "cm2", "unit of the first column"), ("1/cm", "cm", "unit of the second column"), ("1/cm", "foo", "second")],
)
def test_wrong_units_are_refused(x_unit, y_unit, message):
    """A unit of another kind, or none at all, is named."""
    with pytest.raises(LineDataError, match=message):
        parse(TEXT, x_unit, y_unit)


@pytest.mark.parametrize(
    ("text", "message"),
    [
        ("1 2\n3\n", "here:2: expected two numbers, got '3'"),
        ("1 2\n3 4 5\n", "here:2: expected two numbers, got '3 4 5'"),
        ("x y\n1 2\n", "here:1: expected two numbers, got 'x y'; comments begin with #"),
        ("1 2\n3 nan\n", "here:2: expected two numbers"),
        ("1 2\n3 1e999\n", "here:2: expected finite numbers"),
        ("-1 2\n3 4\n", "here:1: expected finite numbers, the first greater than 0"),
        ("1 2\n3 4\n2 5\n", "here:3: first column: expected it to ascend as it begins, got 2 after 3"),
        ("3 2\n2 4\n# x\n2 5\n", "here:4: first column: expected it to descend as it begins, got 2 after 2"),
        ("1 2\n", "here: expected at least two rows"),
    ],
)
def test_broken_tables_are_refused(text, message):
    """The first fault is named with file and line."""
    with pytest.raises(LineDataError, match=re.escape(message)):
        parse(text)


def test_even_tables_keep_their_values():
    """Wavenumbers rounded in print are still even."""
    wavenumber = np.round(np.linspace(1000.0, 1100.0, 1661), 4)
    values = np.sin(wavenumber) * 1e-20
    table, note = evenly_spaced(wavenumber, values, **STATE)
    np.testing.assert_array_equal(table.cross_section_cm2, values)
    assert note == "evenly spaced as it stands"


def test_uneven_tables_are_interpolated_to_their_finest_spacing():
    """No point is farther from the next than in the densest part; the ends stay."""
    wavenumber = np.array([100.0, 101.0, 103.0, 110.0])
    table, note = evenly_spaced(wavenumber, wavenumber * 1e-20, **STATE)
    assert table.step_per_cm == pytest.approx(1.0)
    np.testing.assert_allclose(table.cross_section_cm2, table.wavenumber_per_cm * 1e-20)
    assert note == "interpolated linearly from 4 to 11 evenly spaced points"


def test_too_many_points_are_refused():
    """One pair of points that nearly coincide does not fill the disk."""
    with pytest.raises(LineDataError, match="1e-06 per cm apart"):
        evenly_spaced(np.array([100.0, 100.000001, 2000.0]), np.ones(3), **STATE)


@pytest.mark.parametrize("seed", range(50))
def test_fifty_damaged_copies_are_refused(damage, seed):
    """Faults that free format can show are noticed with file and line: letters, lost or repeated numbers, disorder."""
    rng = np.random.default_rng(seed)
    rows = [f"{1000 + 0.5 * i:.4f} {value:.4E}" for i, value in enumerate(rng.normal(1e-20, 1e-20, 60))]
    data = ("\n".join(rows) + "\n").encode()
    kind = ("overwrite", "control", "join", "repeat", "wrap")[seed % 5]
    spots = [i for i in range(len(data)) if chr(data[i]).strip()]
    if kind == "wrap":  # between the two numbers or inside one
        spots = [i for i in spots if data[i - 1 : i] != b"\n"]
    with pytest.raises(LineDataError, match=r"here:\d+: "):
        parse(damage(data, spots, kind, rng))
