"""Levels and direction cosines of asymmetric tops against closed forms and a dense construction."""

from __future__ import annotations

import itertools
from math import factorial

import numpy as np
import pytest
from hypothesis import given, settings
from hypothesis import strategies as st

from planner.errors import LineDataError
from planner.spectroscopy.lists.asymmetric_rotor import (
    BLOCKS,
    Coupling,
    RotorConstants,
    block_change,
    block_k,
    coupled_levels,
    direction_cosine,
    spin_rotation,
)

QUARTIC = (1.2e-3, -5.7e-3, 2.0e-2, 5.1e-4, 1.3e-3)
SEXTIC = (4.5e-7, -2.5e-6, -4.3e-7, 3.5e-5, 2.1e-7, 9.9e-8, 1.5e-6)
WATER = RotorConstants(a_per_cm=27.88, b_per_cm=14.52, c_per_cm=9.28, quartic_per_cm=QUARTIC, sextic_per_cm=SEXTIC)


# ---- dense reference: the full (2J+1) basis |J, k>, operators multiplied as matrices --------------------------------


def angular_momentum(j):
    """Matrices of P_a, P_b and i P_c in |J, k>, k = -J..J, all real (ladder elements positive)."""
    k = np.arange(-j, j + 1.0)
    ladder = np.sqrt(j * (j + 1) - k[:-1] * k[1:])
    up = np.diag(ladder, -1)  # raises k
    return np.diag(k), 0.5 * (up + up.T), 0.5 * (up.T - up)


def dense_rotor(constants, j):
    """Watson's A-reduced Hamiltonian as products of angular momentum matrices."""
    pa, pb, ipc = angular_momentum(j)
    one = np.eye(2 * j + 1)
    square = pa @ pa
    if constants.softening:
        square = np.diag(2 / constants.softening * (np.sqrt(1 + constants.softening * np.diag(square)) - 1))
    difference = pb @ pb + ipc @ ipc  # P_b^2 - P_c^2
    p = j * (j + 1.0)
    d_j, d_jk, d_k, e_j, e_k = constants.quartic_per_cm
    h_j, h_jk, h_kj, h_k, f_j, f_jk, f_k = constants.sextic_per_cm
    mean, half = (constants.b_per_cm + s * constants.c_per_cm for s in (1, -1))
    result = constants.origin_per_cm * one + constants.a_per_cm * square
    result = result + 0.5 * mean * (p * one - square) + 0.5 * half * difference
    result = result - d_j * p**2 * one - d_jk * p * square - d_k * square @ square
    result = result + h_j * p**3 * one + h_jk * p**2 * square + h_kj * p * square @ square
    result = result + h_k * square @ square @ square
    for factor, power in ((-e_k + f_jk * p, square), (f_k, square @ square)):
        result = result + factor * (power @ difference + difference @ power)
    return result + 2 * (-e_j * p + f_j * p**2) * difference


def dense_coupling(kind, j):
    """Matrix <second|..|first> of a coupling in |J, k>."""
    pa, pb, ipc = angular_momentum(j)
    return {"a": pa, "b": pb, "c": ipc, "ab": pa @ pb + pb @ pa, "F": np.eye(2 * j + 1)}[kind]


def dense_set(states, couplings, j):
    """All vibrational states at one J."""
    size = 2 * j + 1
    whole = np.zeros((len(states) * size,) * 2)
    part = [slice(i * size, (i + 1) * size) for i in range(len(states))]
    for i, constants in enumerate(states):
        whole[part[i], part[i]] = dense_rotor(constants, j)
    for c in couplings:
        matrix = c.strength_per_cm * dense_coupling(c.kind, j)
        whole[part[c.second], part[c.first]] += matrix
        whole[part[c.first], part[c.second]] += matrix.T
    return whole


def racah(j, k, q, j_upper):
    """<j k 1 q | j_upper k+q> by Racah's sum over factorials."""
    kp = k + q
    if abs(kp) > j_upper or abs(k) > j:
        return 0.0
    f = factorial
    front = (2 * j_upper + 1) * f(j_upper + j - 1) * f(j_upper - j + 1) * f(j + 1 - j_upper) / f(j + 1 + j_upper + 1)
    front *= f(j_upper + kp) * f(j_upper - kp) * f(j - k) * f(j + k) * f(1 - q) * f(1 + q)
    total = 0.0
    for t in range(2 * j + 3):
        bottom = (t, j + 1 - j_upper - t, j - k - t, 1 + q - t, j_upper - 1 + k + t, j_upper - j - q + t)
        if min(bottom) >= 0:
            total += (-1) ** t / np.prod([float(f(x)) for x in bottom])
    return np.sqrt(front) * total


