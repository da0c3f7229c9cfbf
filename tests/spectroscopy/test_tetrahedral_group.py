"""The group Td, its species, and the rotational functions it acts on."""

from __future__ import annotations

import numpy as np
import pytest

from planner.spectroscopy.lists.tetrahedral_group import (
    PARTNERS,
    SPECIES,
    adapted,
    group_elements,
    rotation_matrices,
    rotational_tensors,
    species_coupling,
    species_matrices,
    vector_coupling,
)


def test_elements_form_a_group():
    """24 orthogonal matrices, closed under multiplication; 12 of them proper."""
    group = group_elements()
    products = np.einsum("aij,bjk->abik", group, group).reshape(-1, 9)
    assert {tuple(row) for row in products} == {tuple(row) for row in group.reshape(-1, 9)}
    assert np.linalg.det(group).round().tolist().count(1.0) == 12


@pytest.mark.parametrize("species", SPECIES)
def test_species_are_representations(species):
    """Products of matrices are matrices of products."""
    group, matrices = group_elements(), species_matrices(species)
    for a in range(24):
        product = np.einsum("ij,bjk->bik", group[a], group)
        places = [int(np.argmin(np.abs(group - p).sum(axis=(1, 2)))) for p in product]
        assert np.einsum("ij,bjk->bik", matrices[a], matrices) == pytest.approx(matrices[places])


def test_characters_are_orthonormal():
    """Species are irreducible and different."""
    traces = np.array([np.trace(species_matrices(s), axis1=1, axis2=2) for s in SPECIES])
    assert traces @ traces.T / 24 == pytest.approx(np.eye(5), abs=1e-12)


def test_partners_are_products_with_a2():
    """A2 turns each species into its partner."""
    for species, partner in PARTNERS.items():
        product = np.trace(species_matrices(species), axis1=1, axis2=2) * species_matrices("A2")[:, 0, 0]
        assert product == pytest.approx(np.trace(species_matrices(partner), axis1=1, axis2=2))


@pytest.mark.parametrize(
    ("j", "expected"),
    [
        (0, {"A1": 1}),
        (1, {"F1": 1}),
        (2, {"E": 1, "F2": 1}),
        (3, {"A2": 1, "F1": 1, "F2": 1}),
        (4, {"A1": 1, "E": 1, "F1": 1, "F2": 1}),
        (12, {"A1": 2, "A2": 1, "E": 2, "F1": 3, "F2": 3}),
    ],
)
def test_species_of_rotational_levels(j, expected):
    """As tabulated by Herzberg 1945, Infrared and Raman Spectra."""
    found = {s: len(adapted(rotation_matrices(j), s)) for s in SPECIES}
    assert {s: n for s, n in found.items() if n} == expected


@pytest.mark.parametrize(("lower", "upper"), [(0, 1), (1, 0), (1, 1), (2, 2), (3, 2), (3, 4), (6, 6)])
def test_vector_coupling_is_equivariant(lower, upper):
    """Coupling commutes with the group, and its rows are orthonormal."""
    coupling = vector_coupling(lower, upper)
    above, below, vector = rotation_matrices(upper), rotation_matrices(lower), species_matrices("F1")
    turned = np.einsum("gij,ajk,glk->gail", above, coupling, below)
    assert turned == pytest.approx(np.einsum("gba,bil->gail", vector, coupling), abs=1e-12)
    assert np.einsum("aik,ajk->ij", coupling, coupling) == pytest.approx(np.eye(2 * upper + 1), abs=1e-12)


def test_generators_commute_like_rotations():
    """[Lx, Ly] = Lz, and the sum of squares is -J(J+1)."""
    j = 5
    x, y, z = vector_coupling(j, j) * np.sqrt(j * (j + 1.0))
    assert x @ y - y @ x == pytest.approx(z, abs=1e-12)
    assert x @ x + y @ y + z @ z == pytest.approx(-j * (j + 1.0) * np.eye(2 * j + 1), abs=1e-12)


@pytest.mark.parametrize("degree", range(6))
def test_rotational_tensors(degree):
    """Tensors turn like the functions of J = degree and are symmetric or antisymmetric."""
    tensors, matrices = rotational_tensors(4, degree), rotation_matrices(4)
    turned = np.einsum("gij,ajk,glk->gail", matrices, tensors, matrices)
    assert turned == pytest.approx(np.einsum("gba,bil->gail", rotation_matrices(degree), tensors), abs=1e-9)
    assert tensors == pytest.approx((-1.0) ** degree * tensors.swapaxes(1, 2), abs=1e-9)


def test_no_tensor_beyond_twice_j():
    """A degree above 2J vanishes."""
    assert rotational_tensors(1, 3) == pytest.approx(0.0, abs=1e-12)


def test_species_coupling():
    """F1 x F2 holds A2, E, F1 and F2 but not A1; the coefficients of each are orthonormal."""
    sizes = {s: len(species_coupling("F1", "F2", s)) for s in SPECIES}
    assert sizes == {"A1": 0, "A2": 1, "E": 2, "F1": 3, "F2": 3}
    table = np.concatenate([species_coupling("F1", "F2", s).reshape(-1, 9) for s in SPECIES])
    assert table @ table.T == pytest.approx(np.eye(9), abs=1e-12)
