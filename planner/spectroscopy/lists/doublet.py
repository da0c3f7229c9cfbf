"""Lines of a diatomic molecule in a 2Pi ground state (NO) from its constants.

The levels of one v and J are the eigenvalues of a 2x2 matrix in the basis Omega = 3/2, 1/2,

    ``T + (A/2 + A_D {N2, s}/4) s + B N2 - D N2**2``,  ``s = diag(1, -1)``,  ``N2 = [[z, -sqrt z], [-sqrt z, z + 2]]``,

``z = (J + 1/2)**2 - 1``, with the Lambda doubling ``-/+ (p + 2q)(J + 1/2)/2`` on Omega = 1/2 and
``+/- q (J + 1/2) sqrt(z)/2`` off the diagonal for e/f levels (Brown and Merer 1979, J. Mol. Spectrosc. 74, 488; Zare
et al. 1973, J. Mol. Spectrosc. 46, 37). The eigenvectors carry the intensities: both spin components add coherently,
which also gives the weak lines between them. Hyperfine splitting (0.001 cm-1) is left out.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.intensities import (
    einstein_a_per_s,
    relative_intensity,
    whole_band_cut_cm,
    worth_keeping,
)

__all__ = ["doublet_lines", "doublet_states"]

Floats = NDArray[np.float64]

_LEVEL_COLUMNS = 9
_BAND_COLUMNS = 5
_OMEGA = np.array([1.5, 0.5])
"""Order of the basis and of the two energies: the upper spin component first."""


def doublet_states(constants: Sequence[float], j: NDArray[Any], parity: int) -> tuple[Floats, Floats]:
    """Energies and eigenvectors of the two spin components.

    Parameters
    ----------
    constants : sequence of 7 floats
        ``T, B, D, A, A_D, p + 2q, q`` in 1/cm.
    j : array, shape ``(j,)``
        Half-integer quantum numbers from 0.5.
    parity : {1, -1}
        e or f levels.

    Returns
    -------
    energy : shape ``(2, j)``
        1/cm; Omega = 3/2 (absent, NaN, at J = 0.5) and Omega = 1/2.
    vector : shape ``(2, 2, j)``
        Components (state, basis).
    """
    term, b, d, a, a_d, p_2q, q = constants
    x = j + 0.5
    z = x**2 - 1.0
    root = np.sqrt(z)
    upper = term + a / 2 + (b + a_d / 2) * z - d * (z**2 + z)
    lower = term - a / 2 + (b - a_d / 2) * (z + 2) - d * ((z + 2) ** 2 + z) - parity * p_2q * x / 2
    cross = -b * root + d * root * (2 * z + 2) + parity * q * x * root / 2
    angle = 0.5 * np.arctan2(2 * cross, upper - lower)
    cosine, sine = np.cos(angle), np.sin(angle)
    centre, half = (upper + lower) / 2, np.hypot((upper - lower) / 2, cross)
    single = z == 0.0
    energy = np.stack([np.where(single, np.nan, centre + half), np.where(single, lower, centre - half)])
    return energy, np.stack([np.stack([cosine, sine]), np.stack([-sine, cosine])])


def doublet_lines(part: Mapping[str, Any], hitran_number: int) -> Lines:
    """Lines of a molecule in a 2Pi state.

    Parameters
    ----------
    part : mapping
        ``weakest_cm``, the smallest intensity that is kept (at 296 or at 600 K); ``largest_j``; ``widths``, rows
        ``larger J, air half width, self half width (1/cm/atm), temperature exponent``; and ``species``, tables with
        ``isotopologue``, ``nuclear_weight``, ``levels``, rows ``v, T, B, D, A, A_D, p + 2q, q, source``, and
        ``bands``, rows ``upper v, lower v, S (cm/molecule at 296 K), a1, source`` with the Herman-Wallis factor
        ``(1 + a1 m)**2``, m = -J, 0, J+1 in P, Q, R.
    hitran_number : int
        Molecule number that the lines carry.

    Raises
    ------
    LineDataError
        If a row breaks its layout, or a band names a level that is not there.
    """
    widths = np.array(part["widths"], dtype=np.float64)
    return Lines.join(
        [
            _band_lines(species, levels, band, part, widths, hitran_number)
            for species in part["species"]
            for levels in [_levels(species["levels"])]
            for band in species["bands"]
        ]
    )


def _levels(rows: Sequence[Sequence[Any]]) -> dict[int, Sequence[float]]:
    for row in rows:
        if len(row) != _LEVEL_COLUMNS or not np.all(np.isfinite(row[:8])):
            raise LineDataError(f"level {row[:1]}: expected v, T, B, D, A, A_D, p + 2q, q, source; got {list(row)}")
    return {int(row[0]): row[1:8] for row in rows}


@dataclass(frozen=True, kw_only=True, eq=False)
class _Branch:
    """Lines of one band, branch, parity and pair of spin components, shape ``(line,)``."""

    position: Floats
    energy: Floats
    strength: Floats
    j: Floats
    labels: tuple[str, str, str, str]
    """Branch letter, parity letter, Omega below and above."""
    step: int


def _branches(lower: Sequence[float], upper: Sequence[float], slope: float, largest_j: int) -> list[_Branch]:
    j = np.arange(largest_j) + 0.5
    found = []
    for step in (-1, 0, 1):
        above = np.maximum(j + step, 0.5)
        for parity in (1, -1):
            energies, vectors = doublet_states(lower, j, parity)
            energies_up, vectors_up = doublet_states(upper, above, parity if step else -parity)
            amplitude = _direction_cosines(step, j)
            m = 0.0 if step == 0 else np.where(step > 0, j + 1.0, -j)
            for low in (0, 1):
                for up in (0, 1):
                    strength = np.sum(vectors[low] * vectors_up[up] * amplitude, axis=0) ** 2 * (1.0 + slope * m) ** 2
                    position = energies_up[up] - energies[low]
                    keep = (position > 0.0) & (strength > 0.0) & (j + step > 0.0)
                    found.append(
                        _Branch(
                            position=position[keep],
                            energy=energies[low][keep],
                            strength=strength[keep] * relative_intensity(position[keep], energies[low][keep]),
                            j=j[keep],
                            labels=("PQR"[step + 1], "e" if parity > 0 else "f", "31"[low], "31"[up]),
                            step=step,
                        )
                    )
    return found


def _direction_cosines(step: int, j: NDArray[Any]) -> Floats:
    """Amplitude of each basis state in a transition that keeps Omega, shape ``(basis, j)``; 0 where J < Omega."""
    omega = _OMEGA[:, np.newaxis]
    if step == 0:
        return np.where(j >= omega, omega * np.sqrt((2 * j + 1) / (j * (j + 1))), 0.0)
    larger = j + 1.0 if step > 0 else j
    return np.sqrt(np.maximum(larger**2 - omega**2, 0.0) / larger)


def _band_lines(
    species: Mapping[str, Any],
    levels: Mapping[int, Sequence[float]],
    band: Sequence[Any],
    part: Mapping[str, Any],
    widths: Floats,
    hitran_number: int,
) -> Lines:
    if len(band) != _BAND_COLUMNS or not np.all(np.isfinite(band[2:4])) or band[2] <= 0:
        raise LineDataError(f"band {band[:2]}: expected upper v, lower v, S > 0, a1, source; got {list(band)}")
    v_up, v_low = band[:2]
    if missing := [v for v in (v_up, v_low) if v not in levels]:
        raise LineDataError(f"band {band[:2]}: no level v = {missing[0]}; add it to the levels")
    branches = _branches(levels[v_low], levels[v_up], band[3], int(part["largest_j"]))
    scale = band[2] / sum(branch.strength.sum() for branch in branches)
    isotopologue, nuclear = int(species["isotopologue"]), float(species["nuclear_weight"])
    weakest_cm, intensity = float(part["weakest_cm"]), scale * np.concatenate([branch.strength for branch in branches])
    weakest_cm = min(weakest_cm, whole_band_cut_cm(intensity, intensity >= weakest_cm))
    return Lines.join(
        [
            _branch_lines(branch, scale, (v_up, v_low), widths, (hitran_number, isotopologue), nuclear, weakest_cm)
            for branch in branches
        ]
    )


def _branch_lines(
    branch: _Branch,
    scale: float,
    quanta: tuple[int, int],
    widths: Floats,
    numbers: tuple[int, int],
    nuclear: float,
    weakest_cm: float,
) -> Lines:
    intensity = branch.strength * scale
    keep = worth_keeping(*numbers, branch.position, intensity, branch.energy, weakest_cm)
    j, position, energy, intensity = (a[keep] for a in (branch.j, branch.position, branch.energy, intensity))
    upper_weight = nuclear * (2 * (j + branch.step) + 1)
    letter, parity, low, up = branch.labels
    width, self_width, exponent = (np.interp(np.maximum(j, j + branch.step), widths[:, 0], c) for c in widths.T[1:])
    return Lines.make(
        molecule=numbers[0],
        isotopologue=numbers[1],
        wavenumber_per_cm=position,
        intensity_cm=intensity,
        einstein_a_per_s=einstein_a_per_s(*numbers, position, intensity, energy, upper_weight),
        lower_energy_per_cm=energy,
        air_width_per_cm_atm=width,
        self_width_per_cm_atm=self_width,
        temperature_exponent=exponent,
        upper_global=f"       X{up}/2{quanta[0]:4d}",
        lower_global=f"       X{low}/2{quanta[1]:4d}",
        lower_local=np.array([f"   {letter}{value:5.1f}{parity}" for value in j], dtype="<U15"),
        upper_weight=upper_weight,
        lower_weight=nuclear * (2 * j + 1),
    )