def dense_cosine(axis, j, j_upper):
    """Direction cosine times sqrt(2J+1) in |J, k>, shape (2 J'+1, 2 J+1); the c axis without its factor i."""
    result = np.zeros((2 * j_upper + 1, 2 * j + 1))
    parts = {"a": {0: 1.0}, "b": {-1: 0.5**0.5, 1: -(0.5**0.5)}, "c": {-1: 0.5**0.5, 1: 0.5**0.5}}[axis]
    for k, (q, factor) in itertools.product(range(-j, j + 1), parts.items()):
        if abs(k + q) <= j_upper:
            result[k + q + j_upper, k + j] = factor * np.sqrt(2 * j + 1) * racah(j, k, q, j_upper)
    return result


def energies(levels, j):
    """Energies of all blocks at one J, ascending."""
    return np.sort(np.concatenate([block.energy_per_cm[j][block.exists[j]] for block in levels]))


def labelled(levels):
    """Energy by (state, J, Ka, Kc)."""
    return {
        (int(block.state[j, i]), j, int(block.ka[j, i]), int(block.kc[j, i])): float(block.energy_per_cm[j, i])
        for block in levels
        for j in range(block.exists.shape[0])
        for i in np.flatnonzero(block.exists[j])
    }


# ---- levels --------------------------------------------------------------------------------------------------------


def test_rotor_first_levels():
    """J = 1 and J = 2 of the rigid rotor have closed forms (Townes and Schawlow 1955, appendix III)."""
    a, b, c = 27.9, 14.5, 9.3
    found = labelled(coupled_levels([RotorConstants(a_per_cm=a, b_per_cm=b, c_per_cm=c)], [], 2, 2))
    root = 2 * np.sqrt((a + b + c) ** 2 - 3 * (a * b + b * c + a * c))
    expected = {
        (0, 0, 0): 0.0,
        (1, 0, 1): b + c, (1, 1, 1): a + c, (1, 1, 0): a + b,
        (2, 0, 2): 2 * (a + b + c) - root, (2, 2, 0): 2 * (a + b + c) + root,
        (2, 1, 2): a + b + 4 * c, (2, 1, 1): a + 4 * b + c, (2, 2, 1): 4 * a + b + c,
    }  # fmt: skip
    assert found == pytest.approx({(0, *key): value for key, value in expected.items()}, rel=1e-12)


@pytest.mark.parametrize("softening", [0.0, 0.02])
def test_rotor_prolate_limit(softening):
    """With B = C and no asymmetric distortion the levels are those of a symmetric top, K doubly degenerate."""
    a, b, j_max = 4.0, 1.0, 12
    d_j, d_jk, d_k, h_j, h_jk, h_kj, h_k = 1e-4, 2e-4, 3e-4, 1e-7, 2e-7, -3e-7, 4e-7
    top = RotorConstants(
        origin_per_cm=7.0, a_per_cm=a, b_per_cm=b, c_per_cm=b, softening=softening,
        quartic_per_cm=(d_j, d_jk, d_k, 0.0, 0.0), sextic_per_cm=(h_j, h_jk, h_kj, h_k, 0.0, 0.0, 0.0),
    )  # fmt: skip
    for (_, j, ka, _), energy in labelled(coupled_levels([top], [], j_max, j_max)).items():
        p, u = j * (j + 1), ka**2
        if softening:
            u = 2 / softening * (np.sqrt(1 + softening * u) - 1)
        distortion = -d_j * p**2 - d_jk * p * u - d_k * u**2
        distortion += h_j * p**3 + h_jk * p**2 * u + h_kj * p * u**2 + h_k * u**3
        assert energy == pytest.approx(7.0 + b * p + (a - b) * u + distortion, rel=1e-12)


def test_rotor_oblate_limit():
    """With A = B the levels are those of an oblate top, ``B J(J+1) + (C - B) Kc^2``, though the basis is prolate."""
    top = RotorConstants(a_per_cm=3.0, b_per_cm=3.0, c_per_cm=2.0)
    for (_, j, _, kc), energy in labelled(coupled_levels([top], [], 15, 15)).items():
        assert energy == pytest.approx(3.0 * j * (j + 1) - kc**2, abs=1e-9)


