"""Line lists of asymmetric tops from spectroscopic constants: bands of single states and of coupled sets.

A line's amplitude is the direction cosine of the band's axis between the two eigenvectors, each of its elements in
the symmetric-top basis multiplied beforehand by

``m0 + m1 m + m2 (K'^2 - K^2) + m3 m^2 + m4 (K'^2 + K^2) + m5 m (K'^2 - K^2)``, m = -J, 0, J + 1 for P, Q, R

(the first- and second-order terms of the dipole operator, after Herman and Wallis 1955, J. Chem. Phys. 23, 637, applied
where they are defined, on the basis and not on the labels). In a coupled set the amplitudes of the states add before
the square. Intensities are those of Rothman et al. (1998, JQSRT 60, 665, eq. A5) up to a factor that gives the
set its stated sum at 296 K.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass
from functools import lru_cache
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.asymmetric_parts import BandSet, parse_asymmetric_part
from planner.spectroscopy.lists.asymmetric_rotor import (
    BLOCKS,
    Coupling,
    Levels,
    RotorConstants,
    block_change,
    block_k,
    coupled_levels,
    direction_cosine,
    spin_rotation,
)
from planner.spectroscopy.lists.intensities import whole_band_cut_cm

__all__ = ["asymmetric_lines"]

Floats = NDArray[np.float64]

SECOND_RADIATION_CONSTANT_CM_K = 1.438776877
"""h c / k of the 2019 SI, rounded."""
_REFERENCE_TEMPERATURE_K = 296.0
_LEAST_WIDTH_PER_CM_ATM = 0.01
_LOGARITHMIC_TERMS = 6


@dataclass(frozen=True, kw_only=True, eq=False)
class _Group:
    """Transitions between two symmetry blocks with one change of J; arrays have shape ``(J, upper, lower)``."""

    upper: Levels
    lower: Levels
    j_upper: NDArray[np.int64]
    j_lower: NDArray[np.int64]
    wavenumber_per_cm: Floats
    strength: Floats


def asymmetric_lines(part: Mapping[str, Any], hitran_number: int) -> Lines:
    """Lines of one isotopologue of an asymmetric top.

    Parameters
    ----------
    part : mapping
        ``isotopologue``; ``cut_cm``, weakest line kept; ``k_max``, largest K of the basis (default: J);
        ``merge_per_cm``: lines of a band closer than this in wavenumber and lower energy become one (default 0);
        ``spin_weights``, for lower levels whose (K_a, K_c) are even-even, even-odd, odd-even, odd-odd, and
        ``spin_weights_antisymmetric`` for those of the vibrational states in ``antisymmetric_states``;
        ``air_width``, ``self_width`` (1/cm/atm) and ``air_exponent``, four numbers c each, meaning
        ``c0 + c1 e + c2 k + c3 e k`` with ``e = exp(-J/width_j_scale)``, J the larger of both, ``k = K_a'/10``; widths
        may also be six numbers, ``exp(c0 + c1 J + c2 J^2 + c3 K + c4 K^2 + c5 J K)``, J and K_a then means of both
        levels; no width is less than 0.01;

        ``spin_rotation_per_cm``: e_aa, e_bb, e_cc of a molecule with one unpaired electron, whose lines then come
        as doublets (default: none);
        ``distortion``: name -> row of softening, Delta_J, Delta_JK, Delta_K, delta_J, delta_K, Phi_J, Phi_JK, Phi_KJ,
        Phi_K, phi_J, phi_JK, phi_K (zeros at the end may be left out);
        ``states``: name -> row of origin, A, B, C (1/cm), name of a distortion row, source;
        ``bands``: rows of upper, lower, axis, sum of intensities (cm/molecule, 296 K), largest J, list of
        ``[m1, m2, m3, ...]``, source;
        ``coupled``: tables of ``states``, ``lower``, ``sum_cm``, ``j_max``, ``couplings`` (rows of two states, kind,
        1/cm), ``moments`` (state -> [axis, m0, m1, ...]), optional ``keep`` (state -> [largest K_a', cut_cm]).
    hitran_number : int
        Molecule number that the lines carry.

    Returns
    -------
    Lines
        Each band and set adds up to its stated sum before weak lines are dropped, and within a per cent after it
        if more than half of it lies above the cut. A set with limits (``keep``) adds up to it within them.

    Raises
    ------
    LineDataError
        If a key is missing or unknown, a row has the wrong shape, or a state is not defined.
    """
    where = f"asymmetric part of molecule {hitran_number}"
    rotors, sets = parse_asymmetric_part(part, where)
    solver = _Solver(rotors, sets, part)
    return Lines.join([_set_lines(band, solver, part, hitran_number, where) for band in sets])


class _Solver:
    """Levels of every state and set of a part, each solved once, up to the largest J that asks for it."""

    def __init__(self, rotors: Mapping[str, RotorConstants], sets: Sequence[BandSet], part: Mapping[str, Any]) -> None:
        self._rotors = rotors
        self._j_needed: dict[tuple[Any, ...], int] = {}
        for band in sets:
            for key in ((band.states, band.couplings), ((band.lower,), ())):
                self._j_needed[key] = max(band.j_max, self._j_needed.get(key, 0))
        self.k_max = max(2, int(part.get("k_max", max(self._j_needed.values(), default=0))))
        self._solved: dict[tuple[Any, ...], tuple[Levels, ...]] = {}

    def levels(self, states: tuple[str, ...], couplings: tuple[Coupling, ...] = ()) -> tuple[Levels, ...]:
        key = (states, couplings)
        if key not in self._solved:
            rotors = [self._rotors[name] for name in states]
            self._solved[key] = coupled_levels(rotors, couplings, self._j_needed[key], self.k_max)
        return self._solved[key]


def _set_lines(band: BandSet, solver: _Solver, part: Mapping[str, Any], hitran_number: int, where: str) -> Lines:
    upper, lower = solver.levels(band.states, band.couplings), solver.levels((band.lower,))
    groups = list(_groups(band, upper, lower, solver.k_max, _lower_weights(part, band.lower), where))
    strength = np.concatenate([group.strength.ravel() for group in groups])
    if not np.any(strength > 0):
        raise LineDataError(f"{where}: {band.name}: no line has a positive wavenumber and strength")
    cuts = np.array(band.cuts_cm)
    own_cut = np.concatenate([_by_line(cuts[group.upper.state[group.j_upper]], group) for group in groups])
    if np.any(np.isfinite(band.ka_most)):
        scale = _scale_of_kept(strength, own_cut, band.sum_cm)
    else:
        scale = band.sum_cm / float(strength.sum())
        cuts = np.minimum(cuts, whole_band_cut_cm(scale * strength, scale * strength >= own_cut))
    spin = part.get("spin_rotation_per_cm")
    pieces = [_columns(group, scale, cuts, spin) for group in groups]
    column = {name: np.concatenate([piece[name] for piece in pieces]) for name in pieces[0]}
    column = _merged(column, float(part.get("merge_per_cm", 0.0)))
    if spin is not None:
        column = _spin_doublets(column)
    j_scale = float(part["width_j_scale"])
    return Lines.make(
        molecule=hitran_number,
        isotopologue=int(part["isotopologue"]),
        wavenumber_per_cm=column["wavenumber"],
        intensity_cm=column["intensity"],
        lower_energy_per_cm=column["energy"],
        air_width_per_cm_atm=_widths(part["air_width"], column, j_scale),
        self_width_per_cm_atm=_widths(part["self_width"], column, j_scale),
        temperature_exponent=_four_terms(part["air_exponent"], column, j_scale),
        upper_global=np.array(band.states)[column["state"]],
        lower_global=band.lower,
        upper_local=_labels(band.j_max)[column["upper"]],
        lower_local=_labels(band.j_max)[column["lower"]],
    )


def _by_line(by_upper: Floats, group: _Group) -> Floats:
    """Values of upper levels, shape ``(J, upper)``, for every line of a group in turn."""
    return np.broadcast_to(by_upper[:, :, np.newaxis], group.strength.shape).ravel()


def _scale_of_kept(strength: Floats, cut_cm: Floats, sum_cm: float) -> float:
    """The factor with which the lines at or above their cuts add up to a sum.

    Lines are taken in the order in which a growing factor lifts them above their cuts, as long as those taken so far,
    scaled to the sum, all lie above.
    """
    order = np.argsort(-strength / cut_cm)
    together = np.cumsum(strength[order])
    last = np.count_nonzero(sum_cm * strength[order] >= cut_cm[order] * together) - 1
    return float(sum_cm / together[last])


def _groups(
    band: BandSet,
    upper: tuple[Levels, ...],
    lower: tuple[Levels, ...],
    k_max: int,
    weights: Floats,
    where: str,
) -> Iterator[_Group]:
    """Everything the set's moment connects, with relative intensities at 296 K."""
    for delta_j in (-1, 0, 1):
        j_lower = np.arange(max(0, -delta_j), band.j_max + 1 - max(0, delta_j))
        for block in BLOCKS:
            met = {block ^ block_change(m.axis, delta_j) ^ upper[0].blocks[m.state] for m in band.moments}
            if len(met) != 1:
                raise LineDataError(f"{where}: {band.name}: the axes of the moments contradict the couplings")
            above, below = upper[met.pop()], lower[block]
            yield _group(band, above, below, j_lower, j_lower + delta_j, k_max, weights)


def _group(
    band: BandSet,
    upper: Levels,
    lower: Levels,
    j_lower: NDArray[np.int64],
    j_upper: NDArray[np.int64],
    k_max: int,
    weights: Floats,
) -> _Group:
    above, below = upper.energy_per_cm[j_upper][:, :, np.newaxis], lower.energy_per_cm[j_lower][:, np.newaxis, :]
    wavenumber = above - below
    meant = upper.exists[j_upper] & (upper.ka[j_upper] <= np.array(band.ka_most)[upper.state[j_upper]])
    real = meant[:, :, np.newaxis] & lower.exists[j_lower][:, np.newaxis, :] & (wavenumber > 0)
    ka, kc = lower.ka[j_lower], lower.kc[j_lower]
    spin = weights[2 * (ka % 2) + kc % 2][:, np.newaxis, :]
    hotness = -SECOND_RADIATION_CONSTANT_CM_K / _REFERENCE_TEMPERATURE_K
    # what is absorbed less what light makes come back, as populations: far fewer exponentials than lines
    net = spin * np.exp(hotness * below) - spin * np.exp(hotness * above)
    strength = wavenumber * net * _amplitude(band, upper, lower, j_lower, j_upper, k_max) ** 2
    return _Group(
        upper=upper,
        lower=lower,
        j_upper=j_upper,
        j_lower=j_lower,
        wavenumber_per_cm=wavenumber,
        strength=np.where(real, strength, 0.0),
    )


def _amplitude(
    band: BandSet,
    upper: Levels,
    lower: Levels,
    j_lower: NDArray[np.int64],
    j_upper: NDArray[np.int64],
    k_max: int,
) -> Floats:
    """Dipole matrix elements between levels, shape ``(J, upper level, lower level)``."""
    delta_j = int(j_upper[0] - j_lower[0])
    below = lower.blocks[0]
    total: Floats = np.zeros((j_lower.size, upper.energy_per_cm.shape[1], lower.energy_per_cm.shape[1]))
    for moment in band.moments:
        block = upper.blocks[moment.state]
        cosine = _cosines(moment.axis, delta_j, block, below, band.j_max, k_max)[j_lower]
        element = cosine * _factor(moment.factors, delta_j, j_lower, block_k(block, k_max), block_k(below, k_max))
        above = np.swapaxes(upper.vectors[moment.state][j_upper], 1, 2)
        total += above @ element @ lower.vectors[0][j_lower]
    return total


@lru_cache(maxsize=72)
def _cosines(axis: str, delta_j: int, block_upper: int, block_lower: int, j_max: int, k_max: int) -> Floats:
    cosine = direction_cosine(axis, delta_j, block_k(block_upper, k_max), block_k(block_lower, k_max), j_max)
    cosine.flags.writeable = False
    return cosine


def _factor(
    factors: Sequence[float],
    delta_j: int,
    j_lower: NDArray[np.int64],
    k_upper: NDArray[np.int64],
    k_lower: NDArray[np.int64],
) -> Floats:
    """The six-term factor of the module's head, broadcastable to ``(J, K', K)``."""
    m = np.asarray({-1: -j_lower, 0: 0 * j_lower, 1: j_lower + 1}[delta_j], dtype=np.float64)[:, np.newaxis, np.newaxis]
    upper, lower = k_upper[np.newaxis, :, np.newaxis] ** 2.0, k_lower[np.newaxis, np.newaxis, :] ** 2.0
    m0, m1, m2, m3, m4, m5 = factors
    in_j = m0 + m1 * m + m3 * m**2
    if m2 == m4 == m5 == 0:
        return in_j
    return in_j + (m2 + m5 * m) * (upper - lower) + m4 * (upper + lower)


def _columns(group: _Group, scale: float, cuts_cm: Floats, spin: Sequence[float] | None) -> dict[str, NDArray[Any]]:
    """The lines of a group that are strong enough, one array per property."""
    intensity = scale * group.strength
    j, up, low = np.nonzero((intensity > 0) & (intensity >= cuts_cm.min()))
    j_upper, j_lower = group.j_upper[j], group.j_lower[j]
    state = group.upper.state[j_upper, up]
    keep = intensity[j, up, low] >= cuts_cm[state]
    j, up, low, j_upper, j_lower = (index[keep] for index in (j, up, low, j_upper, j_lower))
    column = {
        "wavenumber": group.wavenumber_per_cm[j, up, low],
        "intensity": intensity[j, up, low],
        "energy": group.lower.energy_per_cm[j_lower, low],
        "j_upper": j_upper,
        "j_lower": j_lower,
        "ka": group.upper.ka[j_upper, up],
        "ka_lower": group.lower.ka[j_lower, low],
        "state": state[keep],
        "upper": _label_index(group.upper, j_upper, up),
        "lower": _label_index(group.lower, j_lower, low),
    }
    if spin is not None:
        column["spin_upper"] = spin_rotation(group.upper, spin)[j_upper, up]
        column["spin_lower"] = spin_rotation(group.lower, spin)[j_lower, low]
    return column


def _merged(column: dict[str, NDArray[Any]], tolerance_per_cm: float) -> dict[str, NDArray[Any]]:
    """One line for lines of equal lower energy and wavenumber: the unresolved doublets of high J.

    Energies count as equal in the same cell of the tolerance's width; a doublet astride two cells stays two lines.
    """
    if tolerance_per_cm <= 0:
        return column
    cell = np.rint(column["energy"] / tolerance_per_cm)
    order = np.lexsort((column["wavenumber"], cell))
    column = {name: values[order] for name, values in column.items()}
    first = np.ones(order.size, dtype=bool)
    first[1:] = (np.diff(column["wavenumber"]) >= tolerance_per_cm) | (np.diff(cell[order]) > 0)
    total = np.bincount(np.cumsum(first) - 1, weights=column["intensity"])
    return {name: values[first] for name, values in column.items()} | {"intensity": total}


def _spin_doublets(column: dict[str, NDArray[Any]]) -> dict[str, NDArray[Any]]:
    """Each line as two, J - N = +1/2 and -1/2 in both levels; the weak lines that change J - N are left out."""
    both = []
    for half in (0.5, -0.5):
        n_upper, n_lower = column["j_upper"], column["j_lower"]
        upper, lower = (
            column[f"spin_{level}"] * half / np.maximum(n + 0.5 + half, 0.5)
            for level, n in (("upper", n_upper), ("lower", n_lower))
        )
        changed = {
            "wavenumber": column["wavenumber"] + upper - lower,
            "energy": column["energy"] + lower,
            "intensity": column["intensity"] * (n_lower + 0.5 + half) / (2 * n_lower + 1),
        }
        both.append(column | changed)
    return {name: np.concatenate([one[name] for one in both]) for name in column}


def _label_index(levels: Levels, j: NDArray[np.int64], level: NDArray[np.int64]) -> NDArray[np.int64]:
    return np.asarray(j * (j + 1) + levels.ka[j, level] - levels.kc[j, level], dtype=np.int64)


@lru_cache(maxsize=8)
def _labels(j_max: int) -> NDArray[np.str_]:
    """Texts ``J Ka Kc`` at J (J+1) + Ka - Kc."""
    texts = [
        f"{j:3d}{(j + tau + 1) // 2:3d}{(j - tau + 1) // 2:3d}" for j in range(j_max + 1) for tau in range(-j, j + 1)
    ]
    return np.array(texts)


def _widths(numbers: Sequence[float], column: Mapping[str, NDArray[Any]], j_scale: float) -> Floats:
    if len(numbers) == _LOGARITHMIC_TERMS:
        j, k = 0.5 * (column["j_upper"] + column["j_lower"]), 0.5 * (column["ka"] + column["ka_lower"])
        widths = np.exp(np.array(numbers) @ np.stack([np.ones_like(j), j, j**2, k, k**2, j * k]))
    else:
        widths = _four_terms(numbers, column, j_scale)
    return np.maximum(_LEAST_WIDTH_PER_CM_ATM, widths)


def _four_terms(numbers: Sequence[float], column: Mapping[str, NDArray[Any]], j_scale: float) -> Floats:
    constant, low_j, in_ka, low_j_in_ka = numbers
    decay, ka = np.exp(-np.maximum(column["j_upper"], column["j_lower"]) / j_scale), column["ka"] / 10.0
    return np.asarray(constant + low_j * decay + in_ka * ka + low_j_in_ka * decay * ka, dtype=np.float64)


def _lower_weights(part: Mapping[str, Any], lower: str) -> Floats:
    reversed_ = lower in part.get("antisymmetric_states", ())
    return np.array(part["spin_weights_antisymmetric" if reversed_ else "spin_weights"], dtype=np.float64)
