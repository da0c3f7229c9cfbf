"""Levels of polyads and the dipole moments between them, by symmetry species."""

from __future__ import annotations

import itertools
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from functools import cache

import numpy as np
from numpy.typing import NDArray

from planner.spectroscopy.lists.polyads import Term, polyad_matrices, vibrational_factors
from planner.spectroscopy.lists.tetrahedral_group import (
    PARTNERS,
    SPECIES,
    adapted,
    group_elements,
    rotation_matrices,
    rotational_tensors,
    species_coupling,
    vector_coupling,
)

__all__ = ["Factors", "Levels", "coupled_functions", "polyad_levels", "summed_factors", "transition_amplitudes"]

Matrix = NDArray[np.float64]
Factors = Mapping[tuple[int, int], Matrix]
"""Vibrational factors summed over terms, by (degree, power)."""
Levels = Mapping[str, tuple[Matrix, Matrix]]
"""Energies, ascending, and eigenvectors of each species."""

_CLASS_OF_SPECIES = {"A1": 0, "A2": 0, "E": 0, "F1": 1, "F2": 1}
"""Class under the twofold rotations of the first component: even under all of them, or like x."""
_VECTOR_CLASSES = np.array([1, 3, 2])
"""Classes of x, y, z."""


@dataclass(frozen=True, eq=False)
class _Products:
    """Terms of an operator: vibrational and rotational matrices along the first axis, and the class of both."""

    vibrational: Matrix
    rotational: Matrix
    classes: NDArray[np.int64]


@dataclass(frozen=True, eq=False)
class _Space:
    """Vibrational or rotational functions, each with its class under the three twofold rotations.

    Classes multiply by exclusive or. ``order`` sorts the functions by class and ``blocks[c]`` is the slice of class c
    among the sorted ones. ``copies`` are the symmetry-adapted combinations, shape ``(copy, component, function)`` per
    species.
    """

    classes: NDArray[np.int64]
    order: NDArray[np.int64]
    blocks: tuple[slice, ...]
    copies: Mapping[str, Matrix]

    @classmethod
    def of(cls, matrices: Matrix) -> _Space:
        group = group_elements()
        odd = np.zeros(matrices.shape[1], dtype=np.int64)
        for bit, turn in ((1, (-1, -1, 1)), (2, (1, -1, -1))):
            element = int(np.argmin(np.abs(group - np.diag(turn)).sum(axis=(1, 2))))
            odd += bit * (np.diagonal(matrices[element]) < 0)
        order = np.argsort(odd, kind="stable")
        edges = np.searchsorted(odd[order], np.arange(5))
        blocks = tuple(slice(a, b) for a, b in itertools.pairwise(edges))
        return cls(odd, order, blocks, {species: adapted(matrices, species) for species in SPECIES})


@cache
def _vibration(polyad: int) -> _Space:
    return _Space.of(polyad_matrices(polyad))


@cache
def _rotation(j: int) -> _Space:
    return _Space.of(rotation_matrices(j))


def polyad_levels(factors: Factors, polyad: int, j: int) -> Levels:
    """Levels of one polyad and J from the summed factors of its Hamiltonian.

    Energies in 1/cm, ascending, and eigenvectors on the symmetry-adapted functions. Each species appears once,
    whatever its dimension.
    """
    by_degree = _at_j(factors, j * (j + 1.0))
    products = _Products(
        np.concatenate(list(by_degree.values())),
        np.concatenate([rotational_tensors(j, degree) for degree in by_degree]),
        np.concatenate([_rotation(degree).classes for degree in by_degree]),
    )
    space = (_vibration(polyad), _rotation(j))
    matrices = _assembled(products, space, space)
    levels = {}
    for species, kind in _CLASS_OF_SPECIES.items():
        basis = coupled_functions(polyad, j, species, 0)
        levels[species] = np.linalg.eigh(basis.T @ matrices[kind] @ basis)
    return levels


