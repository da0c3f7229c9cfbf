"""Levels of symmetric tops, and of an A1 and an E state mixed by Coriolis force."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError

__all__ = ["CoupledPair", "TopLevel", "pair_blocks", "read_levels"]

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]


@dataclass(frozen=True, kw_only=True, eq=False)
class TopLevel:
    """Constants of a vibrational level of a symmetric top, in 1/cm.

    Attributes
    ----------
    name : str
    weights : str
        Key of the nuclear spin weights.
    constants : (10,) float64
        G, B, C-B, DJ, DJK, DK, HJ, HJK, HKJ, HK.
    l_terms : (3,) float64
        C zeta, etaJ, etaK; zero in levels that are not degenerate.
    """

    name: str
    weights: str
    constants: Floats
    l_terms: Floats

    def energy_per_cm(self, j: Any, k: Any, vibrational: Any = 0) -> Floats:
        """Energy of the levels J, k, l, broadcast against each other."""
        origin, b, c_b, dj, djk, dk, hj, hjk, hkj, hk = self.constants
        c_zeta, eta_j, eta_k = self.l_terms
        x, square, product = np.asarray(j * (j + 1.0)), np.asarray(k * 1.0) ** 2, k * vibrational
        rigid = origin + b * x + c_b * square
        distortion = -dj * x**2 - djk * x * square - dk * square**2
        sextic = hj * x**3 + hjk * x**2 * square + hkj * x * square**2 + hk * square**3
        return np.asarray(rigid + distortion + sextic + (eta_j * x + eta_k * square - 2.0 * c_zeta) * product)

    def shifted(self, energy_per_cm: float) -> TopLevel:
        """The same level with another origin."""
        constants = self.constants.copy()
        constants[0] += energy_per_cm
        return replace(self, constants=constants)


@dataclass(frozen=True, kw_only=True, eq=False)
class CoupledPair:
    """An A1 and an E state mixed by Coriolis force.

    Attributes
    ----------
    a1, e : TopLevel
    coupling : (2,) float64
        c and cK, in 1/cm.
    doubling : float
        q of the E state, in 1/cm.
    """

    a1: TopLevel
    e: TopLevel
    coupling: Floats
    doubling: float


def pair_blocks(pair: CoupledPair, j: Ints, g: Ints) -> tuple[Floats, Floats]:
    """Levels of a coupled pair, one block of three for each J and ``g = k - l``.

    The force mixes the A1 state with k = g, and the E state with k = g+1, l = +1 and with k = g-1, l = -1. With
    ``r(k) = sqrt(J(J+1) - k(k+1))`` its elements are (e.g. Papousek and Aliev 1982, Molecular
    vibrational-rotational spectra; phases as in the amplitudes of `symmetric_lines`) ::

        <E, +|H|A> = (c + cK (2g+1)) r(g)
        <E, -|H|A> = -(c - cK (2g-1)) r(g-1)
        <E, +|H|E, -> = (q/2) r(g) r(g-1)

    Returns
    -------
    energies, shape ``(block, 3)``, and vectors, shape ``(block, 3, 3)``
        Rows of a vector: A, E with l = +1, E with l = -1.
    """
    c, c_k = pair.coupling
    x = j * (j + 1.0)
    up, down = (np.sqrt(np.maximum(0.0, x - g * (g + s))) for s in (1.0, -1.0))
    blocks = np.zeros((j.size, 3, 3))
    blocks[:, 0, 0] = pair.a1.energy_per_cm(j, g)
    blocks[:, 1, 1] = pair.e.energy_per_cm(j, g + 1, 1)
    blocks[:, 2, 2] = pair.e.energy_per_cm(j, g - 1, -1)
    blocks[:, 1, 0] = (c + c_k * (2 * g + 1)) * up
    blocks[:, 2, 0] = -(c - c_k * (2 * g - 1)) * down
    blocks[:, 2, 1] = pair.doubling / 2 * up * down
    energies, vectors = np.linalg.eigh(blocks)  # reads the lower triangle
    return energies, vectors


def read_levels(rows: Sequence[Sequence[Any]], hitran_number: int) -> dict[str, TopLevel]:
    """Levels by name from rows ``name, weights, constants, l_terms, source``.

    Three, six or all ten constants may be given: left out quartic ones are those of the first level, others zero.

    Raises
    ------
    LineDataError
        If a row has another shape.
    """
    levels: dict[str, TopLevel] = {}
    for row in rows:
        try:
            name, weights, constants, l_terms, _source = row
        except ValueError as error:
            raise LineDataError(f"symmetric top {hitran_number}: level {row}: expected five columns") from error
        if len(constants) not in (3, 6, 10):
            raise LineDataError(
                f"symmetric top {hitran_number}: level {name!r}: expected 3, 6 or 10 constants, got {len(constants)}"
            )
        filled = np.zeros(10)
        filled[: len(constants)] = constants
        if len(constants) == 3 and levels:
            filled[3:6] = next(iter(levels.values())).constants[3:6]
        extra = np.zeros(3)
        extra[: len(l_terms)] = l_terms
        levels[name] = TopLevel(name=name, weights=weights, constants=filled, l_terms=extra)
    return levels
