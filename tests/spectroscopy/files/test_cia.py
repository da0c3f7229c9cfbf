"""Reading HITRAN collision files."""

from __future__ import annotations

import re

import numpy as np
import pytest

from planner.errors import LineDataError
from planner.spectroscopy.files.cia import parse_cia, read_cia


def test_blocks(make_cia):
    """One block per temperature, the pair in alphabetical order whatever the file's."""
    cold, warm = parse_cia(make_cia(), "here")
    assert cold.pair == ("H2", "N2")
    assert (cold.temperature_k, warm.temperature_k) == (200.0, 300.0)
    np.testing.assert_array_equal(cold.wavenumber_per_cm, np.arange(100.0, 140.0))
    np.testing.assert_array_equal(warm.coefficient_cm5, 2e-44)
    assert (cold.where, warm.where) == ("here:1", "here:42")
    assert (warm.reference, warm.comment) == ("12", "")


def test_uncertainties_are_checked_and_not_kept(make_cia):
    """A third column, in all rows or in some, changes nothing."""
    plain, (one, _) = parse_cia(make_cia(), "here")[0], parse_cia(make_cia(errors=True), "here")
    np.testing.assert_array_equal(one.coefficient_cm5, plain.coefficient_cm5)
    rows = make_cia(errors=True).splitlines()
    rows[3] = rows[3][:21]
    np.testing.assert_array_equal(parse_cia("\n".join(rows), "here")[0].coefficient_cm5, plain.coefficient_cm5)


def test_negative_values_are_kept_and_counted(make_cia):
    """Noise below zero stays in the record and is reported."""
    k = np.tile([1e-46, -2e-47, 0.0, 3e-46], 10)
    (table,) = parse_cia(make_cia(temperatures=(250.0,), coefficient=[k]), "here")
    np.testing.assert_array_equal(table.coefficient_cm5, k)
    assert table.remarks() == ("10 negative and 10 zero values of 40",)


@pytest.mark.parametrize(
    ("written", "pair", "usable"),
    [
        ("CO2-CO2", ("CO2", "CO2"), True),
        ("H2-CH4 (equilibrium)", ("CH4", "H2"), True),
        ("CO2-He", ("CO2", "He"), True),
        ("O2-Air", ("Air", "O2"), False),
        ("H2-H", ("H", "H2"), False),
    ],
)
def test_pairs(make_cia, written, pair, usable):
    """Pairs with air or atoms are published too; no scenario can name them."""
    table = parse_cia(make_cia(pair=written), "here")[0]
    assert (table.pair, table.usable) == (pair, usable)


def test_exponents_of_three_digits(make_cia):
    """Very small coefficients are written with three digits, with or without the letter."""
    for spelling in ("1.000-144", "1.000E-144"):
        text = make_cia(temperatures=(300.0,)).replace("1.000E-44", spelling).replace(spelling, "1.000E-44", 1)
        assert parse_cia(text, "here")[0].coefficient_cm5[0] == 1e-144


@pytest.mark.parametrize(
    ("old", "new", "message"),
    [
        ("N2-H2", "N2-Hg", r"here:1: pair \(columns 1-20\): expected two gases, got 'N2-Hg'"),
        ("N2-H2", "N2_H2", r"here:1: pair \(columns 1-20\): expected two gases such as N2-H2"),
        ("   100.000", "   1x0.000", r"here:1: lowest wavenumber"),
        ("   100.000", "   120.000", r"here:1: wavenumbers \(columns 21-40\): expected those of the rows, 100 and 139"),
        ("     40", "     41", r"here:42: row: expected a wavenumber and a coefficient"),
        ("     40", "     39", r"here:41: header: expected 100 characters, got 21"),
        ("     40", "     xx", r"here:1: number of points"),
        ("  200.0", "  -20.0", r"here:1: temperature"),
        (
            "  101.0000  1.000E-44",
            "  102.0000  1.000E-44",
            r"here:4: wavenumber: expected more than 102 of the row above",
        ),
        ("  101.0000  1.000E-44", "  101.0000  1.00E-44", r"here:3: row: expected .* written alike in all rows"),
        ("  101.0000  1.000E-44", "  101.0000       nan", r"here:3: row"),
        ("  101.0000  1.000E-44", "  101.0000", r"here:3: row"),
    ],
)
def test_broken_blocks_are_refused(make_cia, old, new, message):
    """The first fault is named with file, line and field."""
    text = make_cia()
    assert old in text
    with pytest.raises(LineDataError, match=message):
        parse_cia(text.replace(old, new, 1), "here")


def test_too_few_rows(make_cia):
    """A file that ends within a block says how many rows it should have."""
    rows = make_cia().splitlines()[:-3]
    with pytest.raises(LineDataError, match="here:80: expected 40 rows as the header says, the file ends after 37"):
        parse_cia("\n".join(rows), "here")


def number_spots(data: bytes) -> list[int]:
    """Offsets of the bytes that carry the pair or numbers: columns 1 to 64 of headers, everything in rows."""
    spots, start = [], 0
    for row in data.splitlines(keepends=True):
        width = 64 if len(row) > 60 else len(row)
        spots += [start + i for i in range(width) if chr(row[i]).strip()]
        start += len(row)
    return spots


@pytest.mark.parametrize("seed", range(50))
def test_fifty_damaged_copies_are_refused(make_cia, damage, tmp_path, seed):
    """Whatever single fault breaks the format is noticed, with file and line.

    A digit that became another digit is not noticed: nothing in the format could tell.
    """
    rng = np.random.default_rng(seed)
    kind = ("drop", "insert", "overwrite", "control", "cut", "wrap", "join", "lose", "repeat")[seed % 9]
    data = make_cia(coefficient=rng.normal(1e-44, 1e-44, (2, 40))).encode()
    path = tmp_path / f"{kind}.cia"
    path.write_bytes(damage(data, number_spots(data), kind, rng))
    with pytest.raises(LineDataError, match=re.escape(str(path)) + r":\d+: "):
        read_cia(path)
