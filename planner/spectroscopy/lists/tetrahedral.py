"""Lines of methane-like molecules from effective Hamiltonians of interacting polyads.

The Hamiltonian of a polyad and the dipole moment between two of them are sums of the operators of
`planner.spectroscopy.lists.polyads`, each times a constant. For every J the Hamiltonian falls into blocks by
symmetry species (A1, A2, E, F1, F2); their eigenvalues are the levels, numbered from the lowest as in HITRAN. The same
moments serve hot bands: what lifts the ground state to the pentad lifts the dyad to the octad.

A line from level (J'', species) to (J', partner species) has the intensity ::

    S ~ w (2J''+1) |<upper| mu |lower>|**2 nu exp(-c2 E''/T) (1 - exp(-c2 nu/T))

with the weight w = 5, 2, 3 of A, E, F levels (four protons). All systems that share a moment are scaled together, such
that the lines of the main isotopologue from the ground state have the stated sum at 296 K.
"""

from __future__ import annotations

import re
from collections.abc import Iterator, Mapping, Sequence
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.intensities import einstein_a_per_s, relative_intensity, worth_keeping
from planner.spectroscopy.lists.polyad_levels import (
    Factors,
    Levels,
    coupled_functions,
    polyad_levels,
    summed_factors,
    transition_amplitudes,
)
from planner.spectroscopy.lists.polyads import MODE_DIMENSIONS, Term, invariants

__all__ = ["read_terms", "tetrahedral_band_lines"]

Matrix = NDArray[np.float64]

_SPIN_WEIGHTS = {"A1": 5.0, "A2": 5.0, "E": 2.0, "F1": 3.0, "F2": 3.0}


def read_terms(rows: Sequence[Sequence[Any]], *, vector: bool = False, where: str) -> dict[Term, float]:
    """Constants from rows ``made, destroyed, degree, power, [value, ...]``, one value per independent operator.

    Raises
    ------
    LineDataError
        If a row has another shape, or another number of values than there are operators.
    """
    terms: dict[Term, float] = {}
    for row in rows:
        try:
            made, destroyed, degree, power, values = row
            expected = len(invariants(made, destroyed, degree, vector=vector))
        except (TypeError, ValueError) as error:
            raise LineDataError(f"{where}: expected made, destroyed, degree, power, [values], got {row}") from error
        if len(values) != expected:
            raise LineDataError(
                f"{where}: row {row[:4]}: there are {expected} independent operators, got {len(values)} values"
            )
        terms |= {Term(made, destroyed, degree, power, i): float(v) for i, v in enumerate(values)}
    return terms


def tetrahedral_band_lines(part: Mapping[str, Any], hitran_number: int) -> Lines:
    """Lines of all systems of a part.

    Parameters
    ----------
    part : mapping
        ``hamiltonian``, rows as in `read_terms`, in 1/cm;

        ``isotopologues``, rows ``number, intensity relative to the first, [shifts of the four vibrational quanta in
        1/cm], largest lower polyad, largest step``;

        ``widths``, rows ``J'', air width of A and F lines, of E lines, self width (1/cm/atm), temperature exponent``,
        interpolated in J'' and constant beyond;

        ``weakest_cm``, the weakest line kept, at 296 or 600 K;

        ``coupled``, tables with ``lower`` (``"P0"``), ``states`` (the polyad reached from there, such as ``["P2"]``),
        ``sum_cm`` (cm/molecule at 296 K, first isotopologue), ``moments``, rows as in `read_terms` on any scale, and
        ``largest_j``, the largest J'' from P0, and from P1, ... for the hot bands as many polyads up.
    hitran_number : int
        Molecule number that the lines carry.

    Raises
    ------
    LineDataError
        If rows do not fit.
    """
    where = f"tetrahedral bands of molecule {hitran_number}"
    hamiltonian = read_terms(part["hamiltonian"], where=f"{where}, hamiltonian")
    scales: dict[int, float] = {}
    found = []
    for number, relative, shifts, largest_polyad, largest_step in part["isotopologues"]:
        ladder = _Ladder(hamiltonian, shifts)
        for step, coupled in _by_step(part["coupled"], where):
            if step > largest_step:
                continue
            moments = read_terms(coupled["moments"], vector=True, where=f"{where}, moments to P{step}")
            for polyad, largest_j in enumerate(coupled["largest_j"][: largest_polyad + 1]):
                columns = ladder.transitions(moments, polyad + step, polyad, largest_j)
                # the first isotopologue comes first and its ground state sets the scale
                scale = scales.setdefault(step, coupled["sum_cm"] / columns["intensity"].sum())
                columns["intensity"] *= scale * relative
                names = (f"P{polyad + step}", f"P{polyad}")
                found.append(_as_lines(columns, part, hitran_number, number, names))
    coupled_functions.cache_clear()  # tens of megabytes that are not needed again
    return Lines.join(found)


def _by_step(tables: Sequence[Mapping[str, Any]], where: str) -> Iterator[tuple[int, Mapping[str, Any]]]:
    """How many polyads each table climbs, and the table."""
    for table in tables:
        lower, states = table["lower"], table["states"]
        if lower != "P0" or len(states) != 1 or not re.fullmatch(r"P[1-9]", states[0]):
            raise LineDataError(f'{where}: expected lower "P0" and states such as ["P2"], got {lower!r} and {states!r}')
        yield int(states[0][1:]), table


