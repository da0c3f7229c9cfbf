"""Levels of polyads: closed forms of spherical tops, and the blocks against full matrices."""

from __future__ import annotations

from math import sqrt

import numpy as np
import pytest

from planner.spectroscopy.lists.polyad_levels import polyad_levels, summed_factors, transition_amplitudes
from planner.spectroscopy.lists.polyads import Term, vibrational_factors
from planner.spectroscopy.lists.tetrahedral_group import SPECIES, rotational_tensors, vector_coupling

ROTATION = Term("", "", 0, 1, 0)
QUARTIC = Term("", "", 4, 0, 0)
NU2, NU4 = Term("2", "2", 0, 0, 0), Term("4", "4", 0, 0, 0)
CORIOLIS_44, CORIOLIS_42 = Term("4", "4", 1, 0, 0), Term("4", "2", 1, 0, 0)


def levels(terms, polyad, j):
    """Levels straight from terms."""
    return polyad_levels(summed_factors(terms, polyad, polyad), polyad, j)


def everything(found):
    """All energies, each species as often as its dimension says, sorted."""
    return np.sort(np.concatenate([np.repeat(energy, SPECIES[s]) for s, (energy, _) in found.items()]))


def dense(terms, polyad, j):
    """Eigenvalues of the full matrix, built term by term with Kronecker products."""
    total = 0.0
    for term, value in terms.items():
        factors = vibrational_factors(term, polyad, polyad)
        if factors is not None:
            tensors = rotational_tensors(j, term.degree)
            scale = value * (j * (j + 1.0)) ** term.power
            total = total + scale * sum(np.kron(v, r) for v, r in zip(factors, tensors, strict=True))
    return np.linalg.eigvalsh(total)


def test_rigid_spherical_top():
    """E = B J(J+1) for all species."""
    found = levels({ROTATION: 5.24}, 0, 6)
    assert everything(found) == pytest.approx(np.full(13, 5.24 * 42))


@pytest.mark.parametrize(
    ("j", "pattern"),
    [
        (2, {"E": 6.0, "F2": -4.0}),
        (3, {"A2": -12.0, "F2": -2.0, "F1": 6.0}),
        (4, {"A1": 28.0, "E": 4.0, "F1": 14.0, "F2": -26.0}),
    ],
)
def test_centrifugal_splitting_pattern(j, pattern):
    """The fourth-degree invariant splits J like a cubic field splits orbitals of the same angular momentum.

    Patterns of Lea, Leask and Wolf 1962, J. Phys. Chem. Solids 23, 1381 (x = 1).
    """
    found = levels({QUARTIC: 1.0}, 0, j)
    ratios = [found[s][0][0] / value for s, value in pattern.items()]
    assert ratios == pytest.approx(np.full(len(ratios), ratios[0]))


def test_harmonic_pentad():
    """Without interactions the levels of J = 0 are sums of quanta with the degeneracies of the oscillators."""
    terms = {
        Term("1", "1", 0, 0, 0): 2917.0,
        NU2: 1533.0 * sqrt(2),
        Term("3", "3", 0, 0, 0): 3019.0 * sqrt(3),
        NU4: 1311.0 * sqrt(3),
    }
    expected = [2917.0] + [3019.0] * 3 + [3066.0] * 3 + [2844.0] * 6 + [2622.0] * 6
    assert everything(levels(terms, 2, 0)) == pytest.approx(np.sort(expected))


def test_first_order_coriolis_splitting():
    """One quantum of nu4 splits into R = J+1, J, J-1, shifted in the ratio J : -1 : -(J+1) (Teller 1934)."""
    j, scale = 5, 1.0
    shifts = np.unique(np.round(everything(levels({CORIOLIS_44: scale}, 1, j))[:], 9))
    found = shifts[np.abs(shifts) > 1e-6]
    expected = np.array([j, -1.0, -(j + 1.0)])
    expected *= found[np.argmin(np.abs(found))] / -1.0
    assert np.sort(found) == pytest.approx(np.sort(expected))


