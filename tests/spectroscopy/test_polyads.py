"""Polyads of a tetrahedral molecule: states and invariant operators."""

from __future__ import annotations

from math import sqrt

import numpy as np
import pytest

from planner.spectroscopy.lists.polyads import (
    Term,
    invariants,
    modes_of,
    monomial_matrices,
    polyad_matrices,
    vibrational_factors,
    vibrational_states,
)
from planner.spectroscopy.lists.tetrahedral_group import SPECIES, rotation_matrices, species_matrices


def count(*parts: np.ndarray) -> int:
    """How often the totally symmetric species is in a product of representations, by characters."""
    return round(float(np.prod([np.trace(p, axis1=1, axis2=2) for p in parts], axis=0).mean()))


def test_sizes_of_polyads():
    """1, 5, 19, 55 and 140 states, as in the literature on methane (e.g. Boudon et al. 2006, JQSRT 98, 394)."""
    assert [len(vibrational_states(p)) for p in range(5)] == [1, 5, 19, 55, 140]
    assert modes_of(2) == ["1", "3", "22", "24", "44"]


@pytest.mark.parametrize(
    ("modes", "expected"),
    [
        ("22", {"A1": 1, "E": 1}),
        ("44", {"A1": 1, "E": 1, "F2": 1}),
        ("24", {"F1": 1, "F2": 1}),
        ("34", {"A1": 1, "E": 1, "F1": 1, "F2": 1}),
        ("222", {"A1": 1, "A2": 1, "E": 1}),
        ("444", {"A1": 1, "F1": 1, "F2": 2}),
    ],
)
def test_species_of_overtones(modes, expected):
    """As tabulated by Herzberg 1945, Infrared and Raman Spectra."""
    found = {s: count(monomial_matrices(modes), species_matrices(s)) for s in SPECIES}
    assert {s: n for s, n in found.items() if n} == expected


def test_states_turn_orthogonally():
    """The group acts by orthogonal matrices on every polyad."""
    matrices = polyad_matrices(3)
    assert matrices @ matrices.swapaxes(1, 2) == pytest.approx(np.broadcast_to(np.eye(55), (24, 55, 55)), abs=1e-12)


@pytest.mark.parametrize(
    ("create", "destroy", "degree"), [("3", "24", 0), ("4", "2", 1), ("44", "1", 2), ("24", "22", 3)]
)
def test_number_of_operators(create, destroy, degree):
    """As many as the characters say, unit vectors, and left in place by the group."""
    found = invariants(create, destroy, degree)
    parts = [monomial_matrices(create), monomial_matrices(destroy), rotation_matrices(degree)]
    assert len(found) == count(*parts)
    assert np.linalg.norm(found.reshape(len(found), -1), axis=1) == pytest.approx(1.0)
    turned = np.einsum("gai,gbj,gcm,wijm->gwabc", *parts, found)
    assert turned == pytest.approx(np.broadcast_to(found, turned.shape), abs=1e-9)


def test_operators_even_under_time_reversal():
    """Only half of the operators that keep the quanta are allowed: E has no first-order Coriolis force."""
    assert [len(invariants("2", "2", degree)) for degree in (0, 1, 2, 3)] == [1, 0, 1, 1]
    assert [len(invariants("4", "4", degree)) for degree in (0, 1, 2)] == [1, 1, 2]


def test_basis_is_the_echelon_form():
    """Where the first element of an operator stands all others vanish, so the basis is unique."""
    rows = invariants("44", "44", 2).reshape(len(invariants("44", "44", 2)), -1)
    for number, row in enumerate(rows):
        first = int(np.flatnonzero(np.abs(row) > 1e-9)[0])
        others = np.delete(rows[:, first], number)
        assert others == pytest.approx(0.0, abs=1e-9)


def test_moments_are_vectors():
    """nu3 and nu4 have a moment of their own, nu1 and nu2 have none, nu2+nu4 and 2nu4 have one each."""
    counts = {modes: len(invariants(modes, "", 0, vector=True)) for modes in ("1", "2", "3", "4", "24", "44", "22")}
    assert counts == {"1": 0, "2": 0, "3": 1, "4": 1, "24": 1, "44": 1, "22": 0}


def test_number_operator():
    """A one-quantum operator of degree 0 counts quanta, over the root of the dimension of the mode."""
    factors = vibrational_factors(Term("4", "4", 0, 0, 0), 2, 2)
    quanta = [sum(state[6:]) for state in vibrational_states(2)]
    assert factors is not None
    assert factors[0] == pytest.approx(np.diag(quanta) / sqrt(3), abs=1e-12)


def test_cubic_operator_by_hand():
    """<0 0 0 2|(a4+)^2 a1|1 0 0 0> summed over directions: each overtone zz is reached with sqrt(2)/sqrt(2)/sqrt(3)."""
    factors = vibrational_factors(Term("44", "1", 0, 0, 0), 2, 2)
    states = vibrational_states(2)
    column = states.index((1, 0, 0, 0, 0, 0, 0, 0, 0))
    assert factors is not None
    for axis in range(6, 9):
        row = states.index(tuple(2 * (i == axis) for i in range(9)))
        assert abs(factors[0][row, column]) == pytest.approx(1 / sqrt(3))
    assert factors[0] == pytest.approx(factors[0].T)


def test_too_few_quanta():
    """An operator that destroys more than a polyad has is absent from it."""
    assert vibrational_factors(Term("44", "44", 0, 0, 0), 1, 1) is None
