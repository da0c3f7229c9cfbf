"""Levels of linear molecules: energies, symmetry, and the factors of their rotational lines.

Energies are ``E = G + B x - D x**2 + H x**3 -/+ (q N - q_J N**2)/2`` with ``x = J(J+1) - l**2``, ``N = J(J+1)``, the
upper sign for e and the lower for f levels (Herzberg 1945, Infrared and Raman Spectra, section IV.1; e/f labels
after Brown et al. 1975, J. Mol. Spectrosc. 55, 500). Diatomics in a Sigma state are the case l = 0.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError

__all__ = ["E", "F", "Levels", "honl_london"]

Floats = NDArray[np.float64]

E, F = 1, -1
"""Rotationless parity: how the doubling term is signed and the spin rule counts."""

_LEVEL_COLUMNS = 10


@dataclass(frozen=True, kw_only=True, eq=False)
class Levels:
    """Vibrational levels of one isotopologue; arrays have shape ``(level,)``.

    Attributes
    ----------
    names : tuple of str
        HITRAN global labels without leading blanks.
    angular_momentum : int64
        Vibrational angular momentum l.
    ungerade, minus : bool
        Symmetry of a symmetric molecule; Sigma-minus states, which have f levels where Sigma-plus has e levels.
    origin_per_cm, rotation_per_cm, distortion_per_cm, sextic_per_cm, doubling_per_cm, doubling_j_per_cm : float64
        G, B, D, H, q and q_J of the module's formula.
    """

    names: tuple[str, ...]
    angular_momentum: NDArray[np.int64]
    ungerade: NDArray[np.bool_]
    minus: NDArray[np.bool_]
    origin_per_cm: Floats
    rotation_per_cm: Floats
    distortion_per_cm: Floats
    sextic_per_cm: Floats
    doubling_per_cm: Floats
    doubling_j_per_cm: Floats

    @classmethod
    def from_rows(cls, rows: Sequence[Sequence[Any]]) -> Levels:
        """Levels from rows ``name, l, symmetry, G, B, D, H, q, q_J, source``; symmetry such as ``"g"``, ``"u-"``.

        Raises
        ------
        LineDataError
            If a row has another length, a symmetry that is none, or numbers that are not finite; if a name is
            there twice.
        """
        for row in rows:
            if len(row) != _LEVEL_COLUMNS or not np.all(np.isfinite(row[3:9])) or set(row[2]) - set("gu-"):
                raise LineDataError(
                    f"level {row[:1]}: expected name, l, symmetry, G, B, D, H, q, q_J, source; got {list(row)}"
                )
        names = tuple(str(row[0]) for row in rows)
        if len(set(names)) < len(names):
            raise LineDataError(f"level {sorted(n for n in names if names.count(n) > 1)[0]!r}: there twice")
        numbers = np.array([row[3:9] for row in rows], dtype=np.float64).T
        return cls(
            names=names,
            angular_momentum=np.array([row[1] for row in rows], dtype=np.int64),
            ungerade=np.array(["u" in row[2] for row in rows]),
            minus=np.array(["-" in row[2] for row in rows]),
            origin_per_cm=numbers[0],
            rotation_per_cm=numbers[1],
            distortion_per_cm=numbers[2],
            sextic_per_cm=numbers[3],
            doubling_per_cm=numbers[4],
            doubling_j_per_cm=numbers[5],
        )

    def energy_per_cm(self, level: NDArray[np.int64], j: NDArray[Any], parity: int) -> Floats:
        """Energy of the level with quantum number J and parity ``E`` or ``F``; arguments broadcast."""
        rotation = j * (j + 1.0)
        x = rotation - self.angular_momentum[level] ** 2
        rigid = x * (self.rotation_per_cm[level] - x * (self.distortion_per_cm[level] - x * self.sextic_per_cm[level]))
        doubling = rotation * (self.doubling_per_cm[level] - rotation * self.doubling_j_per_cm[level])
        return np.asarray(self.origin_per_cm[level] + rigid - parity * 0.5 * doubling, dtype=np.float64)

    def exists(self, level: NDArray[np.int64], j: NDArray[Any], parity: int) -> NDArray[np.bool_]:
        """Whether there is such a level: J >= l, and only e (Sigma-plus) or only f (Sigma-minus) for l = 0."""
        momentum = self.angular_momentum[level]
        single = np.where(self.minus[level], F, E)
        return np.asarray((j >= momentum) & ((momentum > 0) | (single == parity)))

    def symmetric(self, level: NDArray[np.int64], j: NDArray[Any], parity: NDArray[Any] | int) -> NDArray[np.bool_]:
        """Whether the level is unchanged when equal nuclei change places (s), else it changes sign (a)."""
        sign = np.where(j % 2 == 0, 1, -1) * parity * np.where(self.ungerade[level], -1, 1)
        return np.asarray(sign == 1)


def honl_london(branch: int, j: NDArray[Any], lower: NDArray[Any], upper: NDArray[Any]) -> Floats:
    """Hoenl-London factor of a line in absorption; the branches of one lower J add up to 2J+1.

    Parameters
    ----------
    branch : {-1, 0, 1}
        P, Q, R.
    j : int array
        J of the lower level, at least ``lower``.
    lower, upper : int array
        Vibrational angular momentum below and above. Bands that change it by more than one borrow their strength
        through l-type resonance; they get the parallel factor of l = 0, without Q branch, and their own shape
        through the Herman-Wallis terms.

    Notes
    -----
    Hoenl and London 1925, Z. Phys. 33, 803; in this form Herzberg 1945, eq. IV,59 to IV,61.
    """
    j = np.asarray(j, dtype=np.float64)
    step = np.asarray(upper) - np.asarray(lower)
    momentum = np.where(np.abs(step) > 1, 0.0, lower)
    signed = np.where(step < 0, -momentum, momentum)
    with np.errstate(divide="ignore", invalid="ignore"):
        if branch == 1:
            parallel = ((j + 1) ** 2 - momentum**2) / (j + 1)
            perpendicular = (j + 2 + signed) * (j + 1 + signed) / (2 * (j + 1))
        elif branch == 0:
            parallel = (2 * j + 1) * momentum**2 / (j * (j + 1))
            perpendicular = (j + 1 + signed) * (j - signed) * (2 * j + 1) / (2 * j * (j + 1))
        else:
            parallel = (j**2 - momentum**2) / j
            perpendicular = (j - 1 - signed) * (j - signed) / (2 * j)
    factor = np.where(np.abs(step) == 1, perpendicular, parallel)
    return np.where((j == 0) & (branch < 1), 0.0, factor)
