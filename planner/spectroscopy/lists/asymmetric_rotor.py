"""Levels of asymmetric tops: Watson's A-reduced Hamiltonian, alone or with several vibrational states coupled.

Basis: prolate symmetric-top functions |J, K> of the representation I^r (x, y, z = b, c, a) in the combinations
``(|J, K> + s |J, -K>)/sqrt 2`` of Wang (1929, Phys. Rev. 34, 243). Parity of K and sign s split the problem for
every J into four blocks, numbered by two bits: ``ODD`` is set for odd K, ``MINUS`` for s = -1. In a block the
levels in order of energy have K_a equal to the K of the basis; K_c is J - K_a for s = +1 and J - K_a + 1 for s = -1.

All matrices are real. The b and c operators are those of the direction cosines with the factor i of the c axis
dropped, which is allowed as long as every state enters with one phase.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from itertools import pairwise

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError

__all__ = [
    "BLOCKS",
    "Coupling",
    "Levels",
    "RotorConstants",
    "block_change",
    "block_k",
    "coupled_levels",
    "direction_cosine",
    "rotor_hamiltonian",
    "spin_rotation",
]

Floats = NDArray[np.float64]

ODD, MINUS = 1, 2
BLOCKS = (0, ODD, MINUS, MINUS | ODD)
_Q_CHANGE = {"a": MINUS, "b": ODD, "c": MINUS | ODD}


@dataclass(frozen=True, kw_only=True)
class RotorConstants:
    """Constants of one vibrational state in 1/cm.

    Attributes
    ----------
    origin_per_cm, a_per_cm, b_per_cm, c_per_cm : float
        Energy without rotation and the rotational constants.
    softening : float
        alpha >= 0: wherever Watson's operator has the square of the a component of the angular momentum, K^2,
        it is replaced by ``(2/alpha) (sqrt(1 + alpha K^2) - 1)``, which keeps the series finite for molecules that
        bend easily; 0 leaves K^2.
    quartic_per_cm : (5,) tuple
        Delta_J, Delta_JK, Delta_K, delta_J, delta_K.
    sextic_per_cm : (7,) tuple
        Phi_J, Phi_JK, Phi_KJ, Phi_K, phi_J, phi_JK, phi_K.
    """

    origin_per_cm: float = 0.0
    a_per_cm: float
    b_per_cm: float
    c_per_cm: float
    softening: float = 0.0
    quartic_per_cm: tuple[float, ...] = (0.0,) * 5
    sextic_per_cm: tuple[float, ...] = (0.0,) * 7


@dataclass(frozen=True, kw_only=True)
class Coupling:
    """One coupling between two vibrational states, numbered by their place in the set.

    ``kind`` is an axis ``a``, ``b`` or ``c`` (Coriolis: ``<second|H|first> = strength * J_axis``), ``ab`` for
    ``strength * (J_a J_b + J_b J_a)``, or ``F`` for an anharmonic constant between equal functions.
    """

    first: int
    second: int
    kind: str
    strength_per_cm: float


@dataclass(frozen=True, kw_only=True, eq=False)
class Levels:
    """Levels of one symmetry block for J = 0..j_max; the arrays are padded, ``exists`` says what is real.

    Attributes
    ----------
    blocks : tuple of int
        Block that each vibrational state contributes.
    exists : bool (J, level)
    energy_per_cm : (J, level)
        Ascending in each J.
    vectors : tuple of (J, K, level)
        Coefficients on the basis functions of each state's block; zero where there is no function or level.
    state : int (J, level)
        Vibrational state with the largest share.
    ka, kc : int (J, level)
        Labels: those of the uncoupled level of that state which resembles the level most.
    """

    blocks: tuple[int, ...]
    exists: NDArray[np.bool_]
    energy_per_cm: Floats
    vectors: tuple[Floats, ...]
    state: NDArray[np.int64]
    ka: NDArray[np.int64]
    kc: NDArray[np.int64]


def block_k(block: int, k_max: int) -> NDArray[np.int64]:
    """K of the basis functions of a block, ascending."""
    first = 1 if block & ODD else (2 if block & MINUS else 0)
    return np.arange(first, k_max + 1, 2)


def block_change(axis: str, delta_j: int) -> int:
    """Bits by which the blocks differ that a direction cosine connects (exclusive or)."""
    return _Q_CHANGE[axis] if delta_j == 0 else _Q_CHANGE[axis] ^ MINUS


def rotor_hamiltonian(constants: RotorConstants, block: int, j_max: int, k_max: int) -> Floats:
    """Watson's A-reduced Hamiltonian to sixth order in one block, shape ``(J, K, K)``.

    Rows with K > J are meaningless. Source: Watson (1977), in Vibrational Spectra and Structure 6, 1, eq. for the
    A reduction; the softened K^2 is one of several resummations in use for water.
    """
    k = block_k(block, k_max)
    p = (np.arange(j_max + 1) * (np.arange(j_max + 1) + 1.0))[:, np.newaxis]
    u = _softened(k, constants.softening)[np.newaxis, :]
    mean_bc = 0.5 * (constants.b_per_cm + constants.c_per_cm)
    d_j, d_jk, d_k, _, _ = constants.quartic_per_cm
    h_j, h_jk, h_kj, h_k, _, _, _ = constants.sextic_per_cm
    diagonal = constants.origin_per_cm + mean_bc * (p - u) + constants.a_per_cm * u
    diagonal = diagonal - d_j * p**2 - d_jk * p * u - d_k * u**2
    diagonal = diagonal + h_j * p**3 + h_jk * p**2 * u + h_kj * p * u**2 + h_k * u**3
    if block & ODD:
        sign = -1.0 if block & MINUS else 1.0
        diagonal[:, :1] += sign * _asymmetry(constants, p, np.array([-1]))
    matrix = np.zeros((j_max + 1, k.size, k.size))
    index = np.arange(k.size)
    matrix[:, index, index] = diagonal
    beside = _asymmetry(constants, p, k[:-1])
    if k.size > 1 and k[0] == 0:
        beside[:, 0] *= np.sqrt(2.0)
    matrix[:, index[1:], index[:-1]] = beside
    matrix[:, index[:-1], index[1:]] = beside
    return matrix


def _softened(k: NDArray[np.int64], alpha: float) -> Floats:
    square = np.asarray(k, dtype=np.float64) ** 2
    return 2.0 / alpha * (np.sqrt(1.0 + alpha * square) - 1.0) if alpha > 0 else square


def _asymmetry(constants: RotorConstants, p: Floats, k: NDArray[np.int64]) -> Floats:
    """Elements between K and K + 2 of |J, K>, shape ``(J, K)``."""
    u, u_next = _softened(k, constants.softening), _softened(k + 2, constants.softening)
    _, _, _, d_j, d_k = constants.quartic_per_cm
    _, _, _, _, h_j, h_jk, h_k = constants.sextic_per_cm
    factor = 0.25 * (constants.b_per_cm - constants.c_per_cm) - d_j * p - 0.5 * d_k * (u + u_next)
    factor = factor + h_j * p**2 + 0.5 * h_jk * p * (u + u_next) + 0.5 * h_k * (u**2 + u_next**2)
    ladder = np.maximum(p - k * (k + 1.0), 0.0) * np.maximum(p - (k + 1.0) * (k + 2.0), 0.0)
    return np.asarray(factor * np.sqrt(ladder), dtype=np.float64)


def direction_cosine(
    axis: str, delta_j: int, k_upper: NDArray[np.int64], k_lower: NDArray[np.int64], j_max: int
) -> Floats:
    """Reduced elements <J + delta_j, K'| axis |J, K> in the Wang basis, shape ``(J, K', K)``.

    ``sqrt(2J+1)`` times a Clebsch-Gordan coefficient <J K 1 q|J' K'>, combined as ``a: q = 0``,
    ``b: (q=-1 less q=+1)/sqrt 2``, ``c: (q=-1 plus q=+1)/sqrt 2``, the last two times sqrt 2 where K or K' is 0.
    Whether a pair of blocks is connected at all is the caller's business (`block_change`). The squares of all
    elements from one lower function add up to 2J+1 for each axis.
    """
    j = np.arange(j_max + 1.0)[:, np.newaxis, np.newaxis]
    upper, lower = (
        np.asarray(k_upper)[np.newaxis, :, np.newaxis],
        np.asarray(k_lower)[np.newaxis, np.newaxis, :],
    )
    step = upper - lower
    if axis == "a":
        element = np.where(step == 0, _clebsch_gordan(j, lower, 0, delta_j), 0.0)
    else:
        up, down = _clebsch_gordan(j, lower, 1, delta_j), _clebsch_gordan(j, lower, -1, delta_j)
        up = -up if axis == "b" else up
        element = np.where(step == 1, up, np.where(step == -1, down, 0.0)) * np.sqrt(0.5)
        element = np.where((upper == 0) | (lower == 0), np.sqrt(2.0), 1.0) * element
    real = (lower <= j) & (upper <= j + delta_j)
    return np.where(real, np.sqrt(2.0 * j + 1.0) * element, 0.0)


def _clebsch_gordan(j: Floats, k: NDArray[np.int64], q: int, delta_j: int) -> Floats:
    """<J K 1 q | J + delta_j, K + q>; 0 where it does not exist (Condon and Shortley 1935, table 2 of chapter 3)."""
    s = q * k
    with np.errstate(divide="ignore", invalid="ignore"):
        if delta_j == 1:
            square = (j - k + 1) * (j + k + 1) / (j + 1) if q == 0 else (j + s + 1) * (j + s + 2) / (2 * j + 2)
            value = np.sqrt(np.maximum(square, 0.0) / (2 * j + 1))
        elif delta_j == 0:
            value = (
                k / np.sqrt(j * (j + 1))
                if q == 0
                else (-q * np.sqrt(np.maximum((j - s) * (j + s + 1), 0.0) / (2 * j * (j + 1))))
            )
        else:
            square = (j - k) * (j + k) / j if q == 0 else (j - s) * (j - s - 1) / (2 * j)
            value = (-1.0 if q == 0 else 1.0) * np.sqrt(np.maximum(square, 0.0) / (2 * j + 1))
    return np.where(np.isfinite(value), value, 0.0)


def coupled_levels(
    states: Sequence[RotorConstants], couplings: Sequence[Coupling], j_max: int, k_max: int
) -> tuple[Levels, ...]:
    """Levels of a set of coupled vibrational states, one `Levels` per symmetry block.

    The blocks are numbered by the block that the first state contributes; ``k_max`` is at least 2.

    Raises
    ------
    LineDataError
        If the couplings contradict each other: around a loop they must lead back to the same block.
    """
    shifts = _block_shifts(len(states), couplings)
    return tuple(_solve(states, couplings, tuple(block ^ shift for shift in shifts), j_max, k_max) for block in BLOCKS)


def spin_rotation(levels: Levels, constants_per_cm: Sequence[float]) -> Floats:
    """Expectation value of ``e_aa N_a^2 + e_bb N_b^2 + e_cc N_c^2`` in 1/cm, shape ``(N, level)``.

    A level N of a molecule with one unpaired electron splits by this value E: the component J = N + 1/2 lies at
    E/(2(N+1)), J = N - 1/2 at -E/(2N) (Townes and Schawlow 1955, section 7-3, first order).
    """
    e_aa, e_bb, e_cc = constants_per_cm
    rotor = RotorConstants(a_per_cm=e_aa, b_per_cm=e_bb, c_per_cm=e_cc)
    j_max = levels.energy_per_cm.shape[0] - 1
    total = np.zeros(levels.energy_per_cm.shape)
    for block, vectors in zip(levels.blocks, levels.vectors, strict=True):
        k_max = int(block_k(block, 2 * vectors.shape[1] + 2)[vectors.shape[1] - 1])
        operator = rotor_hamiltonian(rotor, block, j_max, k_max)
        total += (vectors * (operator @ vectors)).sum(axis=1)
    return total


def _block_shifts(count: int, couplings: Sequence[Coupling]) -> list[int]:
    """Bits by which each state's block differs from the first state's."""
    shifts: list[int | None] = [0] + [None] * (count - 1)
    for _ in range(count):
        for coupling in couplings:
            change = _coupled_block_change(coupling.kind)
            for one, other in ((coupling.first, coupling.second), (coupling.second, coupling.first)):
                known = shifts[one]
                if known is not None and shifts[other] is None:
                    shifts[other] = known ^ change
    for coupling in couplings:
        first, second = shifts[coupling.first], shifts[coupling.second]
        if first is None or second is None or first ^ second != _coupled_block_change(coupling.kind):
            raise LineDataError(f"coupling {coupling}: contradicts the symmetry that the other couplings imply")
    if None in shifts:
        raise LineDataError(f"state {shifts.index(None)} of the set is coupled to no other: make it a band")
    return [shift for shift in shifts if shift is not None]


def _coupled_block_change(kind: str) -> int:
    return 0 if kind == "F" else block_change("c" if kind == "ab" else kind, 0)


def _solve(
    states: Sequence[RotorConstants],
    couplings: Sequence[Coupling],
    blocks: tuple[int, ...],
    j_max: int,
    k_max: int,
) -> Levels:
    bases = [block_k(block, k_max) for block in blocks]
    edges = np.cumsum([0, *(k.size for k in bases)])
    whole = np.zeros((j_max + 1, edges[-1], edges[-1]))
    parts = [slice(start, stop) for start, stop in pairwise(edges)]
    for part, constants, block in zip(parts, states, blocks, strict=True):
        whole[:, part, part] = rotor_hamiltonian(constants, block, j_max, k_max)
    alone = whole.copy()
    for coupling in couplings:
        one, other = parts[coupling.first], parts[coupling.second]
        matrix = _coupling_matrix(coupling, bases[coupling.second], bases[coupling.first], j_max)
        whole[:, other, one] += matrix
        whole[:, one, other] += np.swapaxes(matrix, 1, 2)
    k = np.concatenate(bases)
    exists, energy, vectors = _eigen(whole, k)
    owner = np.repeat(np.arange(len(states)), [k.size for k in bases])
    if len(states) == 1:
        state, ka = np.zeros(energy.shape, dtype=np.int64), np.broadcast_to(bases[0], energy.shape).copy()
    else:
        state, ka = _resemblance(alone, parts, vectors, owner, k)
    j = np.arange(j_max + 1)[:, np.newaxis]
    minus = np.array([1 if block & MINUS else 0 for block in blocks])
    return Levels(
        blocks=blocks,
        exists=exists,
        energy_per_cm=energy,
        vectors=tuple(vectors[:, part, :] for part in parts),
        state=state,
        ka=ka,
        kc=j - ka + minus[state],
    )


def _coupling_matrix(coupling: Coupling, k_second: NDArray[np.int64], k_first: NDArray[np.int64], j_max: int) -> Floats:
    """<second|H|first>, shape ``(J, K of second, K of first)``."""
    if coupling.kind == "F":
        same = (k_second[:, np.newaxis] == k_first[np.newaxis, :]).astype(np.float64)
        return np.broadcast_to(coupling.strength_per_cm * same, (j_max + 1, *same.shape))
    j = np.arange(j_max + 1.0)[:, np.newaxis, np.newaxis]
    axis = "c" if coupling.kind == "ab" else coupling.kind
    matrix = direction_cosine(axis, 0, k_second, k_first, j_max) * np.sqrt(j * (j + 1.0) / (2.0 * j + 1.0))
    if coupling.kind == "ab":
        matrix = np.abs(matrix) * (k_second[:, np.newaxis] + k_first[np.newaxis, :])
    return coupling.strength_per_cm * matrix


def _eigen(matrices: Floats, k: NDArray[np.int64]) -> tuple[NDArray[np.bool_], Floats, Floats]:
    """Eigenvalues and vectors of each J among the functions with K <= J, padded: exists, energy, vectors."""
    order = np.argsort(k, kind="stable")
    sizes = np.searchsorted(k[order], np.arange(matrices.shape[0]), side="right")
    ordered = matrices[:, order[:, np.newaxis], order]
    energy, rows = np.zeros(matrices.shape[:2]), np.zeros(matrices.shape)
    for size in np.unique(sizes[sizes > 0]):
        same = slice(*np.searchsorted(sizes, [size, size + 1]))  # sizes grow with J
        energy[same, :size], rows[same, :size, :size] = np.linalg.eigh(ordered[same, :size, :size])
    vectors = np.empty_like(rows)
    vectors[:, order] = rows
    return np.arange(k.size)[np.newaxis, :] < sizes[:, np.newaxis], energy, vectors


def _resemblance(
    alone: Floats,
    parts: Sequence[slice],
    vectors: Floats,
    owner: NDArray[np.int64],
    k: NDArray[np.int64],
) -> tuple[NDArray[np.int64], NDArray[np.int64]]:
    """Dominant state and K_a of every coupled level, by its overlap with the levels of the uncoupled states."""
    share = np.zeros_like(vectors)
    for part in parts:
        _, _, free = _eigen(alone[:, part, part], k[part])
        share[:, part, :] = (np.swapaxes(free, 1, 2) @ vectors[:, part, :]) ** 2
    by_state = np.stack([share[:, part, :].sum(axis=1) for part in parts], axis=1)
    state = by_state.argmax(axis=1)
    own = owner[np.newaxis, :, np.newaxis] == state[:, np.newaxis, :]
    return state, k[np.where(own, share, -1.0).argmax(axis=1)]