@given(
    st.tuples(st.floats(0.3, 30), st.floats(0.3, 30), st.floats(0.3, 30)),
    st.integers(0, 9),
)
@settings(max_examples=30, deadline=None, derandomize=True)
def test_rotor_trace(constants, j):
    """The rigid levels of one J add up to (2J+1) J(J+1)/3 times A+B+C, whatever the asymmetry."""
    a, b, c = sorted(constants, reverse=True)
    levels = coupled_levels([RotorConstants(a_per_cm=a, b_per_cm=b, c_per_cm=c)], [], j, j)
    assert energies(levels, j).sum() == pytest.approx((2 * j + 1) * j * (j + 1) * (a + b + c) / 3, rel=1e-10)


@pytest.mark.parametrize("softening", [0.0, 0.008])
def test_rotor_against_dense(softening):
    """Wang blocks give the eigenvalues of the full matrix made of operator products, sextic terms included."""
    rotor = RotorConstants(
        origin_per_cm=100.0, a_per_cm=27.88, b_per_cm=14.52, c_per_cm=9.28, softening=softening,
        quartic_per_cm=QUARTIC, sextic_per_cm=SEXTIC,
    )  # fmt: skip
    levels = coupled_levels([rotor], [], 10, 10)
    for j in range(11):
        np.testing.assert_allclose(energies(levels, j), np.linalg.eigvalsh(dense_rotor(rotor, j)), rtol=1e-11)


def test_rotor_k_max():
    """A basis truncated well above the levels of interest leaves them unchanged."""
    top = RotorConstants(a_per_cm=3.55, b_per_cm=0.445, c_per_cm=0.395)
    full, cut = (labelled(coupled_levels([top], [], 30, k_max)) for k_max in (30, 16))
    low = {key: energy for key, energy in full.items() if key[2] <= 10}
    assert {key: cut[key] for key in low} == pytest.approx(low, abs=1e-8)


def test_rotor_vectors_orthonormal():
    """Eigenvectors are orthonormal and vanish on functions that do not exist."""
    for block in coupled_levels([WATER], [], 8, 8):
        for j in range(9):
            v = block.vectors[0][j][:, block.exists[j]]
            np.testing.assert_allclose(v.T @ v, np.eye(v.shape[1]), atol=1e-12)
            assert not v[block_k(block.blocks[0], 8) > j].any()


def test_spin_rotation():
    """In the symmetric limit it is e_aa K^2 + e (N(N+1) - K^2), and in general the derivative of a rotor's energy."""
    top = RotorConstants(a_per_cm=8.0, b_per_cm=0.43, c_per_cm=0.43)
    for block in coupled_levels([top], [], 9, 9):
        n = np.arange(10)[:, np.newaxis]
        expected = np.where(block.exists, 0.18 * block.ka**2 - 0.003 * (n * (n + 1) - block.ka**2), 0.0)
        np.testing.assert_allclose(spin_rotation(block, (0.18, -0.003, -0.003)), expected, atol=1e-12)
    step = 1e-5
    e = (0.18, 0.02, -0.03)
    below, above = (
        coupled_levels(
            [RotorConstants(a_per_cm=27.9 + s * e[0], b_per_cm=14.5 + s * e[1], c_per_cm=9.3 + s * e[2])], [], 6, 6
        )
        for s in (-step, step)
    )
    middle = coupled_levels([RotorConstants(a_per_cm=27.9, b_per_cm=14.5, c_per_cm=9.3)], [], 6, 6)
    for low, block, high in zip(below, middle, above, strict=True):
        slope = (high.energy_per_cm - low.energy_per_cm) / (2 * step)
        np.testing.assert_allclose(spin_rotation(block, e), slope, atol=1e-6)


# ---- coupled sets --------------------------------------------------------------------------------------------------

PARTNER = RotorConstants(origin_per_cm=90.0, a_per_cm=26.6, b_per_cm=14.4, c_per_cm=9.14, quartic_per_cm=QUARTIC)
THIRD = RotorConstants(origin_per_cm=-200.0, a_per_cm=35.5, b_per_cm=14.8, c_per_cm=8.97)
SETS = {
    "a": [Coupling(first=0, second=1, kind="a", strength_per_cm=4.6)],
    "b": [Coupling(first=0, second=1, kind="b", strength_per_cm=-1.3)],
    "c": [Coupling(first=0, second=1, kind="c", strength_per_cm=0.5)],
    "ab and F": [
        Coupling(first=0, second=1, kind="ab", strength_per_cm=0.32),
        Coupling(first=0, second=2, kind="F", strength_per_cm=28.0),
    ],
    "loop a, b, c": [
        Coupling(first=0, second=1, kind="a", strength_per_cm=4.65),
        Coupling(first=0, second=2, kind="b", strength_per_cm=-1.29),
        Coupling(first=1, second=2, kind="c", strength_per_cm=-0.3),
    ],
}


