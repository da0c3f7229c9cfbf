"""Reading HITRAN cross-section files."""

from __future__ import annotations

import gzip
import re

import numpy as np
import pytest

from planner.errors import LineDataError
from planner.spectroscopy.files.xsc import format_xsc, parse_xsc, read_xsc


def test_values_and_header(make_xsc):
    """Every field lands where the layout says; points are evenly spaced from first to last."""
    values = np.linspace(1e-19, 4e-18, 57)
    (table,) = parse_xsc(make_xsc(values=values), "here")
    assert (table.formula, table.temperature_k, table.pressure_torr) == ("CCl3F", 293.0, 7.5)
    assert (table.resolution, table.broadener, table.reference) == ("0.03", "N2", "34")
    np.testing.assert_allclose(table.cross_section_cm2, values, rtol=5e-4)
    np.testing.assert_allclose(table.wavenumber_per_cm, np.linspace(830.0, 860.0, 57))
    assert table.where == "here:1"


def test_several_tables_in_one_file(make_xsc):
    """Tables follow each other; each keeps the line of its header."""
    text = make_xsc(temperature=293.0) + make_xsc(temperature=203.0, values=np.ones(20) * 1e-18)
    tables = parse_xsc(text, "here")
    assert [t.temperature_k for t in tables] == [293.0, 203.0]
    assert tables[1].where == "here:8"


@pytest.mark.parametrize("points", [2, 9, 10, 11, 20, 101])
@pytest.mark.parametrize("end", ["\n", "\r\n"])
def test_any_number_of_points(make_xsc, points, end):
    """The last row may be short, full, or filled up with zeros; line ends of both kinds."""
    values = np.full(points, 2e-19)
    text = make_xsc(values=values)
    filled = text.rstrip("\n") + " 0.000E+00" * (-points % 10) + "\n"
    for one in (text, filled):
        (table,) = parse_xsc(one.replace("\n", end), "here")
        np.testing.assert_array_equal(table.cross_section_cm2, values)


def test_negative_values_are_kept_and_counted(make_xsc):
    """Noise below zero stays in the record and is reported, zeros too."""
    values = np.array([1e-19, -2.5e-20, 0.0, 3e-19])
    (table,) = parse_xsc(make_xsc(values=values), "here")
    np.testing.assert_array_equal(table.cross_section_cm2, values)
    assert table.remarks() == ("1 negative and 1 zero values of 4",)


def test_values_that_touch(make_xsc):
    """Ten columns leave no blank between negative values; a lost leading blank does no harm."""
    values = -np.linspace(1e-19, 2e-19, 30)
    (table,) = parse_xsc(make_xsc(values=values), "here")
    np.testing.assert_allclose(table.cross_section_cm2, values, rtol=5e-4)
    header, *rows = make_xsc().splitlines()
    (table,) = parse_xsc("\n".join([header, *(row[1:] for row in rows)]), "here")
    assert table.cross_section_cm2[1] == pytest.approx(1.696e-19)


def test_exponents_of_three_digits(make_xsc):
    """Fortran drops the letter where the exponent needs three digits."""
    header, row = make_xsc(values=np.full(10, 1e-19)).splitlines()
    (table,) = parse_xsc(header + "\n" + row.replace(" 1.000E-19", " 1.000-119", 1), "here")
    assert table.cross_section_cm2[0] == 1e-119


def test_a_header_at_odds_with_its_values_is_reported(make_xsc):
    """A wrong largest value occurs in published files; it is said, not refused."""
    text = make_xsc()
    (table,) = parse_xsc(text.replace("4.000E-18", "4.000E-19", 1), "here")
    assert "the header gives 4.000e-19 cm2 as the largest value, it is 4.000e-18" in table.remarks()[0]


@pytest.mark.parametrize("name", ["CFC-11", "ccl3f", "F11x"])
def test_gas_by_formula_or_common_name(make_xsc, name):
    """Where the formula is not known the common name decides."""
    (table,) = parse_xsc(make_xsc(name=name), "here")
    assert table.formula == "CCl3F"


