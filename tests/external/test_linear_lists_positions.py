"""Positions from the embedded lists of linear molecules and NO against measured frequencies."""

from __future__ import annotations

import numpy as np
import pytest

from planner.spectroscopy.lists.build import read_constants
from planner.spectroscopy.lists.doublet import doublet_states
from planner.spectroscopy.lists.linear import linear_lines
from planner.spectroscopy.lists.linear_levels import E, Levels

GHZ_PER_WAVENUMBER = 29.9792458


def _position(formula: str, upper: str, lower: str, label: str) -> float:
    constants = read_constants(formula)
    number = constants.molecule.hitran_number
    assert number is not None
    lines = linear_lines(constants.line_parts[0], number)
    mask = (lines.isotopologue == 1) & np.char.endswith(lines.lower_local, label)
    mask &= (np.char.strip(lines.upper_global) == upper) & (np.char.strip(lines.lower_global) == lower)
    assert mask.sum() == 1
    return float(lines.wavenumber_per_cm[mask][0])


@pytest.mark.parametrize(
    ("label", "expected"),
    [("P  1", 2139.4261), ("R  0", 2147.0811), ("R 10", 2183.2238), ("P 10", 2103.2697)],
)
def test_carbon_monoxide_calibration_lines(label: str, expected: float) -> None:
    """CO 1-0: Maki and Wells 1991, NIST Special Publication 821 (values from memory)."""
    assert _position("CO", "1", "0", label) == pytest.approx(expected, abs=3e-4)


@pytest.mark.parametrize(
    ("lower", "label", "expected"),
    [
        ("1 0 0 01", "P 20e", 944.1940),
        ("1 0 0 01", "R 20e", 975.9304),
        ("1 0 0 02", "P 20e", 1046.8542),
        ("1 0 0 02", "R 20e", 1078.5906),
    ],
)
def test_carbon_dioxide_laser_lines(lower: str, label: str, expected: float) -> None:
    """The 10.4 and 9.4 um laser lines: Bradley, Soohoo and Freed 1986, IEEE JQE 22, 234 (values from memory)."""
    assert _position("CO2", "0 0 0 11", lower, label) == pytest.approx(expected, abs=1e-3)


@pytest.mark.parametrize(("label", "expected"), [("P  1", 2865.098), ("R  0", 2906.247), ("R  1", 2925.897)])
def test_hydrogen_chloride_lines(label: str, expected: float) -> None:
    """H35Cl 1-0: Rank, Rao and Wiggins 1965, J. Mol. Spectrosc. 17, 122 (values from memory)."""
    assert _position("HCl", "1", "0", label) == pytest.approx(expected, abs=3e-3)


@pytest.mark.parametrize(("label", "expected"), [("P  1", 3920.312), ("R  0", 4000.989)])
def test_hydrogen_fluoride_lines(label: str, expected: float) -> None:
    """HF 1-0: Guelachvili 1976, Opt. Commun. 19, 150 (values from memory)."""
    assert _position("HF", "1", "0", label) == pytest.approx(expected, abs=3e-3)


@pytest.mark.parametrize(("label", "expected_nm"), [("P 13e", 1532.83045), ("P 14e", 1533.46136)])
def test_acetylene_wavelength_reference(label: str, expected_nm: float) -> None:
    """v1 + v3 of 12C2H2: certificate of NIST Standard Reference Material 2517a, vacuum (values from memory)."""
    position = _position("C2H2", "1 0 1 0 0 0+ u", "0 0 0 0 0 0+ g", label)
    assert position == pytest.approx(1e7 / expected_nm, abs=3e-3)


@pytest.mark.parametrize(
    ("formula", "isotopologue", "name", "expected_ghz", "tolerance_ghz"),
    [
        ("CO", 1, "0", 115.271202, 0.001),
        ("CO", 2, "0", 110.201354, 0.001),
        ("CO", 3, "0", 109.782173, 0.001),
        ("HCN", 1, "0 0 0 0", 88.631602, 0.001),
        ("HCN", 2, "0 0 0 0", 86.339921, 0.002),
        ("OCS", 1, "0 0 0 0", 12.162979, 0.001),
        ("N2O", 1, "0 0 0 0", 25.12325, 0.001),
        ("HCl", 1, "0", 625.9187, 0.02),
        ("HF", 1, "0", 1232.4763, 0.02),
    ],
)
def test_first_rotational_line(
    formula: str, isotopologue: int, name: str, expected_ghz: float, tolerance_ghz: float
) -> None:
    """J = 1-0 in the ground state: catalogue of Pickett et al. 1998, JQSRT 60, 883 (values from memory)."""
    species = read_constants(formula).line_parts[0]["species"]
    rows = next(table["levels"] for table in species if table["isotopologue"] == isotopologue)
    levels = Levels.from_rows([row for row in rows if row[0] == name])
    zero, one = levels.energy_per_cm(np.array([0, 0]), np.array([0, 1]), E)
    assert (one - zero) * GHZ_PER_WAVENUMBER == pytest.approx(expected_ghz, abs=tolerance_ghz)


def test_nitric_oxide_radio_lines() -> None:
    """Omega = 1/2, J = 3/2-1/2 near 150.2 and 150.55 GHz, J = 5/2-3/2 near 250.44 and 250.80 GHz; doubling 355 MHz.

    Gottlieb et al. 1979, ApJ 227, 422; Neumann 1970, ApJ 161, 779 (values from memory; the hyperfine lines, which the
    list leaves out, spread over 0.1 GHz around the first two).
    """
    ground = read_constants("NO").line_parts[0]["species"][0]["levels"][0][1:8]
    j = np.array([0.5, 1.5, 2.5])
    energy_e, energy_f = (doublet_states(ground, j, parity)[0][1] for parity in (1, -1))
    assert np.diff(energy_e) * GHZ_PER_WAVENUMBER == pytest.approx([150.20, 250.44], abs=0.06)
    assert np.diff(energy_f) * GHZ_PER_WAVENUMBER == pytest.approx([150.55, 250.80], abs=0.06)
    assert (energy_f - energy_e)[0] * GHZ_PER_WAVENUMBER == pytest.approx(0.355, abs=0.003)