@pytest.mark.parametrize("name", SETS)
def test_coupled_against_dense(name):
    """Symmetry blocks of a coupled set hold the eigenvalues of the dense matrix, for every kind of coupling."""
    states = [WATER, PARTNER, THIRD][: 1 + max(c.second for c in SETS[name])]
    levels = coupled_levels(states, SETS[name], 8, 8)
    for j in range(9):
        expected = np.linalg.eigvalsh(dense_set(states, SETS[name], j))
        np.testing.assert_allclose(energies(levels, j), expected, rtol=1e-10, atol=1e-9)


def test_coupled_two_levels():
    """J = 0 with an anharmonic constant is the two-level problem."""
    states = [RotorConstants(origin_per_cm=g, a_per_cm=3.0, b_per_cm=2.0, c_per_cm=1.0) for g in (10.0, 14.0)]
    levels = coupled_levels(states, [Coupling(first=0, second=1, kind="F", strength_per_cm=3.0)], 0, 2)
    np.testing.assert_allclose(energies(levels, 0), 12.0 + np.array([-1, 1]) * np.hypot(2.0, 3.0))


def test_coupled_labels():
    """A vanishing coupling leaves every level its own label; labels are then a permutation of all of them."""
    weak = [Coupling(first=0, second=1, kind="c", strength_per_cm=1e-9)]
    together = labelled(coupled_levels([WATER, PARTNER], weak, 7, 7))
    for number, state in enumerate((WATER, PARTNER)):
        alone = {(number, *key[1:]): e for key, e in labelled(coupled_levels([state], [], 7, 7)).items()}
        assert {key: together[key] for key in alone} == pytest.approx(alone, rel=1e-10)


def test_coupled_invalid():
    """Couplings that contradict each other's symmetry, and states coupled to nothing, are refused."""
    loop = [*SETS["ab and F"], Coupling(first=1, second=2, kind="a", strength_per_cm=1.0)]
    with pytest.raises(LineDataError, match="contradicts the symmetry"):
        coupled_levels([WATER, PARTNER, THIRD], loop, 2, 2)
    with pytest.raises(LineDataError, match="state 2 of the set is coupled to no other"):
        coupled_levels([WATER, PARTNER, THIRD], SETS["a"], 2, 2)


# ---- direction cosines ---------------------------------------------------------------------------------------------


@pytest.mark.parametrize("axis", "abc")
def test_direction_cosine_sum_rule(axis):
    """From every lower basis function the squares over all upper ones add up to 2J+1."""
    j_max = 9
    for block in BLOCKS:
        k = block_k(block, j_max)
        total = sum(
            (direction_cosine(axis, dj, block_k(block ^ block_change(axis, dj), j_max), k, j_max) ** 2).sum(axis=1)
            for dj in (-1, 0, 1)
        )
        # the last K of the padded basis at J = j_max has its partner K+1 beyond the basis
        for j in range(j_max):
            np.testing.assert_allclose(total[j][k <= j], 2 * j + 1)


@pytest.mark.parametrize("axis", "abc")
def test_strengths_against_dense(axis):
    """Line strengths between Wang blocks are those of full |J, k> eigenvectors with Racah's coefficients."""
    lower, upper = (coupled_levels([state], [], 5, 5) for state in (WATER, PARTNER))
    for j, dj in itertools.product(range(1, 5), (-1, 0, 1)):
        fast = []
        for block in BLOCKS:
            above = upper[block ^ block_change(axis, dj)]
            cosine = direction_cosine(axis, dj, block_k(above.blocks[0], 5), block_k(block, 5), 5)[j]
            amplitude = above.vectors[0][j + dj].T @ cosine @ lower[block].vectors[0][j]
            shift = above.energy_per_cm[j + dj][:, np.newaxis] - lower[block].energy_per_cm[j]
            real = above.exists[j + dj][:, np.newaxis] & lower[block].exists[j]
            fast += list(zip(shift[real], amplitude[real] ** 2, strict=True))
        (e_low, v_low), (e_up, v_up) = (np.linalg.eigh(dense_rotor(s, i)) for s, i in ((WATER, j), (PARTNER, j + dj)))
        strength = (v_up.T @ dense_cosine(axis, j, j + dj) @ v_low) ** 2
        slow = zip((e_up[:, np.newaxis] - e_low).ravel(), strength.ravel(), strict=True)
        fast, slow = (np.array(sorted(x for x in lines if x[1] > 1e-9)) for lines in (fast, slow))
        np.testing.assert_allclose(fast, slow, rtol=1e-7, atol=1e-9)
