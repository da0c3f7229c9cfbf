"""Effective operators of a tetrahedral molecule XY4 with interacting polyads.

The four modes are nu1 (A1), nu2 (E), nu3 and nu4 (F2). Their frequencies are near 2:1:2:1, so levels with the same
``P = 2 n1 + n2 + 2 n3 + n4`` interact and are treated together: the ground state (P = 0), the dyad, the pentad, the
octad. An effective operator is a product of creation operators, annihilation operators and a harmonic tensor of
degree K in the angular momentum, combined to a totally symmetric whole (a Hamiltonian) or to a vector (a dipole
moment). J.-P. Champion (1977, Can. J. Phys. 55, 1802) gives the theory; here the invariants are found by averaging
over the 24 elements of the group, so no tables of coupling coefficients are needed.

Tensors of odd degree stand for i times the hermitian operator and pair with antisymmetric vibrational factors, so
that every matrix is real and symmetric.
"""

from __future__ import annotations

import itertools
from dataclasses import dataclass
from functools import cache
from math import factorial, prod, sqrt

import numpy as np
from numpy.typing import NDArray

from planner.spectroscopy.lists.tetrahedral_group import rotation_matrices, species_matrices

__all__ = [
    "MODE_DIMENSIONS",
    "Term",
    "invariants",
    "modes_of",
    "monomial_matrices",
    "monomials",
    "polyad_matrices",
    "vibrational_factors",
    "vibrational_states",
]

Matrix = NDArray[np.float64]
Quanta = tuple[int, ...]
"""Quanta of the nine oscillators: nu1, nu2 (2), nu3 (3), nu4 (3)."""

MODE_DIMENSIONS = (1, 2, 3, 3)
"""Oscillators of nu1, nu2, nu3, nu4."""
_POLYAD_WEIGHTS = (2, 1, 2, 1)
_STARTS = (0, 1, 3, 6, 9)


@dataclass(frozen=True, order=True)
class Term:
    """One effective operator: which quanta it makes and destroys, and its rotational part.

    ``create`` and ``destroy`` are strings of mode numbers such as ``"24"``; ``degree`` is K, ``power`` the power of
    the square of the angular momentum that multiplies it, ``index`` the place among the independent operators of
    this make in the order of `invariants`.
    """

    create: str
    destroy: str
    degree: int
    power: int
    index: int


@cache
def monomials(modes: str) -> tuple[Quanta, ...]:
    """All ways to place the quanta of a string of modes on their oscillators."""
    counts = [modes.count(str(mode)) for mode in (1, 2, 3, 4)]
    choices = [
        [q for q in itertools.product(range(n + 1), repeat=d) if sum(q) == n]
        for n, d in zip(counts, MODE_DIMENSIONS, strict=True)
    ]
    return tuple(tuple(itertools.chain(*choice)) for choice in itertools.product(*choices))


