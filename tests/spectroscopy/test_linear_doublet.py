"""Lines of NO."""

from __future__ import annotations

import tomllib
from typing import Any

import numpy as np
import pytest

from planner.errors import LineDataError
from planner.resources import data_folder
from planner.spectroscopy.lists.doublet import doublet_lines, doublet_states

HALVES = np.arange(1, 40) + 0.5
GROUND = [58.18, 1.6961, 5.47e-6, 123.14, 1.8e-4, 0.0119, 9.5e-5]
EXCITED = [1934.17, 1.6785, 5.49e-6, 122.89, 1.7e-4, 0.0119, 9.4e-5]


def _part(bands: list[Any], **more: Any) -> dict[str, Any]:
    levels = [[0, *GROUND, "x"], [1, *EXCITED, "x"]]
    species = {"isotopologue": 1, "nuclear_weight": 3, "levels": levels, "bands": bands} | more
    widths = [[0.5, 0.06, 0.07, 0.7], [20.5, 0.05, 0.06, 0.6]]
    return {"weakest_cm": 0.0, "largest_j": 40, "widths": widths, "species": [species]}


def _by_diagonalisation(constants: list[float], j: float, parity: int) -> np.ndarray:
    """Energies by building the matrix and handing it to LAPACK."""
    term, b, d, a, a_d, p_2q, q = constants
    z = (j + 0.5) ** 2 - 1
    n2 = np.array([[z, -np.sqrt(z)], [-np.sqrt(z), z + 2]])
    spin = np.diag([1.0, -1.0])
    matrix = term * np.eye(2) + a / 2 * spin + a_d / 4 * (n2 @ spin + spin @ n2) + b * n2 - d * n2 @ n2
    matrix[1, 1] -= parity * p_2q * (j + 0.5) / 2
    matrix[0, 1] += parity * q * (j + 0.5) * np.sqrt(z) / 2
    matrix[1, 0] = matrix[0, 1]
    return np.linalg.eigvalsh(matrix)[::-1]


@pytest.mark.parametrize("parity", [1, -1])
def test_against_diagonalisation(parity: int) -> None:
    """Energies of both spin components, all constants in play."""
    energy, vector = doublet_states(GROUND, HALVES, parity)
    expected = np.array([_by_diagonalisation(GROUND, j, parity) for j in HALVES]).T
    assert np.allclose(energy, expected, rtol=0, atol=1e-9)
    assert np.allclose(np.einsum("sbj,tbj->stj", vector, vector), np.eye(2)[:, :, np.newaxis], atol=1e-12)


def test_hill_van_vleck() -> None:
    """Without distortion and doubling: B (J+1/2)**2 +/- B/2 sqrt(4 (J+1/2)**2 + Y(Y-4)), Y = A/B.

    Hill and Van Vleck 1928, Phys. Rev. 32, 250.
    """
    b, a = 1.7, 123.0
    energy, _ = doublet_states([0.0, b, 0, a, 0, 0, 0], HALVES, 1)
    y = a / b
    half = b / 2 * np.sqrt(4 * (HALVES + 0.5) ** 2 + y * (y - 4))
    assert np.allclose(energy, b * (HALVES + 0.5) ** 2 + np.array([[1.0], [-1.0]]) * half, atol=1e-9)


def test_without_spin_orbit_coupling() -> None:
    """A = 0 leaves B N(N+1) with N = J +/- 1/2."""
    energy, _ = doublet_states([0.0, 1.7, 0, 0.0, 0, 0, 0], HALVES, 1)
    for row, n in zip(energy, (HALVES + 0.5, HALVES - 0.5), strict=True):
        assert np.allclose(row, 1.7 * n * (n + 1), atol=1e-9)


def test_lowest_level_has_one_component() -> None:
    """J = 1/2 exists for Omega = 1/2 only, split by p + 2q."""
    energy_e, _ = doublet_states(GROUND, np.array([0.5]), 1)
    energy_f, _ = doublet_states(GROUND, np.array([0.5]), -1)
    assert np.isnan(energy_e[0, 0])
    assert energy_f[1, 0] - energy_e[1, 0] == pytest.approx(GROUND[5], rel=1e-9)


def test_band_adds_up() -> None:
    """The lines of both spin components, and the weak ones between them, add up to the stated intensity."""
    lines = doublet_lines(_part([[1, 0, 4.6e-18, 0.0, "x"]]), 8)
    assert lines.intensity_cm.sum() == pytest.approx(4.6e-18, rel=1e-12)
    crossing = lines.where(np.char.strip(lines.upper_global) == "X3/2   1")
    crossing = crossing.where(np.char.strip(crossing.lower_global) == "X1/2   0")
    assert 0 < crossing.intensity_cm.sum() < 1e-3 * 4.6e-18


def test_branches_without_coupling() -> None:
    """With spin components far apart the branches are those of a symmetric top with K = Omega; here P(5.5)/R(5.5)."""
    part = _part([[1, 0, 1e-18, 0.0, "x"]])
    loose = [0.0, 1.7, 0, 1e5, 0, 0, 0]
    part["species"][0]["levels"] = [[0, *loose, "x"], [1, 2000.0, *loose[1:], "x"]]
    lines = doublet_lines(part, 8)
    found = {}
    for branch in "PR":
        mask = lines.lower_local == f"   {branch}  5.5e"
        mask &= np.char.strip(lines.lower_global) == "X1/2   0"
        mask &= np.char.strip(lines.upper_global) == "X1/2   1"
        assert mask.sum() == 1
        found[branch] = (lines.intensity_cm[mask][0], lines.wavenumber_per_cm[mask][0])
    factor = ((5.5**2 - 0.25) / 5.5) / ((6.5**2 - 0.25) / 6.5)
    expected = factor * found["P"][1] / found["R"][1]
    assert found["P"][0] / found["R"][0] == pytest.approx(expected, rel=1e-3)


def test_shipped_list() -> None:
    """Weights are 3 (2J+1), labels 15 columns, every band adds up to 1 % with the cut-off on."""
    with (data_folder("linelists") / "NO.toml").open("rb") as file:
        table = tomllib.load(file)
    part = table["part"][0]
    lines = doublet_lines(part, 8)
    main = lines.where(lines.isotopologue == 1)
    j = np.array([float(label[4:9]) for label in main.lower_local])
    assert np.array_equal(main.lower_weight, 3 * (2 * j + 1))
    assert all(len(label) == 15 for label in main.lower_global)
    assert lines.intensity_cm.sum() == pytest.approx(
        sum(row[2] for species in part["species"] for row in species["bands"]), rel=0.01
    )
    assert {r[-1] for s in part["species"] for r in s["levels"] + s["bands"]} <= set(table["sources"])


@pytest.mark.parametrize(
    ("bands", "message"),
    [
        ([[2, 0, 1e-18, 0, "x"]], "no level v = 2"),
        ([[1, 0, 0.0, 0, "x"]], "S > 0"),
        ([[1, 0, 1e-18, "x"]], "expected upper v"),
    ],
)
def test_broken_bands(bands: list[Any], message: str) -> None:
    """Each broken row is named."""
    with pytest.raises(LineDataError, match=message):
        doublet_lines(_part(bands), 8)


def test_broken_levels() -> None:
    """A level row of the wrong length is named."""
    with pytest.raises(LineDataError, match="level"):
        doublet_lines(_part([[1, 0, 1e-18, 0, "x"]], levels=[[0, 1.0, "x"]]), 8)