@pytest.mark.parametrize(("polyad", "j"), [(1, 0), (1, 1), (1, 4), (2, 3), (3, 2)])
def test_blocks_against_full_matrix(polyad, j):
    """All species together are the spectrum of the full matrix, for a Hamiltonian with every kind of operator."""
    rng = np.random.default_rng(7)
    terms = {ROTATION: 5.2, QUARTIC: 0.01, NU2: 2168.0, NU4: 2270.0, CORIOLIS_44: -11.9, CORIOLIS_42: 6.4}
    terms |= {Term("3", "24", 0, 0, 0): 9.0, Term("44", "1", 2, 0, 1): 0.3, Term("24", "22", 1, 0, 0): 0.4}
    terms |= {Term("244", "244", 1, 0, i): rng.normal() for i in range(3)} | {Term("4", "4", 2, 1, 1): 1e-3}
    assert everything(levels(terms, polyad, j)) == pytest.approx(dense(terms, polyad, j), abs=1e-8)


def test_eigenvectors_are_orthonormal():
    """Vectors of a species form an orthogonal matrix."""
    for _, vectors in levels({ROTATION: 5.2, NU2: 2168.0, CORIOLIS_42: 6.4}, 1, 6).values():
        assert vectors.T @ vectors == pytest.approx(np.eye(len(vectors)), abs=1e-12)


@pytest.mark.parametrize("j", [1, 4])
def test_strength_sum_rule(j):
    """From every level the squared moments to all levels of P, Q and R add to one, however the upper states mix."""
    terms = {ROTATION: 5.2, QUARTIC: 1e-4, NU2: 2168.0, NU4: 2270.0, CORIOLIS_44: -11.9, CORIOLIS_42: 6.4}
    below = levels(terms, 0, j)
    totals = {species: np.zeros(len(energy)) for species, (energy, _) in below.items()}
    factors = summed_factors({Term("4", "", 0, 0, 0): 1.0}, 1, 0, vector=True)
    for j_up in (j - 1, j, j + 1):
        upper = (1, j_up, levels(terms, 1, j_up))
        for _, species, amplitude in transition_amplitudes(factors, upper, (0, j, below)):
            # coefficients into J' are normalised for each upper function
            totals[species] += (amplitude**2).sum(axis=0)
    for total in totals.values():
        assert total == pytest.approx(1.0, abs=1e-9)


def test_selection_by_end_over_end_rotation():
    """Without coupling to nu2, a moment of nu4 only reaches states whose rotation R equals the lower J."""
    j = 4
    upper = (1, j + 1, levels({NU4: 2270.0, NU2: 9000.0, CORIOLIS_44: -11.9}, 1, j + 1))
    factors = summed_factors({Term("4", "", 0, 0, 0): 1.0}, 1, 0, vector=True)
    reached = set()
    for partner, _, amplitude in transition_amplitudes(factors, upper, (0, j, levels({ROTATION: 5.2}, 0, j))):
        strong = (amplitude**2).sum(axis=1) > 1e-9
        reached |= set(np.round(upper[2][partner][0][strong], 6))
    assert len(reached) == 1


def test_amplitudes_against_full_matrix():
    """Strengths summed over degenerate components against the full dipole matrix between all product functions."""
    terms = {ROTATION: 5.2, NU2: 2168.0, NU4: 2270.0, CORIOLIS_44: -11.9, CORIOLIS_42: 6.4, QUARTIC: 0.01}
    moment = {Term("4", "", 0, 0, 0): 1.0, Term("2", "", 1, 0, 0): 0.3}
    j_low, j_up = 2, 3
    cosines = vector_coupling(j_low, j_up)
    full = 0.0
    for term, value in moment.items():
        factors = vibrational_factors(term, 1, 0, vector=True)
        assert factors is not None
        above, below = rotational_tensors(j_up, term.degree), rotational_tensors(j_low, term.degree)
        for m in range(2 * term.degree + 1):
            for a in range(3):
                rotational = (above[m] @ cosines[a] + cosines[a] @ below[m]) / 2
                full = full + value * np.kron(factors[m, a], rotational)
    blocks = list(
        transition_amplitudes(
            summed_factors(moment, 1, 0, vector=True),
            (1, j_up, levels(terms, 1, j_up)),
            (0, j_low, levels(terms, 0, j_low)),
        )
    )
    total = sum(SPECIES[species] * (amplitude**2).sum() for _, species, amplitude in blocks)
    assert total == pytest.approx((full**2).sum())