class _Ladder:
    """Levels of one isotopologue, worked out when first needed."""

    def __init__(self, hamiltonian: Mapping[Term, float], shifts: Sequence[float]) -> None:
        terms = dict(hamiltonian)
        for mode, dimension, shift in zip("1234", MODE_DIMENSIONS, shifts, strict=True):
            # the operator that counts quanta is the unit vector of its kind times the root of the dimension
            number = Term(mode, mode, 0, 0, 0)
            terms[number] = terms.get(number, 0.0) + shift * dimension**0.5
        self._terms = terms
        self._factors: dict[int, Factors] = {}
        self._levels: dict[tuple[int, int], Levels] = {}

    def levels(self, polyad: int, j: int) -> tuple[int, int, Levels]:
        if polyad not in self._factors:
            self._factors[polyad] = summed_factors(self._terms, polyad, polyad)
        if (polyad, j) not in self._levels:
            self._levels[polyad, j] = polyad_levels(self._factors[polyad], polyad, j)
        return polyad, j, self._levels[polyad, j]

    def transitions(
        self, moments: Mapping[Term, float], upper: int, lower: int, largest_j: int
    ) -> dict[str, NDArray[Any]]:
        """All lines between two polyads as columns; intensities at 296 K on the scale of the moments."""
        factors = summed_factors(moments, upper, lower, vector=True)
        parts = []
        for j_low in range(largest_j + 1):
            for j_up in range(abs(j_low - 1), j_low + 2):
                if j_up or j_low:
                    above, below = self.levels(upper, j_up), self.levels(lower, j_low)
                    parts += [_columns(above, below, *item) for item in transition_amplitudes(factors, above, below)]
        return {name: np.concatenate([part[name] for part in parts]) for name in parts[0]}


def _columns(
    upper: tuple[int, int, Levels], lower: tuple[int, int, Levels], species_up: str, species_low: str, amplitude: Matrix
) -> dict[str, NDArray[Any]]:
    """Lines of one matrix of amplitudes as flat columns, those with positive wavenumber."""
    energy_up, energy_low = upper[2][species_up][0], lower[2][species_low][0]
    index_up, index_low = (index.ravel() for index in np.indices(amplitude.shape))
    wavenumber = energy_up[index_up] - energy_low[index_low]
    keep = wavenumber > 0
    index_up, index_low, wavenumber = index_up[keep], index_low[keep], wavenumber[keep]
    radiation = relative_intensity(wavenumber, energy_low[index_low])
    weight = _SPIN_WEIGHTS[species_low] * (2 * lower[1] + 1)
    return {
        "wavenumber": wavenumber,
        "intensity": weight * radiation * amplitude.ravel()[keep] ** 2,
        "lower_energy": energy_low[index_low],
        "j": np.full(wavenumber.size, lower[1]),
        "e_species": np.full(wavenumber.size, species_low == "E"),
        "upper_local": _local_labels(upper[1], species_up, energy_up.size)[index_up],
        "lower_local": _local_labels(lower[1], species_low, energy_low.size)[index_low],
        "upper_weight": np.full(wavenumber.size, _SPIN_WEIGHTS[species_up] * (2 * upper[1] + 1)),
        "lower_weight": np.full(wavenumber.size, weight),
    }


def _local_labels(j: int, species: str, count: int) -> NDArray[np.str_]:
    """HITRAN's local quanta of spherical tops: J, species, number of the level within polyad, J and species."""
    return np.array([f"{j:5d}{species:<2}{number:3d}" for number in range(1, count + 1)], dtype="U15")


def _as_lines(
    columns: Mapping[str, NDArray[Any]],
    part: Mapping[str, Any],
    hitran_number: int,
    isotopologue: int,
    names: tuple[str, str],
) -> Lines:
    strong = worth_keeping(
        hitran_number,
        isotopologue,
        columns["wavenumber"],
        columns["intensity"],
        columns["lower_energy"],
        float(part["weakest_cm"]),
    )
    column = {name: value[strong] for name, value in columns.items()}
    nodes = np.asarray(part["widths"], dtype=np.float64).T
    others, e_lines, own, exponent = (np.interp(column["j"], nodes[0], row) for row in nodes[1:])
    return Lines.make(
        molecule=hitran_number,
        isotopologue=isotopologue,
        wavenumber_per_cm=column["wavenumber"],
        intensity_cm=column["intensity"],
        einstein_a_per_s=einstein_a_per_s(
            hitran_number,
            isotopologue,
            column["wavenumber"],
            column["intensity"],
            column["lower_energy"],
            column["upper_weight"],
        ),
        lower_energy_per_cm=column["lower_energy"],
        air_width_per_cm_atm=np.where(column["e_species"], e_lines, others),
        self_width_per_cm_atm=own,
        temperature_exponent=exponent,
        upper_global=names[0].rjust(15),
        lower_global=names[1].rjust(15),
        upper_local=column["upper_local"],
        lower_local=column["lower_local"],
        upper_weight=column["upper_weight"],
        lower_weight=column["lower_weight"],
    )
