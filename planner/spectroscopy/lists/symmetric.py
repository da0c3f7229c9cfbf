"""Lines of symmetric tops: parallel and perpendicular bands, and pairs of states mixed by Coriolis force.

With ``x = J(J+1)``, the signed projection k of J on the axis, K = ``|k|``, and the vibrational angular momentum
l = +1 or -1 of a degenerate state, a level is (e.g. Herzberg 1945, Infrared and Raman Spectra, chapter IV) ::

    E = G + B x + (C-B) K^2 - DJ x^2 - DJK x K^2 - DK K^4 + HJ x^3 + HJK x^2 K^2 + HKJ x K^4 + HK K^6
          - 2 C zeta k l + etaJ x k l + etaK K^2 k l

where C stands for A in a prolate top. Parallel bands keep k; perpendicular bands change k and l together by one. A
line has the intensity ::

    S ~ w (2J''+1) C^2 F^2 nu exp(-c2 E''/T) (1 - exp(-c2 nu/T)),       F = 1 + h1 m + h2 (K'^2 - K''^2)

with the Clebsch-Gordan coefficient C of (J'' k''; 1 k'-k'') to J' k', which makes C^2 the Hoenl-London factor,
m = -J'', 0, J''+1 in the P, Q and R branches, and w the nuclear spin weight of the lower level, both signs of k taken
together. Each band is scaled to its stated sum at 296 K.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from planner.errors import LineDataError
from planner.spectroscopy.lines import Lines
from planner.spectroscopy.lists.angular import clebsch_gordan
from planner.spectroscopy.lists.intensities import (
    C2_CM_K,
    REFERENCE_TEMPERATURE_K,
    relative_intensity,
    worth_keeping,
)
from planner.spectroscopy.lists.statistical import with_satellites
from planner.spectroscopy.lists.symmetric_levels import CoupledPair, TopLevel, pair_blocks, read_levels

__all__ = ["symmetric_lines"]

Floats = NDArray[np.float64]
Ints = NDArray[np.int64]

_NARROWEST = 0.01
"""No line is narrower (1/cm/atm): the fitted forms may fall below zero far beyond the J and K they were fitted to."""


@dataclass(frozen=True, kw_only=True, eq=False)
class _Transitions:
    """Lines of one band, shape ``(line,)``; J and K are those of the lower level."""

    upper: str
    lower: str
    wavenumber: Floats
    intensity: Floats
    lower_energy: Floats
    j: Ints
    k: Ints


def symmetric_lines(part: Mapping[str, Any], hitran_number: int) -> Lines:
    """Lines of all bands and coupled pairs of a part.

    Parameters
    ----------
    part : mapping
        ``isotopologue``; ``largest``, J and K of the lower level; ``weakest_cm``, the weakest line kept, at 296 or
        600 K; ``weights``,
        named lists of the nuclear spin weights of levels with K = 0 and even J, K = 0 and odd J, K = 3, 6, ...,
        and other K; ``air_width``, ``self_width`` (1/cm/atm) and ``air_exponent``, each ``[a, b, c, d]`` for
        ``a + b e + c K/10 + d e K/10`` with ``e = exp(-J/width_j_scale)`` of the lower level;

        ``levels``, rows ``name, weights, [G, B, C-B, DJ, DJK, DK, HJ, HJK, HKJ, HK], [C zeta, etaJ, etaK], source``:
        left out quartic constants are those of the first level, left out others are zero;

        ``bands``, rows ``upper, lower, "parallel" or "perpendicular", S (cm/molecule), [h1, h2], hot, source``;
        and optionally

        ``hot``, rows ``name, energy, degeneracy, shift, factor``: every band with a true ``hot`` is repeated from
        each of these levels, displaced by the shift, with S times degeneracy, factor and Boltzmann factor, times 2
        (parallel) or 1.5 (perpendicular) if the row carries the name of the band's upper level;

        ``coupled``, tables with ``a1``, ``e``, ``lower`` (names of levels), ``coupling`` [c, cK], ``doubling`` q,
        ``moment_ratio``, the squared moment of
        the A1 state over half that of the E state, ``sum_cm``, ``herman_wallis`` [h1, h2] and ``hot``;

        ``satellites``, tables of arguments of `planner.spectroscopy.lists.statistical.with_satellites`, applied
        one after the other.
    hitran_number : int
        Molecule number that the lines carry.

    Raises
    ------
    LineDataError
        If a row has another shape or names a level that is not there.
    """
    levels = read_levels(part["levels"], hitran_number)
    largest_j, largest_k = part["largest"]
    grid = _quantum_numbers(largest_j, largest_k)
    found: list[_Transitions] = []
    for row in part.get("bands", []):
        found += _band(row, part, levels, grid)
    for table in part.get("coupled", []):
        found += _coupled_band(table, part, levels, grid)
    return _as_lines(found, part, hitran_number)


def _quantum_numbers(largest_j: int, largest_k: int) -> tuple[Ints, Ints]:
    """All J and K = 0..min(J, largest K) of lower levels, flat."""
    j, k = np.indices((largest_j + 1, largest_k + 1)).reshape(2, -1)
    return j[k <= j], k[k <= j]


def _level(levels: Mapping[str, TopLevel], name: str) -> TopLevel:
    if name not in levels:
        raise LineDataError(f"symmetric top: no level {name!r}; add it to the levels")
    return levels[name]


@dataclass(frozen=True, kw_only=True)
class _Copy:
    """A band seen from a higher level: its label, energy and shift in 1/cm, and the factor on the intensity."""

    label: str = ""
    energy: float = 0.0
    shift: float = 0.0
    factor: float = 1.0


def _copies(name: str, hot: Sequence[Sequence[Any]], own_factor: float) -> list[_Copy]:
    """The cold band and its hot copies."""
    copies = [_Copy()]
    for label, energy, degeneracy, shift, factor in hot:
        factor = degeneracy * factor * np.exp(-C2_CM_K * energy / REFERENCE_TEMPERATURE_K)
        factor *= own_factor if label == name else 1.0
        copies.append(_Copy(label=label, energy=energy, shift=shift, factor=factor))
    return copies


def _band(
    row: Sequence[Any], part: Mapping[str, Any], levels: Mapping[str, TopLevel], grid: tuple[Ints, Ints]
) -> list[_Transitions]:
    """An uncoupled band and its hot copies, scaled."""
    try:
        upper_name, lower_name, kind, total, herman_wallis, hot, _source = row
        steps = {"parallel": ((0, 0),), "perpendicular": ((1, 1), (-1, -1))}[kind]
    except (ValueError, KeyError) as error:
        raise LineDataError(
            f"symmetric top: band {row}: expected upper, lower, parallel or perpendicular, S, [h1, h2], hot, source"
        ) from error
    upper, lower = _level(levels, upper_name), _level(levels, lower_name)
    weights = part["weights"][lower.weights]
    pieces = []
    j, k = grid
    for k_step, vibrational in steps:
        for j_step in (-1, 0, 1):
            strength = clebsch_gordan(j, k, j_step, k_step) ** 2
            strength *= _spin_weights(weights, j, k) * (2 * j + 1)
            strength *= _herman_wallis(herman_wallis, j, k, j_step, k_step) ** 2
            energy = lower.energy_per_cm(j, k)
            wavenumber = upper.energy_per_cm(j + j_step, k + k_step, vibrational) - energy
            pieces.append(np.stack([wavenumber, strength, energy, j, k]))
    own = 2.0 if kind == "parallel" else 1.5
    return _scaled(pieces, total, (upper_name, lower_name), _copies(upper_name, part["hot"] if hot else (), own))


def _coupled_band(
    table: Mapping[str, Any], part: Mapping[str, Any], levels: Mapping[str, TopLevel], grid: tuple[Ints, Ints]
) -> list[_Transitions]:
    """A coupled pair and its hot copies, scaled."""
    lower = _level(levels, table["lower"])
    pair = CoupledPair(
        a1=_level(levels, table["a1"]),
        e=_level(levels, table["e"]),
        coupling=np.asarray(table["coupling"], dtype=np.float64),
        doubling=float(table["doubling"]),
    )
    j, k = grid
    weight = _spin_weights(part["weights"][lower.weights], j, k) * (2 * j + 1)
    energy = lower.energy_per_cm(j, k)
    pieces = []
    for j_step in (-1, 0, 1):
        energies, vectors = pair_blocks(pair, j + j_step, k)
        moment = np.stack(
            [
                factor
                * clebsch_gordan(j, k, j_step, k_step)
                * _herman_wallis(table["herman_wallis"], j, k, j_step, k_step)
                for factor, k_step in ((float(table["moment_ratio"]) ** 0.5, 0), (1.0, 1), (-1.0, -1))
            ],
            axis=1,
        )
        amplitude = np.einsum("bi,bis->bs", moment, vectors)
        for state in range(3):
            strength = weight * amplitude[:, state] ** 2
            pieces.append(np.stack([energies[:, state] - energy, strength, energy, j, k]))
    # of the two names the one of the E state stands for the pair
    return _scaled(pieces, table["sum_cm"], (table["e"], table["lower"]), _copies("", table["hot"], 1.0))


def _spin_weights(weights: Sequence[float], j: Ints, k: Ints) -> Floats:
    even, odd, threes, others = weights
    return np.where(k == 0, np.where(j % 2 == 0, even, odd), np.where(k % 3 == 0, threes, others)) * 1.0


def _herman_wallis(factors: Sequence[float], j: Ints, k: Ints, j_step: int, k_step: int) -> Floats:
    linear, square = factors if len(factors) else (0.0, 0.0)
    m = {-1: -j, 0: 0 * j, 1: j + 1}[j_step]
    return np.asarray(1.0 + linear * m + square * ((k + k_step) ** 2 - k**2))


def _scaled(
    pieces: Sequence[Floats], total: float, names: tuple[str, str], copies: Sequence[_Copy]
) -> list[_Transitions]:
    """The lines of a band scaled to its sum at 296 K, and its copies."""
    wavenumber, strength, energy, j, k = np.concatenate(pieces, axis=1)
    keep = (strength > 0) & (wavenumber > 0)
    wavenumber, strength, energy, j, k = (column[keep] for column in (wavenumber, strength, energy, j, k))
    intensity = strength * relative_intensity(wavenumber, energy)
    intensity *= total / intensity.sum()
    return [
        _Transitions(
            upper=f"{names[0]}+{copy.label}" if copy.label else names[0],
            lower=copy.label or names[1],
            wavenumber=wavenumber + copy.shift,
            intensity=copy.factor * intensity,
            lower_energy=energy + copy.energy,
            j=j.astype(np.int64),
            k=k.astype(np.int64),
        )
        for copy in copies
    ]


def _as_lines(found: Sequence[_Transitions], part: Mapping[str, Any], hitran_number: int) -> Lines:
    isotopologue, weakest = int(part["isotopologue"]), float(part["weakest_cm"])
    sets = []
    for band in found:
        decay = np.exp(-band.j / float(part["width_j_scale"]))
        terms = np.stack([np.ones_like(decay), decay, band.k / 10.0, decay * band.k / 10.0])
        air, own, exponent = (np.asarray(part[key]) @ terms for key in ("air_width", "self_width", "air_exponent"))
        lines = Lines.make(
            molecule=hitran_number,
            isotopologue=isotopologue,
            wavenumber_per_cm=band.wavenumber,
            intensity_cm=band.intensity,
            lower_energy_per_cm=band.lower_energy,
            air_width_per_cm_atm=np.maximum(air, _NARROWEST),
            self_width_per_cm_atm=np.maximum(own, _NARROWEST),
            temperature_exponent=exponent,
            upper_global=band.upper.rjust(15)[:15],
            lower_global=band.lower.rjust(15)[:15],
            lower_local=[f"{j:3d}{k:3d}" for j, k in zip(band.j, band.k, strict=True)],
        )
        for satellites in part.get("satellites", []):
            lines = with_satellites(lines, **satellites)
        keep = worth_keeping(
            hitran_number,
            isotopologue,
            lines.wavenumber_per_cm,
            lines.intensity_cm,
            lines.lower_energy_per_cm,
            weakest,
        )
        lines = lines.where(keep)
        if len(lines):
            sets.append(_with_sum(lines, float(band.intensity.sum())))
    return Lines.join(sets)


def _with_sum(lines: Lines, total: float) -> Lines:
    """The lines scaled to a sum. Those near the cut are unsaturated, so they can carry what the dropped ones had."""
    return replace(lines, intensity_cm=lines.intensity_cm * (total / lines.intensity_cm.sum()))