def test_formatted_tables_read_back(make_xsc):
    """What is written reads as the same table."""
    (table,) = parse_xsc(make_xsc(values=np.linspace(-1e-20, 1e-18, 33)), "here")
    (again,) = parse_xsc(format_xsc(table), "there")
    np.testing.assert_array_equal(again.cross_section_cm2, table.cross_section_cm2)
    assert (again.formula, again.from_per_cm, again.temperature_k, again.pressure_torr, again.common_name) == (
        table.formula, table.from_per_cm, table.temperature_k, table.pressure_torr, table.common_name,
    )  # fmt: skip


def test_plain_and_gzip(make_xsc, tmp_path):
    """Gzip is told by its first bytes, whatever the name."""
    (tmp_path / "a.xsc").write_text(make_xsc())
    (tmp_path / "b.xsc").write_bytes(gzip.compress(make_xsc().encode()))
    np.testing.assert_array_equal(
        read_xsc(tmp_path / "a.xsc")[0].cross_section_cm2, read_xsc(tmp_path / "b.xsc")[0].cross_section_cm2
    )


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("               CCl3F", "               XeF2x", r"here:1: molecule \(columns 1-20\): expected a gas"),
        ("               CCl3F", "                 CF4", r"here:1: molecule: 'CF4' .* different gases"),
        ("  830.0000", "  890.0000", r"here:1: wavenumbers \(columns 21-40\): expected lowest < highest"),
        ("  830.0000", "  8x0.0000", r"here:1: lowest wavenumber \(columns 21-30\): expected a number"),
        ("     57", "      0", r"here:1: number of points \(columns 41-47\)"),
        ("     57", "     67", r"here:8: expected 7 rows for 67 points, the file ends after 6"),
        ("     57", "     40", r"here:6: number of points"),
        ("     57", "     50", r"here:7: header: expected 100 characters, got 70"),
        ("     57", "     53", r"here:7: values: expected 3 numbers"),
        ("  293.0", "    0.0", r"here:1: temperature \(columns 48-54\): expected a number greater than 0"),
        ("   7.5", "  -7.5", r"here:1: pressure \(columns 55-60\): expected a number of 0 or more"),
        (" 4.000E-18", " 4.000E-xx", r"here:1: largest value"),
        (" 1.696E-19", " 1.69 E-19", r"here:2: values: expected 10 numbers"),
        (" 1.696E-19", "       nan", r"here:2: values"),
        (" 1.696E-19", "  1.69E-19", r"here:2: values"),
    ],
)  # fmt: skip
def test_broken_tables_are_refused(make_xsc, old, new, message):
    """The first fault is named with file, line and field."""
    text = make_xsc(common="CFC-11" if "CF4" in new else "")
    assert old in text
    with pytest.raises(LineDataError, match=message):
        parse_xsc(text.replace(old, new, 1), "here")


def test_empty_file_is_refused():
    """Nothing is not a table."""
    with pytest.raises(LineDataError, match="here: expected a table, got an empty file"):
        parse_xsc("\n", "here")


def numeric_spots(data: bytes) -> list[int]:
    """Offsets of the bytes that carry numbers: columns 21 to 70 of the header, everything in the rows."""
    first = data.index(b"\n")
    return [i for i in range(len(data)) if (20 <= i < 70 or i > first) and chr(data[i]).strip()]


@pytest.mark.parametrize("seed", range(50))
def test_fifty_damaged_copies_are_refused(make_xsc, damage, tmp_path, seed):
    """Whatever single fault breaks the format is noticed, with file and line.

    A digit that became another digit is not noticed: nothing in the format could tell.
    """
    rng = np.random.default_rng(seed)
    kind = ("drop", "insert", "overwrite", "control", "cut", "wrap", "join", "lose", "repeat")[seed % 9]
    data = make_xsc(values=rng.normal(1e-18, 1e-18, 237)).encode()
    path = tmp_path / f"{kind}.xsc"
    path.write_bytes(damage(data, numeric_spots(data), kind, rng))
    with pytest.raises(LineDataError, match=re.escape(str(path)) + r":\d+: "):
        read_xsc(path)
