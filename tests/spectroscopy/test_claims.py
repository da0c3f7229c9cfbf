"""What constants files say of themselves."""

from __future__ import annotations

from pathlib import Path

import pytest

from planner.spectroscopy.claims import band_rows, claim_of, plain_label, stated_factor
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.build import parse_constants, read_constants


@pytest.mark.parametrize(
    ("text", "factor"),
    [
        ("from memory, within a factor 1.5", 1.5),
        ("guess, factor 2-3", 3.0),
        ("from memory; nu1 and nu2 3 %, 2 nu2 5 %, 1880 per cm 30 to 50 %", 1.5),
        ("fitted to level energies of HITRAN2012", 1.05),
        ("band sum of a published package", 1.1),
        ("from memory", 2.0),
        ("sum from memory; moments fitted to lines", 2.0),
    ],
)
def test_errors_in_words(text: str, factor: float):
    """The largest figure that is named, else what the kind of source is worth."""
    assert stated_factor(text) == pytest.approx(factor)


def test_labels_are_compared_without_ornament():
    """Blanks, marks of mixing and the electronic state of NO do not count."""
    assert plain_label("       X3/2   1") == plain_label(1) == "1"
    assert plain_label("  0 0 0 11") == "00011"
    assert plain_label("011*") == "011"


def test_rows_of_every_kind():
    """Bands of linear, asymmetric, coupled, oxygen and NO parts come with sum and source."""
    for gas, upper, lower in (("CO", "1", "0"), ("NO", "1", "0"), ("H2S", "010", "000"), ("O2", "b0", "X0")):
        rows = [row for part in read_constants(gas).line_parts for row in band_rows(part)]
        found = next(row for row in rows if row.uppers == (upper,) and row.lower == lower)
        assert found.sum_cm > 0
        assert found.source in read_constants(gas).sources
    coupled = [row for part in read_constants("C2H4").line_parts for row in band_rows(part) if len(row.uppers) > 1]
    assert coupled


TEXT = b"""
formula = "CO"
covers_per_cm = [[2000.0, 2300.0]]
[sources]
good = "fitted to lines"
bad = "guess, factor 4"
[[part]]
kind = "linear"
[[part.species]]
isotopologue = 1
bands = [["1", "0", "", 1e-19, 0, 0, "good"], ["2", "1", "", 1e-19, 0, 0, "bad"]]
[[part]]
kind = "statistical"
source = "bad"
bins = [[2000.0, 2100.0, 1e-19, 1.0, 0.0, 0.0, 0.07, 0.7]]
"""


def lines(*upper_lower: tuple[str, str]) -> Lines:
    return Lines.make(
        molecule=5,
        isotopologue=1,
        wavenumber_per_cm=[2050.0 + i for i in range(len(upper_lower))],
        intensity_cm=1e-20,
        lower_energy_per_cm=0.0,
        air_width_per_cm_atm=0.07,
        temperature_exponent=0.7,
        upper_global=[upper for upper, _ in upper_lower],
        lower_global=[lower for _, lower in upper_lower],
    )


def test_shares_of_the_intensity_count():
    """One fitted line and one that was guessed: half is fitted, and the factor is the geometric mean."""
    constants = parse_constants(TEXT, Path("CO.toml"))
    claim = claim_of(constants, lines(("              1", "              0"), ("2", "1")), (2000.0, 2300.0))
    assert claim.fitted_fraction == pytest.approx(0.5)
    assert claim.strength_factor == pytest.approx((4.0 * 1.05) ** 0.5)
    assert set(claim.sources) == {"fitted to lines", "guess, factor 4"}


def test_lines_without_names_go_by_their_bin():
    """Random lines belong to the part whose bins reach the stretch."""
    constants = parse_constants(TEXT, Path("CO.toml"))
    assert claim_of(constants, lines(("", "")), (2000.0, 2300.0)).strength_factor == pytest.approx(4.0)


def test_nothing_is_claimed_where_there_is_nothing():
    """An empty stretch has no sources and counts as unsure."""
    constants = parse_constants(TEXT, Path("CO.toml"))
    claim = claim_of(constants, lines(("1", "0")), (100.0, 200.0))
    assert (claim.sources, claim.strength_factor) == ((), 2.0)


def test_smooth_bands_count_by_their_integral():
    """SF6 at 10.5 um was fitted to measured spectra; CCl4 was recalled."""
    assert claim_of(read_constants("SF6"), None, (900.0, 1000.0)).fitted_fraction == 1.0
    assert claim_of(read_constants("CCl4"), None, (750.0, 820.0)).fitted_fraction == 0.0
