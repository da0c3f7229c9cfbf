"""Line lists of tetrahedral molecules from polyad constants."""

from __future__ import annotations

from math import sqrt

import numpy as np
import pytest

from planner.errors import LineDataError
from planner.spectroscopy.lists.intensities import C2_CM_K, relative_intensity
from planner.spectroscopy.lists.tetrahedral import read_terms, tetrahedral_band_lines

METHANE = 6
NU2, NU3, NU4, B = 1533.0, 3019.0, 1311.0, 5.24


def part(**changes):
    """A rotor with one fundamental that shows, no interactions."""
    return {
        "isotopologues": [[1, 1.0, [0.0, 0.0, 0.0, 0.0], 1, 3]],
        "weakest_cm": 1e-60,
        "widths": [[0, 0.064, 0.062, 0.081, 0.66], [20, 0.044, 0.038, 0.058, 0.59]],
        "hamiltonian": [
            ["", "", 0, 1, [B]],
            ["2", "2", 0, 0, [NU2 * sqrt(2)]],
            ["4", "4", 0, 0, [NU4 * sqrt(3)]],
            ["3", "3", 0, 0, [NU3 * sqrt(3)]],
            ["1", "1", 0, 0, [2916.0]],
            ["", "", 4, 0, [-5e-5]],
        ],
        "coupled": [
            {"lower": "P0", "states": ["P1"], "largest_j": [8], "sum_cm": 5e-18, "moments": [["4", "", 0, 0, [1.0]]]}
        ],
    } | changes


def test_rigid_lines_by_hand():
    """With B the same in both states and no Coriolis force lines lie at nu4 + 2B(J+1), nu4 and nu4 - 2BJ."""
    lines = tetrahedral_band_lines(part(hamiltonian=part()["hamiltonian"][:-1]), METHANE)
    j = np.array([int(label[:5]) for label in lines.lower_local])
    j_up = np.array([int(label[:5]) for label in lines.upper_local])
    expected = NU4 + B * (j_up * (j_up + 1) - j * (j + 1))
    assert lines.wavenumber_per_cm == pytest.approx(expected, abs=1e-9)


def test_sum_and_lower_states():
    """The cold lines of the first isotopologue have the stated sum; hot bands come with their Boltzmann factor."""
    coupled = [
        {"lower": "P0", "states": ["P1"], "largest_j": [16, 16], "sum_cm": 5e-18, "moments": [["4", "", 0, 0, [1.0]]]}
    ]
    lines = tetrahedral_band_lines(part(coupled=coupled), METHANE)
    cold = np.char.strip(lines.lower_global) == "P0"
    assert lines.intensity_cm[cold].sum() == pytest.approx(5e-18, rel=1e-9)
    # harmonic oscillators: nu4 from nu4 = 1, two quanta above in 3 directions, is as strong as 2 + 2 of the cold band
    # (3 states, each raised with 2 along itself and 1 along the two others), from nu2 = 1 it is as strong as 2
    from_nu4, from_nu2 = (np.exp(-C2_CM_K * e / 296.0) for e in (NU4, NU2))
    expected = 4.0 * from_nu4 + 2.0 * from_nu2
    assert lines.intensity_cm[~cold].sum() / 5e-18 == pytest.approx(expected, rel=0.01)


def test_spin_weights():
    """The three R(3) lines of A2, F1, F2 are as 5 : 3 : 3."""
    lines = tetrahedral_band_lines(part(), METHANE)
    r3 = (np.char.startswith(lines.lower_local, "    3")) & (np.char.startswith(lines.upper_local, "    4"))
    sums = {s: lines.intensity_cm[r3 & (np.char.find(lines.lower_local, s) > 0)].sum() for s in ("A2", "F1", "F2")}
    assert sums["F1"] == pytest.approx(sums["F2"], rel=1e-3)
    assert sums["A2"] / sums["F1"] == pytest.approx(5 / 3, rel=1e-3)


