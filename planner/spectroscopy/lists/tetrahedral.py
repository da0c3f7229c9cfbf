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

import itertools
from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.intensities import relative_intensity, worth_keeping
from planner.spectroscopy.lists.polyads import (
    MODE_DIMENSIONS,
    PARTNERS,
    SPECIES,
    Term,
    adapted,
    group_elements,
    invariants,
    polyad_matrices,
    rotation_matrices,
    rotational_tensors,
    species_coupling,
    vector_coupling,
    vibrational_factors,
)

__all__ = ["polyad_levels", "read_terms", "tetrahedral_band_lines", "transition_amplitudes"]

Matrix = NDArray[np.float64]
Factors = Mapping[tuple[int, int], Matrix]
"""Vibrational factors summed over terms, by (degree, power)."""
Levels = Mapping[str, tuple[Matrix, Matrix]]
"""Energies, ascending, and eigenvectors of each species."""

_SPIN_WEIGHTS = {"A1": 5.0, "A2": 5.0, "E": 2.0, "F1": 3.0, "F2": 3.0}
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


def polyad_levels(terms: Mapping[Term, float], polyad: int, j: int) -> Levels:
    """Levels of one polyad and J: energies in 1/cm, and eigenvectors on the symmetry-adapted functions.

    Each species appears once, whatever its dimension.
    """
    factors = _summed_factors(terms, polyad, polyad)
    return _levels(factors, polyad, j)


def _levels(factors: Factors, polyad: int, j: int) -> Levels:
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
        basis = _coupled(polyad, j, species, 0)
        levels[species] = np.linalg.eigh(basis.T @ matrices[kind] @ basis)
    return levels


def transition_amplitudes(
    moments: Mapping[Term, float],
    upper: tuple[int, int, Levels],
    lower: tuple[int, int, Levels],
) -> Iterator[tuple[str, str, Matrix]]:
    """Matrix elements of the dipole moment between two levels, times the direction cosines.

    Parameters
    ----------
    moments : mapping
        Dipole terms and their constants.
    upper, lower : (polyad, J, levels)

    Yields
    ------
    upper species, lower species, array of shape ``(upper level, lower level)``
        The lab-fixed dipole is of species A2, so A1 goes with A2, F1 with F2 and E with E.
    """
    factors = _summed_factors(moments, upper[0], lower[0], vector=True)
    yield from _amplitudes(factors, upper, lower)


def _amplitudes(
    factors: Factors, upper: tuple[int, int, Levels], lower: tuple[int, int, Levels]
) -> Iterator[tuple[str, str, Matrix]]:
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
        above = _coupled(polyad_up, j_up, partner, 0) @ levels_up[partner][1]
        below = _coupled(polyad_low, j_low, species, component) @ levels_low[species][1]
        yield partner, species, above.T @ matrices[_CLASS_OF_SPECIES[species]] @ below


def _summed_factors(terms: Mapping[Term, float], upper: int, lower: int, *, vector: bool = False) -> Factors:
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
def _coupled(polyad: int, j: int, species: str, component: int) -> Matrix:
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

        ``system``, tables with ``step``, the polyads climbed, ``largest_j`` of the lower level for each lower polyad,
        ``sum_cm`` from the ground state (cm/molecule at 296 K), and ``moments``, rows as in `read_terms` on any scale.
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
        for index, system in enumerate(part["system"]):
            if system["step"] > largest_step:
                continue
            moments = read_terms(system["moments"], vector=True, where=f"{where}, moments {index + 1}")
            for polyad, largest_j in enumerate(system["largest_j"][: largest_polyad + 1]):
                columns = ladder.transitions(moments, polyad + system["step"], polyad, largest_j)
                # the first isotopologue comes first and its ground state sets the scale
                scale = scales.setdefault(index, system["sum_cm"] / columns["intensity"].sum())
                columns["intensity"] *= scale * relative
                names = (f"P{polyad + system['step']}", f"P{polyad}")
                found.append(_as_lines(columns, part, hitran_number, number, names))
    return Lines.join(found)


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
            self._factors[polyad] = _summed_factors(self._terms, polyad, polyad)
        if (polyad, j) not in self._levels:
            self._levels[polyad, j] = _levels(self._factors[polyad], polyad, j)
        return polyad, j, self._levels[polyad, j]

    def transitions(
        self, moments: Mapping[Term, float], upper: int, lower: int, largest_j: int
    ) -> dict[str, NDArray[Any]]:
        """All lines between two polyads as columns; intensities at 296 K on the scale of the moments."""
        factors = _summed_factors(moments, upper, lower, vector=True)
        parts = []
        for j_low in range(largest_j + 1):
            for j_up in range(abs(j_low - 1), j_low + 2):
                if j_up or j_low:
                    above, below = self.levels(upper, j_up), self.levels(lower, j_low)
                    parts += [_columns(above, below, *item) for item in _amplitudes(factors, above, below)]
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
