"""The group of the tetrahedron and the rotational functions it acts on.

Everything is real. The rotational functions of each J are the real ones, ordered like real spherical harmonics
(sines with k = J..1, k = 0, cosines with k = 1..J), in which the generators of rotation are real and antisymmetric.
Species are named A1, A2, E, F1, F2 as usual; x, y, z are of species F2, the angular momentum of F1.
"""

from __future__ import annotations

import itertools
from functools import cache
from math import prod, sqrt

import numpy as np
from numpy.typing import NDArray

from planner.spectroscopy.lists.angular import clebsch_gordan

__all__ = [
    "PARTNERS",
    "SPECIES",
    "adapted",
    "group_elements",
    "rotation_matrices",
    "rotational_tensors",
    "species_coupling",
    "species_matrices",
    "vector_coupling",
]

Matrix = NDArray[np.float64]

SPECIES = {"A1": 1, "A2": 1, "E": 2, "F1": 3, "F2": 3}
"""Irreducible representations of the group Td and their dimensions."""

PARTNERS = {"A1": "A2", "A2": "A1", "E": "E", "F1": "F2", "F2": "F1"}
"""Species times A2, the species of the lab-fixed dipole moment."""


@cache
def group_elements() -> NDArray[np.float64]:
    """The 24 orthogonal matrices of Td, acting on x, y, z; shape ``(24, 3, 3)``.

    They are the signed permutations whose signs multiply to +1.
    """
    elements = []
    for permutation in itertools.permutations(range(3)):
        for signs in itertools.product((1.0, -1.0), repeat=3):
            if prod(signs) > 0:
                matrix = np.zeros((3, 3))
                matrix[range(3), permutation] = signs
                elements.append(matrix)
    return np.array(elements)


@cache
def species_matrices(species: str) -> Matrix:
    """Representation matrices of all elements, shape ``(24, d, d)``; E is spanned by 2zz-xx-yy and sqrt3(xx-yy)."""
    group = group_elements()
    sign = np.linalg.det(group).round()[:, None, None]
    if species == "A1":
        return np.ones_like(sign)
    if species == "A2":
        return sign
    if species == "E":
        quadratic = np.array([np.diag([-1.0, -1.0, 2.0]) / sqrt(6.0), np.diag([1.0, -1.0, 0.0]) / sqrt(2.0)])
        moved = np.einsum("gij,ajk,glk->gail", group, quadratic, group)
        return np.einsum("bil,gail->gba", quadratic, moved)
    return group if species == "F2" else sign * group


@cache
def species_coupling(first: str, second: str, total: str) -> Matrix:
    """Coupling coefficients of two species, shape ``(total, first, second)``; empty along the first axis if none."""
    product = np.einsum("gij,gkl->gikjl", species_matrices(first), species_matrices(second))
    size = SPECIES[first] * SPECIES[second]
    found = adapted(product.reshape(24, size, size), total)
    return found[:1].reshape(-1, SPECIES[first], SPECIES[second])


def adapted(matrices: Matrix, species: str) -> Matrix:
    """Orthonormal vectors of one species in a representation, shape ``(copy, component, n)``."""
    irreducible, dimension = species_matrices(species), SPECIES[species]
    projectors = np.tensordot(irreducible[:, :, 0], matrices, (0, 0)) * dimension / 24.0
    values, vectors = np.linalg.eigh((projectors[0] + projectors[0].T) / 2)
    return np.ascontiguousarray(np.moveaxis(projectors @ vectors[:, values > 0.5], 2, 0))


def _real_functions(j: int) -> NDArray[np.complex128]:
    """Unitary matrix from the functions |k>, k = -j..j, to the real ones (sines from k = j down, 0, cosines)."""
    real = np.zeros((2 * j + 1, 2 * j + 1), dtype=complex)
    real[j, j] = 1.0
    for m in range(1, j + 1):
        sign = (-1.0) ** m
        real[j + m, [j + m, j - m]] = sign / sqrt(2), 1.0 / sqrt(2)
        real[j - m, [j + m, j - m]] = 1j * sign / sqrt(2), -1j / sqrt(2)
    return real


@cache
def vector_coupling(lower: int, upper: int) -> Matrix:
    """Coupling of a vector (x, y, z) and the functions of J'' to those of J', shape ``(3, 2J'+1, 2J''+1)``.

    For each upper function the squares add to 1: these are Clebsch-Gordan coefficients in the real basis, and up
    to a factor the direction cosines.
    """
    m = np.arange(-upper, upper + 1)
    spherical = np.zeros((3, 2 * upper + 1, 2 * lower + 1))
    for q in (-1, 0, 1):
        fits = np.abs(m - q) <= lower
        below = m[fits] - q
        spherical[q + 1, np.flatnonzero(fits), below + lower] = clebsch_gordan(lower, below, upper - lower, q)
    components = _real_functions(1).conj() @ spherical.reshape(3, -1)
    turned = _real_functions(upper) @ components.reshape(spherical.shape) @ _real_functions(lower).conj().T
    turned = turned[[2, 0, 1]]  # the functions of J = 1 are y, z, x
    return np.ascontiguousarray(turned.real if upper != lower else turned.imag)


@cache
def rotation_matrices(j: int) -> Matrix:
    """The group on the functions of J, shape ``(24, 2j+1, 2j+1)``; improper elements act without their inversion.

    J = 1 is the species F1; J follows from J - 1 by coupling a vector.
    """
    if j == 0:
        return np.ones((24, 1, 1))
    coupling = vector_coupling(j - 1, j)
    turned = np.tensordot(species_matrices("F1"), coupling, (2, 0)) @ rotation_matrices(j - 1)[:, None].swapaxes(2, 3)
    return np.tensordot(turned, coupling, ((1, 3), (0, 2))).swapaxes(1, 2)


@cache
def rotational_tensors(j: int, degree: int) -> Matrix:
    """Harmonic tensor of some degree in the generators of rotation of J, shape ``(2 degree + 1, 2j+1, 2j+1)``.

    Components transform like the functions of J = degree. Symmetric for even, antisymmetric for odd degree.
    """
    if degree == 0:
        return np.eye(2 * j + 1)[None]
    generators = vector_coupling(j, j) * sqrt(j * (j + 1.0))
    lower = rotational_tensors(j, degree - 1)
    products = generators[:, None] @ lower
    return np.tensordot(vector_coupling(degree - 1, degree), products, ((0, 2), (0, 1)))