def test_branches_of_a_rigid_band():
    """Freed of Boltzmann factors the lines from J go as 2J'+1: the Hoenl-London factors of a spherical top."""
    lines = tetrahedral_band_lines(part(hamiltonian=part()["hamiltonian"][:-1]), METHANE)
    j = np.array([int(label[:5]) for label in lines.lower_local])
    j_up = np.array([int(label[:5]) for label in lines.upper_local])
    bare = lines.intensity_cm / relative_intensity(lines.wavenumber_per_cm, lines.lower_energy_per_cm)
    p, q, r = (bare[(j == 5) & (j_up == 5 + step)].sum() for step in (-1, 0, 1))
    assert [q / p, r / p] == pytest.approx([11 / 9, 13 / 9])


def test_isotopologue_shift_and_abundance():
    """The second isotopologue is displaced by the shift of its mode and weaker by the stated ratio."""
    rows = [[1, 1.0, [0.0, 0.0, 0.0, 0.0], 0, 3], [2, 0.011, [0.0, 0.0, 0.0, -8.0], 0, 3]]
    lines = tetrahedral_band_lines(part(isotopologues=rows), METHANE)
    first, second = (lines.where(lines.isotopologue == number) for number in (1, 2))
    assert second.wavenumber_per_cm == pytest.approx(first.wavenumber_per_cm - 8.0, abs=1e-6)
    assert second.intensity_cm.sum() / first.intensity_cm.sum() == pytest.approx(0.011, rel=0.01)


def test_largest_step_leaves_systems_out():
    """A row that stops at one step has no lines of two."""
    coupled = [
        {"lower": "P0", "states": ["P1"], "largest_j": [3], "sum_cm": 5e-18, "moments": [["4", "", 0, 0, [1.0]]]},
        {"lower": "P0", "states": ["P2"], "largest_j": [3], "sum_cm": 1e-17, "moments": [["3", "", 0, 0, [1.0]]]},
    ]
    rows = [[1, 1.0, [0.0] * 4, 0, 3], [2, 0.011, [0.0] * 4, 0, 1]]
    lines = tetrahedral_band_lines(part(isotopologues=rows, coupled=coupled), METHANE)
    assert set(np.char.strip(lines.upper_global[lines.isotopologue == 2])) == {"P1"}
    assert set(np.char.strip(lines.upper_global[lines.isotopologue == 1])) == {"P1", "P2"}


def test_widths_and_weights():
    """Widths follow J'' and the species; weights are 5, 2, 3 times 2J+1."""
    lines = tetrahedral_band_lines(part(), METHANE)
    e_species = np.char.find(lines.lower_local, "E") > 0
    j = np.array([int(label[:5]) for label in lines.lower_local])
    assert lines.air_width_per_cm_atm[e_species] == pytest.approx(0.062 - 0.0012 * j[e_species])
    assert lines.air_width_per_cm_atm[~e_species] == pytest.approx(0.064 - 0.001 * j[~e_species])
    assert lines.lower_weight[e_species] == pytest.approx(2 * (2 * j[e_species] + 1))


def test_cut():
    """Weak lines are dropped, by their strength at 296 or 600 K."""
    lines = tetrahedral_band_lines(part(), METHANE)
    fewer = tetrahedral_band_lines(part(weakest_cm=1e-22), METHANE)
    assert 0 < len(fewer) < len(lines)
    assert fewer.intensity_cm.sum() > 0.999 * lines.intensity_cm.sum()


def test_bad_states():
    """Only transitions from the ground state to one polyad can be stated."""
    table = {"lower": "P1", "states": ["P2"], "largest_j": [3], "sum_cm": 1e-18, "moments": []}
    with pytest.raises(LineDataError, match='expected lower "P0" and states such as'):
        tetrahedral_band_lines(part(coupled=[table]), METHANE)


@pytest.mark.parametrize(
    ("row", "message"),
    [
        (["4", "4", 2, 0, [0.1]], "there are 2 independent operators, got 1 values"),
        (["4", "4", 0, 0], "expected made, destroyed, degree, power"),
    ],
)
def test_bad_rows(row, message):
    """Rows that do not fit the operators are named."""
    with pytest.raises(LineDataError, match=message):
        read_terms([row], where="here")