def transition_amplitudes(
    factors: Factors, upper: tuple[int, int, Levels], lower: tuple[int, int, Levels]
) -> Iterator[tuple[str, str, Matrix]]:
    """Matrix elements of the dipole moment, times the direction cosines, between two sets of levels.

    Parameters
    ----------
    factors : mapping
        Summed factors of the moment between the two polyads.
    upper, lower : (polyad, J, levels)

    Yields
    ------
    upper species, lower species, array of shape ``(upper level, lower level)``
        The lab-fixed dipole is of species A2, so A1 goes with A2, F1 with F2 and E with E.
    """
    (polyad_up, j_up, levels_up), (polyad_low, j_low, levels_low) = upper, lower
    cosines = vector_coupling(j_low, j_up)
    vibrational, rotational, classes = [], [], []
    for degree, total in _at_j(factors, (j_up * (j_up + 1.0) + j_low * (j_low + 1.0)) / 2).items():
        above = rotational_tensors(j_up, degree)[:, None] @ cosines
        below = cosines @ rotational_tensors(j_low, degree)[:, None]
        vibrational.append(total.reshape(-1, *total.shape[2:]))
        rotational.append(((above + below) / 2).reshape(-1, *above.shape[2:]))
        classes.append((_rotation(degree).classes[:, None] ^ _VECTOR_CLASSES).ravel())
    products = _Products(np.concatenate(vibrational), np.concatenate(rotational), np.concatenate(classes))
    spaces = ((_vibration(polyad_up), _rotation(j_up)), (_vibration(polyad_low), _rotation(j_low)))
    matrices = _assembled(products, *spaces)
    for species, partner in PARTNERS.items():
        # A2 turns the first component of E into the second
        component = 1 if species == "E" else 0
        above = coupled_functions(polyad_up, j_up, partner, 0) @ levels_up[partner][1]
        below = coupled_functions(polyad_low, j_low, species, component) @ levels_low[species][1]
        yield partner, species, above.T @ matrices[_CLASS_OF_SPECIES[species]] @ below


def summed_factors(terms: Mapping[Term, float], upper: int, lower: int, *, vector: bool = False) -> Factors:
    """Vibrational factors between two polyads, by (degree, power), summed over terms times their constants."""
    summed: dict[tuple[int, int], Matrix] = {}
    for term, value in terms.items():
        factor = vibrational_factors(term, upper, lower, vector=vector)
        if factor is not None:
            key = (term.degree, term.power)
            summed[key] = summed.get(key, 0.0) + value * factor
    return summed


def _at_j(factors: Factors, square: float) -> dict[int, Matrix]:
    """Factors by degree, with the powers of J(J+1) put in."""
    result: dict[int, Matrix] = {}
    for (degree, power), factor in factors.items():
        result[degree] = result.get(degree, 0.0) + square**power * factor
    return result


def _assembled(products: _Products, upper: tuple[_Space, _Space], lower: tuple[_Space, _Space]) -> list[Matrix]:
    """Sum of vibrational times rotational matrices between product functions of class 0, and of class 1.

    Both factors of a product are of the same class, so only blocks where it connects the classes are filled, and
    the sum over products in a block is one matrix product. Product functions are ordered by the class of their
    vibrational factor.
    """
    order = np.argsort(products.classes, kind="stable")
    terms = np.searchsorted(products.classes[order], np.arange(5))
    vib = products.vibrational[order[:, None, None], upper[0].order[:, None], lower[0].order]
    rot = products.rotational[order[:, None, None], upper[1].order[:, None], lower[1].order]
    vib_up, rot_up, vib_low, rot_low = (space.blocks for pair in (upper, lower) for space in pair)
    result = []
    for kind in (0, 1):
        rows = []
        for d in range(4):
            row = []
            for c in range(4):
                some = slice(terms[c ^ d], terms[(c ^ d) + 1])
                v, r = vib[some, vib_up[d], vib_low[c]], rot[some, rot_up[d ^ kind], rot_low[c ^ kind]]
                block = v.reshape(len(v), v.shape[1] * v.shape[2]).T @ r.reshape(len(r), r.shape[1] * r.shape[2])
                block = block.reshape(*v.shape[1:], *r.shape[1:]).swapaxes(1, 2)
                row.append(block.reshape(v.shape[1] * r.shape[1], v.shape[2] * r.shape[2]))
            rows.append(np.concatenate(row, axis=1))
        result.append(np.concatenate(rows))
    return result


@cache
def coupled_functions(polyad: int, j: int, species: str, component: int) -> Matrix:
    """Symmetry-adapted functions of a polyad and J, shape ``(product function, adapted function)``."""
    vib, rot = _vibration(polyad), _rotation(j)
    columns = [np.zeros((0, vib.order.size, rot.order.size))]
    for species_vib, a in vib.copies.items():
        for species_rot, b in rot.copies.items():
            coupling = species_coupling(species_vib, species_rot, species)
            if a.size and b.size and coupling.size:
                half = coupling[component] @ b
                full = np.tensordot(a, half, (1, 1)).swapaxes(1, 2)
                columns.append(full.reshape(-1, *full.shape[2:]))
    functions = np.concatenate(columns)[:, vib.order[:, None], rot.order]
    kind = _CLASS_OF_SPECIES[species]
    blocks = [functions[:, vib.blocks[c], rot.blocks[c ^ kind]] for c in range(4)]
    return np.concatenate([b.reshape(len(functions), b.shape[1] * b.shape[2]) for b in blocks], axis=1).T.copy()