def modes_of(polyad: int) -> list[str]:
    """The strings of modes that belong to a polyad: ``["1", "3", "22", "24", "44"]`` for P = 2."""
    found = []
    for counts in itertools.product(*(range(polyad // weight + 1) for weight in _POLYAD_WEIGHTS)):
        if sum(n * w for n, w in zip(counts, _POLYAD_WEIGHTS, strict=True)) == polyad:
            found.append("".join(str(mode) * n for mode, n in zip((1, 2, 3, 4), counts, strict=True)))
    return sorted(found, key=lambda modes: (len(modes), modes))


def vibrational_states(polyad: int) -> tuple[Quanta, ...]:
    """The harmonic-oscillator states of a polyad: 1, 5, 19, 55 of them for P = 0..3."""
    return tuple(itertools.chain.from_iterable(monomials(modes) for modes in modes_of(polyad)))


@cache
def monomial_matrices(modes: str) -> Matrix:
    """How normalised monomials of the modes transform, shape ``(24, n, n)``."""
    states = monomials(modes)
    place = {state: i for i, state in enumerate(states)}
    one_quantum = np.zeros((24, 9, 9))
    for mode, species in enumerate(("A1", "E", "F2", "F2")):
        span = slice(_STARTS[mode], _STARTS[mode + 1])
        one_quantum[:, span, span] = species_matrices(species)
    result = np.zeros((24, len(states), len(states)))
    for column, state in enumerate(states):
        # the image of a product of creation operators is the product of their images
        image: dict[Quanta, Matrix] = {(0,) * 9: np.ones(24)}
        for oscillator in itertools.chain.from_iterable([i] * n for i, n in enumerate(state)):
            grown: dict[Quanta, Matrix] = {}
            for target in np.flatnonzero(np.abs(one_quantum[:, :, oscillator]).max(axis=0)):
                for quanta, weight in image.items():
                    more = tuple(n + (i == target) for i, n in enumerate(quanta))
                    grown[more] = grown.get(more, 0.0) + weight * one_quantum[:, target, oscillator]
            image = grown
        for quanta, weight in image.items():
            result[:, place[quanta], column] = weight * sqrt(_factorials(quanta) / _factorials(state))
    return result


def polyad_matrices(polyad: int) -> Matrix:
    """How the vibrational states of a polyad transform, shape ``(24, n, n)``."""
    blocks = [monomial_matrices(modes) for modes in modes_of(polyad)]
    size = sum(block.shape[1] for block in blocks)
    result, start = np.zeros((24, size, size)), 0
    for block in blocks:
        stop = start + block.shape[1]
        result[:, start:stop, start:stop] = block
        start = stop
    return result


@cache
def _factorials(quanta: Quanta) -> float:
    return float(prod(factorial(n) for n in quanta))


@cache
def invariants(create: str, destroy: str, degree: int, *, vector: bool = False) -> Matrix:
    """Independent ways to combine quanta made, quanta destroyed and a rotational tensor of some degree.

    Returns
    -------
    array, shape ``(way, made monomial, destroyed monomial, 2 degree + 1[, 3])``
        Unit vectors that span the totally symmetric combinations, or with ``vector`` those with a vector (species
        F2). The span is unique, and so is this basis of it: the reduced row echelon form. If the same quanta are made
        and destroyed only those that are even under time reversal are kept.
    """
    parts = [monomial_matrices(create), monomial_matrices(destroy), rotation_matrices(degree)]
    parts += [species_matrices("F2")] * vector
    traces = np.prod([np.trace(part, axis1=1, axis2=2) for part in parts], axis=0)
    count = round(float(traces.mean()))
    # averages of more random tensors than there are ways span the space with certainty for all practical purposes
    trial = np.random.default_rng(1).normal(size=(count + 3, *(part.shape[1] for part in parts)))
    moved = np.broadcast_to(trial, (24, *trial.shape))
    for axis, part in enumerate(parts, 2):
        moved = (part[:, None] @ moved.reshape(24, prod(moved.shape[1:axis]), part.shape[1], -1)).reshape(moved.shape)
    average = moved.mean(axis=0)
    if create == destroy and not vector:
        average += (-1.0) ** degree * average.swapaxes(1, 2)
    return _echelon(average.reshape(count + 3, -1)).reshape(-1, *trial.shape[1:])


def _echelon(rows: Matrix) -> Matrix:
    """Reduced row echelon form without null rows, each row scaled to unit length."""
    rows = rows.copy()
    rank = 0
    for column in range(rows.shape[1]):
        if rank == rows.shape[0]:
            break
        pivot = rank + int(np.argmax(np.abs(rows[rank:, column])))
        if abs(rows[pivot, column]) < 1e-9:
            continue
        rows[[rank, pivot]] = rows[[pivot, rank]]
        rows[rank] /= rows[rank, column]
        others = np.arange(rows.shape[0]) != rank
        rows[others] -= np.outer(rows[others, column], rows[rank])
        rank += 1
    return rows[:rank] / np.linalg.norm(rows[:rank], axis=1, keepdims=True)


@cache
def _monomial_operators(create: str, destroy: str, upper: int, lower: int) -> Matrix:
    """Normalised products of creation and annihilation operators, shape ``(made, destroyed, upper, lower state)``."""
    place = {state: i for i, state in enumerate(vibrational_states(upper))}
    made, destroyed, below = monomials(create), monomials(destroy), vibrational_states(lower)
    result = np.zeros((len(made), len(destroyed), len(place), len(below)))
    for d, gone in enumerate(destroyed):
        for column, state in enumerate(below):
            left = tuple(n - g for n, g in zip(state, gone, strict=True))
            if min(left) < 0:
                continue
            for c, new in enumerate(made):
                target = tuple(n + a for n, a in zip(left, new, strict=True))
                squared = _factorials(state) * _factorials(target) / _factorials(left) ** 2
                result[c, d, place[target], column] = sqrt(squared / _factorials(new) / _factorials(gone))
    return result


def vibrational_factors(term: Term, upper: int, lower: int, *, vector: bool = False) -> Matrix | None:
    """What a term of unit value does to the vibrational states, one matrix per component of its rotational tensor.

    Shape ``(2 degree + 1, upper state, lower state)``, with ``vector`` ``(2 degree + 1, 3, upper, lower)``; None
    where the polyad has too few quanta. Hamiltonian terms are completed by their transposes, such that the product
    with the rotational tensor is symmetric.
    """
    if _weight(term.destroy) > lower:
        return None
    way = invariants(term.create, term.destroy, term.degree, vector=vector)[term.index]
    operators = _monomial_operators(term.create, term.destroy, upper, lower)
    factors = np.tensordot(way, operators, ((0, 1), (0, 1)))
    if not vector and term.create != term.destroy:
        factors = factors + (-1.0) ** term.degree * factors.swapaxes(1, 2)
    return np.ascontiguousarray(factors)


def _weight(modes: str) -> int:
    return sum(_POLYAD_WEIGHTS[int(mode) - 1] for mode in modes)
